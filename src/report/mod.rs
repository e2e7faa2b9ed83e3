//! What people and programs read. Renderers compute nothing: they print what results hold.

pub mod add;
pub mod balance;
pub mod check;
pub mod check_text;
pub mod copy;
pub mod digits;
mod document;
pub mod drain;
pub mod estimate;
pub mod facets;
mod footer;
mod look;
pub mod materials;
pub mod picture;
mod print_text;
mod service;
mod statics_text;
mod sure;
pub mod survey;
pub mod table;
pub mod travel;
pub mod trim;
pub mod weigh;
pub mod weigh_text;
mod whole_text;
mod words;

pub use document::{Document, Failure, InputFact, PROGRAM, Program, path_hex, to_json};
pub use footer::{CAUTION, footer};
#[cfg(feature = "cli")]
pub(crate) use words::kind_word;
