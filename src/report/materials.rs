//! The `materials` document and its table.

use serde::Serialize;

use super::Document;
use super::digits::significant;
use super::table::{Cell, Column, Look, Table};
use crate::error::Result;
use crate::material::Material;

/// The command's part of the document.
#[derive(Clone, Debug, Serialize)]
pub struct MaterialsBody {
    /// Materials in the table's order.
    pub materials: Vec<MaterialRow>,
}

/// One material.
#[derive(Clone, Debug, Serialize)]
pub struct MaterialRow {
    /// Short name.
    pub id: String,
    /// Full name.
    pub name: String,
    /// kg/m³.
    pub density_kg_m3: f64,
    /// Half-width of its usual range, per cent of the density.
    pub tolerance_percent: Option<f64>,
    /// Other names it goes by.
    pub aliases: Vec<String>,
    /// Where the figure comes from.
    pub source: String,
}

impl MaterialRow {
    /// Of a material of the table.
    pub fn of(m: &Material) -> Self {
        let percent = m.density.tolerance.map(|t| {
            // The table states per cent with one decimal at most; the product's rounding goes.
            (t.amount / m.density.value * 100.0 * 1e6).round() / 1e6
        });
        Self {
            id: m.id.clone(),
            name: m.name.clone(),
            density_kg_m3: m.density.value,
            tolerance_percent: percent,
            aliases: m.aliases.clone(),
            source: m.source.clone(),
        }
    }
}

fn table(body: &MaterialsBody) -> Table {
    let mut table = Table::new(vec![
        Column::text("id", "id"),
        Column::text("name", "material"),
        Column::figures("density_kg_m3", "density", "kg/m3"),
        Column::figures("tolerance_percent", "± half-width", "%"),
        Column::text("source", "source"),
    ]);
    for m in &body.materials {
        table.row(vec![
            Cell::text(&m.id),
            Cell::text(&m.name),
            Cell::figure(significant(m.density_kg_m3, 6), m.density_kg_m3),
            m.tolerance_percent
                .map_or_else(Cell::empty, |t| Cell::figure(significant(t, 3), t)),
            Cell::text(&m.source),
        ]);
    }
    table
}

/// As text.
pub fn render(document: &Document<MaterialsBody>, look: Look) -> String {
    let mut text = table(&document.body).render(look);
    text.push_str(
        "\nA density is that of the solid; ± is the half-width of the range in which a delivery is expected.\n",
    );
    text
}

/// As CSV.
///
/// # Errors
/// As [`Table::csv`].
pub fn csv(body: &MaterialsBody) -> Result<String> {
    table(body).csv()
}
