//! The `add` document, and what is said of a slice.

use std::path::Path;

use serde::Serialize;

use super::Document;
use super::table::Look;
use super::weigh::{WeighBody, WeighedFile, Whole};
use super::weigh_text;
use crate::error::Result;
use crate::stream::{Identity, Partial, Slice};
use crate::text::shown;

/// The command's part of the document.
#[derive(Clone, Debug, Serialize)]
pub struct AddBody {
    /// The mesh that the slices are of.
    pub of: Identity,
    /// Its triangles.
    pub triangles: u64,
    /// Symbol of its length unit.
    pub unit: &'static str,
    /// Whether the unit was assumed.
    pub unit_assumed: bool,
    /// Whether it came out negative and was turned; null without figures.
    pub turned: Option<bool>,
    /// Its figures; null where the slices do not close together.
    pub whole: Option<Whole>,
    /// What was proved of its surface, null for nothing.
    pub proved: Option<&'static str>,
}

impl AddBody {
    /// As the answer of `weigh --whole` about the mesh in one piece.
    fn as_weighed(&self) -> WeighBody {
        WeighBody {
            files: vec![WeighedFile {
                path: "slices together".to_owned(),
                path_hex: None,
                format: self.of.format.ends_with("stl").then_some("stl"),
                triangles: Some(self.triangles),
                unit: Some(self.unit),
                unit_assumed: self.unit_assumed,
                error: None,
                findings: Vec::new(),
                overlap: "untested",
                bodies: None,
                whole: self.whole.clone(),
                whole_missing: Vec::new(),
                proved: Some(self.proved),
                turned: self.turned,
            }],
        }
    }
}

/// For people.
pub fn render(document: &Document<AddBody>, look: Look) -> String {
    let weighed = Document {
        schema: document.schema,
        program: document.program,
        exit: document.exit,
        warnings: document.warnings.clone(),
        inputs: document.inputs.clone(),
        body: document.body.as_weighed(),
    };
    weigh_text::render(&weighed, look)
}

/// As CSV.
///
/// # Errors
/// `cannot-write`.
pub fn csv(body: &AddBody) -> Result<String> {
    weigh_text::csv(&body.as_weighed())
}

/// What was summed, and where it went.
pub fn slice_text(slice: Slice, path: &Path, partial: &Partial, output: &Path) -> String {
    let of = partial
        .triangles_of_mesh()
        .map_or(String::new(), |n| format!(" of {n}"));
    let text = format!(
        "slice {slice} of {}: {} triangles{of}, in {}",
        path.display(),
        partial.triangles(),
        output.display()
    );
    format!("{}\n", shown(&text))
}
