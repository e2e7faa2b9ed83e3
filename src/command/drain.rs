//! `bismar drain`: how mass, balance point and inertia travel as tanks empty and things move.

use std::path::PathBuf;

use clap::Args;

use super::balance::{case_named, fact};
use super::meshes::Files;
use super::{Answer, Common, failure};
use crate::assembly;
use crate::error::Result;
use crate::report::drain::DrainBody;
use crate::report::{self, Document, PROGRAM, to_json};

/// Arguments of `drain`.
#[derive(Args, Clone, Debug)]
pub(super) struct DrainArgs {
    /// The assembly file, TOML or JSON
    #[arg(value_name = "ASSEMBLY")]
    file: PathBuf,
    /// Begin in this [[case]] of the file
    #[arg(long, value_name = "NAME")]
    case: Option<String>,
    /// Steps shown of each phase; the worst is looked for between them too
    #[arg(long, value_name = "N", default_value_t = 10,
          value_parser = clap::value_parser!(u32).range(1..=assembly::service::MOST_STEPS as i64))]
    steps: u32,
    /// Draw the travel of the balance point with the limits around it
    #[arg(long, value_name = "FILE.svg|png")]
    picture: Option<PathBuf>,
}

/// Runs the command.
///
/// # Errors
/// Of the options and of the picture; faults of the assembly stand in the answer.
pub(super) fn run(args: &DrainArgs, common: &Common) -> Result<Answer> {
    let loaded = match assembly::load(&args.file) {
        Ok(loaded) => loaded,
        Err(errors) => return Ok(failure(errors, common)),
    };
    let case = match &args.case {
        None => None,
        Some(name) => Some(case_named(&loaded, name)?),
    };
    let mut files = Files::default();
    let resolved = match assembly::resolve(&loaded, &mut files) {
        Ok(resolved) => resolved,
        Err(errors) => return Ok(failure(errors, common)),
    };
    let Some(service) = &resolved.service else {
        return Ok(failure(resolved.refused, common));
    };
    let (drain, pools) = match service.drain(&loaded, case, args.steps as usize) {
        Ok(answer) => answer,
        Err(e) => return Ok(failure(vec![e], common)),
    };
    let exit = drain.exit();
    let mut warnings = resolved.warnings.clone();
    for warning in pools {
        if !warnings.contains(&warning) {
            warnings.push(warning);
        }
    }
    warnings.extend(files.warnings);
    if let Some(path) = &args.picture {
        report::travel::draw(path, &drain, loaded.file.unit)?;
    }
    let document = Document {
        schema: "bismar/drain/1",
        program: PROGRAM,
        exit,
        warnings: warnings.clone(),
        inputs: resolved.inputs.iter().map(fact).collect(),
        body: DrainBody { drain },
    };
    let text = if common.json {
        to_json(&document)
    } else if common.csv {
        report::drain::csv(&document.body)?
    } else {
        let look = report::table::Look::of_standard_output();
        report::drain::render(&document, loaded.file.unit, look)
    };
    Ok(Answer {
        exit,
        text,
        warnings,
        errors: Vec::new(),
    })
}
