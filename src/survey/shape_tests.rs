//! Shapes laid on each other: symmetric ones, mirrored ones, and ones that only seem alike.

use nalgebra::{Matrix3, Rotation3, Vector3};

use super::{Likeness, Shape};

type Tri = [[f64; 3]; 3];

/// A prism over a polygon that is seen from its middle.
fn prism(base: &[[f64; 2]], height: f64) -> Vec<Tri> {
    let n = base.len();
    let p = |i: usize, z: f64| [base[i % n][0], base[i % n][1], z];
    let mut out = Vec::new();
    for i in 0..n {
        let j = i + 1;
        out.extend([
            [p(i, 0.0), p(j, 0.0), p(j, height)],
            [p(i, 0.0), p(j, height), p(i, height)],
            [[0.0, 0.0, 0.0], p(j, 0.0), p(i, 0.0)],
            [[0.0, 0.0, height], p(i, height), p(j, height)],
        ]);
    }
    out
}

fn regular(n: u32, r: f64) -> Vec<[f64; 2]> {
    let turn = |i: u32| f64::from(i) / f64::from(n) * std::f64::consts::TAU;
    (0..n)
        .map(|i| [r * turn(i).cos(), r * turn(i).sin()])
        .collect()
}

/// A wheel with teeth of one length, but for one that is `odd`.
fn gear(teeth: u32, odd: f64) -> Vec<Tri> {
    let base: Vec<[f64; 2]> = regular(2 * teeth, 1.0)
        .into_iter()
        .enumerate()
        .map(|(i, [x, y])| {
            let k = if i == 0 { odd } else { [1.3, 1.0][i % 2] };
            [k * x, k * y]
        })
        .collect();
    prism(&base, 0.4)
}

/// An octahedron, each face cut into four and laid on the ball, `deep` times.
fn ball(deep: u32) -> Vec<Tri> {
    let mut out: Vec<Tri> = Vec::new();
    for x in [-1.0, 1.0] {
        for y in [-1.0, 1.0] {
            for z in [-1.0, 1.0] {
                let t = [[x, 0.0, 0.0], [0.0, y, 0.0], [0.0, 0.0, z]];
                out.push(if x * y * z > 0.0 {
                    t
                } else {
                    [t[0], t[2], t[1]]
                });
            }
        }
    }
    let mid = |a: [f64; 3], b: [f64; 3]| {
        let m = Vector3::from(a) + Vector3::from(b);
        let m: [f64; 3] = m.normalize().into();
        m
    };
    for _ in 0..deep {
        out = out
            .iter()
            .flat_map(|&[a, b, c]| {
                let (d, e, f) = (mid(a, b), mid(b, c), mid(c, a));
                [[a, d, f], [d, b, e], [f, e, c], [d, e, f]]
            })
            .collect();
    }
    out
}

/// A bracket without any symmetry: the corners of a box, moved.
fn bracket() -> Vec<Tri> {
    let base = [
        [-2.0, -1.0],
        [2.1, -1.2],
        [1.7, 0.2],
        [0.4, 0.5],
        [-0.2, 1.9],
        [-1.8, 1.5],
    ];
    let mut out = prism(&base, 0.7);
    for p in out.iter_mut().flatten() {
        p[2] += 0.11 * p[0] + 0.05 * p[0] * p[1];
    }
    out
}

/// Turned and moved, rounded to f32 as an export would be; mirrored first if asked for.
fn placed(facets: &[Tri], seed: f64, mirrored: bool) -> Vec<Tri> {
    let axis = Vector3::new(seed.sin(), (2.0 * seed).cos(), 0.3).normalize();
    let mut turn: Matrix3<f64> = Rotation3::new(axis * (1.0 + seed)).into_inner();
    if mirrored {
        turn *= Matrix3::from_diagonal(&Vector3::new(-1.0, 1.0, 1.0));
    }
    let at = Vector3::new(3.0 * seed, -2.0, 5.0);
    let mut out: Vec<Tri> = facets
        .iter()
        .map(|t| {
            let t = t.map(|p| {
                let q = turn * Vector3::from(p) + at;
                [q.x, q.y, q.z].map(|x| f64::from(x as f32))
            });
            if mirrored { [t[0], t[2], t[1]] } else { t }
        })
        .collect();
    // Facets in another order, beginning at another corner.
    let n = out.len();
    out.rotate_left(n / 3);
    out.iter_mut().for_each(|t| t.rotate_left(1));
    out
}

fn compare(a: &[Tri], b: &[Tri]) -> Likeness {
    Shape::of(a).unwrap().compare(&Shape::of(b).unwrap())
}

#[test]
fn symmetric_bodies_are_found_wherever_they_stand() {
    let square = [[-1.0, -1.0], [1.0, -1.0], [1.0, 1.0], [-1.0, 1.0]];
    for (name, body) in [
        ("cube", prism(&square, 2.0)),
        ("square bar", prism(&square, 7.0)),
        ("cylinder", prism(&regular(96, 1.0), 3.0)),
        (
            "disc as high as it makes all moments equal",
            prism(&regular(60, 1.0), 3.0f64.sqrt()),
        ),
        ("gear", gear(24, 1.3)),
        ("ball", ball(4)),
        ("coarse ball", ball(0)),
    ] {
        for seed in [0.0, 0.4, 1.7, 2.9] {
            for mirrored in [false, true] {
                // All of these are their own mirror image.
                let got = compare(&body, &placed(&body, seed, mirrored));
                assert_eq!(got, Likeness::Same { mirrored: false }, "{name} {seed}");
            }
        }
    }
}

#[test]
fn a_mirror_image_is_told_from_the_thing_itself() {
    // The gear has an odd tooth, and its plate is thicker there: no plane of symmetry is left.
    let mut odd = gear(24, 1.4);
    for p in odd.iter_mut().flatten() {
        p[2] *= 1.0 + 0.2 * p[0] + 0.1 * p[1];
    }
    for body in [bracket(), odd] {
        for seed in [0.3, 1.1, 2.2] {
            let same = compare(&body, &placed(&body, seed, false));
            assert_eq!(same, Likeness::Same { mirrored: false });
            let mirror = compare(&body, &placed(&body, seed, true));
            assert_eq!(mirror, Likeness::Same { mirrored: true });
        }
    }
}

#[test]
fn what_only_seems_alike_is_told_apart() {
    // One tooth in sixteen is moved to another place: the same counts, volumes nearly, and a
    // hundredth of the width in one vertex.
    let a = gear(24, 1.3);
    assert_eq!(
        compare(&a, &placed(&gear(24, 1.31), 0.8, false)),
        Likeness::Different
    );
    let mut moved = bracket();
    let corner = moved[7][1];
    for p in moved.iter_mut().flatten().filter(|p| **p == corner) {
        p[0] += 1e-4;
    }
    assert_eq!(
        compare(&bracket(), &placed(&moved, 0.8, false)),
        Likeness::Different
    );
    // Two teeth longer, next to each other or across: equal volume, area and number of vertices.
    let two = |other: usize| {
        let base: Vec<[f64; 2]> = regular(16, 1.0)
            .into_iter()
            .enumerate()
            .map(|(i, [x, y])| {
                let k = if i == 0 || i == other {
                    1.5
                } else {
                    [1.3, 1.0][i % 2]
                };
                [k * x, k * y]
            })
            .collect();
        prism(&base, 1.0)
    };
    for (a, b) in [(2, 4), (4, 8), (2, 8)] {
        assert_eq!(
            compare(&two(a), &placed(&two(b), 0.6, false)),
            Likeness::Different
        );
    }
    // A tooth to the left of the long one is a tooth to the right, turned over.
    assert_eq!(
        compare(&two(4), &placed(&two(12), 0.6, false)),
        Likeness::Same { mirrored: false }
    );
    assert_eq!(compare(&ball(3), &ball(4)), Likeness::Different);
}

#[test]
fn an_open_or_empty_body_has_no_shape() {
    assert!(Shape::of(&[]).is_none());
    let t = [[0.0; 3], [1.0, 0.0, 0.0], [0.0, 1.0, 0.0]];
    assert!(Shape::of(&[t, [t[0], t[2], t[1]]]).is_none());
}
