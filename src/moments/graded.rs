//! A solid whose density varies along an axis, by a polynomial up to degree 2.
//!
//! With density c₀ + c₁t + c₂t², t = axis·x, the moments are integrals of polynomials up to degree 4
//! over the signed tetrahedra of the surface. The product rule of four points a direction is exact to
//! degree 5 there (Gauss–Legendre on the cube collapsed into the tetrahedron), so that nothing but
//! rounding is lost. All weights are positive: nothing cancels within a tetrahedron.

use nalgebra::{Matrix3, Vector3};

use super::Moments;
use crate::geometry::cubature::{Rule, tetrahedron};
use crate::geometry::eft::Sum;

/// A density that varies along an axis.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Grading {
    /// Unit vector.
    pub axis: Vector3<f64>,
    /// Where t = 0, along the axis from the origin.
    pub from: f64,
    /// Density at t = 0, then its coefficients by t and t².
    pub coefficients: [f64; 3],
}

impl Grading {
    /// The polynomial through two or three (station, density) pairs; none where two stations are
    /// the same.
    pub fn through(axis: Vector3<f64>, points: &[(f64, f64)]) -> Option<Self> {
        let (from, first) = *points.first()?;
        // Newton's divided differences, about the first station.
        let slope = |a: (f64, f64), b: (f64, f64)| (b.1 - a.1) / (b.0 - a.0);
        let coefficients = match *points {
            [_] => [first, 0.0, 0.0],
            [a, b] => [first, slope(a, b), 0.0],
            [a, b, c] => {
                let (one, two) = (slope(a, b), slope(b, c));
                let bend = (two - one) / (c.0 - a.0);
                [first, one - bend * (b.0 - a.0), bend]
            }
            _ => return None,
        };
        coefficients.iter().all(|c| c.is_finite()).then_some(Self {
            axis,
            from,
            coefficients,
        })
    }

    /// The density at a station along the axis.
    pub fn at(&self, station: f64) -> f64 {
        let t = station - self.from;
        let [a, b, c] = self.coefficients;
        a + t * (b + t * c)
    }

    /// The least density between two stations.
    pub fn least(&self, lo: f64, hi: f64) -> f64 {
        let [_, b, c] = self.coefficients;
        let ends = self.at(lo).min(self.at(hi));
        let turning = self.from - b / (2.0 * c);
        if turning > lo && turning < hi {
            ends.min(self.at(turning))
        } else {
            ends
        }
    }

    /// Mass moments of the solid that closed, outward `facets` bound, about `apex`.
    pub fn integrate(&self, facets: &[[[f64; 3]; 3]], apex: Vector3<f64>) -> Moments {
        let rule = Rule::new(4);
        let mut zeroth = Sum::ZERO;
        let mut first = [Sum::ZERO; 3];
        let mut second = [Sum::ZERO; 6];
        const PAIRS: [(usize, usize); 6] = [(0, 0), (1, 1), (2, 2), (0, 1), (0, 2), (1, 2)];
        let from = self.from - self.axis.dot(&apex);
        let about = Vector3::zeros();
        for t in facets {
            let corners = t.map(|p| Vector3::from(p) - apex);
            tetrahedron(&rule, &about, &corners, &mut |d, volume| {
                let along = self.axis.dot(&d) - from;
                let [a, b, c] = self.coefficients;
                let w = volume * (a + along * (b + along * c));
                zeroth.add(w);
                (0..3).for_each(|k| first[k].add(w * d[k]));
                for (sum, (i, j)) in second.iter_mut().zip(PAIRS) {
                    sum.add(w * d[i] * d[j]);
                }
            });
        }
        let v = second.map(Sum::value);
        Moments {
            about: apex,
            zeroth: zeroth.value(),
            first: Vector3::from(first.map(Sum::value)),
            second: Matrix3::new(v[0], v[3], v[4], v[3], v[1], v[5], v[4], v[5], v[2]),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::geometry::box_facets;

    /// A bar along x from 0 to 4, density 2 + 3x + 0.5x²: ∫ρ, ∫ρx, ∫ρx² by hand (textbook
    /// integrals), times its section of 1 by 2.
    #[test]
    fn a_bar_by_hand_also_turned_and_far_away() {
        let l: f64 = 4.0;
        let m = |n: i32| {
            2.0 * l.powi(n + 1) / f64::from(n + 1)
                + 3.0 * l.powi(n + 2) / f64::from(n + 2)
                + 0.5 * l.powi(n + 3) / f64::from(n + 3)
        };
        let points = [0.0, 1.0, 4.0].map(|x| (x, 2.0 + 3.0 * x + 0.5 * x * x));
        for far in [0.0, 1e6] {
            let points = points.map(|(x, d)| (x + far, d));
            let g = Grading::through(Vector3::x(), &points).unwrap();
            assert!((g.at(2.0 + far) - 10.0).abs() < 1e-8);
            let bar = box_facets([far, -0.5, -1.0], [far + l, 0.5, 1.0]);
            let apex = Vector3::new(far, 0.0, 0.0);
            let got = g.integrate(&bar, apex);
            let mass = 2.0 * m(0);
            assert!((got.zeroth - mass).abs() < 1e-13 * mass, "{got:?}");
            assert!((got.first.x - 2.0 * m(1)).abs() < 1e-13 * 2.0 * m(1));
            assert!((got.second[(0, 0)] - 2.0 * m(2)).abs() < 1e-13 * 2.0 * m(2));
            assert!((got.second[(1, 1)] - mass / 12.0).abs() < 1e-13 * mass);
            assert!((got.second[(2, 2)] - mass / 3.0).abs() < 1e-13 * mass);
            assert!(got.first.y.abs() < 1e-12 && got.second[(0, 1)].abs() < 1e-12);
            // From another apex the same solid.
            let other = g.integrate(&bar, apex + Vector3::new(7.0, -3.0, 2.0));
            assert!((other.zeroth - mass).abs() < 1e-12 * mass);
        }
    }

    #[test]
    fn the_least_density_may_lie_between() {
        let g = Grading::through(Vector3::z(), &[(0.0, 2.0), (1.0, 1.0), (2.0, 2.0)]).unwrap();
        assert_eq!(g.least(0.0, 2.0), 1.0);
        assert_eq!(g.least(1.5, 2.0), g.at(1.5));
        let even = Grading::through(Vector3::z(), &[(0.0, 2.0), (1.0, 3.0)]).unwrap();
        assert_eq!(even.least(-1.0, 1.0), 1.0);
        assert_eq!(
            Grading::through(Vector3::z(), &[(1.0, 2.0), (1.0, 3.0)]),
            None
        );
    }
}
