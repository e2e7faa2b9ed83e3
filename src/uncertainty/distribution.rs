//! What is known of how far a source may be off.

use super::random::Draws;
use crate::quantity::{Coverage, Tolerance};

/// How far a source may be off what was stated. Every one is symmetric about its own mean, which
/// is zero but for [`Distribution::Interval`].
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Distribution {
    /// Stated as standard deviations: `± x (k=1)`, `(k=2)` (JCGM 100:2008, 4.3.3).
    Normal {
        /// One standard deviation.
        standard: f64,
    },
    /// Stated as bounds with nothing known in between: `± x` (4.3.7); standard deviation x/√3.
    Rectangular {
        /// x.
        half_width: f64,
    },
    /// Bounds with the middle more likely (4.3.9); standard deviation x/√6.
    Triangular {
        /// x.
        half_width: f64,
    },
    /// A bias between two ends that need not lie about zero, of which nothing says how much
    /// applies: that of facets, the growth that is still to come. Its standard deviation is that of
    /// a value anywhere in between (4.3.7); intervals of a sum reach over all of it.
    Interval {
        /// The lower end.
        low: f64,
        /// The upper end.
        high: f64,
    },
}

impl Distribution {
    /// Its name, as shown.
    pub fn name(self) -> &'static str {
        match self {
            Self::Normal { .. } => "normal",
            Self::Rectangular { .. } => "rectangular",
            Self::Triangular { .. } => "triangular",
            Self::Interval { .. } => "interval",
        }
    }

    /// The expectation.
    pub fn mean(self) -> f64 {
        match self {
            Self::Interval { low, high } => low + 0.5 * (high - low),
            _ => 0.0,
        }
    }

    /// The standard deviation about the mean.
    pub fn standard(self) -> f64 {
        match self {
            Self::Normal { standard } => standard,
            Self::Rectangular { half_width } => half_width / 3.0_f64.sqrt(),
            Self::Triangular { half_width } => half_width / 6.0_f64.sqrt(),
            Self::Interval { low, high } => (high - low) / 12.0_f64.sqrt(),
        }
    }

    /// The two values between which it lies for certain; none for a normal one.
    pub fn bounds(self) -> Option<[f64; 2]> {
        match self {
            Self::Normal { .. } => None,
            Self::Rectangular { half_width } | Self::Triangular { half_width } => {
                Some([-half_width, half_width])
            }
            Self::Interval { low, high } => Some([low, high]),
        }
    }

    /// The characteristic function about the mean, E exp(i·t·(X − mean)); real, since each is
    /// symmetric there.
    pub(super) fn characteristic(self, t: f64) -> f64 {
        match self {
            Self::Normal { standard } => (-0.5 * (standard * t).powi(2)).exp(),
            Self::Rectangular { half_width } => sinc(half_width * t),
            Self::Triangular { half_width } => sinc(0.5 * half_width * t).powi(2),
            Self::Interval { low, high } => sinc(0.5 * (high - low) * t),
        }
    }

    /// What `characteristic` is at most in size for this and every greater `t`.
    pub(super) fn envelope(self, t: f64) -> f64 {
        let under = |x: f64| (1.0 / x.abs()).min(1.0);
        match self {
            Self::Normal { .. } => self.characteristic(t),
            Self::Rectangular { half_width } => under(half_width * t),
            Self::Triangular { half_width } => under(0.5 * half_width * t).powi(2),
            Self::Interval { low, high } => under(0.5 * (high - low) * t),
        }
    }

    /// One draw.
    pub(super) fn draw(self, draws: &mut Draws) -> f64 {
        match self {
            Self::Normal { standard } => standard * draws.normal(),
            Self::Rectangular { half_width } => half_width * (2.0 * draws.uniform() - 1.0),
            Self::Triangular { half_width } => half_width * (draws.uniform() - draws.uniform()),
            Self::Interval { low, high } => low + (high - low) * draws.uniform(),
        }
    }
}

impl From<Tolerance> for Distribution {
    fn from(t: Tolerance) -> Self {
        match t.coverage {
            Coverage::HalfWidth => Self::Rectangular {
                half_width: t.amount,
            },
            Coverage::Standard { .. } => Self::Normal {
                standard: t.standard(),
            },
        }
    }
}

fn sinc(x: f64) -> f64 {
    // The next term of the series, x⁴/120, is below rounding there.
    if x.abs() < 1e-4 {
        1.0 - x * x / 6.0
    } else {
        x.sin() / x
    }
}
