//! From bodies to masses: the figures that a person reads, derived from moments at the very end.

mod figures;

pub use figures::{About, Figures, Substance, box_union};
