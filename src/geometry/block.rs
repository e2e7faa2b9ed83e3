//! Triangles laid out for vector arithmetic: a block of them, one array a coordinate.
//!
//! A processor that has just written single coordinates stalls when it reads them back as one
//! vector; a block is long enough for the writes to have landed.

use std::ops::Range;

use super::{Corners, RecordFacets, Select};

/// Triangles that are worked on side by side. Part of the definition of the bits of every sum.
pub(crate) const LANES: usize = 8;

/// Triangles in a block.
pub(crate) const BLOCK: usize = 64;

/// One number a triangle, for [`LANES`] triangles.
pub(crate) type Lane = [f64; LANES];

/// A coordinate as it is stored.
pub(crate) trait Coordinate: Copy + Default + PartialOrd {
    /// Above every number.
    const HIGHEST: Self;
    /// Below every number.
    const LOWEST: Self;
    /// As f64, exactly.
    fn wide(self) -> f64;
    /// −0 as +0; everything else as it is.
    fn canonical(self) -> Self;
}

impl Coordinate for f32 {
    const HIGHEST: Self = Self::INFINITY;
    const LOWEST: Self = Self::NEG_INFINITY;
    #[inline(always)]
    fn wide(self) -> f64 {
        f64::from(self)
    }
    #[inline(always)]
    fn canonical(self) -> Self {
        self + 0.0
    }
}

impl Coordinate for f64 {
    const HIGHEST: Self = Self::INFINITY;
    const LOWEST: Self = Self::NEG_INFINITY;
    #[inline(always)]
    fn wide(self) -> f64 {
        self
    }
    #[inline(always)]
    fn canonical(self) -> Self {
        self + 0.0
    }
}

/// Up to [`BLOCK`] triangles: `[corner][axis][triangle]`.
pub(crate) struct Block<T> {
    pub(crate) at: [[[T; BLOCK]; 3]; 3],
}

impl<T: Coordinate> Block<T> {
    #[inline(always)]
    pub(crate) fn new() -> Self {
        Self {
            at: [[[T::default(); BLOCK]; 3]; 3],
        }
    }

    /// Sets triangles `from` and up to `pad` three times: triangles that add exactly nothing.
    #[inline(always)]
    fn pad(&mut self, from: usize, pad: [T; 3]) {
        for corner in &mut self.at {
            for (axis, value) in corner.iter_mut().zip(pad) {
                axis[from..].fill(value);
            }
        }
    }
}

impl Block<f32> {
    /// Takes the records of `range`, at most [`BLOCK`], and as many times `pad` as are missing.
    ///
    /// Never inlined: where it is, compilers fetch the coordinates with gathers, which are slower
    /// than plain moves.
    #[allow(
        clippy::needless_range_loop,
        reason = "one index runs over several arrays"
    )]
    #[inline(never)]
    pub(crate) fn records(
        &mut self,
        facets: &RecordFacets<'_>,
        range: Range<usize>,
        pad: [f32; 3],
    ) {
        let n = range.len().min(BLOCK);
        for (l, t) in range.take(BLOCK).enumerate() {
            let corners = facets.raw(t);
            for k in 0..3 {
                for i in 0..3 {
                    self.at[k][i][l] = corners[k][i];
                }
            }
        }
        if n < BLOCK {
            self.pad(n, pad);
        }
    }
}

impl Block<f64> {
    /// Takes the positions `range` of the selection, at most [`BLOCK`], and as many times `pad`
    /// as are missing.
    #[allow(
        clippy::needless_range_loop,
        reason = "one index runs over several arrays"
    )]
    #[inline(never)]
    pub(crate) fn triangles<C: Corners>(
        &mut self,
        facets: &C,
        select: Select<'_>,
        range: Range<usize>,
        pad: [f64; 3],
    ) {
        let n = range.len().min(BLOCK);
        for (l, position) in range.take(BLOCK).enumerate() {
            let corners = facets.triangle(select.get(position));
            for k in 0..3 {
                for i in 0..3 {
                    self.at[k][i][l] = corners[k][i];
                }
            }
        }
        if n < BLOCK {
            self.pad(n, pad);
        }
    }
}
