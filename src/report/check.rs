//! The `check` document.

use serde::Serialize;

use super::copy::Copied;
use crate::error::Error;
use crate::soundness::{Finding, FindingKind};

/// The command's part of the document.
#[derive(Clone, Debug, Serialize)]
pub struct CheckBody {
    /// One answer an input, in order.
    pub files: Vec<CheckedFile>,
}

/// What is said of one file.
#[derive(Clone, Debug, Serialize)]
pub struct CheckedFile {
    /// As given; lossy where it is not UTF-8.
    pub path: String,
    /// The path's bytes in hexadecimal, where it is not UTF-8.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub path_hex: Option<String>,
    /// Name of the format; null where it could not be read.
    pub format: Option<&'static str>,
    /// Triangles, after polygons have been cut.
    pub triangles: Option<u64>,
    /// Symbol of the length unit.
    pub unit: Option<&'static str>,
    /// Whether the unit was assumed.
    pub unit_assumed: bool,
    /// Box around everything, m.
    pub bounds_m: Option<[[f64; 3]; 2]>,
    /// Whether nothing blocks or doubts; null where it could not be read.
    pub sound: Option<bool>,
    /// The kinds that were looked for.
    pub tested: Vec<FindingKind>,
    /// Findings that belong to no single body.
    pub findings: Vec<Finding>,
    /// Why it could not be read.
    pub error: Option<Error>,
    /// Its bodies.
    pub bodies: Vec<CheckedBody>,
    /// The mended copy, where one was asked for.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub mended: Option<Copied>,
    /// The plain copy, where one was asked for.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub copied: Option<Copied>,
    /// Where the picture was drawn, if one was asked for.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub picture: Option<String>,
}

/// What is said of one body.
#[derive(Clone, Debug, Serialize)]
pub struct CheckedBody {
    /// Unique in the file.
    pub id: String,
    /// The file's own name.
    pub name: Option<String>,
    /// Its triangles.
    pub triangles: u64,
    /// Its shells.
    pub shells: u64,
    /// Those of them that are voids.
    pub voids: u64,
    /// Whether the directed edges cancel.
    pub closed: bool,
    /// Whether nothing blocks or doubts.
    pub sound: bool,
    /// Whether it was inside out and turned.
    pub turned: bool,
    /// Its box, m.
    pub bounds_m: [[f64; 3]; 2],
    /// m³; null where no volume exists.
    pub volume_m3: Option<f64>,
    /// m².
    pub area_m2: Option<f64>,
    /// What was found on it.
    pub findings: Vec<Finding>,
}
