//! The density table with sources.
//!
//! The densities stand in `materials.tsv` and the words by which the trade calls them in
//! `aliases.tsv`. A tolerance is the half-width of the range that the source states. Names are
//! compared without regard to case, spaces, hyphens, underscores and slashes.

mod parse;
mod table;

pub use table::{Material, Table};
