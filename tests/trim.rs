//! `bismar trim` on small assemblies: least ballast worked out by hand, written as items, and the
//! assembly with them balanced again.
#![allow(clippy::unwrap_used, clippy::panic)]

#[path = "support/program.rs"]
mod program;

use program::{bismar, json};

const HEAD: &str = "[assembly]\nname = \"rover\"\nunit = \"mm\"\n";
const LOAD: &str = "[[item]]\nname = \"load\"\nmass = \"10 kg\"\nat = [60, 0, 80]\n";
const CENTRE: &str = "[[limit]]\nname = \"fore and aft\"\ncentre.x = { to = 50 }\n";

fn place(name: &str, more: &str) -> String {
    format!("[[ballast]]\nname = \"{name}\"\n{more}\n")
}

fn put(folder: &tempfile::TempDir, name: &str, text: &str) -> String {
    let path = folder.path().join(name);
    std::fs::write(&path, text).unwrap();
    path.to_str().unwrap().to_owned()
}

#[test]
fn whole_unit_weights() {
    // 10·(60 − 50)/(50 + 200) = 0.4 kg would do: two of 0.25 kg.
    let (doc, exit) = json(&[
        "trim",
        "--json",
        "fixtures/assemblies/stands-and-hangs.toml",
    ]);
    assert_eq!((exit, doc["schema"].as_str()), (0, Some("bismar/trim/1")));
    assert_eq!(doc["outcome"], "found");
    assert_eq!(doc["proof"], "gap");
    assert_eq!(doc["ballast"][0]["place"], "tail");
    assert_eq!(doc["ballast"][0]["units"], 2);
    assert_eq!(doc["total_kg"], 0.5);
    assert_eq!(doc["before"][0]["verdict"], "broken");
    assert_eq!(doc["after"][0]["verdict"], "holds");
    assert_eq!(doc["inputs"][0]["sha256"].as_str().unwrap().len(), 64);
    let text =
        String::from_utf8(bismar(&["trim", "fixtures/assemblies/stands-and-hangs.toml"]).stdout)
            .unwrap();
    assert!(
        text.contains("0.500000 kg of ballast, the least there is"),
        "{text}"
    );
    assert_eq!(text.matches("no sloshing").count(), 1, "{text}");
}

#[test]
fn written_items_bring_the_assembly_inside() {
    let folder = tempfile::tempdir().unwrap();
    let limits = format!("{CENTRE}[[limit]]\nname = \"side\"\ncentre.y = {{ from = 3, to = 3 }}\n");
    let places =
        place("tail \\\"a\\\"", "at = [-200, 0, 20]") + &place("side", "at = [-10, 400, 20]");
    let file = put(
        &folder,
        "rover.toml",
        &format!("{HEAD}{LOAD}{limits}{places}"),
    );
    let out = folder.path().join("ballast.toml");
    let (doc, exit) = json(&["trim", "--json", &file, "--write", out.to_str().unwrap()]);
    assert_eq!(exit, 0, "{doc}");
    assert_eq!(doc["proof"], "dual");
    assert!(doc["gap_kg"].as_f64().unwrap() < 1e-8);
    let binding = doc["binding"].as_array().unwrap();
    assert!(
        binding
            .iter()
            .any(|b| b["limit"] == "fore and aft" && b["price"].as_f64().unwrap() > 0.0)
    );
    let with =
        format!("{HEAD}{LOAD}[[group]]\nname = \"trim\"\ninclude = \"ballast.toml\"\n{limits}");
    let (balance, exit) = json(&["balance", "--json", &put(&folder, "with.toml", &with)]);
    assert_eq!(exit, 0, "{balance}");
    let total = 10.0 + doc["total_kg"].as_f64().unwrap();
    assert!((balance["total"]["mass_kg"].as_f64().unwrap() - total).abs() < 1e-13 * total);
    // Nothing more is needed then.
    let (again, exit) = json(&[
        "trim",
        "--json",
        &put(&folder, "again.toml", &format!("{with}{places}")),
    ]);
    assert_eq!(
        (exit, again["outcome"].as_str()),
        (0, Some("holds-already"))
    );
}

#[test]
fn a_mesh_shapes_the_ballast_and_bounds_it() {
    let folder = tempfile::tempdir().unwrap();
    let brick = std::fs::canonicalize("fixtures/assemblies/brick.stl").unwrap();
    std::fs::copy(brick, folder.path().join("brick.stl")).unwrap();
    // 6 cm3 of 8000 kg/m3 hold 48 g at most, with the middle at x = −195: the load is 1 kg.
    let load = LOAD.replace("10 kg", "1 kg");
    let own = "[material.own]\ndensity = \"8000 kg/m3\"\n";
    let shape = place(
        "plate",
        "mesh = \"brick.stl\"\nmaterial = \"own\"\nat = [-200, 0, 0]",
    );
    let file = put(
        &folder,
        "rover.toml",
        &format!("{HEAD}{own}{load}{CENTRE}{shape}"),
    );
    let out = folder.path().join("out.toml");
    let (doc, exit) = json(&["trim", "--json", &file, "--write", out.to_str().unwrap()]);
    assert_eq!(exit, 0, "{doc}");
    let want = 10.0 / 245.0;
    assert!((doc["total_kg"].as_f64().unwrap() - want).abs() < 1e-12);
    assert!(
        doc["inputs"]
            .as_array()
            .unwrap()
            .iter()
            .any(|i| i["path"].as_str().unwrap().ends_with("brick.stl"))
    );
    assert!(
        std::fs::read_to_string(&out)
            .unwrap()
            .contains("inertia = { xx")
    );
    let (doc, exit) = json(&[
        "trim",
        "--json",
        &put(
            &folder,
            "more.toml",
            &format!("{HEAD}{own}{LOAD}{CENTRE}{shape}"),
        ),
    ]);
    assert_eq!((exit, doc["outcome"].as_str()), (1, Some("impossible")));
    assert_eq!(doc["conflict"][0], "fore and aft");
    assert!(doc["total_kg"].is_null() && doc["gap_kg"].is_null());
}

#[test]
fn mistakes_are_told() {
    let folder = tempfile::tempdir().unwrap();
    let none = put(&folder, "none.toml", &format!("{HEAD}{LOAD}{CENTRE}"));
    let (doc, exit) = json(&["trim", "--json", &none]);
    assert_eq!((exit, doc["error"]["kind"].as_str()), (2, Some("usage")));
    let tail = place("tail", "at = [-200, 0, 20]\ntolerance = \"1 %\"");
    let sure = put(&folder, "sure.toml", &format!("{HEAD}{LOAD}{CENTRE}{tail}"));
    let (doc, exit) = json(&["trim", "--json", "--sure", "95", &sure]);
    assert_eq!(exit, 0, "{doc}");
    assert!(
        doc["total_kg"].as_f64().unwrap() > 0.4 && doc["sampled"]["held"].as_f64().unwrap() > 0.94
    );
    let vague = put(
        &folder,
        "vague.toml",
        &format!(
            "{HEAD}{}{CENTRE}{tail}",
            LOAD.replace("10 kg", "10 kg ± 1 %")
        ),
    );
    let (doc, exit) = json(&["trim", "--json", "--sure", "95", &vague]);
    assert_eq!((exit, doc["error"]["kind"].as_str()), (2, Some("usage")));
}
