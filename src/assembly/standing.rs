//! What supports and lines carry, and when the assembly tips: rows of the `balance` document.

use nalgebra::Vector3;
use serde::Serialize;

use super::file::AssemblyFile;
use crate::error::{Result, Warning};
use crate::statics::{self, Stand};

/// Directions in which a lean is tried, evenly around.
const SWEEP: u32 = 24;

/// What one support carries.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct ReactionRow {
    /// Its name.
    pub support: String,
    /// N; null where the thing tips and more than three supports leave no answer.
    pub force_n: Option<f64>,
    /// The least over all equilibria in which no support pulls; null where it tips.
    pub least_n: Option<f64>,
    /// The most over them.
    pub most_n: Option<f64>,
}

/// An edge of the support polygon.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct TipRow {
    /// Names of the supports at its ends.
    pub edge: String,
    /// The slope straight over it at which the thing tips, 0 where it tips as it stands; null
    /// where it does not up to 90°.
    pub angle_deg: Option<f64>,
    /// Level distance of the centre from it, positive inside.
    pub margin_m: f64,
}

/// A lean.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct LeanRow {
    /// Where it leans to: from the assembly's x (seen across gravity) on towards y.
    pub azimuth_deg: f64,
    /// The slope at which it tips; null where it does not up to 90°.
    pub angle_deg: Option<f64>,
}

/// How it hangs.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct HangRow {
    /// The attitude at rest.
    pub attitude: AttitudeRow,
    /// The lines; none where it hangs from a point.
    pub lines: Vec<LineRow>,
}

/// An attitude.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct AttitudeRow {
    /// The direction of gravity in the assembly's axes.
    pub down: [f64; 3],
    /// Rows of the turn that brings the assembly from its axes to how it hangs.
    pub turn: [[f64; 3]; 3],
    /// From how it was drawn.
    pub lean_deg: f64,
    /// Where the hook is in the assembly's axes.
    pub hook_m: [f64; 3],
}

/// What a line carries.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct LineRow {
    /// Its name.
    pub line: String,
    /// N; 0 where it is slack.
    pub tension_n: f64,
    /// The most that it can come to carry when only some lines do.
    pub worst_n: f64,
    /// Its angle from the vertical.
    pub from_vertical_deg: f64,
    /// Whether it hangs loose.
    pub slack: bool,
}

/// What scales say of mass and centre, and how far the model is from it.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct WeighingRow {
    /// As weighed.
    pub mass_kg: f64,
    /// Its standard uncertainty.
    pub mass_standard_kg: f64,
    /// As weighed; along `free` nothing is known, and this is the height of the supports.
    pub centre_m: [f64; 3],
    /// Standard uncertainty of each coordinate; nothing along `free`.
    pub centre_standard_m: [f64; 3],
    /// The direction along which one attitude leaves the centre open; null where it is known.
    pub free: Option<[f64; 3]>,
    /// Of what the weighings disagree by among themselves; null without uncertainties.
    pub chi_squared: Option<f64>,
    /// Its degrees of freedom.
    pub freedom: usize,
    /// The model's mass less that weighed.
    pub model_mass_off_kg: f64,
    /// The model's centre less that weighed; nothing along `free`.
    pub model_centre_off_m: [f64; 3],
}

/// All of it; what the file does not ask for is absent.
#[derive(Clone, Debug, Default, PartialEq, Serialize)]
pub struct Statics {
    /// In the order of the supports.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub reactions: Option<Vec<ReactionRow>>,
    /// Around the support polygon.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub tip: Option<Vec<TipRow>>,
    /// Direction by direction.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub tip_by_direction: Option<Vec<LeanRow>>,
    /// From its hook; null where no attitude at rest was found, which a warning says.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub hang: Option<Option<HangRow>>,
    /// From scales under the supports.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub weighing: Option<WeighingRow>,
}

/// Works out what the file asks for.
///
/// `centre_at` gives the centre of mass, m, when gravity acts along a unit vector in the
/// assembly's axes: a constant for a rigid thing.
pub fn statics(
    file: &AssemblyFile,
    mass_kg: f64,
    centre_at: &mut dyn FnMut(&Vector3<f64>) -> Result<Vector3<f64>>,
) -> Result<(Statics, Vec<Warning>)> {
    let mut out = Statics::default();
    let mut warnings = Vec::new();
    let effective = file.service.gravity.effective();
    let weight = mass_kg * effective.map_or(0.0, |g| g.norm());
    let down = effective.map_or(-Vector3::z(), |g| g.normalize());
    let warning = |kind: &str, message: String, line: Option<u64>, advice: &str| Warning {
        kind: kind.into(),
        message,
        path: Some(file.path.to_string_lossy().into_owned()),
        line,
        advice: advice.into(),
    };
    if let Some(stand) = &file.stand {
        let here = centre_at(&down)?;
        let r = stand.reactions(&here, weight);
        if r.tips {
            warnings.push(warning(
                "tips",
                "the centre of mass stands outside of the supports: it tips as it stands".into(),
                None,
                "move the supports apart or the centre between them",
            ));
        }
        let rows = r.reactions.into_iter().map(|r| ReactionRow {
            support: r.support,
            force_n: r.force,
            least_n: r.least,
            most_n: r.most,
        });
        out.reactions = Some(rows.collect());
        out.tip = Some(edges(stand, centre_at)?);
        out.tip_by_direction = Some(sweep(stand, centre_at)?);
    }
    if let Some(hang) = &file.hang {
        let hung = statics::hang(&hang.hook, &hang.lines, &down, weight, centre_at);
        out.hang = Some(match hung {
            Ok(h) => Some(hang_row(h)),
            Err(e) => {
                warnings.push(warning("hang", e.message, Some(hang.line), &e.advice));
                None
            }
        });
    }
    if !file.weighings.is_empty() {
        let w = statics::weigh(&file.weighings).map_err(|e| e.in_file(&file.path))?;
        let (mass_off, centre_off) = w.disagreement(mass_kg, &centre_at(&down)?);
        out.weighing = Some(WeighingRow {
            mass_kg: w.mass,
            mass_standard_kg: w.mass_standard,
            centre_m: w.centre.into(),
            centre_standard_m: [0, 1, 2].map(|k| w.centre_covariance[(k, k)].max(0.0).sqrt()),
            free: w.free.map(Into::into),
            chi_squared: w.chi_squared,
            freedom: w.freedom,
            model_mass_off_kg: mass_off,
            model_centre_off_m: centre_off.into(),
        });
    }
    Ok((out, warnings))
}

fn edges(
    stand: &Stand,
    centre_at: &mut dyn FnMut(&Vector3<f64>) -> Result<Vector3<f64>>,
) -> Result<Vec<TipRow>> {
    let name = |i: usize| &stand.supports()[i].name;
    let rows = statics::tip_edges(stand, centre_at)?
        .into_iter()
        .map(|t| TipRow {
            edge: format!("{} to {}", name(t.from), name(t.to)),
            angle_deg: t.angle.map(f64::to_degrees),
            margin_m: t.margin,
        });
    Ok(rows.collect())
}

fn sweep(
    stand: &Stand,
    centre_at: &mut dyn FnMut(&Vector3<f64>) -> Result<Vector3<f64>>,
) -> Result<Vec<LeanRow>> {
    let up = stand.up();
    // Azimuth starts at x, or at y where x is nearly the direction of gravity.
    let start = if up.x.abs() < 0.9 {
        Vector3::x()
    } else {
        Vector3::y()
    };
    let start = (start - up * up.dot(&start)).normalize();
    let side = up.cross(&start);
    let lean = |k: u32| {
        let azimuth_deg = 360.0 * f64::from(k) / f64::from(SWEEP);
        let (sin, cos) = azimuth_deg.to_radians().sin_cos();
        let angle = statics::tip_towards(stand, &(start * cos + side * sin), centre_at)?;
        Ok(LeanRow {
            azimuth_deg,
            angle_deg: angle.map(f64::to_degrees),
        })
    };
    (0..SWEEP).map(lean).collect()
}

fn hang_row(h: statics::Hanging) -> HangRow {
    // Adding zero turns −0 into 0.
    let plain = |v: Vector3<f64>| [v.x + 0.0, v.y + 0.0, v.z + 0.0];
    HangRow {
        attitude: AttitudeRow {
            down: plain(h.down),
            turn: [0, 1, 2].map(|r| [0, 1, 2].map(|c| h.turn[(r, c)] + 0.0)),
            lean_deg: h.lean.to_degrees(),
            hook_m: plain(h.hook),
        },
        lines: h
            .lines
            .into_iter()
            .map(|l| LineRow {
                line: l.line,
                tension_n: l.tension,
                worst_n: l.worst,
                from_vertical_deg: l.from_vertical.to_degrees(),
                slack: l.slack,
            })
            .collect(),
    }
}
