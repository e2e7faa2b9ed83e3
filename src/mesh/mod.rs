//! Soup, exact welding, shells, and bodies (an outer shell with its voids).

mod bodies;
mod boundary;
mod buckets;
mod edges;
mod families;
mod fans;
mod join;
mod loops;
pub(crate) mod near;
mod nesting;
mod shells;
mod soup;
mod tangle;
mod union;
mod wedge;
mod weld;

pub use bodies::{Body, Mesh, NestedRule, Refusal};
pub(crate) use boundary::{Boundary, Merge};
pub(crate) use families::Part;
pub(crate) use fans::{Pinch, pinches};
pub use join::Joined;
pub(crate) use join::{clusters, moved_triangles, swept};
pub(crate) use loops::Loop;
pub(crate) use nesting::containers;
pub(crate) use shells::{Shell, middle};
pub(crate) use soup::each;
pub use soup::{ReaderNote, Records, Run, Soup, Triangles, WarpedPolygon};
pub(crate) use wedge::strictly_inside;
pub use weld::MOST_TRIANGLES;
pub(crate) use weld::weld;
