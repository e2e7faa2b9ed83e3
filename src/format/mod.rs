//! One file a file format: bytes in, [`Soup`] out, errors with their place.

mod chunk;
mod detect;
mod faces;
mod family;
pub mod gltf;
pub mod gzip;
mod kinds;
mod number;
pub mod obj;
pub mod off;
mod pieces;
pub mod ply;
pub mod stl;
pub mod threemf;
mod whole;
pub mod write;

use std::path::Path;

pub use crate::bytes::Bytes;
pub use detect::{HEAD, detect, head_is_binary_stl};
pub use family::{Family, Format, stem};
pub use number::MAX_COORDINATE;
pub use whole::write_whole;

use crate::error::{Error, Kind, Result};
use crate::mesh::Soup;

/// Hands over the bytes of a file that a glTF names relative to itself. Readers open nothing
/// themselves.
pub type Neighbours<'a> = dyn Fn(&str) -> Result<Bytes> + 'a;

/// For bytes that came without their neighbours.
///
/// # Errors
/// `not-found`, always.
pub fn no_neighbours(name: &str) -> Result<Bytes> {
    Err(Error::new(
        Kind::NotFound,
        format!("it needs the file \"{name}\" beside it, which is not at hand"),
        "name the file on the disc, or export with the buffers embedded (.glb)",
    ))
}

/// Reads a file of any format that is read here, unpacking it first where it is packed by gzip,
/// and refuses coordinates that are not finite. `path` is for errors and for its extension; it is
/// not opened, and neither are files beside it (see [`no_neighbours`]).
///
/// # Errors
/// Those of [`gzip::unpack`], [`detect`] and of the format's own `parse`, with the path.
pub fn read(bytes: Bytes, path: &Path, hint: Option<Family>) -> Result<Soup> {
    let bytes = unpack(bytes, path)?;
    let format = detect(&bytes, path, hint)?;
    read_as(bytes, path, format, &no_neighbours)
}

/// Unpacks what is packed by gzip.
///
/// # Errors
/// Those of [`gzip::unpack`], with the path.
pub fn unpack(bytes: Bytes, path: &Path) -> Result<Bytes> {
    gzip::unpack(bytes).map_err(|e| e.in_file(path))
}

/// [`read`] of unpacked bytes whose format is known.
///
/// # Errors
/// As [`read`].
pub fn read_as(
    bytes: Bytes,
    path: &Path,
    format: Format,
    neighbours: &Neighbours<'_>,
) -> Result<Soup> {
    let soup = read_unchecked(bytes, path, format, neighbours)?;
    if let crate::mesh::Triangles::Records(records) = &soup.triangles {
        stl::check_finite(records).map_err(|e| e.in_file(path))?;
    }
    Ok(soup)
}

/// Reads unpacked bytes of a known format. The records of a binary STL are not looked at: the
/// caller runs [`stl::check_finite`], or folds it into a pass of its own. All else is checked
/// always.
///
/// # Errors
/// As [`read`], without `not-finite` for binary STL.
pub fn read_unchecked(
    bytes: Bytes,
    path: &Path,
    format: Format,
    neighbours: &Neighbours<'_>,
) -> Result<Soup> {
    match format {
        Format::StlBinary => stl::parse_binary_unchecked(bytes),
        Format::StlText => stl::parse_text(&bytes),
        Format::Obj => obj::parse(&bytes),
        Format::ThreeMf => threemf::parse(&bytes),
        Format::Ply => ply::parse(&bytes),
        Format::Off => off::parse(&bytes),
        Format::GltfBinary => gltf::parse_binary(&bytes, neighbours),
        Format::GltfText => gltf::parse_text(&bytes, neighbours),
    }
    .map_err(|e| e.in_file(path))
}
