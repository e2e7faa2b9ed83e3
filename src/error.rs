//! Errors are values: what went wrong, where, and what to do about it.
//!
//! Every error that a person can meet has a kind from a closed list (programs match on it), a
//! sentence with the cause, a place (path, and line or byte where there is one) and advice.

use std::fmt;
use std::path::{Path, PathBuf};

use serde::{Serialize, Serializer};

/// The closed list of error kinds, as they are spelled in JSON.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord, Serialize)]
#[serde(rename_all = "kebab-case")]
pub enum Kind {
    /// The command line, or a combination of options, makes no sense.
    Usage,
    /// A file, folder or body that was named is not there or cannot be opened.
    NotFound,
    /// The bytes are of no format that is read here.
    UnknownFormat,
    /// The file ends before it should.
    Truncated,
    /// A count that the file declares disagrees with what it holds.
    CountMismatch,
    /// A coordinate is NaN, infinite, or too large for its moments to be finite.
    NotFinite,
    /// Text stands where a number must.
    BadNumber,
    /// A face refers to a vertex that does not exist.
    BadIndex,
    /// The file holds no triangle.
    Empty,
    /// The input is past a stated limit.
    TooLarge,
    /// A unit is missing, unknown or of the wrong dimension.
    Unit,
    /// A key of the assembly file is unknown.
    UnknownKey,
    /// A name (material, body, part, unit) matches nothing.
    UnknownName,
    /// A name could mean more than one thing.
    AmbiguousName,
    /// A part that must be weighed is not a closed solid.
    NotClosed,
    /// A stated inertia that no body can have.
    ImpossibleInertia,
    /// Files include each other in a circle, or too deep.
    Cycle,
    /// Slices that do not belong together.
    Slices,
    /// The output cannot be written.
    CannotWrite,
}

impl fmt::Display for Kind {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        // The JSON spelling is the name; serde already holds it.
        let text = serde_json::to_value(self).unwrap_or_default();
        f.write_str(text.as_str().unwrap_or("error"))
    }
}

/// One fault: kind, cause, place, advice.
#[derive(Clone, Debug, PartialEq, Eq, Serialize)]
pub struct Error {
    /// Which of the closed list.
    pub kind: Kind,
    /// What is wrong, in one sentence without a full stop.
    pub message: String,
    /// The file it is about; `-` is standard input.
    #[serde(serialize_with = "path_or_null")]
    pub path: Option<PathBuf>,
    /// Line of a text file, from 1.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub line: Option<u64>,
    /// Byte offset in a binary file, from 0.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub byte: Option<u64>,
    /// What to do about it, in one sentence.
    pub advice: String,
}

fn path_or_null<S: Serializer>(path: &Option<PathBuf>, s: S) -> Result<S::Ok, S::Error> {
    match path {
        Some(p) => s.serialize_str(&p.to_string_lossy()),
        None => s.serialize_none(),
    }
}

impl Error {
    /// An error without a place.
    pub fn new(kind: Kind, message: impl Into<String>, advice: impl Into<String>) -> Self {
        Self {
            kind,
            message: message.into(),
            path: None,
            line: None,
            byte: None,
            advice: advice.into(),
        }
    }

    /// The same error, about the file at `path` (a path already set is kept).
    #[must_use]
    pub fn in_file(mut self, path: &Path) -> Self {
        self.path.get_or_insert_with(|| path.to_path_buf());
        self
    }

    /// The same error, at `line` (from 1) of a text file.
    #[must_use]
    pub fn at_line(mut self, line: u64) -> Self {
        self.line = Some(line);
        self
    }

    /// The same error, at `byte` (from 0) of a binary file.
    #[must_use]
    pub fn at_byte(mut self, byte: u64) -> Self {
        self.byte = Some(byte);
        self
    }
}

impl fmt::Display for Error {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        if let Some(path) = &self.path {
            write!(f, "{}", crate::text::shown(&path.to_string_lossy()))?;
            if let Some(line) = self.line {
                write!(f, ":{line}")?;
            }
            if let Some(byte) = self.byte {
                write!(f, ": byte {byte}")?;
            }
            write!(f, ": ")?;
        }
        write!(f, "{}", crate::text::shown(&self.message))
    }
}

impl std::error::Error for Error {}

/// Something that was assumed, ignored or is suspicious, said beside the result.
#[derive(Clone, Debug, PartialEq, Eq, Serialize)]
pub struct Warning {
    /// A short name that programs match on, such as `unit-assumed`.
    pub kind: String,
    /// What was done or seen.
    pub message: String,
    /// The file it is about.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub path: Option<String>,
    /// Line of a text file, from 1.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub line: Option<u64>,
    /// What to do about it.
    pub advice: String,
}

/// The result of anything here that can fail with one fault.
pub type Result<T, E = Error> = std::result::Result<T, E>;
