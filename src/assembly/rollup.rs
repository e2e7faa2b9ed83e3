//! The whole from its things: total, subtotals, verdicts.

use nalgebra::{Matrix3, Vector3};
use serde::{Serialize, Serializer};

use super::expect::Expectation;
use super::growth::Growth;
use super::load::Loaded;
use super::open::{self, MassBounds};
use super::overlap::{self, Overlap};
use super::resolve::{Basis, Resolved, Source, Weighed, around};
use super::service::Seen;
use super::standing::{self, Statics};
use super::sum;
use super::sure::Sure;
use crate::error::{Error, Kind, Warning};
use crate::limits::{Judged, Verdict};
use crate::masses::PrintFigures;
use crate::moments::{Moments, principal};
use crate::progress::Progress;
use crate::uncertainty::{Sampling, Uncertainty};

/// The answer to `balance`. Its fields are those of the JSON document; SI units, in the names;
/// lengths and axes are the assembly's.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Balance {
    /// Name of the assembly.
    pub name: String,
    /// The whole; null where a body cannot be weighed.
    pub total: Option<Total>,
    /// What could be weighed, in file order.
    pub parts: Vec<PartRow>,
    /// Subtotals by material and density, in the order of their first part; items and measured
    /// parts without a material stand under null.
    pub by_material: Vec<MaterialRow>,
    /// Subtotals by group, outer before inner; what stands in no group is under null.
    pub by_group: Vec<GroupRow>,
    /// Subtotals by what a mass rests on.
    pub by_basis: Vec<BasisRow>,
    /// Parts that occupy the same space.
    pub overlaps: Vec<Overlap>,
    /// Each limit's verdict, in file order; none where there is no total.
    pub limits: Vec<Judged>,
    /// What supports and lines carry, and when it tips; where the file asks for it.
    #[serde(flatten)]
    pub statics: Statics,
    /// What the figures throw doubt on.
    #[serde(skip)]
    pub warnings: Vec<Warning>,
    /// How far the figures may be off; null where nothing in the assembly has a tolerance.
    pub uncertainty: Option<Uncertainty>,
    /// Tolerances were stated, and yet nothing bounds the figures.
    #[serde(skip)]
    pub unbounded: bool,
    /// Basic and predicted mass; absent where no part carries a maturity.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub growth: Option<Growth>,
    /// Parts against the figures that they must have, in file order.
    pub expectations: Vec<Expectation>,
    /// Why there is no total.
    pub error: Option<Error>,
    /// Further reasons.
    #[serde(skip_serializing_if = "Vec::is_empty")]
    pub more: Vec<Error>,
}

/// Mass, centre and inertia of the whole.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Total {
    /// kg.
    pub mass_kg: f64,
    /// m.
    pub centre_of_mass_m: [f64; 3],
    /// About the centre of mass; off-diagonals are −∫xy dm.
    pub inertia_kg_m2: [[f64; 3]; 3],
    /// Ascending.
    pub principal_moments_kg_m2: [f64; 3],
    /// Rows, right-handed.
    pub principal_axes: [[f64; 3]; 3],
    /// Indices of axes that may be any in a plane or space.
    pub axes_free: Vec<usize>,
    /// √(principal moment / mass).
    pub radii_of_gyration_m: [f64; 3],
    /// Box of all meshes, and of items by their shape (points where none is known).
    pub bounds_m: [[f64; 3]; 2],
    /// How far the figures may be off for the open meshes in it; absent where there is none.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub estimate: Option<MassBounds>,
    /// Moments that all this is derived from.
    #[serde(skip)]
    pub moments: Moments,
}

/// What the facets of a part do to its figures: the mesh's minus the curved part's.
#[derive(Clone, Copy, Debug, PartialEq, Serialize)]
pub struct PartFacets {
    /// What the part's figures are of: `flat` facets as they stand, or the `curved` part.
    pub figures: &'static str,
    /// kg.
    pub mass_error_kg: f64,
    /// How far the mass's error may itself be off, kg.
    pub mass_doubt_kg: f64,
    /// m, in the assembly's axes.
    pub centre_error_m: [f64; 3],
}

/// One thing of the assembly.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct PartRow {
    /// Such as `boom/nozzle#2`.
    pub path: String,
    /// `{"file","body","bodies"}`, `"item"`, or `"smear"`.
    #[serde(serialize_with = "source")]
    pub source: Source,
    /// Its material; null for an item, for a measured part that names none, and for several.
    pub material: Option<String>,
    /// The materials of its bodies, where they differ.
    #[serde(skip_serializing_if = "Vec::is_empty")]
    pub materials: Vec<Option<String>>,
    /// kg.
    pub mass_kg: f64,
    /// Standard uncertainty of the mass; null where it was not computed.
    pub mass_standard_kg: Option<f64>,
    /// Standard uncertainty of the centre; null where it was not computed.
    pub centre_standard_m: Option<[f64; 3]>,
    /// How far along its design is, where that is stated.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub maturity: Option<String>,
    /// With its growth allowance, where it has a maturity.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub predicted_mass_kg: Option<f64>,
    /// What the mass rests on.
    pub basis: Basis,
    /// How far its figures may be off, where its mesh is open; absent where it is closed.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub estimate: Option<MassBounds>,
    /// What its facets do, where they stand for curves; absent where that is not known or nothing.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub facets: Option<PartFacets>,
    /// Measured mass / volume.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub implied_density_kg_m3: Option<f64>,
    /// How it is printed; absent for a solid.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub made: Option<PrintFigures>,
    /// Of the material, where it is one.
    pub density_kg_m3: Option<f64>,
    /// Of the mesh.
    pub volume_m3: Option<f64>,
    /// m.
    pub centre_of_mass_m: Option<[f64; 3]>,
    /// About its own centre of mass, in the assembly's axes.
    pub inertia_kg_m2: Option<[[f64; 3]; 3]>,
    /// Of the total, 0 to 1; null where there is no total.
    pub share_of_mass: Option<f64>,
    /// Box in the assembly's axes.
    pub bounds_m: [[f64; 3]; 2],
}

/// Subtotal of a material.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct MaterialRow {
    /// null: bought in, or measured without a material.
    pub material: Option<String>,
    /// kg/m³.
    pub density_kg_m3: Option<f64>,
    /// kg.
    pub mass_kg: f64,
    /// Its standard uncertainty; null where it was not computed.
    pub mass_standard_kg: Option<f64>,
    /// Of the total.
    pub share_of_mass: Option<f64>,
    /// How many things have it.
    pub parts: usize,
}

/// Subtotal of a group.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct GroupRow {
    /// Path of the group; null: what stands in none.
    pub group: Option<String>,
    /// 1 for a group that stands in none. The rows of depth 1 and the null row add up.
    pub depth: usize,
    /// kg.
    pub mass_kg: f64,
    /// Its standard uncertainty; null where it was not computed.
    pub mass_standard_kg: Option<f64>,
    /// m.
    pub centre_of_mass_m: Option<[f64; 3]>,
    /// Of the total.
    pub share_of_mass: Option<f64>,
    /// How many things stand in it.
    pub parts: usize,
}

/// Subtotal of a basis.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct BasisRow {
    /// What these masses rest on.
    pub basis: Basis,
    /// kg.
    pub mass_kg: f64,
    /// Its standard uncertainty; null where it was not computed.
    pub mass_standard_kg: Option<f64>,
    /// Of the total.
    pub share_of_mass: Option<f64>,
    /// How many things rest on it.
    pub parts: usize,
}

fn source<S: Serializer>(source: &Source, s: S) -> Result<S::Ok, S::Error> {
    match source {
        Source::Item => s.serialize_str("item"),
        Source::Smear => s.serialize_str("smear"),
        Source::Mesh { file, body, bodies } => {
            let value = serde_json::json!({ "file": file, "body": body, "bodies": bodies });
            value.serialize(s)
        }
    }
}

impl Balance {
    /// 0 all is well, 1 a limit or an expectation is broken, 2 there is no total.
    pub fn exit(&self) -> u8 {
        let broken = |verdict: &Verdict| *verdict == Verdict::Broken;
        if self.total.is_none() {
            2
        } else if self.limits.iter().any(|l| broken(&l.verdict))
            || self.expectations.iter().any(|e| broken(&e.verdict))
        {
            1
        } else {
            0
        }
    }
}

/// Adds up what was weighed and judges the limits of the outermost file.
///
/// # Errors
/// `empty` where nothing has any mass, `not-finite` where a sum is too large for a double.
pub fn balance(loaded: &Loaded, resolved: &Resolved) -> Result<Balance, Vec<Error>> {
    balance_with(loaded, resolved, None, Progress::NONE)
}

/// As [`balance`], with the uncertainty sampled too where asked; says how far it is.
///
/// # Errors
/// As [`balance`].
pub fn balance_with(
    loaded: &Loaded,
    resolved: &Resolved,
    sampling: Option<Sampling>,
    progress: Progress<'_>,
) -> Result<Balance, Vec<Error>> {
    let weighed = &resolved.weighed;
    let mut refused = resolved.refused.iter().cloned();
    let error = refused.next();
    let total = match error {
        Some(_) => None,
        None => Some(total(weighed).map_err(|e| vec![e.in_file(&loaded.file.path)])?),
    };
    let mass = total.as_ref().map(|t| t.mass_kg);
    let mut sure = total
        .as_ref()
        .and_then(|total| Sure::of(loaded, resolved, &total.moments));
    if let (Some(sure), Some(sampling)) = (&mut sure, sampling) {
        sure.sample(&loaded.file.limits, sampling);
    }
    let sure = sure.as_ref();
    let limits = match &total {
        None => Vec::new(),
        Some(total) => {
            let seen = seen(loaded, resolved).map_err(|e| vec![e])?;
            let limits = loaded.file.limits.iter().zip(&seen);
            limits
                .map(|(limit, seen)| judged(limit, total, seen, sure))
                .collect()
        }
    };
    let (statics, warnings) = match &total {
        Some(t) => {
            let centre = Vector3::from(t.centre_of_mass_m);
            let mut centre_at = |down: &Vector3<f64>| match (&resolved.service, &resolved.state) {
                (Some(service), Some(state)) if !service.tanks().is_empty() => {
                    service.centre_when(state, down)
                }
                _ => Ok(centre),
            };
            standing::statics(&loaded.file, t.mass_kg, &mut centre_at).map_err(|e| vec![e])?
        }
        None => Default::default(),
    };
    Ok(Balance {
        name: loaded.file.name.clone(),
        parts: weighed
            .iter()
            .enumerate()
            .map(|(n, w)| part_row(n, w, mass, sure))
            .collect(),
        by_material: by_material(weighed, mass, sure),
        by_group: by_group(weighed, mass, sure),
        by_basis: by_basis(weighed, mass, sure),
        total,
        overlaps: overlap::overlaps(weighed, progress),
        limits,
        statics,
        warnings,
        uncertainty: sure.and_then(|s| s.uncertainty.clone()),
        unbounded: sure.is_some_and(|s| s.unbounded),
        growth: sure.and_then(|s| s.growth.clone()),
        expectations: resolved.expectations.clone(),
        error,
        more: refused.collect(),
    })
}

/// What the limits of the file need to know of the state beyond its moments.
fn seen(loaded: &Loaded, resolved: &Resolved) -> Result<Vec<Seen>, Error> {
    let limits = loaded.file.limits.iter();
    let (Some(service), Some(state)) = (&resolved.service, &resolved.state) else {
        return Ok(limits.map(|_| Seen::default()).collect());
    };
    let snapshot = service.at(state)?;
    limits
        .map(|l| service.seen(l, state, &snapshot, loaded.file.stand.as_ref()))
        .collect()
}

pub(super) fn judged(
    limit: &crate::limits::Limit,
    total: &Total,
    seen: &Seen,
    sure: Option<&Sure>,
) -> Judged {
    let [lo, hi] = total.bounds_m.map(Vector3::from);
    let diagonal = (hi - lo).norm();
    let judged = seen.judge(limit, &total.moments, diagonal);
    let value = judged.basic.unwrap_or(judged.value);
    let judged = open::unsure(judged, &limit.quantity, total.estimate.as_ref());
    match sure {
        // How the slope answers with its liquid level at every attitude is not worked out; of the
        // surface as it stands it would be too sure.
        Some(sure) if seen.slope.is_none() => sure.judge(limit, value, judged),
        _ => judged,
    }
}

pub(super) fn total(weighed: &[Weighed]) -> Result<Total, Error> {
    let moments = sum::total(weighed.iter().map(|w| &w.moments));
    let mass = moments.zeroth;
    if mass == 0.0 {
        return Err(Error::new(
            Kind::Empty,
            "nothing in this assembly has any mass",
            "state the mass of an [[item]], or add a [[part]]",
        ));
    }
    let bounds = around(weighed.iter().map(|w| w.bounds));
    let (Some(centre), Some(inertia)) = (moments.centre(), moments.inertia()) else {
        return Err(not_finite());
    };
    let finite = mass.is_finite()
        && inertia.iter().all(|x| x.is_finite())
        && bounds.iter().flatten().all(|x| x.is_finite());
    if !finite {
        return Err(not_finite());
    }
    let p = principal(&inertia);
    Ok(Total {
        mass_kg: mass,
        centre_of_mass_m: plain(centre),
        inertia_kg_m2: rows(&inertia),
        principal_moments_kg_m2: p.moments,
        principal_axes: p.axes,
        axes_free: p.free,
        // Rounding may leave the least moment of a rod a little below zero.
        radii_of_gyration_m: p.moments.map(|m| (m.max(0.0) / mass).sqrt()),
        bounds_m: bounds,
        estimate: open::of_total(weighed, centre, mass),
        moments,
    })
}

fn not_finite() -> Error {
    Error::new(
        Kind::NotFinite,
        "the figures of this assembly are too large for floating point",
        "check the unit and the largest masses and distances",
    )
}

/// −0 is written as 0.
pub(super) fn plain(v: Vector3<f64>) -> [f64; 3] {
    [v.x + 0.0, v.y + 0.0, v.z + 0.0]
}

pub(super) fn rows(m: &Matrix3<f64>) -> [[f64; 3]; 3] {
    std::array::from_fn(|r| std::array::from_fn(|c| m[(r, c)] + 0.0))
}

fn share(of: f64, mass: Option<f64>) -> Option<f64> {
    mass.map(|mass| of / mass)
}

fn facets(w: &Weighed) -> Option<PartFacets> {
    let bias = w.facets?;
    let moved = match bias.corrected {
        true => w.moments.plus(&bias.moments).centre()? - w.moments.centre()?,
        false => w.moments.centre()? - w.moments.plus(&bias.moments.weighted(-1.0)).centre()?,
    };
    let none = bias.moments.zeroth == 0.0 && bias.doubt_kg == 0.0;
    (!none).then(|| PartFacets {
        figures: if bias.corrected { "curved" } else { "flat" },
        mass_error_kg: bias.moments.zeroth,
        mass_doubt_kg: bias.doubt_kg,
        centre_error_m: moved.into(),
    })
}

fn part_row(n: usize, w: &Weighed, mass: Option<f64>, sure: Option<&Sure>) -> PartRow {
    let (mass_standard_kg, centre_standard_m) = sure.and_then(|s| s.standards([n])).unzip();
    let (maturity, predicted_mass_kg) = sure.and_then(|s| s.maturity(n, w.moments.zeroth)).unzip();
    let mut pieces = w.pieces.iter().map(|p| p.material.as_ref());
    let first = pieces.next().flatten();
    let one = pieces.all(|m| m == first);
    let material = first.filter(|_| one);
    let name = |p: &super::resolve::Piece| p.material.as_ref().map(|m| m.name.clone());
    PartRow {
        path: w.path.clone(),
        source: w.source.clone(),
        material: material.map(|m| m.name.clone()),
        materials: if one {
            Vec::new()
        } else {
            w.pieces.iter().map(name).collect()
        },
        mass_kg: w.moments.zeroth,
        mass_standard_kg,
        centre_standard_m,
        maturity,
        predicted_mass_kg,
        basis: w.basis,
        estimate: w.estimate,
        facets: facets(w),
        implied_density_kg_m3: w.implied_density,
        made: w.made.clone(),
        density_kg_m3: material.map(|m| m.density.value),
        volume_m3: w.volume,
        centre_of_mass_m: centre(w),
        inertia_kg_m2: match w.moments.inertia() {
            Some(inertia) => Some(rows(&inertia)),
            // An item of no mass still has its place.
            None => (w.moments.zeroth == 0.0).then_some([[0.0; 3]; 3]),
        },
        share_of_mass: share(w.moments.zeroth, mass),
        bounds_m: w.bounds,
    }
}

fn centre(w: &Weighed) -> Option<[f64; 3]> {
    match w.moments.centre() {
        Some(centre) => Some(plain(centre)),
        None => (w.moments.zeroth == 0.0).then(|| plain(w.moments.about)),
    }
}

/// Things grouped by a key, in the order in which the keys first appear.
fn grouped<'t, K: PartialEq, T>(
    things: impl Iterator<Item = (K, &'t T)>,
    key_of: impl Fn(&K) -> String,
) -> Vec<(K, Vec<&'t T>)> {
    let mut groups: Vec<(K, Vec<&'t T>)> = Vec::new();
    let mut index = std::collections::HashMap::new();
    for (key, thing) in things {
        let at = *index.entry(key_of(&key)).or_insert_with(|| {
            groups.push((key, Vec::new()));
            groups.len() - 1
        });
        groups[at].1.push(thing);
    }
    groups
}

/// Standard uncertainty of the mass of some things.
fn mass_standard(sure: Option<&Sure>, things: impl IntoIterator<Item = usize>) -> Option<f64> {
    sure?.standards(things).map(|(mass, _)| mass)
}

fn by_material(weighed: &[Weighed], mass: Option<f64>, sure: Option<&Sure>) -> Vec<MaterialRow> {
    let mut owners = Vec::new();
    for (n, w) in weighed.iter().enumerate() {
        owners.extend(w.pieces.iter().map(|p| (n, p)));
    }
    let keyed = owners.iter().map(|owned| {
        let material = owned.1.material.as_ref();
        (material.map(|m| (m.name.clone(), m.density.value)), owned)
    });
    let text = |key: &Option<(String, f64)>| match key {
        Some((name, density)) => format!("{:016x} {name}", density.to_bits()),
        None => String::new(),
    };
    let rows = grouped(keyed, text).into_iter().map(|(key, owned)| {
        let kg = sum::sum(owned.iter().map(|(_, p)| p.moments.zeroth));
        let mut parts: Vec<usize> = owned.iter().map(|(n, _)| *n).collect();
        parts.dedup();
        // A part of several materials is not told apart here.
        let whole = parts
            .iter()
            .map(|n| weighed[*n].pieces.len())
            .sum::<usize>()
            == owned.len();
        let standard = if whole {
            mass_standard(sure, parts.iter().copied())
        } else {
            None
        };
        let (material, density_kg_m3) = key.unzip();
        MaterialRow {
            material,
            density_kg_m3,
            mass_kg: kg,
            mass_standard_kg: standard,
            share_of_mass: share(kg, mass),
            parts: parts.len(),
        }
    });
    rows.collect()
}

fn by_group(weighed: &[Weighed], mass: Option<f64>, sure: Option<&Sure>) -> Vec<GroupRow> {
    let owned: Vec<(usize, &Weighed)> = weighed.iter().enumerate().collect();
    let mut keyed = Vec::new();
    for pair in &owned {
        let (_, w) = pair;
        if w.groups.is_empty() {
            keyed.push(((None, 0), pair));
        }
        for (n, group) in w.groups.iter().enumerate() {
            keyed.push(((Some(group.clone()), n + 1), pair));
        }
    }
    let text = |(group, depth): &(Option<String>, usize)| match group {
        Some(group) => format!("{depth} {group}"),
        None => String::new(),
    };
    let rows = grouped(keyed.into_iter(), text)
        .into_iter()
        .map(|((group, depth), things)| {
            let moments = sum::total(things.iter().map(|(_, w)| &w.moments));
            GroupRow {
                group,
                depth,
                mass_kg: moments.zeroth,
                mass_standard_kg: mass_standard(sure, things.iter().map(|(n, _)| *n)),
                centre_of_mass_m: moments.centre().map(plain),
                share_of_mass: share(moments.zeroth, mass),
                parts: things.len(),
            }
        });
    rows.collect()
}

fn by_basis(weighed: &[Weighed], mass: Option<f64>, sure: Option<&Sure>) -> Vec<BasisRow> {
    let owned: Vec<(usize, &Weighed)> = weighed.iter().enumerate().collect();
    let keyed = owned.iter().map(|pair| (pair.1.basis, pair));
    let mut groups = grouped(keyed, |b| format!("{b:?}"));
    groups.sort_by_key(|(basis, _)| *basis);
    let rows = groups.into_iter().map(|(basis, things)| {
        let kg = sum::sum(things.iter().map(|(_, w)| w.moments.zeroth));
        BasisRow {
            basis,
            mass_kg: kg,
            mass_standard_kg: mass_standard(sure, things.iter().map(|(n, _)| *n)),
            share_of_mass: share(kg, mass),
            parts: things.len(),
        }
    });
    rows.collect()
}
