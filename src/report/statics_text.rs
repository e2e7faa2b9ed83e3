//! What supports and lines carry, for people.

use super::balance::fixed;
use super::digits::{length_in, significant, with_uncertainty};
use super::table::{Cell, Column, Look, Mark, Table};
use crate::assembly::{HangRow, Statics, WeighingRow};
use crate::limits::{Judged, Measured};
use crate::quantity::LengthUnit;

/// Reactions, slopes and lines; empty where the file asks for none.
pub(super) fn render(s: &Statics, unit: LengthUnit, look: Look) -> String {
    let mut out = String::new();
    let force = |x: Option<f64>| x.map_or_else(Cell::empty, |x| Cell::figure(significant(x, 5), x));
    let degrees = |x: Option<f64>| match x {
        Some(x) => Cell::figure(format!("{x:.2}"), x),
        None => Cell::text("not up to 90"),
    };
    if let Some(rows) = &s.reactions {
        let mut table = Table::new(vec![
            Column::text("support", "support"),
            Column::figures("force_n", "carries", "N"),
            Column::figures("least_n", "at least", "N"),
            Column::figures("most_n", "at most", "N"),
        ]);
        for r in rows {
            table.row(vec![
                Cell::text(&r.support),
                force(r.force_n),
                force(r.least_n),
                force(r.most_n),
            ]);
        }
        out.push_str(&format!("\n{}", table.render(look)));
        if rows.len() > 3 && rows.iter().all(|r| r.least_n.is_some()) {
            out.push_str("shared as by equal springs; a rigid thing on rigid ground may stand on three of them, or two\n");
        }
        if rows.iter().any(|r| r.least_n.is_none()) {
            let text = "IT TIPS as it stands: the centre of mass is outside of the supports";
            out.push_str(&format!("{}\n", look.marked(text, Mark::Fail)));
        }
    }
    if let Some(rows) = &s.tip {
        let mut table = Table::new(vec![
            Column::text("edge", "tips over"),
            Column::figures("margin_m", "centre to edge", unit.symbol()),
            Column::figures("angle_deg", "on a slope of", "deg"),
        ]);
        for r in rows {
            let m = length_in(r.margin_m, unit);
            table.row(vec![
                Cell::text(&r.edge),
                Cell::figure(significant(m, 5), m),
                degrees(r.angle_deg),
            ]);
        }
        out.push_str(&format!("\n{}", table.render(look)));
        let leans = s.tip_by_direction.iter().flatten();
        let least = leans.filter_map(|l| l.angle_deg.map(|a| (a, l.azimuth_deg)));
        let straight = rows
            .iter()
            .filter_map(|r| r.angle_deg)
            .fold(f64::INFINITY, f64::min);
        // On level feet no lean is worse than the one straight over an edge.
        if let Some((angle, azimuth)) = least.min_by(|a, b| a.0.total_cmp(&b.0))
            && angle < straight
        {
            out.push_str(&format!(
                "of 24 directions the least is {angle:.2} deg, leaning {azimuth:.0} deg from x towards y\n"
            ));
        }
    }
    if let Some(Some(h)) = &s.hang {
        out.push_str(&hang(h, look));
    }
    if let Some(w) = &s.weighing {
        out.push_str(&weighing(w, unit));
    }
    out
}

fn weighing(w: &WeighingRow, unit: LengthUnit) -> String {
    let known = |k: usize| w.free.is_none_or(|f| f[k].abs() < 1.0 - 1e-9);
    let point = |p: [f64; 3], s: Option<[f64; 3]>| {
        let shown = [0, 1, 2].map(|k| {
            if !known(k) {
                return "open".to_owned();
            }
            let x = length_in(p[k], unit);
            match s.map(|s| length_in(s[k], unit)).filter(|s| *s > 0.0) {
                Some(s) => {
                    let (x, s) = with_uncertainty(x, s);
                    format!("{x} ± {s}")
                }
                None => fixed(x),
            }
        });
        format!("({}) {}", shown.join(", "), unit.symbol())
    };
    let mass = match w.mass_standard_kg > 0.0 {
        true => {
            let (m, s) = with_uncertainty(w.mass_kg, w.mass_standard_kg);
            format!("{m} ± {s}")
        }
        false => significant(w.mass_kg, 6),
    };
    let mut out = format!(
        "\non the scales\nmass           {mass} kg\nbalance point  {}\nthe model is off by {} kg and {}\n",
        point(w.centre_m, Some(w.centre_standard_m)),
        significant(w.model_mass_off_kg, 3),
        point(w.model_centre_off_m, None),
    );
    if w.free.is_some() {
        out.push_str("one attitude leaves the height open; weigh it tilted too\n");
    }
    if let (Some(chi), true) = (w.chi_squared, w.freedom > 0) {
        out.push_str(&format!(
            "the weighings disagree among themselves by chi-squared {} on {} degrees of freedom\n",
            significant(chi, 3),
            w.freedom
        ));
    }
    out
}

fn hang(h: &HangRow, look: Look) -> String {
    let d = h.attitude.down;
    let mut out = format!(
        "\nhangs leaning {:.2} deg, gravity along {:.4}, {:.4}, {:.4} of the assembly's axes\n",
        h.attitude.lean_deg, d[0], d[1], d[2]
    );
    if h.lines.is_empty() {
        return out;
    }
    let mut table = Table::new(vec![
        Column::text("line", "line"),
        Column::figures("tension_n", "carries", "N"),
        Column::figures("worst_n", "at worst", "N"),
        Column::figures("from_vertical_deg", "from vertical", "deg"),
        Column::text("slack", ""),
    ]);
    for l in &h.lines {
        table.row(vec![
            Cell::text(&l.line),
            Cell::figure(significant(l.tension_n, 5), l.tension_n),
            Cell::figure(significant(l.worst_n, 5), l.worst_n),
            Cell::figure(format!("{:.1}", l.from_vertical_deg), l.from_vertical_deg),
            Cell::text(if l.slack { "slack" } else { "" }),
        ]);
    }
    out.push_str(&table.render(look));
    out
}

/// The caution that belongs to figures for lifting, tipping and rotors, once; empty where there
/// are none.
pub(super) fn caution(s: &Statics, limits: &[Judged]) -> String {
    let named = ["tip", "reaction", "unbalance.a", "unbalance.b"];
    let asked = *s != Statics::default() || limits.iter().any(|l| named.contains(&l.quantity));
    if asked {
        format!("{}\n", crate::statics::CAUTION)
    } else {
        String::new()
    }
}

/// A figure of a limit in the unit that people read it in, with that unit's symbol.
pub(super) fn readable(x: f64, si: &str, quantity: &str, unit: LengthUnit) -> (f64, String) {
    match si {
        "m" => (length_in(x, unit), unit.symbol().to_owned()),
        "m3" => (x * 1e6, "cm3".to_owned()),
        "rad" => (x.to_degrees(), "deg".to_owned()),
        "kg m" => (x * 1e6, "g mm".to_owned()),
        "1" if quantity == Measured::PERCENT => (x * 100.0, "%".to_owned()),
        "1" => (x, String::new()),
        other => (x, other.to_owned()),
    }
}
