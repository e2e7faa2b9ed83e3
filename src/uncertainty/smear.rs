//! Mass that no mesh shows, spread over what it covers.

use std::sync::Arc;

use super::contribution::sum;
use super::model::{Response, Values, VariableId};
use crate::moments::Moments;

/// How much there is of it.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Amount {
    /// This part of the mass that it covers.
    Fraction(f64),
    /// This mass, kg.
    Mass(f64),
}

/// Paint, welds, harness: mass that lies where other things are, in proportion to their mass, and
/// goes with them wherever their own tolerances take them.
#[derive(Clone, Debug)]
pub struct Smear {
    /// What it covers.
    pub over: Vec<Arc<dyn Response>>,
    /// As stated.
    pub amount: Amount,
    /// What puts the amount off, in its own unit.
    pub by: Option<VariableId>,
}

impl Smear {
    /// Its weight for each unit of weight covered, with the amount off by `off`.
    fn share(&self, covered: f64, off: f64) -> f64 {
        match self.amount {
            Amount::Fraction(f) => f + off,
            Amount::Mass(kg) if covered != 0.0 => (kg + off) / covered,
            Amount::Mass(_) => 0.0,
        }
    }
}

impl Response for Smear {
    fn variables(&self) -> Vec<VariableId> {
        let mut all: Vec<VariableId> = self.over.iter().flat_map(|r| r.variables()).collect();
        all.extend(self.by);
        all.sort_unstable();
        all.dedup();
        all
    }

    fn moments(&self, values: &Values) -> Moments {
        let covered = sum(self.over.iter().map(|r| r.moments(values)));
        let off = self.by.map_or(0.0, |by| values.of(by));
        covered.weighted(self.share(covered.zeroth, off))
    }

    fn tangent(&self, by: VariableId) -> Moments {
        let stated = Values(Vec::new());
        let covered = sum(self.over.iter().map(|r| r.moments(&stated)));
        let rate = sum(self.over.iter().map(|r| r.tangent(by)));
        let share = self.share(covered.zeroth, 0.0);
        // The mass stays, so that what it covers only moves it.
        let kept = match self.amount {
            Amount::Mass(_) if covered.zeroth != 0.0 => {
                covered.weighted(-share * rate.zeroth / covered.zeroth)
            }
            _ => covered.weighted(0.0),
        };
        let own = match (self.by == Some(by), self.amount) {
            (false, _) => 0.0,
            (true, Amount::Fraction(_)) => 1.0,
            (true, Amount::Mass(_)) if covered.zeroth != 0.0 => 1.0 / covered.zeroth,
            (true, Amount::Mass(_)) => 0.0,
        };
        rate.weighted(share)
            .plus(&kept)
            .plus(&covered.weighted(own))
    }
}
