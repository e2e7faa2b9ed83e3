//! The one idea: everything that has mass becomes [`Moments`].

mod algebra;
mod graded;
pub mod liquid;
mod principal;
mod skin;
mod solid;
mod total;

pub use algebra::{Moments, Placement};
pub use graded::Grading;
pub use principal::{Principal, principal};
pub use skin::integrate_skin;
pub(crate) use solid::Running;
pub use solid::{CHUNK, ChunkSums, SolidIntegrals, chunk_sums, integrate};
pub use total::TotalSums;
