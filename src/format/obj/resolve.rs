//! Second pass over an OBJ: indices, names and polygons, with the whole file known.

use std::ops::Range;

use rayon::prelude::*;

use super::scan::{self, Naming, Piece, UNKNOWN_KEPT};
use super::triangulate::{Scratch, triangulate_into};
use super::warp;
use crate::error::{Error, Kind, Result};
use crate::format::chunk::{self, Interner};
use crate::format::number::{Written, token_at};
use crate::mesh::{ReaderNote, Run, Soup, Triangles};

/// Joins the pieces of `text` into one soup.
pub(super) fn resolve(
    text: &[u8],
    ending: u8,
    ranges: &[Range<usize>],
    mut parts: Vec<Piece<'_>>,
) -> Result<Soup> {
    let mut notes = Vec::new();
    passed_over(text, &parts, &mut notes);
    let triangles: usize = parts.iter().map(|p| p.triangles).sum();
    let (names, materials, runs) = names(&parts);
    let vertex_lists: Vec<_> = parts
        .iter_mut()
        .map(|p| std::mem::take(&mut p.vertices))
        .collect();
    let mut before = 0usize;
    let bases: Vec<usize> = vertex_lists
        .iter()
        .map(|list| {
            let base = before;
            before += list.len();
            base
        })
        .collect();
    if before >= u32::MAX as usize {
        return Err(Error::new(
            Kind::TooLarge,
            format!(
                "the file has {before} vertices; at most {} are read",
                u32::MAX - 1
            ),
            "split the file",
        ));
    }
    if triangles == 0 {
        return Err(Error::new(
            Kind::Empty,
            format!("the file holds no face of three or more corners ({before} vertices)"),
            "export the mesh again with its faces; points, lines and curves enclose nothing",
        ));
    }
    let vertices = chunk::join(vertex_lists, [0.0; 3]);

    // The first index that is out of range, in file order.
    let bad = parts
        .par_iter_mut()
        .zip(&bases)
        .map(|(part, &base)| localise(part, base, before));
    let bad: Vec<Option<usize>> = bad.collect();
    if let Some((piece, corner)) = bad.iter().enumerate().find_map(|(i, b)| Some((i, (*b)?))) {
        return Err(bad_index(
            text,
            ranges[piece].clone(),
            ending,
            corner,
            before,
            bases[piece],
        ));
    }

    let mut written = Written::default();
    parts.iter().for_each(|p| written.merge(p.written));
    let mut corners = vec![[0u32; 3]; triangles];
    let mut jobs = Vec::with_capacity(parts.len());
    let mut rest = corners.as_mut_slice();
    let mut first = 0;
    for (part, range) in parts.into_iter().zip(ranges) {
        let (slice, tail) = rest.split_at_mut(part.triangles);
        rest = tail;
        let here = first;
        first += part.triangles;
        jobs.push((part, slice, here, range.start));
    }
    let warped: Vec<warp::Gathered> = jobs
        .into_par_iter()
        .map(|(part, out, first, start)| cut(&part, out, first, start, &vertices, written))
        .collect();
    let warped = warp::gather(Some(text), warped);

    Ok(Soup {
        triangles: Triangles::Indexed { vertices, corners },
        names,
        materials,
        runs,
        unit: None,
        warped,
        notes,
    })
}

/// Makes all indices of a piece absolute; returns the first corner whose index is out of range.
fn localise(part: &mut Piece, base: usize, total: usize) -> Option<usize> {
    for &at in &part.relative {
        let corner = &mut part.corners[at as usize];
        let absolute = base as i64 + i64::from(*corner as i32);
        *corner = u32::try_from(absolute).unwrap_or(u32::MAX);
    }
    let total = total as u32;
    if part.corners.iter().fold(0, |m, &c| m.max(c)) < total {
        return None;
    }
    part.corners.iter().position(|&c| c >= total)
}

/// Scans the piece again, to say where the bad corner is and what stands there.
fn bad_index(
    text: &[u8],
    range: Range<usize>,
    ending: u8,
    corner: usize,
    total: usize,
    base: usize,
) -> Error {
    let at = match scan::scan(text, range.clone(), ending, corner) {
        Ok(found) => (
            found.found.unwrap_or(range.start),
            base + found.piece.vertices.len(),
        ),
        Err(fault) => (fault.at, base),
    };
    let (at, so_far) = at;
    let token = token_at(text, at);
    let index = token.split('/').next().unwrap_or_default().to_string();
    let message = if index.starts_with('-') {
        format!(
            "a face refers to vertex {index}, counted back from the {so_far} vertices before it \
             (the file has {total})"
        )
    } else if index.trim_start_matches('0').is_empty() {
        format!("a face refers to vertex {index}; vertices count from 1 to {total} here")
    } else {
        format!("a face refers to vertex {index}, but the file has {total} vertices")
    };
    Error::new(
        Kind::BadIndex,
        message,
        "export or copy the file again; vertices are missing or the index is wrong",
    )
    .at_line(chunk::line_of(text, at))
}

/// Writes the triangles of a piece to `out` and measures its polygons.
fn cut(
    part: &Piece,
    out: &mut [[u32; 3]],
    first: usize,
    start: usize,
    vertices: &[[f64; 3]],
    written: Written,
) -> warp::Gathered {
    let mut gathered = warp::Gathered::default();
    let mut scratch = Scratch::default();
    let mut points = Vec::new();
    let mut done = 0;
    let mut corner = 0;
    let plain = |from: usize, to: usize, out: &mut [[u32; 3]], done: &mut usize| {
        let (triples, _) = part.corners[from..to].as_chunks::<3>();
        out[*done..*done + triples.len()].copy_from_slice(triples);
        *done += triples.len();
    };
    for polygon in &part.polygons {
        let (begin, size) = (polygon.first as usize, polygon.size as usize);
        plain(corner, begin, out, &mut done);
        let indices = &part.corners[begin..begin + size];
        points.clear();
        points.extend(indices.iter().map(|&i| vertices[i as usize]));
        let chosen = triangulate_into(&points, &mut scratch);
        for (to, t) in out[done..].iter_mut().zip(chosen) {
            *to = t.map(|k| indices[k as usize]);
        }
        if let Some(mut warp) = warp::measure(&points, chosen, written) {
            (warp.at, warp.first) = (start + polygon.at as usize, first + done);
            gathered.add(warp);
        }
        done += size - 2;
        corner = begin + size;
    }
    plain(corner, part.corners.len(), out, &mut done);
    gathered
}

/// Follows the names through the file.
fn names(parts: &[Piece]) -> (Vec<Option<String>>, Vec<String>, Vec<Run>) {
    let mut names = Interner::<Option<String>>::default();
    let mut materials = Interner::<String>::default();
    let mut runs = Vec::new();
    let mut object: Option<Option<String>> = None;
    let mut group: Option<String> = None;
    let mut material: Option<String> = None;
    for part in parts {
        let mut done = 0;
        let ends = part.names.iter().map(|n| (n.triangle, Some(n)));
        for (to, event) in ends.chain([(part.triangles, None)]) {
            if to > done {
                let name = match &object {
                    Some(name) => name,
                    None if group.is_some() => &group,
                    None => &material,
                };
                let name = names.number(name);
                let material = material.as_ref().map(|m| materials.number(m));
                chunk::extend_runs(&mut runs, to - done, name, material);
                done = to;
            }
            if let Some(event) = event {
                let text = chunk::name_of(&event.text);
                match event.naming {
                    Naming::Object => object = Some(text),
                    Naming::Group => group = text,
                    Naming::Material => material = text,
                }
            }
        }
    }
    (names.list, materials.list, runs)
}

/// Says what was passed over, once for each sort.
fn passed_over(text: &[u8], parts: &[Piece], notes: &mut Vec<ReaderNote>) {
    let total = |of: fn(&Piece) -> Option<(usize, usize)>| {
        let mut all = parts.iter().filter_map(of);
        let first = all.next()?;
        Some((
            all.fold(first.0, |n, (m, _)| n + m),
            chunk::line_of(text, first.1),
        ))
    };
    if let Some((count, line)) = total(|p| p.passed_over.faces) {
        notes.push(ReaderNote {
            kind: "faces-ignored",
            message: format!("{count} faces of fewer than three corners were ignored"),
            line: Some(line),
            advice: "they have no area; check the export if faces are missing",
        });
    }
    if let Some((count, line)) = total(|p| p.passed_over.curves) {
        notes.push(ReaderNote {
            kind: "curves-ignored",
            message: format!("{count} statements of curves or free-form surfaces were ignored"),
            line: Some(line),
            advice: "export the mesh again as polygons; these surfaces are not in the figures",
        });
    }
    let mut unknown: Vec<&(String, usize)> = Vec::new();
    for word in parts.iter().flat_map(|p| &p.passed_over.unknown) {
        if unknown.len() < UNKNOWN_KEPT && unknown.iter().all(|u| u.0 != word.0) {
            unknown.push(word);
        }
    }
    if let Some(first) = unknown.first() {
        let words: Vec<String> = unknown.iter().map(|u| format!("\"{}\"", u.0)).collect();
        notes.push(ReaderNote {
            kind: "keywords-unknown",
            message: format!(
                "statements that OBJ does not have were ignored: {}",
                words.join(", ")
            ),
            line: Some(chunk::line_of(text, first.1)),
            advice: "check that the file is an OBJ and that nothing of the mesh is in them",
        });
    }
}
