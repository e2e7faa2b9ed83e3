//! One file: read, audited, weighed, as rows.

use std::collections::BTreeMap;
use std::path::Path;

use sha2::{Digest, Sha256};

use super::{Options, Row};
use crate::error::{Error, Result};
use crate::format::{self, Bytes};
use crate::masses::Figures;
use crate::mesh::{Body, Mesh};
use crate::soundness::{self, Finding, Severity};

/// Program and version, as rows carry them.
pub(super) const PROGRAM: &str = concat!(env!("CARGO_PKG_NAME"), " ", env!("CARGO_PKG_VERSION"));

/// SHA-256 in hexadecimal.
pub(super) fn digest(bytes: &[u8]) -> String {
    Sha256::digest(bytes)
        .iter()
        .map(|b| format!("{b:02x}"))
        .collect()
}

/// What all rows of a file share.
pub(super) fn row_of_file(path: &Path) -> Row {
    Row {
        path: Some(path.to_string_lossy().into_owned()),
        path_hex: path.to_str().is_none().then(|| {
            let bytes = path.as_os_str().as_encoded_bytes();
            bytes.iter().map(|b| format!("{b:02x}")).collect()
        }),
        program: Some(PROGRAM.to_owned()),
        ..Row::default()
    }
}

/// The row of a file that could not be read.
pub(super) fn failed(mut row: Row, error: &Error) -> Row {
    row.bodies = Some(0);
    row.error_kind = Some(error.kind.to_string());
    row.error = Some(error.message.clone());
    row.error_advice = Some(error.advice.clone());
    row.error_line = error.line;
    row.error_byte = error.byte;
    row
}

/// The rows of a file whose bytes are here: one a body, or one that says why there is none. Masses
/// are not in them.
pub(super) fn rows(bytes: Bytes, base: Row, path: &Path, options: &Options) -> Vec<Row> {
    match bodies(bytes, &base, path, options) {
        Ok(rows) => rows,
        Err(e) => vec![failed(base, &e)],
    }
}

/// Reads and welds a file as all commands do.
pub(super) fn mesh(bytes: Bytes, path: &Path, options: &Options) -> Result<(Mesh, f64, bool)> {
    let soup = format::read(bytes, path, None)?;
    let stated = options.unit.or(soup.unit);
    let stem = path
        .file_stem()
        .map_or("body".into(), |s| s.to_string_lossy());
    let metres = stated.unwrap_or_default().metres();
    Ok((Mesh::new(soup, &stem)?, metres, stated.is_none()))
}

fn bodies(bytes: Bytes, base: &Row, path: &Path, options: &Options) -> Result<Vec<Row>> {
    let kind = format::detect(&bytes, path, None)?;
    let (mesh, metres, assumed) = mesh(bytes, path, options)?;
    let mut audit = soundness::audit(&mesh, metres, 1, options.depth());
    let unit = options.unit.or(mesh.soup.unit).unwrap_or_default();
    audit
        .file
        .extend(soundness::unit_suspect(&mesh, unit, assumed, None));
    let file_sound = !audit.file.iter().any(Finding::is_unsound);
    let all = mesh.bodies();
    let base = Row {
        format: Some(kind.name().to_owned()),
        unit: Some(unit.symbol().to_owned()),
        unit_assumed: Some(assumed),
        bodies: Some(all.len() as u64),
        file_findings: told(&audit.file),
        overlap_tested: Some(options.overlap),
        ..base.clone()
    };
    if all.is_empty() {
        return Ok(vec![Row {
            triangles: Some(mesh.soup.triangles.count() as u64),
            sound: Some(false),
            ..base
        }]);
    }
    let rows = all.iter().zip(&audit.bodies);
    Ok(rows
        .map(|(body, findings)| row(&mesh, body, findings, &base, metres, file_sound))
        .collect())
}

fn row(
    mesh: &Mesh,
    body: &Body,
    findings: &[Finding],
    base: &Row,
    metres: f64,
    file_sound: bool,
) -> Row {
    let solid = mesh.solid(body, None);
    let figures = match &solid {
        Ok(solid) => Figures::of(solid, &body.bounds, metres, None, None),
        Err(_) => Figures {
            area_m2: Some(mesh.area(body) * metres * metres).filter(|a| a.is_finite()),
            ..Figures::unknown(Some(body.bounds.map(|p| p.map(|x| x * metres))))
        },
    };
    let unsound = findings.iter().any(Finding::is_unsound);
    let doubts = findings.iter().filter(|f| f.severity == Severity::Doubts);
    let doubts: Vec<f64> = doubts.filter_map(|f| f.volume_effect_m3).collect();
    let [cx, cy, cz] = of(figures.centroid_m);
    let corners = figures.bounds_m.unwrap_or([[f64::NAN; 3]; 2]);
    let [low, high] = corners.map(|p| p.map(finite));
    let tensor = figures.volume_inertia_m5;
    let t = |i: usize, j: usize| tensor.map(|t| t[i][j]);
    let [p1, p2, p3] = of(figures.principal_volume_moments_m5);
    Row {
        body: Some(body.id.clone()),
        name: body.name.clone(),
        triangles: Some(body.triangles as u64),
        shells: Some(body.shell_count() as u64),
        voids: Some(body.void_count() as u64),
        closed: Some(body.closed),
        sound: Some(body.closed && solid.is_ok() && !unsound && file_sound),
        turned: Some(body.turned),
        findings: told(findings),
        refused: solid.as_ref().err().map(|r| r.kind.to_owned()),
        volume_m3: figures.volume_m3,
        volume_doubt_m3: (!doubts.is_empty()).then(|| doubts.iter().map(|x| x.abs()).sum()),
        area_m2: figures.area_m2,
        condition: figures.condition.and_then(finite),
        centroid_x_m: cx,
        centroid_y_m: cy,
        centroid_z_m: cz,
        bounds_low_x_m: low[0],
        bounds_low_y_m: low[1],
        bounds_low_z_m: low[2],
        bounds_high_x_m: high[0],
        bounds_high_y_m: high[1],
        bounds_high_z_m: high[2],
        inertia_xx_m5: t(0, 0),
        inertia_yy_m5: t(1, 1),
        inertia_zz_m5: t(2, 2),
        inertia_xy_m5: t(0, 1),
        inertia_xz_m5: t(0, 2),
        inertia_yz_m5: t(1, 2),
        principal_1_m5: p1,
        principal_2_m5: p2,
        principal_3_m5: p3,
        ..base.clone()
    }
}

fn finite(x: f64) -> Option<f64> {
    Some(x).filter(|x| x.is_finite())
}

fn of(p: Option<[f64; 3]>) -> [Option<f64>; 3] {
    p.map_or([None; 3], |p| p.map(finite))
}

/// Kinds with their counts, in the order of kinds; `None` for nothing found.
fn told(findings: &[Finding]) -> Option<String> {
    let mut counts = BTreeMap::new();
    for f in findings {
        *counts.entry(f.kind).or_insert(0u64) += f.count;
    }
    let words: Vec<String> = counts
        .iter()
        .map(|(kind, n)| format!("{} {n}", kind.name()))
        .collect();
    (!words.is_empty()).then(|| words.join(", "))
}
