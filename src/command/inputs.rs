//! Which meshes a command is about: files, folders, standard input, bodies picked with `#`.

use std::path::{Path, PathBuf};

use clap::Args;
use sha2::{Digest, Sha256};

use super::beside::{Beside, Neighbour};
use crate::error::{Error, Kind, Result, Warning};
use crate::format::{self, Bytes, Family};
use crate::mesh::{Body, Joined, Mesh, ReaderNote};
use crate::progress::Progress;
use crate::quantity::{Dimension, LengthUnit, Quantity};
use crate::report::InputFact;
use crate::soundness::{Finding, FindingKind, Severity, rounded_up};

/// Options that say how meshes are read.
#[derive(Args, Clone, Debug)]
pub(super) struct MeshArgs {
    /// Mesh files, folders of them, or - for standard input; FILE#BODY picks a body
    #[arg(required = true, value_name = "MESH")]
    pub(super) meshes: Vec<PathBuf>,
    /// Length unit of the meshes: mm, cm, m, in, ft [default: the file's own, else mm, and said]
    #[arg(long, value_name = "UNIT", value_parser = parse_unit)]
    pub(super) unit: Option<LengthUnit>,
    /// Format, where the bytes do not tell: stl, obj, 3mf, ply, off, gltf
    #[arg(long, value_name = "FORMAT", value_parser = parse_family)]
    pub(super) format: Option<Family>,
    /// Look into sub-folders too
    #[arg(long)]
    pub(super) deep: bool,
    /// Make vertices on open edges one where they lie within DIST, such as "0.01 mm" (bare numbers
    /// in the mesh's unit); what that did is said
    #[arg(long, value_name = "DIST")]
    pub(super) join: Option<String>,
    /// Give the SHA-256 of each input
    #[arg(long)]
    pub(super) hash: bool,
}

pub(super) fn parse_unit(text: &str) -> Result<LengthUnit, String> {
    [
        LengthUnit::Mm,
        LengthUnit::Cm,
        LengthUnit::M,
        LengthUnit::In,
        LengthUnit::Ft,
    ]
    .into_iter()
    .find(|u| u.symbol() == text)
    .ok_or_else(|| "the units are mm, cm, m, in, ft".to_owned())
}

fn parse_family(text: &str) -> Result<Family, String> {
    Family::from_option(text).map_err(|e| format!("{}: {}", e.message, e.advice))
}

impl MeshArgs {
    /// Judges what can be judged before anything is read.
    ///
    /// # Errors
    /// As [`join_distance`].
    pub(super) fn judge(&self) -> Result<()> {
        if let Some(text) = &self.join {
            join_distance(text, LengthUnit::Mm)?;
        }
        Ok(())
    }
}

/// One thing to read.
#[derive(Clone, Debug)]
pub(super) struct Input {
    /// The file; `-` is standard input.
    pub(super) path: PathBuf,
    /// The body that was picked with `#`.
    pub(super) pick: Option<String>,
}

/// A mesh that was read.
pub(super) struct ReadMesh {
    /// Welded, with its bodies.
    pub(super) mesh: Mesh,
    /// Name of the format in JSON.
    pub(super) format: &'static str,
    /// The unit of its coordinates.
    pub(super) unit: LengthUnit,
    /// Whether that was assumed.
    pub(super) unit_assumed: bool,
    /// What the reader passed over, and the assumed unit.
    pub(super) warnings: Vec<Warning>,
    /// Files beside it that were read for it.
    pub(super) beside: Vec<InputFact>,
}

/// The inputs that the arguments name, folders opened and sorted. An input that cannot be is an
/// error in its place; the others go on.
pub(super) fn expand(args: &MeshArgs) -> Vec<(PathBuf, Result<Input>)> {
    let mut out = Vec::new();
    for name in &args.meshes {
        if name.is_dir() {
            match meshes_in(name, args.deep) {
                Ok(files) if files.is_empty() => {
                    let advice = if args.deep {
                        "name a folder that holds .stl, .obj, .3mf, .ply, .off, .gltf or .glb files"
                    } else {
                        "name a folder that holds .stl, .obj, .3mf, .ply, .off, .gltf or .glb files, or add --deep for its sub-folders"
                    };
                    let e = Error::new(Kind::Empty, "no mesh file in this folder", advice);
                    out.push((name.clone(), Err(e.in_file(name))));
                }
                Ok(files) => out.extend(files.into_iter().map(|f| {
                    (
                        f.clone(),
                        Ok(Input {
                            path: f,
                            pick: None,
                        }),
                    )
                })),
                Err(e) => out.push((name.clone(), Err(e))),
            }
        } else {
            let (path, pick) = split_pick(name);
            out.push((path.clone(), Ok(Input { path, pick })));
        }
    }
    out
}

/// Splits at the last `#`, unless a file of the whole name exists.
pub(super) fn split_pick(name: &Path) -> (PathBuf, Option<String>) {
    if name.exists() {
        return (name.to_path_buf(), None);
    }
    let Some(text) = name.to_str() else {
        return (name.to_path_buf(), None);
    };
    let mut splits = text
        .rmatch_indices('#')
        .map(|(at, _)| (&text[..at], &text[at + 1..]));
    let usable = |(path, pick): &(&str, &str)| !path.is_empty() && !pick.is_empty();
    let last = splits.clone().next().filter(usable);
    // Names of bodies may hold the sign too: the last one that a file stands before.
    match splits
        .find(|s| usable(s) && Path::new(s.0).exists())
        .or(last)
    {
        Some((path, pick)) => (PathBuf::from(path), Some(pick.to_owned())),
        None => (name.to_path_buf(), None),
    }
}

fn meshes_in(folder: &Path, deep: bool) -> Result<Vec<PathBuf>> {
    let fail = |e: std::io::Error| {
        Error::new(
            Kind::NotFound,
            format!("cannot read the folder: {e}"),
            "check its permissions",
        )
        .in_file(folder)
    };
    let mut entries: Vec<PathBuf> = std::fs::read_dir(folder)
        .map_err(fail)?
        .map(|entry| entry.map(|e| e.path()).map_err(fail))
        .collect::<Result<_>>()?;
    entries.sort();
    let mut out = Vec::new();
    for path in entries {
        if path.is_dir() {
            // A link may lead back up.
            if deep && !path.is_symlink() {
                out.extend(meshes_in(&path, deep)?);
            }
        } else if Family::from_path(&path).is_some() {
            out.push(path);
        }
    }
    Ok(out)
}

/// Opens an input and says what it is.
pub(super) fn open(input: &Input, hash: bool) -> Result<(Bytes, InputFact)> {
    let bytes = if input.path.as_os_str() == "-" {
        Bytes::from_stdin()?
    } else {
        Bytes::open(&input.path)?
    };
    let fact = InputFact::new(
        &input.path,
        Some(bytes.len() as u64),
        hash.then(|| digest(&bytes)),
    );
    Ok((bytes, fact))
}

/// SHA-256 as lower-case hexadecimal.
pub(super) fn digest(bytes: &[u8]) -> String {
    Sha256::digest(bytes)
        .iter()
        .map(|b| format!("{b:02x}"))
        .collect()
}

/// Reads and welds one mesh.
pub(super) fn read(
    bytes: Bytes,
    input: &Input,
    args: &MeshArgs,
    progress: Progress<'_>,
) -> Result<ReadMesh> {
    let _stage = progress.stage(format!("reading {}", input.path.display()), 0);
    let bytes = format::unpack(bytes, &input.path)?;
    let kind = format::detect(&bytes, &input.path, args.format)?;
    let beside = Beside::of(&input.path, args.hash);
    let mut soup = format::read_as(bytes, &input.path, kind, &|name| beside.open(name))?;
    let (unit, unit_assumed, mut warnings) = said(soup.unit, &soup.notes, input, args);
    soup.unit = soup.unit.map(|_| unit);
    let stem = format::stem(&input.path);
    let mut mesh = Mesh::new(soup, &stem).map_err(|e| e.in_file(&input.path))?;
    if let Some(text) = &args.join {
        let distance = join_distance(text, unit)? / unit.metres();
        mesh = mesh
            .join(distance, &stem)
            .map_err(|e| e.in_file(&input.path))?;
        warnings.extend(mesh.joined().map(|j| joined_said(j, unit, &input.path)));
    }
    Ok(ReadMesh {
        mesh,
        format: kind.name(),
        unit,
        unit_assumed,
        warnings,
        beside: beside.read().into_iter().map(fact_of).collect(),
    })
}

/// What is told of a file that was read for another.
pub(super) fn fact_of(beside: Neighbour) -> InputFact {
    InputFact::new(&beside.path, Some(beside.bytes), beside.sha256)
}

/// The distance of `--join`, m.
///
/// # Errors
/// What is wrong with it as a length; `usage` where it is not above zero.
pub(super) fn join_distance(text: &str, unit: LengthUnit) -> Result<f64> {
    let q = Quantity::parse(text, Dimension::Length, Some(unit))
        .map_err(|e| Error::new(e.kind, format!("--join: {}", e.message), e.advice))?;
    if q.value > 0.0 && q.value.is_finite() {
        return Ok(q.value);
    }
    Err(Error::new(
        Kind::Usage,
        format!("--join: \"{text}\" is not a distance above zero"),
        "state the distance that `bismar check` names for the crack",
    ))
}

/// What joining did, in words.
pub(super) fn joined_said(joined: &Joined, unit: LengthUnit, path: &Path) -> Warning {
    let (within, sign) = (rounded_up(joined.distance), unit.symbol());
    let message = match joined.vertices {
        0 => format!("no two vertices on open edges lie within {within} {sign}: none was joined"),
        n => format!(
            "{n} {} on open edges moved to a neighbour within {within} {sign}, the farthest by {} {sign}",
            if n == 1 { "vertex" } else { "vertices" },
            rounded_up(joined.farthest)
        ),
    };
    Warning {
        kind: "joined".to_owned(),
        message,
        path: Some(path.to_string_lossy().into_owned()),
        line: None,
        advice:
            "stitch the surface in the model and export again, so that nothing has to be joined"
                .to_owned(),
    }
}

/// The distance within which joining closes a body that nothing but cracks keeps open, with its
/// unit, as `--join` and `join =` take it.
pub(super) fn closing_distance(findings: &[Finding], unit: LengthUnit) -> Option<String> {
    let mut blocks = findings.iter().filter(|f| f.severity == Severity::Blocks);
    let (Some(crack), None) = (blocks.next(), blocks.next()) else {
        return None;
    };
    let join = crack.join_m.filter(|_| crack.kind == FindingKind::Crack)?;
    Some(format!(
        "{} {}",
        rounded_up(join / unit.metres()),
        unit.symbol()
    ))
}

/// The unit of a mesh, whether it was assumed, and the warnings: of the reader, and of that.
pub(super) fn said(
    own: Option<LengthUnit>,
    notes: &[ReaderNote],
    input: &Input,
    args: &MeshArgs,
) -> (LengthUnit, bool, Vec<Warning>) {
    let shown = input.path.to_string_lossy().into_owned();
    let mut warnings = super::meshes::said_by_reader(notes, &input.path);
    if let (Some(own), Some(stated)) = (own, args.unit)
        && own != stated
    {
        warnings.push(Warning {
            kind: "unit-overridden".to_owned(),
            message: format!("the file states lengths in {own}; --unit {stated} is taken instead"),
            path: Some(shown.clone()),
            line: None,
            advice: "leave out --unit to believe the file".to_owned(),
        });
    }
    let stated = args.unit.or(own);
    if stated.is_none() {
        warnings.push(Warning {
            kind: "unit-assumed".to_owned(),
            message: "the file states no length unit; mm is assumed".to_owned(),
            path: Some(shown),
            line: None,
            advice: "say --unit mm, cm, m, in or ft".to_owned(),
        });
    }
    (stated.unwrap_or_default(), stated.is_none(), warnings)
}

/// The bodies that a pick means: all of that name, or the one with that id.
///
/// # Errors
/// `unknown-name` with the names that there are.
pub(super) fn picked<'a>(mesh: &'a Mesh, input: &Input) -> Result<Vec<(usize, &'a Body)>> {
    let all = mesh.bodies().iter().enumerate();
    let Some(pick) = &input.pick else {
        return Ok(all.collect());
    };
    let mut chosen: Vec<_> = all
        .clone()
        .filter(|(_, b)| b.name.as_ref() == Some(pick))
        .collect();
    let with_id: Vec<_> = all.filter(|(_, b)| b.id == *pick).collect();
    if let ([_, ..], [(_, one)]) = (&chosen[..], &with_id[..])
        && one.name.as_ref() != Some(pick)
    {
        return Err(Error::new(
            Kind::AmbiguousName,
            format!("\"{pick}\" is the id of one body and the name of another"),
            "give the bodies other names, or weigh the whole file",
        )
        .in_file(&input.path));
    }
    if chosen.is_empty() {
        chosen = with_id;
    }
    if chosen.is_empty() {
        let mut names: Vec<&str> = mesh.bodies().iter().map(|b| b.id.as_str()).collect();
        let more = names.len().saturating_sub(20);
        names.truncate(20);
        let more = if more > 0 {
            format!(" and {more} more")
        } else {
            String::new()
        };
        return Err(Error::new(
            Kind::UnknownName,
            format!("no body is called \"{pick}\""),
            format!("the bodies are: {}{more}", names.join(", ")),
        )
        .in_file(&input.path));
    }
    Ok(chosen)
}
