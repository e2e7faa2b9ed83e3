//! What a survey says in short.

use std::collections::{BTreeMap, HashSet};

use serde::Serialize;

use super::Row;

/// How often a kind of finding, or of error, was met.
#[derive(Clone, Debug, PartialEq, Eq, Serialize)]
pub struct KindCount {
    /// The kind.
    pub kind: String,
    /// Bodies that have it; files, for findings of a file as a whole and for errors.
    pub count: u64,
}

/// A heavy body.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Heavy {
    /// Its file.
    pub path: String,
    /// Its id.
    pub body: String,
    /// m³.
    pub volume_m3: f64,
    /// kg; null without a material.
    pub mass_kg: Option<f64>,
    /// Its standard uncertainty by the density's tolerance alone, kg; null where none is stated.
    pub mass_standard_kg: Option<f64>,
}

/// Counts over a table.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Summary {
    /// Files.
    pub files: u64,
    /// Files that could not be read.
    pub unreadable: u64,
    /// Bodies.
    pub bodies: u64,
    /// Bodies that are sound.
    pub sound: u64,
    /// Triangles.
    pub triangles: u64,
    /// The sum of all masses, kg; null where no body has one.
    pub mass_kg: Option<f64>,
    /// Its standard uncertainty by the tolerances of densities, as if all of them were off the same
    /// way, kg; null where none is stated.
    pub mass_standard_kg: Option<f64>,
    /// Kinds of findings, the commonest first.
    pub findings: Vec<KindCount>,
    /// Kinds of errors, the commonest first.
    pub errors: Vec<KindCount>,
    /// The heaviest bodies; the largest, where none has a mass.
    pub heaviest: Vec<Heavy>,
}

/// Bodies that `heaviest` lists.
const HEAVIEST: usize = 5;

impl Summary {
    /// Of the rows of a table.
    pub fn of(rows: &[Row]) -> Self {
        let paths: HashSet<_> = rows.iter().map(|r| (&r.path, &r.path_hex)).collect();
        let mut findings = BTreeMap::new();
        let mut errors = BTreeMap::new();
        let mut seen = HashSet::new();
        for row in rows {
            // Findings of a file stand in the row of each of its bodies.
            let of_file = row
                .file_findings
                .as_ref()
                .filter(|_| seen.insert(&row.path));
            for list in [row.findings.as_ref(), of_file].into_iter().flatten() {
                for entry in list.split(", ") {
                    let kind = entry.rsplit_once(' ').map_or(entry, |e| e.0);
                    *findings.entry(kind).or_insert(0) += 1;
                }
            }
            if let Some(kind) = &row.error_kind {
                *errors.entry(kind.as_str()).or_insert(0) += 1;
            }
        }
        let bodies = || rows.iter().filter(|r| r.body.is_some());
        let masses: Vec<f64> = bodies().filter_map(|r| r.mass_kg).collect();
        let mut heavy: Vec<Heavy> = bodies()
            .filter_map(|r| {
                Some(Heavy {
                    path: r.path.clone()?,
                    body: r.body.clone()?,
                    volume_m3: r.volume_m3?,
                    mass_kg: r.mass_kg,
                    mass_standard_kg: r.mass_standard_kg,
                })
            })
            .filter(|h| masses.is_empty() || h.mass_kg.is_some())
            .collect();
        let weight = |h: &Heavy| h.mass_kg.unwrap_or(h.volume_m3);
        heavy.sort_by(|a, b| weight(b).total_cmp(&weight(a)));
        heavy.truncate(HEAVIEST);
        let standard: Vec<f64> = bodies().filter_map(|r| r.mass_standard_kg).collect();
        Self {
            files: paths.len() as u64,
            unreadable: errors.values().sum(),
            bodies: bodies().count() as u64,
            sound: bodies().filter(|r| r.sound == Some(true)).count() as u64,
            triangles: rows.iter().filter_map(|r| r.triangles).sum(),
            mass_kg: (!masses.is_empty()).then(|| masses.iter().sum()),
            mass_standard_kg: (!standard.is_empty()).then(|| standard.iter().sum()),
            findings: commonest(findings),
            errors: commonest(errors),
            heaviest: heavy,
        }
    }
}

fn commonest(counts: BTreeMap<&str, u64>) -> Vec<KindCount> {
    let mut out: Vec<KindCount> = counts
        .into_iter()
        .map(|(kind, count)| KindCount {
            kind: kind.to_owned(),
            count,
        })
        .collect();
    out.sort_by_key(|k| std::cmp::Reverse(k.count));
    out
}
