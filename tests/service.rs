//! Tanks, cases, frames, motion, phases, fields, sheet and graded density: the built program on
//! assemblies whose figures are known in closed form.
#![allow(clippy::unwrap_used, clippy::panic)]

#[path = "support/program.rs"]
mod program;

use std::fmt::Write as _;
use std::path::PathBuf;

use program::{bismar, json};
use serde_json::Value;
use tempfile::TempDir;

/// A folder with meshes of boxes and one assembly file, in metres.
struct Bench {
    dir: TempDir,
}

impl Bench {
    fn new() -> Self {
        Self {
            dir: tempfile::tempdir().unwrap(),
        }
    }

    fn path(&self, name: &str) -> PathBuf {
        self.dir.path().join(name)
    }

    /// Boxes of one body each, side by side in one mesh under one name.
    fn boxes(self, name: &str, boxes: &[([f64; 3], [f64; 3])]) -> Self {
        let mut text = format!("o {}\n", name.trim_end_matches(".obj"));
        for (n, (lo, hi)) in boxes.iter().enumerate() {
            for k in 0..8 {
                let c = |i: usize| if k >> i & 1 == 0 { lo[i] } else { hi[i] };
                let _ = writeln!(text, "v {} {} {}", c(0), c(1), c(2));
            }
            for q in [
                [0, 2, 3, 1],
                [4, 5, 7, 6],
                [0, 1, 5, 4],
                [2, 6, 7, 3],
                [0, 4, 6, 2],
                [1, 3, 7, 5],
            ] {
                let [a, b, c, d] = q.map(|i| i + 1 + 8 * n);
                let _ = writeln!(text, "f {a} {b} {c} {d}");
            }
        }
        std::fs::write(self.path(name), text).unwrap();
        self
    }

    fn assembly(&self, text: &str) -> String {
        let head =
            "[assembly]\nname = \"it\"\nunit = \"m\"\n[material.brine]\ndensity = \"1000 kg/m3\"\n";
        std::fs::write(self.path("it.toml"), format!("{head}{text}")).unwrap();
        self.path("it.toml").to_str().unwrap().to_owned()
    }

    fn run(&self, command: &str, text: &str, more: &[&str]) -> (Value, i32) {
        let path = self.assembly(text);
        let mut arguments = vec![command, "--json", path.as_str()];
        arguments.extend(more);
        json(&arguments)
    }

    fn answered(&self, command: &str, text: &str, more: &[&str]) -> Value {
        let (doc, exit) = self.run(command, text, more);
        assert_eq!(exit, 0, "{doc:#}");
        doc
    }

    /// The first error of what cannot be answered.
    fn refused(&self, command: &str, text: &str, more: &[&str]) -> (String, String) {
        let (doc, exit) = self.run(command, text, more);
        assert_eq!(exit, 2, "{doc:#}");
        assert_eq!(doc["schema"], "bismar/error/1");
        let e = &doc["error"];
        let told = format!("{} {}", e["message"], e["advice"]);
        (e["kind"].as_str().unwrap().to_owned(), told)
    }
}

fn number(v: &Value) -> f64 {
    v.as_f64().unwrap_or_else(|| panic!("{v} is no number"))
}

#[track_caller]
fn near(v: &Value, want: f64, allowed: f64) {
    let v = number(v);
    assert!((v - want).abs() <= allowed, "{v} is not {want}");
}

#[track_caller]
fn near3(v: &Value, want: [f64; 3], allowed: f64) {
    (0..3).for_each(|k| near(&v[k], want[k], allowed));
}

fn warned(doc: &Value, kind: &str) -> bool {
    let list = doc["warnings"].as_array().unwrap();
    list.iter().any(|w| w["kind"] == kind)
}

/// A tank 1 × 2 × 1 m about the z axis, on the ground.
fn tank() -> Bench {
    Bench::new().boxes("tank.obj", &[([-0.5, -1.0, 0.0], [0.5, 1.0, 1.0])])
}

const TANK: &str = "[[tank]]\nname = \"tank\"\nmesh = \"tank.obj\"\nliquid = \"brine\"\n";

#[test]
fn four_ways_to_state_one_fill() {
    let bench = tank();
    for fill in ["\"50 %\"", "\"1000 l\"", "\"1000 kg\"", "0.5", "\"50 cm\""] {
        let doc = bench.answered("balance", &format!("{TANK}fill = {fill}\n"), &[]);
        near(&doc["total"]["mass_kg"], 1000.0, 1e-9);
        near3(&doc["total"]["centre_of_mass_m"], [0.0, 0.0, 0.25], 1e-13);
        // m/12·(b²+c²): 1000/12·(4 + 0.25).
        near(
            &doc["total"]["inertia_kg_m2"][0][0],
            1000.0 / 12.0 * 4.25,
            1e-9,
        );
        let t = &doc["tanks"][0];
        near(&t["capacity_m3"], 2.0, 1e-12);
        near(&t["ullage_m3"], 1.0, 1e-12);
        near(&t["level_m"], 0.5, 1e-12);
        near(&t["surface_area_m2"], 2.0, 1e-12);
        near3(&t["surface_centroid_m"], [0.0, 0.0, 0.5], 1e-12);
        let part = &doc["parts"][0];
        assert_eq!(
            (&part["basis"], &part["material"]),
            (&"computed".into(), &"brine".into())
        );
        assert_eq!(part["source"]["file"], "tank.obj");
        near(&part["volume_m3"], 1.0, 1e-12);
        near(&part["bounds_m"][1][2], 0.5, 1e-12);
    }
}

/// REFERENCE: box tank, width 1, mean depth 0.5, tilted by 10°, by `down` and by an acceleration.
#[test]
fn a_tilted_or_accelerated_tank_shifts_its_liquid() {
    let bench = tank();
    let (sin, cos) = 10f64.to_radians().sin_cos();
    let g = 9.80665;
    for gravity in [
        format!("down = [{sin}, 0, {}]", -cos),
        format!("acceleration = [\"{} m/s2\", 0, 0]", -g * sin / cos),
    ] {
        let text = format!("{TANK}fill = \"50 %\"\n[gravity]\n{gravity}\n");
        let doc = bench.answered("balance", &text, &[]);
        let c = &doc["total"]["centre_of_mass_m"];
        near3(
            c,
            [0.0293878301180775, 0.0, 0.25 + 0.00259093367714695],
            1e-12,
        );
    }
    // The tank turned the other way in level gravity is the same, seen from its own frame.
    let text = format!("{TANK}fill = \"50 %\"\nturn = {{ axis = \"y\", angle = \"10 deg\" }}\n");
    let doc = bench.answered("balance", &text, &[]);
    let (x, z) = (0.0293878301180775, 0.25 + 0.00259093367714695);
    let want = [x * cos + z * sin, 0.0, -x * sin + z * cos];
    near3(&doc["total"]["centre_of_mass_m"], want, 1e-12);
    // A level is measured from the lowest point at that attitude: the corner.
    let text = format!(
        "{TANK}fill = {sin}\n[gravity]\ndown = [{sin}, 0, {}]\n",
        -cos
    );
    let doc = bench.answered("balance", &text, &[]);
    // It reaches the other lower edge: half of B·B·tanθ, times 2 along y.
    near(&doc["total"]["mass_kg"], 1000.0 * sin / cos, 1e-9);
}

#[test]
fn without_effective_gravity_there_is_no_level() {
    let bench = tank();
    let fall = "[gravity]\nacceleration = [0, 0, \"-9.80665 m/s2\"]\n";
    for fill in ["0.5", "\"50 %\""] {
        let text = format!("{TANK}fill = {fill}\n{fall}");
        let (_, told) = bench.refused("balance", &text, &[]);
        assert!(told.contains("effective gravity"), "{told}");
    }
    // Full is full, and empty is empty, whatever is up.
    let doc = bench.answered("balance", &format!("{TANK}fill = \"100 %\"\n{fall}"), &[]);
    near(&doc["total"]["mass_kg"], 2000.0, 1e-9);
    assert_eq!(doc["tanks"][0]["level_m"], Value::Null);
    let (_, told) = bench.refused("balance", &format!("{TANK}fill = 1.2\n"), &[]);
    assert!(told.contains("above the top"), "{told}");
    let (_, told) = bench.refused("balance", &format!("{TANK}fill = \"2100 kg\"\n"), &[]);
    assert!(told.contains("more than tank"), "{told}");
}

#[test]
fn separate_pools_are_told_with_their_volumes() {
    let bench = Bench::new().boxes(
        "tank.obj",
        &[
            ([0.0, 0.0, 0.0], [1.0, 1.0, 1.0]),
            ([2.0, 0.0, 0.5], [3.0, 1.0, 1.5]),
        ],
    );
    let doc = bench.answered("balance", &format!("{TANK}fill = 0.75\n"), &[]);
    assert!(warned(&doc, "separate-pools"), "{doc:#}");
    let pools = &doc["tanks"][0]["pools"];
    near(&pools[0]["volume_m3"], 0.75, 1e-12);
    near(&pools[1]["volume_m3"], 0.25, 1e-12);
    near3(&pools[1]["centroid_m"], [2.5, 0.5, 0.625], 1e-12);
    let doc = bench.answered("balance", &format!("{TANK}fill = 0.25\n"), &[]);
    assert!(!warned(&doc, "separate-pools"));
}

const CASES: &str = r#"
[[item]]
name = "frame"
mass = "100 kg"
[[item]]
name = "payload"
mass = "50 kg"
at = [1, 0, 0]
[[group]]
name = "boom"
at = [0, 2, 0]
turn = { axis = "z", angle = "90 deg" }
  [[group.item]]
  name = "head"
  mass = "10 kg"
  at = [1, 0, 0]
[[case]]
name = "loaded"
with = ["payload"]
fill = { tank = "100 %" }
[[case]]
name = "bare"
without = ["tank", "boom"]
[[case]]
name = "reach"
at = { "boom/head" = [3, 0, 0] }
[[limit]]
mass = { to = "2000 kg" }
"#;

#[test]
fn cases_switch_fill_and_move() {
    let bench = tank();
    let text = format!("{TANK}fill = \"50 %\"\n{CASES}");
    let (doc, exit) = bench.run("balance", &text, &[]);
    // The limit holds as filed and breaks in one case.
    assert_eq!(exit, 1);
    near(&doc["total"]["mass_kg"], 1110.0, 1e-9);
    assert_eq!(doc["limits"][0]["verdict"], "holds");
    assert!(warned(&doc, "in-cases-only"));
    let names: Vec<&str> = doc["parts"]
        .as_array()
        .unwrap()
        .iter()
        .map(|p| p["path"].as_str().unwrap())
        .collect();
    assert_eq!(names, ["tank", "frame", "boom/head"]);
    let cases = doc["cases"].as_array().unwrap();
    assert_eq!(cases.len(), 3);
    near(&cases[0]["total"]["mass_kg"], 2160.0, 1e-9);
    near(
        &cases[0]["total"]["centre_of_mass_m"][0],
        50.0 / 2160.0,
        1e-14,
    );
    assert_eq!(cases[0]["limits"][0]["verdict"], "broken");
    near(&cases[0]["limits"][0]["margin"], -160.0, 1e-9);
    near(&cases[1]["total"]["mass_kg"], 100.0, 1e-12);
    // The head stands at boom's frame (3, 0, 0): turned by a quarter, (0, 3, 0), plus (0, 2, 0).
    near(
        &cases[2]["total"]["centre_of_mass_m"][1],
        50.0 / 1110.0,
        1e-14,
    );
    let (text_out, _) = {
        let path = bench.assembly(&text);
        let out = bismar(&["balance", &path]);
        (String::from_utf8(out.stdout).unwrap(), out.status)
    };
    assert!(text_out.contains("BROKEN, margin -160"), "{text_out}");
    // One case alone.
    let (doc, exit) = bench.run("balance", &text, &["--case", "loaded"]);
    assert_eq!((exit, &doc["case"]), (1, &"loaded".into()));
    near(&doc["total"]["mass_kg"], 2160.0, 1e-9);
    assert_eq!(doc["limits"][0]["verdict"], "broken");
    let (kind, told) = bench.refused("balance", &text, &["--case", "laden"]);
    assert_eq!(kind, "unknown-name");
    assert!(told.contains("loaded"), "{told}");
}

#[test]
fn frames_give_centre_and_inertia_about_a_pivot() {
    let bench = Bench::new();
    let text = "[[item]]\nname = \"bob\"\nmass = \"2 kg\"\nat = [3, 0, 0]\n\
                [[frame]]\nname = \"pivot\"\nat = [1, 0, 0]\naxes = [[0, 1, 0], [-1, 0, 0], [0, 0, 1]]\n";
    let doc = bench.answered("balance", text, &["--about", "pivot"]);
    let about = &doc["about"];
    assert_eq!(about["frame"], "pivot");
    // 2 m along the assembly's x is −2 along the frame's y.
    near3(&about["centre_of_mass_m"], [0.0, -2.0, 0.0], 1e-15);
    near(&about["inertia_kg_m2"][0][0], 8.0, 1e-14);
    near(&about["inertia_kg_m2"][1][1], 0.0, 1e-14);
    near(&about["inertia_kg_m2"][2][2], 8.0, 1e-14);
    let doc = bench.answered("balance", text, &["--about", "1,0,0"]);
    near3(&doc["about"]["centre_of_mass_m"], [2.0, 0.0, 0.0], 1e-15);
    let (kind, _) = bench.refused("balance", text, &["--about", "pivto"]);
    assert_eq!(kind, "unknown-name");
}

/// Draining is monotone in mass; a group's motion takes its tank along, and the liquid stays level.
#[test]
fn drain_follows_fill_and_motion() {
    let bench = tank();
    let text = "[[item]]\nname = \"frame\"\nmass = \"500 kg\"\n\
        [[group]]\nname = \"cradle\"\n  [[group.tank]]\n  name = \"tank\"\n  mesh = \"tank.obj\"\n  liquid = \"brine\"\n  fill = \"100 %\"\n\
        [[motion]]\nname = \"tip\"\nof = \"cradle\"\nturn = { axis = \"y\" }\nto = \"10 deg\"\n\
        [[phase]]\nname = \"out\"\ndrain = [\"cradle/tank\"]\nto = \"50 %\"\n\
        [[phase]]\nname = \"over\"\nmove = [\"tip\"]\n\
        [[limit]]\nname = \"fore\"\ncentre.x = { to = 10 }\n";
    let doc = bench.answered("drain", text, &["--steps", "5"]);
    assert_eq!(doc["schema"], "bismar/drain/1");
    let phases = doc["phases"].as_array().unwrap();
    assert_eq!(phases.len(), 2);
    let masses: Vec<f64> = phases
        .iter()
        .flat_map(|p| p["steps"].as_array().unwrap())
        .map(|s| number(&s["mass_kg"]))
        .collect();
    assert_eq!(masses.len(), 12);
    assert!(masses.windows(2).all(|m| m[1] <= m[0] + 1e-9), "{masses:?}");
    near(&phases[0]["steps"][5]["mass_kg"], 1500.0, 1e-9);
    near(
        &phases[0]["steps"][2]["fills"]["cradle/tank"]["volume_m3"],
        1.6,
        1e-12,
    );
    let last = &phases[1]["steps"][5];
    near(&last["motions"]["tip"], 10f64.to_radians(), 1e-15);
    let (sin, cos) = 10f64.to_radians().sin_cos();
    let (x, z) = (0.0293878301180775, 0.25 + 0.00259093367714695);
    let want = [
        (x * cos + z * sin) * 1000.0 / 1500.0,
        0.0,
        (-x * sin + z * cos) * 1000.0 / 1500.0,
    ];
    near3(&last["centre_of_mass_m"], want, 1e-12);
    // CSV has a row a step.
    let path = bench.assembly(text);
    let out = bismar(&["drain", &path, "--csv", "--steps", "5"]);
    assert_eq!(String::from_utf8(out.stdout).unwrap().lines().count(), 13);
    // And the picture is one.
    let picture = bench.path("way.svg");
    let out = bismar(&["drain", &path, "--picture", picture.to_str().unwrap()]);
    assert_eq!(out.status.code(), Some(0));
    let svg = std::fs::read_to_string(picture).unwrap();
    assert!(
        svg.starts_with("<svg") && svg.contains("2 begins phase over"),
        "{svg}"
    );
}

/// 20 whole turns of an arm: every step finds it where it began, and the worst hides between them.
/// Then a spike of 1 % of a path that lies between two of four steps.
#[test]
fn a_worst_narrower_than_a_step_is_found() {
    let bench = Bench::new();
    let text = "[[item]]\nname = \"frame\"\nmass = \"9 kg\"\n[[item]]\nname = \"arm\"\nmass = \"1 kg\"\nat = [1, 0, 0]\n\
        [[motion]]\nof = \"arm\"\nturn = { axis = \"z\" }\nto = \"7200 deg\"\n[[phase]]\nname = \"spin\"\nmove = [\"arm\"]\n\
        [[limit]]\nname = \"side\"\ncentre.y = { to = \"99 mm\" }\n";
    let (doc, exit) = bench.run("drain", text, &["--steps", "4"]);
    assert_eq!(exit, 1, "{doc:#}");
    for step in doc["phases"][0]["steps"].as_array().unwrap() {
        near(&step["centre_of_mass_m"][1], 0.0, 1e-12);
    }
    let l = &doc["limits"][0];
    assert_eq!(l["verdict"], "broken");
    near(&l["worst"]["value"], 0.1, 1e-9);
    near(&l["worst"]["margin"], -0.001, 1e-9);
    assert!(number(&l["worst"]["within"]) < 2e-3, "{l}");
    near(&doc["envelope"]["centre_of_mass_m"][0][0], -0.1, 1e-9);
    near(&doc["envelope"]["centre_of_mass_m"][1][1], 0.1, 1e-9);

    // A limit a millimetre farther out holds, and that is proved: nothing can hide behind it.
    let doc = bench.answered("drain", &text.replace("99 mm", "101 mm"), &["--steps", "4"]);
    let l = &doc["limits"][0];
    assert_eq!(l["verdict"], "holds");
    near(&l["margin"], 0.001, 1e-9);
    assert!(number(&l["worst"]["within"]) <= 0.001 + 1e-6, "{l}");
    let text = text.replace(
        "turn = { axis = \"z\" }\nto = \"7200 deg\"",
        "through = [[0, 0, 0], [1, 0, 0], [1, 0.01, 0], [1, 0, 0], [2.5, 0, 0]]",
    );
    let text = text.replace("99 mm", "0.9 mm");
    let (doc, exit) = bench.run("drain", &text, &["--steps", "4"]);
    assert_eq!(exit, 1, "{doc:#}");
    let l = &doc["limits"][0];
    // 10 mm of 1 kg in 10 kg, at (1 + 0.01) of 2.52 m.
    near(&l["worst"]["value"], 0.001, 1e-15);
    near(&l["worst"]["at"], 1.01 / 2.52, 1e-12);
    assert_eq!(l["worst"]["phase"], "spin");
}

/// The balance point of a draining tank is lowest between full and empty: for a box of dry mass M at
/// height H and liquid of density ρA per height, dz/dh = 0 where the surface is at the balance
/// point. By hand: (M H + ρA h²/2)/(M + ρA h) is least where it equals h.
#[test]
fn the_lowest_balance_point_is_where_the_surface_meets_it() {
    let bench = tank();
    let text = format!(
        "{TANK}fill = \"100 %\"\n[[item]]\nname = \"frame\"\nmass = \"500 kg\"\nat = [0, 0, 0.5]\n\
         [[limit]]\ncentre.z = {{ from = 0.1 }}\n"
    );
    let doc = bench.answered("drain", &text, &["--steps", "3"]);
    // Without phases every tank empties together.
    assert_eq!(doc["phases"].as_array().unwrap().len(), 1);
    near(&doc["phases"][0]["steps"][3]["mass_kg"], 500.0, 1e-9);
    // ρA h²/2 + M h − M H = 0 with ρA = 2000, M = 500, H = 0.5.
    let h = (-500.0 + (250e3_f64 + 4.0 * 1000.0 * 250.0).sqrt()) / 2000.0;
    let worst = &doc["limits"][0]["worst"];
    near(&worst["value"], h, 1e-12);
    near(&worst["at"], 1.0 - h, 1e-6);
    assert!(number(&worst["within"]) < 1e-3);
}

#[test]
fn drain_goes_in_order_and_motions_come_back() {
    let bench = tank();
    let text = "[[item]]\nname = \"frame\"\nmass = \"1 kg\"\n\
        [[tank]]\nname = \"a\"\nmesh = \"tank.obj\"\nliquid = \"brine\"\nfill = \"50 %\"\n\
        [[tank]]\nname = \"b\"\nmesh = \"tank.obj\"\nliquid = \"brine\"\nfill = \"100 %\"\nat = [5, 0, 0]\n\
        [[motion]]\nname = \"slide\"\nof = \"frame\"\nalong = \"x\"\nto = 3\n\
        [[phase]]\nname = \"one\"\ndrain = [\"a\", \"b\"]\nmove = [\"slide\"]\n\
        [[phase]]\nname = \"two\"\nmove = [\"frame\"]\n";
    let doc = bench.answered("drain", text, &["--steps", "6"]);
    let at =
        |n: usize, tank: &str| number(&doc["phases"][0]["steps"][n]["fills"][tank]["volume_m3"]);
    // 3 m³ in six steps, a first.
    for (n, a, b) in [(1, 0.5, 2.0), (2, 0.0, 2.0), (3, 0.0, 1.5), (6, 0.0, 0.0)] {
        assert!(
            (at(n, "a") - a).abs() < 1e-12 && (at(n, "b") - b).abs() < 1e-12,
            "{n}"
        );
    }
    near(
        &doc["phases"][0]["steps"][3]["motions"]["slide"],
        1.5,
        1e-15,
    );
    near(&doc["phases"][1]["steps"][0]["motions"]["slide"], 3.0, 0.0);
    near(&doc["phases"][1]["steps"][6]["motions"]["slide"], 0.0, 0.0);
}

#[test]
fn slips_in_names_are_told_with_their_lines() {
    let bench = tank();
    let base = format!("{TANK}fill = \"50 %\"\n");
    for (text, kind, said) in [
        (
            "[[motion]]\nof = \"tnak\"\nalong = \"x\"\nto = 1\n",
            "unknown-name",
            "did you mean `tank`",
        ),
        (
            "[[motion]]\nof = \"tank\"\nto = 1\n",
            "usage",
            "not how it moves",
        ),
        (
            "[[motion]]\nof = \"tank\"\nalong = \"x\"\n",
            "usage",
            "no `to`",
        ),
        (
            "[[phase]]\nname = \"p\"\ndrain = [\"frame\"]\n",
            "unknown-name",
            "nothing is called so",
        ),
        (
            "[[phase]]\nname = \"p\"\nmove = [\"boom\"]\n",
            "unknown-name",
            "no motion",
        ),
        ("[[phase]]\nname = \"p\"\n", "usage", "drain"),
        (
            "[[case]]\nname = \"c\"\nwithout = [\"frme\"]\n",
            "unknown-name",
            "nothing is called so",
        ),
        (
            "[[case]]\nname = \"c\"\n[[case]]\nname = \"c\"\n",
            "ambiguous-name",
            "same name",
        ),
        (
            "[[case]]\nname = \"c\"\nfill = { tank = \"120 %\" }\n",
            "bad-number",
            "above 100 %",
        ),
        ("[gravity]\nfield = \"mars\"\n", "usage", "uniform"),
        ("[gravity]\ngm = \"1 m3/s2\"\n", "usage", "says nothing"),
        (
            "[gravity]\nfield = \"central\"\ngm = \"1 m3/s2\"\n",
            "usage",
            "no `at`",
        ),
        (
            "[gravity]\nfield = \"earth\"\nlatitude = \"95 deg\"\n",
            "bad-number",
            "poles",
        ),
        (
            "[[frame]]\nname = \"f\"\naxes = [[1, 0, 0], [1, 1, 0], [0, 0, 1]]\n",
            "bad-number",
            "right angles",
        ),
    ] {
        let (found, told) = bench.refused("balance", &format!("{base}{text}"), &[]);
        assert_eq!(found, kind, "{text}: {told}");
        assert!(told.contains(said), "{text}: {told}");
        let (doc, _) = bench.run("balance", &format!("{base}{text}"), &[]);
        assert!(
            doc["error"]["line"].as_u64().is_some_and(|l| l > 5),
            "{doc:#}"
        );
    }
    let (kind, told) = bench.refused("drain", "[[item]]\nname = \"x\"\nmass = \"1 kg\"\n", &[]);
    assert_eq!(kind, "usage");
    assert!(told.contains("nothing drains"), "{told}");
}

/// REFERENCE: the tether: 20 t at altitude 0, 600 t at 100,000 km.
#[test]
fn three_centres_of_a_tether() {
    let bench = Bench::new();
    let text = "[[item]]\nname = \"low\"\nmass = \"20 t\"\n[[item]]\nname = \"high\"\nmass = \"600 t\"\nat = [\"100000 km\", 0, 0]\n\
        [gravity]\nfield = \"central\"\ngm = \"3.986004418e14 m3/s2\"\nat = [\"6378.137 km\", 0, 0]\n";
    let doc = bench.answered("balance", text, &[]);
    let c = &doc["centres"];
    let radius = |v: &Value| number(&v[0]) / 1e3 + 6378.137;
    assert!((radius(&c["centre_of_mass_m"]) - 103152.330548).abs() < 1e-6);
    assert!((radius(&c["same_force_m"]) - 33739.2159994).abs() < 1e-6);
    assert!((radius(&c["centre_of_gravity_m"]) - 16112.8863468).abs() < 1e-6);
    assert_eq!(c["centroid_m"], Value::Null);
    let stands = c["stands_for"].as_array().unwrap();
    assert!(stands.iter().all(|s| s["holds"] == false), "{c:#}");
    // On the ground all is one, and said why.
    let text = text.split("[gravity]").next().unwrap();
    let doc = bench.answered("balance", text, &["--centres"]);
    let c = &doc["centres"];
    assert_eq!(c["field"], "uniform");
    assert_eq!(c["centre_of_gravity_m"], c["centre_of_mass_m"]);
    near(&c["force_n"][2], -620e3 * 9.80665, 1e-6);
    near(&c["torque_n_m"][0], 0.0, 0.0);
    assert!(
        c["stands_for"][0]["why"]
            .as_str()
            .unwrap()
            .contains("uniform")
    );
    let doc = bench.answered("balance", text, &[]);
    assert!(doc.get("centres").is_none());
}

#[test]
fn density_decides_whether_the_centroid_will_do() {
    let bench = tank();
    let part = "[[part]]\nname = \"p\"\nmesh = \"tank.obj\"\nmaterial = \"brine\"\nplaces = [[0, 0, 0], [4, 0, 0]]\n";
    let doc = bench.answered("balance", part, &["--centres"]);
    let s = &doc["centres"]["stands_for"][0];
    assert_eq!((&s["a"], &s["holds"]), (&"centroid".into(), &true.into()));
    assert!(s["why"].as_str().unwrap().contains("one density"));
    let two = format!(
        "{part}[[part]]\nname = \"q\"\nmesh = \"tank.obj\"\nmaterial = \"steel\"\nat = [8, 0, 0]\n"
    );
    let doc = bench.answered("balance", &two, &["--centres=1 m"]);
    let s = &doc["centres"]["stands_for"][0];
    assert_eq!(s["holds"], false);
    near3(&doc["centres"]["centroid_m"], [4.0, 0.0, 0.5], 1e-12);
    near(&s["tolerance_m"], 1.0, 0.0);
}

/// The skin of a cube of side a: 6a² of sheet, I = 5/18·m·a² (by hand from its six faces).
#[test]
fn sheet_coating_and_graded_density() {
    let bench = Bench::new().boxes("cube.obj", &[([0.0; 3], [1.0, 1.0, 1.0])]);
    let part = "[[part]]\nname = \"p\"\nmesh = \"cube.obj\"\n";
    let sheet = format!("{part}material = \"brine\"\nsheet = \"2 mm\"\n");
    let doc = bench.answered("balance", &sheet, &[]);
    near(&doc["total"]["mass_kg"], 12.0, 1e-12);
    near3(&doc["total"]["centre_of_mass_m"], [0.5; 3], 1e-14);
    near(
        &doc["total"]["inertia_kg_m2"][0][0],
        12.0 * 5.0 / 18.0,
        1e-12,
    );
    near(&doc["parts"][0]["volume_m3"], 0.012, 1e-15);
    assert!(!warned(&doc, "thick-skin"));
    let thick = bench.answered("balance", &sheet.replace("2 mm", "20 mm"), &[]);
    assert!(warned(&thick, "thick-skin"));
    let coated = format!(
        "{part}material = \"brine\"\ncoating = {{ thickness = \"1 mm\", material = \"brine\" }}\n"
    );
    let doc = bench.answered("balance", &coated, &[]);
    near(&doc["total"]["mass_kg"], 1006.0, 1e-9);
    let want = 1000.0 / 6.0 + 6.0 * 5.0 / 18.0;
    near(&doc["total"]["inertia_kg_m2"][1][1], want, 1e-10);
    // 1000 + 600 z: mass 1300, ∫z = 500 + 200.
    let graded = format!(
        "{part}graded = {{ along = \"z\", at = [0, 1], density = [\"1000 kg/m3\", \"1600 kg/m3\"] }}\nat = [0, 0, 5]\n"
    );
    let doc = bench.answered("balance", &graded, &[]);
    near(&doc["total"]["mass_kg"], 1300.0, 1e-10);
    near(
        &doc["total"]["centre_of_mass_m"][2],
        5.0 + 700.0 / 1300.0,
        1e-13,
    );
    near(&doc["parts"][0]["density_kg_m3"], 1300.0, 1e-9);
    let (doc, exit) = bench.run("balance", &graded.replace("1600", "0"), &[]);
    assert_eq!(exit, 2, "{doc:#}");
    let (_, told) = bench.refused("balance", &format!("{graded}sheet = 0.1\n"), &[]);
    assert!(told.contains("cannot stand together"), "{told}");
}

/// A sheet need not be closed: a plate of two triangles.
#[test]
fn an_open_sheet_weighs() {
    let bench = Bench::new();
    std::fs::write(
        bench.path("plate.obj"),
        "o plate\nv 0 0 0\nv 2 0 0\nv 2 1 0\nv 0 1 0\nf 1 2 3 4\n",
    )
    .unwrap();
    let text = "[[part]]\nmesh = \"plate.obj\"\nmaterial = \"brine\"\nsheet = \"3 mm\"\n";
    let doc = bench.answered("balance", text, &[]);
    near(&doc["total"]["mass_kg"], 6.0, 1e-12);
    near3(&doc["total"]["centre_of_mass_m"], [1.0, 0.5, 0.0], 1e-14);
    near(
        &doc["total"]["inertia_kg_m2"][2][2],
        6.0 / 12.0 * 5.0,
        1e-12,
    );
}
