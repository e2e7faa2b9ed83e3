//! What holds a thing up: reactions of supports, the slope at which it tips, how it hangs, and
//! what loads that were measured say of its mass and centre.
//!
//! Nothing here knows parts or files. A centre of mass comes in as a point, or as a closure of the
//! direction of gravity where a liquid flows to another place as the thing leans. Lengths are in
//! m, masses in kg, forces in N, angles in radians, all in one frame fixed to the thing: it is
//! gravity that turns.

mod hang;
mod hook;
mod hull;
pub(crate) mod nnls;
mod readings;
mod stand;
mod tip;

pub use hang::{Hanging, Line, LineForce, hang, sling_factor};
pub use readings::{Attitude, Load, Weighing, weigh};
pub use stand::{Reaction, Reactions, Stand, Support};
pub use tip::{Edge, EdgeTip, tip_edges, tip_towards};

/// Said once beside every result about lifting or tipping.
pub const CAUTION: &str = "All at rest: no sloshing, jerk, wind, ground that gives, nor strength of parts and slings is in these figures; whoever lifts or parks it decides.";

use nalgebra::Vector3;

/// Two unit vectors that stand across `normal` (unit) and each other, right-handed with it.
pub(crate) fn across(normal: &Vector3<f64>) -> (Vector3<f64>, Vector3<f64>) {
    let mut least = 0;
    for k in 1..3 {
        if normal[k].abs() < normal[least].abs() {
            least = k;
        }
    }
    let mut e = Vector3::zeros();
    e[least] = 1.0;
    let first = (e - normal * normal[least]).normalize();
    (first, normal.cross(&first))
}
