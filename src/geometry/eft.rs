//! Error-free transformations: a floating-point operation together with its exact rounding error.
//!
//! Knuth's two-sum, Dekker's split product, and the product by fused multiply-add; together they
//! give the compensated sums and dot products of Ogita, Rump and Oishi, "Accurate sum and dot
//! product", SIAM J. Sci. Comput. 26 (2005). All are exact barring overflow and underflow, so the
//! two ways of forming a product give the same bits.

/// a + b = sum + error, exactly.
#[inline(always)]
pub fn two_sum(a: f64, b: f64) -> (f64, f64) {
    let sum = a + b;
    let part = sum - a;
    (sum, (a - (sum - part)) + (b - part))
}

/// a − b = difference + error, exactly.
#[inline(always)]
pub fn two_diff(a: f64, b: f64) -> (f64, f64) {
    two_sum(a, -b)
}

/// How a product and its error are formed. The bits are the same either way; the speed is not.
pub trait Product: Copy {
    /// a · b = product + error, exactly.
    fn two_prod(a: f64, b: f64) -> (f64, f64);
}

/// By fused multiply-add; fast only where the processor has one.
#[derive(Clone, Copy, Debug)]
pub struct Fused;

/// By Dekker's splitting; fast everywhere.
#[derive(Clone, Copy, Debug)]
pub struct Split;

impl Product for Fused {
    #[inline(always)]
    fn two_prod(a: f64, b: f64) -> (f64, f64) {
        let p = a * b;
        (p, a.mul_add(b, -p))
    }
}

impl Product for Split {
    #[inline(always)]
    fn two_prod(a: f64, b: f64) -> (f64, f64) {
        // 2^27 + 1 splits 53 bits into 26 + 26 with a sign.
        const SPLITTER: f64 = 134_217_729.0;
        let split = |x: f64| {
            let t = SPLITTER * x;
            let high = t - (t - x);
            (high, x - high)
        };
        let p = a * b;
        let (ah, al) = split(a);
        let (bh, bl) = split(b);
        (p, al * bl - (((p - ah * bh) - al * bh) - ah * bl))
    }
}

/// A running sum with its carried error: as accurate as twice the working precision.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Sum {
    high: f64,
    low: f64,
}

impl Sum {
    /// Nothing.
    pub const ZERO: Self = Self {
        high: 0.0,
        low: 0.0,
    };

    /// Adds one term.
    #[inline(always)]
    pub fn add(&mut self, x: f64) {
        let (s, e) = two_sum(self.high, x);
        self.high = s;
        self.low += e;
    }

    /// Adds another running sum.
    #[inline(always)]
    pub fn join(&mut self, other: Self) {
        self.add(other.high);
        self.low += other.low;
    }

    /// The rounded total.
    pub fn value(self) -> f64 {
        self.high + self.low
    }

    /// From its two parts.
    pub fn from_parts(high: f64, low: f64) -> Self {
        Self { high, low }
    }

    /// Its two parts: the running sum, and the error carried beside it.
    pub fn parts(self) -> (f64, f64) {
        (self.high, self.low)
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    proptest! {
        #[test]
        fn both_products_agree_to_the_bit(a in -1e100..1e100f64, b in -1e100..1e100f64) {
            prop_assert_eq!(Fused::two_prod(a, b), Split::two_prod(a, b));
        }
    }

    #[test]
    fn a_sum_that_cancels_keeps_its_small_part() {
        let mut s = Sum::default();
        for x in [1e16, 1.0, -1e16, 1e-3] {
            s.add(x);
        }
        assert_eq!(s.value(), 1.001);
    }
}
