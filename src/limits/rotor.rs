//! A rotor, its unbalance in two planes, and what of it is permitted.

use std::f64::consts::PI;

use nalgebra::{Matrix3, Vector3};

use super::measured::{Axis, Gradient};
use crate::moments::Moments;

/// Of what is permitted in all, each plane gets at least and at most this (common practice).
const SHARE: [f64; 2] = [0.3, 0.7];

/// One of the two planes that unbalance is given in.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Plane {
    /// The first.
    A,
    /// The second.
    B,
}

/// A rigid rotor: its axis, two planes across it, its speed and its balance quality grade.
#[derive(Clone, Debug, PartialEq)]
pub struct Rotor {
    /// Of rotation.
    pub axis: Axis,
    /// Where the planes cut it, m along it from `axis.at`; not in one place.
    pub planes: [f64; 2],
    /// rad/s, above 0.
    pub speed: f64,
    /// Balance quality grade G as the product of permissible eccentricity and speed, m/s: G 6.3
    /// is 0.0063.
    pub grade: f64,
}

/// What ISO 21940-11 permits in all (after its formula; the standard itself was not seen):
/// U = G·m/ω, in kg m, for a grade in m/s, a mass in kg and a speed in rad/s.
pub fn permissible_unbalance(grade: f64, mass: f64, speed: f64) -> f64 {
    grade * mass / speed
}

/// rad/s of revolutions per minute.
pub fn rad_per_s(rpm: f64) -> f64 {
    rpm * PI / 30.0
}

impl Rotor {
    fn gap(&self) -> f64 {
        self.planes[1] - self.planes[0]
    }

    /// The form (k, s) of a plane: U = (s·D − k·F)/gap with F the first moment across the axis and
    /// D the moment of it along the axis. Both planes together give F, and its moment D.
    fn form(&self, plane: Plane) -> (f64, f64) {
        match plane {
            Plane::A => (-self.planes[1], -1.0),
            Plane::B => (self.planes[0], 1.0),
        }
    }

    /// The unbalance in a plane that has the effect of this whole, kg m, a vector across the axis.
    pub fn unbalance(&self, m: &Moments, plane: Plane) -> Vector3<f64> {
        let here = m.shifted(self.axis.at);
        let a = self.axis.along;
        let flat = |v: Vector3<f64>| v - a * a.dot(&v);
        let (k, s) = self.form(plane);
        (flat(here.second * a) * s - flat(here.first) * k) / self.gap()
    }

    /// The share of what is permitted in all that falls to a plane: as its lever arm from the
    /// centre, kept within 0.3 and 0.7. The second value is the share unkept.
    pub fn share(&self, centre: &Vector3<f64>, plane: Plane) -> (f64, f64) {
        let z = self.axis.along.dot(&(centre - self.axis.at));
        let a = (self.planes[1] - z) / self.gap();
        let free = match plane {
            Plane::A => a,
            Plane::B => 1.0 - a,
        };
        (free.clamp(SHARE[0], SHARE[1]), free)
    }

    /// What is permitted in a plane, kg m.
    pub fn permitted(&self, m: &Moments, plane: Plane) -> f64 {
        let centre = m.centre().unwrap_or(m.about);
        permissible_unbalance(self.grade, m.zeroth, self.speed) * self.share(&centre, plane).0
    }

    pub(super) fn gradient(&self, m: &Moments, c: Vector3<f64>, plane: Plane) -> Gradient {
        let u = self.unbalance(m, plane);
        let size = u.norm();
        if size == 0.0 {
            return Gradient::none(c);
        }
        // n stands across the axis, so n·flat(v) = n·v.
        let n = u / size;
        let a = self.axis.along;
        let (k, sign) = self.form(plane);
        let g: Matrix3<f64> = (n * a.transpose() + a * n.transpose()) * (0.5 * sign / self.gap());
        let s = c - self.axis.at;
        let mut out = Gradient::about_point(c, s, g);
        out.zeroth -= k * n.dot(&s) / self.gap();
        out.first -= n * (k / self.gap());
        out
    }

    pub(super) fn permitted_gradient(
        &self,
        m: &Moments,
        c: Vector3<f64>,
        plane: Plane,
    ) -> Gradient {
        let e = permissible_unbalance(self.grade, 1.0, self.speed);
        let (kept, free) = self.share(&c, plane);
        let mut out = Gradient::none(c);
        out.zeroth = e * kept;
        if kept == free {
            // Share·mass is linear in mass and first moment.
            let slope = match plane {
                Plane::A => -1.0,
                Plane::B => 1.0,
            };
            out.first = self.axis.along * (e * slope / self.gap());
        }
        debug_assert!(m.zeroth.is_finite());
        out
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn published_permissible_unbalance() {
        // U = 60000/2π·G·m/n in g·mm: G 6.3, 100 kg, 3000 rpm and G 2.5, 10 kg, 15000 rpm; figures
        // quoted by others, worked out again.
        let g_mm = |g: f64, m: f64, n: f64| permissible_unbalance(g * 1e-3, m, rad_per_s(n)) * 1e6;
        assert!((g_mm(6.3, 100.0, 3000.0) - 2005.352).abs() < 5e-4);
        assert!((g_mm(2.5, 10.0, 15000.0) - 15.9155).abs() < 5e-5);
        // The rounded constant 9549 would be 3.1e-5 low.
        assert!((9549.0 * 6.3 * 100.0 / 3000.0 - g_mm(6.3, 100.0, 3000.0)).abs() > 0.05);
    }

    #[test]
    fn the_lever_rule_shares() {
        // U_A = U·L_B/L; kept within 30 to 70 per cent.
        let rotor = |z: f64| {
            let r = Rotor {
                axis: Axis {
                    at: Vector3::zeros(),
                    along: Vector3::z(),
                },
                planes: [0.0, 0.5],
                speed: 100.0,
                grade: 0.0063,
            };
            let c = Vector3::new(0.0, 0.0, z);
            (r.share(&c, Plane::A).0, r.share(&c, Plane::B).0)
        };
        let near = |got: (f64, f64), a: f64| {
            assert!(
                (got.0 - a).abs() < 1e-15 && (got.1 - (1.0 - a)).abs() < 1e-15,
                "{got:?}"
            )
        };
        near(rotor(0.2), 0.6);
        near(rotor(0.05), 0.7);
        near(rotor(0.9), 0.3);
    }

    #[test]
    fn a_mass_in_a_plane_is_that_plane_s_unbalance() {
        let r = Rotor {
            axis: Axis {
                at: Vector3::new(1.0, 2.0, 3.0),
                along: Vector3::x(),
            },
            planes: [0.1, 0.6],
            speed: 100.0,
            grade: 0.0063,
        };
        let m = Moments::point(Vector3::new(1.1, 2.02, 3.0), 0.5);
        assert!((r.unbalance(&m, Plane::A) - Vector3::new(0.0, 0.01, 0.0)).norm() < 1e-15);
        assert!(r.unbalance(&m, Plane::B).norm() < 1e-15);
        // In the middle each plane gets half.
        let m = Moments::point(Vector3::new(1.35, 2.0, 3.01), 2.0);
        for p in [Plane::A, Plane::B] {
            assert!((r.unbalance(&m, p) - Vector3::new(0.0, 0.0, 0.01)).norm() < 1e-15);
        }
    }
}
