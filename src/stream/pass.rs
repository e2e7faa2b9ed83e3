//! The order in which chunks are added: that of the file, whatever the number of threads.

use rayon::prelude::*;

use super::kernel::Part;
use crate::error::Result;

/// Chunks whose parts are held at a time before they are added, so that memory does not grow with
/// the file. Nothing depends on it but the memory.
const HELD: u64 = 1024;

/// Adds the parts of all chunks to the total, one by one and in order; of several errors, the first
/// in order.
pub(super) fn in_order(
    total: &mut Part,
    chunks: u64,
    part: impl Fn(u64) -> Result<Part> + Sync,
) -> Result<()> {
    let mut begin = 0;
    while begin < chunks {
        let end = chunks.min(begin + HELD);
        let parts: Vec<Result<Part>> = (begin..end).into_par_iter().map(&part).collect();
        for part in parts {
            total.join(&part?);
        }
        begin = end;
    }
    Ok(())
}
