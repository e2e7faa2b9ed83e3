//! What mesh and moments both stand on: triangles by index, error-free arithmetic, exact signs.

pub mod eft;
mod exact;
mod facets;
mod predicates;

pub use exact::{RationalPoint, exact_volume_sign};
pub use facets::{Corners, IndexedFacets, LooseFacets, RecordFacets, Select};
pub use predicates::{Point, Position, is_flat, plane_side, ray_crossing, turn_2d};
