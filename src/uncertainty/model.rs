//! Variables, and the things whose mass moments depend on them.

use std::sync::Arc;

use nalgebra::{Matrix3, Vector3};

use super::contribution::sum;
use super::distribution::Distribution;
use crate::moments::Moments;

/// One independent source of uncertainty.
#[derive(Clone, Debug, PartialEq)]
pub struct Variable {
    /// Such as `density of steel S235`; unique in its model.
    pub name: String,
    /// SI unit of its values; `1` for a fraction.
    pub unit: &'static str,
    /// How far it may be off what was stated.
    pub distribution: Distribution,
}

impl Variable {
    /// A source by this name.
    pub fn new(name: impl Into<String>, unit: &'static str, distribution: Distribution) -> Self {
        Self {
            name: name.into(),
            unit,
            distribution,
        }
    }
}

/// A variable of one model.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct VariableId(pub(super) usize);

/// How far each variable of a model is off what was stated, in its unit.
#[derive(Clone, Debug, PartialEq)]
pub struct Values(pub(super) Vec<f64>);

impl Values {
    /// How far this one is off.
    pub fn of(&self, variable: VariableId) -> f64 {
        self.0.get(variable.0).copied().unwrap_or(0.0)
    }

    /// Puts this one off by `value`.
    pub fn set(&mut self, variable: VariableId, value: f64) {
        if let Some(x) = self.0.get_mut(variable.0) {
            *x = value;
        }
    }
}

/// Something whose mass moments depend on variables. Where it is held about is its own affair; it
/// should be near the thing.
pub trait Response: Send + Sync + std::fmt::Debug {
    /// What it depends on, each once.
    fn variables(&self) -> Vec<VariableId>;

    /// kg, kg m, kg m², with the variables off by `values`.
    fn moments(&self, values: &Values) -> Moments;

    /// The exact derivative of [`Response::moments`] by one variable where all are nominal, as the
    /// rate of change of the moments held about a point that stays (any point).
    fn tangent(&self, by: VariableId) -> Moments;
}

/// Sources and what depends on them. The moments of all terms add.
#[derive(Clone, Debug, Default)]
pub struct Model {
    variables: Vec<Variable>,
    terms: Vec<Arc<dyn Response>>,
    /// Variables of each term, as it was added.
    depends: Vec<Vec<VariableId>>,
}

impl Model {
    /// Takes in a source.
    pub fn variable(&mut self, variable: Variable) -> VariableId {
        self.variables.push(variable);
        VariableId(self.variables.len() - 1)
    }

    /// Takes in a thing.
    pub fn add(&mut self, term: impl Response + 'static) {
        self.share(Arc::new(term));
    }

    /// Takes in a thing that others refer to as well.
    pub fn share(&mut self, term: Arc<dyn Response>) {
        self.depends.push(term.variables());
        self.terms.push(term);
    }

    /// The sources, in the order in which they were taken in.
    pub fn variables(&self) -> &[Variable] {
        &self.variables
    }

    /// The things, in the order in which they were taken in.
    pub fn terms(&self) -> &[Arc<dyn Response>] {
        &self.terms
    }

    /// Which variables a term depends on.
    pub(super) fn depends(&self) -> &[Vec<VariableId>] {
        &self.depends
    }

    /// All as stated.
    pub fn stated(&self) -> Values {
        Values(vec![0.0; self.variables.len()])
    }

    /// The moments of everything with the variables off by `values`, held about `about`.
    pub fn moments(&self, values: &Values, about: Vector3<f64>) -> Moments {
        let terms = self.terms.iter().map(|t| t.moments(values));
        terms.fold(Moments::zero(about), |sum, m| sum.plus(&m))
    }

    /// The moments of everything as stated, held about its centre.
    pub fn nominal(&self) -> Moments {
        let stated = self.stated();
        let near = self.terms.first();
        let near = near.map_or_else(Vector3::zeros, |t| t.moments(&stated).about);
        let sum = self.moments(&stated, near);
        match sum.centre() {
            Some(centre) => self.moments(&stated, centre),
            None => sum,
        }
    }

    /// The exact derivatives of the moments of everything by each variable, held about `about`.
    pub fn tangents(&self, about: Vector3<f64>) -> Tangents {
        let mut sums = vec![Sum::new(about); self.variables.len()];
        let stated = self.moments(&self.stated(), about);
        let size = (stated.second.trace().abs() / stated.zeroth.abs()).sqrt();
        let size = if size.is_finite() { size } else { 0.0 };
        for (term, depends) in self.terms.iter().zip(&self.depends) {
            for by in depends {
                if let Some(sum) = sums.get_mut(by.0) {
                    sum.add(&term.tangent(*by).shifted(about));
                }
            }
        }
        Tangents(sums.iter().map(|s| s.cleaned(size)).collect())
    }
}

impl Model {
    /// The standard uncertainties of the mass and of the centre of some terms together, by their
    /// places among them; zeros for the centre where they have no mass.
    pub fn standards(&self, terms: impl IntoIterator<Item = usize>) -> (f64, [f64; 3]) {
        let stated = self.stated();
        let terms = terms.into_iter();
        let terms = terms.filter_map(|n| self.terms.get(n).zip(self.depends.get(n)));
        let terms: Vec<_> = terms.collect();
        let whole = sum(terms.iter().map(|(term, _)| term.moments(&stated)));
        let about = whole.centre();
        let centre = about.unwrap_or(whole.about);
        let spread = whole.shifted(centre).second.trace().abs();
        let size = (spread / whole.zeroth.abs()).sqrt();
        let size = if size.is_finite() { size } else { 0.0 };
        let mut rates: std::collections::BTreeMap<usize, Sum> = std::collections::BTreeMap::new();
        for (term, depends) in terms {
            for by in depends {
                let rate = term.tangent(*by).shifted(centre);
                let sum = rates.entry(by.0).or_insert_with(|| Sum::new(centre));
                sum.add(&rate);
            }
        }
        let (mut mass, mut place) = (0.0, [0.0; 3]);
        for (by, rate) in rates {
            let Some(variable) = self.variables.get(by) else {
                continue;
            };
            let (rate, u) = (rate.cleaned(size), variable.distribution.standard());
            mass += (rate.zeroth * u).powi(2);
            if about.is_some() {
                for (sum, rate) in place.iter_mut().zip(rate.first.iter()) {
                    *sum += (rate / whole.zeroth * u).powi(2);
                }
            }
        }
        (f64::sqrt(mass), place.map(f64::sqrt))
    }
}

/// Derivatives of moments, one a variable of the model.
#[derive(Clone, Debug, PartialEq)]
pub struct Tangents(pub(super) Vec<Moments>);

impl Tangents {
    /// By this variable.
    pub fn by(&self, variable: VariableId) -> Option<&Moments> {
        self.0.get(variable.0)
    }

    /// By each variable, in their order.
    pub fn iter(&self) -> impl Iterator<Item = &Moments> {
        self.0.iter()
    }
}

/// A sum that knows how large its terms were: what is left of terms that cancel is rounding.
#[derive(Clone)]
struct Sum {
    sum: Moments,
    first: Vector3<f64>,
    second: Matrix3<f64>,
}

impl Sum {
    fn new(about: Vector3<f64>) -> Self {
        Self {
            sum: Moments::zero(about),
            first: Vector3::zeros(),
            second: Matrix3::zeros(),
        }
    }

    fn add(&mut self, m: &Moments) {
        self.sum = self.sum.plus(m);
        self.first += m.first.abs();
        self.second += m.second.abs();
    }

    /// Terms that cancel to below a few hundred roundings of their size, or of their weight times
    /// the `size` of the whole, cancel.
    fn cleaned(&self, size: f64) -> Moments {
        let dust = 1e-13;
        let clean = |x: f64, size: f64| if x.abs() <= dust * size { 0.0 } else { x };
        let first = self.sum.zeroth.abs() * size;
        let second = first * size;
        Moments {
            first: self
                .sum
                .first
                .zip_map(&self.first, |x, all| clean(x, all + first)),
            second: self
                .sum
                .second
                .zip_map(&self.second, |x, all| clean(x, all + second)),
            ..self.sum
        }
    }
}
