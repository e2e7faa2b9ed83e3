//! The sums of many chunks, without any rounding between them.

use super::solid::SUMS;
use super::{ChunkSums, SolidIntegrals};
use crate::geometry::ExactSum;

/// The sums of chunks, added exactly: the same for any order and any grouping, so that chunks can be
/// summed apart, on other threads or other machines, and still give the bits of one process.
///
/// An addition of a chunk costs 23 exact additions of an f64, which is nothing beside the 4096
/// triangles of it; a tree of rounded sums would need its nodes kept wherever a range of chunks
/// begins or ends inside one.
#[derive(Clone, Debug, PartialEq)]
pub struct TotalSums([ExactSum; SUMS + 1]);

impl TotalSums {
    /// Nothing.
    pub const ZERO: Self = Self([ExactSum::ZERO; SUMS + 1]);

    /// Number of sums: volume, first moments (x y z), second (xx yy zz xy xz yz), area, K.
    pub const COUNT: usize = SUMS + 1;

    /// Adds a chunk.
    pub fn add(&mut self, chunk: &ChunkSums) {
        for (sum, (high, low)) in self.0.iter_mut().zip(chunk.parts()) {
            sum.add(high);
            sum.add(low);
        }
    }

    /// Adds what other chunks come to.
    pub fn join(&mut self, other: &Self) {
        for (sum, more) in self.0.iter_mut().zip(&other.0) {
            sum.join(more);
        }
    }

    /// The integrals, each sum rounded once; `apex` is the point that the sums were taken about.
    pub fn finish(&self, apex: [f64; 3]) -> SolidIntegrals {
        SolidIntegrals::of_sums(std::array::from_fn(|i| self.0[i].value()), apex)
    }

    /// For each sum, in the order of [`TotalSums::COUNT`], the numbers that add up to it exactly
    /// (see [`ExactSum::parts`]); to be written down.
    pub fn parts(&self) -> [Vec<f64>; SUMS + 1] {
        std::array::from_fn(|i| self.0[i].parts())
    }

    /// From what [`TotalSums::parts`] gave.
    pub fn from_parts(parts: &[Vec<f64>; SUMS + 1]) -> Self {
        Self(std::array::from_fn(|i| ExactSum::from_parts(&parts[i])))
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::geometry::{LooseFacets, Select};
    use crate::moments::chunk_sums;

    #[test]
    fn one_chunk_alone_has_the_same_bits_by_either_way() {
        let mut x = 0.37f64;
        let mut next = || {
            x = (x * 997.13).fract();
            x * 20.0 - 10.0
        };
        let facets: Vec<[[f64; 3]; 3]> = (0..500)
            .map(|_| [(); 3].map(|()| [(); 3].map(|()| next())))
            .collect();
        let sums = chunk_sums(
            &LooseFacets(&facets),
            Select::All,
            0..500,
            facets[0][0],
            [0.0; 3],
        );
        let mut total = TotalSums::ZERO;
        total.add(&sums);
        assert_eq!(total.finish(facets[0][0]), sums.finish(facets[0][0]));
        assert_eq!(TotalSums::from_parts(&total.parts()), total);
    }
}
