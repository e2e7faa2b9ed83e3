//! glTF 2.0 (Khronos Group, "glTF 2.0 Specification", also ISO/IEC 12113:2022): one binary file,
//! or JSON with its buffers embedded or beside it.
//!
//! The meshes of the default scene are read as its nodes place them; a piece is named by its node,
//! else by its mesh. Lengths are metres, as the format has it. Triangles, strips and fans are
//! read; points and lines are passed over, and said. What changes the surface in ways that are not
//! read (compression, skins, morphing, instancing) is refused by its name.

mod accessor;
mod buffers;
mod container;
mod json;
mod scene;

use crate::error::{Error, Kind, Result};
use crate::format::Neighbours;
use crate::mesh::Soup;
use json::Root;

const AGAIN: &str = "export or copy the file again";

/// Required extensions that leave the surface as it is: looks, light, names.
const HARMLESS: &[&str] = &[
    "KHR_materials_",
    "KHR_texture_",
    "KHR_lights_",
    "KHR_xmp",
    "EXT_texture_",
    "EXT_lights_",
    "MSFT_texture_",
    // Only lets positions be whole numbers, which accessors here may be.
    "KHR_mesh_quantization",
];

fn bad(message: impl Into<String>) -> Error {
    Error::new(Kind::UnknownFormat, message, AGAIN)
}

/// Reads a binary glTF (`.glb`). `neighbours` hands over files beside it, which it may name.
///
/// # Errors
/// `unknown-format` for what glTF 2.0 does not allow or is not read, `truncated`,
/// `count-mismatch`, `bad-index`, `bad-number`, `not-finite`, `unknown-name` for an index of no
/// object, `cycle`, `too-large`, `empty`, and those of `neighbours`.
pub fn parse_binary(bytes: &[u8], neighbours: &Neighbours<'_>) -> Result<Soup> {
    let parts = container::split(bytes)?;
    let root = serde_json::from_slice(parts.json)
        .map_err(|e| bad(format!("its JSON is not that of a glTF: {e}")).at_byte(parts.json_at))?;
    parse(&root, parts.binary, neighbours)
}

/// Reads a glTF as JSON (`.gltf`). `neighbours` hands over the buffers beside it.
///
/// # Errors
/// As [`parse_binary`].
pub fn parse_text(text: &[u8], neighbours: &Neighbours<'_>) -> Result<Soup> {
    let text = text.strip_prefix(b"\xef\xbb\xbf").unwrap_or(text);
    let root = serde_json::from_slice(text).map_err(|e| {
        let error = bad(format!("its JSON is not that of a glTF: {e}"));
        match e.line() {
            0 => error,
            line => error.at_line(line as u64),
        }
    })?;
    parse(&root, None, neighbours)
}

fn parse(root: &Root, binary: Option<&[u8]>, neighbours: &Neighbours<'_>) -> Result<Soup> {
    let version = root
        .asset
        .min_version
        .as_ref()
        .unwrap_or(&root.asset.version);
    if version != "2.0" {
        return Err(Error::new(
            Kind::UnknownFormat,
            format!("this is glTF {version:?}, and 2.0 is read"),
            "export it as glTF 2.0",
        ));
    }
    if let Some(name) = root
        .extensions_required
        .iter()
        .find(|name| !HARMLESS.iter().any(|h| name.starts_with(h)))
    {
        return Err(extension(name));
    }
    let buffers = buffers::load(root, binary, neighbours)?;
    scene::read(root, &buffers)
}

/// The refusal of an extension.
fn extension(name: &str) -> Error {
    Error::new(
        Kind::UnknownFormat,
        format!("it needs the extension {name:?}, which is not read"),
        "export it without compression and without extensions of its geometry",
    )
}

#[cfg(test)]
mod tests;
