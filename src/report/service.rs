//! Tanks and cases as people read them.

use super::balance::{BalanceBody, fixed, readable, verdict};
use super::digits::{length_in, significant};
use super::table::{Cell, Column, Look, Mark, Table};
use super::words::point;
use nalgebra::Vector3;

use crate::assembly::service::{Centres, TankRow};
use crate::limits::Judged;
use crate::quantity::LengthUnit;

/// What the liquid's figures leave out; stands wherever liquid is.
pub(super) const AT_REST: &str =
    "liquid is taken at rest: sloshing, and its freedom not to turn with its tank, are left out";

/// How each tank is filled.
pub(super) fn tanks(tanks: &[TankRow], unit: LengthUnit, look: Look) -> String {
    let u = unit.symbol();
    let mut table = Table::new(vec![
        Column::text("path", "tank"),
        Column::text("liquid", "liquid"),
        Column::figures("fill", "full", "%"),
        Column::figures("volume_m3", "holds now", "l"),
        Column::figures("ullage_m3", "free above", "l"),
        Column::figures("level_m", "level", u),
        Column::text("surface", "next drop goes to"),
    ]);
    let litres = |x: f64| Cell::figure(significant(x * 1e3, 5), x);
    for t in tanks {
        table.row(vec![
            Cell::text(&t.path),
            Cell::text(&t.liquid),
            Cell::figure(format!("{:.1}", 100.0 * t.fill), t.fill),
            litres(t.volume_m3),
            litres(t.ullage_m3),
            t.level_m.map_or_else(Cell::empty, |h| {
                let shown = length_in(h, unit);
                Cell::figure(fixed(shown), h)
            }),
            Cell::text(
                &t.surface_centroid_m
                    .map_or(String::new(), |p| point(&p, unit)),
            ),
        ]);
    }
    format!("\n{}{AT_REST}\n", table.render(look))
}

/// The three centres side by side, and which may stand for which.
pub(super) fn centres(c: &Centres, unit: LengthUnit, look: Look) -> String {
    let u = unit.symbol();
    let mut table = Table::new(vec![
        Column::text("centre", "centre"),
        Column::figures("x", "x", u),
        Column::figures("y", "y", u),
        Column::figures("z", "z", u),
        Column::text("distance_m", &format!("from the centre of mass, {u}")),
    ]);
    let apart = |d: f64| match d == 0.0 {
        true => "0".to_owned(),
        false => significant(length_in(d, unit), 4),
    };
    let mut row = |name: &str, at: Option<[f64; 3]>, offset: Option<[f64; 3]>| {
        let mut cells = vec![Cell::text(name)];
        cells.extend((0..3).map(|k| {
            at.map_or_else(Cell::empty, |p| {
                Cell::figure(fixed(length_in(p[k], unit)), p[k])
            })
        }));
        let away = offset.map_or("–".to_owned(), |o| apart(Vector3::from(o).norm()));
        cells.push(Cell::text(&away));
        table.row(cells);
    };
    let m = c.centre_of_mass_m;
    let between = |p: [f64; 3]| std::array::from_fn(|k| p[k] - m[k]);
    row("centroid", c.centroid_m, c.centroid_m.map(between));
    row("centre of mass", Some(m), Some([0.0; 3]));
    row(
        "centre of gravity, ∫ r g dm / ∫ g dm",
        c.centre_of_gravity_m,
        c.centre_of_gravity_offset_m,
    );
    row("same-force point", c.same_force_m, c.same_force_offset_m);
    let mut out = format!("\n{}", table.render(look));
    for s in &c.stands_for {
        let (verb, mark) = match s.holds {
            true => ("may", Mark::Pass),
            false => ("may NOT", Mark::Fail),
        };
        let claim = format!("the {} {verb} stand for the {}", s.a, s.b);
        out.push_str(&format!(
            "{} within {} {u}: {} apart; {}\n",
            look.marked(&claim, mark),
            apart(s.tolerance_m),
            apart(s.distance_m),
            s.why
        ));
    }
    let triple = |v: [f64; 3]| {
        v.map(|x| match x == 0.0 {
            true => "0".to_owned(),
            false => significant(x, 5),
        })
        .join(", ")
    };
    if let (Some(f), Some(t)) = (c.force_n, c.torque_n_m) {
        out.push_str(&format!(
            "gravity pulls with ({}) N, and turns about the centre of mass with ({}) N m\n",
            triple(f),
            triple(t)
        ));
    }
    out
}

/// The whole in every case, and every limit in every case as one matrix.
pub(super) fn cases(body: &BalanceBody, unit: LengthUnit, look: Look) -> String {
    let u = unit.symbol();
    let mut columns = vec![
        Column::text("figure", "in each case"),
        Column::text("unit", "unit"),
    ];
    let base = body.case.is_none().then_some("as filed");
    let names = body.cases.iter().map(|c| c.name.as_str());
    columns.extend(base.into_iter().chain(names.clone()).map(|n| {
        let shown = crate::text::shown(n);
        Column::text(n, &shown)
    }));
    let mut table = Table::new(columns);
    let own = body.balance.total.as_ref().filter(|_| base.is_some());
    let totals: Vec<_> = own
        .into_iter()
        .chain(body.cases.iter().map(|c| &c.total))
        .collect();
    let mut row = |name: &str, unit: &str, cells: Vec<Cell>| {
        let mut all = vec![Cell::text(name), Cell::text(unit)];
        all.extend(cells);
        table.row(all);
    };
    let masses = totals.iter();
    let masses = masses.map(|t| Cell::text(&significant(t.mass_kg, 6)));
    row("mass", "kg", masses.collect());
    for (k, axis) in ["x", "y", "z"].into_iter().enumerate() {
        let of = totals.iter();
        let of = of.map(|t| Cell::text(&fixed(length_in(t.centre_of_mass_m[k], unit))));
        row(&format!("balance point {axis}"), u, of.collect());
    }
    let own = base.map(|_| &body.balance.limits);
    let judged: Vec<&Vec<Judged>> = own
        .into_iter()
        .chain(body.cases.iter().map(|c| &c.limits))
        .collect();
    let count = body.balance.limits.len();
    let mut broken = 0;
    for n in 0..count {
        let first = &body.balance.limits[n];
        let cells = judged.iter().map(|limits| match limits.get(n) {
            None => Cell::empty(),
            Some(l) => {
                let (margin, _) = readable(l.margin, l.unit, l.quantity, unit);
                let margin = significant(margin, 3);
                let (word, mark) = verdict(l.verdict);
                if mark == Mark::Fail {
                    broken += 1;
                }
                Cell::text(&format!("{word}, margin {margin}")).marked(mark)
            }
        });
        let cells: Vec<Cell> = cells.collect();
        let (_, symbol) = readable(0.0, first.unit, first.quantity, unit);
        row(
            &format!("{} ({})", first.name, first.quantity),
            &symbol,
            cells,
        );
    }
    let out = format!("\n{}", table.render(look));
    if count == 0 {
        return out;
    }
    let verdict = match broken {
        0 => look.marked("every limit holds in every case", Mark::Pass),
        n => look.marked(&format!("BROKEN {n} times over all cases"), Mark::Fail),
    };
    format!("{out}{verdict}\n")
}
