//! Parts that occupy the same space: the overlapping volume, and the mass that is counted twice.

use std::fmt;
use std::sync::Arc;

use serde::Serialize;

use super::resolve::Weighed;
use super::source::MeshBody;
use crate::moments::Placement;
use crate::progress::Progress;
use crate::soundness::shared_spaces_watched;

/// A closed body where it stands in the assembly.
#[derive(Clone)]
pub struct Stand {
    /// The body.
    pub body: Arc<dyn MeshBody>,
    /// From the mesh file's frame to the assembly's.
    pub placement: Placement,
    /// Mass per volume as it counts, kg/m³.
    pub density: f64,
}

impl fmt::Debug for Stand {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "Stand({})", self.body.figures().id)
    }
}

/// Two parts that occupy the same space.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Overlap {
    /// Path of the one that stands first in the file.
    pub a: String,
    /// Path of the other.
    pub b: String,
    /// Volume that both occupy, m³.
    pub volume_m3: f64,
    /// How far off that may be, m³; zero where one lies wholly in the other.
    pub volume_error_m3: f64,
    /// Middle of the shared space, m.
    pub at_m: Option<[f64; 3]>,
    /// What the space weighs as part of `a`, kg. One of the two counts it for nothing.
    pub mass_in_a_kg: f64,
    /// What it weighs as part of `b`, kg.
    pub mass_in_b_kg: f64,
}

/// The volume is refined to this part of the smaller solid, where the finest lattice allows it.
const TOLERANCE: f64 = 1e-4;

/// Shared space below this part of the smaller solid is contact: turning a part rounds its
/// coordinates by some 1e-16 of their size, and fits are no tighter than a micrometre a metre.
const CONTACT: f64 = 1e-6;

/// All pairs of bodies that occupy the same space, in the order of the parts.
///
/// Boxes are compared first; only bodies whose boxes meet are looked at by their facets.
pub(super) fn overlaps(weighed: &[Weighed], progress: Progress<'_>) -> Vec<Overlap> {
    let stands: Vec<(usize, &Stand, [[f64; 3]; 2])> = weighed
        .iter()
        .enumerate()
        .flat_map(|(i, w)| w.stands.iter().map(move |s| (i, s, placed_box(s))))
        .collect();
    let mut order: Vec<usize> = (0..stands.len()).collect();
    order.sort_by(|&i, &j| stands[i].2[0][0].total_cmp(&stands[j].2[0][0]));
    let mut meets = vec![false; stands.len()];
    for (n, &i) in order.iter().enumerate() {
        for &j in &order[n + 1..] {
            let (a, b) = (&stands[i].2, &stands[j].2);
            if b[0][0] >= a[1][0] {
                break;
            }
            if (1..3).all(|k| a[0][k] < b[1][k] && b[0][k] < a[1][k]) {
                meets[i] = true;
                meets[j] = true;
            }
        }
    }
    let chosen: Vec<usize> = (0..stands.len()).filter(|&i| meets[i]).collect();
    let facets: Vec<Vec<[[f64; 3]; 3]>> =
        chosen.iter().map(|&i| placed_facets(stands[i].1)).collect();
    let slices: Vec<&[[[f64; 3]; 3]]> = facets.iter().map(Vec::as_slice).collect();
    shared_spaces_watched(&slices, TOLERANCE, progress)
        .into_iter()
        .filter_map(|found| {
            let (i, a, _) = stands[chosen[found.a]];
            let (j, b, _) = stands[chosen[found.b]];
            let volume = found.moments.zeroth;
            let of = |s: &Stand| s.body.figures().moments.zeroth;
            (volume > CONTACT * of(a).min(of(b))).then(|| Overlap {
                a: weighed[i].path.clone(),
                b: weighed[j].path.clone(),
                volume_m3: volume,
                volume_error_m3: found.volume_error,
                at_m: found.moments.centre().map(Into::into),
                mass_in_a_kg: volume * a.density,
                mass_in_b_kg: volume * b.density,
            })
        })
        .collect()
}

fn placed_box(s: &Stand) -> [[f64; 3]; 2] {
    let b = s.body.bounds_turned(&s.placement.turn);
    b.map(|p| [0, 1, 2].map(|k| p[k] + s.placement.at[k]))
}

/// Facets in the assembly's frame, outward also where the part is mirrored.
fn placed_facets(s: &Stand) -> Vec<[[f64; 3]; 3]> {
    let mirrored = s.placement.turn.determinant() < 0.0;
    let place = |p: [f64; 3]| -> [f64; 3] { s.placement.apply(&p.into()).into() };
    s.body
        .facets()
        .into_iter()
        .map(|t| {
            let [a, b, c] = t.map(place);
            if mirrored { [a, c, b] } else { [a, b, c] }
        })
        .collect()
}
