//! Sums of f64 without any rounding: the order and the grouping of the terms make no difference.
//!
//! A fixed-point number that spans all exponents of f64, in words of 32 bits held in 64, so that
//! carries wait (Kulisch and Miranker, "The arithmetic of the digital computer: a new approach",
//! SIAM Review 28(1), 1986; the waiting carries as in Neal, "Fast exact summation using small and
//! large superaccumulators", 2015).

/// Bits of a word.
const BITS: u32 = 32;
/// 2098 bits from the lowest of the smallest f64 to the highest of the largest, and 64 for the
/// carries of 2⁶⁴ terms.
const WORDS: usize = 68;
/// Terms after which carries must be brought up: each adds less than 2³² to a word.
const MOST_WAITING: u32 = 1 << 30;

/// A running sum of f64, exact.
#[derive(Clone, Debug)]
pub struct ExactSum {
    /// Word `i` weighs 2^(32 i − 1074). Between additions a word is any i64; see `settled`.
    words: [i64; WORDS],
    waiting: u32,
    /// The sum of the terms that are not finite; 0 without any.
    beyond: f64,
}

impl Default for ExactSum {
    fn default() -> Self {
        Self::ZERO
    }
}

impl PartialEq for ExactSum {
    /// Whether the sums are the same number.
    fn eq(&self, other: &Self) -> bool {
        self.beyond.to_bits() == other.beyond.to_bits() && self.settled() == other.settled()
    }
}

impl ExactSum {
    /// Nothing.
    pub const ZERO: Self = Self {
        words: [0; WORDS],
        waiting: 0,
        beyond: 0.0,
    };

    /// Adds one term.
    pub fn add(&mut self, x: f64) {
        let bits = x.to_bits();
        let exponent = ((bits >> 52) & 0x7ff) as u32;
        if exponent == 0x7ff {
            self.beyond += x;
            return;
        }
        let fraction = bits & ((1 << 52) - 1);
        // x = mantissa · 2^(up − 1074)
        let (mantissa, up) = match exponent {
            0 => (fraction, 0),
            e => (fraction | 1 << 52, e - 1),
        };
        let at = (up / BITS) as usize;
        let spread = u128::from(mantissa) << (up % BITS);
        let sign = if x < 0.0 { -1 } else { 1 };
        for k in 0..3 {
            self.words[at + k] += sign * i64::from((spread >> (BITS * k as u32)) as u32);
        }
        self.waiting += 1;
        if self.waiting >= MOST_WAITING {
            self.words = self.settled();
            self.waiting = 0;
        }
    }

    /// Adds another sum.
    pub fn join(&mut self, other: &Self) {
        self.words = self.settled();
        self.waiting = 1;
        for (mine, theirs) in self.words.iter_mut().zip(other.settled()) {
            *mine += theirs;
        }
        self.beyond += other.beyond;
    }

    /// With all carries brought up: words in 0..2³², the sign in the last.
    fn settled(&self) -> [i64; WORDS] {
        let mut words = self.words;
        let mut carry = 0;
        for word in &mut words[..WORDS - 1] {
            let all = *word + carry;
            *word = all & ((1 << BITS) - 1);
            carry = all >> BITS;
        }
        words[WORDS - 1] += carry;
        words
    }

    /// The sum, rounded once, to the nearest f64 (to even on ties).
    pub fn value(&self) -> f64 {
        // Also where infinities of both signs have met.
        if self.beyond != 0.0 {
            return self.beyond;
        }
        let mut words = self.settled();
        let negative = words[WORDS - 1] < 0;
        if negative {
            let mut turned = self.clone();
            turned.words = words.map(|w| -w);
            words = turned.settled();
        }
        let Some(top) = words.iter().rposition(|&w| w != 0) else {
            return 0.0;
        };
        // The highest three words hold more than 53 bits and one to round by, unless there are no
        // more than these.
        let word = |i: usize| (top + i).checked_sub(2).map_or(0, |at| words[at] as u128);
        let high = word(2) << (2 * BITS) | word(1) << BITS | word(0);
        let below = top >= 3 && words[..top - 2].iter().any(|&w| w != 0);
        let base = BITS as i32 * (top as i32 - 2) - 1074;
        let length = 128 - high.leading_zeros() as i32;
        let drop = (length - 53).max(-1074 - base).max(0);
        let mut kept = high >> drop;
        if drop > 0 {
            let half = 1u128 << (drop - 1);
            let rest = high & ((half << 1) - 1);
            if rest > half || rest == half && (below || kept & 1 == 1) {
                kept += 1;
            }
        }
        let size = scaled(kept as f64, base + drop);
        if negative { -size } else { size }
    }

    /// Numbers that add up to the sum exactly, each the rest rounded to the nearest f64: the first
    /// is [`ExactSum::value`]. The same for the same sum; none for zero. To be written down.
    pub fn parts(&self) -> Vec<f64> {
        let mut rest = self.clone();
        let mut out = Vec::new();
        loop {
            let part = rest.value();
            if part == 0.0 {
                return out;
            }
            out.push(part);
            if !part.is_finite() {
                return out;
            }
            rest.add(-part);
        }
    }

    /// From what [`ExactSum::parts`] gave.
    pub fn from_parts(parts: &[f64]) -> Self {
        let mut out = Self::ZERO;
        parts.iter().for_each(|&x| out.add(x));
        out
    }
}

/// x · 2^by for whole x below 2⁵⁴ and `by` ≥ −1074, where no bit is lost; infinite past the largest.
fn scaled(x: f64, by: i32) -> f64 {
    let power = |e: i32| match e {
        // The cast is of a number from 0 to 2046.
        -1022..=1023 => f64::from_bits(((e + 1023) as u64) << 52),
        e => f64::from_bits(1 << (e + 1074)),
    };
    if by > 1023 {
        return f64::INFINITY;
    }
    x * power(by)
}

#[cfg(test)]
mod tests {
    use super::*;
    use num_bigint::BigInt;
    use num_rational::BigRational;
    use num_traits::{ToPrimitive, Zero};
    use proptest::prelude::*;

    fn exact(terms: &[f64]) -> BigRational {
        let of = |x: &f64| BigRational::from_float(*x).unwrap();
        terms.iter().map(of).fold(BigRational::zero(), |a, b| a + b)
    }

    /// Every exponent, both signs.
    fn any_finite() -> impl Strategy<Value = f64> {
        any::<u64>()
            .prop_map(f64::from_bits)
            .prop_filter("finite", |x| x.is_finite())
    }

    proptest! {
        #[test]
        fn the_sum_is_the_exact_one_rounded_once(
            mut terms in prop::collection::vec(prop_oneof![any_finite(), -1e3..1e3f64, -1e-300..1e-300f64], 0..40),
            cancel in any::<bool>(),
            cut in any::<prop::sample::Index>(),
        ) {
            if cancel {
                // All but one term cancel.
                let back: Vec<f64> = terms.iter().skip(1).map(|x| -x).collect();
                terms.extend(back);
            }
            let mut sum = ExactSum::ZERO;
            terms.iter().for_each(|&x| sum.add(x));
            let want = exact(&terms);
            // Huge ones are left to the test of overflow below.
            if want.to_f64().is_some_and(f64::is_finite) && sum.value().is_finite() {
                let got = BigRational::from_float(sum.value()).unwrap();
                let miss = |x: f64| {
                    let x = BigRational::from_float(x).unwrap() - &want;
                    if x < BigRational::zero() { -x } else { x }
                };
                let here = miss(sum.value());
                for near in [sum.value().next_up(), sum.value().next_down()] {
                    if near.is_finite() {
                        prop_assert!(here <= miss(near), "{} of {want}", sum.value());
                    }
                }
                prop_assert_eq!(got.is_zero(), sum.value() == 0.0);
                // What is written down adds up exactly.
                let parts = sum.parts();
                prop_assert_eq!(exact(&parts), want);
                prop_assert_eq!(&ExactSum::from_parts(&parts), &sum);
            }
            // Any order, any grouping.
            let at = cut.index(terms.len() + 1);
            let mut other = ExactSum::ZERO;
            terms[at..].iter().rev().for_each(|&x| other.add(x));
            let mut first = ExactSum::ZERO;
            terms[..at].iter().for_each(|&x| first.add(x));
            other.join(&first);
            prop_assert_eq!(&other, &sum);
            prop_assert_eq!(other.value().to_bits(), sum.value().to_bits());
        }

        #[test]
        fn two_terms_add_as_the_processor_adds_them(a in any_finite(), b in any_finite()) {
            let mut sum = ExactSum::ZERO;
            sum.add(a);
            sum.add(b);
            // IEEE 754: one correct rounding. Of zeros the sign is the sum's own.
            prop_assert_eq!(sum.value() + 0.0, a + b + 0.0);
        }
    }

    #[test]
    fn the_ends_of_the_range_ties_and_what_is_not_finite() {
        let of = |terms: &[f64]| ExactSum::from_parts(terms).value();
        assert_eq!(of(&[f64::MAX, f64::MAX]), f64::INFINITY);
        assert_eq!(of(&[f64::MAX, f64::MAX, -f64::MAX]), f64::MAX);
        assert_eq!(of(&[-f64::MAX, -f64::MAX]), f64::NEG_INFINITY);
        let least = f64::from_bits(1);
        assert_eq!(of(&[least, least]), f64::from_bits(2));
        assert_eq!(
            of(&[f64::MIN_POSITIVE, -least]),
            f64::from_bits((1 << 52) - 1)
        );
        // A tie goes to even, and a bit far below breaks it.
        let half = 2f64.powi(-53);
        assert_eq!(of(&[1.0, half]), 1.0);
        assert_eq!(of(&[1.0, half, least]), 1.0f64.next_up());
        assert_eq!(of(&[1.0f64.next_up(), half]), 1.0 + 2f64.powi(-51));
        assert!(of(&[f64::INFINITY, f64::NEG_INFINITY]).is_nan());
        assert_eq!(of(&[1.0, f64::NEG_INFINITY]), f64::NEG_INFINITY);
        assert_eq!(of(&[]).to_bits(), 0);
        assert_eq!(
            exact(&[0.5]),
            BigRational::new(BigInt::from(1), BigInt::from(2))
        );
    }
}
