//! A whole library of meshes: one row a body, in an order that depends on nothing but the files.
//!
//! [`files`] finds them, [`survey`] weighs them side by side, and [`survey_to_table`] does that for
//! a table on disc: what a run before has weighed, or begun, is not weighed again.

mod find;
mod journal;
mod parquet;
mod row;
mod schedule;
mod shape;
mod shapes;
mod substances;
mod summary;
mod table;
mod weigh;

#[cfg(test)]
mod shape_tests;
#[cfg(test)]
mod tests;

use std::collections::HashMap;
use std::path::{Path, PathBuf};
use std::sync::{Mutex, PoisonError};

pub use find::files;
pub use journal::{Journal, Known};
pub use row::{COLUMNS, Cell, Column, Holds, Row};
pub use shape::{Likeness, Shape};
pub use shapes::Grouped;
pub use substances::Substances;
pub use summary::{Heavy, KindCount, Summary};
pub use table::{TableFormat, read_table, write_table};

use crate::error::{Error, Kind, Result};
use crate::format::Bytes;
use crate::quantity::LengthUnit;
use crate::soundness::Depth;

/// How a survey is made.
#[derive(Clone, Debug)]
pub struct Options {
    /// The unit of meshes that state none; without it mm is assumed, and said in every row.
    pub unit: Option<LengthUnit>,
    /// Look for surfaces that cut each other too, which costs more than the rest.
    pub overlap: bool,
    /// Memory to keep under, bytes.
    pub memory: u64,
    /// What bodies are made of.
    pub substances: Substances,
    /// Group bodies of the same shape.
    pub same_shape: bool,
}

impl Default for Options {
    fn default() -> Self {
        Self {
            unit: None,
            overlap: false,
            memory: 4 << 30,
            substances: Substances::default(),
            same_shape: false,
        }
    }
}

impl Options {
    fn depth(&self) -> Depth {
        if self.overlap {
            Depth::Full
        } else {
            Depth::Surface
        }
    }

    /// Whether these options make the same row, but for its mass and its likes.
    fn made(&self, row: &Row) -> bool {
        // Another budget may let a file in.
        if row.error_kind.as_deref() == Some("too-large") {
            return false;
        }
        // A row without a format is of a file that could not be read: by no options.
        row.format.is_none()
            || row.overlap_tested == Some(self.overlap)
                && match self.unit {
                    None => row.unit_assumed == Some(true),
                    Some(unit) => {
                        row.unit.as_deref() == Some(unit.symbol())
                            && row.unit_assumed == Some(false)
                    }
                }
    }
}

/// How far a survey is.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Progress {
    /// Files done.
    pub files: u64,
    /// Files in all.
    pub all_files: u64,
    /// Bytes done.
    pub bytes: u64,
    /// Bytes in all.
    pub all_bytes: u64,
    /// Files done that were known, and not weighed.
    pub reused: u64,
}

/// A survey that was made.
#[derive(Clone, Debug, Default)]
pub struct Survey {
    /// One row a body, in the order of the files and of the bodies in them.
    pub rows: Vec<Row>,
    /// Files that were known already.
    pub reused: u64,
    /// Groups of one shape, where asked for.
    pub grouped: Option<Grouped>,
}

/// Weighs files side by side on the threads of the current pool. `done` is given the rows of each
/// file as it is finished, in no order, from any thread; `progress` says whether to go on.
///
/// Rows have the same bits for any number of threads. A file that cannot be read is a row with its
/// error.
///
/// # Errors
/// Those of `done`; `usage` where `progress` said to stop.
pub fn survey(
    files: &[(PathBuf, Option<Error>)],
    options: &Options,
    known: &Known,
    done: &(dyn Fn(&[Row]) -> Result<()> + Sync),
    progress: &(dyn Fn(&Progress) -> bool + Sync),
) -> Result<Survey> {
    struct State {
        rows: Vec<Vec<Row>>,
        progress: Progress,
        error: Option<Error>,
    }
    let sizes: Vec<(usize, u64)> = files
        .iter()
        .map(|(path, _)| std::fs::metadata(path).map_or(0, |m| m.len()))
        .enumerate()
        .collect();
    let state = Mutex::new(State {
        rows: vec![Vec::new(); files.len()],
        progress: Progress {
            all_files: files.len() as u64,
            all_bytes: sizes.iter().map(|s| s.1).sum(),
            ..Progress::default()
        },
        error: None,
    });
    let work = |i: usize| {
        let (path, error) = &files[i];
        let (rows, reused) = match error {
            Some(e) => (vec![weigh::failed(weigh::row_of_file(path), e)], false),
            None => of_file(path, sizes[i].1, options, known),
        };
        let written = if reused { Ok(()) } else { done(&rows) };
        let mut state = state.lock().unwrap_or_else(PoisonError::into_inner);
        state.rows[i] = rows;
        state.progress.files += 1;
        state.progress.bytes += sizes[i].1;
        state.progress.reused += u64::from(reused);
        if let Err(e) = written {
            state.error.get_or_insert(e);
        }
        progress(&state.progress) && state.error.is_none()
    };
    let all = schedule::run(&sizes, options.memory, &work)?;
    let state = state.into_inner().unwrap_or_else(PoisonError::into_inner);
    if let Some(error) = state.error {
        return Err(error);
    }
    if !all {
        return Err(Error::new(
            Kind::Usage,
            "the survey was stopped before its end",
            "run it again: what was done is not done twice",
        ));
    }
    let mut rows: Vec<Row> = state.rows.into_iter().flatten().collect();
    for row in &mut rows {
        options.substances.weigh(row);
        (row.same_shape, row.mirrored) = (None, None);
    }
    let grouped = options.same_shape.then(|| {
        let by_name = files
            .iter()
            .map(|(path, _)| (path.to_string_lossy().into_owned(), path.clone()));
        shapes::group(&mut rows, &by_name.collect::<HashMap<_, _>>(), options)
    });
    Ok(Survey {
        rows,
        reused: state.progress.reused,
        grouped,
    })
}

/// The rows of one file, and whether they were known.
fn of_file(path: &Path, size: u64, options: &Options, known: &Known) -> (Vec<Row>, bool) {
    let base = weigh::row_of_file(path);
    let needs = schedule::needs(size);
    if needs > options.memory {
        let mb = |b: u64| b.div_ceil(1_000_000);
        let e = Error::new(
            Kind::TooLarge,
            format!(
                "the file may need {} MB of memory, and the budget is {} MB",
                mb(needs),
                mb(options.memory)
            ),
            "raise --memory, or weigh it with `bismar weigh --whole`",
        );
        let base = Row {
            bytes: Some(size),
            ..base
        };
        return (vec![weigh::failed(base, &e)], false);
    }
    let bytes = match Bytes::open(path) {
        Ok(bytes) => bytes,
        Err(e) => return (vec![weigh::failed(base, &e)], false),
    };
    let hash = weigh::digest(&bytes);
    let name = base.path.as_deref().unwrap_or_default();
    if let Some(rows) = known.get(name, &hash) {
        return (rows.clone(), true);
    }
    let base = Row {
        bytes: Some(bytes.len() as u64),
        sha256: Some(hash),
        ..base
    };
    (weigh::rows(bytes, base, path, options), false)
}

/// Weighs files into a table whose ending says its format. Rows of the table that is there, and of
/// the journal of a run that was cut short, are taken over where a file has not changed. The table
/// is written whole at the end, or not at all.
///
/// # Errors
/// As [`survey`] and [`write_table`]; `unknown-format` where the file that is there is no table of
/// a survey.
pub fn survey_to_table(
    files: &[(PathBuf, Option<Error>)],
    table: &Path,
    options: &Options,
    progress: &(dyn Fn(&Progress) -> bool + Sync),
) -> Result<Survey> {
    TableFormat::of(table)?;
    let mut known = Known::default();
    if table.exists() {
        known.take(read_table(table)?, options);
    }
    let (journal, rows) = Journal::open(table)?;
    known.take(rows, options);
    let survey = survey(files, options, &known, &|rows| journal.add(rows), progress)?;
    write_table(table, &survey.rows)?;
    journal.done();
    Ok(survey)
}
