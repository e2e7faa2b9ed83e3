//! Mesh files as an assembly asks for them: read once each, kept, hashed.

use std::collections::BTreeMap;
use std::path::{Path, PathBuf};
use std::sync::{Arc, OnceLock};

use nalgebra::Matrix3;

use super::curves::CurveArgs;
use super::inputs::digest;
use crate::assembly::{BodyFigures, Capped, Input, MeshBody, MeshFiles, Refusal};
use crate::curvature::{CREASE_DEG, FacetError};
use crate::error::{Error, Result, Warning};
use crate::format::{self, Bytes};
use crate::mesh::{Body, Mesh};
use crate::quantity::LengthUnit;
use crate::report::kind_word;
use crate::soundness::cap::estimate;
use crate::soundness::{self, Depth, EffectIs, Finding, Severity};

/// Reads mesh files for an assembly.
#[derive(Default)]
pub(super) struct Files {
    read: BTreeMap<(PathBuf, &'static str), Vec<Arc<dyn MeshBody>>>,
    inputs: BTreeMap<PathBuf, Input>,
    /// What throws doubt on the meshes that were read.
    pub(super) warnings: Vec<Warning>,
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
        if self.figures.refused.is_some() || !look.looks(&self.body) {
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

impl MeshFiles for Files {
    fn bodies(&mut self, path: &Path, unit: LengthUnit) -> Result<Vec<Arc<dyn MeshBody>>, Error> {
        let key = (path.to_path_buf(), unit.symbol());
        if let Some(bodies) = self.read.get(&key) {
            return Ok(bodies.clone());
        }
        let bytes = Bytes::open(path)?;
        self.inputs.insert(
            path.to_path_buf(),
            Input {
                path: path.to_string_lossy().into_owned(),
                bytes: bytes.len() as u64,
                sha256: Some(digest(&bytes)),
            },
        );
        let soup = format::read(bytes, path, None)?;
        // Formats that state their unit are believed before the assembly's word for all.
        let metres = soup.unit.unwrap_or(unit).metres();
        let stem = path
            .file_stem()
            .map_or("body".into(), |s| s.to_string_lossy());
        let mesh = Arc::new(Mesh::new(soup, &stem).map_err(|e| e.in_file(path))?);
        self.warnings.extend(doubts(&mesh, path, metres));
        let bodies: Vec<Arc<dyn MeshBody>> = mesh
            .bodies()
            .iter()
            .map(|body| {
                let placed = Placed {
                    figures: figures(&mesh, body, metres),
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
}

/// What was dropped, turned or is in doubt, as warnings: an assembly must not swallow it.
fn doubts(mesh: &Mesh, path: &Path, metres: f64) -> Vec<Warning> {
    let audit = soundness::audit(mesh, metres, 1, Depth::Figures);
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

fn figures(mesh: &Mesh, body: &Body, metres: f64) -> BodyFigures {
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
            advice: match r.kind {
                "nested-solid" => "turn the inner shell inward if it is a hollow, else unite the solids, and export again".to_owned(),
                _ => r.advice,
            },
        }),
    }
}
