//! The built program over meshes that overlap, made here: what `check` finds and what `weigh
//! --filled` counts.
#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

use serde_json::Value;

type Facet = [[f32; 3]; 3];

fn block(low: [f32; 3], high: [f32; 3]) -> Vec<Facet> {
    let at = |i: usize| [0, 1, 2].map(|k| if i >> k & 1 == 0 { low[k] } else { high[k] });
    [
        [0, 2, 3, 1],
        [4, 5, 7, 6],
        [0, 1, 5, 4],
        [2, 6, 7, 3],
        [0, 4, 6, 2],
        [1, 3, 7, 5],
    ]
    .iter()
    .flat_map(|q| [[q[0], q[1], q[2]], [q[0], q[2], q[3]]])
    .map(|t| t.map(at))
    .collect()
}

/// A round tube of radius `r` about a centre line like an eight, which runs through itself at the
/// origin: one shell.
fn eight(r: f64, along: usize, around: usize) -> Vec<Facet> {
    use std::f64::consts::TAU;
    let at = |i: usize, j: usize| {
        let u = TAU * (i % along) as f64 / along as f64;
        let v = TAU * (j % around) as f64 / around as f64;
        let (x, y) = (40.0 * u.sin(), 24.0 * (2.0 * u).sin());
        let (tx, ty) = (40.0 * u.cos(), 48.0 * (2.0 * u).cos());
        let l = tx.hypot(ty);
        let (nx, ny) = (-ty / l, tx / l);
        [x + r * v.cos() * nx, y + r * v.cos() * ny, r * v.sin()].map(|c| c as f32)
    };
    (0..along)
        .flat_map(|i| {
            (0..around).flat_map(move |j| {
                let (a, b, c, d) = (at(i, j), at(i + 1, j), at(i + 1, j + 1), at(i, j + 1));
                [[a, c, b], [a, d, c]]
            })
        })
        .collect()
}

fn stl(facets: &[Facet]) -> Vec<u8> {
    let mut out = vec![b' '; 80];
    out.extend((facets.len() as u32).to_le_bytes());
    for t in facets {
        out.extend([0u8; 12]);
        for x in t.iter().flatten() {
            out.extend(x.to_le_bytes());
        }
        out.extend([0u8; 2]);
    }
    out
}

fn run(args: &[&str], facets: &[Facet]) -> (i32, Value) {
    let dir = tempfile::tempdir().unwrap();
    std::fs::write(dir.path().join("part.stl"), stl(facets)).unwrap();
    let out = assert_cmd::Command::cargo_bin("bismar")
        .unwrap()
        .current_dir(dir.path())
        .args(args)
        .args(["--json", "--unit", "m", "part.stl"])
        .output()
        .unwrap();
    let document: Value = serde_json::from_slice(&out.stdout).unwrap();
    (out.status.code().unwrap(), document["files"][0].clone())
}

#[test]
fn check_tests_overlap_unless_told_not_to() {
    let facets = [
        block([0.0; 3], [2.0; 3]),
        block([1.0, 0.5, 0.25], [3.0, 2.5, 1.0]),
    ]
    .concat();
    let (exit, file) = run(&["check"], &facets);
    assert_eq!(exit, 1);
    assert!(
        file["tested"]
            .as_array()
            .unwrap()
            .contains(&"self-overlap".into())
    );
    let f = &file["findings"][0];
    assert_eq!(
        (&f["kind"], &f["severity"]),
        (&"self-overlap".into(), &"doubts".into())
    );
    assert_eq!(f["volume_effect_is"], "estimate");
    // Shared: 1 × 1.5 × 0.75; the estimate is refined to 1e-4 of the smaller block's 3.
    let effect = f["volume_effect_m3"].as_f64().unwrap();
    assert!((effect + 1.125).abs() < 1e-3, "{effect}");
    assert_eq!(f["places"][0]["triangles"].as_array().unwrap().len(), 2);
    let (exit, file) = run(&["check", "--no-overlap"], &facets);
    assert_eq!(exit, 0);
    assert!(
        !file["tested"]
            .as_array()
            .unwrap()
            .contains(&"self-overlap".into())
    );
    assert_eq!(file["findings"], serde_json::json!([]));
}

#[test]
fn weigh_counts_a_region_once_where_told_to() {
    // Where the tube passes through itself two straight tubes cross at an angle a with
    // tan(a/2) = 40/48: for cylinders of radius r they share 16 r³ / (3 sin a), up to the bend of
    // the centre line (its curvature is zero at the crossing) and the facets.
    let r = 2.0;
    let facets = eight(r, 800, 128);
    let (exit, plain) = run(&["weigh"], &facets);
    assert_eq!((exit, &plain["overlap"]), (0, &"untested".into()));
    assert_eq!(plain["bodies"][0]["estimate"], Value::Null);
    let (exit, once) = run(&["weigh", "--filled"], &facets);
    assert_eq!((exit, &once["overlap"]), (0, &"counted-once".into()));
    let volume = |f: &Value| f["bodies"][0]["volume_m3"].as_f64().unwrap();
    let bound = once["bodies"][0]["estimate"]["volume_bound_m3"]
        .as_f64()
        .unwrap();
    let half: f64 = (40.0f64 / 48.0).atan();
    let shared = 16.0 * r.powi(3) / (3.0 * (2.0 * half).sin());
    let off = (volume(&plain) - volume(&once) - shared).abs();
    // 0.3 %: the bend within 4 units of the crossing.
    assert!(off < bound + 3e-3 * shared, "{off} {bound} {shared}");
    // A thin tube in a large box: what rays may have missed is most of the bound.
    assert!(bound < 5e-4 * volume(&once), "{bound}");
    let centre = &once["bodies"][0]["centroid_m"];
    let off = (0..3)
        .map(|k| centre[k].as_f64().unwrap().powi(2))
        .sum::<f64>()
        .sqrt();
    let bound = once["bodies"][0]["estimate"]["centre_bound_m"]
        .as_f64()
        .unwrap();
    assert!(off <= bound, "{off} {bound}");
}

#[test]
fn weigh_of_a_sound_mesh_is_the_same_when_filled() {
    let facets = block([0.0; 3], [1.0, 2.0, 3.0]);
    let (_, plain) = run(&["weigh"], &facets);
    let (exit, filled) = run(&["weigh", "--filled"], &facets);
    assert_eq!((exit, &filled["overlap"]), (0, &"none".into()));
    assert_eq!(plain["bodies"], filled["bodies"]);
}

#[test]
fn the_whole_counts_shared_space_once_too() {
    let facets = [block([0.0; 3], [2.0; 3]), block([1.0; 3], [3.0; 3])].concat();
    let (exit, file) = run(&["weigh", "--filled"], &facets);
    assert_eq!(exit, 0);
    let whole = file["whole"]["volume_m3"].as_f64().unwrap();
    let bound = file["whole"]["estimate"]["volume_bound_m3"]
        .as_f64()
        .unwrap();
    assert!(
        (whole - 15.0).abs() <= bound && bound < 1e-3,
        "{whole} {bound}"
    );
    for body in file["bodies"].as_array().unwrap() {
        assert_eq!(body["volume_m3"], 8.0);
        assert_eq!(body["estimate"], Value::Null);
    }
}

#[test]
fn balance_says_which_parts_occupy_the_same_space() {
    let folder = tempfile::tempdir().unwrap();
    let cube = std::fs::read_to_string("fixtures/cube.obj").unwrap();
    std::fs::write(folder.path().join("cube.obj"), cube).unwrap();
    // Cubes of side 10: the second, mirrored, from 5 to 15; the third touches the second.
    let text = r#"
        [assembly]
        unit = "mm"
        [material.light]
        density = "1 g/cm3"
        [material.heavy]
        density = "4 g/cm3"
        [[part]]
        name = "one"
        mesh = "cube.obj"
        material = "light"
        [[part]]
        name = "two"
        mesh = "cube.obj"
        material = "heavy"
        mirror = "x"
        at = [15, 0, 0]
        [[part]]
        name = "three"
        mesh = "cube.obj"
        material = "heavy"
        at = [15, 0, 0]
    "#;
    let file = folder.path().join("a.toml");
    std::fs::write(&file, text).unwrap();
    let out = std::process::Command::new(env!("CARGO_BIN_EXE_bismar"))
        .args(["balance", "--json"])
        .arg(&file)
        .output()
        .unwrap();
    let document: serde_json::Value = serde_json::from_slice(&out.stdout).unwrap();
    let [overlap] = &document["overlaps"].as_array().unwrap()[..] else {
        panic!("{}", document["overlaps"]);
    };
    assert_eq!(
        (&overlap["a"], &overlap["b"]),
        (&"one".into(), &"two".into())
    );
    let figure = |key: &str| overlap[key].as_f64().unwrap();
    let error = figure("volume_error_m3");
    assert!((figure("volume_m3") - 500e-9).abs() <= error && error < 1e-9);
    assert!((figure("mass_in_b_kg") / figure("mass_in_a_kg") - 4.0).abs() < 1e-12);
}
