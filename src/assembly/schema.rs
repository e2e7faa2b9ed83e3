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
    /// Feet, wheels or scales that it stands on.
    support: Option<Vec<Placed>>,
    /// What it hangs from.
    hang: Option<Hang>,
    /// Mass that no mesh shows, placed with what it covers.
    smear: Option<Vec<Smear>>,
    /// Mass growth allowance of each maturity, in per cent; the names are the file's own.
    allowance: Option<BTreeMap<String, Quantity>>,
    /// What scales under the supports showed, one an attitude.
    weighing: Option<Vec<Weighing>>,
    /// Places that ballast may go to.
    ballast: Option<Vec<Ballast>>,
}

/// A place that ballast may go to: a point, or a mesh with its material.
#[derive(JsonSchema)]
#[serde(deny_unknown_fields)]
struct Ballast {
    /// Its name.
    name: String,
    /// The point, or where the origin of the mesh stands.
    at: Option<[Length; 3]>,
    /// A mesh file, or a body of one, that the ballast has the shape of.
    mesh: Option<String>,
    /// What fills the mesh.
    material: Option<String>,
    /// Nothing, or at least this much.
    least: Option<Quantity>,
    /// At most this much.
    most: Option<Quantity>,
    /// In whole multiples of this only.
    step: Option<Quantity>,
    /// The same: what one unit weighs.
    unit: Option<Quantity>,
    /// Half-width of what is put there, such as "1 %".
    tolerance: Option<Quantity>,
}

/// A named point.
#[derive(JsonSchema)]
#[serde(deny_unknown_fields)]
struct Placed {
    /// Its name.
    name: String,
    /// Where it is.
    at: [Length; 3],
}

/// What scales under the supports showed in one attitude.
#[derive(JsonSchema)]
#[serde(deny_unknown_fields)]
struct Weighing {
    /// A name for people.
    name: Option<String>,
    /// Against gravity in the assembly's axes; as it stands where left out.
    up: Option<Direction>,
    /// A mass or a force by name of support, three or more.
    loads: BTreeMap<String, Quantity>,
}

/// A hook, and the lines that meet at it.
#[derive(JsonSchema)]
#[serde(deny_unknown_fields)]
struct Hang {
    /// Where the hook is as drawn.
    hook: [Length; 3],
    /// Two to four lines, named, with the point of the assembly that each holds; without any it
    /// hangs from the hook as a point.
    line: Option<Vec<Placed>>,
}

/// Paint, welds, harness: mass that lies where other things are, in proportion to their mass.
#[derive(JsonSchema)]
#[serde(deny_unknown_fields)]
struct Smear {
    /// Its name; "smear of" what it covers where left out.
    name: Option<String>,
    /// A glob on paths of parts and items.
    of: String,
    /// Per cent of what it covers, or a mass over all of it; perhaps with a tolerance.
    mass: Quantity,
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
    /// Vertices on open edges of its mesh that lie within this distance of each other are made
    /// one, as `bismar check` names it for a crack.
    join: Option<Length>,
    /// How it is printed; a solid where left out.
    made: Option<Made>,
    /// Whether its facets are what is meant, or stand for the curves that their corners lie on.
    facets: Option<Reading>,
    /// Figures that it must have.
    expect: Option<Expect>,
    /// Whether repeats share one error of each tolerance.
    each: Option<Each>,
    /// How far along its design is: a name in [allowance].
    maturity: Option<String>,
    /// Its mass is this thickness over its surface; its mesh need not be closed.
    sheet: Option<Length>,
    /// What coats its surface.
    coating: Option<Coating>,
    /// A density that varies along an axis; `material` then only names it.
    graded: Option<Graded>,
}

/// How facets are read.
#[derive(JsonSchema)]
#[serde(rename_all = "lowercase")]
enum Reading {
    Flat,
    Curved,
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

/// How a part is printed: in layers, or as a shell. Supports, brim and purge are left out.
#[derive(JsonSchema)]
#[serde(deny_unknown_fields)]
struct Made {
    /// Height of a layer; takes wall, skin and infill with it.
    layers: Option<Length>,
    /// Thickness of the walls, measured in the layer.
    wall: Option<Length>,
    /// A layer is skin where less than this much material lies above or below it.
    skin: Option<Skin>,
    /// Share of the inside that is material, such as "20 %".
    infill: Option<Quantity>,
    /// The direction in which layers are stacked, in the mesh file's axes; z where left out.
    up: Option<Direction>,
    /// Diameter of the filament; 1.75 mm where left out.
    filament: Option<Length>,
    /// Thickness of a shell of one thickness; without infill its inside is hollow.
    shell: Option<Length>,
    /// Positions of the holes that empty a hollow, at the surface in the mesh file's axes; a hollow
    /// without one keeps the powder or resin that it was built in.
    drain: Option<Vec<[Length; 3]>>,
    /// Density of what a closed hollow keeps; the material's own where left out.
    fill: Option<Quantity>,
}

/// One thickness above and below, or one each.
#[derive(JsonSchema)]
#[serde(untagged)]
enum Skin {
    /// The same above and below.
    Both(Length),
    /// One each.
    Each(Sides),
}

/// Thickness of the skins.
#[derive(JsonSchema)]
#[serde(deny_unknown_fields)]
struct Sides {
    /// Where less than this lies above.
    top: Length,
    /// Where less than this lies below.
    bottom: Length,
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
    /// How far along its design is: a name in [allowance].
    maturity: Option<String>,
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
    /// Band of how far along from a datum the centre of mass stands.
    station: Option<Station>,
    /// Band of the same in per cent of a reference length.
    percent: Option<Percent>,
    /// Band of the distance of the centre of mass from a point, line or plane.
    distance: Option<Distance>,
    /// Outline in mass and station.
    envelope: Option<EnvelopeOf>,
    /// Bands of elements of the inertia tensor.
    inertia: Option<InertiaLimit>,
    /// Band of the ratio of two principal moments.
    ratio: Option<Ratio>,
    /// Slope that it must stand on.
    tip: Option<Tip>,
    /// Band of what one of three supports carries.
    reaction: Option<Reaction>,
    /// Unbalance as permitted in two planes.
    unbalance: Option<Unbalance>,
}

/// Band of a station.
#[derive(JsonSchema)]
#[serde(deny_unknown_fields)]
struct Station {
    /// The origin where left out.
    datum: Option<[Length; 3]>,
    /// Direction of stations.
    along: Direction,
    /// The least allowed value.
    from: Option<Length>,
    /// The greatest allowed value.
    to: Option<Length>,
}

/// Band in per cent of the length from `start` to `end`.
#[derive(JsonSchema)]
#[serde(deny_unknown_fields)]
struct Percent {
    /// Where 0 % is.
    start: [Length; 3],
    /// Where 100 % is.
    end: [Length; 3],
    /// Such as "15 %".
    from: Option<Quantity>,
    /// Such as "30 %".
    to: Option<Quantity>,
}

/// Band of a distance from one of point, line and plane.
#[derive(JsonSchema)]
#[serde(deny_unknown_fields)]
struct Distance {
    /// From this point.
    point: Option<[Length; 3]>,
    /// From this line.
    line: Option<LineOf>,
    /// From this plane; positive on the side of its normal.
    plane: Option<PlaneOf>,
    /// The least allowed value.
    from: Option<Length>,
    /// The greatest allowed value.
    to: Option<Length>,
}

/// A line.
#[derive(JsonSchema)]
#[serde(deny_unknown_fields)]
struct LineOf {
    /// A point of it; the origin where left out.
    at: Option<[Length; 3]>,
    /// Its direction.
    along: Direction,
}

/// A plane.
#[derive(JsonSchema)]
#[serde(deny_unknown_fields)]
struct PlaneOf {
    /// A point of it; the origin where left out.
    at: Option<[Length; 3]>,
    /// Across it.
    normal: Direction,
}

/// Outline in mass and station.
#[derive(JsonSchema)]
#[serde(deny_unknown_fields)]
struct EnvelopeOf {
    /// The origin where left out.
    datum: Option<[Length; 3]>,
    /// Direction of stations.
    along: Direction,
    /// Corners in order around: mass and station.
    #[schemars(length(min = 3))]
    outline: Vec<(Quantity, Length)>,
}

/// Bands of elements of the inertia tensor; off-diagonals are −∫xy dm.
#[derive(JsonSchema)]
#[serde(deny_unknown_fields)]
struct InertiaLimit {
    /// The point that it is about; the centre of mass where left out.
    about: Option<[Length; 3]>,
    /// Element xx.
    xx: Option<QuantityBand>,
    /// Element yy.
    yy: Option<QuantityBand>,
    /// Element zz.
    zz: Option<QuantityBand>,
    /// Element xy.
    xy: Option<QuantityBand>,
    /// Element xz.
    xz: Option<QuantityBand>,
    /// Element yz.
    yz: Option<QuantityBand>,
}

/// Band of the ratio of two principal moments.
#[derive(JsonSchema)]
#[serde(deny_unknown_fields)]
struct Ratio {
    /// Which over which, counted from 1 in ascending order.
    moments: [u8; 2],
    /// Such as "110 %".
    from: Option<Quantity>,
    /// Such as "300 %".
    to: Option<Quantity>,
}

/// Slope that it must stand on.
#[derive(JsonSchema)]
#[serde(deny_unknown_fields)]
struct Tip {
    /// Where it leans to; straight over every edge where left out.
    towards: Option<Direction>,
    /// Such as "20 deg".
    from: Quantity,
}

/// Band of what one of three supports carries.
#[derive(JsonSchema)]
#[serde(deny_unknown_fields)]
struct Reaction {
    /// Its name.
    support: String,
    /// Such as "50 N".
    from: Option<Quantity>,
    /// Such as "900 N".
    to: Option<Quantity>,
}

/// Unbalance as permitted in two planes by a balance quality grade.
#[derive(JsonSchema)]
#[serde(deny_unknown_fields)]
struct Unbalance {
    /// A point of the axis of rotation; the origin where left out.
    at: Option<[Length; 3]>,
    /// Along the axis.
    along: Direction,
    /// Where the two planes cut it, from `at`.
    planes: [Length; 2],
    /// Such as "3000 rpm" or "314 rad/s".
    speed: String,
    /// Such as "G 6.3".
    grade: String,
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

/// A band of some quantity; at least one end, both allowed values.
#[derive(JsonSchema)]
#[serde(deny_unknown_fields)]
struct QuantityBand {
    /// The least allowed value.
    from: Option<Quantity>,
    /// The greatest allowed value.
    to: Option<Quantity>,
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
