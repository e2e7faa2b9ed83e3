//! What facets do to the figures of a curved body, estimated from the facets alone.
//!
//! Facets are chords of curved surfaces: where the vertices lie on the true surface, the faces lie
//! beside it. Convex surfaces lose volume, hollow ones gain it. The estimate goes in four steps:
//! `surface` finds the edges that turn by less than the crease angle, `flats` tells plane faces
//! from curved ones, `normals` estimates the surface's normals at the vertices and from them how
//! far it rises over each edge, `patch` integrates the space between each facet and a quadratic
//! patch over it.
//!
//! It rests on two assumptions that no mesh can prove: that the vertices lie on the surface, and
//! that edges which turn by less than the crease angle stand for a curve. A coarse cylinder and a
//! prism are the same mesh; both readings are given.

mod error;
mod flats;
mod nodes;
mod normals;
mod patch;
mod surface;

use crate::error::Result;

pub use error::{FacetError, Reading};
use flats::Faces;
use normals::Trust;
use surface::{NONE, Surface, V};

/// Edges that turn by less than this many degrees are taken as parts of a curve: 24 segments a
/// turn step by 15°, and edges that are meant are seldom below it (common practice, no source).
pub const CREASE_DEG: f64 = 30.0;

/// Rounds of laying normals along straight chords and evening out the rest; chosen by measurement.
const ROUNDS: usize = 2;

/// Estimates what the facets of a closed, outward-facing surface do to the figures of its body, in
/// the facets' unit. Edges that turn by `crease_deg` or more are taken as meant.
///
/// Sequential, and the same on every run. Memory: about 400 bytes a facet.
///
/// # Errors
/// `too-large` past the number of facets that can be welded.
pub fn estimate(facets: &[[[f64; 3]; 3]], crease_deg: f64) -> Result<FacetError> {
    let s = Surface::of(facets)?;
    let faces = Faces::of(&s);
    let crease = crease_deg.to_radians();
    let smooth: Vec<bool> = (0..s.opposite.len())
        .map(|h| {
            let o = s.opposite[h];
            o != NONE && s.turn[h].abs() < crease && !faces.part(h, o as usize)
        })
        .collect();
    let smooth = curved_only(&s, &faces, smooth);
    let (nodes, count) = nodes::nodes(&s, &smooth);
    let mut normals = normals::start(&s, &nodes, count);
    let mut trust = on_planes(&s, &faces, &nodes, &mut normals);
    let (edges, of) = normals::edges(&s, &smooth, &nodes);
    normals::singular(&edges, &normals, &mut trust);
    normals::refine(&edges, &mut normals, &trust);
    for _ in 0..ROUNDS {
        normals::straighten(&edges, &mut normals, &mut trust);
        normals::refine(&edges, &mut normals, &trust);
    }
    let rises = normals::rises(&edges, &normals, &trust);
    let added = patch::integrate(&s, &nodes, &trust, &rises, &of);
    Ok(FacetError::of(&added, &s, crease_deg))
}

/// Leaves out ridges that stand alone: between two faces of which neither turns on into a further
/// one, an edge is a bend and no curve, however little it turns.
fn curved_only(s: &Surface, faces: &Faces, smooth: Vec<bool>) -> Vec<bool> {
    // The face that each turns into, and whether there is a second.
    let mut next: Vec<(u32, bool)> = vec![(NONE, false); faces.plane.len()];
    let sides = |h: usize| {
        let o = s.opposite[h] as usize;
        (faces.of[h / 3], faces.of[o / 3])
    };
    for h in (0..smooth.len()).filter(|&h| smooth[h]) {
        let (a, b) = sides(h);
        if a != b {
            let n = &mut next[a as usize];
            match n.0 {
                NONE => n.0 = b,
                known if known != b => n.1 = true,
                _ => {}
            }
        }
    }
    (0..smooth.len())
        .map(|h| {
            smooth[h] && {
                let (a, b) = sides(h);
                a == b || next[a as usize].1 || next[b as usize].1
            }
        })
        .collect()
}

/// Gives the corners of planes the planes' normals.
fn on_planes(s: &Surface, faces: &Faces, nodes: &[[u32; 3]], normals: &mut [V]) -> Vec<Trust> {
    let mut sum = vec![V::zeros(); normals.len()];
    for (t, c) in nodes.iter().enumerate() {
        if faces.plane[faces.of[t] as usize] {
            for &i in c {
                sum[i as usize] += s.normal[t] * s.area[t];
            }
        }
    }
    sum.iter()
        .zip(normals)
        .map(|(v, n)| match v.try_normalize(0.0) {
            Some(v) => {
                *n = v;
                Trust::Fixed
            }
            None => Trust::Free,
        })
        .collect()
}
