//! A tank against its mesh.

use std::sync::Arc;

use nalgebra::Vector3;

use super::super::expand::Instance;
use super::super::file::Substance;
use super::super::resolve::{Basis, Piece, Source, Weighed};
use super::super::source::MeshBody;
use super::keys::{Fill, FillOf, Tank};
use super::{Service, State};
use crate::error::{Error, Kind};
use crate::moments::liquid::Vessel;
use crate::moments::{Moments, Placement};
use crate::quantity::Tolerance;

/// A tank that stands in the assembly.
#[derive(Clone, Debug)]
pub struct Contents {
    /// Path of the tank.
    pub path: String,
    /// Its inside, m, in its mesh file's frame.
    pub vessel: Arc<Vessel>,
    /// From that frame to the assembly's, as the file places it.
    pub placement: Placement,
    /// What is in it.
    pub liquid: Substance,
    /// How far the file fills it.
    pub fill: Fill,
    /// The file and line of the tank, for messages.
    pub(super) place: (std::path::PathBuf, u64),
}

impl Contents {
    /// What it holds when full, m³.
    pub fn capacity(&self) -> f64 {
        self.vessel.volume()
    }

    /// An error about it.
    fn error(&self, line: u64, message: String, advice: &str) -> Error {
        Error::new(Kind::Usage, message, advice)
            .in_file(&self.place.0)
            .at_line(line)
    }

    /// The error of a partly filled tank where nothing is up.
    pub(super) fn no_up(&self) -> Error {
        self.error(
            self.place.1,
            format!(
                "tank `{}` is partly filled, and without effective gravity its liquid has no level",
                self.path
            ),
            "state the field or an acceleration in [gravity], or fill the tank wholly or not at all",
        )
    }
}

/// The tank as a thing, and what is needed to fill it otherwise. The liquid's moments follow once
/// the state is known: nothing is in it yet.
pub(in crate::assembly) fn weighed_tank(
    instance: &Instance<'_>,
    tank: &Tank,
    vessel: Arc<Vessel>,
    bodies: &[Arc<dyn MeshBody>],
) -> (Weighed, Contents) {
    let ids: Vec<String> = bodies.iter().map(|b| b.figures().id.clone()).collect();
    let body = match ids.as_slice() {
        [one] => Some(one.clone()),
        _ => tank.mesh.body.clone(),
    };
    let at = instance.placement.apply(&vessel.whole().about);
    let moments = Moments::zero(at);
    let weighed = Weighed {
        path: instance.path.clone(),
        groups: instance.groups.to_vec(),
        source: Source::Mesh {
            file: tank.mesh.typed.clone(),
            body,
            bodies: ids,
        },
        basis: Basis::Computed,
        pieces: vec![Piece {
            material: Some(tank.liquid.clone()),
            moments,
        }],
        stands: Vec::new(),
        moments,
        uneven: false,
        estimate: None,
        facets: None,
        made: None,
        rates: Vec::new(),
        volume: Some(0.0),
        implied_density: None,
        bounds: [at.into(), at.into()],
    };
    let path = instance.file().map(|f| f.path.clone()).unwrap_or_default();
    let contents = Contents {
        path: instance.path.clone(),
        vessel,
        placement: instance.placement,
        liquid: tank.liquid.clone(),
        fill: tank.fill,
        place: (path, tank.line),
    };
    (weighed, contents)
}

impl Service {
    /// The volume that a stated fill means in a tank at the attitude of `state`, m³.
    ///
    /// # Errors
    /// More than the tank holds; a level where nothing is up.
    pub fn fill_volume(&self, tank: usize, fill: &Fill, state: &State) -> Result<f64, Error> {
        let t = &self.tanks[tank];
        let whole = t.capacity();
        let amount = fill.amount.value;
        let volume = match fill.of {
            FillOf::Share => amount * whole,
            FillOf::Volume => amount,
            FillOf::Mass => amount / t.liquid.density.value,
            FillOf::Level => {
                let Some(effective) = state.effective else {
                    return Err(t.error(
                        fill.line,
                        format!(
                            "the fill of tank `{}` is a level, and without effective gravity nothing is level",
                            t.path
                        ),
                        "give the fill in per cent, as a volume or a mass, or state the field in [gravity]",
                    ));
                };
                let placement = self.placement_of_tank(tank, state);
                let up: Vector3<f64> = placement.turn.transpose() * -effective.normalize();
                let levelled = t.vessel.levelled(up);
                let depth = levelled.high() - levelled.low();
                if amount > depth * (1.0 + 1e-12) {
                    return Err(t.error(
                        fill.line,
                        format!(
                            "a level of {amount} m is above the top of tank `{}`, which is {depth} m deep at this attitude",
                            t.path
                        ),
                        "check the unit of the level, and the mesh of the tank",
                    ));
                }
                return Ok(levelled.below(levelled.low() + amount).0);
            }
        };
        // Full is full, though a capacity in litres was rounded when it was typed.
        if volume > whole * (1.0 + 1e-9) {
            return Err(t.error(
                fill.line,
                format!(
                    "{volume} m³ is more than tank `{}` holds: {whole} m³",
                    t.path
                ),
                "check the fill and its unit, and the mesh of the tank",
            ));
        }
        Ok(volume.min(whole))
    }

    /// How the liquid of a tank changes with its fill as stated; `None` where it has no free
    /// surface in the state, or no such tank stands.
    pub(in crate::assembly) fn fill_rate(&self, path: &str, state: &State) -> Option<FillRate> {
        let n = self.tanks.iter().position(|t| t.path == path)?;
        let tank = &self.tanks[n];
        let snapshot = self.at(state).ok()?;
        let now = snapshot.tanks.get(n).filter(|t| t.stands)?;
        let surface = now.surface.filter(|s| s.area > 0.0)?;
        let by_volume = Moments {
            about: surface.centroid,
            zeroth: 1.0,
            first: Vector3::zeros(),
            second: surface.second / surface.area,
        };
        let fill = state
            .case
            .and_then(|c| self.plan.fills[c].get(&n))
            .unwrap_or(&tank.fill);
        let density = tank.liquid.density.value;
        let (unit, factor) = match fill.of {
            FillOf::Share => ("1", tank.capacity() * density),
            FillOf::Volume => ("m3", density),
            FillOf::Mass => ("kg", 1.0),
            FillOf::Level => ("m", surface.area * density),
        };
        Some(FillRate {
            unit,
            tolerance: fill.amount.tolerance,
            per_unit: by_volume.weighted(factor),
        })
    }
}

/// How liquid changes with the fill of its tank.
#[derive(Clone, Debug)]
pub(in crate::assembly) struct FillRate {
    /// SI unit of the fill.
    pub(in crate::assembly) unit: &'static str,
    /// Of the fill.
    pub(in crate::assembly) tolerance: Option<Tolerance>,
    /// Mass moments for each unit of it, kg, kg m, kg m².
    pub(in crate::assembly) per_unit: Moments,
}
