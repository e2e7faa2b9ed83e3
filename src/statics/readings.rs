//! Mass and centre from loads that were measured at supports.

use nalgebra::{DMatrix, DVector, Matrix3, Vector3};

use super::{across, nnls};
use crate::error::{Error, Kind, Result};

/// What the scale under a support showed.
#[derive(Clone, Debug, PartialEq)]
pub struct Load {
    /// Where it stands, m, in the thing's frame.
    pub at: Vector3<f64>,
    /// kg.
    pub mass: f64,
    /// Its standard uncertainty, kg.
    pub standard: f64,
}

/// One weighing: the thing on all its scales, still, in one attitude.
#[derive(Clone, Debug, PartialEq)]
pub struct Attitude {
    /// Against gravity, in the thing's frame.
    pub up: Vector3<f64>,
    /// One load a support.
    pub loads: Vec<Load>,
}

/// What weighings say.
#[derive(Clone, Debug, PartialEq)]
pub struct Weighing {
    /// kg.
    pub mass: f64,
    /// Standard uncertainty, kg.
    pub mass_standard: f64,
    /// A point that the centre lies on or, where `free` is `None`, the centre, m.
    pub centre: Vector3<f64>,
    /// Covariance of the centre, m²; nothing along `free`.
    pub centre_covariance: Matrix3<f64>,
    /// The direction along which one attitude leaves the centre open: that of gravity.
    pub free: Option<Vector3<f64>>,
    /// How far the weighings disagree among themselves: the sum of squares of what is left over,
    /// each divided by its standard uncertainty (chi-squared); `None` without uncertainties.
    pub chi_squared: Option<f64>,
    /// Degrees of freedom of it: 3 for each attitude beyond the first, less 1 for the height.
    pub freedom: usize,
}

impl Weighing {
    /// What a model disagrees by: mass, kg, and centre, m (the part across `free`), model minus
    /// weighed.
    pub fn disagreement(&self, mass: f64, centre: &Vector3<f64>) -> (f64, Vector3<f64>) {
        let d = centre - self.centre;
        let across = self.free.map_or(d, |f| d - f * f.dot(&d));
        (mass - self.mass, across)
    }
}

/// Mass and centre of a thing from what the scales under its supports show, in one attitude or
/// several.
///
/// In each attitude the loads add to the mass, and their weighted mean lies on the vertical
/// through the centre: two equations each. Two attitudes give the height too. The centre is the
/// weighted least-squares answer; uncertainties are propagated linearly (JCGM 100:2008), loads
/// taken as independent.
///
/// # Errors
/// `usage` for fewer than three loads in an attitude (two leave the centre open across their
/// line), loads that do not add up to anything, or attitudes that are all the same.
pub fn weigh(attitudes: &[Attitude]) -> Result<Weighing> {
    let usage = |message: String, advice: &str| Err(Error::new(Kind::Usage, message, advice));
    if attitudes.is_empty() {
        return usage(
            "no loads were measured".into(),
            "state what each scale showed",
        );
    }
    let (mut rows, mut right, mut sigma) = (Vec::new(), Vec::new(), Vec::new());
    let mut masses = Vec::new();
    let first = attitudes[0]
        .loads
        .first()
        .map_or(Vector3::zeros(), |l| l.at);
    for a in attitudes {
        if a.loads.len() < 3 {
            return usage(
                format!("{} measured loads leave the centre open", a.loads.len()),
                "measure under three supports or more that do not stand in one line",
            );
        }
        let mass: f64 = a.loads.iter().map(|l| l.mass).sum();
        if mass <= 0.0 || !mass.is_finite() {
            return usage(
                "the measured loads add up to nothing".into(),
                "check the readings and their units",
            );
        }
        let variance: f64 = a.loads.iter().map(|l| l.standard * l.standard).sum();
        masses.push((mass, variance));
        let (e, f) = across(&a.up.normalize());
        for d in [e, f] {
            let place = |l: &Load| d.dot(&(l.at - first));
            let mean = a.loads.iter().map(|l| l.mass * place(l)).sum::<f64>() / mass;
            let var: f64 = a
                .loads
                .iter()
                .map(|l| ((place(l) - mean) / mass * l.standard).powi(2))
                .sum();
            rows.push(d);
            right.push(mean);
            sigma.push(var.sqrt());
        }
    }
    // The two coordinates of one attitude share the errors of its loads: their covariance counts.
    let exact = sigma.iter().any(|s| *s <= 0.0);
    let n = rows.len();
    let mut cov = DMatrix::<f64>::zeros(n, n);
    for (k, a) in attitudes.iter().enumerate() {
        let mass = masses[k].0;
        for (i, j) in [(0, 0), (0, 1), (1, 0), (1, 1)] {
            let (p, q) = (2 * k + i, 2 * k + j);
            cov[(p, q)] = a
                .loads
                .iter()
                .map(|l| {
                    let off = |r: usize| (rows[r].dot(&(l.at - first)) - right[r]) / mass;
                    off(p) * off(q) * l.standard * l.standard
                })
                .sum();
        }
    }
    // Whitened by the Cholesky factor, where there are uncertainties; all rows alike where not.
    let a = DMatrix::from_fn(n, 3, |r, c| rows[r][c]);
    let b = DVector::from_vec(right);
    let factor = if exact {
        None
    } else {
        cov.clone().cholesky().map(|c| c.l())
    };
    let (aw, bw) = match &factor {
        Some(l) => (
            l.solve_lower_triangular(&a).unwrap_or_else(|| a.clone()),
            l.solve_lower_triangular(&b).unwrap_or_else(|| b.clone()),
        ),
        None => (a.clone(), b.clone()),
    };
    let svd = a.clone().svd(false, false);
    let rank = svd
        .singular_values
        .iter()
        .filter(|s| **s > 1e-6 * svd.singular_values[0])
        .count();
    let free = (rank < 3).then(|| attitudes[0].up.normalize());
    if free.is_some() && attitudes.len() > 1 {
        return usage(
            "all attitudes are the same, so the height of the centre stays open".into(),
            "tilt the thing for the second weighing, by 10 degrees or more",
        );
    }
    let d = nnls::least_squares(&aw, &bw);
    let inverse = aw.clone().pseudo_inverse(1e-9 * aw.amax());
    let covariance = match (&factor, inverse) {
        (Some(_), Ok(p)) => &p * p.transpose(),
        (None, Ok(p)) => &p * &cov * p.transpose(),
        _ => DMatrix::zeros(3, 3),
    };
    // Masses: the mean weighted by 1/variance.
    let weigh_all = masses.iter().all(|(_, v)| *v > 0.0);
    let weight = |v: f64| if weigh_all { 1.0 / v } else { 1.0 };
    let total: f64 = masses.iter().map(|(_, v)| weight(*v)).sum();
    let mass = masses.iter().map(|(m, v)| m * weight(*v)).sum::<f64>() / total;
    let variance = masses
        .iter()
        .map(|(_, v)| v * weight(*v).powi(2))
        .sum::<f64>()
        / (total * total);
    let left = &aw * &d - &bw;
    let chi = left.norm_squared()
        + masses
            .iter()
            .map(|(m, v)| (m - mass).powi(2) / v)
            .sum::<f64>();
    let mut centre = Vector3::new(d[0], d[1], d[2]);
    if let Some(f) = free {
        centre -= f * f.dot(&centre);
    }
    Ok(Weighing {
        mass,
        mass_standard: variance.sqrt(),
        centre: first + centre,
        centre_covariance: Matrix3::from_fn(|r, c| covariance[(r, c)]),
        free,
        chi_squared: (factor.is_some() && weigh_all).then_some(chi),
        freedom: if free.is_some() {
            0
        } else {
            3 * attitudes.len() - 4
        },
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    fn loads(c: Vector3<f64>, up: Vector3<f64>, mass: f64, standard: f64) -> Attitude {
        // What a thing that stands in this attitude shows: statics run forward.
        let at = [[55.0, 0.0, 0.0], [121.0, -40.0, 0.0], [121.0, 40.0, 0.0]].map(Vector3::from);
        let supports = at.map(|at| super::super::Support {
            name: String::new(),
            at,
        });
        let stand = super::super::Stand::new(supports.to_vec(), up).unwrap();
        let r = stand.reactions(&c, mass);
        Attitude {
            up,
            loads: r
                .reactions
                .iter()
                .zip(at)
                .map(|(r, at)| Load {
                    at,
                    mass: r.force.unwrap(),
                    standard,
                })
                .collect(),
        }
    }

    #[test]
    fn three_wheels() {
        // 475 lb at 55 in, 1046 and 1040 lb at 121 in → 2561 lb at 108.75869 in.
        let load = |x: f64, y: f64, m: f64| Load {
            at: Vector3::new(x, y, 0.0),
            mass: m,
            standard: 0.0,
        };
        let w = weigh(&[Attitude {
            up: Vector3::z(),
            loads: vec![
                load(55.0, 0.0, 475.0),
                load(121.0, -40.0, 1046.0),
                load(121.0, 40.0, 1040.0),
            ],
        }])
        .unwrap();
        assert_eq!(w.mass, 2561.0);
        assert!((w.centre.x - 108.75869).abs() < 5e-6, "{}", w.centre.x);
        assert_eq!(
            (w.free, w.chi_squared, w.freedom),
            (Some(Vector3::z()), None, 0)
        );
        let (dm, dc) = w.disagreement(2571.0, &Vector3::new(109.0, w.centre.y, 33.0));
        assert!(
            (dm - 10.0).abs() < 1e-9 && (dc.x - (109.0 - w.centre.x)).abs() < 1e-9 && dc.z == 0.0
        );
    }

    #[test]
    fn two_attitudes_give_the_height() {
        let c = Vector3::new(100.0, 3.0, 40.0);
        let tilted = Vector3::new(0.3, 0.1, 1.0).normalize();
        let w = weigh(&[
            loads(c, Vector3::z(), 500.0, 1.0),
            loads(c, tilted, 500.0, 1.0),
        ])
        .unwrap();
        assert!((w.centre - c).norm() < 1e-10, "{}", w.centre);
        assert!(w.free.is_none() && w.freedom == 2 && w.chi_squared.unwrap() < 1e-15);
        assert!((w.mass_standard - (3.0_f64 / 2.0).sqrt()).abs() < 1e-12);
        // The height rests on the tilt alone and is known worst.
        assert!(w.centre_covariance[(2, 2)] > 5.0 * w.centre_covariance[(0, 0)]);
        let same = weigh(&[
            loads(c, Vector3::z(), 500.0, 1.0),
            loads(c, Vector3::z(), 500.0, 1.0),
        ]);
        assert!(same.unwrap_err().message.contains("same"));
    }

    #[test]
    fn uncertainty_of_three_loads_by_the_law_of_propagation() {
        // ∂X/∂m = (x − X)/M: JCGM 100:2008, worked out by hand.
        let w = weigh(&[loads(
            Vector3::new(100.0, 0.0, 0.0),
            Vector3::z(),
            300.0,
            2.0,
        )])
        .unwrap();
        let want: f64 = [55.0, 121.0, 121.0]
            .iter()
            .map(|x| ((x - 100.0_f64) / 300.0 * 2.0).powi(2))
            .sum();
        assert!((w.centre_covariance[(0, 0)] - want).abs() < 1e-12 * want);
        assert!((w.mass_standard - 12f64.sqrt()).abs() < 1e-13);
        assert!(
            weigh(&[Attitude {
                up: Vector3::z(),
                loads: vec![]
            }])
            .is_err()
        );
    }
}
