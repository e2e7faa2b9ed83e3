//! One chunk of triangles: moments, area, box and certificate in a single reading.

use super::certificate::{Certificate, Hashed, Keys};
use crate::geometry::eft::{Fused, Product, Split};
use crate::geometry::{BLOCK, Block, Corners, Level, RecordFacets, Select};
use crate::moments::{ChunkSums, Running, TotalSums};

/// What one chunk adds.
#[derive(Clone, Copy, Debug)]
pub(super) struct Part {
    pub(super) sums: ChunkSums,
    pub(super) certificate: Certificate,
    pub(super) bounds: [[f64; 3]; 2],
}

/// What chunks come to, in any order and grouping.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Total {
    pub(super) sums: TotalSums,
    pub(super) certificate: Certificate,
    pub(super) bounds: [[f64; 3]; 2],
}

/// The box around nothing.
pub(super) const NOWHERE: [[f64; 3]; 2] = [[f64::INFINITY; 3], [f64::NEG_INFINITY; 3]];

impl Total {
    /// Of no triangles.
    pub(super) const NOTHING: Self = Self {
        sums: TotalSums::ZERO,
        certificate: Certificate::ZERO,
        bounds: NOWHERE,
    };

    /// Adds a chunk.
    pub(super) fn add(&mut self, part: &Part) {
        self.sums.add(&part.sums);
        self.beside(part.certificate, &part.bounds);
    }

    /// Adds what other chunks come to.
    pub(super) fn join(&mut self, other: &Self) {
        self.sums.join(&other.sums);
        self.beside(other.certificate, &other.bounds);
    }

    fn beside(&mut self, certificate: Certificate, bounds: &[[f64; 3]; 2]) {
        self.certificate = self.certificate.plus(certificate);
        let [low, high] = &mut self.bounds;
        for (mine, theirs) in low.iter_mut().zip(bounds[0]) {
            *mine = mine.min(theirs);
        }
        for (mine, theirs) in high.iter_mut().zip(bounds[1]) {
            *mine = mine.max(theirs);
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
    let mut certificate = Certificate::ZERO;
    let mut block = Block::<S::Coordinate>::new();
    let mut boxes = Boxes::new();
    let mut at = range.start;
    while at < range.end {
        let end = range.end.min(at + BLOCK);
        source.fill(at..end, apex, &mut block);
        // Triangles past the end are the apex three times: they add nothing to any of these.
        sums.add::<S::Coordinate, P>(&block, apex, [0.0; 3]);
        certificate.add(&block, keys);
        boxes.add(&block);
        at = end;
    }
    Part {
        sums: sums.finish(),
        certificate,
        bounds: boxes.finish(),
    }
}

/// Least and greatest coordinates, one box for each place in a block.
struct Boxes<T> {
    low: [[T; BLOCK]; 3],
    high: [[T; BLOCK]; 3],
}

impl<T: Hashed> Boxes<T> {
    #[inline(always)]
    fn new() -> Self {
        Self {
            low: [[T::HIGHEST; BLOCK]; 3],
            high: [[T::LOWEST; BLOCK]; 3],
        }
    }

    #[inline(always)]
    fn add(&mut self, block: &Block<T>) {
        // What is not a number is left out by these: such chunks are refused by their sums.
        let less = |a: T, b: T| if a < b { a } else { b };
        let more = |a: T, b: T| if a > b { a } else { b };
        for i in 0..3 {
            for l in 0..BLOCK {
                let [a, b, c] = [block.at[0][i][l], block.at[1][i][l], block.at[2][i][l]];
                self.low[i][l] = less(less(a, b), less(c, self.low[i][l]));
                self.high[i][l] = more(more(a, b), more(c, self.high[i][l]));
            }
        }
    }

    #[allow(
        clippy::needless_range_loop,
        reason = "one index runs over several arrays"
    )]
    fn finish(&self) -> [[f64; 3]; 2] {
        let mut out = NOWHERE;
        for i in 0..3 {
            for l in 0..BLOCK {
                out[0][i] = out[0][i].min(self.low[i][l].canonical().wide());
                out[1][i] = out[1][i].max(self.high[i][l].canonical().wide());
            }
        }
        out
    }
}
