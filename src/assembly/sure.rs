//! How far the figures of an assembly may be off, and the chance that each limit holds.

use super::expand::{self, What};
use super::file::Maturity;
use super::growth::{Growth, MaturityRow, Standing};
use super::load::Loaded;
use super::resolve::Resolved;
use super::sources::{self, Sources};
use crate::limits::{End, Gradient, Judged, Limit, Measured, Verdict};
use crate::moments::Moments;
use crate::uncertainty::{
    Band, Combination, Figure, Sampling, Tangents, Uncertainty, sample, spread,
};

/// What an assembly's tolerances come to.
pub(super) struct Sure {
    sources: Sources,
    /// As stated, about the centre.
    whole: Moments,
    tangents: Tangents,
    /// With all growth.
    pub(super) growth: Option<Growth>,
    /// `None` where nothing has a tolerance.
    pub(super) uncertainty: Option<Uncertainty>,
    /// Tolerances were stated, and yet nothing bounds the figures.
    pub(super) unbounded: bool,
    /// Maturity of each thing weighed.
    maturities: Vec<Option<Maturity>>,
}

impl Sure {
    /// Of a whole with these moments.
    pub(super) fn of(loaded: &Loaded, resolved: &Resolved, whole: &Moments) -> Option<Self> {
        let sources = sources::of(loaded, resolved);
        let whole = whole.shifted(whole.centre()?);
        let stated = !sources.model.variables().is_empty();
        let mut uncertainty = None;
        if stated && !sources.centre_unknown {
            uncertainty = spread(&sources.model, &whole);
        }
        if let Some(u) = &mut uncertainty
            && sources.inertia_unknown
        {
            u.inertia_kg_m2 = None;
            u.principal_moments_kg_m2 = None;
            u.radii_of_gyration_m = None;
        }
        let instances = expand::expand(&loaded.file);
        let maturity: std::collections::HashMap<&str, Maturity> = instances
            .iter()
            .filter_map(|i| {
                let maturity = match i.what {
                    What::Part(p) => p.maturity.clone(),
                    What::Item(item) => item.maturity.clone(),
                    What::Tank(_) => None,
                };
                Some((i.path.as_str(), maturity?))
            })
            .collect();
        let of = |w: &super::Weighed| maturity.get(w.path.as_str()).cloned();
        let maturities = resolved.weighed.iter().map(of).collect();
        let tangents = sources.model.tangents(whole.about);
        let mut out = Self {
            sources,
            whole,
            tangents,
            growth: None,
            unbounded: uncertainty.is_none() && stated,
            uncertainty,
            maturities,
        };
        out.growth = out.grown(resolved);
        Some(out)
    }

    fn grown(&self, resolved: &Resolved) -> Option<Growth> {
        if self.maturities.iter().all(Option::is_none) {
            return None;
        }
        let model = &self.sources.model;
        let mut values = model.stated();
        for (by, allowance) in &self.sources.growth {
            values.set(*by, *allowance);
        }
        let predicted = model.moments(&values, self.whole.about);
        let mut by_maturity: Vec<MaturityRow> = Vec::new();
        let terms = model.terms().iter().zip(&resolved.weighed);
        for ((term, weighed), maturity) in terms.zip(&self.maturities) {
            let name = maturity.as_ref().map(|m| m.name.clone());
            let percent = maturity.as_ref().map_or(0.0, |m| 100.0 * m.allowance);
            let same = |r: &MaturityRow| r.maturity == name && r.allowance_percent == percent;
            let at = by_maturity.iter().position(same).unwrap_or_else(|| {
                by_maturity.push(MaturityRow {
                    maturity: name.clone(),
                    allowance_percent: percent,
                    parts: 0,
                    basic_mass_kg: 0.0,
                    predicted_mass_kg: 0.0,
                });
                by_maturity.len() - 1
            });
            let row = &mut by_maturity[at];
            row.parts += 1;
            row.basic_mass_kg += weighed.moments.zeroth;
            row.predicted_mass_kg += term.moments(&values).zeroth;
        }
        let (basic, predicted) = (Standing::of(&self.whole)?, Standing::of(&predicted)?);
        Some(Growth {
            allowance_kg: predicted.mass_kg - basic.mass_kg,
            basic,
            predicted,
            by_maturity,
        })
    }

    /// Standard uncertainties of mass (kg) and centre (m) of some of what was weighed, by place;
    /// `None` where uncertainty is not computed.
    pub(super) fn standards(
        &self,
        things: impl IntoIterator<Item = usize>,
    ) -> Option<(f64, [f64; 3])> {
        self.uncertainty.as_ref()?;
        Some(self.sources.model.standards(things))
    }

    /// Adds the standard uncertainty of the value, the chance that the true value lies inside,
    ///
    /// Where the band itself moves with the whole (an outline of mass and station, a permitted
    /// unbalance), the chance is 1 less the chances of each margin being negative: no more than
    /// the true one. A length that may be nothing within three standard uncertainties has no
    /// linear spread; there both are left out, and draws tell the chance.
    pub(super) fn judge(&self, limit: &Limit, stated: f64, mut judged: Judged) -> Judged {
        let Some(u) = &self.uncertainty else {
            return judged;
        };
        if !stated.is_finite() || self.near_nothing(&limit.quantity, stated, u) {
            return judged;
        }
        let combined = |value: f64, slope: Option<Gradient>| {
            let slope = slope?;
            let slopes = self.tangents.iter().map(|t| slope.of(t));
            let variables = self.sources.model.variables().iter();
            let c = Combination::new(value, slopes.zip(variables.map(|v| v.distribution)));
            c.standard().is_finite().then_some(c)
        };
        let Some(c) = combined(stated, limit.quantity.gradient(&self.whole)) else {
            return judged;
        };
        judged.standard = Some(c.standard());
        judged.probability = if c.standard() == 0.0 {
            // Nothing moves it, and the verdict has allowed for rounding already.
            Some(f64::from(u8::from(judged.verdict != Verdict::Broken)))
        } else if moves(&limit.quantity) {
            let outside = [End::From, End::To].map(|end| {
                let margin = limit.margin(&self.whole, end)?;
                let c = combined(margin, limit.margin_gradient(&self.whole, end))?;
                Some(1.0 - c.within(Some(0.0), None))
            });
            Some((1.0 - outside.iter().flatten().sum::<f64>()).max(0.0))
        } else {
            Some(c.within(limit.from, limit.to))
        };
        judged
    }

    /// Whether a length, or an unbalance, may be nothing.
    fn near_nothing(&self, of: &Measured, stated: f64, u: &Uncertainty) -> bool {
        let [x, y, z] = u.centre_of_mass_m.standard;
        let off = (x * x + y * y + z * z).sqrt();
        match of {
            Measured::FromPoint(_) | Measured::FromLine(_) => stated < 3.0 * off,
            Measured::Unbalance(..) => stated < 3.0 * off * self.whole.zeroth,
            _ => false,
        }
    }

    /// What each variable moves the moments of the whole by, one standard deviation each, with its
    /// name.
    pub(super) fn drivers(&self) -> Vec<(String, Moments)> {
        let variables = self.sources.model.variables().iter();
        let moved = self.tangents.iter().zip(variables);
        moved
            .map(|(t, v)| (v.name.clone(), t.weighted(v.distribution.standard())))
            .collect()
    }

    /// Adds what draws of all sources come to.
    pub(super) fn sample(&mut self, limits: &[Limit], sampling: Sampling) {
        let Some(u) = &self.uncertainty else { return };
        let figures: Vec<_> = limits.iter().map(|l| OfLimit { limit: l }).collect();
        let bands: Vec<Band<'_>> = figures
            .iter()
            .map(|figure| {
                let l = figure.limit;
                let moves = moves(&l.quantity);
                Band {
                    name: &l.name,
                    quantity: l.quantity.name(),
                    figure,
                    from: if moves { Some(0.0) } else { l.from },
                    to: if moves { None } else { l.to },
                }
            })
            .collect();
        let mut sampled = sample(&self.sources.model, &self.whole, &bands, u, sampling);
        if let (Some(s), true) = (&mut sampled, self.sources.inertia_unknown) {
            s.inertia_kg_m2 = None;
            s.principal_moments_kg_m2 = None;
        }
        if let Some(u) = &mut self.uncertainty {
            u.sampled = sampled;
        }
    }

    /// The maturity of a thing that was weighed, by place, with its predicted mass.
    pub(super) fn maturity(&self, thing: usize, mass: f64) -> Option<(String, f64)> {
        let m = self.maturities.get(thing)?.as_ref()?;
        Some((m.name.clone(), mass * (1.0 + m.allowance)))
    }
}

/// Whether the band of a quantity depends on the whole.
fn moves(of: &Measured) -> bool {
    matches!(of, Measured::Envelope(_) | Measured::Unbalance(..))
}

/// The figure of a limit; its least margin where the band moves with the whole.
struct OfLimit<'a> {
    limit: &'a Limit,
}

impl OfLimit<'_> {
    fn nearest(&self, whole: &Moments) -> Option<(f64, End)> {
        let margins = [End::From, End::To].map(|end| Some((self.limit.margin(whole, end)?, end)));
        let margins = margins.into_iter().flatten();
        margins.min_by(|a, b| a.0.total_cmp(&b.0))
    }
}

impl Figure for OfLimit<'_> {
    fn value(&self, whole: &Moments) -> f64 {
        let value = if moves(&self.limit.quantity) {
            self.nearest(whole).map(|(margin, _)| margin)
        } else {
            self.limit.quantity.value(whole)
        };
        value.unwrap_or(f64::NAN)
    }

    fn slope(&self, whole: &Moments, rate: &Moments) -> f64 {
        let gradient = if moves(&self.limit.quantity) {
            let end = self.nearest(whole).map(|(_, end)| end);
            end.and_then(|end| self.limit.margin_gradient(whole, end))
        } else {
            self.limit.quantity.gradient(whole)
        };
        gradient.map_or(f64::NAN, |g| g.of(rate))
    }
}
