//! Attraction of a homogeneous polyhedron at a point: Werner and Scheeres, "Exterior gravitation of
//! a polyhedron derived and compared with harmonic and mascon gravitation representations of
//! asteroid 4769 Castalia", Celest. Mech. Dyn. Astron. 65 (1996).
//!
//! With r the vectors from the point to the corners, n the outward normal of a facet, m the outward
//! normal of a facet's edge within the facet's plane, L = ln((a+b+e)/(a+b−e)) of an edge of length e
//! whose ends lie a and b away, and ω the solid angle of a facet:
//!
//! ```text
//! g = Gρ (−Σ_edges of facets n (m·r) L + Σ_facets n (n·r) ω)
//! Laplacian = −Gρ Σ ω
//! ```
//!
//! Each facet brings its own half of an edge's dyad, so that no table of edges is needed; over a
//! closed surface the halves meet. In this form a facet's term is a potential of its own plane sheet
//! and stays finite on edges: there a+b−e → 0 while (m·r) → 0 faster than L grows.
//!
//! Each term is of the size of the body while the sum falls with the square of the distance: at r
//! sizes away about r² of the digits cancel. From twenty sizes on the attraction is therefore
//! integrated directly, by a product rule exact to degree 13 on the tetrahedra over the facets, whose
//! remainder is below (1/20)^14 there.

use nalgebra::Vector3;

use crate::geometry::cubature::{Rule, tetrahedron};
use crate::geometry::eft::Sum;

/// Attraction at a point, m/s² where Gρ is in 1/s² and lengths in m; and the Laplacian of the
/// potential, −4πGρ inside the body and 0 outside.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Attraction {
    /// Points toward the body.
    pub acceleration: Vector3<f64>,
    /// 1/s².
    pub laplacian: f64,
}

/// How many half-diagonals away the closed form gives way to integration.
const FAR: f64 = 20.0;

/// Attraction at `p` of the solid that closed, outward `facets` bound.
pub fn attraction(facets: &[[[f64; 3]; 3]], g_rho: f64, p: &Vector3<f64>) -> Attraction {
    let (lo, hi) = facets.iter().flatten().fold(
        (
            Vector3::repeat(f64::INFINITY),
            Vector3::repeat(f64::NEG_INFINITY),
        ),
        |(lo, hi), q| {
            let q = Vector3::from(*q);
            (lo.inf(&q), hi.sup(&q))
        },
    );
    if facets.is_empty() {
        return Attraction {
            acceleration: Vector3::zeros(),
            laplacian: 0.0,
        };
    }
    let (middle, half) = ((lo + hi) / 2.0, (hi - lo).norm() / 2.0);
    if (p - middle).norm() > FAR * half {
        return far(facets, g_rho, p, &middle);
    }
    let mut g = [Sum::ZERO; 3];
    let mut angle = Sum::ZERO;
    for t in facets {
        let r = t.map(|q| Vector3::from(q) - p);
        let normal = (r[1] - r[0]).cross(&(r[2] - r[0]));
        let size = normal.norm();
        // No area, nothing to attract.
        if size == 0.0 {
            continue;
        }
        let n = normal / size;
        let d = r.map(|v| v.norm());
        let height = n.dot(&r[0]);
        let mut terms = 0.0;
        for k in 0..3 {
            let l = (k + 1) % 3;
            let edge = r[l] - r[k];
            let e = edge.norm();
            let m = edge.cross(&n) / e;
            let across = m.dot(&r[k]);
            let long = d[k] + d[l];
            // a + b − e without cancellation near the edge's line: with q the foot's distance,
            // (a+b)² − e² = 2(ab + a·b).
            let short = 2.0 * (d[k] * d[l] + r[k].dot(&r[l])) / (long + e);
            if short > 0.0 && across != 0.0 {
                terms += across * ((long + e) / short).ln();
            }
        }
        let below = d[0] * d[1] * d[2]
            + r[0].dot(&r[1]) * d[2]
            + r[1].dot(&r[2]) * d[0]
            + r[2].dot(&r[0]) * d[1];
        // Solid angle after Van Oosterom and Strackee (1983); 0 in the facet's own plane.
        let omega = if height == 0.0 {
            0.0
        } else {
            2.0 * r[0].dot(&r[1].cross(&r[2])).atan2(below)
        };
        angle.add(omega);
        for k in 0..3 {
            g[k].add(n[k] * (height * omega - terms));
        }
    }
    Attraction {
        acceleration: Vector3::from(g.map(Sum::value)) * g_rho,
        laplacian: -g_rho * angle.value(),
    }
}

fn far(
    facets: &[[[f64; 3]; 3]],
    g_rho: f64,
    p: &Vector3<f64>,
    middle: &Vector3<f64>,
) -> Attraction {
    let rule = Rule::new(8);
    let mut g = [Sum::ZERO; 3];
    for t in facets {
        let corners = t.map(Vector3::from);
        tetrahedron(&rule, middle, &corners, &mut |x, weight| {
            let r = x - p;
            let k = weight / r.norm().powi(3);
            (0..3).for_each(|i| g[i].add(r[i] * k));
        });
    }
    Attraction {
        acceleration: Vector3::from(g.map(Sum::value)) * g_rho,
        laplacian: 0.0,
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use std::f64::consts::PI;

    fn cube() -> Vec<[[f64; 3]; 3]> {
        crate::geometry::box_facets([-0.5; 3], [0.5; 3])
    }

    /// REFERENCE: unit cube, Gρ = 1 (polyhedron formula and 40³-point quadrature, computed there).
    #[test]
    fn a_cube_attracts_as_computed_independently() {
        for (p, want) in [
            ([1.0, 0.0, 0.0], [-0.942997762193, 0.0, 0.0]),
            ([1.0, 1.0, 1.0], [-0.193634119662; 3]),
        ] {
            let a = attraction(&cube(), 1.0, &Vector3::from(p));
            let off = a.acceleration - Vector3::from(want);
            // The figures are given to 12 places.
            assert!(off.norm() < 2e-12, "{p:?}: {a:?}");
            assert!(a.laplacian.abs() < 1e-12, "{a:?}");
        }
        for (p, want) in [
            ([2.0, 0.0, 0.0], 0.499557801137),
            ([3.0, 2.0, 1.0], 0.267266196387),
            ([0.0, 0.0, 10.0], 0.099999854317),
            ([1.0, 0.0, 0.0], 0.987592404174),
            ([1.0, 1.0, 1.0], 0.578034334235),
        ] {
            // The potential has those values; its slope is the attraction. Fourth-order central
            // differences along the ray, integrated back to infinity, would only repeat the formula:
            // the potential is checked through its own closed form below.
            let v = potential(&cube(), &Vector3::from(p));
            assert!((v - want).abs() < 2e-12, "{p:?}: {v}");
        }
        let corner = potential(&cube(), &Vector3::repeat(0.5));
        assert!((corner - 1.190_038_681_989_776_8).abs() < 1e-14, "{corner}");
        let centre = potential(&cube(), &Vector3::zeros());
        assert!((centre - 2.380_077_363_979_553_5).abs() < 1e-14, "{centre}");
    }

    /// U = ½ Σ n·r (m·r L) − ½ Σ (n·r)² ω, from the same terms: −2U is the sum of r·(its dyads).
    fn potential(facets: &[[[f64; 3]; 3]], p: &Vector3<f64>) -> f64 {
        let mut sum = Sum::ZERO;
        for t in facets {
            // One facet alone: its dyads give g = n·c, and r·n is its height.
            let a = attraction(std::slice::from_ref(t), 1.0, p).acceleration;
            let r = Vector3::from(t[0]) - p;
            sum.add(-0.5 * a.dot(&r));
        }
        sum.value()
    }

    #[test]
    fn the_laplacian_tells_inside_from_outside() {
        for p in [[0.0; 3], [0.49, -0.3, 0.2], [0.499999, 0.499999, 0.499999]] {
            let a = attraction(&cube(), 1.0, &Vector3::from(p));
            assert!((a.laplacian + 4.0 * PI).abs() < 4.0 * PI * 1e-9, "{a:?}");
        }
        for p in [
            [0.6, 0.0, 0.0],
            [0.500001, 0.500001, 0.500001],
            [3.0, 4.0, 5.0],
        ] {
            let a = attraction(&cube(), 1.0, &Vector3::from(p));
            assert!(a.laplacian.abs() < 4.0 * PI * 1e-9, "{a:?}");
        }
    }

    /// On edges, corners and faces the field is finite and continuous.
    #[test]
    fn edges_and_corners_are_harmless() {
        for p in [
            [0.5, 0.5, 0.0],
            [0.5, 0.5, 0.5],
            [0.5, 0.0, 0.0],
            [0.5, 0.2, 0.2],
            [0.5, 0.5, 2.0],
        ] {
            let p = Vector3::from(p);
            let on = attraction(&cube(), 1.0, &p).acceleration;
            assert!(on.iter().all(|x| x.is_finite()), "{p}: {on}");
            for step in [[1e-9, 0.0, 0.0], [-1e-9, 0.0, 1e-9], [0.0, 1e-9, -1e-9]] {
                let off = attraction(&cube(), 1.0, &(p + Vector3::from(step))).acceleration;
                // The slope of g is at most a few Gρ times a logarithm of the distance.
                assert!((on - off).norm() < 3e-7, "{p}: {on} {off}");
            }
        }
    }

    /// Where the two ways meet they agree, and far away the body is its mass.
    #[test]
    fn the_far_way_takes_over_without_a_step() {
        let half = 0.75f64.sqrt();
        let along = Vector3::new(0.6, 0.64, 0.48);
        let near = attraction(&cube(), 1.0, &(along * (19.999 * half))).acceleration;
        let far = attraction(&cube(), 1.0, &(along * (20.001 * half))).acceleration;
        let ratio = near.norm() / far.norm();
        let want = (20.001f64 / 19.999).powi(2);
        assert!((ratio - want).abs() < 1e-9, "{ratio} {want}");
        let p = along * 1e6;
        let g = attraction(&cube(), 1.0, &p).acceleration;
        assert!((g + along * 1e-12).norm() < 1e-26, "{g}");
    }
}
