//! The estimate as others use it.

use nalgebra::Vector3;

use super::patch::Added;
use super::surface::Surface;
use crate::moments::Moments;

/// Part of all that the patches add by which the estimate is doubted in any case. Over the test
/// bodies of 24 to 192 segments a turn its error stays below this part plus [`OFF`] of what the
/// chords' ends disagree by.
const LEAST: f64 = 0.02;
/// Weight of what the two ends of the chords disagree by, as a volume.
const OFF: f64 = 2.5;

/// How the facets of a body are read.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Reading {
    /// The facets are the shape.
    Flat,
    /// The facets are chords of curves.
    Curved,
}

/// What facets do to the figures of a body: the mesh's figure minus the curved body's.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct FacetError {
    /// Moments of the volume by which the mesh is off, from which the errors of centre and inertia
    /// follow; `zeroth` is the volume's error.
    pub moments: Moments,
    /// The volume's error by convex surfaces; ≤ 0.
    pub convex: f64,
    /// The volume's error by hollow surfaces; ≥ 0.
    pub concave: f64,
    /// The area's error.
    pub area: f64,
    /// How far the volume's error may itself be off; ≥ 0.
    pub doubt: f64,
    /// How far the area's error may itself be off; ≥ 0.
    pub area_doubt: f64,
    /// Part of the area that was taken as curved.
    pub curved_share: f64,
    /// Edges that turn by less than this were taken as parts of a curve, degrees.
    pub crease_deg: f64,
}

impl FacetError {
    pub(super) fn of(added: &Added, s: &Surface, crease_deg: f64) -> Self {
        let moments = Moments {
            about: s.middle,
            ..added.moments
        };
        let whole: f64 = s.area.iter().sum();
        let doubt = LEAST * added.size + OFF * added.unsure;
        Self {
            moments: moments.weighted(-1.0),
            convex: -added.convex,
            concave: -added.concave,
            area: -added.area,
            doubt,
            // Areas follow from the same rises, and are off in the same proportion.
            area_doubt: if added.size > 0.0 {
                doubt / added.size * added.area_size
            } else {
                0.0
            },
            curved_share: if whole > 0.0 {
                added.curved / whole
            } else {
                0.0
            },
            crease_deg,
        }
    }

    /// No error: the facets are what is meant.
    pub fn none(about: Vector3<f64>, crease_deg: f64) -> Self {
        Self {
            moments: Moments::zero(about),
            convex: 0.0,
            concave: 0.0,
            area: 0.0,
            doubt: 0.0,
            area_doubt: 0.0,
            curved_share: 0.0,
            crease_deg,
        }
    }

    /// In another unit of length: all lengths multiplied by `k` > 0.
    #[must_use]
    pub fn scaled(&self, k: f64) -> Self {
        let (k2, k3) = (k * k, k * k * k);
        Self {
            moments: self.moments.scaled(k),
            convex: self.convex * k3,
            concave: self.concave * k3,
            area: self.area * k2,
            doubt: self.doubt * k3,
            area_doubt: self.area_doubt * k2,
            ..*self
        }
    }

    /// Whether nothing was taken as curved.
    pub fn is_none(&self) -> bool {
        self.curved_share == 0.0
    }

    /// The curved body's moments, from the mesh's in the same unit.
    #[must_use]
    pub fn corrected(&self, mesh: &Moments) -> Moments {
        mesh.plus(&self.moments.weighted(-1.0))
    }

    /// How far the mesh's centre lies from the curved body's, in the mesh's axes; `None` where one
    /// has none.
    pub fn centre(&self, mesh: &Moments) -> Option<Vector3<f64>> {
        Some(mesh.centre()? - self.corrected(mesh).centre()?)
    }

    /// The doubt as a part of everything that was added and taken away; 0 where nothing was.
    pub fn doubt_share(&self) -> f64 {
        let size = self.convex.abs() + self.concave.abs();
        if size > 0.0 { self.doubt / size } else { 0.0 }
    }

    /// Between what a figure lies that the mesh gives as `mesh` and whose error, mesh minus true, is
    /// `error` with a doubt of its own. The error is a bias: as the mesh's figure stands the
    /// interval runs from it to the corrected one, widened beyond that by the doubt; of the
    /// corrected figure it is as wide on both sides.
    pub fn interval(mesh: f64, error: f64, doubt: f64, reading: Option<Reading>) -> (f64, f64) {
        let true_one = mesh - error;
        match reading {
            Some(Reading::Flat) => (mesh, mesh),
            Some(Reading::Curved) => (true_one - doubt, true_one + doubt),
            None => (mesh.min(true_one - doubt), mesh.max(true_one + doubt)),
        }
    }

    /// [`interval`](Self::interval) of the volume.
    pub fn volume_interval(&self, mesh: f64, reading: Option<Reading>) -> (f64, f64) {
        Self::interval(mesh, self.moments.zeroth, self.doubt, reading)
    }
}
