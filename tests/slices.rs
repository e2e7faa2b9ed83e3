//! `weigh --whole --slice` and `add` from outside.
#![allow(clippy::unwrap_used, clippy::panic)]

#[path = "../benches/support/mod.rs"]
mod support;

use std::path::Path;
use std::process::{Command, Output};

use serde_json::Value;

fn bismar(folder: &Path, args: &[&str]) -> Output {
    Command::new(env!("CARGO_BIN_EXE_bismar"))
        .args(args)
        .current_dir(folder)
        .output()
        .unwrap()
}

fn json(out: &Output) -> Value {
    serde_json::from_slice(&out.stdout).unwrap_or_else(|e| panic!("{e}: {out:?}"))
}

fn holds(schema: &str, doc: &Value) {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join(format!("schemas/{schema}.schema.json"));
    let schema: Value = serde_json::from_str(&std::fs::read_to_string(path).unwrap()).unwrap();
    let validator = jsonschema::draft202012::new(&schema).unwrap();
    let faults: Vec<String> = validator.iter_errors(doc).map(|e| e.to_string()).collect();
    assert!(faults.is_empty(), "{faults:?}");
    let mut more = doc.clone();
    more["surprise"] = 1.into();
    assert!(!validator.is_valid(&more));
}

/// A ball of about 30,000 triangles.
fn ball() -> Vec<support::Triangle> {
    support::sphere(support::rings_for(30_000), 50.0, [12.5, -3.0, 80.0]).collect()
}

fn slices(folder: &Path, file: &str, n: usize) -> Vec<String> {
    (1..=n)
        .map(|k| {
            let (slice, out) = (format!("{k}/{n}"), format!("{file}.{k}.json"));
            let args = [
                "weigh", "--whole", "--slice", &slice, file, "-o", &out, "--unit", "mm",
            ];
            let done = bismar(folder, &args);
            assert!(done.status.success(), "{done:?}");
            let text = std::fs::read(folder.join(&out)).unwrap();
            assert!(text.len() < 6000);
            holds("partial", &serde_json::from_slice(&text).unwrap());
            // On standard output the same document.
            let printed = bismar(folder, &[&args[..5], &["--json", "--unit", "mm"]].concat());
            assert_eq!(printed.stdout, text);
            out
        })
        .collect()
}

fn add(folder: &Path, partials: &[String], more: &[&str]) -> (Value, i32) {
    let mut args = vec!["add", "--json"];
    args.extend(partials.iter().map(String::as_str));
    args.extend(more);
    let out = bismar(folder, &args);
    let doc = json(&out);
    let code = out.status.code().unwrap();
    assert_eq!(doc["exit"], code);
    let name = doc["schema"].as_str().unwrap().split('/').nth(1).unwrap();
    holds(name, &doc);
    (doc, code)
}

#[test]
fn slices_add_up_to_what_one_process_says_to_the_bit() {
    let folder = tempfile::tempdir().unwrap();
    let at = folder.path();
    std::fs::write(at.join("b.stl"), support::binary_stl(&ball())).unwrap();
    std::fs::write(at.join("t.stl"), support::text_stl(&ball())).unwrap();
    for file in ["b.stl", "t.stl"] {
        let whole = json(&bismar(
            at,
            &[
                "weigh",
                "--whole",
                "--json",
                file,
                "--density",
                "2700 kg/m3",
                "--about",
                "1,2,3",
            ],
        ));
        for n in [1, 2, 7, 13] {
            let mut partials = slices(at, file, n);
            partials.reverse();
            let (doc, code) = add(
                at,
                &partials,
                &["--density", "2700 kg/m3", "--about", "1,2,3"],
            );
            assert_eq!(code, 0);
            assert_eq!(doc["whole"], whole["files"][0]["whole"], "{file} {n}");
            assert_eq!(doc["proved"], "edges-cancel");
            assert_eq!(doc["triangles"], whole["files"][0]["triangles"]);
        }
        let partials = slices(at, file, 7);
        for lost in 0..7 {
            let mut some = partials.clone();
            some.remove(lost);
            let (doc, code) = add(at, &some, &[]);
            assert_eq!((code, &doc["error"]["kind"]), (2, &"slices".into()));
            some.push(some[0].clone());
            assert_eq!(add(at, &some, &[]).1, 2);
        }
        // Halves and quarters make one whole too.
        let mut mixed = slices(at, file, 2);
        mixed.truncate(1);
        let quarters: Vec<String> = slices(at, file, 4)[2..].to_vec();
        // The second slicing has written over the first half: weigh it again.
        let half = bismar(
            at,
            &[
                "weigh",
                "--whole",
                "--slice",
                "1/2",
                file,
                "-o",
                "half.json",
                "--unit",
                "mm",
            ],
        );
        assert!(half.status.success());
        mixed = [vec!["half.json".to_owned()], quarters].concat();
        let (doc, code) = add(at, &mixed, &["--density", "2700 kg/m3", "--about", "1,2,3"]);
        assert_eq!((code, &doc["whole"]), (0, &whole["files"][0]["whole"]));
    }
    let text = String::from_utf8(bismar(at, &["add", "half.json"]).stderr).unwrap();
    assert!(text.contains("in no slice"), "{text}");
}

#[test]
fn one_triangle_less_anywhere_and_nothing_is_proved() {
    let folder = tempfile::tempdir().unwrap();
    let at = folder.path();
    for lost in [0, 4095, 4096, 17_000, 29_999] {
        let mut open = ball();
        open.remove(lost);
        std::fs::write(at.join("o.stl"), support::binary_stl(&open)).unwrap();
        let (doc, code) = add(at, &slices(at, "o.stl", 7), &[]);
        assert_eq!(code, 1);
        assert!(doc["whole"].is_null() && doc["proved"].is_null(), "{doc}");
        assert_eq!(doc["warnings"][0]["kind"], "not-closed");
    }
}

#[test]
fn what_does_not_belong_together_is_refused() {
    let folder = tempfile::tempdir().unwrap();
    let at = folder.path();
    std::fs::write(at.join("a.stl"), support::binary_stl(&ball())).unwrap();
    let other: Vec<_> = support::sphere(support::rings_for(30_000), 51.0, [0.0; 3]).collect();
    std::fs::write(at.join("b.stl"), support::binary_stl(&other)).unwrap();
    let (mut a, b) = (slices(at, "a.stl", 3), slices(at, "b.stl", 3));
    a[1] = b[1].clone();
    let (doc, code) = add(at, &a, &[]);
    assert_eq!((code, &doc["error"]["kind"]), (2, &"slices".into()));
    assert!(
        doc["error"]["message"]
            .as_str()
            .unwrap()
            .contains("different files")
    );
    std::fs::write(at.join("no.json"), "{}").unwrap();
    let (doc, code) = add(at, &["no.json".into()], &[]);
    assert_eq!((code, &doc["error"]["kind"]), (2, &"unknown-format".into()));
    let (doc, code) = add(at, &["none.json".into()], &[]);
    assert_eq!((code, &doc["error"]["kind"]), (2, &"not-found".into()));
    std::fs::write(at.join("c.obj"), support::obj(&[("ball".into(), ball())])).unwrap();
    for args in [
        &["weigh", "--json", "--whole", "--slice", "1/2", "c.obj"][..],
        &["weigh", "--json", "--whole", "--slice", "3/2", "a.stl"],
        &["weigh", "--json", "--slice", "1/2", "a.stl"],
        &[
            "weigh", "--json", "--whole", "--slice", "1/2", "a.stl", "b.stl",
        ],
        &["weigh", "--json", "--whole", "--slice", "1/2", "-"],
    ] {
        let out = bismar(at, args);
        assert_eq!(
            (out.status.code(), &json(&out)["error"]["kind"]),
            (Some(2), &"usage".into()),
            "{args:?}"
        );
    }
}
