//! Quantities as text that reads back to the same bits.

use std::fmt;

use num_traits::{One, Signed};

use super::dimension::Dimension;
use super::exact;
use super::value::{Coverage, Quantity, Tolerance};

/// A quantity with the dimension that its text needs; made by [`Quantity::printed`].
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Printed {
    pub(super) quantity: Quantity,
    pub(super) dimension: Dimension,
}

impl fmt::Display for Printed {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let Self {
            quantity,
            dimension,
        } = *self;
        write!(f, "{}", in_si(quantity.value, dimension))?;
        let Some(tolerance) = quantity.tolerance else {
            return Ok(());
        };
        match per_cent(quantity.value, tolerance) {
            Some(text) => write!(f, " ± {text} %")?,
            None => write!(f, " ± {}", in_si(tolerance.amount, dimension))?,
        }
        match tolerance.coverage {
            Coverage::HalfWidth => Ok(()),
            Coverage::Standard { k } => write!(f, " (k={k})"),
        }
    }
}

/// `value` in the SI unit of `dimension`; percentages for a fraction.
fn in_si(value: f64, dimension: Dimension) -> String {
    let Some(held) = exact::of(value) else {
        // Not reached by parsing; a hand-made value may be NaN or infinite.
        return format!("{value} {}", dimension.symbol());
    };
    let percent = exact::ten(2);
    let scale = match dimension {
        Dimension::Fraction => percent,
        _ => num_rational::BigRational::one(),
    };
    let text = exact::shortest(&(held * &scale), |d| {
        exact::nearest(&(d / &scale)) == Some(value)
    });
    format!("{text} {}", dimension.symbol())
}

/// The percentage that reads back to the tolerance's amount; `None` where it was not written so.
fn per_cent(value: f64, tolerance: Tolerance) -> Option<String> {
    let whole = exact::of(value)?.abs();
    if !tolerance.relative || value == 0.0 {
        return None;
    }
    let percent = exact::ten(2);
    let ratio = exact::of(tolerance.amount)? * &percent / &whole;
    Some(exact::shortest(&ratio, |p| {
        exact::nearest(&(p * &whole / &percent)) == Some(tolerance.amount)
    }))
}
