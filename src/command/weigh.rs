//! `bismar weigh`: volume, area, centroid, mass and inertia of each body.

use clap::{Args, ValueEnum};

use super::curves::CurveArgs;
use super::inputs::{Input, MeshArgs, ReadMesh, closing_distance, expand, open, picked, read};
use super::made::{self, MadeArgs};
use super::open::{self, Opened};
use super::progress::Terminal;
use super::{Answer, Common, gather, point, slice, whole};
use crate::curvature::FacetError;
use crate::error::{Error, Kind, Result, Warning};
use crate::masses::{Figures, Substance, box_union};
use crate::material::Table;
use crate::mesh::{Body, Mesh, NestedRule, Refusal};
use crate::moments::{Moments, SolidIntegrals};
use crate::printed::Printed;
use crate::progress::Progress;
use crate::quantity::{Dimension, LengthUnit, Quantity};
use crate::report::estimate::Estimated;
use crate::report::facets::Facets;
use crate::report::weigh::{NestedFigures, Refused, WeighBody, WeighedBody, WeighedFile, Whole};
use crate::report::{self, InputFact, path_hex};
use crate::soundness::{
    self, Depth, Filled, Finding,
    cap::{Cap, Estimate},
};
use crate::stream::Slice;
use crate::uncertainty::{BodySources, FacetSource, Uncertainty};

/// Arguments of `weigh`.
#[derive(Args, Clone, Debug)]
pub(super) struct WeighArgs {
    #[command(flatten)]
    meshes: MeshArgs,
    /// Density of the solid, such as "7850 kg/m3 ± 1 %" or "2.70 g/cm3"
    #[arg(long, value_name = "Q", conflicts_with = "material")]
    density: Option<String>,
    /// Material by name, from the table that `bismar materials` prints
    #[arg(long, value_name = "NAME")]
    material: Option<String>,
    /// How to count a solid that lies within a solid
    #[arg(long, value_name = "RULE")]
    nested: Option<Nested>,
    /// Count each region once where surfaces overlap, with an error figure
    #[arg(long, conflicts_with = "nested")]
    filled: bool,
    /// Give the inertia tensor about this point too (bare numbers in the mesh's unit)
    #[arg(long, value_name = "X,Y,Z", allow_hyphen_values = true)]
    about: Option<String>,
    /// Give totals alone, in one reading with little memory: proves that edges cancel, and does not
    /// see doubled meshes, solids in solids or single shells inside out
    #[arg(long, conflicts_with_all = ["nested", "join", "filled", "accept_open"])]
    whole: bool,
    /// Sum only the K-th of N slices of one file, to be added by `bismar add`
    #[arg(long, value_name = "K/N", requires = "whole", conflicts_with_all = ["density", "material", "about"])]
    slice: Option<Slice>,
    /// Write the partial of --slice to this file [default: standard output]
    #[arg(short, long, value_name = "PARTIAL", requires = "slice")]
    output: Option<std::path::PathBuf>,
    #[command(flatten)]
    curves: CurveArgs,
    /// Weigh an open body with its holes capped, if its volume is then bounded within P per cent
    #[arg(long, value_name = "PERCENT", value_parser = open::parse_percent)]
    accept_open: Option<f64>,
    #[command(flatten)]
    made: MadeArgs,
}

/// Choices of `--nested`.
#[derive(Clone, Copy, Debug, ValueEnum)]
enum Nested {
    /// Both solids, the overlap twice
    Sum,
    /// The overlap once
    Union,
    /// The inner one as a void
    Void,
}

impl From<Nested> for NestedRule {
    fn from(n: Nested) -> Self {
        match n {
            Nested::Sum => Self::Sum,
            Nested::Union => Self::Union,
            Nested::Void => Self::Void,
        }
    }
}

/// Runs the command.
///
/// # Errors
/// Of the options; faults of inputs stand in the answer.
pub(super) fn run(args: &WeighArgs, common: &Common) -> Result<Answer> {
    let substance = substance(args.density.as_deref(), args.material.as_deref())?;
    // Read once with any unit, so that a fault in it is told before anything is read.
    about_point(args.about.as_deref(), LengthUnit::Mm)?;
    let solid = args.made.plan(LengthUnit::Mm)?.is_none();
    args.meshes.judge()?;
    let inputs = expand(&args.meshes);
    if args.whole {
        whole::without_picks(&inputs)?;
    }
    if let Some(slice) = args.slice {
        return slice::run(inputs, slice, args.output.as_deref(), &args.meshes, common);
    }
    let terminal = Terminal::new(common);
    let progress = terminal.progress();
    let mut answers = gather(inputs, |input| {
        if args.whole {
            return whole::answer(input, &args.meshes, substance.as_ref(), |unit| {
                about_point(args.about.as_deref(), unit)
            });
        }
        let (bytes, fact) = match open(input, args.meshes.hash) {
            Ok(opened) => opened,
            Err(e) => return (None, Err(e)),
        };
        let result = read(bytes, input, &args.meshes, progress)
            .and_then(|m| answer(&m, input, args, substance.as_ref(), progress));
        (Some(fact), result)
    });
    drop(terminal);
    let mut files = Vec::new();
    let mut exit = 0;
    for one in &answers.each {
        match &one.result {
            Ok(file) => {
                let all = match &file.bodies {
                    Some(bodies) => !bodies.is_empty() && file.whole_missing.is_empty(),
                    None => file.whole.is_some(),
                };
                exit = exit.max(u8::from(!all));
                files.push(file.clone());
            }
            Err(e) => {
                exit = 2;
                files.push(unread(&one.path, e, args.whole));
            }
        }
    }
    let unsaid =
        |figures: &Figures, u: &Option<Uncertainty>| figures.mass_kg.is_some() && u.is_none();
    let ignored = files.iter().any(|f| {
        let mut bodies = f.bodies.iter().flatten();
        let whole = f.whole.as_ref();
        bodies.any(|b| unsaid(&b.figures, &b.uncertainty))
            || whole.is_some_and(|w| unsaid(&w.figures, &w.uncertainty))
    });
    if ignored
        && substance
            .as_ref()
            .is_some_and(|s| s.density.tolerance.is_some())
    {
        answers.warnings.push(Warning {
            kind: "tolerances-ignored".to_owned(),
            message: "the density has a tolerance, and the uncertainty of a mass is not computed: nothing bounds its volume or its centre".to_owned(),
            path: None,
            line: None,
            advice: "read that mass as a nominal value".to_owned(),
        });
    }
    if solid
        && let Some(word) = &args.material
        && let Ok(material) = Table::standard().get(word)
        && material.printing
    {
        answers.warnings.push(made::caution(&material.name));
    }
    let body = WeighBody { files };
    answers.finish(
        "bismar/weigh/1",
        exit,
        body,
        common,
        report::weigh_text::render,
        report::weigh_text::csv,
    )
}

/// What the options make a body of.
///
/// # Errors
/// Of the density; `unknown-name` for the material.
pub(super) fn substance(
    density: Option<&str>,
    material: Option<&str>,
) -> Result<Option<Substance>> {
    if let Some(text) = density {
        let density = Quantity::parse(text, Dimension::Density, None)
            .map_err(|e| Error::new(e.kind, format!("--density: {}", e.message), e.advice))?;
        if density.value <= 0.0 {
            return Err(Error::new(
                Kind::BadNumber,
                format!("--density: \"{text}\" is not above zero"),
                "state the density of the solid material",
            ));
        }
        return Ok(Some(Substance {
            name: None,
            density,
        }));
    }
    let Some(word) = material else {
        return Ok(None);
    };
    let material = Table::standard().get(word)?;
    Ok(Some(Substance {
        name: Some(material.name.clone()),
        density: material.density,
    }))
}

/// The warning that a density's tolerance goes into no figure.
pub(super) fn tolerance_ignored(substance: &Substance) -> Option<Warning> {
    substance.density.tolerance.is_some().then(|| Warning {
        kind: "tolerances-ignored".to_owned(),
        message: "the density has a tolerance; the figures are for its nominal value and say nothing of how far they may be off".to_owned(),
        path: None,
        line: None,
        advice: "take the density's tolerance as the mass's own, in per cent, at least".to_owned(),
    })
}

/// The point of `--about`, m.
pub(super) fn about_point(text: Option<&str>, unit: LengthUnit) -> Result<Option<[f64; 3]>> {
    text.map(|text| point(text, unit)).transpose()
}

fn unread(path: &std::path::Path, error: &Error, whole: bool) -> WeighedFile {
    WeighedFile {
        path: path.to_string_lossy().into_owned(),
        path_hex: path_hex(path),
        format: None,
        triangles: None,
        unit: None,
        unit_assumed: false,
        error: Some(error.clone()),
        findings: Vec::new(),
        overlap: "untested",
        bodies: (!whole).then(Vec::new),
        whole: None,
        whole_missing: Vec::new(),
        proved: whole.then_some(None),
        turned: None,
    }
}

fn answer(
    m: &ReadMesh,
    input: &Input,
    args: &WeighArgs,
    substance: Option<&Substance>,
    progress: Progress<'_>,
) -> Result<(WeighedFile, Vec<Warning>, Vec<InputFact>)> {
    let metres = m.unit.metres();
    let about = about_point(args.about.as_deref(), m.unit)?;
    let rule = if args.filled {
        // Without cuts the union is exact: a nested shell adds nothing.
        Some(NestedRule::Union)
    } else {
        args.nested.map(NestedRule::from)
    };
    let cuts = args.filled.then(|| {
        let _stage = progress.stage("seeking surfaces that cut each other", 0);
        soundness::cut_bodies(&m.mesh)
    });
    let is_cut = |i: usize| cuts.as_ref().is_some_and(|c| c.themselves[i]);
    let mut audit = soundness::audit(&m.mesh, metres, 3, Depth::Figures);
    let chosen = picked(&m.mesh, input)?;
    let mut results: Vec<Weighing> = chosen
        .iter()
        .map(|(_, body)| weigh(&m.mesh, body, rule, args.accept_open))
        .collect();
    let mut facets = Vec::with_capacity(chosen.len());
    for (&(i, body), weighing) in chosen.iter().zip(&mut results) {
        let seen = match weighing {
            Weighing::Closed(solid) if !is_cut(i) => args.curves.look(&m.mesh, body)?.map(|e| {
                let said = Facets::of(solid, &e, metres, args.curves.true_curves);
                *solid = args.curves.corrected(solid, &e);
                (said, e)
            }),
            _ => None,
        };
        facets.push(seen);
    }
    let made = args.made.plan(m.unit)?;
    let mut warnings = m.warnings.clone();
    let printed: Vec<Option<Printed>> = chosen
        .iter()
        .zip(&results)
        .map(|((_, body), weighing)| match (&made, weighing.solid()) {
            (Some(made), Some(s)) => made::print(&m.mesh, body, &s.moments, metres, made).map(Some),
            _ => Ok(None),
        })
        .collect::<Result<_>>()?;
    let bodies: Vec<WeighedBody> = chosen
        .iter()
        .zip(results.iter().zip(&printed))
        .zip(facets)
        .map(|((&(i, body), (weighing, printed)), facets)| {
            let mut out = if is_cut(i) {
                filled(&m.mesh, body, metres, substance, about, progress)
            } else {
                weighed(&m.mesh, body, weighing, metres, substance, about)
            };
            let error = facets.map(|(said, error)| {
                out.facets = Some(said);
                error
            });
            if let (Some(error), None) = (error, printed) {
                facet_uncertainty(
                    &mut out,
                    weighing,
                    &error,
                    metres,
                    substance,
                    args.curves.true_curves,
                );
            }
            if let (Some(printed), Some(s)) = (printed, weighing.solid()) {
                let of = [(printed, s.moments.scaled(metres))];
                out.made = made::figures(&of, substance);
                let told = out.made.as_ref();
                warnings.extend(told.and_then(|f| made::trapped(&input.path, &body.id, f)));
                if let Some(s) = substance {
                    let mass = printed.mass(s.density.value);
                    out.figures = out.figures.with_mass(&mass);
                    out.uncertainty = printed_uncertainty(
                        &mass,
                        substance,
                        core_error(printed),
                        error.map(|e| e.scaled(metres)).as_ref(),
                    );
                }
            }
            out.findings = std::mem::take(&mut audit.bodies[i]);
            if let Some(refused) = &mut out.refused {
                advise_joining(refused, &out.findings, m.unit);
            }
            out
        })
        .collect();
    let missing: Vec<String> = bodies
        .iter()
        .filter(|b| b.refused.is_some())
        .map(|b| b.id.clone())
        .collect();
    let whole = (missing.is_empty() && !bodies.is_empty()).then(|| match &bodies[..] {
        [one] => Whole {
            figures: one.figures.clone(),
            made: one.made.clone(),
            estimate: one.estimate.clone(),
            uncertainty: one.uncertainty.clone(),
        },
        _ => {
            let mut sum = together(&chosen, &results, rule, metres, substance, about);
            if made.is_some() {
                print_together(&mut sum, &results, &printed, metres, substance);
            }
            match &cuts {
                // The same space can be shared only where surfaces cut or boxes meet.
                Some(c) if c.any || boxes_meet(&chosen) => {
                    whole_filled(&m.mesh, &chosen, metres, sum, substance, about, progress)
                }
                _ => sum,
            }
        }
    });
    let estimated = whole.as_ref().is_some_and(|w| w.estimate.is_some());
    let mass = whole.as_ref().and_then(|w| w.figures.mass_kg);
    audit.file.extend(soundness::unit_suspect(
        &m.mesh,
        m.unit,
        m.unit_assumed,
        mass,
    ));
    let file = WeighedFile {
        path: input.path.to_string_lossy().into_owned(),
        path_hex: path_hex(&input.path),
        format: Some(m.format),
        triangles: Some(m.mesh.soup.triangles.count() as u64),
        unit: Some(m.unit.symbol()),
        unit_assumed: m.unit_assumed,
        error: None,
        findings: if input.pick.is_some() {
            Vec::new()
        } else {
            audit.file
        },
        overlap: match &cuts {
            None => "untested",
            Some(c) if !c.any && !estimated => "none",
            Some(_) => "counted-once",
        },
        bodies: Some(bodies),
        whole,
        whole_missing: missing,
        proved: None,
        turned: None,
    };
    let flat = file.bodies.iter().flatten().filter(|b| b.facets.is_none());
    let flat: Vec<String> = flat.map(|b| b.id.clone()).collect();
    warnings.extend(args.curves.not_corrected(&input.path, &flat));
    Ok((file, warnings, m.beside.clone()))
}

/// What a body came to, in the file's unit.
enum Weighing {
    Closed(SolidIntegrals),
    Capped(Box<Estimate>),
    Refused(Refusal),
}

impl Weighing {
    fn solid(&self) -> Option<&SolidIntegrals> {
        match self {
            Self::Closed(s) => Some(s),
            Self::Capped(e) => Some(&e.solid),
            Self::Refused(_) => None,
        }
    }
}

fn weigh(mesh: &Mesh, body: &Body, rule: Option<NestedRule>, accept: Option<f64>) -> Weighing {
    match mesh.solid(body, rule) {
        Ok(solid) => Weighing::Closed(solid),
        Err(refusal) => match open::judge(mesh, body, rule, accept, refusal) {
            Opened::Accepted(e) => Weighing::Capped(e),
            Opened::Refused(r) => Weighing::Refused(r),
        },
    }
}

fn weighed(
    mesh: &Mesh,
    body: &Body,
    weighing: &Weighing,
    metres: f64,
    substance: Option<&Substance>,
    about: Option<[f64; 3]>,
) -> WeighedBody {
    let nested = (body.has_nested() && body.closed).then(|| {
        let volume = |rule| {
            mesh.solid(body, Some(rule))
                .map_or(0.0, |s| s.moments.zeroth)
                * metres.powi(3)
        };
        NestedFigures {
            sum_m3: volume(NestedRule::Sum),
            union_m3: volume(NestedRule::Union),
            void_m3: volume(NestedRule::Void),
        }
    });
    let of = |solid| Figures::of(solid, &body.bounds, metres, substance, about);
    let estimate = match weighing {
        Weighing::Capped(e) => Some(Estimated::of(&e.bounds, &e.caps, metres)),
        _ => None,
    };
    let uncertainty = weighing
        .solid()
        .and_then(|s| uncertainty(&s.moments.scaled(metres), substance, estimate.as_ref()));
    let (figures, refused) = match weighing {
        Weighing::Closed(solid) => (of(solid), None),
        Weighing::Capped(e) => (of(&e.solid), None),
        Weighing::Refused(r) => {
            let bounds = body.bounds.map(|p| p.map(|x| x * metres));
            let figures = Figures {
                area_m2: Some(mesh.area(body) * metres * metres).filter(|a| a.is_finite()),
                material: substance.and_then(|s| s.name.clone()),
                density_kg_m3: substance.map(|s| s.density.value),
                ..Figures::unknown(Some(bounds))
            };
            let refused = Refused {
                kind: r.kind,
                open_edges: r.open_edges,
                loops: r.loops,
                advice: r.advice.clone(),
            };
            (figures, Some(refused))
        }
    };
    WeighedBody {
        id: body.id.clone(),
        name: body.name.clone(),
        triangles: body.triangles as u64,
        closed: body.closed,
        turned: body.turned,
        shells: body.shell_count() as u64,
        voids: body.void_count() as u64,
        figures,
        nested,
        findings: Vec::new(),
        refused,
        made: None,
        estimate,
        facets: None,
        uncertainty,
    }
}

/// How far the mass figures of a volume (its moments in SI units) may be off.
pub(super) fn uncertainty(
    volume: &Moments,
    substance: Option<&Substance>,
    estimate: Option<&Estimated>,
) -> Option<Uncertainty> {
    let sources = BodySources {
        density: substance.map(|s| (s.name.clone(), s.density)),
        bounds: estimate.and_then(Estimated::sources),
        facets: None,
    };
    // A volume with an error that nothing bounds has a mass with one.
    if estimate.is_some() && sources.bounds.is_none() {
        return None;
    }
    sources.spread(volume)
}

/// Adds what facets that may stand for curves do to how far the mass figures may be off.
fn facet_uncertainty(
    out: &mut WeighedBody,
    weighing: &Weighing,
    error: &FacetError,
    metres: f64,
    substance: Option<&Substance>,
    corrected: bool,
) {
    let Some(solid) = weighing.solid() else {
        return;
    };
    let error = error.scaled(metres);
    let bias = if corrected {
        Moments::zero(error.moments.about)
    } else {
        error.moments.weighted(-1.0)
    };
    let sources = BodySources {
        density: substance.map(|s| (s.name.clone(), s.density)),
        bounds: None,
        facets: Some(FacetSource {
            bias,
            doubt: error.doubt,
        }),
    };
    out.uncertainty = sources.spread(&solid.moments.scaled(metres));
}

/// How far the mass figures of a print may be off: for its density, for the core's error figure,
/// and for facets that may stand for curves, of which the outside has all and the inside takes
/// some back. What a hollow keeps is taken to be off by the same share as the material.
fn printed_uncertainty(
    mass: &Moments,
    substance: Option<&Substance>,
    core_error: f64,
    facets: Option<&FacetError>,
) -> Option<Uncertainty> {
    let s = substance?;
    let (bias, doubt) = match facets {
        Some(e) => (e.moments.weighted(-1.0), e.doubt),
        None => (Moments::zero(mass.about), 0.0),
    };
    let sources = BodySources {
        density: Some((s.name.clone(), s.density)),
        bounds: None,
        facets: Some(FacetSource {
            bias,
            doubt: doubt + core_error,
        }),
    };
    sources.spread(&mass.weighted(1.0 / s.density.value))
}

/// How far the printed volume may be off for that of its core.
fn core_error(printed: &Printed) -> f64 {
    printed.core_error.unwrap_or(0.0) * (1.0 - printed.infill)
}

/// Of a body that only cracks keep open, the refusal names the distance that closes it.
fn advise_joining(refused: &mut Refused, findings: &[Finding], unit: LengthUnit) {
    // Where facets stand twice, joining alone does not help.
    if refused.kind != "not-closed" {
        return;
    }
    if let Some(distance) = closing_distance(findings, unit) {
        refused.advice = format!(
            "the surface is cracked: stitch it in the model and export again, or weigh it with --join \"{distance}\""
        );
    }
}

/// The error that `--filled` refines to, as a part of the volume.
const FILLED_TOLERANCE: f64 = 1e-6;

fn estimate(filled: &Filled, metres: f64) -> Estimated {
    Estimated {
        method: "columns of rays, each region counted once",
        if_: "three standard errors hold, and no overlap smaller than a lattice cell was missed"
            .to_owned(),
        volume_bound_m3: Some(filled.volume_error * metres.powi(3)),
        centre_bound_m: Some(filled.centre_error * metres),
        inertia_bound_m5: None,
    }
}

/// A body whose surface cuts itself, with each region counted once.
fn filled(
    mesh: &Mesh,
    body: &Body,
    metres: f64,
    substance: Option<&Substance>,
    about: Option<[f64; 3]>,
    progress: Progress<'_>,
) -> WeighedBody {
    let raw = weigh(mesh, body, Some(NestedRule::Sum), None);
    let sum = weighed(mesh, body, &raw, metres, substance, about);
    let Ok(found) = soundness::filled_bodies(mesh, &[body], FILLED_TOLERANCE, progress) else {
        return sum;
    };
    let volume = found.moments.scaled(metres);
    let f = &sum.figures;
    // The area of what is left when space is counted once is not known.
    let figures =
        Figures::from_volume(&volume, f64::NAN, f.condition, f.bounds_m, substance, about);
    let estimate = estimate(&found, metres);
    WeighedBody {
        figures,
        uncertainty: uncertainty(&volume, substance, Some(&estimate)),
        estimate: Some(estimate),
        ..sum
    }
}

/// Whether any two bodies' boxes share space; of more than a thousand bodies that is taken as so.
fn boxes_meet(bodies: &[(usize, &Body)]) -> bool {
    let apart = |a: &Body, b: &Body| {
        (0..3).any(|k| a.bounds[1][k] <= b.bounds[0][k] || b.bounds[1][k] <= a.bounds[0][k])
    };
    let n = bodies.len();
    n > 1000 || (0..n).any(|i| (i + 1..n).any(|j| !apart(bodies[i].1, bodies[j].1)))
}

/// All bodies together with each region counted once.
fn whole_filled(
    mesh: &Mesh,
    bodies: &[(usize, &Body)],
    metres: f64,
    sum: Whole,
    substance: Option<&Substance>,
    about: Option<[f64; 3]>,
    progress: Progress<'_>,
) -> Whole {
    let all: Vec<&Body> = bodies.iter().map(|(_, b)| *b).collect();
    let Ok(found) = soundness::filled_bodies(mesh, &all, FILLED_TOLERANCE, progress) else {
        return sum;
    };
    let volume = found.moments.scaled(metres);
    let f = &sum.figures;
    // The area of what is left when space is counted once is not known.
    let figures =
        Figures::from_volume(&volume, f64::NAN, f.condition, f.bounds_m, substance, about);
    let estimate = estimate(&found, metres);
    Whole {
        figures,
        made: None,
        uncertainty: uncertainty(&volume, substance, Some(&estimate)),
        estimate: Some(estimate),
    }
}

/// The whole of bodies that are printed.
fn print_together(
    sum: &mut Whole,
    results: &[Weighing],
    printed: &[Option<Printed>],
    metres: f64,
    substance: Option<&Substance>,
) {
    let each: Vec<(&Printed, Moments)> = results
        .iter()
        .zip(printed)
        .filter_map(|(w, p)| Some((p.as_ref()?, w.solid()?.moments.scaled(metres))))
        .collect();
    sum.made = made::figures(&each, substance);
    if let Some(s) = substance {
        let mass = each
            .iter()
            .map(|(p, _)| p.mass(s.density.value))
            .reduce(|a, b| a.plus(&b));
        if let Some(mass) = mass {
            sum.figures = sum.figures.clone().with_mass(&mass);
            let error = each.iter().map(|(p, _)| core_error(p)).sum();
            sum.uncertainty = printed_uncertainty(&mass, substance, error, None);
        }
    }
}

/// All bodies together: their moments added about the first one's point, in file order. Where
/// nested solids count once, a body inside one of them adds nothing.
fn together(
    bodies: &[(usize, &Body)],
    results: &[Weighing],
    rule: Option<NestedRule>,
    metres: f64,
    substance: Option<&Substance>,
    about: Option<[f64; 3]>,
) -> Whole {
    let mut total: Option<Moments> = None;
    let (mut area, mut absolute, mut bounds) = (0.0, 0.0, None);
    let mut caps: Vec<Cap> = Vec::new();
    for ((_, body), result) in bodies.iter().zip(results) {
        if rule == Some(NestedRule::Union) && body.is_in_nested() {
            continue;
        }
        let Some(solid) = result.solid() else {
            continue;
        };
        if let Weighing::Capped(e) = result {
            caps.extend(e.caps.iter().cloned());
        }
        let moments = solid.moments.scaled(metres);
        total = Some(total.map_or(moments, |t| t.plus(&moments)));
        area += solid.area * metres * metres;
        absolute += solid.absolute_volume * metres.powi(3);
        bounds = box_union(bounds, Some(body.bounds));
    }
    let total = total.unwrap_or_else(|| Moments::zero(nalgebra::Vector3::zeros()));
    let condition = Some(absolute / total.zeroth.abs()).filter(|c| c.is_finite());
    let estimate = (!caps.is_empty()).then(|| {
        let room = bounds.unwrap_or([[0.0; 3]; 2]);
        let bounds = soundness::cap::bounds(&caps, &total.scaled(1.0 / metres), room);
        Estimated::of(&bounds, &caps, metres)
    });
    let bounds = bounds.map(|b| b.map(|p| p.map(|x| x * metres)));
    Whole {
        figures: Figures::from_volume(&total, area, condition, bounds, substance, about),
        made: None,
        uncertainty: uncertainty(&total, substance, estimate.as_ref()),
        estimate,
    }
}
