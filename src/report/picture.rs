//! A mesh from three sides, with its findings marked and numbered as `check` lists them.
//!
//! The views are along the file's own axes, in third-angle arrangement and to one scale: above,
//! front, right. What is hidden is drawn faint. Black and white throughout.

mod edges;
mod marks;
mod view;
mod write;

use std::fmt::Write as _;
use std::path::Path;

use super::check::CheckedFile;
use super::digits::{length_in, significant};
use super::words::{box_size, kind_word, unit_of};
use crate::error::Result;
use crate::mesh::Mesh;
use crate::soundness::{Finding, Severity};
pub use write::{PictureFormat, png, write_picture};

use edges::{Edge, EdgeKind, edges_of};
use view::{DIRECTIONS, View};

const WIDTH: f64 = 1200.0;
const HEIGHT: f64 = 920.0;
/// Room about a view, for numbers and its name.
const MARGIN: [f64; 2] = [70.0, 46.0];
/// Most lines of one view; the longest are kept.
const MOST_LINES: usize = 40_000;

/// Draws the mesh and writes the picture, as SVG or PNG by the ending of `path`.
///
/// # Errors
/// Those of [`write_picture`].
pub fn draw(path: &Path, mesh: &Mesh, file: &CheckedFile) -> Result<()> {
    let svg = svg(mesh, file);
    write_picture(path, &svg)
}

/// A finding with its number in the list and the body it is on.
pub(super) struct Numbered<'a> {
    number: usize,
    body: Option<&'a str>,
    finding: &'a Finding,
}

fn numbered(file: &CheckedFile) -> Vec<Numbered<'_>> {
    let on_file = file.findings.iter().map(|f| (None, f));
    let on_bodies = file
        .bodies
        .iter()
        .flat_map(|b| b.findings.iter().map(move |f| (Some(b.id.as_str()), f)));
    on_file
        .chain(on_bodies)
        .zip(1..)
        .map(|((body, finding), number)| Numbered {
            number,
            body,
            finding,
        })
        .collect()
}

fn svg(mesh: &Mesh, file: &CheckedFile) -> String {
    let mut out = String::new();
    // Writing into a String cannot fail; that is why the results are let go.
    let _ = write!(
        out,
        "<svg xmlns=\"http://www.w3.org/2000/svg\" viewBox=\"0 0 {WIDTH} {HEIGHT}\" width=\"{WIDTH}\" height=\"{HEIGHT}\" font-family=\"sans-serif\" font-size=\"13\">\n\
         <title>{}</title>\n\
         <defs><pattern id=\"hatch\" width=\"5\" height=\"5\" patternUnits=\"userSpaceOnUse\" patternTransform=\"rotate(45)\"><rect width=\"5\" height=\"5\" fill=\"#fff\"/><line x1=\"0\" y1=\"0\" x2=\"0\" y2=\"5\" stroke=\"#000\" stroke-width=\"2.4\"/></pattern></defs>\n\
         <rect width=\"{WIDTH}\" height=\"{HEIGHT}\" fill=\"#fff\"/>\n",
        escaped(&file.path)
    );
    let list = numbered(file);
    if let Some(bounds) = mesh.bounds() {
        let edges = edges_of(mesh);
        let all = mesh.soup.triangles.count() <= edges::FEW;
        let mut thinned = false;
        for view in views(mesh, &bounds) {
            thinned |= body_of_view(&mut out, &view, &edges, all);
            marks::draw(&mut out, &view, mesh, &edges, &list);
            let _ = writeln!(
                out,
                "<text x=\"{:.1}\" y=\"{:.1}\" text-anchor=\"middle\" fill=\"#444\">{}</text>",
                view.centre[0],
                view.centre[1] + view.half[1] + 34.0,
                view.direction.name
            );
        }
        legend(&mut out, file, &list, thinned);
    }
    out.push_str("</svg>\n");
    out
}

/// Above over front, right beside front.
fn views(mesh: &Mesh, bounds: &[[f64; 3]; 2]) -> Vec<View> {
    let size = [0, 1, 2].map(|k| bounds[1][k] - bounds[0][k]);
    let fit = |room: f64, need: f64| {
        if need > 0.0 {
            room / need
        } else {
            f64::INFINITY
        }
    };
    let (x, y) = (MARGIN[0] * 2.0, MARGIN[1] * 2.0);
    // Columns: x, then y (and the list); rows: y, then z.
    let scale = fit(WIDTH - 2.0 * x, size[0] + size[1])
        .min(fit(WIDTH - x - 430.0, size[0]))
        .min(fit(HEIGHT - 2.0 * y, size[1] + size[2]));
    let scale = if scale.is_finite() { scale } else { 1.0 };
    let column = size[0] * scale + x;
    let row = size[1] * scale + y;
    let centres = [
        [column / 2.0, row / 2.0],
        [column / 2.0, row + (size[2] * scale + y) / 2.0],
        [
            column + (size[1] * scale + x) / 2.0,
            row + (size[2] * scale + y) / 2.0,
        ],
    ];
    DIRECTIONS
        .iter()
        .zip(centres)
        .map(|(d, c)| View::new(*d, c, scale, bounds, mesh))
        .collect()
}

/// Fill, hidden lines, seen lines. Says whether lines were left out.
fn body_of_view(out: &mut String, view: &View, edges: &[Edge], all: bool) -> bool {
    let mut fill = String::new();
    for [left, right, top] in view.covered() {
        let _ = write!(
            fill,
            "M{left:.1} {top:.1}H{right:.1}V{:.1}H{left:.1}Z",
            top + 1.0
        );
    }
    let _ = writeln!(
        out,
        "<path d=\"{fill}\" fill=\"#f1f1f1\" shape-rendering=\"crispEdges\"/>"
    );
    let mut lines: Vec<(f64, &Edge, bool)> = edges
        .iter()
        .filter_map(|e| {
            let outline = e.kind != EdgeKind::Smooth
                || view.faces(&e.normals[0]) != view.faces(&e.normals[1]);
            if !outline && !all {
                return None;
            }
            let [p, q] = e.ends.map(|p| view.see(&p));
            let long = (p[0] - q[0]).hypot(p[1] - q[1]);
            (long > 0.2).then_some((long, e, outline))
        })
        .collect();
    let thinned = lines.len() > MOST_LINES;
    if thinned {
        lines.sort_by(|a, b| b.0.total_cmp(&a.0));
        lines.truncate(MOST_LINES);
    }
    let [mut faint, mut hidden, mut seen] = [const { String::new() }; 3];
    for (_, e, outline) in lines {
        for (path, shown) in pieces(view, &e.ends) {
            match (outline, shown) {
                (true, true) => seen.push_str(&path),
                (true, false) => hidden.push_str(&path),
                (false, true) => faint.push_str(&path),
                (false, false) => {}
            }
        }
    }
    for (d, style) in [
        (faint, "stroke=\"#d0d0d0\" stroke-width=\"0.5\""),
        (
            hidden,
            "stroke=\"#bdbdbd\" stroke-width=\"0.7\" stroke-dasharray=\"3 2\"",
        ),
        (
            seen,
            "stroke=\"#333\" stroke-width=\"1\" stroke-linecap=\"round\"",
        ),
    ] {
        let _ = writeln!(out, "<path d=\"{d}\" fill=\"none\" {style}/>");
    }
    thinned
}

/// An edge as path pieces that are seen and that are not.
fn pieces(view: &View, ends: &[[f64; 3]; 2]) -> Vec<(String, bool)> {
    let [p, q] = ends.map(|p| view.see(&p));
    let n = ((p[0] - q[0]).hypot(p[1] - q[1]) / 3.0)
        .ceil()
        .clamp(1.0, 400.0) as usize;
    let at = |s: f64| [0, 1, 2].map(|k| p[k] + s * (q[k] - p[k]));
    let shown: Vec<bool> = (0..n)
        .map(|i| view.shows(&at((i as f64 + 0.5) / n as f64)))
        .collect();
    let mut out = Vec::new();
    let mut from = 0;
    for part in shown.chunk_by(|a, b| a == b) {
        let (a, b) = (
            at(from as f64 / n as f64),
            at((from + part.len()) as f64 / n as f64),
        );
        out.push((
            format!("M{:.1} {:.1}L{:.1} {:.1}", a[0], a[1], b[0], b[1]),
            part[0],
        ));
        from += part.len();
    }
    out
}

fn legend(out: &mut String, file: &CheckedFile, list: &[Numbered<'_>], thinned: bool) {
    let x = WIDTH - 400.0;
    let mut y = 34.0;
    let mut line = |out: &mut String, text: &str, style: &str| {
        let _ = writeln!(
            out,
            "<text x=\"{x}\" y=\"{y}\" {style}>{}</text>",
            escaped(text)
        );
        y += 18.0;
    };
    let name = Path::new(&file.path)
        .file_name()
        .map_or(file.path.clone(), |n| n.to_string_lossy().into_owned());
    line(
        out,
        &short(&name, 44),
        "font-weight=\"bold\" font-size=\"15\"",
    );
    let unit = unit_of(file.unit);
    if let Some(b) = &file.bounds_m {
        let size = format!("{} {} (x × y × z)", box_size(b, unit), unit.symbol());
        line(out, &size, "");
    }
    let verdict = match (file.sound, list.is_empty()) {
        (Some(true), true) => "sound: nothing to mark",
        (Some(true), false) => "sound, with notes",
        _ => "NOT SOUND",
    };
    line(out, verdict, "font-weight=\"bold\"");
    const ROWS: usize = 14;
    for n in list.iter().take(ROWS) {
        let f = n.finding;
        let word = match f.severity {
            Severity::Blocks => "blocks",
            Severity::Doubts => "doubts",
            Severity::Notes => "notes",
        };
        let on = n.body.map_or(String::new(), |b| format!(" on {b}"));
        let text = format!(
            "{}. {} {}{on} ({word})",
            n.number,
            f.count,
            kind_word(f.kind, f.count)
        );
        line(out, &short(&text, 54), "");
        if let Some(p) = f.places.first() {
            let at = super::words::point(&p.at_m, unit);
            let rim = p.length_m.map_or(String::new(), |l| {
                format!(
                    ", {} {} round",
                    significant(length_in(l, unit), 4),
                    unit.symbol()
                )
            });
            let more = if f.count > 1 { " and others" } else { "" };
            line(
                out,
                &format!("    at {at}{rim}{more}"),
                "fill=\"#444\" xml:space=\"preserve\"",
            );
        }
    }
    if list.len() > ROWS {
        line(
            out,
            &format!("… {} more in the list", list.len() - ROWS),
            "",
        );
    }
    line(
        out,
        "thick: open rims and facets in question; dashed: hidden",
        "fill=\"#444\" font-size=\"11\"",
    );
    if thinned {
        line(
            out,
            "short edges are left out",
            "fill=\"#444\" font-size=\"11\"",
        );
    }
}

fn short(text: &str, most: usize) -> String {
    if text.chars().count() <= most {
        return text.to_owned();
    }
    text.chars().take(most - 1).chain(['…']).collect()
}

/// Text that stays text in XML; control characters, which XML cannot hold, are shown as such.
fn escaped(text: &str) -> String {
    crate::text::shown(text)
        .replace('&', "&amp;")
        .replace('<', "&lt;")
        .replace('>', "&gt;")
        .replace('"', "&quot;")
}
