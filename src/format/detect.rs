//! Which format bytes are of.

use std::path::Path;

use super::{Family, Format, gzip, kinds, obj, stl};
use crate::error::{Error, Kind, Result};

/// Bytes that tell what a stream is.
pub const HEAD: usize = 512;

/// Finds out what the bytes are. Bytes decide; the `hint`, else the extension of `path`, only
/// where they leave it open (a damaged binary STL, an OBJ that begins with unknown statements, an
/// OFF that begins with its counts). Packed bytes are to be unpacked before.
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
        && !gzip::is_gzip(head)
        && kinds::looks_like(head, None).is_none()
}

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
    if let Some(known) = kinds::looks_like(bytes, hint) {
        return known;
    }
    match kinds::first_statement(bytes) {
        Some(word) if obj::is_keyword(word) => return Ok(Format::Obj),
        Some(_) if hint == Some(Family::Obj) && kinds::has_vertices(bytes) => {
            return Ok(Format::Obj);
        }
        // Comments alone: the reader says that there is no face.
        Some(b"") if hint == Some(Family::Obj) => return Ok(Format::Obj),
        // The keyword may be left out, and comments may stand before it.
        Some(word)
            if super::off::is_keyword(word)
                || hint == Some(Family::Off) && word.iter().all(u8::is_ascii_digit) =>
        {
            return Ok(Format::Off);
        }
        _ => {}
    }
    if kinds::is_binary(bytes) && (hint == Some(Family::Stl) || bytes.starts_with(b"solid")) {
        return Ok(Format::StlBinary);
    }
    Err(kinds::unknown(bytes, hint))
}
