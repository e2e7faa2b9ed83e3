//! The three centres: of the shape, of the mass, and of gravity; force and torque in a central
//! field.
//!
//! **Two points go by the name "centre of gravity"**, and they differ:
//!
//! - the *weight-averaged* point ∫ r g dm / ∫ g dm, g being the magnitude of gravity at each bit of
//!   mass: where the weights balance if their directions are taken as one;
//! - the *same-force* point: where the whole mass, as a point, would feel the same force in size and
//!   direction. It does not exist where the resultant vanishes.
//!
//! In a uniform field both are the centre of mass.
//!
//! **How digits are kept**, from a bracket on the ground to a tether of 100,000 km: everything is a
//! difference from the centre of mass c (seen from the field's centre, R = |c|). With d from there,
//! |c+d|² = R²(1+q), q = d·(d+2c)/R², and
//!
//! ```text
//! h(q) = (1+q)^(−3/2) − 1        k(q) = (1+q)^(−1) − 1
//! F = −GM/R³ (M c + V),   V = c ∫h dm + ∫h d dm      (∫ d dm = 0)
//! torque about c = GM/R³ c × ∫h d dm
//! weight-averaged − c = ∫k d dm / (M + ∫k dm)
//! same-force − c = v + ((|c+v|/R)^(−3/2) − 1)(c+v),   v = V/M
//! ```
//!
//! h and k are formed without cancellation, and the part of h that is linear in d is taken out
//! before summing (it integrates to −3c·∫d dm/R² = 0), so that the smallest shift keeps its relative
//! precision. The torque is never −r×F.
//!
//! **How mass is sampled.** A thing of half-size s at distance r stands for 6 points with the same
//! zeroth, first and second moments where (s/r)³ < 1e-13: that is the moment series to second order,
//! and what it leaves out is below 1e-13. A nearer thing whose shape is known is cut into tetrahedra,
//! halved until each is small against its distance, with product rules whose remainder is below
//! 1e-13 there ([`crate::geometry::cubature`]).

use nalgebra::{Matrix3, SymmetricEigen, Vector3};

use crate::geometry::cubature::{Rule, tetrahedron};
use crate::geometry::eft::Sum;
use crate::moments::Moments;

/// Mass whose shape may be known.
#[derive(Clone, Debug)]
pub struct Mass {
    /// kg, kg m, kg m².
    pub moments: Moments,
    /// Box, m.
    pub bounds: [[f64; 3]; 2],
    /// Its solid pieces, each of uniform density; none where only the moments are known.
    pub pieces: Vec<Piece>,
    /// Whether all of it is at one point, or too little is known to do better.
    pub point: bool,
}

/// A solid of one density.
#[derive(Clone, Debug)]
pub struct Piece {
    /// Outward, m, in the frame of the moments: closed, or open where a flat that holds `apex`
    /// closes it.
    pub facets: Vec<[[f64; 3]; 3]>,
    /// A point in or near it.
    pub apex: [f64; 3],
    /// kg/m³.
    pub density: f64,
}

/// What a central field does to a mass; places are differences from the centre of mass.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Central {
    /// Resultant, N.
    pub force: Vector3<f64>,
    /// About the centre of mass, N m.
    pub torque: Vector3<f64>,
    /// ∫ r g dm / ∫ g dm less the centre of mass, m.
    pub weight_averaged: Vector3<f64>,
    /// The point of the same force less the centre of mass, m; none where there is no resultant.
    pub same_force: Option<Vector3<f64>>,
    /// Some mass was near the field's centre while only its moments are known.
    pub rough: bool,
}

/// Sums over the mass, in the order of their appearance above.
struct Sums {
    c: Vector3<f64>,
    r2: f64,
    h: Sum,
    hd: [Sum; 3],
    k: Sum,
    kd: [Sum; 3],
}

impl Sums {
    /// Adds the mass `m` at `d` from the centre of mass.
    fn add(&mut self, d: &Vector3<f64>, m: f64) {
        let linear = 2.0 * self.c.dot(d) / self.r2;
        let q = linear + d.norm_squared() / self.r2;
        // (1+q)^(-3/2) − 1, by the exponential of the logarithm: no digit of a small q is lost.
        let h = (-1.5 * q.ln_1p()).exp_m1();
        let k = -q / (1.0 + q);
        self.h.add(m * rest_of_h(h, q, linear));
        self.k.add(m * k);
        for i in 0..3 {
            self.hd[i].add(m * h * d[i]);
            self.kd[i].add(m * k * d[i]);
        }
    }
}

/// h + 1.5·linear: of second order in d. By its series where h itself has lost the digits.
fn rest_of_h(h: f64, q: f64, linear: f64) -> f64 {
    if q.abs() < 1e-3 {
        // h = −3q/2 + 15q²/8 − 35q³/16 + 315q⁴/128 − 693q⁵/256 + …, the binomial series.
        let tail = q
            * q
            * (15.0 / 8.0
                - q * (35.0 / 16.0
                    - q * (315.0 / 128.0 - q * (693.0 / 256.0 - q * 3003.0 / 1024.0))));
        -1.5 * (q - linear) + tail
    } else {
        h + 1.5 * linear
    }
}

/// What a central field of parameter `gm` (m³/s²) does to all of `masses` together; `at` is the
/// origin of their frame as seen from the field's centre (m).
///
/// None where there is no mass, or where mass lies in the very centre of the field.
pub fn central(masses: &[Mass], total: &Moments, gm: f64, at: &Vector3<f64>) -> Option<Central> {
    let centre = total.centre()?;
    let c = at + centre;
    let r = c.norm();
    let boxes = masses.iter().flat_map(|m| m.bounds);
    let reach = boxes
        .map(|p| (Vector3::from(p) - centre).norm())
        .fold(0.0, f64::max);
    if r < 1e-2 * reach {
        return around(masses, total.zeroth, gm, at, &centre);
    }
    let mut sums = Sums {
        c,
        r2: r * r,
        h: Sum::ZERO,
        hd: [Sum::ZERO; 3],
        k: Sum::ZERO,
        kd: [Sum::ZERO; 3],
    };
    let mut rough = false;
    for mass in masses.iter().filter(|m| m.moments.zeroth > 0.0) {
        rough |= sample(mass, at, &centre, &mut |d, m| sums.add(&d, m));
    }
    let m = total.zeroth;
    let v3 = |s: [Sum; 3]| Vector3::from(s.map(Sum::value));
    let (hd, kd) = (v3(sums.hd), v3(sums.kd));
    let v = (c * sums.h.value() + hd) / m;
    let field = gm / r / r / r;
    let u = c + v;
    let e = (2.0 * c.dot(&v) + v.norm_squared()) / sums.r2;
    // |u| = 0 where the pulls cancel: then e = −1.
    let scale = (-0.75 * e.ln_1p()).exp_m1();
    let same = v + u * scale;
    let weighted = kd / (m + sums.k.value());
    let out = Central {
        force: u * (-field * m),
        torque: c.cross(&hd) * field,
        weight_averaged: weighted,
        same_force: Some(same).filter(|s| u.norm() > 1e-14 * r && s.iter().all(|x| x.is_finite())),
        rough,
    };
    let finite = |v: &Vector3<f64>| v.iter().all(|x| x.is_finite());
    (finite(&out.force) && finite(&out.torque) && finite(&out.weight_averaged)).then_some(out)
}

/// Where the mass lies around the field's centre, shifts are as large as the mass is long: they are
/// taken as they come.
fn around(
    masses: &[Mass],
    m: f64,
    gm: f64,
    at: &Vector3<f64>,
    centre: &Vector3<f64>,
) -> Option<Central> {
    let c = at + centre;
    let mut weight = Sum::ZERO;
    let mut sums = [[Sum::ZERO; 3]; 3];
    let mut rough = false;
    for mass in masses.iter().filter(|m| m.moments.zeroth > 0.0) {
        rough |= sample(mass, at, centre, &mut |d, m| {
            let r = c + d;
            let w = m / r.norm_squared();
            let pull = r * (-gm * w / r.norm());
            let turn = d.cross(&pull);
            weight.add(w);
            for k in 0..3 {
                sums[0][k].add(w * d[k]);
                sums[1][k].add(pull[k]);
                sums[2][k].add(turn[k]);
            }
        });
    }
    let [first, force, torque] = sums.map(|s| Vector3::from(s.map(Sum::value)));
    let pull = force.norm();
    let same = -force / pull * (gm * m / pull).sqrt() - c;
    let out = Central {
        force,
        torque,
        weight_averaged: first / weight.value(),
        same_force: Some(same).filter(|_| pull > 1e-14 * gm * weight.value()),
        rough,
    };
    let finite = |v: &Vector3<f64>| v.iter().all(|x| x.is_finite());
    (finite(&out.force) && finite(&out.torque) && finite(&out.weight_averaged)).then_some(out)
}

/// Hands out points of mass that stand for `mass`, seen from `centre`; true where they are a rough
/// stand-in.
fn sample(
    mass: &Mass,
    at: &Vector3<f64>,
    centre: &Vector3<f64>,
    add: &mut impl FnMut(Vector3<f64>, f64),
) -> bool {
    let m = mass.moments.zeroth;
    let own = mass.moments.first / m + (mass.moments.about - centre);
    let [lo, hi] = mass.bounds.map(Vector3::from);
    let half = (hi - lo).norm() / 2.0;
    let distance = (own + centre + at).norm();
    let small = |s: f64| (s / distance).powi(3) < 1e-13;
    if mass.pieces.is_empty() || small(half) {
        let offset = mass.moments.first / m;
        let second = mass.moments.shifted(mass.moments.about + offset).second / m;
        let spread = second.trace().max(0.0).sqrt();
        if mass.point && spread == 0.0 {
            add(own, m);
            return false;
        }
        six_points(&second, m, &own, add);
        return !small(spread.max(half));
    }
    let (low, high) = (Rule::new(4), Rule::new(8));
    let mut rough = false;
    for piece in &mass.pieces {
        let apex = Vector3::from(piece.apex);
        for t in &piece.facets {
            let corners = t.map(Vector3::from);
            let mut work = vec![[apex, corners[0], corners[1], corners[2]]];
            while let Some(tet) = work.pop() {
                let size = longest(&tet);
                let middle = (tet[0] + tet[1] + tet[2] + tet[3]) / 4.0;
                let away = (middle + at).norm() - size;
                // Degree 5 leaves (size/away)⁶, degree 13 leaves (size/away)¹⁴.
                let rule = if size < 5e-3 * away {
                    &low
                } else if size < 0.1 * away {
                    &high
                } else if size < 1e-3 * half {
                    // As good as in the field's centre.
                    rough = true;
                    &low
                } else {
                    work.extend(halved(&tet));
                    continue;
                };
                let corners = [tet[1], tet[2], tet[3]];
                tetrahedron(rule, &tet[0], &corners, &mut |x, w| {
                    add(x - centre, w * piece.density);
                });
            }
        }
    }
    rough
}

/// Points with the moments of a mass: two on each principal axis, √3 of the radius of spread away.
/// Their third moments are nil.
fn six_points(
    second: &Matrix3<f64>,
    m: f64,
    own: &Vector3<f64>,
    add: &mut impl FnMut(Vector3<f64>, f64),
) {
    let eigen = SymmetricEigen::new(*second);
    for k in 0..3 {
        let arm = eigen.eigenvectors.column(k) * (3.0 * eigen.eigenvalues[k].max(0.0)).sqrt();
        add(own + arm, m / 6.0);
        add(own - arm, m / 6.0);
    }
}

fn longest(t: &[Vector3<f64>; 4]) -> f64 {
    let pairs = [(0, 1), (0, 2), (0, 3), (1, 2), (1, 3), (2, 3)];
    pairs
        .iter()
        .map(|(a, b)| (t[*a] - t[*b]).norm())
        .fold(0.0, f64::max)
}

/// Cut across the middle of its longest edge; both halves keep the sense of their corners.
fn halved(t: &[Vector3<f64>; 4]) -> [[Vector3<f64>; 4]; 2] {
    let mut best = (0, 1);
    for a in 0..4 {
        for b in a + 1..4 {
            if (t[a] - t[b]).norm() > (t[best.0] - t[best.1]).norm() {
                best = (a, b);
            }
        }
    }
    let middle = (t[best.0] + t[best.1]) / 2.0;
    let (mut one, mut two) = (*t, *t);
    one[best.1] = middle;
    two[best.0] = middle;
    [one, two]
}
