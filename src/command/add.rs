//! `bismar add`: the total of slices that were weighed apart.

use std::path::PathBuf;

use clap::Args;

use super::inputs::{digest, parse_unit};
use super::weigh::{about_point, substance, tolerance_ignored};
use super::{Answer, Common, whole};
use crate::error::{Error, Kind, Result, Warning};
use crate::format::Bytes;
use crate::quantity::LengthUnit;
use crate::report::add::{AddBody, csv, render};
use crate::report::table::Look;
use crate::report::{Document, InputFact, PROGRAM, to_json};
use crate::stream::Partial;

/// Arguments of `add`.
#[derive(Args, Clone, Debug)]
pub(super) struct AddArgs {
    /// Partials that `bismar weigh --whole --slice K/N` wrote: all slices of one file, in any order
    #[arg(required = true, value_name = "PARTIAL")]
    partials: Vec<PathBuf>,
    /// Length unit of the mesh [default: what the slices were weighed in, else mm, and said]
    #[arg(long, value_name = "UNIT", value_parser = parse_unit)]
    unit: Option<LengthUnit>,
    /// Density of the solid, such as "7850 kg/m3 ± 1 %"
    #[arg(long, value_name = "Q", conflicts_with = "material")]
    density: Option<String>,
    /// Material by name, from the table that `bismar materials` prints
    #[arg(long, value_name = "NAME")]
    material: Option<String>,
    /// Give the inertia tensor about this point too (bare numbers in the mesh's unit)
    #[arg(long, value_name = "X,Y,Z", allow_hyphen_values = true)]
    about: Option<String>,
}

/// A partial is a few kilobytes; what is far more is something else.
const MOST_BYTES: usize = 64 << 20;

/// Runs the command.
///
/// # Errors
/// Of the options and of partials that cannot be read; `slices` where they are not all slices of
/// one file, each once.
pub(super) fn run(args: &AddArgs, common: &Common) -> Result<Answer> {
    let substance = substance(args.density.as_deref(), args.material.as_deref())?;
    about_point(args.about.as_deref(), LengthUnit::Mm)?;
    let mut inputs = Vec::new();
    let mut sum: Option<Partial> = None;
    for path in &args.partials {
        let bytes = Bytes::open(path)?;
        if bytes.len() > MOST_BYTES {
            return Err(Error::new(
                Kind::TooLarge,
                format!("{} bytes are no partial", bytes.len()),
                "give files that `bismar weigh --whole --slice K/N FILE -o PARTIAL` wrote",
            )
            .in_file(path));
        }
        inputs.push(InputFact::new(
            path,
            Some(bytes.len() as u64),
            Some(digest(&bytes)),
        ));
        let mut next = Partial::from_document(&bytes).map_err(|e| e.in_file(path))?;
        // What is said here holds for all.
        next.unit = args.unit.or(next.unit);
        sum = Some(match &sum {
            None => next,
            Some(sum) => sum.plus(&next).map_err(|e| e.in_file(path))?,
        });
    }
    let sum = match &sum {
        Some(sum) => sum.clone(),
        None => Partial::sum([])?,
    };
    let totals = sum.totals()?;
    let mut warnings: Vec<Warning> = substance
        .as_ref()
        .and_then(tolerance_ignored)
        .into_iter()
        .collect();
    let unit = sum.unit.unwrap_or_default();
    if sum.unit.is_none() {
        warnings.push(Warning {
            kind: "unit-assumed".to_owned(),
            message: "neither the file nor the slices state a length unit; mm is assumed"
                .to_owned(),
            path: None,
            line: None,
            advice: "say --unit mm, cm, m, in or ft".to_owned(),
        });
    }
    let about = about_point(args.about.as_deref(), unit)?;
    let (whole, turned, closed) = whole::judge(
        &totals,
        unit,
        "slices",
        substance.as_ref(),
        about,
        &mut warnings,
    );
    let exit = u8::from(whole.is_none());
    let document = Document {
        schema: "bismar/add/1",
        program: PROGRAM,
        exit,
        warnings: warnings.clone(),
        inputs,
        body: AddBody {
            of: sum.identity().clone(),
            triangles: totals.triangles,
            unit: unit.symbol(),
            unit_assumed: sum.unit.is_none(),
            turned: whole.is_some().then_some(turned),
            whole,
            proved: closed.then_some("edges-cancel"),
        },
    };
    let text = if common.json {
        to_json(&document)
    } else if common.csv {
        csv(&document.body)?
    } else {
        render(&document, Look::of_standard_output())
    };
    Ok(Answer {
        exit,
        text,
        warnings,
        errors: Vec::new(),
    })
}
