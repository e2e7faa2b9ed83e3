//! The readers from outside: whole files in, triangles, names and errors out.
//!
//! Second opinions: `stl_io` (which reads STL to f32) and `tobj` (OBJ, in f64).

// A test whose input cannot be read must stop.
#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

use std::io::Cursor;
use std::path::Path;

use bismar::error::{Error, Kind};
use bismar::format::{Bytes, Family, Format, detect, read};
use bismar::mesh::{Soup, Triangles};
use proptest::prelude::*;

fn soup(text: impl AsRef<[u8]>) -> Result<Soup, Error> {
    read(Bytes::Owned(text.as_ref().to_vec()), Path::new("m"), None)
}

fn fails(text: impl AsRef<[u8]>, kind: Kind, line: u64) -> Error {
    let e = soup(text).expect_err("must fail");
    assert_eq!((e.kind, e.line), (kind, Some(line)), "{e}");
    assert_eq!(e.path.as_deref(), Some(Path::new("m")));
    assert!(!e.advice.is_empty());
    e
}

/// Corners of all triangles.
fn corners(soup: &Soup) -> Vec<[[f64; 3]; 3]> {
    match &soup.triangles {
        Triangles::Loose(all) => all.clone(),
        Triangles::Indexed { vertices, corners } => corners
            .iter()
            .map(|t| t.map(|i| vertices[i as usize]))
            .collect(),
        Triangles::Records(records) => (0..records.count)
            .map(|t| {
                let at = |k: usize| {
                    let b = &records.bytes[84 + 50 * t + 12 + 4 * k..];
                    f64::from(f32::from_le_bytes([b[0], b[1], b[2], b[3]]))
                };
                [
                    [at(0), at(1), at(2)],
                    [at(3), at(4), at(5)],
                    [at(6), at(7), at(8)],
                ]
            })
            .collect(),
    }
}

/// Name, material and number of triangles of each run, which must cover all triangles in order.
fn runs(soup: &Soup) -> Vec<(Option<&str>, Option<&str>, usize)> {
    let mut next = 0;
    let out = soup
        .runs
        .iter()
        .map(|r| {
            assert_eq!(r.first, next);
            next += r.count;
            let material = r.material.map(|m| soup.materials[m as usize].as_str());
            (soup.names[r.name as usize].as_deref(), material, r.count)
        })
        .collect();
    assert_eq!(next, corners(soup).len());
    out
}

const FACET: &str = "facet normal 0 0 1\n outer loop\n  vertex 0 0 0\n  vertex 1 0 0\n  vertex 0 1 0\n endloop\nendfacet\n";

mod stl {
    use super::*;

    #[test]
    fn blocks_are_names() {
        let text = format!(
            "solid left wheel\n{FACET}{FACET}endsolid left wheel\nsolid\n{FACET}endsolid\nSOLID\tleft wheel \r\n{FACET}solid Düse\n{FACET}endsolid"
        );
        let s = soup(text).unwrap();
        assert_eq!(
            runs(&s),
            [
                (Some("left wheel"), None, 2),
                (None, None, 1),
                (Some("left wheel"), None, 1),
                (Some("Düse"), None, 1)
            ]
        );
        assert_eq!(s.names.len(), 3);
        assert!(s.notes.is_empty());
    }

    #[test]
    fn spelling_is_free() {
        let plain = corners(&soup(format!("solid\n{FACET}endsolid\n")).unwrap());
        let one_line = format!("solid x\n{}\nendsolid", FACET.replace('\n', " "));
        for text in [
            format!("solid\r\n{}endsolid\r\n", FACET.replace('\n', "\r\n")),
            format!("\u{feff}  solid a\n{}", FACET.to_uppercase()),
            format!("solid a\r{}endsolid\r", FACET.replace('\n', "\r")),
            format!("solid a\n{}", FACET.replace(' ', "\t\t")),
            format!("\n\n solid\n{}endsolid\n\x1a", FACET.replace('\n', "\n\n")),
            format!(
                "solid\n{}endsolid",
                FACET.replace("0 0 1\n", "nan -nan(ind) x\n")
            ),
            format!(
                "solid\n{}endsolid",
                FACET.replace("1 0 0", "+1.0e+00 0E5 -0")
            ),
            one_line,
            FACET.to_string(),
        ] {
            let s = soup(&text).unwrap_or_else(|e| panic!("{e}: {text:?}"));
            assert_eq!(corners(&s), plain, "{text:?}");
        }
    }

    #[test]
    fn a_missing_end_is_said() {
        let s = soup(format!("solid a\n{FACET}{FACET}")).unwrap();
        assert_eq!(s.notes.len(), 1);
        assert_eq!(s.notes[0].kind, "endsolid-missing");
    }

    #[test]
    fn numbers_keep_the_value_written() {
        let s = soup(format!(
            "solid\n{}endsolid",
            FACET.replace("1 0 0", "0.1 1e-7 16777217")
        ))
        .unwrap();
        assert_eq!(corners(&s)[0][1], [0.1, 1e-7, 16_777_217.0]);
    }

    #[test]
    fn faults_have_their_line() {
        let with =
            |from: &str, to: &str| format!("solid\n{FACET}{}endsolid", FACET.replace(from, to));
        let e = fails(with("1 0 0", "1 zero 0"), Kind::BadNumber, 12);
        assert!(e.message.contains("\"zero\""), "{e}");
        let e = fails(with("1 0 0", "1,5 0 0"), Kind::BadNumber, 12);
        assert!(e.advice.contains("comma"));
        fails(with("1 0 0", "1 0"), Kind::BadNumber, 13);
        for word in ["nan", "-inf", "Infinity", "1e400", "1e61"] {
            fails(with("1 0 0", &format!("0 {word} 0")), Kind::NotFinite, 12);
        }
        fails(with("  vertex 0 1 0\n", ""), Kind::CountMismatch, 13);
        fails(
            with("  vertex 0 1 0\n", "  vertex 0 1 0\n  vertex 0 2 0\n"),
            Kind::CountMismatch,
            14,
        );
        fails(with("endfacet\n", ""), Kind::CountMismatch, 15);
        fails(with("facet normal", "fact normal"), Kind::UnknownFormat, 9);
        fails(
            format!("solid\n{FACET}{}", &FACET[..60]),
            Kind::Truncated,
            12,
        );
        let whole = format!("solid a\n{FACET}");
        for cut in 9..whole.len() - 1 {
            let e = soup(&whole[..cut]).unwrap_err();
            assert_eq!(e.kind, Kind::Truncated, "{cut}: {e}");
        }
        assert_eq!(soup("solid a\nendsolid a\n").unwrap_err().kind, Kind::Empty);
        assert_eq!(soup("solid").unwrap_err().kind, Kind::Empty);
    }

    #[test]
    fn pieces_do_not_change_names_or_faults() {
        // Some megabytes, so that the text is cut many times.
        let mut text = String::new();
        for block in 0..40 {
            text += &format!("solid facet holder {}\n", block % 30);
            (0..300).for_each(|i| text += &FACET.replace("1 0 0", &format!("{block} {i} 0.5")));
            text += "endsolid\n";
        }
        let s = soup(&text).unwrap();
        assert_eq!(s.names.len(), 30);
        assert_eq!(runs(&s).len(), 40);
        let all = corners(&s);
        assert_eq!(all.len(), 12_000);
        assert_eq!(all[301][1], [1.0, 1.0, 0.5]);
        let lines = text.lines().count() as u64;
        fails(
            text.clone() + "facet normal 0 0 1\nouter loop\nvertex 1 2 x\n \n",
            Kind::BadNumber,
            lines + 3,
        );
        let spoiled = text.replacen("vertex 39 7 0.5", "vertex 39 q 0.5", 1) + "facet x y";
        let line = text
            .lines()
            .position(|l| l.contains("vertex 39 7 0.5"))
            .unwrap() as u64
            + 1;
        fails(spoiled, Kind::BadNumber, line);
    }
}

mod obj {
    use super::*;

    const V: &str = "v 0 0 0\nv 1 0 0\nv 0 1 0\nv 0 0 1\n";

    #[test]
    fn faces_in_all_spellings() {
        let plain = corners(&soup(format!("{V}f 1 2 3\n")).unwrap());
        for face in [
            "f 1/1 2/2 3/3",
            "f 1//1 2//2 3//3",
            "f 1/1/1 2/2/2 3/3/3",
            "f -4 -3 -2",
            "f -4/-1/-1 2 -2",
            "f 1 2 \\\n 3",
            "f 1 \\\r\n2 3\r",
            "f 1 2 3 # trailing",
            "f\t1\t2  3 ",
            "f \\\n1 2 3",
            "fo 1 2 3",
            "f 1 2 3",
        ] {
            assert_eq!(
                corners(&soup(format!("{V}{face}\n")).unwrap()),
                plain,
                "{face:?}"
            );
            assert_eq!(
                corners(&soup(format!("{V}{face}")).unwrap()),
                plain,
                "{face:?}"
            );
        }
        for v in [
            "v 0 0 0 1\nv 1 0 0 1\nv 0 1 0\n",
            "v 0 0 0 0.5 0.5 0.5\nv 1 0 0 1 1 1\nv 0 1 0 # c\n",
            "\u{feff}# c\nv 0 \\\n 0 0\r\nv 1 0 0\r\nv 0 1 0#c\r\n",
        ] {
            assert_eq!(
                corners(&soup(format!("{v}f 1 2 3\n")).unwrap()),
                plain,
                "{v:?}"
            );
        }
        let cr = format!("{V}f 1 2 3\n").replace('\n', "\r");
        assert_eq!(corners(&soup(cr).unwrap()), plain);
        // A face may come before its vertices.
        assert_eq!(corners(&soup(format!("f 1 2 3\n{V}")).unwrap()), plain);
    }

    #[test]
    fn names_in_force() {
        let text = format!(
            "{V}f 1 2 3\nusemtl steel S235\nf 1 2 3\ng left side\nf 1 2 3\no  bracket #2 \nf 1 2 3\ng ignored\nusemtl nylon\nf 1 2 3 4\no \nf 1 2 3\no Räder\\\n hinten\nf 1 2 3\n"
        );
        let s = soup(text).unwrap();
        assert_eq!(
            runs(&s),
            [
                (None, None, 1),
                (Some("steel S235"), Some("steel S235"), 1),
                (Some("left side"), Some("steel S235"), 1),
                (Some("bracket #2"), Some("steel S235"), 1),
                (Some("bracket #2"), Some("nylon"), 2),
                (None, Some("nylon"), 1),
                (Some("Räder hinten"), Some("nylon"), 1),
            ]
        );
    }

    #[test]
    fn faults_have_their_line() {
        for (text, kind, line) in [
            ("v 0 0\nf 1 1 1\n", Kind::BadNumber, 1),
            ("v 0 0 0\nv 1 x 0\n", Kind::BadNumber, 2),
            ("v 0 0 0\nv 1 2 3,5\n", Kind::BadNumber, 2),
            ("v 0 0 nan\n", Kind::NotFinite, 1),
            ("v 0 0 1e99\n", Kind::NotFinite, 1),
            ("v 0 0 0\nf 1 1 0\n", Kind::BadIndex, 2),
            ("v 0 0 0\nf 1 1 \\\n 2\n", Kind::BadIndex, 3),
            ("v 0 0 0\nf 1 1\nfo 1 \\\n2 1\nf 1 1\n", Kind::BadIndex, 4),
            ("v 0 0 0\n\nf 1 -2 1\n", Kind::BadIndex, 3),
            (
                "v 0 0 0\nf 1 1 99999999999999999999999\n",
                Kind::BadIndex,
                2,
            ),
            (
                "v 0 0 0\nf 1 1 -99999999999999999999999\n",
                Kind::BadIndex,
                2,
            ),
            ("v 0 0 0\nf 1 1 one\n", Kind::BadNumber, 2),
            ("v 0 0 0\nf 1 1 1.5\n", Kind::BadNumber, 2),
        ] {
            fails(text, kind, line);
        }
        let e = fails(format!("{V}f 1 2 3\nf 1 2 5\n"), Kind::BadIndex, 6);
        assert!(
            e.message.contains("vertex 5") && e.message.contains("4 vertices"),
            "{e}"
        );
        assert_eq!(soup(V).unwrap_err().kind, Kind::Empty);
        assert_eq!(
            soup(format!("{V}f 1 2\nl 1 2 3\n")).unwrap_err().kind,
            Kind::Empty
        );
        // A piece later than the first.
        let many = format!("{}f 1 2 3\n", V.repeat(50_000));
        fails(format!("{many}f 1 2 900000\n"), Kind::BadIndex, 200_002);
        assert_eq!(
            corners(&soup(format!("{many}f -200000 -3 -2\n")).unwrap())[1],
            corners(&soup(&many).unwrap())[0]
        );
    }

    #[test]
    fn what_is_passed_over_is_said() {
        let s = soup(format!("{V}f 1 2\nf 1 2 3\nf 1\ncstype bezier\nsurf 0 1\nfrobnicate 1\nfrobnicate 2\nvt 0 0\ns off\nmtllib x.mtl\nl 1 2\np 1\n")).unwrap();
        let notes: Vec<_> = s.notes.iter().map(|n| (n.kind, n.line)).collect();
        assert_eq!(
            notes,
            [
                ("faces-ignored", Some(5)),
                ("curves-ignored", Some(8)),
                ("keywords-unknown", Some(10))
            ]
        );
        assert!(s.notes[0].message.starts_with("2 "));
        assert_eq!(corners(&s).len(), 1);
    }

    #[test]
    fn warped_polygons_are_measured() {
        let s = soup("v 0.00 0.00 0.00\nv 1.00 0.00 0.00\nv 1.00 1.00 0.01\nv 0.00 1.00 0.00\nv 1.00 1.00 1.00\nf 1 2 3 4\nf 1 2 5 4\nf 1 2 3\n").unwrap();
        assert_eq!(s.warped.len(), 2);
        let (beyond, within) = (&s.warped[0], &s.warped[1]);
        assert!(!beyond.within_rounding && within.within_rounding);
        assert_eq!((beyond.line, beyond.first, beyond.count), (Some(7), 2, 2));
        assert_eq!((within.line, within.first, within.count), (Some(6), 0, 2));
        assert!((beyond.volume_high - beyond.volume_low - 1.0 / 6.0).abs() < 1e-15);
        assert!((within.volume_high - within.volume_low - 0.01 / 6.0).abs() < 1e-15);
        let flat = soup("v 0.1 0.2 0.3\nv 1.1 0.2 0.3\nv 1.1 1.2 0.3\nv 0.1 1.2 0.3\nf 1 2 3 4\n")
            .unwrap();
        assert!(flat.warped.is_empty());
    }

    #[test]
    fn a_very_large_polygon_is_refused() {
        let face = |n: usize| format!("{V}f{}\n", " 1 2 3".repeat(n));
        fails(face(30_000), Kind::TooLarge, 5);
    }
}

/// The same soup to the last bit on any number of threads: pieces have a fixed size.
#[test]
fn threads_do_not_matter() {
    let mut obj = String::new();
    let mut stl = String::new();
    for i in 0..40_000 {
        let x = f64::from(i).sin();
        obj += &format!(
            "v {x} 0 {i}\nv 1 {x} 0.5\nv {i} 1 {x}\nv 0 1 {x:.3}\no part {}\nf -4 -3 -2 -1\n",
            i / 7000
        );
        stl += &FACET.replace("1 0 0", &format!("{x} {i} 0.25"));
    }
    let read_with = |threads: usize| {
        let pool = rayon::ThreadPoolBuilder::new()
            .num_threads(threads)
            .build()
            .unwrap();
        pool.install(|| format!("{:?} {:?}", soup(&obj).unwrap(), soup(&stl).unwrap()))
    };
    let one = read_with(1);
    for threads in [2, 3, 7] {
        assert!(read_with(threads) == one, "{threads} threads");
    }
}

mod kinds {
    use super::*;

    fn kind_of(bytes: &[u8], path: &str) -> Result<Format, Error> {
        detect(bytes, Path::new(path), None)
    }

    #[test]
    fn bytes_win_over_extensions() {
        let stl = format!("solid\n{FACET}endsolid\n");
        assert_eq!(kind_of(stl.as_bytes(), "a.obj").unwrap(), Format::StlText);
        assert_eq!(kind_of(b"# c\n\nv 0 0 0\n", "a.stl").unwrap(), Format::Obj);
        assert_eq!(kind_of(b"# c\n\nv 0 0 0\n", "-").unwrap(), Format::Obj);
        let mut binary = b"v 1 2 3 is a header too".to_vec();
        binary.resize(84 + 50, 0);
        binary[80] = 1;
        assert_eq!(kind_of(&binary, "a.obj").unwrap(), Format::StlBinary);
        binary.push(0);
        assert_eq!(kind_of(&binary, "a.STL").unwrap(), Format::StlBinary);
        assert_eq!(
            kind_of(&binary, "a.bin").unwrap_err().kind,
            Kind::UnknownFormat
        );
        assert_eq!(
            detect(&binary, Path::new("-"), Some(Family::Stl)).unwrap(),
            Format::StlBinary
        );
        binary[..5].copy_from_slice(b"solid");
        assert_eq!(kind_of(&binary, "-").unwrap(), Format::StlBinary);
        assert_eq!(
            kind_of(b"call other.obj\nv 0 0 0\n", "a.obj").unwrap(),
            Format::Obj
        );
        assert_eq!(
            kind_of(b"call other.obj\nv 0 0 0\n", "a").unwrap_err().kind,
            Kind::UnknownFormat
        );
    }

    #[test]
    fn other_kinds_are_named() {
        for (bytes, word) in [
            (&b"PK\x03\x04....a.txt"[..], "zip"),
            (b"BZh91AY", "bzip2"),
            (b"{\"name\":\"wheel\"}", "JSON"),
            (b"ISO-10303-21;\nHEADER;", "STEP"),
            (b"%PDF-1.7", "PDF"),
            (b"\x89PNG\r\n", "PNG"),
            (b"<!DOCTYPE html><html>", "web page"),
            (b"<?xml version=\"1.0\"?><amf>", "AMF"),
            (b"hello world\n", "hello"),
            (b"\0\x01\x02", "not text"),
            (b"\xff\xfes\0o\0", "UTF-16"),
        ] {
            let e = kind_of(bytes, "part.stl");
            // A short file called .stl that is not text is a damaged binary STL.
            if bytes[0] == 0 {
                assert_eq!(e.unwrap(), Format::StlBinary);
                continue;
            }
            let e = e.unwrap_err();
            assert_eq!(e.kind, Kind::UnknownFormat);
            assert!(e.message.contains(word), "{e}");
            assert_eq!(e.path.as_deref(), Some(Path::new("part.stl")));
        }
        assert_eq!(kind_of(b"", "a.stl").unwrap_err().kind, Kind::Empty);
        assert_eq!(Family::from_option("step").unwrap_err().kind, Kind::Usage);
    }

    #[test]
    fn bytes_decide_between_the_formats_whatever_the_name() {
        for (bytes, format) in [
            (&b"PK\x03\x04....3D/3dmodel.model"[..], Format::ThreeMf),
            (b"ply\nformat ascii 1.0\n", Format::Ply),
            (b"ply\rformat ascii 1.0\r", Format::Ply),
            (b"OFF\n3 1 0\n", Format::Off),
            (b"# by hand\nCOFF\n3 1 0\n", Format::Off),
            (b"OFF BINARY\n", Format::Off),
            (b"glTF\x02\0\0\0", Format::GltfBinary),
            (b" {\"asset\":{\"version\":\"2.0\"}}", Format::GltfText),
        ] {
            for name in ["part.stl", "part.obj", "part", "-"] {
                assert_eq!(kind_of(bytes, name).unwrap(), format, "{format} as {name}");
            }
        }
        // A folder of pictures is no package, but what is called so is read as one.
        assert_eq!(
            kind_of(b"PK\x03\x04....", "a.3mf").unwrap(),
            Format::ThreeMf
        );
        assert_eq!(kind_of(b"8 6 0\n", "a.off").unwrap(), Format::Off);
        assert_eq!(
            kind_of(b"8 6 0\n", "a").unwrap_err().kind,
            Kind::UnknownFormat
        );
        // Packed bytes are unpacked before; here they are none.
        assert_eq!(
            kind_of(b"\x1f\x8b\x08\0", "a").unwrap_err().kind,
            Kind::UnknownFormat
        );
    }
}

/// A random mesh: vertices, and triangles as indices.
fn mesh() -> impl Strategy<Value = (Vec<[f32; 3]>, Vec<[usize; 3]>)> {
    prop::collection::vec(prop::array::uniform3(-1e6f32..1e6), 3..40).prop_flat_map(|vertices| {
        let n = vertices.len();
        let faces = prop::collection::vec(prop::array::uniform3(0..n), 1..60);
        (Just(vertices), faces)
    })
}

proptest! {
    #[test]
    fn stl_as_stl_io_reads_it((vertices, faces) in mesh()) {
        let wide = |v: [f32; 3]| v.map(f64::from);
        let expected: Vec<_> = faces.iter().map(|f| f.map(|i| wide(vertices[i]))).collect();
        let triangles: Vec<stl_io::Triangle> = faces
            .iter()
            .map(|f| stl_io::Triangle { normal: stl_io::Normal::new([0.0; 3]), vertices: f.map(|i| stl_io::Vertex::new(vertices[i])) })
            .collect();
        let mut binary = Vec::new();
        stl_io::write_stl(&mut binary, triangles.iter()).unwrap();
        prop_assert_eq!(&corners(&soup(&binary).unwrap()), &expected);

        let mut text = "solid random\n".to_string();
        for f in &expected {
            text += "facet normal 0 0 0\nouter loop\n";
            f.iter().for_each(|v| text += &format!("vertex {:e} {} {:?}\n", v[0], v[1], v[2]));
            text += "endloop\nendfacet\n";
        }
        text += "endsolid random\n";
        let ours = corners(&soup(&text).unwrap());
        prop_assert_eq!(&ours, &expected);
        let theirs = stl_io::read_stl(&mut Cursor::new(text.as_bytes())).unwrap();
        let theirs: Vec<_> = theirs.faces.iter().map(|f| f.vertices.map(|i| wide(theirs.vertices[i].0))).collect();
        prop_assert_eq!(&ours, &theirs);
    }

    #[test]
    fn obj_as_tobj_reads_it((vertices, faces) in mesh(), style in 0..3, seed in any::<u32>()) {
        let mut text = String::new();
        for v in &vertices {
            text += &format!("v {} {:e} {:?}\nvn 0 0 1\nvt 0 0\n", f64::from(v[0]) / 3.0, v[1], v[2]);
        }
        let n = vertices.len() as i64;
        for (k, f) in faces.iter().enumerate() {
            if (seed.rotate_left(k as u32)) & 7 == 0 { text += &format!("o part {}\n", k % 5); }
            let c = f.map(|i| i as i64 + 1);
            text += &match style {
                0 => format!("f {} {} {}\n", c[0], c[1], c[2]),
                1 => format!("f {0}/{0}/{0} {1}/{1}/{1} {2}/{2}/{2}\n", c[0], c[1], c[2]),
                _ => format!("f {}//{} {}//-1 {}//-1\n", c[0] - n - 1, c[0], c[1] - n - 1, c[2] - n - 1),
            };
        }
        let ours = soup(&text).unwrap();
        let options = tobj::LoadOptions { triangulate: false, single_index: false, ..Default::default() };
        let (models, _) = tobj::load_obj_buf(&mut Cursor::new(text.as_bytes()), &options, |_| Err(tobj::LoadError::GenericFailure)).unwrap();
        let theirs: Vec<[[f64; 3]; 3]> = models
            .iter()
            .flat_map(|m| m.mesh.indices.chunks(3).map(|t| {
                let p = |i: u32| { let p = &m.mesh.positions[3 * i as usize..]; [p[0], p[1], p[2]] };
                [p(t[0]), p(t[1]), p(t[2])]
            }))
            .collect();
        prop_assert_eq!(corners(&ours), theirs);
        runs(&ours);
    }

    /// Polygons keep their boundary: the vector area (half the sum of edge cross products) of the
    /// triangles is the polygon's, and their number is right.
    #[test]
    fn polygons_round_trip(vertices in prop::collection::vec(prop::array::uniform3(-1000i32..1000), 3..30), picks in prop::collection::vec(prop::collection::vec(any::<prop::sample::Index>(), 3..12), 1..20)) {
        let mut text = String::new();
        vertices.iter().for_each(|v| text += &format!("v {} {} {}\n", v[0], v[1], v[2]));
        let cross = |a: [f64; 3], b: [f64; 3]| [a[1] * b[2] - a[2] * b[1], a[2] * b[0] - a[0] * b[2], a[0] * b[1] - a[1] * b[0]];
        let mut expected = [0.0; 3];
        let mut count = 0;
        for pick in &picks {
            text += "f";
            let p: Vec<_> = pick.iter().map(|i| { let i = i.index(vertices.len()); text += &format!(" {}", i + 1); vertices[i].map(f64::from) }).collect();
            text += "\n";
            (0..p.len()).for_each(|i| { let c = cross(p[i], p[(i + 1) % p.len()]); (0..3).for_each(|k| expected[k] += c[k]); });
            count += p.len() - 2;
        }
        let all = corners(&soup(&text).unwrap());
        prop_assert_eq!(all.len(), count);
        let mut sum = [0.0; 3];
        for t in &all {
            for i in 0..3 { let c = cross(t[i], t[(i + 1) % 3]); (0..3).for_each(|k| sum[k] += c[k]); }
        }
        // Whole numbers below 2^53: no rounding at all.
        prop_assert_eq!(sum, expected);
    }

    #[test]
    fn any_bytes_give_an_answer(bytes in prop::collection::vec(any::<u8>(), 0..600)) {
        for hint in [None].into_iter().chain(Family::ALL.map(Some)) {
            let _ = read(Bytes::Owned(bytes.clone()), Path::new("x"), hint);
        }
        let _ = bismar::format::stl::parse(Bytes::Owned(bytes.clone()));
        let _ = bismar::format::obj::parse(&bytes);
    }

    #[test]
    fn any_words_give_an_answer(words in prop::collection::vec(prop::sample::select(vec![
        "solid", "facet", "normal", "outer", "loop", "vertex", "endloop", "endfacet", "endsolid", "1", "-2", "0.5", "1e9", "nan", "\n", "\n", "\r\n",
        "v", "f", "o", "g", "usemtl", "\\\n", "\\", "#", "1/2", "3//1", "-1", "0", "1e", "curv", "\u{e9}"]), 0..120), glue in any::<bool>()) {
        let text = words.join(if glue { " " } else { "" });
        if let Ok(s) = bismar::format::stl::parse_text(text.as_bytes()) { runs(&s); }
        if let Ok(s) = bismar::format::obj::parse(text.as_bytes()) { runs(&s); }
        let _ = soup(&text);
    }
}
