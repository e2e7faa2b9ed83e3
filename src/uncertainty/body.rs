//! One body by itself: how its density and the bounds of its volume act on its mass figures.

use nalgebra::{Matrix3, Vector3};

use super::contribution::{Contribution, Motion, Piece};
use super::distribution::Distribution;
use super::model::{Model, Variable};
use super::spread::{Uncertainty, spread};
use crate::moments::Moments;
use crate::quantity::{Coverage, Quantity, Tolerance};

/// What is not certain about a body.
#[derive(Clone, Debug, Default)]
pub struct BodySources {
    /// The material's name where it has one, and the density, kg/m³.
    pub density: Option<(Option<String>, Quantity)>,
    /// Bounds of the volume where the mesh alone does not fix it.
    pub bounds: Option<BodyBounds>,
    /// What the facets do, where they may stand for curves.
    pub facets: Option<FacetSource>,
}

/// What facets do to the moments of a volume, in SI units.
#[derive(Clone, Copy, Debug)]
pub struct FacetSource {
    /// From the volume of the facets to that of the curves; nothing where that was added already.
    pub bias: Moments,
    /// How far the volume of the curves may itself be off, m³.
    pub doubt: f64,
}

/// How far the figures of a volume may be off, in SI units.
#[derive(Clone, Debug)]
pub struct BodyBounds {
    /// What they come from, such as `capped holes`.
    pub name: String,
    /// What the bounds cover.
    pub coverage: Coverage,
    /// m³.
    pub volume: f64,
    /// m; `None` where nothing bounds it.
    pub centre: Option<f64>,
    /// Of each component about the centre, m⁵; `None` where nothing bounds it.
    pub inertia: Option<f64>,
}

/// Less than this part of a volume is rounding and no source.
const ROUNDING: f64 = 1e-11;

impl BodySources {
    /// How far the mass figures may be off. `volume` are the moments of the volume in SI units.
    /// `None` without a density, without any source, where the centre is not bounded or where there
    /// is no volume.
    pub fn spread(&self, volume: &Moments) -> Option<Uncertainty> {
        let (name, density) = self.density.as_ref()?;
        let whole = volume.shifted(volume.centre()?).weighted(density.value);
        let centre = whole.about;
        let mut model = Model::default();
        let mut piece = Piece {
            moments: whole,
            scales: Vec::new(),
            additions: Vec::new(),
        };
        if let Some(tolerance) = density.tolerance.filter(|t| t.amount > 0.0) {
            let source = match name {
                Some(name) => format!("density of {name}"),
                None => "density".to_owned(),
            };
            let by = model.variable(Variable::new(source, "kg/m3", tolerance.into()));
            piece.scales.push((by, 1.0 / density.value));
        }
        if let Some(facets) = &self.facets {
            if facets.bias.zeroth.abs() > ROUNDING * volume.zeroth
                || facets.bias.first.norm() > 0.0 && facets.doubt > ROUNDING * volume.zeroth
            {
                let part = Distribution::Interval {
                    low: 0.0,
                    high: 1.0,
                };
                let by = model.variable(Variable::new("facets for curves", "1", part));
                let bias = facets.bias.weighted(density.value);
                piece.additions.push((by, bias));
            }
            if facets.doubt > ROUNDING * volume.zeroth {
                let half = Distribution::Rectangular {
                    half_width: facets.doubt,
                };
                let by = model.variable(Variable::new("doubt of facets for curves", "m3", half));
                piece.scales.push((by, 1.0 / volume.zeroth));
            }
        }
        let mut known = true;
        let mut motions = Vec::new();
        if let Some(bounds) = &self.bounds {
            let stated = |amount: f64| -> Distribution {
                Tolerance {
                    amount,
                    relative: false,
                    coverage: bounds.coverage,
                }
                .into()
            };
            let mut source = |what: &str, unit, amount: f64| {
                let name = format!("{}, {what}", bounds.name);
                model.variable(Variable::new(name, unit, stated(amount)))
            };
            let by = source("volume", "m3", bounds.volume);
            piece.scales.push((by, 1.0 / volume.zeroth));
            for (k, axis) in ["x", "y", "z"].into_iter().enumerate() {
                let by = source(&format!("centre {axis}"), "m", bounds.centre?);
                let mut along = Vector3::zeros();
                along[k] = 1.0;
                motions.push(Motion::Shift { by, along });
            }
            known = bounds.inertia.is_some();
            for (r, c, name) in ELEMENTS {
                let Some(amount) = bounds.inertia else { break };
                let by = source(&format!("inertia {name}"), "m5", amount);
                let mut tensor = Matrix3::zeros();
                tensor[(r, c)] = density.value;
                tensor[(c, r)] = density.value;
                // The tensor is trace(S)·1 − S, so S = trace(I)/2·1 − I.
                let second = Matrix3::identity() * (tensor.trace() / 2.0) - tensor;
                let addition = Moments {
                    second,
                    ..Moments::zero(centre)
                };
                piece.additions.push((by, addition));
            }
        }
        let mut term = Contribution::of(vec![piece]);
        for motion in motions {
            term = term.moving(motion);
        }
        model.add(term);
        if model.variables().is_empty() {
            return None;
        }
        let mut found = spread(&model, &whole)?;
        if !known {
            found.inertia_kg_m2 = None;
            found.principal_moments_kg_m2 = None;
            found.radii_of_gyration_m = None;
        }
        Some(found)
    }
}

const ELEMENTS: [(usize, usize, &str); 6] = [
    (0, 0, "xx"),
    (1, 1, "yy"),
    (2, 2, "zz"),
    (0, 1, "xy"),
    (0, 2, "xz"),
    (1, 2, "yz"),
];
