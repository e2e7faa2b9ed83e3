//! What a reader hands over: triangles as the file has them, and what the file calls them.

use crate::geometry::{Corners, RecordFacets};
use crate::quantity::LengthUnit;

/// Triangles with their names, in file order, before anything is welded or judged.
///
/// Coordinates are in the file's own unit and frame. Triangle indices are 0-based in file order
/// after polygons have been cut into triangles.
#[derive(Debug, Default)]
pub struct Soup {
    /// The triangles.
    pub triangles: Triangles,
    /// Distinct names of pieces, in order of first appearance; `None` is "no name".
    pub names: Vec<Option<String>>,
    /// Distinct material names that the file itself gives (`usemtl`), in order of appearance.
    pub materials: Vec<String>,
    /// Consecutive triangles of one name and material. They cover all triangles, in order.
    pub runs: Vec<Run>,
    /// The unit, in formats that state one.
    pub unit: Option<LengthUnit>,
    /// Polygons whose corners are not flat.
    pub warped: Vec<WarpedPolygon>,
    /// What the reader passed over or had to assume.
    pub notes: Vec<ReaderNote>,
}

/// Where the corner coordinates lie.
#[derive(Debug)]
pub enum Triangles {
    /// Binary STL records of 50 bytes, left as they are in the file.
    Records(Records),
    /// Three corners per triangle, not shared (text STL).
    Loose(Vec<[[f64; 3]; 3]>),
    /// Corners as indices into a list of vertices (OBJ). Every index is in range.
    Indexed {
        /// Vertex coordinates.
        vertices: Vec<[f64; 3]>,
        /// Three vertex indices per triangle.
        corners: Vec<[u32; 3]>,
    },
}

impl Default for Triangles {
    fn default() -> Self {
        Self::Loose(Vec::new())
    }
}

impl Triangles {
    /// How many triangles there are.
    pub fn count(&self) -> usize {
        match self {
            Self::Records(r) => r.count,
            Self::Loose(list) => list.len(),
            Self::Indexed { corners, .. } => corners.len(),
        }
    }

    /// Coordinates of the vertex that welding numbers `id` (file unit).
    pub(crate) fn vertex(&self, id: u32) -> [f64; 3] {
        let (t, k) = (id as usize / 3, id as usize % 3);
        match self {
            Self::Records(r) => r.facets().triangle(t)[k],
            Self::Loose(list) => list[t][k],
            Self::Indexed { vertices, .. } => vertices[id as usize],
        }
    }
}

/// Runs the same generic code over whichever way the corners are stored: `each!(triangles, f =>
/// expression with f)`.
macro_rules! each {
    ($triangles:expr, $f:ident => $body:expr) => {
        match $triangles {
            $crate::mesh::Triangles::Records(r) => {
                let $f = &r.facets();
                $body
            }
            $crate::mesh::Triangles::Loose(list) => {
                let $f = &$crate::geometry::LooseFacets(list);
                $body
            }
            $crate::mesh::Triangles::Indexed { vertices, corners } => {
                let $f = &$crate::geometry::IndexedFacets { vertices, corners };
                $body
            }
        }
    };
}
pub(crate) use each;

/// The 50-byte records of a binary STL, inside the bytes of the whole file.
#[derive(Debug)]
pub struct Records {
    /// The whole file.
    pub bytes: crate::bytes::Bytes,
    /// Number of records; `84 + 50 * count` bytes are present.
    pub count: usize,
}

impl Records {
    /// The records as triangles.
    pub fn facets(&self) -> RecordFacets<'_> {
        // Fewer bytes than the count needs would be a reader's fault; then fewer records are seen.
        let end = self.bytes.len().min(84 + 50 * self.count);
        RecordFacets::new(self.bytes.get(84..end).unwrap_or_default())
    }
}

/// `count` triangles from `first` on that share a name and a material.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Run {
    /// First triangle.
    pub first: usize,
    /// Number of triangles.
    pub count: usize,
    /// Index into [`Soup::names`].
    pub name: u32,
    /// Index into [`Soup::materials`].
    pub material: Option<u32>,
}

/// A polygon of the file that has no one surface, because its corners are not flat.
#[derive(Clone, Debug, PartialEq)]
pub struct WarpedPolygon {
    /// Line of the file, from 1; none in binary files.
    pub line: Option<u64>,
    /// First of its triangles.
    pub first: usize,
    /// Number of its triangles.
    pub count: usize,
    /// A corner of it (file unit).
    pub at: [f64; 3],
    /// Largest distance of a corner from the best plane (file unit).
    pub deviation: f64,
    /// Least volume that another triangulation would add to the chosen one (file unit³, ≤ 0).
    pub volume_low: f64,
    /// Most volume that another triangulation would add to the chosen one (file unit³, ≥ 0).
    pub volume_high: f64,
    /// Whether the deviation is no more than the rounding of the numbers as written.
    pub within_rounding: bool,
}

/// Something that the reader passed over or had to assume; becomes a warning.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct ReaderNote {
    /// Short name, such as `faces-ignored`.
    pub kind: &'static str,
    /// What was seen and what was done.
    pub message: String,
    /// Line of the file, from 1.
    pub line: Option<u64>,
    /// What to do about it.
    pub advice: &'static str,
}
