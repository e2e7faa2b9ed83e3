//! The published schema says what the reader reads.

use std::collections::{BTreeMap, BTreeSet};
use std::path::Path;

use super::*;
use crate::assembly::reader::Shared;
use crate::assembly::{load, read, tree};

/// A file in which every table stands.
const FULL: &str = r#"
[assembly]
name = "all of it"
unit = "mm"
[[assign]]
body = "frame*"
part = "*"
material = "own"
[material.own]
density = "7850 kg/m3 ± 1 %"
source = "a mill sheet"
note = "rolled"
[[part]]
name = "frame"
mesh = "frame.obj#frame"
unit = "cm"
material = "own"
at = [0, "1 cm", 120]
turn = { axis = [0, 0, 1], angle = "90 deg" }
mirror = "x"
measured = "6.31 kg ± 5 g"
accept-open = "2 %"
facets = "flat"
each = "independent"
maturity = "layout"
expect = { volume = "1 cm3", mass = "1 kg ± 50 %", size = [1, 2, 3], centre = [0, 0, 0] }
made = { layers = "0.1 mm", wall = 0.2, skin = { top = "0.2 mm", bottom = 0.1 }, infill = "20 %", up = "z", filament = "1.75 mm" }
[[part]]
name = "second"
mesh = "frame.obj"
made = { shell = "0.1 mm", drain = [[0, 0.5, 0.5]], fill = "0.5 g/cm3" }
places = [[0, 0, 0], [1, 0, 0]]
[[item]]
name = "box"
mass = "1 kg"
at = [0, 0, 0]
turn = { axis = "z", angle = "90 deg" }
box = [1, 2, 3]
count = 2
each = "shared"
maturity = "layout"
[[item]]
name = "roll"
mass = "1 kg"
cylinder = { radius = 1, height = 2 }
[[item]]
name = "ball"
mass = "1 kg"
sphere = 3
places = [[0, 0, 0]]
[[item]]
name = "motor"
mass = "1 kg"
inertia = { xx = "1 kg m2", yy = "1 kg m2", zz = "1 kg m2", xy = "0.1 kg m2", xz = "0.1 kg m2", yz = "0.1 kg m2" }
[[group]]
name = "boom"
at = [0, 0, 0]
turn = { axis = "y", angle = "5 deg" }
mirror = [1, 0, 0]
count = 2
include = "inner.toml"
[[group.part]]
mesh = "frame.obj#frame"
[[group.item]]
name = "nut"
mass = "1 g"
[[group.group]]
name = "tip"
places = [[0, 0, 0]]
[[tank]]
name = "tank"
mesh = "inside.obj"
unit = "mm"
liquid = "water"
fill = "60 %"
at = [0, 0, 0]
turn = { axis = "z", angle = "90 deg" }
mirror = "y"
each = "shared"
count = 1
[[group.tank]]
mesh = "inside.obj#inside"
liquid = "own"
fill = 0.5
places = [[9, 0, 0]]
[gravity]
field = "uniform"
g = "9.81 m/s2"
down = [0, 0, -1]
acceleration = ["0.1 m/s2", 0, 0]
[[case]]
name = "light"
without = ["tip-weight"]
with = ["payload"]
fill = { tank = "10 %" }
at = { payload = [1, 2, 3] }
[[item]]
name = "payload"
mass = "1 kg"
[[item]]
name = "tip-weight"
mass = "1 kg"
[[motion]]
name = "swing"
of = "motor"
turn = { axis = "z", at = [0, 0, 0] }
from = "10 deg"
to = "90 deg"
[[motion]]
of = "ball"
along = "x"
to = 10
[[motion]]
of = "roll"
through = [[0, 0, 0], [1, 0, 0]]
[[phase]]
name = "out"
drain = ["tank"]
to = "5 %"
move = ["swing"]
[[frame]]
name = "eye"
at = [0, 0, 1]
axes = ["x", "y", "z"]
[[part]]
name = "skin"
mesh = "frame.obj"
material = "own"
sheet = 0.1
coating = { thickness = "0.1 mm", material = "own" }
[[part]]
name = "graded"
mesh = "frame.obj"
graded = { along = "z", at = [0, 1], density = ["1 kg/m3", "2 kg/m3"] }
[[limit]]
name = "all"
mass = { from = "1 kg", to = "2 kg" }
centre.x = { from = 1, to = 2 }
centre.y = { from = 1 }
centre.z = { to = 2 }
station = { datum = [0, 0, 0], along = "x", from = 1, to = 2 }
percent = { start = [0, 0, 0], end = [1, 0, 0], from = "15 %", to = "30 %" }
distance = { point = [0, 0, 0], from = 0, to = 5 }
inertia = { about = [0, 0, 0], xx = { to = "4 kg m2" }, yy = { from = "0 kg m2" }, zz = { to = "4 kg m2" }, xy = { to = "4 kg m2" }, xz = { to = "4 kg m2" }, yz = { to = "4 kg m2" } }
ratio = { moments = [3, 1], from = "110 %", to = "9999 %" }
tip = { towards = "x", from = "20 deg" }
reaction = { support = "a", from = "1 N", to = "2 N" }
[[limit]]
name = "line"
distance = { line = { at = [0, 0, 0], along = "y" }, to = 5 }
envelope = { datum = [0, 0, 0], along = "x", outline = [["1 kg", 0], ["2 kg", 0], ["2 kg", 1]] }
[[limit]]
name = "plane"
distance = { plane = { at = [0, 0, 0], normal = [1, 1, 0] }, to = "5 mm" }
unbalance = { at = [0, 0, 0], along = "x", planes = [1, 2], speed = "3000 rpm", grade = "G 6.3" }
[[support]]
name = "a"
at = [-900, -900, 0]
[[support]]
name = "b"
at = [900, -900, 0]
[[support]]
name = "c"
at = [0, 900, 0]
[[ballast]]
name = "nose"
at = [480, 0, 90]
least = "1 kg"
most = "12 kg"
unit = "0.25 kg ± 2 g"
[[ballast]]
name = "plate"
mesh = "frame.obj"
material = "own"
step = "1 kg"
tolerance = "1 %"
[[weighing]]
name = "level"
up = "z"
loads = { a = "3 kg", b = "30 N ± 1 N", c = "4 kg" }
[hang]
hook = [0, 0, 900]
[[hang.line]]
name = "left"
at = [0, -100, 0]
[[hang.line]]
name = "right"
at = [0, 100, 0]
[[smear]]
name = "paint"
of = "frame*"
mass = "3 % ± 1 %"
[allowance]
layout = "15 %"
"#;

fn bench() -> Bench {
    let bench = Bench::new()
        .mesh("frame.obj", vec![block("frame", [0.0; 3], [1.0; 3])])
        .mesh("inside.obj", vec![block("inside", [0.0; 3], [1.0; 3])]);
    bench.put(
        "inner.toml",
        "[assembly]\nunit = \"m\"\n[[item]]\nname = \"x\"\nmass = \"1 kg\"\n",
    );
    bench
}

/// The keys of each object of the schema, found by the titles of the reader's tables.
fn published() -> BTreeMap<String, BTreeSet<String>> {
    let schema = schema();
    let mut tables = BTreeMap::new();
    let mut note = |name: &str, object: &serde_json::Value| {
        if let Some(properties) = object["properties"].as_object() {
            assert_eq!(object["additionalProperties"], false, "{name}");
            tables.insert(name.to_string(), properties.keys().cloned().collect());
        }
    };
    note("AssemblyFile", &schema);
    for (name, object) in schema["$defs"].as_object().unwrap() {
        note(name, object);
    }
    tables
}

#[test]
fn keys_of_reader_and_schema_agree() {
    let bench = bench();
    let path = bench.dir.path().join("it.toml");
    let (entries, faults) = tree::parse(FULL, false);
    let mut shared = Shared::new(&path, faults);
    read::file(&mut shared, &entries.unwrap(), &mut load::Loader::default());
    assert_eq!(shared.take_faults(), []);
    let names = [
        ("assembly file", vec!["AssemblyFile"]),
        ("assembly", vec!["Head"]),
        ("assign", vec!["Assign"]),
        ("material", vec!["Material"]),
        ("part", vec!["Part"]),
        ("made", vec!["Made"]),
        ("skin", vec!["Sides"]),
        ("turn", vec!["Turn"]),
        ("expect", vec!["Expect"]),
        ("item", vec!["Item"]),
        ("cylinder", vec!["Cylinder"]),
        ("inertia", vec!["Inertia"]),
        ("group", vec!["Group"]),
        ("limit", vec!["Limit"]),
        ("smear", vec!["Smear"]),
        ("tank", vec!["Tank"]),
        ("gravity", vec!["Gravity"]),
        ("case", vec!["Case"]),
        ("motion", vec!["Motion"]),
        ("turn of a motion", vec!["MotionTurn"]),
        ("phase", vec!["Phase"]),
        ("frame", vec!["Frame"]),
        ("coating", vec!["Coating"]),
        ("graded", vec!["Graded"]),
        ("centre of a limit", vec!["Centre"]),
        ("band of a limit", vec!["Band", "MassBand", "QuantityBand"]),
        ("station", vec!["Station"]),
        ("percent", vec!["Percent"]),
        ("distance", vec!["Distance"]),
        ("line of a distance", vec!["LineOf"]),
        ("plane of a distance", vec!["PlaneOf"]),
        ("envelope", vec!["EnvelopeOf"]),
        ("inertia of a limit", vec!["InertiaLimit"]),
        ("ratio", vec!["Ratio"]),
        ("tip", vec!["Tip"]),
        ("reaction", vec!["Reaction"]),
        ("unbalance", vec!["Unbalance"]),
        ("support", vec!["Placed"]),
        ("line", vec!["Placed"]),
        ("weighing", vec!["Weighing"]),
        ("hang", vec!["Hang"]),
        ("ballast", vec!["Ballast"]),
    ];
    let published = published();
    let read = shared.known();
    assert_eq!(read.len(), names.len(), "{:?}", read.keys());
    let mut seen = 0;
    for (table, objects) in names {
        let keys: BTreeSet<String> = read[table].iter().map(|k| k.to_string()).collect();
        for object in objects {
            assert_eq!(keys, published[object], "{table} and {object}");
            seen += 1;
        }
    }
    // Supports and lines have one shape.
    assert_eq!(seen - 1, published.len(), "{:?}", published.keys());
}

#[test]
fn the_schema_takes_the_full_file_and_refuses_a_slip() {
    let mut value: serde_json::Value = toml::from_str(FULL).unwrap();
    let validator = jsonschema::validator_for(&schema()).unwrap();
    let faults: Vec<String> = validator
        .iter_errors(&value)
        .map(|e| e.to_string())
        .collect();
    assert_eq!(faults, Vec::<String>::new());
    value["part"][0]["masss"] = "1 kg".into();
    assert!(!validator.is_valid(&value));
}

/// The committed schema is the current one. `UPDATE_SCHEMAS=1` rewrites it.
#[test]
fn the_committed_schema_is_current() {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("schemas/assembly.schema.json");
    let text = serde_json::to_string_pretty(&schema()).unwrap() + "\n";
    if std::env::var_os("UPDATE_SCHEMAS").is_some() {
        std::fs::create_dir_all(path.parent().unwrap()).unwrap();
        std::fs::write(&path, &text).unwrap();
    }
    let committed = std::fs::read_to_string(&path).unwrap_or_default();
    assert!(
        committed == text,
        "run the tests with UPDATE_SCHEMAS=1 and commit {}",
        path.display()
    );
}

/// The same file as JSON means the same.
#[test]
fn json_of_the_same_shape() {
    let mut bench = bench();
    bench.put("it.toml", FULL);
    let value: serde_json::Value = toml::from_str(FULL).unwrap();
    bench.put("it.json", &serde_json::to_string_pretty(&value).unwrap());
    bench.put("bare", &value.to_string());
    let (toml, _) = bench.balance("it.toml").unwrap();
    for name in ["it.json", "bare"] {
        let (json, _) = bench.balance(name).unwrap();
        let sorted = |b: &Balance| {
            let mut rows: Vec<_> = b
                .parts
                .iter()
                .map(|p| (p.path.clone(), p.mass_kg))
                .collect();
            rows.sort_by(|a, b| a.0.cmp(&b.0));
            rows
        };
        assert_eq!(sorted(&toml), sorted(&json));
        near(
            toml.total.as_ref().unwrap().mass_kg,
            json.total.as_ref().unwrap().mass_kg,
        );
        assert_eq!(json.limits.len(), 22);
        let ends = |b: &Balance| {
            b.limits
                .iter()
                .map(|l| (l.quantity, l.from, l.to))
                .collect::<Vec<_>>()
        };
        assert_eq!(ends(&toml), ends(&json));
        assert_eq!(toml.statics.reactions.as_ref().map(Vec::len), Some(3));
        assert_eq!(toml.statics.tip.as_ref().map(Vec::len), Some(3));
    }
}
