//! Copies that `check` writes: mended, plain, and pictures; through the built program.
#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

use std::path::{Path, PathBuf};
use std::process::Output;

use serde_json::Value;

type P = [f64; 3];

fn bismar(args: &[&str]) -> Output {
    assert_cmd::Command::cargo_bin("bismar")
        .unwrap()
        .args(args)
        .output()
        .unwrap()
}

fn json(args: &[&str]) -> (i32, Value) {
    let out = bismar(args);
    (
        out.status.code().unwrap(),
        serde_json::from_slice(&out.stdout).unwrap(),
    )
}

fn obj(facets: &[(&str, Vec<[P; 3]>)]) -> String {
    let mut text = String::new();
    let mut n = 0;
    for (name, list) in facets {
        text.push_str(&format!("o {name}\n"));
        for t in list {
            for p in t {
                text.push_str(&format!("v {} {} {}\n", p[0], p[1], p[2]));
            }
            text.push_str(&format!("f {} {} {}\n", n + 1, n + 2, n + 3));
            n += 3;
        }
    }
    text
}

/// A closed box, outward: two facets a side, in the order −x +x −y +y −z +z.
fn cube(at: P, size: P) -> Vec<[P; 3]> {
    let mut out = Vec::new();
    for k in 0..3 {
        for far in [0.0, 1.0] {
            let corner = |u: f64, v: f64| {
                let mut p = at;
                p[k] += far * size[k];
                p[(k + 1) % 3] += u * size[(k + 1) % 3];
                p[(k + 2) % 3] += v * size[(k + 2) % 3];
                p
            };
            let [a, b, c, d] = [
                corner(0.0, 0.0),
                corner(1.0, 0.0),
                corner(1.0, 1.0),
                corner(0.0, 1.0),
            ];
            if far > 0.0 {
                out.extend([[a, b, c], [a, c, d]]);
            } else {
                out.extend([[a, c, b], [a, d, c]]);
            }
        }
    }
    out
}

fn turned(facets: Vec<[P; 3]>) -> Vec<[P; 3]> {
    facets.into_iter().map(|[a, b, c]| [a, c, b]).collect()
}

struct Folder(tempfile::TempDir);

impl Folder {
    fn new() -> Self {
        Self(tempfile::tempdir().unwrap())
    }
    fn put(&self, name: &str, text: &str) -> PathBuf {
        let path = self.0.path().join(name);
        std::fs::write(&path, text).unwrap();
        path
    }
    fn path(&self, name: &str) -> PathBuf {
        self.0.path().join(name)
    }
}

fn s(path: &Path) -> &str {
    path.to_str().unwrap()
}

/// Volumes of the bodies of a sound file, m³.
fn sound_volumes(path: &Path) -> Vec<(String, f64)> {
    let (exit, doc) = json(&["check", "--json", "--unit", "m", s(path)]);
    assert_eq!(exit, 0, "{doc}");
    doc["files"][0]["bodies"]
        .as_array()
        .unwrap()
        .iter()
        .map(|b| {
            (
                b["id"].as_str().unwrap().to_owned(),
                b["volume_m3"].as_f64().unwrap(),
            )
        })
        .collect()
}

#[test]
fn everything_harmless_is_mended_and_said() {
    let folder = Folder::new();
    // An open box with a side missing, one inside out, one with a facet twice and a collapsed one.
    let mut open = cube([0.0; 3], [2.0, 3.0, 4.0]);
    open.truncate(10);
    let inverted = turned(cube([10.0, 0.0, 0.0], [1.0; 3]));
    let mut double = cube([20.0, 0.0, 0.0], [1.0, 1.0, 2.0]);
    double.push(double[3]);
    double.push([double[0][0], double[0][0], double[0][1]]);
    let text = obj(&[("tray", open), ("knob", inverted), ("peg", double)]);
    let source = folder.put("bad.obj", &text);
    for out in ["good.obj", "good.stl"] {
        let out = folder.path(out);
        let (exit, doc) = json(&[
            "check",
            "--json",
            "--unit",
            "m",
            s(&source),
            "--mend",
            s(&out),
        ]);
        assert_eq!(exit, 0, "{doc}");
        let file = &doc["files"][0];
        assert_eq!(file["sound"], false);
        let mended = &file["mended"];
        assert_eq!(mended["written"], true);
        let steps: Vec<(String, u64, f64)> = mended["steps"]
            .as_array()
            .unwrap()
            .iter()
            .map(|s| {
                (
                    s["action"].as_str().unwrap().to_owned(),
                    s["count"].as_u64().unwrap(),
                    s["volume_change_m3"].as_f64().unwrap(),
                )
            })
            .collect();
        let actions: Vec<(&str, u64)> = steps.iter().map(|s| (&s.0[..], s.1)).collect();
        assert_eq!(
            actions,
            [
                ("duplicates-dropped", 1),
                ("degenerate-dropped", 1),
                ("holes-capped", 1),
                ("shells-turned", 1)
            ]
        );
        // The tray's cap at z = 4 over 2 × 3, from the origin: a third of 24.
        assert_eq!(steps[2].2, 8.0);
        assert_eq!(steps[3].2, 2.0);
        // By hand: A = 6, (2/3)·6^1.5/√π.
        let bound = mended["steps"][2]["volume_bound_m3"].as_f64().unwrap();
        assert!((bound - 2.0 / 3.0 * 6f64.powf(1.5) / std::f64::consts::PI.sqrt()).abs() < 1e-12);
        let volumes = sound_volumes(&out);
        let values: Vec<f64> = volumes.iter().map(|v| v.1).collect();
        assert_eq!(values, [24.0, 1.0, 2.0], "{volumes:?}");
        if out.extension().unwrap() == "obj" {
            let names: Vec<&str> = volumes.iter().map(|v| &v.0[..]).collect();
            assert_eq!(names, ["tray", "knob", "peg"]);
        }
        // Nothing else is left in the folder.
        assert!(std::fs::read_dir(folder.0.path()).unwrap().count() <= 3);
    }
}

#[test]
fn a_missing_face_with_bores_in_it_is_one_cap() {
    let folder = Folder::new();
    // A plate with a square bore; both its faces in z are missing: two loops each.
    let wall = |at: P, size: P| -> Vec<[P; 3]> { cube(at, size)[..8].to_vec() };
    let mut sides = wall([0.0; 3], [4.0, 4.0, 1.0]);
    sides.extend(turned(wall([1.0, 1.0, 0.0], [1.0, 1.0, 1.0])));
    // One face stays, so that the walls hang together: the ring at z = 0 in eight facets.
    let o = |x: f64, y: f64| [x, y, 0.0];
    let outer = [o(0.0, 0.0), o(4.0, 0.0), o(4.0, 4.0), o(0.0, 4.0)];
    let inner = [o(1.0, 1.0), o(2.0, 1.0), o(2.0, 2.0), o(1.0, 2.0)];
    for i in 0..4 {
        let j = (i + 1) % 4;
        sides.push([outer[i], inner[j], outer[j]]);
        sides.push([outer[i], inner[i], inner[j]]);
    }
    let source = folder.put("plate.obj", &obj(&[("plate", sides)]));
    let out = folder.path("whole.obj");
    let (exit, doc) = json(&[
        "check",
        "--json",
        "--unit",
        "m",
        s(&source),
        "--mend",
        s(&out),
    ]);
    assert_eq!(exit, 0, "{doc}");
    let volumes = sound_volumes(&out);
    assert!((volumes[0].1 - 15.0).abs() < 1e-12, "{volumes:?}");
}

#[test]
fn what_would_be_a_guess_is_refused_and_nothing_is_written() {
    let folder = Folder::new();
    // A corner of the box is gone: the hole is not flat.
    let mut corner = cube([0.0; 3], [1.0; 3]);
    corner.retain(|t| !t.contains(&[1.0, 1.0, 1.0]));
    // One facet runs the wrong way.
    let mut conflict = cube([0.0; 3], [1.0; 3]);
    conflict[4].swap(0, 1);
    // A solid in a solid.
    let mut nested = cube([0.0; 3], [4.0; 3]);
    nested.extend(cube([1.0; 3], [1.0; 3]));
    // A spike pokes through the missing side.
    let mut poked = cube([0.0; 3], [4.0; 3]);
    poked.truncate(10);
    poked.extend(cube([1.0, 1.0, 1.0], [1.0, 1.0, 9.0]));
    for (name, facets) in [
        ("corner", corner),
        ("conflict", conflict),
        ("nested", nested),
        ("poked", poked),
    ] {
        let source = folder.put(&format!("{name}.obj"), &obj(&[(name, facets)]));
        let out = folder.path(&format!("{name}-out.stl"));
        let (exit, doc) = json(&[
            "check",
            "--json",
            "--unit",
            "m",
            s(&source),
            "--mend",
            s(&out),
        ]);
        let mended = &doc["files"][0]["mended"];
        assert_eq!(
            (exit, &mended["written"]),
            (1, &Value::Bool(false)),
            "{name}: {doc}"
        );
        assert!(!mended["refused"].as_array().unwrap().is_empty());
        assert!(!out.exists());
    }
}

#[test]
fn a_crack_is_mended_by_the_join_that_its_refusal_names() {
    let folder = Folder::new();
    // The lid of a box of 2 × 3 × 4 hovers 0.001 above it.
    let mut box_ = cube([0.0; 3], [2.0, 3.0, 4.0]);
    for facet in &mut box_[10..] {
        facet.iter_mut().for_each(|p| p[2] += 0.001);
    }
    let source = folder.put("box.obj", &obj(&[("box", box_)]));
    let out = folder.path("whole.obj");
    let run = |join: &[&str]| {
        let mut arguments = vec!["check", "--json", "--unit", "m", s(&source)];
        arguments.extend(["--mend", s(&out)]);
        arguments.extend(join);
        json(&arguments)
    };
    let (exit, doc) = run(&[]);
    let refused = doc["files"][0]["mended"]["refused"][0].as_str().unwrap();
    assert!(exit == 1 && !out.exists(), "{doc}");
    let distance = refused
        .split("--join ")
        .nth(1)
        .and_then(|rest| rest.split(' ').next())
        .unwrap_or_else(|| panic!("{refused}"));
    let (exit, doc) = run(&["--join", distance]);
    assert_eq!(exit, 0, "{doc}");
    let steps = doc["files"][0]["mended"]["steps"].as_array().unwrap();
    let [step] = &steps[..] else {
        panic!("{steps:?}")
    };
    assert_eq!(
        (&step["action"], &step["count"]),
        (&"vertices-joined".into(), &4.into())
    );
    // From the first vertex, in z = 0: the lid at 4.001 over 2 × 3 came down to 4, and the third
    // of what it spans changed.
    let change = step["volume_change_m3"].as_f64().unwrap();
    assert!((change + 0.001 * 6.0 / 3.0).abs() < 1e-12, "{change}");
    assert!((sound_volumes(&out)[0].1 - 24.0).abs() < 1e-12);
}

#[test]
fn copies_say_what_rounding_does() {
    let folder = Folder::new();
    let source = folder.put(
        "a.obj",
        &obj(&[("rod", cube([0.1, 0.2, 0.3], [0.7, 0.3, 0.9]))]),
    );
    let out = folder.path("a.stl");
    let (exit, doc) = json(&[
        "check",
        "--json",
        "--unit",
        "m",
        s(&source),
        "--write",
        s(&out),
    ]);
    assert_eq!(exit, 0);
    let moved = doc["files"][0]["copied"]["largest_move_m"]
        .as_f64()
        .unwrap();
    // Half a spacing of f32 below 2.
    assert!(moved > 0.0 && moved <= 2f64.powi(-24), "{moved}");
    let kinds: Vec<&str> = doc["warnings"]
        .as_array()
        .unwrap()
        .iter()
        .map(|w| w["kind"].as_str().unwrap())
        .collect();
    assert!(
        kinds.contains(&"rounded-to-f32") && kinds.contains(&"names-dropped"),
        "{kinds:?}"
    );
    assert!((sound_volumes(&out)[0].1 - 0.7 * 0.3 * 0.9).abs() < 1e-6);
    // Far from the origin f32 flattens the rod: refused, not written flat.
    let far = folder.put(
        "far.obj",
        &obj(&[("rod", cube([1e9, 0.0, 0.0], [1.0, 1.0, 1.0]))]),
    );
    let flat = folder.path("far.stl");
    let (exit, doc) = json(&[
        "check",
        "--json",
        "--unit",
        "m",
        s(&far),
        "--write",
        s(&flat),
    ]);
    assert_eq!((exit, flat.exists()), (1, false), "{doc}");
    // To OBJ and back nothing changes.
    let again = folder.path("far2.obj");
    assert_eq!(
        bismar(&["check", "--unit", "m", s(&far), "--write", s(&again)])
            .status
            .code(),
        Some(0)
    );
    assert_eq!(sound_volumes(&again)[0].1, 1.0);
}

#[test]
fn outputs_are_refused_where_they_make_no_sense() {
    let folder = Folder::new();
    let source = folder.put("a.obj", &obj(&[("rod", cube([0.0; 3], [1.0; 3]))]));
    let a = s(&source);
    let nowhere = folder.path("none/b.obj");
    for (args, kind) in [
        (vec!["--write", a], "usage"),
        (vec!["--mend", "b.ply"], "usage"),
        (vec!["--picture", "b.jpg"], "usage"),
        (vec![a, "--mend", "b.obj"], "usage"),
        (vec!["--write", s(&nowhere)], "cannot-write"),
    ] {
        let mut all = vec!["check", "--json", a];
        all.extend(args);
        let (exit, doc) = json(&all);
        assert_eq!(
            (exit, doc["error"]["kind"].as_str()),
            (2, Some(kind)),
            "{all:?}: {doc}"
        );
    }
    assert_eq!(std::fs::read_dir(folder.0.path()).unwrap().count(), 1);
}

#[test]
fn a_picture_is_xml_and_marks_the_hole() {
    let folder = Folder::new();
    let mut open = cube([0.0; 3], [2.0, 3.0, 4.0]);
    open.truncate(10);
    let source = folder.put("a<b.obj", &obj(&[("tray & \"lid\"", open)]));
    let out = folder.path("a.svg");
    let (exit, doc) = json(&[
        "check",
        "--json",
        "--unit",
        "m",
        s(&source),
        "--picture",
        s(&out),
    ]);
    assert_eq!(exit, 1);
    assert_eq!(doc["files"][0]["picture"].as_str(), Some(s(&out)));
    let svg = std::fs::read_to_string(&out).unwrap();
    assert_eq!(svg.matches("from ").count(), 3);
    // A number in each view.
    assert_eq!(svg.matches(">1</text>").count(), 3);
    assert!(svg.contains("a&lt;b.obj") && !svg.contains("NaN") && !svg.contains("inf"));
    assert!(svg.starts_with("<svg") && svg.ends_with("</svg>\n"));
}

#[test]
fn a_picture_in_pixels_is_the_same_drawing() {
    let folder = Folder::new();
    let mut open = cube([0.0; 3], [2.0, 3.0, 4.0]);
    open.truncate(10);
    let source = folder.put("lid.obj", &obj(&[("lid", open)]));
    let drawn = |name: &str| {
        let out = folder.path(name);
        let (exit, doc) = json(&[
            "check",
            "--json",
            "--unit",
            "m",
            s(&source),
            "--picture",
            s(&out),
        ]);
        assert_eq!(exit, 1);
        assert_eq!(doc["files"][0]["picture"].as_str(), Some(s(&out)));
        std::fs::read(&out).unwrap()
    };
    let svg = String::from_utf8(drawn("a.svg")).unwrap();
    let png = drawn("a.PNG");
    assert!(png.starts_with(b"\x89PNG\r\n\x1a\n"));
    assert_eq!(png, bismar::report::picture::png(&svg).unwrap());
}

#[test]
fn open_bodies_are_weighed_only_as_far_as_accepted() {
    let folder = Folder::new();
    // 10 × 10 × 10 with one side of 1 × 1 cut out of a face would be small; here a whole side of a
    // long bar is missing: A = 1, V = 100, B = (2/3)/√π = 0.3761.
    let mut bar = cube([0.0; 3], [1.0, 1.0, 100.0]);
    bar.truncate(10);
    let source = folder.put("bar.obj", &obj(&[("bar", bar)]));
    let (exit, doc) = json(&["weigh", "--json", "--unit", "m", s(&source)]);
    assert_eq!(exit, 1);
    let refused = &doc["files"][0]["bodies"][0]["refused"];
    assert!(
        refused["advice"]
            .as_str()
            .unwrap()
            .contains("--accept-open 0.377"),
        "{refused}"
    );
    for (accept, want) in [("0.376 %", 1), ("0.377", 0), ("1%", 0)] {
        let (exit, doc) = json(&[
            "weigh",
            "--json",
            "--unit",
            "m",
            s(&source),
            "--accept-open",
            accept,
        ]);
        assert_eq!(exit, want, "{accept}");
        let body = &doc["files"][0]["bodies"][0];
        assert_eq!(body["closed"], false);
        if want == 0 {
            let e = &body["estimate"];
            assert_eq!(e["method"], "capped");
            let b = 2.0 / 3.0 / std::f64::consts::PI.sqrt();
            assert!((e["volume_bound_m3"].as_f64().unwrap() / b - 1.0).abs() < 1e-12);
            // d = 50 to the loop's centre and the reach 2/√π; (B·d)/(V − B).
            let d = 50.0 + 2.0 / std::f64::consts::PI.sqrt();
            let c = b * d / (100.0 - b);
            assert!((e["centre_bound_m"].as_f64().unwrap() / c - 1.0).abs() < 1e-9);
            assert!((body["volume_m3"].as_f64().unwrap() - 100.0).abs() < 1e-9);
            assert!(
                e["if"]
                    .as_str()
                    .unwrap()
                    .contains("no larger than twice its flat cap")
            );
        } else {
            assert!(body["estimate"].is_null() && body["volume_m3"].is_null());
            let advice = body["refused"]["advice"].as_str().unwrap();
            assert!(advice.contains("0.377"), "{advice}");
        }
    }
    let text = bismar(&["weigh", "--unit", "m", s(&source), "--accept-open", "1"]);
    let text = String::from_utf8(text.stdout).unwrap();
    let line = text.lines().find(|l| l.contains("ESTIMATE bar")).unwrap();
    assert!(
        line.contains('±')
            && line.contains("if the missing surface is no larger than twice its flat cap")
    );
}

#[test]
fn an_assembly_takes_an_open_part_with_its_bound() {
    let folder = Folder::new();
    let mut bar = cube([0.0; 3], [1.0, 1.0, 100.0]);
    bar.truncate(10);
    folder.put("bar.obj", &obj(&[("bar", bar)]));
    let assembly = |accept: &str| {
        let text = format!(
            "[assembly]\nname = \"mast\"\nunit = \"m\"\n\
             [material.fir]\ndensity = \"500 kg/m3\"\n\
             [[part]]\nmesh = \"bar.obj\"\nmaterial = \"fir\"\n{accept}\
             [[item]]\nname = \"lamp\"\nmass = \"50000 kg\"\nat = [0.5, 0.5, 150]\n\
             [[limit]]\nname = \"crane\"\nmass = {{ to = \"100.1 t\" }}\n\
             [[limit]]\nname = \"road\"\nmass = {{ to = \"101 t\" }}\n\
             [[limit]]\nname = \"balance\"\ncentre.z = {{ to = 100.01 }}\n"
        );
        s(&folder.put("mast.toml", &text)).to_owned()
    };
    for refused in ["", "accept-open = \"0.1 %\"\n"] {
        let (exit, doc) = json(&["balance", "--json", &assembly(refused)]);
        assert_eq!(exit, 2, "{doc}");
        let advice = doc["error"]["advice"].as_str().unwrap();
        assert!(advice.contains("0.377 %"), "{advice}");
    }
    let (exit, doc) = json(&["balance", "--json", &assembly("accept-open = \"1 %\"\n")]);
    assert_eq!(exit, 0, "{doc}");
    let part = &doc["parts"][0];
    assert_eq!(part["basis"], "estimate");
    let near = |x: &Value, y: f64| assert!((x.as_f64().unwrap() / y - 1.0).abs() < 1e-9, "{x} {y}");
    // By hand: B = (2/3)/√π m³ of 100; the centre as in the test of weigh; the lamp holds half.
    let root = std::f64::consts::PI.sqrt();
    let (b, d) = (2.0 / 3.0 / root, 50.0 + 2.0 / root);
    let (mass, centre) = (500.0 * b, b * d / (100.0 - b));
    near(&part["estimate"]["mass_bound_kg"], mass);
    near(&part["estimate"]["centre_bound_m"], centre);
    near(&doc["total"]["estimate"]["mass_bound_kg"], mass);
    let moved = (50_000.0 + mass) * centre + mass * 50.0;
    near(
        &doc["total"]["estimate"]["centre_bound_m"],
        moved / (100_000.0 - mass),
    );
    // 100 kg of room is less than the bound of 188 kg; 1000 kg is more.
    let verdicts: Vec<&str> = doc["limits"]
        .as_array()
        .unwrap()
        .iter()
        .map(|l| l["verdict"].as_str().unwrap())
        .collect();
    assert_eq!(verdicts, ["unsure", "holds", "unsure"]);
    let text = bismar(&["balance", &assembly("accept-open = \"1 %\"\n")]);
    let text = String::from_utf8(text.stdout).unwrap();
    assert!(
        text.contains("ESTIMATE") && text.contains("if the missing surface is no larger"),
        "{text}"
    );
}

#[test]
fn a_hollow_of_another_name_is_told_which_solid_it_lies_in() {
    let folder = Folder::new();
    let inward = |m: Vec<[P; 3]>| m.into_iter().map(|[a, b, c]| [a, c, b]).collect::<Vec<_>>();
    let advice = |at: f64| {
        let source = folder.put(
            "tank.obj",
            &obj(&[
                ("hall", cube([-9.0; 3], [30.0; 3])),
                ("tank", cube([0.0; 3], [10.0; 3])),
                ("inside", inward(cube([at; 3], [4.0; 3]))),
            ]),
        );
        let (exit, doc) = json(&[
            "check",
            "--json",
            "--unit",
            "mm",
            "--no-overlap",
            s(&source),
        ]);
        assert_eq!(exit, 1);
        let finding = &doc["files"][0]["bodies"][2]["findings"][0];
        assert_eq!(finding["kind"], "inside-out");
        finding["advice"].as_str().unwrap().to_owned()
    };
    assert!(advice(3.0).contains("inside \"tank\""), "{}", advice(3.0));
    assert!(advice(15.0).contains("inside \"hall\""), "{}", advice(15.0));
    assert!(!advice(40.0).contains("inside \""), "{}", advice(40.0));
}

#[test]
fn what_was_tested_names_every_kind_that_was_found_and_no_more() {
    let folder = Folder::new();
    // Once more with the other diagonal on each side: no facet stands twice.
    let mut twice = cube([0.0; 3], [2.0; 3]);
    let other: Vec<[P; 3]> = twice
        .chunks(2)
        .flat_map(|side| {
            let d = side[1].iter().find(|p| !side[0].contains(p)).unwrap();
            let ring = ring(&side[0], d);
            [[ring[1], ring[2], ring[3]], [ring[1], ring[3], ring[0]]]
        })
        .collect();
    let tested = |facets: Vec<[P; 3]>| {
        let source = folder.put("a.obj", &obj(&[("peg", facets)]));
        let (_, doc) = json(&["check", "--json", "--unit", "m", "--no-overlap", s(&source)]);
        let file = &doc["files"][0];
        let has = |list: &Value, of: fn(&Value) -> &Value| {
            list.as_array()
                .unwrap()
                .iter()
                .any(|x| of(x) == "self-overlap")
        };
        (
            has(&file["tested"], |x| x),
            has(&file["bodies"][0]["findings"], |f| &f["kind"]),
        )
    };
    assert_eq!(tested(twice.clone()), (false, false));
    twice.extend(other);
    assert_eq!(tested(twice), (true, true));
}

/// The corners of a square in order, from three of them and the fourth.
fn ring(facet: &[P; 3], d: &P) -> [P; 4] {
    let length = |p: &P, q: &P| (0..3).map(|k| (p[k] - q[k]).powi(2)).sum::<f64>();
    let k = (0..3)
        .max_by(|&i, &j| {
            let of = |k: usize| length(&facet[k], &facet[(k + 1) % 3]);
            of(i).total_cmp(&of(j))
        })
        .unwrap();
    // The longest edge is the diagonal; the fourth corner stands between its ends.
    [facet[k], *d, facet[(k + 1) % 3], facet[(k + 2) % 3]]
}
