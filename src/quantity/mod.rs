//! Units, a value with its tolerance, parsing and printing of both.

mod unit;

pub use unit::LengthUnit;
