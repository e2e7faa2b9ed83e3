//! The boundary of a mesh as a chain: its open edges with their weights, and their vertices.

use std::collections::HashMap;

use super::Triangles;
use super::near::distance;
use super::shells::Shells;
use crate::geometry::Point;

/// The open edges of all shells.
#[derive(Debug, Default)]
pub(crate) struct Boundary {
    /// Vertex numbers, ascending; what follows counts in this list.
    pub(crate) vertices: Vec<u32>,
    /// Where they are (file unit).
    pub(crate) points: Vec<Point>,
    /// The open edges, shell by shell.
    pub(crate) edges: Vec<RimEdge>,
}

/// An open edge in the direction that prevails.
#[derive(Clone, Copy, Debug)]
pub(crate) struct RimEdge {
    pub(crate) from: u32,
    pub(crate) to: u32,
    /// How many passages are left over.
    pub(crate) weight: i64,
    pub(crate) shell: u32,
    /// Place in the shell's list of open edges.
    pub(crate) index: u32,
}

impl Boundary {
    pub(crate) fn of(triangles: &Triangles, found: &Shells) -> Self {
        let mut vertices: Vec<u32> = found
            .shells
            .iter()
            .flat_map(|s| s.open.iter().flat_map(|e| [e.from, e.to]))
            .collect();
        vertices.sort_unstable();
        vertices.dedup();
        let place = |v: u32| vertices.partition_point(|&w| w < v) as u32;
        let edges = (0u32..)
            .zip(&found.shells)
            .flat_map(|(shell, s)| {
                (0u32..)
                    .zip(&s.open)
                    .map(move |(index, e)| (shell, index, e))
            })
            .map(|(shell, index, e)| RimEdge {
                from: place(e.from),
                to: place(e.to),
                weight: e.surplus.into(),
                shell,
                index,
            })
            .collect();
        let points = vertices.iter().map(|&v| triangles.vertex(v)).collect();
        Self {
            vertices,
            points,
            edges,
        }
    }

    /// Diagonal of the box around it.
    pub(crate) fn diagonal(&self) -> f64 {
        let mut b = [[f64::INFINITY; 3], [f64::NEG_INFINITY; 3]];
        for p in &self.points {
            for k in 0..3 {
                b[0][k] = b[0][k].min(p[k]);
                b[1][k] = b[1][k].max(p[k]);
            }
        }
        if self.points.is_empty() {
            0.0
        } else {
            distance(&b[0], &b[1])
        }
    }

    pub(crate) fn length(&self, e: &RimEdge) -> f64 {
        distance(&self.points[e.from as usize], &self.points[e.to as usize])
    }

    /// The chain that is left when each vertex is put where `rep` says: by edge of two such, low
    /// to high. Edges that shrink to nothing leave nothing (a simplicial map sends boundaries to
    /// boundaries), so the mesh so joined is closed exactly where this is zero.
    pub(crate) fn joined(&self, rep: &[u32]) -> HashMap<(u32, u32), i64> {
        let mut net = HashMap::new();
        for e in &self.edges {
            let (a, b) = (rep[e.from as usize], rep[e.to as usize]);
            if a != b {
                *net.entry((a.min(b), a.max(b))).or_default() +=
                    if a < b { e.weight } else { -e.weight };
            }
        }
        net
    }
}

/// Sets of small numbers for one thread; the name of a set is its least member, unless it was hung
/// below another.
pub(crate) struct Merge(Vec<u32>);

impl Merge {
    pub(crate) fn new(n: usize) -> Self {
        Self((0..n as u32).collect())
    }

    pub(crate) fn find(&mut self, mut x: u32) -> u32 {
        while self.0[x as usize] != x {
            let above = self.0[self.0[x as usize] as usize];
            self.0[x as usize] = above;
            x = above;
        }
        x
    }

    /// Makes one set of two and returns its name.
    pub(crate) fn join(&mut self, x: u32, y: u32) -> u32 {
        let (x, y) = (self.find(x), self.find(y));
        let (low, high) = (x.min(y), x.max(y));
        self.0[high as usize] = low;
        low
    }

    /// Makes one set of the sets of these names, under the second.
    pub(crate) fn hang(&mut self, below: u32, name: u32) {
        self.0[below as usize] = name;
    }
}
