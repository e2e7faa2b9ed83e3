//! Parts against the figures that another source gives of them.

use nalgebra::Vector3;
use serde::Serialize;

use super::file::Expect;
use crate::limits::Verdict;
use crate::quantity::Quantity;

/// A figure of a part against what was expected. Values are in `unit`.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Expectation {
    /// Path of the part.
    pub part: String,
    /// `volume`, `mass`, `size.x`, `centre.x`, ….
    pub quantity: &'static str,
    /// SI unit of the numbers here.
    pub unit: &'static str,
    /// What the file says.
    pub expected: f64,
    /// How far the value may be off.
    pub tolerance: f64,
    /// What was found.
    pub value: f64,
    /// value − expected.
    pub deviation: f64,
    /// The same in per cent of what was expected; null where that is zero.
    pub deviation_percent: Option<f64>,
    /// Whether the deviation is within the tolerance.
    pub verdict: Verdict,
}

/// What was found of a part, as it stands in its mesh file.
pub(super) struct Figures {
    /// m³.
    pub(super) volume: f64,
    /// kg.
    pub(super) mass: f64,
    /// m.
    pub(super) centre: Option<Vector3<f64>>,
    /// m.
    pub(super) bounds: [[f64; 3]; 2],
}

/// Without a tolerance, ± 0.1 %.
const DEFAULT: f64 = 1e-3;

/// One row for each figure that is expected.
///
/// A centre component that is expected at 0 has no per cent: ± 0.1 % of the diagonal of the box
/// then. A length is never held closer than 1e-6 of the diagonal, the digits that CAD prints.
pub(super) fn judge(part: &str, expect: &Expect, found: &Figures) -> Vec<Expectation> {
    let [lo, hi] = found.bounds.map(Vector3::from);
    let sides = hi - lo;
    let diagonal = sides.norm();
    let row = |quantity, unit, wanted: Quantity, value: f64, floor: f64| {
        let tolerance = match wanted.tolerance {
            Some(t) => t.amount,
            None if wanted.value == 0.0 => floor * 1e3,
            None => (DEFAULT * wanted.value.abs()).max(floor),
        };
        let deviation = value - wanted.value;
        // Rounding of the difference itself is no deviation.
        let slack = 1e-12 * wanted.value.abs().max(value.abs());
        Expectation {
            part: part.to_string(),
            quantity,
            unit,
            expected: wanted.value,
            tolerance,
            value,
            deviation,
            deviation_percent: (wanted.value != 0.0).then(|| 100.0 * deviation / wanted.value),
            verdict: if deviation.abs() <= tolerance + slack {
                Verdict::Holds
            } else {
                Verdict::Broken
            },
        }
    };
    let mut rows = Vec::new();
    rows.extend(
        expect
            .volume
            .map(|q| row("volume", "m3", q, found.volume, 0.0)),
    );
    rows.extend(expect.mass.map(|q| row("mass", "kg", q, found.mass, 0.0)));
    let floor = 1e-6 * diagonal;
    if let Some(size) = expect.size {
        let names = ["size.x", "size.y", "size.z"];
        for n in 0..3 {
            rows.push(row(names[n], "m", size[n], sides[n], floor));
        }
    }
    if let Some(centre) = expect.centre {
        let names = ["centre.x", "centre.y", "centre.z"];
        for n in 0..3 {
            let value = found.centre.map_or(f64::NAN, |c| c[n]);
            rows.push(row(names[n], "m", centre[n], value, floor));
        }
    }
    rows
}
