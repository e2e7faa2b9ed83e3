//! Principal moments that lie so close together that their uncertainty can exchange them.

use nalgebra::Matrix3;
use rayon::prelude::*;

use super::distribution::Distribution;
use super::random::Draws;

/// Draws for this purpose alone: quantiles of 95 % are then good to 2 % of the interval.
const DRAWS: usize = 16_384;
/// Draws a stream.
const CHUNK: usize = 512;
/// Any number; that it is fixed makes the answer repeatable.
const SEED: u64 = 0x0b15_3a42;

/// Mass, and inertia about the centre, with their rates of change by one source.
pub(super) struct Rate {
    pub(super) distribution: Distribution,
    pub(super) mass: f64,
    pub(super) inertia: Matrix3<f64>,
}

/// Standard deviation and 95 % interval of one sampled figure.
#[derive(Clone, Copy, Debug)]
pub(super) struct Drawn {
    pub(super) standard: f64,
    pub(super) interval: [f64; 2],
}

/// The three principal moments and the three radii of gyration, over draws of the sources, with
/// mass and inertia linear in them. A moment or mass below zero counts as zero.
pub(super) fn principal(mass: f64, inertia: &Matrix3<f64>, rates: &[Rate]) -> [[Drawn; 3]; 2] {
    let chunks = DRAWS / CHUNK;
    let drawn: Vec<Vec<[f64; 6]>> = (0..chunks)
        .into_par_iter()
        .map(|chunk| {
            let mut draws = Draws::new(SEED, chunk as u64);
            let one = |_| {
                let (mut m, mut i) = (mass, *inertia);
                for rate in rates {
                    let x = rate.distribution.draw(&mut draws);
                    m += rate.mass * x;
                    i += rate.inertia * x;
                }
                let mut p: [f64; 3] = i.symmetric_eigenvalues().into();
                p.sort_by(f64::total_cmp);
                let radius = |l: f64| {
                    if m > 0.0 {
                        (l.max(0.0) / m).sqrt()
                    } else {
                        0.0
                    }
                };
                [p[0], p[1], p[2], radius(p[0]), radius(p[1]), radius(p[2])]
            };
            (0..CHUNK).map(one).collect()
        })
        .collect();
    let column = |n: usize| {
        let mut all: Vec<f64> = drawn.iter().flatten().map(|d| d[n]).collect();
        let count = all.len() as f64;
        let mean = all.iter().sum::<f64>() / count;
        let variance = all.iter().map(|x| (x - mean).powi(2)).sum::<f64>() / (count - 1.0);
        all.sort_by(f64::total_cmp);
        Drawn {
            standard: variance.sqrt(),
            interval: [quantile(&all, 0.025), quantile(&all, 0.975)],
        }
    };
    [[0, 1, 2].map(column), [3, 4, 5].map(column)]
}

/// A quantile of sorted samples (JCGM 101:2008, 7.7); `NaN` of none.
pub(super) fn quantile(sorted: &[f64], p: f64) -> f64 {
    let last = sorted.len().saturating_sub(1);
    let at = p * last as f64;
    let low = at.floor() as usize;
    let (Some(a), Some(b)) = (sorted.get(low), sorted.get((low + 1).min(last))) else {
        return f64::NAN;
    };
    a + (b - a) * (at - low as f64)
}
