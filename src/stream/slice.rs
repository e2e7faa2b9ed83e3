//! A slice of a mesh, summed by itself.

use std::fmt;
use std::fs::File;
use std::ops::Range;
use std::path::Path;
use std::str::FromStr;

use sha2::{Digest, Sha256};

use super::cover::{Share, Stretch};
use super::partial::{Identity, Partial};
use super::{Keys, chunks_of_corners, records};
use crate::error::{Error, Kind, Result};
use crate::format::stl::{Cuts, parse_range};
use crate::format::{self, Bytes, Family, Format};
use crate::geometry::{Corners, LooseFacets};
use crate::moments::CHUNK;

/// The `k`-th of `n` slices, from 1.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Slice {
    k: u64,
    n: u64,
}

/// Slices that a mesh can be cut into.
const MOST: u64 = 1 << 32;

impl Slice {
    /// The `k`-th of `n`.
    ///
    /// # Errors
    /// `usage` unless 1 ≤ k ≤ n ≤ 2³².
    pub fn new(k: u64, n: u64) -> Result<Self> {
        if (1..=n).contains(&k) && n <= MOST {
            return Ok(Self { k, n });
        }
        Err(Error::new(
            Kind::Usage,
            format!("there is no slice {k}/{n}"),
            "slices run from 1/N to N/N, such as 2/7",
        ))
    }

    /// Its share of `all`: those of all slices cover it once.
    fn of(self, all: u64) -> Range<u64> {
        let at = |k: u64| (u128::from(all) * u128::from(k) / u128::from(self.n)) as u64;
        at(self.k - 1)..at(self.k)
    }

    fn stretch(self, triangles: Range<u64>) -> Stretch {
        Stretch {
            from: Share::new(self.k - 1, self.n),
            to: Share::new(self.k, self.n),
            triangles,
        }
    }
}

impl fmt::Display for Slice {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{}/{}", self.k, self.n)
    }
}

impl FromStr for Slice {
    type Err = Error;
    /// From "K/N".
    fn from_str(text: &str) -> Result<Self> {
        let parts = text.split_once('/');
        let numbers = parts.and_then(|(k, n)| Some((k.parse().ok()?, n.parse().ok()?)));
        let (k, n) = numbers.ok_or_else(|| {
            Error::new(
                Kind::Usage,
                format!("\"{text}\" is not a slice"),
                "write which of how many, such as 2/7",
            )
        })?;
        Self::new(k, n)
    }
}

/// Sums the slice of a mesh file. Of a binary STL only its records are read; of a text STL all
/// before its end is looked through for lines that begin facets, and only its own facets are read.
///
/// The file must not change between slices: see [`Identity`] for what is noticed.
///
/// # Errors
/// Those of reading; `usage` for a format whose faces cannot be read without what stands before
/// them.
pub fn slice_of_path(path: &Path, slice: Slice, hint: Option<Family>) -> Result<Partial> {
    let bytes = Bytes::open(path)?;
    let format = format::detect(&bytes, path, hint)?;
    let of = || -> Result<Partial> {
        #[cfg(unix)]
        if format == Format::StlBinary && matches!(bytes, Bytes::Mapped(_)) {
            let file = File::open(path).map_err(|e| unreadable(&e))?;
            let mut range = 0..0;
            let chunks = |all| {
                range = slice.of(all);
                range.clone()
            };
            let read = records::chunks_of_file(&file, chunks, &Keys::published())?;
            return Ok(of_records(&bytes, slice, range, read));
        }
        of_format(&bytes, format, slice)
    };
    of().map_err(|e| e.in_file(path))
}

#[cfg(unix)]
fn unreadable(e: &std::io::Error) -> Error {
    Error::new(
        Kind::NotFound,
        format!("cannot read the file: {e}"),
        "check the path and the permissions",
    )
}

/// Sums the slice of a mesh whose bytes are all here.
///
/// # Errors
/// As [`slice_of_path`].
pub fn slice_of_memory(bytes: &[u8], slice: Slice, hint: Option<Family>) -> Result<Partial> {
    let format = format::detect(bytes, Path::new("-"), hint)?;
    of_format(bytes, format, slice)
}

fn of_format(bytes: &[u8], format: Format, slice: Slice) -> Result<Partial> {
    match format {
        Format::StlBinary => {
            let mut range = 0..0;
            let chunks = |all| {
                range = slice.of(all);
                range.clone()
            };
            let read = records::chunks_of_memory(bytes, chunks, &Keys::published())?;
            Ok(of_records(bytes, slice, range, read))
        }
        Format::StlText => of_text(bytes, slice),
        other => Err(Error::new(
            Kind::Usage,
            format!(
                "{other} cannot be cut into slices: its faces refer to vertices that stand anywhere before them"
            ),
            "convert it with `bismar check --write FILE.stl`, or weigh it with --whole",
        )),
    }
}

fn of_records(
    bytes: &[u8],
    slice: Slice,
    chunks: Range<u64>,
    (count, apex, total): records::Chunks,
) -> Partial {
    let at = |chunk: u64| (chunk * CHUNK as u64).min(count);
    Partial::new(
        Identity {
            format: "binary stl".to_owned(),
            bytes: bytes.len() as u64,
            fingerprint: fingerprint(bytes),
        },
        Some(count),
        slice.stretch(at(chunks.start)..at(chunks.end)),
        apex,
        total,
    )
}

fn of_text(text: &[u8], slice: Slice) -> Result<Partial> {
    let cuts = Cuts::new(text, CHUNK as u64);
    let share = slice.of(text.len() as u64);
    // A share of a length in memory: it fits.
    let (from, first) = cuts.after(share.start as usize);
    let (to, _) = cuts.after(share.end as usize);
    let triangles = parse_range(text, from..to)?;
    // Sums are about the first vertex of the file, which each slice reads for itself.
    let apex = match (from, triangles.first()) {
        (0, Some(first)) => first[0],
        _ => first_vertex(text)?,
    };
    let facets = LooseFacets(&triangles);
    let total = super::chunks_about(&facets, |all| 0..all, apex, &Keys::published());
    let last = first + triangles.len() as u64;
    Ok(Partial::new(
        Identity {
            format: "text stl".to_owned(),
            bytes: text.len() as u64,
            fingerprint: fingerprint(text),
        },
        (to == text.len()).then_some(last),
        slice.stretch(first..last),
        apex,
        total,
    ))
}

/// The first corner of the first facet of a text.
fn first_vertex(text: &[u8]) -> Result<[f64; 3]> {
    // The first cut that leaves one facet before it.
    let (end, _) = Cuts::new(text, 1).after(1);
    let (end, _) = match parse_range(text, 0..end)?.first() {
        Some(first) => return Ok(first[0]),
        // The first line was itself a facet's.
        None => Cuts::new(text, 1).after(end),
    };
    let first = parse_range(text, 0..end)?;
    first.first().map(|t| t[0]).ok_or_else(|| {
        Error::new(
            Kind::Empty,
            "the file holds no triangle before the slice",
            "export the mesh again with the bodies selected",
        )
    })
}

/// Sums the slice of triangles in memory, such as those of arrays. Their identity is their number
/// and what they are.
pub fn slice_of_corners(facets: &impl Corners, slice: Slice) -> Partial {
    let n = facets.count() as u64;
    let mut chunks = 0..0;
    let (apex, total) = chunks_of_corners(
        facets,
        |all| {
            chunks = slice.of(all);
            chunks.clone()
        },
        &Keys::published(),
    );
    let mut hash = Sha256::new();
    hash.update(n.to_le_bytes());
    let samples = n.min(WINDOWS * WINDOW / 72);
    for i in 0..samples {
        let at = spread(i, samples, n - 1);
        for x in facets.triangle(at as usize).iter().flatten() {
            hash.update((x + 0.0).to_le_bytes());
        }
    }
    let at = |chunk: u64| (chunk * CHUNK as u64).min(n);
    Partial::new(
        Identity {
            format: "triangles".to_owned(),
            bytes: 72 * n,
            fingerprint: hex(&hash.finalize()),
        },
        Some(n),
        slice.stretch(at(chunks.start)..at(chunks.end)),
        apex,
        total,
    )
}

/// Windows of a file that its fingerprint covers, and their length in bytes.
const WINDOWS: u64 = 64;
const WINDOW: u64 = 4096;

/// Where the `i`-th of `of` places stands that are spread over 0..=last.
fn spread(i: u64, of: u64, last: u64) -> u64 {
    (u128::from(i) * u128::from(last) / u128::from((of - 1).max(1))) as u64
}

/// SHA-256 of the length and of 64 windows of 4096 bytes, spread evenly from the first byte to the
/// last; of all bytes where there are no more. It costs the same for a file of any size.
fn fingerprint(bytes: &[u8]) -> String {
    let len = bytes.len() as u64;
    let mut hash = Sha256::new();
    hash.update(len.to_le_bytes());
    if len <= WINDOWS * WINDOW {
        hash.update(bytes);
    } else {
        for i in 0..WINDOWS {
            let at = spread(i, WINDOWS, len - WINDOW) as usize;
            hash.update(&bytes[at..at + WINDOW as usize]);
        }
    }
    hex(&hash.finalize())
}

fn hex(bytes: &[u8]) -> String {
    bytes.iter().map(|b| format!("{b:02x}")).collect()
}
