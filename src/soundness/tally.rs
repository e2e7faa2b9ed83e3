//! What a search for overlapping triangles keeps: counts with the first places, or only which
//! bodies are met.

use std::collections::{BTreeMap, BinaryHeap, HashMap};
use std::sync::atomic::{AtomicBool, Ordering};
use std::sync::{Mutex, PoisonError};

/// What overlaps: how often, and where first.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Cuts {
    /// How many pairs of triangles overlap.
    pub count: u64,
    /// The first of them in file order, the lower number first.
    pub pairs: Vec<(u32, u32)>,
}

/// Which bodies overlap themselves, and whether any overlap is there at all.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct CutBodies {
    /// By body.
    pub themselves: Vec<bool>,
    /// Whether any triangles overlap, of one body or of two.
    pub any: bool,
}

/// Takes what is found, from several threads in any order. Bodies are told by their index.
pub(super) trait Sink: Sync {
    /// Whether a pair of these two bodies would still add anything.
    fn wants(&self, a: u32, b: u32) -> bool;
    /// Takes a pair of triangles that overlap.
    fn put(&self, a: u32, b: u32, pair: (u32, u32));
}

#[derive(Default)]
struct Tally {
    count: u64,
    first: BinaryHeap<(u32, u32)>,
}

impl Tally {
    fn add(&mut self, pair: (u32, u32), places: usize) {
        self.count += 1;
        if self.first.len() < places {
            self.first.push(pair);
        } else if self.first.peek().is_some_and(|last| pair < *last) {
            self.first.pop();
            self.first.push(pair);
        }
    }
}

/// What was found, by the two bodies. Threads share it, since each of very many pairs of bodies
/// would else be held once for every part of the work that met it. It does not depend on the order
/// in which it is filled.
pub(super) struct Tallies {
    shards: Vec<Mutex<HashMap<(u32, u32), Tally>>>,
    places: usize,
}

impl Tallies {
    pub(super) fn new(places: usize) -> Self {
        Self {
            shards: (0..256).map(|_| Mutex::default()).collect(),
            places,
        }
    }

    pub(super) fn into_cuts(self) -> BTreeMap<(usize, usize), Cuts> {
        let cuts = |tally: Tally| Cuts {
            count: tally.count,
            pairs: tally.first.into_sorted_vec(),
        };
        self.shards
            .into_iter()
            .flat_map(|shard| shard.into_inner().unwrap_or_else(PoisonError::into_inner))
            .map(|((a, b), tally)| ((a as usize, b as usize), cuts(tally)))
            .collect()
    }
}

impl Sink for Tallies {
    #[inline(always)]
    fn wants(&self, _: u32, _: u32) -> bool {
        true
    }

    fn put(&self, a: u32, b: u32, pair: (u32, u32)) {
        let key = (a.min(b), a.max(b));
        let shard = key.0.wrapping_mul(31).wrapping_add(key.1) as usize % self.shards.len();
        let mut tallies = self.shards[shard]
            .lock()
            .unwrap_or_else(PoisonError::into_inner);
        tallies.entry(key).or_default().add(pair, self.places);
    }
}

/// Marks, which are only ever set: neither the order of threads nor what they leave out after the
/// first pair changes them.
pub(super) struct Marks {
    themselves: Vec<AtomicBool>,
    others: AtomicBool,
}

impl Marks {
    pub(super) fn new(bodies: usize) -> Self {
        Self {
            themselves: (0..bodies).map(|_| AtomicBool::default()).collect(),
            others: AtomicBool::default(),
        }
    }

    fn mark(&self, a: u32, b: u32) -> &AtomicBool {
        let one = (a == b).then(|| self.themselves.get(a as usize)).flatten();
        one.unwrap_or(&self.others)
    }

    pub(super) fn into_bodies(self) -> CutBodies {
        let themselves: Vec<bool> = self
            .themselves
            .into_iter()
            .map(AtomicBool::into_inner)
            .collect();
        let any = self.others.into_inner() || themselves.contains(&true);
        CutBodies { themselves, any }
    }
}

impl Sink for Marks {
    #[inline(always)]
    fn wants(&self, a: u32, b: u32) -> bool {
        !self.mark(a, b).load(Ordering::Relaxed)
    }

    fn put(&self, a: u32, b: u32, _: (u32, u32)) {
        self.mark(a, b).store(true, Ordering::Relaxed);
    }
}
