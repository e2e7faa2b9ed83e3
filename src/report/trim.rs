//! The `trim` document and what it prints for people.

use serde::Serialize;

use super::Document;
use super::balance::limits;
use super::digits::significant;
use super::footer::{CAUTION, footer, nominal};
use super::statics_text;
use super::table::{Cell, Column, Look, Mark, Table};
use super::words::point;
use crate::assembly::Statics;
use crate::ballast::{InPhase, Outcome, Proof, Trimmed};
use crate::error::Result;
use crate::limits::Judged;
use crate::quantity::LengthUnit;

/// The command's part of the document.
#[derive(Clone, Debug, Serialize)]
pub struct TrimBody {
    /// Name of the assembly.
    pub name: String,
    /// The answer.
    #[serde(flatten)]
    pub trimmed: Trimmed,
    /// Liquid finds its level at every slope.
    #[serde(skip)]
    pub levels: bool,
}

/// As text; lengths in `unit`, the assembly's own.
pub fn render(document: &Document<TrimBody>, unit: LengthUnit, look: Look) -> String {
    let t = &document.body.trimmed;
    let mut out = look.marked(&crate::text::shown(&document.body.name), Mark::Heading);
    out.push_str("\n\n");
    let total = significant(t.total_kg.unwrap_or(0.0), 6);
    let line = match (t.outcome, t.proof) {
        (Outcome::HoldsAlready, _) => look.marked("all limits hold without ballast", Mark::Pass),
        (Outcome::Found, Proof::Local) => look.marked(
            &format!("{total} kg of ballast do; lighter ballast was not ruled out"),
            Mark::Unsure,
        ),
        (Outcome::Found, _) => look.marked(
            &format!("{total} kg of ballast, the least there is"),
            Mark::Pass,
        ),
        (Outcome::Impossible, Proof::Local) => look.marked(
            "NO BALLAST FOUND, which does not prove that there is none",
            Mark::Fail,
        ),
        (Outcome::Impossible, _) => look.marked("NO BALLAST at these places does it", Mark::Fail),
    };
    out.push_str(&format!("{line}\n"));
    if let (Outcome::Found, Some(gap)) = (t.outcome, t.gap_kg) {
        let by = match t.proof {
            Proof::Gap => "branch and bound",
            _ => "its dual",
        };
        out.push_str(&format!(
            "proved by {by}: nothing is lighter by more than {} kg\n",
            significant(gap, 2)
        ));
    }
    if !t.ballast.is_empty() {
        out.push_str(&format!("\n{}", table(t, unit).render(look)));
    }
    if let Some(s) = t.sampled {
        out.push_str(&format!(
            "all limits hold in {:.3} % of {} samples (seed {})\n",
            100.0 * s.held,
            s.n,
            s.seed
        ));
    }
    let plain = |l: &[InPhase]| l.iter().map(|l| l.judged.clone()).collect::<Vec<Judged>>();
    out.push_str("\nbefore");
    out.push_str(&limits(&plain(&t.before), unit, look));
    if t.outcome == Outcome::Found {
        out.push_str("\nafter");
        out.push_str(&limits(&plain(&t.after), unit, look));
    }
    if document.body.levels && t.before.iter().any(|b| b.judged.quantity == "tip") {
        out.push_str("slopes here are with the liquid level at the slope that the limit asks for, which tells whether it holds; `balance` gives the slope at which it tips\n");
    }
    for b in &t.binding {
        let phase = b
            .phase
            .as_ref()
            .map_or(String::new(), |p| format!(" in {p}"));
        // Prices per unit that people loosen by.
        let (price, per) = match b.unit {
            "m" => (b.price * unit.metres(), unit.symbol().to_owned()),
            "rad" => (b.price.to_radians(), "deg".to_owned()),
            "1" if b.quantity == "percent" => (b.price / 100.0, "%".to_owned()),
            "kg m" => (b.price * 1e-6, "g mm".to_owned()),
            u => (b.price, u.to_owned()),
        };
        let worth = if b.price > 0.0 {
            format!("loosened by 1 {per} it saves {} kg", significant(price, 3))
        } else {
            "loosening it alone saves nothing".to_owned()
        };
        out.push_str(&format!(
            "binds: {}{phase}; {worth}\n",
            crate::text::shown(&b.limit)
        ));
    }
    if !t.binding.is_empty() && t.ballast.iter().any(|b| b.units.is_some()) {
        out.push_str("savings are those with the unit weights held, to first order\n");
    }
    if !t.conflict.is_empty() {
        let names: Vec<String> = t
            .conflict
            .iter()
            .map(|n| crate::text::shown(n).to_string())
            .collect();
        out.push_str(&format!(
            "these limits cannot hold together, and could with any one of them left out: {}\n",
            names.join(", ")
        ));
    }
    out.push_str(&nominal(&document.warnings));
    out.push_str(&statics_text::caution(
        &Statics::default(),
        &plain(&t.before),
    ));
    out.push_str(&format!("{CAUTION}\n"));
    out.push_str(&footer(document, look));
    out
}

fn table(t: &Trimmed, unit: LengthUnit) -> Table {
    let u = unit.symbol();
    let mut table = Table::new(vec![
        Column::text("place", "place"),
        Column::figures("mass_kg", "mass", "kg"),
        Column::text("units", "unit weights"),
        Column::text("at", &format!("at, {u}")),
    ]);
    for b in &t.ballast {
        table.row(vec![
            Cell::text(&b.place),
            Cell::figure(significant(b.mass_kg, 6), b.mass_kg),
            Cell::text(&b.units.map_or(String::new(), |n| n.to_string())),
            Cell::text(&point(&b.at_m, unit)),
        ]);
    }
    table
}

/// As CSV: one row a place, SI units.
///
/// # Errors
/// As [`Table::csv`].
pub fn csv(body: &TrimBody) -> Result<String> {
    let mut columns = vec![Column::text("place", "")];
    columns.extend(["mass_kg", "x_m", "y_m", "z_m"].map(|k| Column::figures(k, k, "")));
    columns.push(Column::text("units", ""));
    let mut table = Table::new(columns);
    for b in &body.trimmed.ballast {
        let mut row = vec![Cell::text(&b.place), Cell::figure("", b.mass_kg)];
        row.extend(b.at_m.map(|x| Cell::figure("", x)));
        row.push(Cell::text(
            &b.units.map_or(String::new(), |n| n.to_string()),
        ));
        table.row(row);
    }
    table.csv()
}
