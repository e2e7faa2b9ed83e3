//! Figures of a printed part.

use serde::Serialize;

use crate::moments::Moments;
use crate::printed::Printed;

/// What is in no figure of a print.
pub const LEFT_OUT: [&str; 3] = ["supports", "brim", "purge"];

/// One body as printed, SI units.
#[derive(Clone, Copy, Debug)]
pub struct PrintedBody<'a> {
    /// As printed.
    pub printed: &'a Printed,
    /// Volume moments of its mesh.
    pub solid: &'a Moments,
    /// kg/m³ of its material.
    pub density: Option<f64>,
}

/// How a part is printed and what that comes to. Its fields are those of the JSON.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct PrintFigures {
    /// `layers` or `shell`.
    pub method: &'static str,
    /// Material, m³, without what closed hollows keep.
    pub printed_volume_m3: f64,
    /// What is sparse or hollow, m³.
    pub core_volume_m3: f64,
    /// How far the core's volume may be off, m³; null for layers.
    pub core_error_m3: Option<f64>,
    /// Fraction of the core that is material.
    pub infill: f64,
    /// Parts of the printed volume, 0 to 1.
    pub shares: Shares,
    /// Number of layers; null for a shell.
    pub layers: Option<usize>,
    /// Length of filament, m; null for a shell.
    pub filament_m: Option<f64>,
    /// Area of the first layer, m²; null for a shell.
    pub bed_contact_m2: Option<f64>,
    /// What closed hollows keep; null where there are none.
    pub trapped: Option<TrappedFigures>,
    /// The infill for which the part would have its measured mass.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub implied_infill: Option<f64>,
    /// The density of the material for which the part would have its measured mass, kg/m³.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub implied_density_kg_m3: Option<f64>,
    /// What no figure holds.
    pub left_out: [&'static str; 3],
}

/// Parts of the printed volume.
#[derive(Clone, Copy, Debug, Default, PartialEq, Serialize)]
pub struct Shares {
    /// Walls; of a shell all of it.
    pub wall: f64,
    /// Skins.
    pub skin: f64,
    /// Infill.
    pub infill: f64,
}

/// The powder or resin in closed hollows.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct TrappedFigures {
    /// How many hollows.
    pub hollows: usize,
    /// m³.
    pub volume_m3: f64,
    /// kg/m³; the material's own where none is stated.
    pub density_kg_m3: Option<f64>,
    /// Whether that density is the material's own.
    pub density_assumed: bool,
    /// Of what is kept, kg.
    pub mass_kg: Option<f64>,
    /// Of the part with what it keeps, kg: this is the part's mass.
    pub mass_with_kg: Option<f64>,
    /// Of the part if all were drained, kg.
    pub mass_without_kg: Option<f64>,
}

impl PrintFigures {
    /// Of the bodies of one part, all printed alike; `None` for no body. `measured` is what the
    /// scale showed, kg.
    pub fn of(bodies: &[PrintedBody<'_>], measured: Option<f64>) -> Option<Self> {
        let first = bodies.first()?.printed;
        let sum = |of: &dyn Fn(&PrintedBody<'_>) -> f64| bodies.iter().map(of).sum::<f64>();
        let each = |of: &dyn Fn(&Printed) -> Option<f64>| {
            bodies.iter().map(|b| of(b.printed)).sum::<Option<f64>>()
        };
        let printed = sum(&|b| b.printed.moments.zeroth);
        let share = |of: &dyn Fn(&Printed) -> f64| {
            let volume = sum(&|b| of(b.printed) * b.printed.moments.zeroth);
            if printed > 0.0 { volume / printed } else { 0.0 }
        };
        let [implied_infill, implied_density] = match measured {
            None => [None, None],
            Some(mass) => [implied_infill(bodies, mass), implied_density(bodies, mass)],
        };
        Some(Self {
            method: match first.layers {
                Some(_) => "layers",
                None => "shell",
            },
            printed_volume_m3: printed,
            core_volume_m3: sum(&|b| b.printed.core.zeroth),
            core_error_m3: each(&|p| p.core_error),
            infill: first.infill,
            shares: Shares {
                wall: share(&|p| p.shares.wall),
                skin: share(&|p| p.shares.skin),
                infill: share(&|p| p.shares.infill),
            },
            layers: bodies.iter().filter_map(|b| b.printed.layers).max(),
            filament_m: each(&|p| p.filament),
            bed_contact_m2: each(&|p| p.bed_contact),
            trapped: trapped(bodies),
            implied_infill,
            implied_density_kg_m3: implied_density,
            left_out: LEFT_OUT,
        })
    }
}

fn trapped(bodies: &[PrintedBody<'_>]) -> Option<TrappedFigures> {
    let kept: Vec<_> = bodies
        .iter()
        .filter_map(|b| Some((b, b.printed.trapped.as_ref()?)))
        .collect();
    let (_, first) = kept.first()?;
    let volume: f64 = kept.iter().map(|(_, t)| t.hollow.zeroth).sum();
    let mass: Option<f64> = kept
        .iter()
        .map(|(b, t)| Some(t.hollow.zeroth * t.fill_density.or(b.density)?))
        .sum();
    let without: Option<f64> = bodies
        .iter()
        .map(|b| Some(b.printed.moments.zeroth * b.density?))
        .sum();
    Some(TrappedFigures {
        hollows: kept.iter().map(|(_, t)| t.count).sum(),
        volume_m3: volume,
        density_kg_m3: mass.map(|m| m / volume),
        density_assumed: first.fill_density.is_none(),
        mass_kg: mass,
        mass_with_kg: mass.zip(without).map(|(a, b)| a + b),
        mass_without_kg: without,
    })
}

/// The infill for which the bodies would have this mass, all else as planned: a fraction, which is
/// that of a print only between 0 and 1. `None` where the core is hollow or next to nothing, or a
/// density is not known.
fn implied_infill(bodies: &[PrintedBody<'_>], mass: f64) -> Option<f64> {
    let (mut full, mut core) = (0.0, 0.0);
    for b in bodies {
        if b.printed.trapped.is_some() || b.printed.hollow {
            return None;
        }
        full += b.solid.zeroth * b.density?;
        core += b.printed.core.zeroth * b.density?;
    }
    // Below a millionth of the part the answer would be rounding.
    (core > 1e-6 * full).then(|| 1.0 - (full - mass) / core)
}

/// The density of the material for which the bodies would have this mass. `None` where nothing is
/// printed.
fn implied_density(bodies: &[PrintedBody<'_>], mass: f64) -> Option<f64> {
    let (mut volume, mut fixed) = (0.0, 0.0);
    for b in bodies {
        volume += b.printed.moments.zeroth;
        if let Some(t) = &b.printed.trapped {
            fixed += t.fill_density.unwrap_or(0.0) * t.hollow.zeroth;
        }
    }
    let density = (mass - fixed) / volume;
    (density.is_finite() && density > 0.0).then_some(density)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::printed::Trapped;
    use nalgebra::Vector3;

    fn body(core: f64, infill: f64) -> (Printed, Moments) {
        let of = |v| Moments::point(Vector3::zeros(), v);
        let printed = Printed {
            moments: of(10.0 - (1.0 - infill) * core),
            core: of(core),
            infill,
            hollow: false,
            shares: crate::printed::Shares::default(),
            filament: Some(1.0),
            bed_contact: Some(2.0),
            layers: Some(7),
            trapped: None,
            core_error: None,
        };
        (printed, of(10.0))
    }

    fn figures(printed: &Printed, solid: &Moments, measured: f64) -> PrintFigures {
        let body = PrintedBody {
            printed,
            solid,
            density: Some(2.0),
        };
        PrintFigures::of(&[body, body], Some(measured)).unwrap()
    }

    #[test]
    fn a_weighed_print_calibrates_its_infill_or_its_density() {
        let (printed, solid) = body(5.0, 0.2);
        // Two bodies of 10 with cores of 5 at density 2: 40 − 20·(1 − f).
        let f = figures(&printed, &solid, 30.0);
        assert_eq!(f.implied_infill, Some(0.5));
        assert_eq!(f.implied_density_kg_m3, Some(30.0 / 12.0));
        assert_eq!((f.filament_m, f.bed_contact_m2), (Some(2.0), Some(4.0)));
        let (full, solid) = body(0.0, 0.2);
        assert_eq!(figures(&full, &solid, 30.0).implied_infill, None);
    }

    #[test]
    fn what_is_trapped_is_told_with_and_without() {
        let (mut printed, solid) = body(5.0, 0.0);
        printed.trapped = Some(Trapped {
            hollow: printed.core,
            count: 1,
            fill_density: Some(1.0),
        });
        let f = figures(&printed, &solid, 30.0);
        let t = f.trapped.unwrap();
        assert_eq!(
            (t.hollows, t.volume_m3, t.density_assumed),
            (2, 10.0, false)
        );
        assert_eq!(
            (t.mass_kg, t.mass_with_kg, t.mass_without_kg),
            (Some(10.0), Some(30.0), Some(20.0))
        );
        assert_eq!(f.implied_infill, None);
        // 10 kg are of the fill; the rest of 30 on 10 m³.
        assert_eq!(f.implied_density_kg_m3, Some(2.0));
    }
}
