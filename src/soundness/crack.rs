//! Cracks: open edges that cancel once near vertices are joined, and the distance that it takes.

use std::collections::HashMap;
use std::sync::atomic::{AtomicUsize, Ordering};

use rayon::prelude::*;

use crate::mesh::near::Near;
use crate::mesh::{Boundary, Merge, clusters};

/// The farthest that two vertices of a crack may lie apart, as a share of the diagonal of the box
/// around all open edges. Exporters leave cracks of rounding size, or of the tolerance of the
/// model (1e-6 to 1e-4 of its size); what gapes wider than this is a hole that somebody can see.
pub(crate) const WIDEST: f64 = 1e-3;
/// The farthest that two vertices of a crack may lie apart, as a share of the shortest open edge
/// at either: joining along a crack brings its two rims together, and must not shrink a rim.
pub(crate) const OF_EDGE: f64 = 0.5;

/// Boundaries of more edges are not searched: a surface torn everywhere is no export to be mended,
/// and the search must stay within a small multiple of the file's memory. All loops are holes then.
const MOST_EDGES: usize = 4_000_000;
/// So are they where each vertex has more neighbours than this, on the average, that a crack could
/// join it with: that is a heap of surfaces.
const NEIGHBOURS: usize = 8;

/// One seam: open edges that hang together and close when joined. What hangs together with them
/// and stays open is no part of it.
#[derive(Clone, Debug, PartialEq)]
pub(crate) struct Crack {
    /// The least distance within which vertices must be joined (file unit).
    pub(crate) distance: f64,
    /// Its edges, as places in the boundary's list.
    pub(crate) edges: Vec<u32>,
}

/// All cracks of a boundary, by their first edge.
pub(crate) fn cracks(boundary: &Boundary) -> Vec<Crack> {
    let pairs = near_pairs(boundary);
    if pairs.is_empty() {
        return Vec::new();
    }
    let mut seams = Seams::new(boundary);
    let mut found = seams.grow(&pairs);
    found.extend(of_part(boundary, &seams.sealed(), &pairs));
    found.sort_by_key(|c| c.edges.first().copied());
    hold(boundary, found)
}

/// Cracks among open edges that cancel although what hangs together with them stays open: a slit
/// that runs into a hole. Each is grown apart from that hole, so that its distance is its own.
fn of_part(boundary: &Boundary, sealed: &[u32], pairs: &[(f64, u32, u32)]) -> Vec<Crack> {
    if sealed.is_empty() {
        return Vec::new();
    }
    let mut at_seam = vec![false; boundary.points.len()];
    let edges: Vec<_> = sealed.iter().map(|&i| boundary.edges[i as usize]).collect();
    for e in &edges {
        at_seam[e.from as usize] = true;
        at_seam[e.to as usize] = true;
    }
    let pairs: Vec<_> = pairs
        .iter()
        .filter(|&&(_, i, j)| at_seam[i as usize] && at_seam[j as usize])
        .copied()
        .collect();
    let part = Boundary {
        vertices: boundary.vertices.clone(),
        points: boundary.points.clone(),
        edges,
    };
    let mut found = Seams::new(&part).grow(&pairs);
    for i in found.iter_mut().flat_map(|c| &mut c.edges) {
        *i = sealed[*i as usize];
    }
    found
}

/// Pairs of vertices that may face each other across a crack, nearest first.
fn near_pairs(boundary: &Boundary) -> Vec<(f64, u32, u32)> {
    if boundary.edges.len() > MOST_EDGES {
        return Vec::new();
    }
    let mut reach = vec![boundary.diagonal() * WIDEST; boundary.points.len()];
    for e in &boundary.edges {
        let most = boundary.length(e) * OF_EDGE;
        for v in [e.from, e.to] {
            reach[v as usize] = reach[v as usize].min(most);
        }
    }
    let near = Near::new(&boundary.points);
    let room = Room::new(boundary.points.len());
    let mut pairs: Vec<(f64, u32, u32)> = (0..boundary.points.len() as u32)
        .into_par_iter()
        .flat_map_iter(|i| {
            let mut of_one = Vec::new();
            near.ball(&boundary.points[i as usize], reach[i as usize], |j, d| {
                if i < j && d < reach[i as usize].min(reach[j as usize]) && room.one_more() {
                    of_one.push((d, i, j));
                }
            });
            of_one
        })
        .collect();
    if room.is_exceeded() {
        return Vec::new();
    }
    pairs.par_sort_unstable_by(|a, b| a.0.total_cmp(&b.0).then((a.1, a.2).cmp(&(b.1, b.2))));
    pairs
}

/// A limit on what is gathered by several threads. Whether it is exceeded does not depend on their
/// order, since what is counted is never taken back.
pub(super) struct Room(AtomicUsize, usize);

impl Room {
    pub(super) fn new(vertices: usize) -> Self {
        Self(AtomicUsize::new(0), vertices * NEIGHBOURS + 4096)
    }

    pub(super) fn one_more(&self) -> bool {
        self.0.fetch_add(1, Ordering::Relaxed) < self.1
    }

    pub(super) fn is_exceeded(&self) -> bool {
        self.0.load(Ordering::Relaxed) > self.1
    }
}

/// Vertices made one step by step, with what is left of the boundary.
struct Seams<'a> {
    boundary: &'a Boundary,
    clusters: Merge,
    /// How many vertices each cluster has, under the cluster's name.
    sizes: Vec<u32>,
    /// Edges at each cluster, under the cluster's name.
    edges_at: Vec<Vec<u32>>,
    /// What is left over on each edge between clusters.
    net: HashMap<(u32, u32), i64>,
    /// Clusters whose edges hang together, and for each, under its name:
    groups: Merge,
    /// edges that do not cancel,
    left: Vec<usize>,
    /// and whether it has closed.
    done: Vec<bool>,
}

impl<'a> Seams<'a> {
    fn new(boundary: &'a Boundary) -> Self {
        let n = boundary.points.len();
        let mut out = Self {
            boundary,
            clusters: Merge::new(n),
            sizes: vec![1; n],
            edges_at: vec![Vec::new(); n],
            net: HashMap::new(),
            groups: Merge::new(n),
            left: vec![0; n],
            done: vec![false; n],
        };
        for (i, e) in (0u32..).zip(&boundary.edges) {
            out.edges_at[e.from as usize].push(i);
            out.edges_at[e.to as usize].push(i);
            out.groups.join(e.from, e.to);
        }
        for i in 0..boundary.edges.len() as u32 {
            out.count(i, 1);
        }
        out
    }

    /// Adds the edge to what is left, or with −1 takes it away.
    fn count(&mut self, edge: u32, sign: i64) {
        let e = self.boundary.edges[edge as usize];
        let (a, b) = (self.clusters.find(e.from), self.clusters.find(e.to));
        if a == b {
            return;
        }
        let weight = sign * if a < b { e.weight } else { -e.weight };
        let net = self.net.entry((a.min(b), a.max(b))).or_default();
        let before = *net;
        *net += weight;
        let after = *net;
        let group = self.groups.find(a) as usize;
        match (before, after) {
            (0, 0) => {}
            (0, _) => self.left[group] += 1,
            (_, 0) => self.left[group] -= 1,
            _ => {}
        }
    }

    fn join(&mut self, i: u32, j: u32) -> Option<u32> {
        let (a, b) = (self.clusters.find(i), self.clusters.find(j));
        let (g, h) = (self.groups.find(a), self.groups.find(b));
        if a == b || self.done[g as usize] || self.done[h as usize] {
            return None;
        }
        let group = self.groups.join(g, h);
        if g != h {
            self.left[group as usize] = self.left[g as usize] + self.left[h as usize];
        }
        // The cluster of fewer edges takes the other's name, so that none is renamed often.
        let few = self.edges_at[a as usize].len() < self.edges_at[b as usize].len();
        let (name, renamed) = if few { (b, a) } else { (a, b) };
        let edges = std::mem::take(&mut self.edges_at[renamed as usize]);
        for &e in &edges {
            self.count(e, -1);
        }
        // An edge between the two has shrunk to nothing now.
        self.clusters.hang(renamed, name);
        self.sizes[name as usize] += self.sizes[renamed as usize];
        for &e in &edges {
            self.count(e, 1);
        }
        self.edges_at[name as usize].extend(edges);
        Some(group)
    }

    /// Joins pair after pair; what closes at one distance stays as it is.
    fn grow(&mut self, pairs: &[(f64, u32, u32)]) -> Vec<Crack> {
        let mut closed: Vec<(u32, f64)> = Vec::new();
        for batch in pairs.chunk_by(|a, b| a.0 == b.0) {
            let mut touched: Vec<u32> = Vec::new();
            for &(_, i, j) in batch {
                touched.extend(self.join(i, j));
            }
            for group in touched {
                let group = self.groups.find(group);
                if self.left[group as usize] == 0 && !self.done[group as usize] {
                    self.done[group as usize] = true;
                    closed.push((group, batch[0].0));
                }
            }
        }
        let place: HashMap<u32, usize> = (0..).zip(&closed).map(|(i, c)| (c.0, i)).collect();
        let mut out: Vec<Crack> = closed
            .iter()
            .map(|&(_, distance)| Crack {
                distance,
                edges: Vec::new(),
            })
            .collect();
        for (i, e) in (0u32..).zip(&self.boundary.edges) {
            if let Some(&at) = place.get(&self.groups.find(e.from)) {
                out[at].edges.push(i);
            }
        }
        out
    }

    /// Edges that joining has made cancel, in groups that have not closed.
    fn sealed(&mut self) -> Vec<u32> {
        let mut out = Vec::new();
        for (i, e) in (0u32..).zip(&self.boundary.edges) {
            let (a, b) = (self.clusters.find(e.from), self.clusters.find(e.to));
            // What lies between vertices that nothing was joined to was not closed by joining.
            let alone = [(a, e.from), (b, e.to)]
                .iter()
                .all(|&(name, v)| name == v && self.sizes[name as usize] == 1);
            let cancels = a != b && self.net.get(&(a.min(b), a.max(b))).is_none_or(|&n| n == 0);
            if cancels && !alone && !self.done[self.groups.find(a) as usize] {
                out.push(i);
            }
        }
        out
    }
}

/// Keeps the cracks that also close when every boundary vertex of the file is joined within their
/// own distance or within that of any wider crack, as `--join` does it.
fn hold(boundary: &Boundary, mut found: Vec<Crack>) -> Vec<Crack> {
    let mut distances: Vec<f64> = found.iter().map(|c| c.distance).collect();
    distances.sort_by(f64::total_cmp);
    distances.dedup();
    // Cracks of one file have few widths; of very many, those between are judged by the next.
    let step = distances.len().div_ceil(32).max(1);
    distances = distances.into_iter().rev().step_by(step).collect();
    for d in distances {
        let rep = clusters(&boundary.points, stated(d));
        let net = boundary.joined(&rep);
        found.retain(|c| {
            c.distance > d
                || c.edges.iter().all(|&i| {
                    let e = &boundary.edges[i as usize];
                    let (a, b) = (rep[e.from as usize], rep[e.to as usize]);
                    net.get(&(a.min(b), a.max(b))).is_none_or(|&n| n == 0)
                })
        });
    }
    found
}

/// The distance as it is stated: a little more, so that it survives being written in another unit.
pub(crate) fn stated(distance: f64) -> f64 {
    distance * (1.0 + 1e-12)
}
