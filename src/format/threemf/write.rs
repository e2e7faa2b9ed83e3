//! 3MF out: an object for each name, in the unit that is stated.

use std::collections::HashMap;
use std::io::{self, Write};
use std::path::Path;

use quick_xml::escape::escape;
use zip::write::{SimpleFileOptions, ZipWriter};

use crate::error::{Error, Kind, Result};
use crate::format::whole::write_whole;
use crate::format::write::{corners, decimal};
use crate::mesh::Soup;
use crate::quantity::LengthUnit;

const CONTENT_TYPES: &str = r#"<?xml version="1.0" encoding="UTF-8"?>
<Types xmlns="http://schemas.openxmlformats.org/package/2006/content-types"><Default Extension="rels" ContentType="application/vnd.openxmlformats-package.relationships+xml"/><Default Extension="model" ContentType="application/vnd.ms-package.3dmanufacturing-3dmodel+xml"/></Types>
"#;
const RELATIONSHIPS: &str = r#"<?xml version="1.0" encoding="UTF-8"?>
<Relationships xmlns="http://schemas.openxmlformats.org/package/2006/relationships"><Relationship Id="model" Type="http://schemas.microsoft.com/3dmanufacturing/2013/01/3dmodel" Target="/3D/3dmodel.model"/></Relationships>
"#;

/// What was written.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Written3mf {
    /// Triangles in the file.
    pub triangles: u64,
    /// Triangles with two corners in one place, which 3MF does not allow; they were left out. Their
    /// directed edges cancel, so that nothing is opened.
    pub left_out: u64,
}

/// Writes a 3MF package: an object for each name of the soup, each place once as a vertex, in the
/// shortest decimals that give the same f64 back; materials as base materials; an item of the
/// build for each object. Where `closed` is false the objects are of the type `surface`, since
/// 3MF demands of a `model` that it is closed.
///
/// # Errors
/// `empty` where no triangle has three corners in three places, `cannot-write`.
pub fn write_3mf(path: &Path, soup: &Soup, unit: LengthUnit, closed: bool) -> Result<Written3mf> {
    let objects = objects(soup);
    let triangles: usize = objects.iter().map(|o| o.triangles.len()).sum();
    let left_out = soup.triangles.count() - triangles;
    if triangles == 0 {
        return Err(Error::new(
            Kind::Empty,
            "no triangle has its corners in three places",
            "export the mesh again",
        )
        .in_file(path));
    }
    write_whole(path, |w| package(w, soup, &objects, unit, closed))?;
    Ok(Written3mf {
        triangles: triangles as u64,
        left_out: left_out as u64,
    })
}

struct Object {
    name: u32,
    vertices: Vec<[f64; 3]>,
    triangles: Vec<([u32; 3], Option<u32>)>,
}

/// The triangles by name, in order of first appearance.
fn objects(soup: &Soup) -> Vec<Object> {
    let mut out: Vec<Object> = Vec::new();
    let mut seen: HashMap<u32, usize> = HashMap::new();
    let mut numbers: Vec<HashMap<[u64; 3], u32>> = Vec::new();
    for run in soup.runs.iter().filter(|r| r.count > 0) {
        let at = *seen.entry(run.name).or_insert_with(|| {
            out.push(Object {
                name: run.name,
                vertices: Vec::new(),
                triangles: Vec::new(),
            });
            numbers.push(HashMap::new());
            out.len() - 1
        });
        let (object, numbers) = (&mut out[at], &mut numbers[at]);
        for t in run.first..run.first + run.count {
            let face = corners(soup, t).map(|p| {
                // −0 and 0 are one place.
                let p = p.map(|x| x + 0.0);
                *numbers.entry(p.map(f64::to_bits)).or_insert_with(|| {
                    object.vertices.push(p);
                    // Corners are fewer than 2³²: the mesh was welded, which numbers them so.
                    (object.vertices.len() - 1) as u32
                })
            });
            let [a, b, c] = face;
            if a != b && b != c && c != a {
                object.triangles.push((face, run.material));
            }
        }
    }
    out.retain(|o| !o.triangles.is_empty());
    out
}

fn package(
    w: &mut dyn Write,
    soup: &Soup,
    objects: &[Object],
    unit: LengthUnit,
    closed: bool,
) -> io::Result<()> {
    let mut zip = ZipWriter::new_stream(w);
    let plain = SimpleFileOptions::default();
    for (name, text) in [
        ("[Content_Types].xml", CONTENT_TYPES),
        ("_rels/.rels", RELATIONSHIPS),
    ] {
        zip.start_file(name, plain)?;
        zip.write_all(text.as_bytes())?;
    }
    // Sizes are not known before; beyond 4 GiB the entry needs wide fields.
    let guess = objects
        .iter()
        .map(|o| 100 * o.vertices.len() + 60 * o.triangles.len());
    let is_large = guess.sum::<usize>() as u64 >= u64::from(u32::MAX);
    zip.start_file("3D/3dmodel.model", plain.large_file(is_large))?;
    let mut out = io::BufWriter::with_capacity(1 << 16, &mut zip);
    model(&mut out, soup, objects, unit, closed)?;
    out.flush()?;
    drop(out);
    zip.finish()?.into_inner().flush()
}

fn model(
    w: &mut dyn Write,
    soup: &Soup,
    objects: &[Object],
    unit: LengthUnit,
    closed: bool,
) -> io::Result<()> {
    let unit = match unit {
        LengthUnit::Mm => "millimeter",
        LengthUnit::Cm => "centimeter",
        LengthUnit::M => "meter",
        LengthUnit::In => "inch",
        LengthUnit::Ft => "foot",
    };
    writeln!(w, r#"<?xml version="1.0" encoding="UTF-8"?>"#)?;
    writeln!(
        w,
        r#"<model unit="{unit}" xml:lang="en-US" xmlns="http://schemas.microsoft.com/3dmanufacturing/core/2015/02">"#
    )?;
    writeln!(
        w,
        r#"<metadata name="Application">bismar {}</metadata>"#,
        env!("CARGO_PKG_VERSION")
    )?;
    writeln!(w, "<resources>")?;
    let used = |o: &Object| o.triangles.iter().any(|t| t.1.is_some());
    let materials = objects.iter().any(used) && !soup.materials.is_empty();
    if materials {
        writeln!(w, r#"<basematerials id="1">"#)?;
        for name in &soup.materials {
            writeln!(
                w,
                r##"<base name="{}" displaycolor="#808080FF"/>"##,
                escape(printable(name))
            )?;
        }
        writeln!(w, "</basematerials>")?;
    }
    let kind = if closed { "model" } else { "surface" };
    for (i, object) in objects.iter().enumerate() {
        write!(w, r#"<object id="{}" type="{kind}""#, i + 2)?;
        if let Some(name) = soup
            .names
            .get(object.name as usize)
            .and_then(Option::as_ref)
        {
            write!(w, r#" name="{}""#, escape(printable(name)))?;
        }
        // A triangle's own material wins; the object's is for programs that look at nothing else.
        let first = object
            .triangles
            .iter()
            .find_map(|t| t.1)
            .filter(|_| materials);
        let all = first.filter(|m| object.triangles.iter().all(|t| t.1 == Some(*m)));
        if let Some(m) = all {
            write!(w, r#" pid="1" pindex="{m}""#)?;
        }
        writeln!(w, "><mesh><vertices>")?;
        for [x, y, z] in object.vertices.iter().map(|p| p.map(decimal)) {
            writeln!(w, r#"<vertex x="{x}" y="{y}" z="{z}"/>"#)?;
        }
        writeln!(w, "</vertices><triangles>")?;
        for ([a, b, c], material) in &object.triangles {
            write!(w, r#"<triangle v1="{a}" v2="{b}" v3="{c}""#)?;
            if let Some(m) = material.filter(|_| materials && all.is_none()) {
                write!(w, r#" pid="1" p1="{m}""#)?;
            }
            writeln!(w, "/>")?;
        }
        writeln!(w, "</triangles></mesh></object>")?;
    }
    writeln!(w, "</resources>")?;
    writeln!(w, "<build>")?;
    for i in 0..objects.len() {
        writeln!(w, r#"<item objectid="{}"/>"#, i + 2)?;
    }
    writeln!(w, "</build>")?;
    writeln!(w, "</model>")
}

/// A name without what XML cannot hold.
fn printable(name: &str) -> String {
    let ok = |c: char| !c.is_control() && !matches!(c, '\u{fffe}' | '\u{ffff}');
    let text: String = name.chars().map(|c| if ok(c) { c } else { ' ' }).collect();
    text.trim().to_owned()
}
