//! 3MF, PLY, OFF, glTF and packed files through the whole command. Every file is made here.
#![allow(clippy::unwrap_used, clippy::panic)]

use std::io::Write;
use std::path::{Path, PathBuf};
use std::process::{Command, Output};

use serde_json::{Value, json};

/// A corner tetrahedron with legs 5, 4 and 3: volume 10.
const POINTS: [[f64; 3]; 4] = [[0., 0., 0.], [5., 0., 0.], [0., 4., 0.], [0., 0., 3.]];
const FACES: [[u32; 3]; 4] = [[0, 2, 1], [0, 1, 3], [1, 2, 3], [0, 3, 2]];

fn bismar(arguments: &[&str]) -> Output {
    Command::new(env!("CARGO_BIN_EXE_bismar"))
        .args(arguments)
        .env("NO_COLOR", "1")
        .output()
        .unwrap()
}

/// Exit code and JSON.
fn answer(arguments: &[&str]) -> (i32, Value) {
    let out = bismar(arguments);
    let text = String::from_utf8(out.stdout).unwrap();
    let json = serde_json::from_str(&text).unwrap_or_else(|e| panic!("{e} in {text}"));
    (out.status.code().unwrap(), json)
}

fn kinds(document: &Value) -> Vec<String> {
    let all = document["warnings"].as_array().unwrap();
    all.iter()
        .map(|w| w["kind"].as_str().unwrap().to_owned())
        .collect()
}

fn ply() -> Vec<u8> {
    let mut out = b"ply\nformat binary_big_endian 1.0\nelement vertex 4\nproperty double x\nproperty double y\nproperty double z\nelement face 4\nproperty list uchar uint vertex_indices\nend_header\n".to_vec();
    for x in POINTS.iter().flatten() {
        out.extend(x.to_be_bytes());
    }
    for f in FACES {
        out.push(3);
        f.iter().for_each(|i| out.extend(i.to_be_bytes()));
    }
    out
}

fn off() -> Vec<u8> {
    let mut out = "OFF\n4 4 0\n".to_owned();
    POINTS
        .iter()
        .for_each(|[x, y, z]| out += &format!("{x} {y} {z}\n"));
    FACES
        .iter()
        .for_each(|[a, b, c]| out += &format!("3 {a} {b} {c}\n"));
    out.into_bytes()
}

/// Text and the buffer beside it.
fn gltf() -> (Vec<u8>, Vec<u8>) {
    let mut bytes: Vec<u8> = POINTS
        .iter()
        .flatten()
        .flat_map(|x| (*x as f32).to_le_bytes())
        .collect();
    bytes.extend(FACES.iter().flatten().flat_map(|i| i.to_le_bytes()));
    let scene = json!({
        "asset": {"version": "2.0"},
        "scenes": [{"nodes": [0, 1]}],
        "nodes": [{"mesh": 0, "name": "wheel"}, {"mesh": 0, "name": "wheel", "translation": [10, 0, 0]}],
        "meshes": [{"primitives": [{"attributes": {"POSITION": 0}, "indices": 1, "material": 0}]}],
        "materials": [{"name": "rubber"}],
        "accessors": [
            {"bufferView": 0, "componentType": 5126, "count": 4, "type": "VEC3"},
            {"bufferView": 1, "componentType": 5125, "count": 12, "type": "SCALAR"}
        ],
        "bufferViews": [
            {"buffer": 0, "byteLength": 48},
            {"buffer": 0, "byteOffset": 48, "byteLength": 48}
        ],
        "buffers": [{"byteLength": 96, "uri": "wheel.bin"}]
    });
    (scene.to_string().into_bytes(), bytes)
}

fn packed(bytes: &[u8]) -> Vec<u8> {
    let mut out = flate2::write::GzEncoder::new(Vec::new(), flate2::Compression::best());
    out.write_all(bytes).unwrap();
    out.finish().unwrap()
}

fn put(folder: &Path, name: &str, bytes: &[u8]) -> String {
    let path = folder.join(name);
    std::fs::write(&path, bytes).unwrap();
    path.to_str().unwrap().to_owned()
}

/// All of them in one folder.
fn folder() -> (tempfile::TempDir, PathBuf) {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().to_path_buf();
    put(&path, "a.ply", &ply());
    put(&path, "b.off", &off());
    let (text, buffer) = gltf();
    put(&path, "c.gltf", &text);
    put(&path, "wheel.bin", &buffer);
    put(&path, "d.off.gz", &packed(&off()));
    put(&path, "e.txt", b"notes");
    (folder, path)
}

#[test]
fn a_folder_of_all_formats() {
    let (_keep, path) = folder();
    let (exit, json) = answer(&["weigh", "--json", "--hash", path.to_str().unwrap()]);
    assert_eq!(exit, 0);
    let files = json["files"].as_array().unwrap();
    let told: Vec<(&str, &str, bool, f64, &str)> = files
        .iter()
        .map(|f| {
            let body = &f["bodies"][0];
            (
                f["format"].as_str().unwrap(),
                f["unit"].as_str().unwrap(),
                f["unit_assumed"].as_bool().unwrap(),
                body["volume_m3"].as_f64().unwrap(),
                body["id"].as_str().unwrap(),
            )
        })
        .collect();
    // Exact: small whole numbers, and 1e-3 is one f64.
    let mm = 10.0 * 1e-3f64.powi(3);
    assert_eq!(
        told,
        [
            ("ply", "mm", true, mm, "a"),
            ("off", "mm", true, mm, "b"),
            ("gltf", "m", false, 10.0, "wheel"),
            ("off", "mm", true, mm, "d"),
        ]
    );
    assert_eq!(files[2]["bodies"][1]["id"], "wheel/2");
    assert_eq!(files[2]["bodies"][1]["name"], "wheel");
    // The buffer beside the scene is an input too, with its hash.
    let inputs: Vec<_> = json["inputs"].as_array().unwrap().iter().collect();
    let buffer = inputs
        .iter()
        .find(|i| i["path"].as_str().unwrap().ends_with("wheel.bin"));
    assert_eq!(buffer.unwrap()["bytes"], 96);
    assert_eq!(buffer.unwrap()["sha256"].as_str().unwrap().len(), 64);
    std::fs::remove_file(path.join("wheel.bin")).unwrap();
    let (exit, json) = answer(&["check", "--json", path.to_str().unwrap()]);
    assert_eq!(exit, 2);
    assert_eq!(json["files"][2]["error"]["kind"], "not-found");
    assert_eq!(json["files"][3]["sound"], true);
}

#[test]
fn the_persons_unit_wins_and_is_said() {
    let (_keep, path) = folder();
    let scene = path.join("c.gltf");
    let scene = scene.to_str().unwrap();
    let (_, json) = answer(&["weigh", "--json", "--unit", "in", scene]);
    let file = &json["files"][0];
    assert_eq!(
        (&file["unit"], &file["unit_assumed"]),
        (&json!("in"), &json!(false))
    );
    assert_eq!(kinds(&json), ["unit-overridden"]);
    let volume = file["bodies"][0]["volume_m3"].as_f64().unwrap();
    assert!((volume / (10.0 * 0.0254f64.powi(3)) - 1.0).abs() < 1e-15);
    let (_, json) = answer(&["weigh", "--json", "--unit", "m", scene]);
    assert!(kinds(&json).is_empty());
}

#[test]
fn standard_input_and_hints() {
    let piped = |bytes: &[u8], arguments: &[&str]| -> Value {
        let mut child = Command::new(env!("CARGO_BIN_EXE_bismar"))
            .args(arguments)
            .stdin(std::process::Stdio::piped())
            .stdout(std::process::Stdio::piped())
            .spawn()
            .unwrap();
        child.stdin.take().unwrap().write_all(bytes).unwrap();
        serde_json::from_slice(&child.wait_with_output().unwrap().stdout).unwrap()
    };
    let json = piped(&packed(&ply()), &["weigh", "--json", "-"]);
    assert_eq!(json["files"][0]["format"], "ply");
    assert_eq!(json["files"][0]["bodies"][0]["id"], "body");
    let bare = &off()[4..];
    assert_eq!(
        piped(bare, &["weigh", "--json", "-"])["error"]["kind"],
        "unknown-format"
    );
    let json = piped(bare, &["weigh", "--json", "--format", "off", "-"]);
    assert_eq!(
        json["files"][0]["bodies"][0]["volume_m3"],
        10.0 * 1e-3f64.powi(3)
    );
    let json = piped(&gltf().0, &["weigh", "--json", "-"]);
    assert_eq!(json["error"]["kind"], "not-found");
    // Without bodies: what does not stream is said.
    let json = piped(&packed(&off()), &["weigh", "--json", "--whole", "-"]);
    assert_eq!(json["files"][0]["proved"], "edges-cancel");
    assert_eq!(kinds(&json), ["unit-assumed", "not-streamed"]);
    let json = piped(&ply(), &["weigh", "--json", "--whole", "--unit", "mm", "-"]);
    assert_eq!(kinds(&json), ["not-streamed"]);
}

#[test]
fn copies_keep_names_units_and_materials() {
    let (_keep, path) = folder();
    let scene = path.join("c.gltf");
    let scene = scene.to_str().unwrap();
    let out = |name: &str| path.join(name).to_str().unwrap().to_owned();
    let (exit, json) = answer(&["check", "--json", "--write", &out("o.3mf"), scene]);
    assert_eq!((exit, kinds(&json)), (0, Vec::new()));
    let copied = &json["files"][0]["copied"];
    assert_eq!(
        (&copied["format"], &copied["written"]),
        (&json!("3mf"), &json!(true))
    );
    let (_, before) = answer(&["weigh", "--json", scene]);
    let (exit, after) = answer(&["weigh", "--json", &out("o.3mf")]);
    assert_eq!(exit, 0);
    let (a, b) = (&before["files"][0], &after["files"][0]);
    assert_eq!(
        (&b["unit"], &b["unit_assumed"]),
        (&json!("m"), &json!(false))
    );
    for (x, y) in a["bodies"]
        .as_array()
        .unwrap()
        .iter()
        .zip(b["bodies"].as_array().unwrap())
    {
        for key in ["id", "name", "volume_m3", "area_m2", "centroid_m"] {
            assert_eq!(x[key], y[key], "{key}");
        }
    }
    // An OBJ keeps names and not the unit, and says so.
    let (exit, json) = answer(&["check", "--json", "--write", &out("o.obj"), scene]);
    assert_eq!((exit, kinds(&json)), (0, vec!["unit-dropped".to_owned()]));
    let text = std::fs::read_to_string(out("o.obj")).unwrap();
    assert!(
        text.contains("# lengths in m\n") && text.contains("usemtl rubber"),
        "{text}"
    );
    let (_, json) = answer(&["weigh", "--json", "--unit", "m", &out("o.obj")]);
    assert_eq!(json["files"][0]["bodies"][1]["id"], "wheel/2");
    // A mesh that is turned inside out is mended into a 3MF.
    let inside_out = String::from_utf8(off())
        .unwrap()
        .replace("3 0 2 1", "3 1 2 0");
    let inside_out = inside_out
        .replace("3 0 1 3", "3 3 1 0")
        .replace("3 1 2 3", "3 3 2 1");
    let inside_out = inside_out.replace("3 0 3 2", "3 2 3 0");
    let bad = put(&path, "bad.off", inside_out.as_bytes());
    let (exit, json) = answer(&[
        "check",
        "--json",
        "--unit",
        "in",
        "--mend",
        &out("m.3mf"),
        &bad,
    ]);
    assert_eq!(exit, 0, "{json}");
    let (exit, json) = answer(&["check", "--json", &out("m.3mf")]);
    let file = &json["files"][0];
    assert_eq!(
        (exit, &file["unit"], &file["sound"]),
        (0, &json!("in"), &json!(true))
    );
    // An open mesh goes out as a surface: 3MF wants models closed. It comes back as open as it was.
    let open = String::from_utf8(off())
        .unwrap()
        .replace("4 4 0", "4 3 0")
        .replace("3 0 3 2\n", "");
    let open = put(&path, "open.off", open.as_bytes());
    answer(&["check", "--json", "--write", &out("open.3mf"), &open]);
    let (exit, json) = answer(&["check", "--json", &out("open.3mf")]);
    assert_eq!(
        (exit, &json["files"][0]["bodies"][0]["closed"]),
        (1, &json!(false))
    );
    for name in ["o.ply", "o.3mf.gz", "o.glb", "o"] {
        let run = bismar(&["check", "--write", &out(name), scene]);
        assert_eq!(run.status.code(), Some(2), "{name}");
        assert!(!path.join(name).exists());
    }
}

#[test]
fn an_assembly_takes_bodies_and_materials_out_of_a_package() {
    let (_keep, path) = folder();
    let scene = path.join("c.gltf");
    let package = path.join("rover.3mf");
    let run = bismar(&[
        "check",
        "-q",
        "--write",
        package.to_str().unwrap(),
        scene.to_str().unwrap(),
    ]);
    assert_eq!(run.status.code(), Some(0));
    for mesh in ["rover.3mf", "c.gltf"] {
        let file = put(
            &path,
            "it.toml",
            format!(
                "[assembly]\nname = \"x\"\nunit = \"mm\"\n[[assign]]\nbody = \"rubber\"\nmaterial = \"rubber\"\n\
                 [material.rubber]\ndensity = \"1100 kg/m3\"\n[[part]]\nname = \"wheels\"\nmesh = \"{mesh}\"\n"
            )
            .as_bytes(),
        );
        let (exit, json) = answer(&["balance", "--json", &file]);
        assert_eq!(exit, 0, "{json}");
        // The file's own metres win over the assembly's word for meshes that state none.
        assert_eq!(json["total"]["mass_kg"], 22000.0);
        if mesh == "c.gltf" {
            let has = |i: &Value| i["path"].as_str().unwrap().ends_with("wheel.bin");
            assert!(json["inputs"].as_array().unwrap().iter().any(has));
        }
    }
}

#[test]
fn faults_have_a_place() {
    let (_keep, path) = folder();
    let cut = put(&path, "cut.ply", &ply()[..200]);
    let (exit, json) = answer(&["weigh", "--json", &cut]);
    assert_eq!(
        (exit, &json["error"]["kind"], &json["error"]["byte"]),
        (2, &json!("truncated"), &json!(200))
    );
    let text = String::from_utf8(off())
        .unwrap()
        .replace("3 1 2 3", "3 1 2 4");
    let bad = put(&path, "bad.off", text.as_bytes());
    let (exit, json) = answer(&["weigh", "--json", &bad]);
    assert_eq!(
        (exit, &json["error"]["kind"], &json["error"]["line"]),
        (2, &json!("bad-index"), &json!(9))
    );
    let bomb = put(&path, "bomb.stl.gz", &packed(&vec![b' '; 64 << 20]));
    let (exit, json) = answer(&["weigh", "--json", &bomb]);
    assert_eq!((exit, &json["error"]["kind"]), (2, &json!("too-large")));
}
