//! The assembly file, resolving it against meshes, the roll-up.
//!
//! ```text
//! load      text → AssemblyFile, with all faults of all included files together
//! resolve   AssemblyFile + bodies → every thing with its mass moments where it stands
//! balance   → total, subtotals, verdicts
//! ```
//!
//! Conventions that the file itself does not show:
//!
//! - Placement of a part, item or group: mirrored in the plane through its own origin, turned
//!   (right-handed) about that origin, then moved to `at` in its group's frame. A part's own frame
//!   is that of its mesh file. An item's `at` is its centre of mass.
//! - Globs: `*` also matches `/`, so `frame*` matches the body `frame/2` and `*bracket` a part in
//!   any group. `part` is matched against a path with and without its marks of repeats, so `wheel`
//!   matches `wheel#2`.
//! - An included file has its own unit, materials and rules; paths in it are relative to it. Its
//!   rules are tried before those of the file that includes it. Its limits are judged only when it
//!   is balanced by itself, which a warning says.
//! - `mesh = "file#body"` is split at the last `#`, unless a file has the whole as its name.

mod assign;
mod choose;
mod expand;
mod expect;
mod file;
mod growth;
mod load;
mod made;
mod notes;
mod open;
mod overlap;
mod position;
mod printing;
mod read;
mod read_ballast;
mod read_limits;
mod read_statics;
mod read_weighing;
mod reader;
mod resolve;
mod rollup;
mod schema;
pub mod service;
mod shape;
mod smear;
mod source;
mod sources;
mod spread;
mod standing;
mod substance;
mod sum;
mod sure;
mod tree;
mod trim;
mod trim_states;

#[cfg(test)]
mod tests;

pub use expect::Expectation;
pub use file::{
    AssemblyFile, Assign, BallastPlace, Coating, Each, Entry, Expect, Graded, Group, Hang, Item,
    Maturity, MeshChoice, Part, Pattern, Position, Shape, SmearEntry, SmearMass, Substance, Turn,
};
pub use growth::{Growth, MaturityRow, Standing};
pub use load::{DEEPEST, Input, Loaded, load};
pub use open::{Capped, MassBounds};
pub use overlap::{Overlap, Stand};
pub use resolve::{Basis, FacetBias, Piece, Resolved, Source, Weighed, resolve};
pub use rollup::{
    Balance, BasisRow, GroupRow, MaterialRow, PartFacets, PartRow, Total, balance, balance_with,
};
pub use schema::schema;
pub use shape::impossible as impossible_inertia;
pub use smear::Smeared;
pub use source::{BodyFigures, MeshBody, MeshFiles, Refusal};
pub use standing::{
    AttitudeRow, HangRow, LeanRow, LineRow, ReactionRow, Statics, TipRow, WeighingRow, statics,
};
pub use trim::{ballast_items, ballast_problem};
pub use trim_states::Situations;

/// Names as a list for a message, the first of them where there are very many.
fn listed(names: &[&str]) -> String {
    const MOST: usize = 30;
    let mut text = names
        .iter()
        .take(MOST)
        .map(|n| format!("`{n}`"))
        .collect::<Vec<_>>()
        .join(", ");
    if names.len() > MOST {
        text += &format!(" and {} more", names.len() - MOST);
    }
    text
}
