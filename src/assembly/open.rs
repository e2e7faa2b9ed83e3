//! Open bodies that a part accepts as capped solids, and what their bounds do to the whole.

use nalgebra::Vector3;
use serde::Serialize;

use super::resolve::Weighed;
use crate::limits::{Judged, Measured, Verdict};
use crate::moments::Moments;

/// An open body's capped solid, in SI units and the mesh file's axes.
#[derive(Clone, Debug)]
pub struct Capped {
    /// Moments of its volume.
    pub moments: Moments,
    /// The volume differs by at most this, m³, under the assumption.
    pub volume_bound: f64,
    /// The centre differs by at most this, m.
    pub centre_bound: f64,
    /// Each component of the volume's inertia about the centre differs by at most this, m⁵;
    /// infinite where nothing bounds it.
    pub inertia_bound: f64,
}

/// How far the mass figures of something may be off, if for each hole the missing surface is no
/// larger than twice its flat cap.
#[derive(Clone, Copy, Debug, Default, PartialEq, Serialize)]
pub struct MassBounds {
    /// kg.
    pub mass_bound_kg: f64,
    /// m.
    pub centre_bound_m: f64,
    /// Of each component about the centre of mass, kg m²; null where it is not bounded.
    pub inertia_bound_kg_m2: Option<f64>,
}

/// A body's bounds with its density.
pub(super) fn of_body(c: &Capped, density: f64) -> MassBounds {
    MassBounds {
        mass_bound_kg: c.volume_bound * density,
        centre_bound_m: c.centre_bound,
        inertia_bound_kg_m2: Some(c.inertia_bound * density).filter(|x| x.is_finite()),
    }
}

/// Bounds of several things together, from mass moments and bounds of each.
///
/// With mass m ± δ and a centre within b of c, m′(c′ − C) − m(c − C) is at most
/// (m + δ)·b + δ·|c − C|; the sum of these over the least total mass bounds the common centre C.
/// Inertia is given for one thing alone.
pub(super) fn together<'a>(
    things: impl Iterator<Item = (&'a Moments, Option<MassBounds>)> + Clone,
    centre: Vector3<f64>,
    mass: f64,
) -> Option<MassBounds> {
    let mut open = things.clone().filter_map(|(m, b)| b.map(|b| (m, b)));
    let first = open.clone().next()?;
    if things.clone().count() == 1 {
        return Some(first.1);
    }
    let most: f64 = open.clone().map(|(_, b)| b.mass_bound_kg).sum();
    let moved: f64 = open
        .by_ref()
        .map(|(m, b)| {
            let away = m.centre().map_or(0.0, |c| (c - centre).norm());
            (m.zeroth + b.mass_bound_kg) * b.centre_bound_m + b.mass_bound_kg * away
        })
        .sum();
    let least = mass - most;
    Some(MassBounds {
        mass_bound_kg: most,
        // Where nothing is sure to be there, the centre is anywhere.
        centre_bound_m: if least > 0.0 {
            moved / least
        } else {
            f64::INFINITY
        },
        inertia_bound_kg_m2: None,
    })
}

/// Bounds of the whole.
pub(super) fn of_total(weighed: &[Weighed], centre: Vector3<f64>, mass: f64) -> Option<MassBounds> {
    together(
        weighed.iter().map(|w| (&w.moments, w.estimate)),
        centre,
        mass,
    )
}

/// A limit that a figure may cross within its bound neither holds nor is broken. Figures for which
/// no bound is worked out may be anywhere.
pub(super) fn unsure(mut judged: Judged, of: &Measured, bounds: Option<&MassBounds>) -> Judged {
    let Some(b) = bounds else { return judged };
    let bound = match of {
        Measured::Mass => b.mass_bound_kg,
        Measured::Centre(_)
        | Measured::Station(_)
        | Measured::FromPoint(_)
        | Measured::FromLine(_)
        | Measured::FromPlane(_) => b.centre_bound_m,
        Measured::Percent { length, .. } => b.centre_bound_m / length,
        _ => f64::INFINITY,
    };
    if bound > 0.0 && (judged.margin.abs() < bound || !bound.is_finite()) {
        judged.verdict = Verdict::Unsure;
    }
    judged
}
