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

/// What is wrong with a file of [`library`], so that tests know what a survey must say.
pub(crate) const FAULTS: [&str; 8] = [
    "hole",
    "crack",
    "inside-out",
    "duplicate",
    "truncated",
    "count-mismatch",
    "not-finite",
    "empty",
];

/// The fault of the `i`-th file: one in twenty has one, each in its turn.
pub(crate) fn fault_of(i: u64) -> Option<&'static str> {
    (i % 20 == 7).then(|| FAULTS[(i / 20) as usize % FAULTS.len()])
}

/// Triangles of the `i`-th file of `count`: many small, few large; 5 M in all for 2,000 files.
pub(crate) fn size_of(i: u64) -> u64 {
    match i % 200 {
        199 => 230_000,
        190..199 => 16_000,
        150..190 => 2_000,
        _ => 220,
    }
}

/// A library of mesh files in sub-folders, in three formats, of balls that each stand and weigh
/// differently; a few stand there twice. With `tiny`, cubes of 12 triangles.
pub(crate) fn library(tiny: bool, count: u64, folder: &std::path::Path) -> std::io::Result<()> {
    for i in 0..count {
        let name = ["frame", "wheels", "pump", "tank", "brackets"][(i / 7 % 5) as usize];
        let at = folder.join(name);
        std::fs::create_dir_all(&at)?;
        // Every hundredth is a copy of the one before.
        let of = if i % 100 == 50 && !tiny { i - 1 } else { i };
        let n = if tiny { 0 } else { rings_for(size_of(of)) };
        let radius = 10.0 + (of as f64 * 0.618).fract() * 40.0;
        let centre = [of as f64 % 13.0, -3.0, 80.0];
        let mut triangles: Vec<Triangle> = match tiny {
            true => cube(radius as f32),
            false => sphere(n, radius, centre).collect(),
        };
        let fault = fault_of(i).filter(|_| !tiny);
        match fault {
            Some("hole") => drop(triangles.remove(0)),
            Some("crack") => triangles[0][1][2] += 1e-3,
            Some("inside-out") => triangles.iter_mut().for_each(|t| t.swap(1, 2)),
            Some("duplicate") => triangles.push(triangles[3]),
            Some("not-finite") => triangles[5][1][2] = f32::NAN,
            Some("empty") => triangles.clear(),
            _ => {}
        }
        // Faults of bytes are of binary files.
        let (ending, mut bytes) = match (fault, i % 10) {
            (None, 3) => ("obj", obj(&[("ball".into(), triangles)])),
            (None, 6) => ("stl", text_stl(&triangles)),
            _ => ("stl", binary_stl(&triangles)),
        };
        match fault {
            Some("truncated") => bytes.truncate(bytes.len() - 60),
            Some("count-mismatch") => bytes.extend([0; 50]),
            _ => {}
        }
        std::fs::write(at.join(format!("part-{i:05}.{ending}")), bytes)?;
    }
    Ok(())
}

/// An axis-aligned cube.
pub(crate) fn cube(side: f32) -> Vec<Triangle> {
    let p = |i: usize| [0, 1, 2].map(|k| if i >> k & 1 == 1 { side } else { 0.0 });
    let quads = [
        [0, 2, 3, 1],
        [4, 5, 7, 6],
        [0, 1, 5, 4],
        [2, 6, 7, 3],
        [0, 4, 6, 2],
        [1, 3, 7, 5],
    ];
    let halves = |q: [usize; 4]| [[p(q[0]), p(q[1]), p(q[2])], [p(q[0]), p(q[2]), p(q[3])]];
    quads.into_iter().flat_map(halves).collect()
}
