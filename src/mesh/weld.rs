//! Exact welding: corners whose coordinates are the same bits (−0 taken as 0) are one vertex.

use rayon::prelude::*;

use super::Triangles;
use super::buckets::{Buckets, hash2, random_seed};
use super::words::Words;
use crate::error::{Error, Kind, Result};

/// Most triangles that the exact path audits: corners are numbered in 32 bits.
pub const MOST_TRIANGLES: usize = (u32::MAX / 3) as usize;

/// Vertex numbers after welding, three a triangle, and the memory that the work was done in.
///
/// A vertex's number is that of the first place, in file order, where its coordinates stand: a
/// corner (3·triangle + corner) where corners are not shared, a row of the vertex list where they
/// are.
pub(crate) fn weld(triangles: &Triangles) -> Result<(Vec<[u32; 3]>, Words)> {
    let vertices = match triangles {
        Triangles::Indexed { vertices, .. } => vertices.len(),
        _ => 0,
    };
    if triangles.count() > MOST_TRIANGLES || vertices > MOST_TRIANGLES * 3 - 1 {
        return Err(Error::new(
            Kind::TooLarge,
            format!(
                "{} triangles are more than the {MOST_TRIANGLES} that can be audited",
                triangles.count()
            ),
            "weigh it as a whole with --whole, or split the file into its bodies",
        ));
    }
    Ok(match triangles {
        Triangles::Records(r) => {
            let facets = r.facets();
            first_places(triangles.count(), |t| {
                let corner = 3 * t as u32;
                let [p, q, r] = facets.raw(t).map(|p| p.map(bits32));
                [
                    [p[0], p[1], p[2], corner],
                    [q[0], q[1], q[2], corner + 1],
                    [r[0], r[1], r[2], corner + 2],
                ]
            })
        }
        Triangles::Loose(list) => first_places(list.len(), |t| {
            let corner = 3 * t as u32;
            let [p, q, r] = list[t];
            [
                words64(p, corner),
                words64(q, corner + 1),
                words64(r, corner + 2),
            ]
        }),
        Triangles::Indexed { vertices, corners } => {
            let (first, scratch) =
                first_places(vertices.len(), |v| [words64(vertices[v], v as u32)]);
            let corners = corners
                .par_iter()
                .map(|c| c.map(|v| first[v as usize][0]))
                .collect();
            (corners, scratch)
        }
    })
}

/// −0 + 0 is +0; every other value keeps its bits.
#[inline(always)]
fn bits32(x: f32) -> u32 {
    (x + 0.0).to_bits()
}

/// The bits of three coordinates, then the place.
#[inline(always)]
fn words64(p: [f64; 3], place: u32) -> [u32; 7] {
    let b = p.map(|x| (x + 0.0).to_bits());
    let (low, high) = (b.map(|x| x as u32), b.map(|x| (x >> 32) as u32));
    [low[0], high[0], low[1], high[1], low[2], high[2], place]
}

/// For each place, the first place of the same key. An item is its key's words, then its place.
/// Items of one key are all in one bucket, in order, so each bucket can be done alone.
fn first_places<const W: usize, const M: usize>(
    n: usize,
    items: impl Fn(usize) -> [[u32; W]; M] + Sync,
) -> (Vec<[u32; M]>, Words) {
    let seed = random_seed();
    let mut buckets = Buckets::<W>::fill(n, None, |i| Some(items(i)), |item| hash(seed, item));
    buckets.rewrite(Table::default, |table: &mut Table<W>, len, segments| {
        table.clear(len);
        for segment in segments {
            segment.each(|item| table.first(item));
        }
    });
    (buckets.last_words(n), buckets.into_scratch())
}

/// Hash of an item's key.
#[inline(always)]
fn hash<const W: usize>(seed: u64, item: &[u32; W]) -> u64 {
    let pair = |i: usize| u64::from(item[i]) | u64::from(item[i + 1]) << 32;
    let mut h = seed;
    let mut i = 0;
    while i + 3 < W - 1 {
        h = hash2(h, pair(i), pair(i + 2));
        i += 4;
    }
    match W - 1 - i {
        3 => hash2(h, pair(i), u64::from(item[i + 2])),
        2 => hash2(h, pair(i), 0),
        1 => hash2(h, u64::from(item[i]), 0),
        _ => h,
    }
}

/// Open addressing: keys with their first places.
struct Table<const W: usize> {
    slots: Vec<[u32; W]>,
    used: usize,
    seed: u64,
}

/// Marks an empty slot; no place has this number, since triangles are limited to a third of it
/// and vertices of one file to as many.
const EMPTY: u32 = u32::MAX;

impl<const W: usize> Default for Table<W> {
    fn default() -> Self {
        Self {
            slots: Vec::new(),
            used: 0,
            seed: random_seed(),
        }
    }
}

impl<const W: usize> Table<W> {
    fn clear(&mut self, items: usize) {
        // Most meshes have six corners to a vertex; the table grows where one has fewer.
        let size = (items / 2).next_power_of_two().max(16);
        self.slots.clear();
        self.slots.resize(size, [EMPTY; W]);
        self.used = 0;
    }

    /// The first place of the item's key; the item's own where it is the first.
    #[inline(always)]
    fn first(&mut self, item: &[u32; W]) -> u32 {
        let mask = self.slots.len() - 1;
        let mut at = hash(self.seed, item) as usize & mask;
        loop {
            let slot = &self.slots[at];
            if slot[W - 1] == EMPTY {
                break;
            }
            if slot[..W - 1] == item[..W - 1] {
                return slot[W - 1];
            }
            at = (at + 1) & mask;
        }
        self.slots[at] = *item;
        self.used += 1;
        if self.used * 2 > self.slots.len() {
            self.grow();
        }
        item[W - 1]
    }

    #[cold]
    fn grow(&mut self) {
        let size = self.slots.len() * 2;
        let old = std::mem::replace(&mut self.slots, vec![[EMPTY; W]; size]);
        for item in old.into_iter().filter(|s| s[W - 1] != EMPTY) {
            let mut at = hash(self.seed, &item) as usize & (size - 1);
            while self.slots[at][W - 1] != EMPTY {
                at = (at + 1) & (size - 1);
            }
            self.slots[at] = item;
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
            let (got, _) = weld(&Triangles::Loose(list)).unwrap();
            prop_assert_eq!(got.concat(), want);
        }
    }
}
