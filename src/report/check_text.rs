//! What `check` prints for people.

use super::Document;
use super::check::{CheckBody, CheckedFile};
use super::digits::{at_most, significant};
use super::footer::footer;
use super::table::{Cell, Column, Look, Mark, Table};
use super::words::{box_size, file_heading, kind_word, point, unit_of};
use crate::error::Result;
use crate::soundness::{EffectIs, Finding, FindingKind, Severity};

/// As text.
pub fn render(document: &Document<CheckBody>, look: Look) -> String {
    let mut out = String::new();
    for file in &document.body.files {
        out.push_str(&of_file(file, look));
        out.push('\n');
    }
    let files = &document.body.files;
    if files.len() > 1 {
        let sound = files.iter().filter(|f| f.sound == Some(true)).count();
        let unread = files.iter().filter(|f| f.error.is_some()).count();
        out.push_str(&format!(
            "{} files: {sound} sound, {} not sound, {unread} not read\n\n",
            files.len(),
            files.len() - sound - unread
        ));
    }
    out.push_str(&footer(document, look));
    out
}

fn of_file(file: &CheckedFile, look: Look) -> String {
    let mut out = file_heading(
        &file.path,
        file.format,
        file.triangles,
        file.unit,
        file.unit_assumed,
        look,
    );
    if file.error.is_some() {
        out.push_str(&look.marked("not read: see the error\n", Mark::Fail));
        return out;
    }
    let verdict = if file.sound == Some(true) {
        look.marked(
            "sound: every body is closed and nothing throws doubt on its volume",
            Mark::Pass,
        )
    } else if file.bodies.is_empty() {
        look.marked("NOT SOUND: no body in the file", Mark::Fail)
    } else {
        look.marked("NOT SOUND: see the findings", Mark::Fail)
    };
    out.push_str(&verdict);
    out.push_str("\n\n");
    if !file.bodies.is_empty() {
        out.push_str(&table(std::slice::from_ref(file), false).render(look));
    }
    let mut n = 0;
    let on_file = file.findings.iter().map(|f| (None, f));
    let on_bodies = file
        .bodies
        .iter()
        .flat_map(|b| b.findings.iter().map(move |f| (Some(&b.id), f)));
    for (id, f) in on_file.chain(on_bodies) {
        n += 1;
        out.push('\n');
        out.push_str(&finding(
            n,
            id.map(String::as_str),
            f,
            unit_of(file.unit),
            look,
        ));
    }
    let unit = unit_of(file.unit);
    for (copy, verb) in [(&file.mended, "MENDED"), (&file.copied, "COPIED")] {
        if let Some(copy) = copy {
            out.push('\n');
            out.push_str(&super::copy::render(copy, verb, unit, look));
        }
    }
    if let Some(path) = &file.picture {
        out.push_str(&format!(
            "\npicture: {}, with the numbers of this list\n",
            crate::text::shown(path)
        ));
    }
    out
}

fn finding(
    n: usize,
    id: Option<&str>,
    f: &Finding,
    unit: crate::quantity::LengthUnit,
    look: Look,
) -> String {
    let (word, mark) = match f.severity {
        Severity::Blocks => ("blocks", Mark::Fail),
        Severity::Doubts => ("doubts", Mark::Fail),
        Severity::Notes => ("notes", Mark::Dim),
    };
    let on = id.map_or(String::new(), |id| {
        format!(" on {}", crate::text::shown(id))
    });
    let mut out = format!(
        "{n}. {} {}: {}{on}\n",
        look.marked(word, mark),
        f.count,
        kind_word(f.kind, f.count),
    );
    let effect = match (f.volume_effect_m3, f.volume_effect_is) {
        (Some(v), Some(is)) => {
            // A bound that rests on an assumption never stands without it.
            let shown = if is == EffectIs::Bound {
                at_most(v * 1e6)
            } else {
                significant(v * 1e6, 6)
            };
            let on = if f.kind == FindingKind::Hole {
                format!(", {}", super::estimate::IF)
            } else {
                String::new()
            };
            let (cm3, is) = (
                shown,
                match is {
                    EffectIs::Exact => "exact",
                    EffectIs::Bound => "at most, either way",
                    EffectIs::Estimate => "estimate",
                },
            );
            format!(
                "   the volume as the facets stand in the file would change by {cm3} cm3 ({is}{on})\n"
            )
        }
        _ => "   effect on the volume: not known\n".to_owned(),
    };
    out.push_str(&effect);
    for p in &f.places {
        let triangles = match &p.triangles[..] {
            [] => String::new(),
            [one] => format!(", facet {one}"),
            many => {
                let first: Vec<String> = many.iter().take(6).map(u32::to_string).collect();
                let more = if many.len() > 6 { ", …" } else { "" };
                format!(", facets {}{more}", first.join(", "))
            }
        };
        let line = p.line.map_or(String::new(), |l| format!(", line {l}"));
        let rim = match (p.edges, p.length_m) {
            (Some(e), Some(l)) => {
                format!(
                    ", {e} edges, {} {} round",
                    significant(l / unit.metres(), 5),
                    unit.symbol()
                )
            }
            (Some(e), None) => format!(", {e} corners"),
            _ => String::new(),
        };
        out.push_str(&format!(
            "   at {}{rim}{line}{triangles}\n",
            point(&p.at_m, unit)
        ));
    }
    if f.count > f.places_shown as u64 {
        out.push_str(&format!(
            "   … {} more (--places N)\n",
            f.count - f.places_shown as u64
        ));
    }
    out.push_str(&format!("   → {}\n", crate::text::shown(&f.advice)));
    out
}

fn table(files: &[CheckedFile], with_path: bool) -> Table {
    let mut columns = Vec::new();
    if with_path {
        columns.push(Column::text("path", "file"));
    }
    columns.extend([
        Column::text("id", "body"),
        Column::counts("triangles", "triangles"),
        Column::counts("shells", "shells"),
        Column::counts("voids", "voids"),
        Column::text("closed", "closed"),
        Column::text("sound", "sound"),
    ]);
    let unit = unit_of(files.first().and_then(|f| f.unit));
    if with_path {
        columns.extend([
            Column::figures("volume_m3", "volume", "m3"),
            Column::figures("area_m2", "area", "m2"),
            Column::text("findings", "findings"),
        ]);
    } else {
        columns.extend([
            Column::figures("volume_cm3", "volume", "cm3"),
            Column::figures("area_cm2", "area", "cm2"),
            Column::text("size", &format!("box, {}", unit.symbol())),
        ]);
    }
    let mut table = Table::new(columns);
    for file in files {
        for b in &file.bodies {
            let yes = |x: bool| {
                if x {
                    Cell::text("yes").marked(Mark::Pass)
                } else {
                    Cell::text("NO").marked(Mark::Fail)
                }
            };
            let figure = |x: Option<f64>, k: f64| {
                x.map_or_else(Cell::empty, |x| Cell::figure(significant(x * k, 6), x * k))
            };
            let mut row = Vec::new();
            if with_path {
                row.push(Cell::text(&file.path));
            }
            row.extend([
                Cell::text(&b.id),
                Cell::count(b.triangles),
                Cell::count(b.shells),
                Cell::count(b.voids),
                yes(b.closed),
                yes(b.sound),
            ]);
            if with_path {
                let kinds: Vec<String> = b
                    .findings
                    .iter()
                    .map(|f| format!("{} {}", f.count, kind_word(f.kind, f.count)))
                    .collect();
                row.extend([
                    figure(b.volume_m3, 1.0),
                    figure(b.area_m2, 1.0),
                    Cell::text(&kinds.join("; ")),
                ]);
            } else {
                row.extend([
                    figure(b.volume_m3, 1e6),
                    figure(b.area_m2, 1e4),
                    Cell::text(&box_size(&b.bounds_m, unit)),
                ]);
            }
            table.row(row);
        }
    }
    table
}

/// As CSV: one row a body.
///
/// # Errors
/// As [`Table::csv`].
pub fn csv(body: &CheckBody) -> Result<String> {
    table(&body.files, true).csv()
}
