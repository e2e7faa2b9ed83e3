//! What a finding looks like on the picture: rims, hatched facets, shells, and numbers.

use std::collections::HashSet;
use std::fmt::Write as _;

use super::edges::{Edge, EdgeKind};
use super::view::View;
use super::{Numbered, pieces};
use crate::geometry::Corners;
use crate::mesh::{Body, Loop, Mesh, Shell, each};
use crate::soundness::FindingKind;

/// Most numbers that one finding gets in a view.
const MOST_NUMBERS: usize = 8;
/// Least distance between numbers.
const APART: f64 = 24.0;

/// Marks all findings in a view.
pub(super) fn draw(
    out: &mut String,
    view: &View,
    mesh: &Mesh,
    edges: &[Edge],
    list: &[Numbered<'_>],
) {
    let mut labels: Vec<(usize, [f64; 3])> = Vec::new();
    for n in list {
        let body = mesh.bodies().iter().find(|b| Some(b.id.as_str()) == n.body);
        let targets = match (n.finding.kind, body) {
            (FindingKind::Hole, Some(body)) => holes(out, view, mesh, body, n),
            (FindingKind::InsideOut | FindingKind::NestedSolid, _) => {
                shells(out, view, mesh, edges, n)
            }
            (FindingKind::WindingConflict | FindingKind::NonManifoldEdge, _) => {
                shared_edges(out, view, mesh, n)
            }
            _ => facets(out, view, mesh, n),
        };
        // Places that lie close together share a number.
        let mut apart: Vec<[f64; 3]> = Vec::new();
        for p in targets {
            if apart
                .iter()
                .all(|q| (p[0] - q[0]).hypot(p[1] - q[1]) > 2.0 * APART)
            {
                apart.push(p);
            }
        }
        let targets = apart;
        labels.extend(
            targets
                .into_iter()
                .take(MOST_NUMBERS)
                .map(|p| (n.number, p)),
        );
    }
    numbers(out, view, labels);
}

/// The loops that the finding lists: others are cracks or T-junctions.
fn holes(
    out: &mut String,
    view: &View,
    mesh: &Mesh,
    body: &Body,
    n: &Numbered<'_>,
) -> Vec<[f64; 3]> {
    let mut targets = Vec::new();
    let listed: HashSet<&[u32]> = n
        .finding
        .places
        .iter()
        .map(|p| p.triangles.as_slice())
        .collect();
    // A place names its loop by the loop's first triangles.
    let is_listed = |l: &&Loop| listed.contains(&l.triangles[..l.triangles.len().min(64)]);
    for l in shells_of(mesh, body)
        .flat_map(|s| &s.loops)
        .filter(|l| !l.conflict)
        .filter(is_listed)
    {
        let points: Vec<[f64; 3]> = l
            .vertices
            .iter()
            .map(|&v| mesh.soup.triangles.vertex(v))
            .collect();
        let ring: Vec<[[f64; 3]; 2]> = (0..points.len())
            .map(|i| [points[i], points[(i + 1) % points.len()]])
            .collect();
        strokes(out, view, &ring);
        // The middle of the edge that is best seen.
        let middles: Vec<[f64; 3]> = ring
            .iter()
            .map(|[p, q]| view.see(&[0, 1, 2].map(|k| (p[k] + q[k]) / 2.0)))
            .collect();
        let best = middles.iter().find(|p| view.shows(p)).or(middles.first());
        targets.extend(best);
    }
    targets
}

fn shells_of<'a>(mesh: &'a Mesh, body: &'a Body) -> impl Iterator<Item = &'a Shell> {
    body.roles().iter().map(|r| &mesh.found().shells[r.shell])
}

/// Thick lines: solid where they are seen, dashed where they are not.
fn strokes(out: &mut String, view: &View, edges: &[[[f64; 3]; 2]]) {
    let (mut seen, mut hidden) = (String::new(), String::new());
    for ends in edges {
        for (path, shown) in pieces(view, ends) {
            if shown { &mut seen } else { &mut hidden }.push_str(&path);
        }
    }
    for (d, style) in [
        (
            &hidden,
            "stroke=\"#000\" stroke-width=\"2\" stroke-dasharray=\"4 3\"",
        ),
        (
            &seen,
            "stroke=\"#fff\" stroke-width=\"6\" stroke-linecap=\"round\"",
        ),
        (
            &seen,
            "stroke=\"#000\" stroke-width=\"3.4\" stroke-linecap=\"round\"",
        ),
    ] {
        if !d.is_empty() {
            let _ = writeln!(out, "<path d=\"{d}\" fill=\"none\" {style}/>");
        }
    }
}

/// A whole shell: its creases and outline, thick.
fn shells(
    out: &mut String,
    view: &View,
    mesh: &Mesh,
    edges: &[Edge],
    n: &Numbered<'_>,
) -> Vec<[f64; 3]> {
    let mut targets = Vec::new();
    for place in &n.finding.places {
        let Some(shell) = mesh
            .found()
            .shells
            .iter()
            .find(|s| place.triangles.contains(&s.first))
        else {
            continue;
        };
        let select = shell.members.select();
        let members: HashSet<u32> = (0..select.len(mesh.soup.triangles.count()))
            .map(|i| select.get(i) as u32)
            .collect();
        let lines: Vec<[[f64; 3]; 2]> = edges
            .iter()
            .filter(|e| {
                members.contains(&e.triangle)
                    && (e.kind != EdgeKind::Smooth
                        || view.faces(&e.normals[0]) != view.faces(&e.normals[1]))
            })
            .map(|e| e.ends)
            .collect();
        strokes(out, view, &lines);
        let nearest = lines
            .iter()
            .map(|l| view.see(&l[0]))
            .max_by(|a, b| a[0].total_cmp(&b[0]));
        targets.extend(nearest);
    }
    targets
}

/// The edges that all facets of a place have in common.
fn shared_edges(out: &mut String, view: &View, mesh: &Mesh, n: &Numbered<'_>) -> Vec<[f64; 3]> {
    let corners = &mesh.found().corners;
    let mut edges = Vec::new();
    for place in &n.finding.places {
        let Some((&first, rest)) = place.triangles.split_first() else {
            continue;
        };
        let shared: Vec<[f64; 3]> = corners[first as usize]
            .into_iter()
            .filter(|v| rest.iter().all(|&t| corners[t as usize].contains(v)))
            .map(|v| mesh.soup.triangles.vertex(v))
            .collect();
        if let [p, q] = shared[..] {
            edges.push([p, q]);
        }
    }
    strokes(out, view, &edges);
    edges
        .iter()
        .map(|[p, q]| view.see(&[0, 1, 2].map(|k| (p[k] + q[k]) / 2.0)))
        .collect()
}

fn facets(out: &mut String, view: &View, mesh: &Mesh, n: &Numbered<'_>) -> Vec<[f64; 3]> {
    let mut targets = Vec::new();
    let (mut seen, mut hidden) = (String::new(), String::new());
    for place in &n.finding.places {
        let mut best: Option<[f64; 3]> = None;
        for &t in &place.triangles {
            let corners = each!(&mesh.soup.triangles, f => f.triangle(t as usize));
            let p = corners.map(|p| view.see(&p));
            let middle = [0, 1, 2].map(|k| (p[0][k] + p[1][k] + p[2][k]) / 3.0);
            let shown = view.shows(&middle);
            let path = format!(
                "M{:.1} {:.1}L{:.1} {:.1}L{:.1} {:.1}Z",
                p[0][0], p[0][1], p[1][0], p[1][1], p[2][0], p[2][1]
            );
            if shown { &mut seen } else { &mut hidden }.push_str(&path);
            if shown || best.is_none() {
                best = Some(middle);
            }
        }
        targets.extend(best);
    }
    let _ = writeln!(
        out,
        "<path d=\"{hidden}\" fill=\"none\" stroke=\"#000\" stroke-width=\"1.2\" stroke-dasharray=\"4 3\"/>\n\
         <path d=\"{seen}\" fill=\"url(#hatch)\" stroke=\"#000\" stroke-width=\"1.6\" stroke-linejoin=\"round\"/>"
    );
    targets
}

/// Numbers in a column on either side, each with a line to what it means.
fn numbers(out: &mut String, view: &View, labels: Vec<(usize, [f64; 3])>) {
    let (left, right): (Vec<_>, Vec<_>) =
        labels.into_iter().partition(|(_, p)| p[0] < view.centre[0]);
    for (side, mut column) in [(-1.0, left), (1.0, right)] {
        column.sort_by(|a, b| a.1[1].total_cmp(&b.1[1]).then(a.0.cmp(&b.0)));
        let top = view.centre[1] - view.half[1] - 20.0;
        let bottom = view.centre[1] + view.half[1] + 20.0;
        let mut ys: Vec<f64> = column
            .iter()
            // Aslant, so that no line runs along a level edge.
            .map(|c| (c.1[1] - 14.0).clamp(top, bottom))
            .collect();
        // Pushed apart downwards, then back up from the bottom.
        for i in 1..ys.len() {
            ys[i] = ys[i].max(ys[i - 1] + APART);
        }
        let mut limit = bottom;
        for y in ys.iter_mut().rev() {
            *y = y.min(limit);
            limit = *y - APART;
        }
        let x = view.centre[0] + side * (view.half[0] + 42.0);
        for ((number, p), y) in column.iter().zip(ys) {
            let dash = if view.shows(p) {
                ""
            } else {
                " stroke-dasharray=\"4 3\""
            };
            let (px, py) = (p[0], p[1]);
            let _ = writeln!(
                out,
                "<line x1=\"{x:.1}\" y1=\"{y:.1}\" x2=\"{px:.1}\" y2=\"{py:.1}\" stroke=\"#fff\" stroke-width=\"2.6\"/>\n\
                 <line x1=\"{x:.1}\" y1=\"{y:.1}\" x2=\"{px:.1}\" y2=\"{py:.1}\" stroke=\"#000\" stroke-width=\"1.1\"{dash}/>\n\
                 <circle cx=\"{px:.1}\" cy=\"{py:.1}\" r=\"3.2\" fill=\"#000\" stroke=\"#fff\"/>\n\
                 <circle cx=\"{x:.1}\" cy=\"{y:.1}\" r=\"11\" fill=\"#000\"/>\n\
                 <text x=\"{x:.1}\" y=\"{:.1}\" text-anchor=\"middle\" fill=\"#fff\" font-weight=\"bold\">{number}</text>",
                y + 4.5
            );
        }
    }
}
