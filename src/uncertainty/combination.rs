//! The distribution of a sum of independent sources.

use std::f64::consts::PI;

use super::distribution::Distribution;

/// The normal distribution's 97.5 % point: half of a 95 % interval in standard deviations.
pub(super) const COVERAGE_95: f64 = 1.959_963_984_540_054;
/// A source with more than this share of the variance rules out the normal approximation.
const DOMINANT: f64 = 0.5;
/// Of the sources of a sum this many, the largest, are convolved each by itself; what is left is
/// taken as one normal source (central limit theorem).
const CONVOLVED: usize = 48;
/// The most terms of a series.
const MOST_TERMS: usize = 8192;
/// Terms smaller than this are left out.
const NEGLIGIBLE: f64 = 1e-13;

/// value + Σ c·X over independent sources X: its standard deviation, quantiles, probabilities.
///
/// A [`Distribution::Interval`] is a bias of one direction, of which nothing says how much applies.
/// Intervals of the sum reach from where none of it applies to where all of it does; for a chance,
/// any part of it is as likely as any other.
#[derive(Clone, Debug)]
pub struct Combination {
    mean: f64,
    standard: f64,
    /// Of the sources that are no bias.
    spread: f64,
    /// Half of what all biases together reach, about the mean.
    span: f64,
    /// Of the sum without its biases.
    law: Law,
    /// Of the whole sum.
    all: Law,
}

#[derive(Clone, Debug)]
enum Law {
    /// It is what it is.
    Exact,
    Normal,
    /// A single bounded source; its half-width.
    Rectangular(f64),
    /// A convolution, as the Fourier series of its distribution function on ±`half_period`.
    Series {
        half_period: f64,
        /// φ(kπ/L)/(kπ) from k = 1.
        terms: Vec<f64>,
    },
}

impl Law {
    /// Of a sum of sources about its mean, with this standard deviation.
    fn of(mut parts: Vec<(f64, Distribution)>, standard: f64) -> Self {
        let variance = |(c, d): &(f64, Distribution)| (c * d.standard()).powi(2);
        let total = standard * standard;
        parts.sort_by(|a, b| variance(b).total_cmp(&variance(a)));
        let greatest = parts.first().map_or(0.0, variance);
        let normal = |(_, d): &(f64, Distribution)| matches!(d, Distribution::Normal { .. });
        if !(total > 0.0 && total.is_finite()) {
            Law::Exact
        } else if greatest <= DOMINANT * total || parts.iter().all(normal) {
            Law::Normal
        } else {
            match parts.as_slice() {
                [(c, Distribution::Rectangular { half_width })] => {
                    Law::Rectangular((c * half_width).abs())
                }
                [(c, Distribution::Interval { low, high })] => {
                    Law::Rectangular((0.5 * c * (high - low)).abs())
                }
                _ => {
                    let rest: f64 = parts.iter().skip(CONVOLVED).map(variance).sum();
                    parts.truncate(CONVOLVED);
                    if rest > 0.0 {
                        let standard = rest.sqrt();
                        parts.push((1.0, Distribution::Normal { standard }));
                    }
                    convolved(&parts, standard)
                }
            }
        }
    }
}

impl Combination {
    /// `value` with these sources and the derivatives by them.
    ///
    /// Where one source has more than half of the variance, the distributions are convolved;
    /// otherwise the sum is taken as normal.
    pub fn new(value: f64, sources: impl IntoIterator<Item = (f64, Distribution)>) -> Self {
        let mut parts: Vec<(f64, Distribution)> = sources
            .into_iter()
            .filter(|(c, d)| *c != 0.0 && d.standard() > 0.0)
            .collect();
        let mean = value + parts.iter().map(|(c, d)| c * d.mean()).sum::<f64>();
        let variance = |(c, d): &(f64, Distribution)| (c * d.standard()).powi(2);
        let total: f64 = parts.iter().map(variance).sum();
        let standard = total.sqrt();
        let is_bias = |(_, d): &(f64, Distribution)| matches!(d, Distribution::Interval { .. });
        let span = parts.iter().filter(|p| is_bias(p)).map(|(c, d)| {
            let [low, high] = d.bounds().unwrap_or([0.0; 2]);
            0.5 * (c * (high - low)).abs()
        });
        let span: f64 = span.sum();
        let all = Law::of(parts.clone(), standard);
        parts.retain(|p| !is_bias(p));
        let total: f64 = parts.iter().map(variance).sum();
        let spread = total.sqrt();
        let law = Law::of(parts, spread);
        Self {
            mean,
            standard,
            spread,
            span,
            law,
            all,
        }
    }

    /// The expectation.
    pub fn mean(&self) -> f64 {
        self.mean
    }

    /// The standard deviation about it.
    pub fn standard(&self) -> f64 {
        self.standard
    }

    /// The chance of a value up to `x`.
    pub fn below(&self, x: f64) -> f64 {
        let x = x - self.mean;
        match &self.all {
            Law::Exact => f64::from(u8::from(x >= 0.0)),
            Law::Normal => normal_below(x / self.standard),
            Law::Rectangular(half) => (0.5 * (1.0 + x / half)).clamp(0.0, 1.0),
            Law::Series { half_period, terms } => series(x, *half_period, terms),
        }
    }

    /// The chance of a value within the band, its ends included; an end that is none is far away.
    pub fn within(&self, from: Option<f64>, to: Option<f64>) -> f64 {
        if let Law::Exact = self.all {
            let inside = from.is_none_or(|f| self.mean >= f) && to.is_none_or(|t| self.mean <= t);
            return f64::from(u8::from(inside));
        }
        let below = from.map_or(0.0, |from| self.below(from));
        let up_to = to.map_or(1.0, |to| self.below(to));
        (up_to - below).clamp(0.0, 1.0)
    }

    /// The 2.5 % and the 97.5 % quantile.
    pub fn interval_95(&self) -> [f64; 2] {
        let half = match &self.law {
            Law::Exact => 0.0,
            Law::Normal => COVERAGE_95 * self.spread,
            Law::Rectangular(half) => 0.95 * half,
            Law::Series { half_period, terms } => {
                let (mut low, mut high) = (0.0, *half_period);
                for _ in 0..60 {
                    let middle = 0.5 * (low + high);
                    if series(middle, *half_period, terms) < 0.975 {
                        low = middle;
                    } else {
                        high = middle;
                    }
                }
                0.5 * (low + high)
            }
        };
        // The sum is symmetric about its mean, as every source is.
        let half = half + self.span;
        [self.mean - half, self.mean + half]
    }
}

/// The chance of a standard normal variable up to `z`.
pub(super) fn normal_below(z: f64) -> f64 {
    0.5 * libm::erfc(-z / std::f64::consts::SQRT_2)
}

/// The convolution of the sources about their means. The characteristic function of a sum is the
/// product of those of its terms; on an interval that holds the whole distribution it gives the
/// Fourier coefficients of the density, and the series of the distribution function follows term
/// by term.
fn convolved(parts: &[(f64, Distribution)], standard: f64) -> Law {
    let reach = |(c, d): &(f64, Distribution)| match d.bounds() {
        Some([low, high]) => 0.5 * (c * (high - low)).abs(),
        None => 9.0 * (c * d.standard()).abs(),
    };
    // Nothing lies beyond all bounds together; and beyond 9 standard deviations of a sum of many
    // sources lies less than rounding.
    let support: f64 = parts.iter().map(reach).sum();
    let half_period = 1.05 * support.min(9.0 * standard);
    let step = PI / half_period;
    let mut terms = Vec::new();
    for k in 1..=MOST_TERMS {
        let t = k as f64 * step;
        let product: f64 = parts.iter().map(|(c, d)| d.characteristic(c * t)).product();
        terms.push(product / (k as f64 * PI));
        let most: f64 = parts.iter().map(|(c, d)| d.envelope(c * t)).product();
        if most < NEGLIGIBLE {
            break;
        }
    }
    Law::Series { half_period, terms }
}

/// F(x) = ½ + x/2L + Σ φ(kπ/L)/(kπ)·sin(kπx/L), by Clenshaw's recurrence.
fn series(x: f64, half_period: f64, terms: &[f64]) -> f64 {
    if x.abs() >= half_period {
        return f64::from(u8::from(x > 0.0));
    }
    let (sin, cos) = (PI * x / half_period).sin_cos();
    let (mut next, mut after) = (0.0, 0.0);
    for term in terms.iter().rev() {
        (next, after) = (term + 2.0 * cos * next - after, next);
    }
    (0.5 + 0.5 * x / half_period + sin * next).clamp(0.0, 1.0)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn rectangular(half_width: f64) -> Distribution {
        Distribution::Rectangular { half_width }
    }

    #[track_caller]
    fn near(a: f64, b: f64, within: f64) {
        assert!((a - b).abs() <= within, "{a} is not {b}");
    }

    /// One rectangular source: 95 % of its width, less than 1.96 standard deviations, which lie
    /// outside of it altogether (√3 = 1.732). A ± 2 % half-width has u = 1.154701 %.
    #[test]
    fn one_rectangular_source() {
        let c = Combination::new(10.0, [(-3.0, rectangular(2.0))]);
        near(c.standard(), 3.0 * 1.154_701, 5e-6);
        near(c.interval_95()[0], 4.3, 1e-14);
        near(c.interval_95()[1], 15.7, 1e-14);
        assert!(COVERAGE_95 * c.standard() > 6.0);
        assert_eq!(c.within(Some(4.0), Some(16.0)), 1.0);
        assert_eq!(c.within(Some(10.0), None), 0.5);
    }

    /// The sum of two rectangular sources of half-widths a > b is a trapezoid with the feet at
    /// ±(a + b) and the shoulders at ±(a − b): within x of the upper foot lies x²/8ab. By hand.
    #[test]
    fn two_rectangular_sources_are_a_trapezoid() {
        for (a, b) in [(1.0, 0.5), (2.0, 1.9), (1.0, 0.1), (3.0, 0.01)] {
            let c = Combination::new(0.0, [(a, rectangular(1.0)), (b, rectangular(1.0))]);
            let closed = |x: f64| {
                if x >= a + b {
                    1.0
                } else if x > a - b {
                    1.0 - (a + b - x).powi(2) / (8.0 * a * b)
                } else {
                    0.5 + x / (2.0 * a)
                }
            };
            for k in 0..40 {
                let x = f64::from(k) / 39.0 * (a + b);
                // The series ends at k⁻³ of its first term, or at its 8192nd near a kink.
                near(c.below(x), closed(x), 2e-7);
                near(c.below(-x), 1.0 - closed(x), 2e-7);
            }
            let high = c.interval_95()[1];
            near(closed(high), 0.975, 2e-7);
        }
    }

    /// A rectangular and a normal source: F(x) = (σ/2a)·(G((x + a)/σ) − G((x − a)/σ)) with
    /// G(z) = z·Φ(z) + φ(z), by integrating Φ once.
    #[test]
    fn a_rectangular_and_a_normal_source() {
        for (a, sigma) in [(2.0, 0.3), (1.0, 0.5), (1.0, 1e-3)] {
            let normal = Distribution::Normal { standard: 1.0 };
            let c = Combination::new(7.0, [(sigma, normal), (a, rectangular(1.0))]);
            let g = |z: f64| z * normal_below(z) + (-0.5 * z * z).exp() / (2.0 * PI).sqrt();
            let closed = |x: f64| sigma / (2.0 * a) * (g((x + a) / sigma) - g((x - a) / sigma));
            for k in -30..=30 {
                let x = f64::from(k) / 20.0 * (a + 2.0 * sigma);
                near(c.below(7.0 + x), closed(x), 2e-6);
            }
            near(closed(c.interval_95()[1] - 7.0), 0.975, 1e-7);
        }
    }

    /// A triangular source by itself: 1 − (1 − x)²/2 up to x from the middle.
    #[test]
    fn a_triangular_source() {
        let c = Combination::new(0.0, [(1.0, Distribution::Triangular { half_width: 1.0 })]);
        near(c.interval_95()[1], 1.0 - 0.05_f64.sqrt(), 1e-7);
        near(c.standard(), 1.0 / 6.0_f64.sqrt(), 1e-15);
    }

    #[test]
    fn normal_where_no_source_dominates() {
        let c = Combination::new(1.0, [(1.0, rectangular(1.0)); 3]);
        near(c.interval_95()[1], 1.0 + 1.959_964, 1e-6);
        // Values of Φ as printed in any table (from memory).
        near(normal_below(1.0), 0.841_344_746_068_543, 1e-14);
        near(normal_below(COVERAGE_95), 0.975, 1e-15);
    }

    /// A bias reaches from what was stated to all of it, and a spread widens that on both sides.
    #[test]
    fn one_sided() {
        let bias = Distribution::Interval {
            low: 0.0,
            high: 2.0,
        };
        let c = Combination::new(5.0, [(1.0, bias)]);
        assert_eq!(c.mean(), 6.0);
        near(c.standard(), 1.0 / 3.0_f64.sqrt(), 1e-15);
        assert_eq!(c.interval_95(), [5.0, 7.0]);
        assert_eq!(c.within(Some(5.0), Some(7.0)), 1.0);
        near(c.within(None, Some(6.5)), 0.75, 1e-12);
        let c = Combination::new(5.0, [(-1.0, bias), (1.0, rectangular(0.1))]);
        near(c.interval_95()[0], 3.0 - 0.095, 1e-12);
        near(c.interval_95()[1], 5.0 + 0.095, 1e-12);
        near(c.within(Some(4.0), None), 0.5, 1e-9);
    }

    #[test]
    fn nothing_is_exact() {
        let c = Combination::new(5.0, []);
        assert_eq!(c.interval_95(), [5.0, 5.0]);
        assert_eq!(c.within(Some(5.0), Some(5.0)), 1.0);
        assert_eq!(c.within(None, Some(4.9)), 0.0);
    }

    /// More sources than are convolved one by one.
    #[test]
    fn a_large_source_among_hundreds() {
        let many = (0..500).map(|_| (0.02, rectangular(1.0)));
        let c = Combination::new(0.0, many.chain([(1.0, rectangular(1.0))]));
        // The rest is normal to a few parts in a thousand: σ = 0.02·√(500/3).
        let sigma = 0.02 * (500.0_f64 / 3.0).sqrt();
        let same = Combination::new(
            0.0,
            [
                (1.0, rectangular(1.0)),
                (1.0, Distribution::Normal { standard: sigma }),
            ],
        );
        near(c.interval_95()[1], same.interval_95()[1], 1e-4);
    }
}
