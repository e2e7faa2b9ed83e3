//! `--layers` and `--shell` of `weigh`: how a body is printed.

use clap::Args;
use nalgebra::{Unit, Vector3};

use super::point;
use crate::error::{Error, Kind, Result, Warning};
use crate::geometry::LooseFacets;
use crate::masses::{PrintFigures, PrintedBody, Substance};
use crate::mesh::{Body, Mesh};
use crate::moments::Moments;
use crate::printed::{self, LayerPlan, Made, Printed, ShellPlan};
use crate::quantity::{Dimension, LengthUnit, Quantity, QuantityError};

/// How a body is printed.
#[derive(Args, Clone, Debug, Default)]
pub(super) struct MadeArgs {
    /// Weigh as printed in layers of this height, with --wall, --skin and --infill
    #[arg(long, value_name = "H", help_heading = "As printed", conflicts_with_all = ["shell", "nested", "filled", "accept_open", "whole"],
          requires_all = ["wall", "skin", "infill"])]
    layers: Option<String>,
    /// Thickness of the walls, measured in the layer
    #[arg(
        long,
        value_name = "T",
        help_heading = "As printed",
        requires = "layers"
    )]
    wall: Option<String>,
    /// Thickness of material above and below which the inside begins: one, or TOP,BOTTOM
    #[arg(
        long,
        value_name = "T",
        help_heading = "As printed",
        requires = "layers"
    )]
    skin: Option<String>,
    /// Share of the inside that is material, in per cent
    #[arg(long, value_name = "P", help_heading = "As printed")]
    infill: Option<String>,
    /// Direction in which layers are stacked: an axis, or X,Y,Z
    #[arg(
        long,
        value_name = "X,Y,Z",
        help_heading = "As printed",
        requires = "layers",
        allow_hyphen_values = true
    )]
    up: Option<String>,
    /// Diameter of the filament; 1.75 mm if not given
    #[arg(
        long,
        value_name = "D",
        help_heading = "As printed",
        requires = "layers"
    )]
    filament: Option<String>,
    /// Weigh as a shell of this thickness; hollow unless --infill is given
    #[arg(long, value_name = "T", help_heading = "As printed",
          conflicts_with_all = ["nested", "filled", "accept_open", "whole"])]
    shell: Option<String>,
    /// Where a hole empties the hollow; without one it keeps its powder or resin (may be repeated)
    #[arg(
        long,
        value_name = "X,Y,Z",
        help_heading = "As printed",
        requires = "shell",
        conflicts_with = "infill",
        allow_hyphen_values = true
    )]
    drain: Vec<String>,
    /// Density of what a closed hollow keeps, to be in the mass; left out and said if not given
    #[arg(
        long,
        value_name = "Q",
        help_heading = "As printed",
        requires = "shell"
    )]
    fill: Option<String>,
}

impl MadeArgs {
    /// The plan, bare lengths in `unit`, in m; `None` for a solid.
    ///
    /// # Errors
    /// Of the options.
    pub(super) fn plan(&self, unit: LengthUnit) -> Result<Option<Made>> {
        let length = |name: &str, text: &str| {
            let q = Quantity::parse(text.trim(), Dimension::Length, Some(unit))
                .map_err(|e| of(name, e))?;
            match q.tolerance {
                None => Ok(q.value),
                Some(_) => Err(Error::new(
                    Kind::Usage,
                    format!("{name}: a tolerance is not taken here"),
                    "state the part in an assembly file, where `made` takes tolerances",
                )),
            }
        };
        let infill = self.infill.as_deref().map(percent).transpose()?;
        if let Some(layers) = &self.layers {
            // The parser has seen to it that they are there.
            let (wall, skin) = (self.wall.as_deref(), self.skin.as_deref());
            let skin = skin.unwrap_or("0");
            let (top, bottom) = skin.split_once(',').unwrap_or((skin, skin));
            let layer = length("--layers", layers)?;
            let filament = match &self.filament {
                None => 1.75e-3,
                Some(d) => length("--filament", d)?,
            };
            for (name, x) in [("--layers", layer), ("--filament", filament)] {
                if x <= 0.0 {
                    return Err(Error::new(
                        Kind::BadNumber,
                        format!("{name} is not above zero"),
                        "write a length above zero",
                    ));
                }
            }
            return Ok(Some(Made::Layers(LayerPlan {
                layer,
                wall: length("--wall", wall.unwrap_or("0"))?,
                skin_top: length("--skin", top)?,
                skin_bottom: length("--skin", bottom)?,
                infill: infill.unwrap_or(1.0),
                up: up(self.up.as_deref().unwrap_or("z"))?,
                filament,
            })));
        }
        let Some(shell) = &self.shell else {
            if infill.is_some() {
                return Err(Error::new(
                    Kind::Usage,
                    "--infill stands without --layers or --shell",
                    "say how the part is printed",
                ));
            }
            return Ok(None);
        };
        let fill = self.fill.as_deref().map(|text| {
            Quantity::parse(text, Dimension::Density, None)
                .map(|q| q.value)
                .map_err(|e| of("--fill", e))
        });
        let drains = self.drain.iter().map(|text| {
            point(text, unit).map_err(|e| {
                Error::new(
                    e.kind,
                    e.message.replacen("--about", "--drain", 1),
                    e.advice,
                )
            })
        });
        Ok(Some(Made::Shell(ShellPlan {
            thickness: length("--shell", shell)?,
            infill,
            drains: drains.collect::<Result<_>>()?,
            fill_density: fill.transpose()?,
        })))
    }
}

fn of(name: &str, e: QuantityError) -> Error {
    Error::new(e.kind, format!("{name}: {}", e.message), e.advice)
}

/// A share such as `20`, `20%` or `20 %`.
fn percent(text: &str) -> Result<f64> {
    let number = text.trim().trim_end_matches('%').trim_end();
    match number.parse::<f64>() {
        Ok(p) if (0.0..=100.0).contains(&p) => Ok(p / 100.0),
        _ => Err(Error::new(
            Kind::BadNumber,
            format!("--infill: \"{text}\" is no share of the inside"),
            "write a share from 0 % to 100 %, such as \"20 %\"",
        )),
    }
}

fn up(text: &str) -> Result<Unit<Vector3<f64>>> {
    let bad = || {
        Error::new(
            Kind::BadNumber,
            format!("--up: \"{text}\" is no direction"),
            "write x, y or z, or three numbers parted by commas that are not all zero",
        )
    };
    let axis = match text.trim() {
        "x" => Some(Vector3::x()),
        "y" => Some(Vector3::y()),
        "z" => Some(Vector3::z()),
        "-x" => Some(-Vector3::x()),
        "-y" => Some(-Vector3::y()),
        "-z" => Some(-Vector3::z()),
        _ => None,
    };
    if let Some(axis) = axis {
        return Ok(Unit::new_normalize(axis));
    }
    let numbers: Vec<f64> = text
        .split(',')
        .map(|n| n.trim().parse::<f64>().ok().filter(|x| x.is_finite()))
        .collect::<Option<_>>()
        .ok_or_else(bad)?;
    let &[x, y, z] = &numbers[..] else {
        return Err(bad());
    };
    let largest = x.abs().max(y.abs()).max(z.abs());
    if largest == 0.0 {
        return Err(bad());
    }
    Ok(Unit::new_normalize(Vector3::new(x, y, z) / largest))
}

/// A body of a mesh as it is printed, in m.
///
/// # Errors
/// Those of the method.
pub(super) fn print(
    mesh: &Mesh,
    body: &Body,
    solid: &Moments,
    metres: f64,
    made: &Made,
) -> Result<Printed> {
    let mut facets = mesh.outward_facets(body);
    for x in facets.iter_mut().flatten().flatten() {
        *x *= metres;
    }
    printed::print(&LooseFacets(&facets), &solid.scaled(metres), made, None)
        .map_err(|e| Error::new(e.kind, format!("`{}`: {}", body.id, e.message), e.advice))
}

/// The figures of bodies printed alike; each with its solid's moments in m.
pub(super) fn figures(
    bodies: &[(&Printed, Moments)],
    substance: Option<&Substance>,
) -> Option<PrintFigures> {
    let density = substance.map(|s| s.density.value);
    let each: Vec<PrintedBody<'_>> = bodies
        .iter()
        .map(|(printed, solid)| PrintedBody {
            printed,
            solid,
            density,
        })
        .collect();
    PrintFigures::of(&each, None)
}

/// A printing material that is weighed as a solid.
pub(super) fn caution(name: &str) -> Warning {
    Warning {
        kind: "printed-as-solid".to_owned(),
        message: format!(
            "{name} is a printing material, and it is weighed as solid: walls with a sparse inside can weigh a fraction of that"
        ),
        path: None,
        line: None,
        advice: "give --layers with --wall, --skin and --infill, or --shell; a part printed at an infill of 100 % is solid"
            .to_owned(),
    }
}

/// What a closed hollow does to the mass.
pub(super) fn trapped(path: &std::path::Path, id: &str, f: &PrintFigures) -> Option<Warning> {
    let t = f.trapped.as_ref()?;
    Some(Warning {
        kind: "trapped".to_owned(),
        message: format!(
            "`{id}`: closed hollows of {:.3} cm³ keep the powder or resin they were built in, and the mass {}",
            t.volume_m3 * 1e6,
            if t.density_assumed { "leaves that out" } else { "holds that" },
        ),
        path: Some(path.to_string_lossy().into_owned()),
        line: None,
        advice: "state the density of what stays with --fill, or the holes with --drain, or --infill where the inside is printed in air"
            .to_owned(),
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    fn layers() -> MadeArgs {
        let some = |t: &str| Some(t.to_owned());
        MadeArgs {
            layers: some("0.2"),
            wall: some("0.9 mm"),
            skin: some("1, 0.08 cm"),
            infill: some("20 %"),
            up: some("0,0,-3"),
            ..MadeArgs::default()
        }
    }

    #[test]
    fn options_are_read_with_and_without_units() {
        let Some(Made::Layers(p)) = layers().plan(LengthUnit::Mm).unwrap() else {
            panic!("not layers");
        };
        assert_eq!((p.layer, p.wall, p.infill), (0.2e-3, 0.9e-3, 0.2));
        assert_eq!((p.skin_top, p.skin_bottom), (1e-3, 0.8e-3));
        assert_eq!(p.up.into_inner(), Vector3::new(0.0, 0.0, -1.0));
        assert_eq!(p.filament, 1.75e-3);
        let shell = MadeArgs {
            shell: Some("2".to_owned()),
            drain: vec!["1,2,3 cm".to_owned()],
            ..MadeArgs::default()
        };
        let Some(Made::Shell(p)) = shell.plan(LengthUnit::Mm).unwrap() else {
            panic!("no shell");
        };
        assert_eq!((p.thickness, p.infill), (2e-3, None));
        assert_eq!(p.drains, [[1e-3, 2e-3, 30e-3]]);
        assert_eq!(MadeArgs::default().plan(LengthUnit::Mm).unwrap(), None);
    }

    #[test]
    fn options_that_make_no_sense_are_named() {
        let some = |t: &str| Some(t.to_owned());
        for (args, word) in [
            (
                MadeArgs {
                    layers: some("0"),
                    ..layers()
                },
                "--layers",
            ),
            (
                MadeArgs {
                    wall: some("2 kg"),
                    ..layers()
                },
                "--wall",
            ),
            (
                MadeArgs {
                    skin: some("1,2,3"),
                    ..layers()
                },
                "--skin",
            ),
            (
                MadeArgs {
                    infill: some("120"),
                    ..layers()
                },
                "--infill",
            ),
            (
                MadeArgs {
                    up: some("0,0,0"),
                    ..layers()
                },
                "--up",
            ),
            (
                MadeArgs {
                    up: some("w"),
                    ..layers()
                },
                "--up",
            ),
            (
                MadeArgs {
                    filament: some("-1"),
                    ..layers()
                },
                "--filament",
            ),
            (
                MadeArgs {
                    infill: some("20"),
                    ..MadeArgs::default()
                },
                "--infill",
            ),
        ] {
            let e = args.plan(LengthUnit::Mm).unwrap_err();
            assert!(e.message.contains(word), "{word}: {e}");
        }
    }
}
