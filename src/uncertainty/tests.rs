//! Published and hand-made cases of the propagation, and linear against sampled.

mod coverage;
mod exact;
mod published;

use std::sync::Arc;

use nalgebra::{Matrix3, Vector3};

use super::random::Draws;
use super::*;
use crate::moments::Moments;

#[track_caller]
pub(super) fn near(a: f64, b: f64, within: f64) {
    assert!(
        (a - b).abs() <= within,
        "{a} is not {b}, allowed {within:e}"
    );
}

pub(super) fn normal(standard: f64) -> Distribution {
    Distribution::Normal { standard }
}

pub(super) fn rectangular(half_width: f64) -> Distribution {
    Distribution::Rectangular { half_width }
}

/// A point of mass `kg` at x in metres, both with a standard uncertainty (none where 0).
pub(super) fn item(model: &mut Model, n: usize, kg: f64, u: f64, x: f64, ux: f64) {
    let at = Vector3::new(x, 0.0, 0.0);
    let mut term = Contribution::new(Moments::point(at, kg));
    if u > 0.0 {
        let by = model.variable(Variable::new(format!("mass {n}"), "kg", normal(u)));
        term = term.adding(by, Moments::point(at, 1.0));
    }
    if ux > 0.0 {
        let by = model.variable(Variable::new(format!("position {n}"), "m", normal(ux)));
        let along = Vector3::x();
        term = term.moving(Motion::Shift { by, along });
    }
    model.add(term);
}

/// Moments of a solid box of some sides somewhere.
pub(super) fn block(draws: &mut Draws, reach: f64) -> Moments {
    let mut within = |r: f64| r * (2.0 * draws.uniform() - 1.0);
    let at = Vector3::new(within(reach), within(reach), within(reach));
    let sides = Vector3::new(within(1.0), within(1.0), within(1.0)).map(|s| 0.3 + s.abs());
    let mass = 1.0 + within(0.9);
    Moments {
        zeroth: mass,
        second: Matrix3::from_diagonal(&(sides.component_mul(&sides) * (mass / 12.0))),
        ..Moments::zero(at)
    }
}

/// Things of every kind with tolerances of every kind, each of relative size `scale`.
pub(super) fn assembly(seed: u64, scale: f64) -> Model {
    biased(seed, scale, scale)
}

/// As [`assembly`], with growth of up to `most`.
pub(super) fn biased(seed: u64, scale: f64, most: f64) -> Model {
    let mut draws = Draws::new(seed, 0);
    let mut model = Model::default();
    let mut named = |what: &str, distribution| {
        let name = format!("{what} {}", model.variables().len());
        model.variable(Variable::new(name, "1", distribution))
    };
    let density = [rectangular(scale), normal(scale), rectangular(0.5 * scale)];
    let density = density.map(|d| named("density", d));
    let mass = [normal(scale), rectangular(scale)].map(|d| named("mass", d));
    let shift = [rectangular(scale), normal(scale)].map(|d| named("shift", d));
    let turn = named("turn", normal(scale));
    let stretch = named("stretch", Distribution::Triangular { half_width: scale });
    let growth = named(
        "growth",
        Distribution::Interval {
            low: 0.0,
            high: most,
        },
    );
    let smeared = [rectangular(scale), normal(scale)].map(|d| named("smear", d));
    let mut piece = |by: VariableId| Piece {
        moments: block(&mut draws, 2.0),
        scales: vec![(by, 1.0)],
        additions: Vec::new(),
    };
    let axis = Vector3::new(0.48, -0.6, 0.64);
    let pivot = Vector3::new(0.3, 1.0, -0.2);
    let things = [
        Contribution::of(vec![piece(density[0])]).moving(Motion::Turn {
            by: turn,
            axis,
            pivot,
        }),
        // On the scale together, of two materials.
        Contribution::of(vec![piece(density[0]), piece(density[1])])
            .weighed()
            .scaled(mass[0], 1.0)
            .moving(Motion::Shift {
                by: shift[0],
                along: axis,
            }),
        Contribution::of(vec![piece(density[2])])
            .scaled(growth, 1.0)
            .moving(Motion::Stretch {
                by: stretch,
                gradient: axis * axis.transpose(),
                pivot,
            })
            .moving(Motion::Turn {
                by: turn,
                axis: -axis,
                pivot: -pivot,
            })
            .moving(Motion::Shift {
                by: shift[1],
                along: Vector3::y(),
            }),
        Contribution::of(vec![piece(density[1])]),
    ];
    let added = block(&mut draws, 2.0);
    let things = things.map(|t| Arc::new(t.adding(mass[1], added)));
    for thing in &things {
        model.share(thing.clone());
    }
    let over = |some: &[usize]| -> Vec<Arc<dyn Response>> {
        some.iter().map(|n| things[*n].clone() as _).collect()
    };
    model.add(Smear {
        over: over(&[0, 1]),
        amount: Amount::Fraction(0.03),
        by: Some(smeared[0]),
    });
    model.add(Smear {
        over: over(&[1, 2, 3]),
        amount: Amount::Mass(0.7),
        by: Some(smeared[1]),
    });
    model.add(Contribution::new(block(&mut draws, 2.0)));
    model
}
