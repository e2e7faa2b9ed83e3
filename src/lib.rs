//! Mass, balance point and inertia of mesh exports, with every mesh proved closed or refused.
//!
//! Data flows one way:
//!
//! ```text
//! bytes → format → soup of named triangles → mesh (welded) → shells → bodies
//!       → moments → masses → assembly → verdicts → report
//! ```

#![deny(unsafe_code)]
#![warn(missing_docs)]

pub mod assembly;
pub mod bytes;
#[cfg(feature = "cli")]
pub mod command;
pub mod error;
pub mod format;
pub mod geometry;
pub mod limits;
pub mod masses;
pub mod material;
pub mod mesh;
pub mod moments;
pub mod quantity;
pub mod report;
pub mod soundness;
pub mod stream;
pub mod text;

pub use error::{Error, Kind, Result, Warning};
