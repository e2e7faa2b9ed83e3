//! The demo data are what this code makes, byte for byte; no code of the library takes part.
//!
//! `BISMAR_WRITE_DEMO=1 cargo test --test demo` writes them anew.
#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

use std::collections::{BTreeMap, BTreeSet};
use std::path::{Path, PathBuf};

#[path = "demo/broken.rs"]
mod broken;
#[path = "demo/mesh.rs"]
mod mesh;
#[path = "demo/rover.rs"]
mod rover;
#[path = "demo/write.rs"]
mod write;

/// One file of the demo; `bodies` are those that must be closed solids.
pub(crate) struct File {
    /// Relative to `demo-data/`.
    pub(crate) path: String,
    pub(crate) bytes: Vec<u8>,
    pub(crate) bodies: Vec<mesh::Body>,
}

fn all() -> Vec<File> {
    let mut files = rover::files();
    files.extend(broken::files());
    files
}

fn root() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("demo-data")
}

fn committed(folder: &Path, found: &mut BTreeSet<PathBuf>) {
    for entry in std::fs::read_dir(folder).unwrap() {
        let path = entry.unwrap().path();
        if path.is_dir() {
            committed(&path, found);
        } else {
            found.insert(path);
        }
    }
}

#[test]
fn the_committed_files_are_what_the_code_makes() {
    let files = all();
    if std::env::var_os("BISMAR_WRITE_DEMO").is_some() {
        for file in &files {
            let path = root().join(&file.path);
            std::fs::create_dir_all(path.parent().unwrap()).unwrap();
            std::fs::write(&path, &file.bytes).unwrap();
        }
    }
    let mut found = BTreeSet::new();
    committed(&root(), &mut found);
    let made: BTreeSet<PathBuf> = files.iter().map(|f| root().join(&f.path)).collect();
    assert_eq!(
        found, made,
        "demo-data holds other files than the code makes"
    );
    for file in &files {
        let bytes = std::fs::read(root().join(&file.path)).unwrap();
        assert!(
            bytes == file.bytes,
            "{} differs: see the head of this test",
            file.path
        );
    }
    let size: usize = files.iter().map(|f| f.bytes.len()).sum();
    assert!(size <= 3_000_000, "the demo has grown to {size} bytes");
}

/// Every directed edge is met by exactly one opposite, no triangle is degenerate, and the solid
/// is on the inside.
#[test]
fn every_rover_body_is_a_closed_solid() {
    let mut names = BTreeSet::new();
    for body in rover::files().iter().flat_map(|f| &f.bodies) {
        assert!(
            names.insert(body.name.clone()),
            "two bodies are called {}",
            body.name
        );
        let mut edges: BTreeMap<(usize, usize), i32> = BTreeMap::new();
        for face in &body.faces {
            for (i, &a) in face.iter().enumerate() {
                *edges.entry((a, face[(i + 1) % face.len()])).or_default() += 1;
            }
        }
        for (&(a, b), &n) in &edges {
            assert!(
                n == 1 && edges.get(&(b, a)) == Some(&1),
                "{}: edge {:?} {:?}",
                body.name,
                body.vertex(a),
                body.vertex(b)
            );
        }
        let mut volume = 0.0;
        for [a, b, c] in body.triangles() {
            let normal = cross(sub(b, a), sub(c, a));
            volume += dot(a, normal) / 6.0;
            // A fan over a concave face has triangles that face back; they still have an area.
            assert!(
                dot(normal, normal) > 0.0,
                "{}: degenerate at {a:?}",
                body.name
            );
        }
        assert!(volume > 1000.0, "{}: {volume} mm3", body.name);
    }
    assert!(names.len() >= 12);
}

fn sub(a: [f64; 3], b: [f64; 3]) -> [f64; 3] {
    [a[0] - b[0], a[1] - b[1], a[2] - b[2]]
}

fn dot(a: [f64; 3], b: [f64; 3]) -> f64 {
    a[0] * b[0] + a[1] * b[1] + a[2] * b[2]
}

fn cross(a: [f64; 3], b: [f64; 3]) -> [f64; 3] {
    [
        a[1] * b[2] - a[2] * b[1],
        a[2] * b[0] - a[0] * b[2],
        a[0] * b[1] - a[1] * b[0],
    ]
}
