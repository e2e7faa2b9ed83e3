//! Which bodies of which mesh files stand in the assembly.

use std::collections::{BTreeMap, HashMap, HashSet};
use std::path::{Path, PathBuf};
use std::sync::Arc;

use super::expand::Instance;
use super::file::MeshChoice;
use super::listed;
use super::source::{MeshBody, MeshFiles};
use crate::error::{Error, Kind, Warning};
use crate::quantity::LengthUnit;

pub(super) type Bodies = Vec<Arc<dyn MeshBody>>;

/// A file, its unit, and the bits of the distance within which it is joined.
type Reading = (PathBuf, &'static str, Option<u64>);

/// The bodies that parts took. Entries are known by their address: they live as long as the
/// loaded file, and a repeat is the same entry.
#[derive(Default)]
pub(super) struct Choice {
    /// Bodies by file, unit and distance of joining; none where the file could not be read.
    files: BTreeMap<Reading, Option<Bodies>>,
    /// Mesh files in the order of their first use.
    pub(super) order: Vec<PathBuf>,
    /// Ids of the bodies that some part took, by file.
    taken: BTreeMap<PathBuf, HashSet<String>>,
    /// Bodies that an entry took.
    chosen: HashMap<*const MeshChoice, Bodies>,
    pub(super) errors: Vec<Error>,
}

impl Choice {
    /// The bodies that the mesh of a part or tank names.
    pub(super) fn of(&self, mesh: &MeshChoice) -> Option<&Bodies> {
        self.chosen.get(&std::ptr::from_ref(mesh))
    }

    /// Finds the bodies of a part or tank; once an entry.
    pub(super) fn choose(
        &mut self,
        instance: &Instance<'_>,
        mesh: &MeshChoice,
        unit: LengthUnit,
        join: Option<f64>,
        meshes: &mut dyn MeshFiles,
    ) {
        let key: *const MeshChoice = mesh;
        if self.chosen.contains_key(&key) {
            return;
        }
        let path = &mesh.path;
        let file = (path.clone(), unit.symbol(), join.map(f64::to_bits));
        if !self.files.contains_key(&file) {
            if !self.order.contains(path) {
                self.order.push(path.clone());
            }
            let bodies = self.read(path, unit, join, meshes);
            self.files.insert(file.clone(), bodies);
        }
        let Some(Some(bodies)) = self.files.get(&file) else {
            return;
        };
        let found: Result<Bodies, (Kind, String)> = match &mesh.body {
            None => Ok(bodies.clone()),
            Some(name) => named(bodies, name),
        };
        match found {
            Ok(found) => {
                let taken = self.taken.entry(path.clone()).or_default();
                taken.extend(found.iter().map(|b| b.figures().id.clone()));
                self.chosen.insert(key, found);
            }
            Err((kind, message)) => {
                let ids: Vec<&str> = bodies.iter().map(|b| b.figures().id.as_str()).collect();
                let advice = format!("the bodies of `{}` are {}", mesh.typed, listed(&ids));
                let mut error = instance.error(kind, message, advice);
                error.line = Some(mesh.line);
                self.errors.push(error);
                self.chosen.insert(key, Vec::new());
            }
        }
    }

    fn read(
        &mut self,
        path: &Path,
        unit: LengthUnit,
        join: Option<f64>,
        meshes: &mut dyn MeshFiles,
    ) -> Option<Bodies> {
        match meshes.bodies(path, unit, join) {
            Ok(bodies) if bodies.is_empty() => {
                self.errors.push(
                    Error::new(
                        Kind::Empty,
                        "there is no body in this mesh file",
                        "export it again, or take the part out",
                    )
                    .in_file(path),
                );
                None
            }
            Ok(bodies) => {
                self.taken.entry(path.to_path_buf()).or_default();
                Some(bodies)
            }
            Err(e) => {
                self.errors.push(e.in_file(path));
                None
            }
        }
    }

    /// Warns of bodies that stand in no part, a warning a file.
    pub(super) fn unused_bodies(&self, warnings: &mut Vec<Warning>) {
        for path in &self.order {
            let of_file = self.files.iter().filter(|((p, _, _), _)| p == path);
            // Joining leaves no more bodies than there were: those that stay are what can be unused.
            let bodies = of_file
                .filter_map(|(_, bodies)| bodies.as_ref())
                .min_by_key(|bodies| bodies.len());
            let (Some(bodies), Some(taken)) = (bodies, self.taken.get(path)) else {
                continue;
            };
            let ids = bodies.iter().map(|b| b.figures().id.as_str());
            let unused: Vec<&str> = ids.filter(|id| !taken.contains(*id)).collect();
            if unused.is_empty() {
                continue;
            }
            warnings.push(Warning {
                kind: "body-unused".into(),
                message: format!(
                    "{} of {} bodies of this mesh stand in no part and are not counted: {}",
                    unused.len(),
                    bodies.len(),
                    listed(&unused)
                ),
                path: Some(path.to_string_lossy().into_owned()),
                line: None,
                advice: "add a [[part]] for each that belongs to the assembly".into(),
            });
        }
    }
}

/// The bodies of a name: all that the file calls so (unnamed ones go by the stem of the file), or
/// else the one with that id.
fn named(bodies: &Bodies, name: &str) -> Result<Bodies, (Kind, String)> {
    let called = |body: &&Arc<dyn MeshBody>| {
        let figures = body.figures();
        match &figures.name {
            Some(own) => own == name,
            None => {
                let id = figures.id.as_str();
                let stem = id
                    .rsplit_once('/')
                    .filter(|(_, n)| n.parse::<u64>().is_ok());
                stem.map_or(id, |(stem, _)| stem) == name || id == name
            }
        }
    };
    let by_name: Bodies = bodies.iter().filter(called).cloned().collect();
    let by_id = bodies.iter().find(|b| b.figures().id == name);
    match by_id {
        Some(one) if by_name.is_empty() => Ok(vec![one.clone()]),
        Some(one)
            if one.figures().name.is_some() && !by_name.iter().any(|b| Arc::ptr_eq(b, one)) =>
        {
            Err((
                Kind::AmbiguousName,
                format!("`{name}` is the name of one body and the id of another"),
            ))
        }
        // An unnamed body's own id is more exact than the stem that it shares.
        Some(one) if one.figures().name.is_none() && name.contains('/') => Ok(vec![one.clone()]),
        _ if by_name.is_empty() => Err((
            Kind::NotFound,
            format!("there is no body `{name}` in this mesh"),
        )),
        _ => Ok(by_name),
    }
}
