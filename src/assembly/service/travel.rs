//! The way from full to empty: phases as functions of how far they have gone, and how fast the
//! centre can move on it.

use std::f64::consts::PI;

use nalgebra::Vector3;

use super::super::resolve::around;
use super::keys::{Fill, FillOf, MotionKind};
use super::plan::PlannedPhase;
use super::{Contents, Extent, Service, Snapshot, State, state};
use crate::error::{Error, Kind};
use crate::moments::Placement;
use crate::quantity::Quantity;

/// A phase as a function of `s` from 0 to 1.
#[derive(Clone, Debug)]
pub(in crate::assembly) struct Leg {
    pub(in crate::assembly) name: String,
    start: State,
    /// Tanks that drain together, with the share of the phase in which they do.
    drains: Vec<Drained>,
    /// Motion, from, to.
    moves: Vec<(usize, f64, f64)>,
    /// 0, 1 and every place between at which the way has a corner, ascending.
    pub(in crate::assembly) corners: Vec<f64>,
}

#[derive(Clone, Debug)]
struct Drained {
    /// Tank, volume that leaves it.
    tanks: Vec<(usize, f64)>,
    from: f64,
    to: f64,
}

impl Leg {
    /// The state after the share `s` of the phase.
    pub(in crate::assembly) fn at(&self, s: f64) -> State {
        let mut out = self.start.clone();
        for d in &self.drains {
            let part = if s >= d.to {
                1.0
            } else if s <= d.from {
                0.0
            } else {
                (s - d.from) / (d.to - d.from)
            };
            for (tank, volume) in &d.tanks {
                let left = self.start.fills[*tank] - volume * part;
                out.fills[*tank] = left.max(0.0);
            }
        }
        for &(motion, from, to) in &self.moves {
            out.motions[motion] = if s >= 1.0 { to } else { from + (to - from) * s };
        }
        out
    }
}

impl Service {
    /// All phases one after the other, beginning at `start`. Without phases in the file, one that
    /// empties every tank together.
    ///
    /// # Errors
    /// `usage` where there is neither a phase nor a tank; a `to` that a tank cannot hold.
    pub(in crate::assembly) fn legs(&self, start: &State) -> Result<Vec<Leg>, Error> {
        let all = PlannedPhase {
            name: "all tanks together".to_owned(),
            drain: vec![(0..self.tanks().len()).collect()],
            to: None,
            moves: Vec::new(),
        };
        let phases = match self.planned() {
            [] if self.tanks().is_empty() => {
                return Err(Error::new(
                    Kind::Usage,
                    "nothing drains or moves in this assembly",
                    "add a [[tank]], or a [[motion]] and a [[phase]] that moves it",
                ));
            }
            [] => std::slice::from_ref(&all),
            phases => phases,
        };
        let mut legs = Vec::with_capacity(phases.len());
        let mut state = start.clone();
        for phase in phases {
            let leg = self.leg(phase, &state)?;
            state = leg.at(1.0);
            legs.push(leg);
        }
        Ok(legs)
    }

    fn leg(&self, phase: &PlannedPhase, start: &State) -> Result<Leg, Error> {
        let mut moves = Vec::new();
        let mut end = start.clone();
        for &n in &phase.moves {
            let motion = &self.motions()[n];
            let now = start.motions[n];
            // What has moved already moves back.
            let to = if now == motion.to {
                motion.from
            } else {
                motion.to
            };
            moves.push((n, now, to));
            end.motions[n] = to;
        }
        let empty = Fill {
            of: FillOf::Share,
            amount: Quantity::exact(0.0),
            line: 0,
        };
        let mut groups = Vec::new();
        let mut left = start.fills.clone();
        for group in &phase.drain {
            let mut tanks = Vec::new();
            for &tank in group {
                let to = self.fill_volume(tank, phase.to.as_ref().unwrap_or(&empty), &end)?;
                let volume = (left[tank] - to).max(0.0);
                // A tank named twice has nothing left the second time.
                left[tank] -= volume;
                tanks.push((tank, volume));
            }
            groups.push(tanks);
        }
        let of = |tanks: &[(usize, f64)]| tanks.iter().map(|(_, v)| v).sum::<f64>();
        let whole: f64 = groups.iter().map(|g| of(g)).sum();
        let mut drains = Vec::new();
        let mut corners = vec![0.0];
        let mut gone = 0.0;
        for tanks in groups {
            let volume = of(&tanks);
            if volume <= 0.0 {
                continue;
            }
            let from = gone / whole;
            gone += volume;
            let to = (gone / whole).min(1.0);
            corners.push(to);
            drains.push(Drained { tanks, from, to });
        }
        if let Some(last) = drains.last_mut() {
            // Rounding must not leave a drop.
            last.to = 1.0;
        }
        for &(n, from, to) in &moves {
            for share in state::corners(&self.motions()[n].kind) {
                let s = (share - from) / (to - from);
                if s > 0.0 && s < 1.0 {
                    corners.push(s);
                }
            }
        }
        corners.push(1.0);
        corners.retain(|s| s.is_finite());
        corners.sort_by(f64::total_cmp);
        corners.dedup_by(|b, a| (*b - *a).abs() < 1e-12);
        if let Some(last) = corners.last_mut() {
            *last = 1.0;
        }
        Ok(Leg {
            name: phase.name.clone(),
            start: start.clone(),
            drains,
            moves,
            corners,
        })
    }

    /// Bounds on |d centre / ds| along each axis between two corners of a leg, m.
    ///
    /// With M the mass and F = ∫ x dm, dX = (dF − X·dM)/M. A drop that leaves tank j comes from its
    /// free surface, inside the tank's box: it moves F − X·M by at most ρ·dV times the longest
    /// distance between that box and the box of everything. What moves with speed v adds m·v. A tank
    /// that turns by dφ also lets its liquid run: F changes by ρ·dφ times the second moment of the
    /// free surface, at most π·d⁴/16 for a vessel of diameter d (area ≤ π·d²/4 of any plane set of
    /// that diameter; variance ≤ d²/4 of anything within a range d). M is least at the end.
    pub(super) fn fastest(&self, leg: &Leg, from: f64, to: f64) -> Result<[f64; 3], Error> {
        let (start, end) = (leg.at(from), leg.at(to));
        let now = self.at(&start)?;
        let least = self.at(&end)?.total.zeroth;
        let length = to - from;
        let mut first = Vector3::zeros();
        let mut boxes = Vec::new();
        let mut drops = Vec::new();
        for standing in &now.things {
            let thing = &self.things[standing.thing];
            let mut around = standing.bounds;
            if let Extent::Tank(n) = thing.extent {
                let tank = &self.tanks()[n];
                let placement = self.placement_of_tank(n, &start);
                around = boxed(tank, &placement).unwrap_or(around);
            }
            let (speed, turning) = self.speed(thing, &leg.moves, &start);
            first += speed * standing.moments.zeroth;
            // Wherever it goes during the leg.
            let grown = [
                (Vector3::from(around[0]) - speed).into(),
                (Vector3::from(around[1]) + speed).into(),
            ];
            boxes.push(grown);
            if let Extent::Tank(n) = thing.extent {
                let density = self.tanks()[n].liquid.density.value;
                let rate = density * (start.fills[n] - end.fills[n]) / length;
                if rate > 0.0 {
                    drops.push((rate, grown));
                }
                let d = (Vector3::from(around[1]) - Vector3::from(around[0])).norm();
                // A box of the turned vessel is at most √3 times its own.
                first += Vector3::repeat(density * turning * PI * d.powi(4) / 16.0 * 9.0);
            }
        }
        let [lo, hi] = around_all(&boxes, &now);
        for (rate, [l, h]) in drops {
            for k in 0..3 {
                first[k] += rate * (h[k] - lo[k]).max(hi[k] - l[k]);
            }
        }
        Ok((first / least).into())
    }

    /// How fast any point of a thing may move during a leg (m per leg along each axis), and by how
    /// much it turns (rad).
    fn speed(
        &self,
        thing: &super::Thing,
        moves: &[(usize, f64, f64)],
        state: &State,
    ) -> (Vector3<f64>, f64) {
        let mut speed = Vector3::zeros();
        let mut turning = 0.0;
        // How far inner motions may have taken it from where the file places it.
        let mut away = 0.0;
        let shift = thing.shifts[state.case.unwrap_or(self.keys.cases.len())];
        let shift = shift.unwrap_or_default();
        let file = match &thing.extent {
            Extent::Tank(n) => {
                let tank = &self.tanks()[*n];
                boxed(tank, &tank.placement).unwrap_or(thing.weighed.bounds)
            }
            _ => thing.weighed.bounds,
        };
        let corners = (0..8).map(|n| Vector3::from_fn(|k, _| file[n >> k & 1][k]) + shift);
        let corners: Vec<Vector3<f64>> = corners.collect();
        for &n in &thing.motions {
            let motion = &self.motions()[n];
            let moved = moves.iter().find(|(m, _, _)| *m == n);
            let by = moved.map_or(0.0, |(_, from, to)| (to - from).abs());
            let most = motion.from.abs().max(motion.to.abs());
            match &motion.kind {
                MotionKind::Along(axis) => {
                    speed += axis.abs() * by;
                    away += most;
                }
                MotionKind::Turn { axis, at } => {
                    let arm = corners.iter().map(|p| axis.cross(&(p - at)).norm());
                    let arm = arm.fold(0.0, f64::max) + away;
                    let across = axis.map(|x| (1.0 - x * x).max(0.0).sqrt());
                    speed += across * (arm * by);
                    turning += by;
                    away += 2.0 * arm;
                }
                MotionKind::Through(places) => {
                    let way: f64 = places.windows(2).map(|w| (w[1] - w[0]).norm()).sum();
                    speed += Vector3::repeat(way * by);
                    away += way;
                }
            }
        }
        // An outer turn may carry the direction of an inner speed anywhere.
        if turning > 0.0 && thing.motions.len() > 1 {
            speed = Vector3::repeat(speed.norm());
        }
        (speed, turning)
    }
}

/// The box of the whole of a tank where it stands.
fn boxed(tank: &Contents, placement: &Placement) -> Option<[[f64; 3]; 2]> {
    let whole = tank.vessel.levelled(Vector3::z());
    let bounds = whole.liquid(whole.high(), &placement.turn).bounds?;
    Some(bounds.map(|c| (Vector3::from(c) + placement.at).into()))
}

fn around_all(boxes: &[[[f64; 3]; 2]], now: &Snapshot) -> [[f64; 3]; 2] {
    around(boxes.iter().copied().chain([now.bounds]))
}
