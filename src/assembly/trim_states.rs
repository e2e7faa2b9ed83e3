//! The situations in which the limits of `trim` must hold: the file as it stands, its cases, its
//! phases, and slopes with the liquid level there.

use nalgebra::Vector3;

use super::load::Loaded;
use super::resolve::Resolved;
use super::service::{self, Leg, Service};
use super::sure::Sure;
use crate::ballast::{InPhase, Place, State};
use crate::error::Result;
use crate::limits::{End, Limit, Measured};
use crate::moments::Moments;

/// Steps of a phase that are asked of at once.
const COARSE: usize = 8;
/// Steps of a phase in which an answer is looked at again.
const FINE: usize = 200;
/// Golden sections towards the worst between two of them.
const SECTIONS: usize = 40;

/// The states of an assembly, and what they are made of.
pub struct Situations<'a> {
    loaded: &'a Loaded,
    resolved: &'a Resolved,
    service: &'a Service,
    legs: Vec<Leg>,
    /// Limits with what growth takes of them.
    limits: Vec<Limit>,
    /// What growth adds at most, kg.
    growth: f64,
    /// Names of the sources of error in the order of every state's drivers; none where certainty
    /// is not asked for.
    sources: Option<Vec<String>>,
    states: Vec<State>,
}

impl<'a> Situations<'a> {
    /// Every situation that the file names. `sure`: with what its tolerances do in each.
    ///
    /// # Errors
    /// As [`Service::rest`] and [`Service::at`].
    pub fn of(
        loaded: &'a Loaded,
        resolved: &'a Resolved,
        service: &'a Service,
        sure: bool,
    ) -> Result<Self> {
        let rest = service.rest(None)?;
        let legs = if service.phases().is_empty() {
            Vec::new()
        } else {
            service.legs(&rest)?
        };
        let mut all = Self {
            loaded,
            resolved,
            service,
            legs,
            limits: loaded.file.limits.clone(),
            growth: 0.0,
            sources: sure.then(Vec::new),
            states: Vec::new(),
        };
        let alone = service.cases().is_empty() && all.legs.is_empty();
        let mut asked = vec![(if alone { "" } else { "as filed" }.to_owned(), rest)];
        for (n, case) in service.cases().iter().enumerate() {
            asked.push((case.name.clone(), service.rest(Some(n))?));
        }
        for leg in &all.legs {
            let mut at = leg.corners.clone();
            at.extend((0..=COARSE).map(|k| k as f64 / COARSE as f64));
            at.sort_by(f64::total_cmp);
            at.dedup();
            asked.extend(at.into_iter().map(|s| (leg.name.clone(), leg.at(s))));
        }
        let mut growth: f64 = 0.0;
        for (_, state) in &asked {
            let snapshot = service.at(state)?;
            let predicted = snapshot.predicted_kg.unwrap_or(snapshot.total.zeroth);
            growth = growth.max(predicted - snapshot.total.zeroth);
        }
        // Limits on mass are held against the predicted mass; ballast does not grow.
        for limit in &mut all.limits {
            if limit.quantity == Measured::Mass {
                limit.to = limit.to.map(|to| to - growth);
            }
        }
        all.growth = growth;
        for (name, state) in asked {
            let states = all.with_slopes(&name, &state)?;
            all.states.extend(states);
        }
        all.line_up();
        Ok(all)
    }

    /// The limits to hold.
    pub fn limits(&self) -> &[Limit] {
        &self.limits
    }

    /// What a limit on mass was held against, as the file states it: the predicted mass.
    pub fn restore(&self, rows: &mut [InPhase]) {
        for row in rows.iter_mut().map(|r| &mut r.judged) {
            if self.growth > 0.0 && row.quantity == Measured::Mass.name() {
                row.to = row.to.map(|to| to + self.growth);
                if row.nearest == End::To {
                    row.basic = Some(row.value);
                    row.value += self.growth;
                }
            }
        }
    }

    /// The states to begin with.
    pub fn states(&self) -> Vec<State> {
        self.states.clone()
    }

    /// States between the steps of the phases in which an answer does not hold, each limit's worst.
    ///
    /// # Errors
    /// As [`Service::at`].
    pub fn broken(&mut self, places: &[Place], x: &[f64], diagonal: f64) -> Result<Vec<State>> {
        let mut out = Vec::new();
        for leg in 0..self.legs.len() {
            for (n, limit) in self.limits.clone().iter().enumerate() {
                // A slope is looked at in the states that it is asked of.
                if matches!(limit.quantity, Measured::Tip(_)) && self.levels() {
                    continue;
                }
                let margin = |s: f64| -> Result<f64> {
                    let total = self.service.at(&self.legs[leg].at(s))?.total;
                    let laden = places
                        .iter()
                        .zip(x)
                        .fold(total, |m, (p, x)| m.plus(&p.per_kg.weighted(*x)));
                    let judged = limit.judge_whole(&laden, diagonal);
                    Ok(if judged.margin.is_nan() {
                        f64::NEG_INFINITY
                    } else {
                        judged.margin
                    })
                };
                let worst = least(&margin)?;
                // What the answer was solved to, of the limit's own size.
                let scale = limit.to.or(limit.from).map_or(1.0, f64::abs);
                if worst.1 < -1e-9 * scale.max(1e-6) {
                    let name = self.legs[leg].name.clone();
                    let state = self.legs[leg].at(worst.0);
                    let mut state = self.state(&name, &state)?;
                    state.only = Some(vec![n]);
                    out.push(state);
                }
            }
        }
        if let Some(sources) = &self.sources {
            for state in &mut out {
                state
                    .drivers
                    .resize(sources.len(), Moments::zero(state.moments.about));
            }
        }
        Ok(out)
    }

    /// Whether liquid finds its level at every slope.
    fn levels(&self) -> bool {
        !self.service.tanks().is_empty()
    }

    /// A state, and for limits on slopes one with the liquid level at each of them: it stands at a
    /// slope exactly when its centre, level there, lies above the supports.
    fn with_slopes(&mut self, name: &str, state: &service::State) -> Result<Vec<State>> {
        let mut upright = self.state(name, state)?;
        let (Some(stand), true) = (&self.loaded.file.stand, self.levels()) else {
            return Ok(vec![upright]);
        };
        let up = stand.up();
        let mut out = Vec::new();
        let mut plain = Vec::new();
        for (n, limit) in self.limits.clone().iter().enumerate() {
            let (Measured::Tip(tip), Some(slope)) = (&limit.quantity, limit.from) else {
                plain.push(n);
                continue;
            };
            for edge in &tip.edges {
                let towards = tip.towards.unwrap_or(edge.outward);
                let level = towards - up * up.dot(&towards);
                let down: Vector3<f64> = level.normalize() * slope.sin() - up * slope.cos();
                let size = state.effective.map_or(1.0, |g| g.norm());
                let leaning = service::State {
                    effective: Some(down * size),
                    ..state.clone()
                };
                let mut leaning = self.state(name, &leaning)?;
                leaning.only = Some(vec![n]);
                out.push(leaning);
            }
        }
        upright.only = Some(plain);
        out.insert(0, upright);
        Ok(out)
    }

    fn state(&mut self, name: &str, state: &service::State) -> Result<State> {
        let moments = self.service.at(state)?.total;
        let mut drivers = Vec::new();
        if let Some(sources) = &mut self.sources {
            let (weighed, smears) = self.service.weighed(state)?;
            let stood = Resolved {
                weighed,
                smears,
                state: Some(state.clone()),
                ..self.resolved.clone()
            };
            let of = Sure::of(self.loaded, &stood, &moments);
            drivers = vec![Moments::zero(moments.about); sources.len()];
            for (name, moved) in of.iter().flat_map(Sure::drivers) {
                let at = sources.iter().position(|s| *s == name);
                let at = at.unwrap_or_else(|| {
                    sources.push(name);
                    drivers.push(Moments::zero(moments.about));
                    sources.len() - 1
                });
                drivers[at] = moved;
            }
        }
        Ok(State {
            phase: name.to_owned(),
            moments,
            drivers,
            only: None,
        })
    }

    /// Sources that came up late move nothing in the states before.
    fn line_up(&mut self) {
        let Some(sources) = &self.sources else { return };
        for state in &mut self.states {
            let about = state.moments.about;
            state.drivers.resize(sources.len(), Moments::zero(about));
        }
    }
}

/// Where a function of the way is least, and how much it is there: the least of fine steps, refined
/// by golden sections between its neighbours.
fn least(f: &dyn Fn(f64) -> Result<f64>) -> Result<(f64, f64)> {
    let step = 1.0 / FINE as f64;
    let mut best = (0.0, f64::INFINITY);
    for k in 0..=FINE {
        let s = k as f64 * step;
        let value = f(s)?;
        if value < best.1 {
            best = (s, value);
        }
    }
    let golden = (5.0_f64.sqrt() - 1.0) / 2.0;
    let (mut a, mut b) = ((best.0 - step).max(0.0), (best.0 + step).min(1.0));
    for _ in 0..SECTIONS {
        let (c, d) = (b - golden * (b - a), a + golden * (b - a));
        let (at_c, at_d) = (f(c)?, f(d)?);
        for (s, value) in [(c, at_c), (d, at_d)] {
            if value < best.1 {
                best = (s, value);
            }
        }
        if at_c < at_d {
            b = d;
        } else {
            a = c;
        }
    }
    Ok(best)
}
