//! What is said of a copy that was written, mended or as it was.

use serde::Serialize;

use super::digits::significant;
use super::table::{Look, Mark};
use crate::quantity::LengthUnit;
use crate::soundness::mend::{Action, Step};

/// A copy of a mesh.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Copied {
    /// Where to; lossy where it is not UTF-8.
    pub path: String,
    /// `stl` (binary), `obj` or `3mf`.
    pub format: &'static str,
    /// Whether it was written; if not, nothing was.
    pub written: bool,
    /// Its triangles; null where it was not written.
    pub triangles: Option<u64>,
    /// The farthest that a coordinate moved when it was rounded to what the format holds, m.
    pub largest_move_m: f64,
    /// Facets left out because two of their corners were in one place, by that rounding, or where
    /// the format does not allow it (3MF).
    pub facets_collapsed: u64,
    /// What was done, in order; empty for a plain copy.
    pub steps: Vec<StepDone>,
    /// Why it was not written.
    pub refused: Vec<String>,
}

/// One step of mending.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct StepDone {
    /// What.
    pub action: Action,
    /// The body, where it was one.
    pub body: Option<String>,
    /// How many vertices, facets, holes or shells.
    pub count: u64,
    /// What the file's signed volume, summed about its first vertex, changed by, m³.
    pub volume_change_m3: f64,
    /// What the true volume can differ by if the missing surface is no larger than twice its flat
    /// cap, m³; null of other steps.
    pub volume_bound_m3: Option<f64>,
}

impl StepDone {
    /// A step in the file's unit of `metres`.
    pub fn of(step: &Step, metres: f64) -> Self {
        Self {
            action: step.action,
            body: step.body.clone(),
            count: step.count,
            volume_change_m3: step.volume_change * metres.powi(3),
            volume_bound_m3: step.volume_bound.map(|b| b * metres.powi(3)),
        }
    }
}

/// As text.
pub(super) fn render(copy: &Copied, verb: &str, unit: LengthUnit, look: Look) -> String {
    let path = crate::text::shown(&copy.path).into_owned();
    if !copy.written {
        let mut out = look.marked(
            &format!("NOT {verb}: nothing was written to {path}"),
            Mark::Fail,
        );
        out.push('\n');
        for why in &copy.refused {
            out.push_str(&format!("   {}\n", crate::text::shown(why)));
        }
        return out;
    }
    let mut out = look.marked(&format!("{verb}: {path}"), Mark::Heading);
    let kind = match copy.format {
        "stl" => "binary STL",
        "3mf" => "3MF",
        _ => "OBJ",
    };
    out.push_str(&format!(
        " · {kind} · {} triangles\n",
        copy.triangles.unwrap_or_default()
    ));
    for s in &copy.steps {
        let what = match (s.action, s.count == 1) {
            (Action::VerticesJoined, true) => "vertex on open edges joined to a neighbour",
            (Action::VerticesJoined, _) => "vertices on open edges joined to a neighbour",
            (Action::PolygonsCut, true) => "polygon that is not flat cut into triangles",
            (Action::PolygonsCut, _) => "polygons that are not flat cut into triangles",
            (Action::DuplicatesDropped, true) => "duplicate facet dropped",
            (Action::DuplicatesDropped, _) => "duplicate facets dropped",
            (Action::DegenerateDropped, true) => "facet with two corners in one place dropped",
            (Action::DegenerateDropped, _) => "facets with two corners in one place dropped",
            (Action::HolesCapped, true) => "flat hole capped",
            (Action::HolesCapped, _) => "flat holes capped",
            (Action::ShellsTurned, true) => "shell turned",
            (Action::ShellsTurned, _) => "shells turned",
        };
        let on = s
            .body
            .as_ref()
            .map_or(String::new(), |b| format!(" on {}", crate::text::shown(b)));
        let bound = s.volume_bound_m3.map_or(String::new(), |b| {
            format!(
                " (the true volume ± {} cm3 {})",
                super::digits::at_most(b * 1e6),
                super::estimate::IF
            )
        });
        out.push_str(&format!(
            "   {} {what}{on}: the summed volume changed by {} cm3{bound}\n",
            s.count,
            significant(s.volume_change_m3 * 1e6, 6)
        ));
    }
    if copy.largest_move_m > 0.0 {
        out.push_str(&format!(
            "   coordinates rounded to f32: none moved farther than {} {}",
            super::digits::at_most(super::digits::length_in(copy.largest_move_m, unit)),
            unit.symbol()
        ));
        if copy.facets_collapsed > 0 {
            out.push_str(&format!(
                "; {} facets fell together and were left out",
                copy.facets_collapsed
            ));
        }
        out.push('\n');
    } else if copy.facets_collapsed > 0 {
        out.push_str(&format!(
            "   {} facets with two corners in one place were left out, which {kind} does not allow\n",
            copy.facets_collapsed
        ));
    }
    out
}
