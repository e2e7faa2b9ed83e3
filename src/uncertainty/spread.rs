//! First-order propagation: what each source does to each figure, and the intervals from it.

use nalgebra::Matrix3;
use serde::Serialize;

use super::combination::Combination;
use super::distribution::Distribution;
use super::model::{Model, Tangents};
use super::near::{self, Rate};
use super::sampling::Sampled;
use crate::moments::{Moments, principal};

/// Two principal moments whose distance is less than this many standard uncertainties of it are
/// not told apart.
const APART: f64 = 3.0;

/// A source and its share of the variance of a figure, 0 to 1.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Driver<T> {
    /// Name of the variable.
    pub source: String,
    /// Of the variance; of a vector's components each.
    pub share: T,
}

/// How far a figure may be off, in its unit; vectors and matrices component by component.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Spread<T> {
    /// The standard uncertainty: one standard deviation.
    pub standard: T,
    /// The 2.5 % quantile.
    pub low_95: T,
    /// The 97.5 % quantile.
    pub high_95: T,
    /// Sources with any share, the largest first.
    pub drivers: Vec<Driver<T>>,
}

/// A source as it was stated.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Source {
    /// Such as `density of steel S235`.
    pub source: String,
    /// `normal`, `rectangular`, `triangular` or `interval`.
    pub distribution: &'static str,
    /// SI unit of the numbers here; `1` for a fraction.
    pub unit: &'static str,
    /// How far it may be off what was stated, for certain; null for a normal one.
    pub bounds: Option<[f64; 2]>,
    /// One standard deviation.
    pub standard: f64,
}

/// How far the figures of a whole may be off. Keyed by the field that each qualifies.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Uncertainty {
    /// kg.
    pub mass_kg: Spread<f64>,
    /// m.
    pub centre_of_mass_m: Spread<[f64; 3]>,
    /// About the centre of mass; null where nothing bounds it.
    pub inertia_kg_m2: Option<Spread<[[f64; 3]; 3]>>,
    /// Null where nothing bounds the inertia.
    pub principal_moments_kg_m2: Option<Spread<[f64; 3]>>,
    /// Null where nothing bounds the inertia.
    pub radii_of_gyration_m: Option<Spread<[f64; 3]>>,
    /// Indices of principal axes that the uncertainty leaves undetermined: their moments lie
    /// closer together than 3 standard uncertainties of their distance. The uncertainties of
    /// these moments are sampled.
    pub axes_undetermined: Vec<usize>,
    /// Correlations of mass and centre x, y, z, in that order; 0 where one of the two is certain.
    pub correlation: [[f64; 4]; 4],
    /// Every source as it was stated.
    pub sources: Vec<Source>,
    /// The same by Monte Carlo; absent where it was not asked for.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub sampled: Option<Sampled>,
}

/// Propagates the sources of `model` to the figures of `whole`, its moments as stated, which must
/// be held about the centre of mass. `None` where there is no mass.
///
/// With T the derivative of the moments held about the centre: dM = T₀, dX = T₁/M, and the
/// inertia about the centre changes as that about the point where the centre was, since the moved
/// centre is of second order. A principal moment changes by v·dI·v with v its axis.
pub fn spread(model: &Model, whole: &Moments) -> Option<Uncertainty> {
    let tangents = model.tangents(whole.centre()?);
    of_tangents(model, whole, &tangents)
}

pub(super) fn of_tangents(
    model: &Model,
    whole: &Moments,
    tangents: &Tangents,
) -> Option<Uncertainty> {
    let centre = whole.centre()?;
    let mass = whole.zeroth;
    let inertia = whole.inertia()?;
    let of = Of { model };
    let masses: Vec<f64> = tangents.iter().map(|t| t.zeroth).collect();
    let centres = [0, 1, 2].map(|k| -> Vec<f64> {
        let slopes = tangents.iter().map(|t| t.first[k] / mass);
        slopes.collect()
    });
    let inertias: Vec<Matrix3<f64>> = tangents.iter().map(Moments::inertia_here).collect();
    let elements = [0, 1, 2].map(|r| {
        [0, 1, 2].map(|c| -> (f64, Vec<f64>) {
            let slopes = inertias.iter().map(|i| i[(r, c)]).collect();
            (inertia[(r, c)] + 0.0, slopes)
        })
    });
    let (moments, radii, axes_undetermined) = of.principal(mass, &inertia, &masses, &inertias);
    let joint = [&masses, &centres[0], &centres[1], &centres[2]];
    Some(Uncertainty {
        mass_kg: of.scalar(mass, &masses),
        centre_of_mass_m: of.vector([0, 1, 2].map(|k| (centre[k], &centres[k][..]))),
        inertia_kg_m2: Some(of.matrix(&elements)),
        principal_moments_kg_m2: Some(moments),
        radii_of_gyration_m: Some(radii),
        axes_undetermined,
        correlation: joint.map(|a| joint.map(|b| of.correlation(a, b))),
        sources: model.variables().iter().map(Source::of).collect(),
        sampled: None,
    })
}

impl Source {
    fn of(v: &super::model::Variable) -> Self {
        Self {
            source: v.name.clone(),
            distribution: v.distribution.name(),
            unit: v.unit,
            bounds: v.distribution.bounds(),
            standard: v.distribution.standard(),
        }
    }
}

/// Propagation to single figures.
struct Of<'m> {
    model: &'m Model,
}

/// One figure: standard uncertainty, quantiles, and each source's share.
struct One {
    standard: f64,
    interval: [f64; 2],
    shares: Vec<f64>,
}

impl Of<'_> {
    fn distributions(&self) -> impl Iterator<Item = Distribution> + '_ {
        self.model.variables().iter().map(|v| v.distribution)
    }

    fn one(&self, value: f64, slopes: &[f64]) -> One {
        let sources = || slopes.iter().copied().zip(self.distributions());
        let c = Combination::new(value, sources());
        One {
            standard: c.standard(),
            interval: c.interval_95(),
            shares: shares(sources().map(|(g, d)| (g * d.standard()).powi(2))),
        }
    }

    fn scalar(&self, value: f64, slopes: &[f64]) -> Spread<f64> {
        let one = self.one(value, slopes);
        Spread {
            standard: one.standard,
            low_95: one.interval[0],
            high_95: one.interval[1],
            drivers: self.drivers(|n| one.shares[n], |share| *share),
        }
    }

    fn vector(&self, figures: [(f64, &[f64]); 3]) -> Spread<[f64; 3]> {
        self.together(figures.map(|(value, slopes)| self.one(value, slopes)))
    }

    fn together(&self, ones: [One; 3]) -> Spread<[f64; 3]> {
        Spread {
            standard: ones.each_ref().map(|o| o.standard),
            low_95: ones.each_ref().map(|o| o.interval[0]),
            high_95: ones.each_ref().map(|o| o.interval[1]),
            drivers: self.drivers(|n| ones.each_ref().map(|o| o.shares[n]), largest),
        }
    }

    fn matrix(&self, elements: &[[(f64, Vec<f64>); 3]; 3]) -> Spread<[[f64; 3]; 3]> {
        let rows = elements.each_ref().map(|row| {
            let row = row.each_ref();
            row.map(|(value, slopes)| self.one(*value, slopes))
        });
        let each = |f: &dyn Fn(&One) -> f64| rows.each_ref().map(|r| r.each_ref().map(f));
        Spread {
            standard: each(&|o| o.standard),
            low_95: each(&|o| o.interval[0]),
            high_95: each(&|o| o.interval[1]),
            drivers: self.drivers(
                |n| each(&|o| o.shares[n]),
                |s| s.iter().map(largest).fold(0.0, f64::max),
            ),
        }
    }

    /// Sources with any share, the one with the largest first; on ties in their own order.
    fn drivers<T>(&self, share: impl Fn(usize) -> T, size: impl Fn(&T) -> f64) -> Vec<Driver<T>> {
        let all = self.model.variables().iter().enumerate();
        let mut drivers: Vec<Driver<T>> = all
            .map(|(n, v)| Driver {
                source: v.name.clone(),
                share: share(n),
            })
            .filter(|d| size(&d.share) > 0.0)
            .collect();
        drivers.sort_by(|a, b| size(&b.share).total_cmp(&size(&a.share)));
        drivers
    }

    fn covariance(&self, a: &[f64], b: &[f64]) -> f64 {
        let variances = self.distributions().map(|d| d.standard().powi(2));
        a.iter()
            .zip(b)
            .zip(variances)
            .map(|((a, b), v)| a * b * v)
            .sum()
    }

    fn correlation(&self, a: &[f64], b: &[f64]) -> f64 {
        let size = (self.covariance(a, a) * self.covariance(b, b)).sqrt();
        if size > 0.0 {
            (self.covariance(a, b) / size).clamp(-1.0, 1.0)
        } else {
            0.0
        }
    }

    /// Principal moments, radii of gyration, and the axes that are undetermined.
    fn principal(
        &self,
        mass: f64,
        inertia: &Matrix3<f64>,
        masses: &[f64],
        inertias: &[Matrix3<f64>],
    ) -> (Spread<[f64; 3]>, Spread<[f64; 3]>, Vec<usize>) {
        let p = principal(inertia);
        let axes = p.axes.map(nalgebra::Vector3::from);
        // In the principal axes, the diagonal elements move the moments and the others turn them.
        let turned = |a: usize, b: usize| -> Vec<f64> {
            let rates = inertias.iter().map(|i| axes[a].dot(&(i * axes[b])));
            rates.collect()
        };
        let diagonal = [0, 1, 2].map(|k| turned(k, k));
        let close = |a: usize, b: usize| {
            let apart: Vec<f64> = diagonal[a]
                .iter()
                .zip(&diagonal[b])
                .map(|(a, b)| b - a)
                .collect();
            let off = turned(a, b);
            // Moments of a 2×2 block lie √(d² + 4·off²) apart.
            let variance = self.covariance(&apart, &apart) + 4.0 * self.covariance(&off, &off);
            p.moments[b] - p.moments[a] < APART * variance.sqrt()
        };
        let (lower, upper) = (close(0, 1), close(1, 2));
        let undetermined: Vec<usize> = match (lower, upper) {
            (true, true) => vec![0, 1, 2],
            (true, false) => vec![0, 1],
            (false, true) => vec![1, 2],
            (false, false) => Vec::new(),
        };
        let mut moments = [0, 1, 2].map(|k| self.one(p.moments[k], &diagonal[k]));
        let radius = p.moments.map(|l| (l.max(0.0) / mass).sqrt());
        let mut radii = [0, 1, 2].map(|k| {
            // k² = λ/M, so 2k dk = dλ/M − λ dM/M².
            let rate = |(l, m): (&f64, &f64)| {
                let r = radius[k];
                let both = l - r * r * m;
                // A common factor moves no radius: what is left of it is rounding.
                if r == 0.0 || both.abs() <= 1e-13 * (l.abs() + (r * r * m).abs()) {
                    return 0.0;
                }
                both / (2.0 * r * mass)
            };
            let slopes: Vec<f64> = diagonal[k].iter().zip(masses).map(rate).collect();
            self.one(radius[k], &slopes)
        });
        if !undetermined.is_empty() {
            let rates: Vec<Rate> = self
                .distributions()
                .zip(masses.iter().zip(inertias))
                .filter(|(_, (m, i))| **m != 0.0 || i.iter().any(|x| *x != 0.0))
                .map(|(distribution, (mass, inertia))| Rate {
                    distribution,
                    mass: *mass,
                    inertia: *inertia,
                })
                .collect();
            let [drawn, drawn_radii] = near::principal(mass, inertia, &rates);
            let shares = self.shares_within(&undetermined, &turned);
            for &k in &undetermined {
                for (one, d) in [(&mut moments[k], drawn[k]), (&mut radii[k], drawn_radii[k])] {
                    one.standard = d.standard;
                    one.interval = d.interval;
                    one.shares.clone_from(&shares);
                }
            }
        }
        (self.together(moments), self.together(radii), undetermined)
    }

    /// Shares of sources in the block of axes that are not told apart: of the squares of all its
    /// elements, which no choice of axes within it changes.
    fn shares_within(
        &self,
        block: &[usize],
        turned: &dyn Fn(usize, usize) -> Vec<f64>,
    ) -> Vec<f64> {
        let mut squares = vec![0.0; self.model.variables().len()];
        for &a in block {
            for &b in block {
                for (square, (g, d)) in squares
                    .iter_mut()
                    .zip(turned(a, b).iter().zip(self.distributions()))
                {
                    *square += (g * d.standard()).powi(2);
                }
            }
        }
        shares(squares.into_iter())
    }
}

fn largest(v: &[f64; 3]) -> f64 {
    v.iter().fold(0.0, |a, b| a.max(*b))
}

fn shares(variances: impl Iterator<Item = f64>) -> Vec<f64> {
    let all: Vec<f64> = variances.collect();
    let total: f64 = all.iter().sum();
    let share = |v: f64| if total > 0.0 { v / total } else { 0.0 };
    all.into_iter().map(share).collect()
}
