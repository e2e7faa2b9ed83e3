//! Meshes made by rule, for benches and for measuring whole commands.
#![allow(dead_code, reason = "each bench uses a part of it")]

use std::fmt::Write as _;

/// Three corners, as binary STL holds them.
pub(crate) type Triangle = [[f32; 3]; 3];

/// A sphere of `n` rings of `2n` quads around `centre`, less the flat ones: 4n(n−1) triangles,
/// closed and outward.
pub(crate) fn sphere(n: u32, radius: f64, centre: [f64; 3]) -> impl Iterator<Item = Triangle> {
    let at = move |i: u32, j: u32| -> [f32; 3] {
        let (p, q) = (
            f64::from(i) / f64::from(n) * std::f64::consts::PI,
            f64::from(j % (2 * n)) / f64::from(n) * std::f64::consts::PI,
        );
        // The poles are one point each, to the bit.
        let s = if i == 0 || i == n { 0.0 } else { p.sin() };
        let v = [s * q.cos(), s * q.sin(), p.cos()];
        [0, 1, 2].map(|k| (centre[k] + radius * v[k]) as f32)
    };
    (0..n).flat_map(move |i| {
        let (mut here, mut below) = (at(i, 0), at(i + 1, 0));
        (0..2 * n).flat_map(move |j| {
            let (next, under) = (at(i, j + 1), at(i + 1, j + 1));
            let upper = (i > 0).then_some([here, under, next]);
            let lower = (i + 1 < n).then_some([here, below, under]);
            (here, below) = (next, under);
            [lower, upper].into_iter().flatten()
        })
    })
}

/// Number of triangles of [`sphere`].
pub(crate) fn sphere_count(n: u32) -> u64 {
    4 * u64::from(n) * (u64::from(n) - 1)
}

/// The smallest `n` whose sphere has at least `triangles`.
pub(crate) fn rings_for(triangles: u64) -> u32 {
    (2..)
        .find(|&n| sphere_count(n) >= triangles)
        .unwrap_or(u32::MAX)
}

/// A rod of length 1000 and radius 0.01 in one piece: triangles a hundred thousand times as long
/// as they are wide. `4n` triangles.
pub(crate) fn slivers(n: u32) -> Vec<Triangle> {
    let at = |i: u32, z: f32| {
        let a = f64::from(i % n) / f64::from(n) * std::f64::consts::TAU;
        [(0.01 * a.cos()) as f32, (0.01 * a.sin()) as f32, z]
    };
    let (low, high) = ([0.0, 0.0, 0.0], [0.0, 0.0, 1000.0]);
    (0..n)
        .flat_map(|i| {
            let (a, b) = (at(i, 0.0), at(i + 1, 0.0));
            let (c, d) = (at(i, 1000.0), at(i + 1, 1000.0));
            [[a, b, d], [a, d, c], [low, b, a], [high, c, d]]
        })
        .collect()
}

/// In an order that has nothing to do with where they lie; the same in every run.
pub(crate) fn shuffled(mut triangles: Vec<Triangle>) -> Vec<Triangle> {
    let mut state = 0x2545_f491_4f6c_dd1du64;
    for i in (1..triangles.len()).rev() {
        state ^= state << 13;
        state ^= state >> 7;
        state ^= state << 17;
        triangles.swap(i, (state % (i as u64 + 1)) as usize);
    }
    triangles
}

/// One record of binary STL.
pub(crate) fn record(t: &Triangle) -> [u8; 50] {
    let mut out = [0; 50];
    for (k, x) in t.iter().flatten().enumerate() {
        out[12 + 4 * k..16 + 4 * k].copy_from_slice(&x.to_le_bytes());
    }
    out
}

/// The bytes before the records.
pub(crate) fn header(count: u64) -> Vec<u8> {
    let mut out = vec![0; 80];
    out.extend((count as u32).to_le_bytes());
    out
}

/// As binary STL.
pub(crate) fn binary_stl(triangles: &[Triangle]) -> Vec<u8> {
    let mut out = header(triangles.len() as u64);
    out.reserve(50 * triangles.len());
    for t in triangles {
        out.extend(record(t));
    }
    out
}

/// As text STL.
pub(crate) fn text_stl(triangles: &[Triangle]) -> Vec<u8> {
    let mut out = String::from("solid made\n");
    for t in triangles {
        out.push_str("  facet normal 0.000000e+00 0.000000e+00 0.000000e+00\n    outer loop\n");
        for p in t {
            let _ = writeln!(out, "      vertex {:.9e} {:.9e} {:.9e}", p[0], p[1], p[2]);
        }
        out.push_str("    endloop\n  endfacet\n");
    }
    out.push_str("endsolid made\n");
    out.into_bytes()
}

/// As OBJ with shared vertices, one named piece an entry.
pub(crate) fn obj(pieces: &[(String, Vec<Triangle>)]) -> Vec<u8> {
    let mut out = String::new();
    let mut known = std::collections::HashMap::new();
    for (name, triangles) in pieces {
        let _ = writeln!(out, "o {name}");
        let mut faces = String::new();
        for t in triangles {
            faces.push('f');
            for p in t {
                let number = known.len() + 1;
                let number = *known.entry(p.map(f32::to_bits)).or_insert_with(|| {
                    let _ = writeln!(out, "v {:.6} {:.6} {:.6}", p[0], p[1], p[2]);
                    number
                });
                let _ = write!(faces, " {number}");
            }
            faces.push('\n');
        }
        out.push_str(&faces);
    }
    out.into_bytes()
}

/// `count` spheres side by side, of about `triangles` each.
pub(crate) fn row_of_spheres(count: u32, triangles: u64) -> Vec<(String, Vec<Triangle>)> {
    let n = rings_for(triangles);
    (0..count)
        .map(|i| {
            let centre = [f64::from(i) * 25.0, 3.0, -7.0];
            (format!("ball {i}"), sphere(n, 10.0, centre).collect())
        })
        .collect()
}

/// `count` spheres in one another, about one centre, of about `triangles` each.
pub(crate) fn nested_spheres(count: u32, triangles: u64) -> Vec<Triangle> {
    let n = rings_for(triangles);
    (1..=count)
        .flat_map(|i| {
            let inward = (count - i) % 2 == 1;
            sphere(n, f64::from(i), [0.5; 3]).map(
                move |[a, b, c]| {
                    if inward { [a, c, b] } else { [a, b, c] }
                },
            )
        })
        .collect()
}
