//! Plane faces: coplanar facets that belong to a plane rather than to a curved surface.
//!
//! A plane that runs into a fillet meets its first facet at half the fillet's step. A normal
//! averaged there would bulge the plane, whose facets are the largest of all, so planes give their
//! own normal to the corners they share.
//!
//! A face of coplanar facets with more than four corners is a plane: facets of a curved surface
//! lie in one plane three or four corners at a time. One with three or four may be a step of a
//! cylinder as well; those are left to the chords (see `normals`).

use super::nodes::Groups;
use super::surface::{NEXT, NONE, Surface, V};

/// Faces: facets joined across edges that do not turn.
pub(super) struct Faces {
    /// The face of each facet.
    pub(super) of: Vec<u32>,
    /// Whether each is taken as a plane.
    pub(super) plane: Vec<bool>,
}

impl Faces {
    /// Joins coplanar facets; those with more than four corners are planes.
    pub(super) fn of(s: &Surface) -> Self {
        let mut groups = Groups::new(s.corners.len());
        let inner = |h: usize| s.opposite[h] != NONE && s.turn[h].abs() <= s.level(h);
        for h in 0..s.opposite.len() {
            if (h as u32) < s.opposite[h] && inner(h) {
                groups.join((h / 3) as u32, s.opposite[h] / 3);
            }
        }
        let (of, count) = groups.numbers();
        // Both ends of each boundary edge: face, point, which edge.
        let mut ends: Vec<(u32, u32, u32)> = Vec::new();
        for h in 0..s.opposite.len() {
            let o = s.opposite[h];
            if o == NONE || of[o as usize / 3] != of[h / 3] {
                let (t, k) = (h / 3, h % 3);
                ends.push((of[t], s.corners[t][k], h as u32));
                ends.push((of[t], s.corners[t][NEXT[k]], h as u32));
            }
        }
        ends.sort_unstable();
        let mut corners = vec![0u32; count];
        for at in ends.chunk_by(|a, b| (a.0, a.1) == (b.0, b.1)) {
            let straight = matches!(at, [a, b] if {
                let (d, e) = (s.along(a.2 as usize), s.along(b.2 as usize));
                d.cross(&e).norm() <= 1e-3 * d.norm() * e.norm()
            });
            corners[at[0].0 as usize] += u32::from(!straight);
        }
        // Facets of a fine fan turn by less than rounding hides, and yet the fan is no plane.
        let mut normal = vec![V::zeros(); count];
        for (t, &f) in of.iter().enumerate() {
            normal[f as usize] += s.normal[t] * s.area[t];
        }
        let mut reach = vec![(f64::INFINITY, f64::NEG_INFINITY); count];
        for (t, &f) in of.iter().enumerate() {
            let Some(n) = normal[f as usize].try_normalize(0.0) else {
                continue;
            };
            let r = &mut reach[f as usize];
            for k in 0..3 {
                let d = s.at(t, k).dot(&n);
                *r = (r.0.min(d), r.1.max(d));
            }
        }
        let plane = corners
            .iter()
            .zip(&reach)
            .map(|(&c, r)| c > 4 && r.1 - r.0 <= 8.0 * s.grain)
            .collect();
        Self { of, plane }
    }

    /// Whether an edge lies between two planes: such an edge is meant, however little it turns.
    pub(super) fn part(&self, h: usize, o: usize) -> bool {
        let (a, b) = (self.of[h / 3], self.of[o / 3]);
        a != b && self.plane[a as usize] && self.plane[b as usize]
    }
}
