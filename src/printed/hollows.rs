//! Which hollows of a shell are closed.
//!
//! Cells of the core that share a face belong to one hollow. A drain opens the hollow nearest to
//! it; whatever no drain opens keeps the powder or resin that it was built in.

use std::collections::HashMap;

use nalgebra::Vector3;

use super::hollow::{Cell, Leaf, Room, sum};
use super::{ShellPlan, Trapped};
use crate::error::{Error, Kind, Result};
use crate::moments::Moments;

/// Specks where the octree grazes a narrow place: hollows of less than this part of the core.
const SPECK: f64 = 1e-6;

/// The hollows that no drain opens; `None` where all are open or there are none.
///
/// # Errors
/// `usage` for a drain with no hollow within twice the shell's thickness.
pub(super) fn trapped(
    leaves: &[Leaf],
    room: &Room,
    solid: &Moments,
    plan: &ShellPlan,
) -> Result<Option<Trapped>> {
    let owner = hollows(leaves);
    let mut opened: Vec<usize> = Vec::new();
    for drain in &plan.drains {
        let p = Vector3::from(*drain);
        let nearest = leaves
            .iter()
            .zip(&owner)
            .map(|((cell, _), &o)| (distance(room, cell, &p), o))
            .min_by(|a, b| a.0.total_cmp(&b.0));
        match nearest {
            // Around a corner of three faces the hollow is √3 thicknesses away.
            Some((d, o)) if d <= 2.0 * plan.thickness => opened.push(o),
            _ => {
                return Err(Error::new(
                    Kind::Usage,
                    format!("the drain at {drain:?} reaches no hollow"),
                    "state drains at the surface, in the mesh's own axes, where the part is \
                     thicker than two shells",
                ));
            }
        }
    }
    let volume: f64 = leaves.iter().map(|l| l.1.zeroth).sum();
    let mut closed: Vec<(usize, f64)> = Vec::new();
    for ((_, moments), &o) in leaves.iter().zip(&owner) {
        if opened.contains(&o) {
            continue;
        }
        match closed.iter_mut().find(|c| c.0 == o) {
            Some(c) => c.1 += moments.zeroth,
            None => closed.push((o, moments.zeroth)),
        }
    }
    closed.retain(|c| c.1 > SPECK * volume);
    if closed.is_empty() {
        return Ok(None);
    }
    let kept = leaves
        .iter()
        .zip(&owner)
        .filter(|(_, o)| closed.iter().any(|c| c.0 == **o))
        .map(|(l, _)| l);
    Ok(Some(Trapped {
        hollow: sum(solid, kept),
        count: closed.len(),
        fill_density: plan.fill_density,
    }))
}

/// For each leaf the first leaf of its hollow.
fn hollows(leaves: &[Leaf]) -> Vec<usize> {
    let index: HashMap<Cell, usize> = leaves.iter().enumerate().map(|(i, l)| (l.0, i)).collect();
    let mut parent: Vec<usize> = (0..leaves.len()).collect();
    fn root(parent: &mut [usize], mut i: usize) -> usize {
        while parent[i] != i {
            parent[i] = parent[parent[i]];
            i = parent[i];
        }
        i
    }
    for (i, (cell, _)) in leaves.iter().enumerate() {
        for (k, step) in [(0, -1), (0, 1), (1, -1), (1, 1), (2, -1), (2, 1)] {
            let mut at = cell.at.map(i64::from);
            at[k] += step;
            if at[k] < 0 || at[k] >= 1 << cell.level {
                continue;
            }
            let mut beside = Cell {
                level: cell.level,
                at: at.map(|x| x as u32),
            };
            // As large or larger; smaller ones find this one from their side.
            loop {
                if let Some(&j) = index.get(&beside) {
                    let (a, b) = (root(&mut parent, i), root(&mut parent, j));
                    parent[a.max(b)] = a.min(b);
                    break;
                }
                if beside.level == 0 {
                    break;
                }
                beside = Cell {
                    level: beside.level - 1,
                    at: beside.at.map(|x| x / 2),
                };
            }
        }
    }
    (0..leaves.len()).map(|i| root(&mut parent, i)).collect()
}

/// From a point to a cell.
fn distance(room: &Room, cell: &Cell, p: &Vector3<f64>) -> f64 {
    let half = room.half(cell.level);
    let away = (p - room.middle(cell)).abs() - Vector3::repeat(half);
    away.map(|x| x.max(0.0)).norm()
}
