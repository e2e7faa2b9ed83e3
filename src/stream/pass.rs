//! All chunks of a range, added up.

use std::ops::Range;

use rayon::prelude::*;

use super::kernel::{Part, Total};
use crate::error::Result;

/// Chunks whose parts are held at a time before they are added, so that memory does not grow with
/// the file. Nothing depends on it but the memory.
const HELD: u64 = 1024;

/// Adds the parts of the chunks to the total; of several errors, the first in order.
pub(super) fn all(
    total: &mut Total,
    chunks: Range<u64>,
    part: impl Fn(u64) -> Result<Part> + Sync,
) -> Result<()> {
    let mut begin = chunks.start;
    while begin < chunks.end {
        let end = chunks.end.min(begin + HELD);
        let parts: Vec<Result<Part>> = (begin..end).into_par_iter().map(&part).collect();
        for part in parts {
            total.add(&part?);
        }
        begin = end;
    }
    Ok(())
}
