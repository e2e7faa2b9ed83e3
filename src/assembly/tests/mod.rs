//! Tests of the assembly, with boxes in the place of meshes.

mod by_hand;
mod faults;
mod in_service;
mod made;
mod materials;
mod properties;
mod published;
mod schema;
mod standing;
mod sure;

use std::collections::HashMap;
use std::path::Path;
use std::sync::Arc;

use nalgebra::{Matrix3, Vector3};
use tempfile::TempDir;

use super::*;
use crate::error::{Error, Kind};
use crate::moments::Moments;
use crate::quantity::LengthUnit;

/// An axis-aligned box of a mesh file, in the file's unit until it is read.
#[derive(Clone)]
pub(super) struct Block {
    id: String,
    name: Option<String>,
    joined: Vec<String>,
    materials: Vec<String>,
    lo: [f64; 3],
    hi: [f64; 3],
    refused: bool,
}

pub(super) fn block(name: &str, lo: [f64; 3], hi: [f64; 3]) -> Block {
    Block {
        id: name.into(),
        name: Some(name.into()),
        joined: Vec::new(),
        materials: Vec::new(),
        lo,
        hi,
        refused: false,
    }
}

struct Read {
    figures: BodyFigures,
}

impl MeshBody for Read {
    fn figures(&self) -> &BodyFigures {
        &self.figures
    }

    fn facets(&self) -> Vec<[[f64; 3]; 3]> {
        let [lo, hi] = self.figures.bounds;
        crate::printed::tests::cuboid(lo, hi)
    }

    fn bounds_turned(&self, turn: &Matrix3<f64>) -> [[f64; 3]; 2] {
        let [lo, hi] = self.figures.bounds;
        let corners = (0..8).map(|n| {
            let pick = |axis: usize| {
                if n >> axis & 1 == 0 {
                    lo[axis]
                } else {
                    hi[axis]
                }
            };
            let p: [f64; 3] = (turn * Vector3::new(pick(0), pick(1), pick(2))).into();
            [p, p]
        });
        resolve::around(corners)
    }
}

impl Block {
    fn read(&self, unit: LengthUnit) -> Arc<dyn MeshBody> {
        let k = unit.metres();
        let [lo, hi] = [self.lo, self.hi].map(|c| Vector3::from(c) * k);
        let d = hi - lo;
        let volume = d.x * d.y * d.z;
        Arc::new(Read {
            figures: BodyFigures {
                id: self.id.clone(),
                name: self.name.clone(),
                joined: self.joined.clone(),
                materials: self.materials.clone(),
                moments: Moments {
                    zeroth: volume,
                    second: Matrix3::from_diagonal(&(d.component_mul(&d) * (volume / 12.0))),
                    ..Moments::zero((lo + hi) / 2.0)
                },
                area: 2.0 * (d.x * d.y + d.y * d.z + d.z * d.x),
                bounds: [lo.into(), hi.into()],
                condition: 1.0,
                refused: self.refused.then(|| Refusal {
                    kind: "not-closed".into(),
                    message: "it has 4 open edges in 1 loop".into(),
                    advice: "close the hole".into(),
                }),
                // As if the block's upper side were missing in part.
                capped: self.refused.then(|| super::Capped {
                    moments: Moments {
                        zeroth: volume,
                        second: Matrix3::from_diagonal(&(d.component_mul(&d) * (volume / 12.0))),
                        ..Moments::zero((lo + hi) / 2.0)
                    },
                    volume_bound: 0.01 * volume,
                    centre_bound: 0.02 * d.z,
                    inertia_bound: f64::INFINITY,
                }),
            },
        })
    }
}

/// A folder with assembly files and meshes.
pub(super) struct Bench {
    dir: TempDir,
    meshes: HashMap<String, Vec<Block>>,
}

impl MeshFiles for Bench {
    fn bodies(
        &mut self,
        path: &Path,
        unit: LengthUnit,
        _: Option<f64>,
    ) -> Result<Vec<Arc<dyn MeshBody>>, Error> {
        let name = path.file_name().unwrap().to_string_lossy().into_owned();
        let blocks = self.meshes.get(&name).ok_or_else(|| {
            Error::new(Kind::Truncated, "this mesh ends early", "export it again")
        })?;
        Ok(blocks.iter().map(|b| b.read(unit)).collect())
    }

    fn input(&mut self, path: &Path) -> Option<Input> {
        Some(Input {
            path: path.to_string_lossy().into_owned(),
            bytes: 0,
            sha256: None,
        })
    }
}

impl Bench {
    pub(super) fn new() -> Self {
        Self {
            dir: tempfile::tempdir().unwrap(),
            meshes: HashMap::new(),
        }
    }

    pub(super) fn mesh(mut self, name: &str, blocks: Vec<Block>) -> Self {
        self.put(name, "");
        self.meshes.insert(name.into(), blocks);
        self
    }

    pub(super) fn put(&self, name: &str, text: &str) {
        let path = self.dir.path().join(name);
        std::fs::create_dir_all(path.parent().unwrap()).unwrap();
        std::fs::write(path, text).unwrap();
    }

    pub(super) fn load(&self, name: &str) -> Result<Loaded, Vec<Error>> {
        load(&self.dir.path().join(name))
    }

    /// The balance of a file of the bench, and the warnings of it.
    pub(super) fn balance(&mut self, name: &str) -> Result<(Balance, Vec<Warned>), Vec<Error>> {
        let loaded = self.load(name)?;
        let resolved = resolve(&loaded, self)?;
        let warnings = resolved.warnings.iter();
        let warned = warnings
            .map(|w| (w.kind.clone(), w.message.clone(), w.line))
            .collect();
        Ok((balance(&loaded, &resolved)?, warned))
    }

    /// The balance of this text as a file of its own.
    pub(super) fn of(&mut self, text: &str) -> (Balance, Vec<Warned>) {
        self.put("it.toml", text);
        self.balance("it.toml").unwrap_or_else(|e| panic!("{e:#?}"))
    }

    /// The faults of this text.
    pub(super) fn faults(&mut self, text: &str) -> Vec<Error> {
        self.put("it.toml", text);
        match self.balance("it.toml") {
            Err(errors) => errors,
            Ok((balance, _)) => panic!("no fault: {balance:#?}"),
        }
    }
}

pub(super) type Warned = (String, String, Option<u64>);

pub(super) fn kinds(warned: &[Warned]) -> Vec<&str> {
    warned.iter().map(|(kind, _, _)| kind.as_str()).collect()
}

/// Equal to a few roundings of the larger.
#[track_caller]
pub(super) fn near(a: f64, b: f64) {
    let allowed = 1e-13 * a.abs().max(b.abs()) + 1e-300;
    assert!((a - b).abs() <= allowed, "{a} is not {b}");
}

/// Equal vectors, to 1e-13 of `scale`.
#[track_caller]
pub(super) fn near3(a: [f64; 3], b: [f64; 3], scale: f64) {
    for (x, y) in a.into_iter().zip(b) {
        assert!((x - y).abs() <= 1e-13 * scale, "{a:?} is not {b:?}");
    }
}
