//! Soup, exact welding, shells, and bodies (an outer shell with its voids).

mod soup;

pub use soup::{ReaderNote, Records, Run, Soup, Triangles, WarpedPolygon};
