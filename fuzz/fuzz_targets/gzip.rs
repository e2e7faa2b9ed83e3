//! Any bytes as a gzip stream: what comes out is within bounds.
#![no_main]

use bismar::format::{Bytes, gzip};
use libfuzzer_sys::fuzz_target;

fuzz_target!(|data: &[u8]| {
    let packed = gzip::is_gzip(data);
    match gzip::unpack(Bytes::Owned(data.to_vec())) {
        Ok(out) if packed => assert!(out.len() <= 256 * data.len() + (1 << 20)),
        Ok(out) => assert_eq!(&out[..], data),
        Err(error) => assert!(packed && !error.advice.is_empty()),
    }
});
