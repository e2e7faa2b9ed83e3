//! Units of length that a mesh can be in.

use std::fmt;
use std::str::FromStr;

use num_rational::BigRational;
use serde::{Deserialize, Serialize};

use super::error::QuantityError;
use super::exact;
use crate::error::Kind;

/// Unit of a mesh's coordinates and of bare lengths.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "lowercase")]
pub enum LengthUnit {
    /// Millimetre; assumed, and said, where nothing states a unit.
    #[default]
    Mm,
    /// Centimetre.
    Cm,
    /// Metre.
    M,
    /// International inch, 25.4 mm exactly.
    In,
    /// International foot, 304.8 mm exactly.
    Ft,
}

impl LengthUnit {
    /// Every unit, in the order in which they are offered.
    pub const ALL: [Self; 5] = [Self::Mm, Self::Cm, Self::M, Self::In, Self::Ft];

    /// Metres in one of this unit.
    pub fn metres(self) -> f64 {
        match self {
            Self::Mm => 1e-3,
            Self::Cm => 1e-2,
            Self::M => 1.0,
            Self::In => 0.0254,
            Self::Ft => 0.3048,
        }
    }

    /// The symbol.
    pub fn symbol(self) -> &'static str {
        match self {
            Self::Mm => "mm",
            Self::Cm => "cm",
            Self::M => "m",
            Self::In => "in",
            Self::Ft => "ft",
        }
    }

    /// Metres in one of this unit, exactly.
    pub(super) fn factor(self) -> BigRational {
        let (num, ten): (u32, i32) = match self {
            Self::Mm => (1, -3),
            Self::Cm => (1, -2),
            Self::M => (1, 0),
            Self::In => (254, -4),
            Self::Ft => (3048, -4),
        };
        BigRational::from_integer(num.into()) * exact::ten(ten)
    }
}

impl fmt::Display for LengthUnit {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.pad(self.symbol())
    }
}

impl FromStr for LengthUnit {
    type Err = QuantityError;

    fn from_str(text: &str) -> Result<Self, QuantityError> {
        let found = Self::ALL.into_iter().find(|u| u.symbol() == text.trim());
        found.ok_or_else(|| QuantityError {
            kind: Kind::Unit,
            message: format!("`{text}` is not a unit of length that a mesh can be in"),
            advice: "write one of mm, cm, m, in, ft".to_owned(),
            at: 0..text.len(),
        })
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn symbols_are_read_back_and_factors_agree() {
        for unit in LengthUnit::ALL {
            assert_eq!(unit.symbol().parse(), Ok(unit));
            assert_eq!(exact::nearest(&unit.factor()), Some(unit.metres()));
        }
        let e = "furlong".parse::<LengthUnit>().unwrap_err();
        assert_eq!(e.kind, Kind::Unit);
        assert!("MM".parse::<LengthUnit>().is_err());
    }
}
