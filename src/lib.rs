//! Mass, balance point and inertia of mesh exports, with every mesh proved closed or refused.
//!
//! Data flows one way:
//!
//! ```text
//! bytes → format → soup of named triangles → mesh (welded) → shells → bodies
//!       → moments → masses → assembly → verdicts → report
//! ```
//!
//! A body is weighed from the bytes of a file:
//!
//! ```
//! use bismar::format::{self, Bytes};
//! use bismar::masses::{Figures, Substance};
//! use bismar::mesh::Mesh;
//! use bismar::quantity::{Dimension, LengthUnit, Quantity};
//!
//! # fn main() -> Result<(), Box<dyn std::error::Error>> {
//! // A corner tetrahedron with legs 5, 4 and 3.
//! let text = "v 0 0 0\nv 5 0 0\nv 0 4 0\nv 0 0 3\nf 1 3 2\nf 1 2 4\nf 2 3 4\nf 1 4 3\n";
//! let soup = format::read(Bytes::Owned(text.into()), "corner.obj".as_ref(), None)?;
//! let mesh = Mesh::new(soup, "corner")?;
//! let body = &mesh.bodies()[0];
//!
//! // A body that is not closed has no volume: it is refused with the reason.
//! let solid = mesh.solid(body, None).map_err(|refusal| refusal.advice)?;
//! assert_eq!(solid.moments.zeroth, 10.0);
//!
//! let density = Quantity::parse("2.70 g/cm3 ± 1 %", Dimension::Density, None)?;
//! let aluminium = Substance { name: None, density };
//! let metres = LengthUnit::Mm.metres();
//! let figures = Figures::of(&solid, &body.bounds, metres, Some(&aluminium), None);
//! assert!((figures.mass_kg.unwrap() - 10e-9 * 2700.0).abs() < 1e-19);
//! assert!((figures.centroid_m.unwrap()[0] - 1.25e-3).abs() < 1e-18);
//! # Ok(())
//! # }
//! ```

#![deny(unsafe_code)]
#![warn(missing_docs)]

pub mod assembly;
pub mod ballast;
pub mod bytes;
#[cfg(feature = "cli")]
pub mod command;
pub mod curvature;
pub mod error;
pub mod format;
pub mod geometry;
pub mod gravity;
pub mod limits;
pub mod masses;
pub mod material;
pub mod mesh;
pub mod moments;
pub mod printed;
pub mod progress;
pub mod quantity;
pub mod report;
pub mod soundness;
pub mod statics;
pub mod stream;
pub mod survey;
pub mod text;
pub mod uncertainty;

pub use error::{Error, Kind, Result, Warning};
