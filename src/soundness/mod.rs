//! What is wrong with a mesh, where, how often, and what it can do to the volume.

mod audit;
mod finding;
mod overlap;

pub use audit::{Audit, Overlap, audit};
pub use finding::{EffectIs, Finding, FindingKind, Place, Severity, TESTED, TESTED_WITH_OVERLAP};
pub use overlap::{Cuts, OverlapFindings, cuts, self_overlap};
