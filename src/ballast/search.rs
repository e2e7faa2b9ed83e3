//! One search for ballast over given states and a given set of limits.

use super::branch::{Best, Program};
use super::row::{Demand, Forms, Row, laden};
use super::{Place, State, local};
use crate::limits::{End, Limit, Verdict};

/// A place without a stated most takes up to this many times the mass of the whole.
const MOST_TIMES: f64 = 1000.0;
/// Convex programs of one search.
const NODES: usize = 5000;

/// What a search works on.
pub(super) struct Task<'a> {
    pub(super) places: &'a [Place],
    pub(super) limits: &'a [Limit],
    pub(super) states: &'a [State],
    /// Which limits count.
    pub(super) keep: &'a [bool],
    /// Standard deviations that each margin must leave.
    pub(super) factor: Option<f64>,
    pub(super) diagonal: f64,
}

/// What was found.
#[derive(Clone, Debug)]
pub(super) struct Found {
    pub(super) best: Option<Best>,
    /// No ballast is lighter than this.
    pub(super) bound: f64,
    pub(super) branched: bool,
    /// Not all of it is proved: not convex, or a program was not solved.
    pub(super) local: bool,
}

impl Task<'_> {
    /// The size of masses here.
    pub(super) fn mass(&self) -> f64 {
        self.states
            .iter()
            .fold(f64::MIN_POSITIVE, |m, s| m.max(s.moments.zeroth.abs()))
    }

    pub(super) fn most(&self) -> Vec<f64> {
        let cap = MOST_TIMES * self.mass();
        let of = |p: &Place| {
            let most = p.most.unwrap_or(cap);
            p.step.map_or(most, |s| (most / s + 1e-9).floor() * s)
        };
        self.places.iter().map(of).collect()
    }

    /// Demands of the limits that count; margins of certainty of what is not linear are those at
    /// `near`.
    pub(super) fn demands(&self, near: &[f64]) -> Vec<Demand> {
        let mut out = Vec::new();
        for (s, state) in self.states.iter().enumerate() {
            let forms = Forms {
                state,
                places: self.places,
                sure: self.factor,
                size: self.diagonal,
            };
            for (l, limit) in self
                .limits
                .iter()
                .enumerate()
                .filter(|(l, _)| self.keep[*l] && state.asks(*l))
            {
                let equality = limit.from.is_some() && limit.from == limit.to;
                for end in [End::From, End::To] {
                    let Some(mut d) = forms.demand(limit, end, (l, s)) else {
                        continue;
                    };
                    let spread = self.spread(limit, state, end, near);
                    for row in d.any.iter_mut().flatten() {
                        row.equality = equality;
                        if !row.sure {
                            row.t.constant -= spread * row.loosened(near).max(0.0);
                        }
                    }
                    out.push(d);
                }
            }
        }
        out
    }

    /// The margin that certainty asks for, in the limit's unit, to first order at `x`.
    pub(super) fn spread(&self, limit: &Limit, state: &State, end: End, x: &[f64]) -> f64 {
        let Some(k) = self.factor else { return 0.0 };
        let m = laden(state, self.places, x);
        let Some(g) = limit.margin_gradient(&m, end) else {
            return 0.0;
        };
        let mut sum: f64 = state.drivers.iter().map(|d| g.of(d).powi(2)).sum();
        for (p, x) in self.places.iter().zip(x) {
            let per_kg = g.of(&p.per_kg);
            sum += (per_kg * p.relative * x).powi(2);
            if *x > 0.0 {
                sum += (per_kg * p.absolute).powi(2);
            }
        }
        k * sum.sqrt()
    }

    /// Whether every limit that counts holds in exact figures, with its margin of certainty.
    pub(super) fn holds(&self, x: &[f64]) -> bool {
        self.states.iter().all(|s| {
            let m = laden(s, self.places, x);
            let limits = self.limits.iter().enumerate();
            let mut limits = limits.filter(|(n, _)| self.keep[*n] && s.asks(*n));
            limits.all(|(_, l)| {
                if l.judge_whole(&m, self.diagonal).verdict != Verdict::Holds {
                    return false;
                }
                [End::From, End::To].iter().all(|&end| {
                    let spread = self.spread(l, s, end, x);
                    let slip = l.quantity.rounding(&m, self.diagonal) + 1e-9 * spread;
                    spread == 0.0 || l.margin(&m, end).is_none_or(|g| g - spread >= -slip)
                })
            })
        })
    }

    pub(super) fn program<'p>(
        &self,
        demands: &'p [Demand],
        accept: &'p dyn Fn(&[f64]) -> bool,
    ) -> Program<'p> {
        Program {
            cost: vec![1.0; self.places.len()],
            lo: vec![0.0; self.places.len()],
            hi: self.most(),
            step: self.places.iter().map(|p| p.step).collect(),
            least: self.places.iter().map(|p| p.least).collect(),
            rows: Vec::<Row>::new(),
            demands,
            mass: self.mass(),
            most_nodes: NODES,
            accept,
        }
    }

    /// The least ballast.
    pub(super) fn solve(&self) -> Found {
        let mut near = vec![0.0; self.places.len()];
        let mut found = self.solve_near(&near);
        if self.factor.is_none() {
            return found;
        }
        // Margins of certainty of cones depend on the answer: a few rounds settle them.
        for _ in 0..12 {
            let Some(best) = &found.best else {
                return found;
            };
            let moved = best
                .x
                .iter()
                .zip(&near)
                .fold(0.0_f64, |m, (a, b)| m.max((a - b).abs()));
            if moved <= 1e-10 * self.mass() {
                break;
            }
            near.clone_from(&best.x);
            found = self.solve_near(&near);
        }
        found
    }

    fn solve_near(&self, near: &[f64]) -> Found {
        let demands = self.demands(near);
        let checked = demands.iter().any(|d| d.checked);
        // Certainty at the last round's masses is not certainty at these: rows only, then.
        let exact = |x: &[f64]| self.holds(x);
        let mean = Task {
            factor: None,
            ..*self
        };
        let rounded = |x: &[f64]| {
            // What is not convex is judged at the end.
            (checked || mean.holds(x))
                && demands.iter().all(|d| {
                    d.any.iter().any(|list| {
                        list.iter()
                            .all(|r| r.slack(x) >= -1e-9 * r.size(self.mass()))
                    })
                })
        };
        if !checked && self.factor.is_none() {
            let s = self.program(&demands, &exact).search();
            return Found {
                best: s.best,
                bound: s.bound,
                branched: s.branched,
                local: s.unsure,
            };
        }
        let s = self.program(&demands, &rounded).search();
        let holds = s
            .best
            .as_ref()
            .is_some_and(|b| !checked || self.holds(&b.x));
        if holds || (s.best.is_none() && !s.unsure) {
            return Found {
                best: s.best,
                bound: s.bound,
                branched: s.branched,
                local: s.unsure,
            };
        }
        let best = local::search(self, &demands, s.best.as_ref().map(|b| b.x.as_slice()));
        Found {
            best,
            bound: s.bound,
            branched: s.branched,
            local: true,
        }
    }
}
