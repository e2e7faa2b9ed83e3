//! The `survey` document: the table in short.

use serde::Serialize;

use super::Document;
use super::digits::{figure, significant};
use super::footer::footer;
use super::table::{Cell, Column, Look, Mark, Table};
use crate::error::Result;
use crate::survey::{Grouped, KindCount, Summary};
use crate::text::shown;

/// The command's part of the document.
#[derive(Clone, Debug, Serialize)]
pub struct SurveyBody {
    /// Where the table was written.
    pub table: String,
    /// `parquet`, `csv` or `ndjson`.
    pub format: &'static str,
    /// Its rows.
    pub rows: u64,
    /// Files that had not changed and were not weighed again.
    pub reused_files: u64,
    /// Whether surfaces that cut each other were looked for.
    pub overlap_tested: bool,
    /// Counts over the table.
    #[serde(flatten)]
    pub summary: Summary,
    /// Groups of one shape; null where they were not asked for.
    pub same_shape: Option<SameShape>,
}

/// Bodies that are the same shape.
#[derive(Clone, Copy, Debug, Serialize)]
pub struct SameShape {
    /// Groups of two bodies and more.
    pub groups: u64,
    /// Bodies in them.
    pub bodies: u64,
    /// Pairs that could not be compared.
    pub undecided: u64,
}

impl From<Grouped> for SameShape {
    fn from(g: Grouped) -> Self {
        Self {
            groups: g.groups,
            bodies: g.bodies,
            undecided: g.undecided,
        }
    }
}

/// Kinds that are listed for people.
const MOST_KINDS: usize = 8;

/// For people.
pub fn render(document: &Document<SurveyBody>, look: Look) -> String {
    let body = &document.body;
    let s = &body.summary;
    let mut out = format!(
        "{} files, {} bodies, {} triangles\n",
        s.files, s.bodies, s.triangles
    );
    out.push_str(&format!(
        "{} of {} bodies are sound{}\n",
        s.sound,
        s.bodies,
        if body.overlap_tested {
            ""
        } else {
            " (surfaces that cut each other were not looked for: --overlap)"
        }
    ));
    if s.unreadable > 0 {
        let text = format!("{} of {} files could not be read", s.unreadable, s.files);
        out.push_str(&format!("{}\n", look.marked(&text, Mark::Fail)));
    }
    if body.reused_files > 0 {
        out.push_str(&format!(
            "{} files have not changed and were not weighed again\n",
            body.reused_files
        ));
    }
    for (title, kinds) in [("commonest findings", &s.findings), ("errors", &s.errors)] {
        if !kinds.is_empty() {
            let of = |k: &KindCount| format!("{} {}", k.kind, k.count);
            let words: Vec<String> = kinds.iter().take(MOST_KINDS).map(of).collect();
            out.push_str(&format!("{title}: {}\n", words.join(", ")));
        }
    }
    if let Some(g) = &body.same_shape {
        out.push_str(&format!(
            "same shape: {} bodies in {} groups\n",
            g.bodies, g.groups
        ));
    }
    if !s.heaviest.is_empty() {
        out.push('\n');
        out.push_str(&heaviest(s).render(look));
    }
    if let Some(mass) = s.mass_kg {
        out.push_str(&format!(
            "all masses together: {} kg\n{}\n",
            figure(mass, s.mass_standard_kg),
            super::CAUTION
        ));
    }
    out.push_str(&format!(
        "\ntable: {} ({} rows)\n",
        shown(&body.table),
        body.rows
    ));
    out.push_str(&footer(document, look));
    out
}

fn heaviest(s: &Summary) -> Table {
    let title = if s.mass_kg.is_some() {
        "heaviest"
    } else {
        "largest"
    };
    let mut table = Table::new(vec![
        Column::text("path", title),
        Column::text("body", "body"),
        Column::figures("volume_m3", "volume", "cm3"),
        Column::figures("mass_kg", "mass", "kg"),
    ]);
    for h in &s.heaviest {
        table.row(vec![
            Cell::text(&h.path),
            Cell::text(&h.body),
            Cell::figure(significant(h.volume_m3 * 1e6, 6), h.volume_m3),
            h.mass_kg.map_or_else(Cell::empty, |m| {
                Cell::figure(figure(m, h.mass_standard_kg), m)
            }),
        ]);
    }
    table
}

/// The heaviest bodies as CSV; the table itself is the file.
///
/// # Errors
/// `cannot-write`.
pub fn csv(body: &SurveyBody) -> Result<String> {
    heaviest(&body.summary).csv()
}
