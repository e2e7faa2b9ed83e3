//! Which material a body is taken to be of.

use globset::{GlobBuilder, GlobMatcher};

use super::Row;
use crate::error::{Error, Kind, Result};
use crate::masses::Substance;
use crate::material::Table;

/// Rules by globs, the first match wins; what none matches is of the substance for all the rest.
#[derive(Clone, Debug, Default)]
pub struct Substances {
    rules: Vec<(GlobMatcher, Substance)>,
    /// For what no rule matches; without it such bodies get no mass.
    pub rest: Option<Substance>,
}

impl Substances {
    /// No rules, and `rest` for all.
    pub fn of_rest(rest: Option<Substance>) -> Self {
        Self {
            rules: Vec::new(),
            rest,
        }
    }

    /// Adds a rule, written `GLOB=MATERIAL`. The glob is of a body's id or name, of a file's path,
    /// or of both as `path#body`; `*` also matches `/`.
    ///
    /// # Errors
    /// `usage` for what is no rule; `unknown-name` for the material.
    pub fn assign(&mut self, rule: &str) -> Result<()> {
        let usage = |what: String| {
            Error::new(
                Kind::Usage,
                what,
                "write a glob of bodies or files and a material, such as --assign 'frame*=steel S235'",
            )
        };
        let (glob, material) = rule
            .rsplit_once('=')
            .ok_or_else(|| usage(format!("--assign: \"{rule}\" has no =")))?;
        let glob = GlobBuilder::new(glob.trim())
            .literal_separator(false)
            .build()
            .map_err(|e| usage(format!("--assign: `{glob}` is no glob: {}", e.kind())))?;
        let material = Table::standard().get(material.trim())?;
        let substance = Substance {
            name: Some(material.name.clone()),
            density: material.density,
        };
        self.rules.push((glob.compile_matcher(), substance));
        Ok(())
    }

    /// Fills the row's material, density and mass.
    pub fn weigh(&self, row: &mut Row) {
        (
            row.material,
            row.density_kg_m3,
            row.mass_kg,
            row.mass_standard_kg,
        ) = Default::default();
        if row.body.is_none() {
            return;
        }
        let place = row.place();
        let words = [&row.body, &row.name, &row.path];
        let words = || words.into_iter().flatten().chain([&place]);
        let rule = self
            .rules
            .iter()
            .find(|(g, _)| words().any(|w| g.is_match(w)));
        let Some(of) = rule.map(|r| &r.1).or(self.rest.as_ref()) else {
            return;
        };
        row.material.clone_from(&of.name);
        row.density_kg_m3 = Some(of.density.value);
        row.mass_kg = row.volume_m3.map(|v| v * of.density.value);
        row.mass_standard_kg = row
            .volume_m3
            .zip(of.density.tolerance)
            .map(|(v, t)| v * t.standard());
    }
}
