//! `bismar balance`: mass, balance point and inertia of the whole, and each limit's verdict.

use std::path::PathBuf;

use clap::Args;
use nalgebra::Matrix3;

use super::meshes::Files;
use super::progress::Terminal;
use super::{Answer, Common, failure, point};
use crate::assembly::service::Frame;
use crate::assembly::{self, Input, Loaded, Resolved};
use crate::error::{Error, Kind, Result, Warning};
use crate::quantity::{Dimension, Quantity};
use crate::report::balance::{AboutPoint, BalanceBody};
use crate::report::{self, Document, InputFact, PROGRAM, to_json};
use crate::uncertainty::{MOST_SAMPLES, Sampling};

/// Arguments of `balance`.
#[derive(Args, Clone, Debug)]
pub(super) struct BalanceArgs {
    /// The assembly file, TOML or JSON
    #[arg(value_name = "ASSEMBLY")]
    file: PathBuf,
    /// Give centre and inertia of the whole about a [[frame]] of the file or a point too (bare
    /// numbers in the assembly's unit)
    #[arg(long, value_name = "NAME|X,Y,Z", allow_hyphen_values = true)]
    about: Option<String>,
    /// Repeat the uncertainty by Monte Carlo with N draws, each evaluated anew
    #[arg(long, value_name = "N", value_parser = clap::value_parser!(u64).range(2..=MOST_SAMPLES))]
    samples: Option<u64>,
    /// Seed of the draws; the same seed gives the same figures on any number of threads
    #[arg(long, value_name = "SEED", default_value_t = 1, requires = "samples")]
    seed: u64,
    /// Answer for this [[case]] of the file
    #[arg(long, value_name = "NAME")]
    case: Option<String>,
    /// Set centroid, centre of mass and centre of gravity side by side, and say which may stand
    /// for which within TOLERANCE [default: 0.01 mm]; a file with [gravity] gets it unasked
    #[arg(long, value_name = "TOLERANCE", num_args = 0..=1, require_equals = true, default_missing_value = "0.01 mm")]
    centres: Option<String>,
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
        Some(text) => Some(frame(text, &loaded)?),
    };
    let terminal = Terminal::new(common);
    let mut files = Files::watched(terminal.progress());
    let case = match &args.case {
        None => None,
        Some(name) => Some(case_named(&loaded, name)?),
    };
    let tolerance = centres_tolerance(args.centres.as_deref(), &loaded)?;
    let mut resolved = match assembly::resolve(&loaded, &mut files) {
        Ok(resolved) => resolved,
        Err(errors) => return Ok(failure(errors, common)),
    };
    let served = match served(&loaded, &mut resolved, case, tolerance) {
        Ok(served) => served,
        Err(e) => return Ok(failure(vec![e], common)),
    };
    let sampling = args.samples.map(|n| Sampling { n, seed: args.seed });
    let balance = match assembly::balance_with(&loaded, &resolved, sampling, terminal.progress()) {
        Ok(balance) => balance,
        Err(errors) => return Ok(failure(errors, common)),
    };
    let about = about.and_then(|f| {
        let total = balance.total.as_ref()?;
        let i = total.moments.shifted(f.at).inertia_here();
        let i = f.axes * i * f.axes.transpose();
        let c = f.axes * (total.moments.centre()? - f.at);
        let square = |m: &Matrix3<f64>| [0, 1, 2].map(|r| [0, 1, 2].map(|c| m[(r, c)] + 0.0));
        Some(AboutPoint {
            frame: Some(f.name).filter(|n| !n.is_empty()),
            point_m: f.at.into(),
            axes: square(&f.axes),
            centre_of_mass_m: [c.x + 0.0, c.y + 0.0, c.z + 0.0],
            inertia_kg_m2: square(&i),
        })
    });
    let broken = served.cases.iter().any(assembly::service::CaseRow::broken);
    let exit = balance.exit().max(u8::from(broken));
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
        body: BalanceBody {
            balance,
            about,
            case: args.case.clone(),
            cases: served.cases,
            tanks: served.tanks,
            centres: served.centres,
        },
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

/// What only an assembly with tanks or cases has to say.
#[derive(Default)]
struct Served {
    cases: Vec<assembly::service::CaseRow>,
    tanks: Vec<assembly::service::TankRow>,
    centres: Option<assembly::service::Centres>,
}

/// Puts the assembly into the state that is asked for, and answers for every case.
fn served(
    loaded: &Loaded,
    resolved: &mut Resolved,
    case: Option<usize>,
    tolerance: Option<f64>,
) -> Result<Served> {
    let Some(service) = &resolved.service else {
        return Ok(Served::default());
    };
    let state = service.rest(case)?;
    if case.is_some() {
        (resolved.weighed, resolved.smears) = service.weighed(&state)?;
        resolved.state = Some(state.clone());
    }
    let mut cases = Vec::new();
    for n in 0..service.cases().len() {
        resolved
            .warnings
            .extend(service.pool_warnings(&service.rest(Some(n))?));
    }
    cases.extend(service.case_rows(loaded)?);
    Ok(Served {
        cases,
        tanks: service.tank_rows(&state)?,
        centres: match tolerance {
            Some(t) => service.centres(&state, t)?,
            None => None,
        },
    })
}

/// The tolerance at which centres are compared, m; none where nobody asks for it.
fn centres_tolerance(option: Option<&str>, loaded: &Loaded) -> Result<Option<f64>> {
    const USUAL: f64 = 1e-5;
    let Some(text) = option else {
        return Ok(loaded.file.service.gravity.line.map(|_| USUAL));
    };
    let read = Quantity::parse(text, Dimension::Length, Some(loaded.file.unit));
    match read {
        Ok(q) if q.value >= 0.0 && q.value.is_finite() => Ok(Some(q.value)),
        Ok(_) => Err(Error::new(
            Kind::BadNumber,
            format!("--centres: \"{text}\" is below zero"),
            "write a length, such as --centres=\"0.01 mm\"",
        )),
        Err(e) => {
            let message = format!("--centres: {}", e.message);
            Err(Error::new(e.kind, message, e.advice))
        }
    }
}

/// The case of that name.
///
/// # Errors
/// `unknown-name` with the cases that there are.
pub(super) fn case_named(loaded: &Loaded, name: &str) -> Result<usize> {
    let cases = &loaded.file.service.cases;
    cases.iter().position(|c| c.name == name).ok_or_else(|| {
        let names: Vec<&str> = cases.iter().map(|c| c.name.as_str()).collect();
        let advice = match names.is_empty() {
            true => "the file has no [[case]]".to_owned(),
            false => format!("the cases are: {}", names.join(", ")),
        };
        let message = format!("there is no case \"{name}\"");
        Error::new(Kind::UnknownName, message, advice).in_file(&loaded.file.path)
    })
}

/// A frame of the file, or one at a point with the assembly's axes.
fn frame(text: &str, loaded: &Loaded) -> Result<Frame> {
    let frames = &loaded.file.service.frames;
    if let Some(frame) = frames.iter().find(|f| f.name == text) {
        return Ok(frame.clone());
    }
    if text.split(',').count() == 3 || frames.is_empty() {
        return Ok(Frame {
            line: 0,
            name: String::new(),
            at: point(text, loaded.file.unit)?.into(),
            axes: Matrix3::identity(),
        });
    }
    let names: Vec<&str> = frames.iter().map(|f| f.name.as_str()).collect();
    Err(Error::new(
        Kind::UnknownName,
        format!("--about: there is no frame \"{text}\""),
        format!(
            "the frames are: {}; or write a point X,Y,Z",
            names.join(", ")
        ),
    )
    .in_file(&loaded.file.path))
}

pub(super) fn fact(input: &Input) -> InputFact {
    InputFact::new(
        std::path::Path::new(&input.path),
        Some(input.bytes),
        input.sha256.clone(),
    )
}
