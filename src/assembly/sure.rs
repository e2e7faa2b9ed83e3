//! How far the figures of an assembly may be off, and the chance that each limit holds.

use super::expand::{self, What};
use super::file::Maturity;
use super::growth::{Growth, MaturityRow, Standing};
use super::load::Loaded;
use super::resolve::Resolved;
use super::sources::{self, Sources};
use crate::limits::{Judged, Limit, Measured, Verdict};
use crate::moments::Moments;
use crate::uncertainty::{
    Band, Centre, Combination, Figure, Mass, Sampling, Tangents, Uncertainty, sample, spread,
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

    /// The figure that a limit is held against: masses with all growth (the margin of a mass
    /// limit is that of the predicted mass), centres as stated.
    pub(super) fn value(&self, of: Measured, stated: f64) -> f64 {
        match (of, &self.growth) {
            (Measured::Mass, Some(growth)) => growth.predicted.mass_kg,
            _ => stated,
        }
    }

    /// Adds the chance that the true value lies inside, and what the value is without growth.
    pub(super) fn judge(&self, limit: &Limit, stated: f64, mut judged: Judged) -> Judged {
        if limit.quantity == Measured::Mass && self.growth.is_some() {
            judged.basic = Some(stated);
        }
        if self.uncertainty.is_none() {
            return judged;
        }
        let figure = figure(limit.quantity);
        let slopes = self.tangents.iter().map(|t| figure.slope(&self.whole, t));
        let variables = self.sources.model.variables().iter();
        let sources = slopes.zip(variables.map(|v| v.distribution));
        let c = Combination::new(stated, sources);
        judged.probability = Some(if c.standard() > 0.0 {
            c.within(limit.from, limit.to)
        } else {
            // Nothing moves it, and the verdict has allowed for rounding already.
            f64::from(u8::from(judged.verdict != Verdict::Broken))
        });
        judged
    }

    /// Adds what draws of all sources come to.
    pub(super) fn sample(&mut self, limits: &[Limit], sampling: Sampling) {
        let Some(u) = &self.uncertainty else { return };
        let figures: Vec<_> = limits.iter().map(|l| figure(l.quantity)).collect();
        let bands: Vec<Band<'_>> = limits
            .iter()
            .zip(&figures)
            .map(|(l, figure)| Band {
                name: &l.name,
                quantity: l.quantity.name(),
                figure: figure.as_ref(),
                from: l.from,
                to: l.to,
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

fn figure(of: Measured) -> Box<dyn Figure> {
    match of {
        Measured::Mass => Box::new(Mass),
        Measured::Centre(axis) => Box::new(Centre(axis)),
    }
}
