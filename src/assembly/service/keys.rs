//! What an assembly file says of its tanks, its gravity, and how it moves and is loaded in service.

use std::collections::BTreeMap;

use nalgebra::{Matrix3, Vector3};

use super::super::file::{Each, MeshChoice, Position, Substance};
use crate::gravity::{Field, STANDARD_GRAVITY};
use crate::quantity::{LengthUnit, Quantity};

/// A tank: the mesh of its inside, and how far it is filled with what.
#[derive(Clone, Debug)]
pub struct Tank {
    /// Its line in the file.
    pub line: u64,
    /// Its name in its group.
    pub name: String,
    /// The mesh of its inside, and the bodies of it.
    pub mesh: MeshChoice,
    /// Unit of the mesh, where it is not the assembly's.
    pub unit: LengthUnit,
    /// What is in it.
    pub liquid: Substance,
    /// How far it is filled.
    pub fill: Fill,
    /// Where it stands.
    pub position: Position,
    /// How its repeats share their tolerances.
    pub each: Each,
}

/// How a fill was stated.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum FillOf {
    /// A share of the tank's volume, 1 when full.
    Share,
    /// m³.
    Volume,
    /// kg.
    Mass,
    /// m along effective up from the tank's lowest point at that attitude.
    Level,
}

/// How far a tank is filled.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Fill {
    /// What the amount is of.
    pub of: FillOf,
    /// Zero or more, in SI units.
    pub amount: Quantity,
    /// Line of the key.
    pub line: u64,
}

/// The field, and what else accelerates the assembly.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Gravity {
    /// The field.
    pub field: Field,
    /// Acceleration of the assembly itself in its own axes, m/s²; liquid lags behind it.
    pub acceleration: Vector3<f64>,
    /// Line of the table; none where the file has none and standard gravity along −z is meant.
    pub line: Option<u64>,
}

impl Default for Gravity {
    fn default() -> Self {
        Self {
            field: Field::Uniform {
                g: STANDARD_GRAVITY,
                down: -Vector3::z(),
            },
            acceleration: Vector3::zeros(),
            line: None,
        }
    }
}

impl Gravity {
    /// Effective gravity at the assembly's origin: the field less the assembly's own acceleration,
    /// m/s² in the assembly's axes. None where it vanishes: then nothing is up.
    pub fn effective(&self) -> Option<Vector3<f64>> {
        let g = self.field.at(&Vector3::zeros())? - self.acceleration;
        // Less than this share of the two is what rounding leaves of free fall.
        let size = self.acceleration.norm();
        (g.norm() > 1e-12 * size && g.norm() > 0.0).then_some(g)
    }
}

/// Something that moves. Its value is 0 where the file places it.
#[derive(Clone, Debug)]
pub struct Motion {
    /// Its line in the file.
    pub line: u64,
    /// Its name.
    pub name: String,
    /// Path of the part, item, tank or group that moves.
    pub of: String,
    /// How it moves.
    pub kind: MotionKind,
    /// Value before it moves: m, rad, or a share of the path.
    pub from: f64,
    /// Value after.
    pub to: f64,
}

/// How something moves, in the assembly's axes.
#[derive(Clone, Debug, PartialEq)]
pub enum MotionKind {
    /// Along a unit vector, in m.
    Along(Vector3<f64>),
    /// About an axis through a point, in rad, right-handed.
    Turn {
        /// Unit vector.
        axis: Vector3<f64>,
        /// A point of the axis, m.
        at: Vector3<f64>,
    },
    /// Through positions in straight lines, by the share of the way: the first is where it stands.
    Through(Vec<Vector3<f64>>),
}

/// A stretch of service: tanks drain in an order, and things move.
#[derive(Clone, Debug)]
pub struct Phase {
    /// Its line in the file.
    pub line: u64,
    /// Its name.
    pub name: String,
    /// Paths of tanks that drain, one after the other.
    pub drain: Vec<String>,
    /// What is left in each at its end.
    pub to: Option<Fill>,
    /// Names of motions (or what they move) that run from one end to the other.
    pub moves: Vec<String>,
}

/// A state of loading.
#[derive(Clone, Debug)]
pub struct Case {
    /// Its line in the file.
    pub line: u64,
    /// Its name.
    pub name: String,
    /// Paths that are left out.
    pub without: Vec<String>,
    /// Paths that stand in this case (and in no other that does not name them).
    pub with: Vec<String>,
    /// Fills by path of tank.
    pub fill: BTreeMap<String, Fill>,
    /// Positions by path, in their groups' frames, m.
    pub at: BTreeMap<String, [f64; 3]>,
}

/// A frame to give centre and inertia in.
#[derive(Clone, Debug, PartialEq)]
pub struct Frame {
    /// Its line in the file.
    pub line: u64,
    /// Its name.
    pub name: String,
    /// Its origin in the assembly's frame, m.
    pub at: Vector3<f64>,
    /// Its axes as rows, orthonormal and right-handed.
    pub axes: Matrix3<f64>,
}

/// All of it, of one file.
#[derive(Clone, Debug, Default)]
pub struct ServiceKeys {
    /// Standard gravity along −z where none is stated.
    pub gravity: Gravity,
    /// In file order.
    pub cases: Vec<Case>,
    /// In file order.
    pub motions: Vec<Motion>,
    /// In file order.
    pub phases: Vec<Phase>,
    /// In file order.
    pub frames: Vec<Frame>,
}

impl ServiceKeys {
    /// The first line of any of it that only the outermost file may hold.
    pub(in crate::assembly) fn first_line(&self) -> Option<u64> {
        let lines = self.gravity.line.into_iter();
        let lines = lines.chain(self.cases.iter().map(|c| c.line));
        let lines = lines.chain(self.motions.iter().map(|m| m.line));
        let lines = lines.chain(self.phases.iter().map(|p| p.line));
        lines.chain(self.frames.iter().map(|f| f.line)).min()
    }
}
