//! Totals of a mesh in one reading, with memory that does not grow with the file.
//!
//! Moments, area, box and count, and a proof that the directed edges cancel (see
//! [`Certificate`]). Nothing is welded and no body is told from another: a mesh that is written
//! twice, shells inside out and solids in solids cancel too and are not seen here.
//!
//! Sums are taken about the first vertex of the file, over the same chunks and in the same order as
//! [`integrate`](crate::moments::integrate) takes them: the moments of a single body have the same
//! bits on both paths.

mod certificate;
mod kernel;
mod pass;
mod records;

pub use certificate::{Certificate, Keys};
pub use records::{of_file, of_memory, of_stream};

#[cfg(test)]
mod tests;

use crate::geometry::Corners;
use crate::moments::{CHUNK, SolidIntegrals};
use kernel::{OfCorners, Part, part};

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
    fn new(triangles: u64, apex: [f64; 3], total: &Part) -> Self {
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
    let n = facets.count();
    if n == 0 {
        return Totals::new(0, [0.0; 3], &Part::NOTHING);
    }
    let apex = facets.triangle(0)[0];
    let source = OfCorners(facets);
    let mut total = Part::NOTHING;
    // Nothing here can fail.
    let _ = pass::in_order(&mut total, n.div_ceil(CHUNK) as u64, |k| {
        let at = k as usize * CHUNK;
        Ok(part(&source, at..n.min(at + CHUNK), apex, keys))
    });
    Totals::new(n as u64, apex, &total)
}
