//! Binary STL: the records stay in the file's bytes.

use rayon::prelude::*;

use crate::error::{Error, Kind, Result};
use crate::format::Bytes;
use crate::mesh::{Records, Run, Soup, Triangles};

/// Bytes before the first record.
pub(crate) const HEADER: u64 = 84;
/// Bytes of a record.
pub(crate) const RECORD: u64 = 50;
/// Records that one step of the finiteness check takes.
const STEP: usize = 16 * 1024;

/// The number of triangles that the file says it has.
pub(crate) fn declared(bytes: &[u8]) -> Option<u64> {
    let count: [u8; 4] = bytes.get(80..84)?.try_into().ok()?;
    Some(u64::from(u32::from_le_bytes(count)))
}

/// The number of triangles of a binary STL of `len` bytes that begins with `head`.
///
/// # Errors
/// `truncated`, `count-mismatch` or `empty`, with the declared count and what the length allows.
pub(crate) fn count_in(head: &[u8], len: u64) -> Result<u64> {
    if len == 0 {
        return Err(Error::new(
            Kind::Empty,
            "the file is empty",
            "export the mesh again",
        ));
    }
    let Some(declared) = declared(head) else {
        return Err(Error::new(
            Kind::Truncated,
            format!("the file ends at byte {len}, inside the 84-byte header of a binary STL"),
            "export or copy the file again",
        )
        .at_byte(len));
    };
    let expected = HEADER + RECORD * declared;
    let room = (len - HEADER) / RECORD;
    if len < expected {
        return Err(Error::new(
            Kind::Truncated,
            format!(
                "the header declares {declared} triangles ({expected} bytes), but the file ends at \
                 byte {len}, which allows {room}"
            ),
            "export or copy the file again; triangles are missing",
        )
        .at_byte(len));
    }
    if len > expected {
        return Err(Error::new(
            Kind::CountMismatch,
            format!(
                "the header declares {declared} triangles, which end at byte {expected}, but the \
                 file goes on to byte {len}, which allows {room}"
            ),
            "export the file again; its count or its end is wrong",
        )
        .at_byte(expected));
    }
    if declared == 0 {
        return Err(Error::new(
            Kind::Empty,
            "the file holds no triangle: its count is 0",
            "export the mesh again with the bodies selected",
        )
        .at_byte(80));
    }
    Ok(declared)
}

/// Reads a binary STL without looking at the coordinates, for callers that fold
/// [`check_finite`] into a pass of their own.
///
/// # Errors
/// `truncated`, `count-mismatch` or `empty`, with the declared count and what the length allows.
pub fn parse_unchecked(bytes: Bytes) -> Result<Soup> {
    let declared = count_in(&bytes, bytes.len() as u64)?;
    let Ok(count) = usize::try_from(declared) else {
        return Err(Error::new(
            Kind::TooLarge,
            "more triangles than this machine can address",
            "use a 64-bit machine",
        ));
    };
    Ok(Soup {
        triangles: Triangles::Records(Records { bytes, count }),
        names: vec![None],
        runs: vec![Run {
            first: 0,
            count,
            name: 0,
            material: None,
        }],
        ..Soup::default()
    })
}

/// Refuses NaN and infinite corners. Normals are not looked at.
///
/// One pass at the speed of memory: a float is not finite exactly when all its exponent bits are
/// set, so adding one to the exponent carries into the sign bit, which is gathered by `or` for two
/// floats at a time.
///
/// # Errors
/// `not-finite` for the first bad triangle, with its number and the byte of the coordinate.
pub fn check_finite(records: &Records) -> Result<()> {
    let end = (HEADER as usize).saturating_add(records.count.saturating_mul(RECORD as usize));
    let body = records.bytes.get(HEADER as usize..end).unwrap_or(&[]);
    let (all, _) = body.as_chunks::<{ RECORD as usize }>();
    let bad = all
        .par_chunks(STEP)
        .enumerate()
        .find_map_first(|(step, part)| {
            let any = part.iter().fold(0, |bits, r| bits | overflow(r)) != 0;
            let at = any.then(|| part.iter().position(|r| overflow(r) != 0))??;
            Some(step * STEP + at)
        });
    match bad {
        Some(at) => Err(not_finite(&all[at], at as u64)),
        None => Ok(()),
    }
}

/// The first of the records with a corner that is not finite, told as `triangle` and up.
pub(crate) fn first_not_finite(records: &[[u8; RECORD as usize]], triangle: u64) -> Option<Error> {
    let at = records.iter().position(|r| overflow(r) != 0)?;
    Some(not_finite(&records[at], triangle + at as u64))
}

/// What is wrong with a record that [`overflow`] has caught.
fn not_finite(record: &[u8; RECORD as usize], triangle: u64) -> Error {
    let value = |k: usize| {
        let at = 12 + 4 * k;
        f32::from_le_bytes([record[at], record[at + 1], record[at + 2], record[at + 3]])
    };
    let k = (0..9).find(|&k| !value(k).is_finite()).unwrap_or(0);
    let what = if value(k).is_nan() {
        "not a number"
    } else {
        "infinite"
    };
    let axis = ["x", "y", "z"][k % 3];
    Error::new(
        Kind::NotFinite,
        format!(
            "{axis} of corner {} of triangle {triangle} is {what}",
            k / 3
        ),
        "export the mesh again; the program that wrote it could not compute this coordinate",
    )
    .at_byte(HEADER + RECORD * triangle + 12 + 4 * k as u64)
}

/// Non-zero where one of the nine corner coordinates is not finite.
#[inline(always)]
fn overflow(record: &[u8; RECORD as usize]) -> u64 {
    const EXPONENT: u64 = 0x7f80_0000_7f80_0000;
    const ONE: u64 = 0x0080_0000_0080_0000;
    const SIGN: u64 = 0x8000_0000_8000_0000;
    let two = |at: usize| {
        let mut word = [0u8; 8];
        word.copy_from_slice(&record[at..at + 8]);
        (u64::from_le_bytes(word) & EXPONENT) + ONE
    };
    // Bytes 12..48 hold nine floats; the last pair overlaps the one before.
    (two(12) | two(20) | two(28) | two(36) | two(40)) & SIGN
}

#[cfg(test)]
mod tests {
    use super::*;

    fn file(header: &[u8], count: u32, triangles: &[[f32; 9]]) -> Vec<u8> {
        let mut out = header.to_vec();
        out.resize(80, 0);
        out.extend(count.to_le_bytes());
        for t in triangles {
            out.extend([0u8; 12]);
            t.iter().for_each(|x| out.extend(x.to_le_bytes()));
            out.extend([0u8; 2]);
        }
        out
    }

    fn read(bytes: Vec<u8>) -> Result<Soup> {
        super::super::parse(Bytes::Owned(bytes))
    }

    const ONE: [f32; 9] = [0., 0., 0., 1., 0., 0., 0., 1., 0.];

    #[test]
    fn a_header_may_begin_with_solid() {
        let soup = read(file(b"solid made by a plotter", 2, &[ONE, ONE])).unwrap();
        assert!(matches!(
            soup.triangles,
            Triangles::Records(Records { count: 2, .. })
        ));
        assert_eq!(
            soup.runs,
            vec![Run {
                first: 0,
                count: 2,
                name: 0,
                material: None
            }]
        );
    }

    #[test]
    fn counts_are_compared_with_the_length() {
        let e = read(file(b"solid x", 3, &[ONE, ONE])).unwrap_err();
        assert_eq!((e.kind, e.byte), (Kind::Truncated, Some(184)));
        assert!(
            e.message.contains("declares 3") && e.message.contains("allows 2"),
            "{e}"
        );
        let e = read(file(b"", 1, &[ONE, ONE])).unwrap_err();
        assert_eq!((e.kind, e.byte), (Kind::CountMismatch, Some(134)));
        let e = read(file(b"", 0, &[ONE])).unwrap_err();
        assert_eq!((e.kind, e.byte), (Kind::CountMismatch, Some(84)));
        let e = read(file(b"", u32::MAX, &[ONE])).unwrap_err();
        assert_eq!(e.kind, Kind::Truncated);
        assert_eq!(read(file(b"", 0, &[])).unwrap_err().kind, Kind::Empty);
        assert_eq!(read(vec![0; 40]).unwrap_err().kind, Kind::Truncated);
        assert_eq!(read(vec![]).unwrap_err().kind, Kind::Empty);
        let mut trailing = file(b"", 1, &[ONE]);
        trailing.push(0);
        assert_eq!(read(trailing).unwrap_err().kind, Kind::CountMismatch);
    }

    #[test]
    fn every_coordinate_is_checked() {
        for k in 0..9 {
            for bad in [f32::NAN, f32::INFINITY, f32::NEG_INFINITY] {
                let mut t = vec![[f32::MAX; 9]; STEP + 5];
                t[STEP + 3][k] = bad;
                let e = read(file(b"", t.len() as u32, &t)).unwrap_err();
                assert_eq!(e.kind, Kind::NotFinite);
                assert_eq!(
                    e.byte,
                    Some(84 + 50 * (STEP as u64 + 3) + 12 + 4 * k as u64)
                );
            }
        }
        // The normal may be anything, and so may the spare bytes.
        let mut bytes = file(b"", 1, &[ONE]);
        bytes[84..96].fill(0xff);
        bytes[132..134].fill(0xff);
        assert!(read(bytes).is_ok());
    }
}
