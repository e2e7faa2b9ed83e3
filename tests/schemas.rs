//! The published JSON Schemas against what the built program prints, and against assembly files.
#![allow(clippy::unwrap_used, clippy::panic)]

#[path = "support/program.rs"]
mod program;

use std::collections::BTreeMap;

use jsonschema::Validator;
use program::{files, json, repository};
use serde_json::Value;

fn schema(name: &str) -> Value {
    let path = repository().join(format!("schemas/{name}.schema.json"));
    serde_json::from_str(&std::fs::read_to_string(path).unwrap()).unwrap()
}

/// Validators by the name in `bismar/NAME/1`.
struct Schemas(BTreeMap<&'static str, Validator>);

impl Schemas {
    fn all() -> Self {
        let names = ["check", "weigh", "balance", "materials", "error"];
        let of = |n| (n, jsonschema::draft202012::new(&schema(n)).unwrap());
        Self(names.map(of).into_iter().collect())
    }

    /// Runs the program and holds its answer against the schema that it names itself.
    fn hold(&self, arguments: &[&str], faults: &mut Vec<String>) -> String {
        let (doc, exit) = json(arguments);
        assert_eq!(doc["exit"], exit, "{arguments:?}");
        let id = doc["schema"].as_str().unwrap();
        let name = id.split('/').nth(1).unwrap().to_owned();
        assert_eq!(id, format!("bismar/{name}/1"));
        assert!(
            name == "error" || name == arguments[0],
            "{arguments:?} answers {name}"
        );
        for e in self.0[name.as_str()].iter_errors(&doc) {
            faults.push(format!("{arguments:?}: {} at {}", e, e.instance_path()));
        }
        name
    }
}

fn none(faults: &[String]) {
    assert!(
        faults.is_empty(),
        "{} faults:\n{}",
        faults.len(),
        faults.join("\n")
    );
}

#[test]
fn the_schemas_are_draft_2020_12_and_refuse_unknown_fields() {
    fn walk(v: &Value, at: &str, name: &str, objects: &mut usize) {
        if let Some(o) = v.as_object() {
            if o.get("type").is_some_and(|t| t == "object") {
                assert_eq!(
                    o.get("additionalProperties"),
                    Some(&Value::Bool(false)),
                    "{name}{at}"
                );
                *objects += 1;
            }
            o.iter()
                .for_each(|(k, v)| walk(v, &format!("{at}/{k}"), name, objects));
        } else if let Some(list) = v.as_array() {
            list.iter().for_each(|v| walk(v, at, name, objects));
        }
    }
    for name in ["check", "weigh", "balance", "materials", "error"] {
        let s = schema(name);
        assert_eq!(s["$schema"], "https://json-schema.org/draft/2020-12/schema");
        jsonschema::meta::validate(&s).unwrap_or_else(|e| panic!("{name}: {e}"));
        let mut objects = 0;
        walk(&s, "", name, &mut objects);
        assert!(objects >= 5, "{name}");
    }
}

#[test]
fn meshes_answer_as_the_schemas_say() {
    let schemas = Schemas::all();
    let mut faults = Vec::new();
    let mut answered: BTreeMap<String, usize> = BTreeMap::new();
    let mut meshes = files("fixtures", &["stl", "obj", "3mf"], true);
    meshes.extend(files("demo-data", &["stl", "obj"], true));
    let mut hold = |arguments: &[&str]| {
        *answered
            .entry(schemas.hold(arguments, &mut faults))
            .or_default() += 1;
    };
    for path in &meshes {
        hold(&["check", "--json", path]);
        hold(&["weigh", "--json", path]);
        hold(&[
            "weigh",
            "--json",
            "--material",
            "steel",
            "--nested",
            "void",
            "--about",
            "1,2,3",
            "--hash",
            path,
        ]);
    }
    // Several at once, some of them unreadable; whole folders; a body.
    let mut many = vec!["check", "--json", "--unit", "in"];
    many.extend(meshes.iter().map(String::as_str));
    hold(&many);
    many[0] = "weigh";
    hold(&many);
    hold(&["check", "--json", "--deep", "fixtures"]);
    hold(&[
        "weigh",
        "--json",
        "demo-data/rover/frame.obj#frame rail left",
    ]);
    let bracket = "demo-data/rover/nozzle-bracket.stl";
    let weigh = ["weigh", "--json", "--material", "petg", bracket];
    let layers = [
        "--layers", "1", "--wall", "1", "--skin", "1", "--infill", "20",
    ];
    hold(&[&weigh[..], &layers[..]].concat());
    hold(&[&weigh[..], &["--shell", "2", "--fill", "0.6 g/cm3"]].concat());
    for name in ["check", "weigh", "error"] {
        assert!(answered.get(name).is_some_and(|n| *n > 3), "{answered:?}");
    }
    none(&faults);
}

#[test]
fn assemblies_and_materials_answer_as_the_schemas_say() {
    let schemas = Schemas::all();
    let mut faults = Vec::new();
    let mut answered: BTreeMap<String, usize> = BTreeMap::new();
    let mut assemblies = files("fixtures/assemblies", &["toml"], true);
    assemblies.extend(files("demo-data", &["toml"], true));
    assemblies.push("fixtures/assemblies/plain.json".into());
    for path in &assemblies {
        for more in [&[][..], &["--about", "1,2,3"][..]] {
            let arguments = [&["balance", "--json", path.as_str()][..], more].concat();
            *answered
                .entry(schemas.hold(&arguments, &mut faults))
                .or_default() += 1;
        }
    }
    for arguments in [
        &["materials", "--json"][..],
        &["materials", "steel", "--json"],
    ] {
        *answered
            .entry(schemas.hold(arguments, &mut faults))
            .or_default() += 1;
    }
    for name in ["balance", "materials", "error"] {
        assert!(answered.get(name).is_some_and(|n| *n > 1), "{answered:?}");
    }
    none(&faults);
}

#[test]
fn mistakes_on_the_command_line_answer_as_the_schema_says() {
    let schemas = Schemas::all();
    let mut faults = Vec::new();
    for arguments in [
        &["check", "--json"][..],
        &["weigh", "--json", "no-such-file.stl"],
        &["weigh", "--json", "--density", "7850", "fixtures/cube.obj"],
        &[
            "weigh",
            "--json",
            "--material",
            "unobtainium",
            "fixtures/cube.obj",
        ],
        &["balance", "--json", "no-such-file.toml"],
        &["weigh", "--json", "fixtures/cube.obj#nobody"],
        &["check", "--json", "fixtures/invalid/folder-without-meshes"],
    ] {
        let name = schemas.hold(arguments, &mut faults);
        assert_eq!(name, "error", "{arguments:?}");
    }
    none(&faults);
}

/// One field too many, one too few, one of another type, at any depth: each is refused.
#[test]
fn the_schemas_notice() {
    let schemas = Schemas::all();
    for arguments in [
        &["check", "--json", "fixtures/hole-one-facet-missing.stl"][..],
        &["weigh", "--json", "fixtures/cube.obj"],
        &["balance", "--json", "fixtures/assemblies/limit-holds.toml"],
    ] {
        let (doc, _) = json(arguments);
        let validator = &schemas.0[arguments[0]];
        assert!(validator.is_valid(&doc));
        let paths = objects(&doc, String::new());
        assert!(paths.len() > 4);
        for path in paths {
            let mut more = doc.clone();
            more.pointer_mut(&path).unwrap()["surprise"] = 1.into();
            assert!(
                !validator.is_valid(&more),
                "{arguments:?}: a field more at {path}"
            );
            let keys: Vec<String> = doc
                .pointer(&path)
                .unwrap()
                .as_object()
                .unwrap()
                .keys()
                .cloned()
                .collect();
            for key in keys {
                let mut other = doc.clone();
                other.pointer_mut(&path).unwrap()[&key] = serde_json::json!({ "no": ["such"] });
                assert!(
                    !validator.is_valid(&other),
                    "{arguments:?}: another type at {path}/{key}"
                );
                if ["path", "line", "length_m", "edges", "implied_density_kg_m3"]
                    .contains(&key.as_str())
                {
                    continue;
                }
                let mut fewer = doc.clone();
                fewer
                    .pointer_mut(&path)
                    .unwrap()
                    .as_object_mut()
                    .unwrap()
                    .remove(&key);
                assert!(
                    !validator.is_valid(&fewer),
                    "{arguments:?}: nothing at {path}/{key}"
                );
            }
        }
    }
}

fn objects(v: &Value, at: String) -> Vec<String> {
    match v {
        Value::Object(o) => {
            let inner = o.iter().flat_map(|(k, v)| objects(v, format!("{at}/{k}")));
            let inner: Vec<_> = inner.collect();
            std::iter::once(at).chain(inner).collect()
        }
        Value::Array(list) => list
            .iter()
            .enumerate()
            .flat_map(|(i, v)| objects(v, format!("{at}/{i}")))
            .collect(),
        _ => Vec::new(),
    }
}

fn assembly_file(path: &str) -> Option<Value> {
    let text = std::fs::read_to_string(repository().join(path)).unwrap();
    if path.ends_with(".json") {
        serde_json::from_str(&text).ok()
    } else {
        toml::from_str(&text).ok()
    }
}

/// Files that `balance` answers are of the published shape; so are most that it refuses for
/// another reason, and those with an unknown key or table are not.
#[test]
fn assembly_files_are_of_the_published_shape() {
    let published = schema("assembly");
    let validator = jsonschema::draft202012::new(&published).unwrap();
    let (printed, _) = json(&["schema"]);
    assert_eq!(printed, published, "schemas/assembly.schema.json is stale");
    let mut assemblies = files("fixtures/assemblies", &["toml"], false);
    assemblies.extend(files("demo-data", &["toml"], true));
    assemblies.push("fixtures/assemblies/plain.json".into());
    let mut faults = Vec::new();
    let mut valid = 0;
    for path in &assemblies {
        let (doc, _) = json(&["balance", "--json", path]);
        if doc["schema"] != "bismar/balance/1" {
            continue;
        }
        let file = assembly_file(path).unwrap();
        valid += 1;
        for e in validator.iter_errors(&file) {
            faults.push(format!("{path}: {e} at {}", e.instance_path()));
        }
        // A key that is not known, in any table of the file.
        for at in objects(&file, String::new()) {
            // Names of materials are the file's own.
            if at == "/material" {
                continue;
            }
            let mut more = file.clone();
            more.pointer_mut(&at).unwrap()["surprise"] = 1.into();
            if validator.is_valid(&more) {
                faults.push(format!("{path}: takes a key more at {at:?}"));
            }
        }
    }
    assert!(valid > 20, "{valid} valid files");
    for path in ["unknown-key", "unknown-table"] {
        let file = assembly_file(&format!("fixtures/assemblies/{path}.toml")).unwrap();
        if validator.is_valid(&file) {
            faults.push(format!("{path} is taken"));
        }
    }
    none(&faults);
}
