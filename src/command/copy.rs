//! `--mend`, `--write` and `--picture` of `check`: what it writes.

use std::path::{Path, PathBuf};

use clap::Args;

use super::inputs::{Input, MeshArgs, ReadMesh};
use crate::error::{Error, Kind, Result, Warning};
use crate::format::threemf::write_3mf;
use crate::format::write::{family_of, narrowed, write_obj, write_stl};
use crate::format::{self, Family};
use crate::mesh::{Mesh, Soup};
use crate::quantity::LengthUnit;
use crate::report::copy::{Copied, StepDone};
use crate::report::picture::PictureFormat;
use crate::soundness::mend;

/// Options that write files.
#[derive(Args, Clone, Debug)]
pub(super) struct CopyArgs {
    /// Write a mended copy (.stl, .obj or .3mf): only what is provably harmless is done, and listed
    #[arg(long, value_name = "OUT")]
    pub(super) mend: Option<PathBuf>,
    /// Write a plain copy (.stl, .obj or .3mf)
    #[arg(long, value_name = "OUT")]
    pub(super) write: Option<PathBuf>,
    /// Draw the mesh from three sides with its findings marked and numbered (.svg or .png)
    #[arg(long, value_name = "FILE")]
    pub(super) picture: Option<PathBuf>,
}

impl CopyArgs {
    fn outputs(&self) -> impl Iterator<Item = &PathBuf> {
        [&self.mend, &self.write, &self.picture]
            .into_iter()
            .flatten()
    }

    /// Whether the options make sense together with the inputs.
    ///
    /// # Errors
    /// `usage`.
    pub(super) fn check(
        &self,
        meshes: &MeshArgs,
        inputs: &[(PathBuf, Result<Input>)],
    ) -> Result<()> {
        if self.outputs().next().is_none() {
            return Ok(());
        }
        let usage = |message: &str, advice: &str| Err(Error::new(Kind::Usage, message, advice));
        let [(path, input)] = inputs else {
            return usage(
                "--mend, --write and --picture are of one mesh",
                "name one mesh file",
            );
        };
        let picked = input.as_ref().is_ok_and(|i| i.pick.is_some());
        if picked || meshes.meshes.len() != 1 {
            return usage(
                "--mend, --write and --picture are of a whole file",
                "name the file without #",
            );
        }
        for out in self.mend.iter().chain(&self.write) {
            family_of(out)?;
        }
        if let Some(picture) = &self.picture {
            PictureFormat::of(picture)?;
        }
        let place = |p: &Path| std::fs::canonicalize(p).ok();
        let mut places: Vec<PathBuf> = place(path).into_iter().collect();
        for out in self.outputs() {
            let here = place(out).unwrap_or_else(|| out.clone());
            if places.contains(&here) {
                return usage(
                    "an output would take the place of the input or of another output",
                    "name each output otherwise",
                );
            }
            places.push(here);
        }
        Ok(())
    }
}

/// Writes the mended copy, or says why not.
///
/// # Errors
/// `too-large`, `cannot-write`.
pub(super) fn mended(m: &ReadMesh, input: &Input, out: &Path) -> Result<(Copied, Vec<Warning>)> {
    let stem = format::stem(&input.path);
    match mend::mend(&m.mesh, &stem)? {
        Err(refused) => Ok((unwritten(out, refused)?, Vec::new())),
        Ok(mended) => {
            let steps: Vec<StepDone> = mended
                .steps
                .iter()
                .map(|s| StepDone::of(s, m.unit.metres()))
                .collect();
            let (copy, warnings) = save(&mended.soup, out, m.unit, &stem, true)?;
            Ok((Copied { steps, ..copy }, warnings))
        }
    }
}

/// Writes a plain copy. `sound` is whether the mesh is: then its copy must be.
///
/// # Errors
/// `too-large`, `cannot-write`.
pub(super) fn written(
    m: &ReadMesh,
    input: &Input,
    out: &Path,
    sound: bool,
) -> Result<(Copied, Vec<Warning>)> {
    save(&m.mesh.soup, out, m.unit, &format::stem(&input.path), sound)
}

fn unwritten(out: &Path, refused: Vec<String>) -> Result<Copied> {
    Ok(Copied {
        path: out.to_string_lossy().into_owned(),
        format: family_of(out)?.name(),
        written: false,
        triangles: None,
        largest_move_m: 0.0,
        facets_collapsed: 0,
        steps: Vec::new(),
        refused,
    })
}

fn save(
    soup: &Soup,
    out: &Path,
    unit: LengthUnit,
    stem: &str,
    sound: bool,
) -> Result<(Copied, Vec<Warning>)> {
    let family = family_of(out)?;
    let metres = unit.metres();
    let mut copy = Copied {
        written: true,
        triangles: Some(soup.triangles.count() as u64),
        ..unwritten(out, Vec::new())?
    };
    let mut warnings = Vec::new();
    if family != Family::ThreeMf && unit != LengthUnit::Mm {
        warnings.push(Warning {
            kind: "unit-dropped".to_owned(),
            message: format!(
                "{} has no place for the unit: the numbers of the copy are in {unit}",
                family.title()
            ),
            path: Some(copy.path.clone()),
            line: None,
            advice: format!("read it with --unit {unit}, or write 3MF to keep the unit"),
        });
    }
    match family {
        Family::ThreeMf => {
            let done = write_3mf(out, soup, unit, sound)?;
            copy.triangles = Some(done.triangles);
            copy.facets_collapsed = done.left_out;
        }
        Family::Obj => write_obj(out, soup)?,
        _ => {
            let narrow = narrowed(soup).map_err(|e| e.in_file(out))?;
            copy.largest_move_m = narrow.largest_move * metres;
            copy.facets_collapsed = narrow.collapsed as u64;
            copy.triangles = Some(narrow.soup.triangles.count() as u64);
            if narrow.largest_move > 0.0 {
                warnings.push(Warning {
                    kind: "rounded-to-f32".to_owned(),
                    message: format!(
                        "binary STL holds f32: coordinates moved by up to {:e} m",
                        copy.largest_move_m
                    ),
                    path: Some(copy.path.clone()),
                    line: None,
                    advice: "write OBJ to keep every digit".to_owned(),
                });
            }
            if soup.names.iter().any(Option::is_some) {
                warnings.push(Warning {
                    kind: "names-dropped".to_owned(),
                    message: "binary STL has no place for the names of bodies".to_owned(),
                    path: Some(copy.path.clone()),
                    line: None,
                    advice: "write OBJ to keep them".to_owned(),
                });
            }
            // Without names pieces are welded to each other, and rounding may fold what is fine.
            let nameless = Soup {
                names: vec![None],
                materials: Vec::new(),
                runs: vec![crate::mesh::Run {
                    first: 0,
                    count: narrow.soup.triangles.count(),
                    name: 0,
                    material: None,
                }],
                ..narrow.soup
            };
            let mesh = Mesh::new(nameless, stem)?;
            let left = if sound {
                mend::unsound(&mesh)
            } else {
                Vec::new()
            };
            if !left.is_empty() {
                let mut why = vec![
                    "as binary STL, without names and rounded to f32, it would not be sound: write OBJ instead"
                        .to_owned(),
                ];
                why.extend(left);
                return Ok((unwritten(out, why)?, Vec::new()));
            }
            write_stl(out, &mesh.soup)?;
        }
    }
    Ok((copy, warnings))
}
