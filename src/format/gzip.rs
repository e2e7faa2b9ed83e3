//! Files packed by gzip, unpacked into memory within bounds.

use std::io::Read;

use crate::bytes::{self, Bytes};
use crate::error::{Error, Kind, Result};

/// Most bytes that one packed byte may become. Deflate itself reaches 1032; meshes that repeat
/// themselves line by line stay below 100.
pub(crate) const RATIO: u64 = 256;
/// Unpacked bytes that are allowed whatever the packed size.
pub(crate) const FREE: u64 = 1 << 20;

/// The most that `packed` bytes may unpack to here, whatever size they declare.
pub(crate) fn most(packed: u64) -> u64 {
    packed
        .saturating_mul(RATIO)
        .saturating_add(FREE)
        .min(bytes::memory_budget())
}

/// Whether the bytes are a gzip stream.
pub fn is_gzip(bytes: &[u8]) -> bool {
    bytes.starts_with(b"\x1f\x8b")
}

/// Unpacks a gzip stream (RFC 1952; several members follow each other); other bytes go through as
/// they are. Sizes that the stream declares are not used; its checksums are.
///
/// # Errors
/// `truncated` where it ends early, `unknown-format` where it is damaged, `too-large` past the
/// bound on its unpacked size.
pub fn unpack(packed: Bytes) -> Result<Bytes> {
    if !is_gzip(&packed) {
        return Ok(packed);
    }
    let most = most(packed.len() as u64);
    let mut out = Vec::new();
    let mut from = flate2::bufread::MultiGzDecoder::new(&packed[..]).take(most.saturating_add(1));
    from.read_to_end(&mut out).map_err(|e| {
        if e.kind() == std::io::ErrorKind::UnexpectedEof {
            Error::new(
                Kind::Truncated,
                "the gzip stream ends before it should",
                "copy or pack the file again",
            )
            .at_byte(packed.len() as u64)
        } else {
            Error::new(
                Kind::UnknownFormat,
                format!("the gzip stream is damaged: {e}"),
                "copy or pack the file again",
            )
        }
    })?;
    if out.len() as u64 > most {
        return Err(too_large(packed.len() as u64, most));
    }
    if is_gzip(&out) {
        return Err(Error::new(
            Kind::UnknownFormat,
            "the file is packed by gzip twice",
            "unpack it once",
        ));
    }
    Ok(Bytes::Owned(out))
}

/// The refusal of what unpacks to more than `most` bytes.
pub(crate) fn too_large(packed: u64, most: u64) -> Error {
    Error::new(
        Kind::TooLarge,
        format!("{packed} packed bytes unpack to more than {most} bytes"),
        "unpack it yourself, if you trust it and the memory is there, and name the unpacked file",
    )
}

#[cfg(test)]
mod tests {
    use super::*;
    use flate2::{Compression, write::GzEncoder};
    use std::io::Write;

    fn pack(bytes: &[u8]) -> Vec<u8> {
        let mut out = GzEncoder::new(Vec::new(), Compression::best());
        out.write_all(bytes).unwrap();
        out.finish().unwrap()
    }

    #[test]
    fn members_follow_each_other_and_the_rest_goes_through() {
        let mut two = pack(b"solid ");
        two.extend(pack(b"wheel"));
        assert_eq!(&unpack(Bytes::Owned(two)).unwrap()[..], b"solid wheel");
        assert_eq!(&unpack(Bytes::Owned(b"v 0".into())).unwrap()[..], b"v 0");
    }

    #[test]
    fn bombs_damage_and_early_ends_are_told() {
        let bomb = pack(&vec![0; 64 << 20]);
        assert!(bomb.len() < 80_000);
        let e = unpack(Bytes::Owned(bomb)).unwrap_err();
        assert_eq!(e.kind, Kind::TooLarge);
        let whole = pack(&(0..2000u32).flat_map(u32::to_le_bytes).collect::<Vec<_>>());
        for end in [3, 12, whole.len() / 2, whole.len() - 1] {
            let e = unpack(Bytes::Owned(whole[..end].to_vec())).unwrap_err();
            assert_eq!(e.kind, Kind::Truncated, "{end}: {e}");
        }
        let mut wrong = whole.clone();
        let at = wrong.len() - 6;
        wrong[at] ^= 1;
        let e = unpack(Bytes::Owned(wrong)).unwrap_err();
        assert_eq!(e.kind, Kind::UnknownFormat, "{e}");
        let e = unpack(Bytes::Owned(pack(&whole))).unwrap_err();
        assert_eq!(e.kind, Kind::UnknownFormat);
    }
}
