//! Aligned tables for a terminal, and the same table as CSV.
//!
//! Nothing is cut off: long text wraps, and a table too wide for the terminal even so is laid out
//! as one block of lines a row. Colour only repeats what a word already says.

use unicode_width::{UnicodeWidthChar, UnicodeWidthStr};

use crate::error::{Error, Kind, Result};
use crate::text::shown;

pub use super::look::{Look, Mark};

/// Where the text of a column stands.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Align {
    /// Names and sentences; they wrap.
    Left,
    /// Counts.
    Right,
    /// Figures, with their decimal points in one line.
    Decimal,
}

/// One column.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Column {
    /// Its heading in CSV, with the SI unit in the name: `mass_kg`.
    pub key: String,
    /// Its heading on a terminal.
    pub title: String,
    /// The unit of the shown figures, under the heading.
    pub unit: Option<String>,
    /// Where its cells stand.
    pub align: Align,
}

impl Column {
    /// A column of text.
    pub fn text(key: &str, title: &str) -> Self {
        Self {
            key: key.to_owned(),
            title: title.to_owned(),
            unit: None,
            align: Align::Left,
        }
    }

    /// A column of figures in `unit`, aligned at the point.
    pub fn figures(key: &str, title: &str, unit: &str) -> Self {
        Self {
            unit: Some(unit.to_owned()),
            align: Align::Decimal,
            ..Self::text(key, title)
        }
    }

    /// A column of whole numbers.
    pub fn counts(key: &str, title: &str) -> Self {
        Self {
            align: Align::Right,
            ..Self::text(key, title)
        }
    }
}

/// What a cell holds in CSV.
#[derive(Clone, Debug, PartialEq)]
enum Full {
    Text(String),
    Number(f64),
    Count(u64),
    Nothing,
}

/// One cell: what people read, and what programs read.
#[derive(Clone, Debug, PartialEq)]
pub struct Cell {
    shown: String,
    full: Full,
    mark: Mark,
}

impl Cell {
    /// Text; controls in it are made visible.
    pub fn text(text: &str) -> Self {
        let safe = shown(text).into_owned();
        Self {
            shown: safe.clone(),
            full: Full::Text(safe),
            mark: Mark::Plain,
        }
    }

    /// A figure, shown as `text` and written to CSV in full as `full` (in the unit that the
    /// column's key names). A figure that is not finite is an empty cell there.
    pub fn figure(text: impl Into<String>, full: f64) -> Self {
        Self {
            shown: shown(&text.into()).into_owned(),
            full: Full::Number(full),
            mark: Mark::Plain,
        }
    }

    /// A whole number.
    pub fn count(count: u64) -> Self {
        Self {
            shown: count.to_string(),
            full: Full::Count(count),
            mark: Mark::Plain,
        }
    }

    /// Nothing.
    pub fn empty() -> Self {
        Self {
            shown: String::new(),
            full: Full::Nothing,
            mark: Mark::Plain,
        }
    }

    /// The same cell under `mark`.
    #[must_use]
    pub fn marked(mut self, mark: Mark) -> Self {
        self.mark = mark;
        self
    }

    fn csv(&self) -> String {
        match &self.full {
            Full::Text(text) => guarded(text),
            Full::Number(v) if !v.is_finite() => String::new(),
            // The shortest decimal that reads back to the same double.
            Full::Number(v) if *v == 0.0 || (1e-5..1e16).contains(&v.abs()) => format!("{v}"),
            Full::Number(v) => format!("{v:e}"),
            Full::Count(n) => n.to_string(),
            Full::Nothing => String::new(),
        }
    }
}

/// A spreadsheet takes text that begins with one of these for a formula and may run it; an
/// apostrophe in front makes it text (OWASP, CSV injection).
fn guarded(text: &str) -> String {
    if text.trim_start().starts_with(['=', '+', '-', '@']) {
        format!("'{text}")
    } else {
        text.to_owned()
    }
}

/// A table of rows under headings, with an optional total.
#[derive(Clone, Debug, PartialEq)]
pub struct Table {
    columns: Vec<Column>,
    rows: Vec<Vec<Cell>>,
    total: Option<Vec<Cell>>,
}

/// Blank columns between two columns.
const GAP: usize = 2;
/// A text column is not made narrower than this; below it the table is laid out as blocks.
const NARROWEST: usize = 12;

impl Table {
    /// A table without rows.
    pub fn new(columns: Vec<Column>) -> Self {
        Self {
            columns,
            rows: Vec::new(),
            total: None,
        }
    }

    /// Adds a row. Missing cells are empty; cells beyond the last column are an error of the
    /// caller and are kept out.
    pub fn row(&mut self, cells: Vec<Cell>) {
        let cells = self.fitted(cells);
        self.rows.push(cells);
    }

    /// Sets the row under the rule.
    pub fn total(&mut self, cells: Vec<Cell>) {
        self.total = Some(self.fitted(cells));
    }

    /// Whether there is no row.
    pub fn is_empty(&self) -> bool {
        self.rows.is_empty()
    }

    fn fitted(&self, mut cells: Vec<Cell>) -> Vec<Cell> {
        debug_assert!(cells.len() <= self.columns.len());
        cells.resize_with(self.columns.len(), Cell::empty);
        cells
    }

    /// The table as text, each line ended.
    pub fn render(&self, look: Look) -> String {
        let natural = self.natural();
        match self.widths(&natural, look.width) {
            Some(widths) => self.grid(&natural, &widths, look),
            None => self.blocks(look),
        }
    }

    /// The rows as CSV (RFC 4180) under the columns' keys. The total is left out: a sum over the
    /// column would count everything twice.
    ///
    /// # Errors
    /// `cannot-write` where memory for the text cannot be had.
    pub fn csv(&self) -> Result<String> {
        let cannot = |_| {
            Error::new(
                Kind::CannotWrite,
                "the table cannot be written as CSV",
                "try again",
            )
        };
        let mut out = csv::Writer::from_writer(Vec::new());
        out.write_record(self.columns.iter().map(|c| &c.key))
            .map_err(cannot)?;
        for row in &self.rows {
            out.write_record(row.iter().map(Cell::csv))
                .map_err(cannot)?;
        }
        let bytes = out
            .into_inner()
            .map_err(|e| cannot(e.into_error().into()))?;
        Ok(String::from_utf8_lossy(&bytes).into_owned())
    }

    fn all_rows(&self) -> impl Iterator<Item = &Vec<Cell>> {
        self.rows.iter().chain(&self.total)
    }

    /// Width of each column and of the part before its decimal points, nothing wrapped.
    fn natural(&self) -> Vec<Natural> {
        let mut out = Vec::with_capacity(self.columns.len());
        for (i, column) in self.columns.iter().enumerate() {
            let cells = || {
                self.all_rows()
                    .filter_map(|r| r.get(i))
                    .map(|c| c.shown.as_str())
            };
            let heading = column.title.width().max(column.unit_text().width());
            let (before, body) = if column.align == Align::Decimal {
                let before = cells().map(|t| at_point(t).0.width()).max().unwrap_or(0);
                let after = cells().map(|t| at_point(t).1.width()).max().unwrap_or(0);
                (before, before + after)
            } else {
                (0, cells().map(UnicodeWidthStr::width).max().unwrap_or(0))
            };
            out.push(Natural {
                width: heading.max(body),
                body,
                before,
            });
        }
        out
    }

    /// The widths to use within `limit`: text columns give way, the widest first; `None` where
    /// that is not enough.
    fn widths(&self, natural: &[Natural], limit: Option<usize>) -> Option<Vec<usize>> {
        let mut widths: Vec<usize> = natural.iter().map(|n| n.width).collect();
        let gaps = GAP * widths.len().saturating_sub(1);
        let limit = limit.unwrap_or(usize::MAX);
        while widths.iter().sum::<usize>() + gaps > limit {
            let over = widths.iter().sum::<usize>() + gaps - limit;
            let text = |i: &usize| self.columns[*i].align == Align::Left;
            let widest = (0..widths.len()).filter(text).max_by_key(|i| widths[*i])?;
            let least = NARROWEST.max(self.columns[widest].title.width());
            if widths[widest] <= least {
                return None;
            }
            // Down to the next widest, so that columns give way evenly.
            let next = (0..widths.len())
                .filter(text)
                .filter(|i| *i != widest)
                .map(|i| widths[i])
                .max()
                .unwrap_or(0);
            let step = over.min((widths[widest] - next).max(1));
            widths[widest] = (widths[widest] - step).max(least);
        }
        Some(widths)
    }

    fn grid(&self, natural: &[Natural], widths: &[usize], look: Look) -> String {
        let mut out = String::new();
        let titles = self.columns.iter().map(|c| c.title.clone()).collect();
        self.line(&mut out, titles, widths, look, &|_| Mark::Heading);
        if self.columns.iter().any(|c| !c.unit_text().is_empty()) {
            let units = self.columns.iter().map(Column::unit_text).collect();
            self.line(&mut out, units, widths, look, &|_| Mark::Dim);
        }
        let rule = |out: &mut String| {
            let bars = widths.iter().map(|w| "-".repeat(*w)).collect();
            self.line(out, bars, widths, look, &|_| Mark::Dim);
        };
        rule(&mut out);
        for row in &self.rows {
            self.body(&mut out, row, natural, widths, look);
        }
        if let Some(total) = &self.total {
            rule(&mut out);
            self.body(&mut out, total, natural, widths, look);
        }
        out
    }

    /// One row, as many lines as its tallest cell.
    fn body(
        &self,
        out: &mut String,
        row: &[Cell],
        natural: &[Natural],
        widths: &[usize],
        look: Look,
    ) {
        let cells: Vec<Vec<String>> = (0..self.columns.len())
            .map(|i| match self.columns[i].align {
                Align::Left => wrapped(&row[i].shown, widths[i]),
                Align::Right => vec![row[i].shown.clone()],
                Align::Decimal => vec![pointed(&row[i].shown, natural[i])],
            })
            .collect();
        let height = cells.iter().map(Vec::len).max().unwrap_or(0).max(1);
        for n in 0..height {
            let line = cells
                .iter()
                .map(|lines| lines.get(n).cloned().unwrap_or_default())
                .collect();
            self.line(out, line, widths, look, &|i| row[i].mark);
        }
    }

    /// One line of cells, padded to the widths; no blanks at its end.
    fn line(
        &self,
        out: &mut String,
        cells: Vec<String>,
        widths: &[usize],
        look: Look,
        mark: &dyn Fn(usize) -> Mark,
    ) {
        let mut pending = 0;
        for (i, text) in cells.iter().enumerate() {
            let blank = widths[i].saturating_sub(text.width());
            let left = if self.columns[i].align == Align::Left {
                0
            } else {
                blank
            };
            let trimmed = text.trim_end();
            if !trimmed.is_empty() {
                out.push_str(&" ".repeat(pending + left));
                out.push_str(&look.marked(trimmed, mark(i)));
                pending = 0;
            } else {
                pending += left;
            }
            pending += text.width() - trimmed.width() + blank - left + GAP;
        }
        out.push('\n');
    }

    /// One block of `heading  value` lines a row, for a terminal too narrow for the grid.
    fn blocks(&self, look: Look) -> String {
        let heads: Vec<String> = self
            .columns
            .iter()
            .map(|c| match &c.unit {
                Some(unit) => format!("{} [{unit}]", c.title),
                None => c.title.clone(),
            })
            .collect();
        let wide = heads.iter().map(|h| h.width()).max().unwrap_or(0);
        let room = look
            .width
            .map_or(usize::MAX, |w| w.saturating_sub(wide + GAP).max(NARROWEST));
        let mut out = String::new();
        for (n, row) in self.all_rows().enumerate() {
            if n > 0 {
                out.push('\n');
            }
            for (cell, head) in row.iter().zip(&heads) {
                for (k, part) in wrapped(&cell.shown, room).iter().enumerate() {
                    let head = if k == 0 { head.as_str() } else { "" };
                    let blank = wide - head.width() + GAP;
                    out.push_str(&look.marked(head, Mark::Heading));
                    out.push_str(&" ".repeat(blank));
                    out.push_str(&look.marked(part, cell.mark));
                    out.push('\n');
                }
            }
        }
        out
    }
}

impl Column {
    fn unit_text(&self) -> String {
        self.unit.clone().unwrap_or_default()
    }
}

#[derive(Clone, Copy)]
struct Natural {
    width: usize,
    body: usize,
    before: usize,
}

/// A figure before and from its decimal point (or exponent).
fn at_point(text: &str) -> (&str, &str) {
    text.split_at(
        text.find(['.', 'e'])
            .filter(|_| is_figure(text))
            .unwrap_or(text.len()),
    )
}

fn is_figure(text: &str) -> bool {
    text.starts_with(|c: char| c.is_ascii_digit() || c == '-' || c == '.')
}

/// `text` padded on both sides, so that the points of a column stand in one line.
fn pointed(text: &str, natural: Natural) -> String {
    let (before, after) = at_point(text);
    let left = natural.before - before.width();
    let right = natural.body - natural.before - after.width();
    format!("{}{text}{}", " ".repeat(left), " ".repeat(right))
}

/// `text` in lines of at most `width`, broken at blanks, or within a word that is longer; every
/// character but the blanks at breaks is kept.
fn wrapped(text: &str, width: usize) -> Vec<String> {
    let width = width.max(2);
    let mut lines = Vec::new();
    let mut line = String::new();
    for word in text.split(' ') {
        let joined = line.width() + usize::from(!line.is_empty()) + word.width();
        if joined <= width {
            if !line.is_empty() {
                line.push(' ');
            }
            line.push_str(word);
            continue;
        }
        if !line.is_empty() {
            lines.push(std::mem::take(&mut line));
        }
        for c in word.chars() {
            if line.width() + c.width().unwrap_or(0) > width {
                lines.push(std::mem::take(&mut line));
            }
            line.push(c);
        }
    }
    lines.push(line);
    lines
}

#[cfg(test)]
#[path = "table_tests.rs"]
mod tests;
