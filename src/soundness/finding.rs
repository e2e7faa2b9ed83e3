//! A finding is a value, not a sentence: what, how bad, how often, where, and what it does.

use serde::Serialize;

/// What can be wrong with a mesh, as JSON spells it.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Serialize)]
#[serde(rename_all = "kebab-case")]
pub enum FindingKind {
    /// A boundary loop.
    Hole,
    /// An edge of more than two triangles.
    NonManifoldEdge,
    /// An edge that two triangles pass in the same direction.
    WindingConflict,
    /// A shell that faces the wrong way and was turned.
    InsideOut,
    /// A triangle without area.
    Degenerate,
    /// Facets that stand in one place.
    Duplicate,
    /// Surfaces that cut each other or cover each other in one plane.
    SelfOverlap,
    /// A solid within a solid.
    NestedSolid,
    /// A solid whose surface is spread over several names.
    NameSplit,
    /// A polygon whose corners are not flat.
    WarpedPolygon,
}

/// All kinds that [`audit`](super::audit) looks for where surfaces are tested for overlap too.
pub const TESTED_WITH_OVERLAP: &[FindingKind] = &[
    FindingKind::Hole,
    FindingKind::NonManifoldEdge,
    FindingKind::WindingConflict,
    FindingKind::InsideOut,
    FindingKind::Degenerate,
    FindingKind::Duplicate,
    FindingKind::SelfOverlap,
    FindingKind::NestedSolid,
    FindingKind::NameSplit,
    FindingKind::WarpedPolygon,
];

/// All kinds that [`audit`](super::audit) looks for where they are not.
pub const TESTED: &[FindingKind] = &[
    FindingKind::Hole,
    FindingKind::NonManifoldEdge,
    FindingKind::WindingConflict,
    FindingKind::InsideOut,
    FindingKind::Degenerate,
    FindingKind::Duplicate,
    FindingKind::NestedSolid,
    FindingKind::NameSplit,
    FindingKind::WarpedPolygon,
];

/// How bad a finding is.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Serialize)]
#[serde(rename_all = "lowercase")]
pub enum Severity {
    /// No volume exists.
    Blocks,
    /// The volume may be off by the stated amount.
    Doubts,
    /// Worth knowing; the volume stands.
    Notes,
}

/// What a stated effect is.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize)]
#[serde(rename_all = "lowercase")]
pub enum EffectIs {
    /// The effect to rounding.
    Exact,
    /// No more than this, either way.
    Bound,
    /// About this.
    Estimate,
}

/// Where a finding stands.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Place {
    /// A point to look at, m, in the file's frame.
    pub at_m: [f64; 3],
    /// The triangles there, 0-based in file order.
    pub triangles: Vec<u32>,
    /// Line of a text file, from 1.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub line: Option<u64>,
    /// Length of a boundary loop, m.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub length_m: Option<f64>,
    /// Edges of a boundary loop.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub edges: Option<usize>,
}

/// One finding.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Finding {
    /// What.
    pub kind: FindingKind,
    /// How bad.
    pub severity: Severity,
    /// How many: loops, edges, surplus facets, or places, by kind.
    pub count: u64,
    /// The first of the places, in file order.
    pub places: Vec<Place>,
    /// How many of the places are listed.
    pub places_shown: usize,
    /// What the file's volume would change by if it is mended as advised, m³ (signed); a bound is
    /// the most it could change either way. `None` where it is not known.
    pub volume_effect_m3: Option<f64>,
    /// What kind of figure that is.
    pub volume_effect_is: Option<EffectIs>,
    /// What to do, in plain words.
    pub advice: String,
}

impl Finding {
    /// Whether it leaves the mesh unsound.
    pub fn is_unsound(&self) -> bool {
        self.severity < Severity::Notes
    }
}
