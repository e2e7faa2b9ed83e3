//! Parts that are printed: each part's bodies once, however often it stands.

use std::collections::HashMap;
use std::sync::Arc;

use super::choose::Bodies;
use super::expand::Instance;
use super::file::{Part, Substance};
use super::made::Off;
use super::notes;
use crate::error::{Error, Kind, Warning};
use crate::geometry::LooseFacets;
use crate::masses::{PrintFigures, PrintedBody};
use crate::moments::Moments;
use crate::printed::{self, Made, Printed};
use crate::quantity::Tolerance;

/// Printed bodies by the part's entry, known by its address as in `resolve`.
#[derive(Default)]
pub(super) struct Printing {
    done: HashMap<*const Part, Option<Arc<Vec<Printed>>>>,
}

impl Printing {
    /// The bodies of a part as printed, in their order; `None` where it cannot be printed, which
    /// is then among `errors`, once.
    pub(super) fn of(
        &mut self,
        instance: &Instance<'_>,
        part: &Part,
        made: &Made,
        bodies: &Bodies,
        errors: &mut Vec<Error>,
    ) -> Option<Arc<Vec<Printed>>> {
        let one = |body: &Arc<dyn super::MeshBody>| {
            let figures = body.figures();
            if figures.refused.is_some() {
                return Err(Error::new(
                    Kind::NotClosed,
                    "only a closed mesh can be printed",
                    "close the surface in the program that made it and export again",
                ));
            }
            let facets = body.facets();
            printed::print(&LooseFacets(&facets), &figures.moments, made, None)
        };
        let print = || {
            let all: Result<Vec<Printed>, Error> = bodies.iter().map(one).collect();
            all.and_then(|all| match all.iter().all(|p| p.evenly().zeroth == 0.0) {
                false => Ok(Arc::new(all)),
                true => Err(Error::new(
                    Kind::Empty,
                    "nothing of it is printed: wall, skin and infill are all nothing",
                    "state what is printed, or take the part out",
                )),
            })
        };
        self.done
            .entry(part)
            .or_insert_with(|| match print() {
                Ok(all) => Some(all),
                Err(e) => {
                    let message = format!("part `{}`: {}", instance.path, e.message);
                    errors.push(instance.error(e.kind, message, e.advice));
                    None
                }
            })
            .clone()
    }
}

/// How the moments of a printed part's bodies change with one of its thicknesses or its infill.
#[derive(Clone, Debug)]
pub(super) struct PrintRate {
    /// Such as `wall`.
    pub(super) what: &'static str,
    /// SI unit of what is off.
    pub(super) unit: &'static str,
    /// Of the file.
    pub(super) tolerance: Tolerance,
    /// Moments of the material of each body for each unit of it.
    pub(super) per_unit: Vec<Moments>,
}

/// How the print answers to the tolerances of its plan: by printing it once more with each a
/// standard uncertainty further on, since layers and distances have no derivative in closed form.
pub(super) fn rates(
    made: &Made,
    bodies: &Bodies,
    printed: &[Printed],
    off: &[Off],
) -> Vec<PrintRate> {
    off.iter()
        .filter_map(|off| {
            let step = off.quantity.standard();
            let varied = (off.varied)(made, step);
            let per_unit: Option<Vec<Moments>> = bodies
                .iter()
                .zip(printed)
                .map(|(body, now)| {
                    let facets = body.facets();
                    let solid = &body.figures().moments;
                    let then = printed::print(&LooseFacets(&facets), solid, &varied, None).ok()?;
                    let moved = then.moments.plus(&now.moments.weighted(-1.0));
                    Some(moved.weighted(1.0 / step))
                })
                .collect();
            Some(PrintRate {
                what: off.what,
                unit: off.unit,
                tolerance: off.quantity.tolerance.filter(|_| step > 0.0)?,
                per_unit: per_unit?,
            })
        })
        .collect()
}

/// Moments of mass of a body, or of its volume where no density is known.
pub(super) fn mass_of(printed: &Printed, material: Option<&Substance>) -> Moments {
    match material {
        Some(m) => printed.mass(m.density.value),
        None => printed.evenly(),
    }
}

/// The figures of a printed part.
pub(super) fn figures(
    all: &[Printed],
    bodies: &Bodies,
    materials: &[Option<Substance>],
    measured: Option<f64>,
) -> Option<PrintFigures> {
    let each: Vec<PrintedBody<'_>> = all
        .iter()
        .zip(bodies)
        .zip(materials)
        .map(|((printed, body), material)| PrintedBody {
            printed,
            solid: &body.figures().moments,
            density: material.as_ref().map(|m| m.density.value),
        })
        .collect();
    PrintFigures::of(&each, measured)
}

/// What should be said of a printed part beside its figures.
pub(super) fn remarks(instance: &Instance<'_>, f: &PrintFigures) -> Vec<Warning> {
    let mut out = Vec::new();
    if let Some(t) = &f.trapped {
        let (hollows, fill) = (
            t.hollows,
            t.density_kg_m3.map(|d| format!(" of {d:.0} kg/m³")),
        );
        out.push(notes::warning(
            instance,
            "trapped",
            format!(
                "part `{}`: {hollows} closed hollow{} of {:.3} cm³ keep{} the powder or resin{} \
                 it was built in, and its mass {}",
                instance.path,
                if hollows == 1 { "" } else { "s" },
                t.volume_m3 * 1e6,
                if hollows == 1 { "s" } else { "" },
                fill.filter(|_| !t.density_assumed).unwrap_or_default(),
                if t.density_assumed {
                    "leaves that out"
                } else {
                    "holds that"
                },
            ),
            "state the holes in `drain`, the density of what stays in `fill`, or `infill` where \
             the inside is printed in air",
        ));
    }
    if let Some(infill) = f.implied_infill.filter(|i| !(0.0..=1.0).contains(i)) {
        out.push(notes::warning(
            instance,
            "implied-infill",
            format!(
                "part `{}` as measured would need an infill of {:.0} %",
                instance.path,
                100.0 * infill
            ),
            "check the scale, the material, walls and skins, and whether supports were removed",
        ));
    }
    out
}
