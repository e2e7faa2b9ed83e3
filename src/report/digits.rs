//! Figures with as many digits as their uncertainty supports.
//!
//! An uncertainty is given to two significant digits and the value to the same decimal place
//! (JCGM 100:2008, 7.2.6). Between 1e-4 and 1e7 no exponent is used; `-0` is never printed.

use crate::quantity::LengthUnit;

/// What is shown for a figure that is not finite: there is none.
pub const NO_FIGURE: &str = "n/a";

/// Significant digits of a figure whose uncertainty is unknown.
pub const DEFAULT_DIGITS: u32 = 6;

/// A double carries 15 decimal digits whatever its uncertainty says.
const MOST_DIGITS: i32 = 15;

/// `value` to `digits` significant digits (at least 1, at most 15).
pub fn significant(value: f64, digits: u32) -> String {
    if !value.is_finite() {
        return NO_FIGURE.to_owned();
    }
    if value == 0.0 {
        return "0".to_owned();
    }
    let digits = i32::try_from(digits).map_or(MOST_DIGITS, |d| d.clamp(1, MOST_DIGITS));
    to_place(value, lead(value, digits) + 1 - digits)
}

/// A bound to two figures, rounded up: it must not look smaller than it is.
pub fn at_most(x: f64) -> String {
    let short = significant(x, 2);
    if x > 0.0 && short.parse::<f64>().is_ok_and(|s| s < x) {
        let step = 10f64.powf(x.log10().floor() - 1.0);
        return significant(x + step / 2.0, 2);
    }
    short
}

/// `value` to the decimal place of the second significant digit of its standard uncertainty; to
/// [`DEFAULT_DIGITS`] where there is none. A value below that place shows as zero.
pub fn figure(value: f64, standard: Option<f64>) -> String {
    match standard.and_then(place) {
        Some(last) if value.is_finite() => to_place(value, last.max(finest(value))),
        _ => significant(value, DEFAULT_DIGITS),
    }
}

/// `value` and its standard uncertainty, both to the same place: `("22.75", "0.22")`.
pub fn with_uncertainty(value: f64, standard: f64) -> (String, String) {
    (figure(value, Some(standard)), significant(standard, 2))
}

/// `value` to the place that its standard uncertainty supports; where there is none, or it is zero,
/// as `otherwise` says.
pub fn supported(value: f64, standard: Option<f64>, otherwise: impl Fn(f64) -> String) -> String {
    match standard.filter(|u| place(*u).is_some()) {
        Some(u) => figure(value, Some(u)),
        None => otherwise(value),
    }
}

/// The power of ten of the second significant digit of `uncertainty`, after rounding to two;
/// `None` where it is zero, negative or not finite.
pub fn place(uncertainty: f64) -> Option<i32> {
    (uncertainty.is_finite() && uncertainty > 0.0).then(|| lead(uncertainty, 2) - 1)
}

/// The place of the last digit that a double of this size can carry.
fn finest(value: f64) -> i32 {
    if value == 0.0 {
        i32::MIN
    } else {
        lead(value, MOST_DIGITS) + 1 - MOST_DIGITS
    }
}

/// The power of ten of the first digit of `value` (finite, not 0) once rounded to `digits`.
fn lead(value: f64, digits: i32) -> i32 {
    let text = format!("{:.*e}", usize::try_from(digits - 1).unwrap_or(0), value);
    // `{:e}` always writes an exponent.
    text.rsplit('e')
        .next()
        .and_then(|e| e.parse().ok())
        .unwrap_or(0)
}

/// `value` rounded to the power of ten `last`.
fn to_place(value: f64, last: i32) -> String {
    if value == 0.0 {
        return plain(0.0, last);
    }
    let first = lead(value, MOST_DIGITS);
    // Rounding may carry into a place above the first digit: 99.6 to the units is 100.
    let kept = first - last + 1;
    if kept < 0 {
        return plain(0.0, last);
    }
    if kept > 0 {
        let digits = usize::try_from(kept - 1).unwrap_or(0);
        let carried = lead(value, kept);
        if !(-4..7).contains(&carried) {
            let text = format!(
                "{:.*e}",
                digits + usize::try_from(carried - first).unwrap_or(0),
                value
            );
            return text;
        }
    }
    plain(value, last)
}

/// `value` rounded to the power of ten `last`, without an exponent.
fn plain(value: f64, last: i32) -> String {
    let text = match usize::try_from(last.saturating_neg()) {
        Ok(decimals) => format!("{value:.*}", decimals.min(340)),
        Err(_) => {
            let step = 10_f64.powi(last);
            format!("{:.0}", (value / step).round() * step)
        }
    };
    without_minus_zero(text)
}

fn without_minus_zero(text: String) -> String {
    match text.strip_prefix('-') {
        Some(rest) if !rest.contains(|c: char| c.is_ascii_digit() && c != '0') => rest.to_owned(),
        _ => text,
    }
}

/// Figures on one scale: what is shown times 10^`exponent`.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Shared {
    /// One text a figure, all to the same decimal place. `0` alone is exactly zero; `0.000` is
    /// below the rounding of the largest.
    pub cells: Vec<String>,
    /// A multiple of 3; 0 where the largest figure needs no exponent.
    pub exponent: i32,
}

/// A column of figures on one scale, the largest with `digits` significant digits.
pub fn shared(values: &[f64], digits: u32) -> Shared {
    let largest = largest(values);
    let digits = i32::try_from(digits).map_or(MOST_DIGITS, |d| d.clamp(1, MOST_DIGITS));
    shared_to(
        values,
        if largest == 0.0 {
            0
        } else {
            lead(largest, digits) + 1 - digits
        },
    )
}

/// A column of figures on one scale, to the place that the standard uncertainty supports.
pub fn shared_figures(values: &[f64], standard: Option<f64>) -> Shared {
    match standard.and_then(place) {
        Some(last) => shared_to(values, last.max(finest(largest(values)))),
        None => shared(values, DEFAULT_DIGITS),
    }
}

fn largest(values: &[f64]) -> f64 {
    values
        .iter()
        .filter(|v| v.is_finite())
        .fold(0.0, |m, v| m.max(v.abs()))
}

fn shared_to(values: &[f64], last: i32) -> Shared {
    let largest = largest(values);
    let first = if largest == 0.0 {
        0
    } else {
        lead(largest, MOST_DIGITS)
    };
    let exponent = if (-4..7).contains(&first) {
        0
    } else {
        first.div_euclid(3) * 3
    };
    let cells = values
        .iter()
        .map(|v| {
            if !v.is_finite() {
                NO_FIGURE.to_owned()
            } else if *v == 0.0 {
                "0".to_owned()
            } else {
                plain(shifted(*v, -exponent), last.saturating_sub(exponent))
            }
        })
        .collect();
    Shared { cells, exponent }
}

/// `value · 10^power`, by way of its decimal digits, so that no digit changes.
fn shifted(value: f64, power: i32) -> f64 {
    if power == 0 {
        return value;
    }
    let text = format!("{value:e}");
    match text.split_once('e') {
        Some((digits, e)) => e
            .parse::<i32>()
            .ok()
            .and_then(|e| format!("{digits}e{}", e + power).parse().ok())
            .unwrap_or(value),
        None => value,
    }
}

/// A 3×3 tensor on one scale, the largest element with `digits` significant digits.
pub fn tensor(elements: &[[f64; 3]; 3], digits: u32) -> ([[String; 3]; 3], i32) {
    let Shared { cells, exponent } = shared(elements.as_flattened(), digits);
    let mut cells = cells.into_iter();
    let rows = [(); 3].map(|()| [(); 3].map(|()| cells.next().unwrap_or_default()));
    (rows, exponent)
}

/// A 3×3 tensor on one scale, to the place that the standard uncertainty supports.
pub fn tensor_figures(elements: &[[f64; 3]; 3], standard: Option<f64>) -> ([[String; 3]; 3], i32) {
    let Shared { cells, exponent } = shared_figures(elements.as_flattened(), standard);
    let mut cells = cells.into_iter();
    let rows = [(); 3].map(|()| [(); 3].map(|()| cells.next().unwrap_or_default()));
    (rows, exponent)
}

/// A unit to show figures in.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Scale {
    /// The power of ten that an SI figure is multiplied by.
    pub power: i32,
    /// The unit's symbol.
    pub symbol: &'static str,
}

impl Scale {
    /// `si` in this unit; only the point moves.
    pub fn of(self, si: f64) -> f64 {
        shifted(si, self.power)
    }

    /// mg, g or kg, whichever suits a mass of `kg` (of a column: its largest).
    pub fn for_mass(kg: f64) -> Self {
        let (power, symbol) = match kg.abs() {
            m if m > 0.0 && m < 1e-3 => (6, "mg"),
            m if m > 0.0 && m < 1.0 => (3, "g"),
            _ => (0, "kg"),
        };
        Self { power, symbol }
    }
}

/// A length of `metres` in `unit`, rounded once.
pub fn length_in(metres: f64, unit: LengthUnit) -> f64 {
    match unit {
        LengthUnit::Mm => shifted(metres, 3),
        LengthUnit::Cm => shifted(metres, 2),
        LengthUnit::M => metres,
        LengthUnit::In | LengthUnit::Ft => metres / unit.metres(),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    #[test]
    fn significant_digits() {
        for (value, digits, text) in [
            (1234.567, 6, "1234.57"),
            (1234.567, 2, "1200"),
            (0.000_123_456, 3, "0.000123"),
            (0.000_012_345_6, 3, "1.23e-5"),
            (12_345_678.0, 3, "1.23e7"),
            (9_999_999.0, 3, "1.00e7"),
            (1_234_567.0, 3, "1230000"),
            (99.96, 3, "100"),
            (0.099_96, 3, "0.100"),
            (-0.0, 3, "0"),
            (0.0, 3, "0"),
            (-1.5, 1, "-2"),
            (f64::NAN, 3, "n/a"),
            (f64::INFINITY, 3, "n/a"),
        ] {
            assert_eq!(significant(value, digits), text, "{value} {digits}");
        }
    }

    /// JCGM 100:2008, 7.2.6: two digits of the uncertainty, and the value to the same place. The
    /// first two rows are the three items of the worked propagation (M 22.75 u 0.216564,
    /// X 123.736264 u 1.653453).
    #[test]
    fn digits_follow_the_uncertainty() {
        for (value, u, text, shown) in [
            (22.75, 0.216_564, "22.75", "0.22"),
            (123.736_264, 1.653_453, "123.7", "1.7"),
            (10.057_62, 0.027, "10.058", "0.027"),
            (123_456.0, 1234.0, "123500", "1200"),
            (5.0, 0.099_6, "5.00", "0.10"),
            (0.001, 0.5, "0.00", "0.50"),
            (-0.001, 0.5, "0.00", "0.50"),
            (3e-6, 1e-7, "3.00e-6", "1.0e-7"),
            (0.0, 0.012, "0.000", "0.012"),
            (0.97, 12.0, "1", "12"),
        ] {
            assert_eq!(
                with_uncertainty(value, u),
                (text.to_owned(), shown.to_owned()),
                "{value} {u}"
            );
        }
        assert_eq!(figure(1.234_567_8, None), "1.23457");
        assert_eq!(figure(1.234_567_8, Some(0.0)), "1.23457");
        // No more digits than a double has.
        assert_eq!(figure(0.1, Some(1e-30)), "0.100000000000000");
    }

    #[test]
    fn one_scale() {
        let column = shared(&[123.456, -0.000_01, 0.0, 7.0], 5);
        assert_eq!(column.cells, ["123.46", "0.00", "0", "7.00"]);
        assert_eq!(column.exponent, 0);
        let small = shared(&[1.234_56e-6, -4.5e-8], 4);
        assert_eq!(small.cells, ["1.235", "-0.045"]);
        assert_eq!(small.exponent, -6);
        let large = shared(&[1.5e9, f64::NAN, 2e7], 3);
        assert_eq!(large.cells, ["1.50", "n/a", "0.02"]);
        assert_eq!(large.exponent, 9);
        assert_eq!(shared(&[0.0, 0.0], 3).cells, ["0", "0"]);
        assert_eq!(
            shared_figures(&[12.345, 1.0], Some(0.2)).cells,
            ["12.35", "1.00"]
        );
        let (rows, exponent) = tensor(&[[2.0, -0.1, 0.0], [-0.1, 3.0, 1e-9], [0.0, 1e-9, 4.0]], 3);
        assert_eq!(rows[0], ["2.00", "-0.10", "0"]);
        assert_eq!(rows[1], ["-0.10", "3.00", "0.00"]);
        assert_eq!(exponent, 0);
    }

    #[test]
    fn scales() {
        let g = Scale::for_mass(0.35);
        assert_eq!((g.symbol, g.of(0.35)), ("g", 350.0));
        assert_eq!(Scale::for_mass(4.12).symbol, "kg");
        assert_eq!(Scale::for_mass(2e-4).symbol, "mg");
        assert_eq!(Scale::for_mass(0.0).symbol, "kg");
        assert_eq!(length_in(0.0021, LengthUnit::Mm), 2.1);
        assert_eq!(length_in(0.0254, LengthUnit::In), 1.0);
    }

    proptest! {
        /// What is shown is the value to half of its last place, has no `-0`, and never panics.
        #[test]
        fn figures_are_near(value in -1e12..1e12_f64, exponent in -20..20_i32, digits in 1..15_u32) {
            let value = value * 10_f64.powi(exponent - 6);
            let text = significant(value, digits);
            let read: f64 = text.parse().unwrap();
            let half = 0.5 * 10_f64.powi(1 - digits as i32);
            prop_assert!((read - value).abs() <= value.abs() * half * (1.0 + 1e-9) + 1e-300, "{value} {text}");
            prop_assert!(!text.starts_with("-0") || read != 0.0);
        }

        #[test]
        fn any_double_is_survived(value in any::<f64>(), u in any::<f64>()) {
            let _ = (figure(value, Some(u)), significant(value, 7), shared(&[value, u], 4));
            let _ = shared_figures(&[value, u], Some(u));
        }
    }
}
