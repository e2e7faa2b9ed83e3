//! The least ballast that brings everything inside its limits.
//!
//! ```text
//! places, limits, states → rows ‖v(x)‖ ≤ t(x) → convex programs → branch and bound → exact check
//! ```
//!
//! Multiplied by the total mass, limits on the centre, on tipping and on what one of three
//! supports carries are linear in the added masses; distances from a point or line, unbalance and
//! lower limits on inertia are second-order cones. Each answer carries a lower bound from its
//! multipliers that holds whatever the solver's tolerances, and is checked in exact figures.
//! Upper limits on inertia about the centre, products about it and ratios are not convex: they are
//! searched from many starts, and what is found is never called the least.

mod branch;
mod certain;
mod conic;
mod local;
mod row;
mod search;
mod trim;

use nalgebra::Vector3;
use serde::Serialize;

use crate::limits::{Judged, Limit};
use crate::moments::Moments;

pub use trim::trim;

/// A place that ballast may be put at.
#[derive(Clone, Debug, PartialEq)]
pub struct Place {
    /// Its name.
    pub name: String,
    /// Moments of 1 kg there: a point, or a shape of it.
    pub per_kg: Moments,
    /// Nothing, or at least this much, kg.
    pub least: f64,
    /// At most this much, kg.
    pub most: Option<f64>,
    /// In whole units of this weight only, kg.
    pub step: Option<f64>,
    /// Standard uncertainty of what is put there, as a fraction of it.
    pub relative: f64,
    /// Standard uncertainty of what is put there, kg.
    pub absolute: f64,
}

impl Place {
    /// Any amount at a point.
    pub fn point(name: &str, at: Vector3<f64>) -> Self {
        Self {
            name: name.to_owned(),
            per_kg: Moments::point(at, 1.0),
            least: 0.0,
            most: None,
            step: None,
            relative: 0.0,
            absolute: 0.0,
        }
    }
}

/// One situation in which limits must hold: a case, or a step of a phase.
#[derive(Clone, Debug, PartialEq)]
pub struct State {
    /// Its name; empty where there is only the thing as it stands.
    pub phase: String,
    /// Mass moments of the whole before any ballast.
    pub moments: Moments,
    /// What each independent source of error moves these moments by, one standard deviation each;
    /// in the same order in all states.
    pub drivers: Vec<Moments>,
    /// Which limits are asked of it, by their place; all where `None`. A slope of the whole with
    /// its liquid level there is a state of its own, for the limit on that slope alone.
    pub only: Option<Vec<usize>>,
}

impl State {
    /// Whether a limit is asked of it.
    pub(crate) fn asks(&self, limit: usize) -> bool {
        self.only.as_ref().is_none_or(|o| o.contains(&limit))
    }
}

/// How sure all limits must be to hold together.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Sure {
    /// Chance, from a half to below 1.
    pub probability: f64,
    /// Of the samples that check it.
    pub seed: u64,
}

/// What is asked.
#[derive(Clone, Debug, PartialEq)]
pub struct Problem {
    /// Where ballast may go.
    pub places: Vec<Place>,
    /// What must hold.
    pub limits: Vec<Limit>,
    /// When it must hold.
    pub states: Vec<State>,
    /// Diagonal of a box around everything, m: the size that rounding is judged by.
    pub diagonal: f64,
    /// Mean figures must hold where `None`.
    pub sure: Option<Sure>,
}

/// How it ended.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub enum Outcome {
    /// Nothing is needed.
    HoldsAlready,
    /// Ballast was found.
    Found,
    /// None was: none exists, or (`local`) the search found none.
    Impossible,
}

/// What the answer rests on.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize)]
#[serde(rename_all = "lowercase")]
pub enum Proof {
    /// Multipliers of a convex program.
    Dual,
    /// Branch and bound over such programs.
    Gap,
    /// A search from many starts, which proves nothing.
    Local,
}

/// Ballast at one place.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Placed {
    /// Its name.
    pub place: String,
    /// Centre of what is put there, m.
    pub at_m: [f64; 3],
    /// kg.
    pub mass_kg: f64,
    /// How many unit weights; null where any amount may be put.
    pub units: Option<u64>,
}

/// A limit in the state in which its margin is least.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct InPhase {
    /// The verdict.
    #[serde(flatten)]
    pub judged: Judged,
    /// The state; absent where there is only one without a name.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub phase: Option<String>,
}

/// What holds the ballast up.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Binding {
    /// Name of the limit, or `most at PLACE`.
    pub limit: String,
    /// Such as `centre.x`; `mass` for a place.
    pub quantity: &'static str,
    /// The state in which it binds; null where there is only one without a name.
    pub phase: Option<String>,
    /// kg of ballast that one `unit` of the bound, loosened, would save; of the continuous problem
    /// with whole numbers held.
    pub price: f64,
    /// SI unit of the bound.
    pub unit: &'static str,
}

/// The answer to `trim`.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Trimmed {
    /// How it ended.
    pub outcome: Outcome,
    /// What that rests on.
    pub proof: Proof,
    /// No answer is lighter by more than this; null where nothing was found, or nothing is known.
    pub gap_kg: Option<f64>,
    /// Where something is put, in the order of the places.
    pub ballast: Vec<Placed>,
    /// kg; null where nothing was found.
    pub total_kg: Option<f64>,
    /// Every limit before, in its worst state.
    pub before: Vec<InPhase>,
    /// Every limit after; empty where nothing was found.
    pub after: Vec<InPhase>,
    /// What binds.
    pub binding: Vec<Binding>,
    /// A set of limits that cannot hold together while any one less of them could.
    pub conflict: Vec<String>,
    /// Share of seeded samples in which all limits hold; absent where no certainty was asked.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub sampled: Option<Sampled>,
}

/// A check of certainty by samples.
#[derive(Clone, Copy, Debug, PartialEq, Serialize)]
pub struct Sampled {
    /// How many.
    pub n: u32,
    /// Of the random numbers.
    pub seed: u64,
    /// Share in which all limits hold in all states.
    pub held: f64,
}

#[cfg(test)]
mod tests;
