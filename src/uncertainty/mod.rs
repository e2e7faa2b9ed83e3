//! How far figures may be off: named sources, what each adds, and intervals from them.
//!
//! Terms and rules are those of the Guide to the expression of uncertainty in measurement (GUM,
//! JCGM 100:2008) and its supplement on Monte Carlo (JCGM 101:2008).
//!
//! A [`Model`] holds [`Variable`]s, each an independent source with a [`Distribution`], and
//! [`Response`]s: things whose mass moments depend on them. A variable's value is how far the
//! source is off what was stated, so that all zeros are the nominal figures. Sources that act
//! together (one density on many parts) are one variable; that is all there is to correlation.
//!
//! Mass moments add, and every term gives its exact derivative by each variable. From the sum's
//! derivatives follow those of the centre, the inertia about it, principal moments and any
//! [`Figure`]. Intervals are quantiles of the distribution of the linearised figure; [`sample`]
//! evaluates everything anew for each draw instead.
//!
//! ```
//! use bismar::moments::Moments;
//! use bismar::uncertainty::{Contribution, Distribution, Model, Variable, spread};
//!
//! let mut model = Model::default();
//! for (mass, u, x) in [(12.0, 0.12, 0.1), (7.5, 0.15, 0.25)] {
//!     let stated = Distribution::Normal { standard: u };
//!     let of = model.variable(Variable::new("mass", "kg", stated));
//!     let item = Moments::point([x, 0.0, 0.0].into(), mass);
//!     model.add(Contribution::new(item).adding(of, item.weighted(1.0 / mass)));
//! }
//! let found = spread(&model, &model.nominal()).unwrap();
//! assert!((found.mass_kg.standard - 0.12_f64.hypot(0.15)).abs() < 1e-15);
//! ```

mod body;
mod combination;
mod contribution;
mod distribution;
mod figure;
mod model;
mod near;
mod random;
mod sampling;
mod smear;
mod spread;

#[cfg(test)]
mod tests;

pub use body::{BodyBounds, BodySources, FacetSource};
pub use combination::Combination;
pub use contribution::{Contribution, Motion, Piece};
pub use distribution::Distribution;
pub use figure::{Centre, Figure, Mass};
pub use model::{Model, Response, Tangents, Values, Variable, VariableId};
pub use sampling::{Band, MOST_SAMPLES, MeanStandard, Sampled, SampledFigure, Sampling, sample};
pub use smear::{Amount, Smear};
pub use spread::{Driver, Source, Spread, Uncertainty, spread};
