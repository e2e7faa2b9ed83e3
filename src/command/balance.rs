//! `bismar balance`: mass, balance point and inertia of the whole, and each limit's verdict.

use std::path::PathBuf;

use clap::Args;

use super::meshes::Files;
use super::progress::Terminal;
use super::{Answer, Common, failure, point};
use crate::assembly::{self, Input};
use crate::error::{Error, Result, Warning};
use crate::report::balance::{AboutPoint, BalanceBody};
use crate::report::{self, Document, InputFact, PROGRAM, to_json};
use crate::uncertainty::{MOST_SAMPLES, Sampling};

/// Arguments of `balance`.
#[derive(Args, Clone, Debug)]
pub(super) struct BalanceArgs {
    /// The assembly file, TOML or JSON
    #[arg(value_name = "ASSEMBLY")]
    file: PathBuf,
    /// Give the inertia of the whole about this point too (bare numbers in the assembly's unit)
    #[arg(long, value_name = "X,Y,Z", allow_hyphen_values = true)]
    about: Option<String>,
    /// Repeat the uncertainty by Monte Carlo with N draws, each evaluated anew
    #[arg(long, value_name = "N", value_parser = clap::value_parser!(u64).range(2..=MOST_SAMPLES))]
    samples: Option<u64>,
    /// Seed of the draws; the same seed gives the same figures on any number of threads
    #[arg(long, value_name = "SEED", default_value_t = 1, requires = "samples")]
    seed: u64,
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
    let terminal = Terminal::new(common);
    let mut files = Files::watched(terminal.progress());
    let resolved = match assembly::resolve(&loaded, &mut files) {
        Ok(resolved) => resolved,
        Err(errors) => return Ok(failure(errors, common)),
    };
    let sampling = args.samples.map(|n| Sampling { n, seed: args.seed });
    let balance = match assembly::balance_with(&loaded, &resolved, sampling, terminal.progress()) {
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
    if balance.unbounded {
        warnings.push(Warning {
            kind: "tolerances-ignored".to_owned(),
            message: "tolerances were stated, and the uncertainty of the whole is not computed: nothing bounds where its centre is".to_owned(),
            path: None,
            line: None,
            advice: "close the open meshes, or read the figures as nominal values".to_owned(),
        });
    }
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
