//! Any bytes through detection and the whole reader, with and without a hint.
#![no_main]

use std::path::Path;

use bismar::format::{Bytes, Family, read};
use libfuzzer_sys::fuzz_target;

fuzz_target!(|data: &[u8]| {
    for hint in [None].into_iter().chain(Family::ALL.map(Some)) {
        if let Err(error) = read(Bytes::Owned(data.to_vec()), Path::new("x"), hint) {
            assert!(error.path.is_some() && !error.advice.is_empty());
        }
    }
});
