//! Printed parts: walls and skins full, the inside sparse or hollow.
//!
//! A printed part is the solid of its mesh less the share of its core that is left empty: with V
//! the moments of the solid and C those of the core, it is V − (1 − infill)·C. V is exact for the
//! mesh, so that only the core carries the error of a method, and an infill of 100 % gives the
//! solid itself.
//!
//! - [`layered`] takes the core from sections as material extrusion lays them: walls measured in
//!   the layer, skins across layers.
//! - [`hollowed`] takes the core as all that lies deeper than a thickness below the surface.
//!
//! Words after ISO/ASTM 52900:2021 where it has them; wall, skin and infill are common practice.
//! Supports, brim and purge are left out of every figure.

mod cell;
mod distance;
mod frame;
mod hollow;
mod hollows;
mod inset;
mod layers;
mod plan;
mod region;
mod section;
mod windows;

pub use hollow::hollowed;
pub use layers::layered;
pub use plan::{LayerPlan, Made, ShellPlan};

use crate::error::Result;
use crate::geometry::Corners;

use crate::moments::Moments;

/// What is called with (steps done, steps in all) while work goes on, from any thread.
pub type Progress<'a> = &'a (dyn Fn(usize, usize) + Sync);

/// A part as it is printed. Lengths are in the unit of the facets that it was made from; weights
/// are 1 where material is, so that moments times its density are those of mass.
#[derive(Clone, Debug, PartialEq)]
pub struct Printed {
    /// Moments of the material, without what a closed hollow keeps.
    pub moments: Moments,
    /// Moments of the core: of what is printed at the infill's fraction, or is hollow.
    pub core: Moments,
    /// Fraction of the core that is material, 0 to 1.
    pub infill: f64,
    /// Whether the core is a hollow and not infill.
    pub hollow: bool,
    /// How the material is shared out.
    pub shares: Shares,
    /// Length of feedstock that it takes, where it is laid from a filament.
    pub filament: Option<f64>,
    /// Area of the first layer, which lies on the bed.
    pub bed_contact: Option<f64>,
    /// Number of layers.
    pub layers: Option<usize>,
    /// What a hollow without an opening keeps.
    pub trapped: Option<Trapped>,
    /// How far the volume of the core may be off; `None` for layers, which are what is printed.
    pub core_error: Option<f64>,
}

/// Parts of the printed volume, 0 to 1; all zero where nothing is printed.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Shares {
    /// Walls; of a shell all of it.
    pub wall: f64,
    /// Skins.
    pub skin: f64,
    /// Infill.
    pub infill: f64,
}

/// Hollows that no opening reaches, and that keep the powder or resin they were built in.
#[derive(Clone, Debug, PartialEq)]
pub struct Trapped {
    /// Moments of the hollows.
    pub hollow: Moments,
    /// How many there are.
    pub count: usize,
    /// Density of what is in them, where it was stated.
    pub fill_density: Option<f64>,
}

/// A closed body as it is made: [`layered`] or [`hollowed`].
///
/// # Errors
/// Those of the method.
pub fn print(
    facets: &impl Corners,
    solid: &Moments,
    made: &Made,
    progress: Option<Progress<'_>>,
) -> Result<Printed> {
    match made {
        Made::Layers(plan) => layered(facets, solid, plan, progress),
        Made::Shell(plan) => hollowed(facets, solid, plan, progress),
    }
}

impl Printed {
    /// Moments of mass for a density of the material, with what closed hollows keep where the
    /// density of that was stated.
    pub fn mass(&self, density: f64) -> Moments {
        let part = self.moments.weighted(density);
        let kept = self.trapped.as_ref();
        match kept.and_then(|t| Some((&t.hollow, t.fill_density?))) {
            None => part,
            Some((hollow, fill)) => part.plus(&hollow.weighted(fill)),
        }
    }

    /// Moments of the material: how a mass is spread where no density is known.
    pub fn evenly(&self) -> Moments {
        self.moments
    }
}

#[cfg(test)]
pub(crate) mod tests;
