//! The `balance` document and what it prints for people.

use serde::Serialize;

use super::Document;
use super::digits::{at_most, length_in, significant};
use super::footer::{CAUTION, footer, nominal};
use super::table::{Cell, Column, Look, Mark, Table};
use super::weigh_text::matrix;
use super::words::{box_size, direction, point, point_in};
use crate::assembly::{Balance, Basis, MassBounds, PartRow, Source, Total};
use crate::error::Result;
use crate::limits::{End, Judged, PercentOf, Verdict};
use crate::quantity::LengthUnit;

/// The command's part of the document.
#[derive(Clone, Debug, Serialize)]
pub struct BalanceBody {
    /// The answer.
    #[serde(flatten)]
    pub balance: Balance,
    /// Inertia about a point that was asked for.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub about: Option<AboutPoint>,
}

/// The tensor of the whole about a stated point.
#[derive(Clone, Debug, Serialize)]
pub struct AboutPoint {
    /// m, in the assembly's frame.
    pub point_m: [f64; 3],
    /// About the point, in the assembly's axes; off-diagonals −∫xy dm.
    pub inertia_kg_m2: [[f64; 3]; 3],
}

/// As text; lengths in `unit`, the assembly's own.
pub fn render(document: &Document<BalanceBody>, unit: LengthUnit, look: Look) -> String {
    let body = &document.body;
    let b = &body.balance;
    let mut out = look.marked(&crate::text::shown(&b.name), Mark::Heading);
    out.push_str("\n\n");
    out.push_str(&parts(b, unit).render(look));
    out.push_str(&subtotals(b, look));
    for p in &b.parts {
        if let Some(e) = &p.estimate {
            out.push_str(&estimated(&p.path, e, unit, look));
        }
    }
    out.push_str(&printed(b, look));
    if let Some(e) = b.total.as_ref().and_then(|t| t.estimate.as_ref()) {
        out.push_str(&estimated("the whole", e, unit, look));
    }
    match &b.total {
        Some(total) => out.push_str(&whole(total, body.about.as_ref(), unit, look)),
        None => out.push_str(&format!(
            "\n{}\n",
            look.marked(
                "NO TOTAL: a part cannot be weighed, see the error",
                Mark::Fail
            )
        )),
    }
    if !b.expectations.is_empty() {
        out.push_str(&expectations(b, unit, look));
    }
    if !b.limits.is_empty() {
        out.push_str(&limits(&b.limits, unit, look));
    } else if b.total.is_some() {
        out.push_str("\nno limits are stated\n");
    }
    out.push_str(&overlaps(b, unit, look));
    out.push_str(&nominal(&document.warnings));
    out.push_str(&format!("{CAUTION}\n"));
    out.push_str(&footer(document, look));
    out
}

/// How parts are printed; repeats of one once.
fn printed(b: &Balance, look: Look) -> String {
    let mut out = String::new();
    let mut rows = b.parts.iter().filter(|p| p.made.is_some()).peekable();
    while let Some(p) = rows.next() {
        let mut more = 0;
        while rows.next_if(|next| next.made == p.made).is_some() {
            more += 1;
        }
        let of = match more {
            0 => p.path.clone(),
            n => format!("{} and {n} more, each", p.path),
        };
        if let Some(made) = &p.made {
            out.push_str(&super::print_text::render(&of, made, p.volume_m3, look));
        }
    }
    out
}

fn basis_word(basis: Basis) -> &'static str {
    match basis {
        Basis::Computed => "computed",
        Basis::Measured => "measured",
        Basis::Stated => "stated",
        Basis::Estimate => "estimate",
    }
}

fn made_of(p: &PartRow) -> String {
    match (&p.material, &p.source) {
        (Some(m), _) => m.clone(),
        (None, Source::Item) => "(bought in)".to_owned(),
        (None, _) if !p.materials.is_empty() => {
            let names = p.materials.iter().map(|m| m.as_deref().unwrap_or("?"));
            names.collect::<Vec<_>>().join(" + ")
        }
        (None, _) => "(as measured)".to_owned(),
    }
}

fn parts(b: &Balance, unit: LengthUnit) -> Table {
    let u = unit.symbol();
    let mut table = Table::new(vec![
        Column::text("path", "part"),
        Column::text("material", "material"),
        Column::text("basis", "basis"),
        Column::figures("mass_kg", "mass", "kg"),
        Column::figures("share", "share", "%"),
        Column::figures("x", "centre x", u),
        Column::figures("y", "y", u),
        Column::figures("z", "z", u),
        Column::text("size", &format!("box, {u}")),
    ]);
    let centre = |c: Option<[f64; 3]>, k: usize| {
        c.map_or_else(Cell::empty, |c| {
            let x = length_in(c[k], unit);
            Cell::figure(fixed(x), x)
        })
    };
    for p in &b.parts {
        let c = p.centre_of_mass_m;
        // What a print implies stands with its other figures.
        let implied = p.implied_density_kg_m3.filter(|_| p.made.is_none());
        let implied = implied.map_or(String::new(), |d| {
            let against = p
                .density_kg_m3
                .map_or(String::new(), |t| format!(" against {}", significant(t, 4)));
            format!(", implies {} kg/m3{against}", significant(d, 4))
        });
        table.row(vec![
            Cell::text(&p.path),
            Cell::text(&made_of(p)),
            Cell::text(&format!("{}{implied}", basis_word(p.basis))),
            Cell::figure(significant(p.mass_kg, 5), p.mass_kg),
            p.share_of_mass.map_or_else(Cell::empty, |s| {
                Cell::figure(format!("{:.1}", 100.0 * s), s)
            }),
            centre(c, 0),
            centre(c, 1),
            centre(c, 2),
            Cell::text(&box_size(&p.bounds_m, unit)),
        ]);
    }
    if let Some(t) = &b.total {
        let c = Some(t.centre_of_mass_m);
        table.total(vec![
            Cell::text("total"),
            Cell::empty(),
            Cell::empty(),
            Cell::figure(significant(t.mass_kg, 6), t.mass_kg),
            Cell::figure("100.0", 1.0),
            centre(c, 0),
            centre(c, 1),
            centre(c, 2),
            Cell::text(&box_size(&t.bounds_m, unit)),
        ]);
    }
    table
}

/// Hundredths of the unit at most: a position is not known finer.
fn fixed(x: f64) -> String {
    let text = format!("{x:.2}");
    if text
        .trim_start_matches('-')
        .chars()
        .all(|c| matches!(c, '0' | '.'))
    {
        "0.00".to_owned()
    } else {
        text
    }
}

fn subtotals(b: &Balance, look: Look) -> String {
    let mut table = Table::new(vec![
        Column::text("by", "subtotal"),
        Column::text("name", ""),
        Column::counts("parts", "parts"),
        Column::figures("mass_kg", "mass", "kg"),
        Column::figures("share", "share", "%"),
    ]);
    let mut row = |by: &str, name: &str, parts: usize, mass: f64, share: Option<f64>| {
        table.row(vec![
            Cell::text(by),
            Cell::text(name),
            Cell::count(parts as u64),
            Cell::figure(significant(mass, 5), mass),
            share.map_or_else(Cell::empty, |s| {
                Cell::figure(format!("{:.1}", 100.0 * s), s)
            }),
        ]);
    };
    for (i, m) in b.by_material.iter().enumerate() {
        let by = if i == 0 { "by material" } else { "" };
        let density = m
            .density_kg_m3
            .map_or(String::new(), |d| format!(", {} kg/m3", significant(d, 5)));
        let name = m
            .material
            .as_deref()
            .unwrap_or("(no material: bought in or measured)");
        row(
            by,
            &format!("{name}{density}"),
            m.parts,
            m.mass_kg,
            m.share_of_mass,
        );
    }
    if b.by_group.iter().any(|g| g.group.is_some()) {
        for (i, g) in b.by_group.iter().enumerate() {
            let by = if i == 0 { "by group" } else { "" };
            let indent = "  ".repeat(g.depth.saturating_sub(1));
            let name = g.group.as_deref().unwrap_or("(in no group)");
            row(
                by,
                &format!("{indent}{name}"),
                g.parts,
                g.mass_kg,
                g.share_of_mass,
            );
        }
    }
    for (i, s) in b.by_basis.iter().enumerate() {
        let by = if i == 0 { "by basis" } else { "" };
        row(by, basis_word(s.basis), s.parts, s.mass_kg, s.share_of_mass);
    }
    format!("\n{}", table.render(look))
}

fn whole(t: &Total, about: Option<&AboutPoint>, unit: LengthUnit, look: Look) -> String {
    let mut out = format!("\n{}\n", look.marked("the whole", Mark::Heading));
    out.push_str(&format!(
        "mass           {} kg\n",
        significant(t.mass_kg, 6)
    ));
    out.push_str(&format!(
        "balance point  {}   frame: the assembly's axes and origin\n",
        point_in(&t.centre_of_mass_m, &t.bounds_m, unit)
    ));
    out.push_str(&format!(
        "box            {} {}\n",
        box_size(&t.bounds_m, unit),
        unit.symbol()
    ));
    out.push_str(&matrix(
        "inertia about the centre of mass, kg m2; off-diagonals are the tensor's own, −∫xy dm",
        &t.inertia_kg_m2,
        6,
    ));
    let mut table = Table::new(vec![
        Column::text("n", "principal"),
        Column::figures("moment", "moment", "kg m2"),
        Column::figures("radius", "radius of gyration", unit.symbol()),
        Column::text("axis", "axis"),
    ]);
    for i in 0..3 {
        let axis = direction(&t.principal_axes[i]);
        let free = if t.axes_free.contains(&i) {
            " (free)"
        } else {
            ""
        };
        table.row(vec![
            Cell::text(&(i + 1).to_string()),
            Cell::figure(
                significant(t.principal_moments_kg_m2[i], 6),
                t.principal_moments_kg_m2[i],
            ),
            Cell::figure(
                significant(length_in(t.radii_of_gyration_m[i], unit), 6),
                t.radii_of_gyration_m[i],
            ),
            Cell::text(&format!("{axis}{free}")),
        ]);
    }
    out.push_str(&table.render(look));
    if let Some(a) = about {
        out.push_str(&matrix(
            &format!("inertia about {}, kg m2", point(&a.point_m, unit)),
            &a.inertia_kg_m2,
            6,
        ));
    }
    out
}

/// A figure in the unit that people read it in, with that unit's symbol.
fn readable(x: f64, si: &str, unit: LengthUnit) -> (f64, String) {
    match si {
        "m" => (length_in(x, unit), unit.symbol().to_owned()),
        "m3" => (x * 1e6, "cm3".to_owned()),
        other => (x, other.to_owned()),
    }
}

fn expectations(b: &Balance, unit: LengthUnit, look: Look) -> String {
    let mut table = Table::new(vec![
        Column::text("part", "expected of"),
        Column::text("quantity", "figure"),
        Column::text("unit", "unit"),
        Column::figures("expected", "expected", ""),
        Column::figures("tolerance", "±", ""),
        Column::figures("value", "found", ""),
        Column::figures("deviation", "off by", "%"),
        Column::text("verdict", "verdict"),
    ]);
    for e in &b.expectations {
        let shown = |x: f64| {
            let (x, _) = readable(x, e.unit, unit);
            Cell::figure(significant(x, 6), x)
        };
        let (word, mark) = verdict(e.verdict);
        table.row(vec![
            Cell::text(&e.part),
            Cell::text(e.quantity),
            Cell::text(&readable(0.0, e.unit, unit).1),
            shown(e.expected),
            shown(e.tolerance),
            shown(e.value),
            e.deviation_percent
                .map_or_else(Cell::empty, |p| Cell::figure(format!("{p:+.3}"), p)),
            Cell::text(word).marked(mark),
        ]);
    }
    format!("\n{}", table.render(look))
}

/// The bounds of an open mesh, never without what they rest on.
fn estimated(of: &str, e: &MassBounds, unit: LengthUnit, look: Look) -> String {
    let scale = super::digits::Scale::for_mass(e.mass_bound_kg);
    format!(
        "{} {}: an open mesh with its holes capped; mass ± {} {}, centre ± {} {} {}\n",
        look.marked("ESTIMATE", Mark::Fail),
        crate::text::shown(of),
        at_most(scale.of(e.mass_bound_kg)),
        scale.symbol,
        at_most(length_in(e.centre_bound_m, unit)),
        unit.symbol(),
        super::estimate::IF
    )
}

fn overlaps(b: &Balance, unit: LengthUnit, look: Look) -> String {
    if b.overlaps.is_empty() {
        return "\nno two meshes occupy the same space (bought-in items are not looked at)\n\n"
            .to_owned();
    }
    let mut table = Table::new(vec![
        Column::text("a", "same space"),
        Column::text("b", "and"),
        Column::figures("volume_m3", "volume", "cm3"),
        Column::figures("volume_error_m3", "± at most", "cm3"),
        Column::figures("mass_in_a_kg", "weighs in first", "kg"),
        Column::figures("mass_in_b_kg", "in second", "kg"),
        Column::text("at", "about"),
    ]);
    for o in &b.overlaps {
        let cm3 = |x: f64| Cell::figure(significant(x * 1e6, 3), x);
        let kg = |x: f64| Cell::figure(significant(x, 3), x);
        table.row(vec![
            Cell::text(&o.a),
            Cell::text(&o.b),
            cm3(o.volume_m3),
            cm3(o.volume_error_m3),
            kg(o.mass_in_a_kg),
            kg(o.mass_in_b_kg),
            Cell::text(&o.at_m.map_or(String::new(), |p| point(&p, unit))),
        ]);
    }
    format!(
        "\n{}{}\n\n",
        table.render(look),
        look.marked(
            "the total counts this space twice: cut one part, or move it",
            Mark::Fail
        )
    )
}

fn verdict(v: Verdict) -> (&'static str, Mark) {
    match v {
        Verdict::Holds => ("holds", Mark::Pass),
        Verdict::Broken => ("BROKEN", Mark::Fail),
        Verdict::Unsure => ("UNSURE", Mark::Unsure),
    }
}

fn limits(limits: &[Judged], unit: LengthUnit, look: Look) -> String {
    let mut table = Table::new(vec![
        Column::text("name", "limit"),
        Column::text("quantity", "figure"),
        Column::text("unit", "unit"),
        Column::figures("value", "value", ""),
        Column::figures("from", "from", ""),
        Column::figures("to", "to", ""),
        Column::figures("margin", "margin", ""),
        Column::text("percent", "margin in per cent"),
        Column::text("verdict", "verdict"),
    ]);
    for l in limits {
        let shown = |x: f64| {
            let (x, _) = readable(x, l.unit, unit);
            let text = if l.unit == "m" {
                fixed(x)
            } else {
                significant(x, 6)
            };
            Cell::figure(text, x)
        };
        let percent = match (l.margin_percent, l.percent_of) {
            (Some(p), Some(of)) => {
                let of = match of {
                    PercentOf::Limit => "the limit",
                    PercentOf::Range => "the range",
                };
                format!("{p:.1} % of {of}")
            }
            _ => String::new(),
        };
        let end = match l.nearest {
            End::From => " to the lower end",
            End::To => " to the upper end",
        };
        let percent = if l.from.is_some() && l.to.is_some() {
            percent + end
        } else {
            percent
        };
        let (word, mark) = verdict(l.verdict);
        table.row(vec![
            Cell::text(&l.name),
            Cell::text(l.quantity),
            Cell::text(&readable(0.0, l.unit, unit).1),
            shown(l.value),
            l.from.map_or_else(Cell::empty, shown),
            l.to.map_or_else(Cell::empty, shown),
            shown(l.margin),
            Cell::text(percent.trim_start()),
            Cell::text(word).marked(mark),
        ]);
    }
    let broken = limits
        .iter()
        .filter(|l| l.verdict == Verdict::Broken)
        .count();
    let verdict = if broken == 0 {
        look.marked(
            &format!("all {} limits hold at the nominal figures", limits.len()),
            Mark::Pass,
        )
    } else {
        look.marked(
            &format!("{broken} of {} limits BROKEN", limits.len()),
            Mark::Fail,
        )
    };
    format!("\n{}{verdict}\n", table.render(look))
}

/// As CSV: one row a part, SI units.
///
/// # Errors
/// As [`Table::csv`].
pub fn csv(body: &BalanceBody) -> Result<String> {
    let figures = [
        "mass_kg",
        "share_of_mass",
        "density_kg_m3",
        "implied_density_kg_m3",
        "volume_m3",
        "centre_x_m",
        "centre_y_m",
        "centre_z_m",
        "inertia_xx_kg_m2",
        "inertia_yy_kg_m2",
        "inertia_zz_kg_m2",
        "inertia_xy_kg_m2",
        "inertia_xz_kg_m2",
        "inertia_yz_kg_m2",
        "size_x_m",
        "size_y_m",
        "size_z_m",
    ];
    let mut columns = vec![
        Column::text("path", ""),
        Column::text("material", ""),
        Column::text("basis", ""),
    ];
    columns.extend(figures.iter().map(|k| Column::figures(k, k, "")));
    let mut table = Table::new(columns);
    for p in &body.balance.parts {
        let c = |k: usize| p.centre_of_mass_m.map(|c| c[k]);
        let i = |a: usize, b: usize| p.inertia_kg_m2.map(|t| t[a][b]);
        let size = |k: usize| Some(p.bounds_m[1][k] - p.bounds_m[0][k]);
        let figures = [
            Some(p.mass_kg),
            p.share_of_mass,
            p.density_kg_m3,
            p.implied_density_kg_m3,
            p.volume_m3,
            c(0),
            c(1),
            c(2),
            i(0, 0),
            i(1, 1),
            i(2, 2),
            i(0, 1),
            i(0, 2),
            i(1, 2),
            size(0),
            size(1),
            size(2),
        ];
        let mut row = vec![
            Cell::text(&p.path),
            Cell::text(&made_of(p)),
            Cell::text(basis_word(p.basis)),
        ];
        row.extend(figures.map(|x| x.map_or_else(Cell::empty, |x| Cell::figure("", x))));
        table.row(row);
    }
    table.csv()
}
