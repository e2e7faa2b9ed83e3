//! One file a file format: bytes in, [`Soup`] out, errors with their place.

mod chunk;
mod kinds;
mod number;
pub mod obj;
pub mod stl;
mod whole;
pub mod write;

use std::fmt;
use std::path::Path;

pub use crate::bytes::Bytes;
pub use number::MAX_COORDINATE;
pub use whole::write_whole;

use crate::error::{Error, Kind, Result};
use crate::mesh::Soup;

/// The formats that are read.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Format {
    /// STL as records of 50 bytes.
    StlBinary,
    /// STL as text.
    StlText,
    /// OBJ.
    Obj,
}

/// What a person or a file name can say about a format; the bytes tell the rest.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Family {
    /// STL of either kind.
    Stl,
    /// OBJ.
    Obj,
}

impl Format {
    /// The name in JSON and in options: `stl` (for both kinds, see [`Format::is_text`]) or `obj`.
    pub fn name(self) -> &'static str {
        match self {
            Self::StlBinary | Self::StlText => "stl",
            Self::Obj => "obj",
        }
    }

    /// Whether its numbers are written as text, and so have lines.
    pub fn is_text(self) -> bool {
        self != Self::StlBinary
    }
}

/// In words: "binary STL", "text STL", "OBJ".
impl fmt::Display for Format {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(match self {
            Self::StlBinary => "binary STL",
            Self::StlText => "text STL",
            Self::Obj => "OBJ",
        })
    }
}

impl Family {
    /// The family that an option such as `--format stl` names.
    ///
    /// # Errors
    /// `usage`, with the names that there are.
    pub fn from_option(name: &str) -> Result<Self> {
        Self::of(name).ok_or_else(|| {
            Error::new(
                Kind::Usage,
                format!("\"{name}\" is not a format that is read"),
                "the formats are stl and obj",
            )
        })
    }

    /// The family that a file's extension names, in any case.
    pub fn from_path(path: &Path) -> Option<Self> {
        Self::of(path.extension()?.to_str()?)
    }

    fn of(name: &str) -> Option<Self> {
        match name.to_ascii_lowercase().as_str() {
            "stl" => Some(Self::Stl),
            "obj" => Some(Self::Obj),
            _ => None,
        }
    }
}

/// Finds out what the bytes are. Bytes decide; the `hint`, else the extension of `path`, only
/// where they leave it open (a damaged binary STL, an OBJ that begins with unknown statements).
///
/// # Errors
/// `empty` for no bytes, and `unknown-format`, with what it looks like and what to export instead.
pub fn detect(bytes: &[u8], path: &Path, hint: Option<Family>) -> Result<Format> {
    detect_bytes(bytes, hint.or_else(|| Family::from_path(path))).map_err(|e| e.in_file(path))
}

/// Whether a stream is taken as a binary STL by its first [`HEAD`] bytes, which must say so: a stream
/// has no length that its count could be compared with. What is not is read whole, and judged by
/// [`detect`].
pub fn head_is_binary_stl(head: &[u8]) -> bool {
    head.len() >= HEAD
        && kinds::is_binary(head)
        && !stl::is_text(head)
        && kinds::looks_like(head).is_none()
}

/// Bytes that tell what a stream is.
pub const HEAD: usize = 512;

fn detect_bytes(bytes: &[u8], hint: Option<Family>) -> Result<Format> {
    if bytes.is_empty() {
        return Err(Error::new(
            Kind::Empty,
            "the file is empty",
            "export the mesh again",
        ));
    }
    // A binary STL has 80 free bytes first, which may look like anything.
    if stl::is_binary(bytes) {
        return Ok(Format::StlBinary);
    }
    if stl::is_text(bytes) {
        return Ok(Format::StlText);
    }
    if let Some(other) = kinds::looks_like(bytes) {
        return Err(other);
    }
    match kinds::first_statement(bytes) {
        Some(word) if obj::is_keyword(word) => return Ok(Format::Obj),
        Some(_) if hint == Some(Family::Obj) && kinds::has_vertices(bytes) => {
            return Ok(Format::Obj);
        }
        // Comments alone: the reader says that there is no face.
        Some(b"") if hint == Some(Family::Obj) => return Ok(Format::Obj),
        _ => {}
    }
    if kinds::is_binary(bytes) && (hint == Some(Family::Stl) || bytes.starts_with(b"solid")) {
        return Ok(Format::StlBinary);
    }
    Err(kinds::unknown(bytes, hint))
}

/// Reads a file of any format that is read here, and refuses coordinates that are not finite.
/// `path` is for errors and for its extension; it is not opened.
///
/// # Errors
/// Those of [`detect`], [`stl::parse_binary`], [`stl::parse_text`] and [`obj::parse`], with the
/// path.
pub fn read(bytes: Bytes, path: &Path, hint: Option<Family>) -> Result<Soup> {
    let format = detect(&bytes, path, hint)?;
    let soup = read_unchecked(bytes, path, format)?;
    if let crate::mesh::Triangles::Records(records) = &soup.triangles {
        stl::check_finite(records).map_err(|e| e.in_file(path))?;
    }
    Ok(soup)
}

/// Reads a file of a known format. The records of a binary STL are not looked at: the caller runs
/// [`stl::check_finite`], or folds it into a pass of its own. Text is checked always.
///
/// # Errors
/// As [`read`], without `not-finite` for binary STL.
pub fn read_unchecked(bytes: Bytes, path: &Path, format: Format) -> Result<Soup> {
    match format {
        Format::StlBinary => stl::parse_binary_unchecked(bytes),
        Format::StlText => stl::parse_text(&bytes),
        Format::Obj => obj::parse(&bytes),
    }
    .map_err(|e| e.in_file(path))
}
