//! Items sorted into buckets by hash, in parallel and in a fixed order.
//!
//! Each fixed chunk of items is sorted by bucket on its own, in cache; a bucket is then the list
//! of its segments over all chunks. Inside a bucket the items keep the order of the input, on any
//! number of threads.

use rayon::prelude::*;

/// Items of one chunk in bucket order, with the start of each bucket.
struct Chunk<T> {
    items: Vec<T>,
    starts: Vec<u32>,
}

/// Items in buckets.
pub(crate) struct Buckets<T> {
    chunks: Vec<Chunk<T>>,
    count: usize,
}

impl<T: Copy + Default + Send + Sync> Buckets<T> {
    /// Sorts the items of `0..n` into buckets. `emit(range, push)` calls `push(hash, item)` for
    /// each item of the sources in `range`, in order; at most `per_source` of them each.
    pub(crate) fn fill<E>(n: usize, per_source: usize, emit: E) -> Self
    where
        E: Fn(std::ops::Range<usize>, &mut dyn FnMut(u64, T)) + Sync,
    {
        Self::fill_with(n, per_source, |range, sink: &mut Vec<(u32, T)>, shift| {
            emit(range, &mut |hash, item| {
                sink.push(((hash >> shift) as u32, item))
            });
        })
    }

    fn fill_with<E>(n: usize, per_source: usize, emit: E) -> Self
    where
        E: Fn(std::ops::Range<usize>, &mut Vec<(u32, T)>, u32) + Sync,
    {
        // About eight thousand items a bucket keep its table inside a core's own cache.
        let items = n.saturating_mul(per_source);
        let bits = (items / 8192)
            .next_power_of_two()
            .trailing_zeros()
            .clamp(1, 12);
        let count = 1usize << bits;
        // Chunks are large enough that a bucket's segment in one is a few cache lines.
        let chunk = (count * 64 / per_source).clamp(16_384, 1 << 20);
        let chunks = (0..n.div_ceil(chunk))
            .into_par_iter()
            .map(|k| {
                let range = k * chunk..n.min((k + 1) * chunk);
                let mut loose: Vec<(u32, T)> = Vec::with_capacity(range.len() * per_source);
                emit(range, &mut loose, 64 - bits);
                let mut starts = vec![0u32; count + 1];
                for (b, _) in &loose {
                    starts[*b as usize + 1] += 1;
                }
                for b in 0..count {
                    starts[b + 1] += starts[b];
                }
                let mut next = starts.clone();
                let mut items = vec![T::default(); loose.len()];
                for (b, item) in &loose {
                    let at = &mut next[*b as usize];
                    items[*at as usize] = *item;
                    *at += 1;
                }
                Chunk { items, starts }
            })
            .collect();
        Self { chunks, count }
    }

    /// Number of buckets.
    pub(crate) fn count(&self) -> usize {
        self.count
    }

    /// The segments of one bucket: (chunk, items), in input order.
    pub(crate) fn segments(&self, bucket: usize) -> impl Iterator<Item = (usize, &[T])> {
        self.chunks.iter().enumerate().map(move |(k, c)| {
            (
                k,
                &c.items[c.starts[bucket] as usize..c.starts[bucket + 1] as usize],
            )
        })
    }

    /// How many items the bucket holds.
    pub(crate) fn len(&self, bucket: usize) -> usize {
        self.chunks
            .iter()
            .map(|c| (c.starts[bucket + 1] - c.starts[bucket]) as usize)
            .sum()
    }
}

/// A 64-bit hash of two words: folded multiplication. Results never depend on it; `seed` is drawn
/// anew for each run so that no file can be built to collide.
#[inline(always)]
pub(crate) fn hash2(seed: u64, a: u64, b: u64) -> u64 {
    let fold = |x: u64, y: u64| {
        let p = u128::from(x) * u128::from(y);
        (p as u64) ^ ((p >> 64) as u64)
    };
    let h = fold(a ^ seed, b ^ 0x9e37_79b9_7f4a_7c15);
    fold(h ^ 0xd6e8_feb8_6659_fd93, seed | 1)
}

/// A seed that differs from run to run.
pub(crate) fn random_seed() -> u64 {
    use std::hash::{BuildHasher, Hasher};
    std::collections::hash_map::RandomState::new()
        .build_hasher()
        .finish()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_item_is_in_its_bucket_and_in_order() {
        let n = 100_000;
        let seed = random_seed();
        let b = Buckets::<u32>::fill(n, 2, |range, push| {
            for i in range {
                push(hash2(seed, i as u64 % 777, 0), i as u32);
                push(hash2(seed, i as u64 % 777, 1), i as u32);
            }
        });
        let mut seen = 0;
        for bucket in 0..b.count() {
            let items: Vec<u32> = b
                .segments(bucket)
                .flat_map(|(_, s)| s.iter().copied())
                .collect();
            assert!(items.is_sorted());
            assert_eq!(items.len(), b.len(bucket));
            seen += items.len();
        }
        assert_eq!(seen, 2 * n);
    }
}
