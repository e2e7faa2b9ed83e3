//! The whole answer: least ballast over all states, worst ones added as they are found.

use super::branch::Best;
use super::row::laden;
use super::search::{Found, Task};
use super::{
    Binding, InPhase, Outcome, Place, Placed, Problem, Proof, Sampled, State, Trimmed, certain,
};
use crate::error::{Error, Kind, Result};
use crate::limits::Limit;

/// Rounds of adding worst states.
const ROUNDS: usize = 60;
/// The most places, and limits times states.
const MOST: usize = 2000;
/// Samples that check a certainty.
const SAMPLES: u32 = 100_000;

/// The least ballast with which every limit holds in every state.
///
/// `worst` is asked about an answer (masses in the order of the places) and gives the states in
/// which it does not hold, such as those between two steps of a phase; they are added and it is
/// solved again until there is none.
///
/// # Errors
/// `usage` without places or limits, or for a place that cannot be; `too-large` for more than 2000
/// places or rows; those of `worst`.
pub fn trim(
    problem: &Problem,
    worst: &mut dyn FnMut(&[f64]) -> Result<Vec<State>>,
) -> Result<Trimmed> {
    check(problem)?;
    let mut states = problem.states.clone();
    let keep = vec![true; problem.limits.len()];
    let nothing = vec![0.0; problem.places.len()];
    let mut factor = problem.sure.map(|s| {
        // Bonferroni: the chances of all rows to break add up to no more than what is left.
        let rows = 2 * problem.limits.len() * states.len();
        certain::factor((1.0 - s.probability) / rows as f64)
    });
    let mut rounds = 0;
    let mut tightened = 0;
    loop {
        let task = Task {
            places: &problem.places,
            limits: &problem.limits,
            states: &states,
            keep: &keep,
            factor,
            diagonal: problem.diagonal,
        };
        let already = task.holds(&nothing);
        let found = if already {
            let best = Best {
                x: nothing.clone(),
                cost: 0.0,
                rows: Vec::new(),
                dual: Vec::new(),
            };
            Found {
                best: Some(best),
                bound: 0.0,
                branched: false,
                local: false,
            }
        } else {
            task.solve()
        };
        let Some(best) = &found.best else {
            let conflict = conflict(&task);
            let before = judged(&task, &states, &nothing);
            return Ok(Trimmed {
                outcome: Outcome::Impossible,
                proof: proof(&found),
                gap_kg: None,
                ballast: Vec::new(),
                total_kg: None,
                before,
                after: Vec::new(),
                binding: Vec::new(),
                conflict,
                sampled: None,
            });
        };
        let x = without_traces(&task, best.x.clone());
        let more = worst(&x)?;
        if !more.is_empty() {
            rounds += 1;
            if rounds >= ROUNDS {
                return Err(Error::new(
                    Kind::TooLarge,
                    format!(
                        "after {ROUNDS} rounds there still are states in which a limit is broken"
                    ),
                    "walk the phases in finer steps",
                ));
            }
            states.extend(more);
            continue;
        }
        let sampled = problem.sure.map(|s| Sampled {
            n: SAMPLES,
            seed: s.seed,
            held: certain::sampled(
                &problem.limits,
                &states,
                &problem.places,
                &x,
                problem.diagonal,
                (SAMPLES, s.seed),
            ),
        });
        if let (Some(s), Some(r), Some(k)) = (problem.sure, sampled, factor.as_mut()) {
            // What is not linear may fall short of what its tangent promised.
            let p = s.probability;
            let noise = 3.0 * (p * (1.0 - p) / f64::from(SAMPLES)).sqrt();
            if r.held < p - noise && tightened < 8 {
                tightened += 1;
                *k *= 1.1;
                continue;
            }
        }
        let outcome = if already {
            Outcome::HoldsAlready
        } else {
            Outcome::Found
        };
        let total: f64 = x.iter().sum();
        let known = found.bound.is_finite() && !found.local;
        return Ok(Trimmed {
            outcome,
            proof: proof(&found),
            gap_kg: (known || already).then(|| (total - found.bound.min(total)).max(0.0)),
            ballast: placed(&problem.places, &x),
            total_kg: Some(total),
            before: judged(&task, &states, &nothing),
            after: judged(&task, &states, &x),
            binding: binding(&task, best),
            conflict: Vec::new(),
            sampled,
        });
    }
}

fn proof(found: &Found) -> Proof {
    if found.local {
        Proof::Local
    } else if found.branched {
        Proof::Gap
    } else {
        Proof::Dual
    }
}

/// An answer without what the solver leaves of places that need nothing, where it holds so.
fn without_traces(task: &Task<'_>, x: Vec<f64>) -> Vec<f64> {
    let least = 1e-8 * x.iter().sum::<f64>();
    let plain: Vec<f64> = x
        .iter()
        .map(|m| if *m < least { 0.0 } else { *m })
        .collect();
    if plain != x && task.holds(&plain) {
        plain
    } else {
        x
    }
}

fn check(problem: &Problem) -> Result<()> {
    let usage = |message: String, advice: &str| Err(Error::new(Kind::Usage, message, advice));
    if problem.places.is_empty() {
        return usage(
            "there is no place that ballast may go to".into(),
            "state places with [[ballast]]",
        );
    }
    if problem.limits.is_empty() || problem.states.is_empty() {
        return usage(
            "there is no limit that ballast could be for".into(),
            "state limits with [[limit]]",
        );
    }
    if problem.places.len() > MOST || problem.limits.len() * problem.states.len() > MOST {
        let rows = problem.limits.len() * problem.states.len();
        return Err(Error::new(
            Kind::TooLarge,
            format!(
                "{} places and {rows} limits over all states",
                problem.places.len()
            ),
            format!("stay within {MOST} of each"),
        ));
    }
    for p in &problem.places {
        let most = p.most.unwrap_or(f64::MAX);
        let good = p.least.is_finite() && p.least >= 0.0 && most >= p.least && most.is_finite();
        if !good || p.step.is_some_and(|s| !(s > 0.0 && s.is_finite())) {
            return usage(
                format!("the masses of the place `{}` cannot be", p.name),
                "0 ≤ least ≤ most, and a step above 0",
            );
        }
    }
    if problem
        .sure
        .is_some_and(|s| !(0.5..1.0).contains(&s.probability))
    {
        return usage(
            "a certainty is from 50 % to below 100 %".into(),
            "ask for 95 % or the like",
        );
    }
    Ok(())
}

/// A set of limits without any ballast for it, of which no one can be left out: limits are taken
/// away one by one, and stay away where it is still impossible without them (deletion filter,
/// Chinneck & Dravnieks 1991).
fn conflict(task: &Task<'_>) -> Vec<String> {
    let mut keep = task.keep.to_vec();
    // Limits of one name go and stay together.
    let names: Vec<&str> = {
        let mut names: Vec<&str> = Vec::new();
        for l in task.limits {
            if !names.contains(&l.name.as_str()) {
                names.push(&l.name);
            }
        }
        names
    };
    let mut kept: Vec<String> = Vec::new();
    for name in names {
        let without: Vec<bool> = task
            .limits
            .iter()
            .zip(&keep)
            .map(|(l, k)| *k && l.name != name)
            .collect();
        let rest = Task {
            keep: &without,
            ..*task
        };
        let possible = !without.contains(&true) || rest.solve().best.is_some();
        if possible {
            kept.push(name.to_owned());
        } else {
            keep = without;
        }
    }
    kept
}

/// Each limit in the state in which its margin is least.
fn judged(task: &Task<'_>, states: &[State], x: &[f64]) -> Vec<InPhase> {
    let of = |(n, limit): (usize, &Limit)| {
        let all = states.iter().filter(|s| s.asks(n)).map(|s| {
            let m = laden(s, task.places, x);
            let phase = (!s.phase.is_empty()).then(|| s.phase.clone());
            InPhase {
                judged: limit.judge_whole(&m, task.diagonal),
                phase,
            }
        });
        // No value is worse than any.
        let key = |j: &InPhase| {
            if j.judged.margin.is_nan() {
                f64::NEG_INFINITY
            } else {
                j.judged.margin
            }
        };
        all.min_by(|a, b| key(a).total_cmp(&key(b)))
    };
    task.limits.iter().enumerate().filter_map(of).collect()
}

fn placed(places: &[Place], x: &[f64]) -> Vec<Placed> {
    let some = places.iter().zip(x).filter(|(_, x)| **x > 0.0);
    some.map(|(p, x)| {
        let at = p.per_kg.centre().unwrap_or(p.per_kg.about);
        Placed {
            place: p.name.clone(),
            at_m: [at.x + 0.0, at.y + 0.0, at.z + 0.0],
            mass_kg: *x,
            units: p.step.map(|s| (x / s).round() as u64),
        }
    })
    .collect()
}

fn binding(task: &Task<'_>, best: &Best) -> Vec<Binding> {
    let mass = task.mass();
    let mut out: Vec<((usize, usize), Binding)> = Vec::new();
    for (row, dual) in best.rows.iter().zip(&best.dual) {
        if row.slack(&best.x).abs() > 1e-8 * row.size(mass) {
            continue;
        }
        let price = row.price(&best.x, dual);
        let price = if dual[0] * row.size(mass) > 1e-7 * mass {
            price
        } else {
            0.0
        };
        match out.iter_mut().find(|(of, _)| *of == row.of) {
            Some((_, b)) => b.price += price,
            None => {
                let limit = &task.limits[row.of.0];
                let phase = &task.states[row.of.1].phase;
                out.push((
                    row.of,
                    Binding {
                        limit: limit.name.clone(),
                        quantity: limit.quantity.name(),
                        phase: (!phase.is_empty()).then(|| phase.clone()),
                        price,
                        unit: limit.quantity.unit(),
                    },
                ));
            }
        }
    }
    let mut out: Vec<Binding> = out.into_iter().map(|(_, b)| b).collect();
    for (j, p) in task.places.iter().enumerate() {
        let full = p.most.is_some_and(|m| best.x[j] >= m - 1e-9 * mass);
        let worth: f64 = best
            .rows
            .iter()
            .zip(&best.dual)
            .map(|(r, z)| {
                let all = std::iter::once(&r.t).chain(&r.v);
                all.zip(z).map(|(a, z)| a.slope[j] * z).sum::<f64>()
            })
            .sum();
        if full && worth > 1.0 + 1e-7 {
            out.push(Binding {
                limit: format!("most at {}", p.name),
                quantity: "mass",
                phase: None,
                price: worth - 1.0,
                unit: "kg",
            });
        }
    }
    out
}
