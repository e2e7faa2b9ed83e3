//! The published JSON Schema of the assembly file, for editors and for programs that write one.
//!
//! The shapes here exist for their schema only; a test holds their keys to those that the reader
//! asks for.

// Their fields are read by the derive alone.
#![allow(dead_code)]

use std::collections::BTreeMap;

use schemars::JsonSchema;
use schemars::generate::SchemaSettings;

/// The JSON Schema (draft 2020-12) of an assembly file, in JSON or in TOML of the same shape.
pub fn schema() -> serde_json::Value {
    let generator = SchemaSettings::draft2020_12().into_generator();
    let mut schema = generator.into_root_schema_for::<AssemblyFile>();
    schema.insert("title".into(), "Bismar assembly file".into());
    schema.to_value()
}

/// A length: a bare number in the file's unit, or a text with a unit and perhaps a tolerance.
#[derive(JsonSchema)]
#[serde(untagged)]
enum Length {
    /// In the file's unit.
    Bare(f64),
    /// Such as "210 mm" or "210 mm ± 1 mm".
    Text(String),
}

/// A quantity with its unit, and perhaps a tolerance after ± or +/-, absolute or in %.
#[derive(JsonSchema)]
#[schemars(transparent)]
struct Quantity(String);

/// A direction: the name of an axis, or a vector of any length.
#[derive(JsonSchema)]
#[serde(untagged)]
enum Direction {
    /// "x", "y" or "z".
    Axis(Axis),
    /// Three numbers that are not all zero.
    Vector([f64; 3]),
}

#[derive(JsonSchema)]
#[serde(rename_all = "lowercase")]
enum Axis {
    X,
    Y,
    Z,
}

/// A unit of length.
#[derive(JsonSchema)]
#[serde(rename_all = "lowercase")]
enum Unit {
    Mm,
    Cm,
    M,
    In,
    Ft,
}

/// Parts, items and groups with their materials and limits.
#[derive(JsonSchema)]
#[serde(deny_unknown_fields)]
struct AssemblyFile {
    /// The assembly itself.
    assembly: Head,
    /// Which material goes on which body; the first rule that matches wins.
    assign: Option<Vec<Assign>>,
    /// The file's own materials by name; names are read without regard to case.
    material: Option<BTreeMap<String, Material>>,
    /// Meshes, or bodies of them.
    part: Option<Vec<Part>>,
    /// Bought-in things of stated mass.
    item: Option<Vec<Item>>,
    /// Tanks with liquid in them.
    tank: Option<Vec<Tank>>,
    /// Parts, items, tanks and groups under a placement of their own.
    group: Option<Vec<Group>>,
    /// The field, and what else accelerates the assembly; standard gravity along −z where left out.
    gravity: Option<Gravity>,
    /// States of loading.
    case: Option<Vec<Case>>,
    /// What moves in service.
    motion: Option<Vec<Motion>>,
    /// What drains and moves, one after the other.
    phase: Option<Vec<Phase>>,
    /// Frames to give centre and inertia in.
    frame: Option<Vec<Frame>>,
    /// Bands that figures of the whole must stay in.
    limit: Option<Vec<Limit>>,
}

/// The assembly itself.
#[derive(JsonSchema)]
#[serde(deny_unknown_fields)]
struct Head {
    /// Its name; the stem of the file where left out.
    name: Option<String>,
    /// Unit of the meshes and of bare lengths in this file.
    unit: Unit,
}

/// A rule that gives bodies a material; with `body`, `part` or both.
#[derive(JsonSchema)]
#[serde(deny_unknown_fields)]
struct Assign {
    /// A glob on a body's name, its id, or a material name of the mesh file; * matches / too.
    body: Option<String>,
    /// A glob on paths of parts, such as boom/nozzle#2; * matches / too.
    part: Option<String>,
    /// A material of this file or of the table.
    material: String,
}

/// A material of the file's own.
#[derive(JsonSchema)]
#[serde(deny_unknown_fields)]
struct Material {
    /// Such as "7850 kg/m3 ± 1 %".
    density: Quantity,
    /// Where that density comes from.
    source: Option<String>,
    /// Anything else that a reader should know.
    note: Option<String>,
}

/// A mesh, or bodies of one.
#[derive(JsonSchema)]
#[serde(deny_unknown_fields)]
struct Part {
    /// Its name in its group; the body's or the file's where left out.
    name: Option<String>,
    /// The mesh file, relative to this file; file#body takes the bodies of one name.
    mesh: String,
    /// Unit of the mesh, where it is not that of the assembly.
    unit: Option<Unit>,
    /// Its material, which wins over every rule.
    material: Option<String>,
    /// Where its origin stands, in its group's frame.
    at: Option<[Length; 3]>,
    /// Turn about its origin, after the mirror and before `at`.
    turn: Option<Turn>,
    /// Normal of the plane through its origin that it is mirrored in, before anything else.
    mirror: Option<Direction>,
    /// One position for each repeat; takes the place of `at`.
    #[schemars(length(min = 1))]
    places: Option<Vec<[Length; 3]>>,
    /// How many stand in the one place; takes the place of `places`.
    #[schemars(range(min = 1, max = 100_000))]
    count: Option<u32>,
    /// What the scale showed for one of them; the mesh then says how that mass is spread.
    measured: Option<Quantity>,
    /// Take open bodies of it with their holes capped, while the bound on the volume is at most
    /// this per cent of it.
    #[serde(rename = "accept-open")]
    accept_open: Option<Quantity>,
    /// Figures that it must have.
    expect: Option<Expect>,
    /// Whether repeats share one error of each tolerance.
    each: Option<Each>,
    /// Its mass is this thickness over its surface; its mesh need not be closed.
    sheet: Option<Length>,
    /// What coats its surface.
    coating: Option<Coating>,
    /// A density that varies along an axis; `material` then only names it.
    graded: Option<Graded>,
}

/// A coat on a surface: surface times thickness, the first order in thickness.
#[derive(JsonSchema)]
#[serde(deny_unknown_fields)]
struct Coating {
    /// How thick it is.
    thickness: Length,
    /// A material of this file or of the table.
    material: String,
}

/// A density by the straight line or parabola through stations along an axis of the mesh file.
#[derive(JsonSchema)]
#[serde(deny_unknown_fields)]
struct Graded {
    /// The axis, from the mesh file's origin.
    along: Direction,
    /// Two or three stations.
    #[schemars(length(min = 2, max = 3))]
    at: Vec<Length>,
    /// The density at each.
    #[schemars(length(min = 2, max = 3))]
    density: Vec<Quantity>,
}

/// The inside of a tank, and what is in it.
#[derive(JsonSchema)]
#[serde(deny_unknown_fields)]
struct Tank {
    /// Its name in its group; the body's or the file's where left out.
    name: Option<String>,
    /// The mesh of its inside, relative to this file; file#body takes the bodies of one name.
    mesh: String,
    /// Unit of the mesh, where it is not that of the assembly.
    unit: Option<Unit>,
    /// A material of this file or of the table.
    liquid: String,
    /// How full it is.
    fill: FillLevel,
    /// Where its origin stands, in its group's frame.
    at: Option<[Length; 3]>,
    /// Turn about its origin, after the mirror and before `at`.
    turn: Option<Turn>,
    /// Normal of the plane through its origin that it is mirrored in, before anything else.
    mirror: Option<Direction>,
    /// One position for each repeat; takes the place of `at`.
    #[schemars(length(min = 1))]
    places: Option<Vec<[Length; 3]>>,
    /// How many stand in the one place; takes the place of `places`.
    #[schemars(range(min = 1, max = 100_000))]
    count: Option<u32>,
    /// Whether repeats share one error of each tolerance.
    each: Option<Each>,
}

/// A fill: per cent, a volume or a mass with its unit; a length is a level above the tank's lowest
/// point along effective up.
#[derive(JsonSchema)]
#[serde(untagged)]
enum FillLevel {
    /// A level in the file's unit.
    Bare(f64),
    /// Such as "60 %", "32 l", "30 kg" or "120 mm".
    Text(String),
}

/// The field in which the assembly stands, and its own acceleration.
#[derive(JsonSchema)]
#[serde(deny_unknown_fields)]
struct Gravity {
    /// "uniform" where left out.
    field: Option<FieldKind>,
    /// Of a uniform field; standard gravity where left out.
    g: Option<Quantity>,
    /// Where down is, uniform or on the Earth; −z where left out.
    down: Option<Direction>,
    /// Geodetic latitude, on the Earth.
    latitude: Option<Quantity>,
    /// Height above the ellipsoid, on the Earth.
    height: Option<Length>,
    /// Gravitational parameter of a central field, such as "3.986004418e14 m3/s2".
    gm: Option<Quantity>,
    /// The assembly's origin as seen from the centre of a central field, in the assembly's axes.
    at: Option<[Length; 3]>,
    /// Acceleration of the assembly in its own axes; liquid lags behind it.
    acceleration: Option<[Acceleration; 3]>,
}

#[derive(JsonSchema)]
#[serde(rename_all = "lowercase")]
enum FieldKind {
    Uniform,
    Earth,
    Central,
}

/// An acceleration with its unit, or the number 0.
#[derive(JsonSchema)]
#[serde(untagged)]
enum Acceleration {
    /// Nothing along this axis.
    Nil(f64),
    /// Such as "2 m/s2".
    Text(String),
}

/// A state of loading.
#[derive(JsonSchema)]
#[serde(deny_unknown_fields)]
struct Case {
    /// Its name.
    name: String,
    /// Paths that are left out.
    without: Option<Names>,
    /// Paths that stand in this case, and in no other that does not name them.
    with: Option<Names>,
    /// Fills by path of tank.
    fill: Option<BTreeMap<String, FillLevel>>,
    /// Positions by path, in their groups' frames.
    at: Option<BTreeMap<String, [Length; 3]>>,
}

/// One name, or several.
#[derive(JsonSchema)]
#[serde(untagged)]
enum Names {
    /// One.
    One(String),
    /// Several.
    Several(Vec<String>),
}

/// Something that moves; one of along, turn and through. Where the file places it its value is 0.
#[derive(JsonSchema)]
#[serde(deny_unknown_fields)]
struct Motion {
    /// Its name; that of what moves where left out.
    name: Option<String>,
    /// Path of the part, item, tank or group that moves.
    of: String,
    /// Along a direction, by lengths.
    along: Option<Direction>,
    /// About an axis, by angles.
    turn: Option<MotionTurn>,
    /// Through positions in straight lines, by shares of the way; the first is where it stands.
    #[schemars(length(min = 2))]
    through: Option<Vec<[Length; 3]>>,
    /// Where it begins: nothing where left out.
    from: Option<Length>,
    /// Where it ends; the whole way through positions where left out.
    to: Option<Length>,
}

/// A right-handed axis in the assembly's frame.
#[derive(JsonSchema)]
#[serde(deny_unknown_fields)]
struct MotionTurn {
    /// Its direction.
    axis: Direction,
    /// A point of it; the assembly's origin where left out.
    at: Option<[Length; 3]>,
}

/// A stretch of service.
#[derive(JsonSchema)]
#[serde(deny_unknown_fields)]
struct Phase {
    /// Its name.
    name: String,
    /// Tanks that drain, one after the other.
    drain: Option<Names>,
    /// What is left in each; nothing where left out.
    to: Option<FillLevel>,
    /// Motions that run to their other end while the tanks drain.
    r#move: Option<Names>,
}

/// A frame to give centre and inertia in.
#[derive(JsonSchema)]
#[serde(deny_unknown_fields)]
struct Frame {
    /// Its name.
    name: String,
    /// Its origin in the assembly's frame.
    at: Option<[Length; 3]>,
    /// Its x, y and z in the assembly's axes, at right angles, right-handed.
    axes: Option<[Direction; 3]>,
}

/// Whether repeats share one error of each tolerance, or have one each.
#[derive(JsonSchema)]
#[serde(rename_all = "lowercase")]
enum Each {
    Shared,
    Independent,
}

/// A right-handed turn.
#[derive(JsonSchema)]
#[serde(deny_unknown_fields)]
struct Turn {
    /// The axis, through the origin.
    axis: Direction,
    /// Such as "90 deg".
    angle: Quantity,
}

/// Figures of a part as it stands in its mesh file; without a tolerance ± 0.1 %.
#[derive(JsonSchema)]
#[serde(deny_unknown_fields)]
struct Expect {
    /// Such as "812 cm3 ± 1 %".
    volume: Option<Quantity>,
    /// From volume and density.
    mass: Option<Quantity>,
    /// Sides of the box along the mesh file's axes.
    size: Option<[Length; 3]>,
    /// Centre of mass in the mesh file's axes.
    centre: Option<[Length; 3]>,
}

/// A bought-in thing; at most one of box, cylinder, sphere and inertia, else a point.
#[derive(JsonSchema)]
#[serde(deny_unknown_fields)]
struct Item {
    /// Its name in its group.
    name: String,
    /// Mass of one, such as "4.12 kg ± 20 g".
    mass: Quantity,
    /// Where its centre of mass stands, in its group's frame.
    at: Option<[Length; 3]>,
    /// Turn of its shape about its centre of mass.
    turn: Option<Turn>,
    /// One position for each repeat; takes the place of `at`.
    #[schemars(length(min = 1))]
    places: Option<Vec<[Length; 3]>>,
    /// How many stand in the one place; takes the place of `places`.
    #[schemars(range(min = 1, max = 100_000))]
    count: Option<u32>,
    /// A solid box with these sides.
    r#box: Option<[Length; 3]>,
    /// A solid cylinder along its z.
    cylinder: Option<Cylinder>,
    /// A solid sphere of this radius.
    sphere: Option<Length>,
    /// A stated tensor about its centre of mass.
    inertia: Option<Inertia>,
    /// Whether repeats share one error of each tolerance.
    each: Option<Each>,
}

/// A solid cylinder along z.
#[derive(JsonSchema)]
#[serde(deny_unknown_fields)]
struct Cylinder {
    /// Its radius.
    radius: Length,
    /// Its height.
    height: Length,
}

/// The elements of an inertia tensor; off-diagonals are −∫xy dm.
#[derive(JsonSchema)]
#[serde(deny_unknown_fields)]
struct Inertia {
    /// Such as "0.012 kg m2".
    xx: Quantity,
    /// As xx.
    yy: Quantity,
    /// As xx.
    zz: Quantity,
    /// Zero where left out.
    xy: Option<Quantity>,
    /// Zero where left out.
    xz: Option<Quantity>,
    /// Zero where left out.
    yz: Option<Quantity>,
}

/// Parts, items and groups under a placement of their own.
#[derive(JsonSchema)]
#[serde(deny_unknown_fields)]
struct Group {
    /// The first half of the paths in it; the included assembly's where left out.
    name: Option<String>,
    /// Where its origin stands.
    at: Option<[Length; 3]>,
    /// Turn about its origin, after the mirror and before `at`.
    turn: Option<Turn>,
    /// Normal of the plane through its origin that it is mirrored in, before anything else.
    mirror: Option<Direction>,
    /// One position for each repeat of the whole group; takes the place of `at`.
    #[schemars(length(min = 1))]
    places: Option<Vec<[Length; 3]>>,
    /// How many stand in the one place; takes the place of `places`.
    #[schemars(range(min = 1, max = 100_000))]
    count: Option<u32>,
    /// Another assembly file that stands in it, relative to this file.
    include: Option<String>,
    /// Meshes, or bodies of them.
    part: Option<Vec<Part>>,
    /// Bought-in things of stated mass.
    item: Option<Vec<Item>>,
    /// Tanks with liquid in them.
    tank: Option<Vec<Tank>>,
    /// Groups in this one.
    group: Option<Vec<Group>>,
}

/// Bands on figures of the whole, under one name.
#[derive(JsonSchema)]
#[serde(deny_unknown_fields)]
struct Limit {
    /// Its name; each quantity's where left out.
    name: Option<String>,
    /// Band of the total mass.
    mass: Option<MassBand>,
    /// Bands of the centre of mass.
    centre: Option<Centre>,
}

/// Bands of the centre of mass.
#[derive(JsonSchema)]
#[serde(deny_unknown_fields)]
struct Centre {
    /// Along x.
    x: Option<Band>,
    /// Along y.
    y: Option<Band>,
    /// Along z.
    z: Option<Band>,
}

/// A band of lengths; at least one end, both allowed values.
#[derive(JsonSchema)]
#[serde(deny_unknown_fields)]
struct Band {
    /// The least allowed value.
    from: Option<Length>,
    /// The greatest allowed value.
    to: Option<Length>,
}

/// A band of masses; at least one end, both allowed values.
#[derive(JsonSchema)]
#[serde(deny_unknown_fields)]
struct MassBand {
    /// The least allowed value.
    from: Option<Quantity>,
    /// The greatest allowed value.
    to: Option<Quantity>,
}
