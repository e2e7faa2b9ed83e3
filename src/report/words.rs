//! Phrases that several sheets share.

use super::digits::{length_in, significant};
use super::table::{Look, Mark};
use crate::quantity::LengthUnit;
use crate::soundness::FindingKind;
use crate::text::shown;

/// The unit of a symbol; mm where there is none.
pub fn unit_of(symbol: Option<&str>) -> LengthUnit {
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
pub fn file_heading(
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
pub fn box_size(bounds_m: &[[f64; 3]; 2], unit: LengthUnit) -> String {
    [0, 1, 2]
        .map(|k| significant(length_in(bounds_m[1][k] - bounds_m[0][k], unit), 6))
        .join(" × ")
}

/// A point, such as `(1.5, 0, −3) mm`.
pub fn point(at_m: &[f64; 3], unit: LengthUnit) -> String {
    let p = at_m.map(|x| significant(length_in(x, unit), 6));
    format!("({}, {}, {}) {}", p[0], p[1], p[2], unit.symbol())
}

/// What a finding counts, in words.
pub fn kind_word(kind: FindingKind, count: u64) -> &'static str {
    let one = count == 1;
    match kind {
        FindingKind::Hole if one => "hole",
        FindingKind::Hole => "holes",
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
