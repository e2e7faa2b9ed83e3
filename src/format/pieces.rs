//! Meshes placed one after the other: one soup out of the instances of a scene or a build.

use nalgebra::{Matrix3, Vector3};

use super::chunk::{Interner, extend_runs};
use super::number::MAX_COORDINATE;
use crate::bytes;
use crate::error::{Error, Kind, Result};
use crate::mesh::{ReaderNote, Run, Soup, Triangles};
use crate::quantity::LengthUnit;

/// Bytes that a vertex and a triangle take while they are put together.
const VERTEX: u64 = 24;
const TRIANGLE: u64 = 12;
/// Most meshes that are placed.
const INSTANCES: u64 = 1 << 20;

/// p ↦ linear · p + shift, on column vectors.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) struct Placing {
    pub(crate) linear: Matrix3<f64>,
    pub(crate) shift: Vector3<f64>,
}

impl Placing {
    /// Leaves everything where it is.
    pub(crate) fn identity() -> Self {
        Self {
            linear: Matrix3::identity(),
            shift: Vector3::zeros(),
        }
    }

    /// First `inner`, then this.
    pub(crate) fn after(&self, inner: &Self) -> Self {
        Self {
            linear: self.linear * inner.linear,
            shift: self.linear * inner.shift + self.shift,
        }
    }

    /// A point, where it comes to lie.
    fn apply(&self, p: [f64; 3]) -> [f64; 3] {
        if *self == Self::identity() {
            return p;
        }
        (self.linear * Vector3::from(p) + self.shift).into()
    }

    /// Negative where it mirrors, zero where it flattens.
    pub(crate) fn determinant(&self) -> f64 {
        self.linear.determinant()
    }
}

/// How much is to be put together, counted before any of it is.
#[derive(Clone, Copy, Debug, Default)]
pub(crate) struct Size {
    pub(crate) instances: u64,
    pub(crate) vertices: u64,
    pub(crate) triangles: u64,
}

impl Size {
    /// Both together.
    pub(crate) fn plus(self, other: Self) -> Self {
        Self {
            instances: self.instances.saturating_add(other.instances),
            vertices: self.vertices.saturating_add(other.vertices),
            triangles: self.triangles.saturating_add(other.triangles),
        }
    }

    /// Refuses what the memory or the indices cannot hold: copies of copies multiply.
    ///
    /// # Errors
    /// `too-large`.
    pub(crate) fn check(self) -> Result<()> {
        let bytes = self
            .vertices
            .saturating_mul(VERTEX)
            .saturating_add(self.triangles.saturating_mul(TRIANGLE));
        if self.instances > INSTANCES
            || bytes > bytes::memory_budget()
            || self.vertices >= u64::from(u32::MAX)
        {
            return Err(Error::new(
                Kind::TooLarge,
                format!(
                    "its {} placed meshes come to {} vertices and {} triangles, more than can be \
                     held here",
                    self.instances, self.vertices, self.triangles
                ),
                "split the file, or place the parts in an assembly file",
            ));
        }
        Ok(())
    }
}

/// The soup in the making.
#[derive(Debug, Default)]
pub(crate) struct Pieces {
    vertices: Vec<[f64; 3]>,
    corners: Vec<[u32; 3]>,
    names: Vec<Option<String>>,
    materials: Interner<String>,
    runs: Vec<Run>,
}

impl Pieces {
    /// The number of a material by its name.
    pub(crate) fn material(&mut self, name: &String) -> u32 {
        self.materials.number(name)
    }

    /// Begins a piece, whose vertices are welded among themselves and to no other piece's, even
    /// one of the same name. Copies of one mesh may touch without being one.
    pub(crate) fn begin(&mut self, name: Option<String>) {
        self.names.push(name);
    }

    /// Adds vertices, placed; the number of the first.
    ///
    /// # Errors
    /// `not-finite` where a placed vertex is beyond bounds.
    pub(crate) fn vertices(&mut self, placing: &Placing, vertices: &[[f64; 3]]) -> Result<u32> {
        let base = self.vertices.len() as u32;
        self.vertices.reserve(vertices.len());
        for (i, &p) in vertices.iter().enumerate() {
            let placed = placing.apply(p);
            if !placed.iter().all(|x| x.abs() <= MAX_COORDINATE) {
                return Err(Error::new(
                    Kind::NotFinite,
                    format!(
                        "vertex {i} lies at {placed:?} once placed: no moments are finite there"
                    ),
                    "export the mesh again; a coordinate or a transform is wrong",
                ));
            }
            self.vertices.push(placed);
        }
        Ok(base)
    }

    /// Adds triangles over the vertices from `base` on to the piece that was begun last, each with
    /// the number of its material. Where the placing mirrors, they are turned, so that what faced
    /// outward still does.
    pub(crate) fn triangles(
        &mut self,
        placing: &Placing,
        base: u32,
        triangles: impl Iterator<Item = ([u32; 3], Option<u32>)>,
    ) {
        let mirrors = placing.determinant() < 0.0;
        let name = self.names.len().saturating_sub(1) as u32;
        for ([a, b, c], material) in triangles {
            let (b, c) = if mirrors { (c, b) } else { (b, c) };
            self.corners.push([a, b, c].map(|i| base + i));
            extend_runs(&mut self.runs, 1, name, material);
        }
    }

    /// The soup.
    pub(crate) fn finish(self, unit: LengthUnit, notes: Vec<ReaderNote>) -> Soup {
        Soup {
            triangles: Triangles::Indexed {
                vertices: self.vertices,
                corners: self.corners,
            },
            names: self.names,
            materials: self.materials.list,
            runs: self.runs,
            unit: Some(unit),
            warped: Vec::new(),
            notes,
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn mirrored_pieces_stay_outward_and_composition_is_in_order() {
        let mirror = Placing {
            linear: Matrix3::from_diagonal(&Vector3::new(-1.0, 1.0, 1.0)),
            shift: Vector3::new(10.0, 0.0, 0.0),
        };
        let turn = Placing {
            linear: Matrix3::new(0.0, -1.0, 0.0, 1.0, 0.0, 0.0, 0.0, 0.0, 1.0),
            shift: Vector3::zeros(),
        };
        // First turned, then mirrored: x goes to y, then stays.
        assert_eq!(mirror.after(&turn).apply([1.0, 0.0, 0.0]), [10.0, 1.0, 0.0]);
        let mut pieces = Pieces::default();
        pieces.begin(Some("wheel".into()));
        let points = [[0.0; 3], [1.0, 0.0, 0.0], [0.0, 1.0, 0.0]];
        let base = pieces.vertices(&mirror, &points).unwrap();
        pieces.triangles(&mirror, base, std::iter::once(([0, 1, 2], None)));
        let soup = pieces.finish(LengthUnit::M, Vec::new());
        let Triangles::Indexed { vertices, corners } = soup.triangles else {
            unreachable!()
        };
        assert_eq!(corners, [[0, 2, 1]]);
        assert_eq!(
            vertices,
            [[10.0, 0.0, 0.0], [9.0, 0.0, 0.0], [10.0, 1.0, 0.0]]
        );
        let huge = Size {
            instances: 1 << 40,
            vertices: 1 << 60,
            triangles: 1 << 60,
        };
        assert_eq!(huge.plus(huge).check().unwrap_err().kind, Kind::TooLarge);
    }
}
