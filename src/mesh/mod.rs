//! Soup, exact welding, shells, and bodies (an outer shell with its voids).

mod bodies;
mod buckets;
mod edges;
mod loops;
mod nesting;
mod shells;
mod soup;
mod tangle;
mod union;
mod wedge;
mod weld;
mod words;

pub(crate) use bodies::Part;
pub use bodies::{Body, Mesh, NestedRule, Refusal};
pub(crate) use shells::{Shell, middle};
pub(crate) use soup::each;
pub use soup::{ReaderNote, Records, Run, Soup, Triangles, WarpedPolygon};
pub use weld::MOST_TRIANGLES;
