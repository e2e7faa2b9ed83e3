//! How a part is printed: the numbers, and what they must satisfy.

use nalgebra::{Unit, Vector3};

use crate::error::{Error, Kind, Result};

/// How a part is printed. Lengths are in one unit, that of the facets it is used with.
#[derive(Clone, Debug, PartialEq)]
pub enum Made {
    /// Layer by layer, with walls, skins and infill.
    Layers(LayerPlan),
    /// A shell of one thickness around a hollow or sparse core.
    Shell(ShellPlan),
}

/// Material extrusion.
#[derive(Clone, Debug, PartialEq)]
pub struct LayerPlan {
    /// Height of a layer, above 0.
    pub layer: f64,
    /// Thickness of the walls, measured in the layer.
    pub wall: f64,
    /// A layer is skin where less than this much material lies above it.
    pub skin_top: f64,
    /// As `skin_top`, below it.
    pub skin_bottom: f64,
    /// Fraction of the core that is material, 0 to 1.
    pub infill: f64,
    /// The direction in which layers are stacked, in the facets' axes.
    pub up: Unit<Vector3<f64>>,
    /// Diameter of the filament, above 0.
    pub filament: f64,
}

/// A hollowed part.
#[derive(Clone, Debug, PartialEq)]
pub struct ShellPlan {
    /// Thickness of the shell, measured from the surface inward.
    pub thickness: f64,
    /// Fraction of the core that is material; `None` for a hollow, which is built in powder or
    /// resin and keeps it where nothing drains it.
    pub infill: Option<f64>,
    /// Openings: points at or near the surface, each of which drains the hollow next to it.
    pub drains: Vec<[f64; 3]>,
    /// Density of what a closed hollow keeps; `None`: the part's own.
    pub fill_density: Option<f64>,
}

impl LayerPlan {
    /// # Errors
    /// `bad-number` where a figure is not finite or out of its range.
    pub(super) fn judge(&self) -> Result<()> {
        above_zero("the layer height", self.layer)?;
        above_zero("the filament's diameter", self.filament)?;
        not_negative("the wall", self.wall)?;
        not_negative("the top skin", self.skin_top)?;
        not_negative("the bottom skin", self.skin_bottom)?;
        fraction("the infill", self.infill)
    }
}

impl ShellPlan {
    /// # Errors
    /// `bad-number` where a figure is not finite or out of its range.
    pub(super) fn judge(&self) -> Result<()> {
        not_negative("the shell's thickness", self.thickness)?;
        if let Some(f) = self.infill {
            fraction("the infill", f)?;
        }
        if let Some(d) = self.fill_density {
            not_negative("the density of the fill", d)?;
        }
        for p in self.drains.iter().flatten() {
            if !p.is_finite() {
                return Err(out_of_range("a drain's position", *p, "write numbers"));
            }
        }
        Ok(())
    }
}

fn above_zero(what: &str, x: f64) -> Result<()> {
    if x.is_finite() && x > 0.0 {
        return Ok(());
    }
    Err(out_of_range(what, x, "write a length above zero"))
}

fn not_negative(what: &str, x: f64) -> Result<()> {
    if x.is_finite() && x >= 0.0 {
        return Ok(());
    }
    Err(out_of_range(what, x, "write zero or more"))
}

fn fraction(what: &str, x: f64) -> Result<()> {
    if (0.0..=1.0).contains(&x) {
        return Ok(());
    }
    Err(out_of_range(what, x, "write a share from 0 % to 100 %"))
}

fn out_of_range(what: &str, x: f64, advice: &str) -> Error {
    Error::new(
        Kind::BadNumber,
        format!("{what} is {x}, which no print can have"),
        advice,
    )
}
