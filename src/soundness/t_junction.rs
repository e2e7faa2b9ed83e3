//! T-junctions: vertices on the rim that lie inside another open edge, which closes when split.

use std::collections::HashMap;

use rayon::prelude::*;

use super::crack::Room;
use crate::geometry::{Point, turn_2d};
use crate::mesh::Boundary;
use crate::mesh::near::{Near, length};

/// How far beside the edge the vertex may lie, as a share of the box around the open edges or of
/// its distance from the origin, whichever is larger: sixteen steps of a 32-bit coordinate of
/// that size, so that a model that was turned or moved before it was written keeps its junctions.
const BESIDE: f64 = 1e-6;
/// The same as a share of the edge's length; what lies farther off leaves a gap that is a hole.
const BESIDE_OF_EDGE: f64 = 1e-3;

/// A vertex inside an edge.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) struct Junction {
    /// The vertex, as a place in the boundary's list.
    pub(crate) vertex: u32,
    /// The edge, likewise.
    pub(crate) edge: u32,
    /// Share of the way along the edge.
    along: f64,
    /// Whether it lies on the edge exactly.
    pub(crate) exact: bool,
}

/// What splitting edges at the vertices on them does.
pub(crate) struct Split {
    /// The junctions at edges that cancel once they are split, by vertex.
    pub(crate) junctions: Vec<Junction>,
    /// Which edges cancel.
    pub(crate) cancels: Vec<bool>,
}

/// Finds the junctions among the edges that `taken` does not name.
pub(crate) fn split(boundary: &Boundary, taken: &[bool]) -> Split {
    let rest: Vec<u32> = (0..boundary.edges.len() as u32)
        .filter(|&i| !taken[i as usize])
        .collect();
    let all = junctions(boundary, &rest);
    let mut cancels = vec![false; boundary.edges.len()];
    if all.is_empty() {
        return Split {
            junctions: all,
            cancels,
        };
    }
    // The edges cut at their junctions, and what is left of the sum.
    let mut pieces: Vec<(u32, [u32; 2])> = Vec::new();
    for &i in &rest {
        let e = &boundary.edges[i as usize];
        let mut on: Vec<&Junction> = {
            let from = all.partition_point(|j| j.edge < i);
            all[from..].iter().take_while(|j| j.edge == i).collect()
        };
        on.sort_by(|a, b| a.along.total_cmp(&b.along).then(a.vertex.cmp(&b.vertex)));
        let mut at = e.from;
        for v in on.iter().map(|j| j.vertex).chain([e.to]) {
            pieces.push((i, [at, v]));
            at = v;
        }
    }
    let key = |[a, b]: [u32; 2]| (a.min(b), a.max(b));
    let mut net: HashMap<(u32, u32), i64> = HashMap::new();
    for &(i, ends) in &pieces {
        let weight = boundary.edges[i as usize].weight;
        *net.entry(key(ends)).or_default() += if ends[0] < ends[1] { weight } else { -weight };
    }
    for &i in &rest {
        cancels[i as usize] = true;
    }
    for &(i, ends) in &pieces {
        cancels[i as usize] &= net[&key(ends)] == 0;
    }
    let mut junctions: Vec<Junction> = all
        .into_iter()
        .filter(|j| cancels[j.edge as usize])
        .collect();
    junctions.sort_by_key(|j| (j.vertex, j.edge));
    Split { junctions, cancels }
}

/// Vertices inside edges, by edge.
fn junctions(boundary: &Boundary, rest: &[u32]) -> Vec<Junction> {
    let mut listed: Vec<u32> = rest
        .iter()
        .flat_map(|&i| {
            let e = &boundary.edges[i as usize];
            [e.from, e.to]
        })
        .collect();
    listed.sort_unstable();
    listed.dedup();
    let points: Vec<Point> = listed
        .iter()
        .map(|&v| boundary.points[v as usize])
        .collect();
    let near = Near::new(&points);
    let far = points.iter().flatten().fold(0.0f64, |m, x| m.max(x.abs()));
    let beside = BESIDE * boundary.diagonal().max(far);
    let room = Room::new(points.len());
    let found = rest
        .par_iter()
        .flat_map_iter(|&i| {
            let e = &boundary.edges[i as usize];
            let (p, q) = (
                &boundary.points[e.from as usize],
                &boundary.points[e.to as usize],
            );
            let u = [0, 1, 2].map(|k| q[k] - p[k]);
            let reach = beside.min(BESIDE_OF_EDGE * length(&u));
            let mut on = Vec::new();
            near.segment(p, q, reach, |place| {
                let vertex = listed[place as usize];
                if vertex != e.from && vertex != e.to {
                    let x = &boundary.points[vertex as usize];
                    let found = inside(p, q, x, reach).filter(|_| room.one_more());
                    on.extend(found.map(|(along, exact)| Junction {
                        vertex,
                        edge: i,
                        along,
                        exact,
                    }));
                }
            });
            on.sort_by_key(|j| j.vertex);
            on
        })
        .collect();
    // A heap of edges upon edges is no surface whose corners were left out.
    if room.is_exceeded() {
        return Vec::new();
    }
    found
}

/// Where x lies along p–q, if strictly inside it and at most `reach` beside it; and whether it
/// lies on it exactly.
fn inside(p: &Point, q: &Point, x: &Point, reach: f64) -> Option<(f64, bool)> {
    let (u, w) = (
        [0, 1, 2].map(|k| q[k] - p[k]),
        [0, 1, 2].map(|k| x[k] - p[k]),
    );
    let uu = u[0] * u[0] + u[1] * u[1] + u[2] * u[2];
    let along = (u[0] * w[0] + u[1] * w[1] + u[2] * w[2]) / uu;
    let near_end = reach / uu.sqrt();
    // Written so that a length of zero or of no number is not inside.
    if !(along > near_end && along < 1.0 - near_end) {
        return None;
    }
    let off = length(&[0, 1, 2].map(|k| w[k] - along * u[k]));
    if off > reach {
        return None;
    }
    let exact = [(0, 1), (1, 2), (2, 0)]
        .iter()
        .all(|&(i, j)| turn_2d(p, q, x, i, j) == 0);
    Some((along, exact))
}
