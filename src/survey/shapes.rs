//! Bodies of a table that are the same shape, in groups.

use std::collections::HashMap;
use std::path::{Path, PathBuf};

use super::shape::{Likeness, Shape};
use super::{Options, Row, weigh};
use crate::format::Bytes;

/// What grouping came to.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Grouped {
    /// Groups of two bodies and more.
    pub groups: u64,
    /// Bodies in them.
    pub bodies: u64,
    /// Pairs that were given up (see [`Likeness::Undecided`]).
    pub undecided: u64,
}

/// Volumes that differ by more, as a part of them, are not looked at. [`Shape::compare`] draws the
/// line.
const NEAR: f64 = 1e-3;

/// Fills the columns `same_shape` and `mirrored`. Bodies of nearly the same volume and vertices
/// that can be read again are compared; equal bodies of equal files need no looking at. `paths` are
/// the files by what their rows call them.
pub(super) fn group(
    rows: &mut [Row],
    paths: &HashMap<String, PathBuf>,
    options: &Options,
) -> Grouped {
    let mut order: Vec<(f64, usize)> = Vec::new();
    for (i, row) in rows.iter_mut().enumerate() {
        (row.same_shape, row.mirrored) = (None, None);
        if let (Some(v), Some(_)) = (row.volume_m3.filter(|v| *v > 0.0), &row.body) {
            order.push((v, i));
        }
    }
    order.sort_by(|a, b| a.0.total_cmp(&b.0).then(a.1.cmp(&b.1)));
    let mut out = Grouped::default();
    let mut cache = Cache {
        paths,
        options,
        shapes: HashMap::new(),
        held: 0,
    };
    // Stretches in which each volume is near to the next.
    let mut begin = 0;
    while begin < order.len() {
        let near = |i: usize| order[i].0 - order[i - 1].0 <= NEAR * order[i].0;
        let end = (begin + 1..order.len())
            .find(|&i| !near(i))
            .unwrap_or(order.len());
        let mut members: Vec<usize> = order[begin..end].iter().map(|o| o.1).collect();
        members.sort_unstable();
        if members.len() > 1 {
            of_stretch(rows, &members, &mut cache, &mut out);
        }
        begin = end;
    }
    out
}

fn of_stretch(rows: &mut [Row], members: &[usize], cache: &mut Cache<'_>, out: &mut Grouped) {
    // The first of each shape, with its followers.
    let mut shapes: Vec<(usize, Vec<(usize, bool)>)> = Vec::new();
    // The same body of equal files; the id of a nameless one follows the file's name.
    let copy = |a: &Row, b: &Row| {
        let one = a.bodies == Some(1) || a.path != b.path && a.body == b.body;
        one && a.sha256.is_some() && a.sha256 == b.sha256
    };
    'each: for &i in members {
        for (first, followers) in &mut shapes {
            let (a, b) = (&rows[*first], &rows[i]);
            let (Some(u), Some(v)) = (a.volume_m3, b.volume_m3) else {
                continue;
            };
            if (u - v).abs() > NEAR * u {
                continue;
            }
            let likeness = if copy(a, b) {
                Likeness::Same { mirrored: false }
            } else {
                cache.compare(a, b)
            };
            match likeness {
                Likeness::Same { mirrored } => {
                    followers.push((i, mirrored));
                    continue 'each;
                }
                Likeness::Undecided => out.undecided += 1,
                Likeness::Different => {}
            }
        }
        shapes.push((i, Vec::new()));
    }
    for (first, followers) in shapes.into_iter().filter(|s| !s.1.is_empty()) {
        let name = rows[first].place();
        out.groups += 1;
        out.bodies += 1 + followers.len() as u64;
        for (i, mirrored) in followers.into_iter().chain([(first, false)]) {
            rows[i].same_shape = Some(name.clone());
            rows[i].mirrored = Some(mirrored);
        }
    }
}

/// Shapes that were read again, as long as there is room.
struct Cache<'a> {
    paths: &'a HashMap<String, PathBuf>,
    options: &'a Options,
    /// By path, then by body.
    shapes: HashMap<String, HashMap<String, Shape>>,
    held: u64,
}

impl Cache<'_> {
    fn compare(&mut self, a: &Row, b: &Row) -> Likeness {
        self.load(a, b);
        self.load(b, a);
        match (self.get(a), self.get(b)) {
            (Some(a), Some(b)) => a.compare(b),
            // A file that has gone since: nothing is confirmed.
            _ => Likeness::Undecided,
        }
    }

    fn get(&self, row: &Row) -> Option<&Shape> {
        self.shapes.get(row.path.as_ref()?)?.get(row.body.as_ref()?)
    }

    fn load(&mut self, row: &Row, keep: &Row) {
        let Some(name) = &row.path else { return };
        if self.shapes.contains_key(name) {
            return;
        }
        if self.held > self.options.memory / 4 {
            self.shapes
                .retain(|path, _| Some(path) == keep.path.as_ref());
            self.held = self
                .shapes
                .values()
                .flat_map(HashMap::values)
                .map(Shape::bytes)
                .sum();
        }
        let shapes = self.paths.get(name).map(|path| self.read(path, row));
        let shapes = shapes.unwrap_or_default();
        self.held += shapes.values().map(Shape::bytes).sum::<u64>();
        self.shapes.insert(name.clone(), shapes);
    }

    /// The shapes of all bodies of a file that has not changed since.
    fn read(&self, path: &Path, row: &Row) -> HashMap<String, Shape> {
        let Ok(bytes) = Bytes::open(path) else {
            return HashMap::new();
        };
        if row.sha256.as_deref() != Some(&weigh::digest(&bytes)) {
            return HashMap::new();
        }
        let Ok((mesh, metres, _)) = weigh::mesh(bytes, path, self.options) else {
            return HashMap::new();
        };
        let scaled = |t: [[f64; 3]; 3]| t.map(|p| p.map(|x| x * metres));
        mesh.bodies()
            .iter()
            .filter_map(|body| {
                let facets = mesh.outward_facets(body).into_iter().map(scaled);
                let shape = Shape::of(&facets.collect::<Vec<_>>())?;
                Some((body.id.clone(), shape))
            })
            .collect()
    }
}
