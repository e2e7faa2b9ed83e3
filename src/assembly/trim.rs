//! The question of `trim`: places, limits and states of an assembly.

use nalgebra::Vector3;

use super::file::{BallastPlace, Entry};
use super::load::{Input, Loaded};
use super::resolve::resolve;
use super::rollup::Total;
use super::source::MeshFiles;
use crate::ballast::{Place, Placed, Problem, State, Sure};
use crate::error::Error;
use crate::limits::Limit;
use crate::moments::Moments;

/// Puts the question.
///
/// `limits` must hold in all of `states`, one of which has no name where there is only the assembly
/// as it stands. The files of meshes that ballast is shaped by come second.
///
/// # Errors
/// Faults of the meshes of places.
pub fn ballast_problem(
    loaded: &Loaded,
    total: &Total,
    limits: Vec<Limit>,
    states: Vec<State>,
    sure: Option<Sure>,
    meshes: &mut dyn MeshFiles,
) -> Result<(Problem, Vec<Input>), Vec<Error>> {
    let mut errors = Vec::new();
    let mut inputs = Vec::new();
    let mut places = Vec::new();
    for place in &loaded.file.ballast {
        match place_of(place, loaded, meshes, &mut inputs) {
            Ok(p) => places.push(p),
            Err(e) => errors.extend(e),
        }
    }
    if !errors.is_empty() {
        return Err(errors);
    }
    let [lo, hi] = total.bounds_m.map(Vector3::from);
    let problem = Problem {
        places,
        limits,
        states,
        diagonal: (hi - lo).norm(),
        sure,
    };
    Ok((problem, inputs))
}

fn place_of(
    place: &BallastPlace,
    loaded: &Loaded,
    meshes: &mut dyn MeshFiles,
    inputs: &mut Vec<Input>,
) -> Result<Place, Vec<Error>> {
    let mut most = place.most;
    let per_kg = match &place.part {
        None => Moments::point(Vector3::from(place.at), 1.0),
        Some(part) => {
            // The shape alone, weighed like any part of the file.
            let mut alone = loaded.clone();
            alone.file.entries = vec![Entry::Part(part.clone())];
            alone.warnings.clear();
            let resolved = resolve(&alone, meshes)?;
            if !resolved.refused.is_empty() {
                return Err(resolved.refused);
            }
            for input in resolved.inputs {
                if !loaded.inputs.contains(&input) && !inputs.contains(&input) {
                    inputs.push(input);
                }
            }
            let whole = resolved
                .weighed
                .iter()
                .map(|w| w.moments)
                .reduce(|a, b| a.plus(&b))
                .unwrap_or_else(|| Moments::zero(Vector3::zeros()));
            let full = whole.zeroth;
            most = Some(most.map_or(full, |m| m.min(full)));
            whole.weighted(1.0 / full)
        }
    };
    Ok(Place {
        name: place.name.clone(),
        per_kg,
        least: place.least,
        most,
        step: place.step,
        relative: place.relative,
        absolute: 0.0,
    })
}

/// The answer as an assembly file of its own, for a group's `include`: items where the ballast
/// goes, with the inertia of what has a shape.
pub fn ballast_items(name: &str, ballast: &[Placed], places: &[Place]) -> String {
    let quoted = |s: &str| toml::Value::String(s.to_owned()).to_string();
    let mut out = format!(
        "# Ballast worked out for {name}.\n[assembly]\nname = \"ballast\"\nunit = \"m\"\n",
        name = name.replace(['\n', '\r'], " ")
    );
    for b in ballast {
        let [x, y, z] = b.at_m;
        // A double is printed so that it reads back to the same bits.
        out.push_str(&format!(
            "\n[[item]]\nname = {}\nmass = \"{} kg\"\nat = [\"{x} m\", \"{y} m\", \"{z} m\"]\n",
            quoted(&b.place),
            b.mass_kg
        ));
        if let Some(n) = b.units {
            out.push_str(&format!("# {n} unit weights\n"));
        }
        let shape = places
            .iter()
            .find(|p| p.name == b.place)
            .and_then(|p| p.per_kg.inertia());
        if let Some(i) = shape.map(|i| i * b.mass_kg)
            && i.amax() > 0.0
        {
            out.push_str(&format!(
                "inertia = {{ xx = \"{} kg m2\", yy = \"{} kg m2\", zz = \"{} kg m2\", xy = \"{} kg m2\", xz = \"{} kg m2\", yz = \"{} kg m2\" }}\n",
                i[(0, 0)], i[(1, 1)], i[(2, 2)], i[(0, 1)], i[(0, 2)], i[(1, 2)]
            ));
        }
    }
    out
}
