//! How sure the figures are, through the command line.
#![allow(clippy::unwrap_used, clippy::panic)]

#[path = "support/program.rs"]
mod program;

use program::{bismar, json, repository};
use serde_json::Value;

const ROVER: &str = "demo-data/rover/rover.toml";

fn number(v: &Value) -> f64 {
    v.as_f64().unwrap_or_else(|| panic!("{v} is no number"))
}

#[track_caller]
fn near(v: &Value, want: f64, within: f64) {
    let got = number(v);
    assert!((got - want).abs() <= within, "{got} is not {want}");
}

fn text(arguments: &[&str]) -> String {
    String::from_utf8(bismar(arguments).stdout).unwrap()
}

/// A file in a folder of its own, with its answer held against the published schema.
fn balance(toml: &str, more: &[&str]) -> (Value, i32, String) {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("it.toml");
    std::fs::write(&path, toml).unwrap();
    let path = path.to_str().unwrap();
    let arguments = [&["balance", path, "--json"][..], more].concat();
    let (doc, exit) = json(&arguments);
    let schema = repository().join("schemas/balance.schema.json");
    let schema: Value = serde_json::from_str(&std::fs::read_to_string(schema).unwrap()).unwrap();
    let validator = jsonschema::draft202012::new(&schema).unwrap();
    let faults: Vec<String> = validator
        .iter_errors(&doc)
        .map(|e| format!("{e} at {}", e.instance_path()))
        .collect();
    assert_eq!(faults, Vec::<String>::new());
    let shown = text(&[&["balance", path][..], more].concat());
    (doc, exit, shown)
}

#[test]
fn weigh_gives_the_uncertainty_of_a_density() {
    let file = "fixtures/cube.obj";
    for (density, standard, half) in [
        ("1000 kg/m3 ± 2 %", 0.02 / 3.0_f64.sqrt(), 0.019),
        ("1000 kg/m3 ± 2 % (k=1)", 0.02, 0.02 * 1.959_964),
        ("1000 kg/m3 ± 2 % (k=2)", 0.01, 0.01 * 1.959_964),
        ("1000 kg/m3 ± 20 kg/m3", 0.02 / 3.0_f64.sqrt(), 0.019),
    ] {
        let (doc, exit) = json(&["weigh", "--json", "--unit", "m", "--density", density, file]);
        assert_eq!(exit, 0);
        assert_eq!(doc["warnings"], serde_json::json!([]), "{density}");
        let body = &doc["files"][0]["bodies"][0];
        let (m, u) = (number(&body["mass_kg"]), &body["uncertainty"]);
        near(&u["mass_kg"]["standard"], standard * m, 1e-12 * m);
        near(&u["mass_kg"]["high_95"], m * (1.0 + half), 1e-6 * m);
        near(&u["mass_kg"]["low_95"], m * (1.0 - half), 1e-6 * m);
        assert_eq!(u["mass_kg"]["drivers"][0]["share"], 1.0);
        assert_eq!(u["mass_kg"]["drivers"][0]["source"], "density");
        assert_eq!(
            u["centre_of_mass_m"]["standard"],
            serde_json::json!([0.0, 0.0, 0.0])
        );
        let i = number(&body["inertia_kg_m2"][0][0]);
        near(
            &u["inertia_kg_m2"]["standard"][0][0],
            standard * i,
            1e-12 * i,
        );
        assert_eq!(doc["files"][0]["whole"]["uncertainty"], *u);
        let (doc, _) = json(&[
            "weigh",
            "--json",
            "--whole",
            "--unit",
            "m",
            "--density",
            density,
            file,
        ]);
        near(
            &doc["files"][0]["whole"]["uncertainty"]["mass_kg"]["standard"],
            standard * m,
            1e-12 * m,
        );
    }
    // A material of the table has a spread; a density without one says nothing.
    let (doc, _) = json(&["weigh", "--json", "--material", "al-6061", file]);
    let u = &doc["files"][0]["bodies"][0]["uncertainty"];
    assert_eq!(u["sources"][0]["source"], "density of aluminium 6061-T6");
    let (doc, _) = json(&["weigh", "--json", "--density", "1 g/cm3", file]);
    assert_eq!(doc["files"][0]["bodies"][0]["uncertainty"], Value::Null);
}

#[test]
fn balance_says_how_sure_it_is() {
    let (doc, exit) = json(&["balance", ROVER, "--json"]);
    assert_eq!(exit, 0);
    assert!(
        doc["warnings"]
            .as_array()
            .unwrap()
            .iter()
            .all(|w| w["kind"] != "tolerances-ignored")
    );
    let u = &doc["uncertainty"];
    let mass = number(&doc["total"]["mass_kg"]);
    assert!(number(&u["mass_kg"]["low_95"]) < mass && mass < number(&u["mass_kg"]["high_95"]));
    for share in [
        u["mass_kg"]["drivers"]
            .as_array()
            .unwrap()
            .iter()
            .map(|d| number(&d["share"]))
            .sum::<f64>(),
        u["centre_of_mass_m"]["drivers"]
            .as_array()
            .unwrap()
            .iter()
            .map(|d| number(&d["share"][2]))
            .sum(),
    ] {
        assert!((share - 1.0).abs() < 1e-12, "{share}");
    }
    for limit in doc["limits"].as_array().unwrap() {
        assert!(number(&limit["probability"]) > 0.99, "{limit}");
    }
    // Figures stop where their uncertainty begins.
    let shown = text(&["balance", ROVER]);
    assert!(
        shown.contains("mass           110.52 kg (95 % from 109.80 to 111.91 kg)\n"),
        "{shown}"
    );
    assert!(shown.contains("what drives it"));
    assert!(!shown.contains("110.5199"));
}

/// Draws agree with propagation on the demo; another seed draws others.
#[test]
fn samples() {
    let (doc, _) = json(&["balance", ROVER, "--json", "--samples", "20000"]);
    let (u, s) = (&doc["uncertainty"], &doc["uncertainty"]["sampled"]);
    assert_eq!(
        (s["n"].as_u64(), s["seed"].as_u64()),
        (Some(20_000), Some(1))
    );
    for (figure, at) in [
        ("mass_kg", ""),
        ("centre_of_mass_m", "/0"),
        ("centre_of_mass_m", "/2"),
        ("principal_moments_kg_m2", "/1"),
        ("inertia_kg_m2", "/0/2"),
    ] {
        let of = |v: &Value, key: &str| number(v.pointer(&format!("/{figure}/{key}{at}")).unwrap());
        let (linear, drawn) = (of(u, "standard"), of(s, "standard"));
        // One standard error of 20,000 draws is 0.5 %, and less for what is not normal.
        assert!(
            (drawn / linear - 1.0).abs() < 0.02,
            "{figure}{at}: {linear} {drawn}"
        );
    }
    assert_eq!(s["linear_not_good_enough"], serde_json::json!([]));
    let (other, _) = json(&[
        "balance",
        ROVER,
        "--json",
        "--samples",
        "20000",
        "--seed",
        "2",
    ]);
    assert_ne!(other["uncertainty"]["sampled"]["mass_kg"], s["mass_kg"]);
    for wrong in [
        &["--samples", "1"][..],
        &["--samples", "x"],
        &["--seed", "2"],
    ] {
        assert_eq!(
            bismar(&[&["balance", ROVER][..], wrong].concat())
                .status
                .code(),
            Some(2)
        );
    }
}

#[test]
fn growth_and_smears() {
    let (doc, exit, shown) = balance(
        "[assembly]\nunit = \"mm\"\n[allowance]\nlayout = \"15 %\"\n\
         [[item]]\nname = \"pump\"\nmass = \"10 kg ± 1 %\"\nmaturity = \"layout\"\nbox = [100, 100, 100]\n\
         [[item]]\nname = \"battery\"\nmass = \"5 kg\"\nat = [500, 0, 0]\n\
         [[smear]]\nname = \"paint\"\nof = \"*\"\nmass = \"2 % ± 1 %\"\n\
         [[limit]]\nmass = { to = \"17 kg\" }\n",
        &["--samples", "1000"],
    );
    assert_eq!(exit, 0);
    near(&doc["total"]["mass_kg"], 15.3, 1e-12);
    near(&doc["growth"]["predicted"]["mass_kg"], 16.83, 1e-12);
    near(&doc["limits"][0]["value"], 16.83, 1e-12);
    near(&doc["limits"][0]["basic"], 15.3, 1e-12);
    assert_eq!(doc["parts"][2]["source"], "smear");
    near(&doc["parts"][0]["predicted_mass_kg"], 11.5, 1e-12);
    assert!(shown.contains("predicted mass"), "{shown}");
    assert!(shown.contains("growth of pump"), "{shown}");
}

/// A limit in the middle of the interval has an even chance, and its verdict goes by the value.
#[test]
fn chances_of_limits() {
    let (doc, exit, shown) = balance(
        "[assembly]\nunit = \"mm\"\n[[item]]\nname = \"a\"\nmass = \"10 kg ± 1 kg\"\n\
         [[limit]]\nname = \"even\"\nmass = { to = \"10 kg\" }\n\
         [[limit]]\nname = \"lower\"\nmass = { to = \"9.5 kg\" }\n",
        &[],
    );
    assert_eq!(exit, 1);
    near(&doc["limits"][0]["probability"], 0.5, 1e-12);
    near(&doc["limits"][1]["probability"], 0.25, 1e-12);
    assert_eq!(doc["limits"][0]["verdict"], "holds");
    assert_eq!(doc["limits"][1]["verdict"], "broken");
    assert!(
        shown.contains("50.00 %") && shown.contains("25.00 %"),
        "{shown}"
    );
}
