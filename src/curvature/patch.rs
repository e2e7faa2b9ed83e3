//! The space between each facet and a curved patch over it.
//!
//! Over a facet the surface is taken as the quadratic height that vanishes at the corners and
//! rises along each side as the normals at its ends say, with λ the barycentric coordinates:
//!
//! ```text
//! h = Σ cᵢⱼ λᵢ λⱼ      cᵢⱼ = (nⱼ − nᵢ)·(pⱼ − pᵢ)/2
//! ```
//!
//! (along a side of curvature κ and length l: c = κ l²/2, four times the sag). The space under it
//! and its moments are integrated exactly. What opens between two patches along their edge is a
//! kite of area (h₁x₁ + h₂x₂)/2, where x is how far the surface's edge lies out beyond the
//! facet's: x₁ = (h₂ − h₁ cos φ)/sin φ where the facets' normals turn by φ.

use nalgebra::Matrix3;

use super::normals::{Rise, Trust};
use super::surface::{NEXT, NONE, Surface, V};
use crate::moments::Moments;

/// Dunavant's rule of degree 6 ("High degree efficient symmetrical Gaussian quadrature rules for
/// the triangle", Int. J. Numer. Methods Eng. 21, 1985): weight and barycentric coordinates of
/// each orbit. h³ and h·x·xᵀ have degree 6 and 4.
const PAIRS: [(f64, f64); 2] = [
    (0.116_786_275_726_379_37, 0.249_286_745_170_910_42),
    (0.050_844_906_370_206_82, 0.063_089_014_491_502_23),
];
const TRIPLE: (f64, f64, f64) = (
    0.082_851_075_618_373_57,
    0.053_145_049_844_816_95,
    0.310_352_451_033_784_4,
);

fn rule() -> [(f64, [f64; 3]); 12] {
    let mut out = [(0.0, [0.0; 3]); 12];
    let mut n = 0;
    for (w, a) in PAIRS {
        for k in 0..3 {
            let mut l = [a; 3];
            l[k] = 1.0 - 2.0 * a;
            out[n] = (w, l);
            n += 1;
        }
    }
    let (w, a, b) = TRIPLE;
    let c = 1.0 - a - b;
    for l in [
        [a, b, c],
        [a, c, b],
        [b, a, c],
        [b, c, a],
        [c, a, b],
        [c, b, a],
    ] {
        out[n] = (w, l);
        n += 1;
    }
    out
}

/// What the patches add to the facets.
pub(super) struct Added {
    pub(super) convex: f64,
    pub(super) concave: f64,
    /// Moments of volume about the middle of the box.
    pub(super) moments: Moments,
    pub(super) area: f64,
    /// Σ of the sizes of all that was added to the volume.
    pub(super) size: f64,
    /// Σ of the sizes of all that was added to the area.
    pub(super) area_size: f64,
    /// Σ over sides of how far the two ends differ on their rise, as a volume.
    pub(super) unsure: f64,
    /// Area of the facets that a patch rises over or sinks under.
    pub(super) curved: f64,
}

/// The height of the patch and its derivatives by λ. Towards the tip of a cone the rise of the
/// opposite side falls with the distance: λᵢλⱼ/(λᵢ + λⱼ) in place of λᵢλⱼ.
fn height(c: &[f64; 3], l: &[f64; 3], tip: Option<usize>) -> (f64, [f64; 3]) {
    let mut h = 0.0;
    let mut d = [0.0; 3];
    for k in 0..3 {
        let j = NEXT[k];
        if tip == Some(NEXT[j]) {
            let sum = l[k] + l[j];
            h += c[k] * l[k] * l[j] / sum;
            d[k] += c[k] * (l[j] / sum).powi(2);
            d[j] += c[k] * (l[k] / sum).powi(2);
        } else {
            h += c[k] * l[k] * l[j];
            d[k] += c[k] * l[j];
            d[j] += c[k] * l[k];
        }
    }
    (h, d)
}

/// A rule of Gauss and Legendre, four points each way, in the coordinates that lead to a corner:
/// there the conic height is a polynomial.
fn towards(tip: usize) -> [(f64, [f64; 3]); 16] {
    let (a, b): (f64, f64) = (0.861_136_311_594_052_6, 0.339_981_043_584_856_26);
    let (u, v) = (0.347_854_845_137_453_85, 0.652_145_154_862_546_1);
    let line = [(u, -a), (v, -b), (v, b), (u, a)].map(|(w, x)| (w / 2.0, (x + 1.0) / 2.0));
    let mut out = [(0.0, [0.0; 3]); 16];
    for (i, (w, s)) in line.iter().enumerate() {
        for (j, (q, t)) in line.iter().enumerate() {
            let mut l = [0.0; 3];
            l[tip] = 1.0 - s;
            l[NEXT[tip]] = s * (1.0 - t);
            l[NEXT[NEXT[tip]]] = s * t;
            out[4 * i + j] = (w * q * 2.0 * s, l);
        }
    }
    out
}

/// Integrates the space between all facets and their patches.
pub(super) fn integrate(
    s: &Surface,
    nodes: &[[u32; 3]],
    trust: &[Trust],
    rises: &[Rise],
    of: &[u32],
) -> Added {
    let plain = rule();
    let mut out = Added {
        convex: 0.0,
        concave: 0.0,
        moments: Moments::zero(V::zeros()),
        area: 0.0,
        size: 0.0,
        area_size: 0.0,
        unsure: 0.0,
        curved: 0.0,
    };
    let side = |h: usize| rises[of[h] as usize];
    for t in 0..s.corners.len() {
        let c = [0, 1, 2].map(|k| side(3 * t + k));
        let area = s.area[t];
        let longest = (0..3)
            .map(|k| s.along(3 * t + k).norm())
            .fold(0.0, f64::max);
        let largest = c.iter().map(|c| c.value.abs()).fold(0.0, f64::max);
        out.unsure += area / 12.0 * c.iter().map(|c| c.off).sum::<f64>();
        if largest <= 1e-9 * longest || area <= 0.0 {
            continue;
        }
        out.curved += area;
        let c = c.map(|c| c.value);
        let p = [0, 1, 2].map(|k| s.at(t, k));
        let n = s.normal[t];
        // Gradients of the barycentric coordinates.
        let g = [0, 1, 2].map(|k| n.cross(&(p[NEXT[NEXT[k]]] - p[NEXT[k]])) / (2.0 * area));
        let (mut zeroth, mut first, mut second, mut more) =
            (0.0, V::zeros(), Matrix3::zeros(), 0.0);
        let tip = (0..3).find(|&k| trust[nodes[t][k] as usize] == Trust::Singular);
        let conic;
        let points = match tip {
            None => &plain[..],
            Some(k) => {
                conic = towards(k);
                &conic[..]
            }
        };
        for (w, l) in points {
            let (h, d) = height(&c, l, tip);
            let slope = g[0] * d[0] + g[1] * d[1] + g[2] * d[2];
            let x = p[0] * l[0] + p[1] * l[1] + p[2] * l[2];
            let (w, m) = (w * area, x + n * (h / 2.0));
            zeroth += w * h;
            first += m * (w * h);
            // ∫₀ʰ (x + z n)(x + z n)ᵀ dz about the middle of the column.
            second += (m * m.transpose() + n * n.transpose() * (h * h / 12.0)) * (w * h);
            more += w * ((1.0 + slope.norm_squared()).sqrt() - 1.0);
        }
        out.add(zeroth);
        out.moments.zeroth += zeroth;
        out.moments.first += first;
        out.moments.second += second;
        out.area += more;
        out.area_size += more;
        out.size += zeroth.abs();
    }
    for h in 0..s.opposite.len() {
        let o = s.opposite[h];
        if o != NONE && (h as u32) < o {
            out.edge(s, h, side(h).value, side(o as usize).value);
        }
    }
    out
}

impl Added {
    fn add(&mut self, volume: f64) {
        if volume > 0.0 {
            self.convex += volume;
        } else {
            self.concave += volume;
        }
    }

    /// What opens along an edge.
    fn edge(&mut self, s: &Surface, h: usize, c: f64, d: f64) {
        if c == 0.0 && d == 0.0 {
            return;
        }
        let (sin, cos) = s.turn[h].sin_cos();
        let [x, y] = if s.turn[h].abs() < 0.2 {
            [(c + d) / 2.0 * (s.turn[h] / 2.0).tan(); 2]
        } else if sin.abs() < 0.05 {
            // A blade: where its edge runs is anyone's guess.
            return;
        } else {
            [(d - c * cos) / sin, (c - d * cos) / sin]
        };
        let e = s.along(h);
        let length = e.norm();
        let volume = (c * x + d * y) * length / 60.0;
        if !volume.is_finite() {
            return;
        }
        let middle = s.at(h / 3, h % 3) + e / 2.0;
        self.add(volume);
        self.moments.zeroth += volume;
        self.moments.first += middle * volume;
        self.moments.second += middle * middle.transpose() * volume;
        self.area += (x + y) * length / 6.0;
        self.area_size += (x.abs() + y.abs()) * length / 6.0;
        self.size += volume.abs();
    }
}
