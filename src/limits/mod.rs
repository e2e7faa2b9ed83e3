//! Limits on the figures of an assembly, and whether they hold.

use serde::Serialize;

use crate::moments::Moments;

mod envelope;
mod measured;
mod rotor;

pub use envelope::Envelope;
pub use measured::{Axis, Gradient, Measured, SupportShare, Tipping};
pub use rotor::{Plane, Rotor, permissible_unbalance, rad_per_s};

/// What bounds of a limit are like for a search over added masses.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Shape {
    /// Times the total mass it is linear in the masses that are added.
    Linear,
    /// Times the total mass (or as it is) it is a second-order cone in them.
    Cone,
    /// Neither; only a search that proves nothing finds a way.
    NotConvex,
}

/// A band that a figure must stay in; at least one end is stated.
#[derive(Clone, Debug, PartialEq)]
pub struct Limit {
    /// As typed, or the name of the quantity.
    pub name: String,
    /// What it is on.
    pub quantity: Measured,
    /// The least allowed value, in SI units.
    pub from: Option<f64>,
    /// The greatest allowed value, in SI units.
    pub to: Option<f64>,
    /// Its line in the assembly file.
    pub line: u64,
}

/// One end of a limit.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize)]
#[serde(rename_all = "lowercase")]
pub enum End {
    /// The least allowed value.
    From,
    /// The greatest allowed value.
    To,
}

/// What the per cent of a margin are of.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize)]
#[serde(rename_all = "lowercase")]
pub enum PercentOf {
    /// The bound: a limit with one end on what has a natural zero.
    Limit,
    /// The width of the band, `to` − `from`.
    Range,
}

/// Whether a limit holds.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize)]
#[serde(rename_all = "lowercase")]
pub enum Verdict {
    /// The margin is zero or more.
    Holds,
    /// The margin is below zero.
    Broken,
    /// The value may lie on either side within its bound.
    Unsure,
}

/// A limit against the value that was found. Values are in `unit`.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Judged {
    /// Name of the limit.
    pub name: String,
    /// Such as `centre.x`.
    pub quantity: &'static str,
    /// SI unit of the numbers here.
    pub unit: &'static str,
    /// What was found.
    pub value: f64,
    /// Standard uncertainty of the value; null where the uncertainty is not computed.
    pub standard: Option<f64>,
    /// The basic figure, where `value` is the predicted one: masses in an assembly whose parts
    /// carry growth allowances.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub basic: Option<f64>,
    /// The least allowed value.
    pub from: Option<f64>,
    /// The greatest allowed value.
    pub to: Option<f64>,
    /// Distance to the nearest end, positive inside.
    pub margin: f64,
    /// Which end that is.
    pub nearest: End,
    /// The margin in per cent; null where there is nothing sensible to take it of (a centre with
    /// one end: its distance from an origin that anyone may choose says nothing).
    pub margin_percent: Option<f64>,
    /// What the per cent are of.
    pub percent_of: Option<PercentOf>,
    /// Whether it holds.
    pub verdict: Verdict,
    /// Chance that it holds; null where the uncertainty is not computed.
    pub probability: Option<f64>,
}

impl Limit {
    /// The verdict on `value`.
    ///
    /// `rounding` is how far arithmetic alone may have moved the value (same unit). A margin no
    /// larger than that is no margin: it is given as 0 and holds, so that 0.1 kg and 0.2 kg keep
    /// a limit of 0.3 kg.
    pub fn judge(&self, value: f64, rounding: f64) -> Judged {
        self.judge_in(value, (self.from, self.to), rounding)
    }

    /// The verdict on a whole of these mass moments, with a box of this diagonal, m. What has no
    /// value is broken.
    pub fn judge_whole(&self, m: &Moments, diagonal: f64) -> Judged {
        let value = self.quantity.value(m).unwrap_or(f64::NAN);
        let rounding = self.quantity.rounding(m, diagonal);
        self.judge_in(value, self.band(m), rounding)
    }

    /// The band for a whole of these moments: that of the file, but for an envelope, whose band
    /// depends on the mass, and for unbalance, of which a heavier rotor is permitted more.
    pub fn band(&self, m: &Moments) -> (Option<f64>, Option<f64>) {
        match &self.quantity {
            Measured::Envelope(e) => {
                let [lo, hi] = e.band(m.zeroth, self.quantity.value(m).unwrap_or(f64::NAN));
                (Some(lo.0), Some(hi.0))
            }
            Measured::Unbalance(rotor, plane) => (None, Some(rotor.permitted(m, *plane))),
            _ => (self.from, self.to),
        }
    }

    /// The margin to one end; `None` where there is no such end or no value.
    pub fn margin(&self, m: &Moments, end: End) -> Option<f64> {
        let value = self.quantity.value(m)?;
        let (from, to) = self.band(m);
        match end {
            End::From => from.map(|from| value - from),
            End::To => to.map(|to| to - value),
        }
    }

    /// The exact gradient of [`Limit::margin`] with respect to the moments of the whole.
    pub fn margin_gradient(&self, m: &Moments, end: End) -> Option<Gradient> {
        let value = self.quantity.gradient(m)?;
        let nothing = Gradient::none(value.about);
        let bound = match &self.quantity {
            Measured::Envelope(e) => {
                let [lo, hi] = e.band(m.zeroth, self.quantity.value(m)?);
                let zeroth = match end {
                    End::From => lo.1,
                    End::To => hi.1,
                };
                Gradient { zeroth, ..nothing }
            }
            Measured::Unbalance(rotor, plane) => rotor.permitted_gradient(m, value.about, *plane),
            _ => nothing,
        };
        match (end, self.band(m)) {
            (End::From, (Some(_), _)) => Some(value.minus(bound)),
            (End::To, (_, Some(_))) => Some(bound.minus(value)),
            _ => None,
        }
    }

    /// What one end is like for a search over added masses. Products about the centre and an
    /// outline with a side that bends the wrong way are not convex as a rule; where other limits
    /// hold the centre, or the outline is kind, they may be.
    pub fn shape(&self, end: End) -> Shape {
        match (&self.quantity, end) {
            (
                Measured::Mass
                | Measured::Centre(_)
                | Measured::Station(_)
                | Measured::Percent { .. }
                | Measured::FromPlane(_)
                | Measured::Reaction(_)
                | Measured::Inertia { about: Some(_), .. },
                _,
            ) => Shape::Linear,
            (Measured::Tip(_), End::From) => Shape::Linear,
            (Measured::FromPoint(_) | Measured::FromLine(_) | Measured::Unbalance(..), End::To) => {
                Shape::Cone
            }
            (
                Measured::Inertia {
                    row,
                    column,
                    about: None,
                },
                End::From,
            ) if row == column => Shape::Cone,
            _ => Shape::NotConvex,
        }
    }

    fn judge_in(
        &self,
        value: f64,
        (from, to): (Option<f64>, Option<f64>),
        rounding: f64,
    ) -> Judged {
        let below = from.map(|from| value - from);
        let above = to.map(|to| to - value);
        let (margin, nearest) = match (below, above) {
            (Some(b), Some(a)) if b <= a => (b, End::From),
            (Some(b), None) => (b, End::From),
            (_, Some(a)) => (a, End::To),
            // A limit has at least one end; without one nothing can break it.
            (None, None) => (f64::INFINITY, End::To),
        };
        let margin = if margin.abs() <= rounding {
            0.0
        } else {
            margin
        };
        let base = match (from, to) {
            (Some(from), Some(to)) => Some((to - from, PercentOf::Range)),
            (Some(end), None) | (None, Some(end)) if self.quantity.is_absolute() => {
                Some((end, PercentOf::Limit))
            }
            _ => None,
        };
        let percent = base
            .map(|(base, of)| (100.0 * margin / base, of))
            .filter(|(percent, _)| percent.is_finite());
        Judged {
            name: self.name.clone(),
            quantity: self.quantity.name(),
            unit: self.quantity.unit(),
            value,
            standard: None,
            basic: None,
            from,
            to,
            margin,
            nearest,
            margin_percent: percent.map(|(p, _)| p),
            percent_of: percent.map(|(_, of)| of),
            // A value that is not a number is inside nothing.
            verdict: if margin >= 0.0 {
                Verdict::Holds
            } else {
                Verdict::Broken
            },
            probability: None,
        }
    }
}

#[cfg(test)]
#[path = "gradient_tests.rs"]
mod gradient_tests;

#[cfg(test)]
mod tests {
    use super::*;

    fn limit(quantity: Measured, from: Option<f64>, to: Option<f64>) -> Limit {
        Limit {
            name: quantity.name().into(),
            quantity,
            from,
            to,
            line: 1,
        }
    }

    #[test]
    fn margins_by_hand() {
        let l = limit(Measured::Centre(0), Some(-0.04), Some(0.025));
        let j = l.judge(0.015, 0.0);
        assert_eq!(j.nearest, End::To);
        assert!((j.margin - 0.010).abs() < 1e-17);
        assert_eq!(j.percent_of, Some(PercentOf::Range));
        assert!((j.margin_percent.unwrap() - 100.0 * 10.0 / 65.0).abs() < 1e-12);
        assert_eq!(j.verdict, Verdict::Holds);
        let j = l.judge(-0.05, 0.0);
        assert_eq!((j.nearest, j.verdict), (End::From, Verdict::Broken));
        assert!((j.margin + 0.01).abs() < 1e-17);
    }

    #[test]
    fn equality_holds_and_rounding_is_no_breach() {
        let l = limit(Measured::Mass, None, Some(0.3));
        let j = l.judge(0.3, 0.0);
        assert_eq!((j.margin, j.verdict), (0.0, Verdict::Holds));
        assert_eq!(l.judge(0.1 + 0.2, 0.0).verdict, Verdict::Broken);
        let j = l.judge(0.1 + 0.2, 1e-13 * 0.3);
        assert_eq!((j.margin, j.verdict), (0.0, Verdict::Holds));
        assert_eq!(l.judge(0.3001, 1e-13 * 0.3).verdict, Verdict::Broken);
        assert_eq!(j.percent_of, Some(PercentOf::Limit));
    }

    #[test]
    fn no_percent_of_an_arbitrary_origin() {
        let j = limit(Measured::Centre(2), None, Some(1.0)).judge(0.5, 0.0);
        assert_eq!((j.margin_percent, j.percent_of), (None, None));
        let j = limit(Measured::Centre(2), Some(0.5), Some(0.5)).judge(0.5, 0.0);
        assert_eq!((j.margin, j.margin_percent), (0.0, None));
    }

    #[test]
    fn not_a_number_is_broken() {
        let j = limit(Measured::Mass, None, Some(1.0)).judge(f64::NAN, 0.0);
        assert_eq!(j.verdict, Verdict::Broken);
    }
}
