//! Decimal numbers as exact rationals, so that a conversion is rounded once.

use num_bigint::BigInt;
use num_rational::BigRational;
use num_traits::{Signed, ToPrimitive, Zero};

/// Decimal exponents beyond this are out of the range of a double with any mantissa that fits the
/// longest text accepted; refusing them keeps the integers small.
const LARGEST_EXPONENT: i32 = 700;

/// 10^`exponent`, exactly.
pub(super) fn ten(exponent: i32) -> BigRational {
    let power = BigInt::from(10).pow(exponent.unsigned_abs());
    if exponent < 0 {
        BigRational::new_raw(BigInt::from(1), power)
    } else {
        BigRational::from_integer(power)
    }
}

/// The nearest double; `None` where it would be infinite, or zero for a value that is not.
pub(super) fn nearest(value: &BigRational) -> Option<f64> {
    if value.is_zero() {
        return Some(0.0);
    }
    value.to_f64().filter(|v| v.is_finite() && *v != 0.0)
}

/// The exact value of a finite double; `None` for others.
pub(super) fn of(value: f64) -> Option<BigRational> {
    BigRational::from_float(value)
}

/// Why the start of a text is no number.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Fault {
    /// No digit where one must be.
    NotANumber,
    /// The exponent is past all bounds.
    Range,
}

/// Reads the decimal number that `text` begins with: a sign (also U+2212), digits with at most one
/// point, and an exponent. Returns it with the number of bytes read.
pub(super) fn read(text: &str) -> Result<(BigRational, usize), Fault> {
    let (negative, mut at) = sign(text, 0);
    let mut digits = String::new();
    let mut scale = 0_i32;
    let mut point = false;
    let bytes = text.as_bytes();
    while let Some(&b) = bytes.get(at) {
        match b {
            b'0'..=b'9' => {
                digits.push(char::from(b));
                scale += i32::from(point);
            }
            b'.' if !point => {
                // A point that joins units (`5 kg.m2`) never follows a digit directly; one that
                // ends the digits (`5.`) is read as part of the number.
                point = true;
            }
            _ => break,
        }
        at += 1;
    }
    if digits.is_empty() {
        return Err(Fault::NotANumber);
    }
    let mut exponent = 0_i32;
    if matches!(bytes.get(at), Some(b'e' | b'E')) {
        let (negative, from) = sign(text, at + 1);
        let to = from
            + bytes[from.min(bytes.len())..]
                .iter()
                .take_while(|b| b.is_ascii_digit())
                .count();
        if to > from {
            let size: i32 = text[from..to].parse().map_err(|_| Fault::Range)?;
            exponent = if negative { -size } else { size };
            at = to;
        }
    }
    let mantissa: BigInt = digits.parse().map_err(|_| Fault::NotANumber)?;
    if mantissa.is_zero() {
        return Ok((BigRational::zero(), at));
    }
    if exponent.abs() > LARGEST_EXPONENT {
        return Err(Fault::Range);
    }
    let mantissa = if negative { -mantissa } else { mantissa };
    Ok((
        BigRational::from_integer(mantissa) * ten(exponent - scale),
        at,
    ))
}

fn sign(text: &str, at: usize) -> (bool, usize) {
    match text.get(at..).and_then(|t| t.chars().next()) {
        Some('-') => (true, at + 1),
        Some('\u{2212}') => (true, at + '\u{2212}'.len_utf8()),
        Some('+') => (false, at + 1),
        _ => (false, at),
    }
}

/// The shortest decimal, without exponent where that is short, for which `lands` is true of its
/// exact value; tried by rounding `value` to 1, 2, … 25 significant digits.
pub(super) fn shortest(value: &BigRational, lands: impl Fn(&BigRational) -> bool) -> String {
    let mut text = String::new();
    for digits in 1..=25 {
        text = rounded(value, digits);
        if read(&text).is_ok_and(|(v, _)| lands(&v)) {
            break;
        }
    }
    text
}

/// `value` to `digits` significant digits, as text that [`read`] takes.
fn rounded(value: &BigRational, digits: u32) -> String {
    if value.is_zero() {
        return "0".to_owned();
    }
    // The position of the leading digit, found from a double and corrected exactly.
    let size = value.abs();
    let guess = size.to_f64().filter(|v| v.is_normal()).unwrap_or(1.0);
    let mut lead = guess.log10().floor() as i32;
    while size >= ten(lead + 1) {
        lead += 1;
    }
    while size < ten(lead) {
        lead -= 1;
    }
    let last = lead + 1 - digits as i32;
    let whole = (size * ten(-last)).round().to_integer().to_string();
    let minus = if value.is_negative() { "-" } else { "" };
    let whole = whole.trim_end_matches('0');
    let kept = whole.len() as i32;
    // Trailing zeros were cut (and a carry may have added a digit): place the point again.
    let last = lead_after(value, digits, lead) + 1 - kept;
    if last >= 0 && last + kept <= 16 {
        format!("{minus}{whole}{}", "0".repeat(last as usize))
    } else if last < 0 && kept + last > 0 {
        let (a, b) = whole.split_at((kept + last) as usize);
        format!("{minus}{a}.{b}")
    } else if last < 0 && kept + last > -5 {
        format!("{minus}0.{}{whole}", "0".repeat((-kept - last) as usize))
    } else {
        format!("{minus}{whole}e{last}")
    }
}

/// The position of the leading digit after rounding: one higher where the digits carry over.
fn lead_after(value: &BigRational, digits: u32, lead: i32) -> i32 {
    let last = lead + 1 - digits as i32;
    let whole = (value.abs() * ten(-last)).round().to_integer();
    if whole >= BigInt::from(10).pow(digits) {
        lead + 1
    } else {
        lead
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    fn text_of(v: f64) -> String {
        let exact = of(v).unwrap();
        shortest(&exact, |d| nearest(d) == Some(v))
    }

    #[test]
    fn decimals_are_short_and_carry() {
        assert_eq!(text_of(7850.0), "7850");
        assert_eq!(text_of(-0.001), "-0.001");
        assert_eq!(text_of(3.986_004_418e14), "398600441800000");
        assert_eq!(text_of(1e-9), "1e-9");
        assert_eq!(text_of(1.5e300), "15e299");
        assert_eq!(text_of(99.5), "99.5");
        let exact = of(99.96).unwrap();
        assert_eq!(rounded(&exact, 3), "100");
        assert_eq!(rounded(&exact, 2), "100");
    }

    proptest! {
        /// Rust's own reader rounds correctly; ours goes by way of exact rationals.
        #[test]
        fn reads_like_the_standard_library(v in proptest::num::f64::NORMAL) {
            let text = format!("{v:e}");
            let (exact, used) = read(&text).unwrap();
            prop_assert_eq!(used, text.len());
            prop_assert_eq!(nearest(&exact), Some(v));
        }

        #[test]
        fn prints_what_it_reads(v in proptest::num::f64::NORMAL) {
            let text = text_of(v);
            prop_assert_eq!(read(&text).ok().and_then(|(e, _)| nearest(&e)), Some(v));
        }

        #[test]
        fn any_text_is_survived(text in "\\PC{0,12}") {
            let _ = read(&text);
        }
    }
}
