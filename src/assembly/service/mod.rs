//! An assembly in service: the same things in any state of loading, filling, motion and attitude.
//!
//! [`Service::at`] gives every thing where it stands in a [`State`]. Bodies are weighed once;
//! a state only places their moments again and cuts the liquid anew, so that thousands of states
//! are cheap.
//!
//! What a state does, in this order: things that the case leaves out go; things that it places
//! elsewhere are shifted; motions turn and shift what they are of, the inner before the outer, each
//! in the assembly's axes as the file places things; tanks are filled, their free surface normal to
//! effective gravity. Liquid is at rest: sloshing, and its freedom not to turn with its tank, are
//! left out.

mod centres;
mod drain;
mod keys;
mod lean;
mod notes;
mod plan;
mod read;
mod rows;
mod state;
mod tank;
mod travel;
mod worst;

use std::fmt;
use std::sync::Arc;

use nalgebra::Vector3;

pub use centres::{Centres, StandsFor};
pub use drain::{
    Drain, DrainPhase, DrainStep, DrainedLimit, Envelope, MOST_STEPS, TankFill, Worst,
};
pub use keys::{Case, Fill, FillOf, Frame, Gravity, Motion, MotionKind, Phase, ServiceKeys, Tank};
pub use lean::Seen;
pub(super) use notes::notes;
pub(super) use plan::faults;
pub(super) use read::{fill, read};
pub use rows::{CaseRow, PoolRow, TankRow};
pub use state::{Snapshot, Standing, State, TankState};
pub use tank::Contents;
pub(super) use tank::weighed_tank;

use super::expand::{Instance, What};
use super::file::{AssemblyFile, Shape};
use super::load::Loaded;
use super::resolve::Weighed;
use super::smear::Planned as Smear;
use super::source::MeshBody;
use crate::error::Error;
use crate::moments::Placement;
use plan::{Plan, PlannedPhase};
pub(super) use travel::Leg;

/// An assembly that can be evaluated in any state.
#[derive(Clone, Debug)]
pub struct Service {
    things: Vec<Thing>,
    /// Numbered behind the things.
    smears: Vec<Smear>,
    tanks: Vec<Contents>,
    plan: Plan,
    keys: ServiceKeys,
}

/// A thing as the file has it, and how it may move.
#[derive(Clone)]
struct Thing {
    weighed: Weighed,
    placement: Placement,
    extent: Extent,
    /// Share of its mass that may still be added.
    allowance: f64,
    /// Motions that move it, in the order in which they apply.
    motions: Vec<usize>,
    /// Per case, then without a case: where it is shifted to; none where it is left out.
    shifts: Vec<Option<Vector3<f64>>>,
}

/// What a thing's box is computed from.
#[derive(Clone)]
enum Extent {
    Shape(Shape),
    Bodies(Vec<Arc<dyn MeshBody>>),
    /// Index among the tanks.
    Tank(usize),
}

impl fmt::Debug for Thing {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "Thing({})", self.weighed.path)
    }
}

impl Service {
    /// Of everything that was weighed, with the bodies that it came from.
    pub(super) fn new(
        loaded: &Loaded,
        instances: &[Instance<'_>],
        weighed: Vec<Weighed>,
        smears: Vec<Smear>,
        tanks: Vec<Contents>,
        bodies: impl Fn(&Instance<'_>) -> Vec<Arc<dyn MeshBody>>,
    ) -> Self {
        let file: &AssemblyFile = &loaded.file;
        let (plan, _) = Plan::new(file, instances);
        let mut things = Vec::with_capacity(weighed.len());
        // What cannot be weighed is missing; the rest keeps its order.
        let mut numbered = instances.iter().enumerate();
        for w in weighed {
            let Some((n, instance)) = numbered.find(|(_, i)| i.path == w.path) else {
                continue;
            };
            let extent = match instance.what {
                What::Item(item) => Extent::Shape(item.shape.clone()),
                What::Part(_) => Extent::Bodies(bodies(instance)),
                What::Tank(_) => {
                    let of = tanks.iter().position(|t| t.path == w.path);
                    Extent::Tank(of.unwrap_or(0))
                }
            };
            things.push(Thing {
                placement: instance.placement,
                allowance: match instance.what {
                    What::Part(part) => part.maturity.as_ref(),
                    What::Item(item) => item.maturity.as_ref(),
                    What::Tank(_) => None,
                }
                .map_or(0.0, |m| m.allowance),
                extent,
                motions: plan.motions_of[n].clone(),
                shifts: plan.shifts.iter().map(|s| s[n]).collect(),
                weighed: w,
            });
        }
        Self {
            things,
            smears,
            tanks,
            plan,
            keys: file.service.clone(),
        }
    }

    /// The gravity of the file.
    pub fn gravity(&self) -> &Gravity {
        &self.keys.gravity
    }

    /// The cases of the file.
    pub fn cases(&self) -> &[Case] {
        &self.keys.cases
    }

    /// The motions of the file.
    pub fn motions(&self) -> &[Motion] {
        &self.keys.motions
    }

    /// The phases of the file.
    pub fn phases(&self) -> &[Phase] {
        &self.keys.phases
    }

    /// The frames of the file.
    pub fn frames(&self) -> &[Frame] {
        &self.keys.frames
    }

    /// The tanks, in file order, repeats apart.
    pub fn tanks(&self) -> &[Contents] {
        &self.tanks
    }

    /// Paths of things that stand in cases only.
    pub fn payload(&self) -> Vec<&str> {
        let base = self.keys.cases.len();
        let things = self.things.iter();
        things
            .filter(|t| t.shifts[base].is_none())
            .map(|t| t.weighed.path.as_str())
            .collect()
    }

    /// The path of a thing of a snapshot.
    pub fn path(&self, thing: usize) -> &str {
        match self.things.get(thing) {
            Some(t) => &t.weighed.path,
            None => &self.smears[thing - self.things.len()].path,
        }
    }

    /// The phases with names resolved.
    pub(super) fn planned(&self) -> &[PlannedPhase] {
        &self.plan.phases
    }

    /// The state at rest: of the file, or of one of its cases. Motions stand at their `from`.
    ///
    /// # Errors
    /// Where a fill is more than its tank holds, or a level has no direction.
    pub fn rest(&self, case: Option<usize>) -> Result<State, Error> {
        let effective = self.keys.gravity.effective();
        let case = case.filter(|c| *c < self.keys.cases.len());
        let mut state = State {
            case,
            fills: vec![0.0; self.tanks.len()],
            motions: self.keys.motions.iter().map(|m| m.from).collect(),
            effective,
        };
        for n in 0..self.tanks.len() {
            let fill = case
                .and_then(|c| self.plan.fills[c].get(&n))
                .unwrap_or(&self.tanks[n].fill);
            state.fills[n] = self.fill_volume(n, fill, &state)?;
        }
        Ok(state)
    }
}
