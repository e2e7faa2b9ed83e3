//! Signed distance from a closed surface.
//!
//! The nearest point of a triangle after Ericson, "Real-Time Collision Detection" (2005), 5.1.5;
//! the side by the angle-weighted normal of the nearest feature, after Baerentzen and Aanaes,
//! "Signed distance computation using the angle weighted pseudonormal", IEEE Transactions on
//! Visualization and Computer Graphics 11(3), 2005 (both from memory). The feature's facets are
//! those whose nearest points are one, so that no adjacency is kept.

use nalgebra::Vector3;

use crate::geometry::{BoxTree, Corners, Point, Select};

/// Squared distances and places that are one up to rounding: some hundred units in the last place.
const SAME: f64 = 1e-13;

/// A closed surface that answers how far points are from it.
pub(super) struct Surface<'a, C> {
    facets: &'a C,
    tree: BoxTree,
    /// Length below which two places are one.
    same: f64,
}

/// The surface seen from a point.
#[derive(Clone, Copy, Debug)]
pub(super) struct Sight {
    /// Distance, positive inside the solid.
    pub(super) depth: f64,
    /// Unit vector along which the depth grows.
    pub(super) inward: Vector3<f64>,
}

impl<'a, C: Corners> Surface<'a, C> {
    /// `facets` face outward; `extent` is the size of their box.
    pub(super) fn new(facets: &'a C, extent: f64) -> Self {
        Self {
            facets,
            tree: BoxTree::new(facets, Select::All),
            same: extent * 1e-12,
        }
    }

    /// The nearest point of the surface, which must hold a facet; it is known to be within `bound`.
    pub(super) fn from(&self, x: &Vector3<f64>, bound: f64) -> Sight {
        let slack = |d: f64| d * (1.0 + SAME) + self.same * self.same;
        let mut best = f64::INFINITY;
        let mut near: Vec<(f64, Vector3<f64>, Vector3<f64>)> = Vec::new();
        let start = (bound * (1.0 + 1e-9) + self.same).powi(2);
        self.tree
            .near(self.facets, &(*x).into(), start, |_, corners| {
                let (place, angle) = nearest_on(x, corners);
                let d = (x - place).norm_squared();
                if d < best {
                    if slack(d) < best {
                        near.retain(|n| n.0 <= slack(d));
                    }
                    best = d;
                }
                if d <= slack(best) {
                    near.push((d, place, normal(corners) * angle));
                }
                slack(best).min(start)
            });
        let Some((d, place, _)) = near
            .iter()
            .copied()
            .min_by(|a, b| a.0.total_cmp(&b.0).then_with(|| order(&a.1, &b.1)))
        else {
            // No facet within the bound: as far as the bound says, and outside.
            return Sight {
                depth: -bound,
                inward: Vector3::zeros(),
            };
        };
        // Summed in an order of their own: facets come as the tree holds them.
        let outward: Vector3<f64> = near
            .iter()
            .filter(|n| (n.1 - place).norm() <= self.same)
            .map(|n| n.2)
            .sum();
        let away = x - place;
        let distance = d.sqrt();
        let inside = away.dot(&outward) < 0.0;
        let depth = if inside { distance } else { -distance };
        let inward = if distance > self.same {
            away / depth
        } else {
            -outward.normalize()
        };
        Sight { depth, inward }
    }
}

fn order(a: &Vector3<f64>, b: &Vector3<f64>) -> std::cmp::Ordering {
    a.iter()
        .zip(b)
        .map(|(x, y)| x.total_cmp(y))
        .find(|o| o.is_ne())
        .unwrap_or(std::cmp::Ordering::Equal)
}

/// Unit normal; zero for a facet without area.
fn normal([a, b, c]: &[Point; 3]) -> Vector3<f64> {
    let [a, b, c] = [a, b, c].map(|p| Vector3::from(*p));
    let n = (b - a).cross(&(c - a));
    n.try_normalize(0.0).unwrap_or_else(Vector3::zeros)
}

/// The nearest point of a triangle and the angle that the triangle takes up around it.
fn nearest_on(x: &Vector3<f64>, corners: &[Point; 3]) -> (Vector3<f64>, f64) {
    use std::f64::consts::{PI, TAU};
    let [a, b, c] = corners.map(Vector3::from);
    let at = |p: Vector3<f64>, q: Vector3<f64>, r: Vector3<f64>| {
        let (u, v) = (q - p, r - p);
        u.cross(&v).norm().atan2(u.dot(&v))
    };
    let (ab, ac, ap) = (b - a, c - a, x - a);
    let (d1, d2) = (ab.dot(&ap), ac.dot(&ap));
    if d1 <= 0.0 && d2 <= 0.0 {
        return (a, at(a, b, c));
    }
    let bp = x - b;
    let (d3, d4) = (ab.dot(&bp), ac.dot(&bp));
    if d3 >= 0.0 && d4 <= d3 {
        return (b, at(b, c, a));
    }
    let vc = d1 * d4 - d3 * d2;
    if vc <= 0.0 && d1 >= 0.0 && d3 <= 0.0 && d1 > d3 {
        return (a + ab * (d1 / (d1 - d3)), PI);
    }
    let cp = x - c;
    let (d5, d6) = (ab.dot(&cp), ac.dot(&cp));
    if d6 >= 0.0 && d5 <= d6 {
        return (c, at(c, a, b));
    }
    let vb = d5 * d2 - d1 * d6;
    if vb <= 0.0 && d2 >= 0.0 && d6 <= 0.0 && d2 > d6 {
        return (a + ac * (d2 / (d2 - d6)), PI);
    }
    let va = d3 * d6 - d5 * d4;
    if va <= 0.0 && d4 - d3 >= 0.0 && d5 - d6 >= 0.0 && (d4 - d3) + (d5 - d6) > 0.0 {
        let w = (d4 - d3) / ((d4 - d3) + (d5 - d6));
        return (b + (c - b) * w, PI);
    }
    let all = va + vb + vc;
    if all > 0.0 {
        (a + ab * (vb / all) + ac * (vc / all), TAU)
    } else {
        (a, at(a, b, c))
    }
}

#[cfg(test)]
mod tests {
    use super::super::tests::{cuboid, sphere};
    use super::*;
    use crate::geometry::LooseFacets;
    use proptest::prelude::*;

    proptest! {
        #[test]
        fn a_box_has_its_signed_distance(p in prop::array::uniform3(-3.0..6.0_f64)) {
            let sides = [3.0, 2.0, 4.0];
            let facets = cuboid([0.0; 3], sides);
            let f = LooseFacets(&facets);
            let got = Surface::new(&f, 4.0).from(&Vector3::from(p), f64::INFINITY);
            // Closed form (textbook): outside the distance to the clamped point.
            let out: f64 = (0..3)
                .map(|k| (p[k] - p[k].clamp(0.0, sides[k])).powi(2))
                .sum();
            let within = (0..3).map(|k| p[k].min(sides[k] - p[k])).fold(f64::INFINITY, f64::min);
            let want = if out > 0.0 { -out.sqrt() } else { within };
            prop_assert!((got.depth - want).abs() < 1e-12, "{} {}", got.depth, want);
            // The depth grows by the step along the direction given.
            let on = Vector3::from(p) + got.inward * 1e-4;
            let further = Surface::new(&f, 4.0).from(&on, f64::INFINITY);
            prop_assert!(further.depth >= got.depth - 1e-12);
        }

        #[test]
        fn the_side_is_right_near_corners_of_a_sphere(
            d in prop::array::uniform3(-1.0..1.0_f64), r in 0.3..2.0_f64,
        ) {
            let d = Vector3::from(d);
            prop_assume!(d.norm() > 0.1);
            // Facets of 12 rings lie between 0.96 and 1 of the radius.
            prop_assume!(!(0.95..1.0).contains(&r));
            let facets = sphere(1.0, 12, [0.0; 3]);
            let f = LooseFacets(&facets);
            let sight = Surface::new(&f, 2.0).from(&(d.normalize() * r), f64::INFINITY);
            prop_assert_eq!(sight.depth > 0.0, r < 1.0);
        }
    }
}
