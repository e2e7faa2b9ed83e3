//! The edges of a mesh that are worth drawing.

use rayon::prelude::*;

use crate::geometry::Corners;
use crate::mesh::{Mesh, each};

/// An edge with the facets beside it.
#[derive(Clone, Debug)]
pub(super) struct Edge {
    pub(super) ends: [[f64; 3]; 2],
    /// Directions (not unit) that the first two facets face.
    pub(super) normals: [[f64; 3]; 2],
    pub(super) kind: EdgeKind,
    /// One of its facets.
    pub(super) triangle: u32,
}

#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum EdgeKind {
    /// Facets meet at an angle.
    Crease,
    /// Not two facets.
    Open,
    /// Between facets that are nearly flush.
    Smooth,
}

/// Meshes of at most this many triangles are drawn with all their edges.
pub(super) const FEW: usize = 3000;

/// Cosine of the angle from which on an edge is a crease (25°).
const CREASE: f64 = 0.906;

/// Edges of the mesh, each once, in the order of their vertices.
pub(super) fn edges_of(mesh: &Mesh) -> Vec<Edge> {
    let corners = &mesh.found().corners;
    let mut passages: Vec<(u32, u32, u32)> = corners
        .par_iter()
        .enumerate()
        .flat_map_iter(|(t, c)| {
            (0..3).filter_map(move |k| {
                let (a, b) = (c[k], c[(k + 1) % 3]);
                (a != b).then_some((a.min(b), a.max(b), t as u32))
            })
        })
        .collect();
    passages.par_sort_unstable();
    let normal = |t: u32| {
        let p = each!(&mesh.soup.triangles, f => f.triangle(t as usize));
        let (u, v) = (
            [0, 1, 2].map(|k| p[1][k] - p[0][k]),
            [0, 1, 2].map(|k| p[2][k] - p[0][k]),
        );
        [
            u[1] * v[2] - u[2] * v[1],
            u[2] * v[0] - u[0] * v[2],
            u[0] * v[1] - u[1] * v[0],
        ]
    };
    let dot = |a: &[f64; 3], b: &[f64; 3]| a[0] * b[0] + a[1] * b[1] + a[2] * b[2];
    passages
        .chunk_by(|x, y| (x.0, x.1) == (y.0, y.1))
        .map(|group| {
            let (a, b, first) = group[0];
            let second = group.get(1).map_or(first, |g| g.2);
            let normals = [normal(first), normal(second)];
            let [m, n] = &normals;
            let kind = if group.len() != 2 {
                EdgeKind::Open
            } else if dot(m, n) < CREASE * (dot(m, m) * dot(n, n)).sqrt() {
                EdgeKind::Crease
            } else {
                EdgeKind::Smooth
            };
            Edge {
                ends: [a, b].map(|v| mesh.soup.triangles.vertex(v)),
                normals,
                kind,
                triangle: first,
            }
        })
        .collect()
}
