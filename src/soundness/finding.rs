//! A finding is a value, not a sentence: what, how bad, how often, where, and what it does.

use serde::Serialize;

/// What can be wrong with a mesh, as JSON spells it.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Serialize)]
#[serde(rename_all = "kebab-case")]
pub enum FindingKind {
    /// A boundary loop.
    Hole,
    /// Open edges that close when near vertices are joined.
    Crack,
    /// A vertex on the edge of a facet that does not have it as a corner.
    TJunction,
    /// An edge of more than two triangles.
    NonManifoldEdge,
    /// A vertex at which several fans of triangles meet.
    NonManifoldVertex,
    /// An edge that two triangles pass in the same direction.
    WindingConflict,
    /// A shell that faces the wrong way and was turned.
    InsideOut,
    /// A triangle without area, or with hardly any height.
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
    /// A facet whose stated normal points away from the side that its corners turn about.
    FacetNormalDisagrees,
    /// A size or a mass that makes the assumed unit unlikely.
    UnitSuspect,
    /// A stray fragment.
    TinyShell,
}

/// All kinds that [`audit`](super::audit) looks for where surfaces are tested for overlap too.
pub const TESTED_WITH_OVERLAP: &[FindingKind] = &[
    FindingKind::Hole,
    FindingKind::Crack,
    FindingKind::TJunction,
    FindingKind::NonManifoldEdge,
    FindingKind::NonManifoldVertex,
    FindingKind::WindingConflict,
    FindingKind::InsideOut,
    FindingKind::Degenerate,
    FindingKind::Duplicate,
    FindingKind::SelfOverlap,
    FindingKind::NestedSolid,
    FindingKind::NameSplit,
    FindingKind::WarpedPolygon,
    FindingKind::FacetNormalDisagrees,
    FindingKind::UnitSuspect,
    FindingKind::TinyShell,
];

/// All kinds that [`audit`](super::audit) looks for where they are not.
pub const TESTED: &[FindingKind] = &[
    FindingKind::Hole,
    FindingKind::Crack,
    FindingKind::TJunction,
    FindingKind::NonManifoldEdge,
    FindingKind::NonManifoldVertex,
    FindingKind::WindingConflict,
    FindingKind::InsideOut,
    FindingKind::Degenerate,
    FindingKind::Duplicate,
    FindingKind::NestedSolid,
    FindingKind::NameSplit,
    FindingKind::WarpedPolygon,
    FindingKind::FacetNormalDisagrees,
    FindingKind::UnitSuspect,
    FindingKind::TinyShell,
];

impl FindingKind {
    /// As JSON spells it.
    pub fn name(self) -> String {
        let text = serde_json::to_value(self).unwrap_or_default();
        text.as_str().unwrap_or_default().to_owned()
    }
}

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
    /// Of a crack: the distance within which joining vertices closes it, or closed it, m.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub join_m: Option<f64>,
    /// What to do, in plain words.
    pub advice: String,
}

impl Finding {
    /// Whether it leaves the mesh unsound.
    pub fn is_unsound(&self) -> bool {
        self.severity < Severity::Notes
    }
}
