//! The same bytes on any number of threads. (The sheet for people repeats the options it was run
//! with at its foot, the number of threads among them; that number is blotted out.)
#![allow(clippy::unwrap_used, clippy::panic)]

#[path = "support/program.rs"]
mod program;
#[path = "support/solids.rs"]
mod solids;

use program::{bismar, files};

fn same_on_any_threads(arguments: &[&str]) {
    let on = |n: &str| {
        let mut all = arguments.to_vec();
        all.extend(["--threads", n]);
        let out = bismar(&all);
        assert!(
            !out.stdout.is_empty(),
            "{arguments:?}: {:?}",
            String::from_utf8_lossy(&out.stderr)
        );
        let text = String::from_utf8(out.stdout).unwrap();
        let text = text.replace(&format!("--threads {n}"), "--threads N");
        (out.status.code(), text, out.stderr)
    };
    let one = on("1");
    for n in ["2", "3", "7"] {
        assert!(on(n) == one, "{arguments:?} differs on {n} threads");
    }
}

#[test]
fn every_command_on_the_demo_and_the_fixtures() {
    let mut meshes = files("demo-data", &["stl", "obj"], true);
    meshes.extend(files("fixtures", &["stl", "obj"], true));
    assert!(meshes.len() > 50, "{meshes:?}");
    let all: Vec<&str> = meshes.iter().map(String::as_str).collect();
    for command in [
        vec!["check"],
        vec!["weigh", "--density", "7850 kg/m3", "--nested", "sum"],
    ] {
        let mut arguments = command;
        arguments.extend(&all);
        for form in ["--json", "--csv", "-q"] {
            let mut shown = arguments.clone();
            shown.push(form);
            same_on_any_threads(&shown);
        }
    }
    same_on_any_threads(&["materials", "steel", "--json"]);
    let assemblies = files("demo-data", &["toml"], true);
    assert!(!assemblies.is_empty());
    same_on_any_threads(&["balance", &assemblies[0], "--json", "--samples", "3000"]);
    for file in assemblies
        .iter()
        .chain(&files("fixtures/assemblies", &["toml"], false))
    {
        same_on_any_threads(&["balance", file, "--json"]);
    }
}

/// Enough facets for many chunks and blocks, in several bodies: here the threads have something
/// to be out of step with.
#[test]
fn a_large_mesh_of_many_bodies() {
    let mut t = Vec::new();
    for i in 0..6 {
        let at = [3.0 * f64::from(i), 0.1, -0.2];
        let sphere = solids::mapped(&solids::icosphere(5), |p| [p[0], 0.9 * p[1], 1.1 * p[2]]);
        t.extend(solids::moved(&sphere, at));
        t.extend(solids::reversed(&solids::moved(
            &solids::uv_sphere(0.4, 90),
            at,
        )));
    }
    let mut bytes = vec![b' '; 80];
    bytes.extend((t.len() as u32).to_le_bytes());
    for f in &t {
        bytes.extend([0u8; 12]);
        f.iter()
            .flatten()
            .for_each(|x| bytes.extend((*x as f32).to_le_bytes()));
        bytes.extend([0u8; 2]);
    }
    assert!(t.len() > 100_000);
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("many.stl");
    std::fs::write(&path, bytes).unwrap();
    let path = path.to_str().unwrap();
    for command in ["check", "weigh"] {
        same_on_any_threads(&[command, path, "--json"]);
    }
    let (doc, exit) = program::json(&["weigh", path, "--json"]);
    assert_eq!(exit, 0);
    assert_eq!(doc["files"][0]["bodies"].as_array().unwrap().len(), 6);
    assert!(
        doc["files"][0]["bodies"]
            .as_array()
            .unwrap()
            .iter()
            .all(|b| b["voids"] == 1)
    );
}
