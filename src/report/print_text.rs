//! How a part is printed, in words.

use super::digits::{Scale, significant};
use super::table::{Look, Mark};
use crate::masses::PrintFigures;

/// Lines on one printed part; `solid_m3` is the volume of its mesh.
pub(super) fn render(of: &str, f: &PrintFigures, solid_m3: Option<f64>, look: Look) -> String {
    let volume = |v: f64| format!("{} cm3", significant(v * 1e6, 5));
    let percent = |x: f64| format!("{:.1} %", 100.0 * x);
    let of_solid = solid_m3.filter(|v| *v > 0.0).map_or(String::new(), |v| {
        format!(", {} of the solid", percent(f.printed_volume_m3 / v))
    });
    let s = &f.shares;
    let mut out = format!(
        "{} {}: {} of material{of_solid}",
        look.marked("PRINTED", Mark::Heading),
        crate::text::shown(of),
        volume(f.printed_volume_m3),
    );
    match f.layers {
        Some(layers) => {
            out.push_str(&format!(
                "; {layers} layer{}; wall {}, skin {}, infill {} of it\n",
                if layers == 1 { "" } else { "s" },
                percent(s.wall),
                percent(s.skin),
                percent(s.infill)
            ));
            if let (Some(length), Some(area)) = (f.filament_m, f.bed_contact_m2) {
                out.push_str(&format!(
                    "   filament {} m; on the bed {} cm2",
                    significant(length, 4),
                    significant(area * 1e4, 4)
                ));
            }
        }
        None => {
            out.push_str(&format!(
                "; shell {}, infill {} of it\n   inside {}",
                percent(s.wall),
                percent(s.infill),
                volume(f.core_volume_m3)
            ));
            if let Some(e) = f.core_error_m3 {
                out.push_str(&format!(" ± {} cm3", significant(e * 1e6, 2)));
            }
        }
    }
    out.push_str(&format!("; left out: {}\n", f.left_out.join(", ")));
    if let Some(t) = &f.trapped {
        let mass = |m: Option<f64>| {
            m.map_or_else(
                || "not known".to_owned(),
                |m| {
                    let scale = Scale::for_mass(m);
                    format!("{} {}", significant(scale.of(m), 5), scale.symbol)
                },
            )
        };
        out.push_str(&format!(
            "   {} {} closed hollow{} of {} keep{} the powder or resin it is built in: with {} {}, without {}; the mass is that {}\n",
            look.marked("TRAPPED", Mark::Fail),
            t.hollows,
            if t.hollows == 1 { "" } else { "s" },
            volume(t.volume_m3),
            if t.hollows == 1 { "s" } else { "" },
            if t.density_assumed { "it at the material's own density" } else { "it" },
            mass(t.mass_with_kg),
            mass(t.mass_without_kg),
            if t.density_assumed { "without" } else { "with it" },
        ));
    }
    if let Some(density) = f.implied_density_kg_m3 {
        let infill = f.implied_infill.map_or(String::new(), |i| {
            format!("an infill of {}, or ", percent(i))
        });
        out.push_str(&format!(
            "   as measured it implies {infill}a material of {} kg/m3\n",
            significant(density, 4)
        ));
    }
    out
}
