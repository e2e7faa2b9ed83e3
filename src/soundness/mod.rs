//! What is wrong with a mesh, where, how often, and what it can do to the volume.

mod audit;
mod columns;
mod filled;
mod finding;
mod overlap;
mod shared_space;

pub use audit::{Audit, Overlap, audit};
pub use filled::{Filled, filled, filled_bodies};
pub use finding::{EffectIs, Finding, FindingKind, Place, Severity, TESTED, TESTED_WITH_OVERLAP};
pub use overlap::{Cuts, OverlapFindings, cuts, self_overlap};
pub use shared_space::{SharedSpace, common_space, shared_spaces};
