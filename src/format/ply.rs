//! PLY (Turk, "The PLY Polygon File Format", Stanford 1994): text, or binary of either byte order.
//!
//! Of the element `vertex` the properties `x`, `y` and `z` are read, of any type and in any order;
//! of the element `face` the list `vertex_indices` (or `vertex_index`). Everything else is skipped.
//! Numbers in text keep the value written, also where the header calls them `float`. The file names
//! no bodies and states no unit.

mod body;
mod header;

use crate::error::{Error, Kind, Result};
use crate::format::chunk::line_of;
use crate::format::faces::Faces;
use crate::format::number::Written;
use crate::mesh::{Run, Soup, Triangles};
use body::{Binary, Place, Text, Values};
use header::{Element, Encoding, Header, Property, Scalar};

const AGAIN: &str = "export or copy the file again";

/// Reads a PLY. Polygons are cut as those of an OBJ are.
///
/// # Errors
/// `unknown-format` for a header that is none, `truncated`, `count-mismatch`, `bad-number`,
/// `not-finite`, `bad-index`, `too-large` with the line or the byte, and `empty`.
pub fn parse(bytes: &[u8]) -> Result<Soup> {
    let header = header::parse(bytes)?;
    let rest = bytes.len() - header.end;
    let read = match header.encoding {
        Encoding::Text => {
            let mut values = Text::new(bytes, header.end);
            read(&header, &mut values, rest)?
        }
        Encoding::LittleEndian => {
            let mut values = Binary::<false>::new(bytes, header.end);
            read(&header, &mut values, rest)?
        }
        Encoding::BigEndian => {
            let mut values = Binary::<true>::new(bytes, header.end);
            read(&header, &mut values, rest)?
        }
    };
    let Read {
        vertices,
        faces,
        written,
    } = read;
    if faces.triangles() == 0 {
        return Err(Error::new(
            Kind::Empty,
            format!(
                "the file holds no face of three or more corners ({} vertices)",
                vertices.len()
            ),
            "export the mesh again with its faces; points enclose nothing",
        ));
    }
    let text = (header.encoding == Encoding::Text).then_some(bytes);
    let notes = faces.note(|at| text.map(|t| line_of(t, at)));
    let (corners, warped) = faces.cut(&vertices, written, text);
    Ok(Soup {
        names: vec![None],
        runs: vec![Run {
            first: 0,
            count: corners.len(),
            name: 0,
            material: None,
        }],
        triangles: Triangles::Indexed { vertices, corners },
        warped,
        notes: notes.into_iter().collect(),
        ..Soup::default()
    })
}

struct Read {
    vertices: Vec<[f64; 3]>,
    faces: Faces,
    written: Written,
}

fn read<'a, V: Values<'a>>(header: &Header, values: &mut V, rest: usize) -> Result<Read> {
    let declared = |name: &str| header.elements.iter().find(|e| e.name == name);
    let Some(points) = declared("vertex") else {
        return Err(Error::new(
            Kind::Empty,
            "the header declares no element \"vertex\"",
            AGAIN,
        ));
    };
    if points.count >= u64::from(u32::MAX) {
        return Err(Error::new(
            Kind::TooLarge,
            format!(
                "the header declares {} vertices; at most {} are read",
                points.count,
                u32::MAX - 1
            ),
            "split the file",
        )
        .at_line(points.line));
    }
    if let Some(strips) = declared("tristrips") {
        return Err(Error::new(
            Kind::UnknownFormat,
            "its faces are triangle strips (element \"tristrips\"), which are not read",
            "export the mesh again with an element \"face\"",
        )
        .at_line(strips.line));
    }
    let mut out = Read {
        vertices: Vec::new(),
        faces: Faces::default(),
        written: Written::default(),
    };
    for element in &header.elements {
        match element.name.as_str() {
            "vertex" => read_vertices(element, values, rest, &mut out)?,
            "face" => read_faces(element, points.count as u32, values, rest, &mut out)?,
            _ => skip(element, values)?,
        }
    }
    values.end()?;
    Ok(out)
}

/// Entries to make room for at once: what is declared, but no more than the bytes could hold.
fn room(element: &Element, rest: usize) -> usize {
    let least = element.least_size().max(1);
    usize::try_from(element.count).map_or(rest, |n| n.min(rest / least + 1))
}

fn read_vertices<'a, V: Values<'a>>(
    element: &Element,
    values: &mut V,
    rest: usize,
    out: &mut Read,
) -> Result<()> {
    let mut axes = Vec::with_capacity(element.properties.len());
    let mut found = [None; 3];
    for property in &element.properties {
        let axis = ["x", "y", "z"].iter().position(|a| *a == property.name);
        match (axis, property.list) {
            (Some(axis), None) => {
                found[axis] = Some(property.scalar);
                axes.push(Some(axis));
            }
            _ => axes.push(None),
        }
    }
    let [Some(x), Some(y), Some(z)] = found else {
        return Err(Error::new(
            Kind::UnknownFormat,
            "the element \"vertex\" has no properties x, y and z",
            AGAIN,
        )
        .at_line(element.line));
    };
    if V::BINARY {
        out.written = Written::binary([x, y, z].contains(&Scalar::F32));
    }
    out.vertices.reserve_exact(room(element, rest));
    for _ in 0..element.count {
        values.begin(element)?;
        let mut point = [0.0; 3];
        for (property, axis) in element.properties.iter().zip(&axes) {
            match axis {
                Some(axis) => {
                    point[*axis] = values.coordinate(property, &mut out.written)?;
                }
                None => values.skip(property)?,
            }
        }
        values.finish()?;
        out.vertices.push(point);
    }
    Ok(())
}

fn read_faces<'a, V: Values<'a>>(
    element: &Element,
    vertices: u32,
    values: &mut V,
    rest: usize,
    out: &mut Read,
) -> Result<()> {
    let is_corners = |p: &Property| {
        p.list.is_some() && matches!(p.name.as_str(), "vertex_indices" | "vertex_index")
    };
    let Some(corners) = element.properties.iter().position(is_corners) else {
        return Err(Error::new(
            Kind::UnknownFormat,
            "the element \"face\" has no list \"vertex_indices\"",
            AGAIN,
        )
        .at_line(element.line));
    };
    out.faces = Faces::with_room(room(element, rest), rest);
    let mut indices = Vec::new();
    for face in 0..element.count {
        let place = values.begin(element)?;
        for (i, property) in element.properties.iter().enumerate() {
            if i != corners {
                values.skip(property)?;
                continue;
            }
            indices.clear();
            let length = values.length(property)?;
            for _ in 0..length {
                let (index, at) = values.index(property)?;
                match u32::try_from(index) {
                    Ok(index) if index < vertices => indices.push(index),
                    _ => return Err(bad_index(face, index, vertices, at)),
                }
            }
        }
        values.finish()?;
        out.faces
            .push(&indices, place.at())
            .map_err(|e| place.mark(e))?;
    }
    Ok(())
}

fn bad_index(face: u64, index: i64, vertices: u32, at: Place<'_>) -> Error {
    at.mark(Error::new(
        Kind::BadIndex,
        format!(
            "face {face} refers to vertex {index}; vertices count from 0 and there are {vertices}"
        ),
        "export or copy the file again; vertices are missing or the index is wrong",
    ))
}

fn skip<'a, V: Values<'a>>(element: &Element, values: &mut V) -> Result<()> {
    for _ in 0..element.count {
        values.begin(element)?;
        for property in &element.properties {
            values.skip(property)?;
        }
        values.finish()?;
    }
    Ok(())
}

#[cfg(test)]
mod tests;
