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
    // What the file's own tolerances put at risk, more ballast makes good.
    let (more, exit) = json(&["trim", "--json", "--sure", "95", &vague]);
    assert_eq!(exit, 0, "{more}");
    assert!(more["total_kg"].as_f64().unwrap() > doc["total_kg"].as_f64().unwrap());
}

/// A box as an OBJ mesh, in the file's unit.
fn vessel(folder: &tempfile::TempDir, lo: [f64; 3], hi: [f64; 3]) {
    let mut text = String::from("o inside\n");
    for k in 0..8 {
        let c = [0, 1, 2].map(|i| if k >> i & 1 == 0 { lo[i] } else { hi[i] });
        text += &format!("v {} {} {}\n", c[0], c[1], c[2]);
    }
    text += "f 1 3 4 2\nf 5 6 8 7\nf 1 2 6 5\nf 3 7 8 4\nf 1 5 7 3\nf 2 4 8 6\n";
    std::fs::write(folder.path().join("inside.obj"), text).unwrap();
}

const SPRAYER: &str = "[assembly]\nname = \"sprayer\"\nunit = \"m\"\n\
    [material.brine]\ndensity = \"1000 kg/m3\"\n\
    [[item]]\nname = \"dry\"\nmass = \"120 kg\"\nat = [0, 0, 0.5]\n\
    [[tank]]\nname = \"tank\"\nmesh = \"inside.obj\"\nliquid = \"brine\"\nfill = \"160 kg\"\n\
    [[support]]\nname = \"a\"\nat = [-0.45, -1, 0]\n[[support]]\nname = \"b\"\nat = [0.45, -1, 0]\n\
    [[support]]\nname = \"c\"\nat = [0.45, 1, 0]\n[[support]]\nname = \"d\"\nat = [-0.45, 1, 0]\n";

/// The published sprayer tips at 36.972° with its liquid level; ballast near the ground that makes
/// it hold 40°, balanced again, tips at 40° exactly.
#[test]
fn ballast_against_a_slope_counts_the_liquid_where_it_runs_to() {
    let folder = tempfile::tempdir().unwrap();
    vessel(&folder, [-0.4, -0.25, 0.3], [0.4, 0.25, 1.1]);
    let limit = "[[limit]]\nname = \"slope\"\ntip = { towards = \"x\", from = \"40 deg\" }\n";
    let low = place("low", "at = [0, 0, 0.1]");
    let file = put(&folder, "sprayer.toml", &format!("{SPRAYER}{limit}{low}"));
    let (before, exit) = json(&["balance", "--json", &file]);
    let slope = before["limits"][0]["value"].as_f64().unwrap().to_degrees();
    assert!((slope - 36.97196065).abs() < 1e-8, "{slope}");
    assert_eq!(exit, 1);
    let items = folder.path().join("low.toml");
    let (_, exit) = json(&["trim", "--json", &file, "--write", items.to_str().unwrap()]);
    assert_eq!(exit, 0);
    let group = "[[group]]\nname = \"ballast\"\ninclude = \"low.toml\"\n";
    let file = put(&folder, "mended.toml", &format!("{SPRAYER}{limit}{group}"));
    let (after, exit) = json(&["balance", "--json", &file]);
    let slope = after["limits"][0]["value"].as_f64().unwrap().to_degrees();
    assert!((slope - 40.0).abs() < 1e-7, "{slope}");
    assert_eq!(exit, 0, "{after}");
}

/// A case without the dry load, and a tank that drains: the ballast holds the limit in all of
/// them, and a little less does not.
#[test]
fn ballast_holds_in_every_case_and_on_the_way() {
    let folder = tempfile::tempdir().unwrap();
    vessel(&folder, [0.2, -0.25, 0.3], [1.0, 0.25, 1.1]);
    let more = "[[limit]]\nname = \"aft\"\ncentre.x = { from = -0.4, to = 0.25 }\n\
        [[case]]\nname = \"bare\"\nwithout = [\"dry\"]\nfill = { tank = \"10 kg\" }\n\
        [[phase]]\nname = \"spraying\"\ndrain = [\"tank\"]\n";
    let tail = place("tail", "at = [-0.5, 0, 0.1]");
    let file = put(&folder, "rover.toml", &format!("{SPRAYER}{more}{tail}"));
    let items = folder.path().join("tail.toml");
    let (doc, exit) = json(&["trim", "--json", &file, "--write", items.to_str().unwrap()]);
    assert_eq!((exit, doc["outcome"].as_str()), (0, Some("found")), "{doc}");
    // As filed: 160·(0.6 − 0.25) = 120·0.25 + 0.75·m.
    let total = doc["total_kg"].as_f64().unwrap();
    assert!(
        (total - (160.0 * 0.35 - 120.0 * 0.25) / 0.75).abs() < 1e-6,
        "{total}"
    );
    let group = "[[group]]\nname = \"ballast\"\ninclude = \"tail.toml\"\n";
    let file = put(&folder, "with.toml", &format!("{SPRAYER}{more}{group}"));
    for question in ["balance", "drain"] {
        let (doc, exit) = json(&[question, "--json", &file]);
        assert_eq!(exit, 0, "{question}: {doc}");
    }
}
