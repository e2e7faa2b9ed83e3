//! STL, binary and text, told apart by structure: the word "solid" may begin either.
//!
//! Binary: 80 free bytes, a little-endian u32 count, then 50 bytes a triangle (normal, three
//! corners, two spare bytes). Text: `solid`, `facet normal`, `outer loop`, `vertex` lines.
//! Both as in the 3D Systems interface specification of 1989 (common practice since).

mod binary;
mod range;
mod text;

pub(crate) use binary::{HEADER, RECORD, count_in, declared, first_not_finite};
pub use binary::{check_finite, parse_unchecked as parse_binary_unchecked};
pub(crate) use range::{Cuts, parse_range};
pub use text::parse as parse_text;

use crate::error::Result;
use crate::format::Bytes;
use crate::mesh::Soup;

/// Whether these are the bytes of a binary STL: its count gives exactly its length.
pub fn is_binary(bytes: &[u8]) -> bool {
    binary::declared(bytes).is_some_and(|n| 84 + 50 * n == bytes.len() as u64)
}

/// Reads a binary STL. The records stay where they are; no triangle is copied.
///
/// # Errors
/// `truncated` or `count-mismatch` where count and length disagree, `empty`, and `not-finite`
/// with the triangle and its byte.
pub fn parse_binary(bytes: Bytes) -> Result<Soup> {
    let soup = binary::parse_unchecked(bytes)?;
    if let crate::mesh::Triangles::Records(records) = &soup.triangles {
        check_finite(records)?;
    }
    Ok(soup)
}

/// Reads an STL of either kind.
///
/// # Errors
/// Those of [`parse_binary`] and [`parse_text`].
pub fn parse(bytes: Bytes) -> Result<Soup> {
    if !is_binary(&bytes) && text::looks_like(&bytes) {
        text::parse(&bytes)
    } else {
        parse_binary(bytes)
    }
}

/// Whether these are the bytes of a text STL.
pub(crate) fn is_text(bytes: &[u8]) -> bool {
    !is_binary(bytes) && text::looks_like(bytes)
}
