//! What is said of facets that stand for curves.

use serde::Serialize;

use super::digits::{at_most, significant};
use crate::curvature::{FacetError, Reading};
use crate::moments::SolidIntegrals;

/// What the facets do to the figures of one body: the mesh's figure minus the curved body's.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Facets {
    /// m³.
    pub volume_error_m3: f64,
    /// By convex surfaces, m³; ≤ 0.
    pub convex_m3: f64,
    /// By hollow surfaces, m³; ≥ 0.
    pub concave_m3: f64,
    /// m².
    pub area_error_m2: f64,
    /// m.
    pub centre_error_m: Option<[f64; 3]>,
    /// Of the volume's inertia about the centre, m⁵.
    pub inertia_error_m5: Option<[[f64; 3]; 3]>,
    /// How far the volume's error may itself be off, m³.
    pub volume_doubt_m3: f64,
    /// Both readings of the volume.
    pub readings: Readings,
    /// Between what the volume of the curved body lies: one-sided of the mesh's own figure, even on
    /// both sides of a corrected one.
    pub volume_interval_m3: [f64; 2],
    /// Part of the area that is taken as curved.
    pub curved_share: f64,
    /// Edges that turn by less were taken as parts of a curve.
    pub crease_deg: f64,
    /// What the figures of this body are of: `flat` facets as they stand, or the `curved` body.
    pub figures: &'static str,
}

/// A coarse cylinder and a prism are the same mesh.
#[derive(Clone, Copy, Debug, PartialEq, Serialize)]
pub struct Readings {
    /// If the facets are what is meant, m³.
    pub flat_m3: f64,
    /// If they stand for curves, m³.
    pub curved_m3: f64,
}

impl Facets {
    /// Of a body whose mesh has these integrals and whose facets do this, both in the file's unit of
    /// `metres`; `corrected` where its figures are the curved body's.
    pub fn of(mesh: &SolidIntegrals, error: &FacetError, metres: f64, corrected: bool) -> Self {
        let mesh = mesh.moments.scaled(metres);
        let error = error.scaled(metres);
        let curved = error.corrected(&mesh);
        let inertia = mesh.inertia().zip(curved.inertia()).map(|(a, b)| a - b);
        let reading = corrected.then_some(Reading::Curved);
        let (low, high) = error.volume_interval(mesh.zeroth, reading);
        Self {
            volume_error_m3: error.moments.zeroth,
            convex_m3: error.convex,
            concave_m3: error.concave,
            area_error_m2: error.area,
            centre_error_m: error.centre(&mesh).map(Into::into),
            inertia_error_m5: inertia.map(|m| [0, 1, 2].map(|i| [0, 1, 2].map(|j| m[(i, j)]))),
            volume_doubt_m3: error.doubt,
            readings: Readings {
                flat_m3: mesh.zeroth,
                curved_m3: curved.zeroth,
            },
            volume_interval_m3: [low, high],
            curved_share: error.curved_share,
            crease_deg: error.crease_deg,
            figures: if corrected { "curved" } else { "flat" },
        }
    }

    /// For people, in one line without its end.
    pub(super) fn line(&self) -> String {
        let crease = format!(
            "edges that turn by less than {}° are taken as curves (--crease)",
            self.crease_deg
        );
        if self.curved_share == 0.0 {
            return format!("facets: none stands for a curve; {crease}");
        }
        let whole = self.readings.curved_m3.abs();
        let percent = |x: f64| 100.0 * x / whole;
        let signed = |x: f64| {
            let size = significant(percent(x).abs(), 2);
            if x < 0.0 {
                format!("−{size} %")
            } else {
                format!("+{size} %")
            }
        };
        let mut by = Vec::new();
        let least = 1e-6 * self.convex_m3.abs().max(self.concave_m3);
        if -self.convex_m3 > least {
            by.push(format!("outer curves {}", signed(self.convex_m3)));
        }
        if self.concave_m3 > least {
            by.push(format!("bores and hollows {}", signed(self.concave_m3)));
        }
        let by = by.join(", ");
        let doubt = at_most(percent(self.volume_doubt_m3));
        let side = if self.volume_error_m3 < 0.0 {
            "low"
        } else {
            "high"
        };
        let off = significant(percent(self.volume_error_m3).abs(), 2);
        let what = if self.figures == "curved" {
            format!(
                "figures are of the true curves (--true-curves); the mesh's volume is about {off} % {side}"
            )
        } else {
            format!("volume about {off} % {side}")
        };
        format!(
            "facets: {what}: {by}, itself within {doubt} %; {crease}, if they are meant the volume is the mesh's own"
        )
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::moments::Moments;
    use nalgebra::Vector3;

    fn facets(corrected: bool) -> Facets {
        let at = Vector3::zeros();
        let mesh = SolidIntegrals {
            moments: Moments {
                second: nalgebra::Matrix3::identity(),
                ..Moments::point(at, 99.0)
            },
            area: 1.0,
            absolute_volume: 99.0,
        };
        let error = FacetError {
            moments: Moments::point(at, -1.0),
            convex: -1.5,
            concave: 0.5,
            doubt: 0.25,
            curved_share: 0.5,
            ..FacetError::none(at, 30.0)
        };
        Facets::of(&mesh, &error, 1.0, corrected)
    }

    #[test]
    fn the_bias_is_one_sided_until_it_is_corrected() {
        assert_eq!(facets(false).volume_interval_m3, [99.0, 100.25]);
        assert_eq!(facets(true).volume_interval_m3, [99.75, 100.25]);
        assert_eq!(facets(true).readings.curved_m3, 100.0);
    }

    #[test]
    fn the_line_says_total_regions_and_crease() {
        let line = facets(false).line();
        for part in [
            "about 1.0 % low",
            "outer curves −1.5 %",
            "hollows +0.50 %",
            "30°",
        ] {
            assert!(line.contains(part), "{part} not in {line}");
        }
        assert!(facets(true).line().contains("--true-curves"));
    }
}
