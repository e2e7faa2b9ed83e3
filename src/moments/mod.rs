//! The one idea: everything that has mass becomes [`Moments`].

mod algebra;

pub use algebra::{Moments, Placement};
