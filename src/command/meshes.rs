//! Mesh files as an assembly asks for them: read once each, kept, hashed.

use std::collections::BTreeMap;
use std::path::{Path, PathBuf};
use std::sync::{Arc, OnceLock};

use nalgebra::Matrix3;

use super::beside::Beside;
use super::curves::CurveArgs;
use super::inputs::{closing_distance, digest, joined_said};
use crate::assembly::{BodyFigures, Capped, Input, MeshBody, MeshFiles, Refusal};
use crate::curvature::{CREASE_DEG, FacetError};
use crate::error::{Error, Result, Warning};
use crate::format::{self, Bytes};
use crate::mesh::{Body, Mesh, ReaderNote};
use crate::progress::Progress;
use crate::quantity::LengthUnit;
use crate::report::kind_word;
use crate::soundness::cap::estimate;
use crate::soundness::{self, Audit, Depth, EffectIs, Finding, Severity};

/// A file, its unit, and the bits of the distance within which vertices were joined.
type Reading = (PathBuf, &'static str, Option<u64>);

/// Reads mesh files for an assembly.
#[derive(Default)]
pub(super) struct Files<'a> {
    read: BTreeMap<Reading, Vec<Arc<dyn MeshBody>>>,
    inputs: BTreeMap<PathBuf, Input>,
    /// Is told which mesh is read.
    progress: Progress<'a>,
    /// What was read beside them.
    beside: BTreeMap<PathBuf, Vec<Input>>,
    /// What throws doubt on the meshes that were read, and what was joined.
    pub(super) warnings: Vec<Warning>,
}

impl<'a> Files<'a> {
    /// Tells `progress` which mesh is read.
    pub(super) fn watched(progress: Progress<'a>) -> Self {
        Self {
            progress,
            ..Self::default()
        }
    }
}

struct Placed {
    mesh: Arc<Mesh>,
    body: Body,
    metres: f64,
    figures: BodyFigures,
    /// What its facets do, once it was looked at.
    curves: OnceLock<Option<FacetError>>,
}

impl MeshBody for Placed {
    fn figures(&self) -> &BodyFigures {
        &self.figures
    }

    fn facets(&self) -> Vec<[[f64; 3]; 3]> {
        let facets = self.mesh.outward_facets(&self.body);
        facets
            .into_iter()
            .map(|t| t.map(|p| p.map(|x| x * self.metres)))
            .collect()
    }

    fn facet_error(&self, asked: bool) -> Option<FacetError> {
        let look = CurveArgs {
            true_curves: asked,
            crease: CREASE_DEG,
        };
        if self.figures.refused.is_some() || !look.looks(&self.mesh, &self.body) {
            return None;
        }
        // Welding failed before if it fails here.
        *self.curves.get_or_init(|| {
            let found = look.look(&self.mesh, &self.body).ok().flatten()?;
            Some(found.scaled(self.metres))
        })
    }

    fn bounds_turned(&self, turn: &Matrix3<f64>) -> [[f64; 3]; 2] {
        self.mesh
            .bounds_turned(&self.body, turn)
            .map(|p| p.map(|x| x * self.metres))
    }
}

impl MeshFiles for Files<'_> {
    fn bodies(
        &mut self,
        path: &Path,
        unit: LengthUnit,
        join: Option<f64>,
    ) -> Result<Vec<Arc<dyn MeshBody>>, Error> {
        let key = (path.to_path_buf(), unit.symbol(), join.map(f64::to_bits));
        if let Some(bodies) = self.read.get(&key) {
            return Ok(bodies.clone());
        }
        let _stage = (self.progress).stage(format!("reading {}", path.display()), 0);
        let bytes = Bytes::open(path)?;
        self.inputs.insert(
            path.to_path_buf(),
            Input {
                path: path.to_string_lossy().into_owned(),
                bytes: bytes.len() as u64,
                sha256: Some(digest(&bytes)),
            },
        );
        let bytes = format::unpack(bytes, path)?;
        let kind = format::detect(&bytes, path, None)?;
        let beside = Beside::of(path, true);
        let soup = format::read_as(bytes, path, kind, &|name| beside.open(name))?;
        let of = |b: super::beside::Neighbour| Input {
            path: b.path.to_string_lossy().into_owned(),
            bytes: b.bytes,
            sha256: b.sha256,
        };
        let beside = beside.read().into_iter().map(of).collect();
        self.beside.insert(path.to_path_buf(), beside);
        self.warnings.extend(said_by_reader(&soup.notes, path));
        // Formats that state their unit are believed before the assembly's word for all.
        let unit = soup.unit.unwrap_or(unit);
        let metres = unit.metres();
        let stem = format::stem(path);
        let mut mesh = Mesh::new(soup, &stem).map_err(|e| e.in_file(path))?;
        if let Some(distance) = join {
            mesh = mesh
                .join(distance / metres, &stem)
                .map_err(|e| e.in_file(path))?;
            self.warnings
                .extend(mesh.joined().map(|j| joined_said(j, unit, path)));
        }
        let mesh = Arc::new(mesh);
        let audit = soundness::audit(&mesh, metres, 1, Depth::Figures);
        self.warnings.extend(doubts(&mesh, &audit, path));
        let bodies: Vec<Arc<dyn MeshBody>> = mesh
            .bodies()
            .iter()
            .zip(&audit.bodies)
            .map(|(body, findings)| {
                let placed = Placed {
                    figures: figures(&mesh, body, findings, unit),
                    body: body.clone(),
                    mesh: Arc::clone(&mesh),
                    metres,
                    curves: OnceLock::new(),
                };
                Arc::new(placed) as Arc<dyn MeshBody>
            })
            .collect();
        self.read.insert(key, bodies.clone());
        Ok(bodies)
    }

    fn input(&mut self, path: &Path) -> Option<Input> {
        self.inputs.get(path).cloned()
    }

    fn beside(&mut self, path: &Path) -> Vec<Input> {
        self.beside.get(path).cloned().unwrap_or_default()
    }
}

/// What the reader passed over, as warnings.
pub(super) fn said_by_reader(notes: &[ReaderNote], path: &Path) -> Vec<Warning> {
    let said = |n: &ReaderNote| Warning {
        kind: n.kind.to_owned(),
        message: n.message.clone(),
        path: Some(path.to_string_lossy().into_owned()),
        line: n.line,
        advice: n.advice.to_owned(),
    };
    notes.iter().map(said).collect()
}

/// What was dropped, turned or is in doubt, as warnings: an assembly must not swallow it.
fn doubts(mesh: &Mesh, audit: &Audit, path: &Path) -> Vec<Warning> {
    let warning = |on: &str, f: &Finding| {
        let effect = match (f.volume_effect_m3, f.volume_effect_is) {
            (Some(v), Some(EffectIs::Bound)) => {
                format!("; its volume may be off by {:.3} cm3", v.abs() * 1e6)
            }
            _ => String::new(),
        };
        Warning {
            kind: f.kind.name(),
            message: format!("{on}: {} {}{effect}", f.count, kind_word(f.kind, f.count)),
            path: Some(path.to_string_lossy().into_owned()),
            line: f.places.first().and_then(|p| p.line),
            advice: f.advice.clone(),
        }
    };
    let of_bodies = mesh
        .bodies()
        .iter()
        .zip(&audit.bodies)
        .flat_map(|(b, list)| {
            list.iter()
                .filter(|f| f.severity == Severity::Doubts)
                .map(|f| warning(&format!("body `{}`", b.id), f))
                .collect::<Vec<_>>()
        });
    let of_file = audit
        .file
        .iter()
        .filter(|f| f.severity == Severity::Doubts)
        .map(|f| warning("the file", f));
    of_bodies.chain(of_file).collect()
}

fn figures(mesh: &Mesh, body: &Body, findings: &[Finding], unit: LengthUnit) -> BodyFigures {
    let metres = unit.metres();
    let closes = closing_distance(findings, unit);
    let solid = mesh.solid(body, None);
    let moments = match &solid {
        Ok(s) => s.moments.scaled(metres),
        Err(_) => crate::moments::Moments::zero(nalgebra::Vector3::zeros()),
    };
    BodyFigures {
        id: body.id.clone(),
        name: body.name.clone(),
        joined: body.joined.clone(),
        materials: body.materials.clone(),
        moments,
        area: mesh.area(body) * metres * metres,
        bounds: body.bounds.map(|p| p.map(|x| x * metres)),
        condition: solid
            .as_ref()
            .ok()
            .and_then(|s| s.condition())
            .unwrap_or(f64::INFINITY),
        capped: match &solid {
            Err(r) if r.kind == "not-closed" => estimate(mesh, body, None).ok().map(|e| Capped {
                moments: e.solid.moments.scaled(metres),
                volume_bound: e.bounds.volume * metres.powi(3),
                centre_bound: e.bounds.centre * metres,
                inertia_bound: e.bounds.inertia * metres.powi(5),
            }),
            _ => None,
        },
        refused: solid.err().map(|r| Refusal {
            kind: r.kind.to_owned(),
            message: match r.kind {
                "not-closed" => format!(
                    "it is not closed: {} open edges in {} boundary loop{}",
                    r.open_edges,
                    r.loops,
                    if r.loops == 1 { "" } else { "s" }
                ),
                "duplicate" => "facets stand twice in it and cannot be dropped".to_owned(),
                "nested-solid" => "a solid lies within its solid".to_owned(),
                _ => "it holds no volume".to_owned(),
            },
            advice: match (r.kind, closes) {
                ("not-closed", Some(distance)) => format!(
                    "the surface is cracked: stitch it in the model and export again, or state join = \"{distance}\" on the part"
                ),
                ("nested-solid", _) => "turn the inner shell inward if it is a hollow, else unite the solids, and export again".to_owned(),
                _ => r.advice,
            },
        }),
    }
}
