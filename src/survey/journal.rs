//! What has been weighed already: in a table of before, and in the journal of a run that was cut
//! short.

use std::collections::HashMap;
use std::fs::{File, OpenOptions};
use std::io::{Read, Write};
use std::path::{Path, PathBuf};
use std::sync::{Mutex, PoisonError};

use super::weigh::PROGRAM;
use super::{Options, Row};
use crate::error::{Error, Kind, Result};

/// Rows of files by path and content.
#[derive(Debug, Default)]
pub struct Known {
    files: HashMap<(String, String), Vec<Row>>,
}

impl Known {
    /// Takes in rows of a table or a journal. Only those are kept that this version made with the
    /// same options, of files whose rows are all there; masses, and which shapes are the same, are
    /// found anew.
    pub fn take(&mut self, rows: impl IntoIterator<Item = Row>, options: &Options) {
        let mut files: HashMap<(String, String), Vec<Row>> = HashMap::new();
        for row in rows {
            if let (Some(path), Some(hash)) = (&row.path, &row.sha256)
                && row.program.as_deref() == Some(PROGRAM)
                && options.made(&row)
            {
                files
                    .entry((path.clone(), hash.clone()))
                    .or_default()
                    .push(row);
            }
        }
        let whole = |rows: &Vec<Row>| {
            // A file without a body has one row all the same.
            let wanted = rows[0].bodies.unwrap_or(0).max(1);
            let all = rows.iter().all(|r| r.bodies == rows[0].bodies);
            all && rows.len() as u64 == wanted
        };
        files.retain(|_, rows| whole(rows));
        self.files.extend(files);
    }

    /// The rows of the file of that path and content.
    pub fn get(&self, path: &str, sha256: &str) -> Option<&Vec<Row>> {
        if self.files.is_empty() {
            return None;
        }
        self.files.get(&(path.to_owned(), sha256.to_owned()))
    }

    /// Whether nothing is known.
    pub fn is_empty(&self) -> bool {
        self.files.is_empty()
    }
}

/// A file beside the table that gathers rows as they come, one JSON object a line.
#[derive(Debug)]
pub struct Journal {
    path: PathBuf,
    file: Mutex<File>,
}

impl Journal {
    /// Where the journal of a table stands.
    pub fn beside(table: &Path) -> PathBuf {
        let mut name = std::ffi::OsString::from(".");
        name.push(table.file_name().unwrap_or_default());
        name.push(".journal");
        table.with_file_name(name)
    }

    /// Opens the journal of a table, and reads what a run before has left in it. A last line that
    /// was cut off is passed over.
    ///
    /// # Errors
    /// `cannot-write`; also where another run writes the same table.
    pub fn open(table: &Path) -> Result<(Self, Vec<Row>)> {
        let path = Self::beside(table);
        let fail = |e: &dyn std::fmt::Display| {
            Error::new(
                Kind::CannotWrite,
                format!("cannot keep a journal beside the table: {e}"),
                "check the folder, its permissions and the room on the disc",
            )
            .in_file(&path)
        };
        let mut file = OpenOptions::new()
            .read(true)
            .append(true)
            .create(true)
            .open(&path)
            .map_err(|e| fail(&e))?;
        match file.try_lock() {
            Ok(()) => {}
            Err(std::fs::TryLockError::WouldBlock) => {
                return Err(fail(&"another run is writing this table"));
            }
            // Where files cannot be locked nobody is kept out.
            Err(std::fs::TryLockError::Error(_)) => {}
        }
        let mut text = Vec::new();
        file.read_to_end(&mut text).map_err(|e| fail(&e))?;
        if text.last().is_some_and(|&b| b != b'\n') {
            file.write_all(b"\n").map_err(|e| fail(&e))?;
        }
        let rows = text.split(|&b| b == b'\n');
        let rows = rows.filter_map(|line| serde_json::from_slice(line).ok());
        let rows = rows.collect();
        let journal = Self {
            path,
            file: Mutex::new(file),
        };
        Ok((journal, rows))
    }

    /// Writes down the rows of one file.
    ///
    /// # Errors
    /// `cannot-write`.
    pub fn add(&self, rows: &[Row]) -> Result<()> {
        let mut text = Vec::new();
        for row in rows {
            // Into memory: nothing there can fail.
            let _ = serde_json::to_writer(&mut text, row);
            text.push(b'\n');
        }
        let mut file = self.file.lock().unwrap_or_else(PoisonError::into_inner);
        file.write_all(&text).map_err(|e| {
            Error::new(
                Kind::CannotWrite,
                format!("cannot write: {e}"),
                "check the room on the disc",
            )
            .in_file(&self.path)
        })
    }

    /// Takes the journal away, once the table is written.
    pub fn done(self) {
        // One that stays is read and found to hold nothing new.
        let _ = std::fs::remove_file(&self.path);
    }
}
