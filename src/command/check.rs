//! `bismar check`: can this be weighed? What is wrong, where, and what does it do to the volume?

use clap::Args;

use super::copy::{self, CopyArgs};
use super::inputs::{Input, MeshArgs, ReadMesh, expand, open, picked, read};
use super::progress::Terminal;
use super::{Answer, Common, gather};
use crate::error::{Error, Result, Warning};
use crate::mesh::{Body, Mesh};
use crate::progress::Progress;
use crate::report::check::{CheckBody, CheckedBody, CheckedFile};
use crate::report::copy::Copied;
use crate::report::{self, InputFact, path_hex};
use crate::soundness::{self, Depth, Finding, FindingKind, TESTED, TESTED_WITH_OVERLAP};

/// Arguments of `check`.
#[derive(Args, Clone, Debug)]
pub(super) struct CheckArgs {
    #[command(flatten)]
    meshes: MeshArgs,
    /// List up to N places of each finding
    #[arg(long, value_name = "N", default_value_t = 10)]
    places: usize,
    /// Skip the test for surfaces that cut each other
    #[arg(long)]
    no_overlap: bool,
    #[command(flatten)]
    copy: CopyArgs,
}

impl CheckArgs {
    fn overlap(&self) -> Depth {
        if self.no_overlap {
            Depth::Surface
        } else {
            Depth::Full
        }
    }

    fn tested(&self) -> &'static [FindingKind] {
        if self.no_overlap {
            TESTED
        } else {
            TESTED_WITH_OVERLAP
        }
    }
}

/// Runs the command.
pub(super) fn run(args: &CheckArgs, common: &Common) -> Result<Answer> {
    args.meshes.judge()?;
    let inputs = expand(&args.meshes);
    args.copy.check(&args.meshes, &inputs)?;
    let terminal = Terminal::new(common);
    let progress = terminal.progress();
    let answers = gather(inputs, |input| check_file(input, args, progress));
    drop(terminal);
    let mut files = Vec::new();
    let mut exit = 0;
    for one in &answers.each {
        match &one.result {
            Ok(file) => {
                // Mended, it is sound; a copy that was refused is a no whatever the mesh.
                let fine = match (&file.mended, &file.copied) {
                    (Some(m), c) => m.written && c.as_ref().is_none_or(|c| c.written),
                    (None, c) => file.sound == Some(true) && c.as_ref().is_none_or(|c| c.written),
                };
                exit = exit.max(u8::from(!fine));
                files.push(file.clone());
            }
            Err(e) => {
                exit = 2;
                files.push(unread(&one.path, e, args));
            }
        }
    }
    let body = CheckBody { files };
    answers.finish(
        "bismar/check/1",
        exit,
        body,
        common,
        report::check_text::render,
        report::check_text::csv,
    )
}

fn unread(path: &std::path::Path, error: &Error, args: &CheckArgs) -> CheckedFile {
    CheckedFile {
        path: path.to_string_lossy().into_owned(),
        path_hex: path_hex(path),
        format: None,
        triangles: None,
        unit: None,
        unit_assumed: false,
        bounds_m: None,
        sound: None,
        tested: args.tested().to_vec(),
        findings: Vec::new(),
        error: Some(error.clone()),
        bodies: Vec::new(),
        mended: None,
        copied: None,
        picture: None,
    }
}

type Checked = (CheckedFile, Vec<Warning>, Vec<InputFact>);

fn check_file(
    input: &Input,
    args: &CheckArgs,
    progress: Progress<'_>,
) -> (Option<InputFact>, Result<Checked>) {
    let (bytes, fact) = match open(input, args.meshes.hash) {
        Ok(opened) => opened,
        Err(e) => return (None, Err(e)),
    };
    let result =
        read(bytes, input, &args.meshes, progress).and_then(|m| answer(&m, input, args, progress));
    (Some(fact), result)
}

fn answer(
    m: &ReadMesh,
    input: &Input,
    args: &CheckArgs,
    progress: Progress<'_>,
) -> Result<Checked> {
    let metres = m.unit.metres();
    let mut audit =
        soundness::audit_watched(&m.mesh, metres, args.places, args.overlap(), progress);
    audit.file.extend(soundness::unit_suspect(
        &m.mesh,
        m.unit,
        m.unit_assumed,
        None,
    ));
    let chosen = picked(&m.mesh, input)?;
    let bodies: Vec<CheckedBody> = chosen
        .iter()
        .map(|&(i, body)| checked(&m.mesh, body, std::mem::take(&mut audit.bodies[i]), metres))
        .collect();
    // Of a picked body the rest of the file is no fault.
    let file_findings = if input.pick.is_some() {
        Vec::new()
    } else {
        audit.file
    };
    let mut kinds = args.tested();
    let mut found = file_findings
        .iter()
        .chain(bodies.iter().flat_map(|b| &b.findings));
    if found.any(|f| f.kind == FindingKind::SelfOverlap) {
        // Without the search a surface that is written twice still shows. Only where it does is the
        // kind among those tested: elsewhere its absence would prove nothing.
        kinds = TESTED_WITH_OVERLAP;
    }
    let tested = soundness::tested(&m.mesh, kinds);
    let sound = !bodies.is_empty()
        && bodies.iter().all(|b| b.sound)
        && !file_findings.iter().any(Finding::is_unsound);
    let mut warnings = m.warnings.clone();
    let mut said = |(copy, more): (Copied, Vec<Warning>)| {
        warnings.extend(more);
        copy
    };
    let mended = match &args.copy.mend {
        Some(out) => Some(said(copy::mended(m, input, out)?)),
        None => None,
    };
    let copied = match &args.copy.write {
        Some(out) => Some(said(copy::written(m, input, out, sound)?)),
        None => None,
    };
    let mut file = CheckedFile {
        path: input.path.to_string_lossy().into_owned(),
        path_hex: path_hex(&input.path),
        format: Some(m.format),
        triangles: Some(m.mesh.soup.triangles.count() as u64),
        unit: Some(m.unit.symbol()),
        unit_assumed: m.unit_assumed,
        bounds_m: m.mesh.bounds().map(|b| b.map(|p| p.map(|x| x * metres))),
        sound: Some(sound),
        tested,
        findings: file_findings,
        error: None,
        bodies,
        mended,
        copied,
        picture: None,
    };
    if let Some(out) = &args.copy.picture {
        report::picture::draw(out, &m.mesh, &file)?;
        file.picture = Some(out.to_string_lossy().into_owned());
    }
    Ok((file, warnings, m.beside.clone()))
}

fn checked(mesh: &Mesh, body: &Body, findings: Vec<Finding>, metres: f64) -> CheckedBody {
    let volume = mesh
        .solid(body, None)
        .ok()
        .map(|s| s.moments.zeroth * metres.powi(3));
    let sound = body.closed && volume.is_some() && !findings.iter().any(Finding::is_unsound);
    CheckedBody {
        id: body.id.clone(),
        name: body.name.clone(),
        triangles: body.triangles as u64,
        shells: body.shell_count() as u64,
        voids: body.void_count() as u64,
        closed: body.closed,
        sound,
        turned: body.turned,
        bounds_m: body.bounds.map(|p| p.map(|x| x * metres)),
        volume_m3: volume.filter(|v| v.is_finite()),
        area_m2: Some(mesh.area(body) * metres * metres).filter(|a| a.is_finite()),
        findings,
    }
}
