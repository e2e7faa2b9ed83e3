//! How sure the figures of a balance are, for people.

use super::digits::{figure, length_in, significant, with_uncertainty};
use super::table::{Cell, Column, Look, Mark, Table};
use crate::assembly::{Balance, Growth, Total};
use crate::quantity::LengthUnit;
use crate::uncertainty::{Driver, Sampled, Source, Uncertainty};

/// Sources are named until they make up this share of the variance.
const MOST_OF_IT: f64 = 0.8;
/// And no more than this many.
const NAMED: usize = 4;

/// How far a figure may be off, behind it: `± u`, or the 95 % interval where that does not lie
/// about the figure, as with a bias to one side. Figures are in the unit that they are shown in.
pub(super) fn off(value: f64, standard: f64, [low, high]: [f64; 2], unit: &str) -> String {
    if standard == 0.0 {
        return String::new();
    }
    if (0.5 * (low + high) - value).abs() <= 1e-3 * standard {
        return format!(" ± {}{unit}", significant(standard, 2));
    }
    let shown = |x: f64| figure(x, Some(standard));
    format!(" (95 % from {} to {}{unit})", shown(low), shown(high))
}

/// The uncertainty of a whole: each figure with its standard uncertainty, 95 % interval and what
/// drives it; growth and draws where there are any. Empty where nothing was computed.
pub(super) fn render(b: &Balance, unit: LengthUnit, look: Look) -> String {
    let Some(total) = &b.total else {
        return String::new();
    };
    let mut out = String::new();
    if let Some(u) = &b.uncertainty {
        out.push_str(&format!(
            "\n{}\n{}",
            look.marked("how sure", Mark::Heading),
            spreads(total, u, unit).render(look)
        ));
        out.push_str(&assumed(&u.sources));
        if !u.axes_undetermined.is_empty() {
            let axes: Vec<String> = u
                .axes_undetermined
                .iter()
                .map(|k| format!("{}", k + 1))
                .collect();
            out.push_str(&format!(
                "principal axes {} are undetermined: their moments lie closer together than 3 standard uncertainties of their distance (sampled)\n",
                axes.join(", ")
            ));
        }
        if u.inertia_kg_m2.is_none() {
            out.push_str(
                "inertia: nothing bounds how far it may be off, since an open mesh is in it\n",
            );
        }
        if let Some(s) = &u.sampled {
            out.push_str(&sampled(s, unit, look));
        }
    }
    if let Some(growth) = &b.growth {
        out.push_str(&grown(growth, unit, look));
    }
    out
}

fn spreads(total: &Total, u: &Uncertainty, unit: LengthUnit) -> Table {
    let mut table = Table::new(vec![
        Column::text("figure", "figure"),
        Column::text("unit", "unit"),
        Column::figures("value", "value", ""),
        Column::figures("standard", "standard", ""),
        Column::figures("low_95", "95 % from", ""),
        Column::figures("high_95", "to", ""),
        Column::text("drivers", "what drives it (share of the variance)"),
    ]);
    let mut row = |name: &str, unit: &str, [value, standard, low, high]: [f64; 4], why: String| {
        let (shown, off) = with_uncertainty(value, standard);
        let certain = standard == 0.0;
        let end = |x: f64| match certain {
            true => Cell::empty(),
            false => Cell::figure(figure(x, Some(standard)), x),
        };
        table.row(vec![
            Cell::text(name),
            Cell::text(unit),
            Cell::figure(shown, value),
            Cell::figure(if certain { "0".to_owned() } else { off }, standard),
            end(low),
            end(high),
            Cell::text(&why),
        ]);
    };
    let m = &u.mass_kg;
    row(
        "mass",
        "kg",
        [total.mass_kg, m.standard, m.low_95, m.high_95],
        drivers(&m.drivers, |s| *s),
    );
    let c = &u.centre_of_mass_m;
    for (k, axis) in ["x", "y", "z"].into_iter().enumerate() {
        let figures = [
            total.centre_of_mass_m[k],
            c.standard[k],
            c.low_95[k],
            c.high_95[k],
        ];
        row(
            &format!("centre {axis}"),
            unit.symbol(),
            figures.map(|x| dusted(length_in(x, unit))),
            drivers(&c.drivers, |s| s[k]),
        );
    }
    if let Some(p) = &u.principal_moments_kg_m2 {
        for k in 0..3 {
            let figures = [
                total.principal_moments_kg_m2[k],
                p.standard[k],
                p.low_95[k],
                p.high_95[k],
            ];
            row(
                &format!("moment {}", k + 1),
                "kg m2",
                figures,
                drivers(&p.drivers, |s| s[k]),
            );
        }
    }
    table
}

/// Below a millionth of a millionth of the unit there is rounding alone.
fn dusted(x: f64) -> f64 {
    if x.abs() < 1e-12 { 0.0 } else { x }
}

/// The few sources that make up most of a variance.
pub(super) fn drivers<T>(all: &[Driver<T>], share: impl Fn(&T) -> f64) -> String {
    let mut of: Vec<(f64, &str)> = all
        .iter()
        .map(|d| (share(&d.share), d.source.as_str()))
        .filter(|(s, _)| *s > 0.0)
        .collect();
    of.sort_by(|a, b| b.0.total_cmp(&a.0));
    let (mut told, mut named) = (0.0, Vec::new());
    for (share, source) in &of {
        if told >= MOST_OF_IT || named.len() == NAMED {
            break;
        }
        told += share;
        named.push(format!("{source} {:.0} %", 100.0 * share));
    }
    named.join(", ")
}

/// What the stated tolerances were taken to mean.
pub(super) fn assumed(sources: &[Source]) -> String {
    let count = |name: &str| sources.iter().filter(|s| s.distribution == name).count();
    let sources = |n: usize| if n == 1 { "source" } else { "sources" };
    let mut said = Vec::new();
    match count("rectangular") {
        0 => {}
        n => said.push(format!(
            "± x without more as the half-width of a range in which every value is as likely ({n} {})",
            sources(n)
        )),
    }
    match count("normal") {
        0 => {}
        n => said.push(format!(
            "(k=…) as that many standard deviations ({n} {})",
            sources(n)
        )),
    }
    match count("interval") {
        0 => {}
        n => said.push(format!(
            "growth and facets that stand for curves as a bias, anything from none to all of it ({n} {})",
            sources(n)
        )),
    }
    format!(
        "standard is one standard uncertainty, as after ±; from {} sources after JCGM 100 (GUM): {}; tolerances are independent of each other, one that is stated once acts alike on all that it is stated of\n",
        count("rectangular") + count("normal") + count("interval"),
        said.join("; ")
    )
}

fn sampled(s: &Sampled, unit: LengthUnit, look: Look) -> String {
    let mut table = Table::new(vec![
        Column::text("figure", "drawn figure"),
        Column::text("unit", "unit"),
        Column::figures("mean", "mean", ""),
        Column::figures("standard", "standard", ""),
        Column::figures("low_95", "95 % from", ""),
        Column::figures("high_95", "to", ""),
    ]);
    let mut row = |name: &str, unit: &str, figures: [f64; 4]| {
        let [mean, standard, ..] = figures;
        let shown = figures.map(|x| figure(x, Some(standard)));
        let off = significant(standard, 2);
        let [m, _, low, high] = shown;
        table.row(vec![
            Cell::text(name),
            Cell::text(unit),
            Cell::figure(m, mean),
            Cell::figure(off, standard),
            Cell::figure(low, figures[2]),
            Cell::figure(high, figures[3]),
        ]);
    };
    let m = &s.mass_kg;
    row("mass", "kg", [m.mean, m.standard, m.low_95, m.high_95]);
    let c = &s.centre_of_mass_m;
    for (k, axis) in ["x", "y", "z"].into_iter().enumerate() {
        let figures = [c.mean[k], c.standard[k], c.low_95[k], c.high_95[k]];
        row(
            &format!("centre {axis}"),
            unit.symbol(),
            figures.map(|x| dusted(length_in(x, unit))),
        );
    }
    if let Some(p) = &s.principal_moments_kg_m2 {
        for k in 0..3 {
            row(
                &format!("moment {}", k + 1),
                "kg m2",
                [p.mean[k], p.standard[k], p.low_95[k], p.high_95[k]],
            );
        }
    }
    let verdict = if s.linear_not_good_enough.is_empty() {
        look.marked(
            "no linear interval is shown to be off by the draws, to the second digit of the uncertainty",
            Mark::Pass,
        )
    } else {
        look.marked(
            &format!(
                "the linear intervals are NOT good enough for {}: take those of the draws",
                s.linear_not_good_enough.join(", ")
            ),
            Mark::Fail,
        )
    };
    let without = match s.without_mass {
        0 => String::new(),
        n => format!("{n} draws had no mass, and are in none of these but the mean of the mass\n"),
    };
    format!(
        "\n{} draws, seed {} (Monte Carlo, JCGM 101)\n{}{without}{verdict}\n",
        s.n,
        s.seed,
        table.render(look)
    )
}

fn grown(g: &Growth, unit: LengthUnit, look: Look) -> String {
    let u = unit.symbol();
    let mut table = Table::new(vec![
        Column::text("standing", "mass growth"),
        Column::figures("mass_kg", "mass", "kg"),
        Column::figures("x", "centre x", u),
        Column::figures("y", "y", u),
        Column::figures("z", "z", u),
        Column::figures("xx", "inertia xx", "kg m2"),
        Column::figures("yy", "yy", "kg m2"),
        Column::figures("zz", "zz", "kg m2"),
    ]);
    for (name, s) in [("basic", &g.basic), ("predicted", &g.predicted)] {
        let mut row = vec![
            Cell::text(name),
            Cell::figure(significant(s.mass_kg, 6), s.mass_kg),
        ];
        row.extend(s.centre_of_mass_m.map(|x| {
            let shown = dusted(length_in(x, unit));
            Cell::figure(format!("{shown:.1}"), x)
        }));
        row.extend([0, 1, 2].map(|k| {
            let x = s.inertia_kg_m2[k][k];
            Cell::figure(significant(x, 5), x)
        }));
        table.row(row);
    }
    let mut by = Table::new(vec![
        Column::text("maturity", "maturity"),
        Column::figures("allowance", "allowance", "%"),
        Column::counts("parts", "parts"),
        Column::figures("basic", "basic", "kg"),
        Column::figures("predicted", "predicted", "kg"),
    ]);
    for r in &g.by_maturity {
        by.row(vec![
            Cell::text(r.maturity.as_deref().unwrap_or("(none stated)")),
            Cell::figure(significant(r.allowance_percent, 3), r.allowance_percent),
            Cell::count(r.parts as u64),
            Cell::figure(significant(r.basic_mass_kg, 5), r.basic_mass_kg),
            Cell::figure(significant(r.predicted_mass_kg, 5), r.predicted_mass_kg),
        ]);
    }
    format!(
        "\n{}mass growth allowance {} kg; limits on mass are held against the predicted mass\n\n{}",
        table.render(look),
        significant(g.allowance_kg, 4),
        by.render(look)
    )
}
