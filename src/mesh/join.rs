//! Joining of near vertices on open edges, where a person asks for it.

use std::collections::{BTreeMap, HashMap};

use rayon::prelude::*;

use super::boundary::{Boundary, Merge};
use super::near::{distance, length};
use super::shells::{Members, Shells};
use super::{Mesh, Soup, Triangles, each};
use crate::bytes::Bytes;
use crate::error::Result;
use crate::geometry::{Corners, Point, Select};
use crate::moments::integrate;

/// What joining did to a mesh.
#[derive(Clone, Debug)]
pub struct Joined {
    /// Within which distance vertices were joined (file unit).
    pub distance: f64,
    /// How many vertices moved.
    pub vertices: usize,
    /// How far the farthest moved (file unit).
    pub farthest: f64,
    /// What the file's signed volume, summed about its first vertex, changed by (file unit³).
    pub volume_change: f64,
    pub(crate) seams: Vec<Seam>,
}

/// Open edges that hang together and were joined.
#[derive(Clone, Debug)]
pub(crate) struct Seam {
    /// A vertex that moved, as it was (file unit).
    pub(crate) at: Point,
    /// The facets along it, ascending.
    pub(crate) triangles: Vec<u32>,
    /// The most volume that moving them can have swept (file unit³).
    pub(crate) swept: f64,
}

impl Mesh {
    /// The mesh with its near boundary vertices made one: those that chains of steps of at most
    /// `distance` (file unit) connect, where the vertex lies on an open edge. All of them move to
    /// the first in file order. Only triangles of open shells move; nothing else changes.
    ///
    /// # Errors
    /// As [`Mesh::new`].
    pub fn join(self, distance: f64, stem: &str) -> Result<Self> {
        let boundary = Boundary::of(&self.soup.triangles, &self.found);
        let rep = clusters(&boundary.points, distance);
        let moves: HashMap<u32, u32> = (0u32..)
            .zip(&rep)
            .filter(|(i, r)| i != *r)
            .map(|(i, &r)| (boundary.vertices[i as usize], boundary.vertices[r as usize]))
            .collect();
        let mut joined = Joined {
            distance,
            vertices: moves.len(),
            farthest: 0.0,
            volume_change: 0.0,
            seams: Vec::new(),
        };
        if moves.is_empty() {
            let mut mesh = self;
            mesh.joined = Some(joined);
            return Ok(mesh);
        }
        for (&from, &to) in &moves {
            let (p, q) = (
                self.soup.triangles.vertex(from),
                self.soup.triangles.vertex(to),
            );
            joined.farthest = joined.farthest.max(self::distance(&p, &q));
        }
        let moved = moved_triangles(&self.found, &moves);
        joined.seams = seams(&self, &boundary, &rep, &moved);
        // The first vertex never moves: others move to it.
        let apex = self.soup.triangles.vertex(0);
        let sum = |soup: &Soup| {
            each!(&soup.triangles, f => integrate(f, Select::List(&moved), apex, apex))
                .moments
                .zeroth
        };
        let before = sum(&self.soup);
        let soup = moved_soup(self.soup, &self.found, &moves, &moved);
        joined.volume_change = sum(&soup) - before;
        let mut mesh = Self::new(soup, stem)?;
        mesh.joined = Some(joined);
        Ok(mesh)
    }

    /// What [`Mesh::join`] did, where it was asked for.
    pub fn joined(&self) -> Option<&Joined> {
        self.joined.as_ref()
    }
}

/// For each point the first of those that steps of at most `reach` connect it with.
pub(crate) fn clusters(points: &[Point], reach: f64) -> Vec<u32> {
    let mut sets = Merge::new(points.len());
    // The diagonal of a cell is shorter than the reach, and two cells on lie farther than it. A
    // reach below the spacing of coordinates must not run out of cell numbers.
    let largest = points.iter().flatten().fold(0.0f64, |m, x| m.max(x.abs()));
    let cell = (reach / 1.9).max(largest * 1e-15).max(f64::MIN_POSITIVE);
    let mut cells: BTreeMap<[i64; 3], Vec<u32>> = BTreeMap::new();
    for (i, p) in (0u32..).zip(points) {
        cells
            .entry(p.map(|x| (x / cell).floor() as i64))
            .or_default()
            .push(i);
    }
    let near = |i: u32, j: u32| distance(&points[i as usize], &points[j as usize]) <= reach;
    for (at, here) in &cells {
        for (k, &i) in here.iter().enumerate() {
            for &j in &here[..k] {
                if sets.find(i) == sets.find(j) {
                    break;
                }
                if near(i, j) {
                    sets.join(i, j);
                }
            }
        }
        for step in forward_steps() {
            let Some(there) = cells.get(&[0, 1, 2].map(|k| at[k].saturating_add(step[k]))) else {
                continue;
            };
            for &i in here {
                for &j in there {
                    if sets.find(i) != sets.find(j) && near(i, j) {
                        sets.join(i, j);
                    }
                }
            }
        }
    }
    (0..points.len() as u32).map(|i| sets.find(i)).collect()
}

/// Steps to cells up to two away, one of each opposite pair.
fn forward_steps() -> impl Iterator<Item = [i64; 3]> {
    (0..=2i64)
        .flat_map(|x| (-2..=2i64).flat_map(move |y| (-2..=2i64).map(move |z| [x, y, z])))
        .filter(|&s| s > [0, 0, 0])
}

/// Triangles of open shells (and of none) that have a vertex that moves, ascending.
pub(crate) fn moved_triangles(found: &Shells, moves: &HashMap<u32, u32>) -> Vec<u32> {
    let most = moves.keys().max().map_or(0, |&v| v as usize + 1);
    let mut marked = vec![false; most];
    for &v in moves.keys() {
        marked[v as usize] = true;
    }
    let mut stays = vec![false; found.corners.len()];
    for shell in found.shells.iter().filter(|s| s.closed()) {
        if let Members::Listed(list) = &shell.members {
            for &t in list {
                stays[t as usize] = true;
            }
        }
    }
    (0..found.corners.len() as u32)
        .into_par_iter()
        .filter(|&t| {
            !stays[t as usize]
                && found.corners[t as usize]
                    .iter()
                    .any(|&v| marked.get(v as usize) == Some(&true))
        })
        .collect()
}

/// The most volume that the triangle sweeps while its corners go to their new places along
/// straight lines: its largest area on the way times the longest of the three ways.
pub(crate) fn swept(old: &[Point; 3], new: &[Point; 3]) -> f64 {
    let far = (0..3)
        .map(|k| distance(&old[k], &new[k]))
        .fold(0.0, f64::max);
    let side = |i: usize, j: usize| length(&[0, 1, 2].map(|k| old[j][k] - old[i][k])) + 2.0 * far;
    0.5 * side(0, 1) * side(0, 2) * far
}

fn seams(mesh: &Mesh, boundary: &Boundary, rep: &[u32], moved: &[u32]) -> Vec<Seam> {
    let mut groups = Merge::new(boundary.points.len());
    for e in &boundary.edges {
        groups.join(e.from, e.to);
    }
    for (i, &r) in (0u32..).zip(rep) {
        groups.join(i, r);
    }
    let mut seams: BTreeMap<u32, Seam> = BTreeMap::new();
    for (i, _) in (0u32..).zip(rep).filter(|(i, r)| i != *r) {
        seams.entry(groups.find(i)).or_insert_with(|| Seam {
            at: boundary.points[i as usize],
            triangles: Vec::new(),
            swept: 0.0,
        });
    }
    for e in &boundary.edges {
        if let Some(seam) = seams.get_mut(&groups.find(e.from)) {
            let open = &mesh.found.shells[e.shell as usize].open[e.index as usize];
            seam.triangles.extend(&open.triangles);
        }
    }
    for &t in moved {
        let old = each!(&mesh.soup.triangles, f => f.triangle(t as usize));
        let mut new = old;
        let mut group = None;
        for (k, v) in mesh.found.corners[t as usize].iter().enumerate() {
            if let Ok(i) = boundary.vertices.binary_search(v) {
                new[k] = boundary.points[rep[i] as usize];
                if rep[i] as usize != i {
                    group = Some(groups.find(i as u32));
                }
            }
        }
        if let Some(seam) = group.and_then(|g| seams.get_mut(&g)) {
            seam.swept += swept(&old, &new);
        }
    }
    let mut seams: Vec<Seam> = seams.into_values().collect();
    for s in &mut seams {
        s.triangles.sort_unstable();
        s.triangles.dedup();
    }
    seams
}

fn moved_soup(soup: Soup, found: &Shells, moves: &HashMap<u32, u32>, moved: &[u32]) -> Soup {
    let Soup { triangles, .. } = soup;
    let target = |t: u32, k: usize| moves.get(&found.corners[t as usize][k]).copied();
    let triangles = match triangles {
        Triangles::Records(mut records) => {
            let mut bytes = records.bytes.to_vec();
            for &t in moved {
                for k in 0..3 {
                    let Some(to) = target(t, k) else { continue };
                    let corner = |place: usize| 84 + 50 * (place / 3) + 12 + 12 * (place % 3);
                    let (from, at) = (corner(to as usize), corner(3 * t as usize + k));
                    // The place that a vertex is named after never moves itself.
                    bytes.copy_within(from..from + 12, at);
                }
            }
            records.bytes = Bytes::Owned(bytes);
            Triangles::Records(records)
        }
        Triangles::Loose(mut list) => {
            for &t in moved {
                for k in 0..3 {
                    if let Some(to) = target(t, k) {
                        list[t as usize][k] = list[to as usize / 3][to as usize % 3];
                    }
                }
            }
            Triangles::Loose(list)
        }
        Triangles::Indexed {
            vertices,
            mut corners,
        } => {
            for &t in moved {
                for (k, corner) in corners[t as usize].iter_mut().enumerate() {
                    *corner = target(t, k).unwrap_or(*corner);
                }
            }
            Triangles::Indexed { vertices, corners }
        }
    };
    Soup { triangles, ..soup }
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    proptest! {
        #[test]
        fn clusters_are_those_of_all_pairs(
            raw in prop::collection::vec([-9i8..=9, -9i8..=9, -9i8..=9], 0..60), reach in 0.0f64..6.0
        ) {
            let points: Vec<Point> = raw.iter().map(|p| p.map(|x| f64::from(x) * 0.5)).collect();
            let mut sets = Merge::new(points.len());
            for i in 0..points.len() {
                for j in 0..i {
                    if distance(&points[i], &points[j]) <= reach {
                        sets.join(i as u32, j as u32);
                    }
                }
            }
            let want: Vec<u32> = (0..points.len() as u32).map(|i| sets.find(i)).collect();
            prop_assert_eq!(clusters(&points, reach), want);
        }
    }
}
