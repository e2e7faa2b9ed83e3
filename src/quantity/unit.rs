//! Units of length that a mesh can be in.

use serde::{Deserialize, Serialize};

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
}
