//! Meshes of solids, made in code: closed, wound outward, with vertices shared to the bit.
#![allow(dead_code, reason = "each test uses some of them")]

use std::collections::HashMap;
use std::f64::consts::{PI, TAU};

use bismar::mesh::{Mesh, Run, Soup, Triangles};
use bismar::moments::SolidIntegrals;

/// A point.
pub(crate) type P = [f64; 3];
/// Three corners.
pub(crate) type Tri = [P; 3];

/// The soup of one nameless piece.
pub(crate) fn soup(triangles: Vec<Tri>) -> Soup {
    named(vec![(None, triangles)])
}

/// The soup of several pieces, in order.
pub(crate) fn named(pieces: Vec<(Option<&str>, Vec<Tri>)>) -> Soup {
    let mut out = Soup::default();
    let mut all = Vec::new();
    for (name, list) in pieces {
        let name = name.map(str::to_owned);
        let at = out
            .names
            .iter()
            .position(|n| *n == name)
            .unwrap_or_else(|| {
                out.names.push(name);
                out.names.len() - 1
            });
        out.runs.push(Run {
            first: all.len(),
            count: list.len(),
            name: at as u32,
            material: None,
        });
        all.extend(list);
    }
    out.triangles = Triangles::Loose(all);
    out
}

/// The mesh of one nameless piece.
pub(crate) fn mesh(triangles: Vec<Tri>) -> Mesh {
    Mesh::new(soup(triangles), "it").unwrap()
}

/// The integrals of a mesh that must be one closed shell, as it stands.
pub(crate) fn solid(triangles: Vec<Tri>) -> SolidIntegrals {
    let mesh = mesh(triangles);
    let [body] = mesh.bodies() else {
        panic!("{} bodies", mesh.bodies().len())
    };
    assert!(body.closed && !body.turned && body.shell_count() == 1);
    mesh.solid(body, None).unwrap()
}

/// Faces of any number of corners, cut into fans; good for convex faces.
pub(crate) fn polyhedron(points: &[P], faces: &[Vec<usize>]) -> Vec<Tri> {
    let mut out = Vec::new();
    for f in faces {
        for i in 1..f.len() - 1 {
            out.push([points[f[0]], points[f[i]], points[f[i + 1]]]);
        }
    }
    out
}

/// The box from `lo` to `hi`.
pub(crate) fn cuboid(lo: P, hi: P) -> Vec<Tri> {
    let p: Vec<P> = (0..8)
        .map(|i| [0, 1, 2].map(|k| if i >> k & 1 == 0 { lo[k] } else { hi[k] }))
        .collect();
    let faces = [
        [0, 2, 3, 1],
        [4, 5, 7, 6],
        [0, 1, 5, 4],
        [2, 6, 7, 3],
        [0, 4, 6, 2],
        [1, 3, 7, 5],
    ];
    polyhedron(&p, &faces.map(|f| f.to_vec()))
}

/// A prism over a polygon that is convex and runs counter-clockwise, from z = 0 to `h`.
pub(crate) fn prism(polygon: &[[f64; 2]], h: f64) -> Vec<Tri> {
    let n = polygon.len();
    let at = |z: f64| polygon.iter().map(move |p| [p[0], p[1], z]);
    let points: Vec<P> = at(0.0).chain(at(h)).collect();
    let mut faces: Vec<Vec<usize>> = vec![(0..n).rev().collect(), (n..2 * n).collect()];
    faces.extend((0..n).map(|i| vec![i, (i + 1) % n, n + (i + 1) % n, n + i]));
    polyhedron(&points, &faces)
}

/// A regular polygon of `n` corners on the circle of radius `r`.
pub(crate) fn ngon(n: usize, r: f64) -> Vec<[f64; 2]> {
    (0..n)
        .map(|i| {
            let (s, c) = (TAU * i as f64 / n as f64).sin_cos();
            [r * c, r * s]
        })
        .collect()
}

/// A profile (r, z) turned about z in `n` steps. It runs counter-clockwise with r to the right and
/// z up; points with r = 0 are poles. `ring` closes it onto itself.
pub(crate) fn lathe(profile: &[[f64; 2]], n: usize, ring: bool) -> Vec<Tri> {
    let turn = ngon(n, 1.0);
    let at = |p: [f64; 2], i: usize| {
        let t = turn[i % n];
        [p[0] * t[0], p[0] * t[1], p[1]]
    };
    let m = profile.len();
    let mut out = Vec::new();
    for k in 0..if ring { m } else { m - 1 } {
        let (a, b) = (profile[k], profile[(k + 1) % m]);
        for i in 0..n {
            let quad = [at(a, i), at(a, i + 1), at(b, i + 1), at(b, i)];
            if a[0] != 0.0 {
                out.push([quad[0], quad[1], quad[2]]);
            }
            if b[0] != 0.0 {
                out.push([quad[0], quad[2], quad[3]]);
            }
        }
    }
    out
}

/// Points of an arc in the (r, z) plane from angle `from` to `to` (from the r axis), with exact
/// poles where the angle is ±π/2.
pub(crate) fn arc(r: f64, from: f64, to: f64, steps: usize, centre_z: f64) -> Vec<[f64; 2]> {
    (0..=steps)
        .map(|i| {
            let t = from + (to - from) * i as f64 / steps as f64;
            let (s, c) = t.sin_cos();
            let x = if (t.abs() - PI / 2.0).abs() < 1e-12 {
                0.0
            } else {
                r * c
            };
            [x, centre_z + r * s]
        })
        .collect()
}

/// A cylinder of radius `r` from z = 0 to `h`.
pub(crate) fn cylinder(r: f64, h: f64, n: usize) -> Vec<Tri> {
    lathe(&[[0.0, 0.0], [r, 0.0], [r, h], [0.0, h]], n, false)
}

/// A tube from z = 0 to `h`.
pub(crate) fn tube(outer: f64, inner: f64, h: f64, n: usize) -> Vec<Tri> {
    let profile = [[inner, 0.0], [outer, 0.0], [outer, h], [inner, h]];
    lathe(&profile, n, true)
}

/// A cone with its base at z = 0.
pub(crate) fn cone(r: f64, h: f64, n: usize) -> Vec<Tri> {
    lathe(&[[0.0, 0.0], [r, 0.0], [0.0, h]], n, false)
}

/// A cut cone, radius `r` at z = 0 and `top` at `h`.
pub(crate) fn frustum(r: f64, top: f64, h: f64, n: usize) -> Vec<Tri> {
    lathe(&[[0.0, 0.0], [r, 0.0], [top, h], [0.0, h]], n, false)
}

/// A sphere in `n` meridians and `n/2` bands.
pub(crate) fn uv_sphere(r: f64, n: usize) -> Vec<Tri> {
    lathe(&arc(r, -PI / 2.0, PI / 2.0, n / 2, 0.0), n, false)
}

/// The upper half of a sphere.
pub(crate) fn hemisphere(r: f64, n: usize) -> Vec<Tri> {
    let mut profile = vec![[0.0, 0.0]];
    profile.extend(arc(r, 0.0, PI / 2.0, n / 4, 0.0));
    lathe(&profile, n, false)
}

/// The top of a sphere about the origin, of height `h`.
pub(crate) fn cap(r: f64, h: f64, n: usize) -> Vec<Tri> {
    let rim = ((r - h) / r).asin();
    let mut profile = vec![[0.0, r * rim.sin()]];
    profile.extend(arc(r, rim, PI / 2.0, n / 4, 0.0));
    lathe(&profile, n, false)
}

/// An ellipsoid of half axes `a`, `b`, `c`.
pub(crate) fn ellipsoid(a: f64, b: f64, c: f64, n: usize) -> Vec<Tri> {
    uv_sphere(1.0, n)
        .into_iter()
        .map(|t| t.map(|p| [p[0] * a, p[1] * b, p[2] * c]))
        .collect()
}

/// A torus about z.
pub(crate) fn torus(big: f64, small: f64, n: usize) -> Vec<Tri> {
    let ring: Vec<[f64; 2]> = ngon(n / 2, small)
        .iter()
        .map(|p| [big + p[0], p[1]])
        .collect();
    lathe(&ring, n, true)
}

/// A paraboloid of revolution, base of radius `r` at z = 0, top at `h`.
pub(crate) fn paraboloid(r: f64, h: f64, n: usize) -> Vec<Tri> {
    let steps = n / 4;
    let mut profile = vec![[0.0, 0.0]];
    profile.extend((0..=steps).map(|i| {
        let u = 1.0 - i as f64 / steps as f64;
        [r * u, h * (1.0 - u * u)]
    }));
    lathe(&profile, n, false)
}

/// A cylinder of length `l` with half spheres on both ends, its middle at the origin.
pub(crate) fn capsule(r: f64, l: f64, n: usize) -> Vec<Tri> {
    let mut profile = arc(r, -PI / 2.0, 0.0, n / 4, -l / 2.0);
    profile.extend(arc(r, 0.0, PI / 2.0, n / 4, l / 2.0));
    lathe(&profile, n, false)
}

/// A pyramid on the square of side `a` about the origin in z = 0.
pub(crate) fn pyramid(a: f64, h: f64) -> Vec<Tri> {
    let b = a / 2.0;
    let p = [
        [-b, -b, 0.0],
        [b, -b, 0.0],
        [b, b, 0.0],
        [-b, b, 0.0],
        [0.0, 0.0, h],
    ];
    let mut faces = vec![vec![3, 2, 1, 0]];
    faces.extend((0..4).map(|i| vec![i, (i + 1) % 4, 4]));
    polyhedron(&p, &faces)
}

/// The tetrahedron of the origin and a point on each axis.
pub(crate) fn corner_tetrahedron(a: f64, b: f64, c: f64) -> Vec<Tri> {
    let p = [[0.0; 3], [a, 0.0, 0.0], [0.0, b, 0.0], [0.0, 0.0, c]];
    polyhedron(
        &p,
        &[vec![0, 2, 1], vec![0, 1, 3], vec![1, 2, 3], vec![0, 3, 2]],
    )
}

/// The convex hull of points about the origin, by trying every plane; faces whole.
pub(crate) fn hull(points: &[P]) -> Vec<Tri> {
    let n = points.len();
    let sub = |a: P, b: P| [0, 1, 2].map(|k| a[k] - b[k]);
    let mut faces: Vec<Vec<usize>> = Vec::new();
    for i in 0..n {
        for j in 0..n {
            for k in 0..n {
                if i == j || j == k || k == i {
                    continue;
                }
                let normal = cross(sub(points[j], points[i]), sub(points[k], points[i]));
                let side: Vec<f64> = points
                    .iter()
                    .map(|p| dot(normal, sub(*p, points[i])))
                    .collect();
                if side.iter().any(|s| *s > 1e-9) {
                    continue;
                }
                let mut on: Vec<usize> = (0..n).filter(|&q| side[q].abs() <= 1e-9).collect();
                if faces.iter().any(|f| on.iter().all(|q| f.contains(q))) {
                    continue;
                }
                let middle = [0, 1, 2]
                    .map(|a| on.iter().map(|&q| points[q][a]).sum::<f64>() / on.len() as f64);
                let u = sub(points[on[0]], middle);
                let v = cross(normal, u);
                let size = dot(v, v).sqrt() / dot(u, u).sqrt();
                on.sort_by(|&a, &b| {
                    let angle = |q: usize| {
                        let d = sub(points[q], middle);
                        (dot(d, v) / size).atan2(dot(d, u))
                    };
                    angle(a).total_cmp(&angle(b))
                });
                faces.push(on);
            }
        }
    }
    polyhedron(points, &faces)
}

/// Vertices of the regular solid of 4, 8, 12 or 20 faces, edge 1, middle at the origin.
pub(crate) fn regular(faces: usize) -> Vec<P> {
    let phi = (1.0 + 5f64.sqrt()) / 2.0;
    let mut out = Vec::new();
    let signs = [-1.0, 1.0];
    match faces {
        4 => {
            let s = 1.0 / 8f64.sqrt();
            out.extend([[s, s, s], [s, -s, -s], [-s, s, -s], [-s, -s, s]]);
        }
        8 => {
            let s = 0.5f64.sqrt();
            for k in 0..3 {
                for sign in signs {
                    let mut p = [0.0; 3];
                    p[k] = sign * s;
                    out.push(p);
                }
            }
        }
        _ => {
            let (long, short) = if faces == 20 {
                (phi / 2.0, 0.5)
            } else {
                // Edge 2/φ before scaling.
                (phi * phi / 2.0, 0.5)
            };
            for k in 0..3 {
                for s in signs {
                    for t in signs {
                        let mut p = [0.0; 3];
                        p[k] = s * long;
                        p[(k + 1) % 3] = t * short;
                        out.push(p);
                    }
                }
            }
            if faces == 12 {
                for i in 0..8 {
                    out.push([0, 1, 2].map(|k| signs[i >> k & 1] * phi / 2.0));
                }
            }
        }
    }
    out
}

/// The icosahedron on the unit sphere, each triangle cut in four `times` times, the new points
/// brought onto the sphere.
pub(crate) fn icosphere(times: usize) -> Vec<Tri> {
    let to_sphere = |p: P| {
        let l = dot(p, p).sqrt();
        p.map(|x| x / l)
    };
    let mut points: Vec<P> = Vec::new();
    let mut faces: Vec<[usize; 3]> = Vec::new();
    for t in hull(&regular(20)) {
        faces.push(t.map(|p| {
            let p = to_sphere(p);
            points.iter().position(|q| *q == p).unwrap_or_else(|| {
                points.push(p);
                points.len() - 1
            })
        }));
    }
    for _ in 0..times {
        let mut middles: HashMap<(usize, usize), usize> = HashMap::new();
        let mut next = Vec::with_capacity(faces.len() * 4);
        for f in &faces {
            let m = [0, 1, 2].map(|i| {
                let (a, b) = (f[i].min(f[(i + 1) % 3]), f[i].max(f[(i + 1) % 3]));
                *middles.entry((a, b)).or_insert_with(|| {
                    points.push(to_sphere([0, 1, 2].map(|k| points[a][k] + points[b][k])));
                    points.len() - 1
                })
            });
            next.extend([
                [f[0], m[0], m[2]],
                [m[0], f[1], m[1]],
                [m[2], m[1], f[2]],
                [m[0], m[1], m[2]],
            ]);
        }
        faces = next;
    }
    faces.iter().map(|f| f.map(|i| points[i])).collect()
}

/// The surface turned inside out.
pub(crate) fn reversed(triangles: &[Tri]) -> Vec<Tri> {
    triangles.iter().map(|t| [t[0], t[2], t[1]]).collect()
}

/// Every corner through `f`.
pub(crate) fn mapped(triangles: &[Tri], f: impl Fn(P) -> P) -> Vec<Tri> {
    triangles.iter().map(|t| t.map(&f)).collect()
}

/// The surface moved by `d`.
pub(crate) fn moved(triangles: &[Tri], d: P) -> Vec<Tri> {
    mapped(triangles, |p| [p[0] + d[0], p[1] + d[1], p[2] + d[2]])
}

pub(crate) fn cross(a: P, b: P) -> P {
    [
        a[1] * b[2] - a[2] * b[1],
        a[2] * b[0] - a[0] * b[2],
        a[0] * b[1] - a[1] * b[0],
    ]
}

pub(crate) fn dot(a: P, b: P) -> f64 {
    a[0] * b[0] + a[1] * b[1] + a[2] * b[2]
}
