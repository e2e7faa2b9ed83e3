//! How bodies of mesh files come in: geometry stays below, and the assembly sees its figures.

use std::path::Path;
use std::sync::Arc;

use nalgebra::Matrix3;

use super::load::Input;
use crate::curvature::FacetError;
use crate::error::Error;
use crate::moments::Moments;
use crate::quantity::LengthUnit;

/// What the assembly needs to know of one body, in SI units and the mesh file's axes.
#[derive(Clone, Debug)]
pub struct BodyFigures {
    /// Unique in its file: the name, then `name/2`, `name/3`; unnamed: from the file's stem.
    pub id: String,
    /// The file's own name of it.
    pub name: Option<String>,
    /// Other names whose pieces were joined into this body.
    pub joined: Vec<String>,
    /// The mesh file's own names of the materials on it.
    pub materials: Vec<String>,
    /// Moments of its volume: m³, m⁴, m⁵.
    pub moments: Moments,
    /// m².
    pub area: f64,
    /// Least and greatest corner, m.
    pub bounds: [[f64; 3]; 2],
    /// How many times larger the terms of the volume are than their sum.
    pub condition: f64,
    /// Why it cannot be weighed, in one sentence with the open edges and loops.
    pub refused: Option<Refusal>,
    /// Of an open body that can be capped: the capped solid.
    pub capped: Option<super::Capped>,
}

/// Why a body cannot be weighed.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Refusal {
    /// Such as `not-closed`, `duplicate`, `nested-solid`.
    pub kind: String,
    /// One sentence without a full stop.
    pub message: String,
    /// What to do about it.
    pub advice: String,
}

/// One body of a mesh file.
pub trait MeshBody: Send + Sync {
    /// Its figures.
    fn figures(&self) -> &BodyFigures;

    /// Its facets (m, the file's frame), facing outward, voids included; none where they are not
    /// at hand, and then nothing is said of the space that it shares.
    fn facets(&self) -> Vec<[[f64; 3]; 3]> {
        Vec::new()
    }

    /// What its facets do to its figures where they stand for curves (m, the file's frame); none
    /// where that is not known: it is not closed, holds a solid within its solid, or has more
    /// facets than are looked at unasked and it is not `asked`.
    fn facet_error(&self, asked: bool) -> Option<FacetError> {
        let _ = asked;
        None
    }

    /// The exact bounds (m) of the body's vertices after `turn` about the file's origin.
    fn bounds_turned(&self, turn: &Matrix3<f64>) -> [[f64; 3]; 2];
}

/// Mesh files, read when asked for and kept.
pub trait MeshFiles {
    /// All bodies of a file, in file order. Within `join` (m) vertices on open edges are made one.
    ///
    /// # Errors
    /// Whatever keeps the file from being read.
    fn bodies(
        &mut self,
        path: &Path,
        unit: LengthUnit,
        join: Option<f64>,
    ) -> Result<Vec<Arc<dyn MeshBody>>, Error>;

    /// Length and hash of a file that was read.
    fn input(&mut self, path: &Path) -> Option<Input>;

    /// Length and hash of the files beside it that were read for it, such as buffers.
    fn beside(&mut self, _path: &Path) -> Vec<Input> {
        Vec::new()
    }
}
