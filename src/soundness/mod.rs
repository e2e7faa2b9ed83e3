//! What is wrong with a mesh, where, how often, and what it can do to the volume.

mod audit;
mod crack;
mod facets;
mod finding;
mod gaps;
mod notes;
mod sizes;
mod t_junction;

pub use audit::{Audit, audit};
pub use finding::{EffectIs, Finding, FindingKind, Place, Severity, TESTED};
pub(crate) use gaps::rounded_up;
pub use notes::tested;
pub use sizes::unit_suspect;
