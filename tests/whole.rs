//! `weigh --whole` from outside, beside the exact path.
#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

use std::path::{Path, PathBuf};
use std::process::{Command, Output, Stdio};

use serde_json::Value;

fn fixtures() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("fixtures")
}

fn bismar(args: &[&str]) -> Output {
    Command::new(env!("CARGO_BIN_EXE_bismar"))
        .args(args)
        .current_dir(fixtures())
        .output()
        .unwrap()
}

fn json(out: &Output) -> Value {
    serde_json::from_slice(&out.stdout).unwrap_or_else(|e| panic!("{e}: {out:?}"))
}

/// Every readable fixture.
fn meshes() -> Vec<String> {
    let mut out: Vec<String> = std::fs::read_dir(fixtures())
        .unwrap()
        .map(|e| e.unwrap().file_name().into_string().unwrap())
        .filter(|n| n.ends_with(".stl") || n.ends_with(".obj"))
        .collect();
    out.sort();
    assert!(out.len() > 40);
    out
}

/// What only the exact path knows.
fn without_condition(figures: &Value) -> Value {
    let mut figures = figures.clone();
    figures["condition"] = Value::Null;
    figures
}

#[test]
fn both_paths_agree_on_every_fixture() {
    let (mut alike, mut open) = (0, 0);
    for name in meshes() {
        let exact = json(&bismar(&["weigh", "--json", &name]));
        let out = bismar(&["weigh", "--whole", "--json", &name]);
        let doc = json(&out);
        let (exact, file) = (&exact["files"][0], &doc["files"][0]);
        assert_eq!(doc["schema"], "bismar/weigh/1");
        assert_eq!(file["bodies"], Value::Null, "{name}");
        assert_eq!(file["triangles"], exact["triangles"], "{name}");
        assert_eq!(file["unit_assumed"], true, "{name}");
        let bodies = exact["bodies"].as_array().unwrap();
        let refused = |kind: &str| bodies.iter().any(|b| b["refused"]["kind"] == kind);
        let closed = bodies.iter().all(|b| b["closed"] == true);
        // A facet that stands twice, facing one way, is dropped by the exact path alone.
        let dropped = name == "duplicate-one-facet-doubled.stl";
        let proved = file["proved"] == "edges-cancel";
        assert_eq!(proved, closed && !dropped, "{name}");
        let warned = |kind: &str| {
            let all = doc["warnings"].as_array().unwrap();
            all.iter().any(|w| w["kind"] == kind)
        };
        if file["whole"].is_null() {
            open += 1;
            assert_eq!(out.status.code(), Some(1), "{name}");
            assert!(
                warned(if proved { "degenerate" } else { "not-closed" }),
                "{name}"
            );
            if proved {
                assert!(bodies.is_empty() || refused("degenerate"), "{name}");
            }
            continue;
        }
        assert!(proved && out.status.code() == Some(0), "{name}");
        assert!(file["whole"]["condition"].is_null());
        assert_eq!(warned("inside-out"), file["turned"] == true, "{name}");
        if let [body] = &bodies[..]
            && body["refused"].is_null()
            && body["nested"].is_null()
            && body["findings"]
                .as_array()
                .unwrap()
                .iter()
                .all(|f| f["kind"] == "inside-out")
            && body["triangles"] == file["triangles"]
        {
            alike += 1;
            assert_eq!(body["turned"], file["turned"], "{name}");
            // The same bits: JSON carries them.
            assert_eq!(
                *file.get("whole").unwrap(),
                without_condition(&exact["whole"]),
                "{name}"
            );
        }
    }
    assert!(alike >= 20 && open >= 5, "{alike} {open}");
}

#[test]
fn what_cancels_without_being_right_is_weighed_and_the_sheet_says_what_was_not_looked_at() {
    // By contract: a mesh that is written twice cancels, and has twice the volume.
    let out = bismar(&["weigh", "--whole", "duplicate-mesh-written-twice.stl"]);
    let text = String::from_utf8(out.stdout).unwrap();
    assert!(out.status.success() && text.contains("2.00000"), "{text}");
    for word in ["proved", "written twice", "inside out", "solids in solids"] {
        assert!(text.contains(word), "{word}: {text}");
    }
    let out = bismar(&[
        "weigh",
        "--whole",
        "--material",
        "steel S235",
        "inside-out.stl",
    ]);
    let text = String::from_utf8(out.stdout).unwrap();
    assert!(
        text.contains("turned") && text.contains("verify by weighing"),
        "{text}"
    );
}

#[test]
fn masses_and_another_point_are_given_as_by_the_exact_path() {
    let options = [
        "--density",
        "2700 kg/m3",
        "--about",
        "1,2,3",
        "--unit",
        "cm",
    ];
    let run = |whole: bool| {
        let mut args = vec!["weigh", "--json", "cube-binary.stl"];
        args.extend(options);
        args.extend(whole.then_some("--whole"));
        json(&bismar(&args))["files"][0]["whole"].clone()
    };
    assert!(run(true)["about"]["inertia_kg_m2"].is_array());
    assert_eq!(run(true), without_condition(&run(false)));
}

fn piped(name: &str, args: &[&str], keep: impl Fn(Vec<u8>) -> Vec<u8>) -> Output {
    use std::io::Write;
    let bytes = keep(std::fs::read(fixtures().join(name)).unwrap());
    let mut child = Command::new(env!("CARGO_BIN_EXE_bismar"))
        .args(["weigh", "--whole", "--json", "-"])
        .args(args)
        .stdin(Stdio::piped())
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()
        .unwrap();
    let mut to = child.stdin.take().unwrap();
    // The program may have seen enough before the end.
    let _ = to.write_all(&bytes);
    drop(to);
    child.wait_with_output().unwrap()
}

#[test]
fn standard_input_gives_what_the_file_gives() {
    for name in meshes() {
        let file = json(&bismar(&["weigh", "--whole", "--json", "--hash", &name]));
        let pipe = json(&piped(&name, &["--hash"], |b| b));
        for key in ["whole", "proved", "triangles", "format", "turned"] {
            assert_eq!(
                file["files"][0].get(key),
                pipe["files"][0].get(key),
                "{name}: {key}"
            );
        }
        assert_eq!(pipe["inputs"][0]["path"], "-");
        for key in ["bytes", "sha256"] {
            assert_eq!(
                file["inputs"][0][key], pipe["inputs"][0][key],
                "{name}: {key}"
            );
        }
    }
}

#[test]
fn a_stream_that_ends_early_or_goes_on_is_refused() {
    let cut = piped("cube-binary.stl", &[], |b| b[..b.len() - 7].to_vec());
    assert_eq!(cut.status.code(), Some(2));
    assert_eq!(json(&cut)["error"]["kind"], "truncated");
    let more = piped("cube-binary.stl", &[], |b| [b, vec![0; 3]].concat());
    assert_eq!(more.status.code(), Some(2));
    assert_eq!(json(&more)["error"]["kind"], "count-mismatch");
    assert_eq!(json(&more)["error"]["path"], "-");
    let none = piped("cube-binary.stl", &[], |_| Vec::new());
    assert_eq!(json(&none)["error"]["kind"], "empty");
}

#[test]
fn every_number_of_threads_prints_the_same_bytes() {
    for name in ["thin-hollow-sphere.obj", "cube-binary.stl"] {
        let run = |n| bismar(&["weigh", "--whole", "--json", "--threads", n, name]).stdout;
        let one = run("1");
        for n in ["2", "3", "7"] {
            assert_eq!(run(n), one, "{name} on {n}");
        }
    }
}

#[test]
fn a_body_cannot_be_picked_from_the_whole() {
    let out = bismar(&["weigh", "--whole", "--json", "cube.obj#a"]);
    assert_eq!(out.status.code(), Some(2));
    assert_eq!(json(&out)["error"]["kind"], "usage");
    let out = bismar(&["weigh", "--whole", "--nested", "sum", "cube.obj"]);
    assert_eq!(out.status.code(), Some(2));
}

#[test]
fn a_file_that_cannot_be_read_does_not_keep_the_others_from_their_answers() {
    let out = bismar(&[
        "weigh",
        "--whole",
        "--json",
        "no-such.stl",
        "cube-binary.stl",
    ]);
    let doc = json(&out);
    assert_eq!(out.status.code(), Some(2));
    assert_eq!(doc["files"][0]["error"]["kind"], "not-found");
    assert!(doc["files"][0]["proved"].is_null() && doc["files"][0]["bodies"].is_null());
    assert_eq!(doc["files"][1]["proved"], "edges-cancel");
}
