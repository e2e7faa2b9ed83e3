//! Totals of a mesh in one reading, with memory that does not grow with the file.
//!
//! Moments, area, box and count, and a proof that the directed edges cancel (see
//! [`Certificate`]). Nothing is welded and no body is told from another: a mesh that is written
//! twice, shells inside out and solids in solids cancel too and are not seen here.
//!
//! Sums are taken about the first vertex of the file, over the same chunks as
//! [`integrate`](crate::moments::integrate) takes them, and chunks are added without rounding: the
//! moments of a single body have the same bits on both paths, and so have those of a mesh whose
//! slices were summed apart (see [`Partial`]).

mod certificate;
mod cover;
mod kernel;
mod partial;
mod pass;
mod records;
mod slice;

pub use certificate::{Certificate, Keys};
pub use partial::{Identity, PARTIAL_SCHEMA, Partial};
pub use records::{of_file, of_memory, of_stream};
pub use slice::{Slice, slice_of_corners, slice_of_memory, slice_of_path};

#[cfg(test)]
mod slice_tests;
#[cfg(test)]
mod tests;

use crate::geometry::Corners;
use crate::moments::{CHUNK, SolidIntegrals};
use kernel::{OfCorners, Total, part};

/// What one reading of a mesh yields, in the file's unit.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Totals {
    /// Number of triangles.
    pub triangles: u64,
    /// Moments of volume and surface area. The sign of the volume is the file's own.
    /// `absolute_volume` is taken about the first vertex of the file, not about the middle of the
    /// box, which is not known before the end.
    pub solid: SolidIntegrals,
    /// Lower and upper corner of the box; `None` without a triangle.
    pub bounds: Option<[[f64; 3]; 2]>,
    /// Whether directed edges cancel, and what to add for other parts of the mesh.
    pub certificate: Certificate,
}

impl Totals {
    fn new(triangles: u64, apex: [f64; 3], total: &Total) -> Self {
        Self {
            triangles,
            solid: total.sums.finish(apex),
            bounds: (triangles > 0).then_some(total.bounds),
            certificate: total.certificate,
        }
    }

    /// Whether the volume differs from zero by more than its rounding can (see
    /// [`integrate`](crate::moments::integrate): a few ulp of K).
    pub fn has_volume(&self) -> bool {
        self.solid.moments.zeroth.abs() > 1e-13 * self.solid.absolute_volume
    }
}

/// Totals of triangles in memory whose coordinates are finite f64.
pub fn of_corners(facets: &impl Corners, keys: &Keys) -> Totals {
    let (apex, total) = chunks_of_corners(facets, |all| 0..all, keys);
    Totals::new(facets.count() as u64, apex, &total)
}

/// What the chunks `wanted` come to, and the first vertex; it is told how many there are.
fn chunks_of_corners(
    facets: &impl Corners,
    wanted: impl FnOnce(u64) -> std::ops::Range<u64>,
    keys: &Keys,
) -> ([f64; 3], Total) {
    if facets.count() == 0 {
        return ([0.0; 3], Total::NOTHING);
    }
    let apex = facets.triangle(0)[0];
    (apex, chunks_about(facets, wanted, apex, keys))
}

/// What the chunks `wanted` come to, about `apex`.
fn chunks_about(
    facets: &impl Corners,
    wanted: impl FnOnce(u64) -> std::ops::Range<u64>,
    apex: [f64; 3],
    keys: &Keys,
) -> Total {
    let n = facets.count();
    let source = OfCorners(facets);
    let mut total = Total::NOTHING;
    // Nothing here can fail.
    let _ = pass::all(&mut total, wanted(n.div_ceil(CHUNK) as u64), |k| {
        let at = k as usize * CHUNK;
        Ok(part(&source, at..n.min(at + CHUNK), apex, keys))
    });
    total
}
