//! Phrases that several sheets share.

use super::digits::{length_in, significant};
use super::table::{Look, Mark};
use crate::quantity::LengthUnit;
use crate::soundness::FindingKind;
use crate::text::shown;

/// The unit of a symbol; mm where there is none.
pub(super) fn unit_of(symbol: Option<&str>) -> LengthUnit {
    [
        LengthUnit::Mm,
        LengthUnit::Cm,
        LengthUnit::M,
        LengthUnit::In,
        LengthUnit::Ft,
    ]
    .into_iter()
    .find(|u| Some(u.symbol()) == symbol)
    .unwrap_or_default()
}

/// Path, format, size and unit of a file.
pub(super) fn file_heading(
    path: &str,
    format: Option<&str>,
    triangles: Option<u64>,
    unit: Option<&str>,
    assumed: bool,
    look: Look,
) -> String {
    let mut out = look.marked(&shown(path), Mark::Heading);
    if let (Some(format), Some(triangles), Some(unit)) = (format, triangles, unit) {
        let assumed = if assumed { " (assumed)" } else { "" };
        let format = format.to_uppercase();
        out.push_str(&format!(
            " · {format} · {triangles} triangles · lengths in {unit}{assumed}"
        ));
    }
    out.push('\n');
    out
}

/// Size of a box, such as `600 × 400 × 80`.
pub(super) fn box_size(bounds_m: &[[f64; 3]; 2], unit: LengthUnit) -> String {
    let sides = [0, 1, 2].map(|k| length_in(bounds_m[1][k] - bounds_m[0][k], unit));
    column(&sides).map(|s| trimmed(&s)).join(" × ")
}

/// A point, such as `(1.5, 0, -3) mm`.
pub(super) fn point(at_m: &[f64; 3], unit: LengthUnit) -> String {
    let p = column(&at_m.map(|x| length_in(x, unit))).map(|s| trimmed(&s));
    format!("({}, {}, {}) {}", p[0], p[1], p[2], unit.symbol())
}

/// Three lengths to the same decimal place, the largest with six digits or, where that is far,
/// tenths of a thousandth of the unit: what is below the largest one's rounding shows as zero.
fn column(x: &[f64; 3]) -> [String; 3] {
    let largest = x.iter().fold(0.0f64, |m, v| m.max(v.abs()));
    if !largest.is_finite() || largest >= 1e9 || (largest < 1e-3 && largest > 0.0) {
        return x.map(|v| significant(v, 6));
    }
    let decimals = (5 - largest.max(1e-3).log10().floor() as i32).clamp(0, 9) as usize;
    x.map(|v| format!("{v:.decimals$}"))
}

/// The three coordinates of a point in table cells: to six digits of the largest length about it,
/// so that rounding dust shows as zero.
pub(super) fn coordinates(at_m: &[f64; 3], size_m: f64, unit: LengthUnit) -> [(String, f64); 3] {
    let p = at_m.map(|x| length_in(x, unit));
    let scale = p
        .iter()
        .fold(length_in(size_m, unit), |m, x| m.max(x.abs()));
    let shown = column(&[scale, scale, scale]);
    let decimals = shown[0].split_once('.').map_or(0, |(_, d)| d.len());
    p.map(|x| {
        if shown[0].contains('e') {
            return (significant(x, 6), x);
        }
        let text = format!("{x:.decimals$}");
        let zero = text.bytes().all(|b| matches!(b, b'-' | b'0' | b'.'));
        (
            if zero {
                text.trim_start_matches('-').to_owned()
            } else {
                text
            },
            x,
        )
    })
}

/// A point, with dust below the rounding of the thing's size shown as zero.
pub(super) fn point_in(at_m: &[f64; 3], bounds_m: &[[f64; 3]; 2], unit: LengthUnit) -> String {
    let size = (0..3)
        .map(|k| bounds_m[1][k] - bounds_m[0][k])
        .fold(0.0, f64::max);
    let p = coordinates(at_m, size, unit).map(|(text, _)| trimmed(&text));
    format!("({}, {}, {}) {}", p[0], p[1], p[2], unit.symbol())
}

/// A direction as its three components, to five places.
pub(super) fn direction(axis: &[f64; 3]) -> String {
    axis.map(|x| {
        let text = format!("{x:+.5}");
        if text == "-0.00000" {
            "+0.00000".to_owned()
        } else {
            text
        }
    })
    .join(" ")
}

/// Without the zeros behind the point that say nothing, and without a negative zero.
fn trimmed(text: &str) -> String {
    let text = if text.contains('.') && !text.contains('e') {
        text.trim_end_matches('0').trim_end_matches('.')
    } else {
        text
    };
    if text == "-0" {
        "0".to_owned()
    } else {
        text.to_owned()
    }
}

/// What a finding counts, in words.
pub(crate) fn kind_word(kind: FindingKind, count: u64) -> &'static str {
    let one = count == 1;
    match kind {
        FindingKind::Hole if one => "hole",
        FindingKind::Hole => "holes",
        FindingKind::Crack if one => "crack",
        FindingKind::Crack => "cracks",
        FindingKind::TJunction if one => "T-junction",
        FindingKind::TJunction => "T-junctions",
        FindingKind::NonManifoldVertex if one => "non-manifold vertex",
        FindingKind::NonManifoldVertex => "non-manifold vertices",
        FindingKind::FacetNormalDisagrees if one => "facet whose stated normal disagrees",
        FindingKind::FacetNormalDisagrees => "facets whose stated normals disagree",
        FindingKind::UnitSuspect => "doubt about the length unit",
        FindingKind::TinyShell if one => "stray fragment",
        FindingKind::TinyShell => "stray fragments",
        FindingKind::NonManifoldEdge if one => "non-manifold edge",
        FindingKind::NonManifoldEdge => "non-manifold edges",
        FindingKind::WindingConflict if one => "edge with a winding conflict",
        FindingKind::WindingConflict => "edges with a winding conflict",
        FindingKind::InsideOut if one => "shell inside out",
        FindingKind::InsideOut => "shells inside out",
        FindingKind::Degenerate if one => "degenerate facet",
        FindingKind::Degenerate => "degenerate facets",
        FindingKind::Duplicate if one => "duplicate facet",
        FindingKind::Duplicate => "duplicate facets",
        FindingKind::SelfOverlap if one => "pair of facets that overlap",
        FindingKind::SelfOverlap => "pairs of facets that overlap",
        FindingKind::NestedSolid if one => "solid nested in a solid",
        FindingKind::NestedSolid => "solids nested in a solid",
        FindingKind::NameSplit if one => "solid split over names",
        FindingKind::NameSplit => "solids split over names",
        FindingKind::WarpedPolygon if one => "polygon that is not flat",
        FindingKind::WarpedPolygon => "polygons that are not flat",
    }
}
