//! A state, and everything where it stands in it.

use nalgebra::{Matrix3, Vector3};

use super::super::file::Turn;
use super::super::resolve::{Piece, Weighed, around};
use super::super::smear::Smeared;
use super::super::sum;
use super::keys::MotionKind;
use super::{Extent, Service, Thing};
use crate::error::Error;
use crate::moments::liquid::{Pool, Surface};
use crate::moments::{Moments, Placement};
use crate::quantity::Quantity;

/// Everything that may differ while the things stay the same.
#[derive(Clone, Debug, PartialEq)]
pub struct State {
    /// Index of the case; none for the file as it is.
    pub case: Option<usize>,
    /// Volume of liquid in each tank, m³, in the order of [`Service::tanks`].
    pub fills: Vec<f64>,
    /// Value of each motion (m, rad, or a share of the path), in the order of
    /// [`Service::motions`].
    pub motions: Vec<f64>,
    /// Effective gravity in the assembly's axes, m/s²: a tilt of the whole is a turn of this
    /// vector the other way. None where there is none.
    pub effective: Option<Vector3<f64>>,
}

/// A thing where it stands.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Standing {
    /// Its number; [`Service::path`] names it.
    pub thing: usize,
    /// kg, kg m, kg m², in the assembly's axes.
    pub moments: Moments,
    /// Box along the assembly's axes, m.
    pub bounds: [[f64; 3]; 2],
}

/// A tank in a state.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct TankState {
    /// Whether the case has it.
    pub stands: bool,
    /// m³.
    pub volume: f64,
    /// Height of the free surface above the lowest point of the tank, along effective up, m; none
    /// where nothing is up.
    pub level: Option<f64>,
    /// The free surface in the assembly's frame: m², m, m⁴.
    pub surface: Option<Surface>,
    /// Mass moments of the liquid in the assembly's axes.
    pub moments: Moments,
    /// Its box, m; a point where it is empty.
    pub bounds: [[f64; 3]; 2],
}

/// The assembly in a state.
#[derive(Clone, Debug, PartialEq)]
pub struct Snapshot {
    /// What stands in it, in file order.
    pub things: Vec<Standing>,
    /// All tanks, in their order.
    pub tanks: Vec<TankState>,
    /// Mass moments of the whole, about its centre.
    pub total: Moments,
    /// Box around all of it, m.
    pub bounds: [[f64; 3]; 2],
    /// Mass with all growth allowances, kg; none where nothing carries one.
    pub predicted_kg: Option<f64>,
}

impl Service {
    /// Everything where it stands in a state. Fills and motions that the state does not hold are
    /// taken as zero.
    ///
    /// # Errors
    /// A partly filled tank where there is no effective gravity.
    pub fn at(&self, state: &State) -> Result<Snapshot, Error> {
        let tanks = (0..self.tanks.len()).map(|n| self.tank_at(n, state));
        let mut tanks = tanks.collect::<Result<Vec<_>, _>>()?;
        let mut things = Vec::with_capacity(self.things.len());
        for (n, thing) in self.things.iter().enumerate() {
            let Some(moved) = self.moved(thing, state) else {
                if let Extent::Tank(t) = thing.extent {
                    tanks[t].stands = false;
                }
                continue;
            };
            let (moments, bounds) = match (&thing.extent, &moved) {
                (Extent::Tank(t), _) => (tanks[*t].moments, tanks[*t].bounds),
                (_, None) => (thing.weighed.moments, thing.weighed.bounds),
                (_, Some(m)) => (thing.weighed.moments.placed(m), thing.bounds(m)),
            };
            things.push(Standing {
                thing: n,
                moments,
                bounds,
            });
        }
        self.smeared(&mut things)?;
        Ok(Snapshot {
            predicted_kg: self.predicted(&things),
            total: sum::total(things.iter().map(|t| &t.moments)),
            bounds: around(things.iter().map(|t| t.bounds)),
            things,
            tanks,
        })
    }

    /// Adds the smears over what stands.
    fn smeared(&self, things: &mut Vec<Standing>) -> Result<(), Error> {
        if self.smears.is_empty() {
            return Ok(());
        }
        let mut of: Vec<Option<Standing>> = vec![None; self.things.len()];
        for standing in things.iter() {
            of[standing.thing] = Some(*standing);
        }
        for (n, smear) in self.smears.iter().enumerate() {
            let covered: Vec<Standing> = smear.covers.iter().filter_map(|&c| of[c]).collect();
            // All that it covers is left out, and so is it.
            if covered.is_empty() {
                continue;
            }
            let over = sum::total(covered.iter().map(|s| &s.moments));
            things.push(Standing {
                thing: self.things.len() + n,
                moments: smear.moments(&over).ok_or_else(|| smear.unplaced())?,
                bounds: around(covered.iter().map(|s| s.bounds)),
            });
        }
        Ok(())
    }

    fn predicted(&self, things: &[Standing]) -> Option<f64> {
        if self.things.iter().all(|t| t.allowance == 0.0) {
            return None;
        }
        let mut factors = vec![1.0; self.things.len() + self.smears.len()];
        for (factor, thing) in factors.iter_mut().zip(&self.things) {
            *factor = 1.0 + thing.allowance;
        }
        for (n, smear) in self.smears.iter().enumerate().filter(|(_, s)| s.grows()) {
            let over = things.iter().filter(|s| smear.covers.contains(&s.thing));
            let (mut basic, mut grown) = (0.0, 0.0);
            for s in over {
                basic += s.moments.zeroth;
                grown += s.moments.zeroth * factors[s.thing];
            }
            factors[self.things.len() + n] = if basic > 0.0 { grown / basic } else { 1.0 };
        }
        let all = things.iter().map(|s| s.moments.zeroth * factors[s.thing]);
        Some(sum::sum(all))
    }

    /// The things of a state as they are reported, and what the smears among them cover.
    ///
    /// # Errors
    /// As [`Service::at`].
    pub fn weighed(&self, state: &State) -> Result<(Vec<Weighed>, Vec<Smeared>), Error> {
        let snapshot = self.at(state)?;
        let mut smeared = Vec::new();
        let place = |thing: usize| snapshot.things.iter().position(|s| s.thing == thing);
        let stood = snapshot.things.iter().enumerate().map(|(at, standing)| {
            let Some(thing) = self.things.get(standing.thing) else {
                let smear = &self.smears[standing.thing - self.things.len()];
                let covers = smear.covers.iter().filter_map(|&c| place(c)).collect();
                let (w, s) = smear.weighed(standing.moments, standing.bounds, at, covers);
                smeared.push(s);
                return w;
            };
            let mut w = thing.weighed.clone();
            if let Extent::Tank(t) = thing.extent {
                w.volume = Some(snapshot.tanks[t].volume);
                w.pieces = vec![Piece {
                    material: Some(self.tanks[t].liquid.clone()),
                    moments: standing.moments,
                }];
            } else if let Some(Some(m)) = self.moved(thing, state) {
                for piece in &mut w.pieces {
                    piece.moments = piece.moments.placed(&m);
                }
                for stand in &mut w.stands {
                    stand.placement = stand.placement.then(&m);
                }
            }
            w.moments = standing.moments;
            w.bounds = standing.bounds;
            w
        });
        let stood = stood.collect();
        Ok((stood, smeared))
    }

    /// The pools of every tank that stands and is partly filled, by the number of the tank. A tank
    /// of one pool is not among them.
    pub fn separate_pools(&self, state: &State) -> Vec<(usize, Vec<Pool>)> {
        let Some(effective) = state.effective else {
            return Vec::new();
        };
        let standing = self.things.iter().filter_map(|t| match t.extent {
            Extent::Tank(n) => self.moved(t, state).map(|_| n),
            _ => None,
        });
        standing
            .filter_map(|n| {
                let tank = &self.tanks[n];
                let placement = self.placement_of_tank(n, state);
                let up = placement.turn.transpose() * -effective.normalize();
                let levelled = tank.vessel.levelled(up);
                let h = levelled.level(fill_of(state, n));
                let mut pools = levelled.pools(h);
                for pool in &mut pools {
                    pool.centroid = placement.apply(&pool.centroid);
                }
                (pools.len() > 1).then_some((n, pools))
            })
            .collect()
    }

    /// How a thing has moved from where the file places it: `None` where it does not stand,
    /// `Some(None)` where it has not moved.
    pub(super) fn moved(&self, thing: &Thing, state: &State) -> Option<Option<Placement>> {
        let case = state.case.unwrap_or(self.keys.cases.len());
        let shift = thing.shifts[case]?;
        let mut all = Placement::identity();
        all.at = shift;
        let mut any = shift != Vector3::zeros();
        for &n in &thing.motions {
            let value = state.motions.get(n).copied().unwrap_or(0.0);
            if let Some(m) = placement(&self.keys.motions[n].kind, value) {
                all = all.then(&m);
                any = true;
            }
        }
        Some(any.then_some(all))
    }

    /// From the frame of a tank's mesh to the assembly's in a state; as the file places it where
    /// the case leaves the tank out.
    pub(super) fn placement_of_tank(&self, tank: usize, state: &State) -> Placement {
        let own = self.tanks[tank].placement;
        let thing = self.things.iter().find(|t| match t.extent {
            Extent::Tank(n) => n == tank,
            _ => false,
        });
        match thing.and_then(|t| self.moved(t, state)) {
            Some(Some(m)) => own.then(&m),
            _ => own,
        }
    }

    fn tank_at(&self, n: usize, state: &State) -> Result<TankState, Error> {
        let tank = &self.tanks[n];
        let whole = tank.capacity();
        let volume = fill_of(state, n).clamp(0.0, whole);
        let placement = self.placement_of_tank(n, state);
        let up = match state.effective {
            Some(g) => placement.turn.transpose() * -g.normalize(),
            // Full or empty, it is the same whatever is up.
            None if volume == 0.0 || volume == whole => placement.turn.transpose() * Vector3::z(),
            None => return Err(tank.no_up()),
        };
        let levelled = tank.vessel.levelled(up);
        let h = levelled.level(volume);
        let liquid = levelled.liquid(h, &placement.turn);
        let moments = liquid
            .moments
            .weighted(tank.liquid.density.value)
            .placed(&placement);
        let about = moments.about;
        let lift = |corner: [f64; 3]| (Vector3::from(corner) + placement.at).into();
        Ok(TankState {
            stands: true,
            volume,
            level: state.effective.map(|_| h - levelled.low()),
            surface: liquid.surface.map(|s| Surface {
                area: s.area,
                centroid: placement.apply(&s.centroid),
                second: placement.turn * s.second * placement.turn.transpose(),
            }),
            moments,
            bounds: liquid
                .bounds
                .map_or([about.into(), about.into()], |b| b.map(lift)),
        })
    }
}

fn fill_of(state: &State, tank: usize) -> f64 {
    state.fills.get(tank).copied().unwrap_or(0.0)
}

impl Thing {
    /// Its box after it has moved.
    fn bounds(&self, moved: &Placement) -> [[f64; 3]; 2] {
        if moved.turn == Matrix3::identity() {
            let shifted = |c: [f64; 3]| (Vector3::from(c) + moved.at).into();
            return self.weighed.bounds.map(shifted);
        }
        let stands = self.placement.then(moved);
        match &self.extent {
            Extent::Shape(shape) => {
                let half = shape.half_extent(&stands.turn);
                [(stands.at - half).into(), (stands.at + half).into()]
            }
            Extent::Bodies(bodies) => {
                let turned = around(bodies.iter().map(|b| b.bounds_turned(&stands.turn)));
                turned.map(|c| (Vector3::from(c) + stands.at).into())
            }
            Extent::Tank(_) => self.weighed.bounds,
        }
    }
}

/// What a motion does at a value; none where it does nothing.
fn placement(kind: &MotionKind, value: f64) -> Option<Placement> {
    if value == 0.0 {
        return None;
    }
    let identity = Placement::identity();
    Some(match kind {
        MotionKind::Along(axis) => Placement {
            at: axis * value,
            ..identity
        },
        MotionKind::Turn { axis, at } => {
            let turn = Turn {
                axis: *axis,
                angle: Quantity::exact(value),
            }
            .matrix();
            Placement {
                turn,
                at: at - turn * at,
            }
        }
        MotionKind::Through(places) => Placement {
            at: along(places, value) - places[0],
            ..identity
        },
    })
}

/// The point at a share of the length of a line through positions.
fn along(places: &[Vector3<f64>], share: f64) -> Vector3<f64> {
    let lengths: Vec<f64> = places.windows(2).map(|w| (w[1] - w[0]).norm()).collect();
    let whole: f64 = lengths.iter().sum();
    let mut left = share.clamp(0.0, 1.0) * whole;
    for (leg, length) in places.windows(2).zip(&lengths) {
        if left <= *length && *length > 0.0 {
            return leg[0] + (leg[1] - leg[0]) * (left / length);
        }
        left -= length;
    }
    places[places.len() - 1]
}

/// The shares of the way at which a line through positions has its corners, ends left out.
pub(super) fn corners(kind: &MotionKind) -> Vec<f64> {
    let MotionKind::Through(places) = kind else {
        return Vec::new();
    };
    let lengths: Vec<f64> = places.windows(2).map(|w| (w[1] - w[0]).norm()).collect();
    let whole: f64 = lengths.iter().sum();
    let mut at = 0.0;
    let mut out = Vec::new();
    for length in &lengths[..lengths.len() - 1] {
        at += length / whole;
        if at > 0.0 && at < 1.0 {
            out.push(at);
        }
    }
    out
}
