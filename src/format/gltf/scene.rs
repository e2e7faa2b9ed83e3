//! The scene: which meshes stand where.

use nalgebra::{Matrix3, Quaternion, UnitQuaternion, Vector3};

use super::accessor;
use super::buffers::{Buffers, missing};
use super::json::{Mesh, Node, Primitive, Root};
use super::{AGAIN, bad, extension};
use crate::error::{Error, Kind, Result};
use crate::format::pieces::{Pieces, Placing, Size};
use crate::mesh::{ReaderNote, Soup};
use crate::quantity::LengthUnit;

/// How far the length of a rotation's quaternion may be from one before it is an error; below, the
/// rounding of 32-bit writers is taken out of it.
const QUATERNION: f64 = 1e-3;

/// A mesh. Primitives may share their positions.
#[derive(Default)]
struct ReadMesh {
    /// By the accessor that they come from.
    positions: Vec<(usize, Vec<[f64; 3]>)>,
    parts: Vec<ReadPart>,
}

struct ReadPart {
    /// Which of the positions.
    over: usize,
    triangles: Vec<[u32; 3]>,
    material: Option<usize>,
}

/// Reads the default scene.
pub(super) fn read(root: &Root, buffers: &Buffers<'_>) -> Result<Soup> {
    let mut notes = Vec::new();
    let placed = placed(root, &mut notes)?;
    let mut users = vec![0u64; root.meshes.len()];
    for (_, _, mesh) in &placed {
        users[*mesh] += 1;
    }
    check_size(root, &users)?;
    let mut passed_over = 0usize;
    let mut meshes: Vec<Option<ReadMesh>> = Vec::with_capacity(root.meshes.len());
    for (i, mesh) in root.meshes.iter().enumerate() {
        meshes.push(match users[i] {
            0 => None,
            _ => Some(read_mesh(root, buffers, i, mesh, &mut passed_over)?),
        });
    }
    let mut pieces = Pieces::default();
    let mut flat = 0usize;
    let mut triangles = 0usize;
    for (node, placing, mesh) in &placed {
        let Some(read) = &meshes[*mesh] else { continue };
        if placing.determinant() == 0.0 {
            flat += 1;
            continue;
        }
        let node = &root.nodes[*node];
        let name = [&node.name, &root.meshes[*mesh].name];
        let name = name.into_iter().flatten().find(|n| !n.trim().is_empty());
        pieces.begin(name.map(|n| n.trim().to_owned()));
        let mut bases = Vec::with_capacity(read.positions.len());
        for (_, positions) in &read.positions {
            let base = pieces.vertices(placing, positions);
            bases.push(base.map_err(|e| within(e, &format!("mesh {mesh}")))?);
        }
        for part in &read.parts {
            let material = match part.material {
                Some(m) => {
                    let Some(named) = root.materials.get(m) else {
                        return Err(missing("material", m, root.materials.len()));
                    };
                    named.name.as_ref().map(|n| pieces.material(n))
                }
                None => None,
            };
            triangles += part.triangles.len();
            let all = part.triangles.iter().map(|&t| (t, material));
            pieces.triangles(placing, bases[part.over], all);
        }
    }
    let mut note = |kind, message: String, advice| {
        notes.push(ReaderNote {
            kind,
            message,
            line: None,
            advice,
        });
    };
    if passed_over > 0 {
        note(
            "primitives-ignored",
            format!("{passed_over} primitives of points or lines were ignored"),
            "they enclose nothing; check the export if faces are missing",
        );
    }
    if flat > 0 {
        note(
            "nodes-ignored",
            format!("{flat} nodes with meshes are scaled to nothing and were ignored"),
            "scenes hide things this way; give the node a scale if the thing is to be weighed",
        );
    }
    if !root.animations.is_empty() {
        note(
            "animations-ignored",
            "it holds animations: things are weighed where the scene itself has them".to_owned(),
            "export the pose that is meant, if it is another",
        );
    }
    if triangles == 0 {
        return Err(Error::new(
            Kind::Empty,
            "the scene holds no triangle",
            "export the mesh again with the bodies selected",
        ));
    }
    Ok(pieces.finish(LengthUnit::M, notes))
}

/// Nodes with meshes in the order of a walk from the roots: node, where it stands, mesh.
fn placed(root: &Root, notes: &mut Vec<ReaderNote>) -> Result<Vec<(usize, Placing, usize)>> {
    let mut is_child = vec![false; root.nodes.len()];
    for (i, node) in root.nodes.iter().enumerate() {
        for &child in &node.children {
            let Some(seen) = is_child.get_mut(child) else {
                return Err(missing("node", child, root.nodes.len()));
            };
            if *seen {
                return Err(circle(
                    child,
                    format!("node {i} and another have it as a child"),
                ));
            }
            *seen = true;
        }
    }
    let tops: Vec<usize> = match (root.scene, root.scenes.first()) {
        (Some(scene), _) => match root.scenes.get(scene) {
            Some(scene) => scene.nodes.clone(),
            None => return Err(missing("scene", scene, root.scenes.len())),
        },
        (None, Some(first)) => first.nodes.clone(),
        (None, None) => (0..root.nodes.len()).filter(|&i| !is_child[i]).collect(),
    };
    if root.scenes.len() > 1 {
        notes.push(ReaderNote {
            kind: "scenes-ignored",
            message: format!(
                "of its {} scenes scene {} was read",
                root.scenes.len(),
                root.scene.unwrap_or(0)
            ),
            line: None,
            advice: "export the scene that is meant by itself, if it is another",
        });
    }
    let mut out = Vec::new();
    let mut seen = vec![false; root.nodes.len()];
    let mut open: Vec<(usize, Placing)> = tops
        .iter()
        .rev()
        .map(|&i| (i, Placing::identity()))
        .collect();
    while let Some((i, above)) = open.pop() {
        let Some(node) = root.nodes.get(i) else {
            return Err(missing("node", i, root.nodes.len()));
        };
        if std::mem::replace(&mut seen[i], true) {
            return Err(circle(
                i,
                "it stands in its own tree, or twice in the scene".to_owned(),
            ));
        }
        let here = above.after(&local(i, node)?);
        if let Some(name) = node.extensions.keys().find(|k| k.contains("instancing")) {
            return Err(extension(name));
        }
        if let Some(mesh) = node.mesh {
            let Some(found) = root.meshes.get(mesh) else {
                return Err(missing("mesh", mesh, root.meshes.len()));
            };
            if node.skin.is_some() {
                return Err(deformed(i, "a skin"));
            }
            let weights = if node.weights.is_empty() {
                &found.weights
            } else {
                &node.weights
            };
            if weights.iter().any(|w| *w != 0.0) {
                return Err(deformed(i, "morph targets with weights"));
            }
            out.push((i, here, mesh));
        }
        open.extend(node.children.iter().rev().map(|&c| (c, here)));
    }
    // Nodes that no root leads to have parents all round: they stand in a circle, or outside the
    // scene, under a root of their own.
    if root.scenes.is_empty()
        && let Some(i) = seen.iter().position(|s| !s)
    {
        return Err(circle(i, "it stands in its own tree".to_owned()));
    }
    Ok(out)
}

fn circle(node: usize, why: String) -> Error {
    Error::new(
        Kind::Cycle,
        format!("the nodes are no tree: of node {node}, {why}"),
        AGAIN,
    )
}

fn deformed(node: usize, by: &str) -> Error {
    Error::new(
        Kind::UnknownFormat,
        format!("node {node} is deformed by {by}, which is not read"),
        "export the deformed mesh itself",
    )
}

/// What the node does to what is in it (section 3.5.3 of the specification).
fn local(index: usize, node: &Node) -> Result<Placing> {
    let wrong = |what: &str| {
        Err(Error::new(
            Kind::BadNumber,
            format!("node {index}: {what}"),
            AGAIN,
        ))
    };
    if let Some(m) = &node.matrix {
        if node.translation.is_some() || node.rotation.is_some() || node.scale.is_some() {
            return wrong("it has a matrix and a translation, rotation or scale as well");
        }
        if [m[3], m[7], m[11], m[15]] != [0.0, 0.0, 0.0, 1.0] {
            return wrong("the last row of its matrix is not 0 0 0 1");
        }
        // Columns one after the other.
        return Ok(Placing {
            linear: Matrix3::new(m[0], m[4], m[8], m[1], m[5], m[9], m[2], m[6], m[10]),
            shift: Vector3::new(m[12], m[13], m[14]),
        });
    }
    let turn = match node.rotation {
        None => Matrix3::identity(),
        Some([x, y, z, w]) => {
            let q = Quaternion::new(w, x, y, z);
            if (q.norm() - 1.0).abs() > QUATERNION {
                return wrong("its rotation is no unit quaternion");
            }
            *UnitQuaternion::new_normalize(q)
                .to_rotation_matrix()
                .matrix()
        }
    };
    let scale = Vector3::from(node.scale.unwrap_or([1.0; 3]));
    Ok(Placing {
        linear: turn * Matrix3::from_diagonal(&scale),
        shift: Vector3::from(node.translation.unwrap_or([0.0; 3])),
    })
}

/// Counts what all placed meshes come to, as they are declared.
fn check_size(root: &Root, users: &[u64]) -> Result<()> {
    let mut total = Size::default();
    for (mesh, &users) in root.meshes.iter().zip(users) {
        let mut shared = Vec::new();
        for primitive in mesh.primitives.iter().filter(|_| users > 0) {
            let Some(&position) = primitive.attributes.get("POSITION") else {
                continue;
            };
            let vertices = accessor::count(root, position)?;
            let corners = match primitive.indices {
                Some(i) => accessor::count(root, i)?,
                None => vertices,
            };
            let list = matches!(primitive.mode, None | Some(4));
            total = total.plus(Size {
                instances: if shared.is_empty() { users } else { 0 },
                vertices: if shared.contains(&position) {
                    0
                } else {
                    users.saturating_mul(vertices)
                },
                triangles: users.saturating_mul(if list { corners / 3 } else { corners }),
            });
            shared.push(position);
        }
    }
    total.check()
}

fn read_mesh(
    root: &Root,
    buffers: &Buffers<'_>,
    index: usize,
    mesh: &Mesh,
    passed_over: &mut usize,
) -> Result<ReadMesh> {
    let mut read = ReadMesh::default();
    for (i, primitive) in mesh.primitives.iter().enumerate() {
        let part = read_primitive(root, buffers, primitive, &mut read.positions);
        match part.map_err(|e| within(e, &format!("mesh {index}, primitive {i}")))? {
            Some(part) => read.parts.push(part),
            None => *passed_over += 1,
        }
    }
    Ok(read)
}

fn within(mut error: Error, what: &str) -> Error {
    error.message = format!("{what}: {}", error.message);
    error
}

/// None for points and lines.
fn read_primitive(
    root: &Root,
    buffers: &Buffers<'_>,
    primitive: &Primitive,
    positions: &mut Vec<(usize, Vec<[f64; 3]>)>,
) -> Result<Option<ReadPart>> {
    let mode = primitive.mode.unwrap_or(4);
    if mode < 4 {
        return Ok(None);
    }
    if mode > 6 {
        return Err(bad(format!("{mode} is no mode of glTF")));
    }
    let compressed = || primitive.extensions.keys().find(|k| k.contains("draco"));
    let Some(&position) = primitive.attributes.get("POSITION") else {
        return Err(match compressed() {
            Some(name) => extension(name),
            None => bad("it has no POSITION"),
        });
    };
    // Where the extension is not required, plain accessors stand beside it.
    if let Some(name) = compressed()
        && root
            .accessors
            .get(position)
            .is_some_and(|a| a.buffer_view.is_none())
    {
        return Err(extension(name));
    }
    let over = match positions.iter().position(|(a, _)| *a == position) {
        Some(over) => over,
        None => {
            positions.push((position, accessor::positions(root, buffers, position)?));
            positions.len() - 1
        }
    };
    let vertices = positions[over].1.len();
    let corners = match primitive.indices {
        Some(i) => accessor::indices(root, buffers, i, vertices)?,
        None => {
            let Ok(count) = u32::try_from(vertices) else {
                return Err(Error::new(
                    Kind::TooLarge,
                    "it has 2³² vertices or more",
                    "split it",
                ));
            };
            (0..count).collect()
        }
    };
    let triangles = match mode {
        4 => {
            let (all, rest) = corners.as_chunks::<3>();
            if !rest.is_empty() {
                return Err(Error::new(
                    Kind::CountMismatch,
                    format!(
                        "its {} corners are no whole number of triangles",
                        corners.len()
                    ),
                    AGAIN,
                ));
            }
            all.to_vec()
        }
        // Section 3.7.2.1. Strips and fans are joined by triangles with two corners in one.
        5 => corners
            .windows(3)
            .enumerate()
            .map(|(i, w)| {
                if i % 2 == 0 {
                    [w[0], w[1], w[2]]
                } else {
                    [w[0], w[2], w[1]]
                }
            })
            .filter(|[a, b, c]| a != b && b != c && c != a)
            .collect(),
        _ => corners
            .get(1..)
            .unwrap_or_default()
            .windows(2)
            .map(|w| [w[0], w[1], corners[0]])
            .filter(|[a, b, c]| a != b && b != c && c != a)
            .collect(),
    };
    Ok(Some(ReadPart {
        over,
        triangles,
        material: primitive.material,
    }))
}
