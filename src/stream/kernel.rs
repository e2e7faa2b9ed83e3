//! One chunk of triangles: moments, area, box and certificate in a single reading.

use super::certificate::{Certificate, Hashed, Keys, Running as Edges};
use crate::geometry::eft::{Fused, Product, Split};
use crate::geometry::{BLOCK, Block, Corners, LANES, Level, RecordFacets, Select};
use crate::moments::{ChunkSums, Running};

/// What one chunk adds.
#[derive(Clone, Copy, Debug)]
pub(super) struct Part {
    pub(super) sums: ChunkSums,
    pub(super) certificate: Certificate,
    pub(super) bounds: [[f64; 3]; 2],
}

impl Part {
    /// Of no triangles.
    pub(super) const NOTHING: Self = Self {
        sums: ChunkSums::ZERO,
        certificate: Certificate::ZERO,
        bounds: [[f64::INFINITY; 3], [f64::NEG_INFINITY; 3]],
    };

    /// Adds the part that follows.
    pub(super) fn join(&mut self, next: &Self) {
        self.sums.join(&next.sums);
        self.certificate = self.certificate.plus(next.certificate);
        for k in 0..3 {
            self.bounds[0][k] = self.bounds[0][k].min(next.bounds[0][k]);
            self.bounds[1][k] = self.bounds[1][k].max(next.bounds[1][k]);
        }
    }
}

/// Triangles that can be laid out in blocks.
pub(super) trait Source: Sync {
    type Coordinate: Hashed;
    fn fill(
        &self,
        range: std::ops::Range<usize>,
        apex: [f64; 3],
        block: &mut Block<Self::Coordinate>,
    );
}

/// Binary STL records.
pub(super) struct OfRecords<'a>(pub(super) RecordFacets<'a>);

impl Source for OfRecords<'_> {
    type Coordinate = f32;
    #[inline(always)]
    fn fill(&self, range: std::ops::Range<usize>, apex: [f64; 3], block: &mut Block<f32>) {
        // The apex is a corner of a record: f32 holds it.
        block.records(&self.0, range, apex.map(|x| x as f32));
    }
}

/// Anything else.
pub(super) struct OfCorners<'a, C>(pub(super) &'a C);

impl<C: Corners> Source for OfCorners<'_, C> {
    type Coordinate = f64;
    #[inline(always)]
    fn fill(&self, range: std::ops::Range<usize>, apex: [f64; 3], block: &mut Block<f64>) {
        block.triangles(self.0, Select::All, range, apex);
    }
}

/// The triangles `range` of the source, by the fastest kernel that this processor runs; all give
/// the same bits.
pub(super) fn part<S: Source>(
    source: &S,
    range: std::ops::Range<usize>,
    apex: [f64; 3],
    keys: &Keys,
) -> Part {
    match Level::of_processor() {
        // SAFETY: the processor has just been asked for the features.
        #[cfg(target_arch = "x86_64")]
        #[allow(unsafe_code)]
        Level::Wide512 => unsafe { wide512(source, range, apex, keys) },
        // SAFETY: as above.
        #[cfg(target_arch = "x86_64")]
        #[allow(unsafe_code)]
        Level::Wide256 => unsafe { wide256(source, range, apex, keys) },
        Level::Fused => kernel::<S, Fused>(source, range, apex, keys),
        Level::Plain => kernel::<S, Split>(source, range, apex, keys),
    }
}

#[cfg(target_arch = "x86_64")]
#[target_feature(enable = "avx512f,avx512dq,avx512vl,avx512bw,avx2,fma")]
fn wide512<S: Source>(
    source: &S,
    range: std::ops::Range<usize>,
    apex: [f64; 3],
    keys: &Keys,
) -> Part {
    kernel::<S, Fused>(source, range, apex, keys)
}

#[cfg(target_arch = "x86_64")]
#[target_feature(enable = "avx2,fma")]
fn wide256<S: Source>(
    source: &S,
    range: std::ops::Range<usize>,
    apex: [f64; 3],
    keys: &Keys,
) -> Part {
    kernel::<S, Fused>(source, range, apex, keys)
}

/// By the kernel that every processor runs.
#[cfg(test)]
pub(super) fn plain<S: Source>(
    source: &S,
    range: std::ops::Range<usize>,
    apex: [f64; 3],
    keys: &Keys,
) -> Part {
    kernel::<S, Split>(source, range, apex, keys)
}

#[inline(always)]
fn kernel<S: Source, P: Product>(
    source: &S,
    range: std::ops::Range<usize>,
    apex: [f64; 3],
    keys: &Keys,
) -> Part {
    let mut sums = Running::ZERO;
    let mut edges = Edges::ZERO;
    let mut block = Block::<S::Coordinate>::new();
    let mut boxes = Boxes::new();
    let mut at = range.start;
    while at < range.end {
        let end = range.end.min(at + BLOCK);
        source.fill(at..end, apex, &mut block);
        // Triangles past the end are the apex three times: they add nothing to any of these.
        for group in 0..(end - at).div_ceil(LANES) {
            sums.add::<P>(&block.lanes(group), apex, [0.0; 3]);
        }
        for group in 0..(end - at).div_ceil(LANES) {
            edges.add(&block, group, keys);
        }
        boxes.add(&block);
        at = end;
    }
    Part {
        sums: sums.finish(),
        certificate: edges.finish(),
        bounds: boxes.finish(),
    }
}

/// Lanes of the boxes: one vector of f32 on the widest processors.
const WIDE: usize = 16;

/// Least and greatest coordinates, one box a lane.
struct Boxes<T> {
    low: [[T; WIDE]; 3],
    high: [[T; WIDE]; 3],
    empty: bool,
}

impl<T: Hashed> Boxes<T> {
    #[inline(always)]
    fn new() -> Self {
        Self {
            low: [[T::default(); WIDE]; 3],
            high: [[T::default(); WIDE]; 3],
            empty: true,
        }
    }

    #[inline(always)]
    fn add(&mut self, block: &Block<T>) {
        if self.empty {
            self.empty = false;
            for i in 0..3 {
                self.low[i].copy_from_slice(&block.at[0][i][..WIDE]);
                self.high[i].copy_from_slice(&block.at[0][i][..WIDE]);
            }
        }
        for corner in &block.at {
            for i in 0..3 {
                let (mut low, mut high) = (self.low[i], self.high[i]);
                for part in corner[i].chunks_exact(WIDE) {
                    for l in 0..WIDE {
                        // As the machine's own minimum, which leaves out what is not a number:
                        // such chunks are refused by their sums.
                        low[l] = if part[l] < low[l] { part[l] } else { low[l] };
                        high[l] = if part[l] > high[l] { part[l] } else { high[l] };
                    }
                }
                (self.low[i], self.high[i]) = (low, high);
            }
        }
    }

    #[inline(always)]
    fn finish(&self) -> [[f64; 3]; 2] {
        if self.empty {
            return Part::NOTHING.bounds;
        }
        let of = |lanes: &[T; WIDE], pick: fn(f64, f64) -> f64| {
            let first = lanes[0].canonical().wide();
            lanes.iter().map(|x| x.canonical().wide()).fold(first, pick)
        };
        [
            [0, 1, 2].map(|i| of(&self.low[i], f64::min)),
            [0, 1, 2].map(|i| of(&self.high[i], f64::max)),
        ]
    }
}
