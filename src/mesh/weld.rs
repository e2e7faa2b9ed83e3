//! Exact welding: corners whose coordinates are the same bits (−0 taken as 0) are one vertex.

use std::sync::atomic::{AtomicU32, Ordering};

use rayon::prelude::*;

use super::Triangles;
use super::buckets::{Buckets, hash2, random_seed};
use crate::error::{Error, Kind, Result};

/// Most triangles that the exact path audits: corners are numbered in 32 bits.
pub const MOST_TRIANGLES: usize = (u32::MAX / 3) as usize;

/// Vertex numbers after welding, three a triangle.
///
/// A vertex's number is that of the first place, in file order, where its coordinates stand: a
/// corner (3·triangle + corner) where corners are not shared, a row of the vertex list where they
/// are.
pub(crate) fn weld(triangles: &Triangles) -> Result<Vec<[u32; 3]>> {
    if triangles.count() > MOST_TRIANGLES {
        return Err(Error::new(
            Kind::TooLarge,
            format!(
                "{} triangles are more than the {MOST_TRIANGLES} that can be audited",
                triangles.count()
            ),
            "split the file into its bodies and weigh each",
        ));
    }
    Ok(match triangles {
        Triangles::Records(r) => {
            let facets = r.facets();
            weld_corners(triangles.count(), |t| {
                facets.raw(t).map(|p| {
                    // −0 + 0 is +0; every other value keeps its bits.
                    let b = p.map(|x| (x + 0.0).to_bits());
                    [u64::from(b[0]) | u64::from(b[1]) << 32, u64::from(b[2])]
                })
            })
        }
        Triangles::Loose(list) => weld_corners(list.len(), |t| list[t].map(key64)),
        Triangles::Indexed { vertices, corners } => {
            let first = weld_points(vertices.len(), |v| key64(vertices[v]));
            corners
                .par_iter()
                .map(|c| c.map(|v| first[v as usize]))
                .collect()
        }
    })
}

fn key64(p: [f64; 3]) -> [u64; 3] {
    p.map(|x| (x + 0.0).to_bits())
}

/// A key that welding compares: the coordinate bits.
trait Key: Copy + Default + Eq + Send + Sync {
    fn hash(self, seed: u64) -> u64;
}

impl Key for [u64; 2] {
    #[inline(always)]
    fn hash(self, seed: u64) -> u64 {
        hash2(seed, self[0], self[1])
    }
}

impl Key for [u64; 3] {
    #[inline(always)]
    fn hash(self, seed: u64) -> u64 {
        hash2(hash2(seed, self[0], self[1]), self[2], 1)
    }
}

fn weld_corners<K: Key>(n: usize, keys: impl Fn(usize) -> [K; 3] + Sync) -> Vec<[u32; 3]> {
    let seed = random_seed();
    let buckets = Buckets::<(K, u32)>::fill(n, 3, |range, push| {
        for t in range {
            for (k, key) in keys(t).into_iter().enumerate() {
                push(key.hash(seed), (key, (3 * t + k) as u32));
            }
        }
    });
    let out: Vec<AtomicU32> = (0..3 * n)
        .into_par_iter()
        .map(|_| AtomicU32::new(0))
        .collect();
    first_places(&buckets, &out);
    out.par_chunks_exact(3)
        .map(|c| [0, 1, 2].map(|k: usize| c[k].load(Ordering::Relaxed)))
        .collect()
}

fn weld_points<K: Key>(n: usize, key: impl Fn(usize) -> K + Sync) -> Vec<u32> {
    let seed = random_seed();
    let buckets = Buckets::<(K, u32)>::fill(n, 1, |range, push| {
        for v in range {
            let k = key(v);
            push(k.hash(seed), (k, v as u32));
        }
    });
    let out: Vec<AtomicU32> = (0..n).into_par_iter().map(|_| AtomicU32::new(0)).collect();
    first_places(&buckets, &out);
    out.into_iter().map(AtomicU32::into_inner).collect()
}

/// For each place, the first place of the same key. Places of one key are all in one bucket, in
/// order, so each bucket can be done alone.
fn first_places<K: Key>(buckets: &Buckets<(K, u32)>, out: &[AtomicU32]) {
    (0..buckets.count())
        .into_par_iter()
        .for_each_init(Table::default, |table, b| {
            table.clear(buckets.len(b));
            for (_, segment) in buckets.segments(b) {
                for &(key, place) in segment {
                    out[place as usize].store(table.first(key, place), Ordering::Relaxed);
                }
            }
        });
}

/// Open addressing with the key beside its first place.
struct Table<K> {
    slots: Vec<(K, u32)>,
    used: usize,
    seed: u64,
}

/// Marks an empty slot; no place has this number, since triangles are limited to a third of it.
const EMPTY: u32 = u32::MAX;

impl<K> Default for Table<K> {
    fn default() -> Self {
        Self {
            slots: Vec::new(),
            used: 0,
            seed: random_seed(),
        }
    }
}

impl<K: Key> Table<K> {
    fn clear(&mut self, items: usize) {
        // Most meshes have six corners to a vertex; the table grows where one has fewer.
        let size = (items / 2).next_power_of_two().max(16);
        self.slots.clear();
        self.slots.resize(size, (K::default(), EMPTY));
        self.used = 0;
    }

    #[inline(always)]
    fn first(&mut self, key: K, place: u32) -> u32 {
        let mask = self.slots.len() - 1;
        let mut at = key.hash(self.seed) as usize & mask;
        loop {
            let slot = self.slots[at];
            if slot.1 == EMPTY {
                break;
            }
            if slot.0 == key {
                return slot.1;
            }
            at = (at + 1) & mask;
        }
        self.slots[at] = (key, place);
        self.used += 1;
        if self.used * 2 > self.slots.len() {
            self.grow();
        }
        place
    }

    #[cold]
    fn grow(&mut self) {
        let size = self.slots.len() * 2;
        let old = std::mem::replace(&mut self.slots, vec![(K::default(), EMPTY); size]);
        for (key, place) in old.into_iter().filter(|s| s.1 != EMPTY) {
            let mut at = key.hash(self.seed) as usize & (size - 1);
            while self.slots[at].1 != EMPTY {
                at = (at + 1) & (size - 1);
            }
            self.slots[at] = (key, place);
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;
    use std::collections::HashMap;

    proptest! {
        #[test]
        fn numbers_are_first_places(
            raw in prop::collection::vec(prop::array::uniform9(-2i8..=2), 0..200)
        ) {
            let list: Vec<[[f64; 3]; 3]> = raw
                .iter()
                .map(|v| [0, 3, 6].map(|k| [0, 1, 2].map(|i| f64::from(v[k + i]) * -0.5)))
                .collect();
            let mut seen = HashMap::new();
            let mut want = Vec::new();
            for (i, p) in list.iter().flatten().enumerate() {
                let key = p.map(|x| (x + 0.0).to_bits());
                want.push(*seen.entry(key).or_insert(i as u32));
            }
            let got = weld(&Triangles::Loose(list)).unwrap();
            prop_assert_eq!(got.concat(), want);
        }
    }
}
