//! Limits on the figures of an assembly, and whether they hold.

use serde::Serialize;

/// What a limit is on.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Measured {
    /// The total mass, kg.
    Mass,
    /// A component of the centre of mass, 0 to 2 for x to z, m.
    Centre(usize),
}

impl Measured {
    /// Its name in files and results.
    pub fn name(self) -> &'static str {
        match self {
            Self::Mass => "mass",
            Self::Centre(0) => "centre.x",
            Self::Centre(1) => "centre.y",
            Self::Centre(_) => "centre.z",
        }
    }

    /// The SI unit that values and bounds are in.
    pub fn unit(self) -> &'static str {
        match self {
            Self::Mass => "kg",
            Self::Centre(_) => "m",
        }
    }
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
    /// The bound that is nearest: a mass limit with one end.
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
        let below = self.from.map(|from| value - from);
        let above = self.to.map(|to| to - value);
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
        let base = match (self.from, self.to, self.quantity) {
            (Some(from), Some(to), _) => Some((to - from, PercentOf::Range)),
            (Some(end), None, Measured::Mass) | (None, Some(end), Measured::Mass) => {
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
            basic: None,
            from: self.from,
            to: self.to,
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
