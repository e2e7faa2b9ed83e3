//! The assembly against its meshes: every thing with its mass moments where it stands.

use std::collections::{HashMap, HashSet};
use std::path::PathBuf;
use std::sync::Arc;

use nalgebra::{Matrix3, Vector3};
use serde::Serialize;

use super::assign::{self, Used};
use super::choose::{Bodies, Choice};
use super::expand::{self, Instance, What};
use super::expect::{self, Expectation};
use super::file::{Coating, Part, Substance};
use super::load::{Input, Loaded};
use super::open::Capped;
use super::open::{self, MassBounds};
use super::overlap::Stand;
use super::printing::{self, Printing};
use super::service::{self, Contents, Service, State, Tank};
use super::smear::{self, Smeared};
use super::source::{MeshBody, MeshFiles};
use super::{listed, notes, spread, sum};
use crate::curvature::Reading;
use crate::error::{Error, Kind, Warning};
use crate::masses::PrintFigures;
use crate::moments::Moments;
use crate::moments::liquid::Vessel;
use crate::quantity::{Quantity, Tolerance};

/// Where a mass comes from.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize)]
#[serde(rename_all = "lowercase")]
pub enum Basis {
    /// Volume of the mesh times density.
    Computed,
    /// The scale; the mesh says how it is spread.
    Measured,
    /// Stated for a bought-in item.
    Stated,
    /// Volume of an open mesh with its holes capped, times density: within a bound if an
    /// assumption holds.
    Estimate,
}

/// What a mass is the mass of.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Source {
    /// Bodies of a mesh file.
    Mesh {
        /// As typed.
        file: String,
        /// The body's id where it is one, else the name that took them, else none.
        body: Option<String>,
        /// Ids of all of them.
        bodies: Vec<String>,
    },
    /// A bought-in item.
    Item,
    /// Mass that no mesh shows.
    Smear,
}

/// The mass of one body of a part, where it stands in the assembly.
#[derive(Clone, Debug)]
pub struct Piece {
    /// Its material; none where a measured part names none, and for items.
    pub material: Option<Substance>,
    /// kg, kg m, kg m², in the assembly's axes.
    pub moments: Moments,
}

/// What the facets of a part do to its mass moments: the mesh's minus the curved part's.
///
/// It is a bias. Of figures that are not `corrected` the interval runs from them to themselves less
/// this, widened there by the doubt; of corrected ones, the doubt lies on both sides.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct FacetBias {
    /// Whether the part's figures have had it taken off.
    pub corrected: bool,
    /// kg, kg m, kg m², in the assembly's axes.
    pub moments: Moments,
    /// How far the mass of it may itself be off, kg; the rest in the same proportion.
    pub doubt_kg: f64,
}

/// How the mass of a part answers to something of its own that has a tolerance.
#[derive(Clone, Debug)]
pub struct Rate {
    /// Such as `wall`.
    pub what: &'static str,
    /// SI unit of what is off.
    pub unit: &'static str,
    /// Of the file.
    pub tolerance: Tolerance,
    /// Mass moments for each unit of it, where the part stands.
    pub per_unit: Moments,
}

/// One thing that stands in the assembly, weighed.
#[derive(Clone, Debug)]
pub struct Weighed {
    /// Such as `boom/nozzle#2`.
    pub path: String,
    /// Paths of its groups, outermost first.
    pub groups: Vec<String>,
    /// Where its mass comes from.
    pub source: Source,
    /// What that mass rests on.
    pub basis: Basis,
    /// Its bodies, or the item itself.
    pub pieces: Vec<Piece>,
    /// Its closed bodies where they stand; none for items and open meshes.
    pub stands: Vec<Stand>,
    /// Their sum.
    pub moments: Moments,
    /// Its mass is not spread evenly through its bodies: sheet, coated, or graded.
    pub uneven: bool,
    /// How far its figures may be off, where its mesh is open.
    pub estimate: Option<MassBounds>,
    /// What its facets do; none for items, parts whose facets are what is meant, and where it is not
    /// known.
    pub facets: Option<FacetBias>,
    /// m³, of the mesh, or of the curves that its facets stand for.
    pub volume: Option<f64>,
    /// Measured mass / volume, kg/m³.
    pub implied_density: Option<f64>,
    /// How it is printed, where it is.
    pub made: Option<PrintFigures>,
    /// How its mass answers to thicknesses and shares of its own that have a tolerance.
    pub rates: Vec<Rate>,
    /// Box along the assembly's axes, m.
    pub bounds: [[f64; 3]; 2],
}

/// All of it.
#[derive(Clone, Debug)]
pub struct Resolved {
    /// What could be weighed, in file order.
    pub weighed: Vec<Weighed>,
    /// Parts against the figures that they must have.
    pub expectations: Vec<Expectation>,
    /// Bodies that cannot be weighed; where there are any, there is no total.
    pub refused: Vec<Error>,
    /// What was assumed or looks odd.
    pub warnings: Vec<Warning>,
    /// The assembly files, then the meshes.
    pub inputs: Vec<Input>,
    /// What the smears among `weighed` cover.
    pub smears: Vec<Smeared>,
    /// The same things in any state; none where a body cannot be weighed.
    pub service: Option<Service>,
    /// The state that `weighed` is in.
    pub state: Option<State>,
}

/// Weighs every thing of an assembly.
///
/// # Errors
/// All faults found in the light of the meshes: one that cannot be read, a body that is not
/// there, a part without a material. A body that cannot be weighed is among `refused`.
pub fn resolve(loaded: &Loaded, meshes: &mut dyn MeshFiles) -> Result<Resolved, Vec<Error>> {
    let instances = expand::expand(&loaded.file);
    let mut work = Work::default();
    for instance in &instances {
        match instance.what {
            What::Part(part) => work
                .choice
                .choose(instance, &part.mesh, part.unit, part.join, meshes),
            What::Tank(tank) => work
                .choice
                .choose(instance, &tank.mesh, tank.unit, None, meshes),
            What::Item(_) => {}
        }
    }
    if !work.choice.errors.is_empty() {
        return Err(work.choice.errors);
    }
    let mut out = Resolved {
        weighed: Vec::with_capacity(instances.len()),
        expectations: Vec::new(),
        refused: Vec::new(),
        warnings: loaded.warnings.clone(),
        inputs: loaded.inputs.clone(),
        smears: Vec::new(),
        service: None,
        state: None,
    };
    let mut tanks = Vec::new();
    for instance in &instances {
        let weighed = match instance.what {
            What::Item(item) => {
                let mass = item.shape.moments(item.mass.value);
                let half = item.shape.half_extent(&instance.placement.turn);
                let at = instance.placement.at;
                let moments = mass.placed(&instance.placement);
                Some(Weighed {
                    path: instance.path.clone(),
                    groups: instance.groups.to_vec(),
                    source: Source::Item,
                    estimate: None,
                    facets: None,
                    basis: Basis::Stated,
                    pieces: vec![Piece {
                        material: None,
                        moments,
                    }],
                    stands: Vec::new(),
                    moments,
                    uneven: false,
                    volume: None,
                    implied_density: None,
                    made: None,
                    rates: Vec::new(),
                    bounds: [(at - half).into(), (at + half).into()],
                })
            }
            What::Part(part) => work.part(instance, part, &mut out),
            What::Tank(tank) => work.tank(instance, tank, &mut tanks, &mut out),
        };
        out.weighed.extend(weighed);
    }
    if !work.errors.is_empty() {
        return Err(work.errors);
    }
    if out.refused.is_empty() {
        let all = std::mem::take(&mut out.weighed);
        let smears = smear::planned(&instances);
        let service = Service::new(loaded, &instances, all, smears, tanks, |i| match i.what {
            What::Part(part) => work.choice.of(&part.mesh).cloned().unwrap_or_default(),
            _ => Vec::new(),
        });
        let rest = service.rest(None).map_err(|e| vec![e])?;
        (out.weighed, out.smears) = service.weighed(&rest).map_err(|e| vec![e])?;
        out.warnings.extend(service::notes(
            &service,
            loaded,
            std::slice::from_ref(&rest),
        ));
        out.state = Some(rest);
        out.service = Some(service);
    }
    work.choice.unused_bodies(&mut out.warnings);
    notes::unused_rules(loaded, &work.used, &mut out.warnings);
    for path in &work.choice.order {
        out.inputs.extend(meshes.input(path));
        out.inputs.extend(meshes.beside(path));
    }
    Ok(out)
}

/// What is kept while an assembly is resolved. Entries are known by their address: they live as
/// long as the loaded file, and a repeat is the same entry.
#[derive(Default)]
struct Work {
    choice: Choice,
    /// Boxes by entry and turn: repeats that stand alike need no second look at the vertices.
    boxes: HashMap<(*const Part, [u64; 9]), [[f64; 3]; 2]>,
    /// Which entry put which body where.
    stands: HashMap<(PathBuf, String, [u64; 12]), (*const Part, String)>,
    used: Used,
    printing: Printing,
    /// Entries whose warnings have been given.
    said: HashSet<*const Part>,
    /// Insides of tanks by entry: repeats hold alike.
    vessels: HashMap<*const Tank, Arc<Vessel>>,
    errors: Vec<Error>,
}

impl Work {
    /// Weighs a part where it stands; `None` where it cannot be, which is then said.
    fn part(
        &mut self,
        instance: &Instance<'_>,
        part: &Part,
        out: &mut Resolved,
    ) -> Option<Weighed> {
        let key: *const Part = part;
        let first = self.said.insert(key);
        let bodies = self.choice.of(&part.mesh)?.clone();
        let mut refused = false;
        for body in &bodies {
            let figures = body.figures();
            let volume = moments_of(body, part).zeroth;
            let why = match &figures.refused {
                // A sheet is its surface: it need not hold anything.
                _ if part.sheet.is_some() && figures.area > 0.0 => spread::too_thick(body, part)
                    .map(|why| {
                        (
                            why,
                            "check the sheet's thickness and the mesh's unit".to_string(),
                        )
                    }),
                Some(_) if accepted(body, part).is_some() => None,
                Some(r) => Some((r.message.clone(), open_advice(body, part, &r.advice))),
                None if !(volume > 0.0 && volume.is_finite()) => Some((
                    format!("its volume is {volume:e} m³"),
                    "check the mesh".to_string(),
                )),
                None => spread::hollow(body, part).map(|why| {
                    (
                        why,
                        "check the stations and densities of `graded`".to_string(),
                    )
                }),
            };
            let Some((why, advice)) = why else { continue };
            refused = true;
            if first {
                let message = format!(
                    "part `{}`: body `{}` of `{}` cannot be weighed: {why}",
                    instance.path, figures.id, part.mesh.typed
                );
                let mut error = instance.error(Kind::NotClosed, message, advice);
                error.line = Some(part.mesh.line);
                out.refused.push(error);
            }
        }
        if refused {
            return None;
        }
        let materials = self.materials(instance, part, &bodies)?;
        let printed = match &part.made {
            None => None,
            Some(made) => {
                let errors = &mut self.errors;
                Some(self.printing.of(instance, part, made, &bodies, errors)?)
            }
        };
        let measured_kg = part.measured.map(|m| m.value);
        let volume = sum::sum(bodies.iter().map(|b| spread::volume(b, part)));
        // Mass moments in the mesh file's axes. Without densities the measured mass is spread
        // evenly over the volume.
        let computed: Vec<Moments> = bodies
            .iter()
            .zip(&materials)
            .enumerate()
            .map(|(n, (body, material))| {
                if let Some(printed) = printed.as_ref().and_then(|all| all.get(n)) {
                    return printing::mass_of(printed, material.as_ref());
                }
                let density = material.as_ref().map_or(1.0, |m| m.density.value);
                spread::mass(body, part, density)
            })
            .collect();
        let made = printed
            .as_ref()
            .and_then(|all| printing::figures(all, &bodies, &materials, measured_kg));
        let coats: Vec<(&Coating, Moments)> = part
            .coating
            .iter()
            .flat_map(|c| bodies.iter().map(move |b| (c, spread::coat(b, c))))
            .collect();
        let all = computed.iter().chain(coats.iter().map(|(_, m)| m));
        let computed_mass = sum::sum(all.clone().map(|m| m.zeroth));
        let known = materials.iter().all(Option::is_some);
        let factor = part.measured.map_or(1.0, |m| m.value / computed_mass);
        if let (Some(made), true) = (&made, first) {
            out.warnings.extend(printing::remarks(instance, made));
        }
        let of_solid = known && made.is_none();
        if let (Some(measured), true, true) = (part.measured, of_solid, first) {
            let table = computed_mass / volume;
            let spread = sum::sum(materials.iter().zip(&bodies).map(|(m, b)| {
                let tolerance = m.as_ref().and_then(|m| m.density.tolerance);
                tolerance.map_or(0.0, |t| t.amount) * spread::volume(b, part) / volume
            }));
            out.warnings.extend(notes::odd_density(
                instance,
                part,
                measured.value / volume,
                table,
                spread,
            ));
        }
        self.twice(instance, part, &bodies, &mut out.warnings);
        if first {
            out.warnings
                .extend(notes::thick_skin(instance, part, &bodies));
        }
        let own = sum::total(all);
        if let Some(expect) = &part.expect {
            let figures = expect::Figures {
                volume,
                mass: if known {
                    computed_mass
                } else {
                    computed_mass * factor
                },
                centre: own.centre(),
                bounds: around(bodies.iter().map(|b| b.figures().bounds)),
            };
            for row in expect::judge(instance.path.as_str(), expect, &figures) {
                // Repeats are the same mesh: what is told of the first is not told again.
                let same = |e: &Expectation| e.quantity == row.quantity && e.value == row.value;
                if first || !out.expectations.iter().any(same) {
                    out.expectations.push(row);
                }
            }
        }
        let mut pieces: Vec<Piece> = materials
            .into_iter()
            .zip(&computed)
            .map(|(material, moments)| Piece {
                material,
                moments: moments.weighted(factor).placed(&instance.placement),
            })
            .collect();
        // Coats stand behind the bodies: what pairs bodies with pieces ends before them.
        pieces.extend(coats.iter().map(|(coating, moments)| Piece {
            material: Some(coating.material.clone()),
            moments: moments.weighted(factor).placed(&instance.placement),
        }));
        let place = |m: Moments| m.weighted(factor).placed(&instance.placement);
        let mut rates = Vec::new();
        if let (Some(made), Some(printed), false) = (&part.made, &printed, part.made_off.is_empty())
        {
            for rate in printing::rates(made, &bodies, printed, &part.made_off) {
                let density = |n: usize| {
                    let of = pieces.get(n).and_then(|p: &Piece| p.material.as_ref());
                    of.map_or(1.0, |m| m.density.value)
                };
                let all = rate.per_unit.iter().enumerate();
                let all: Vec<Moments> = all.map(|(n, m)| m.weighted(density(n))).collect();
                rates.push(Rate {
                    what: rate.what,
                    unit: rate.unit,
                    tolerance: rate.tolerance,
                    per_unit: place(sum::total(all.iter())),
                });
            }
        }
        // Sheet and coats are in proportion to their thickness.
        let thick = |q: &Quantity, all: &[Moments]| {
            let total = sum::total(all.iter());
            Some((q.tolerance?, place(total).weighted(1.0 / q.value)))
        };
        if let Some((tolerance, per_unit)) = part.sheet.as_ref().and_then(|q| thick(q, &computed)) {
            rates.push(Rate {
                what: "sheet",
                unit: "m",
                tolerance,
                per_unit,
            });
        }
        let coated: Vec<Moments> = coats.iter().map(|(_, m)| *m).collect();
        let coating = part.coating.as_ref().map(|c| &c.thickness);
        if let Some((tolerance, per_unit)) = coating.and_then(|q| thick(q, &coated)) {
            rates.push(Rate {
                what: "coating",
                unit: "m",
                tolerance,
                per_unit,
            });
        }
        let moments = match pieces.as_slice() {
            [one] => one.moments,
            _ => sum::total(pieces.iter().map(|p| &p.moments)),
        };
        let ids: Vec<String> = bodies.iter().map(|b| b.figures().id.clone()).collect();
        let body = match ids.as_slice() {
            [one] => Some(one.clone()),
            _ => part.mesh.body.clone(),
        };
        let bounds = self.bounds(instance, part, &bodies);
        // On the scale the mass is known; only how it is spread is not.
        let of_bodies: Vec<Option<MassBounds>> = bodies
            .iter()
            .zip(&pieces)
            .map(|(b, p)| {
                let capped = accepted(b, part)?;
                let density = p.moments.zeroth / capped.moments.zeroth;
                Some(open::of_body(capped, density))
            })
            .collect();
        let estimate = open::together(
            pieces.iter().map(|p| &p.moments).zip(of_bodies),
            moments.centre().unwrap_or(moments.about),
            moments.zeroth,
        )
        .map(|b| MassBounds {
            mass_bound_kg: if part.measured.is_some() {
                0.0
            } else {
                b.mass_bound_kg
            },
            ..b
        });
        let stands = bodies
            .iter()
            .zip(&pieces)
            .filter(|(b, _)| b.figures().refused.is_none() && part.sheet.is_none())
            .map(|(b, p)| Stand {
                body: b.clone(),
                placement: instance.placement,
                density: p.moments.zeroth / moments_of(b, part).zeroth,
            })
            .collect();
        let facets = bias(part, &bodies, &pieces, &instance.placement);
        if part.facets == Some(Reading::Curved) && facets.is_none() && first {
            out.warnings.push(notes::warning(
                instance,
                "curves-not-estimated",
                format!(
                    "the figures of `{}` are those of its facets as they stand",
                    instance.path
                ),
                "curves are estimated of closed bodies without a solid inside their solid",
            ));
        }
        Some(Weighed {
            rates,
            stands,
            facets,
            estimate,
            path: instance.path.clone(),
            groups: instance.groups.to_vec(),
            source: Source::Mesh {
                file: part.mesh.typed.clone(),
                body,
                bodies: ids,
            },
            basis: match (part.measured, estimate) {
                (Some(_), _) => Basis::Measured,
                (None, Some(_)) => Basis::Estimate,
                (None, None) => Basis::Computed,
            },
            pieces,
            uneven: part.sheet.is_some() || part.coating.is_some() || part.graded.is_some(),
            moments,
            volume: Some(volume),
            implied_density: part.measured.map(|m| m.value / volume),
            made,
            bounds,
        })
    }

    /// A tank where it stands, still empty; `None` where its inside has no volume, which is then
    /// said.
    fn tank(
        &mut self,
        instance: &Instance<'_>,
        tank: &Tank,
        tanks: &mut Vec<Contents>,
        out: &mut Resolved,
    ) -> Option<Weighed> {
        let key: *const Tank = tank;
        let bodies = self.choice.of(&tank.mesh)?.clone();
        let first = !self.vessels.contains_key(&key);
        let mut refused = false;
        for body in &bodies {
            let figures = body.figures();
            let (why, advice) = match &figures.refused {
                Some(r) => (r.message.clone(), r.advice.clone()),
                None if figures.moments.zeroth > 0.0 => continue,
                None => ("it holds nothing".to_owned(), "check the mesh".to_owned()),
            };
            refused = true;
            if first {
                let message = format!(
                    "tank `{}`: body `{}` of `{}` cannot be filled: {why}",
                    instance.path, figures.id, tank.mesh.typed
                );
                let mut error = instance.error(Kind::NotClosed, message, advice);
                error.line = Some(tank.mesh.line);
                out.refused.push(error);
            }
        }
        let vessel = self.vessels.entry(key).or_insert_with(|| {
            let facets: Vec<_> = bodies.iter().flat_map(|b| b.facets()).collect();
            Arc::new(Vessel::new(&facets))
        });
        if refused {
            return None;
        }
        let (weighed, contents) =
            service::weighed_tank(instance, tank, Arc::clone(vessel), &bodies);
        tanks.push(contents);
        Some(weighed)
    }

    /// The material of each body of a part. All `None` only for a measured part that names none.
    fn materials(
        &mut self,
        instance: &Instance<'_>,
        part: &Part,
        bodies: &Bodies,
    ) -> Option<Vec<Option<Substance>>> {
        if let Some(graded) = &part.graded {
            let of = bodies.iter();
            return Some(
                of.map(|b| Some(spread::substance(b, part, graded)))
                    .collect(),
            );
        }
        let mut materials = Vec::with_capacity(bodies.len());
        let mut without = Vec::new();
        let mut fault = false;
        for body in bodies {
            match assign::material_of(instance, body.figures(), &mut self.used) {
                Ok(material) => {
                    if material.is_none() {
                        without.push(body.figures().id.as_str());
                    }
                    materials.push(material);
                }
                Err(assign::Ambiguous(message)) => {
                    fault = true;
                    self.errors.push(instance.error(
                        Kind::AmbiguousName,
                        format!("part `{}`: {message}", instance.path),
                        "write `material` on the part, or make the rules agree",
                    ));
                }
            }
        }
        let spread_evenly = part.measured.is_some() && without.len() == bodies.len();
        if !without.is_empty() && !spread_evenly {
            fault = true;
            let advice = "write `material` on the part, or an [[assign]] whose `body` or `part` \
                          matches; `bismar materials` lists the table";
            self.errors.push(instance.error(
                Kind::UnknownName,
                format!(
                    "part `{}` has no material for {}",
                    instance.path,
                    match without.len() {
                        1 => format!("body {}", listed(&without)),
                        n => format!("{n} bodies: {}", listed(&without)),
                    }
                ),
                advice,
            ));
        }
        (!fault).then_some(materials)
    }

    fn bounds(&mut self, instance: &Instance<'_>, part: &Part, bodies: &Bodies) -> [[f64; 3]; 2] {
        let turn = &instance.placement.turn;
        let mut bits = [0; 9];
        for (bit, x) in bits.iter_mut().zip(turn.iter()) {
            *bit = x.to_bits();
        }
        let turned = *self.boxes.entry((part, bits)).or_insert_with(|| {
            let as_is = *turn == Matrix3::identity();
            around(bodies.iter().map(|b| match as_is {
                true => b.figures().bounds,
                false => b.bounds_turned(turn),
            }))
        });
        turned.map(|corner| (Vector3::from(corner) + instance.placement.at).into())
    }

    /// Warns where another entry puts the same body in the same place: it is then counted twice.
    fn twice(
        &mut self,
        instance: &Instance<'_>,
        part: &Part,
        bodies: &Bodies,
        warnings: &mut Vec<Warning>,
    ) {
        let mut bits = [0; 12];
        let p = &instance.placement;
        for (bit, x) in bits.iter_mut().zip(p.turn.iter().chain(p.at.iter())) {
            // −0 is 0.
            *bit = (x + 0.0).to_bits();
        }
        let mut twice: Vec<(String, String)> = Vec::new();
        for body in bodies {
            let id = body.figures().id.clone();
            let key = (part.mesh.path.clone(), id.clone(), bits);
            match self.stands.get(&key) {
                Some((other, path)) if !std::ptr::eq(*other, part) => {
                    twice.push((id, path.clone()));
                }
                Some(_) => {}
                None => {
                    self.stands.insert(key, (part, instance.path.clone()));
                }
            }
        }
        if let Some((_, other)) = twice.first() {
            let ids: Vec<&str> = twice.iter().map(|(id, _)| id.as_str()).collect();
            warnings.push(notes::warning(
                instance,
                "counted-twice",
                format!(
                    "`{}` and `{other}` put the same bodies in the same place, and both are \
                     counted: {}",
                    instance.path,
                    listed(&ids)
                ),
                "take one of them out, name single bodies with #, or write `count` if there are two",
            ));
        }
    }
}

/// The box around boxes, m.
pub(super) fn around(boxes: impl Iterator<Item = [[f64; 3]; 2]>) -> [[f64; 3]; 2] {
    boxes.fold(
        [[f64::INFINITY; 3], [f64::NEG_INFINITY; 3]],
        |[lo, hi], [l, h]| {
            let least = std::array::from_fn(|n| lo[n].min(l[n]));
            let greatest = std::array::from_fn(|n| hi[n].max(h[n]));
            [least, greatest]
        },
    )
}

/// The capped solid of an open body, where the part accepts its bound.
fn accepted<'b>(body: &'b Arc<dyn MeshBody>, part: &Part) -> Option<&'b Capped> {
    let figures = body.figures();
    figures
        .refused
        .as_ref()
        .filter(|r| r.kind == "not-closed")?;
    let capped = figures.capped.as_ref()?;
    let most = part.accept_open? * capped.moments.zeroth;
    (capped.volume_bound <= most).then_some(capped)
}

pub(super) fn moments_of(body: &Arc<dyn MeshBody>, part: &Part) -> Moments {
    if let Some(capped) = accepted(body, part) {
        return capped.moments;
    }
    let mesh = body.figures().moments;
    match part.facets {
        Some(Reading::Curved) => body.facet_error(true).map_or(mesh, |e| e.corrected(&mesh)),
        _ => mesh,
    }
}

/// What the facets of a part do to its mass moments where it stands; none where it is not known of
/// one of its bodies.
fn bias(
    part: &Part,
    bodies: &Bodies,
    pieces: &[Piece],
    placement: &crate::moments::Placement,
) -> Option<FacetBias> {
    if part.facets == Some(Reading::Flat) {
        return None;
    }
    let asked = part.facets == Some(Reading::Curved);
    let mut moments = Moments::zero(placement.at);
    let mut doubt = 0.0;
    for (body, piece) in bodies.iter().zip(pieces) {
        let error = body.facet_error(asked)?;
        // Of a print the outside gains all of it and the inside loses some: anything in between.
        let full = piece.material.as_ref().filter(|_| part.made.is_some());
        let density = full.map_or(piece.moments.zeroth / moments_of(body, part).zeroth, |m| {
            m.density.value
        });
        moments = moments.plus(&error.moments.weighted(density).placed(placement));
        doubt += error.doubt * density;
    }
    Some(FacetBias {
        corrected: asked,
        moments,
        doubt_kg: doubt,
    })
}

/// What to do about a body that is refused, with the bound that it would have capped.
fn open_advice(body: &Arc<dyn MeshBody>, part: &Part, advice: &str) -> String {
    let Some(c) = &body.figures().capped else {
        return advice.to_owned();
    };
    // Rounded up, so that the percentage named is one that would be accepted.
    let percent = (1e5 * c.volume_bound / c.moments.zeroth).ceil() / 1e3;
    let said = match part.accept_open {
        Some(_) => "more than is accepted,",
        None => "which accept-open on the part would accept,",
    };
    format!(
        "{advice}; capped, its volume is within {percent} %, {said} if the missing surface is no larger than twice its flat cap"
    )
}
