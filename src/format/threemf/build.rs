//! The build: every object where its items and components place it.

use super::AGAIN;
use super::model::{Model, Object, ObjectType, Shape};
use crate::error::{Error, Kind, Result};
use crate::format::pieces::{Pieces, Placing, Size};
use crate::mesh::{ReaderNote, Soup};

/// Most objects within each other.
const DEPTH: u32 = 32;

/// What an object comes to with all its components.
#[derive(Clone, Copy, Default)]
struct Extent {
    size: Size,
    depth: u32,
}

/// Puts the soup together.
pub(super) fn expand(mut model: Model) -> Result<Soup> {
    // Objects refer to objects before them alone, so that one pass counts all.
    let mut extents: Vec<Extent> = Vec::with_capacity(model.objects.len());
    for object in &model.objects {
        let extent = match &object.shape {
            Shape::Mesh {
                vertices,
                triangles,
            } => Extent {
                size: Size {
                    instances: 1,
                    vertices: vertices.len() as u64,
                    triangles: triangles.len() as u64,
                },
                depth: 1,
            },
            Shape::Components(list) => {
                let mut all = Extent::default();
                for component in list {
                    let inner = extents[component.object];
                    all.size = all.size.plus(inner.size);
                    all.depth = all.depth.max(inner.depth);
                }
                all.depth += 1;
                all
            }
        };
        extents.push(extent);
    }
    let mut total = Size::default();
    for item in &model.items {
        total = total.plus(extents[item.object].size);
        if extents[item.object].depth > DEPTH {
            return Err(Error::new(
                Kind::TooLarge,
                format!("objects lie more than {DEPTH} deep within each other"),
                AGAIN,
            ));
        }
    }
    total.check()?;
    let mut walk = Walk {
        model: &model,
        pieces: Pieces::default(),
        reached: vec![false; model.objects.len()],
        supports: 0,
        others: 0,
        triangles: 0,
    };
    for item in &model.items {
        let part = item.part_number.as_deref();
        walk.object(item.object, &item.placing, None, part)?;
    }
    let Walk {
        pieces,
        reached,
        supports,
        others,
        triangles,
        ..
    } = walk;
    let mut notes = std::mem::take(&mut model.notes);
    let mut note = |count: usize, kind, message: String, advice| {
        if count > 0 {
            notes.push(ReaderNote {
                kind,
                message,
                line: None,
                advice,
            });
        }
    };
    note(
        supports,
        "supports-ignored",
        format!("{supports} placed objects of the type support or solidsupport were left out"),
        "supports are no part of the thing; give an object the type model if it is to be weighed",
    );
    note(
        others,
        "objects-ignored",
        format!("{others} placed objects of the type other were left out"),
        "give an object the type model if it is to be weighed",
    );
    let unbuilt = model
        .objects
        .iter()
        .zip(&reached)
        .filter(|(o, reached)| !**reached && o.kind != ObjectType::Other)
        .count();
    note(
        unbuilt,
        "objects-unbuilt",
        format!("{unbuilt} objects stand in no item of the build and were left out"),
        "add them to the build if they are to be weighed",
    );
    if triangles == 0 {
        return Err(Error::new(
            Kind::Empty,
            "the build holds no triangle",
            "export it again with the bodies in its build",
        ));
    }
    Ok(pieces.finish(model.unit, notes))
}

struct Walk<'m> {
    model: &'m Model,
    pieces: Pieces,
    reached: Vec<bool>,
    supports: usize,
    others: usize,
    triangles: usize,
}

impl<'m> Walk<'m> {
    /// Places an object. No deeper than [`DEPTH`], which was counted before.
    fn object(
        &mut self,
        index: usize,
        placing: &Placing,
        above: Option<&'m str>,
        part: Option<&'m str>,
    ) -> Result<()> {
        let Object {
            kind,
            name,
            part_number,
            shape,
        } = &self.model.objects[index];
        self.reached[index] = true;
        match kind {
            ObjectType::Support => {
                self.supports += 1;
                self.reach(shape);
                return Ok(());
            }
            ObjectType::Other => {
                self.others += 1;
                return Ok(());
            }
            ObjectType::Model | ObjectType::Surface => {}
        }
        let name = name.as_deref().or(above);
        let part = part_number.as_deref().or(part);
        match shape {
            Shape::Components(list) => {
                for component in list {
                    let here = placing.after(&component.placing);
                    self.object(component.object, &here, name, part)?;
                }
            }
            Shape::Mesh {
                vertices,
                triangles,
            } => {
                self.pieces.begin(name.or(part).map(str::to_owned));
                let base = self.pieces.vertices(placing, vertices)?;
                // One look-up a run of one material.
                let mut last = None;
                for group in triangles.chunk_by(|a, b| a.1 == b.1) {
                    let key = group[0].1;
                    let material = match (key, last) {
                        (Some(key), Some((seen, number))) if key == seen => Some(number),
                        (Some(key), _) => {
                            let named = self.model.materials.get(&key.0);
                            let named = named.and_then(|g| g.get(key.1 as usize));
                            named.map(|n| self.pieces.material(n))
                        }
                        (None, _) => None,
                    };
                    last = key.zip(material);
                    let all = group.iter().map(|(t, _)| (*t, material));
                    self.pieces.triangles(placing, base, all);
                }
                self.triangles += triangles.len();
            }
        }
        Ok(())
    }

    /// What lies in a support is left out with it, and not forgotten.
    fn reach(&mut self, shape: &'m Shape) {
        if let Shape::Components(list) = shape {
            for component in list {
                if !std::mem::replace(&mut self.reached[component.object], true) {
                    self.reach(&self.model.objects[component.object].shape);
                }
            }
        }
    }
}
