//! Matching of directed edges: which triangles meet where, and which edges are not plain.

use rayon::prelude::*;

use super::buckets::{Buckets, Hash};
use super::union::Sets;

/// One triangle's passage along an edge.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub(crate) struct Half {
    /// The vertex of lower number.
    pub(crate) low: u32,
    /// The vertex of higher number.
    pub(crate) high: u32,
    /// The triangle.
    pub(crate) triangle: u32,
    /// Whether it runs from low to high.
    pub(crate) forward: bool,
}

/// Of an edge of which only one passage is known yet.
const NONE: u32 = u32::MAX;
/// Of an edge that is not one passage each way by two triangles of one name.
const IRREGULAR: u32 = u32::MAX - 1;

/// Joins triangles across every plain edge (two triangles of one name, one passage each way) and
/// returns all passages along the other edges, sorted by edge, then triangle.
///
/// Triangles in which two corners are one vertex have no say: their passages cancel by themselves.
pub(crate) fn match_edges(
    corners: &[[u32; 3]],
    name_of: &(dyn Fn(u32) -> u32 + Sync),
    sets: &Sets,
    scratch: Vec<u32>,
) -> Vec<Half> {
    let buckets = Buckets::<3>::fill(corners.len(), scratch, |t| {
        let [a, b, c] = corners[t];
        let whole = a != b && b != c && c != a;
        whole.then(|| [(a, b), (b, c), (c, a)].map(|(a, b)| packed(a, b, t as u32)))
    });
    let mut odd: Vec<Half> = (0..buckets.count())
        .into_par_iter()
        .fold(
            || (EdgeTable::default(), Vec::new()),
            |(mut table, mut odd), b| {
                table.clear(buckets.len(b));
                buckets.each(b, |&[low, high, passage]| {
                    table.see(low, high, passage, name_of);
                });
                if table.settle(sets) {
                    buckets.each(b, |&[low, high, passage]| {
                        if table.is_irregular(low, high) {
                            let forward = passage & 1 == 1;
                            odd.push(Half {
                                low,
                                high,
                                triangle: passage >> 1,
                                forward,
                            });
                        }
                    });
                }
                (table, odd)
            },
        )
        .map(|(_, odd)| odd)
        .reduce(Vec::new, |mut a, mut b| {
            a.append(&mut b);
            a
        });
    odd.par_sort_unstable();
    odd
}

/// The passage a → b of a triangle: low, high, 2·triangle + forward.
#[inline(always)]
fn packed(a: u32, b: u32, triangle: u32) -> [u32; 3] {
    [a.min(b), a.max(b), triangle << 1 | u32::from(a < b)]
}

struct Edge {
    low: u32,
    high: u32,
    first: u32,
    second: u32,
}

#[derive(Default)]
struct EdgeTable {
    hash: Hash<3>,
    slots: Vec<u32>,
    edges: Vec<Edge>,
}

impl EdgeTable {
    fn clear(&mut self, passages: usize) {
        // Two passages to an edge in all but broken meshes; the table grows in those.
        let size = passages.next_power_of_two().max(16);
        self.slots.clear();
        self.slots.resize(size, NONE);
        self.edges.clear();
    }

    #[inline(always)]
    fn place(&self, low: u32, high: u32) -> usize {
        let mask = self.slots.len() - 1;
        let mut at =
            (self.hash.of(&[low, high, 0]) >> (64 - self.slots.len().trailing_zeros())) as usize;
        loop {
            let slot = self.slots[at];
            if slot == NONE {
                return at;
            }
            let e = &self.edges[slot as usize];
            if e.low == low && e.high == high {
                return at;
            }
            at = (at + 1) & mask;
        }
    }

    #[inline(always)]
    fn see(&mut self, low: u32, high: u32, passage: u32, name_of: &(dyn Fn(u32) -> u32 + Sync)) {
        let at = self.place(low, high);
        let slot = self.slots[at];
        if slot == NONE {
            self.slots[at] = self.edges.len() as u32;
            self.edges.push(Edge {
                low,
                high,
                first: passage,
                second: NONE,
            });
            if self.edges.len() * 4 > self.slots.len() * 3 {
                self.grow();
            }
            return;
        }
        let e = &mut self.edges[slot as usize];
        let opposed = (e.first ^ passage) & 1 == 1;
        e.second = if e.second == NONE && opposed && name_of(e.first >> 1) == name_of(passage >> 1)
        {
            passage
        } else {
            IRREGULAR
        };
    }

    #[cold]
    fn grow(&mut self) {
        self.slots.clear();
        self.slots
            .resize((self.edges.len() * 2).next_power_of_two(), NONE);
        for i in 0..self.edges.len() {
            let at = self.place(self.edges[i].low, self.edges[i].high);
            self.slots[at] = i as u32;
        }
    }

    /// Joins across plain edges; says whether there are others.
    fn settle(&mut self, sets: &Sets) -> bool {
        let mut others = false;
        // Neighbours in a shuffled file are far apart. Looking many up at once, before any is
        // joined, lets the processor wait for all of them together.
        const AT_ONCE: usize = 64;
        let mut above = [(0u32, 0u32); AT_ONCE];
        for block in self.edges.chunks_mut(AT_ONCE) {
            let mut n = 0;
            for e in block {
                if e.second < IRREGULAR {
                    above[n] = (sets.above(e.first >> 1), sets.above(e.second >> 1));
                    n += 1;
                } else {
                    e.second = IRREGULAR;
                    others = true;
                }
            }
            for pair in &mut above[..n] {
                *pair = (sets.above(pair.0), sets.above(pair.1));
            }
            for &(x, y) in above[..n].iter().filter(|(x, y)| x != y) {
                sets.join(x, y);
            }
        }
        others
    }

    fn is_irregular(&self, low: u32, high: u32) -> bool {
        let slot = self.slots[self.place(low, high)];
        slot != NONE && self.edges[slot as usize].second == IRREGULAR
    }
}
