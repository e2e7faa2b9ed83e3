//! The built program over every file of `fixtures/`, against figures written by scripts that share
//! no code with it (`tests/outside/`). Its JSON is read by structs that refuse unknown and missing
//! fields.
#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

#[path = "fixtures/balancing.rs"]
mod balancing;
#[path = "fixtures/expected.rs"]
mod expected;
#[path = "fixtures/json.rs"]
mod json;
#[path = "fixtures/weighing.rs"]
mod weighing;

use expected::{Entry, Expected, Faults, Fixtures, bismar, repository};
use json::{Balance, Check, ErrorDocument, Fault, Finding, Warning, Weigh, strictly};
use weighing::volume_holds;

fn entries() -> Vec<Entry> {
    let text = std::fs::read_to_string(repository().join("fixtures/expected.json")).unwrap();
    serde_json::from_str::<Fixtures>(&text).unwrap().fixtures
}

fn assumed(warnings: &[Warning]) -> bool {
    warnings.iter().any(|w| w.kind == "unit-assumed")
}

#[test]
fn check_says_what_is_wrong_with_each_fixture() {
    let mut faults = Faults::default();
    for entry in entries().iter().filter(|e| e.error.is_none()) {
        let path = &entry.path;
        let out = bismar("fixtures", &["check", "--json", path]);
        let Some(doc) = faults.read::<Check>(path, strictly(&out.stdout)) else {
            continue;
        };
        let exit = out.status.code();
        faults.expect(doc.schema == "bismar/check/1", || {
            format!("{path}: {}", doc.schema)
        });
        faults.expect(
            exit == Some(entry.check_exit) && exit == Some(doc.exit),
            || {
                format!(
                    "{path}: check exits {exit:?} and says {}, not {}",
                    doc.exit, entry.check_exit
                )
            },
        );
        faults.expect(assumed(&doc.warnings), || {
            format!("{path}: no warning of the unit")
        });
        faults.expect(
            doc.inputs.len() == 1 && doc.inputs[0].sha256.is_none(),
            || format!("{path}: inputs {:?}", doc.inputs),
        );
        let [file] = doc.files.as_slice() else {
            faults.expect(false, || format!("{path}: {} files", doc.files.len()));
            continue;
        };
        faults.expect(
            file.path == *path
                && file.format.as_deref() == Some(&entry.format)
                && file.triangles == Some(entry.triangles)
                && file.unit.as_deref() == Some("mm")
                && file.unit_assumed == Some(true)
                && file.error.is_none(),
            || format!("{path}: file {file:?}"),
        );
        let found: Vec<&Finding> = file
            .findings
            .iter()
            .chain(file.bodies.iter().flat_map(|b| &b.findings))
            .collect();
        let sound = found.iter().all(|f| f.severity == "notes");
        faults.expect(
            file.sound == Some(sound) && sound == (entry.check_exit == 0),
            || format!("{path}: sound {:?} with {:?}", file.sound, kinds(&found)),
        );
        for kind in TESTED {
            faults.expect(file.tested.iter().any(|t| t == kind), || {
                format!("{path}: {kind} is not tested: {:?}", file.tested)
            });
        }
        findings(&mut faults, entry, &file.tested, &found);
        if let Some(bodies) = &entry.bodies {
            let ids: Vec<_> = file.bodies.iter().map(|b| b.id.as_str()).collect();
            let wanted: Vec<_> = bodies.iter().map(|b| b.id.as_str()).collect();
            faults.expect(ids == wanted, || {
                format!("{path}: bodies {ids:?}, not {wanted:?}")
            });
            for (got, body) in file.bodies.iter().zip(bodies) {
                faults.expect(
                    got.name == body.name
                        && body.triangles.is_none_or(|n| n == got.triangles)
                        && body.shells.is_none_or(|n| n == got.shells)
                        && body.voids.is_none_or(|n| n == got.voids)
                        && got.closed == body.closed
                        && got.sound == body.sound
                        && body.turned.is_none_or(|t| t == got.turned),
                    || format!("{path}: check's body {got:?}"),
                );
                if let Some(f) = &body.figures {
                    let volume = got.volume_m3.unwrap_or(f64::NAN);
                    faults.expect(volume_holds(volume, f), || {
                        format!("{path}: check says {volume} m3, not {} mm3", f.volume_mm3)
                    });
                }
            }
        }
    }
    faults.end();
}

fn kinds(found: &[&Finding]) -> Vec<(String, String, u64)> {
    found
        .iter()
        .map(|f| (f.kind.clone(), f.severity.clone(), f.count))
        .collect()
}

/// What every check looks for, at the least.
const TESTED: [&str; 14] = [
    "hole",
    "crack",
    "t-junction",
    "non-manifold-edge",
    "non-manifold-vertex",
    "unit-suspect",
    "tiny-shell",
    "winding-conflict",
    "inside-out",
    "degenerate",
    "duplicate",
    "nested-solid",
    "name-split",
    "warped-polygon",
];

/// Every expected finding is there, and no other beyond those that may be. What a check does not
/// look for, by its own word, is not missed; the exit code and the refusal hold all the same.
fn findings(faults: &mut Faults, entry: &Entry, tested: &[String], found: &[&Finding]) {
    let path = &entry.path;
    for want in entry.findings.iter().filter(|w| tested.contains(&w.kind)) {
        let there = found.iter().any(|f| {
            f.kind == want.kind
                && f.severity == want.severity
                && want.count.is_none_or(|n| n == f.count)
        });
        faults.expect(there, || {
            format!(
                "{path}: no {} ({}, {:?}) in {:?}",
                want.kind,
                want.severity,
                want.count,
                kinds(found)
            )
        });
    }
    for f in found {
        let known = entry.findings.iter().any(|w| w.kind == f.kind);
        faults.expect(known || entry.may_find.contains(&f.kind), || {
            format!(
                "{path}: false alarm {} ({}, {})",
                f.kind, f.severity, f.count
            )
        });
        faults.expect(
            !f.advice.is_empty() && f.places.len() as u64 == f.places_shown && f.count > 0,
            || format!("{path}: {f:?}"),
        );
        let is = f.volume_effect_is.as_deref();
        faults.expect(
            is.is_some() == f.volume_effect_m3.is_some()
                && is.is_none_or(|w| ["exact", "bound", "estimate"].contains(&w)),
            || {
                format!(
                    "{path}: {} has effect {:?} {is:?}",
                    f.kind, f.volume_effect_m3
                )
            },
        );
    }
}

/// The errors of a run: where nothing could be answered, or beside the file.
fn errors(faults: &mut Faults, path: &str, command: &str, bytes: &[u8]) -> Vec<Fault> {
    if let Ok(doc) = strictly::<ErrorDocument>(bytes) {
        faults.expect(doc.schema == "bismar/error/1" && doc.exit == 2, || {
            format!("{path}: {} exit {}", doc.schema, doc.exit)
        });
        return std::iter::once(doc.error).chain(doc.more).collect();
    }
    match command {
        "check" => faults
            .read::<Check>(path, strictly(bytes))
            .map(|d| d.files.into_iter().filter_map(|f| f.error).collect()),
        "weigh" => faults
            .read::<Weigh>(path, strictly(bytes))
            .map(|d| d.files.into_iter().filter_map(|f| f.error).collect()),
        // A part that cannot be weighed: the rest is listed, and the total withheld.
        _ => faults.read::<Balance>(path, strictly(bytes)).map(|d| {
            faults.expect(d.total.is_none() && d.limits.is_empty(), || {
                format!("{path}: a total in spite of an error")
            });
            d.error.into_iter().chain(d.more).collect()
        }),
    }
    .unwrap_or_default()
}

fn matches(error: &Fault, want: &Expected) -> bool {
    want.kinds.as_ref().is_none_or(|k| k.contains(&error.kind))
        && want
            .line
            .is_none_or(|[a, b]| error.line.is_some_and(|at| (a..=b).contains(&at)))
        && want
            .byte
            .is_none_or(|[a, b]| error.byte.is_some_and(|at| (a..=b).contains(&at)))
        && !error.advice.is_empty()
        && !error.message.is_empty()
}

#[test]
fn unreadable_files_are_refused_with_kind_and_place() {
    let mut faults = Faults::default();
    for entry in &entries() {
        let Some(want) = &entry.error else { continue };
        let path = &entry.path;
        for (command, exit) in [("check", entry.check_exit), ("weigh", entry.weigh_exit)] {
            let out = bismar("fixtures", &[command, "--json", path]);
            faults.expect(out.status.code() == Some(exit), || {
                format!(
                    "{path}: {command} exits {:?}, not {exit}",
                    out.status.code()
                )
            });
            let found = errors(&mut faults, path, command, &out.stdout);
            faults.expect(
                found
                    .iter()
                    .any(|e| matches(e, want) && e.path.as_deref() == Some(path)),
                || {
                    format!(
                        "{path}: {command} says {found:?}, not {:?} line {:?} byte {:?}",
                        want.kinds, want.line, want.byte
                    )
                },
            );
        }
    }
    faults.end();
}

#[test]
fn a_bad_file_does_not_take_the_others_answers() {
    let mut faults = Faults::default();
    let paths = ["cube-ascii.stl", "invalid/nan.obj", "cube.obj"];
    let out = bismar(
        "fixtures",
        &["weigh", "--json", paths[0], paths[1], paths[2]],
    );
    faults.expect(out.status.code() == Some(2), || {
        format!("exit {:?}", out.status.code())
    });
    if let Some(doc) = faults.read::<Weigh>("three files", strictly(&out.stdout)) {
        let got: Vec<_> = doc
            .files
            .iter()
            .map(|f| (f.path.as_str(), f.error.is_some()))
            .collect();
        faults.expect(got == paths.map(|p| (p, p == paths[1])), || {
            format!("{got:?}")
        });
        let volumes: Vec<_> = doc
            .files
            .iter()
            .flat_map(|f| &f.bodies)
            .filter_map(|b| b.volume_m3)
            .collect();
        faults.expect(
            volumes.len() == 2 && volumes.iter().all(|v| (v - 1e-6).abs() < 1e-19),
            || format!("{volumes:?}"),
        );
    }
    faults.end();
}

#[test]
fn names_cannot_drive_the_terminal() {
    for command in ["check", "weigh"] {
        let out = bismar("fixtures", &[command, "name-escape-sequence.obj"]);
        assert_eq!(out.status.code(), Some(0));
        let text = [out.stdout, out.stderr].concat();
        assert!(
            !text.contains(&0x1b),
            "{command}: {}",
            String::from_utf8_lossy(&text)
        );
    }
}

#[test]
fn one_and_two_threads_give_the_same_bytes() {
    let folder = "demo-data/rover";
    for command in ["check", "weigh"] {
        let run = |n: &str| bismar(folder, &[command, "--json", "--threads", n, "."]).stdout;
        let one = run("1");
        assert!(one.len() > 1000);
        assert_eq!(one, run("2"), "{command}");
    }
}
