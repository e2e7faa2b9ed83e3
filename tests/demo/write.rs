//! Writers of the demo's meshes, independent of the readers that are tested with them.

use std::fmt::Write as _;

use super::mesh::{Body, Point};

/// Binary STL of all bodies in order, with facet normals; coordinates must fit 32-bit floats.
pub(crate) fn stl_binary(header: &str, bodies: &[Body]) -> Vec<u8> {
    let triangles: Vec<[Point; 3]> = bodies.iter().flat_map(Body::triangles).collect();
    let mut out = vec![b' '; 80];
    out[..header.len()].copy_from_slice(header.as_bytes());
    out.extend(
        u32::try_from(triangles.len())
            .expect("a demo mesh is small")
            .to_le_bytes(),
    );
    for t in &triangles {
        for c in normal(t).into_iter().chain(t.iter().copied().flatten()) {
            out.extend((c as f32).to_le_bytes());
        }
        out.extend([0, 0]);
    }
    out
}

/// ASCII STL, one named `solid` a body.
pub(crate) fn stl_ascii(bodies: &[Body]) -> Vec<u8> {
    let mut out = String::new();
    for body in bodies {
        let _ = writeln!(out, "solid {}", body.name);
        for t in body.triangles() {
            let [x, y, z] = normal(&t).map(|c| number((c * 1e6).round() / 1e6));
            let _ = writeln!(out, "  facet normal {x} {y} {z}\n    outer loop");
            for p in t {
                let [x, y, z] = p.map(number);
                let _ = writeln!(out, "      vertex {x} {y} {z}");
            }
            out.push_str("    endloop\n  endfacet\n");
        }
        let _ = writeln!(out, "endsolid {}", body.name);
    }
    out.into_bytes()
}

/// OBJ, one `o` a body, polygons kept.
pub(crate) fn obj(comment: &str, bodies: &[Body]) -> Vec<u8> {
    let mut out = format!("# {comment}\n");
    let mut first = 1;
    for body in bodies {
        let _ = writeln!(out, "o {}", body.name);
        for i in 0..body.vertex_count() {
            let [x, y, z] = body.vertex(i).map(number);
            let _ = writeln!(out, "v {x} {y} {z}");
        }
        for face in &body.faces {
            out.push('f');
            for i in face {
                let _ = write!(out, " {}", i + first);
            }
            out.push('\n');
        }
        first += body.vertex_count();
    }
    out.into_bytes()
}

/// The shortest decimal that reads back the same; never a minus zero.
fn number(c: f64) -> String {
    format!("{}", c + 0.0)
}

fn normal(t: &[Point; 3]) -> Point {
    let [a, b, c] = t;
    let side = |p: &Point| [p[0] - a[0], p[1] - a[1], p[2] - a[2]];
    let (u, v) = (side(b), side(c));
    let n = [
        u[1] * v[2] - u[2] * v[1],
        u[2] * v[0] - u[0] * v[2],
        u[0] * v[1] - u[1] * v[0],
    ];
    let length = (n[0] * n[0] + n[1] * n[1] + n[2] * n[2]).sqrt();
    n.map(|c| if length > 0.0 { c / length + 0.0 } else { 0.0 })
}
