//! The `drain` document and what it prints for people.

use serde::Serialize;

use super::Document;
use super::balance::{fixed, readable, verdict};
use super::digits::{length_in, significant};
use super::footer::{CAUTION, footer, nominal};
use super::service::AT_REST;
use super::table::{Cell, Column, Look, Mark, Table};
use crate::assembly::service::{Drain, DrainStep};
use crate::error::Result;
use crate::limits::Verdict;
use crate::quantity::LengthUnit;

/// The command's part of the document.
#[derive(Clone, Debug, Serialize)]
pub struct DrainBody {
    /// The answer.
    #[serde(flatten)]
    pub drain: Drain,
}

/// As text; lengths in `unit`, the assembly's own.
pub fn render(document: &Document<DrainBody>, unit: LengthUnit, look: Look) -> String {
    let d = &document.body.drain;
    let u = unit.symbol();
    let mut out = look.marked(&crate::text::shown(&d.name), Mark::Heading);
    if let Some(case) = &d.case {
        out.push_str(&format!(" · case {}", crate::text::shown(case)));
    }
    out.push_str("\n\n");
    let first = d.phases.first().and_then(|p| p.steps.first());
    let tanks: Vec<&String> = first.iter().flat_map(|s| s.fills.keys()).collect();
    let motions: Vec<&String> = first.iter().flat_map(|s| s.motions.keys()).collect();
    let mut columns = vec![
        Column::text("phase", "phase"),
        Column::figures("at", "done", "%"),
    ];
    columns.extend(
        tanks
            .iter()
            .map(|t| Column::figures(t, &crate::text::shown(t), "l")),
    );
    columns.extend(
        motions
            .iter()
            .map(|m| Column::figures(m, &crate::text::shown(m), "m or rad")),
    );
    columns.extend([
        Column::figures("mass_kg", "mass", "kg"),
        Column::figures("x", "centre x", u),
        Column::figures("y", "y", u),
        Column::figures("z", "z", u),
        Column::figures("ixx", "inertia xx", "kg m2"),
        Column::figures("iyy", "yy", "kg m2"),
        Column::figures("izz", "zz", "kg m2"),
    ]);
    let mut table = Table::new(columns);
    for phase in &d.phases {
        for (n, s) in phase.steps.iter().enumerate() {
            let mut row = vec![
                Cell::text(if n == 0 { &phase.name } else { "" }),
                Cell::figure(format!("{:.1}", 100.0 * s.at), s.at),
            ];
            row.extend(tanks.iter().map(|t| {
                s.fills.get(*t).map_or_else(Cell::empty, |f| {
                    Cell::figure(significant(f.volume_m3 * 1e3, 5), f.volume_m3)
                })
            }));
            row.extend(motions.iter().map(|m| {
                s.motions
                    .get(*m)
                    .map_or_else(Cell::empty, |v| Cell::figure(significant(*v, 5), *v))
            }));
            row.push(Cell::figure(significant(s.mass_kg, 6), s.mass_kg));
            row.extend(s.centre_of_mass_m.map(|x| {
                let shown = length_in(x, unit);
                Cell::figure(fixed(shown), x)
            }));
            row.extend([0, 1, 2].map(|k| {
                let x = s.inertia_kg_m2[k][k];
                Cell::figure(significant(x, 5), x)
            }));
            table.row(row);
        }
    }
    out.push_str(&table.render(look));
    out.push_str(&envelope(d, unit));
    if d.limits.is_empty() {
        out.push_str("\nno limits are stated\n");
    } else {
        out.push_str(&limits(d, unit, look));
    }
    out.push_str(&format!("{AT_REST}\n\n"));
    out.push_str(&nominal(&document.warnings));
    out.push_str(&format!("{CAUTION}\n"));
    out.push_str(&footer(document, look));
    out
}

fn envelope(d: &Drain, unit: LengthUnit) -> String {
    let e = &d.envelope;
    let [lo, hi] = e.centre_of_mass_m.map(|p| p.map(|x| length_in(x, unit)));
    let span = |k: usize| format!("{} to {}", fixed(lo[k]), fixed(hi[k]));
    format!(
        "\non the whole way\nmass           {} to {} kg\nbalance point  x {}, y {}, z {} {} (between the steps too, within {} {})\n",
        significant(e.mass_kg[0], 6),
        significant(e.mass_kg[1], 6),
        span(0),
        span(1),
        span(2),
        unit.symbol(),
        super::digits::at_most(length_in(e.within_m, unit)),
        unit.symbol()
    )
}

fn limits(d: &Drain, unit: LengthUnit, look: Look) -> String {
    let mut table = Table::new(vec![
        Column::text("name", "limit at its worst"),
        Column::text("quantity", "figure"),
        Column::text("unit", "unit"),
        Column::figures("value", "value", ""),
        Column::figures("from", "from", ""),
        Column::figures("to", "to", ""),
        Column::figures("margin", "margin", ""),
        Column::figures("within", "nowhere less by", ""),
        Column::text("phase", "in phase"),
        Column::figures("at", "at", "%"),
        Column::text("verdict", "verdict"),
    ]);
    for limit in &d.limits {
        let l = &limit.judged;
        let shown = |x: f64| {
            let (x, _) = readable(x, l.unit, l.quantity, unit);
            let text = match l.unit {
                "m" => fixed(x),
                _ => significant(x, 6),
            };
            Cell::figure(text, x)
        };
        let within = readable(limit.worst.within, l.unit, l.quantity, unit).0;
        let (word, mark) = verdict(l.verdict);
        table.row(vec![
            Cell::text(&l.name),
            Cell::text(l.quantity),
            Cell::text(&readable(0.0, l.unit, l.quantity, unit).1),
            shown(l.value),
            l.from.map_or_else(Cell::empty, shown),
            l.to.map_or_else(Cell::empty, shown),
            shown(l.margin),
            if within.is_finite() {
                Cell::figure(super::digits::at_most(within), within)
            } else {
                Cell::text("not proved")
            },
            Cell::text(&limit.worst.phase),
            Cell::figure(format!("{:.2}", 100.0 * limit.worst.at), limit.worst.at),
            Cell::text(word).marked(mark),
        ]);
    }
    let broken = d.limits.iter();
    let broken = broken
        .filter(|l| l.judged.verdict == Verdict::Broken)
        .count();
    let unsure = d.limits.iter();
    let unsure = unsure
        .filter(|l| l.judged.verdict == Verdict::Unsure)
        .count();
    let word = match broken {
        0 if unsure > 0 => look.marked(
            &format!(
                "{unsure} of {} limits UNSURE: none was seen to break, and a narrow dip could",
                d.limits.len()
            ),
            Mark::Unsure,
        ),
        0 if d.limits.iter().any(|l| !l.worst.within.is_finite()) => look.marked(
            &format!(
                "all {} limits hold at every step and where the least was sought; those not proved could break in between",
                d.limits.len()
            ),
            Mark::Pass,
        ),
        0 => look.marked(
            &format!("all {} limits hold on the whole way", d.limits.len()),
            Mark::Pass,
        ),
        n => look.marked(
            &format!("{n} of {} limits BROKEN on the way", d.limits.len()),
            Mark::Fail,
        ),
    };
    format!("\n{}{word}\n", table.render(look))
}

/// As CSV: one row a step, SI units.
///
/// # Errors
/// As [`Table::csv`].
pub fn csv(body: &DrainBody) -> Result<String> {
    let d = &body.drain;
    let first = d.phases.first().and_then(|p| p.steps.first());
    let tanks: Vec<&String> = first.iter().flat_map(|s| s.fills.keys()).collect();
    let motions: Vec<&String> = first.iter().flat_map(|s| s.motions.keys()).collect();
    let mut columns = vec![Column::text("phase", ""), Column::figures("at", "", "")];
    for tank in &tanks {
        columns.push(Column::figures(&format!("{tank} volume_m3"), "", ""));
        columns.push(Column::figures(&format!("{tank} mass_kg"), "", ""));
    }
    columns.extend(
        motions
            .iter()
            .map(|m| Column::figures(&format!("{m} motion"), "", "")),
    );
    let figures = [
        "mass_kg",
        "centre_x_m",
        "centre_y_m",
        "centre_z_m",
        "inertia_xx_kg_m2",
        "inertia_yy_kg_m2",
        "inertia_zz_kg_m2",
        "inertia_xy_kg_m2",
        "inertia_xz_kg_m2",
        "inertia_yz_kg_m2",
    ];
    columns.extend(figures.iter().map(|k| Column::figures(k, k, "")));
    let mut table = Table::new(columns);
    let number = |x: f64| Cell::figure("", x);
    for phase in &d.phases {
        for s in &phase.steps {
            let mut row = vec![Cell::text(&phase.name), number(s.at)];
            for tank in &tanks {
                let fill = s.fills.get(*tank);
                row.push(fill.map_or_else(Cell::empty, |f| number(f.volume_m3)));
                row.push(fill.map_or_else(Cell::empty, |f| number(f.mass_kg)));
            }
            row.extend(
                motions
                    .iter()
                    .map(|m| s.motions.get(*m).map_or_else(Cell::empty, |v| number(*v))),
            );
            row.extend(of_step(s).map(number));
            table.row(row);
        }
    }
    table.csv()
}

fn of_step(s: &DrainStep) -> [f64; 10] {
    let (c, i) = (s.centre_of_mass_m, s.inertia_kg_m2);
    [
        s.mass_kg, c[0], c[1], c[2], i[0][0], i[1][1], i[2][2], i[0][1], i[0][2], i[1][2],
    ]
}
