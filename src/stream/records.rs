//! Binary STL from a file, from memory, or from a stream without a length.

#[cfg(unix)]
use std::cell::RefCell;
use std::fs::File;
use std::io::Read;
use std::ops::Range;

use super::kernel::{OfRecords, Part, Total, part};
use super::{Keys, Totals, pass};
use crate::error::{Error, Kind, Result};
use crate::format::stl::{HEADER, RECORD, count_in, declared, first_not_finite};
use crate::geometry::RecordFacets;
use crate::moments::CHUNK;

/// Bytes of one chunk of records.
const CHUNK_BYTES: usize = CHUNK * RECORD as usize;

/// Chunks that are read from a stream at a time.
const BATCH: usize = 16;

/// The first vertex of the records.
fn apex_of(records: &[u8]) -> [f64; 3] {
    let facets = RecordFacets::new(records);
    match records.len() {
        0..50 => [0.0; 3],
        _ => facets.raw(0)[0].map(f64::from),
    }
}

/// One chunk, refused where a coordinate is not finite.
fn chunk(records: &[u8], first: u64, apex: [f64; 3], keys: &Keys) -> Result<Part> {
    let (all, _) = records.as_chunks::<{ RECORD as usize }>();
    let part = part(
        &OfRecords(RecordFacets::new(records)),
        0..all.len(),
        apex,
        keys,
    );
    // The area of a triangle is not finite exactly where a coordinate is not: products of f32 are
    // far from the largest f64. An apex that is not finite is a coordinate of the first chunk.
    if !part.sums.area().is_finite()
        && let Some(error) = first_not_finite(all, first)
    {
        return Err(error);
    }
    Ok(part)
}

/// Totals of the whole bytes of a binary STL.
///
/// # Errors
/// `truncated`, `count-mismatch`, `empty` and `not-finite`, with the byte.
pub fn of_memory(bytes: &[u8], keys: &Keys) -> Result<Totals> {
    let (count, apex, total) = chunks_of_memory(bytes, |all| 0..all, keys)?;
    Ok(Totals::new(count, apex, &total))
}

/// Some chunks of a mesh: the number of triangles of all of it, its first vertex, and what they
/// come to.
pub(super) type Chunks = (u64, [f64; 3], Total);

/// What the chunks `wanted` come to; it is told how many there are.
pub(super) fn chunks_of_memory(
    bytes: &[u8],
    wanted: impl FnOnce(u64) -> Range<u64>,
    keys: &Keys,
) -> Result<Chunks> {
    let count = count_in(bytes, bytes.len() as u64)?;
    let records = bytes.get(HEADER as usize..).unwrap_or_default();
    let apex = apex_of(records);
    let mut total = Total::NOTHING;
    pass::all(&mut total, wanted(count.div_ceil(CHUNK as u64)), |k| {
        let at = k as usize * CHUNK_BYTES;
        let end = records.len().min(at + CHUNK_BYTES);
        chunk(&records[at..end], k * CHUNK as u64, apex, keys)
    })?;
    Ok((count, apex, total))
}

fn unreadable(e: &std::io::Error) -> Error {
    match e.kind() {
        std::io::ErrorKind::UnexpectedEof => Error::new(
            Kind::Truncated,
            "the file became shorter while it was read",
            "wait until it is written and weigh it again",
        ),
        _ => Error::new(
            Kind::NotFound,
            format!("cannot read the file: {e}"),
            "check the disk and the permissions",
        ),
    }
}

/// Totals of a binary STL in a regular file, of any length.
///
/// Chunks are copied into a buffer of each thread. That is faster here than a map of the file: a
/// copy that stays in the cache costs less than the page faults.
///
/// # Errors
/// As [`of_memory`], and `not-found` where reading fails.
pub fn of_file(file: &File, keys: &Keys) -> Result<Totals> {
    #[cfg(unix)]
    {
        let (count, apex, total) = chunks_of_file(file, |all| 0..all, keys)?;
        Ok(Totals::new(count, apex, &total))
    }
    #[cfg(not(unix))]
    {
        let mut file = file;
        of_stream(&mut file, keys).map(|(totals, _)| totals)
    }
}

/// What the chunks `wanted` come to; it is told how many there are.
#[cfg(unix)]
pub(super) fn chunks_of_file(
    file: &File,
    wanted: impl FnOnce(u64) -> Range<u64>,
    keys: &Keys,
) -> Result<Chunks> {
    use std::os::unix::fs::FileExt;
    thread_local! {
        static BUFFER: RefCell<Vec<u8>> = const { RefCell::new(Vec::new()) };
    }
    let len = file.metadata().map_err(|e| unreadable(&e))?.len();
    let mut head = [0; (HEADER + RECORD) as usize];
    let known = head.len().min(usize::try_from(len).unwrap_or(usize::MAX));
    file.read_exact_at(&mut head[..known], 0)
        .map_err(|e| unreadable(&e))?;
    let count = count_in(&head[..known], len)?;
    let apex = apex_of(&head[HEADER as usize..]);
    let mut total = Total::NOTHING;
    pass::all(&mut total, wanted(count.div_ceil(CHUNK as u64)), |k| {
        let first = k * CHUNK as u64;
        // At most CHUNK: it fits.
        let bytes = (count - first).min(CHUNK as u64) as usize * RECORD as usize;
        BUFFER.with_borrow_mut(|buffer| {
            buffer.resize(CHUNK_BYTES, 0);
            let records = &mut buffer[..bytes];
            file.read_exact_at(records, HEADER + RECORD * first)
                .map_err(|e| unreadable(&e))?;
            chunk(records, first, apex, keys)
        })
    })?;
    Ok((count, apex, total))
}

/// Totals of a binary STL from a stream, and the number of its bytes. One batch is read while the
/// one before is worked on.
///
/// # Errors
/// As [`of_memory`]. The count is checked at the end: a stream has no length.
pub fn of_stream(mut stream: impl Read + Send, keys: &Keys) -> Result<(Totals, u64)> {
    let mut head = Vec::new();
    fill(&mut stream, &mut head, HEADER as usize)?;
    let Some(count) = declared(&head) else {
        return Err(count_in(&head, head.len() as u64).err().unwrap_or_else(|| {
            Error::new(
                Kind::Truncated,
                "the stream ends in the header",
                "send all of it",
            )
        }));
    };
    let mut done = 0;
    let mut apex = [0.0; 3];
    let mut total = Total::NOTHING;
    let (mut now, mut next) = (Vec::new(), Vec::new());
    let wanted = |done: u64| (count - done).min((BATCH * CHUNK) as u64) as usize * RECORD as usize;
    fill(&mut stream, &mut now, wanted(0))?;
    while !now.is_empty() {
        if done == 0 {
            apex = apex_of(&now);
        }
        let records = (now.len() / RECORD as usize) as u64;
        let after = done + records;
        let last = now.len() < wanted(done);
        let work = || {
            let chunks = records.div_ceil(CHUNK as u64);
            pass::all(&mut total, 0..chunks, |k| {
                let at = k as usize * CHUNK_BYTES;
                let end = now.len().min(at + CHUNK_BYTES);
                chunk(&now[at..end], done + k * CHUNK as u64, apex, keys)
            })
        };
        let read = || match last {
            true => {
                next.clear();
                Ok(())
            }
            false => fill(&mut stream, &mut next, wanted(after)),
        };
        let (worked, filled) = rayon::join(work, read);
        worked?;
        filled?;
        if last {
            // What is left of a record is a part of the length.
            let len = HEADER + RECORD * done + now.len() as u64;
            return Err(ends_early(count, len));
        }
        done = after;
        std::mem::swap(&mut now, &mut next);
    }
    if done < count {
        return Err(ends_early(count, HEADER + RECORD * done));
    }
    let len = HEADER + RECORD * count;
    fill(&mut stream, &mut now, 1)?;
    if !now.is_empty() {
        return Err(Error::new(
            Kind::CountMismatch,
            format!(
                "the header declares {count} triangles, which end at byte {len}, but more follows"
            ),
            "export the file again; its count or its end is wrong",
        )
        .at_byte(len));
    }
    if count == 0 {
        count_in(&head, len)?;
    }
    Ok((Totals::new(count, apex, &total), len))
}

/// The error of a stream that ended at byte `len`.
fn ends_early(count: u64, len: u64) -> Error {
    let mut head = [0; HEADER as usize];
    // A declared count is a u32.
    head[80..].copy_from_slice(&(count as u32).to_le_bytes());
    count_in(&head, len)
        .err()
        .unwrap_or_else(|| Error::new(Kind::Truncated, "the stream ends early", "send all of it"))
}

/// Reads `bytes` bytes, fewer only at the end. Memory is taken as they come: the count is the
/// stream's word.
fn fill(stream: &mut impl Read, into: &mut Vec<u8>, bytes: usize) -> Result<()> {
    into.clear();
    stream
        .take(bytes as u64)
        .read_to_end(into)
        .map_err(|e| unreadable(&e))?;
    Ok(())
}
