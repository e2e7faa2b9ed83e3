//! The `balance` document and what it prints for people.

use serde::Serialize;

use super::Document;
use super::digits::{at_most, figure, length_in, place, significant, supported};
use super::footer::{CAUTION, footer, nominal};
use super::service;
use super::statics_text;
pub(super) use super::statics_text::readable;
use super::sure;
use super::table::{Cell, Column, Look, Mark, Table};
use super::weigh_text::matrix;
use super::words::{box_size, direction, point, point_in};
use crate::assembly::service::{CaseRow, Centres, TankRow};
use crate::assembly::{Balance, Basis, MassBounds, PartRow, Source, Total};
use crate::error::Result;
use crate::limits::{End, Judged, PercentOf, Verdict};
use crate::quantity::LengthUnit;
use crate::uncertainty::{Spread, Uncertainty};

/// The command's part of the document.
#[derive(Clone, Debug, Serialize)]
pub struct BalanceBody {
    /// The answer.
    #[serde(flatten)]
    pub balance: Balance,
    /// Inertia about a point that was asked for.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub about: Option<AboutPoint>,
    /// The case that the figures are of; absent for the file as it stands.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub case: Option<String>,
    /// Every case of the file; absent where it has none.
    #[serde(skip_serializing_if = "Vec::is_empty")]
    pub cases: Vec<CaseRow>,
    /// The tanks as they are filled; absent where there are none.
    #[serde(skip_serializing_if = "Vec::is_empty")]
    pub tanks: Vec<TankRow>,
    /// Centroid, centre of mass and centre of gravity; absent where not asked for.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub centres: Option<Centres>,
}

/// Centre and tensor of the whole seen from a stated point or frame.
#[derive(Clone, Debug, Serialize)]
pub struct AboutPoint {
    /// Name of the frame; absent for a point.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub frame: Option<String>,
    /// The frame's origin, m, in the assembly's frame.
    pub point_m: [f64; 3],
    /// The frame's axes as rows, in the assembly's axes.
    pub axes: [[f64; 3]; 3],
    /// Centre of mass in the frame.
    pub centre_of_mass_m: [f64; 3],
    /// About the frame's origin, in the frame's axes; off-diagonals −∫xy dm.
    pub inertia_kg_m2: [[f64; 3]; 3],
}

/// As text; lengths in `unit`, the assembly's own.
pub fn render(document: &Document<BalanceBody>, unit: LengthUnit, look: Look) -> String {
    let body = &document.body;
    let b = &body.balance;
    let mut out = look.marked(&crate::text::shown(&b.name), Mark::Heading);
    if let Some(case) = &body.case {
        out.push_str(&format!(" · case {}", crate::text::shown(case)));
    }
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
    if !body.tanks.is_empty() {
        out.push_str(&service::tanks(&body.tanks, unit, look));
    }
    match &b.total {
        Some(total) => {
            let u = b.uncertainty.as_ref();
            out.push_str(&whole(total, u, body.about.as_ref(), unit, look));
            out.push_str(&sure::render(b, unit, look));
        }
        None => out.push_str(&format!(
            "\n{}\n",
            look.marked(
                "NO TOTAL: a part cannot be weighed, see the error",
                Mark::Fail
            )
        )),
    }
    if let Some(c) = &body.centres {
        out.push_str(&service::centres(c, unit, look));
    }
    if !b.expectations.is_empty() {
        out.push_str(&expectations(b, unit, look));
    }
    if !b.limits.is_empty() {
        out.push_str(&limits(&b.limits, unit, look));
    } else if b.total.is_some() {
        out.push_str("\nno limits are stated\n");
    }
    out.push_str(&statics_text::render(&b.statics, unit, look));
    if !body.cases.is_empty() {
        out.push_str(&service::cases(body, unit, look));
    }
    out.push_str(&overlaps(b, unit, look));
    out.push_str(&nominal(&document.warnings));
    out.push_str(&statics_text::caution(&b.statics, &b.limits));
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
        (None, Source::Smear) => "(with what it covers)".to_owned(),
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
    let centre = |c: Option<[f64; 3]>, standard: Option<[f64; 3]>, k: usize| {
        c.map_or_else(Cell::empty, |c| {
            let x = length_in(c[k], unit);
            Cell::figure(position(x, standard.map(|u| length_in(u[k], unit))), x)
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
        let curved = match p.facets {
            Some(f) if f.figures == "curved" => ", facets taken as curves",
            _ => "",
        };
        table.row(vec![
            Cell::text(&p.path),
            Cell::text(&made_of(p)),
            Cell::text(&format!("{}{curved}{implied}", basis_word(p.basis))),
            Cell::figure(mass(p.mass_kg, p.mass_standard_kg), p.mass_kg),
            p.share_of_mass.map_or_else(Cell::empty, |s| {
                Cell::figure(format!("{:.1}", 100.0 * s), s)
            }),
            centre(c, p.centre_standard_m, 0),
            centre(c, p.centre_standard_m, 1),
            centre(c, p.centre_standard_m, 2),
            Cell::text(&box_size(&p.bounds_m, unit)),
        ]);
    }
    if let Some(t) = &b.total {
        let c = Some(t.centre_of_mass_m);
        let of = |u: &Option<Uncertainty>| u.as_ref().map(|u| u.centre_of_mass_m.standard);
        table.total(vec![
            Cell::text("total"),
            Cell::empty(),
            Cell::empty(),
            Cell::figure(total_mass(t, b.uncertainty.as_ref()), t.mass_kg),
            Cell::figure("100.0", 1.0),
            centre(c, of(&b.uncertainty), 0),
            centre(c, of(&b.uncertainty), 1),
            centre(c, of(&b.uncertainty), 2),
            Cell::text(&box_size(&t.bounds_m, unit)),
        ]);
    }
    table
}

/// A mass to the place that its uncertainty supports, else to five figures.
fn mass(kg: f64, standard: Option<f64>) -> String {
    supported(kg, standard, |x| significant(x, 5))
}

fn total_mass(t: &Total, u: Option<&Uncertainty>) -> String {
    let standard = u.map(|u| u.mass_kg.standard);
    supported(t.mass_kg, standard, |x| significant(x, 6))
}

/// A coordinate to the place that its uncertainty supports, and to hundredths at most.
fn position(x: f64, standard: Option<f64>) -> String {
    match standard.filter(|u| place(*u).is_some_and(|p| p > -2)) {
        Some(u) => figure(x, Some(u)),
        None => fixed(x),
    }
}

/// Hundredths of the unit at most: a position is not known finer.
pub(super) fn fixed(x: f64) -> String {
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
    let mut row = |by: &str, name: &str, parts: usize, kg: [Option<f64>; 2], share: Option<f64>| {
        let [kg, standard] = kg;
        let kg = kg.unwrap_or_default();
        table.row(vec![
            Cell::text(by),
            Cell::text(name),
            Cell::count(parts as u64),
            Cell::figure(mass(kg, standard), kg),
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
            [Some(m.mass_kg), m.mass_standard_kg],
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
                [Some(g.mass_kg), g.mass_standard_kg],
                g.share_of_mass,
            );
        }
    }
    for (i, s) in b.by_basis.iter().enumerate() {
        let by = if i == 0 { "by basis" } else { "" };
        row(
            by,
            basis_word(s.basis),
            s.parts,
            [Some(s.mass_kg), s.mass_standard_kg],
            s.share_of_mass,
        );
    }
    format!("\n{}", table.render(look))
}

fn whole(
    t: &Total,
    u: Option<&Uncertainty>,
    about: Option<&AboutPoint>,
    unit: LengthUnit,
    look: Look,
) -> String {
    let mut out = format!("\n{}\n", look.marked("the whole", Mark::Heading));
    let off = u.map_or(String::new(), |u| {
        let m = &u.mass_kg;
        sure::off(t.mass_kg, m.standard, [m.low_95, m.high_95], " kg")
    });
    out.push_str(&format!("mass           {} kg{off}\n", total_mass(t, u)));
    out.push_str(&format!(
        "balance point  {}   frame: the assembly's axes and origin\n",
        u.map_or_else(
            || point_in(&t.centre_of_mass_m, &t.bounds_m, unit),
            |u| sure_point(&t.centre_of_mass_m, &u.centre_of_mass_m, unit)
        )
    ));
    out.push_str(&format!(
        "box            {} {}\n",
        box_size(&t.bounds_m, unit),
        unit.symbol()
    ));
    // One place for the whole tensor: that of the least certain of its moments.
    let standard = u.and_then(|u| u.inertia_kg_m2.as_ref()).map(|i| {
        let s = i.standard;
        s[0][0].max(s[1][1]).max(s[2][2])
    });
    out.push_str(&matrix(
        "inertia about the centre of mass, kg m2; off-diagonals are the tensor's own, −∫xy dm",
        &t.inertia_kg_m2,
        standard.filter(|s| *s > 0.0),
    ));
    let moments = u.and_then(|u| u.principal_moments_kg_m2.as_ref());
    let radii = u.and_then(|u| u.radii_of_gyration_m.as_ref());
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
        } else if u.is_some_and(|u| u.axes_undetermined.contains(&i)) {
            " (undetermined)"
        } else {
            ""
        };
        table.row(vec![
            Cell::text(&(i + 1).to_string()),
            Cell::figure(
                supported(
                    t.principal_moments_kg_m2[i],
                    moments.map(|m| m.standard[i]),
                    |x| significant(x, 6),
                ),
                t.principal_moments_kg_m2[i],
            ),
            Cell::figure(
                supported(
                    length_in(t.radii_of_gyration_m[i], unit),
                    radii.map(|r| length_in(r.standard[i], unit)),
                    |x| significant(x, 6),
                ),
                t.radii_of_gyration_m[i],
            ),
            Cell::text(&format!("{axis}{free}")),
        ]);
    }
    out.push_str(&table.render(look));
    if let Some(a) = about {
        let place = point(&a.point_m, unit);
        let (of, axes) = match &a.frame {
            Some(name) => (
                format!("frame {} at {place}", crate::text::shown(name)),
                "the frame's axes",
            ),
            None => (place, "the assembly's axes"),
        };
        out.push_str(&format!(
            "balance point  {} from {of}, in {axes}\n",
            point(&a.centre_of_mass_m, unit)
        ));
        out.push_str(&matrix(
            &format!("inertia about {of}, in {axes}, kg m2"),
            &a.inertia_kg_m2,
            standard.filter(|s| *s > 0.0),
        ));
    }
    out
}

/// A point with the standard uncertainty of each coordinate.
fn sure_point(at: &[f64; 3], off: &Spread<[f64; 3]>, unit: LengthUnit) -> String {
    let shown = [0, 1, 2].map(|k| {
        let figures = [at[k], off.standard[k], off.low_95[k], off.high_95[k]];
        let [x, u, low, high] = figures.map(|x| length_in(x, unit));
        let text = if u > 0.0 {
            figure(x, Some(u))
        } else {
            fixed(x)
        };
        text + &sure::off(x, u, [low, high], "")
    });
    format!("({}) {}", shown.join(", "), unit.symbol())
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
            let (x, _) = readable(x, e.unit, e.quantity, unit);
            Cell::figure(significant(x, 6), x)
        };
        let (word, mark) = verdict(e.verdict);
        table.row(vec![
            Cell::text(&e.part),
            Cell::text(e.quantity),
            Cell::text(&readable(0.0, e.unit, e.quantity, unit).1),
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

pub(super) fn verdict(v: Verdict) -> (&'static str, Mark) {
    match v {
        Verdict::Holds => ("holds", Mark::Pass),
        Verdict::Broken => ("BROKEN", Mark::Fail),
        Verdict::Unsure => ("UNSURE", Mark::Unsure),
    }
}

pub(super) fn limits(limits: &[Judged], unit: LengthUnit, look: Look) -> String {
    let sure = limits.iter().any(|l| l.standard.is_some());
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
        Column::text("probability", if sure { "chance inside" } else { "" }),
    ]);
    for l in limits {
        let found = |x: f64| {
            let (x, _) = readable(x, l.unit, l.quantity, unit);
            let standard = l.standard.map(|s| readable(s, l.unit, l.quantity, unit).0);
            let text = if l.unit == "m" {
                position(x, standard)
            } else {
                supported(x, standard, |x| significant(x, 6))
            };
            Cell::figure(text, x)
        };
        let shown = |x: f64| {
            let (x, _) = readable(x, l.unit, l.quantity, unit);
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
            Cell::text(&readable(0.0, l.unit, l.quantity, unit).1),
            found(l.value),
            l.from.map_or_else(Cell::empty, shown),
            l.to.map_or_else(Cell::empty, shown),
            found(l.margin),
            Cell::text(percent.trim_start()),
            Cell::text(word).marked(mark),
            Cell::text(&l.probability.map_or(String::new(), chance)),
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

/// A probability in per cent, never rounded to certainty.
fn chance(p: f64) -> String {
    match 100.0 * p {
        p if p > 99.99 => "> 99.99 %".to_owned(),
        p if p < 0.01 => "< 0.01 %".to_owned(),
        p => format!("{p:.2} %"),
    }
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
        "mass_standard_kg",
        "centre_x_standard_m",
        "centre_y_standard_m",
        "centre_z_standard_m",
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
        let u = |k: usize| p.centre_standard_m.map(|u| u[k]);
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
            p.mass_standard_kg,
            u(0),
            u(1),
            u(2),
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
