//! How a thing hangs from a hook, and what its lines carry.

use nalgebra::{DMatrix, DVector, Matrix3, Vector3};

use super::{hook, nnls};
use crate::error::{Error, Kind, Result};

/// A line or sling from the hook to a point of the thing.
#[derive(Clone, Debug, PartialEq)]
pub struct Line {
    /// Its name.
    pub name: String,
    /// Where it holds the thing, m.
    pub at: Vector3<f64>,
}

/// What a line carries.
#[derive(Clone, Debug, PartialEq)]
pub struct LineForce {
    /// Its name.
    pub line: String,
    /// N; 0 where it is slack.
    pub tension: f64,
    /// The most that it can come to carry in this attitude when only some of the lines carry, N.
    pub worst: f64,
    /// Its angle from the vertical, rad.
    pub from_vertical: f64,
    /// It hangs loose.
    pub slack: bool,
}

/// A thing that hangs at rest.
#[derive(Clone, Debug, PartialEq)]
pub struct Hanging {
    /// The direction of gravity in the thing's frame, a unit vector.
    pub down: Vector3<f64>,
    /// Where the hook is in the thing's frame, m: it moves from where it was drawn when the lines
    /// swing.
    pub hook: Vector3<f64>,
    /// The centre of mass in this attitude, m.
    pub centre: Vector3<f64>,
    /// The least turn that brings `down` to the direction of gravity as drawn: positions in the
    /// thing's frame × this = positions as it hangs.
    pub turn: Matrix3<f64>,
    /// How far it leans from the attitude as drawn, rad.
    pub lean: f64,
    /// In the order of the lines; empty where it hangs from one point.
    pub lines: Vec<LineForce>,
}

/// How many times as much as straight up a sling carries at an angle from the vertical, rad:
/// 1/cos. Infinite from 90° on. From the horizontal take 90° less the angle.
pub fn sling_factor(from_vertical: f64) -> f64 {
    let c = from_vertical.cos();
    // cos(π/2) is 6e-17 in doubles.
    if c > 1e-15 { 1.0 / c } else { f64::INFINITY }
}

/// How a thing hangs from `hook` (m, in its own frame as drawn, with gravity along `down`).
///
/// Without lines it hangs from that point. With two to four lines that meet at the hook, of the
/// lengths as drawn, it takes the attitude that puts its centre below the hook; a line that would
/// push is slack, and the hook then moves to where the others hold it. Four lines that all carry
/// share as equal springs that only pull. `centre_at` gives the centre of mass when gravity acts
/// along a unit vector: liquids level anew. The attitude is a fixed point, sought by damped
/// iteration to 1e-13 rad. Of several attitudes (with lines, one may hang mirrored) the one with
/// the hook nearest to where it was drawn is given.
///
/// # Errors
/// `usage` for one line or more than four, an end in the hook, or a thing whose attitude does not
/// settle (its centre at the hook, or a liquid that flows over); those of `centre_at`.
pub fn hang(
    hook: &Vector3<f64>,
    lines: &[Line],
    drawn_down: &Vector3<f64>,
    weight: f64,
    centre_at: &mut dyn FnMut(&Vector3<f64>) -> Result<Vector3<f64>>,
) -> Result<Hanging> {
    if lines.len() == 1 || lines.len() > 4 {
        let s = if lines.len() == 1 { "" } else { "s" };
        return Err(Error::new(
            Kind::Usage,
            format!("{} line{s} from one hook", lines.len()),
            "state two to four lines; for one, make the hook the point that it holds, without lines",
        ));
    }
    let at: Vec<_> = lines.iter().map(|l| l.at).collect();
    let length: Vec<f64> = at.iter().map(|a| (hook - a).norm()).collect();
    if let Some(i) = length.iter().position(|l| *l <= 0.0 || !l.is_finite()) {
        return Err(Error::new(
            Kind::Usage,
            format!("the line `{}` has no length", lines[i].name),
            "put the hook above the points that the lines hold",
        ));
    }
    let drawn = drawn_down.normalize();
    let mut down = drawn;
    let mut step = 1.0;
    let mut last = f64::INFINITY;
    for _ in 0..2000 {
        let centre = centre_at(&down)?;
        let hung = settle(hook, &at, &length, &centre)?;
        let wanted = centre - hung.hook;
        let size = length
            .iter()
            .fold(centre.norm().max(hook.norm()), |m, l| m.max(*l));
        if wanted.norm() <= 1e-12 * size {
            return Err(Error::new(
                Kind::Usage,
                "the centre of mass lies in the hook, so every attitude is one of rest",
                "hang it from a point that is not its centre of mass",
            ));
        }
        let wanted = wanted.normalize();
        let off = (wanted - down).norm();
        if off <= 1e-13 {
            return Ok(finish(hung, lines, &at, &drawn, wanted, centre, weight));
        }
        if off >= last {
            step *= 0.5_f64;
        }
        last = off;
        let moved = down + (wanted - down) * step;
        if moved.norm() <= 1e-6 || step < 1e-9 {
            break;
        }
        down = moved.normalize();
    }
    Err(Error::new(
        Kind::Usage,
        "no attitude at rest was found: what flows in it moves the centre further than the lean that it follows",
        "hang it from a higher point, or with its tanks full or empty",
    ))
}

/// Where the hook comes to stand for a centre that stays.
fn settle(
    hook: &Vector3<f64>,
    at: &[Vector3<f64>],
    length: &[f64],
    centre: &Vector3<f64>,
) -> Result<hook::Hung> {
    if at.is_empty() {
        return Ok(hook::Hung {
            hook: *hook,
            taut: Vec::new(),
            shares: Vec::new(),
        });
    }
    if at.len() == 4 {
        // All four may carry where the hook stays as drawn: springs decide.
        if let Some(shares) = springs(hook, at, centre) {
            return Ok(hook::Hung {
                hook: *hook,
                taut: (0..4).filter(|&i| shares[i] > 0.0).collect(),
                shares,
            });
        }
    }
    let places = hook::places(centre, at, length);
    let nearest = places.into_iter().min_by(|a, b| {
        let d = |h: &hook::Hung| (h.hook - hook).norm();
        // Among equals the one with more lines carrying, so that a tie is told the same way.
        let (x, y) = (d(a), d(b));
        let tie = (x - y).abs() <= 1e-9 * length[0];
        if tie {
            b.taut.len().cmp(&a.taut.len())
        } else {
            x.total_cmp(&y)
        }
    });
    nearest.ok_or_else(|| {
        Error::new(
            Kind::Usage,
            "these lines hold the thing in no attitude",
            "check where the hook and the ends of the lines are",
        )
    })
}

/// Unit vectors from the ends of the lines to the hook, as columns.
fn pulls(hook: &Vector3<f64>, at: &[Vector3<f64>]) -> DMatrix<f64> {
    DMatrix::from_fn(3, at.len(), |r, k| (hook - at[k]).normalize()[r])
}

/// Shares of lines that pull as equal springs on a weight of 1 that hangs from the hook.
fn springs(hook: &Vector3<f64>, at: &[Vector3<f64>], centre: &Vector3<f64>) -> Option<Vec<f64>> {
    let up = (hook - centre).normalize();
    if !up.iter().all(|x| x.is_finite()) {
        return None;
    }
    let b = DVector::from_column_slice(up.as_slice());
    let x = nnls::least_norm(&pulls(hook, at), &b)?;
    Some(x.iter().copied().collect())
}

/// The most that each line can carry in this attitude over all forces that only pull: they stand
/// where at most three lines carry.
fn worst(hook: &Vector3<f64>, at: &[Vector3<f64>], up: &Vector3<f64>) -> Vec<f64> {
    let all = pulls(hook, at);
    let b = DVector::from_column_slice(up.as_slice());
    let mut out = vec![0.0_f64; at.len()];
    for mask in 1_u32..1 << at.len() {
        if mask.count_ones() > 3 {
            continue;
        }
        let set: Vec<usize> = (0..at.len()).filter(|i| mask & (1 << i) != 0).collect();
        let a = all.select_columns(&set);
        let x = nnls::least_squares(&a, &b);
        if (&a * &x - &b).amax() <= 1e-9 && x.iter().all(|t| *t >= -1e-12) {
            for (k, &i) in set.iter().enumerate() {
                out[i] = out[i].max(x[k]);
            }
        }
    }
    out
}

fn finish(
    hung: hook::Hung,
    lines: &[Line],
    at: &[Vector3<f64>],
    drawn: &Vector3<f64>,
    down: Vector3<f64>,
    centre: Vector3<f64>,
    weight: f64,
) -> Hanging {
    let up = -down;
    let most = worst(&hung.hook, at, &up);
    let forces = lines.iter().enumerate().map(|(i, line)| {
        let slack = !hung.taut.contains(&i);
        let along = (hung.hook - at[i]).normalize();
        LineForce {
            line: line.name.clone(),
            tension: hung.shares[i] * weight,
            worst: if slack {
                0.0
            } else {
                most[i].max(hung.shares[i]) * weight
            },
            from_vertical: along.cross(&up).norm().atan2(along.dot(&up)),
            slack,
        }
    });
    Hanging {
        down,
        hook: hung.hook,
        centre,
        turn: least_turn(&down, drawn),
        lean: down.cross(drawn).norm().atan2(down.dot(drawn)),
        lines: forces.collect(),
    }
}

/// The least turn from one unit vector to another; by half a turn about an axis across both where
/// they are opposite.
fn least_turn(from: &Vector3<f64>, to: &Vector3<f64>) -> Matrix3<f64> {
    let v = from.cross(to);
    let c = from.dot(to);
    if c < -1.0 + 1e-15 {
        let (axis, _) = super::across(from);
        return axis * axis.transpose() * 2.0 - Matrix3::identity();
    }
    let k = v.cross_matrix();
    Matrix3::identity() + k + k * k / (1.0 + c)
}

#[cfg(test)]
#[path = "hang_tests.rs"]
mod tests;
