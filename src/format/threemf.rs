//! 3MF (3MF Consortium, "3D Manufacturing Format, Core Specification" 1.3; also ISO/IEC 25422).
//!
//! The objects of the build are read as its items and their components place them. A piece is
//! named by its object, else by the nearest object around it that has a name, else by a part
//! number; base materials name materials. Supports are left out, and said. Extensions that a file
//! requires are refused by name, unless they leave the surfaces of objects as they are.

mod build;
mod model;
mod package;
mod write;
mod xml;

use crate::error::{Error, Kind, Result};
use crate::mesh::Soup;

pub use write::{Written3mf, write_3mf};

const AGAIN: &str = "export or copy the file again";

fn bad(message: impl Into<String>) -> Error {
    Error::new(Kind::UnknownFormat, message, AGAIN)
}

/// Reads a 3MF package.
///
/// # Errors
/// `unknown-format` for what the specification does not allow or is not read, `truncated`,
/// `bad-number`, `not-finite`, `bad-index`, `unit`, `unknown-name` for a reference to nothing that
/// stands before it, `ambiguous-name` for an id given twice, `too-large`, `empty`; in a part of the
/// package with its name and line.
pub fn parse(bytes: &[u8]) -> Result<Soup> {
    let mut package = package::Package::open(bytes)?;
    let (name, text) = package.model()?;
    let inside = |mut e: Error| {
        e.message = format!("{name}: {}", e.message);
        e
    };
    parse_model(&text).map_err(inside)
}

/// Reads the model part of a 3MF, taken out of its package.
///
/// # Errors
/// As [`parse`].
pub fn parse_model(text: &[u8]) -> Result<Soup> {
    build::expand(model::parse(xml::utf8(text)?)?)
}

#[cfg(test)]
mod tests;
