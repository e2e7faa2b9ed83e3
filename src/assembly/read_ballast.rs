//! Places that ballast may go to.
//!
//! ```toml
//! [[ballast]]
//! name = "nose"
//! at = [480, 0, 90]                  # a point, or the origin of a mesh
//! least = "1 kg"                     # nothing, or at least this much
//! most = "12 kg"
//! unit = "0.25 kg ± 2 g"             # whole unit weights only (or `step`, the same)
//! tolerance = "1 %"                  # of what is put there; without `unit`
//! mesh = "plate.stl"                 # ballast of this shape; its full mass is the most
//! material = "steel S235"
//! ```

use super::file::{BallastPlace, Each, Part, Position};
use super::read::Context;
use super::reader::Reader;
use super::substance;
use crate::error::Kind;
use crate::quantity::{Dimension, Quantity, Tolerance};

/// Reads every `[[ballast]]`.
pub(super) fn read(root: &Reader<'_, '_>, context: &mut Context<'_, '_>) -> Vec<BallastPlace> {
    let mut out: Vec<BallastPlace> = Vec::new();
    for r in root.tables("ballast") {
        let line = r.line;
        let Some(place) = place(r, context) else {
            continue;
        };
        if let Some(first) = out.iter().find(|p| p.name == place.name) {
            let message = format!(
                "the place `{}` of line {} has the same name",
                place.name, first.line
            );
            context.shared.fault(
                line,
                Kind::AmbiguousName,
                message,
                "give each place a name of its own",
            );
        }
        out.push(place);
    }
    out
}

fn place(r: Reader<'_, '_>, context: &mut Context<'_, '_>) -> Option<BallastPlace> {
    let shared = r.shared;
    let name = r.text("name");
    if r.entry("name").is_none() {
        r.missing(
            "name",
            Kind::Usage,
            "name the place, so that results can speak of it",
        );
    }
    let at = r.lengths("at");
    let mesh = r
        .text("mesh")
        .and_then(|(typed, line)| context.loader.mesh(shared, &typed, line));
    let material = substance::chosen(&r, context.own);
    if r.entry("at").is_none() && r.entry("mesh").is_none() {
        r.missing(
            "at",
            Kind::Usage,
            "state where it is: at = [x, y, z], or mesh and material",
        );
    }
    if r.entry("mesh").is_some() != r.entry("material").is_some() {
        let message = "a place has a mesh and its material, or neither".to_string();
        shared.fault(
            r.line,
            Kind::Usage,
            message,
            "state both, or a point with `at`",
        );
    }
    let mass = |key: &'static str| {
        let (q, line) = r.quantity(key, Dimension::Mass)?;
        if q.value <= 0.0 {
            let message = format!("`{key}` must be above zero");
            shared.fault(
                line,
                Kind::BadNumber,
                message,
                "leave it out where there is none",
            );
            return None;
        }
        Some((q, line))
    };
    let (least, most) = (mass("least"), mass("most"));
    let (step, unit) = (mass("step"), mass("unit"));
    if step.is_some() && unit.is_some() {
        let message = "`step` and `unit` both say what a piece weighs".to_string();
        shared.fault(r.line, Kind::Usage, message, "keep one of them");
    }
    let tolerance = r.quantity("tolerance", Dimension::Fraction);
    if let (Some((l, line)), Some((m, _))) = (least, most)
        && l.value > m.value
    {
        let message = "`least` is above `most`".to_string();
        shared.fault(line, Kind::BadNumber, message, "exchange them");
    }
    let line = r.line;
    r.finish();
    let (name, _) = name?;
    let at = at.map_or([Quantity::exact(0.0); 3], |(at, _)| at);
    let part = match (mesh, material) {
        (Some(mesh), Some(material)) => Some(Box::new(Part {
            line,
            name: name.clone(),
            mesh,
            unit: shared.unit,
            material: Some(material),
            position: Position {
                mirror: None,
                turn: None,
                at: vec![at],
            },
            measured: None,
            accept_open: None,
            join: None,
            made: None,
            made_off: Vec::new(),
            facets: None,
            sheet: None,
            coating: None,
            graded: None,
            expect: None,
            each: Each::Shared,
            maturity: None,
        })),
        _ => None,
    };
    let step = step.or(unit).map(|(q, _)| q);
    let relative = step.filter(|s| s.tolerance.is_some()).map_or_else(
        // A half-width in which every value is as likely.
        || tolerance.map_or(0.0, |(t, _)| half_width(t.value)),
        |s| s.standard() / s.value,
    );
    Some(BallastPlace {
        line,
        name,
        at: at.map(|q| q.value),
        part,
        least: least.map_or(0.0, |(q, _)| q.value),
        most: most.map(|(q, _)| q.value),
        step: step.map(|q| q.value),
        relative,
    })
}

/// The standard uncertainty of a rectangular half-width.
fn half_width(amount: f64) -> f64 {
    let coverage = crate::quantity::Coverage::HalfWidth;
    Tolerance {
        amount,
        relative: false,
        coverage,
    }
    .standard()
}
