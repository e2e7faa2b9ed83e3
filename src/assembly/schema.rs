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
    /// Parts, items and groups under a placement of their own.
    group: Option<Vec<Group>>,
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
    /// Whether its facets are what is meant, or stand for the curves that their corners lie on.
    facets: Option<Reading>,
    /// Figures that it must have.
    expect: Option<Expect>,
    /// Whether repeats share one error of each tolerance.
    each: Option<Each>,
}

/// How facets are read.
#[derive(JsonSchema)]
#[serde(rename_all = "lowercase")]
enum Reading {
    Flat,
    Curved,
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
