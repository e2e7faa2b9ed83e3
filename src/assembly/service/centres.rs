//! Centroid, centre of mass and centre of gravity of an assembly side by side, and which may stand
//! for which.

use nalgebra::Vector3;
use serde::Serialize;

use super::super::file::Shape;
use super::super::rollup::plain;
use super::super::sum;
use super::{Extent, Service, State};
use crate::error::Error;
use crate::geometry::box_facets;
use crate::gravity::{self, Field, Mass, Piece};
use crate::moments::Moments;

/// The centres of a whole in its field. SI units, the assembly's axes.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Centres {
    /// `uniform`, `earth` or `central`.
    pub field: &'static str,
    /// Of the shape: meshes and liquids by their volume. Bought-in items have none and are left
    /// out; null where nothing has a volume.
    pub centroid_m: Option<[f64; 3]>,
    /// Of the mass.
    pub centre_of_mass_m: [f64; 3],
    /// Weight-averaged: ∫ r g dm / ∫ g dm; null where there is no gravity.
    pub centre_of_gravity_m: Option<[f64; 3]>,
    /// Where the whole mass as a point would feel the same force; null where the resultant
    /// vanishes.
    pub same_force_m: Option<[f64; 3]>,
    /// Weight-averaged point less the centre of mass, with digits that the sum would lose.
    pub centre_of_gravity_offset_m: Option<[f64; 3]>,
    /// Same-force point less the centre of mass, likewise.
    pub same_force_offset_m: Option<[f64; 3]>,
    /// Resultant of gravity.
    pub force_n: Option<[f64; 3]>,
    /// Of gravity about the centre of mass.
    pub torque_n_m: Option<[f64; 3]>,
    /// Which may stand for which.
    pub stands_for: Vec<StandsFor>,
}

/// Whether one centre may stand for another.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct StandsFor {
    /// The one that is easier to have.
    pub a: &'static str,
    /// The one that is meant.
    pub b: &'static str,
    /// How far apart they are.
    pub distance_m: f64,
    /// How far apart they may be.
    pub tolerance_m: f64,
    /// Whether they are no farther apart than that.
    pub holds: bool,
    /// Why they agree or differ.
    pub why: String,
}

impl Service {
    /// The centres of a state, compared at `tolerance` (m).
    ///
    /// # Errors
    /// As [`Service::at`].
    pub fn centres(&self, state: &State, tolerance: f64) -> Result<Option<Centres>, Error> {
        let snapshot = self.at(state)?;
        let total = snapshot.total;
        let Some(centre) = total.centre() else {
            return Ok(None);
        };
        let (centroid, items) = self.centroid(state)?;
        let field = self.gravity().field;
        let mut out = Centres {
            field: match field {
                Field::Uniform { .. } => "uniform",
                Field::Earth { .. } => "earth",
                Field::Central { .. } => "central",
            },
            centroid_m: centroid.map(plain),
            centre_of_mass_m: plain(centre),
            centre_of_gravity_m: None,
            same_force_m: None,
            centre_of_gravity_offset_m: None,
            same_force_offset_m: None,
            force_n: None,
            torque_n_m: None,
            stands_for: Vec::new(),
        };
        let mut rough = false;
        match field {
            Field::Central { gm, at } => {
                let masses = self.masses(state, &at)?;
                if let Some(c) = gravity::central(&masses, &total, gm, &at) {
                    rough = c.rough;
                    out.centre_of_gravity_offset_m = Some(plain(c.weight_averaged));
                    out.centre_of_gravity_m = Some(plain(centre + c.weight_averaged));
                    out.same_force_offset_m = c.same_force.map(plain);
                    out.same_force_m = c.same_force.map(|s| plain(centre + s));
                    out.force_n = Some(plain(c.force));
                    out.torque_n_m = Some(plain(c.torque));
                }
            }
            _ => {
                let g = field.at(&centre).unwrap_or_default();
                out.force_n = Some(plain(g * total.zeroth));
                out.torque_n_m = Some([0.0; 3]);
                if g.norm() > 0.0 {
                    out.centre_of_gravity_m = Some(plain(centre));
                    out.same_force_m = Some(plain(centre));
                    out.centre_of_gravity_offset_m = Some([0.0; 3]);
                    out.same_force_offset_m = Some([0.0; 3]);
                }
            }
        }
        if let Some(centroid) = centroid {
            let densities = self.densities(state)?;
            let even = densities.windows(2).all(|d| d[0] == d[1]);
            let why = match (even, items) {
                (true, false) => "one density throughout",
                (true, true) => {
                    "one density throughout, but bought-in items have mass and no volume here"
                }
                (false, _) => "densities differ from part to part",
            };
            out.compare(
                "centroid",
                "centre of mass",
                (centroid - centre).norm(),
                tolerance,
                why,
            );
        }
        if let Some(offset) = out.centre_of_gravity_offset_m {
            let why = match (field.uniform(), rough) {
                (true, _) => "the field is uniform: every bit of mass feels the same gravity",
                (false, false) => "the field falls with distance: nearer mass weighs more",
                (false, true) => {
                    "the field falls with distance; mass near its centre is known by its moments \
                     alone, so this is rough"
                }
            };
            let apart = Vector3::from(offset).norm();
            out.compare("centre of mass", "centre of gravity", apart, tolerance, why);
        }
        if let Some(offset) = out.same_force_offset_m {
            let why = match field.uniform() {
                true => "the field is uniform: a point anywhere feels the same force",
                false => "the field is not uniform: force is that at another distance",
            };
            let apart = Vector3::from(offset).norm();
            out.compare("centre of mass", "same-force point", apart, tolerance, why);
        }
        Ok(Some(out))
    }

    /// Centroid of everything that has a volume, and whether anything with mass has none.
    fn centroid(&self, state: &State) -> Result<(Option<Vector3<f64>>, bool), Error> {
        let mut volumes = Vec::new();
        let mut items = false;
        for w in self.weighed(state)?.0 {
            if !w.stands.is_empty() {
                volumes.extend(
                    w.stands
                        .iter()
                        .map(|s| s.body.figures().moments.placed(&s.placement)),
                );
                continue;
            }
            match (w.volume, w.moments.centre()) {
                (Some(v), Some(c)) if v > 0.0 => volumes.push(Moments::point(c, v)),
                (None, _) => items |= w.moments.zeroth > 0.0,
                _ => {}
            }
        }
        Ok((sum::total(volumes.iter()).centre(), items))
    }

    /// Mean density of everything that has a volume.
    fn densities(&self, state: &State) -> Result<Vec<f64>, Error> {
        let mut out = Vec::new();
        for w in self.weighed(state)?.0 {
            out.extend(w.stands.iter().map(|s| s.density));
            if let (true, Some(v)) = (w.stands.is_empty(), w.volume) {
                out.extend(Some(w.moments.zeroth / v).filter(|d| d.is_finite()));
            }
        }
        // A graded, coated or sheet part has no one density, whatever its mean.
        if self.things.iter().any(|t| t.weighed.uneven) {
            out.push(f64::NAN);
        }
        Ok(out)
    }

    /// The masses of a state for [`gravity::central`]; shapes of things that are not small against
    /// their distance from the field's centre.
    fn masses(&self, state: &State, at: &Vector3<f64>) -> Result<Vec<Mass>, Error> {
        let snapshot = self.at(state)?;
        let (weighed, _) = self.weighed(state)?;
        let mut out = Vec::with_capacity(weighed.len());
        for (standing, w) in snapshot.things.iter().zip(&weighed) {
            let thing = &self.things[standing.thing];
            let [lo, hi] = standing.bounds.map(Vector3::from);
            let half = (hi - lo).norm() / 2.0;
            let far = half < 1e-5 * ((hi + lo) / 2.0 + at).norm();
            let mut mass = Mass {
                moments: standing.moments,
                bounds: standing.bounds,
                pieces: Vec::new(),
                point: matches!(thing.extent, Extent::Shape(Shape::Point)),
            };
            if !far {
                mass.pieces = self.pieces(thing, w, state);
            }
            out.push(mass);
        }
        Ok(out)
    }

    fn pieces(&self, thing: &super::Thing, w: &super::Weighed, state: &State) -> Vec<Piece> {
        let placed = |facets: Vec<[[f64; 3]; 3]>, p: &crate::moments::Placement| {
            let mirrored = p.turn.determinant() < 0.0;
            let facets = facets.into_iter().map(|t| {
                let [a, b, c] = t.map(|q| p.apply(&Vector3::from(q)).into());
                if mirrored { [a, c, b] } else { [a, b, c] }
            });
            facets.collect::<Vec<[[f64; 3]; 3]>>()
        };
        match &thing.extent {
            Extent::Tank(n) => {
                let tank = &self.tanks[*n];
                let Some(effective) = state.effective else {
                    return Vec::new();
                };
                let p = self.placement_of_tank(*n, state);
                let up = p.turn.transpose() * -effective.normalize();
                let levelled = tank.vessel.levelled(up);
                let volume = state.fills.get(*n).copied().unwrap_or(0.0);
                let (facets, apex) = levelled.wetted(levelled.level(volume));
                vec![Piece {
                    facets: placed(facets, &p),
                    apex: p.apply(&Vector3::from(apex)).into(),
                    density: tank.liquid.density.value,
                }]
            }
            Extent::Shape(Shape::Box(sides)) => {
                let half = Vector3::from(sides.map(|s| s.value / 2.0));
                let p = match self.moved(thing, state) {
                    Some(Some(m)) => thing.placement.then(&m),
                    _ => thing.placement,
                };
                let volume = 8.0 * half.x * half.y * half.z;
                if volume <= 0.0 {
                    return Vec::new();
                }
                vec![Piece {
                    facets: placed(box_facets((-half).into(), half.into()), &p),
                    apex: p.at.into(),
                    density: w.moments.zeroth / volume,
                }]
            }
            Extent::Shape(_) => Vec::new(),
            // Uneven mass in a body is known by its moments alone.
            Extent::Bodies(_) if w.uneven || w.stands.len() != w.pieces.len() => Vec::new(),
            Extent::Bodies(_) => {
                let stands = w.stands.iter();
                stands
                    .map(|s| {
                        let about = s.body.figures().moments.about;
                        Piece {
                            facets: placed(s.body.facets(), &s.placement),
                            apex: s.placement.apply(&about).into(),
                            density: s.density,
                        }
                    })
                    .collect()
            }
        }
    }
}

impl Centres {
    fn compare(
        &mut self,
        a: &'static str,
        b: &'static str,
        distance: f64,
        tolerance: f64,
        why: &str,
    ) {
        self.stands_for.push(StandsFor {
            a,
            b,
            distance_m: distance,
            tolerance_m: tolerance,
            holds: distance <= tolerance,
            why: why.to_owned(),
        });
    }
}
