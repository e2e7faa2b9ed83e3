//! The whole from its things: total, subtotals, verdicts.

use nalgebra::{Matrix3, Vector3};
use serde::{Serialize, Serializer};
use serde_json::Value;

use super::expect::Expectation;
use super::load::Loaded;
use super::open::{self, MassBounds};
use super::overlap::{self, Overlap};
use super::resolve::{Basis, Resolved, Source, Weighed, around};
use super::sum;
use crate::error::{Error, Kind};
use crate::limits::{Judged, Measured, Verdict};
use crate::moments::{Moments, principal};

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
    /// null: not computed.
    pub uncertainty: Option<Value>,
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

/// One thing of the assembly.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct PartRow {
    /// Such as `boom/nozzle#2`.
    pub path: String,
    /// `{"file","body","bodies"}`, or `"item"`.
    #[serde(serialize_with = "source")]
    pub source: Source,
    /// Its material; null for an item, for a measured part that names none, and for several.
    pub material: Option<String>,
    /// The materials of its bodies, where they differ.
    #[serde(skip_serializing_if = "Vec::is_empty")]
    pub materials: Vec<Option<String>>,
    /// kg.
    pub mass_kg: f64,
    /// What the mass rests on.
    pub basis: Basis,
    /// How far its figures may be off, where its mesh is open; absent where it is closed.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub estimate: Option<MassBounds>,
    /// Measured mass / volume.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub implied_density_kg_m3: Option<f64>,
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
    /// Of the total.
    pub share_of_mass: Option<f64>,
    /// How many things rest on it.
    pub parts: usize,
}

fn source<S: Serializer>(source: &Source, s: S) -> Result<S::Ok, S::Error> {
    match source {
        Source::Item => s.serialize_str("item"),
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
    let weighed = &resolved.weighed;
    let mut refused = resolved.refused.iter().cloned();
    let error = refused.next();
    let total = match error {
        Some(_) => None,
        None => Some(total(weighed).map_err(|e| vec![e.in_file(&loaded.file.path)])?),
    };
    let mass = total.as_ref().map(|t| t.mass_kg);
    let limits = total.as_ref().map_or_else(Vec::new, |total| {
        let limits = loaded.file.limits.iter();
        limits.map(|limit| judged(limit, total)).collect()
    });
    Ok(Balance {
        name: loaded.file.name.clone(),
        parts: weighed.iter().map(|w| part_row(w, mass)).collect(),
        by_material: by_material(weighed, mass),
        by_group: by_group(weighed, mass),
        by_basis: by_basis(weighed, mass),
        total,
        overlaps: overlap::overlaps(weighed),
        limits,
        uncertainty: None,
        expectations: resolved.expectations.clone(),
        error,
        more: refused.collect(),
    })
}

/// What arithmetic alone may move: a mass is good to 1e-13 of itself, a centre to 1e-13 of the
/// box diagonal or 4 units in the last place of the coordinate.
pub(super) fn judged(limit: &crate::limits::Limit, total: &Total) -> Judged {
    let (value, rounding) = match limit.quantity {
        Measured::Mass => (total.mass_kg, 1e-13 * total.mass_kg),
        Measured::Centre(axis) => {
            let value = total.centre_of_mass_m[axis];
            let [lo, hi] = total.bounds_m.map(Vector3::from);
            let rounding = 1e-13 * (hi - lo).norm();
            (value, rounding.max(4.0 * f64::EPSILON * value.abs()))
        }
    };
    open::unsure(
        limit.judge(value, rounding),
        limit.quantity,
        total.estimate.as_ref(),
    )
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

fn part_row(w: &Weighed, mass: Option<f64>) -> PartRow {
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
        basis: w.basis,
        estimate: w.estimate,
        implied_density_kg_m3: w.implied_density,
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

fn by_material(weighed: &[Weighed], mass: Option<f64>) -> Vec<MaterialRow> {
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
        let (material, density_kg_m3) = key.unzip();
        MaterialRow {
            material,
            density_kg_m3,
            mass_kg: kg,
            share_of_mass: share(kg, mass),
            parts: parts.len(),
        }
    });
    rows.collect()
}

fn by_group(weighed: &[Weighed], mass: Option<f64>) -> Vec<GroupRow> {
    let mut keyed = Vec::new();
    for w in weighed {
        if w.groups.is_empty() {
            keyed.push(((None, 0), w));
        }
        for (n, group) in w.groups.iter().enumerate() {
            keyed.push(((Some(group.clone()), n + 1), w));
        }
    }
    let text = |(group, depth): &(Option<String>, usize)| match group {
        Some(group) => format!("{depth} {group}"),
        None => String::new(),
    };
    let rows = grouped(keyed.into_iter(), text)
        .into_iter()
        .map(|((group, depth), things)| {
            let moments = sum::total(things.iter().map(|w| &w.moments));
            GroupRow {
                group,
                depth,
                mass_kg: moments.zeroth,
                centre_of_mass_m: moments.centre().map(plain),
                share_of_mass: share(moments.zeroth, mass),
                parts: things.len(),
            }
        });
    rows.collect()
}

fn by_basis(weighed: &[Weighed], mass: Option<f64>) -> Vec<BasisRow> {
    let mut groups = grouped(weighed.iter().map(|w| (w.basis, w)), |b| format!("{b:?}"));
    groups.sort_by_key(|(basis, _)| *basis);
    let rows = groups.into_iter().map(|(basis, things)| {
        let kg = sum::sum(things.iter().map(|w| w.moments.zeroth));
        BasisRow {
            basis,
            mass_kg: kg,
            share_of_mass: share(kg, mass),
            parts: things.len(),
        }
    });
    rows.collect()
}
