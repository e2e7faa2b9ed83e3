//! Names in cases, motions and phases, resolved against what stands in the assembly.

use std::collections::BTreeMap;

use nalgebra::Vector3;

use super::super::expand::{self, Instance, Node, What};
use super::super::file::AssemblyFile;
use super::super::{listed, reader};
use super::keys::{Fill, Phase};
use crate::error::{Error, Kind};

/// Numbers instead of names. Instances are counted in file order, tanks among themselves.
#[derive(Clone, Debug, Default)]
pub(super) struct Plan {
    /// By instance: the motions that move it, inner before outer.
    pub(super) motions_of: Vec<Vec<usize>>,
    /// By case, then without a case; by instance: its shift, or none where it is left out.
    pub(super) shifts: Vec<Vec<Option<Vector3<f64>>>>,
    /// By case: fills by tank.
    pub(super) fills: Vec<BTreeMap<usize, Fill>>,
    pub(super) phases: Vec<PlannedPhase>,
}

/// A phase with names resolved.
#[derive(Clone, Debug)]
pub(in crate::assembly) struct PlannedPhase {
    pub(in crate::assembly) name: String,
    /// Tanks in the order of draining; several at once where they were named together.
    pub(in crate::assembly) drain: Vec<Vec<usize>>,
    pub(in crate::assembly) to: Option<Fill>,
    pub(in crate::assembly) moves: Vec<usize>,
}

/// What is wrong with the names in cases, motions and phases.
pub(in crate::assembly) fn faults(file: &AssemblyFile) -> Vec<Error> {
    Plan::new(file, &expand::expand(file)).1
}

/// Whether `name` means the thing or a group that it stands in; marks of repeats may be left out.
fn covers(name: &str, path: &str, entry_path: &str) -> bool {
    [path, entry_path].iter().any(|p| {
        p.strip_prefix(name)
            .is_some_and(|rest| rest.is_empty() || rest.starts_with('/'))
    })
}

struct Names<'a, 'f> {
    file: &'a AssemblyFile,
    instances: &'a [Instance<'f>],
    nodes: Vec<Node>,
    errors: Vec<Error>,
}

impl Names<'_, '_> {
    fn fault(&mut self, line: u64, kind: Kind, message: String, advice: String) {
        let error = Error::new(kind, message, advice).at_line(line);
        self.errors.push(error.in_file(&self.file.path));
    }

    /// The instances that a name means; a fault where there is none.
    fn of(&mut self, name: &str, line: u64, what: &str) -> Vec<usize> {
        let found: Vec<usize> = (0..self.instances.len())
            .filter(|n| {
                let i = &self.instances[*n];
                covers(name, &i.path, &i.entry_path)
            })
            .collect();
        if found.is_empty() {
            let mut paths: Vec<&str> = self.nodes.iter().map(|n| n.path.as_str()).collect();
            paths.dedup();
            let advice = match reader::nearest(name, paths.iter().copied()) {
                Some(near) => format!("did you mean `{near}`?"),
                None => format!("there are {}", listed(&paths)),
            };
            let message = format!("{what} names `{name}`, and nothing is called so");
            self.fault(line, Kind::UnknownName, message, advice);
        }
        found
    }

    /// The tanks that a name means, as numbers of tanks.
    fn tanks(&mut self, name: &str, line: u64, what: &str) -> Vec<usize> {
        let found = self.of(name, line, what);
        let is_tank = |n: &usize| matches!(self.instances[*n].what, What::Tank(_));
        let number = |n: usize| (0..n).filter(is_tank).count();
        let tanks: Vec<usize> = found.iter().copied().filter(is_tank).map(number).collect();
        if tanks.is_empty() && !found.is_empty() {
            let names: Vec<String> = (0..self.instances.len())
                .filter(is_tank)
                .map(|n| self.instances[n].path.clone())
                .collect();
            let names: Vec<&str> = names.iter().map(String::as_str).collect();
            let advice = match names.is_empty() {
                true => "there is no [[tank]] in this assembly".to_owned(),
                false => format!("the tanks are {}", listed(&names)),
            };
            let message = format!("{what} fills or drains `{name}`, which is no tank");
            self.fault(line, Kind::UnknownName, message, advice);
        }
        tanks
    }
}

impl Plan {
    /// The plan, and what is wrong with it; where anything is, it is of no use.
    pub(super) fn new(file: &AssemblyFile, instances: &[Instance<'_>]) -> (Self, Vec<Error>) {
        let keys = &file.service;
        let mut names = Names {
            file,
            instances,
            nodes: if keys.cases.is_empty() && keys.motions.is_empty() && keys.phases.is_empty() {
                Vec::new()
            } else {
                expand::nodes(file)
            },
            errors: Vec::new(),
        };
        let mut plan = Self {
            motions_of: vec![Vec::new(); instances.len()],
            ..Self::default()
        };
        // The longer path is the inner one: it moves first, in the file's own placement.
        let mut order: Vec<usize> = (0..keys.motions.len()).collect();
        order.sort_by_key(|n| std::cmp::Reverse(keys.motions[*n].of.split('/').count()));
        for n in order {
            let motion = &keys.motions[n];
            for i in names.of(
                &motion.of,
                motion.line,
                &format!("motion `{}`", motion.name),
            ) {
                plan.motions_of[i].push(n);
            }
        }
        plan.cases(&mut names);
        for phase in &keys.phases {
            let planned = planned(phase, &mut names);
            plan.phases.push(planned);
        }
        (plan, names.errors)
    }

    fn cases(&mut self, names: &mut Names<'_, '_>) {
        let cases = &names.file.service.cases;
        let all = names.instances.len();
        // What some case brings with it stands in no other.
        let mut payload = vec![false; all];
        let mut with = Vec::with_capacity(cases.len());
        for case in cases {
            let what = format!("case `{}`", case.name);
            let mut brought = Vec::new();
            for name in &case.with {
                brought.extend(names.of(name, case.line, &what));
            }
            brought.iter().for_each(|n| payload[*n] = true);
            with.push(brought);
        }
        let stands = |n: usize| (!payload[n]).then(Vector3::zeros);
        for (case, brought) in cases.iter().zip(with) {
            let what = format!("case `{}`", case.name);
            let mut shifts: Vec<Option<Vector3<f64>>> = (0..all).map(stands).collect();
            brought
                .into_iter()
                .for_each(|n| shifts[n] = Some(Vector3::zeros()));
            for (name, at) in &case.at {
                self.shift(&mut shifts, names, case.line, name, at);
            }
            for name in &case.without {
                for n in names.of(name, case.line, &what) {
                    shifts[n] = None;
                }
            }
            let mut fills = BTreeMap::new();
            for (name, fill) in &case.fill {
                for tank in names.tanks(name, fill.line, &what) {
                    fills.insert(tank, *fill);
                }
            }
            self.shifts.push(shifts);
            self.fills.push(fills);
        }
        self.shifts.push((0..all).map(stands).collect());
    }

    fn shift(
        &self,
        shifts: &mut [Option<Vector3<f64>>],
        names: &mut Names<'_, '_>,
        line: u64,
        name: &str,
        at: &[f64; 3],
    ) {
        let exact = names.nodes.iter().filter(|n| n.path == name);
        let loose = names.nodes.iter().filter(|n| n.entry_path == name);
        let mut found: Vec<Node> = exact.cloned().collect();
        let repeats = loose.count();
        if found.is_empty() {
            let what = "`at` of a case".to_owned();
            if names.of(name, line, &what).is_empty() {
                return;
            }
        }
        let (Some(node), false) = (found.pop(), repeats > 1 && !name.contains('#')) else {
            let message = format!("`at` of a case moves `{name}`, and that is not one thing");
            let advice = "name one of its repeats, such as `wheel#2`, or give the first a name of \
                          its own"
                .to_owned();
            names.fault(line, Kind::AmbiguousName, message, advice);
            return;
        };
        let by = node.outer.turn * (Vector3::from(*at) - node.at);
        for (n, instance) in names.instances.iter().enumerate() {
            let inside = instance
                .path
                .strip_prefix(node.path.as_str())
                .is_some_and(|rest| rest.is_empty() || rest.starts_with('/'));
            if let (true, Some(shift)) = (inside, &mut shifts[n]) {
                *shift += by;
            }
        }
    }
}

fn planned(phase: &Phase, names: &mut Names<'_, '_>) -> PlannedPhase {
    let what = format!("phase `{}`", phase.name);
    let drain = phase.drain.iter();
    let drain = drain
        .map(|name| names.tanks(name, phase.line, &what))
        .collect();
    let motions = &names.file.service.motions;
    let mut moves = Vec::new();
    let mut unknown = Vec::new();
    for name in &phase.moves {
        let called = motions.iter().position(|m| m.name == *name);
        let of: Vec<usize> = match called {
            Some(n) => vec![n],
            None => (0..motions.len())
                .filter(|n| motions[*n].of == *name)
                .collect(),
        };
        if of.is_empty() {
            unknown.push(name.clone());
        }
        moves.extend(of);
    }
    for name in unknown {
        let known: Vec<&str> = motions.iter().map(|m| m.name.as_str()).collect();
        let advice = match reader::nearest(&name, known.iter().copied()) {
            Some(near) => format!("did you mean `{near}`?"),
            None if known.is_empty() => "there is no [[motion]] in this file".to_owned(),
            None => format!("the motions are {}", listed(&known)),
        };
        let message = format!("{what} moves `{name}`, and no motion is called so");
        names.fault(phase.line, Kind::UnknownName, message, advice);
    }
    PlannedPhase {
        name: phase.name.clone(),
        drain,
        to: phase.to,
        moves,
    }
}
