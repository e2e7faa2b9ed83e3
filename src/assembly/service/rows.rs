//! What `balance` says of tanks and cases.

use serde::Serialize;

use super::super::load::Loaded;
use super::super::rollup::{self, Total, plain};
use super::{Service, State};
use crate::error::Error;
use crate::limits::{Judged, Verdict};

/// A case: the whole in it, and every limit.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct CaseRow {
    /// Its name.
    pub name: String,
    /// The whole.
    pub total: Total,
    /// Each limit's verdict, in file order.
    pub limits: Vec<Judged>,
}

impl CaseRow {
    /// Whether a limit is broken in it.
    pub fn broken(&self) -> bool {
        self.limits.iter().any(|l| l.verdict == Verdict::Broken)
    }
}

/// A tank as it is filled.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct TankRow {
    /// Its path.
    pub path: String,
    /// What is in it.
    pub liquid: String,
    /// What it holds when full.
    pub capacity_m3: f64,
    /// What is in it.
    pub volume_m3: f64,
    /// kg.
    pub mass_kg: f64,
    /// What is free above the liquid.
    pub ullage_m3: f64,
    /// Volume over capacity.
    pub fill: f64,
    /// Height of the free surface above the tank's lowest point, along effective up; null where
    /// nothing is up.
    pub level_m: Option<f64>,
    /// Of the free surface; null where there is none.
    pub surface_area_m2: Option<f64>,
    /// Its centroid in the assembly's frame: where the next drop goes.
    pub surface_centroid_m: Option<[f64; 3]>,
    /// Separate pools, the largest first; none where the liquid hangs together.
    pub pools: Vec<PoolRow>,
}

/// Liquid that hangs together.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct PoolRow {
    /// Its volume.
    pub volume_m3: f64,
    /// Its centroid in the assembly's frame.
    pub centroid_m: [f64; 3],
}

impl Service {
    /// The number of a case, by its name.
    pub fn case_named(&self, name: &str) -> Option<usize> {
        self.cases().iter().position(|c| c.name == name)
    }

    /// Every case with its total, and the limits judged in it.
    ///
    /// # Errors
    /// As [`Service::rest`] and [`Service::at`]; a case in which nothing has any mass.
    pub fn case_rows(&self, loaded: &Loaded) -> Result<Vec<CaseRow>, Error> {
        let cases = self.cases().iter().enumerate();
        cases
            .map(|(n, case)| {
                let wrong = |e: Error| Error {
                    message: format!("case `{}`: {}", case.name, e.message),
                    ..e
                };
                let state = self.rest(Some(n)).map_err(wrong)?;
                let (weighed, _) = self.weighed(&state).map_err(wrong)?;
                let total = rollup::total(&weighed)
                    .map_err(|e| wrong(e).in_file(&loaded.file.path).at_line(case.line))?;
                let snapshot = self.at(&state).map_err(wrong)?;
                let stand = loaded.file.stand.as_ref();
                let limits = loaded.file.limits.iter().map(|l| {
                    let seen = self.seen(l, &state, &snapshot, stand).map_err(wrong)?;
                    Ok(rollup::judged(l, &total, &seen, None))
                });
                Ok(CaseRow {
                    name: case.name.clone(),
                    limits: limits.collect::<Result<_, Error>>()?,
                    total,
                })
            })
            .collect()
    }

    /// The tanks of a state.
    ///
    /// # Errors
    /// As [`Service::at`].
    pub fn tank_rows(&self, state: &State) -> Result<Vec<TankRow>, Error> {
        let snapshot = self.at(state)?;
        let pools = self.separate_pools(state);
        let tanks = self.tanks().iter().zip(&snapshot.tanks).enumerate();
        let rows = tanks.filter(|(_, (_, t))| t.stands).map(|(n, (tank, t))| {
            let apart = pools.iter().find(|(of, _)| *of == n);
            TankRow {
                path: tank.path.clone(),
                liquid: tank.liquid.name.clone(),
                capacity_m3: tank.capacity(),
                volume_m3: t.volume,
                mass_kg: t.moments.zeroth,
                ullage_m3: tank.capacity() - t.volume,
                fill: t.volume / tank.capacity(),
                level_m: t.level,
                surface_area_m2: t.surface.map(|s| s.area),
                surface_centroid_m: t.surface.map(|s| plain(s.centroid)),
                pools: apart.map_or_else(Vec::new, |(_, pools)| {
                    let pools = pools.iter();
                    pools
                        .map(|p| PoolRow {
                            volume_m3: p.volume,
                            centroid_m: plain(p.centroid),
                        })
                        .collect()
                }),
            }
        });
        Ok(rows.collect())
    }
}
