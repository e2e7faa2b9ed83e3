//! The binary container: a header and chunks.

use super::{AGAIN, bad};
use crate::error::{Error, Kind, Result};

/// What stands in it.
pub(super) struct Parts<'a> {
    pub(super) json: &'a [u8],
    pub(super) json_at: u64,
    pub(super) binary: Option<&'a [u8]>,
}

fn word(bytes: &[u8], at: usize) -> Result<u32> {
    match bytes.get(at..).and_then(|rest| rest.first_chunk::<4>()) {
        Some(found) => Ok(u32::from_le_bytes(*found)),
        None => Err(truncated(bytes)),
    }
}

fn truncated(bytes: &[u8]) -> Error {
    Error::new(
        Kind::Truncated,
        format!(
            "the binary glTF ends at byte {}, before it should",
            bytes.len()
        ),
        AGAIN,
    )
    .at_byte(bytes.len() as u64)
}

/// Takes the container apart.
pub(super) fn split(bytes: &[u8]) -> Result<Parts<'_>> {
    let version = word(bytes, 4)?;
    if version != 2 {
        return Err(bad(format!(
            "this is a binary glTF of version {version}, and 2 is read"
        ))
        .at_byte(4));
    }
    let length = word(bytes, 8)? as usize;
    if length > bytes.len() {
        return Err(truncated(bytes));
    }
    if length < bytes.len() {
        return Err(Error::new(
            Kind::CountMismatch,
            format!(
                "its header declares {length} bytes, but the file goes on to byte {}",
                bytes.len()
            ),
            AGAIN,
        )
        .at_byte(length as u64));
    }
    let mut parts = Parts {
        json: &[],
        json_at: 0,
        binary: None,
    };
    let mut at = 12;
    for number in 0.. {
        if at == bytes.len() {
            break;
        }
        let size = word(bytes, at)? as usize;
        let kind = word(bytes, at + 4)?.to_le_bytes();
        let begin = at + 8;
        let Some(chunk) = bytes.get(begin..).and_then(|rest| rest.get(..size)) else {
            return Err(truncated(bytes));
        };
        match (number, &kind) {
            (0, b"JSON") => (parts.json, parts.json_at) = (chunk, begin as u64),
            (0, _) => {
                return Err(bad("the first chunk of a binary glTF must be JSON").at_byte(at as u64));
            }
            (1, b"BIN\0") => parts.binary = Some(chunk),
            // Chunks of other kinds are to be passed over.
            _ => {}
        }
        at = begin + size;
    }
    if parts.json_at == 0 {
        return Err(truncated(bytes));
    }
    Ok(parts)
}
