//! From the entries of a file to every single thing that stands in the assembly: paths and
//! placements, before any mesh is read.

use std::collections::HashMap;
use std::rc::Rc;

use nalgebra::{Matrix3, Vector3};

use super::file::{AssemblyFile, Entry, Item, Part, Position, Turn};
use super::service::Tank;
use crate::error::{Error, Kind};
use crate::moments::Placement;

/// The most things in one assembly, repeats counted.
const MOST: u64 = 100_000;

/// One thing that stands in the assembly.
#[derive(Clone, Debug)]
pub(super) struct Instance<'f> {
    /// Such as `boom/nozzle#2`.
    pub(super) path: String,
    /// The same without the marks of repeats: `boom/nozzle`.
    pub(super) entry_path: String,
    /// Paths of the groups that it stands in, outermost first.
    pub(super) groups: Rc<[String]>,
    /// The files whose rules apply to it, innermost last.
    pub(super) scopes: Rc<[Scope<'f>]>,
    /// From its own frame to the assembly's.
    pub(super) placement: Placement,
    /// What its placement is made of, outermost first; the last is its own.
    pub(super) levels: Rc<[Level<'f>]>,
    pub(super) what: What<'f>,
}

/// One entry's own placement within a thing's: a group's, or that of the thing itself.
#[derive(Clone, Debug)]
pub(super) struct Level<'f> {
    pub(super) position: &'f Position,
    /// Which of its repeats.
    pub(super) nth: usize,
    /// From the frame that the position is stated in to the assembly's.
    pub(super) outer: Placement,
    /// Path of the entry, without and with the marks of repeats.
    pub(super) entry_path: Rc<str>,
    pub(super) path: Rc<str>,
}

/// A part, an item or a tank.
#[derive(Clone, Copy, Debug)]
pub(super) enum What<'f> {
    Part(&'f Part),
    Item(&'f Item),
    Tank(&'f Tank),
}

/// A file, and where the paths that are its own begin within a path of the assembly.
#[derive(Clone, Copy, Debug)]
pub(super) struct Scope<'f> {
    pub(super) file: &'f AssemblyFile,
    pub(super) path_from: usize,
    pub(super) entry_path_from: usize,
}

impl<'f> Instance<'f> {
    /// The file that it is written in.
    pub(super) fn file(&self) -> Option<&'f AssemblyFile> {
        self.scopes.last().map(|s| s.file)
    }

    /// Its line in that file.
    pub(super) fn line(&self) -> u64 {
        match self.what {
            What::Part(p) => p.line,
            What::Item(i) => i.line,
            What::Tank(t) => t.line,
        }
    }

    /// An error about it, with its file and line.
    pub(super) fn error(&self, kind: Kind, message: String, advice: impl Into<String>) -> Error {
        let error = Error::new(kind, message, advice).at_line(self.line());
        match self.file() {
            Some(file) => error.in_file(&file.path),
            None => error,
        }
    }
}

impl Position {
    /// Where each repeat stands in its group: mirror, then turn, then move.
    pub fn placements(&self) -> impl Iterator<Item = Placement> + '_ {
        let turn = self
            .turn
            .as_ref()
            .map_or_else(Matrix3::identity, Turn::matrix);
        let turn = match &self.mirror {
            // Householder's reflection in the plane through the origin with unit normal n.
            Some(n) => turn * (Matrix3::identity() - 2.0 * n * n.transpose()),
            None => turn,
        };
        self.at.iter().map(move |at| Placement {
            turn,
            at: Vector3::from(at.map(|q| q.value)),
        })
    }
}

impl Turn {
    /// The rotation matrix (Rodrigues). Multiples of a right angle have exact sines and cosines,
    /// so that a part turned by "90 deg" about an axis keeps its digits.
    pub fn matrix(&self) -> Matrix3<f64> {
        let quarter = std::f64::consts::FRAC_PI_2;
        let angle = self.angle.value;
        let turns = (angle / quarter).round();
        // A few units in the last place: the typed angle was rounded once on its way to radians.
        let (sin, cos) = if (angle - turns * quarter).abs() <= 4.0 * f64::EPSILON * angle.abs() {
            match turns.rem_euclid(4.0) as u8 {
                0 => (0.0, 1.0),
                1 => (1.0, 0.0),
                2 => (0.0, -1.0),
                _ => (-1.0, 0.0),
            }
        } else {
            angle.sin_cos()
        };
        let k = self.axis;
        Matrix3::identity() * cos + k.cross_matrix() * sin + k * k.transpose() * (1.0 - cos)
    }
}

/// What is wrong with the assembly as a whole: nothing in it, too much, or two of one path.
pub(super) fn faults(file: &AssemblyFile) -> Vec<Error> {
    match count(&file.entries) {
        0 => {
            return vec![
                Error::new(
                    Kind::Empty,
                    "there is nothing in this assembly",
                    "add a [[part]], an [[item]] or a [[group]] of them",
                )
                .in_file(&file.path),
            ];
        }
        n if n > MOST => {
            return vec![
                Error::new(
                    Kind::TooLarge,
                    format!("this assembly repeats its entries to more than {MOST} things"),
                    "weigh a repeated group by itself, and give it as one item",
                )
                .in_file(&file.path),
            ];
        }
        _ => {}
    }
    let mut errors = Vec::new();
    let mut seen = HashMap::new();
    let instances = expand(file);
    for instance in &instances {
        if let Some(line) = seen.insert(instance.path.as_str(), instance.line()) {
            errors.push(instance.error(
                Kind::AmbiguousName,
                format!(
                    "the path `{}` is also that of the entry at line {line}",
                    instance.path
                ),
                "rename one of the two: `#2` marks repeats, and `/` separates groups",
            ));
        }
    }
    errors
}

fn count(entries: &[Entry]) -> u64 {
    entries.iter().fold(0_u64, |sum, entry| {
        let each = match entry {
            Entry::Part(_) | Entry::Item(_) | Entry::Tank(_) => 1,
            Entry::Group(g) => {
                let included = g.include.as_ref().map_or(0, |f| count(&f.entries));
                count(&g.entries).saturating_add(included)
            }
        };
        sum.saturating_add(each.saturating_mul(entry.position().at.len() as u64))
    })
}

/// An entry where it stands, groups included: what a case moves.
#[derive(Clone, Debug)]
pub(super) struct Node {
    pub(super) path: String,
    pub(super) entry_path: String,
    /// From the frame that `at` is in to the assembly's.
    pub(super) outer: Placement,
    pub(super) at: Vector3<f64>,
}

/// Every entry of the assembly, in file order, each group before what stands in it.
pub(super) fn nodes(file: &AssemblyFile) -> Vec<Node> {
    let mut out = Vec::new();
    name_nodes(&file.entries, &Placement::identity(), "", "", &mut out);
    out
}

fn name_nodes(
    entries: &[Entry],
    outer: &Placement,
    path: &str,
    entry_path: &str,
    out: &mut Vec<Node>,
) {
    for entry in entries {
        for (n, own) in entry.position().placements().enumerate() {
            let name = entry.name();
            let node = Node {
                path: match n {
                    0 => format!("{path}{name}"),
                    n => format!("{path}{name}#{}", n + 1),
                },
                entry_path: format!("{entry_path}{name}"),
                outer: *outer,
                at: own.at,
            };
            let (inner, inner_entry) = (format!("{}/", node.path), format!("{}/", node.entry_path));
            out.push(node);
            if let Entry::Group(group) = entry {
                let here = own.then(outer);
                name_nodes(&group.entries, &here, &inner, &inner_entry, out);
                if let Some(file) = &group.include {
                    name_nodes(&file.entries, &here, &inner, &inner_entry, out);
                }
            }
        }
    }
}

/// Every thing of the assembly, in file order.
pub(super) fn expand(file: &AssemblyFile) -> Vec<Instance<'_>> {
    let mut out = Vec::new();
    let place = Place {
        placement: Placement::identity(),
        path: String::new(),
        entry_path: String::new(),
        groups: Rc::new([]),
        scopes: Rc::new([Scope {
            file,
            path_from: 0,
            entry_path_from: 0,
        }]),
        levels: Rc::new([]),
    };
    walk(&file.entries, &place, &mut out);
    out
}

/// Where the walk is.
#[derive(Clone)]
struct Place<'f> {
    placement: Placement,
    /// With a `/` at its end, or empty.
    path: String,
    entry_path: String,
    groups: Rc<[String]>,
    scopes: Rc<[Scope<'f>]>,
    levels: Rc<[Level<'f>]>,
}

fn walk<'f>(entries: &'f [Entry], here: &Place<'f>, out: &mut Vec<Instance<'f>>) {
    for entry in entries {
        for (n, placement) in entry.position().placements().enumerate() {
            let name = entry.name();
            let path = match n {
                0 => format!("{}{name}", here.path),
                n => format!("{}{name}#{}", here.path, n + 1),
            };
            let entry_path = format!("{}{name}", here.entry_path);
            let placement = placement.then(&here.placement);
            let level = Level {
                position: entry.position(),
                nth: n,
                outer: here.placement,
                entry_path: entry_path.as_str().into(),
                path: path.as_str().into(),
            };
            let levels = here.levels.iter().cloned().chain([level]).collect();
            let what = match entry {
                Entry::Part(p) => What::Part(p),
                Entry::Item(i) => What::Item(i),
                Entry::Tank(t) => What::Tank(t),
                Entry::Group(group) => {
                    let groups = here.groups.iter().cloned().chain([path.clone()]).collect();
                    let mut inside = Place {
                        placement,
                        path: path + "/",
                        entry_path: entry_path + "/",
                        groups,
                        scopes: here.scopes.clone(),
                        levels,
                    };
                    walk(&group.entries, &inside, out);
                    if let Some(file) = &group.include {
                        let scope = Scope {
                            file,
                            path_from: inside.path.len(),
                            entry_path_from: inside.entry_path.len(),
                        };
                        inside.scopes = here.scopes.iter().copied().chain([scope]).collect();
                        walk(&file.entries, &inside, out);
                    }
                    continue;
                }
            };
            out.push(Instance {
                path,
                entry_path,
                groups: here.groups.clone(),
                scopes: here.scopes.clone(),
                placement,
                levels,
                what,
            });
        }
    }
}
