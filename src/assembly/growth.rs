//! The bookkeeping of mass growth: basic mass, growth allowance, predicted mass.
//!
//! Words as AIAA S-120A and ISO 22010 use them (from memory; clause numbers not checked): *basic*
//! mass is what the present design comes to; the *mass growth allowance* is what it is still
//! expected to grow by, a per cent by maturity; *predicted* mass is both together; the *margin* of
//! a mass limit is the limit less the predicted mass.

use serde::Serialize;

use super::file::Maturity;
use super::reader::{self, Reader};
use crate::error::Kind;
use crate::moments::{Moments, principal};
use crate::quantity::Dimension;

/// The allowance of each maturity, by the file's own names.
#[derive(Debug, Default)]
pub(super) struct Allowances {
    /// Name and fraction; none where the fraction is among the faults.
    all: Vec<(String, Option<f64>)>,
}

/// Reads `[allowance]`: a per cent for each maturity.
pub(super) fn allowances(root: &Reader<'_, '_>) -> Allowances {
    let entries = root.own_keys("allowance").iter();
    let all = entries.map(|e| {
        let read = reader::quantity(root.shared, &e.node, &e.key, Dimension::Fraction);
        let fault = |message: String, advice: &str| {
            let kind = Kind::BadNumber;
            root.shared.fault(e.node.line, kind, message, advice);
        };
        let fraction = read.and_then(|q| {
            if q.tolerance.is_some() {
                fault(
                    format!("the allowance of `{}` has a tolerance", e.key),
                    "state the allowance without ±: the mass may grow by anything up to it",
                );
                return None;
            }
            if !(0.0..=10.0).contains(&q.value) {
                fault(
                    format!("the allowance of `{}` is not between 0 and 1000 %", e.key),
                    "write what the mass may still grow by, such as \"15 %\"",
                );
                return None;
            }
            Some(q.value)
        });
        (e.key.clone(), fraction)
    });
    Allowances { all: all.collect() }
}

impl Allowances {
    /// Reads `maturity`.
    pub(super) fn maturity(&self, r: &Reader<'_, '_>) -> Option<Maturity> {
        let (name, line) = r.text("maturity")?;
        if let Some((_, allowance)) = self.all.iter().find(|(n, _)| *n == name) {
            let allowance = (*allowance)?;
            return Some(Maturity { name, allowance });
        }
        let names: Vec<&str> = self.all.iter().map(|(n, _)| n.as_str()).collect();
        let advice = match (reader::nearest(&name, names.iter().copied()), &names[..]) {
            (Some(near), _) => format!("did you mean `{near}`?"),
            (None, []) => format!("give it an allowance: [allowance] {name} = \"15 %\""),
            (None, names) => format!("the maturities here are {}", super::listed(names)),
        };
        let message = format!("there is no allowance for the maturity `{name}`");
        r.shared.fault(line, Kind::UnknownName, message, advice);
        None
    }
}

/// Basic and predicted figures of the whole.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Growth {
    /// Of the present design; the same as `total`.
    pub basic: Standing,
    /// Mass growth allowance, kg: predicted less basic.
    pub allowance_kg: f64,
    /// With all allowances.
    pub predicted: Standing,
    /// Parts and items by their maturity, those without one under null.
    pub by_maturity: Vec<MaturityRow>,
}

/// Figures of the whole at one standing.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Standing {
    /// kg.
    pub mass_kg: f64,
    /// m.
    pub centre_of_mass_m: [f64; 3],
    /// About the centre of mass.
    pub inertia_kg_m2: [[f64; 3]; 3],
    /// Ascending.
    pub principal_moments_kg_m2: [f64; 3],
}

/// Parts and items of one maturity.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct MaturityRow {
    /// Null: none stated.
    pub maturity: Option<String>,
    /// Per cent of the basic mass.
    pub allowance_percent: f64,
    /// How many.
    pub parts: usize,
    /// kg.
    pub basic_mass_kg: f64,
    /// kg.
    pub predicted_mass_kg: f64,
}

impl Standing {
    /// `None` where there is no mass.
    pub(super) fn of(whole: &Moments) -> Option<Self> {
        let inertia = whole.inertia()?;
        Some(Self {
            mass_kg: whole.zeroth,
            centre_of_mass_m: whole.centre()?.map(|x| x + 0.0).into(),
            inertia_kg_m2: [0, 1, 2].map(|r| [0, 1, 2].map(|c| inertia[(r, c)] + 0.0)),
            principal_moments_kg_m2: principal(&inertia).moments,
        })
    }
}
