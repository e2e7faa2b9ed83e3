//! How mass, balance point and inertia travel as tanks empty and things move, and where each limit
//! comes nearest to breaking.

use std::collections::BTreeMap;

use serde::Serialize;

use super::super::load::Loaded;
use super::super::rollup::{self, plain, rows};
use super::travel::Leg;
use super::worst::{Least, Samples};
use super::{Service, Snapshot, State};
use crate::error::{Error, Kind, Warning};
use crate::limits::{Axis, Judged, Limit, Measured, Verdict};
use crate::statics::Stand;

/// The answer to `drain`. Its fields are those of the JSON document; SI units, in the names;
/// lengths and axes are the assembly's.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Drain {
    /// Name of the assembly.
    pub name: String,
    /// The case that it begins in; null: as the file stands.
    pub case: Option<String>,
    /// The phases, in their order.
    pub phases: Vec<DrainPhase>,
    /// What the figures stay within on the whole way, between the steps too.
    pub envelope: Envelope,
    /// Each limit at its worst, in file order.
    pub limits: Vec<DrainedLimit>,
}

/// One phase.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct DrainPhase {
    /// Its name.
    pub name: String,
    /// From its beginning to its end.
    pub steps: Vec<DrainStep>,
}

/// The whole at one moment.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct DrainStep {
    /// Share of the phase, 0 to 1: of the volume that drains in it, or of its motion.
    pub at: f64,
    /// By path of tank.
    pub fills: BTreeMap<String, TankFill>,
    /// By name: m, rad, or a share of the path.
    pub motions: BTreeMap<String, f64>,
    /// kg.
    pub mass_kg: f64,
    /// m.
    pub centre_of_mass_m: [f64; 3],
    /// About the centre of mass; off-diagonals are −∫xy dm.
    pub inertia_kg_m2: [[f64; 3]; 3],
}

/// What is in a tank.
#[derive(Clone, Copy, Debug, PartialEq, Serialize)]
pub struct TankFill {
    /// m³.
    pub volume_m3: f64,
    /// kg.
    pub mass_kg: f64,
}

/// Least and greatest values on the whole way.
#[derive(Clone, Copy, Debug, PartialEq, Serialize)]
pub struct Envelope {
    /// kg.
    pub mass_kg: [f64; 2],
    /// Least and greatest of each component of the centre of mass.
    pub centre_of_mass_m: [[f64; 3]; 2],
    /// No component lies outside by more than this.
    pub within_m: f64,
}

/// A limit where it comes nearest to breaking; the figures of the limit are those of that moment.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct DrainedLimit {
    /// Judged at its worst.
    #[serde(flatten)]
    pub judged: Judged,
    /// Where that is.
    pub worst: Worst,
}

/// The worst moment of a limit.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Worst {
    /// Name of the phase.
    pub phase: String,
    /// Share of the phase.
    pub at: f64,
    /// Value of the limit's quantity there.
    pub value: f64,
    /// Margin there.
    pub margin: f64,
    /// The whole at that moment, kg.
    pub mass_kg: f64,
    /// Its balance point then.
    pub centre_of_mass_m: [f64; 3],
    /// Nowhere on the way is the margin less by more than this, in the limit's unit; null where
    /// nothing bounds how fast the figure changes: there it was sampled at every step, and the
    /// least refined.
    pub within: f64,
}

impl Drain {
    /// 1 where a limit is broken on the way, else 0.
    pub fn exit(&self) -> u8 {
        let broken = |l: &DrainedLimit| l.judged.verdict == Verdict::Broken;
        u8::from(self.limits.iter().any(broken))
    }
}

/// What is followed: a figure, and whether its least or its greatest is looked for.
#[derive(Clone, Copy, Debug)]
enum Followed<'l> {
    Margin(&'l Limit),
    Least(usize),
    Greatest(usize),
}

impl Followed<'_> {
    /// How it depends on the way of the centre.
    fn slope(&self, centre: &[f64; 3]) -> Slope {
        let along = |a: &Axis| (0..3).map(|k| (a.along[k] * centre[k]).abs()).sum();
        let far = (centre[0].powi(2) + centre[1].powi(2) + centre[2].powi(2)).sqrt();
        match self {
            Self::Margin(limit) => match &limit.quantity {
                Measured::Mass => Slope::Even,
                Measured::Centre(k) => Slope::AtMost(centre[*k]),
                Measured::Station(a) | Measured::FromPlane(a) => Slope::AtMost(along(a)),
                Measured::Percent { from, length } => Slope::AtMost(along(from) / length.abs()),
                Measured::FromPoint(_) | Measured::FromLine(_) => Slope::AtMost(far),
                _ => Slope::Unknown,
            },
            Self::Least(k) | Self::Greatest(k) => Slope::AtMost(centre[*k]),
        }
    }
}

/// What is known of how fast a figure changes.
#[derive(Clone, Copy, Debug)]
enum Slope {
    /// It changes evenly from corner to corner.
    Even,
    /// It changes by no more than this per unit of the way.
    AtMost(f64),
    /// Nothing bounds it: the steepest that was seen, and half as much again, is taken.
    Unknown,
}

/// The most steps of a phase.
pub const MOST_STEPS: usize = 100_000;

impl Service {
    /// Walks all phases from the state at rest of the file or of a case, in `steps` steps each.
    ///
    /// # Errors
    /// As [`Service::rest`] and [`Service::at`]; nothing that drains or moves; a whole of no mass.
    pub fn drain(
        &self,
        loaded: &Loaded,
        case: Option<usize>,
        steps: usize,
    ) -> Result<(Drain, Vec<Warning>), Error> {
        let start = self.rest(case)?;
        let legs = self.legs(&start)?;
        let steps = steps.clamp(1, MOST_STEPS);
        let mut warnings: Vec<Warning> = Vec::new();
        let mut phases = Vec::with_capacity(legs.len());
        for leg in &legs {
            let mut rows = Vec::with_capacity(steps + 1);
            for n in 0..=steps {
                let at = n as f64 / steps as f64;
                let state = leg.at(at);
                rows.push(self.step(at, &state, loaded)?);
                for warning in self.pool_warnings(&state) {
                    // Once a tank is enough.
                    let same = |w: &Warning| w.kind == warning.kind && w.line == warning.line;
                    if !warnings.iter().any(same) {
                        warnings.push(warning);
                    }
                }
            }
            phases.push(DrainPhase {
                name: leg.name.clone(),
                steps: rows,
            });
        }
        let mut followed: Vec<Followed<'_>> =
            loaded.file.limits.iter().map(Followed::Margin).collect();
        let limits = followed.len();
        followed.extend((0..3).flat_map(|k| [Followed::Least(k), Followed::Greatest(k)]));
        let found = self.follow(&legs, &followed, steps, loaded.file.stand.as_ref())?;
        let mut judged = Vec::with_capacity(limits);
        for (limit, (leg, least)) in loaded.file.limits.iter().zip(&found) {
            let state = legs[*leg].at(least.at);
            let (weighed, _) = self.weighed(&state)?;
            let total = rollup::total(&weighed)?;
            let snapshot = self.at(&state)?;
            let seen = self.seen(limit, &state, &snapshot, loaded.file.stand.as_ref())?;
            let mut row = rollup::judged(limit, &total, &seen, None);
            // What could still hide between the samples would break it by more than a micrometre.
            let proved = least.within.is_finite();
            if proved && row.verdict == Verdict::Holds && least.within - row.margin > 1e-6 {
                row.verdict = Verdict::Unsure;
            }
            judged.push(DrainedLimit {
                worst: Worst {
                    phase: legs[*leg].name.clone(),
                    at: least.at,
                    value: row.value,
                    margin: row.margin,
                    mass_kg: total.mass_kg,
                    centre_of_mass_m: total.centre_of_mass_m,
                    within: least.within,
                },
                judged: row,
            });
        }
        let extent = &found[limits..];
        let masses = phases.iter().flat_map(|p| &p.steps).map(|s| s.mass_kg);
        let mass = masses.fold([f64::INFINITY, f64::NEG_INFINITY], |[lo, hi], m| {
            [lo.min(m), hi.max(m)]
        });
        let drain = Drain {
            name: loaded.file.name.clone(),
            case: case.map(|c| self.cases()[c].name.clone()),
            phases,
            envelope: Envelope {
                mass_kg: mass,
                centre_of_mass_m: [
                    [0, 1, 2].map(|k| extent[2 * k].1.value + 0.0),
                    [0, 1, 2].map(|k| -extent[2 * k + 1].1.value + 0.0),
                ],
                within_m: extent.iter().map(|e| e.1.within).fold(0.0, f64::max),
            },
            limits: judged,
        };
        Ok((drain, warnings))
    }

    fn followed(
        &self,
        f: &Followed<'_>,
        state: &State,
        snapshot: &Snapshot,
        stand: Option<&Stand>,
    ) -> Result<f64, Error> {
        let total = &snapshot.total;
        let centre = total.centre().map_or([f64::NAN; 3], plain);
        Ok(match f {
            Followed::Margin(limit) => {
                let seen = self.seen(limit, state, snapshot, stand)?;
                seen.judge(limit, total, 0.0).margin
            }
            Followed::Least(k) => centre[*k],
            Followed::Greatest(k) => -centre[*k],
        })
    }

    fn step(&self, at: f64, state: &State, loaded: &Loaded) -> Result<DrainStep, Error> {
        let snapshot = self.at(state)?;
        let (centre, inertia) = (snapshot.total.centre(), snapshot.total.inertia());
        let (Some(centre), Some(inertia)) = (centre, inertia) else {
            return Err(massless(loaded));
        };
        let tanks = self.tanks().iter().zip(&snapshot.tanks);
        let fills = tanks.filter(|(_, t)| t.stands).map(|(tank, t)| {
            let fill = TankFill {
                volume_m3: t.volume,
                mass_kg: t.moments.zeroth,
            };
            (tank.path.clone(), fill)
        });
        let motions = self.motions().iter().zip(&state.motions);
        Ok(DrainStep {
            at,
            fills: fills.collect(),
            motions: motions.map(|(m, v)| (m.name.clone(), *v)).collect(),
            mass_kg: snapshot.total.zeroth,
            centre_of_mass_m: plain(centre),
            inertia_kg_m2: rows(&inertia),
        })
    }

    /// For each that is followed, the leg and place where it is least.
    fn follow(
        &self,
        legs: &[Leg],
        followed: &[Followed<'_>],
        steps: usize,
        stand: Option<&Stand>,
    ) -> Result<Vec<(usize, Least)>, Error> {
        let mut found: Vec<Option<(usize, Least)>> = vec![None; followed.len()];
        for (n, leg) in legs.iter().enumerate() {
            let mut samples = Samples::new(|s: f64| {
                let state = leg.at(s);
                let snapshot = self.at(&state)?;
                let values = followed.iter();
                let values = values.map(|f| self.followed(f, &state, &snapshot, stand));
                values.collect::<Result<Vec<f64>, Error>>()
            });
            for k in 0..=steps {
                samples.get(k as f64 / steps as f64, 0)?;
            }
            for ends in leg.corners.windows(2) {
                let (a, b) = (ends[0], ends[1]);
                let fastest = self.fastest(leg, a, b)?;
                for (k, f) in followed.iter().enumerate() {
                    let least = match f.slope(&fastest) {
                        Slope::AtMost(steepest) => {
                            // A share of what the figure could travel at most between the corners.
                            let allowed = 1e-4 * steepest * (b - a);
                            let least = samples.least(k, a, b, steepest, allowed)?;
                            // A margin that holds is looked at again until nothing can break it.
                            let open = matches!(f, Followed::Margin(_))
                                && least.value >= 0.0
                                && least.within > least.value;
                            if open {
                                let allowed = least.value.max(1e-3 * allowed);
                                samples.least(k, a, b, steepest, allowed)?
                            } else {
                                least
                            }
                        }
                        Slope::Unknown => {
                            let steepest = 1.5 * samples.steepest(k, a, b)?;
                            let allowed = 1e-4 * steepest * (b - a);
                            Least {
                                within: f64::INFINITY,
                                ..samples.least(k, a, b, steepest, allowed)?
                            }
                        }
                        Slope::Even => {
                            let (at_a, at_b) = (samples.get(a, k)?, samples.get(b, k)?);
                            let (at, value) = if at_a <= at_b { (a, at_a) } else { (b, at_b) };
                            Least {
                                at,
                                value,
                                within: 0.0,
                            }
                        }
                    };
                    let slot = &mut found[k];
                    let within = slot.map_or(0.0, |(_, l): (_, Least)| {
                        // What an earlier stretch could still hide, seen from the new least.
                        l.within - (l.value - least.value).max(0.0)
                    });
                    *slot = Some(match *slot {
                        Some((at, old)) if old.value <= least.value => {
                            let hidden = least.within - (least.value - old.value);
                            let within = old.within.max(hidden);
                            (at, Least { within, ..old })
                        }
                        _ => {
                            let within = least.within.max(within);
                            (n, Least { within, ..least })
                        }
                    });
                }
            }
        }
        // Every leg has corners at 0 and 1.
        Ok(found.into_iter().flatten().collect())
    }
}

fn massless(loaded: &Loaded) -> Error {
    Error::new(
        Kind::Empty,
        "nothing is left that has any mass",
        "state the mass of an [[item]], or add a [[part]]",
    )
    .in_file(&loaded.file.path)
}
