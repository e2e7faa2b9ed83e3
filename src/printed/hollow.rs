//! Shells: the core is all that lies deeper than a thickness below the surface.
//!
//! The signed distance from the surface is taken at the middles of the cells of an octree. It
//! changes by no more than a step does, so that a cell whose middle is more than half a diagonal
//! to either side of the thickness lies wholly in the core or outside it, and is added exactly or
//! dropped. What remains is cut by the planes at the thickness below the nearest places of the
//! surface, as seen from the cell's middle and corners; for flat faces that is exact. A cell is
//! halved until its halves change its volume by less than its share of the error allowed. The sum
//! of the last changes is the error figure: as they fall fourfold from level to level, it is
//! about three times the error that is left.

use nalgebra::Vector3;
use rayon::prelude::*;

use super::cell::{self, HalfSpace};
use super::distance::{Sight, Surface};
use super::hollows;
use super::{Printed, Progress, Shares, ShellPlan};
use crate::error::{Error, Kind, Result};
use crate::geometry::Corners;
use crate::moments::Moments;

/// The core's volume is refined until the error figure is this part of the solid's.
const TOLERANCE: f64 = 1e-4;
/// A core that is known no better than this part of the solid's volume is not told.
const WORST: f64 = 0.01;
/// Levels at which cells are halved without being asked, as they are while larger than the
/// shell's thickness: a core that hides between samples that agree is then next to nothing beside
/// the shell around it.
const FIRST: u8 = 5;
/// Levels of the octree, for parts that are long and thin.
const LAST: u8 = 18;
/// Cells cut at one level, at most: some 200 bytes each.
const MOST_CELLS: usize = 200_000;

/// A cube of the octree over the part.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub(super) struct Cell {
    pub(super) level: u8,
    pub(super) at: [u32; 3],
}

/// The cube that the octree divides.
#[derive(Clone, Copy, Debug)]
pub(super) struct Room {
    low: Vector3<f64>,
    side: f64,
}

impl Room {
    pub(super) fn half(&self, level: u8) -> f64 {
        self.side / f64::from(2_u32 << level)
    }

    pub(super) fn middle(&self, cell: &Cell) -> Vector3<f64> {
        let half = self.half(cell.level);
        self.low + Vector3::from(cell.at.map(|i| f64::from(2 * i + 1) * half))
    }
}

/// A part of the core: a cell with the moments of what of it is core.
pub(super) type Leaf = (Cell, Moments);

/// A closed body as a shell of one thickness around a core that is hollow or sparse.
///
/// `facets` are the body's, closed and facing outward, voids included; `solid` is what they
/// enclose. The lengths of `plan` are in their unit, and so is the result. A hollow (no `infill`)
/// that no drain opens keeps what it was built in: see [`Printed::trapped`]. Holes of drains are
/// not taken off the shell.
///
/// # Errors
/// `bad-number` for a plan that no print can have, `usage` for a drain that reaches no hollow,
/// `too-large` where the core cannot be found within 1 % of the solid's volume.
pub fn hollowed(
    facets: &impl Corners,
    solid: &Moments,
    plan: &ShellPlan,
    progress: Option<Progress<'_>>,
) -> Result<Printed> {
    plan.judge()?;
    let infill = plan.infill.unwrap_or(0.0);
    let room = room(facets)?;
    let (leaves, error) = if plan.thickness == 0.0 {
        (Vec::new(), 0.0)
    } else {
        core(facets, &room, solid.zeroth, plan.thickness, progress)
    };
    if error > WORST * solid.zeroth {
        return Err(Error::new(
            Kind::TooLarge,
            "the shell is too thin for the part's size and detail: its inside is not found within 1 %",
            "take a thicker shell, weigh the solid, or hollow the mesh in the program that made it",
        ));
    }
    let core = if plan.thickness == 0.0 {
        *solid
    } else {
        sum(solid, leaves.iter())
    };
    let mut moments = solid.plus(&core.weighted(infill - 1.0));
    if moments.zeroth <= 0.0 {
        // A shell of no thickness: nothing, also of what rounding would leave.
        moments = Moments::zero(solid.about);
    }
    let trapped = match plan.infill {
        Some(_) => None,
        None if plan.thickness == 0.0 => None,
        None => hollows::trapped(&leaves, &room, solid, plan)?,
    };
    let sparse = infill * core.zeroth;
    let shares = if moments.zeroth > 0.0 {
        Shares {
            wall: 1.0 - sparse / moments.zeroth,
            skin: 0.0,
            infill: sparse / moments.zeroth,
        }
    } else {
        Shares::default()
    };
    Ok(Printed {
        moments,
        core,
        infill,
        hollow: plan.infill.is_none(),
        shares,
        filament: None,
        bed_contact: None,
        layers: None,
        trapped,
        core_error: Some(error),
    })
}

/// The moments of leaves together, about the solid's point.
pub(super) fn sum<'l>(solid: &Moments, leaves: impl Iterator<Item = &'l Leaf>) -> Moments {
    leaves.fold(Moments::zero(solid.about), |sum, (_, m)| sum.plus(m))
}

fn room(facets: &impl Corners) -> Result<Room> {
    let (mut low, mut high) = (
        Vector3::repeat(f64::INFINITY),
        Vector3::repeat(f64::NEG_INFINITY),
    );
    for i in 0..facets.count() {
        for p in facets.triangle(i) {
            low = low.inf(&Vector3::from(p));
            high = high.sup(&Vector3::from(p));
        }
    }
    let side = (high - low).max();
    if !side.is_finite() || side <= 0.0 {
        return Err(Error::new(
            Kind::NotFinite,
            "the part's box cannot be divided into cells",
            "check the unit of the mesh",
        ));
    }
    // A little larger, so that no face of a plain part lies in the faces of cells.
    let side = side * 1.013;
    Ok(Room {
        low: (low + high) / 2.0 - Vector3::repeat(side / 2.0),
        side,
    })
}

/// What a cell is of the core.
enum State {
    Without,
    Within(Moments),
    Cut(Moments),
}

/// A cell that the core's boundary may cross, with what its middle sees.
struct Open {
    cell: Cell,
    depth: f64,
    moments: Moments,
}

struct Search<'a, C> {
    surface: Surface<'a, C>,
    room: &'a Room,
    thickness: f64,
}

impl<C: Corners> Search<'_, C> {
    /// `bound`: the surface is at most this far from the cell's middle.
    fn look(&self, cell: Cell, bound: f64) -> (State, f64) {
        let half = self.room.half(cell.level);
        let middle = self.room.middle(&cell);
        let sight = self.surface.from(&middle, bound);
        let reach = half * 3.0_f64.sqrt();
        let over = sight.depth - self.thickness;
        let state = if over >= reach {
            State::Within(cell::whole(&middle, half))
        } else if over <= -reach {
            State::Without
        } else if cell.level < FIRST {
            State::Cut(Moments::zero(middle))
        } else {
            State::Cut(self.cut(&middle, half, &sight))
        };
        (state, sight.depth)
    }

    fn cut(&self, middle: &Vector3<f64>, half: f64, from_middle: &Sight) -> Moments {
        let mut samples = [(*middle, *from_middle); 9];
        let reach = half * 3.0_f64.sqrt();
        for (i, sample) in samples.iter_mut().enumerate().skip(1) {
            let sign = |bit: usize| if (i - 1) >> bit & 1 == 1 { half } else { -half };
            let x = middle + Vector3::new(sign(0), sign(1), sign(2));
            *sample = (x, self.surface.from(&x, from_middle.depth.abs() + reach));
        }
        let space = |(x, s): &(Vector3<f64>, Sight)| HalfSpace {
            inward: s.inward,
            from: s.inward.dot(x) - (s.depth - self.thickness),
        };
        let mut spaces: Vec<HalfSpace> = Vec::with_capacity(9);
        let same = 1e-9 * half;
        for sample in &samples {
            let plane = space(sample);
            let seen = |x: &Vector3<f64>, depth: f64| plane.over(x) - (depth - self.thickness);
            // Below convex places of the surface every plane lies above the depth, and what is in
            // all of them is the core. Where one does not, around a place that juts into the
            // part, the middle's plane alone is the best guess.
            if samples.iter().any(|(x, s)| seen(x, s.depth) < -same) {
                return cell::cut(middle, half, &[space(&samples[0])]);
            }
            let alike = |p: &HalfSpace| {
                (p.inward - plane.inward).norm() < 1e-9
                    && (p.over(middle) - plane.over(middle)).abs() < same
            };
            if !spaces.iter().any(alike) {
                spaces.push(plane);
            }
        }
        cell::cut(middle, half, &spaces)
    }
}

fn core(
    facets: &impl Corners,
    room: &Room,
    volume: f64,
    thickness: f64,
    progress: Option<Progress<'_>>,
) -> (Vec<Leaf>, f64) {
    let search = Search {
        surface: Surface::new(facets, room.side),
        room,
        thickness,
    };
    let mut leaves: Vec<Leaf> = Vec::new();
    let root = Cell {
        level: 0,
        at: [0; 3],
    };
    let mut open = vec![Open {
        cell: root,
        depth: f64::INFINITY,
        moments: Moments::zero(room.middle(&root)),
    }];
    let (mut settled, mut left) = (0.0, TOLERANCE * volume);
    for level in 0..LAST {
        if open.is_empty() {
            break;
        }
        let halved: Vec<Vec<(Cell, State, f64)>> = open
            .par_iter()
            .with_min_len(16)
            .map(|parent| children(&search, parent))
            .collect();
        if let Some(tell) = progress {
            tell(usize::from(level) + 1, usize::from(LAST));
        }
        let change = |parent: &Open, children: &[(Cell, State, f64)]| {
            let found: f64 = children
                .iter()
                .map(|(_, state, _)| match state {
                    State::Without => 0.0,
                    State::Within(m) | State::Cut(m) => m.zeroth,
                })
                .sum();
            (found - parent.moments.zeroth).abs()
        };
        let estimated = level >= FIRST;
        let judged = estimated && 2.0 * room.half(level) <= thickness;
        let changes: Vec<f64> = open
            .iter()
            .zip(&halved)
            .map(|(p, c)| {
                if estimated {
                    change(p, c)
                } else {
                    f64::INFINITY
                }
            })
            .collect();
        let cut = halved
            .iter()
            .flatten()
            .filter(|(_, s, _)| matches!(s, State::Cut(_)))
            .count();
        let total: f64 = changes.iter().sum();
        let end = (judged && total <= left) || level + 1 == LAST || cut > MOST_CELLS;
        let share = if end {
            f64::INFINITY
        } else {
            left / 2.0 / open.len() as f64
        };
        let mut next = Vec::new();
        for (change, children) in changes.into_iter().zip(halved) {
            let enough = end || (judged && change <= share);
            if enough {
                settled += change;
                left -= change;
            }
            for (cell, state, depth) in children {
                match state {
                    State::Without => {}
                    State::Within(moments) => leaves.push((cell, moments)),
                    State::Cut(moments) if enough => {
                        if moments.zeroth > 0.0 {
                            leaves.push((cell, moments));
                        }
                    }
                    State::Cut(moments) => next.push(Open {
                        cell,
                        depth,
                        moments,
                    }),
                }
            }
        }
        open = next;
    }
    (leaves, settled)
}

fn children<C: Corners>(search: &Search<'_, C>, parent: &Open) -> Vec<(Cell, State, f64)> {
    // A child's middle is half a child's diagonal from its parent's.
    let step = search.room.half(parent.cell.level + 1) * 3.0_f64.sqrt();
    (0..8_u32)
        .map(|i| {
            let at = parent.cell.at;
            let cell = Cell {
                level: parent.cell.level + 1,
                at: [0, 1, 2].map(|k| 2 * at[k] + (i >> k & 1)),
            };
            let (state, depth) = search.look(cell, parent.depth.abs() + step);
            (cell, state, depth)
        })
        .collect()
}
