//! `bismar balance`: mass, balance point and inertia of the whole, and each limit's verdict.

use std::path::PathBuf;

use clap::Args;

use super::meshes::Files;
use super::{Answer, Common, failure, point};
use crate::assembly::{self, Input};
use crate::error::{Error, Result};
use crate::report::balance::{AboutPoint, BalanceBody};
use crate::report::{self, Document, InputFact, PROGRAM, to_json};

/// Arguments of `balance`.
#[derive(Args, Clone, Debug)]
pub(super) struct BalanceArgs {
    /// The assembly file, TOML or JSON
    #[arg(value_name = "ASSEMBLY")]
    file: PathBuf,
    /// Give the inertia of the whole about this point too (bare numbers in the assembly's unit)
    #[arg(long, value_name = "X,Y,Z", allow_hyphen_values = true)]
    about: Option<String>,
}

/// Runs the command.
///
/// # Errors
/// Of the options; faults of the assembly stand in the answer.
pub(super) fn run(args: &BalanceArgs, common: &Common) -> Result<Answer> {
    let loaded = match assembly::load(&args.file) {
        Ok(loaded) => loaded,
        Err(errors) => return Ok(failure(errors, common)),
    };
    let about = match &args.about {
        None => None,
        Some(text) => Some(point(text, loaded.file.unit)?),
    };
    let mut files = Files::default();
    let resolved = match assembly::resolve(&loaded, &mut files) {
        Ok(resolved) => resolved,
        Err(errors) => return Ok(failure(errors, common)),
    };
    let balance = match assembly::balance(&loaded, &resolved) {
        Ok(balance) => balance,
        Err(errors) => return Ok(failure(errors, common)),
    };
    let about = about.and_then(|p| {
        let total = balance.total.as_ref()?;
        let i = total.moments.shifted(p.into()).inertia_here();
        Some(AboutPoint {
            point_m: p,
            inertia_kg_m2: [0, 1, 2].map(|r| [0, 1, 2].map(|c| i[(r, c)])),
        })
    });
    let exit = balance.exit();
    let errors: Vec<Error> = balance.error.iter().chain(&balance.more).cloned().collect();
    let mut warnings = resolved.warnings.clone();
    warnings.extend(files.warnings);
    warnings.extend(balance.warnings.iter().cloned());
    let inputs = resolved.inputs.iter().map(fact).collect();
    let document = Document {
        schema: "bismar/balance/1",
        program: PROGRAM,
        exit,
        warnings: warnings.clone(),
        inputs,
        body: BalanceBody { balance, about },
    };
    let unit = loaded.file.unit;
    let text = if common.json {
        to_json(&document)
    } else if common.csv {
        report::balance::csv(&document.body)?
    } else {
        report::balance::render(&document, unit, report::table::Look::of_standard_output())
    };
    Ok(Answer {
        exit,
        text,
        warnings,
        errors,
    })
}

pub(super) fn fact(input: &Input) -> InputFact {
    InputFact::new(
        std::path::Path::new(&input.path),
        Some(input.bytes),
        input.sha256.clone(),
    )
}
