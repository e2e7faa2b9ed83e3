//! From bodies to masses: the figures that a person reads, derived from moments at the very end.

mod figures;
mod print;

pub use figures::{About, Figures, Substance, box_union};
pub use print::{LEFT_OUT, PrintFigures, PrintedBody, Shares, TrappedFigures};
