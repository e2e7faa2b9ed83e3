//! The one idea: everything that has mass becomes [`Moments`].

mod algebra;
mod principal;

pub use algebra::{Moments, Placement};
pub use principal::{Principal, principal};
