//! Facets that stand for curves: when they are looked at, and what becomes of the figures.

use clap::Args;

use crate::curvature::{CREASE_DEG, FacetError, estimate};
use crate::error::{Result, Warning};
use crate::mesh::{Body, Mesh};
use crate::moments::SolidIntegrals;

/// Bodies of more triangles are looked at only where the curves are asked for: it would take longer
/// than all the rest.
const UNASKED: usize = 50_000;

/// Options of facets that stand for curves.
#[derive(Args, Clone, Copy, Debug)]
pub(super) struct CurveArgs {
    /// Give the figures of the curved bodies that the facets stand for, as estimated from the facets
    #[arg(long, conflicts_with_all = ["whole", "filled", "layers", "shell"])]
    pub(super) true_curves: bool,
    /// Edges that turn by less than so many degrees stand for a curve
    #[arg(long, value_name = "DEG", default_value_t = CREASE_DEG, value_parser = degrees)]
    pub(super) crease: f64,
}

fn degrees(text: &str) -> std::result::Result<f64, String> {
    let number = text.trim().trim_end_matches(['°', ' ']);
    let number = number.strip_suffix("deg").map_or(number, str::trim_end);
    match number.parse::<f64>() {
        Ok(d) if (0.0..=90.0).contains(&d) => Ok(d),
        _ => Err("an angle from 0 to 90 degrees is wanted, such as 30".to_owned()),
    }
}

impl CurveArgs {
    /// Whether a body is looked at: not one of a file of many triangles unasked, nor one with a
    /// solid in its solid, whose parts count in ways of their own.
    pub(super) fn looks(&self, mesh: &Mesh, body: &Body) -> bool {
        !body.has_nested() && (mesh.soup.triangles.count() <= UNASKED || self.true_curves)
    }

    /// What the facets do to a body that is weighed as it stands; `None` where it is not looked at.
    ///
    /// # Errors
    /// As [`estimate`].
    pub(super) fn look(&self, mesh: &Mesh, body: &Body) -> Result<Option<FacetError>> {
        if !self.looks(mesh, body) {
            return Ok(None);
        }
        estimate(&mesh.outward_facets(body), self.crease).map(Some)
    }

    /// The integrals of the curved body, where it was asked for.
    pub(super) fn corrected(&self, mesh: &SolidIntegrals, error: &FacetError) -> SolidIntegrals {
        if !self.true_curves {
            return *mesh;
        }
        SolidIntegrals {
            moments: error.corrected(&mesh.moments),
            area: mesh.area - error.area,
            absolute_volume: mesh.absolute_volume,
        }
    }

    /// Said of bodies whose figures are not those of curves although that was asked for.
    pub(super) fn not_corrected(&self, path: &std::path::Path, ids: &[String]) -> Option<Warning> {
        (self.true_curves && !ids.is_empty()).then(|| Warning {
            kind: "curves-not-estimated".to_owned(),
            message: format!(
                "the figures of {} are those of the facets as they stand",
                ids.join(", ")
            ),
            path: Some(path.to_string_lossy().into_owned()),
            line: None,
            advice: "curves are estimated of closed bodies without a solid inside their solid"
                .to_owned(),
        })
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn angles_are_read_with_and_without_their_unit() {
        for text in ["30", "30°", "30 deg", " 30.0 "] {
            assert_eq!(degrees(text), Ok(30.0));
        }
        for text in ["", "x", "-1", "91", "nan", "30 rad"] {
            assert!(degrees(text).is_err(), "{text}");
        }
    }
}
