//! The bytes that the JSON describes: in the container, as text in it, or in files beside it.

use base64::Engine;
use base64::engine::general_purpose::STANDARD;

use super::json::Root;
use super::{AGAIN, bad, extension};
use crate::bytes::Bytes;
use crate::error::{Error, Kind, Result};
use crate::format::Neighbours;

/// All buffers.
pub(super) struct Buffers<'a> {
    each: Vec<Buffer<'a>>,
}

enum Buffer<'a> {
    Within(&'a [u8]),
    Own(Bytes),
}

impl Buffer<'_> {
    fn bytes(&self) -> &[u8] {
        match self {
            Self::Within(bytes) => bytes,
            Self::Own(bytes) => bytes,
        }
    }
}

/// Fetches all buffers.
pub(super) fn load<'a>(
    root: &Root,
    binary: Option<&'a [u8]>,
    neighbours: &Neighbours<'_>,
) -> Result<Buffers<'a>> {
    let mut each = Vec::with_capacity(root.buffers.len());
    for (i, buffer) in root.buffers.iter().enumerate() {
        let bytes = match &buffer.uri {
            Some(uri) => Buffer::Own(fetch(i, uri, neighbours)?),
            None => match binary {
                Some(bytes) if i == 0 => Buffer::Within(bytes),
                _ => {
                    return Err(bad(format!(
                        "buffer {i} names no bytes and is not in the file"
                    )));
                }
            },
        };
        let there = bytes.bytes().len() as u64;
        if there < buffer.byte_length {
            return Err(Error::new(
                Kind::Truncated,
                format!(
                    "buffer {i} declares {} bytes, and {there} are there",
                    buffer.byte_length
                ),
                AGAIN,
            ));
        }
        each.push(bytes);
    }
    Ok(Buffers { each })
}

fn fetch(i: usize, uri: &str, neighbours: &Neighbours<'_>) -> Result<Bytes> {
    if let Some(data) = uri.strip_prefix("data:") {
        let Some((_, text)) = data.split_once(";base64,") else {
            return Err(bad(format!("buffer {i} is embedded other than as base64")));
        };
        let bytes = STANDARD
            .decode(text)
            .map_err(|e| bad(format!("buffer {i} is not base64: {e}")))?;
        return Ok(Bytes::Owned(bytes));
    }
    let Some(name) = decoded(uri) else {
        return Err(bad(format!(
            "buffer {i} has a name that is not text: {uri:?}"
        )));
    };
    // A file must not make others be read than those that lie with it.
    let steps = || name.split(['/', '\\']);
    if name.contains(':') || name.starts_with(['/', '\\']) || steps().any(|s| s == "..") {
        return Err(Error::new(
            Kind::UnknownFormat,
            format!("buffer {i} lies elsewhere, at {name:?}; only files beside the glTF are read"),
            "put the buffer beside it, or export it as .glb",
        ));
    }
    neighbours(&name)
}

/// Percent signs decoded (RFC 3986).
fn decoded(uri: &str) -> Option<String> {
    let mut out = Vec::with_capacity(uri.len());
    let mut rest = uri.as_bytes();
    while let [first, tail @ ..] = rest {
        match (first, tail) {
            (b'%', [a, b, after @ ..]) => {
                let digit = |d: u8| char::from(d).to_digit(16);
                out.push((16 * digit(*a)? + digit(*b)?) as u8);
                rest = after;
            }
            _ => {
                out.push(*first);
                rest = tail;
            }
        }
    }
    String::from_utf8(out).ok()
}

impl Buffers<'_> {
    /// Bytes of all together.
    pub(super) fn total(&self) -> u64 {
        self.each.iter().map(|b| b.bytes().len() as u64).sum()
    }

    /// The bytes of a view, and the stride that it states.
    pub(super) fn view(&self, root: &Root, index: usize) -> Result<(&[u8], Option<u64>)> {
        let Some(view) = root.buffer_views.get(index) else {
            return Err(missing("buffer view", index, root.buffer_views.len()));
        };
        if let Some(name) = view.extensions.keys().find(|k| k.contains("meshopt")) {
            return Err(extension(name));
        }
        let Some(buffer) = self.each.get(view.buffer) else {
            return Err(missing("buffer", view.buffer, self.each.len()));
        };
        let declared = root.buffers[view.buffer].byte_length;
        let end = view.byte_offset.checked_add(view.byte_length);
        let Some(end) = end.filter(|&e| e <= declared) else {
            return Err(Error::new(
                Kind::CountMismatch,
                format!(
                    "buffer view {index} takes {} bytes from byte {} on, past the end of buffer {} \
                     at {declared}",
                    view.byte_length, view.byte_offset, view.buffer
                ),
                AGAIN,
            ));
        };
        // The declared length is there: it was compared when the buffer was fetched.
        let bytes = &buffer.bytes()[view.byte_offset as usize..end as usize];
        Ok((bytes, view.byte_stride))
    }
}

/// The error for an index that nothing has.
pub(super) fn missing(what: &str, index: usize, count: usize) -> Error {
    Error::new(
        Kind::UnknownName,
        format!("{what} {index} is referred to; they count from 0 and there are {count}"),
        AGAIN,
    )
}
