//! What an assembly file says of how far things may be off, as a model of variables and terms.
//!
//! One stated tolerance is one variable. What is stated once acts alike on all that it is stated
//! of: a density on all bodies of the material, an entry's tolerance on all its repeats unless it
//! says `each = "independent"`.

use std::collections::HashMap;
use std::sync::Arc;

use nalgebra::{Matrix3, Vector3};

use super::expand::{self, Instance, Level, What};
use super::file::{Each, Item, Part, Shape, SmearMass};
use super::load::Loaded;
use super::open::MassBounds;
use super::resolve::{FacetBias, Resolved, Weighed};
use super::service::{FillOf, Tank};
use super::shape::second_of;
use super::smear::Smeared;
use crate::moments::Moments;
use crate::quantity::{Coverage, Quantity, Tolerance};
use crate::uncertainty::{
    Amount, Contribution, Distribution, Model, Motion, Piece, Response, Smear, Variable, VariableId,
};

/// The model of an assembly.
#[derive(Debug, Default)]
pub(super) struct Sources {
    /// One term for each thing that was weighed, in their order.
    pub(super) model: Model,
    /// Growth still to come: its variable and the allowance.
    pub(super) growth: Vec<(VariableId, f64)>,
    /// Something's inertia is not bounded by anything.
    pub(super) inertia_unknown: bool,
    /// Something's centre is not bounded by anything.
    pub(super) centre_unknown: bool,
    /// Variables by what they are of.
    known: HashMap<String, VariableId>,
    names: HashMap<String, usize>,
}

/// The model of what was weighed.
pub(super) fn of(loaded: &Loaded, resolved: &Resolved) -> Sources {
    let instances = expand::expand(&loaded.file);
    let by_path: HashMap<&str, &Instance<'_>> =
        instances.iter().map(|i| (i.path.as_str(), i)).collect();
    let smears: HashMap<usize, &Smeared> = resolved.smears.iter().map(|s| (s.at, s)).collect();
    let mut out = Sources::default();
    for (n, weighed) in resolved.weighed.iter().enumerate() {
        let term: Arc<dyn Response> = match (smears.get(&n), by_path.get(weighed.path.as_str())) {
            (Some(smear), _) => Arc::new(out.smear(smear)),
            (None, Some(instance)) => match instance.what {
                What::Item(item) => Arc::new(out.item(instance, item, weighed)),
                What::Part(part) => Arc::new(out.part(instance, part, weighed)),
                What::Tank(tank) => Arc::new(out.tank(instance, tank, weighed, resolved)),
            },
            (None, None) => Arc::new(Contribution::new(weighed.moments)),
        };
        out.model.share(term);
    }
    out
}

/// Who shares the tolerances of an entry.
struct Sharing<'a> {
    /// Address of the entry's position, which is one an entry.
    entry: usize,
    /// Without marks of repeats where all share, with them where each is by itself.
    path: &'a str,
}

impl<'a> Sharing<'a> {
    fn of(instance: &'a Instance<'_>, each: Each) -> Self {
        Self {
            entry: instance
                .levels
                .last()
                .map_or(0, |l| std::ptr::from_ref(l.position).addr()),
            path: match each {
                Each::Shared => &instance.entry_path,
                Each::Independent => &instance.path,
            },
        }
    }
}

impl Sources {
    /// The variable of a tolerance of an entry; none where it says nothing.
    fn own(
        &mut self,
        sharing: &Sharing<'_>,
        what: &str,
        unit: &'static str,
        tolerance: Option<Tolerance>,
    ) -> Option<VariableId> {
        let tolerance = tolerance.filter(|t| t.amount > 0.0)?;
        self.off(sharing, what, unit, tolerance.into())
    }

    fn off(
        &mut self,
        sharing: &Sharing<'_>,
        what: &str,
        unit: &'static str,
        distribution: Distribution,
    ) -> Option<VariableId> {
        let Sharing { entry, path } = sharing;
        let key = format!("{entry} {path} {what} {distribution:?}");
        Some(self.variable(key, format!("{what} of {path}"), unit, distribution))
    }

    fn variable(
        &mut self,
        key: String,
        name: String,
        unit: &'static str,
        distribution: Distribution,
    ) -> VariableId {
        if let Some(id) = self.known.get(&key) {
            return *id;
        }
        let count = self.names.entry(name.clone()).or_insert(0);
        *count += 1;
        let name = match *count {
            1 => name,
            n => format!("{name} ({n})"),
        };
        let id = self.model.variable(Variable::new(name, unit, distribution));
        self.known.insert(key, id);
        id
    }

    fn density(&mut self, name: &str, density: Quantity) -> Option<VariableId> {
        let tolerance = density.tolerance.filter(|t| t.amount > 0.0)?;
        let distribution: Distribution = tolerance.into();
        let key = format!(
            "density {name} {} {distribution:?}",
            density.value.to_bits()
        );
        Some(self.variable(key, format!("density of {name}"), "kg/m3", distribution))
    }

    fn part(&mut self, instance: &Instance<'_>, part: &Part, weighed: &Weighed) -> Contribution {
        let sharing = Sharing::of(instance, part.each);
        let mut pieces = Vec::with_capacity(weighed.pieces.len());
        for piece in &weighed.pieces {
            let mut scales = Vec::new();
            if let Some(m) = &piece.material
                && let Some(by) = self.density(&m.name, m.density)
            {
                scales.push((by, 1.0 / m.density.value));
            }
            pieces.push(Piece {
                moments: piece.moments,
                scales,
                additions: Vec::new(),
            });
        }
        let mut term = Contribution::of(pieces);
        if let Some(measured) = part.measured {
            term = term.weighed();
            if let Some(by) = self.own(&sharing, "measured mass", "kg", measured.tolerance) {
                term = term.scaled(by, 1.0 / measured.value);
            }
        }
        if let Some(bounds) = &weighed.estimate {
            term = self.open(instance, weighed, bounds, term);
        }
        for rate in &weighed.rates {
            if let Some(by) = self.own(&sharing, rate.what, rate.unit, Some(rate.tolerance)) {
                term = term.adding(by, rate.per_unit);
            }
        }
        if let Some(facets) = &weighed.facets {
            term = self.facets(&sharing, facets, weighed, term);
        }
        if let Some(maturity) = &part.maturity {
            term = self.grown(&sharing, maturity.allowance, term);
        }
        self.placed(instance, part.each, term)
    }

    /// Liquid: its density, how far its tank is filled, and where the tank stands. A little more or
    /// less liquid lies in the free surface: the surface's own moments are the exact derivative by
    /// the volume.
    fn tank(
        &mut self,
        instance: &Instance<'_>,
        tank: &Tank,
        weighed: &Weighed,
        resolved: &Resolved,
    ) -> Contribution {
        let sharing = Sharing::of(instance, tank.each);
        let mut term = Contribution::new(weighed.moments);
        let density = tank.liquid.density;
        let by_density = self.density(&tank.liquid.name, density);
        if let Some(by) = by_density {
            term = term.scaled(by, 1.0 / density.value);
        }
        let known = resolved.service.as_ref().zip(resolved.state.as_ref());
        let filled = known.and_then(|(service, state)| service.fill_rate(&instance.path, state));
        let Some(filled) = filled else {
            return self.placed(instance, tank.each, term);
        };
        // A stated mass keeps: what is denser leaves its free surface.
        if let (Some(by), FillOf::Mass) = (by_density, tank.fill.of) {
            let volume = weighed.moments.zeroth / density.value;
            term = term.adding(by, filled.per_unit.weighted(-volume));
        }
        if let Some(by) = self.own(&sharing, "fill", filled.unit, filled.tolerance) {
            term = term.adding(by, filled.per_unit);
        }
        self.placed(instance, tank.each, term)
    }

    /// Facets that may stand for curves: a bias from the mesh's figures to those of the curves,
    /// and how far these may themselves be off. All repeats of a mesh are off alike.
    fn facets(
        &mut self,
        sharing: &Sharing<'_>,
        facets: &FacetBias,
        weighed: &Weighed,
        mut term: Contribution,
    ) -> Contribution {
        let bias = facets.moments.weighted(-1.0);
        // Less than that is rounding and no source.
        let rounding = 1e-11 * weighed.moments.zeroth;
        let any = bias.zeroth.abs() > rounding || facets.doubt_kg > rounding;
        if !facets.corrected && any {
            let part = Distribution::Interval {
                low: 0.0,
                high: 1.0,
            };
            if let Some(by) = self.off(sharing, "facets for curves", "1", part) {
                term = term.adding(by, bias);
            }
        }
        if facets.doubt_kg > 1e-11 * weighed.moments.zeroth {
            let half = Distribution::Rectangular {
                half_width: facets.doubt_kg,
            };
            if let Some(by) = self.off(sharing, "doubt of facets for curves", "kg", half) {
                term = term.adding(by, weighed.moments.weighted(1.0 / weighed.moments.zeroth));
            }
        }
        term
    }

    /// The bounds of a mesh that was taken with its holes capped. All repeats of the mesh are off
    /// alike, in their own axes.
    fn open(
        &mut self,
        instance: &Instance<'_>,
        weighed: &Weighed,
        bounds: &MassBounds,
        mut term: Contribution,
    ) -> Contribution {
        let sharing = Sharing::of(instance, Each::Shared);
        let half = |amount: f64| {
            Some(Tolerance {
                amount,
                relative: false,
                coverage: Coverage::HalfWidth,
            })
        };
        let mass = self.own(
            &sharing,
            "capped holes, mass",
            "kg",
            half(bounds.mass_bound_kg),
        );
        if let Some(by) = mass {
            term = term.scaled(by, 1.0 / weighed.moments.zeroth);
        }
        self.centre_unknown |= !bounds.centre_bound_m.is_finite();
        let turn = &instance.placement.turn;
        for (k, axis) in AXES.into_iter().enumerate() {
            let what = format!("capped holes, centre {axis}");
            let by = half(bounds.centre_bound_m).filter(|t| t.amount.is_finite());
            if let Some(by) = self.own(&sharing, &what, "m", by) {
                let along = turn.column(k).into_owned();
                term = term.moving(Motion::Shift { by, along });
            }
        }
        let Some(bound) = bounds.inertia_bound_kg_m2 else {
            self.inertia_unknown = true;
            return term;
        };
        let centre = weighed.moments.centre().unwrap_or(weighed.moments.about);
        for (name, tensor) in elements() {
            let what = format!("capped holes, inertia {name}");
            if let Some(by) = self.own(&sharing, &what, "kg m2", half(bound)) {
                term = term.adding(by, of_tensor(&tensor, turn, centre));
            }
        }
        term
    }

    fn item(&mut self, instance: &Instance<'_>, item: &Item, weighed: &Weighed) -> Contribution {
        let sharing = Sharing::of(instance, item.each);
        let placement = &instance.placement;
        let (turn, at) = (&placement.turn, placement.at);
        let mut term = Contribution::new(weighed.moments);
        if let Some(by) = self.own(&sharing, "mass", "kg", item.mass.tolerance) {
            let per_kg = match &item.shape {
                // A stated tensor does not know of the mass.
                Shape::Inertia(_) => Moments::point(at, 1.0),
                shape => shape.moments(1.0).placed(placement),
            };
            term = term.adding(by, per_kg);
        }
        if let Shape::Inertia(stated) = &item.shape {
            for (q, (name, tensor)) in stated.iter().zip(elements()) {
                let what = format!("inertia {name}");
                if let Some(by) = self.own(&sharing, &what, "kg m2", q.tolerance) {
                    term = term.adding(by, of_tensor(&tensor, turn, at));
                }
            }
        }
        // A size that is off stretches the item along its own axes, its mass kept.
        for (what, size, along) in sizes(&item.shape) {
            if let Some(by) = self.own(&sharing, what, "m", size.tolerance) {
                let along = Matrix3::from_diagonal(&(along / size.value));
                term = term.moving(Motion::Stretch {
                    by,
                    gradient: turn * along * turn.transpose(),
                    pivot: at,
                });
            }
        }
        if let Some(maturity) = &item.maturity {
            term = self.grown(&sharing, maturity.allowance, term);
        }
        self.placed(instance, item.each, term)
    }

    /// The mass may still grow by anything up to the allowance.
    fn grown(&mut self, sharing: &Sharing<'_>, allowance: f64, term: Contribution) -> Contribution {
        if allowance == 0.0 {
            return term;
        }
        let distribution = Distribution::Interval {
            low: 0.0,
            high: allowance,
        };
        match self.off(sharing, "growth", "1", distribution) {
            Some(by) => {
                if !self.growth.iter().any(|(known, _)| *known == by) {
                    self.growth.push((by, allowance));
                }
                term.scaled(by, 1.0)
            }
            None => term,
        }
    }

    /// The tolerances of its place, its own first, then those of the groups around it.
    fn placed(
        &mut self,
        instance: &Instance<'_>,
        each: Each,
        mut term: Contribution,
    ) -> Contribution {
        for (depth, level) in instance.levels.iter().enumerate().rev() {
            let own = depth + 1 == instance.levels.len();
            let independent = own && each == Each::Independent;
            for motion in self.motions(level, independent) {
                term = term.moving(motion);
            }
        }
        term
    }

    fn motions(&mut self, level: &Level<'_>, independent: bool) -> Vec<Motion> {
        let mut motions = Vec::new();
        let Some(at) = level.position.at.get(level.nth) else {
            return motions;
        };
        let sharing = Sharing {
            entry: std::ptr::from_ref(level.position).addr(),
            path: if independent {
                &level.path
            } else {
                &level.entry_path
            },
        };
        let outer = &level.outer;
        if let Some(turn) = &level.position.turn
            && let Some(by) = self.own(&sharing, "turn", "rad", turn.angle.tolerance)
        {
            motions.push(Motion::Turn {
                by,
                // Seen in a mirror, a turn goes the other way round.
                axis: outer.turn * turn.axis * outer.turn.determinant().signum(),
                pivot: outer.apply(&Vector3::from(at.map(|q| q.value))),
            });
        }
        for (k, axis) in AXES.into_iter().enumerate() {
            let what = format!("position {axis}");
            if let Some(by) = self.own(&sharing, &what, "m", at[k].tolerance) {
                let along = outer.turn.column(k).into_owned();
                motions.push(Motion::Shift { by, along });
            }
        }
        motions
    }

    fn smear(&mut self, smear: &Smeared) -> Smear {
        let (amount, unit, q) = match smear.mass {
            SmearMass::Fraction(q) => (Amount::Fraction(q.value), "1", q),
            SmearMass::Mass(q) => (Amount::Mass(q.value), "kg", q),
        };
        let sharing = Sharing {
            entry: smear.entry,
            path: &smear.name,
        };
        let by = self.own(&sharing, "mass", unit, q.tolerance);
        let terms = self.model.terms();
        let over = smear.covers.iter().filter_map(|n| terms.get(*n).cloned());
        Smear {
            over: over.collect(),
            amount,
            by,
        }
    }
}

const AXES: [&str; 3] = ["x", "y", "z"];

/// The elements of a tensor, in the order of a stated one, each by itself.
fn elements() -> [(&'static str, Matrix3<f64>); 6] {
    [
        ("xx", 0, 0),
        ("yy", 1, 1),
        ("zz", 2, 2),
        ("xy", 0, 1),
        ("xz", 0, 2),
        ("yz", 1, 2),
    ]
    .map(|(name, r, c)| {
        let mut m = Matrix3::zeros();
        m[(r, c)] = 1.0;
        m[(c, r)] = 1.0;
        (name, m)
    })
}

/// Moments whose inertia about `at` is `tensor` in its own axes, without any mass.
fn of_tensor(tensor: &Matrix3<f64>, turn: &Matrix3<f64>, at: Vector3<f64>) -> Moments {
    Moments {
        second: turn * second_of(tensor) * turn.transpose(),
        ..Moments::zero(at)
    }
}

/// The sizes of a shape, and the axes that each acts along.
fn sizes(shape: &Shape) -> Vec<(&'static str, Quantity, Vector3<f64>)> {
    match shape {
        Shape::Point | Shape::Inertia(_) => Vec::new(),
        Shape::Box(sides) => vec![
            ("box x", sides[0], Vector3::x()),
            ("box y", sides[1], Vector3::y()),
            ("box z", sides[2], Vector3::z()),
        ],
        Shape::Cylinder { radius, height } => vec![
            ("radius", *radius, Vector3::new(1.0, 1.0, 0.0)),
            ("height", *height, Vector3::z()),
        ],
        Shape::Sphere(radius) => vec![("radius", *radius, Vector3::repeat(1.0))],
    }
}
