//! Monte Carlo propagation (JCGM 101:2008): every draw evaluates everything anew.

use nalgebra::Matrix3;
use rayon::prelude::*;
use serde::Serialize;

use super::distribution::Distribution;
use super::figure::Figure;
use super::model::{Model, Response, Values};
use super::near::quantile;
use super::random::Draws;
use super::spread::{Spread, Uncertainty};
use crate::moments::Moments;

/// Draws a stream, and a unit of work.
const CHUNK: u64 = 1024;
/// Quantiles are taken of this many of the first draws: they are then good to 0.6 % of half of
/// the interval, and memory stays bounded.
const KEPT: u64 = 1 << 18;
/// Chunks in memory at once.
const BATCH: usize = 1024;
/// The most draws.
pub const MOST_SAMPLES: u64 = 1_000_000_000;

/// How many draws, and from which seed.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Sampling {
    /// At least 2, at most [`MOST_SAMPLES`].
    pub n: u64,
    /// The same seed gives the same bits, on any number of threads.
    pub seed: u64,
}

/// Mean and standard deviation of draws.
#[derive(Clone, Copy, Debug, PartialEq, Serialize)]
pub struct MeanStandard<T> {
    /// Arithmetic mean.
    pub mean: T,
    /// Standard deviation of one draw.
    pub standard: T,
    /// The 2.5 % quantile.
    pub low_95: T,
    /// The 97.5 % quantile.
    pub high_95: T,
}

/// The chance that a limit on a figure holds.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct SampledFigure {
    /// Name of the limit.
    pub limit: String,
    /// Name of the figure.
    pub quantity: String,
    /// Share of the draws that lie inside.
    pub probability: f64,
}

/// Figures over draws of all sources.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Sampled {
    /// How many draws.
    pub n: u64,
    /// Of the generator.
    pub seed: u64,
    /// Draws with no mass or less, which have no centre and no inertia and are left out of these.
    pub without_mass: u64,
    /// kg.
    pub mass_kg: MeanStandard<f64>,
    /// m.
    pub centre_of_mass_m: MeanStandard<[f64; 3]>,
    /// About the centre of each draw; null where nothing bounds it.
    pub inertia_kg_m2: Option<MeanStandard<[[f64; 3]; 3]>>,
    /// Of each draw, ascending; null where nothing bounds the inertia.
    pub principal_moments_kg_m2: Option<MeanStandard<[f64; 3]>>,
    /// Of each limit, in their order.
    pub limits: Vec<SampledFigure>,
    /// Figures whose linear interval is not good enough: an end of it lies farther from that of
    /// the draws than half of the last place of a standard uncertainty with two significant
    /// digits (JCGM 101:2008, clause 8) and than chance explains (3 standard errors of the
    /// quantile). Such as `centre_of_mass_m.x`.
    pub linear_not_good_enough: Vec<String>,
}

/// A band that a figure should lie in.
pub struct Band<'a> {
    /// Of the limit.
    pub name: &'a str,
    /// Of the figure.
    pub quantity: &'a str,
    /// The figure.
    pub figure: &'a dyn Figure,
    /// Its lower end.
    pub from: Option<f64>,
    /// Its upper end.
    pub to: Option<f64>,
}

impl std::fmt::Debug for Band<'_> {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        write!(f, "{} {:?}..{:?}", self.quantity, self.from, self.to)
    }
}

/// Mass, centre x y z, inertia xx yy zz xy xz yz, principal moments.
const FIGURES: usize = 13;
const NAMES: [&str; FIGURES] = [
    "mass_kg",
    "centre_of_mass_m.x",
    "centre_of_mass_m.y",
    "centre_of_mass_m.z",
    "inertia_kg_m2.xx",
    "inertia_kg_m2.yy",
    "inertia_kg_m2.zz",
    "inertia_kg_m2.xy",
    "inertia_kg_m2.xz",
    "inertia_kg_m2.yz",
    "principal_moments_kg_m2.1",
    "principal_moments_kg_m2.2",
    "principal_moments_kg_m2.3",
];
/// Rows and columns of the elements, in the order of [`NAMES`].
const ELEMENTS: [(usize, usize); 6] = [(0, 0), (1, 1), (2, 2), (0, 1), (0, 2), (1, 2)];

/// What one chunk of draws adds: sums of differences from the figures as stated.
struct Chunk {
    count: u64,
    mass: [f64; 2],
    sums: [[f64; 2]; FIGURES],
    held: Vec<u64>,
    kept: Vec<[f64; FIGURES]>,
}

/// Draws all variables `sampling.n` times. `whole` are the moments as stated, held about the
/// centre; `linear` is what propagation gives, for the comparison. `None` where there is no mass.
///
/// Draws come from one stream a chunk of fixed size, and chunks are added in their order, so that
/// the result has the same bits on any number of threads.
pub fn sample(
    model: &Model,
    whole: &Moments,
    bands: &[Band<'_>],
    linear: &Uncertainty,
    sampling: Sampling,
) -> Option<Sampled> {
    let stated = figures(whole)?;
    // What depends on nothing is added once.
    let constant: Vec<bool> = model.depends().iter().map(Vec::is_empty).collect();
    let mut fixed = Moments::zero(whole.about);
    let mut terms: Vec<&dyn Response> = Vec::new();
    for (term, constant) in model.terms().iter().zip(&constant) {
        if *constant {
            fixed = fixed.plus(&term.moments(&model.stated()));
        } else {
            terms.push(term.as_ref());
        }
    }
    let judge = |m: &Moments| -> Vec<bool> {
        bands
            .iter()
            .map(|b| {
                let v = b.figure.value(m);
                b.from.is_none_or(|from| v >= from) && b.to.is_none_or(|to| v <= to)
            })
            .collect()
    };
    let chunk = |index: u64| -> Chunk {
        let mut draws = Draws::new(sampling.seed, index);
        let first = index * CHUNK;
        let mut out = Chunk {
            count: 0,
            mass: [0.0; 2],
            sums: [[0.0; 2]; FIGURES],
            held: vec![0; bands.len()],
            kept: Vec::new(),
        };
        let mut values: Values = model.stated();
        for n in first..(first + CHUNK).min(sampling.n) {
            for (value, variable) in values.0.iter_mut().zip(model.variables()) {
                *value = variable.distribution.draw(&mut draws);
            }
            let whole = terms
                .iter()
                .fold(fixed, |sum, t| sum.plus(&t.moments(&values)));
            let mass = whole.zeroth - stated[0];
            out.mass[0] += mass;
            out.mass[1] += mass * mass;
            let Some(found) = figures(&whole) else {
                continue;
            };
            out.count += 1;
            for ((sum, x), stated) in out.sums.iter_mut().zip(found).zip(stated) {
                let off = x - stated;
                sum[0] += off;
                sum[1] += off * off;
            }
            for (held, inside) in out.held.iter_mut().zip(judge(&whole)) {
                *held += u64::from(inside);
            }
            if n < KEPT {
                out.kept.push(found);
            }
        }
        out
    };
    let count = sampling.n.div_ceil(CHUNK);
    let mut all = Chunk {
        count: 0,
        mass: [0.0; 2],
        sums: [[0.0; 2]; FIGURES],
        held: vec![0; bands.len()],
        kept: Vec::new(),
    };
    for from in (0..count).step_by(BATCH) {
        let to = (from + BATCH as u64).min(count);
        let chunks: Vec<Chunk> = (from..to).into_par_iter().map(chunk).collect();
        for c in chunks {
            all.take(c);
        }
    }
    Some(all.answer(&stated, bands, linear, sampling, biased(model)))
}

fn add(sum: &mut [f64; 2], more: [f64; 2]) {
    sum[0] += more[0];
    sum[1] += more[1];
}

/// The figures of a whole; `None` where it has no mass.
fn figures(whole: &Moments) -> Option<[f64; FIGURES]> {
    if whole.zeroth <= 0.0 {
        return None;
    }
    let centre = whole.centre()?;
    let inertia = whole.inertia()?;
    let mut principal: [f64; 3] = inertia.symmetric_eigenvalues().into();
    principal.sort_by(f64::total_cmp);
    let mut out = [0.0; FIGURES];
    out[0] = whole.zeroth;
    out[1..4].copy_from_slice(centre.as_slice());
    for (x, at) in out[4..10].iter_mut().zip(ELEMENTS) {
        *x = inertia[at];
    }
    out[10..].copy_from_slice(&principal);
    Some(out)
}

impl Chunk {
    fn take(&mut self, c: Self) {
        self.count += c.count;
        add(&mut self.mass, c.mass);
        for (sum, more) in self.sums.iter_mut().zip(c.sums) {
            add(sum, more);
        }
        for (held, more) in self.held.iter_mut().zip(c.held) {
            *held += more;
        }
        self.kept.extend(c.kept);
    }

    fn answer(
        &self,
        stated: &[f64; FIGURES],
        bands: &[Band<'_>],
        linear: &Uncertainty,
        sampling: Sampling,
        biased: bool,
    ) -> Sampled {
        let n = self.count as f64;
        let one = |k: usize| {
            let [sum, squares] = self.sums[k];
            let mut sorted: Vec<f64> = self.kept.iter().map(|f| f[k]).collect();
            sorted.sort_by(f64::total_cmp);
            MeanStandard {
                mean: stated[k] + sum / n,
                standard: ((squares - sum * sum / n) / (n - 1.0)).max(0.0).sqrt(),
                low_95: quantile(&sorted, 0.025),
                high_95: quantile(&sorted, 0.975),
            }
        };
        let all: [MeanStandard<f64>; FIGURES] = std::array::from_fn(one);
        let kept = self.kept.len() as f64;
        let linear = intervals(linear);
        let rounding = rounding(stated);
        let doubtful = (0..FIGURES).filter(|&k| {
            let s = &all[k];
            linear[k].is_some_and(|[low, high]| {
                // With a bias the linear interval reaches over all of it; only what it leaves out
                // counts.
                let off = if biased {
                    (low - s.low_95).max(s.high_95 - high)
                } else {
                    (low - s.low_95).abs().max((high - s.high_95).abs())
                };
                off > half_of_last_place(s.standard) + chance(s, kept) + rounding[k]
            })
        });
        let doubtful = doubtful.map(|k| NAMES[k].to_owned()).collect();
        let vector = |from: usize| {
            let v = [all[from], all[from + 1], all[from + 2]];
            MeanStandard {
                mean: v.map(|x| x.mean),
                standard: v.map(|x| x.standard),
                low_95: v.map(|x| x.low_95),
                high_95: v.map(|x| x.high_95),
            }
        };
        let matrix = |f: fn(&MeanStandard<f64>) -> f64| {
            let mut m = Matrix3::zeros();
            for (k, (r, c)) in ELEMENTS.into_iter().enumerate() {
                m[(r, c)] = f(&all[4 + k]);
                m[(c, r)] = f(&all[4 + k]);
            }
            [0, 1, 2].map(|r| [0, 1, 2].map(|c| m[(r, c)]))
        };
        let limits = bands.iter().zip(&self.held).map(|(b, held)| SampledFigure {
            limit: b.name.to_owned(),
            quantity: b.quantity.to_owned(),
            probability: *held as f64 / sampling.n as f64,
        });
        Sampled {
            n: sampling.n,
            seed: sampling.seed,
            without_mass: sampling.n - self.count,
            mass_kg: MeanStandard {
                mean: stated[0] + self.mass[0] / sampling.n as f64,
                ..all[0]
            },
            centre_of_mass_m: vector(1),
            inertia_kg_m2: Some(MeanStandard {
                mean: matrix(|x| x.mean),
                standard: matrix(|x| x.standard),
                low_95: matrix(|x| x.low_95),
                high_95: matrix(|x| x.high_95),
            }),
            principal_moments_kg_m2: Some(vector(10)),
            limits: limits.collect(),
            linear_not_good_enough: doubtful,
        }
    }
}

/// The linear 95 % intervals in the order of [`NAMES`].
/// Whether a source is a bias.
fn biased(model: &Model) -> bool {
    let bias = |v: &super::model::Variable| matches!(v.distribution, Distribution::Interval { .. });
    model.variables().iter().any(bias)
}

fn intervals(u: &Uncertainty) -> [Option<[f64; 2]>; FIGURES] {
    let vector = |s: &Spread<[f64; 3]>, k: usize| Some([s.low_95[k], s.high_95[k]]);
    std::array::from_fn(|n| match n {
        0 => Some([u.mass_kg.low_95, u.mass_kg.high_95]),
        1..4 => vector(&u.centre_of_mass_m, n - 1),
        4..10 => {
            let (r, c) = ELEMENTS[n - 4];
            let s = u.inertia_kg_m2.as_ref()?;
            Some([s.low_95[r][c], s.high_95[r][c]])
        }
        _ => vector(u.principal_moments_kg_m2.as_ref()?, n - 10),
    })
}

/// Half of the place of the second significant digit of a standard uncertainty: the numerical
/// tolerance of JCGM 101:2008, 7.9.2.
fn half_of_last_place(standard: f64) -> f64 {
    if standard > 0.0 && standard.is_finite() {
        0.5 * 10f64.powf(standard.log10().floor() - 1.0)
    } else {
        0.0
    }
}

/// Three standard errors of a 2.5 % quantile of `n` draws: √(p(1 − p)/n)/f with the normal
/// density f there.
fn chance(s: &MeanStandard<f64>, n: f64) -> f64 {
    let density = 0.058_4;
    3.0 * (0.025 * 0.975 / n.max(1.0)).sqrt() / density * s.standard
}

/// What arithmetic alone may move each figure by.
fn rounding(stated: &[f64; FIGURES]) -> [f64; FIGURES] {
    let inertia = stated[4] + stated[5] + stated[6];
    let size = (inertia / stated[0]).max(0.0).sqrt();
    std::array::from_fn(|k| {
        1e-12
            * match k {
                0 => stated[0],
                1..4 => size + stated[k].abs(),
                _ => inertia,
            }
    })
}
