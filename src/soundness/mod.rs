//! What is wrong with a mesh, where, how often, and what it can do to the volume.

mod audit;
pub mod cap;
mod cross;
mod finding;
pub mod mend;

pub use audit::{Audit, audit};
pub use finding::{EffectIs, Finding, FindingKind, Place, Severity, TESTED};
