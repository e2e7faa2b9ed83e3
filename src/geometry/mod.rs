//! What mesh and moments both stand on: triangles by index, error-free arithmetic, exact signs.

mod block;
mod cross;
pub mod cubature;
pub mod eft;
mod exact;
mod exact_sum;
mod facets;
mod level;
mod predicates;
mod tree;

pub(crate) use block::{BLOCK, Block, Coordinate, LANES, Lane};
pub use cross::{Meeting, meeting, meeting_point, meeting_sharing, unfolded};
pub use exact::{RationalPoint, exact_volume_sign};
pub use exact_sum::ExactSum;
pub use facets::{Corners, IndexedFacets, LooseFacets, RecordFacets, Select, box_facets};
pub(crate) use level::Level;
pub use predicates::{Point, Position, is_flat, plane_side, ray_crossing, turn_2d};
pub use tree::BoxTree;
