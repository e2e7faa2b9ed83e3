use super::*;
use crate::bytes::Bytes;
use crate::format::no_neighbours;
use crate::mesh::{Mesh, Triangles};
use crate::quantity::LengthUnit;
use base64::Engine;
use serde_json::{Value, json};

/// A corner tetrahedron with legs 5, 4 and 3: volume 10; and its indices as u16 and u8.
const POINTS: [[f32; 3]; 4] = [[0., 0., 0.], [5., 0., 0.], [0., 4., 0.], [0., 0., 3.]];
const CORNERS: [u16; 12] = [0, 2, 1, 0, 1, 3, 1, 2, 3, 0, 3, 2];

fn buffer() -> Vec<u8> {
    let mut out: Vec<u8> = POINTS
        .iter()
        .flatten()
        .flat_map(|x| x.to_le_bytes())
        .collect();
    out.extend(CORNERS.iter().flat_map(|x| x.to_le_bytes()));
    out
}

fn uri(bytes: &[u8]) -> String {
    let text = base64::engine::general_purpose::STANDARD.encode(bytes);
    format!("data:application/octet-stream;base64,{text}")
}

fn scene() -> Value {
    json!({
        "asset": {"version": "2.0"},
        "scene": 0,
        "scenes": [{"nodes": [0]}],
        "nodes": [{"mesh": 0, "name": "wheel"}],
        "meshes": [{"name": "round thing", "primitives": [{"attributes": {"POSITION": 0}, "indices": 1}]}],
        "accessors": [
            {"bufferView": 0, "componentType": 5126, "count": 4, "type": "VEC3"},
            {"bufferView": 1, "componentType": 5123, "count": 12, "type": "SCALAR"}
        ],
        "bufferViews": [
            {"buffer": 0, "byteOffset": 0, "byteLength": 48},
            {"buffer": 0, "byteOffset": 48, "byteLength": 24}
        ],
        "buffers": [{"byteLength": 72, "uri": uri(&buffer())}]
    })
}

fn read(scene: &Value) -> Result<Soup> {
    parse_text(scene.to_string().as_bytes(), &no_neighbours)
}

fn binary(scene: &Value, bytes: &[u8]) -> Vec<u8> {
    let mut json = scene.to_string().into_bytes();
    json.resize(json.len().next_multiple_of(4), b' ');
    let mut out = b"glTF\x02\0\0\0".to_vec();
    out.extend((28 + json.len() as u32 + bytes.len() as u32).to_le_bytes());
    out.extend((json.len() as u32).to_le_bytes());
    out.extend(b"JSON");
    out.extend(json);
    out.extend((bytes.len() as u32).to_le_bytes());
    out.extend(b"BIN\0");
    out.extend(bytes);
    out
}

fn parts(soup: &Soup) -> (&[[f64; 3]], &[[u32; 3]]) {
    match &soup.triangles {
        Triangles::Indexed { vertices, corners } => (vertices, corners),
        _ => unreachable!(),
    }
}

fn volumes(soup: Soup) -> Vec<(String, f64)> {
    let mesh = Mesh::new(soup, "stem").unwrap();
    let of = |b| (mesh.solid(b, None).unwrap().moments.zeroth * 1e6).round() / 1e6;
    mesh.bodies()
        .iter()
        .map(|b| (b.id.clone(), of(b)))
        .collect()
}

#[test]
fn all_containers_say_the_same() {
    let soup = read(&scene()).unwrap();
    assert_eq!(soup.unit, Some(LengthUnit::M));
    let expected: Vec<[f64; 3]> = POINTS.iter().map(|p| p.map(f64::from)).collect();
    assert_eq!(parts(&soup).0, expected);
    let mut own = scene();
    own["buffers"][0] = json!({"byteLength": 72});
    let bytes = binary(&own, &buffer());
    let glb = parse_binary(&bytes, &no_neighbours).unwrap();
    assert_eq!(parts(&glb), parts(&soup));
    let mut beside = scene();
    beside["buffers"][0]["uri"] = json!("the%20wheel.bin");
    let asked = |name: &str| {
        assert_eq!(name, "the wheel.bin");
        Ok(Bytes::Owned(buffer()))
    };
    let near = parse_text(beside.to_string().as_bytes(), &asked).unwrap();
    assert_eq!(parts(&near), parts(&soup));
    assert_eq!(read(&beside).unwrap_err().kind, Kind::NotFound);
    for away in [
        "../x.bin",
        "/etc/passwd",
        "a/..%2F..%2Fx",
        "http://here/x.bin",
        "c:\\x",
        "file:x",
    ] {
        beside["buffers"][0]["uri"] = json!(away);
        let e = parse_text(beside.to_string().as_bytes(), &|_| panic!("asked")).unwrap_err();
        assert_eq!(e.kind, Kind::UnknownFormat, "{away}");
    }
    assert_eq!(volumes(soup), [("wheel".into(), 10.0)]);
    for cut in 0..bytes.len() {
        assert!(parse_binary(&bytes[..cut], &no_neighbours).is_err());
    }
    let long = [&bytes[..], &[0]].concat();
    assert_eq!(
        parse_binary(&long, &no_neighbours).unwrap_err().kind,
        Kind::CountMismatch
    );
    let mut old = bytes;
    old[4] = 1;
    assert_eq!(
        parse_binary(&old, &no_neighbours).unwrap_err().kind,
        Kind::UnknownFormat
    );
}

#[test]
fn nodes_place_and_name() {
    let mut s = scene();
    s["scenes"][0]["nodes"] = json!([0, 3]);
    // A half turn about z by its quaternion; a mirror with a stretch; columns of a matrix.
    s["nodes"] = json!([
        {"name": "axle", "translation": [10, 0, 0], "rotation": [0, 0, 1, 0], "children": [1, 2]},
        {"mesh": 0, "name": "wheel", "translation": [1, 0, 0]},
        {"mesh": 0, "name": "wheel", "scale": [-2, 1, 1]},
        {"mesh": 0, "matrix": [0, 1, 0, 0, -1, 0, 0, 0, 0, 0, 1, 0, 7, 8, 9, 1]},
        {"mesh": 0, "name": "of no scene"}
    ]);
    let soup = read(&s).unwrap();
    let near = |p: [f64; 3], q: [f64; 3]| (0..3).all(|k| (p[k] - q[k]).abs() < 1e-14);
    let v = parts(&soup).0;
    assert!(near(v[1], [4.0, 0.0, 0.0]), "{:?}", v[1]);
    assert!(near(v[5], [20.0, 0.0, 0.0]), "{:?}", v[5]);
    assert!(near(v[9], [7.0, 13.0, 9.0]), "{:?}", v[9]);
    let mesh = Mesh::new(read(&s).unwrap(), "stem").unwrap();
    assert!(mesh.bodies().iter().all(|b| !b.turned));
    let expected = [("wheel", 10.0), ("wheel/2", 20.0), ("round thing", 10.0)];
    let expected: Vec<(String, f64)> = expected.iter().map(|(n, v)| ((*n).into(), *v)).collect();
    assert_eq!(volumes(soup), expected);
    s["nodes"][3]["matrix"][0] = json!(0.0);
    s["nodes"][2]["scale"] = json!([0, 0, 0]);
    let soup = read(&s).unwrap();
    assert_eq!(soup.notes[0].kind, "nodes-ignored");
    let e = |path: &str, value: Value| {
        let mut s = s.clone();
        *s.pointer_mut(path).unwrap() = value;
        read(&s).unwrap_err().kind
    };
    assert_eq!(e("/nodes/0/children", json!([0])), Kind::Cycle);
    assert_eq!(e("/nodes/0/children", json!([1, 1])), Kind::Cycle);
    assert_eq!(e("/scenes/0/nodes", json!([0, 1])), Kind::Cycle);
    assert_eq!(e("/nodes/0/children", json!([9])), Kind::UnknownName);
    assert_eq!(e("/nodes/1/mesh", json!(5)), Kind::UnknownName);
    assert_eq!(e("/scene", json!(5)), Kind::UnknownName);
    assert_eq!(e("/nodes/0/rotation", json!([0, 0, 1, 1])), Kind::BadNumber);
    assert_eq!(e("/nodes/3/matrix/3", json!(1)), Kind::BadNumber);
    assert_eq!(
        e("/nodes/0/translation", json!([1e300, 0, 0])),
        Kind::NotFinite
    );
    let mut ring = scene();
    ring.as_object_mut().unwrap().remove("scene");
    ring.as_object_mut().unwrap().remove("scenes");
    assert!(read(&ring).is_ok());
    ring["nodes"] = json!([{"mesh": 0, "children": [1]}, {"children": [0]}]);
    assert_eq!(read(&ring).unwrap_err().kind, Kind::Cycle);
}

#[test]
fn strips_fans_sparse_strides_and_whole_numbers() {
    // The tetrahedron as one strip, its joins degenerate, and as fans from two corners.
    let run = |primitives: Value, indices: &[u8], views: Value| {
        let mut s = scene();
        let mut bytes = buffer();
        bytes.extend(indices);
        s["meshes"][0]["primitives"] = primitives;
        s["accessors"]
            .as_array_mut()
            .unwrap()
            .extend(views.as_array().unwrap().clone());
        s["bufferViews"].as_array_mut().unwrap().push(json!(
            {"buffer": 0, "byteOffset": 72, "byteLength": indices.len()}
        ));
        s["buffers"][0] = json!({"byteLength": bytes.len(), "uri": uri(&bytes)});
        read(&s)
    };
    let strip = run(
        json!([{"attributes": {"POSITION": 0}, "indices": 2, "mode": 5}]),
        &[1, 0, 2, 3, 1, 0],
        json!([{"bufferView": 2, "componentType": 5121, "count": 6, "type": "SCALAR"}]),
    );
    let strip = strip.unwrap();
    assert_eq!(
        parts(&strip).1,
        [[1, 0, 2], [0, 3, 2], [2, 3, 1], [3, 0, 1]]
    );
    assert_eq!(volumes(strip), [("wheel".into(), 10.0)]);
    let fans = run(
        json!([
            {"attributes": {"POSITION": 0}, "indices": 2, "mode": 6},
            {"attributes": {"POSITION": 0}, "indices": 3, "mode": 6},
            {"attributes": {"POSITION": 0}, "mode": 1},
        ]),
        &[0, 2, 1, 3, 2, 3, 1, 2],
        json!([
            {"bufferView": 2, "componentType": 5121, "count": 5, "type": "SCALAR"},
            {"bufferView": 2, "componentType": 5121, "count": 3, "type": "SCALAR", "byteOffset": 5}
        ]),
    );
    let fans = fans.unwrap();
    assert_eq!(fans.notes[0].kind, "primitives-ignored");
    assert_eq!(
        parts(&fans).0.len(),
        4,
        "positions that are shared are read once"
    );
    assert_eq!(parts(&fans).1[0], [2, 1, 0]);
    assert_eq!(volumes(fans), [("wheel".into(), 10.0)]);
    // Corner 3 moved from z = 3 to z = 6: twice the volume.
    let mut bytes = vec![3u8, 0, 0, 0];
    bytes.extend([0f32, 0.0, 6.0].iter().flat_map(|x| x.to_le_bytes()));
    let sparse = run(
        json!([{"attributes": {"POSITION": 2}, "indices": 1}]),
        &bytes,
        json!([{"bufferView": 0, "componentType": 5126, "count": 4, "type": "VEC3", "sparse": {
            "count": 1,
            "indices": {"bufferView": 2, "componentType": 5121},
            "values": {"bufferView": 2, "byteOffset": 4}
        }}]),
    );
    assert_eq!(volumes(sparse.unwrap()), [("wheel".into(), 20.0)]);
    let wild = [&[4u8][..], &bytes[1..]].concat();
    let bad = run(
        json!([{"attributes": {"POSITION": 2}, "indices": 1}]),
        &wild,
        json!([{"componentType": 5126, "count": 4, "type": "VEC3", "sparse": {
            "count": 1,
            "indices": {"bufferView": 2, "componentType": 5121},
            "values": {"bufferView": 2, "byteOffset": 4}
        }}]),
    );
    assert_eq!(bad.unwrap_err().kind, Kind::BadIndex);
    // Positions as normalised bytes, four apart: 127 is 1.
    let mut s = scene();
    let mut bytes = buffer();
    bytes.extend([0u8, 0, 0, 99, 127, 0, 0, 99, 0, 127, 0, 99, 0, 0, 127, 99]);
    s["bufferViews"].as_array_mut().unwrap().push(json!(
        {"buffer": 0, "byteOffset": 72, "byteLength": 16, "byteStride": 4}
    ));
    s["accessors"][0] = json!(
        {"bufferView": 2, "componentType": 5120, "normalized": true, "count": 4, "type": "VEC3"}
    );
    s["buffers"][0] = json!({"byteLength": bytes.len(), "uri": uri(&bytes)});
    s["extensionsRequired"] = json!(["KHR_mesh_quantization"]);
    let (v, _) = (read(&s).unwrap(), ());
    assert_eq!(parts(&v).0[1], [1.0, 0.0, 0.0]);
}

#[test]
fn bounds_and_extensions_are_checked() {
    let e = |path: &str, value: Value| {
        let mut s = scene();
        let (parent, key) = path.rsplit_once('/').unwrap();
        s.pointer_mut(parent).unwrap()[key] = value;
        let e = read(&s).unwrap_err();
        assert!(!e.advice.is_empty());
        (e.kind, e.message)
    };
    let kind = |path, value| e(path, value).0;
    assert_eq!(kind("/accessors/0/count", json!(5)), Kind::CountMismatch);
    assert_eq!(
        kind("/accessors/0/byteOffset", json!(4)),
        Kind::CountMismatch
    );
    assert_eq!(
        kind("/accessors/0/byteOffset", json!(u64::MAX)),
        Kind::CountMismatch
    );
    assert_eq!(kind("/accessors/0/count", json!(u64::MAX)), Kind::TooLarge);
    assert_eq!(
        kind("/accessors/0/type", json!("VEC4")),
        Kind::UnknownFormat
    );
    assert_eq!(
        kind("/accessors/1/componentType", json!(5122)),
        Kind::UnknownFormat
    );
    assert_eq!(kind("/accessors/1/count", json!(11)), Kind::CountMismatch);
    assert_eq!(kind("/accessors/0/bufferView", json!(7)), Kind::UnknownName);
    assert_eq!(
        kind("/bufferViews/0/byteLength", json!(73)),
        Kind::CountMismatch
    );
    assert_eq!(
        kind("/bufferViews/1/byteOffset", json!(u64::MAX)),
        Kind::CountMismatch
    );
    assert_eq!(
        kind("/bufferViews/0/byteStride", json!(8)),
        Kind::UnknownFormat
    );
    assert_eq!(kind("/bufferViews/0/buffer", json!(1)), Kind::UnknownName);
    assert_eq!(kind("/buffers/0/byteLength", json!(73)), Kind::Truncated);
    assert_eq!(
        kind("/buffers/0/uri", json!("data:;base64,@@")),
        Kind::UnknownFormat
    );
    assert_eq!(kind("/meshes/0/primitives", json!([])), Kind::Empty);
    assert_eq!(kind("/asset/version", json!("1.0")), Kind::UnknownFormat);
    assert_eq!(kind("/asset/minVersion", json!("2.1")), Kind::UnknownFormat);
    assert_eq!(kind("/nodes/0/skin", json!(0)), Kind::UnknownFormat);
    assert_eq!(kind("/nodes/0/weights", json!([0.5])), Kind::UnknownFormat);
    for name in [
        "KHR_draco_mesh_compression",
        "EXT_meshopt_compression",
        "ANY_thing",
    ] {
        let (kind, message) = e("/extensionsRequired", json!([name]));
        assert!(
            kind == Kind::UnknownFormat && message.contains(name),
            "{message}"
        );
    }
    let (_, message) = e(
        "/bufferViews/0/extensions",
        json!({"EXT_meshopt_compression": {}}),
    );
    assert!(message.contains("EXT_meshopt_compression"));
    let (_, message) = e(
        "/nodes/0/extensions",
        json!({"EXT_mesh_gpu_instancing": {}}),
    );
    assert!(message.contains("EXT_mesh_gpu_instancing"));
    let mut far = scene();
    let mut bytes = buffer();
    bytes[48] = 4;
    far["buffers"][0]["uri"] = json!(uri(&bytes));
    assert_eq!(read(&far).unwrap_err().kind, Kind::BadIndex);
    bytes[48] = 0;
    bytes[..4].copy_from_slice(&f32::NAN.to_le_bytes());
    far["buffers"][0]["uri"] = json!(uri(&bytes));
    assert_eq!(read(&far).unwrap_err().kind, Kind::NotFinite);
    let e = parse_text(b"{\n\"asset\": 5}", &no_neighbours).unwrap_err();
    assert_eq!((e.kind, e.line), (Kind::UnknownFormat, Some(2)));
}

#[test]
fn placed_copies_are_counted_before_they_are_made() {
    let mut s = scene();
    s["accessors"][0] = json!({"componentType": 5126, "count": 72, "type": "VEC3"});
    let nodes: Vec<Value> = (0..1000).map(|_| json!({"mesh": 0})).collect();
    s["scenes"][0]["nodes"] = json!((0..1000).collect::<Vec<_>>());
    s["nodes"] = json!(nodes);
    assert_eq!(read(&s).unwrap().runs.len(), 1000);
    s["accessors"][0]["count"] = json!(1u64 << 40);
    assert_eq!(read(&s).unwrap_err().kind, Kind::TooLarge);
}
