//! `bismar trim`: the least ballast that brings everything inside its limits.

use std::path::{Path, PathBuf};

use clap::Args;

use super::meshes::Files;
use super::{Answer, Common, failure, spare};
use crate::assembly;
use crate::ballast::{self, Outcome, Sure};
use crate::error::{Error, Kind, Result, Warning};
use crate::format::write_whole;
use crate::report::trim::TrimBody;
use crate::report::{self, Document, PROGRAM, to_json};

/// Seed of the samples that check a certainty.
const SEED: u64 = 1;

/// Arguments of `trim`.
#[derive(Args, Clone, Debug)]
pub(super) struct TrimArgs {
    /// The assembly file, TOML or JSON, with [[limit]] and [[ballast]] entries
    #[arg(value_name = "ASSEMBLY")]
    file: PathBuf,
    /// All limits must hold together with this chance (50 up to below 100), by the tolerances
    #[arg(long, value_name = "PERCENT", value_parser = certainty)]
    sure: Option<f64>,
    /// Write the ballast as items, for `include` in the assembly file
    #[arg(long, value_name = "FILE")]
    write: Option<PathBuf>,
}

fn certainty(text: &str) -> std::result::Result<f64, String> {
    let number = text.trim().trim_end_matches('%').trim_end().parse::<f64>();
    number
        .ok()
        .filter(|p| (50.0..100.0).contains(p))
        .ok_or_else(|| "give per cent from 50 to below 100, such as 95".to_owned())
}

/// Runs the command.
///
/// # Errors
/// Of the options, and of the file that is written.
pub(super) fn run(args: &TrimArgs, common: &Common) -> Result<Answer> {
    let loaded = match assembly::load(&args.file) {
        Ok(loaded) => loaded,
        Err(errors) => return Ok(failure(errors, common)),
    };
    if let Some(out) = &args.write {
        spare(out, loaded.inputs.iter().map(|i| Path::new(&i.path)))?;
    }
    let mut files = Files::default();
    let resolved = match assembly::resolve(&loaded, &mut files) {
        Ok(resolved) => resolved,
        Err(errors) => return Ok(failure(errors, common)),
    };
    let balance = match assembly::balance(&loaded, &resolved) {
        Ok(balance) => balance,
        Err(errors) => return Ok(failure(errors, common)),
    };
    let Some(total) = &balance.total else {
        let errors = balance.error.iter().chain(&balance.more).cloned().collect();
        return Ok(failure(errors, common));
    };
    if args.sure.is_some() && balance.unbounded {
        return Err(Error::new(
            Kind::Usage,
            "--sure needs the uncertainty of the whole, and nothing bounds where its centre is",
            "close the open meshes, or leave --sure out",
        )
        .in_file(&args.file));
    }
    // There is a total, so everything was weighed.
    let Some(service) = &resolved.service else {
        return Ok(failure(Vec::new(), common));
    };
    let situations = assembly::Situations::of(&loaded, &resolved, service, args.sure.is_some());
    let mut situations = match situations {
        Ok(situations) => situations,
        Err(e) => return Ok(failure(vec![e], common)),
    };
    let sure = args.sure.map(|percent| Sure {
        probability: percent / 100.0,
        seed: SEED,
    });
    let asked = assembly::ballast_problem(
        &loaded,
        total,
        situations.limits().to_vec(),
        situations.states(),
        sure,
        &mut files,
    );
    let (problem, shapes) = match asked {
        Ok(asked) => asked,
        Err(errors) => return Ok(failure(errors, common)),
    };
    let mut broken = |x: &[f64]| situations.broken(&problem.places, x, problem.diagonal);
    let mut trimmed = ballast::trim(&problem, &mut broken).map_err(|e| e.in_file(&args.file))?;
    situations.restore(&mut trimmed.before);
    situations.restore(&mut trimmed.after);
    let mut warnings = resolved.warnings.clone();
    if let Some(path) = &args.write
        && trimmed.outcome != Outcome::Found
    {
        warnings.push(Warning {
            kind: "nothing-written".to_owned(),
            message: "no ballast was found or needed, and nothing was written".to_owned(),
            path: Some(path.to_string_lossy().into_owned()),
            line: None,
            advice: "a file of that name from an earlier run still holds that run's ballast"
                .to_owned(),
        });
    }
    if let Some(path) = &args.write
        && trimmed.outcome == Outcome::Found
    {
        let text = assembly::ballast_items(&balance.name, &trimmed.ballast, &problem.places);
        write_whole(path, |w| w.write_all(text.as_bytes()))?;
    }
    let exit = u8::from(trimmed.outcome == Outcome::Impossible);
    warnings.extend(files.warnings);
    let inputs = resolved
        .inputs
        .iter()
        .chain(&shapes)
        .map(super::balance::fact)
        .collect();
    let document = Document {
        schema: "bismar/trim/1",
        program: PROGRAM,
        exit,
        warnings: warnings.clone(),
        inputs,
        body: TrimBody {
            name: balance.name.clone(),
            trimmed,
            levels: !service.tanks().is_empty(),
        },
    };
    let text = if common.json {
        to_json(&document)
    } else if common.csv {
        report::trim::csv(&document.body)?
    } else {
        report::trim::render(
            &document,
            loaded.file.unit,
            report::table::Look::of_standard_output(),
        )
    };
    Ok(Answer {
        exit,
        text,
        warnings,
        errors: Vec::new(),
    })
}
