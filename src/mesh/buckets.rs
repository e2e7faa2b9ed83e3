//! Items sorted into buckets by hash, in parallel and in a fixed order.
//!
//! An item is a few 32-bit words. Each fixed chunk of sources is sorted by bucket on its own, in
//! a core's own cache; a bucket is then the list of its segments over all chunks. Inside a bucket
//! the items keep the order of the sources, on any number of threads. The cost does not depend on
//! the order that the sources come in.

use std::sync::atomic::AtomicU32;

use rayon::prelude::*;

/// Items in buckets: `W` words each.
pub(crate) struct Buckets<const W: usize> {
    /// Chunk after chunk; in a chunk, bucket after bucket.
    items: Vec<u32>,
    /// For each chunk, where in it each bucket starts, and the end.
    starts: Vec<u32>,
    /// The bucket of each item, in source order, chunk after chunk.
    tags: Vec<u16>,
    count: usize,
    /// Room for the items of one chunk.
    room: usize,
    /// Sources of one chunk.
    sources: usize,
}

/// Items of one bucket that keep its table inside a core's own cache.
const ITEMS_A_BUCKET: usize = 32_768;

impl<const W: usize> Buckets<W> {
    /// Sorts the items of sources `0..n` into buckets: `M` of each source, or none. `scratch` is
    /// memory that an earlier run gave back, or none.
    pub(crate) fn fill<const M: usize>(
        n: usize,
        scratch: Vec<u32>,
        items_of: impl Fn(usize) -> Option<[[u32; W]; M]> + Sync,
    ) -> Self {
        let hash = Hash::<W>::default();
        Self::fill_by(n, scratch, items_of, |item| hash.of(item))
    }

    /// The same with a hash of one's own, whose top bits must be the random ones.
    pub(crate) fn fill_by<const M: usize>(
        n: usize,
        scratch: Vec<u32>,
        items_of: impl Fn(usize) -> Option<[[u32; W]; M]> + Sync,
        hash: impl Fn(&[u32; W]) -> u64 + Sync,
    ) -> Self {
        let bits = (n.saturating_mul(M) / ITEMS_A_BUCKET)
            .next_power_of_two()
            .trailing_zeros()
            .clamp(1, 14);
        let count = 1usize << bits;
        // A bucket's segment of a chunk should be a few cache lines at least, and a chunk not
        // much more than a core's own cache.
        let sources = (count * 48 / M).clamp(8192, 1 << 18);
        let chunks = n.div_ceil(sources);
        let room = sources * M;
        let mut items = scratch;
        if items.len() < chunks * room * W {
            // Zeroed memory costs nothing before it is touched.
            items = vec![0; chunks * room * W];
        }
        let mut tags = vec![0u16; chunks * room];
        let mut starts = vec![0u32; chunks * (count + 1)];
        items[..chunks * room * W]
            .as_chunks_mut::<W>()
            .0
            .par_chunks_mut(room.max(1))
            .zip(tags.par_chunks_mut(room.max(1)))
            .zip(starts.par_chunks_mut(count + 1))
            .enumerate()
            .for_each(|(k, ((items, tags), starts))| {
                let range = k * sources..n.min((k + 1) * sources);
                let mut used = 0;
                for items in range.clone().filter_map(&items_of) {
                    for item in &items {
                        let tag = (hash(item) >> (64 - bits)) as u16;
                        tags[used] = tag;
                        used += 1;
                        starts[tag as usize + 1] += 1;
                    }
                }
                for b in 0..count {
                    starts[b + 1] += starts[b];
                }
                let mut next = starts[..count].to_vec();
                let mut used = 0;
                for of_source in range.filter_map(&items_of) {
                    for item in of_source {
                        let at = &mut next[tags[used] as usize];
                        items[*at as usize] = item;
                        *at += 1;
                        used += 1;
                    }
                }
            });
        Self {
            items,
            starts,
            tags,
            count,
            room,
            sources,
        }
    }

    /// The memory, for the next run.
    pub(crate) fn into_scratch(self) -> Vec<u32> {
        self.items
    }

    fn all(&self) -> &[[u32; W]] {
        self.items.as_chunks::<W>().0
    }

    /// Number of buckets.
    pub(crate) fn count(&self) -> usize {
        self.count
    }

    fn chunks(&self) -> usize {
        self.starts.len() / (self.count + 1)
    }

    fn segment(&self, chunk: usize, bucket: usize) -> std::ops::Range<usize> {
        let s = &self.starts[chunk * (self.count + 1) + bucket..];
        chunk * self.room + s[0] as usize..chunk * self.room + s[1] as usize
    }

    /// Calls `see` with each item of one bucket, in source order.
    #[inline(always)]
    pub(crate) fn each(&self, bucket: usize, mut see: impl FnMut(&[u32; W])) {
        for k in 0..self.chunks() {
            for item in &self.all()[self.segment(k, bucket)] {
                see(item);
            }
        }
    }

    /// How many items the bucket holds.
    pub(crate) fn len(&self, bucket: usize) -> usize {
        (0..self.chunks())
            .map(|k| self.segment(k, bucket).len())
            .sum()
    }

    /// Lets `work` see each bucket alone, in parallel, and put a new last word into its items.
    pub(crate) fn rewrite<S>(
        &mut self,
        start: impl Fn() -> S + Sync + Send,
        work: impl Fn(&mut S, usize, &mut dyn Iterator<Item = Cells<'_, W>>) + Sync + Send,
    ) {
        let (count, room) = (self.count, self.room);
        let (starts, cells) = (&self.starts, as_atomic(&mut self.items));
        let chunks = starts.len() / (count + 1);
        (0..count).into_par_iter().for_each_init(start, |state, b| {
            let mut segments = (0..chunks).map(|k| {
                let s = &starts[k * (count + 1) + b..];
                let range = k * room + s[0] as usize..k * room + s[1] as usize;
                Cells(&cells[range.start * W..range.end * W])
            });
            let len = (0..chunks)
                .map(|k| {
                    let s = &starts[k * (count + 1) + b..];
                    (s[1] - s[0]) as usize
                })
                .sum();
            work(state, len, &mut segments);
        });
    }

    /// The last word of every item, in source order; `M` items a source, none left out.
    pub(crate) fn last_words<const M: usize>(&self, n: usize) -> Vec<[u32; M]> {
        let mut out = vec![[0u32; M]; n];
        out.par_chunks_mut(self.sources)
            .enumerate()
            .for_each(|(k, out)| {
                let first = k * (self.count + 1);
                let mut next = self.starts[first..first + self.count].to_vec();
                let items = &self.all()[k * self.room..(k + 1) * self.room];
                let tags = &self.tags[k * self.room..];
                for (word, tag) in out.as_flattened_mut().iter_mut().zip(tags) {
                    let at = &mut next[*tag as usize];
                    *word = items[*at as usize][W - 1];
                    *at += 1;
                }
            });
        out
    }
}

/// A segment of a bucket while it is rewritten.
pub(crate) struct Cells<'a, const W: usize>(&'a [AtomicU32]);

impl<const W: usize> Cells<'_, W> {
    /// Calls `change` with each item; what it returns becomes the item's last word.
    #[inline(always)]
    pub(crate) fn each(&self, mut change: impl FnMut(&[u32; W]) -> u32) {
        use std::sync::atomic::Ordering::Relaxed;
        for cell in self.0.chunks_exact(W) {
            let item: [u32; W] = std::array::from_fn(|i| cell[i].load(Relaxed));
            cell[W - 1].store(change(&item), Relaxed);
        }
    }
}

/// The same words, open to several threads while the exclusive borrow lasts.
#[allow(unsafe_code)]
fn as_atomic(words: &mut [u32]) -> &[AtomicU32] {
    // SAFETY: AtomicU32 has the size, alignment and bit validity of u32, and the exclusive borrow
    // that is given up for the shared one keeps every other access away while it lasts.
    unsafe { &*(std::ptr::from_mut(words) as *const [AtomicU32]) }
}

/// A hash drawn at random from a strongly universal family: the multilinear one, k₀ + Σ kᵢwᵢ
/// mod 2⁶⁴, of which the top bits are taken (Lemire & Kaser, "Strongly universal string hashing is
/// fast", Computer Journal 57, 2014). Results never depend on it, and no file can be built to
/// collide, since its keys differ from run to run.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Hash<const W: usize>([u64; W]);

impl<const W: usize> Default for Hash<W> {
    fn default() -> Self {
        use std::hash::{BuildHasher, Hasher};
        let draw = || {
            std::collections::hash_map::RandomState::new()
                .build_hasher()
                .finish()
        };
        Self(std::array::from_fn(|_| draw()))
    }
}

impl<const W: usize> Hash<W> {
    /// Of the first W − 1 words of an item; the last is not part of its key.
    #[inline(always)]
    pub(crate) fn of(&self, item: &[u32; W]) -> u64 {
        let mut h = self.0[W - 1];
        for (k, w) in self.0.iter().zip(&item[..W - 1]) {
            h = h.wrapping_add(k.wrapping_mul(u64::from(*w)));
        }
        h
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_item_is_in_its_bucket_and_in_order() {
        let n = 100_000;
        let mut b = Buckets::<3>::fill(n, Vec::new(), |i| {
            Some([
                [i as u32 % 777, 0, 2 * i as u32],
                [i as u32 % 555, 1, 2 * i as u32 + 1],
            ])
        });
        let mut seen = 0;
        for bucket in 0..b.count() {
            let mut items = Vec::new();
            b.each(bucket, |i| items.push(i[2]));
            assert!(items.is_sorted());
            assert_eq!(items.len(), b.len(bucket));
            seen += items.len();
        }
        assert_eq!(seen, 2 * n);
        b.rewrite(
            || (),
            |(), _, segments| {
                for s in segments {
                    s.each(|item| item[0] + item[2]);
                }
            },
        );
        for (i, words) in b.last_words::<2>(n).iter().enumerate() {
            assert_eq!(words[0] as usize, i % 777 + 2 * i);
            assert_eq!(words[1] as usize, i % 555 + 2 * i + 1);
        }
    }
}
