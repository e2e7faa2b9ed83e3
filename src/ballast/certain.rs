//! Chances: the factor that a certainty asks for, and samples that check it.

use std::f64::consts::{PI, SQRT_2};

use super::{Place, State, row};
use crate::limits::{Limit, Verdict};
use crate::moments::Moments;

/// Chance that a standard normal variable is above `k`. By the complementary error function's
/// continued fraction above 2 and its series below (Abramowitz & Stegun 7.1.5, 7.1.14), to 1e-14.
fn above(k: f64) -> f64 {
    let x = k / SQRT_2;
    if x < 2.0 {
        let (mut term, mut sum) = (x, x);
        for n in 1..200 {
            term *= -x * x / f64::from(n);
            sum += term / f64::from(2 * n + 1);
        }
        return 0.5 * (1.0 - 2.0 / PI.sqrt() * sum);
    }
    let mut f = 0.0;
    for n in (1..300).rev() {
        f = f64::from(n) / 2.0 / (x + f);
    }
    0.5 * (-x * x).exp() / PI.sqrt() / (x + f)
}

/// The k at which a normal variable stays below its mean + k standard deviations with all but
/// this chance (at most a half).
pub(super) fn factor(chance: f64) -> f64 {
    let (mut lo, mut hi) = (0.0, 38.0);
    for _ in 0..100 {
        let mid = 0.5 * (lo + hi);
        if above(mid) > chance {
            lo = mid
        } else {
            hi = mid
        }
    }
    hi
}

/// SplitMix64 (Steele, Lea & Flood 2014): the same numbers for the same seed everywhere.
struct Random(u64);

impl Random {
    fn bits(&mut self) -> u64 {
        self.0 = self.0.wrapping_add(0x9E37_79B9_7F4A_7C15);
        let z = (self.0 ^ (self.0 >> 30)).wrapping_mul(0xBF58_476D_1CE4_E5B9);
        let z = (z ^ (z >> 27)).wrapping_mul(0x94D0_49BB_1331_11EB);
        z ^ (z >> 31)
    }

    fn uniform(&mut self) -> f64 {
        ((self.bits() >> 11) as f64 + 0.5) / (1u64 << 53) as f64
    }

    /// Two standard normal variables (Box & Muller 1958).
    fn normal(&mut self) -> [f64; 2] {
        let (r, a) = (
            (-2.0 * self.uniform().ln()).sqrt(),
            2.0 * PI * self.uniform(),
        );
        [r * a.cos(), r * a.sin()]
    }
}

/// `n` numbers from 0 to 1.
pub(super) fn uniforms(seed: u64, n: usize) -> Vec<f64> {
    let mut random = Random(seed);
    (0..n).map(|_| random.uniform()).collect()
}

/// The share of `n` seeded samples in which every limit holds in every state. The same source of
/// error moves all states together.
pub(super) fn sampled(
    limits: &[Limit],
    states: &[State],
    places: &[Place],
    x: &[f64],
    diagonal: f64,
    (n, seed): (u32, u64),
) -> f64 {
    let mut random = Random(seed);
    let sources = states.iter().map(|s| s.drivers.len()).max().unwrap_or(0);
    let at: Vec<Moments> = states.iter().map(|s| row::laden(s, places, x)).collect();
    // All changes are held about the point of their state's total, so that adding is plain.
    let drivers: Vec<Vec<Moments>> = states
        .iter()
        .zip(&at)
        .map(|(s, m)| s.drivers.iter().map(|d| d.shifted(m.about)).collect())
        .collect();
    let loads: Vec<Vec<(Moments, Moments)>> = at
        .iter()
        .map(|m| {
            let of = |(p, x): (&Place, &f64)| {
                let unit = p.per_kg.shifted(m.about);
                let absolute = if *x > 0.0 { p.absolute } else { 0.0 };
                (unit.weighted(p.relative * x), unit.weighted(absolute))
            };
            places.iter().zip(x).map(of).collect()
        })
        .collect();
    let need = sources + 2 * places.len();
    let mut good = 0_u32;
    for _ in 0..n {
        let mut z = Vec::with_capacity(need + 1);
        while z.len() < need {
            z.extend(random.normal());
        }
        let holds = (0..states.len()).all(|s| {
            let mut m = at[s];
            for (d, z) in drivers[s].iter().zip(&z) {
                m = m.plus(&d.weighted(*z));
            }
            for (j, (r, a)) in loads[s].iter().enumerate() {
                let k = sources + 2 * j;
                m = m.plus(&r.weighted(z[k])).plus(&a.weighted(z[k + 1]));
            }
            limits
                .iter()
                .enumerate()
                .filter(|(n, _)| states[s].asks(*n))
                .all(|(_, l)| l.judge_whole(&m, diagonal).verdict == Verdict::Holds)
        });
        good += u32::from(holds);
    }
    f64::from(good) / f64::from(n)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn factors_of_the_normal_distribution() {
        // 1.6449, 2.3263 and 3.0902: one-sided 95, 99 and 99.9 % (standard tables, from memory);
        // 1 − Φ(2) = 0.0227501319481792, likewise.
        for (chance, k) in [
            (0.05, 1.644_853_626_951_472),
            (0.01, 2.326_347_874_040_841),
            (0.001, 3.090_232_306_167_813),
        ] {
            assert!((factor(chance) - k).abs() < 1e-12, "{chance}");
        }
        assert!((above(2.0) - 0.022_750_131_948_179_2).abs() < 1e-15);
        assert!((above(2.0 * SQRT_2 - 1e-12) - above(2.0 * SQRT_2 + 1e-12)).abs() < 3e-14);
        assert!(factor(0.5) < 1e-12);
    }

    #[test]
    fn normal_samples_have_their_mean_and_spread() {
        let mut r = Random(7);
        let z: Vec<f64> = (0..50_000).flat_map(|_| r.normal()).collect();
        let mean = z.iter().sum::<f64>() / 1e5;
        let var = z.iter().map(|z| z * z).sum::<f64>() / 1e5;
        // Four standard deviations of each.
        assert!(
            mean.abs() < 4.0 / 1e5_f64.sqrt() && (var - 1.0).abs() < 4.0 * (2.0 / 1e5_f64).sqrt()
        );
    }
}
