//! What every JSON document carries.

use std::path::Path;

use serde::Serialize;

use crate::error::{Error, Warning};

/// Name and version of this program.
#[derive(Clone, Copy, Debug, Serialize)]
pub struct Program {
    /// `bismar`.
    pub name: &'static str,
    /// The crate's version.
    pub version: &'static str,
}

/// This program.
pub const PROGRAM: Program = Program {
    name: env!("CARGO_PKG_NAME"),
    version: env!("CARGO_PKG_VERSION"),
};

/// One input, so that a result can be traced.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct InputFact {
    /// As given; lossy where it is not UTF-8. `-` is standard input.
    pub path: String,
    /// The path's bytes in hexadecimal, where it is not UTF-8.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub path_hex: Option<String>,
    /// Length in bytes; null where it could not be read.
    pub bytes: Option<u64>,
    /// Null where it was not asked for.
    pub sha256: Option<String>,
}

impl InputFact {
    /// Of an input at `path`.
    pub fn new(path: &Path, bytes: Option<u64>, sha256: Option<String>) -> Self {
        let path_hex = path_hex(path);
        Self {
            path: path.to_string_lossy().into_owned(),
            path_hex,
            bytes,
            sha256,
        }
    }
}

/// The bytes of a path that is not UTF-8, in hexadecimal.
pub fn path_hex(path: &Path) -> Option<String> {
    path.to_str().is_none().then(|| {
        path.as_os_str()
            .as_encoded_bytes()
            .iter()
            .map(|b| format!("{b:02x}"))
            .collect()
    })
}

/// A document: the common head, then what the command adds.
#[derive(Clone, Debug, Serialize)]
pub struct Document<B> {
    /// `bismar/NAME/VERSION`.
    pub schema: &'static str,
    /// Who made it.
    pub program: Program,
    /// The exit code.
    pub exit: u8,
    /// What was assumed, ignored or is suspicious.
    pub warnings: Vec<Warning>,
    /// What was read.
    pub inputs: Vec<InputFact>,
    /// The command's own part.
    #[serde(flatten)]
    pub body: B,
}

/// The body of an error document.
#[derive(Clone, Debug, Serialize)]
pub struct Failure {
    /// The first error.
    pub error: Error,
    /// The other errors, where there are several.
    #[serde(skip_serializing_if = "Vec::is_empty")]
    pub more: Vec<Error>,
}

/// The document as text with a final line end. Non-finite numbers are null.
pub fn to_json<B: Serialize>(document: &Document<B>) -> String {
    // Serialising these structs into memory has no way to fail: keys are strings.
    let mut text = serde_json::to_string_pretty(document).unwrap_or_default();
    text.push('\n');
    text
}
