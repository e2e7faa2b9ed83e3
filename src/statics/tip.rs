//! The slope at which a thing tips over the edge of its supports.

use std::f64::consts::FRAC_PI_2;

use nalgebra::Vector3;

use super::hull::hull;
use super::{Stand, across};
use crate::error::Result;

/// Slopes up to 90° are tried in this many steps for a change of sign.
const STEPS: usize = 180;

/// An edge of the support polygon, about which a thing can tip.
#[derive(Clone, Debug, PartialEq)]
pub struct Edge {
    /// Index of the support at its start; the polygon runs counter-clockwise as seen from above.
    pub from: usize,
    /// Index of the support at its end.
    pub to: usize,
    /// A point of the edge, m.
    pub at: Vector3<f64>,
    /// Unit vector across the edge and gravity, out of the polygon.
    pub outward: Vector3<f64>,
    /// Along the edge; one long as seen along gravity.
    along: Vector3<f64>,
}

impl Edge {
    /// Level distance from the centre to the edge, m, positive inside: the arm that holds it.
    pub fn margin(&self, centre: &Vector3<f64>) -> f64 {
        self.outward.dot(&(self.at - centre))
    }

    /// The pair (n, m) of a lean towards `towards` (a unit vector across gravity): a thing with
    /// its centre at c stands over this edge on a slope θ while
    /// cos θ·n·(p − c) − sin θ·m·(c − p) ≥ 0, with p = `at`.
    ///
    /// With gravity along g = −cos θ·up + sin θ·u, the arm of gravity about the edge e is
    /// (e × −g)·(p − c). On level feet m is up times the cosine between the lean and `outward`.
    pub fn leaning(&self, towards: &Vector3<f64>) -> (Vector3<f64>, Vector3<f64>) {
        (self.outward, towards.cross(&self.along))
    }

    /// The slope at which a thing with a fixed centre tips over this edge when it leans towards
    /// `towards`, rad: from −π (it has long tipped) to π (it never does).
    pub fn angle(&self, towards: &Vector3<f64>, centre: &Vector3<f64>) -> f64 {
        let (n, m) = self.leaning(towards);
        n.dot(&(self.at - centre)).atan2(m.dot(&(centre - self.at)))
    }

    /// The arm of gravity about the edge, as a distance seen along gravity, m.
    fn arm(&self, down: &Vector3<f64>, centre: &Vector3<f64>) -> f64 {
        let n = self.along.cross(&-down);
        n.dot(&(self.at - centre)) / n.norm()
    }
}

/// An edge with what it takes to tip over it.
#[derive(Clone, Debug, PartialEq)]
pub struct EdgeTip {
    /// Index of the support at its start.
    pub from: usize,
    /// Index of the support at its end.
    pub to: usize,
    /// Level distance from the centre to the edge as it stands, m; negative where it tips now.
    pub margin: f64,
    /// The slope straight over the edge at which it tips, rad (on level feet the least over all
    /// directions is the least of these); 0 where it tips as it stands,
    /// `None` where it does not up to 90°.
    pub angle: Option<f64>,
}

impl Stand {
    /// The edges of the support polygon.
    pub fn edges(&self) -> Vec<Edge> {
        let corners = self.corners(&self.up());
        let next = corners.iter().cycle().skip(1);
        let edges = corners.iter().zip(next).map(|(&from, &to)| {
            let (p, q) = (self.supports()[from].at, self.supports()[to].at);
            let e = q - p;
            let along = e / e.cross(&self.up()).norm();
            Edge {
                from,
                to,
                at: p,
                outward: along.cross(&self.up()).normalize(),
                along,
            }
        });
        edges.collect()
    }

    /// Distance from the centre to the rim of the support polygon, both seen along `down`, m;
    /// positive inside. Where the supports fall into one line as seen so, it is not positive.
    pub fn margin(&self, down: &Vector3<f64>, centre: &Vector3<f64>) -> f64 {
        let up = -down.normalize();
        let flat = self.flat(&up);
        let corners = hull(&flat);
        let (e, f) = across(&up);
        let d = centre - self.mean();
        let c = [d.dot(&e), d.dot(&f)];
        let next = corners.iter().cycle().skip(1);
        let sides = corners.iter().zip(next).map(|(&i, &j)| {
            let (p, q) = (flat[i], flat[j]);
            let (x, y) = (q[0] - p[0], q[1] - p[1]);
            let length = x.hypot(y);
            if length > 0.0 {
                (x * (c[1] - p[1]) - y * (c[0] - p[0])) / length
            } else {
                -(c[0] - p[0]).hypot(c[1] - p[1])
            }
        });
        sides.fold(f64::INFINITY, f64::min)
    }
}

/// Margin and slope of every edge of the support polygon, as the thing leans straight over it.
///
/// `centre_at` gives the centre of mass, m, when gravity acts along a unit vector in the thing's
/// own frame: a liquid levels anew at each slope. The slope is the first at which gravity through
/// the centre passes the edge: found between steps of half a degree (and at the least between
/// them) and solved by bisection to rounding.
///
/// # Errors
/// Those of `centre_at`.
pub fn tip_edges(
    stand: &Stand,
    centre_at: &mut dyn FnMut(&Vector3<f64>) -> Result<Vector3<f64>>,
) -> Result<Vec<EdgeTip>> {
    let here = centre_at(&-stand.up())?;
    let edges = stand.edges().into_iter().map(|edge| {
        let (up, u) = (stand.up(), edge.outward);
        let angle = first_crossing(&mut |slope| {
            let down = u * slope.sin() - up * slope.cos();
            Ok(edge.arm(&down, &centre_at(&down)?))
        })?;
        Ok(EdgeTip {
            from: edge.from,
            to: edge.to,
            margin: edge.margin(&here),
            angle,
        })
    });
    edges.collect()
}

/// The slope at which the thing tips, over whichever edge, when it leans towards `towards`
/// (brought across gravity), rad; 0 where it tips as it stands, `None` where it does not up to
/// 90° or the direction is that of gravity.
///
/// # Errors
/// Those of `centre_at`, which is as in [`tip_edges`].
pub fn tip_towards(
    stand: &Stand,
    towards: &Vector3<f64>,
    centre_at: &mut dyn FnMut(&Vector3<f64>) -> Result<Vector3<f64>>,
) -> Result<Option<f64>> {
    let up = stand.up();
    let level = towards - up * up.dot(towards);
    if level.norm() <= 1e-12 * towards.norm() {
        return Ok(None);
    }
    let u = level.normalize();
    first_crossing(&mut |slope| {
        let down = u * slope.sin() - up * slope.cos();
        Ok(stand.margin(&down, &centre_at(&down)?))
    })
}

/// The first slope from 0 to 90° at which `margin` is below zero.
fn first_crossing(margin: &mut dyn FnMut(f64) -> Result<f64>) -> Result<Option<f64>> {
    let at = |k: usize| FRAC_PI_2 * k as f64 / STEPS as f64;
    let mut past: Vec<(f64, f64)> = Vec::with_capacity(3);
    for k in 0..=STEPS {
        let (x, m) = (at(k), margin(at(k))?);
        if m < 0.0 {
            return match past.last() {
                None => Ok(Some(0.0)),
                Some(&(inside, _)) => bisect(margin, inside, x).map(Some),
            };
        }
        // A dip between steps may pass below zero and come back.
        if let [.., (a, fa), (_, fb)] = past[..]
            && fb < fa
            && fb < m
            && let Some(out) = dip(margin, a, x)?
        {
            return bisect(margin, a, out).map(Some);
        }
        past.push((x, m));
        if past.len() > 2 {
            past.remove(0);
        }
    }
    Ok(None)
}

/// A point between `a` and `b` where `margin` is below zero, if its least there is (golden
/// section).
fn dip(margin: &mut dyn FnMut(f64) -> Result<f64>, mut a: f64, mut b: f64) -> Result<Option<f64>> {
    let ratio = (5.0_f64.sqrt() - 1.0) / 2.0;
    let (mut c, mut d) = (b - ratio * (b - a), a + ratio * (b - a));
    let (mut fc, mut fd) = (margin(c)?, margin(d)?);
    for _ in 0..40 {
        if fc < 0.0 {
            return Ok(Some(c));
        }
        if fd < 0.0 {
            return Ok(Some(d));
        }
        if fc < fd {
            (b, d, fd) = (d, c, fc);
            c = b - ratio * (b - a);
            fc = margin(c)?;
        } else {
            (a, c, fc) = (c, d, fd);
            d = a + ratio * (b - a);
            fd = margin(d)?;
        }
    }
    Ok(None)
}

/// Halves the interval between a slope that holds and one that does not until no double is left
/// between them.
fn bisect(
    margin: &mut dyn FnMut(f64) -> Result<f64>,
    mut inside: f64,
    mut outside: f64,
) -> Result<f64> {
    loop {
        let middle = inside + (outside - inside) / 2.0;
        if middle <= inside || middle >= outside {
            return Ok(inside);
        }
        if margin(middle)? < 0.0 {
            outside = middle;
        } else {
            inside = middle;
        }
    }
}

#[cfg(test)]
mod tests {
    use super::super::Support;
    use super::*;
    use proptest::prelude::*;

    fn stand(at: &[[f64; 3]]) -> Stand {
        let supports = at.iter().map(|p| Support {
            name: String::new(),
            at: Vector3::from(*p),
        });
        Stand::new(supports.collect(), Vector3::z()).unwrap()
    }

    fn wheels() -> Stand {
        stand(&[
            [-0.5, -0.45, 0.0],
            [0.5, -0.45, 0.0],
            [0.5, 0.45, 0.0],
            [-0.5, 0.45, 0.0],
        ])
    }

    #[test]
    fn by_hand() {
        // Centre 0.4 m from the edge and 1.2 m high: atan(1/3) = 18.434949°.
        let s = stand(&[
            [-1.0, -0.4, 0.0],
            [1.0, -0.4, 0.0],
            [1.0, 0.4, 0.0],
            [-1.0, 0.4, 0.0],
        ]);
        let tips = tip_edges(&s, &mut |_| Ok(Vector3::new(0.0, 0.0, 1.2))).unwrap();
        let least = tips.iter().map(|t| t.angle.unwrap()).fold(9.0, f64::min);
        assert!((least.to_degrees() - 18.434_948_822_922_01).abs() < 1e-12);
        assert!((tips[0].margin - 0.4).abs() < 1e-16);
        // Below its feet it never tips up to 90°; outside of them it tips as it stands.
        let tips = tip_edges(&s, &mut |_| Ok(Vector3::new(0.0, 0.0, -0.1))).unwrap();
        assert!(tips.iter().all(|t| t.angle.is_none()));
        let tips = tip_edges(&s, &mut |_| Ok(Vector3::new(0.0, 0.5, 1.0))).unwrap();
        assert_eq!(tips.iter().filter(|t| t.angle == Some(0.0)).count(), 1);
    }

    /// Centre of the liquid in a box tank `width` wide (y), `depth` deep on average, its bottom at
    /// `bottom`, when the surface slopes by `slope` against y: the wedge of a trapezium, or of a
    /// triangle once the surface reaches the floor or the top. By exact polygon clipping.
    fn liquid(
        width: f64,
        height: f64,
        depth: f64,
        bottom: f64,
        down: &Vector3<f64>,
    ) -> Vector3<f64> {
        let area = width * depth;
        let n = [-down.y, -down.z];
        let rim = [
            [-width / 2.0, bottom],
            [width / 2.0, bottom],
            [width / 2.0, bottom + height],
            [-width / 2.0, bottom + height],
        ];
        let cut = |level: f64| -> (f64, [f64; 2]) {
            let mut poly = Vec::new();
            for i in 0..4 {
                let (p, q): ([f64; 2], [f64; 2]) = (rim[i], rim[(i + 1) % 4]);
                let side = |r: [f64; 2]| n[0] * r[0] + n[1] * r[1] - level;
                let (a, b) = (side(p), side(q));
                if a <= 0.0 {
                    poly.push(p);
                }
                if (a < 0.0 && b > 0.0) || (a > 0.0 && b < 0.0) {
                    let t = a / (a - b);
                    poly.push([p[0] + t * (q[0] - p[0]), p[1] + t * (q[1] - p[1])]);
                }
            }
            let (mut sum, mut c) = (0.0, [0.0; 2]);
            for i in 0..poly.len() {
                let (p, q) = (poly[i], poly[(i + 1) % poly.len()]);
                let w = (p[0] * q[1] - p[1] * q[0]) / 2.0;
                sum += w;
                c[0] += w * (p[0] + q[0]) / 3.0;
                c[1] += w * (p[1] + q[1]) / 3.0;
            }
            (sum, [c[0] / sum, c[1] / sum])
        };
        let (mut lo, mut hi) = (-10.0, 10.0);
        for _ in 0..200 {
            let mid = 0.5 * (lo + hi);
            if cut(mid).0 < area {
                lo = mid
            } else {
                hi = mid
            }
        }
        let (_, c) = cut(hi);
        Vector3::new(0.0, c[0], c[1])
    }

    #[test]
    fn a_liquid_that_levels_anew_tips_the_sprayer_earlier() {
        // Dry 120 kg centred 0.5 m high, wheels 0.45 m either side, tank 0.8 m wide, 0.5 m long,
        // 0.8 m high with its bottom at 0.3 m, 160 kg of water (0.4 m deep): 36.97196065°, against
        // 41.98721250° for a frozen surface (worked out apart, to the digits shown).
        let s = wheels();
        let whole = |down: &Vector3<f64>| {
            let wet = liquid(0.8, 0.8, 0.4, 0.3, down);
            (Vector3::new(0.0, 0.0, 0.5) * 120.0 + wet * 160.0) / 280.0
        };
        let order = s.edges();
        let side = order.iter().position(|e| e.outward.y > 0.9).unwrap();
        let tips = tip_edges(&s, &mut |d| Ok(whole(d))).unwrap();
        let got = tips[side].angle.unwrap().to_degrees();
        assert!((got - 36.971_960_65).abs() < 5e-9, "{got}");
        let frozen = whole(&-Vector3::z());
        let tips = tip_edges(&s, &mut |_| Ok(frozen)).unwrap();
        let got = tips[side].angle.unwrap().to_degrees();
        assert!((got - 41.987_212_50).abs() < 5e-9, "{got}");
        let towards = tip_towards(&s, &Vector3::y(), &mut |d| Ok(whole(d)))
            .unwrap()
            .unwrap();
        assert!((towards.to_degrees() - 36.971_960_65).abs() < 5e-9);
    }

    #[test]
    fn a_dip_narrower_than_a_step_is_found() {
        let mut f = |x: f64| Ok((x - 0.7003).powi(2) - 1e-8);
        let got = first_crossing(&mut f).unwrap().unwrap();
        assert!((got - (0.7003 - 1e-4)).abs() < 1e-12, "{got}");
    }

    proptest! {
        /// The least slope over a sweep of directions is the least over the edges, and each
        /// direction's is that of the closed form.
        #[test]
        fn edges_and_directions_agree(x in -0.4..0.4f64, y in -0.4..0.4f64, h in 0.1..2.0f64, lift in prop_oneof![Just(0.0), -0.2..0.2f64]) {
            // Feet in one plane that leans against gravity.
            let feet: Vec<[f64; 3]> = [[-0.5, -0.45], [0.5, -0.5], [0.6, 0.45], [-0.5, 0.5]]
                .iter().map(|p| [p[0], p[1], lift * p[0]]).collect();
            let s = stand(&feet);
            let c = Vector3::new(x, y, h + lift * x);
            let tips = tip_edges(&s, &mut |_| Ok(c)).unwrap();
            let least = tips.iter().filter_map(|t| t.angle).fold(f64::INFINITY, f64::min);
            for k in 0..36 {
                let a = f64::from(k) * 10f64.to_radians();
                let u = Vector3::new(a.cos(), a.sin(), 0.0);
                let got = tip_towards(&s, &u, &mut |_| Ok(c)).unwrap();
                let want = s.edges().iter().map(|e| e.angle(&u, &c))
                    .filter(|a| *a >= 0.0).fold(f64::INFINITY, f64::min);
                if let Some(got) = got {
                    prop_assert!((got - want).abs() < 1e-9, "{got} {want}");
                    // On feet that lean against gravity an oblique lean may be the worst.
                    prop_assert!(lift != 0.0 || got >= least - 1e-12);
                } else {
                    prop_assert!(want > 1.5);
                }
            }
        }
    }
}
