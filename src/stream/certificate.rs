//! The closedness certificate: do the directed edges of a triangle soup cancel?
//!
//! Every vertex is sent to a pseudo-random point (u, w) of the plane over the integers modulo 2⁶⁴,
//! by its coordinates and a seed. The certificate is the sum of twice the signed areas of the
//! triangles there. By the shoelace rule that area is a sum over directed edges,
//! H(a,b) = u(a)·w(b), each minus its reverse, H(b,a): edges that cancel add exactly nothing, in
//! any order and grouping, so a closed surface always gives zero. One area costs two
//! multiplications a triangle, where a hash of every edge would cost six. Two such planes with
//! independent keys make 128 bits.
//!
//! **When edges do not cancel.** Let m(a,b) be how often a→b stands more often than b→a. With u and
//! w independent random functions of the vertex, S = Σ m(a,b)·(u(a)w(b) − u(b)w(a)) over unordered
//! pairs is linear in the u of any one vertex a, with coefficient L = Σ_b m(a,b)·w(b). Where some
//! m(a,b) is odd, L is uniform, is divisible by 2^v exactly with chance 2^−(v+1), and then S is zero
//! with chance at most 2^(v−64); together at most 33·2⁻⁶⁴. Both planes: 33²·2⁻¹²⁸ < 2⁻¹¹⁷. (This is
//! the lemma of Schwartz, J. ACM 27(4), 1980, and Zippel, EUROSAM 1979, carried to a ring.) Where
//! every m is divisible by 2^k, the bound is 2^(2k) times that: a hole of a mesh that stands there
//! a million times over is still found but for a chance of 2⁻⁷⁷.
//!
//! **What that rests on.** u and w are not random functions but four and five rounds of multiplication by
//! odd numbers and folding, keyed by the seed; no theorem says that they behave like random ones. The
//! tests look for it on structured coordinates (whole numbers, signs, prisms, symmetric holes).
//! Whoever knows the seed can build an open mesh whose certificate is zero: [`Keys::published`]
//! defends against chance alone. [`Keys::random`] differs from run to run, so that a file cannot be
//! made for it; the function is not a cryptographic one all the same. The exact path, which compares
//! coordinates themselves, has the last word.

use crate::geometry::{BLOCK, Block, Coordinate};

/// The keys of the two planes.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Keys([PlaneKeys; 2]);

#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct PlaneKeys {
    mask: [u64; 2],
    /// Odd multipliers.
    times: [u64; 6],
}

impl Keys {
    /// Keys that follow from a seed; slices of one mesh need the same seed.
    pub fn from_seed(seed: u64) -> Self {
        // SplitMix64: Steele, Lea and Flood, "Fast splittable pseudorandom number generators",
        // OOPSLA 2014.
        let mut state = seed;
        let mut next = || {
            state = state.wrapping_add(0x9e37_79b9_7f4a_7c15);
            let z = (state ^ (state >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
            let z = (z ^ (z >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
            z ^ (z >> 31)
        };
        Self([(); 2].map(|()| PlaneKeys {
            mask: [next(), next()],
            times: [(); 6].map(|()| next() | 1),
        }))
    }

    /// The keys of seed 0, the same in every run and on every machine.
    pub fn published() -> Self {
        Self::from_seed(0)
    }

    /// Keys that differ from run to run.
    pub fn random() -> Self {
        use std::hash::{BuildHasher, Hasher};
        let state = std::collections::hash_map::RandomState::new();
        Self::from_seed(state.build_hasher().finish())
    }
}

/// The certificate of some triangles; those of parts add to that of the whole.
///
/// Sums are comparable only under the same [`Keys`], and only between coordinates of one width
/// (f32 of binary STL, f64 of all else): others do not cancel.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Certificate([u64; 2]);

impl Certificate {
    /// Of no triangles.
    pub const ZERO: Self = Self([0; 2]);

    /// Of both.
    #[must_use]
    pub fn plus(self, other: Self) -> Self {
        Self([0, 1].map(|p| self.0[p].wrapping_add(other.0[p])))
    }

    /// Whether the directed edges cancel, but for the chance that the module states.
    pub fn cancels(self) -> bool {
        self == Self::ZERO
    }

    /// Both sums, to be written down.
    pub fn words(self) -> [u64; 2] {
        self.0
    }

    /// From what [`Certificate::words`] gave.
    pub fn from_words(words: [u64; 2]) -> Self {
        Self(words)
    }
}

impl Certificate {
    /// Adds the triangles of a block.
    #[allow(
        clippy::needless_range_loop,
        reason = "one index runs over several arrays"
    )]
    #[inline(always)]
    pub(super) fn add<T: Hashed>(&mut self, block: &Block<T>, keys: &Keys) {
        let mut sums = self.0;
        // One loop over plain numbers, as for the moments.
        for l in 0..BLOCK {
            for p in 0..2 {
                let keys = &keys.0[p];
                let (au, aw) = T::point(block, 0, l, keys);
                let (bu, bw) = T::point(block, 1, l, keys);
                let (cu, cw) = T::point(block, 2, l, keys);
                // Twice the signed area; exactly zero where two corners are alike.
                let (bu, bw) = (bu.wrapping_sub(au), bw.wrapping_sub(aw));
                let (cu, cw) = (cu.wrapping_sub(au), cw.wrapping_sub(aw));
                let area = bu.wrapping_mul(cw).wrapping_sub(cu.wrapping_mul(bw));
                sums[p] = sums[p].wrapping_add(area);
            }
        }
        self.0 = sums;
    }
}

/// Coordinates that can be hashed.
pub(super) trait Hashed: Coordinate {
    /// The point (u, w) of a corner of a triangle.
    fn point(block: &Block<Self>, corner: usize, l: usize, keys: &PlaneKeys) -> (u64, u64);
}

impl Hashed for f32 {
    #[inline(always)]
    fn point(block: &Block<f32>, corner: usize, l: usize, keys: &PlaneKeys) -> (u64, u64) {
        let [x, y, z] = &block.at[corner];
        let x = u64::from(x[l].canonical().to_bits());
        let y = u64::from(y[l].canonical().to_bits());
        let z = u64::from(z[l].canonical().to_bits());
        last(first(x | y << 32, keys), z, keys)
    }
}

impl Hashed for f64 {
    #[inline(always)]
    fn point(block: &Block<f64>, corner: usize, l: usize, keys: &PlaneKeys) -> (u64, u64) {
        let [x, y, z] = &block.at[corner];
        let x = x[l].canonical().to_bits();
        let y = y[l].canonical().to_bits();
        let z = z[l].canonical().to_bits();
        // The low half of a round number is all zeros: the high one is brought down.
        last(middle(first(x, keys), y, keys), fold::<32>(z), keys)
    }
}

#[inline(always)]
fn fold<const BY: u32>(x: u64) -> u64 {
    x ^ (x >> BY)
}

#[inline(always)]
fn first(word: u64, keys: &PlaneKeys) -> u64 {
    fold::<32>((word ^ keys.mask[0]).wrapping_mul(keys.times[0]))
}

#[inline(always)]
fn middle(t: u64, word: u64, keys: &PlaneKeys) -> u64 {
    fold::<32>(
        t.wrapping_add(word ^ keys.mask[1])
            .wrapping_mul(keys.times[5]),
    )
}

#[inline(always)]
fn last(t: u64, word: u64, keys: &PlaneKeys) -> (u64, u64) {
    let t = fold::<32>(t.wrapping_add(word.wrapping_mul(keys.times[1])));
    let t = fold::<29>(t.wrapping_mul(keys.times[2]));
    // Folding before each: mere multiples of each other would make every area zero.
    let u = fold::<29>(fold::<32>(t).wrapping_mul(keys.times[3]));
    let w = fold::<29>(fold::<32>(u).wrapping_mul(keys.times[4]));
    (u, w)
}

/// The four words that stand for a vertex of f32.
#[cfg(test)]
pub(super) fn points_of(vertex: [f32; 3], keys: &Keys) -> [u64; 4] {
    let [x, y, z] = vertex.map(|x| u64::from((x + 0.0).to_bits()));
    let [p, q] = [0, 1].map(|i: usize| last(first(x | y << 32, &keys.0[i]), z, &keys.0[i]));
    [p.0, p.1, q.0, q.1]
}
