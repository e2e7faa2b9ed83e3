//! The `weigh` document.

use serde::Serialize;

use super::estimate::Estimated;
use super::facets::Facets;
use crate::error::Error;
use crate::masses::{Figures, PrintFigures};
use crate::soundness::Finding;
use crate::uncertainty::Uncertainty;

/// The command's part of the document.
#[derive(Clone, Debug, Serialize)]
pub struct WeighBody {
    /// One answer an input, in order.
    pub files: Vec<WeighedFile>,
}

/// What is said of one file.
#[derive(Clone, Debug, Serialize)]
pub struct WeighedFile {
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
    /// Why it could not be read.
    pub error: Option<Error>,
    /// Findings that belong to no single body.
    pub findings: Vec<Finding>,
    /// Whether surfaces that cut each other were looked for.
    pub overlap: &'static str,
    /// Its bodies; null where only the whole was asked for.
    pub bodies: Option<Vec<WeighedBody>>,
    /// All bodies together; null where one of them cannot be weighed.
    pub whole: Option<Whole>,
    /// The bodies for want of which there is no whole.
    pub whole_missing: Vec<String>,
    /// What was proved of the surface, null for nothing; absent where bodies were asked for.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub proved: Option<Option<&'static str>>,
    /// Whether the whole came out negative and was turned; absent where bodies were asked for.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub turned: Option<bool>,
}

/// All bodies of a file together.
#[derive(Clone, Debug, Serialize)]
pub struct Whole {
    /// Volume, mass, centres, inertia.
    #[serde(flatten)]
    pub figures: Figures,
    /// How they are printed; absent for solids.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub made: Option<PrintFigures>,
    /// How far they may be off for the open bodies among them; absent where all are closed.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub estimate: Option<Estimated>,
    /// How far the figures may be off; null where it was not computed.
    pub uncertainty: Option<Uncertainty>,
}

/// What is said of one body.
#[derive(Clone, Debug, Serialize)]
pub struct WeighedBody {
    /// Unique in the file.
    pub id: String,
    /// The file's own name.
    pub name: Option<String>,
    /// Its triangles.
    pub triangles: u64,
    /// Whether the directed edges cancel.
    pub closed: bool,
    /// Whether it was inside out and turned.
    pub turned: bool,
    /// Its shells.
    pub shells: u64,
    /// Those of them that are voids.
    pub voids: u64,
    /// Volume, mass, centres, inertia.
    #[serde(flatten)]
    pub figures: Figures,
    /// The three readings, where a solid lies within a solid.
    pub nested: Option<NestedFigures>,
    /// What was found on it.
    pub findings: Vec<Finding>,
    /// Why it was not weighed.
    pub refused: Option<Refused>,
    /// How it is printed; absent for a solid.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub made: Option<PrintFigures>,
    /// How the figures were come by, where they are not exact for the mesh.
    pub estimate: Option<Estimated>,
    /// What the facets do to the figures of a curved body; null where it was not estimated.
    pub facets: Option<Facets>,
    /// How far the figures may be off; null where it was not computed.
    pub uncertainty: Option<Uncertainty>,
}

/// Volumes of a body that holds a solid within its solid.
#[derive(Clone, Copy, Debug, Serialize)]
pub struct NestedFigures {
    /// Both counted, m³.
    pub sum_m3: f64,
    /// The overlap counted once, m³.
    pub union_m3: f64,
    /// The inner one taken as a void, m³.
    pub void_m3: f64,
}

/// Why a body was not weighed.
#[derive(Clone, Debug, Serialize)]
pub struct Refused {
    /// `not-closed`, `duplicate`, `nested-solid` or `degenerate`.
    pub kind: &'static str,
    /// Σ|imbalance| over undirected edges.
    pub open_edges: u64,
    /// Boundary loops.
    pub loops: usize,
    /// What to do.
    pub advice: String,
}
