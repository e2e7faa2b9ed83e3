//! Limits that are not convex: many starts, each followed by linear models within a trust region.

use super::branch::Best;
use super::certain::uniforms;
use super::row::{Affine, Demand, Row, laden};
use super::search::Task;
use crate::limits::End;

/// Starts beside that of the convex part.
const STARTS: usize = 24;
/// Steps from one start.
const STEPS: usize = 80;
/// Programs of one step.
const NODES: usize = 100;
/// What a unit of breach costs against a unit of ballast.
const PENALTY: f64 = 1e3;

/// The lightest ballast found that holds in exact figures.
///
/// From each start a sequence of programs with the margins that are not convex put linear at the
/// last answer (by their exact gradients), in a region that shrinks where the model fails:
/// sequential linear programming with an exact penalty (Fletcher & Sainz de la Maza 1989). Starts
/// are answers of the convex part for seeded random costs, so that every region holds one.
pub(super) fn search(task: &Task<'_>, demands: &[Demand], first: Option<&[f64]>) -> Option<Best> {
    let n = task.places.len();
    let always = |_: &[f64]| true;
    let mut starts: Vec<Vec<f64>> = first.map(<[f64]>::to_vec).into_iter().collect();
    let random = uniforms(0x0b15_3a2c, STARTS * n);
    for k in 0..STARTS {
        let mut p = task.program(demands, &always);
        // Some pull towards more ballast, some towards less.
        p.cost = (0..n).map(|j| 1.5 * random[k * n + j] - 0.75).collect();
        p.hi =
            p.hi.iter()
                .map(|h| h.min(task.mass() * if k % 2 == 0 { 1.0 } else { 0.1 }))
                .collect();
        for (h, s) in p.hi.iter_mut().zip(&p.step) {
            if let Some(s) = s {
                *h = (*h / s + 1e-9).floor() * s;
            }
        }
        p.most_nodes = NODES;
        starts.extend(p.search().best.map(|b| b.x));
    }
    let mut best: Option<Best> = None;
    for x in starts {
        if let Some(b) = descend(task, demands, x)
            && best.as_ref().is_none_or(|o| b.cost < o.cost)
        {
            best = Some(b);
        }
    }
    best
}

/// A margin that is not convex, over its own size.
struct Curved<'d> {
    demand: &'d Demand,
    scale: f64,
}

impl Curved<'_> {
    fn value(&self, task: &Task<'_>, x: &[f64]) -> f64 {
        let d = self.demand;
        let (state, limit) = (&task.states[d.state], &task.limits[d.limit]);
        let m = laden(state, task.places, x);
        // What has no value is as bad as a breach of the whole size.
        let margin = limit.margin(&m, d.end).unwrap_or(-self.scale);
        (margin - task.spread(limit, state, d.end, x)) / self.scale
    }

    /// The linear model at `x`, with a place of its own for what it may be short of.
    fn row(&self, task: &Task<'_>, x: &[f64], own: usize, all: usize, mass: f64) -> Option<Row> {
        let d = self.demand;
        let m = laden(&task.states[d.state], task.places, x);
        let g = task.limits[d.limit].margin_gradient(&m, d.end)?;
        let mut slope: Vec<f64> = task
            .places
            .iter()
            .map(|p| g.of(&p.per_kg) / self.scale)
            .collect();
        let at: f64 = slope.iter().zip(x).map(|(a, x)| a * x).sum();
        slope.resize(all, 0.0);
        slope[own] = 1.0 / mass;
        Some(Row {
            t: Affine {
                constant: self.value(task, x) - at - 1e-10,
                slope,
            },
            v: Vec::new(),
            loosen_t: Affine::constant(all, 1.0 / self.scale),
            loosen_v: Vec::new(),
            of: (d.limit, d.state),
            sure: true,
            equality: false,
        })
    }
}

fn padded(row: &Row, all: usize) -> Row {
    let mut row = row.clone();
    let affines = std::iter::once(&mut row.t)
        .chain(&mut row.v)
        .chain(std::iter::once(&mut row.loosen_t))
        .chain(&mut row.loosen_v);
    affines.for_each(|a| a.slope.resize(all, 0.0));
    row
}

fn descend(task: &Task<'_>, demands: &[Demand], start: Vec<f64>) -> Option<Best> {
    let n = task.places.len();
    let mass = task.mass();
    let curved: Vec<Curved<'_>> = demands
        .iter()
        .filter(|d| d.checked)
        .map(|d| {
            let limit = &task.limits[d.limit];
            let state = &task.states[d.state];
            let m = laden(state, task.places, &start);
            let here = limit.margin(&m, d.end).unwrap_or(0.0).abs();
            let value = limit.quantity.value(&m).unwrap_or(0.0).abs();
            let bound = match d.end {
                End::From => limit.from,
                End::To => limit.to,
            };
            let scale = here
                .max(value)
                .max(bound.unwrap_or(0.0).abs())
                .max(f64::MIN_POSITIVE);
            Curved { demand: d, scale }
        })
        .collect();
    let all = n + curved.len();
    let padded: Vec<Demand> = demands
        .iter()
        .map(|d| Demand {
            any: d
                .any
                .iter()
                .map(|l| l.iter().map(|r| padded(r, all)).collect())
                .collect(),
            ..d.clone()
        })
        .collect();
    let merit = |x: &[f64]| {
        let short: f64 = curved.iter().map(|c| (-c.value(task, x)).max(0.0)).sum();
        x.iter().sum::<f64>() + PENALTY * mass * short
    };
    let always = |_: &[f64]| true;
    let plain = task.program(&padded, &always);
    let mut x = start;
    let mut now = merit(&x);
    let mut radius = 0.25 * mass;
    let mut last: Option<(Vec<Row>, Vec<Vec<f64>>)> = None;
    for _ in 0..STEPS {
        let mut p = task.program(&padded, &always);
        p.most_nodes = NODES;
        p.rows = curved
            .iter()
            .enumerate()
            .map(|(i, c)| c.row(task, &x, n + i, all, mass))
            .collect::<Option<Vec<_>>>()?;
        p.cost.resize(all, PENALTY);
        p.step.resize(all, None);
        p.least.resize(all, 0.0);
        p.lo = x.iter().map(|x| (x - radius).max(0.0)).collect();
        p.hi = x
            .iter()
            .zip(&plain.hi)
            .map(|(x, h)| (x + radius).min(*h))
            .collect();
        p.lo.resize(all, 0.0);
        let worst = curved
            .iter()
            .map(|c| c.value(task, &x).abs())
            .fold(1.0, f64::max);
        p.hi.resize(all, 1e4 * worst * mass);
        let Some(step) = p.search().best else {
            radius *= 0.25;
            if radius < 1e-11 * mass {
                break;
            }
            continue;
        };
        let next = step.x[..n].to_vec();
        let moved = next
            .iter()
            .zip(&x)
            .fold(0.0_f64, |m, (a, b)| m.max((a - b).abs()));
        let then = merit(&next);
        if then < now {
            x = next;
            now = then;
            radius *= 2.0;
            last = Some((step.rows, step.dual));
        } else {
            radius = 0.25 * radius.min(moved.max(1e-12 * mass));
        }
        if radius < 1e-11 * mass || moved == 0.0 {
            break;
        }
    }
    let tiny = 1e-12 * mass;
    let snapped: Vec<f64> = x
        .iter()
        .map(|x| if *x <= tiny { 0.0 } else { *x })
        .collect();
    let x = [snapped, x].into_iter().find(|x| task.holds(x))?;
    let (rows, dual) = last.unwrap_or_default();
    Some(Best {
        cost: x.iter().sum(),
        rows: rows.into_iter().map(|r| cut(r, n)).collect(),
        x,
        dual,
    })
}

fn cut(mut row: Row, n: usize) -> Row {
    let affines = std::iter::once(&mut row.t)
        .chain(&mut row.v)
        .chain(std::iter::once(&mut row.loosen_t))
        .chain(&mut row.loosen_v);
    affines.for_each(|a| a.slope.truncate(n));
    row
}
