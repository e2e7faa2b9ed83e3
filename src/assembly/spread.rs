//! How the mass of a part is spread over its bodies: through their volume evenly or graded, or as
//! sheet over their surface; and what coats them.
//!
//! Sheet and coating are surface moments times thickness: the first order in thickness over radius
//! of curvature. Off the middle of a sheet, or outside a body, the true volume differs by the
//! surface's mean curvature integrated times the square of the thickness: a sphere of radius R with
//! a skin t thick by t/R of the skin, a box by its edges. A mesh that is the middle of the sheet has
//! no error of that order but at its edges and folds.

use std::sync::Arc;

use nalgebra::Vector3;

use super::file::{Coating, Graded, Part, Substance};
use super::reader::{self, Reader};
use super::resolve::moments_of;
use super::source::MeshBody;
use super::substance::{self, OwnMaterials};
use super::tree::Value;
use crate::error::Kind;
use crate::geometry::{LooseFacets, Select};
use crate::moments::{Grading, Moments, integrate_skin};
use crate::quantity::{Dimension, Quantity};

/// Volume of the material of a body, m³.
pub(super) fn volume(body: &Arc<dyn MeshBody>, part: &Part) -> f64 {
    match &part.sheet {
        Some(thickness) => body.figures().area * thickness.value,
        None => moments_of(body, part).zeroth,
    }
}

/// Mass moments of a body in the mesh file's axes, with `density` where none is graded.
pub(super) fn mass(body: &Arc<dyn MeshBody>, part: &Part, density: f64) -> Moments {
    if let Some(thickness) = &part.sheet {
        return skin(body).weighted(thickness.value * density);
    }
    match &part.graded {
        Some(g) => g
            .grading
            .integrate(&body.facets(), body.figures().moments.about),
        None => moments_of(body, part).weighted(density),
    }
}

/// Mass moments of what coats a body, in the mesh file's axes.
pub(super) fn coat(body: &Arc<dyn MeshBody>, coating: &Coating) -> Moments {
    skin(body).weighted(coating.thickness.value * coating.material.density.value)
}

fn skin(body: &Arc<dyn MeshBody>) -> Moments {
    let facets = body.facets();
    let [lo, hi] = body.figures().bounds.map(Vector3::from);
    let middle = (lo + hi) / 2.0;
    integrate_skin(&LooseFacets(&facets), Select::All, middle.into())
}

/// What a graded part is called by, with its mean density.
pub(super) fn substance(body: &Arc<dyn MeshBody>, part: &Part, graded: &Graded) -> Substance {
    let mean = mass(body, part, 1.0).zeroth / moments_of(body, part).zeroth;
    Substance {
        name: graded
            .material
            .clone()
            .unwrap_or_else(|| "graded".to_owned()),
        density: Quantity::exact(mean),
        source: None,
    }
}

/// Why a graded body has no sensible mass, if so: somewhere its density is not above zero.
pub(super) fn hollow(body: &Arc<dyn MeshBody>, part: &Part) -> Option<String> {
    let graded = part.graded.as_ref()?;
    let axis = graded.grading.axis;
    let (mut lo, mut hi) = (f64::INFINITY, f64::NEG_INFINITY);
    for p in body.facets().iter().flatten() {
        let station = axis.dot(&Vector3::from(*p));
        (lo, hi) = (lo.min(station), hi.max(station));
    }
    let least = graded.grading.least(lo, hi);
    (least <= 0.0).then(|| {
        format!(
            "its graded density falls to {least:.4} kg/m³ between the stations {lo} m and {hi} m that it reaches"
        )
    })
}

/// Why a sheet cannot be: it would hold more than the closed mesh that it lies in.
pub(super) fn too_thick(body: &Arc<dyn MeshBody>, part: &Part) -> Option<String> {
    let figures = body.figures();
    let (sheet, held) = (volume(body, part), figures.moments.zeroth);
    (figures.refused.is_none() && sheet > held).then(|| {
        format!(
            "its surface times the thickness of the sheet is {:.3} cm³, more than the {:.3} cm³ that the mesh holds",
            sheet * 1e6,
            held * 1e6
        )
    })
}

/// How far a skin's thickness is from thin: over the least side of the body's box that it does not
/// lie in. Above a hundredth the first order may be off by more than a per cent or so.
pub(super) fn thick(body: &Arc<dyn MeshBody>, thickness: f64) -> Option<f64> {
    let [lo, hi] = body.figures().bounds;
    let sides = (0..3).map(|k| hi[k] - lo[k]).filter(|s| *s > 0.0);
    let ratio = thickness / sides.fold(f64::INFINITY, f64::min);
    (ratio > 0.01).then_some(ratio)
}

/// Reads `sheet`, `coating` and `graded` of a part.
pub(super) fn read(
    r: &Reader<'_, '_>,
    own: &OwnMaterials,
) -> (Option<Quantity>, Option<Coating>, Option<Graded>) {
    let positive = |r: &Reader<'_, '_>, key: &'static str| {
        let (q, line) = r.quantity(key, Dimension::Length)?;
        if q.value > 0.0 {
            return Some(q);
        }
        let message = format!("`{key}` is not above zero");
        r.shared.fault(
            line,
            Kind::BadNumber,
            message,
            "write a thickness above zero",
        );
        None
    };
    let sheet = positive(r, "sheet");
    let coating = r.table("coating", "coating").and_then(|c| {
        let thickness = positive(&c, "thickness");
        let material = substance::chosen(&c, own);
        for key in ["thickness", "material"] {
            if c.entry(key).is_none() {
                let advice =
                    "write coating = { thickness = \"0.1 mm\", material = \"a material\" }";
                c.missing(key, Kind::Usage, advice);
            }
        }
        c.finish();
        Some(Coating {
            thickness: thickness?,
            material: material?,
        })
    });
    let graded = r.table("graded", "graded").and_then(|g| graded(g, r));
    let clash = |a: &'static str, b: &'static str, why: &str| {
        if let (Some(entry), Some(_)) = (r.entry(a), r.entry(b)) {
            let message = format!("`{a}` and `{b}` cannot stand together: {why}");
            r.shared
                .fault(entry.line, Kind::Usage, message, "take one of them out");
        }
    };
    clash("graded", "sheet", "sheet has one density");
    clash("sheet", "accept-open", "a sheet needs no closed mesh");
    clash("graded", "accept-open", "the density of a cap is not known");
    (sheet, coating, graded)
}

fn graded(g: Reader<'_, '_>, part: &Reader<'_, '_>) -> Option<Graded> {
    let along = g.direction("along");
    let advice =
        "write graded = { along = \"z\", at = [0, 100], density = [\"600 kg/m3\", \"700 kg/m3\"] }";
    let list = |key: &'static str, of: Dimension| {
        let Some(entry) = g.entry(key) else {
            g.missing(key, Kind::Usage, advice);
            return None;
        };
        let Value::List(list) = &entry.node.value else {
            let message = format!("`{key}` of graded must be a list of two or three");
            g.shared.fault(entry.line, Kind::BadNumber, message, advice);
            return None;
        };
        let list = list.iter();
        let read: Vec<_> = list
            .map(|n| reader::quantity(g.shared, n, key, of).map(|q| q.value))
            .collect();
        read.into_iter().collect::<Option<Vec<f64>>>()
    };
    if g.entry("along").is_none() {
        g.missing("along", Kind::Usage, advice);
    }
    let (at, density) = (
        list("at", Dimension::Length),
        list("density", Dimension::Density),
    );
    let line = g.line;
    let shared = g.shared;
    g.finish();
    let (along, at, density) = (along?, at?, density?);
    if at.len() != density.len() || !(2..=3).contains(&at.len()) {
        let message = format!(
            "graded has {} stations and {} densities",
            at.len(),
            density.len()
        );
        let advice = "two of each for a straight line, three for a parabola";
        shared.fault(line, Kind::BadNumber, message, advice);
        return None;
    }
    let points: Vec<(f64, f64)> = at.into_iter().zip(density).collect();
    let grading = Grading::through(along, &points);
    if grading.is_none() {
        let message = "two stations of graded are the same".into();
        shared.fault(
            line,
            Kind::BadNumber,
            message,
            "give each density a place of its own",
        );
    }
    let material = match part.entry("material").map(|e| &e.node.value) {
        Some(Value::Text(name)) => Some(name.clone()),
        _ => None,
    };
    Some(Graded {
        grading: grading?,
        material,
    })
}
