//! The least value of a function on a line whose slope is bounded: found, and proved.
//!
//! Between two samples f(a), f(b) of a function that changes by at most L per unit, its least value
//! is no less than (f(a) + f(b) − L·(b−a))/2. The interval with the lowest such bound is halved
//! until no bound lies below the least sample by more than what is allowed (Piyavskii 1972, Shubert
//! 1972). So a dip narrower than any step is found if it is deeper than that. The least sample is
//! then refined by golden sections between its neighbours.

use std::cmp::Ordering;
use std::collections::{BTreeMap, BinaryHeap};

/// What was found.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Least {
    /// Where.
    pub(super) at: f64,
    /// The least value found.
    pub(super) value: f64,
    /// Nothing on the line is less than `value` by more than this.
    pub(super) within: f64,
}

/// Between two samples; ordered so that the lowest bound is the greatest.
struct Interval {
    bound: f64,
    a: f64,
    b: f64,
}

impl Ord for Interval {
    fn cmp(&self, other: &Self) -> Ordering {
        let by_bound = other.bound.total_cmp(&self.bound);
        by_bound.then_with(|| other.a.total_cmp(&self.a))
    }
}

impl PartialOrd for Interval {
    fn partial_cmp(&self, other: &Self) -> Option<Ordering> {
        Some(self.cmp(other))
    }
}

impl PartialEq for Interval {
    fn eq(&self, other: &Self) -> bool {
        self.cmp(other) == Ordering::Equal
    }
}

impl Eq for Interval {}

/// Samples of several functions, taken once each.
pub(super) struct Samples<F> {
    of: F,
    taken: BTreeMap<u64, Vec<f64>>,
}

impl<E, F: FnMut(f64) -> Result<Vec<f64>, E>> Samples<F> {
    pub(super) fn new(of: F) -> Self {
        Self {
            of,
            taken: BTreeMap::new(),
        }
    }

    /// Value of function `n` at `s` ≥ 0.
    pub(super) fn get(&mut self, s: f64, n: usize) -> Result<f64, E> {
        // Bits of numbers that are not negative order as the numbers do.
        let key = s.to_bits();
        if let Some(values) = self.taken.get(&key) {
            return Ok(values[n]);
        }
        let values = (self.of)(s)?;
        let value = values[n];
        self.taken.insert(key, values);
        Ok(value)
    }

    /// The steepest slope between neighbouring samples of function `n` on [a, b].
    pub(super) fn steepest(&mut self, n: usize, a: f64, b: f64) -> Result<f64, E> {
        self.get(a, n)?;
        self.get(b, n)?;
        let at = self.within(a, b);
        let mut most: f64 = 0.0;
        for ends in at.windows(2) {
            let rise = self.get(ends[1], n)? - self.get(ends[0], n)?;
            most = most.max(rise.abs() / (ends[1] - ends[0]));
        }
        Ok(most)
    }

    /// Where samples were taken within [a, b].
    fn within(&self, a: f64, b: f64) -> Vec<f64> {
        let range = self.taken.range(a.to_bits()..=b.to_bits());
        range.map(|(k, _)| f64::from_bits(*k)).collect()
    }

    /// The least of function `n` on [a, b], its slope bounded by `steepest`.
    pub(super) fn least(
        &mut self,
        n: usize,
        a: f64,
        b: f64,
        steepest: f64,
        allowed: f64,
    ) -> Result<Least, E> {
        /// Samples beyond this are not worth what they still could find; what is not proved is
        /// said.
        const MOST: usize = 3000;
        self.get(a, n)?;
        self.get(b, n)?;
        let mut at = self.within(a, b);
        let mut least = f64::INFINITY;
        let mut open = BinaryHeap::new();
        for k in 0..at.len() {
            least = least.min(self.get(at[k], n)?);
            if k + 1 < at.len() {
                open.push(self.interval(n, at[k], at[k + 1], steepest)?);
            }
        }
        for _ in 0..MOST {
            let Some(lowest) = open.pop() else { break };
            let (a, b) = (lowest.a, lowest.b);
            let middle = a + (b - a) / 2.0;
            if least - lowest.bound <= allowed || !(middle > a && middle < b) {
                break;
            }
            least = least.min(self.get(middle, n)?);
            open.push(self.interval(n, a, middle, steepest)?);
            open.push(self.interval(n, middle, b, steepest)?);
            at.push(middle);
        }
        at.sort_by(f64::total_cmp);
        self.refine(n, &at)?;
        let at = self.within(a, b);
        let mut best = (a, f64::INFINITY);
        let mut bound = f64::INFINITY;
        for k in 0..at.len() {
            let f = self.get(at[k], n)?;
            if f < best.1 {
                best = (at[k], f);
            }
            if k + 1 < at.len() {
                let g = self.get(at[k + 1], n)?;
                bound = bound.min((f + g - steepest * (at[k + 1] - at[k])) / 2.0);
            }
        }
        Ok(Least {
            at: best.0,
            value: best.1,
            within: (best.1 - bound).max(0.0),
        })
    }

    fn interval(&mut self, n: usize, a: f64, b: f64, steepest: f64) -> Result<Interval, E> {
        let bound = (self.get(a, n)? + self.get(b, n)? - steepest * (b - a)) / 2.0;
        Ok(Interval { bound, a, b })
    }

    /// Golden sections between the neighbours of the least sample.
    fn refine(&mut self, n: usize, at: &[f64]) -> Result<(), E> {
        const GOLD: f64 = 0.618_033_988_749_894_9;
        let mut best = 0;
        for k in 0..at.len() {
            if self.get(at[k], n)? < self.get(at[best], n)? {
                best = k;
            }
        }
        let (mut a, mut b) = (at[best.saturating_sub(1)], at[(best + 1).min(at.len() - 1)]);
        let mut c = b - GOLD * (b - a);
        let mut d = a + GOLD * (b - a);
        while b - a > 1e-10 {
            if self.get(c, n)? < self.get(d, n)? {
                b = d;
                d = c;
                c = b - GOLD * (b - a);
            } else {
                a = c;
                c = d;
                d = a + GOLD * (b - a);
            }
        }
        Ok(())
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use std::convert::Infallible;

    fn least(f: impl Fn(f64) -> f64, steepest: f64, allowed: f64) -> (Least, usize) {
        let mut count = 0;
        let mut samples = Samples::new(|s| {
            count += 1;
            Ok::<_, Infallible>(vec![f(s)])
        });
        let Ok(least) = samples.least(0, 0.0, 1.0, steepest, allowed);
        (least, count)
    }

    #[test]
    fn a_spike_narrower_than_any_step_is_found() {
        // Slope 1 but for a spike of half-width 0.002 and slope 100.
        let f = |s: f64| s - (0.2 - 100.0 * (s - 0.7613).abs()).max(0.0) * 10.0;
        let (l, _) = least(f, 1001.0, 0.01);
        assert!((l.at - 0.7613).abs() < 1e-8, "{l:?}");
        assert!((l.value - (0.7613 - 2.0)).abs() < 1e-5, "{l:?}");
        assert!(l.within <= 0.011, "{l:?}");
    }

    #[test]
    fn a_smooth_least_is_refined() {
        let (l, count) = least(|s| (s - 0.3).powi(2), 2.0, 1e-3);
        assert!((l.at - 0.3).abs() < 1e-7 && l.value < 1e-14, "{l:?}");
        assert!(count < 400, "{count}");
    }

    #[test]
    fn an_end_may_be_the_least() {
        let (l, _) = least(|s| s, 1.0, 1e-6);
        assert_eq!((l.at, l.value), (0.0, 0.0));
        let (l, _) = least(|s| -s, 1.0, 1e-6);
        assert_eq!((l.at, l.value), (1.0, -1.0));
    }
}
