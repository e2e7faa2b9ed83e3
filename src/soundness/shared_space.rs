//! Which closed solids occupy the same space, and how much of it.
//!
//! Pairs are sought by boxes, then by exact crossings of triangles over trees; where nothing
//! crosses, a shell may still lie wholly inside the other solid, which an exact winding number of
//! one of its points shows. The volume is an integral over columns of rays (see the module
//! `columns`), with its error beside it; of a solid that lies wholly inside another it is exact.

use std::collections::HashMap;
use std::sync::atomic::{AtomicBool, Ordering};

use rayon::prelude::*;

use super::columns::{Lattice, Piece, finer, integrate, mean};
use super::filled::pieces_of;
use crate::geometry::{
    BoxTree, LooseFacets, Meeting, Point, Position, RationalPoint, Select, meeting, ray_crossing,
};
use crate::mesh::{Body, Mesh, each};
use crate::moments::{self, Moments};
use crate::progress::Progress;

/// Coarsest and finest lattices, in points along a side.
const COARSEST: usize = 32;
const FINEST: usize = 512;

/// How much of the smaller solid the first look at a contact may miss: surfaces that nowhere pass
/// through each other for certain share space only if one lies in the other along a whole face.
const CONTACT_LOOK: f64 = 1e-2;

/// Space that two solids both occupy, in the facets' unit.
#[derive(Clone, Debug)]
pub struct SharedSpace {
    /// Index of the first solid.
    pub a: usize,
    /// Index of the second solid, above the first's.
    pub b: usize,
    /// Moments of the shared volume.
    pub moments: Moments,
    /// How far off the volume may be: three standard errors and what rays may have missed; zero
    /// where it is exact to rounding.
    pub volume_error: f64,
}

/// All pairs of the solids that share space, ascending.
///
/// Each solid is a closed soup of triangles, outward, placed in one frame. The volume is refined
/// until its error is below `tolerance` times the smaller solid's volume, or the finest lattice is
/// reached; the error says which. Solids in contact share nothing.
pub fn shared_spaces(solids: &[&[[Point; 3]]], tolerance: f64) -> Vec<SharedSpace> {
    shared_spaces_watched(solids, tolerance, Progress::NONE)
}

/// As [`shared_spaces`], and says how far it is.
pub fn shared_spaces_watched(
    solids: &[&[[Point; 3]]],
    tolerance: f64,
    progress: Progress<'_>,
) -> Vec<SharedSpace> {
    let boxes: Vec<[Point; 2]> = solids.par_iter().map(|s| bounds(s)).collect();
    let pairs = pairs_of_boxes(&boxes);
    let mut wanted = vec![false; solids.len()];
    for &(a, b) in &pairs {
        wanted[a] = true;
        wanted[b] = true;
    }
    let prepared: Vec<Option<Solid<'_>>> = (0..solids.len())
        .into_par_iter()
        .map(|i| wanted[i].then(|| Solid::new(solids[i], boxes[i])))
        .collect();
    let stage = progress.stage("seeking space that parts share", pairs.len());
    pairs
        .into_par_iter()
        .filter_map(|(a, b)| {
            stage.advance(1);
            let (x, y) = (prepared[a].as_ref()?, prepared[b].as_ref()?);
            let (moments, volume_error) = x.shared_with(y, tolerance)?;
            Some(SharedSpace {
                a,
                b,
                moments,
                volume_error,
            })
        })
        .collect()
}

fn bounds(facets: &[[Point; 3]]) -> [Point; 2] {
    let mut out = [[f64::INFINITY; 3], [f64::NEG_INFINITY; 3]];
    for p in facets.iter().flatten() {
        for k in 0..3 {
            out[0][k] = out[0][k].min(p[k]);
            out[1][k] = out[1][k].max(p[k]);
        }
    }
    out
}

/// The part of two boxes that both hold; `None` where it has no volume.
fn common(a: &[Point; 2], b: &[Point; 2]) -> Option<[Point; 2]> {
    let low = [0, 1, 2].map(|k| a[0][k].max(b[0][k]));
    let high = [0, 1, 2].map(|k| a[1][k].min(b[1][k]));
    (0..3).all(|k| low[k] < high[k]).then_some([low, high])
}

/// Pairs whose boxes share volume, ascending: boxes are swept along the axis of the widest spread.
fn pairs_of_boxes(boxes: &[[Point; 2]]) -> Vec<(usize, usize)> {
    let spread = |k: usize| {
        let ends = boxes.iter().filter(|b| b[0][k].is_finite());
        let (low, high) = ends.fold((f64::INFINITY, f64::NEG_INFINITY), |(l, h), b| {
            (l.min(b[0][k]), h.max(b[0][k]))
        });
        high - low
    };
    let axis = (0..3)
        .max_by(|&i, &j| spread(i).total_cmp(&spread(j)))
        .unwrap_or(0);
    let mut order: Vec<usize> = (0..boxes.len()).collect();
    order.sort_by(|&i, &j| {
        boxes[i][0][axis]
            .total_cmp(&boxes[j][0][axis])
            .then(i.cmp(&j))
    });
    let mut pairs = Vec::new();
    for (k, &i) in order.iter().enumerate() {
        for &j in order[k + 1..]
            .iter()
            .take_while(|&&j| boxes[j][0][axis] < boxes[i][1][axis])
        {
            if common(&boxes[i], &boxes[j]).is_some() {
                pairs.push((i.min(j), i.max(j)));
            }
        }
    }
    pairs.sort_unstable();
    pairs
}

struct Solid<'a> {
    facets: &'a [[Point; 3]],
    bounds: [Point; 2],
    tree: BoxTree,
    /// The facets of each connected shell.
    shells: Vec<Vec<u32>>,
    whole: Moments,
}

impl<'a> Solid<'a> {
    fn new(facets: &'a [[Point; 3]], bounds: [Point; 2]) -> Self {
        let f = LooseFacets(facets);
        let apex = facets.first().map_or([0.0; 3], |t| t[0]);
        Self {
            facets,
            bounds,
            tree: BoxTree::new(&f, Select::All),
            shells: shells(facets),
            whole: moments::integrate(&f, Select::All, apex, apex).moments,
        }
    }

    fn shared_with(&self, other: &Self, tolerance: f64) -> Option<(Moments, f64)> {
        let region = common(&self.bounds, &other.bounds)?;
        let (cuts, touches) = self.meets(other);
        if !cuts && !touches {
            let (mine, theirs) = (self.shells_inside(other), other.shells_inside(self));
            match (mine, theirs) {
                (0, 0) => return None,
                (n, 0) if n == self.shells.len() => return Some((self.whole, 0.0)),
                (0, n) if n == other.shells.len() => return Some((other.whole, 0.0)),
                _ => {}
            }
        }
        let smaller = self.whole.zeroth.abs().min(other.whole.zeroth.abs());
        if !cuts {
            // Contact is the rule in assemblies. If a coarse look finds no space at all, nothing
            // that a finer one could find is more than that look's error.
            let wanted = tolerance.max(CONTACT_LOOK) * smaller;
            let (moments, _) = common_space(self.facets, other.facets, region, wanted);
            // Faces in contact are rounded apart: what their rays find is dust.
            if moments.zeroth <= 1e-9 * smaller {
                return None;
            }
        }
        let (moments, error) = common_space(self.facets, other.facets, region, tolerance * smaller);
        // Where surfaces were only seen to touch, what is within the error is contact.
        let real = cuts || moments.zeroth > error.max(1e-9 * smaller);
        real.then_some((moments, error))
    }

    /// Whether the surfaces pass through each other for certain, and whether they meet at all.
    fn meets(&self, other: &Self) -> (bool, bool) {
        let (cuts, touches) = (AtomicBool::new(false), AtomicBool::new(false));
        self.tree.pairs_with(
            &LooseFacets(self.facets),
            &other.tree,
            &LooseFacets(other.facets),
            |_: &mut (), _, _, p, q| {
                if cuts.load(Ordering::Relaxed) {
                    return;
                }
                match meeting(p, q) {
                    Meeting::Apart => {
                        // Touching at points only: the winding of another point would do, but
                        // which is not known here.
                        if p.iter().any(|v| q.contains(v)) {
                            touches.store(true, Ordering::Relaxed);
                        }
                    }
                    Meeting::Crosses
                    | Meeting::Coplanar { opposed: false }
                    | Meeting::EdgeOn { side: -1, .. } => cuts.store(true, Ordering::Relaxed),
                    _ => touches.store(true, Ordering::Relaxed),
                }
            },
        );
        (cuts.into_inner(), touches.into_inner())
    }

    /// How many of its shells lie inside the other solid, where no surfaces cross.
    fn shells_inside(&self, other: &Self) -> usize {
        self.shells
            .iter()
            .filter(|shell| other.holds(shell.iter().map(|&t| &self.facets[t as usize])))
            .count()
    }

    /// Whether a shell that does not cross this solid's surface lies inside it.
    fn holds<'t>(&self, shell: impl Iterator<Item = &'t [Point; 3]>) -> bool {
        const ASKED: usize = 64;
        for t in shell.take(ASKED) {
            let exact = RationalPoint::middle(t);
            let by_corner = self.winding(|u| ray_crossing(&t[0], u));
            let by_middle = || self.winding(|u| exact.ray_crossing(u));
            if let Some(w) = by_corner.or_else(by_middle) {
                return w != 0;
            }
        }
        false
    }

    /// `None` where the point lies on the surface.
    fn winding(&self, crossing: impl Fn(&[Point; 3]) -> Position) -> Option<i64> {
        let mut total = 0;
        for u in self.facets {
            match crossing(u) {
                Position::On => return None,
                Position::Crosses(s) => total += i64::from(s),
                Position::Misses => {}
            }
        }
        Some(total)
    }
}

/// Facets that hang together at vertices of the same coordinates.
fn shells(facets: &[[Point; 3]]) -> Vec<Vec<u32>> {
    let mut parent: Vec<u32> = (0..facets.len() as u32).collect();
    fn root(parent: &mut [u32], mut i: u32) -> u32 {
        while parent[i as usize] != i {
            parent[i as usize] = parent[parent[i as usize] as usize];
            i = parent[i as usize];
        }
        i
    }
    let mut first: HashMap<[u64; 3], u32> = HashMap::with_capacity(facets.len() / 2 + 1);
    for (t, corners) in facets.iter().enumerate() {
        for p in corners {
            let other = *first
                .entry(p.map(|x| (x + 0.0).to_bits()))
                .or_insert(t as u32);
            let (a, b) = (root(&mut parent, other), root(&mut parent, t as u32));
            parent[a.max(b) as usize] = a.min(b);
        }
    }
    let mut out: Vec<Vec<u32>> = Vec::new();
    let mut place: HashMap<u32, usize> = HashMap::new();
    for t in 0..facets.len() as u32 {
        let r = root(&mut parent, t);
        let at = *place.entry(r).or_insert_with(|| {
            out.push(Vec::new());
            out.len() - 1
        });
        out[at].push(t);
    }
    out
}

/// Moments of the space inside both closed surfaces, within `region`, and how far off its
/// volume may be: refined until that is below `wanted`, or the finest lattice is reached.
pub fn common_space(
    a: &[[Point; 3]],
    b: &[[Point; 3]],
    region: [Point; 2],
    wanted: f64,
) -> (Moments, f64) {
    let (fa, fb) = (LooseFacets(a), LooseFacets(b));
    let piece = |facets, group| Piece {
        facets,
        select: Select::All,
        weight: 1,
        group,
    };
    refined(&[piece(&fa, 0), piece(&fb, 1)], region, wanted, FINEST)
}

/// Moments of what two bodies of a mesh both occupy, as [`common_space`]; zero where their boxes
/// share nothing. Both must be closed.
pub(super) fn common_space_of_bodies(
    mesh: &Mesh,
    a: &Body,
    b: &Body,
    wanted: f64,
    finest: usize,
) -> Option<(Moments, f64)> {
    let region = common(&a.bounds, &b.bounds)?;
    Some(each!(&mesh.soup.triangles, f => {
        let of_a = pieces_of(mesh, a, f, 0);
        let pieces: Vec<Piece<'_>> = of_a.chain(pieces_of(mesh, b, f, 1)).collect();
        refined(&pieces, region, wanted, finest)
    }))
}

fn refined(pieces: &[Piece<'_>], region: [Point; 2], wanted: f64, finest: usize) -> (Moments, f64) {
    let mut side = COARSEST;
    loop {
        let lattice = Lattice {
            bounds: region,
            side,
        };
        let inside = |w: [i32; 2]| f64::from(u8::from(w[0] > 0 && w[1] > 0));
        let found = integrate(pieces, lattice, &inside);
        let error = found.volume_error();
        if error <= wanted || side >= finest {
            return (mean(&found.replicates), error);
        }
        side = finer(side, error, wanted, finest);
    }
}

#[cfg(test)]
#[path = "shared_space_tests.rs"]
mod tests;
