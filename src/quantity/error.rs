//! What is wrong with the text of a quantity, and where in it.

use std::fmt;
use std::ops::Range;

use crate::error::{Error, Kind};

/// A fault in the text of a quantity. It knows the place within the text; the caller knows the
/// file and the line.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct QuantityError {
    /// `bad-number`, or `unit` where the unit is missing, unknown or of the wrong dimension.
    pub kind: Kind,
    /// What is wrong, quoting the text.
    pub message: String,
    /// What to write instead.
    pub advice: String,
    /// The bytes of the text that are at fault; empty where something is missing.
    pub at: Range<usize>,
}

impl fmt::Display for QuantityError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{}", crate::text::shown(&self.message))
    }
}

impl std::error::Error for QuantityError {}

impl From<QuantityError> for Error {
    fn from(e: QuantityError) -> Self {
        Self::new(e.kind, e.message, e.advice)
    }
}
