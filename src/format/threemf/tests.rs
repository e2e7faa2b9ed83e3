use std::io::Write;

use super::*;
use crate::mesh::{Mesh, Triangles};
use crate::quantity::LengthUnit;
use proptest::prelude::*;
use zip::write::{SimpleFileOptions, ZipWriter};

const RELS: &str = r#"<Relationships xmlns="http://schemas.openxmlformats.org/package/2006/relationships"><Relationship Id="a" Type="http://schemas.openxmlformats.org/package/2006/relationships/metadata/thumbnail" Target="/t.png"/><Relationship Id="b" Type="http://schemas.microsoft.com/3dmanufacturing/2013/01/3dmodel" Target="/3D/body.model"/></Relationships>"#;
const HEAD: &str = r#"<?xml version="1.0" encoding="UTF-8"?>
<model unit="centimeter" xmlns="http://schemas.microsoft.com/3dmanufacturing/core/2015/02" xmlns:m="http://schemas.microsoft.com/3dmanufacturing/material/2015/02" xmlns:b="http://schemas.microsoft.com/3dmanufacturing/beamlattice/2017/02">
"#;
/// A corner tetrahedron with legs 5, 4 and 3: volume 10.
const TETRA: &str = r#"<mesh>
<vertices><vertex x="0" y="0" z="0"/><vertex x="5" y="0" z="0"/><vertex x="0" y="4" z="0"/><vertex x="0" y="0" z="3"/></vertices>
<triangles><triangle v1="0" v2="2" v3="1"/><triangle v1="0" v2="1" v3="3"/><triangle v1="1" v2="2" v3="3"/><triangle v1="0" v2="3" v3="2"/></triangles>
</mesh>"#;

fn package(entries: &[(&str, &str)]) -> Vec<u8> {
    let mut zip = ZipWriter::new(std::io::Cursor::new(Vec::new()));
    for (name, text) in entries {
        zip.start_file(*name, SimpleFileOptions::default()).unwrap();
        zip.write_all(text.as_bytes()).unwrap();
    }
    zip.finish().unwrap().into_inner()
}

fn of_model(model: &str) -> Result<Soup> {
    parse(&package(&[("_rels/.rels", RELS), ("3D/body.model", model)]))
}

/// Resources and build in the usual head.
fn of(resources: &str, build: &str) -> Result<Soup> {
    of_model(&format!(
        "{HEAD}<resources>\n{resources}\n</resources>\n<build>\n{build}\n</build>\n</model>"
    ))
}

fn volumes(soup: Soup) -> Vec<(String, f64)> {
    let mesh = Mesh::new(soup, "stem").unwrap();
    let of = |b| (mesh.solid(b, None).unwrap().moments.zeroth * 1e9).round() / 1e9;
    mesh.bodies()
        .iter()
        .map(|b| (b.id.clone(), of(b)))
        .collect()
}

#[test]
fn items_and_components_place_objects() {
    let resources = format!(
        r#"<basematerials id="9"><base name="steel S235" displaycolor="FF0000"/><base name="PETG" displaycolor="00FF00"/></basematerials>
        <object id="1" name="wheel" pid="9" pindex="1">{TETRA}</object>
        <object id="2">{TETRA}</object>
        <object id="3" type="solidsupport">{TETRA}</object>
        <object id="4" name="chassis" partnumber="C-1"><components><component objectid="1"/><component objectid="1" transform="-1 0 0 0 1 0 0 0 2 100 0 0"/><component objectid="2" transform="1 0 0 0 1 0 0 0 1 0 50 0"/><component objectid="3"/></components></object>
        <object id="5" name="spare">{TETRA}</object>"#
    );
    let build = r#"<item objectid="4" transform="0 1 0 -1 0 0 0 0 1 7 8 9"/><item objectid="2" transform="1 0 0 0 1 0 0 0 1 500 0 0"/><item objectid="2" partnumber="P-7"/>"#;
    let soup = of(&resources, build).unwrap();
    assert_eq!(soup.unit, Some(LengthUnit::Cm));
    assert_eq!(soup.materials, ["PETG"]);
    let kinds: Vec<_> = soup.notes.iter().map(|n| n.kind).collect();
    assert_eq!(kinds, ["supports-ignored", "objects-unbuilt"]);
    let Triangles::Indexed { vertices, .. } = &soup.triangles else {
        unreachable!()
    };
    // The vertex (5 0 0) of the first wheel goes through the item's transform: rows times matrix.
    assert_eq!(vertices[1], [7.0, 13.0, 9.0]);
    // That of the second is mirrored to 95 first.
    assert_eq!(vertices[5], [7.0, 103.0, 9.0]);
    assert_eq!(
        volumes(soup),
        [
            ("wheel".into(), 10.0),
            // Mirrored and stretched, and still outward: positive without being turned.
            ("wheel/2".into(), 20.0),
            ("chassis".into(), 10.0),
            ("stem".into(), 10.0),
            ("P-7".into(), 10.0),
        ]
    );
}

#[test]
fn copies_that_touch_stay_two_bodies() {
    let resources = format!(r#"<object id="1" name="wheel">{TETRA}</object>"#);
    // Both in one place: welded they would be facets that stand twice.
    let soup = of(&resources, r#"<item objectid="1"/><item objectid="1"/>"#).unwrap();
    let mesh = Mesh::new(soup, "x").unwrap();
    assert!(mesh.bodies().iter().all(|b| mesh.solid(b, None).is_ok()));
    let ids: Vec<_> = mesh.bodies().iter().map(|b| &b.id).collect();
    assert_eq!(ids, ["wheel", "wheel/2"]);
    // A mirrored one is not turned by the reader of shells.
    let soup = of(
        &resources,
        r#"<item objectid="1" transform="-1 0 0 0 1 0 0 0 1 0 0 0"/>"#,
    );
    assert!(!Mesh::new(soup.unwrap(), "x").unwrap().bodies()[0].turned);
}

#[test]
fn units_are_the_files_own() {
    for (unit, expected) in [
        ("millimeter", LengthUnit::Mm),
        ("inch", LengthUnit::In),
        ("foot", LengthUnit::Ft),
        ("meter", LengthUnit::M),
        ("micron", LengthUnit::Mm),
    ] {
        let head = HEAD.replace("centimeter", unit);
        let model = format!(
            r#"{head}<resources><object id="1">{TETRA}</object></resources><build><item objectid="1" transform="1 0 0 0 1 0 0 0 1 1.1 0 2e1"/></build></model>"#
        );
        let soup = of_model(&model).unwrap();
        assert_eq!(soup.unit, Some(expected));
        let Triangles::Indexed { vertices, .. } = &soup.triangles else {
            unreachable!()
        };
        // Decimals are moved before they are read: no second rounding.
        let (a, b) = if unit == "micron" {
            (0.0011, 0.023)
        } else {
            (1.1, 23.0)
        };
        assert_eq!((vertices[0][0], vertices[3][2]), (a, b));
    }
    let default = HEAD.replace(r#"unit="centimeter" "#, "");
    let rest = format!(
        r#"<resources><object id="1">{TETRA}</object></resources><build><item objectid="1"/></build></model>"#
    );
    assert_eq!(
        of_model(&(default + &rest)).unwrap().unit,
        Some(LengthUnit::Mm)
    );
    let e = of_model(&(HEAD.replace("centimeter", "furlong") + &rest)).unwrap_err();
    assert_eq!((e.kind, e.line), (Kind::Unit, Some(2)));
}

#[test]
fn rules_of_the_specification_are_kept() {
    let object = format!(r#"<object id="1">{TETRA}</object>"#);
    let item = r#"<item objectid="1"/>"#;
    assert!(of(&object, item).is_ok());
    // (what stands in its place, in what, kind, line)
    let wrong: &[(&str, &str, Kind, u64)] = &[
        ("v2=\"2\" v3=\"1\"", "v2=\"2\" v3=\"4\"", Kind::BadIndex, 6),
        ("v2=\"2\" v3=\"1\"", "v2=\"0\" v3=\"1\"", Kind::BadIndex, 6),
        ("v2=\"2\" v3=\"1\"", "v2=\"2\"", Kind::UnknownFormat, 6),
        ("v2=\"2\" v3=\"1\"", "v2=\"2\" v3=\"x\"", Kind::BadNumber, 6),
        (
            "v2=\"2\" v3=\"1\"",
            "v2=\"2\" v3=\"1\" v3=\"1\"",
            Kind::UnknownFormat,
            6,
        ),
        (
            "v3=\"1\"/>",
            "v3=\"1\" pid=\"7\" p1=\"0\"/>",
            Kind::UnknownName,
            6,
        ),
        ("x=\"5\"", "x=\"5,0\"", Kind::BadNumber, 5),
        ("x=\"5\"", "x=\"INF\"", Kind::NotFinite, 5),
        ("x=\"5\"", "", Kind::UnknownFormat, 5),
        ("id=\"1\"", "id=\"0\"", Kind::BadNumber, 4),
        ("id=\"1\"", "id=\"2147483648\"", Kind::BadNumber, 4),
        ("id=\"1\"", "", Kind::UnknownFormat, 4),
        (
            "id=\"1\"",
            "id=\"1\" type=\"thing\"",
            Kind::UnknownFormat,
            4,
        ),
        ("id=\"1\"", "id=\"1\" pindex=\"0\"", Kind::UnknownFormat, 4),
        (
            "id=\"1\"",
            "id=\"1\" pid=\"3\" pindex=\"0\"",
            Kind::UnknownName,
            4,
        ),
        ("<vertices>", "<vertexes>", Kind::UnknownFormat, 5),
        ("</mesh>", "</mesh><mesh></mesh>", Kind::UnknownFormat, 7),
        ("</mesh>", "</mush>", Kind::UnknownFormat, 7),
        ("</mesh>", "&bomb;</mesh>", Kind::UnknownFormat, 7),
        ("</mesh>", "<triangles/></mesh>", Kind::UnknownFormat, 7),
    ];
    for (from, to, kind, line) in wrong {
        assert!(object.contains(from), "{from}");
        let e = of(&object.replacen(from, to, 1), item).unwrap_err();
        assert_eq!((e.kind, e.line), (*kind, Some(*line)), "{from} → {to}: {e}");
        assert!(e.message.starts_with("3D/body.model: "), "{e}");
    }
    let e = |resources: &str, build: &str| {
        let e = of(resources, build).unwrap_err();
        (e.kind, e.line.is_some())
    };
    let twice = format!("{object}{object}");
    assert_eq!(e(&twice, item), (Kind::AmbiguousName, true));
    let shared =
        format!(r#"<m:colorgroup id="1"><m:color color="FFFFFF"/></m:colorgroup>{object}"#);
    assert_eq!(e(&shared, item), (Kind::AmbiguousName, true));
    // To an object after it, to itself, to none.
    for to in [1, 2, 3] {
        let resources = format!(
            r#"<object id="2"><components><component objectid="{to}"/></components></object>{object}"#
        );
        assert_eq!(e(&resources, item), (Kind::UnknownName, true));
    }
    assert_eq!(
        e(&object, r#"<item objectid="2"/>"#),
        (Kind::UnknownName, true)
    );
    assert_eq!(e(&object, ""), (Kind::Empty, false));
    assert_eq!(
        e(&object.replace("id=", "type=\"other\" id="), item),
        (Kind::UnknownFormat, true)
    );
    assert_eq!(
        e(&object.replace("id=", "type=\"support\" id="), item),
        (Kind::Empty, false)
    );
    for transform in [
        "1 0 0 0 1 0 0 0 1 0 0",
        "1 0 0 0 1 0 0 0 1 0 0 0 0",
        "1 0 0 0 1 0 0 0 0 0 0 0",
        "1 0 0 0 1 0 0 0 1 0 0 x",
    ] {
        let item = format!(r#"<item objectid="1" transform="{transform}"/>"#);
        assert_eq!(e(&object, &item), (Kind::BadNumber, true), "{transform}");
    }
    let far = r#"<item objectid="1" transform="1e60 0 0 0 1 0 0 0 1 0 0 0"/>"#;
    assert_eq!(e(&object, far), (Kind::NotFinite, false));
    let bases = format!(
        r#"<basematerials id="3"><base name="a" displaycolor="000000"/></basematerials>{}"#,
        object.replace("id=", "pid=\"3\" pindex=\"1\" id=")
    );
    assert_eq!(e(&bases, item), (Kind::BadIndex, true));
    let path = r#"<item objectid="1" p:path="/3D/other.model"/>"#;
    assert_eq!(e(&object, path), (Kind::UnknownFormat, true));
    let beams = object.replace("</mesh>", "<b:beamlattice/></mesh>");
    let soup = of(&beams, item).unwrap();
    assert_eq!(soup.notes[0].kind, "extensions-ignored");
}

#[test]
fn extensions_and_document_types_are_refused() {
    let rest = format!(
        r#"<resources><object id="1">{TETRA}</object></resources><build><item objectid="1"/></build></model>"#
    );
    let required = |prefix: &str| {
        let head = HEAD.replace(
            "<model ",
            &format!("<model requiredextensions=\"{prefix}\" "),
        );
        of_model(&(head + &rest))
    };
    assert!(required("m").is_ok());
    let e = required("m b").unwrap_err();
    assert!(
        e.kind == Kind::UnknownFormat && e.message.contains("beamlattice"),
        "{e}"
    );
    assert_eq!(required("q").unwrap_err().kind, Kind::UnknownFormat);
    let bomb = HEAD.replace(
        "<model ",
        "<!DOCTYPE m [<!ENTITY a \"aaaa\"><!ENTITY b \"&a;&a;\">]>\n<model ",
    );
    let e = of_model(&(bomb + &rest)).unwrap_err();
    assert!(
        e.kind == Kind::UnknownFormat && e.message.contains("document type"),
        "{e}"
    );
    let utf16 = HEAD.replace("UTF-8", "UTF-16");
    assert_eq!(
        of_model(&(utf16 + &rest)).unwrap_err().kind,
        Kind::UnknownFormat
    );
    // A prefix is as good as none, and another space is not.
    let prefixed = (HEAD.to_owned() + &rest)
        .replace("xmlns=", "xmlns:c=")
        .replace("</", "</c:")
        .replace('<', "<c:")
        .replace("<c:/", "</")
        .replace("<c:?", "<?");
    assert!(of_model(&prefixed).is_ok(), "{:?}", of_model(&prefixed));
    let other = HEAD.replace("core/2015/02", "core/2099/02");
    assert_eq!(
        of_model(&(other + &rest)).unwrap_err().kind,
        Kind::UnknownFormat
    );
}

#[test]
fn packages_are_held_to_their_relationships_and_size() {
    let model = format!(
        r#"{HEAD}<resources><object id="1">{TETRA}</object></resources><build><item objectid="1"/></build></model>"#
    );
    let kind = |entries: &[(&str, &str)]| parse(&package(entries)).map(|_| ()).map_err(|e| e.kind);
    assert_eq!(
        kind(&[("_rels/.rels", RELS), ("3d/Body.MODEL", &model)]),
        Ok(())
    );
    let unknown = Err(Kind::UnknownFormat);
    assert_eq!(kind(&[("3D/body.model", &model)]), unknown);
    assert_eq!(kind(&[("_rels/.rels", RELS)]), unknown);
    let without = RELS.replace("2013/01/3dmodel", "2013/01/texture");
    assert_eq!(
        kind(&[("_rels/.rels", &without), ("3D/body.model", &model)]),
        unknown
    );
    let two = RELS.replace("metadata/thumbnail", "x").replace(
        "http://schemas.openxmlformats.org/package/2006/relationships/x",
        "http://schemas.microsoft.com/3dmanufacturing/2013/01/3dmodel",
    );
    assert_eq!(
        kind(&[("_rels/.rels", &two), ("3D/body.model", &model)]),
        unknown
    );
    let external = RELS.replace("Target=\"/3D", "TargetMode=\"External\" Target=\"/3D");
    assert_eq!(
        kind(&[("_rels/.rels", &external), ("3D/body.model", &model)]),
        unknown
    );
    let bomb = format!("{model}{}", " ".repeat(64 << 20));
    let packed = package(&[("_rels/.rels", RELS), ("3D/body.model", &bomb)]);
    assert!(packed.len() < 1 << 20);
    assert_eq!(parse(&packed).unwrap_err().kind, Kind::TooLarge);
    let whole = package(&[("_rels/.rels", RELS), ("3D/body.model", &model)]);
    for end in [30, whole.len() / 2, whole.len() - 1] {
        assert!(parse(&whole[..end]).is_err());
    }
}

#[test]
fn copies_of_copies_are_counted_before_they_are_made() {
    let doubled = |levels: u32| {
        let mut resources = format!(r#"<object id="1">{TETRA}</object>"#);
        for level in 2..=levels {
            let inner = level - 1;
            resources += &format!(
                r#"<object id="{level}"><components><component objectid="{inner}"/><component objectid="{inner}" transform="1 0 0 0 1 0 0 0 1 {level} 0 0"/></components></object>"#
            );
        }
        of(&resources, &format!(r#"<item objectid="{levels}"/>"#))
    };
    assert_eq!(doubled(4).unwrap().runs.len(), 8);
    assert_eq!(doubled(30).unwrap_err().kind, Kind::TooLarge);
    assert_eq!(doubled(70).unwrap_err().kind, Kind::TooLarge);
    let mut chain = format!(r#"<object id="1">{TETRA}</object>"#);
    for id in 2..40 {
        chain += &format!(
            r#"<object id="{id}"><components><component objectid="{}"/></components></object>"#,
            id - 1
        );
    }
    assert!(of(&chain, r#"<item objectid="32"/>"#).is_ok());
    let e = of(&chain, r#"<item objectid="33"/>"#).unwrap_err();
    assert_eq!(e.kind, Kind::TooLarge);
}

fn written(soup: &Soup, unit: LengthUnit, closed: bool) -> (Written3mf, Soup) {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("out.3mf");
    let done = write_3mf(&path, soup, unit, closed).unwrap();
    (done, parse(&std::fs::read(&path).unwrap()).unwrap())
}

#[test]
fn what_is_written_comes_back_with_names_materials_and_unit() {
    let resources = format!(
        r#"<basematerials id="9"><base name="steel &lt;1&gt;" displaycolor="FF0000"/><base name="PETG" displaycolor="00FF00"/></basematerials>
        <object id="1" name="wheel &amp; &quot;axle&quot;" pid="9" pindex="1">{}</object>"#,
        TETRA.replace("v1=\"1\"", "pid=\"9\" p1=\"0\" v1=\"1\"")
    );
    let soup = of(&resources, r#"<item objectid="1"/>"#).unwrap();
    assert_eq!(soup.names, [Some("wheel & \"axle\"".into())]);
    let (done, back) = written(&soup, LengthUnit::In, true);
    assert_eq!((done.triangles, done.left_out), (4, 0));
    assert_eq!(
        (back.unit, &back.names),
        (Some(LengthUnit::In), &soup.names)
    );
    assert_eq!(back.materials, soup.materials);
    assert_eq!(back.runs, soup.runs);
    let again = written(&soup, LengthUnit::Cm, false).1;
    assert_eq!(volumes(again), volumes(soup));
}

proptest! {
    #[test]
    fn writing_keeps_every_bit(
        points in prop::collection::vec(prop::array::uniform3(prop::num::f64::NORMAL), 3..12),
        picks in prop::collection::vec(prop::array::uniform3(0usize..1000), 1..12),
    ) {
        let points: Vec<[f64; 3]> = points.into_iter().map(|p| p.map(|x| if x.abs() > 1e60 { x.signum() } else { x })).collect();
        let faces: Vec<[[f64; 3]; 3]> = picks.iter().map(|f| f.map(|i| points[i % points.len()])).collect();
        let plain: Vec<_> = faces.iter().filter(|[a, b, c]| a != b && b != c && c != a).copied().collect();
        prop_assume!(!plain.is_empty());
        let soup = Soup {
            names: vec![Some("a".into())],
            runs: vec![crate::mesh::Run { first: 0, count: faces.len(), name: 0, material: None }],
            triangles: Triangles::Loose(faces.clone()),
            ..Soup::default()
        };
        let (done, back) = written(&soup, LengthUnit::Mm, true);
        prop_assert_eq!(done.left_out as usize, faces.len() - plain.len());
        let Triangles::Indexed { vertices, corners } = &back.triangles else { unreachable!() };
        let read: Vec<_> = corners.iter().map(|t| t.map(|i| vertices[i as usize])).collect();
        prop_assert_eq!(read, plain);
    }

    #[test]
    fn damaged_models_are_answered(at in 0usize..900, byte in 0u8..128) {
        let mut model = format!(r#"{HEAD}<resources><object id="1">{TETRA}</object></resources><build><item objectid="1"/></build></model>"#).into_bytes();
        let at = at % model.len();
        model[at] = byte;
        let _ = of_model(std::str::from_utf8(&model).unwrap());
    }
}
