//! What the sections of a run of neighbouring layers have in common, for every run.
//!
//! Layers are taken in blocks as long as a run; within each block the sections in common from its
//! start and to its end are kept. Any run is then a tail of one block and a head of the next: two
//! overlays a layer whatever the run's length (van Herk, "A fast algorithm for local minimum and
//! maximum filters on rectangular and octagonal kernels", Pattern Recognition Letters 13, 1992;
//! the same idea on numbers).

use rayon::prelude::*;

use super::region::{Overlayer, Region};

/// Common regions of runs of layers.
pub(super) struct Windows<'a> {
    length: usize,
    heads: Vec<Region>,
    tails: Vec<Region>,
    sections: &'a [Region],
}

impl<'a> Windows<'a> {
    /// For runs of `length` layers, at least 1.
    pub(super) fn of(sections: &'a [Region], length: usize) -> Self {
        let blocks: Vec<&[Region]> = if length > 1 && length <= sections.len() {
            sections.chunks(length).collect()
        } else {
            Vec::new()
        };
        let (heads, tails) = rayon::join(
            || blocks.par_iter().map(|b| running(b.iter())).collect(),
            || {
                let tail = |b: &&[Region]| {
                    let mut t = running(b.iter().rev());
                    t.reverse();
                    t
                };
                blocks.par_iter().map(tail).collect()
            },
        );
        let flat = |v: Vec<Vec<Region>>| v.into_iter().flatten().collect();
        Self {
            length,
            heads: flat(heads),
            tails: flat(tails),
            sections,
        }
    }

    /// The part of `inset` that is in all of the layers from `first` on, as many as a run has;
    /// nothing where the stack ends before.
    pub(super) fn common(&self, o: &mut Overlayer, inset: &Region, first: usize) -> Region {
        let last = first + self.length - 1;
        if last >= self.sections.len() {
            return Region::default();
        }
        if self.length == 1 {
            return o.common(inset, &self.sections[first]);
        }
        if first.is_multiple_of(self.length) {
            return o.common(inset, &self.tails[first]);
        }
        o.common_of_three(inset, &self.tails[first], &self.heads[last])
    }
}

/// What each section has in common with all before it.
fn running<'r>(sections: impl Iterator<Item = &'r Region>) -> Vec<Region> {
    let mut o = Overlayer::new();
    let mut out: Vec<Region> = Vec::new();
    for section in sections {
        let next = match out.last() {
            None => section.clone(),
            Some(before) => o.common(before, section),
        };
        out.push(next);
    }
    out
}
