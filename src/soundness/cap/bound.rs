//! The bounds themselves; their derivation stands with [`super`].

use super::Cap;
use super::cover::{length, minus};
use crate::geometry::Point;
use crate::moments::Moments;

/// How far figures of the capped solid can be off, under the assumption, in the file's unit.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Bounds {
    /// |ΔV| at most.
    pub volume: f64,
    /// The centre moves by at most this.
    pub centre: f64,
    /// Each component of the volume's inertia about the centre changes by at most this; infinite
    /// where nothing bounds it.
    pub inertia: f64,
}

/// 2·√(A/π).
pub fn reach(area: f64) -> f64 {
    2.0 * (area / std::f64::consts::PI).sqrt()
}

/// (2/3)·A^1.5/√π: of a flat cap.
pub fn flat_bound(area: f64) -> f64 {
    2.0 / 3.0 * area.powf(1.5) / std::f64::consts::PI.sqrt()
}

/// (3A)^1.5/(6√π): of a cap that is not flat.
pub fn any_bound(area: f64) -> f64 {
    (3.0 * area).powf(1.5) / (6.0 * std::f64::consts::PI.sqrt())
}

/// How far the figures of a solid with these caps can be off, from its volume moments and the box
/// round what the file has of it.
pub fn bounds(caps: &[Cap], capped: &Moments, bounds: [[f64; 3]; 2]) -> Bounds {
    let volume = capped.zeroth;
    let mut room = bounds;
    for c in caps {
        room = [
            [0, 1, 2].map(|k| room[0][k].min(c.centre[k] - c.reach)),
            [0, 1, 2].map(|k| room[1][k].max(c.centre[k] + c.reach)),
        ];
    }
    let most: f64 = (0..3).map(|k| room[1][k] - room[0][k]).product();
    let centre: Point = capped.centre().unwrap_or(capped.about).into();
    let distance = |c: &Cap| length(&minus(&c.centre, &centre)) + c.reach;
    let moment = |n: i32| -> f64 {
        caps.iter()
            .map(|c| c.volume_bound * distance(c).powi(n))
            .sum()
    };
    let (sum, first, second) = (moment(0), moment(1), moment(2));
    let corner = [0, 1, 2].map(|k| (centre[k] - room[0][k]).max(room[1][k] - centre[k]));
    let least = volume - sum;
    let (centre, inertia) = if least > 0.0 {
        (
            (first / least).min(length(&corner)),
            second + first * first / least,
        )
    } else {
        (length(&corner), f64::INFINITY)
    };
    Bounds {
        volume: sum.min(volume.max(most - volume)),
        centre,
        inertia,
    }
}
