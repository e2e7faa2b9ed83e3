//! Soup, exact welding, shells, and bodies (an outer shell with its voids).

mod bodies;
mod buckets;
mod edges;
mod families;
mod loops;
mod nesting;
mod shells;
mod soup;
mod tangle;
mod union;
mod wedge;
mod weld;

pub use bodies::{Body, Mesh, NestedRule, Refusal};
pub(crate) use families::Part;
pub(crate) use shells::Shell;
pub(crate) use soup::each;
pub use soup::{ReaderNote, Records, Run, Soup, Triangles, WarpedPolygon};
pub(crate) use wedge::strictly_inside;
pub use weld::MOST_TRIANGLES;
