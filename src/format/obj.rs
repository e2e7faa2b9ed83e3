//! OBJ: vertices, polygons, and the names that are in force over them.
//!
//! The statements are those of appendix B1 of the Advanced Visualizer manual (common practice
//! since). `v` and `f` make the mesh; `o`, `g` and `usemtl` name it; texture coordinates,
//! normals, lines and points are passed over; curves and free-form surfaces are not read, and
//! said so.
//!
//! Names: the `o` in force names triangles; where the file has had no `o` yet, the `g` in force;
//! without that, the `usemtl` in force. A `g` after an `o` does not rename. An `o` without a name
//! ends the one before and leaves triangles unnamed. All words after `g` are one name. `#` is a
//! comment at the beginning of a statement and after numbers, but belongs to a name
//! (`o bracket #2`).

mod resolve;
mod scan;
pub(super) mod triangulate;
pub(super) mod warp;

use crate::error::{Error, Kind, Result};
use crate::format::chunk;
use crate::mesh::Soup;

pub(crate) use scan::is_keyword;
pub use triangulate::triangulate;

/// Most corners that one polygon may have. Cutting a polygon takes time that can grow with the
/// square of its corners; real exports stay far below.
pub const MAX_CORNERS: usize = 1 << 16;

/// Reads an OBJ. Polygons are cut into triangles of their own corners, so that each edge of a
/// polygon is the edge of exactly one of its triangles; see [`triangulate`].
///
/// # Errors
/// `bad-number`, `not-finite`, `bad-index`, `too-large` with the line, and `empty`.
pub fn parse(bytes: &[u8]) -> Result<Soup> {
    let ending = chunk::line_ending(bytes);
    let start = if bytes.starts_with(b"\xef\xbb\xbf") {
        3
    } else {
        0
    };
    let mut pieces = chunk::pieces(bytes, chunk::PIECE, |at| next_statement(bytes, at, ending));
    if let Some(first) = pieces.first_mut() {
        first.start = start.min(first.end);
    }
    if pieces.iter().any(|p| p.len() as u64 > u64::from(u32::MAX)) {
        return Err(Error::new(
            Kind::TooLarge,
            "a single statement is longer than 4 GiB",
            "export the mesh again as triangles",
        ));
    }
    let parts = chunk::read_pieces(bytes, &pieces, |range| {
        scan::scan(bytes, range, ending, usize::MAX).map(|s| s.piece)
    })?;
    resolve::resolve(bytes, ending, &pieces, parts)
}

/// The beginning of the next statement after `at`: after a line end that no `\` continues.
fn next_statement(text: &[u8], mut at: usize, ending: u8) -> Option<usize> {
    loop {
        let end = chunk::line_end(text, at, ending);
        if end + 1 >= text.len() {
            return None;
        }
        let before = match text[..end].last() {
            Some(b'\r') => end.checked_sub(2),
            _ => end.checked_sub(1),
        };
        if before.is_none_or(|b| text[b] != b'\\') {
            return Some(end + 1);
        }
        at = end + 1;
    }
}
