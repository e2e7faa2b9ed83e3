//! Decimal numbers in text: the f64 nearest to what is written, and how finely it was written.

use crate::error::{Error, Kind};

/// Largest magnitude of a coordinate in a text file, in the file's unit.
///
/// Second moments of a solid are of the fifth degree in its coordinates; (1e60)⁵ = 1e300 still
/// leaves room below f64's 1.8e308 for the sum over all triangles. Nothing that is weighed comes
/// near it.
pub const MAX_COORDINATE: f64 = 1e60;

/// Powers of ten that f64 holds exactly.
const EXACT: [f64; 23] = [
    1e0, 1e1, 1e2, 1e3, 1e4, 1e5, 1e6, 1e7, 1e8, 1e9, 1e10, 1e11, 1e12, 1e13, 1e14, 1e15, 1e16,
    1e17, 1e18, 1e19, 1e20, 1e21, 1e22,
];

/// The finest way that any number of a set was written.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub(crate) struct Written {
    /// Largest number of decimals (digits after the point, less the exponent).
    pub(crate) decimals: i32,
    /// Largest value of the digits read as one whole number; its length is the number of
    /// significant digits.
    pub(crate) digits: u64,
    /// Whether they are 32-bit floats, whose spacing then is the step.
    pub(crate) single: bool,
}

impl Written {
    /// The finest of both.
    pub(crate) fn merge(&mut self, other: Self) {
        self.decimals = self.decimals.max(other.decimals);
        self.digits = self.digits.max(other.digits);
        self.single |= other.single;
    }

    /// Of binary floats, 32 bits wide or 64.
    pub(crate) fn binary(single: bool) -> Self {
        Self {
            decimals: i32::MAX,
            digits: u64::MAX,
            single,
        }
    }

    /// One unit of the last digit of a coordinate of magnitude `size`, for a file written with a
    /// fixed number of decimals or of significant digits, whichever is coarser; never below the
    /// spacing of f64 there.
    pub(crate) fn step(self, size: f64) -> f64 {
        let by_decimals = 10f64.powi(-self.decimals.min(300));
        let significant = self.digits.max(1).ilog10() as i32 + 1;
        let by_digits = if size > 0.0 {
            10f64.powi((size.log10().floor() as i32 + 1 - significant).clamp(-300, 300))
        } else {
            0.0
        };
        let spacing = if self.single {
            f64::from(f32::EPSILON)
        } else {
            f64::EPSILON
        };
        by_decimals.max(by_digits).max(size * spacing)
    }
}

/// Any byte up to the blank separates words: blanks, tabs, line ends, and the NUL or Ctrl-Z that
/// some systems leave at the end of a text.
#[inline(always)]
pub(crate) fn is_blank(byte: u8) -> bool {
    byte <= b' '
}

/// The first position from `at` on that is not blank (line ends are blank too).
#[inline(always)]
pub(crate) fn skip_blank(text: &[u8], mut at: usize) -> usize {
    while let Some(&byte) = text.get(at)
        && is_blank(byte)
    {
        at += 1;
    }
    at
}

/// The end of the word that starts at `at`.
#[inline]
pub(crate) fn word_end(text: &[u8], mut at: usize) -> usize {
    while let Some(&byte) = text.get(at)
        && !is_blank(byte)
    {
        at += 1;
    }
    at
}

/// Powers of ten for up to eight digits.
const TENS: [u64; 9] = [
    1,
    10,
    100,
    1_000,
    10_000,
    100_000,
    1_000_000,
    10_000_000,
    100_000_000,
];

/// Reads up to eight digits at `at` and appends them to `mantissa`; returns how many there were.
///
/// The arithmetic works on all eight bytes of a word at once: the first byte that is no digit is
/// found by carries into the top bits, the digits before it are moved to the end of the word, and
/// pairs, fours and eights of them are combined.
#[inline(always)]
fn digits(text: &[u8], at: usize, mantissa: &mut u64) -> usize {
    let Some(bytes) = text.get(at..).and_then(|rest| rest.first_chunk::<8>()) else {
        let rest = text.get(at..).unwrap_or(&[]);
        let some = rest.iter().take_while(|b| b.is_ascii_digit());
        return some
            .map(|b| *mantissa = mantissa.wrapping_mul(10).wrapping_add(u64::from(b - b'0')))
            .count();
    };
    let word = u64::from_le_bytes(*bytes);
    let values = word.wrapping_sub(0x3030_3030_3030_3030);
    let others = (values | word.wrapping_add(0x4646_4646_4646_4646)) & 0x8080_8080_8080_8080;
    let count = (others.trailing_zeros() / 8) as usize;
    if count == 0 {
        return 0;
    }
    let values = values << (8 * (8 - count));
    let pairs = (values.wrapping_mul(10)).wrapping_add(values >> 8);
    let a = (pairs & 0x0000_00ff_0000_00ff).wrapping_mul(0x000f_4240_0000_0064);
    let b = ((pairs >> 16) & 0x0000_00ff_0000_00ff).wrapping_mul(0x0000_2710_0000_0001);
    let value = a.wrapping_add(b) >> 32;
    *mantissa = mantissa.wrapping_mul(TENS[count]).wrapping_add(value);
    count
}

/// Reads one number at `at` and returns its value, correctly rounded, and where it ends; the
/// caller sees to it that a separator follows. `nan` and `inf` words and overflow give
/// non-finite values.
#[inline(always)]
pub(crate) fn real(text: &[u8], at: usize, written: &mut Written) -> Option<(f64, usize)> {
    let mut p = at;
    let sign = text.get(p).copied()?;
    if sign == b'-' || sign == b'+' {
        p += 1;
    }
    let mut mantissa = 0u64;
    let start = p;
    while let Some(d) = text.get(p).map(|b| b.wrapping_sub(b'0'))
        && d < 10
    {
        mantissa = mantissa.wrapping_mul(10).wrapping_add(u64::from(d));
        p += 1;
    }
    let mut count = p - start;
    let mut exponent = 0i32;
    if text.get(p) == Some(&b'.') {
        p += 1;
        let fraction = p;
        loop {
            let some = digits(text, p, &mut mantissa);
            p += some;
            if some < 8 {
                break;
            }
        }
        count += p - fraction;
        if count > 19 {
            return slow(text, at, written);
        }
        exponent = -((p - fraction) as i32);
    }
    if count == 0 || count > 19 {
        return slow(text, at, written);
    }
    if let Some(b'e' | b'E') = text.get(p) {
        let mut q = p + 1;
        let negative = text.get(q) == Some(&b'-');
        if let Some(b'-' | b'+') = text.get(q) {
            q += 1;
        }
        let first = q;
        let mut power = 0i32;
        while let Some(d) = text.get(q).map(|b| b.wrapping_sub(b'0'))
            && d < 10
        {
            power = power.saturating_mul(10).saturating_add(i32::from(d));
            q += 1;
        }
        if q == first {
            return None;
        }
        p = q;
        let power = power.min(100_000);
        exponent += if negative { -power } else { power };
    }
    written.decimals = written.decimals.max(-exponent);
    written.digits = written.digits.max(mantissa);
    // W. D. Clinger, "How to read floating point numbers accurately" (1990): a whole number up to
    // 2^53 and a power of ten up to 10^22 are both exact, so one operation rounds once.
    let value = if mantissa <= 1 << 53 && (-22..=22).contains(&exponent) {
        let m = mantissa as f64;
        if exponent < 0 {
            m / EXACT[exponent.unsigned_abs() as usize]
        } else {
            m * EXACT[exponent as usize]
        }
    } else {
        let (value, used) = fast_float2::parse_partial::<f64, _>(text.get(at..p)?).ok()?;
        return (used == p - at).then_some((value, p));
    };
    Some((if sign == b'-' { -value } else { value }, p))
}

/// Long numbers and words such as `nan`.
#[cold]
#[inline(never)]
fn slow(text: &[u8], at: usize, written: &mut Written) -> Option<(f64, usize)> {
    let (value, used) = fast_float2::parse_partial::<f64, _>(&text[at..]).ok()?;
    let token = &text[at..at + used];
    let digit_count = |part: &[u8]| part.iter().filter(|b| b.is_ascii_digit()).count();
    let significand = token.split(|b| matches!(b, b'e' | b'E')).next()?;
    if digit_count(significand) > 19 {
        let point = memchr::memchr(b'.', significand).unwrap_or(significand.len());
        let power: i32 = std::str::from_utf8(token.get(significand.len() + 1..).unwrap_or(b""))
            .ok()
            .and_then(|t| t.parse().ok())
            .unwrap_or(0);
        let decimals = i32::try_from(digit_count(&significand[point..])).unwrap_or(i32::MAX);
        written.decimals = written.decimals.max(decimals.saturating_sub(power));
        written.digits = u64::MAX;
    }
    Some((value, at + used))
}

/// The word at `at`, for a message: at most 40 characters.
pub(crate) fn token_at(text: &[u8], at: usize) -> String {
    let end = word_end(text, at).min(at + 160);
    let word = String::from_utf8_lossy(text.get(at..end).unwrap_or(b""));
    let mut short: String = word.chars().take(40).collect();
    if short.len() < word.len() {
        short.push('…');
    }
    short
}

/// The error for the word at `at` where a coordinate must stand.
#[cold]
#[inline(never)]
pub(crate) fn not_a_number(text: &[u8], at: usize, what: &str) -> Error {
    let token = token_at(text, at);
    let value = fast_float2::parse::<f64, _>(token.as_bytes());
    if let Ok(value) = value
        && (value.is_nan() || value.abs() > MAX_COORDINATE)
    {
        let why = if value.is_nan() {
            "not a number"
        } else if token.bytes().any(|b| b.is_ascii_digit()) {
            "too large for its moments to be finite"
        } else {
            "infinite"
        };
        return Error::new(
            Kind::NotFinite,
            format!("{what} \"{token}\" is {why}"),
            "export the mesh again; the program that wrote it could not compute this coordinate",
        );
    }
    let advice = if token.contains(',') {
        "write numbers with a decimal point, not a comma, and separate them by blanks"
    } else {
        "three numbers separated by blanks must stand here; export the mesh again"
    };
    let message = if token.is_empty() {
        format!("a number is missing: {what} must stand here")
    } else {
        format!("\"{token}\" is not a number: {what} must stand here")
    };
    Error::new(Kind::BadNumber, message, advice)
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    fn value(text: &str) -> Option<f64> {
        let (v, end) = real(text.as_bytes(), 0, &mut Written::default())?;
        (end == text.len()).then_some(v)
    }

    #[test]
    fn numbers_keep_the_value_written() {
        for text in [
            "0",
            "-0",
            "1",
            "+1",
            "1.",
            ".5",
            "-.5e1",
            "1e22",
            "1e23",
            "0.1",
            "1.7976931348623157e308",
            "4.9e-324",
            "2.2250738585072011e-308",
            "9007199254740993",
            "123456789.123456789",
            "0.000000000000000000000000000001",
            "1234567890123456789012345",
            "3.4028234e38",
            "5e-1",
            "1E5",
            "1e+05",
            "12345678.12345678",
            "-1.234567e-03",
            "0.30000000000000004",
            "100000000000000000000000.000000000000001",
        ] {
            let expected: f64 = text.parse().unwrap();
            assert_eq!(
                value(text).map(f64::to_bits),
                Some(expected.to_bits()),
                "{text}"
            );
        }
    }

    #[test]
    fn junk_is_no_number() {
        for text in [
            "", "-", "+", ".", "e5", "1e", "1e+", "1,5", "1.5.2", "0x10", "1d5", "--1", "1_0",
            "vertex",
        ] {
            assert_eq!(value(text), None, "{text}");
        }
    }

    #[test]
    fn how_finely_numbers_are_written() {
        let mut w = Written::default();
        for text in ["1.500000", "12.250000", "-100.125000"] {
            real(text.as_bytes(), 0, &mut w);
        }
        assert_eq!(
            w,
            Written {
                decimals: 6,
                digits: 100_125_000,
                single: false,
            }
        );
        assert_eq!(w.step(100.0), 1e-6);
        let mut w = Written::default();
        real(b"1.23457e-05", 0, &mut w);
        assert_eq!(w.decimals, 10);
        // Six significant digits: a coordinate of a few hundred is known to 1e-3.
        assert_eq!(w.step(100.0), 1e-3);
    }

    proptest! {
        // std's parser is documented to be correctly rounded.
        #[test]
        fn same_value_as_std(x in any::<f64>().prop_filter("finite", |x| x.is_finite()), form in 0..4) {
            let text = match form { 0 => format!("{x}"), 1 => format!("{x:e}"), 2 => format!("{x:.6e}"), _ => format!("{:.7}", x % 1e9) };
            prop_assert_eq!(value(&text).map(f64::to_bits), Some(text.parse::<f64>().unwrap().to_bits()), "{}", text);
        }

        #[test]
        fn any_bytes(bytes in prop::collection::vec(any::<u8>(), 0..40)) {
            if let Some((_, end)) = real(&bytes, 0, &mut Written::default()) {
                prop_assert!(end <= bytes.len() && end > 0);
            }
        }
    }
}
