//! `survey` from outside: a made library with known faults, killed and resumed, on any number of
//! threads.
#![allow(clippy::unwrap_used, clippy::panic)]

#[path = "../benches/support/mod.rs"]
mod support;

use std::collections::BTreeMap;
use std::io::Write;
use std::path::Path;
use std::process::{Command, Output, Stdio};

use bismar::survey::{Journal, Row, read_table};
use serde_json::Value;

fn bismar(folder: &Path, args: &[&str]) -> Output {
    command(folder, args).output().unwrap()
}

fn command(folder: &Path, args: &[&str]) -> Command {
    let mut c = Command::new(env!("CARGO_BIN_EXE_bismar"));
    c.args(args).current_dir(folder);
    c
}

fn json(out: &Output) -> Value {
    let doc: Value = serde_json::from_slice(&out.stdout).unwrap_or_else(|e| panic!("{e}: {out:?}"));
    let name = doc["schema"].as_str().unwrap().split('/').nth(1).unwrap();
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join(format!("schemas/{name}.schema.json"));
    let schema: Value = serde_json::from_str(&std::fs::read_to_string(path).unwrap()).unwrap();
    let validator = jsonschema::draft202012::new(&schema).unwrap();
    let faults: Vec<String> = validator.iter_errors(&doc).map(|e| e.to_string()).collect();
    assert!(faults.is_empty(), "{faults:?}");
    assert_eq!(doc["exit"], out.status.code().unwrap());
    doc
}

#[test]
fn every_fault_of_the_library_stands_in_its_row_and_the_rest_is_sound() {
    let folder = tempfile::tempdir().unwrap();
    let at = folder.path();
    support::library(false, 170, &at.join("library")).unwrap();
    let args = [
        "survey",
        "library",
        "-o",
        "t.parquet",
        "--json",
        "--material",
        "steel S235",
        "--assign",
        "library/brackets/*=PLA",
        "--same-shape",
    ];
    let doc = json(&bismar(at, &args));
    let rows = read_table(&at.join("t.parquet")).unwrap();
    assert_eq!(
        (&doc["files"], &doc["rows"]),
        (&170.into(), &rows.len().into())
    );
    let by_name: BTreeMap<u64, &Row> = rows
        .iter()
        .map(|r| {
            let digits: String = r
                .path
                .as_ref()
                .unwrap()
                .chars()
                .filter(char::is_ascii_digit)
                .collect();
            (digits.parse().unwrap(), r)
        })
        .collect();
    for (i, row) in &by_name {
        let has = |kind: &str| row.findings.as_deref().unwrap_or_default().contains(kind);
        match support::fault_of(*i) {
            None => {
                assert_eq!(row.sound, Some(true), "{row:?}");
                assert!(row.mass_kg > Some(0.0) && row.mass_standard_kg > Some(0.0));
                let plastic = row.path.as_ref().unwrap().contains("brackets");
                assert_eq!(row.material.as_deref() == Some("PLA"), plastic);
            }
            Some(kind @ ("hole" | "crack")) => {
                assert!(
                    has(kind) && row.closed == Some(false) && row.mass_kg.is_none(),
                    "{row:?}"
                );
                assert_eq!(row.refused.as_deref(), Some("not-closed"));
            }
            Some(kind @ ("inside-out" | "duplicate")) => {
                assert!(
                    has(kind) && row.sound == Some(false) && row.volume_m3.is_some(),
                    "{row:?}"
                );
            }
            Some(kind) => {
                assert_eq!(row.error_kind.as_deref(), Some(kind), "{row:?}");
                assert!(row.error_advice.is_some() && row.sha256.is_some());
            }
        }
    }
    // Copies have one shape.
    let copy = by_name[&50];
    assert_eq!(copy.same_shape, by_name[&49].same_shape);
    assert_eq!(copy.same_shape.as_deref(), Some(&*by_name[&49].place()));
    assert!(doc["same_shape"]["groups"].as_u64() >= Some(1), "{doc}");
    assert_eq!(doc["unreadable"], 4);
    // The figures are those of `weigh`, to the bit.
    let path = by_name[&3].path.as_deref().unwrap();
    let out = bismar(at, &["weigh", "--json", path, "--material", "steel S235"]);
    let weighed: Value = serde_json::from_slice(&out.stdout).unwrap();
    let body = &weighed["files"][0]["bodies"][0];
    let row = by_name[&3];
    assert_eq!(body["mass_kg"], row.mass_kg.unwrap());
    assert_eq!(body["volume_inertia_m5"][0][1], row.inertia_xy_m5.unwrap());
    assert_eq!(body["centroid_m"][2], row.centroid_z_m.unwrap());
    assert_eq!(body["bounds_m"][1][0], row.bounds_high_x_m.unwrap());
}

#[test]
fn killed_and_resumed_or_on_other_threads_the_table_has_the_same_bytes() {
    let folder = tempfile::tempdir().unwrap();
    let at = folder.path();
    support::library(false, 200, &at.join("library")).unwrap();
    for ending in ["parquet", "csv", "ndjson"] {
        let table = |n: &str| format!("{n}.{ending}");
        for n in ["1", "2", "5"] {
            let done = bismar(at, &["survey", "library", "-o", &table(n), "--threads", n]);
            assert!(done.status.success(), "{done:?}");
        }
        let want = std::fs::read(at.join(table("1"))).unwrap();
        for n in ["2", "5"] {
            assert!(
                std::fs::read(at.join(table(n))).unwrap() == want,
                "{n} {ending}"
            );
        }
        let killed = table("killed");
        let mut child = command(at, &["survey", "library", "-o", &killed, "--threads", "2"])
            .stdout(Stdio::null())
            .stderr(Stdio::null())
            .spawn()
            .unwrap();
        let journal = Journal::beside(&at.join(&killed));
        let lines = || std::fs::read(&journal).map_or(0, |t| t.split(|b| *b == b'\n').count());
        while lines() < 25 && child.try_wait().unwrap().is_none() {
            std::thread::yield_now();
        }
        child.kill().unwrap();
        child.wait().unwrap();
        assert!(
            !at.join(&killed).exists() && lines() >= 25,
            "it was done too soon"
        );
        let doc = json(&bismar(at, &["survey", "library", "-o", &killed, "--json"]));
        let reused = doc["reused_files"].as_u64().unwrap();
        assert!((20..200).contains(&reused), "{reused}");
        assert!(std::fs::read(at.join(&killed)).unwrap() == want, "{ending}");
        assert!(!journal.exists());
        // And once more, with nothing to do.
        let doc = json(&bismar(at, &["survey", "library", "-o", &killed, "--json"]));
        assert_eq!(doc["reused_files"], 200);
        assert!(std::fs::read(at.join(&killed)).unwrap() == want);
    }
}

#[test]
fn paths_come_from_standard_input_and_mistakes_are_told() {
    let folder = tempfile::tempdir().unwrap();
    let at = folder.path();
    support::library(true, 12, &at.join("tiny")).unwrap();
    let mut child = command(at, &["survey", "-", "-o", "t.csv", "--json"])
        .stdin(Stdio::piped())
        .stdout(Stdio::piped())
        .spawn()
        .unwrap();
    child
        .stdin
        .take()
        .unwrap()
        .write_all(b"tiny/frame/part-00001.stl\nnone.stl\n\ntiny/frame/part-00000.stl\n")
        .unwrap();
    let doc = json(&child.wait_with_output().unwrap());
    assert_eq!((&doc["files"], &doc["unreadable"]), (&3.into(), &1.into()));
    let rows = read_table(&at.join("t.csv")).unwrap();
    assert_eq!(rows[1].error_kind.as_deref(), Some("not-found"));
    // In the order of the list.
    let ends = |i: usize, name: &str| rows[i].path.as_ref().unwrap().ends_with(name);
    assert!(ends(0, "00001.stl") && ends(2, "00000.stl"));
    let text = String::from_utf8(bismar(at, &["survey", "tiny", "-o", "t.csv"]).stdout).unwrap();
    assert!(
        text.contains("12 of 12 bodies are sound") && text.contains("largest"),
        "{text}"
    );
    std::fs::write(at.join("mine.csv"), "a,b\n1,2\n").unwrap();
    for (args, kind) in [
        (&["survey", "tiny", "-o", "t.txt"][..], "usage"),
        (&["survey", "tiny", "-o", "t.csv", "--assign", "x"], "usage"),
        (
            &["survey", "tiny", "-o", "t.csv", "--assign", "x=cheese"],
            "unknown-name",
        ),
        (
            &["survey", "tiny", "-o", "t.csv", "--memory", "2 hats"],
            "usage",
        ),
        (&["survey", "tiny", "-o", "no/t.csv"], "cannot-write"),
        // Somebody else's table is not written over.
        (&["survey", "tiny", "-o", "mine.csv"], "unknown-format"),
    ] {
        let doc = json(&bismar(at, &[args, &["--json"]].concat()));
        assert_eq!(
            (&doc["error"]["kind"], &doc["exit"]),
            (&kind.into(), &2.into()),
            "{args:?}"
        );
    }
    assert_eq!(std::fs::read(at.join("mine.csv")).unwrap(), b"a,b\n1,2\n");
    std::fs::create_dir(at.join("hollow")).unwrap();
    let doc = json(&bismar(at, &["survey", "hollow", "-o", "h.csv", "--json"]));
    assert_eq!(doc["error"]["kind"], "empty");
}

/// Reading the same bytes and parsing them alone, on as many threads, beside the whole command.
#[test]
#[ignore = "measures: run it with --release on an idle machine"]
fn a_survey_costs_at_most_three_times_reading_and_parsing() {
    use rayon::prelude::*;
    let folder = tempfile::tempdir().unwrap();
    let at = folder.path();
    support::library(false, 2000, &at.join("library")).unwrap();
    let files = bismar::survey::files(&[at.join("library")]).unwrap();
    let best = |run: &dyn Fn()| {
        let time = || {
            let begin = std::time::Instant::now();
            run();
            begin.elapsed().as_secs_f64()
        };
        (0..5).map(|_| time()).fold(f64::INFINITY, f64::min)
    };
    let parse = best(&|| {
        files.par_iter().with_max_len(1).for_each(|(path, _)| {
            let bytes = bismar::format::Bytes::Owned(std::fs::read(path).unwrap());
            let soup = bismar::format::read(bytes, path, None);
            std::hint::black_box(soup.is_ok());
        });
    });
    let survey = best(&|| {
        let _ = std::fs::remove_file(at.join("t.parquet"));
        assert!(
            bismar(at, &["survey", "library", "-o", "t.parquet"])
                .status
                .success()
        );
    });
    println!(
        "parse {parse:.3} s, survey {survey:.3} s, {:.2} times",
        survey / parse
    );
    assert!(survey < 3.0 * parse, "{survey} {parse}");
}
