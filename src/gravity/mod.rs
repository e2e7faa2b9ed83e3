//! Gravity: uniform and central fields, and the three centres that they tell apart.
//!
//! A central field is gravitation alone; [`Field::Earth`] is normal gravity, which holds the
//! centrifugal part of the Earth's rotation.

mod centres;
mod field;
mod polyhedron;

pub use centres::{Central, Mass, Piece, central};
pub use field::{EARTH, Ellipsoid, Field, STANDARD_GRAVITY};
pub use polyhedron::{Attraction, attraction};

#[cfg(test)]
mod tests;
