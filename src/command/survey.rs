//! `bismar survey`: a whole library of meshes, one row a body.

use std::io::{IsTerminal, Write};
use std::path::PathBuf;
use std::sync::Mutex;
use std::time::{Duration, Instant};

use clap::Args;

use super::inputs::parse_unit;
use super::weigh::substance;
use super::{Answer, Common};
use crate::error::{Error, Kind, Result, Warning};
use crate::quantity::LengthUnit;
use crate::report::survey::{SurveyBody, csv, render};
use crate::report::table::Look;
use crate::report::{Document, PROGRAM, to_json};
use crate::survey::{
    Options, Progress, Row, Substances, Summary, TableFormat, files, survey_to_table,
};

/// Arguments of `survey`.
#[derive(Args, Clone, Debug)]
pub(super) struct SurveyArgs {
    /// Folders with all below them, globs, mesh files, or - for a list of paths on standard input
    #[arg(required = true, value_name = "WHERE")]
    wheres: Vec<PathBuf>,
    /// The table: .parquet, .csv or .ndjson; files that have not changed since one that is there
    /// are not weighed again
    #[arg(short, long, value_name = "TABLE")]
    output: PathBuf,
    /// Length unit of meshes that state none: mm, cm, m, in, ft [default: mm, and said]
    #[arg(long, value_name = "UNIT", value_parser = parse_unit)]
    unit: Option<LengthUnit>,
    /// Keep memory under SIZE, such as "2 GB" [default: half of what is free]
    #[arg(long, value_name = "SIZE", value_parser = parse_size)]
    memory: Option<u64>,
    /// Density of what no --assign matches, such as "7850 kg/m3 ± 1 %"
    #[arg(long, value_name = "Q", conflicts_with = "material")]
    density: Option<String>,
    /// Material of what no --assign matches, by name
    #[arg(long, value_name = "NAME")]
    material: Option<String>,
    /// Material by a glob of bodies or files, such as 'frame*=steel S235'; the first that matches
    #[arg(long, value_name = "GLOB=MATERIAL")]
    assign: Vec<String>,
    /// Test for surfaces that cut each other too, which costs more than the rest
    #[arg(long)]
    overlap: bool,
    /// Group bodies that are the same shape up to a rigid motion, or its mirror image
    #[arg(long)]
    same_shape: bool,
}

/// Bytes, from a number with or without a unit.
fn parse_size(text: &str) -> Result<u64, String> {
    let text = text.trim();
    let at = text
        .find(|c: char| c.is_ascii_alphabetic())
        .unwrap_or(text.len());
    let factor = match text[at..].to_ascii_lowercase().as_str() {
        "" | "b" => 1.0,
        "k" | "kb" => 1e3,
        "m" | "mb" => 1e6,
        "g" | "gb" => 1e9,
        "t" | "tb" => 1e12,
        "kib" => 1024.0,
        "mib" => 1_048_576.0,
        "gib" => 1_073_741_824.0,
        _ => return Err("the units are kB, MB, GB, TB, KiB, MiB, GiB".into()),
    };
    let number: f64 = text[..at]
        .trim()
        .parse()
        .map_err(|_| "write a size such as 2 GB")?;
    let bytes = number * factor;
    if !(1e6..1e18).contains(&bytes) {
        return Err("a budget is at least 1 MB".into());
    }
    Ok(bytes as u64)
}

/// Half of the memory that is free, or 4 GiB where that is not known.
fn default_memory() -> u64 {
    let known = std::fs::read_to_string("/proc/meminfo")
        .ok()
        .and_then(|text| {
            let line = text.lines().find(|l| l.starts_with("MemAvailable:"))?;
            let kib: u64 = line.split_whitespace().nth(1)?.parse().ok()?;
            Some(kib * 1024 / 2)
        });
    known.unwrap_or(4 << 30).max(64 << 20)
}

/// The places that the arguments name; `-` is replaced by the lines of standard input.
fn wheres(args: &SurveyArgs) -> Result<Vec<PathBuf>> {
    let mut out = Vec::new();
    for place in &args.wheres {
        if place.as_os_str() != "-" {
            out.push(place.clone());
            continue;
        }
        for line in std::io::stdin().lines() {
            let line = line.map_err(|e| {
                Error::new(
                    Kind::NotFound,
                    format!("cannot read the list of paths: {e}"),
                    "pipe paths into it, one a line",
                )
            })?;
            if !line.is_empty() {
                out.push(PathBuf::from(line));
            }
        }
    }
    Ok(out)
}

/// Runs the command.
///
/// # Errors
/// Of the options; `empty` where there is no mesh file; those of the table.
pub(super) fn run(args: &SurveyArgs, common: &Common) -> Result<Answer> {
    let format = TableFormat::of(&args.output)?;
    let rest = substance(args.density.as_deref(), args.material.as_deref())?;
    let mut substances = Substances::of_rest(rest);
    for rule in &args.assign {
        substances.assign(rule)?;
    }
    let options = Options {
        unit: args.unit,
        overlap: args.overlap,
        memory: args.memory.unwrap_or_else(default_memory),
        substances,
        same_shape: args.same_shape,
    };
    let found = files(&wheres(args)?)?;
    if found.is_empty() {
        return Err(Error::new(
            Kind::Empty,
            "there is no mesh file",
            "name folders that hold .stl or .obj files",
        ));
    }
    let meter = Meter::new(!common.quiet && std::io::stderr().is_terminal());
    let made = survey_to_table(&found, &args.output, &options, &|p| meter.show(p));
    meter.clear();
    let made = made?;
    let summary = Summary::of(&made.rows);
    let mut warnings = warnings(&made.rows, &summary);
    if let Some(n) = made.grouped.map(|g| g.undecided).filter(|n| *n > 0) {
        warnings.push(warning(
            "undecided",
            format!("{n} pairs of bodies could not be compared: too many of their vertices stand alike, or a file has changed"),
            "compare them by volume and moments",
        ));
    }
    let document = Document {
        schema: "bismar/survey/1",
        program: PROGRAM,
        exit: 0,
        warnings: warnings.clone(),
        inputs: Vec::new(),
        body: SurveyBody {
            table: args.output.to_string_lossy().into_owned(),
            format: format.name(),
            rows: made.rows.len() as u64,
            reused_files: made.reused,
            overlap_tested: options.overlap,
            summary,
            same_shape: made.grouped.map(Into::into),
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
        exit: 0,
        text,
        warnings,
        errors: Vec::new(),
    })
}

fn warning(kind: &str, message: String, advice: &str) -> Warning {
    Warning {
        kind: kind.to_owned(),
        message,
        path: None,
        line: None,
        advice: advice.to_owned(),
    }
}

fn warnings(rows: &[Row], summary: &Summary) -> Vec<Warning> {
    let mut out = Vec::new();
    if rows.iter().any(|r| r.unit_assumed == Some(true)) {
        out.push(warning(
            "unit-assumed",
            "some files state no length unit; mm is assumed (column unit_assumed)".to_owned(),
            "say --unit mm, cm, m, in or ft",
        ));
    }
    if summary.unreadable > 0 {
        out.push(warning(
            "unreadable",
            format!(
                "{} of {} files could not be read",
                summary.unreadable, summary.files
            ),
            "their rows say why, in the columns error and error_advice",
        ));
    }
    out
}

/// Says how far a survey is, on a terminal, ten times a second at most.
struct Meter {
    on: bool,
    state: Mutex<(Instant, Instant)>,
}

impl Meter {
    fn new(on: bool) -> Self {
        let now = Instant::now();
        Self {
            on,
            state: Mutex::new((now, now)),
        }
    }

    fn show(&self, p: &Progress) -> bool {
        // Another thread is at it: it will say as much.
        let Some(mut state) = self.state.try_lock().ok().filter(|_| self.on) else {
            return true;
        };
        let (begin, last) = *state;
        if last.elapsed() < Duration::from_millis(100) {
            return true;
        }
        state.1 = Instant::now();
        let mb = |bytes: u64| bytes / 1_000_000;
        // What was known takes no time; bytes say best how much is left.
        let done = p.bytes.max(1) as f64 / p.all_bytes.max(1) as f64;
        let left = begin.elapsed().as_secs_f64() * (1.0 - done).max(0.0) / done;
        let _ = write!(
            std::io::stderr(),
            "\r\x1b[K{} of {} files, {} of {} MB, about {left:.0} s left",
            p.files,
            p.all_files,
            mb(p.bytes),
            mb(p.all_bytes)
        );
        true
    }

    fn clear(&self) {
        if self.on {
            let _ = write!(std::io::stderr(), "\r\x1b[K");
        }
    }
}

#[cfg(test)]
mod tests {
    use super::parse_size;

    #[test]
    fn sizes_are_read_with_their_units() {
        assert_eq!(parse_size("2 GB").unwrap(), 2_000_000_000);
        assert_eq!(parse_size("1.5GiB").unwrap(), 1_610_612_736);
        assert_eq!(parse_size("500 mb").unwrap(), 500_000_000);
        for bad in ["", "GB", "12 parsecs", "-1 GB", "10", "nan MB", "1e40"] {
            assert!(parse_size(bad).is_err(), "{bad}");
        }
    }
}
