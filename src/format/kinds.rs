//! Files of kinds that are not read, told by their first bytes, and what to export instead.

use super::chunk::{line_end, line_ending};
use super::number::{is_blank, skip_blank, token_at, word_end};
use super::{Family, Format};
use crate::error::{Error, Kind, Result};

/// How much of a text is searched for signs of its kind.
const LOOK: usize = 64 * 1024;

const EXPORT: &str = "export the mesh as STL, OBJ, 3MF, PLY, OFF or glTF";
const UNPACK: &str = "unpack it and name the mesh file inside";
const RETESSELLATE: &str =
    "open it in the program that wrote it and export a mesh: STL, OBJ, 3MF, PLY, OFF or glTF";

/// What files begin with, what they are, and what to do.
const BEGINNINGS: &[(&[u8], &str, &str)] = &[
    (b"BZh", "a bzip2 archive", UNPACK),
    (b"\xfd7zXZ\0", "an xz archive", UNPACK),
    (b"\x28\xb5\x2f\xfd", "a zstd archive", UNPACK),
    (b"7z\xbc\xaf\x27\x1c", "a 7z archive", UNPACK),
    (b"Rar!", "a rar archive", UNPACK),
    (b"%PDF", "a PDF document", EXPORT),
    (b"\x89PNG", "a PNG picture", EXPORT),
    (b"\xff\xd8\xff", "a JPEG picture", EXPORT),
    (b"GIF8", "a GIF picture", EXPORT),
    (b"RIFF", "a RIFF file (picture or sound)", EXPORT),
    (b"\x7fELF", "a program", EXPORT),
    (b"MZ", "a program", EXPORT),
    (b"Kaydara FBX", "an FBX scene", EXPORT),
    (b"; FBX", "an FBX scene", EXPORT),
    (b"BLENDER", "a scene of a modelling program", EXPORT),
    (
        b"ISO-10303-21",
        "a STEP model, which has exact surfaces and no mesh",
        RETESSELLATE,
    ),
    (
        b"DBRep_DrawableShape",
        "a boundary model, which has exact surfaces and no mesh",
        RETESSELLATE,
    ),
    (b"#VRML", "a VRML scene", EXPORT),
    (b"SQLite format 3", "a database", EXPORT),
    (
        b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1",
        "a compound document of a CAD or office program",
        RETESSELLATE,
    ),
    (b"\xff\xfe", "UTF-16 text", "save it as UTF-8 or ASCII text"),
    (b"\xfe\xff", "UTF-16 text", "save it as UTF-8 or ASCII text"),
];

/// What a file that is no STL is by its beginning, where that decides: a format that is read, or the
/// refusal of a kind that is not.
pub(super) fn looks_like(bytes: &[u8], hint: Option<Family>) -> Option<Result<Format>> {
    if bytes.starts_with(b"PK\x03\x04") || bytes.starts_with(b"PK\x05\x06") {
        // Names of entries stand before each and in the list at the end.
        let head = &bytes[..bytes.len().min(LOOK)];
        let tail = &bytes[bytes.len().saturating_sub(LOOK)..];
        let has = |what: &[u8]| {
            let find = |part| memchr::memmem::find(part, what).is_some();
            find(head) || find(tail)
        };
        let is_package = hint == Some(Family::ThreeMf) || has(b"3D/") || has(b".model");
        return Some(if is_package {
            Ok(Format::ThreeMf)
        } else {
            Err(refuse("a zip archive", UNPACK))
        });
    }
    if bytes.starts_with(b"glTF") {
        return Some(Ok(Format::GltfBinary));
    }
    if let Some((_, what, advice)) = BEGINNINGS.iter().find(|(b, ..)| bytes.starts_with(b)) {
        return Some(Err(refuse(what, advice)));
    }
    let start = if bytes.starts_with(b"\xef\xbb\xbf") {
        3
    } else {
        0
    };
    let at = skip_blank(&bytes[..bytes.len().min(LOOK)], start);
    let rest = bytes.get(at..)?;
    let word = &rest[..word_end(rest, 0)];
    if bytes.starts_with(b"ply") && matches!(bytes.get(3), Some(b'\n' | b'\r')) {
        return Some(Ok(Format::Ply));
    }
    if super::off::begins(rest) {
        return Some(Ok(Format::Off));
    }
    // Buffers as text may stand before the word that tells.
    if rest.starts_with(b"{")
        && (hint == Some(Family::Gltf) || memchr::memmem::find(rest, b"\"asset\"").is_some())
    {
        return Some(Ok(Format::GltfText));
    }
    other(rest, word).map(Err)
}

/// The refusal for a text of a known kind that is not read here.
fn other(rest: &[u8], word: &[u8]) -> Option<Error> {
    let head = rest[..rest.len().min(LOOK)].to_ascii_lowercase();
    let has = |what: &[u8]| memchr::memmem::find(&head, what).is_some();
    let what = match word {
        _ if rest.starts_with(b"ISO-10303-21") => {
            return Some(refuse(
                "a STEP model, which has exact surfaces and no mesh",
                RETESSELLATE,
            ));
        }
        _ if rest.starts_with(b"{") || rest.starts_with(b"[") => "JSON or TOML text",
        _ if rest.starts_with(b"<") => {
            if has(b"<html") || has(b"<!doctype html") {
                return Some(refuse("a web page", "download the mesh file itself"));
            } else if has(b"<amf") {
                "an AMF mesh"
            } else if has(b"<collada") {
                "a COLLADA scene"
            } else if has(b"<svg") {
                "an SVG picture"
            } else if has(b"3dmanufacturing") {
                return Some(refuse(
                    "the model of a 3MF package, taken out of it",
                    "name the whole package",
                ));
            } else {
                "XML"
            }
        }
        b"0" if has(b"section") => "a DXF drawing",
        _ if rest.starts_with(b"version https://git-lfs") => {
            return Some(refuse(
                "a pointer to a large file that was not fetched",
                "fetch the file itself",
            ));
        }
        _ => return None,
    };
    Some(refuse(what, EXPORT))
}

fn refuse(what: &str, advice: &str) -> Error {
    Error::new(
        Kind::UnknownFormat,
        format!("this looks like {what}, which is not read"),
        advice,
    )
}

/// The first word of the first line that is no comment, if the beginning is text.
pub(super) fn first_statement(bytes: &[u8]) -> Option<&[u8]> {
    if is_binary(bytes) {
        return None;
    }
    let ending = line_ending(bytes);
    let mut at = if bytes.starts_with(b"\xef\xbb\xbf") {
        3
    } else {
        0
    };
    loop {
        at = skip_blank(bytes, at);
        if bytes.get(at) != Some(&b'#') {
            return Some(&bytes[at..word_end(bytes, at)]);
        }
        at = line_end(bytes, at, ending);
    }
}

/// Whether some line near the beginning is a vertex of an OBJ.
pub(super) fn has_vertices(bytes: &[u8]) -> bool {
    let head = &bytes[..bytes.len().min(16 * LOOK)];
    head.split(|&b| b == b'\n' || b == b'\r').any(|line| {
        let line = line.trim_ascii_start();
        line.first() == Some(&b'v') && line.get(1).is_some_and(|&b| is_blank(b))
    })
}

/// Whether the beginning holds bytes that no text has.
pub(super) fn is_binary(bytes: &[u8]) -> bool {
    bytes[..bytes.len().min(1024)]
        .iter()
        .any(|&b| b < b'\t' || (0x0e..0x1a).contains(&b))
}

/// The refusal for bytes of no known kind.
pub(super) fn unknown(bytes: &[u8], hint: Option<Family>) -> Error {
    let (found, binary) = if is_binary(bytes) {
        ("its bytes are not text".to_string(), true)
    } else {
        let word = String::from_utf8_lossy(first_statement(bytes).unwrap_or(b"")).into_owned();
        (
            format!("its text begins with \"{}\"", token_at(word.as_bytes(), 0)),
            false,
        )
    };
    let message = match hint {
        Some(Family::Stl) => format!(
            "this is called an STL, but {found}, where an STL has \"solid\", \"facet\" or a binary \
             header"
        ),
        Some(other) => format!("this is called {}, but {found}", other.title()),
        None if binary => {
            format!(
                "{found}, and no binary STL has this length ({} bytes)",
                bytes.len()
            )
        }
        None => format!("{found}, which no mesh format that is read here does"),
    };
    Error::new(Kind::UnknownFormat, message, EXPORT)
}
