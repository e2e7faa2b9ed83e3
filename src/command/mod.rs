//! One file a command: arguments in, a library call, a report out. No geometry here.

mod add;
mod balance;
mod beside;
mod check;
mod copy;
mod curves;
mod drain;
mod inputs;
mod made;
mod materials;
mod meshes;
mod open;
mod progress;
mod schema;
mod slice;
mod survey;
mod trim;
mod weigh;
mod whole;

use std::io::Write;
use std::path::PathBuf;

use clap::{Args, CommandFactory, Parser, Subcommand};
use rayon::prelude::*;
use serde::Serialize;

use crate::error::{Error, Kind, Result, Warning};
use crate::quantity::{Dimension, LengthUnit, Quantity};
use crate::report::table::Look;
use crate::report::{Document, Failure, InputFact, PROGRAM, to_json};
use inputs::Input;

/// Mass, balance point and inertia of mesh exports, with every mesh proved closed or refused
#[derive(Parser, Debug)]
#[command(
    name = "bismar",
    version,
    max_term_width = 100,
    disable_help_subcommand = true
)]
struct Cli {
    #[command(flatten)]
    common: Common,
    #[command(subcommand)]
    command: Command,
}

/// Options that every command takes.
#[derive(Args, Clone, Debug, Default)]
pub(crate) struct Common {
    /// Print one JSON document (SI units)
    #[arg(long, global = true)]
    json: bool,
    /// Print tables as CSV
    #[arg(long, global = true, conflicts_with = "json")]
    csv: bool,
    /// Say nothing on standard error but errors
    #[arg(short, long, global = true)]
    quiet: bool,
    /// Use N threads [default: all]
    #[arg(long, global = true, value_name = "N", value_parser = clap::value_parser!(u16).range(1..=1024))]
    threads: Option<u16>,
}

#[derive(Subcommand, Debug)]
enum Command {
    /// Say whether meshes can be weighed: what is wrong, where, and what it does to the volume
    Check(check::CheckArgs),
    /// Give volume, area, centroid, mass and inertia of each body
    Weigh(Box<weigh::WeighArgs>),
    /// Give mass, balance point and inertia of an assembly, and judge its limits
    Balance(balance::BalanceArgs),
    /// Give the least ballast that brings an assembly inside its limits
    Trim(trim::TrimArgs),
    /// Add slices that were weighed apart to the total, with the proof over all of them
    Add(add::AddArgs),
    /// Weigh a whole library of meshes into a table, one row a body
    Survey(survey::SurveyArgs),
    /// Follow mass, balance point and inertia as tanks empty and things move
    Drain(drain::DrainArgs),
    /// List densities with their spread and source
    Materials(materials::MaterialsArgs),
    /// Print the JSON Schema of the assembly file
    Schema,
    /// Print shell completions
    Completions {
        /// The shell they are for
        shell: clap_complete::Shell,
    },
    /// Print the manual page
    Manual,
}

/// What a command has to say.
pub(crate) struct Answer {
    exit: u8,
    text: String,
    warnings: Vec<Warning>,
    errors: Vec<Error>,
}

/// Runs the program on its arguments and returns its exit code.
pub fn main() -> u8 {
    let args: Vec<std::ffi::OsString> = std::env::args_os().collect();
    let cli = match Cli::try_parse_from(&args) {
        Ok(cli) => cli,
        Err(e) => return usage(&e, &args),
    };
    if let Some(n) = cli.common.threads {
        // Fails only if a pool is running already, and none is.
        let _ = rayon::ThreadPoolBuilder::new()
            .num_threads(n.into())
            .build_global();
    }
    let result = match &cli.command {
        Command::Check(args) => check::run(args, &cli.common),
        Command::Weigh(args) => weigh::run(args, &cli.common),
        Command::Balance(args) => balance::run(args, &cli.common),
        Command::Trim(args) => trim::run(args, &cli.common),
        Command::Add(args) => add::run(args, &cli.common),
        Command::Survey(args) => survey::run(args, &cli.common),
        Command::Drain(args) => drain::run(args, &cli.common),
        Command::Materials(args) => materials::run(args, &cli.common),
        Command::Schema => Ok(schema::run()),
        Command::Completions { shell } => {
            let mut text = Vec::new();
            clap_complete::generate(*shell, &mut Cli::command(), "bismar", &mut text);
            Ok(Answer::of_text(text))
        }
        Command::Manual => manual(),
    };
    let answer = result.unwrap_or_else(|e| failure(vec![e], &cli.common));
    answer.say(&cli.common)
}

fn manual() -> Result<Answer> {
    let mut text = Vec::new();
    clap_mangen::Man::new(Cli::command())
        .render(&mut text)
        .map_err(|e| {
            Error::new(
                Kind::CannotWrite,
                format!("cannot make the manual: {e}"),
                "try again",
            )
        })?;
    Ok(Answer::of_text(text))
}

/// A mistake on the command line, or a call for help.
fn usage(e: &clap::Error, args: &[std::ffi::OsString]) -> u8 {
    let wants_json = args.iter().any(|a| a == "--json");
    if e.exit_code() == 0 || !wants_json {
        // A closed pipe is no error.
        let _ = e.print();
        return if e.exit_code() == 0 { 0 } else { 2 };
    }
    let text = e.to_string();
    let message = text.split("\n\n").next().unwrap_or_default();
    let message = message.trim_start_matches("error: ").replace('\n', " ");
    let error = Error::new(Kind::Usage, message, "see bismar --help");
    failure(
        vec![error],
        &Common {
            json: true,
            ..Common::default()
        },
    )
    .say(&Common {
        json: true,
        ..Common::default()
    })
}

/// Nothing could be answered.
fn failure(mut errors: Vec<Error>, common: &Common) -> Answer {
    let more = errors.split_off(1.min(errors.len()));
    let Some(error) = errors.pop() else {
        return Answer::of_text(Vec::new());
    };
    let text = if common.json {
        to_json(&Document {
            schema: "bismar/error/1",
            program: PROGRAM,
            exit: 2,
            warnings: Vec::new(),
            inputs: Vec::new(),
            body: Failure {
                error: error.clone(),
                more: more.clone(),
            },
        })
    } else {
        String::new()
    };
    let errors = std::iter::once(error).chain(more).collect();
    Answer {
        exit: 2,
        text,
        warnings: Vec::new(),
        errors,
    }
}

impl Answer {
    fn of_text(text: Vec<u8>) -> Self {
        let text = String::from_utf8_lossy(&text).into_owned();
        Self {
            exit: 0,
            text,
            warnings: Vec::new(),
            errors: Vec::new(),
        }
    }

    /// Prints the answer: results on standard output, the rest on standard error.
    fn say(self, common: &Common) -> u8 {
        // In JSON the warnings stand in the document.
        let mut err = std::io::stderr().lock();
        if !common.json && !common.quiet {
            for w in &self.warnings {
                let at = w.path.as_ref().map_or(String::new(), |p| match w.line {
                    Some(line) => format!("{p}:{line}: "),
                    None => format!("{p}: "),
                });
                let text = format!("{at}{} ({})", w.message, w.advice);
                let _ = writeln!(err, "warning: {}", crate::text::shown(&text));
            }
        }
        if !common.json {
            for e in &self.errors {
                let _ = writeln!(err, "error: {e}\n  hint: {}", crate::text::shown(&e.advice));
            }
        }
        let mut out = std::io::stdout().lock();
        match out
            .write_all(self.text.as_bytes())
            .and_then(|()| out.flush())
        {
            // Whoever reads has seen enough.
            Err(e) if e.kind() == std::io::ErrorKind::BrokenPipe => self.exit,
            Err(e) => {
                let _ = writeln!(err, "error: cannot write the result: {e}");
                2
            }
            Ok(()) => self.exit,
        }
    }
}

/// The answer about one input.
struct One<T> {
    path: PathBuf,
    result: Result<T>,
}

/// Answers about all inputs, in order.
struct Gathered<T> {
    each: Vec<One<T>>,
    warnings: Vec<Warning>,
    facts: Vec<InputFact>,
}

/// Files of at most this many bytes are read side by side; larger ones one by one, each with all
/// threads, so that memory stays a multiple of one file's size.
const SMALL: u64 = 8 << 20;

/// Asks `answer` about every input: what it is, and the answer with its warnings and with what else
/// was read for it. Small files go side by side.
fn gather<T: Send>(
    inputs: Vec<(PathBuf, Result<Input>)>,
    answer: impl Fn(&Input) -> (Option<InputFact>, Result<(T, Vec<Warning>, Vec<InputFact>)>) + Sync,
) -> Gathered<T> {
    type Told<T> = (
        PathBuf,
        Option<InputFact>,
        Result<(T, Vec<Warning>, Vec<InputFact>)>,
    );
    let ask = |(path, input): (PathBuf, Result<Input>)| -> Told<T> {
        match input {
            Ok(input) => {
                let (fact, result) = answer(&input);
                (path, fact, result)
            }
            Err(e) => (path, None, Err(e)),
        }
    };
    let is_small = |path: &PathBuf| std::fs::metadata(path).is_ok_and(|m| m.len() <= SMALL);
    let mut told: Vec<Told<T>> = Vec::with_capacity(inputs.len());
    let mut batch = Vec::new();
    for item in inputs {
        if is_small(&item.0) {
            batch.push(item);
        } else {
            told.par_extend(std::mem::take(&mut batch).into_par_iter().map(ask));
            told.push(ask(item));
        }
    }
    told.par_extend(batch.into_par_iter().map(ask));
    let mut out = Gathered {
        each: Vec::new(),
        warnings: Vec::new(),
        facts: Vec::new(),
    };
    for (path, fact, result) in told {
        out.facts
            .push(fact.unwrap_or_else(|| InputFact::new(&path, None, None)));
        let result = result.map(|(file, warnings, beside)| {
            out.facts.extend(beside);
            out.warnings.extend(warnings);
            file
        });
        out.each.push(One { path, result });
    }
    out
}

/// The body of an error document that also says what became of each file.
#[derive(Serialize)]
struct FailureOf<B> {
    #[serde(flatten)]
    failure: Failure,
    #[serde(flatten)]
    body: B,
}

impl<T> Gathered<T> {
    /// Makes the answer: JSON, CSV or text.
    fn finish<B: Serialize>(
        self,
        schema: &'static str,
        exit: u8,
        body: B,
        common: &Common,
        text: impl Fn(&Document<B>, Look) -> String,
        csv: impl Fn(&B) -> Result<String>,
    ) -> Result<Answer> {
        let errors: Vec<Error> = self
            .each
            .iter()
            .filter_map(|o| o.result.as_ref().err().cloned())
            .collect();
        let nothing = !self.each.is_empty() && errors.len() == self.each.len();
        let warnings = self.warnings.clone();
        let document = Document {
            schema,
            program: PROGRAM,
            exit,
            warnings: self.warnings,
            inputs: self.facts,
            body,
        };
        let text = if common.json && nothing {
            let mut all = errors.clone();
            let more = all.split_off(1);
            to_json(&Document {
                schema: "bismar/error/1",
                program: PROGRAM,
                exit,
                warnings: document.warnings,
                inputs: document.inputs,
                body: FailureOf {
                    failure: Failure {
                        error: all.remove(0),
                        more,
                    },
                    body: document.body,
                },
            })
        } else if common.json {
            to_json(&document)
        } else if common.csv {
            csv(&document.body)?
        } else {
            text(&document, Look::of_standard_output())
        };
        Ok(Answer {
            exit,
            text,
            warnings,
            errors,
        })
    }
}

/// A point as the options write it: three lengths parted by commas; bare numbers in `unit`. In m.
fn point(text: &str, unit: LengthUnit) -> Result<[f64; 3]> {
    let parts: Vec<&str> = text.split(',').collect();
    let [x, y, z] = parts[..] else {
        return Err(Error::new(
            Kind::Usage,
            format!("--about: \"{text}\" is not three lengths"),
            "write three lengths parted by commas, such as 0,0,120",
        ));
    };
    let length = |part: &str| {
        Quantity::parse(part.trim(), Dimension::Length, Some(unit))
            .map(|q| q.value)
            .map_err(|e| Error::new(e.kind, format!("--about: {}", e.message), e.advice))
    };
    Ok([length(x)?, length(y)?, length(z)?])
}
/// Refuses an output that would take the place of an input.
///
/// # Errors
/// `usage`.
fn spare<'p>(
    out: &std::path::Path,
    inputs: impl Iterator<Item = &'p std::path::Path>,
) -> Result<()> {
    let here = std::fs::canonicalize(out).ok();
    let taken = here.is_some_and(|here| {
        inputs
            .filter_map(|p| std::fs::canonicalize(p).ok())
            .any(|p| p == here)
    });
    if taken {
        return Err(Error::new(
            Kind::Usage,
            format!("{} is an input, and would be replaced", out.display()),
            "name the output otherwise",
        ));
    }
    Ok(())
}
