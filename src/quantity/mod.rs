//! Units, a value with its tolerance, parsing and printing of both.
//!
//! Text is turned into SI by exact rational arithmetic and rounded to a double once, so that
//! `7.85 g/cm3` is 7850 kg/m³ to the last bit. A bare number is a length in the unit of the file
//! and nothing else: a density, mass or angle without a unit is an error.
//!
//! ```
//! use bismar::quantity::{Dimension, Quantity};
//!
//! let steel = Quantity::parse("7.85 g/cm3 ± 1 %", Dimension::Density, None)?;
//! assert_eq!(steel.value, 7850.0);
//! assert_eq!(steel.tolerance.map(|t| t.amount), Some(78.5));
//! # Ok::<(), bismar::quantity::QuantityError>(())
//! ```

mod dimension;
mod error;
mod exact;
mod print;
mod read;
mod symbols;
#[cfg(test)]
mod tests;
mod unit;
mod value;

pub use dimension::Dimension;
pub use error::QuantityError;
pub use print::Printed;
pub use unit::LengthUnit;
pub use value::{Coverage, Quantity, Tolerance};
