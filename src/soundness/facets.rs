//! What one look at each facet tells: no area, a sliver, a stated normal that points elsewhere.

use rayon::prelude::*;

use crate::geometry::{Corners, Point, is_flat};
use crate::mesh::{Mesh, Triangles, each};

/// A facet is a sliver where its height is below this share of its longest side. Coordinates of
/// 32 bits stand 6e-8 of their size apart, so such a height is a few of their steps, and which way
/// the facet faces is chance.
pub(super) const SLIVER: f64 = 1e-6;
/// A stated normal disagrees where the cosine between it and the winding's is below this: more
/// than 90°, and by more than normals written with few digits are off.
const DISAGREES: f64 = -1e-3;

/// Triangles by what is odd about them, ascending.
#[derive(Debug, Default)]
pub(super) struct OddFacets {
    /// Their corners lie exactly on one line.
    pub(super) flat: Vec<u32>,
    /// They have an area, and hardly any height.
    pub(super) slivers: Vec<u32>,
    /// Their stated normal points away from the side that their corners turn about.
    pub(super) disagree: Vec<u32>,
}

impl OddFacets {
    pub(super) fn is_empty(&self) -> bool {
        self.flat.is_empty() && self.slivers.is_empty() && self.disagree.is_empty()
    }
}

/// Whether the file's own normals are at hand: those of binary STL are.
pub(super) fn has_normals(mesh: &Mesh) -> bool {
    matches!(mesh.soup.triangles, Triangles::Records(_))
}

/// Looks at every facet once.
pub(super) fn odd_facets(mesh: &Mesh) -> OddFacets {
    let found = match &mesh.soup.triangles {
        Triangles::Records(records) => {
            let f = records.facets();
            look(&f, |t| Some(f.stated_normal(t)))
        }
        other => each!(other, f => look(f, |_| None)),
    };
    let mut out = OddFacets::default();
    for (t, what) in found {
        match what {
            Odd::Flat => out.flat.push(t),
            Odd::Sliver => out.slivers.push(t),
            Odd::Disagrees => out.disagree.push(t),
        }
    }
    out
}

#[derive(Clone, Copy)]
enum Odd {
    Flat,
    Sliver,
    Disagrees,
}

fn look<C: Corners>(f: &C, normal: impl Fn(usize) -> Option<[f32; 3]> + Sync) -> Vec<(u32, Odd)> {
    (0..f.count() as u32)
        .into_par_iter()
        .with_min_len(4096)
        .filter_map(|t| {
            let odd = judge(&f.triangle(t as usize), || normal(t as usize))?;
            Some((t, odd))
        })
        .collect()
}

#[inline(always)]
fn judge(t: &[Point; 3], stated: impl FnOnce() -> Option<[f32; 3]>) -> Option<Odd> {
    let edge = |i: usize, j: usize| [0, 1, 2].map(|k| t[j][k] - t[i][k]);
    let (u, v, w) = (edge(0, 1), edge(0, 2), edge(1, 2));
    let n = [
        u[1] * v[2] - u[2] * v[1],
        u[2] * v[0] - u[0] * v[2],
        u[0] * v[1] - u[1] * v[0],
    ];
    let square = |x: &Point| x[0] * x[0] + x[1] * x[1] + x[2] * x[2];
    let longest = square(&u).max(square(&v)).max(square(&w));
    // Height over the longest side is 2A / L².
    let slender = square(&n.map(|x| x / longest)).sqrt();
    // A facet without area is far below the bound; where squares leave the range of numbers,
    // only the exact test has a say.
    let judged = longest.is_normal() && slender.is_finite();
    if !judged || slender <= SLIVER {
        return if is_flat(t) {
            Some(Odd::Flat)
        } else {
            judged.then_some(Odd::Sliver)
        };
    }
    let s = stated()?.map(f64::from);
    let dot = (s[0] * n[0] + s[1] * n[1] + s[2] * n[2]) / longest;
    // A normal of zeros, or of no numbers, states nothing.
    (dot < DISAGREES * slender * square(&s).sqrt()).then_some(Odd::Disagrees)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn kind(t: [Point; 3], n: [f32; 3]) -> Option<u8> {
        judge(&t, || Some(n)).map(|o| o as u8)
    }

    #[test]
    fn facets_are_judged_whatever_their_size() {
        for k in [1e-60, 1e-9, 1.0, 1e9, 1e60] {
            let t = |h: f64| [[0.0; 3], [k, 0.0, 0.0], [0.3 * k, h * k, 0.0]];
            assert_eq!(kind(t(0.5), [0.0, 0.0, 1.0]), None);
            assert_eq!(kind(t(2e-6), [0.0, 0.0, 1.0]), None);
            assert_eq!(kind(t(5e-7), [0.0, 0.0, 1.0]), Some(Odd::Sliver as u8));
            assert_eq!(kind(t(0.0), [0.0, 0.0, 1.0]), Some(Odd::Flat as u8));
            let turned = Some(Odd::Disagrees as u8);
            assert_eq!(kind(t(0.5), [0.0, 0.0, -1.0]), turned);
            assert_eq!(kind(t(0.5), [1.0, 0.0, -0.01]), turned);
            for silent in [[0.0; 3], [1.0, 0.0, 0.0], [f32::NAN; 3], [1.0, 0.0, -1e-4]] {
                assert_eq!(kind(t(0.5), silent), None);
            }
        }
    }
}
