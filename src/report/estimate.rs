//! What is said of figures that rest on caps over the holes of an open body.

use serde::Serialize;

use crate::quantity::Coverage;
use crate::soundness::cap::{Bounds, Cap};
use crate::uncertainty::BodyBounds;

/// How figures of an open body were come by, and how far they may be off if an assumption holds.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Estimated {
    /// `capped`: each boundary loop closed by its own least cap.
    pub method: &'static str,
    /// What the bounds rest on, in words.
    #[serde(rename = "if")]
    pub if_: String,
    /// m³, either way.
    pub volume_bound_m3: Option<f64>,
    /// m.
    pub centre_bound_m: Option<f64>,
    /// Of each component of the volume's inertia about the centre, m⁵.
    pub inertia_bound_m5: Option<f64>,
}

/// The assumption as the text output says it.
pub const IF: &str = "if the missing surface is no larger than twice its flat cap";

impl Estimated {
    /// How the figures were come by, for people.
    pub fn how(&self) -> &'static str {
        match self.method {
            "capped" => "open and weighed with its holes capped",
            _ => "space that is filled twice is counted once, along rays",
        }
    }

    /// The bounds as sources of uncertainty; none where the volume is not bounded. Caps give the
    /// half-width of a range, rays three standard errors.
    pub fn sources(&self) -> Option<BodyBounds> {
        let (name, coverage) = match self.method {
            "capped" => ("capped holes", Coverage::HalfWidth),
            _ => ("rays", Coverage::Standard { k: 3.0 }),
        };
        Some(BodyBounds {
            name: name.to_owned(),
            coverage,
            volume: self.volume_bound_m3?,
            centre: self.centre_bound_m,
            inertia: self.inertia_bound_m5,
        })
    }

    /// What the bounds rest on, for people.
    pub fn assumption(&self) -> String {
        match self.method {
            "capped" => IF.to_owned(),
            _ => format!("if {}", self.if_),
        }
    }

    /// Bounds in the file's unit of `metres`, and the caps that they come from.
    pub fn of(bounds: &Bounds, caps: &[Cap], metres: f64) -> Self {
        let finite = |x: f64| x.is_finite().then_some(x);
        let area: f64 = caps.iter().map(|c| c.area).sum();
        let each = if caps.len() == 1 {
            "the cap"
        } else {
            "each cap"
        };
        Self {
            method: "capped",
            if_: format!(
                "the missing surface is no larger than twice its flat cap ({} in all, {:.6e} m2), lies on one side of it, and stays within twice the radius of a disc of {each}'s area, or the loop's own, of the loop's centre",
                caps.len(),
                area * metres * metres,
            ),
            volume_bound_m3: finite(bounds.volume * metres.powi(3)),
            centre_bound_m: finite(bounds.centre * metres),
            inertia_bound_m5: finite(bounds.inertia * metres.powi(5)),
        }
    }
}
