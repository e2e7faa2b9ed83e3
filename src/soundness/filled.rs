//! A body of overlapping surfaces with each region counted once: what lies where the winding
//! number is above zero.
//!
//! The sum over the facets counts each region as often as the surfaces wind about it, and that sum
//! is known to rounding. Only the difference (1 − w where w > 1, −w where w < 0) is estimated, by
//! columns of rays (see the module `columns`): where nothing overlaps nothing is added, and the
//! error is that of the overlaps, not of the body.

use nalgebra::Vector3;

use super::columns::{Lattice, Piece, REPLICATES, finer, integrate, mean, three_errors};
use crate::geometry::{Corners, LooseFacets, Point, Select};
use crate::mesh::{Body, Mesh, NestedRule, Part, Refusal, each};
use crate::moments::{self, Moments};
use crate::progress::Progress;

/// Coarsest and finest lattices, in points along a side.
const COARSEST: usize = 64;
const FINEST: usize = 512;
/// Passages of rays through surfaces that one lattice may ask for, which is seconds of work: some
/// sixty a ray on the finest. Where thousands of solids share one place the lattice stays coarser,
/// and the error figure says so.
const MOST_PASSAGES: u64 = 1 << 27;

/// Moments of a filled body, with how far off they may be (three standard errors, and what rays may
/// have missed), in the facets' unit.
#[derive(Clone, Copy, Debug)]
pub struct Filled {
    /// Of the region of positive winding number.
    pub moments: Moments,
    /// Of the volume.
    pub volume_error: f64,
    /// Of the centroid, as a distance.
    pub centre_error: f64,
    /// Of the second moments about the centroid, as a Frobenius norm.
    pub second_error: f64,
}

/// Fills a closed soup of triangles. The volume is refined until its error is below `tolerance`
/// times itself, or the finest lattice is reached; the error says which.
pub fn filled(facets: &[[Point; 3]], tolerance: f64) -> Filled {
    let f = LooseFacets(facets);
    let mut bounds = [[f64::INFINITY; 3], [f64::NEG_INFINITY; 3]];
    for p in facets.iter().flatten() {
        for k in 0..3 {
            bounds[0][k] = bounds[0][k].min(p[k]);
            bounds[1][k] = bounds[1][k].max(p[k]);
        }
    }
    let apex = facets.first().map_or([0.0; 3], |t| t[0]);
    let raw = moments::integrate(&f, Select::All, apex, apex).moments;
    let piece = Piece {
        facets: &f,
        select: Select::All,
        weight: 1,
        group: 0,
    };
    fill(&[piece], raw, bounds, tolerance)
}

/// Fills bodies of a mesh together: solids nested in them count once, voids are taken out, and
/// what several of them occupy counts once.
///
/// # Errors
/// The first refusal of [`Mesh::solid`] with nested solids allowed: a body that is not closed has
/// no winding number.
pub fn filled_bodies(
    mesh: &Mesh,
    bodies: &[&Body],
    tolerance: f64,
    progress: Progress<'_>,
) -> Result<Filled, Refusal> {
    let _stage = progress.stage("counting each region once", 0);
    let mut raw: Option<Moments> = None;
    let mut bounds = [[f64::INFINITY; 3], [f64::NEG_INFINITY; 3]];
    for body in bodies {
        let m = mesh.solid(body, Some(NestedRule::Sum))?.moments;
        raw = Some(raw.map_or(m, |sum| sum.plus(&m)));
        bounds = [
            [0, 1, 2].map(|k| bounds[0][k].min(body.bounds[0][k])),
            [0, 1, 2].map(|k| bounds[1][k].max(body.bounds[1][k])),
        ];
    }
    let raw = raw.unwrap_or_else(|| Moments::zero(Vector3::zeros()));
    Ok(each!(&mesh.soup.triangles, f => {
        let pieces: Vec<Piece<'_>> = bodies
            .iter()
            .flat_map(|b| pieces_of(mesh, b, f, 0))
            .collect();
        fill(&pieces, raw, bounds, tolerance)
    }))
}

/// The closed shells of a body.
pub(super) fn pieces_of<'a>(
    mesh: &'a Mesh,
    body: &'a Body,
    facets: &'a dyn Corners,
    group: usize,
) -> impl Iterator<Item = Piece<'a>> {
    let roles = body.roles().iter().filter(|r| r.part != Part::Stray);
    roles.map(move |r| Piece {
        facets,
        select: mesh.found().shells[r.shell].members.select(),
        weight: if r.turned { -1 } else { 1 },
        group,
    })
}

fn fill(pieces: &[Piece<'_>], raw: Moments, bounds: [Point; 2], tolerance: f64) -> Filled {
    let mut side = COARSEST;
    let mut finest = FINEST;
    loop {
        let lattice = Lattice { bounds, side };
        let found = integrate(pieces, lattice, &|w| match w[0] {
            0 | 1 => 0.0,
            w if w > 1 => f64::from(1 - w),
            w => f64::from(-w),
        });
        let moments = raw.plus(&mean(&found.replicates));
        let volume_error = found.volume_error();
        // Passages grow as the square of the side.
        let room = (MOST_PASSAGES as f64 / found.passages.max(1) as f64).sqrt();
        finest = finest.min((side as f64 * room.max(1.0)) as usize);
        if volume_error <= tolerance * moments.zeroth.abs() || side >= finest {
            let all: [Moments; REPLICATES] = found.replicates.map(|m| raw.plus(&m));
            let centre = |m: &Moments| m.centre().unwrap_or(m.about);
            let middle = centre(&moments);
            // What is unseen may lie as far off as the box reaches.
            let reach = (Vector3::from(bounds[1]) - Vector3::from(bounds[0])).norm();
            let unseen = found.unseen * reach / moments.zeroth.abs();
            let row = |k: usize| {
                three_errors(&all, |m| {
                    let m = m.shifted(middle).second;
                    Vector3::new(m[(k, 0)], m[(k, 1)], m[(k, 2)])
                })
            };
            let second_error = (0..3).map(|k| row(k).powi(2)).sum::<f64>().sqrt();
            return Filled {
                moments,
                volume_error,
                centre_error: three_errors(&all, centre) + unseen,
                second_error: second_error + found.unseen * reach * reach,
            };
        }
        side = finer(side, volume_error, tolerance * moments.zeroth.abs(), finest);
    }
}
