//! Material extrusion: walls, skins and infill layer by layer.

use std::sync::atomic::{AtomicUsize, Ordering};

use nalgebra::Vector3;
use rayon::prelude::*;

use super::frame::frame;
use super::inset::inset_contour;
use super::region::{Flat, Grid, Overlayer, Region, extent};
use super::section::{Crossings, Stack};
use super::windows::Windows;
use super::{LayerPlan, Printed, Progress, Shares};
use crate::error::{Error, Kind, Result};
use crate::geometry::Corners;
use crate::geometry::eft::Sum;
use crate::moments::{Moments, Placement};

/// A whole number of layers is taken as such where a thickness misses it by this part of a layer,
/// which decimal figures do in binary.
const WHOLE: f64 = 1e-6;

/// A closed body as material extrusion prints it.
///
/// `facets` are the body's, closed and facing outward, voids included; `solid` is what they
/// enclose. The lengths of `plan` are in their unit, and so is the result. Each layer is cut at
/// its middle; the core of a layer is what is at least a wall away from the section's boundary
/// and in the sections of all layers within the skins' thickness above and below, counted in
/// whole layers, so that skins are at least as thick as asked. With skins and walls of nothing the
/// core is the solid. The core's error falls with the square of the layer height where skins are
/// whole layers, since it is integrated by the midpoint rule.
///
/// # Errors
/// `bad-number` for a plan that no print can have, `too-large` for too many layers, `not-closed`
/// where the facets do not close.
pub fn layered(
    facets: &impl Corners,
    solid: &Moments,
    plan: &LayerPlan,
    progress: Option<Progress<'_>>,
) -> Result<Printed> {
    plan.judge()?;
    let frame = frame(&plan.up);
    let stack = Stack::under(facets, frame, plan.layer)?;
    let n = stack.count;
    let tick = Tick::new(2 * n, progress);
    let mut out = Printed {
        moments: *solid,
        core: Moments::zero(solid.about),
        infill: plan.infill,
        hollow: false,
        shares: Shares::default(),
        filament: None,
        bed_contact: Some(0.0),
        layers: Some(n),
        trapped: None,
        core_error: None,
    };
    if n == 0 {
        return Err(Error::new(
            Kind::BadNumber,
            "the part is not even half a layer high, and no layer of it is printed",
            "check the layer's height and the unit of the mesh",
        ));
    }
    let grid = stack.grid();
    let crossings = Crossings::of(facets, &stack)?;
    let sections: Vec<Region> = (0..n)
        .into_par_iter()
        .map_init(Overlayer::new, |o, k| {
            let contours = crossings.contours(facets, &stack, &grid, k)?;
            tick.one();
            Ok(o.wound(&contours))
        })
        .collect::<Result<_>>()?;
    drop(crossings);
    out.bed_contact = Some(Flat::of(&sections[0], &grid).area);
    let whole = plan.wall == 0.0 && plan.skin_top == 0.0 && plan.skin_bottom == 0.0;
    if whole {
        out.core = *solid;
        finish(&mut out, solid, plan, [0.0, 0.0]);
        return Ok(out);
    }
    let cores = cores(&sections, &grid, &stack, plan, &tick);
    let [mut wall, mut skin] = [Sum::ZERO; 2];
    let [x, y] = grid.middle();
    let mut core = Moments::zero(Vector3::new(x, y, stack.middle(n / 2)));
    for layer in &cores {
        wall.add(layer.wall);
        skin.add(layer.skin);
        if let Some(slab) = &layer.core {
            core = core.plus(slab);
        }
    }
    let back = Placement {
        turn: frame.transpose(),
        at: Vector3::zeros(),
    };
    // Held about a point of the part, as the solid is: the figures of far parts keep their digits.
    out.core = core.placed(&back).shifted(solid.about);
    finish(&mut out, solid, plan, [wall.value(), skin.value()]);
    Ok(out)
}

/// One layer's core and the areas around it.
struct Layer {
    wall: f64,
    skin: f64,
    core: Option<Moments>,
}

fn cores(
    sections: &[Region],
    grid: &Grid,
    stack: &Stack,
    plan: &LayerPlan,
    tick: &Tick<'_>,
) -> Vec<Layer> {
    let most = sections.len();
    let in_layers = |skin: f64| {
        let count = (skin / plan.layer - WHOLE).ceil().max(0.0);
        (count as usize).min(most)
    };
    let (above, below) = (in_layers(plan.skin_top), in_layers(plan.skin_bottom));
    let windows = Windows::of(sections, above + below + 1);
    let w = grid.steps(plan.wall);
    let one = |o: &mut Overlayer, k: usize| {
        let section = &sections[k];
        let area = Flat::of(section, grid).area;
        let solid = Layer {
            wall: area,
            skin: 0.0,
            core: None,
        };
        // Walls as wide as half the section leave nothing, and the grid room for no more.
        let thin = extent(section).is_none_or(|e| w >= e[0] / 2.0 || w >= e[1] / 2.0);
        if thin {
            return solid;
        }
        let inset = if w > 0.0 {
            o.wound(&inset_contour(section, w))
        } else {
            section.clone()
        };
        let inner = Flat::of(&inset, grid).area;
        if inner <= 0.0 {
            return solid;
        }
        let core = if above + below == 0 {
            inset
        } else if k < below {
            Region::default()
        } else {
            windows.common(o, &inset, k - below)
        };
        let flat = Flat::of(&core, grid);
        Layer {
            wall: area - inner,
            skin: inner - flat.area,
            core: (flat.area > 0.0).then(|| flat.slab(stack.middle(k), plan.layer)),
        }
    };
    (0..sections.len())
        .into_par_iter()
        .map_init(Overlayer::new, |o, k| {
            let layer = one(o, k);
            tick.one();
            layer
        })
        .collect()
}

/// The part from its core: material, shares, filament. `around` weighs walls against skins.
fn finish(out: &mut Printed, solid: &Moments, plan: &LayerPlan, around: [f64; 2]) {
    let empty = 1.0 - plan.infill;
    if empty > 0.0 {
        out.moments = solid.plus(&out.core.weighted(-empty));
    }
    if out.core.zeroth == solid.zeroth && plan.infill == 0.0 {
        // Nothing is printed: exactly nothing, also of what rounding would leave.
        out.moments = Moments::zero(solid.about);
    }
    let printed = out.moments.zeroth;
    let sparse = plan.infill * out.core.zeroth;
    let full = (printed - sparse).max(0.0);
    let [wall, skin] = around;
    if printed > 0.0 {
        // The sections' own areas say how the full material is shared, the exact volume how much
        // of it there is.
        let part = |x: f64| {
            if wall + skin > 0.0 {
                x / (wall + skin)
            } else {
                0.0
            }
        };
        out.shares = Shares {
            wall: full * part(wall) / printed,
            skin: full * part(skin) / printed,
            infill: sparse / printed,
        };
    }
    let thread = std::f64::consts::PI * plan.filament * plan.filament / 4.0;
    out.filament = Some(printed / thread);
}

/// Counts steps from many threads.
pub(super) struct Tick<'a> {
    done: AtomicUsize,
    of: usize,
    progress: Option<Progress<'a>>,
}

impl<'a> Tick<'a> {
    pub(super) fn new(of: usize, progress: Option<Progress<'a>>) -> Self {
        Self {
            done: AtomicUsize::new(0),
            of,
            progress,
        }
    }

    pub(super) fn one(&self) {
        if let Some(tell) = self.progress {
            tell(self.done.fetch_add(1, Ordering::Relaxed) + 1, self.of);
        }
    }
}
