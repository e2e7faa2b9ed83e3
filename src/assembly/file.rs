//! What an assembly file says, once every fault of it has been ruled out.

use std::path::PathBuf;

use globset::GlobMatcher;
use nalgebra::Vector3;

use super::service::{ServiceKeys, Tank};
use crate::limits::Limit;
use crate::moments::Grading;
use crate::printed::Made;
use crate::quantity::{LengthUnit, Quantity};
use crate::statics::{Line, Stand};

/// One assembly file. Lengths are in metres, everything in SI units.
#[derive(Clone, Debug)]
pub struct AssemblyFile {
    /// Where it was read from.
    pub path: PathBuf,
    /// Its own name; the stem of the file where it states none.
    pub name: String,
    /// Unit of its meshes and of the bare lengths in it.
    pub unit: LengthUnit,
    /// Which material goes on which body, in file order.
    pub assigns: Vec<Assign>,
    /// Parts, items and groups, in file order.
    pub entries: Vec<Entry>,
    /// The limits, one a quantity, in file order.
    pub limits: Vec<Limit>,
    /// Gravity, cases, motions, phases and frames.
    pub service: ServiceKeys,
    /// Mass that no mesh shows, in file order.
    pub smears: Vec<SmearEntry>,
    /// Where it stands, if that is stated.
    pub stand: Option<Stand>,
    /// What it hangs from, if that is stated.
    pub hang: Option<Hang>,
    /// What scales under its supports showed.
    pub weighings: Vec<crate::statics::Attitude>,
    /// Where ballast may go.
    pub ballast: Vec<BallastPlace>,
}

/// A place that ballast may be put at.
#[derive(Clone, Debug)]
pub struct BallastPlace {
    /// Its line in the file.
    pub line: u64,
    /// Its name.
    pub name: String,
    /// The point, or where the origin of the mesh stands, m.
    pub at: [f64; 3],
    /// The shape of the ballast, with the material that fills it.
    pub part: Option<Box<Part>>,
    /// Nothing, or at least this much, kg.
    pub least: f64,
    /// kg.
    pub most: Option<f64>,
    /// Whole multiples of this only, kg.
    pub step: Option<f64>,
    /// Standard uncertainty of what is put there, as a fraction of it.
    pub relative: f64,
}

/// A hook and the lines that meet at it.
#[derive(Clone, Debug, PartialEq)]
pub struct Hang {
    /// Its line in the file.
    pub line: u64,
    /// Where the hook is as drawn, m.
    pub hook: Vector3<f64>,
    /// None, or two to four.
    pub lines: Vec<Line>,
}

/// Mass that no mesh shows (paint, welds, harness), placed with what it covers.
#[derive(Clone, Debug)]
pub struct SmearEntry {
    /// Its line in the file.
    pub line: u64,
    /// Its own name, or `smear of` its pattern.
    pub name: String,
    /// Matches paths of parts and items within this file.
    pub of: Pattern,
    /// How much: a fraction of what it covers, or a mass in kg.
    pub mass: SmearMass,
}

/// How much of a smear there is.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum SmearMass {
    /// Of the mass that it covers.
    Fraction(Quantity),
    /// kg, over all that it covers.
    Mass(Quantity),
}

/// How far along a part's design is, and the growth in mass that is still expected of it (mass
/// growth allowance of AIAA S-120A and ISO 22010).
#[derive(Clone, Debug, PartialEq)]
pub struct Maturity {
    /// Such as `layout`; a key of the file's `[allowance]`.
    pub name: String,
    /// Fraction of the basic mass.
    pub allowance: f64,
}

/// A material that was chosen, with its density.
#[derive(Clone, Debug, PartialEq)]
pub struct Substance {
    /// Its name in the file or in the table.
    pub name: String,
    /// kg/m³, above 0.
    pub density: Quantity,
    /// Where the density comes from, if that is stated.
    pub source: Option<String>,
}

/// A rule that gives bodies a material. The first rule that matches wins.
#[derive(Clone, Debug)]
pub struct Assign {
    /// Its line in the file.
    pub line: u64,
    /// Matches names of bodies: a body's name, its id, or a material name of the mesh file.
    pub body: Option<Pattern>,
    /// Matches paths of parts within this file.
    pub part: Option<Pattern>,
    /// What a match gets.
    pub material: Substance,
}

/// A glob. `*` matches any run of characters, `/` included: `frame*` matches `frame/2`.
#[derive(Clone, Debug)]
pub struct Pattern {
    /// As typed.
    pub text: String,
    /// Compiled.
    pub matcher: GlobMatcher,
}

/// What stands in an assembly or a group.
#[derive(Clone, Debug)]
pub enum Entry {
    /// A mesh, or bodies of it.
    Part(Box<Part>),
    /// A bought-in thing of stated mass.
    Item(Box<Item>),
    /// A tank with liquid in it.
    Tank(Box<Tank>),
    /// Entries under a placement of their own.
    Group(Box<Group>),
}

impl Entry {
    /// Its name in its group.
    pub fn name(&self) -> &str {
        match self {
            Self::Part(p) => &p.name,
            Self::Item(i) => &i.name,
            Self::Tank(t) => &t.name,
            Self::Group(g) => &g.name,
        }
    }

    /// Where it stands.
    pub fn position(&self) -> &Position {
        match self {
            Self::Part(p) => &p.position,
            Self::Item(i) => &i.position,
            Self::Tank(t) => &t.position,
            Self::Group(g) => &g.position,
        }
    }

    /// Its line in the file.
    pub fn line(&self) -> u64 {
        match self {
            Self::Part(p) => p.line,
            Self::Item(i) => i.line,
            Self::Tank(t) => t.line,
            Self::Group(g) => g.line,
        }
    }
}

/// Where an entry stands in its group: mirrored in the plane through its own origin, then turned
/// about that origin, then moved to `at`.
#[derive(Clone, Debug)]
pub struct Position {
    /// Unit normal of the mirror plane.
    pub mirror: Option<Vector3<f64>>,
    /// Turn about an axis through the origin.
    pub turn: Option<Turn>,
    /// One position for each time that the entry stands there; never empty.
    pub at: Vec<[Quantity; 3]>,
}

/// A right-handed turn.
#[derive(Clone, Debug)]
pub struct Turn {
    /// Unit vector.
    pub axis: Vector3<f64>,
    /// Radians.
    pub angle: Quantity,
}

/// Whether the repeats of an entry share one error of each tolerance, or have one each.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum Each {
    /// All repeats are off alike (one mould, one drawing, one scale).
    #[default]
    Shared,
    /// Each repeat is off in its own way.
    Independent,
}

/// A mesh, or bodies of one.
#[derive(Clone, Debug)]
pub struct Part {
    /// Its line in the file.
    pub line: u64,
    /// Its name in its group.
    pub name: String,
    /// The mesh and the bodies of it.
    pub mesh: MeshChoice,
    /// Unit of the mesh, where it is not the assembly's.
    pub unit: LengthUnit,
    /// Its own material, which wins over every rule.
    pub material: Option<Substance>,
    /// Where it stands.
    pub position: Position,
    /// The mass that the scale showed, of one such part.
    pub measured: Option<Quantity>,
    /// Open bodies of it are taken capped while the bound is at most this share of the volume.
    pub accept_open: Option<f64>,
    /// Vertices on open edges of its mesh are made one within this distance, m.
    pub join: Option<f64>,
    /// How it is printed; a solid where nothing is stated. Lengths in m, the mesh file's axes.
    pub made: Option<Made>,
    /// What of that has a tolerance.
    pub made_off: Vec<super::made::Off>,
    /// Whether its facets are what is meant or stand for curves; none where it does not say.
    pub facets: Option<crate::curvature::Reading>,
    /// What the CAD model says of it.
    pub expect: Option<Expect>,
    /// How its repeats share their tolerances.
    pub each: Each,
    /// How far along it is.
    pub maturity: Option<Maturity>,
    /// Its mass is this thickness of sheet over its surface, not what its mesh holds, m.
    pub sheet: Option<Quantity>,
    /// What coats its surface.
    pub coating: Option<Coating>,
    /// A density that varies along an axis of the mesh file.
    pub graded: Option<Graded>,
}

/// A coat on a surface.
#[derive(Clone, Debug, PartialEq)]
pub struct Coating {
    /// m.
    pub thickness: Quantity,
    /// What it is.
    pub material: Substance,
}

/// A density that varies along an axis.
#[derive(Clone, Debug, PartialEq)]
pub struct Graded {
    /// Stations from the mesh file's origin, m; kg/m³.
    pub grading: Grading,
    /// A name for it.
    pub material: Option<String>,
}

/// A mesh file and, of its bodies, all or those of one name.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct MeshChoice {
    /// The file, found from the assembly file's own folder.
    pub path: PathBuf,
    /// The file as it was typed.
    pub typed: String,
    /// The name after `#`.
    pub body: Option<String>,
    /// Line of the key.
    pub line: u64,
}

/// Figures that a part must have, from another source than the mesh. Lengths and the centre are
/// those of the part as it stands in its mesh file: before mirror, turn and `at`.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Expect {
    /// m³.
    pub volume: Option<Quantity>,
    /// kg, from volume and density even where a measured mass is used for the total.
    pub mass: Option<Quantity>,
    /// Sides of the box along the mesh file's axes, m.
    pub size: Option<[Quantity; 3]>,
    /// Centre of mass in the mesh file's axes, m.
    pub centre: Option<[Quantity; 3]>,
}

/// A bought-in thing: its mass is stated, and `at` is its centre of mass.
#[derive(Clone, Debug)]
pub struct Item {
    /// Its line in the file.
    pub line: u64,
    /// Its name in its group.
    pub name: String,
    /// Of one such item.
    pub mass: Quantity,
    /// How its mass is spread.
    pub shape: Shape,
    /// Where it stands.
    pub position: Position,
    /// How its repeats share their tolerances.
    pub each: Each,
    /// How far along it is.
    pub maturity: Option<Maturity>,
}

/// How an item's mass is spread about its centre, in its own axes.
#[derive(Clone, Debug, PartialEq)]
pub enum Shape {
    /// All of it at one point.
    Point,
    /// A solid box with these sides along x, y, z, in m.
    Box([Quantity; 3]),
    /// A solid cylinder along z, in m.
    Cylinder {
        /// m.
        radius: Quantity,
        /// m.
        height: Quantity,
    },
    /// A solid sphere of this radius, in m.
    Sphere(Quantity),
    /// A stated tensor about the centre, kg m²: xx, yy, zz, xy, xz, yz; the products are the
    /// tensor's own elements, −∫xy.
    Inertia(Box<[Quantity; 6]>),
}

/// Entries under a placement of their own.
#[derive(Clone, Debug)]
pub struct Group {
    /// Its line in the file.
    pub line: u64,
    /// Its name in its group.
    pub name: String,
    /// Where it stands.
    pub position: Position,
    /// What stands in it, in file order.
    pub entries: Vec<Entry>,
    /// Another assembly file that stands in it, with its own unit, materials and rules.
    pub include: Option<Box<AssemblyFile>>,
}
