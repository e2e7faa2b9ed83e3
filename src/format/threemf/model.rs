//! The model part: its unit, resources and build, each rule of the core specification checked
//! where it stands.

use std::collections::{HashMap, HashSet};

use nalgebra::{Matrix3, Vector3};
use quick_xml::events::{BytesStart, Event};

use super::xml::Reader;
use super::{AGAIN, bad};
use crate::error::{Error, Kind, Result};
use crate::format::number::{MAX_COORDINATE, Written, not_a_number, real};
use crate::format::pieces::Placing;
use crate::mesh::ReaderNote;
use crate::quantity::LengthUnit;

const CORE: &str = "http://schemas.microsoft.com/3dmanufacturing/core/2015/02";

/// Extensions that may be required because they leave the surfaces of objects as they are. Of the
/// production extension the ids are passed over; models in other parts are refused.
const HARMLESS: &[&str] = &[
    "http://schemas.microsoft.com/3dmanufacturing/material/2015/02",
    "http://schemas.microsoft.com/3dmanufacturing/production/2015/06",
];

#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum ObjectType {
    Model,
    Support,
    Surface,
    Other,
}

/// Material of a triangle: group and index in it.
pub(super) type MaterialKey = (u32, u32);

#[derive(Debug)]
pub(super) struct Component {
    /// Index of the object among those before.
    pub(super) object: usize,
    pub(super) placing: Placing,
}

#[derive(Debug)]
pub(super) enum Shape {
    Mesh {
        vertices: Vec<[f64; 3]>,
        triangles: Vec<([u32; 3], Option<MaterialKey>)>,
    },
    Components(Vec<Component>),
}

#[derive(Debug)]
pub(super) struct Object {
    pub(super) kind: ObjectType,
    pub(super) name: Option<String>,
    pub(super) part_number: Option<String>,
    pub(super) shape: Shape,
}

#[derive(Debug)]
pub(super) struct Item {
    pub(super) object: usize,
    pub(super) placing: Placing,
    pub(super) part_number: Option<String>,
}

#[derive(Debug)]
pub(super) struct Model {
    pub(super) unit: LengthUnit,
    pub(super) objects: Vec<Object>,
    pub(super) items: Vec<Item>,
    /// Names of base materials by the id of their group.
    pub(super) materials: HashMap<u32, Vec<String>>,
    pub(super) notes: Vec<ReaderNote>,
}

/// Reads the model part.
pub(super) fn parse(text: &str) -> Result<Model> {
    let mut parser = Parser {
        reader: Reader::new(text),
        prefix: String::new(),
        shift: 0,
        ids: HashSet::new(),
        objects_by_id: HashMap::new(),
        extensions: Vec::new(),
        model: Model {
            unit: LengthUnit::Mm,
            objects: Vec::new(),
            items: Vec::new(),
            materials: HashMap::new(),
            notes: Vec::new(),
        },
    };
    parser.document()?;
    if !parser.extensions.is_empty() {
        parser.model.notes.push(ReaderNote {
            kind: "extensions-ignored",
            message: format!(
                "elements of extensions were ignored in its objects: {}",
                parser.extensions.join(", ")
            ),
            line: None,
            advice: "the figures are those of the plain triangles; export the mesh without extensions if that is not meant",
        });
    }
    Ok(parser.model)
}

struct Parser<'a> {
    reader: Reader<'a>,
    /// What stands before the names of core elements, with its colon.
    prefix: String,
    /// Decimals that lengths are moved by, so that they are in the unit of the model.
    shift: i32,
    /// Ids of all resources.
    ids: HashSet<u32>,
    objects_by_id: HashMap<u32, usize>,
    extensions: Vec<String>,
    model: Model,
}

/// Where an element of an extension stands.
#[derive(Clone, Copy)]
enum Within {
    /// Its id is a resource's.
    Resources,
    /// It could say more of an object than is read.
    Object,
    Other,
}

/// What stands next in an element.
enum Child<'a> {
    /// An element of the core, and whether things may stand in it.
    Core(String, BytesStart<'a>, bool),
    End,
}

fn id_of(what: &str, value: &str) -> Result<u32> {
    // Section 4: ids are positive and below 2^31.
    match value.parse::<u32>() {
        Ok(id) if id > 0 && id < 1 << 31 => Ok(id),
        _ => Err(Error::new(
            Kind::BadNumber,
            format!("{what} \"{value}\" is not a whole number from 1 to 2147483647"),
            AGAIN,
        )),
    }
}

fn index_of(what: &str, value: &str) -> Result<u32> {
    value.parse().map_err(|_| {
        Error::new(
            Kind::BadNumber,
            format!("{what} \"{value}\" is not an index"),
            AGAIN,
        )
    })
}

fn set<T>(slot: &mut Option<T>, value: T, key: &str) -> Result<()> {
    if slot.replace(value).is_some() {
        return Err(bad(format!(
            "its XML is not well formed: {key} is stated twice"
        )));
    }
    Ok(())
}

fn needed<T>(slot: Option<T>, element: &str, key: &str) -> Result<T> {
    slot.ok_or_else(|| bad(format!("a <{element}> has no {key}")))
}

fn named(value: &str) -> Option<String> {
    (!value.is_empty()).then(|| value.to_owned())
}

impl<'a> Parser<'a> {
    fn document(&mut self) -> Result<()> {
        let (root, open) = loop {
            match self.reader.next()? {
                Event::Start(e) => break (e, true),
                Event::Empty(e) => break (e, false),
                Event::Eof => return Err(bad("it holds no element <model>")),
                _ => {}
            }
        };
        self.root(&root)?;
        let mut built = false;
        loop {
            match self.children(open, Within::Other)? {
                Child::End => break,
                Child::Core(name, e, open) => match name.as_str() {
                    "metadata" => self.pass(open)?,
                    "resources" if !built => self.resources(open)?,
                    "build" if !built => {
                        built = true;
                        self.build(open)?;
                    }
                    _ => return Err(self.stranger(&e, "model")),
                },
            }
        }
        if !built {
            return Err(self.reader.fail(bad("the model has no <build>")));
        }
        loop {
            match self.reader.next()? {
                Event::Eof => return Ok(()),
                Event::Start(_) | Event::Empty(_) => {
                    return Err(self.reader.fail(bad("an element stands after the model")));
                }
                _ => {}
            }
        }
    }

    fn root(&mut self, e: &BytesStart<'_>) -> Result<()> {
        let name = e.name().into_inner();
        let (prefix, local) = match name.split_once(':') {
            Some((p, local)) => (p, local),
            None => ("", name),
        };
        let mut spaces = HashMap::new();
        let (mut unit, mut required) = (None, None);
        self.reader.attributes(e, |key, value| match key {
            "unit" => set(&mut unit, value.to_owned(), key),
            "requiredextensions" => set(&mut required, value.to_owned(), key),
            "xmlns" => {
                spaces.insert(String::new(), value.to_owned());
                Ok(())
            }
            _ => {
                if let Some(p) = key.strip_prefix("xmlns:") {
                    spaces.insert(p.to_owned(), value.to_owned());
                }
                Ok(())
            }
        })?;
        let space = spaces.get(prefix).map(String::as_str);
        if local != "model" || space != Some(CORE) {
            return Err(self.reader.fail(bad(format!(
                "its first element is <{name}> of {space:?}, where the core of 3MF has <model> of \
                 {CORE:?}"
            ))));
        }
        if !prefix.is_empty() {
            self.prefix = format!("{prefix}:");
        }
        for extension in required.unwrap_or_default().split_ascii_whitespace() {
            let Some(space) = spaces.get(extension) else {
                return Err(self.reader.fail(bad(format!(
                    "it requires the extension \"{extension}\" and does not say what that is"
                ))));
            };
            if !HARMLESS.contains(&space.as_str()) {
                return Err(self.reader.fail(Error::new(
                    Kind::UnknownFormat,
                    format!("it requires the extension {space}, which is not read"),
                    "export the bodies as plain triangles, without extensions",
                )));
            }
        }
        // Section 3.4: millimetres where nothing is said.
        (self.model.unit, self.shift) = match unit.as_deref() {
            None | Some("millimeter") => (LengthUnit::Mm, 0),
            // Read as thousandths of a millimetre, decimal by decimal.
            Some("micron") => (LengthUnit::Mm, -3),
            Some("centimeter") => (LengthUnit::Cm, 0),
            Some("inch") => (LengthUnit::In, 0),
            Some("foot") => (LengthUnit::Ft, 0),
            Some("meter") => (LengthUnit::M, 0),
            Some(other) => {
                return Err(self.reader.fail(Error::new(
                    Kind::Unit,
                    format!("its unit \"{other}\" is none that 3MF has"),
                    "the units are micron, millimeter, centimeter, inch, foot and meter",
                )));
            }
        };
        Ok(())
    }

    /// The next element of the core in one that may be `open`; an empty one has none.
    fn children(&mut self, open: bool, within: Within) -> Result<Child<'a>> {
        if open {
            self.child(within)
        } else {
            Ok(Child::End)
        }
    }

    /// The next element of the core in the one that is open. Elements of extensions are passed
    /// over.
    fn child(&mut self, within: Within) -> Result<Child<'a>> {
        loop {
            let (e, open) = match self.reader.next()? {
                Event::Start(e) => (e, true),
                Event::Empty(e) => (e, false),
                Event::End(_) => return Ok(Child::End),
                _ => continue,
            };
            let name = e.name().into_inner();
            let local = name.strip_prefix(&self.prefix).filter(|n| !n.contains(':'));
            let Some(local) = local else {
                self.foreign(&e, within)?;
                self.pass(open)?;
                continue;
            };
            let own = format!(
                "xmlns{}{}",
                if self.prefix.is_empty() { "" } else { ":" },
                self.prefix.trim_end_matches(':')
            );
            let mut declares = false;
            // Names of vertices and triangles are known before their attributes are read.
            if !matches!(local, "vertex" | "triangle") {
                self.reader.attributes(&e, |key, value| {
                    declares |= key == own && value != CORE;
                    Ok(())
                })?;
            }
            if declares {
                self.foreign(&e, within)?;
                self.pass(open)?;
                continue;
            }
            return Ok(Child::Core(local.to_owned(), e, open));
        }
    }

    /// Takes note of an element of an extension.
    fn foreign(&mut self, e: &BytesStart<'_>, within: Within) -> Result<()> {
        match within {
            Within::Resources => {}
            Within::Object => {
                let name = e.name().into_inner().chars().take(40).collect();
                if self.extensions.len() < 8 && !self.extensions.contains(&name) {
                    self.extensions.push(name);
                }
                return Ok(());
            }
            Within::Other => return Ok(()),
        }
        let mut id = None;
        self.reader.attributes(e, |key, value| {
            if key == "id" {
                id = value.parse::<u32>().ok();
            }
            Ok(())
        })?;
        if let Some(id) = id {
            self.take_id(id)?;
        }
        Ok(())
    }

    fn take_id(&mut self, id: u32) -> Result<()> {
        if !self.ids.insert(id) {
            return Err(self.reader.fail(Error::new(
                Kind::AmbiguousName,
                format!("two resources have the id {id}"),
                AGAIN,
            )));
        }
        Ok(())
    }

    /// Goes past an element whose content is not looked at.
    fn pass(&mut self, open: bool) -> Result<()> {
        if open { self.reader.skip() } else { Ok(()) }
    }

    fn stranger(&self, e: &BytesStart<'_>, within: &str) -> Error {
        let name: String = e.name().into_inner().chars().take(40).collect();
        self.reader
            .fail(bad(format!("<{name}> may not stand here in <{within}>")))
    }

    fn resources(&mut self, open: bool) -> Result<()> {
        loop {
            match self.children(open, Within::Resources)? {
                Child::End => break,
                Child::Core(name, e, open) => match name.as_str() {
                    "basematerials" => self.base_materials(&e, open)?,
                    "object" => self.object(&e, open)?,
                    _ => return Err(self.stranger(&e, "resources")),
                },
            }
        }
        Ok(())
    }

    fn base_materials(&mut self, e: &BytesStart<'_>, open: bool) -> Result<()> {
        let mut id = None;
        self.reader.attributes(e, |key, value| match key {
            "id" => set(&mut id, id_of("the id", value)?, key),
            _ => Ok(()),
        })?;
        let id = needed(id, "basematerials", "id").map_err(|e| self.reader.fail(e))?;
        self.take_id(id)?;
        let mut names = Vec::new();
        loop {
            match self.children(open, Within::Other)? {
                Child::End => break,
                Child::Core(name, e, open) if name == "base" => {
                    let mut own = None;
                    self.reader.attributes(&e, |key, value| match key {
                        "name" => set(&mut own, value.to_owned(), key),
                        _ => Ok(()),
                    })?;
                    names.push(needed(own, "base", "name").map_err(|e| self.reader.fail(e))?);
                    self.pass(open)?;
                }
                Child::Core(_, e, _) => return Err(self.stranger(&e, "basematerials")),
            }
        }
        self.model.materials.insert(id, names);
        Ok(())
    }

    fn object(&mut self, e: &BytesStart<'_>, open: bool) -> Result<()> {
        let (mut id, mut kind, mut name, mut part, mut pid, mut pindex) =
            (None, None, None, None, None, None);
        self.reader.attributes(e, |key, value| match key {
            "id" => set(&mut id, id_of("the id", value)?, key),
            "type" => {
                let found = match value {
                    "model" => ObjectType::Model,
                    "support" | "solidsupport" => ObjectType::Support,
                    "surface" => ObjectType::Surface,
                    "other" => ObjectType::Other,
                    other => return Err(bad(format!("\"{other}\" is no type of an object"))),
                };
                set(&mut kind, found, key)
            }
            "name" => set(&mut name, named(value), key),
            "partnumber" => set(&mut part, named(value), key),
            "pid" => set(&mut pid, id_of("the pid", value)?, key),
            "pindex" => set(&mut pindex, index_of("the pindex", value)?, key),
            _ => Ok(()),
        })?;
        let id = needed(id, "object", "id").map_err(|e| self.reader.fail(e))?;
        self.take_id(id)?;
        if pindex.is_some() && pid.is_none() {
            let e = bad(format!("the object {id} has a pindex and no pid"));
            return Err(self.reader.fail(e));
        }
        let default = self.material(pid, pindex)?;
        let mut shape = None;
        loop {
            match self.children(open, Within::Object)? {
                Child::End => break,
                Child::Core(name, e, open) => match name.as_str() {
                    "metadatagroup" if shape.is_none() => self.pass(open)?,
                    "mesh" if shape.is_none() => shape = Some(self.mesh(id, default, pid, open)?),
                    "components" if shape.is_none() => {
                        shape = Some(self.components(id, open)?);
                    }
                    _ => return Err(self.stranger(&e, "object")),
                },
            }
        }
        let Some(shape) = shape else {
            let e = bad(format!("the object {id} has neither a mesh nor components"));
            return Err(self.reader.fail(e));
        };
        self.objects_by_id.insert(id, self.model.objects.len());
        self.model.objects.push(Object {
            kind: kind.unwrap_or(ObjectType::Model),
            name: name.flatten(),
            part_number: part.flatten(),
            shape,
        });
        Ok(())
    }

    /// Material of a property group and an index, if the group is one of base materials.
    fn material(&self, pid: Option<u32>, index: Option<u32>) -> Result<Option<MaterialKey>> {
        let Some(pid) = pid else { return Ok(None) };
        let fail = |e: Error| Err(self.reader.fail(e));
        if !self.ids.contains(&pid) || self.objects_by_id.contains_key(&pid) {
            return fail(Error::new(
                Kind::UnknownName,
                format!("the pid {pid} is of no group of properties before it"),
                AGAIN,
            ));
        }
        let (Some(group), Some(index)) = (self.model.materials.get(&pid), index) else {
            return Ok(None);
        };
        if index as usize >= group.len() {
            return fail(Error::new(
                Kind::BadIndex,
                format!(
                    "material {index} of group {pid} is referred to, which has {}",
                    group.len()
                ),
                AGAIN,
            ));
        }
        Ok(Some((pid, index)))
    }

    fn mesh(
        &mut self,
        id: u32,
        default: Option<MaterialKey>,
        object_pid: Option<u32>,
        open: bool,
    ) -> Result<Shape> {
        let (mut vertices, mut triangles) = (None, None);
        loop {
            match self.children(open, Within::Object)? {
                Child::End => break,
                Child::Core(name, e, open) => match name.as_str() {
                    "vertices" if vertices.is_none() => vertices = Some(self.vertices(open)?),
                    "triangles" if triangles.is_none() => {
                        let count = vertices.as_ref().map_or(0, Vec::len);
                        triangles = Some(self.triangles(id, count, default, object_pid, open)?);
                    }
                    _ => return Err(self.stranger(&e, "mesh")),
                },
            }
        }
        match (vertices, triangles) {
            (Some(vertices), Some(triangles)) if !triangles.is_empty() => Ok(Shape::Mesh {
                vertices,
                triangles,
            }),
            _ => Err(self.reader.fail(Error::new(
                Kind::Empty,
                format!("the mesh of the object {id} has no triangles"),
                "export the mesh again with its faces",
            ))),
        }
    }

    fn vertices(&mut self, open: bool) -> Result<Vec<[f64; 3]>> {
        let mut out = Vec::new();
        let shift = self.shift;
        loop {
            let (e, open) = match self.children(open, Within::Object)? {
                Child::End => break,
                Child::Core(name, e, open) if name == "vertex" => (e, open),
                Child::Core(_, e, _) => return Err(self.stranger(&e, "vertices")),
            };
            let mut point = [None; 3];
            self.reader.attributes(&e, |key, value| {
                match ["x", "y", "z"].iter().position(|k| *k == key) {
                    Some(k) => set(&mut point[k], length(key, value, shift)?, key),
                    None => Ok(()),
                }
            })?;
            let [Some(x), Some(y), Some(z)] = point else {
                return Err(self.reader.fail(bad("a <vertex> lacks one of x, y and z")));
            };
            out.push([x, y, z]);
            self.pass(open)?;
        }
        if out.len() >= u32::MAX as usize {
            return Err(self.reader.fail(Error::new(
                Kind::TooLarge,
                "a mesh has 2³² vertices or more",
                "split it",
            )));
        }
        Ok(out)
    }

    fn triangles(
        &mut self,
        id: u32,
        count: usize,
        default: Option<MaterialKey>,
        object_pid: Option<u32>,
        open: bool,
    ) -> Result<Vec<([u32; 3], Option<MaterialKey>)>> {
        let mut out = Vec::new();
        loop {
            let (e, open) = match self.children(open, Within::Object)? {
                Child::End => break,
                Child::Core(name, e, open) if name == "triangle" => (e, open),
                Child::Core(_, e, _) => return Err(self.stranger(&e, "triangles")),
            };
            let mut corners = [None; 3];
            let (mut pid, mut p1) = (None, None);
            self.reader.attributes(&e, |key, value| match key {
                "v1" => set(&mut corners[0], index_of(key, value)?, key),
                "v2" => set(&mut corners[1], index_of(key, value)?, key),
                "v3" => set(&mut corners[2], index_of(key, value)?, key),
                "pid" => set(&mut pid, id_of("the pid", value)?, key),
                "p1" => set(&mut p1, index_of(key, value)?, key),
                _ => Ok(()),
            })?;
            let [Some(a), Some(b), Some(c)] = corners else {
                return Err(self
                    .reader
                    .fail(bad("a <triangle> lacks one of v1, v2 and v3")));
            };
            let corners = [a, b, c];
            let wrong =
                |message: String| Err(self.reader.fail(Error::new(Kind::BadIndex, message, AGAIN)));
            if let Some(v) = corners.iter().find(|&&v| v as usize >= count) {
                return wrong(format!(
                    "triangle {} of the object {id} refers to vertex {v}; vertices count from 0 \
                     and there are {count}",
                    out.len()
                ));
            }
            // Section 4.1.4: the indices v1, v2 and v3 are distinct.
            if a == b || b == c || c == a {
                return wrong(format!(
                    "triangle {} of the object {id} has one vertex at two corners ({a}, {b}, {c})",
                    out.len()
                ));
            }
            let material = match (pid, p1) {
                (None, None) => default,
                (pid, p1) => self.material(pid.or(object_pid), p1)?,
            };
            out.push((corners, material));
            self.pass(open)?;
        }
        Ok(out)
    }

    fn components(&mut self, id: u32, open: bool) -> Result<Shape> {
        let mut out = Vec::new();
        loop {
            let (e, open) = match self.children(open, Within::Object)? {
                Child::End => break,
                Child::Core(name, e, open) if name == "component" => (e, open),
                Child::Core(_, e, _) => return Err(self.stranger(&e, "components")),
            };
            let (object, placing, _) = self.reference(&e, "component")?;
            out.push(Component { object, placing });
            self.pass(open)?;
        }
        if out.is_empty() {
            let e = bad(format!("the object {id} has no component"));
            return Err(self.reader.fail(e));
        }
        Ok(Shape::Components(out))
    }

    fn build(&mut self, open: bool) -> Result<()> {
        loop {
            let (e, open) = match self.children(open, Within::Other)? {
                Child::End => break,
                Child::Core(name, e, open) if name == "item" => (e, open),
                Child::Core(_, e, _) => return Err(self.stranger(&e, "build")),
            };
            let (object, placing, part_number) = self.reference(&e, "item")?;
            if self.model.objects[object].kind == ObjectType::Other {
                return Err(self.reader.fail(bad(
                    "an item of the build refers to an object of the type \"other\"",
                )));
            }
            self.model.items.push(Item {
                object,
                placing,
                part_number,
            });
            self.pass(open)?;
        }
        Ok(())
    }

    /// Object, placing and part number of a component or an item.
    fn reference(
        &self,
        e: &BytesStart<'_>,
        what: &str,
    ) -> Result<(usize, Placing, Option<String>)> {
        let (mut id, mut placing, mut part, mut path) = (None, None, None, false);
        let shift = self.shift;
        self.reader.attributes(e, |key, value| match key {
            "objectid" => set(&mut id, id_of("the objectid", value)?, key),
            "transform" => set(&mut placing, transform(value, shift)?, key),
            "partnumber" => set(&mut part, named(value), key),
            _ => {
                path |= key.ends_with(":path");
                Ok(())
            }
        })?;
        if path {
            return Err(self.reader.fail(Error::new(
                Kind::UnknownFormat,
                format!("a <{what}> refers to a model in another part of the package (production extension), which is not read"),
                "export the bodies into one model",
            )));
        }
        let id = needed(id, what, "objectid").map_err(|e| self.reader.fail(e))?;
        let Some(&object) = self.objects_by_id.get(&id) else {
            return Err(self.reader.fail(Error::new(
                Kind::UnknownName,
                format!("a <{what}> refers to the object {id}, and none before it has that id"),
                AGAIN,
            )));
        };
        Ok((
            object,
            placing.unwrap_or(Placing::identity()),
            part.flatten(),
        ))
    }
}

/// A number as XML Schema has doubles, within what moments can be made of.
fn number(what: &str, text: &str) -> Result<f64> {
    match real(text.as_bytes(), 0, &mut Written::default()) {
        Some((x, end)) if end == text.len() && x.abs() <= MAX_COORDINATE => Ok(x),
        _ => Err(not_a_number(text.as_bytes(), 0, what)),
    }
}

/// A length, its decimal point moved.
fn length(what: &str, text: &str, shift: i32) -> Result<f64> {
    if shift == 0 {
        return number(what, text);
    }
    number(what, text)?;
    let (digits, exponent) = text.split_once(['e', 'E']).unwrap_or((text, "0"));
    match exponent.parse::<i32>() {
        Ok(e) => number(what, &format!("{digits}e{}", e.saturating_add(shift))),
        Err(_) => Err(not_a_number(text.as_bytes(), 0, what)),
    }
}

/// Four rows of three: what becomes of x, y and z, and where the origin goes (section 3.3; points
/// are rows there, multiplied from the left).
fn transform(text: &str, shift: i32) -> Result<Placing> {
    let mut m = [0.0; 12];
    let mut words = text.split_ascii_whitespace();
    for (i, x) in m.iter_mut().enumerate() {
        let word = words.next().unwrap_or_default();
        let what = format!("number {i} of a transform");
        *x = if i < 9 {
            number(&what, word)?
        } else {
            length(&what, word, shift)?
        };
    }
    if let Some(word) = words.next() {
        return Err(Error::new(
            Kind::BadNumber,
            format!("a transform has more than twelve numbers, from \"{word}\" on"),
            AGAIN,
        ));
    }
    let placing = Placing {
        linear: Matrix3::new(m[0], m[3], m[6], m[1], m[4], m[7], m[2], m[5], m[8]),
        shift: Vector3::new(m[9], m[10], m[11]),
    };
    if placing.determinant() == 0.0 {
        return Err(Error::new(
            Kind::BadNumber,
            "a transform flattens what it places: its determinant is zero",
            AGAIN,
        ));
    }
    Ok(placing)
}
