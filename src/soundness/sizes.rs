//! Sizes that no sensible part has: of a whole file (its unit), and of stray fragments.

use super::finding::{Finding, FindingKind, Severity};
use crate::mesh::near::{distance, length};
use crate::mesh::{Mesh, Shell};
use crate::quantity::LengthUnit;

/// Largest extents, m, that a part to be weighed may have without a word. A model in metres that
/// is taken as mm comes out a thousand times too small, so that anything up to a metre is below
/// the lower one; the upper is the length of a large vehicle.
const SENSIBLE_M: [f64; 2] = [1e-3, 50.0];
/// Extents, m, that a suggested unit must give.
const LIKELY_M: [f64; 2] = [5e-3, 5.0];
/// Masses, kg, of a whole file that pass without a word: a milligram to a hundred tonnes.
const SENSIBLE_KG: [f64; 2] = [1e-6, 1e5];

/// Doubts the unit of a mesh by its size, and by its mass where that is known. Only an assumed
/// unit is doubted: one that was stated is believed.
pub fn unit_suspect(
    mesh: &Mesh,
    unit: LengthUnit,
    assumed: bool,
    mass_kg: Option<f64>,
) -> Option<Finding> {
    let [low, high] = mesh.bounds().filter(|_| assumed)?;
    let extent = (0..3).map(|k| high[k] - low[k]).fold(0.0, f64::max);
    let outside = |x: f64, [a, b]: [f64; 2]| x > 0.0 && !(a..=b).contains(&x);
    let metres = extent * unit.metres();
    let size = outside(metres, SENSIBLE_M);
    let mass = mass_kg.filter(|&m| outside(m, SENSIBLE_KG));
    if !size && mass.is_none() {
        return None;
    }
    let mut reasons = Vec::new();
    if size {
        reasons.push(format!("the largest extent is {} mm", shown(metres * 1e3)));
    }
    if let Some(m) = mass {
        reasons.push(format!("the mass is {} kg", shown(m)));
    }
    let likely: Vec<String> = [
        LengthUnit::Mm,
        LengthUnit::Cm,
        LengthUnit::M,
        LengthUnit::In,
        LengthUnit::Ft,
    ]
    .into_iter()
    .filter(|u| *u != unit && (LIKELY_M[0]..=LIKELY_M[1]).contains(&(extent * u.metres())))
    .map(|u| {
        let mm = shown(extent * u.metres() * 1e3);
        format!("--unit {} makes it {mm} mm", u.symbol())
    })
    .collect();
    let advice = if likely.is_empty() {
        format!(
            "{} with the assumed unit {}, and no other unit that is known makes it a likely part: check the scale of the export",
            reasons.join(" and "),
            unit.symbol()
        )
    } else {
        format!(
            "{} with the assumed unit {}: if that is wrong, {}",
            reasons.join(" and "),
            unit.symbol(),
            likely.join(", ")
        )
    };
    let middle = crate::mesh::middle(&[low, high]).map(|x| x * unit.metres());
    Some(Finding {
        kind: FindingKind::UnitSuspect,
        severity: Severity::Notes,
        count: 1,
        places: vec![super::finding::Place {
            at_m: middle,
            triangles: Vec::new(),
            line: None,
            length_m: None,
            edges: None,
        }],
        places_shown: 1,
        volume_effect_m3: None,
        volume_effect_is: None,
        join_m: None,
        advice,
    })
}

fn shown(x: f64) -> String {
    let text = format!("{x:.3e}");
    let value: f64 = text.parse().unwrap_or(x);
    if (1e-4..1e7).contains(&value.abs()) {
        value.to_string()
    } else {
        text
    }
}

/// A stray fragment has a box whose diagonal is below this share of the whole file's: a screw of
/// 3 mm on a machine of 3 m is not yet one.
const TINY_DIAGONAL: f64 = 1e-3;
/// The box of a stray fragment has less volume than this share of all solids: its mass is lost in
/// the last digit that anybody signs for.
const TINY_VOLUME: f64 = 1e-6;
/// A stray fragment has at most so many facets; more are somebody's work.
const FEW_FACETS: usize = 100;

/// The shells that are stray fragments, by their places in the list.
pub(super) fn tiny_shells(shells: &[Shell]) -> Vec<usize> {
    if shells.len() < 2 {
        return Vec::new();
    }
    let mut all = shells[0].bounds;
    for s in shells {
        all = [
            [0, 1, 2].map(|k| all[0][k].min(s.bounds[0][k])),
            [0, 1, 2].map(|k| all[1][k].max(s.bounds[1][k])),
        ];
    }
    let diagonal = distance(&all[0], &all[1]);
    let volume: f64 = shells
        .iter()
        .filter(|s| s.closed())
        .map(|s| s.solid.moments.zeroth.abs())
        .sum();
    let is_tiny = |s: &Shell| {
        let side = [0, 1, 2].map(|k| s.bounds[1][k] - s.bounds[0][k]);
        s.count <= FEW_FACETS
            && length(&side) < TINY_DIAGONAL * diagonal
            && (volume == 0.0 || side[0] * side[1] * side[2] < TINY_VOLUME * volume)
    };
    (0..shells.len()).filter(|&i| is_tiny(&shells[i])).collect()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::mesh::{Run, Soup, Triangles};

    fn suspect(size: f64, assumed: bool, mass: Option<f64>) -> Option<String> {
        let soup = Soup {
            triangles: Triangles::Loose(vec![[[0.0; 3], [size, 0.0, 0.0], [0.0, size, 0.0]]]),
            names: vec![None],
            runs: vec![Run {
                first: 0,
                count: 1,
                name: 0,
                material: None,
            }],
            ..Soup::default()
        };
        let mesh = Mesh::new(soup, "part").unwrap();
        unit_suspect(&mesh, LengthUnit::Mm, assumed, mass).map(|f| f.advice)
    }

    #[test]
    fn ordinary_parts_pass_and_the_likely_unit_is_named() {
        for size in [1.0, 3.0, 600.0, 12_000.0] {
            assert_eq!(suspect(size, true, Some(1.0)), None);
        }
        let metres = suspect(0.6, true, None).unwrap();
        assert!(metres.contains("--unit m makes it 600 mm"), "{metres}");
        assert_eq!(suspect(0.6, false, None), None);
        assert!(suspect(1e6, true, None).unwrap().contains("scale"));
        assert!(suspect(20.0, true, Some(1e-9)).unwrap().contains("mass"));
        assert_eq!(suspect(0.0, true, None), None);
    }
}
