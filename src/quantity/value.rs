//! A value with its tolerance, read from text.

use super::dimension::Dimension;
use super::error::QuantityError;
use super::print::Printed;
use super::read::Reader;
use super::unit::LengthUnit;

/// What a stated `± x` covers.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Coverage {
    /// `x` is the half-width of an interval in which every value is as likely (rectangular).
    HalfWidth,
    /// `x` is `k` standard deviations: written `(k=1)`, `(k=2)`.
    Standard {
        /// The coverage factor, above 0.
        k: f64,
    },
}

/// How far a value may be off.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Tolerance {
    /// Absolute, in the SI unit of the value; never negative.
    pub amount: f64,
    /// It was written as a percentage of the value.
    pub relative: bool,
    /// What the amount covers.
    pub coverage: Coverage,
}

impl Tolerance {
    /// The standard uncertainty, in the unit of `amount`: amount/√3 for a half-width (rectangular
    /// distribution, JCGM 100:2008, type B evaluation), amount/k for `k` standard deviations.
    pub fn standard(self) -> f64 {
        match self.coverage {
            Coverage::HalfWidth => self.amount / 3.0_f64.sqrt(),
            Coverage::Standard { k } => self.amount / k,
        }
    }
}

/// A value in the SI unit of its dimension (m, m², m³, kg, kg/m³, rad, a fraction of 1, kg m²,
/// m/s², m³/s², N, N m, s), with its tolerance if one was stated.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Quantity {
    /// In SI units; finite.
    pub value: f64,
    /// How far it may be off, if that was stated.
    pub tolerance: Option<Tolerance>,
}

impl Quantity {
    /// A value without a tolerance.
    pub fn exact(value: f64) -> Self {
        Self {
            value,
            tolerance: None,
        }
    }

    /// Reads a quantity of one dimension. A number without a unit is a length in `bare`, and an
    /// error for every other dimension or where `bare` is `None`.
    ///
    /// # Errors
    /// `bad-number` where no finite number stands, a value that cannot be negative is, or a
    /// tolerance is; `unit` where a unit is missing, unknown or measures something else.
    pub fn parse(
        text: &str,
        dimension: Dimension,
        bare: Option<LengthUnit>,
    ) -> Result<Self, QuantityError> {
        Self::parse_one_of(text, &[dimension], bare).map(|(_, q)| q)
    }

    /// Reads a quantity of any of several dimensions (a fill is a percentage, a volume, a mass or
    /// a level) and says which it is.
    ///
    /// # Errors
    /// As [`Quantity::parse`].
    pub fn parse_one_of(
        text: &str,
        dimensions: &[Dimension],
        bare: Option<LengthUnit>,
    ) -> Result<(Dimension, Self), QuantityError> {
        Reader {
            text,
            dimensions,
            bare,
        }
        .read()
    }

    /// A bare number of a TOML or JSON file: a length in `bare`, and nothing else. The decimal that
    /// was written is converted, not its nearest double: 0.1 in mm is 1e-4 m to the last bit.
    ///
    /// # Errors
    /// As [`Quantity::parse`].
    pub fn from_number(
        number: f64,
        dimension: Dimension,
        bare: Option<LengthUnit>,
    ) -> Result<Self, QuantityError> {
        // Both forms are the shortest decimal that reads back to the same double.
        let plain = format!("{number}");
        if plain.len() <= 24 {
            return Self::parse(&plain, dimension, bare);
        }
        Self::parse(&format!("{number:e}"), dimension, bare)
    }

    /// Text that [`Quantity::parse`] reads back to the same bits, in SI units.
    pub fn printed(self, dimension: Dimension) -> Printed {
        Printed {
            quantity: self,
            dimension,
        }
    }

    /// The standard uncertainty in the unit of the value; 0 where no tolerance was stated.
    pub fn standard(self) -> f64 {
        self.tolerance.map_or(0.0, Tolerance::standard)
    }
}
