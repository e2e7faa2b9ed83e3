use super::*;
use proptest::prelude::*;

const TETRA: &str = "ply\nformat ascii 1.0\ncomment made by hand\nobj_info none\n\
    element vertex 4\nproperty float x\nproperty float y\nproperty double z\n\
    element face 4\nproperty list uchar int vertex_indices\nend_header\n\
    0 0 0\n5 0 0\n0 4 0\n0 0 0.3\n3 0 2 1\n3 0 1 3\n3 1 2 3\n3 0 3 2\n";

fn parts(soup: &Soup) -> (&[[f64; 3]], &[[u32; 3]]) {
    match &soup.triangles {
        Triangles::Indexed { vertices, corners } => (vertices, corners),
        _ => unreachable!(),
    }
}

/// A binary file with properties that are skipped before, between and after those that are read.
fn binary(big: bool, vertices: &[[f64; 3]], faces: &[Vec<u32>]) -> Vec<u8> {
    let order = if big { "big" } else { "little" };
    let mut out = format!(
        "ply\nformat binary_{order}_endian 1.0\nelement camera 1\nproperty list ushort short at\n\
         element vertex {}\nproperty uchar red\nproperty double y\nproperty list uchar float w\n\
         property double z\nproperty double x\nelement face {}\nproperty float quality\n\
         property list uint uint vertex_index\nproperty int flags\nend_header\n",
        vertices.len(),
        faces.len()
    )
    .into_bytes();
    let mut put = |bytes: &[u8]| {
        if big {
            out.extend(bytes.iter().rev());
        } else {
            out.extend(bytes);
        }
    };
    put(&2u16.to_le_bytes());
    put(&(-1i16).to_le_bytes());
    put(&7i16.to_le_bytes());
    for p in vertices {
        put(&[200]);
        put(&p[1].to_le_bytes());
        put(&[1]);
        put(&1.5f32.to_le_bytes());
        put(&p[2].to_le_bytes());
        put(&p[0].to_le_bytes());
    }
    for f in faces {
        put(&0.25f32.to_le_bytes());
        put(&(f.len() as u32).to_le_bytes());
        f.iter().for_each(|i| put(&i.to_le_bytes()));
        put(&(-9i32).to_le_bytes());
    }
    out
}

#[test]
fn text_keeps_the_values_written() {
    for text in [
        TETRA.to_owned(),
        TETRA.replace('\n', "\r\n"),
        TETRA.replace('\n', "\r"),
    ] {
        let soup = parse(text.as_bytes()).unwrap();
        let (vertices, corners) = parts(&soup);
        assert_eq!(vertices[3], [0.0, 0.0, 0.3]);
        assert_eq!(corners, [[0, 2, 1], [0, 1, 3], [1, 2, 3], [0, 3, 2]]);
        assert!(soup.unit.is_none() && soup.names == [None]);
    }
}

#[test]
fn both_byte_orders_say_the_same() {
    let vertices = [
        [0.1, 2.0, -3.0],
        [1e20, 5.0, 6.0],
        [7.0, 8.5, 9.0],
        [0.0, 1.0, 2.0],
    ];
    let faces = [vec![0, 1, 2], vec![3, 2, 1, 0], vec![1, 2]];
    for big in [false, true] {
        let soup = parse(&binary(big, &vertices, &faces)).unwrap();
        let (v, c) = parts(&soup);
        assert_eq!(v, vertices);
        assert_eq!((c[0], c.len()), ([0, 1, 2], 3));
        assert_eq!(soup.notes[0].kind, "faces-ignored");
        // A polygon that is not flat, in a file without lines.
        assert_eq!(soup.warped.len(), 1);
        assert_eq!(soup.warped[0].line, None);
        assert_eq!((soup.warped[0].first, soup.warped[0].count), (1, 2));
    }
}

#[test]
fn faces_may_stand_before_vertices() {
    let text = "ply\nformat ascii 1.0\nelement face 1\nproperty list uchar int vertex_indices\n\
        element vertex 3\nproperty int z\nproperty int x\nproperty int y\nend_header\n\
        3 0 1 2\n3 1 2\n6 4 5\n9 7 8\n";
    let soup = parse(text.as_bytes()).unwrap();
    assert_eq!(parts(&soup).0[1], [4.0, 5.0, 6.0]);
}

#[test]
fn faults_have_a_kind_and_a_place() {
    let e = |from: &str, to: &str| {
        assert!(TETRA.contains(from), "{from}");
        let e = parse(TETRA.replacen(from, to, 1).as_bytes()).unwrap_err();
        assert!(!e.advice.is_empty());
        (e.kind, e.line)
    };
    assert_eq!(e("3 0 2 1", "3 0 2 4"), (Kind::BadIndex, Some(16)));
    assert_eq!(e("3 0 2 1", "3 0 2 -1"), (Kind::BadIndex, Some(16)));
    assert_eq!(e("3 0 2 1", "3 0 2"), (Kind::CountMismatch, Some(16)));
    assert_eq!(e("3 0 2 1", "3 0 2 1 1"), (Kind::CountMismatch, Some(16)));
    assert_eq!(e("3 0 2 1", "-3 0 2 1"), (Kind::BadNumber, Some(16)));
    assert_eq!(e("3 0 2 1", "3 0 2 1.5"), (Kind::BadNumber, Some(16)));
    assert_eq!(e("0 0 0.3", "0 0 0,3"), (Kind::BadNumber, Some(15)));
    assert_eq!(e("0 0 0.3", "0 0 nan"), (Kind::NotFinite, Some(15)));
    assert_eq!(e("0 0 0.3", "0 0 1e61"), (Kind::NotFinite, Some(15)));
    assert_eq!(e("element face 4", "element face 5").0, Kind::Truncated);
    assert_eq!(
        e("element face 4", "element face 3"),
        (Kind::CountMismatch, Some(19))
    );
    assert_eq!(e("element face 4", "element face 0").0, Kind::CountMismatch);
    assert_eq!(
        e("element face 4", "element tristrips 4"),
        (Kind::UnknownFormat, Some(9))
    );
    assert_eq!(
        e("vertex_indices", "corners"),
        (Kind::UnknownFormat, Some(9))
    );
    assert_eq!(
        e("property double z", "property double w"),
        (Kind::UnknownFormat, Some(5))
    );
    assert_eq!(e("ascii 1.0", "ascii 2.0"), (Kind::UnknownFormat, Some(2)));
    assert_eq!(
        e("property float y", "property float x"),
        (Kind::UnknownFormat, Some(7))
    );
    assert_eq!(
        e("element vertex 4", "element vertex 4000000000000").0,
        Kind::TooLarge
    );
    assert_eq!(
        e("element vertex 4", "element vertex four").0,
        Kind::BadNumber
    );
    assert_eq!(e("end_header\n", "").0, Kind::UnknownFormat);
    let points = TETRA.split("element face").next().unwrap().to_owned() + "end_header\n1 2 3\n";
    let points = points.replace("vertex 4", "vertex 1");
    assert_eq!(parse(points.as_bytes()).unwrap_err().kind, Kind::Empty);

    let good = binary(false, &[[0.0; 3]; 3], &[vec![0, 1, 2]]);
    let e = parse(&good[..good.len() - 1]).unwrap_err();
    assert_eq!(
        (e.kind, e.byte),
        (Kind::Truncated, Some(good.len() as u64 - 1))
    );
    let long = [&good[..], &[0]].concat();
    let e = parse(&long).unwrap_err();
    assert_eq!(
        (e.kind, e.byte),
        (Kind::CountMismatch, Some(good.len() as u64))
    );
    let bad = parse(&binary(false, &[[0.0; 3]; 3], &[vec![0, 1, 3]])).unwrap_err();
    assert_eq!(
        (bad.kind, bad.byte),
        (Kind::BadIndex, Some(good.len() as u64 - 8))
    );
    let nan = parse(&binary(true, &[[f64::NAN; 3]; 3], &[vec![0, 1, 2]])).unwrap_err();
    assert_eq!(nan.kind, Kind::NotFinite);
    // A count far beyond the bytes takes no memory.
    let text = String::from_utf8_lossy(&good[..good.len() - 200]).into_owned();
    let far = text.replace("vertex 3", "vertex 4294967294");
    assert_eq!(parse(far.as_bytes()).unwrap_err().kind, Kind::Truncated);
}

proptest! {
    #[test]
    fn binary_round_trip(
        vertices in prop::collection::vec(prop::array::uniform3(-1e9f64..1e9), 3..20),
        picks in prop::collection::vec(prop::array::uniform3(0u32..1000), 1..20),
        big: bool,
    ) {
        let n = vertices.len() as u32;
        let faces: Vec<Vec<u32>> = picks.iter().map(|f| f.map(|i| i % n).to_vec()).collect();
        let soup = parse(&binary(big, &vertices, &faces)).unwrap();
        let (v, c) = parts(&soup);
        prop_assert_eq!(v, &vertices[..]);
        prop_assert_eq!(c.iter().map(|t| t.to_vec()).collect::<Vec<_>>(), faces);
    }

    #[test]
    fn damaged_files_are_answered(at in 0usize..400, byte: u8, cut in 0usize..600) {
        for mut bytes in [binary(false, &[[1.0; 3]; 4], &[vec![0, 1, 2, 3]]), TETRA.as_bytes().to_vec()] {
            if let Some(b) = bytes.get_mut(at) { *b = byte; }
            bytes.truncate(cut.max(4));
            let _ = parse(&bytes);
        }
    }
}
