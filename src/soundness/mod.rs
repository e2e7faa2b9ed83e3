//! What is wrong with a mesh, where, how often, and what it can do to the volume.

mod audit;
pub mod cap;
mod columns;
mod crack;
mod cross;
mod facets;
mod filled;
mod finding;
mod gaps;
pub mod mend;
mod notes;
mod of_facets;
mod of_shells;
mod overlap;
mod shared_space;
mod sizes;
mod t_junction;
mod tally;

pub use audit::{Audit, Depth, audit, audit_watched};
pub use filled::{Filled, filled, filled_bodies};
pub use finding::{EffectIs, Finding, FindingKind, Place, Severity, TESTED, TESTED_WITH_OVERLAP};
pub(crate) use gaps::rounded_up;
pub use notes::tested;
pub use overlap::{OverlapFindings, cut_bodies, cuts, self_overlap};
pub use shared_space::{SharedSpace, common_space, shared_spaces, shared_spaces_watched};
pub use sizes::unit_suspect;
pub use tally::{CutBodies, Cuts};
