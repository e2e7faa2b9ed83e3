//! Against a brute force in exact rational arithmetic that shares no step with the predicates: it
//! clips one triangle by the other and looks at what is left.

use super::*;
use num_rational::BigRational;
use num_traits::{Signed, Zero};
use proptest::prelude::*;

type Q = BigRational;
type V = [Q; 3];

fn exact(p: &Point) -> V {
    p.map(|x| Q::from_float(x).unwrap())
}
fn sub(a: &V, b: &V) -> V {
    [0, 1, 2].map(|k| &a[k] - &b[k])
}
fn cross(a: &V, b: &V) -> V {
    [
        &a[1] * &b[2] - &a[2] * &b[1],
        &a[2] * &b[0] - &a[0] * &b[2],
        &a[0] * &b[1] - &a[1] * &b[0],
    ]
}
fn dot(a: &V, b: &V) -> Q {
    &a[0] * &b[0] + &a[1] * &b[1] + &a[2] * &b[2]
}

/// Keeps the part of a convex polygon (or segment, as two points) where f ≥ 0.
fn clip(shape: Vec<V>, f: impl Fn(&V) -> Q) -> Vec<V> {
    let mut out = Vec::new();
    for (i, p) in shape.iter().enumerate() {
        let next = &shape[(i + 1) % shape.len()];
        let (d, e) = (f(p), f(next));
        if !d.is_negative() {
            out.push(p.clone());
        }
        if (&d * &e).is_negative() {
            let part = &d / (&d - &e);
            out.push([0, 1, 2].map(|k| &p[k] + (&next[k] - &p[k]) * &part));
        }
    }
    let mut kept: Vec<V> = Vec::new();
    for p in out {
        if !kept.contains(&p) {
            kept.push(p);
        }
    }
    kept
}

/// Whether the point lies on an edge of the triangle.
fn on_edge(t: &[V; 3], p: &V) -> Option<usize> {
    (0..3).find(|&k| {
        let c = cross(&sub(&t[(k + 1) % 3], &t[k]), &sub(p, &t[k]));
        c.iter().all(Zero::is_zero)
    })
}

fn brute(t: &[Point; 3], u: &[Point; 3]) -> Meeting {
    let (t, u) = (t.map(|p| exact(&p)), u.map(|p| exact(&p)));
    let normal = |t: &[V; 3]| cross(&sub(&t[1], &t[0]), &sub(&t[2], &t[0]));
    let (nt, nu) = (normal(&t), normal(&u));
    let none = |n: &V| n.iter().all(Zero::is_zero);
    if none(&nt) || none(&nu) {
        return Meeting::Apart;
    }
    // Both half-spaces of u's plane leave what lies in it; then the three edges of u.
    let mut shape = t.to_vec();
    shape = clip(shape, |p| dot(&nu, &sub(p, &u[0])));
    shape = clip(shape, |p| -dot(&nu, &sub(p, &u[0])));
    for k in 0..3 {
        let inward = cross(&nu, &sub(&u[(k + 1) % 3], &u[k]));
        shape = clip(shape, |p| dot(&inward, &sub(p, &u[k])));
    }
    if shape.len() < 2 {
        return Meeting::Apart;
    }
    if shape.len() > 2 {
        return Meeting::Coplanar {
            opposed: dot(&nt, &nu).is_negative(),
        };
    }
    if none(&cross(&nt, &nu)) {
        // In one plane, touching along an edge.
        return Meeting::Apart;
    }
    let half = Q::new(1.into(), 2.into());
    let middle: V = [0, 1, 2].map(|k| (&shape[0][k] + &shape[1][k]) * &half);
    let side = |n: &V, a: &V, t: &[V; 3]| {
        let s = t
            .iter()
            .map(|p| dot(n, &sub(p, a)))
            .find(|d| !d.is_zero())
            .unwrap();
        if s.is_positive() { 1 } else { -1 }
    };
    match (on_edge(&t, &middle), on_edge(&u, &middle)) {
        (None, None) => Meeting::Crosses,
        (Some(_), None) => Meeting::EdgeOn {
            first: true,
            side: side(&nu, &u[0], &t),
        },
        (None, Some(_)) => Meeting::EdgeOn {
            first: false,
            side: side(&nt, &t[0], &u),
        },
        (Some(e), Some(f)) => Meeting::EdgeOnEdge { edges: [e, f] },
    }
}

/// Few distinct values, so that grazing, coplanar and shared cases are common.
fn small(most: i8) -> impl Strategy<Value = [Point; 3]> {
    prop::array::uniform9(-most..=most)
        .prop_map(|v| [0, 3, 6].map(|k| [0, 1, 2].map(|i| f64::from(v[k + i]))))
}

fn flat_small() -> impl Strategy<Value = [Point; 3]> {
    prop::array::uniform6(-3i8..=3).prop_map(|v| {
        // The plane x + 2y = z.
        [0, 2, 4].map(|k| {
            let (x, y) = (f64::from(v[k]), f64::from(v[k + 1]));
            [x, y, x + 2.0 * y]
        })
    })
}

fn agrees(t: &[Point; 3], u: &[Point; 3]) -> Result<(), TestCaseError> {
    let want = brute(t, u);
    prop_assert_eq!(meeting(t, u), want);
    // Turning corners about keeps the meeting; swapping the triangles swaps its ends.
    let turned = [t[1], t[2], t[0]];
    let expected = match want {
        Meeting::EdgeOnEdge { edges: [e, f] } => Meeting::EdgeOnEdge {
            edges: [(e + 2) % 3, f],
        },
        same => same,
    };
    prop_assert_eq!(meeting(&turned, u), expected);
    let swapped = match want {
        Meeting::EdgeOn { first, side } => Meeting::EdgeOn {
            first: !first,
            side,
        },
        Meeting::EdgeOnEdge { edges: [e, f] } => Meeting::EdgeOnEdge { edges: [f, e] },
        same => same,
    };
    prop_assert_eq!(meeting(u, t), swapped);
    let shared = |a: &[Point; 3], b: &[Point; 3]| a.map(|p| b.contains(&p));
    prop_assert_eq!(meeting_sharing(t, u, shared(t, u), shared(u, t)), want);
    let (p, q) = (shared(t, u), shared(u, t));
    let third = |s: [bool; 3]| (0..3).find(|&k| !s[k] && s[(k + 1) % 3] && s[(k + 2) % 3]);
    if let (Some(a), Some(b)) = (third(p), third(q)) {
        let folded = matches!(want, Meeting::Coplanar { .. });
        let flat = is_flat(t) || is_flat(u);
        prop_assert!(flat || unfolded(t, u, a, b) || folded || want == Meeting::Apart);
        prop_assert!(!(folded && unfolded(t, u, a, b)));
    }
    if want != Meeting::Apart {
        // The point lies in both boxes, to rounding.
        let p = meeting_point(t, u);
        for q in [t, u] {
            for k in 0..3 {
                let (low, high) = (
                    q[0][k].min(q[1][k]).min(q[2][k]),
                    q[0][k].max(q[1][k]).max(q[2][k]),
                );
                prop_assert!(p[k] >= low - 1e-9 && p[k] <= high + 1e-9, "{:?}", p);
            }
        }
    }
    Ok(())
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(3000))]

    #[test]
    fn agrees_with_exact_clipping_on_a_coarse_lattice(t in small(1), u in small(1)) {
        agrees(&t, &u)?;
    }

    #[test]
    fn agrees_with_exact_clipping_on_a_finer_lattice(t in small(4), u in small(4)) {
        agrees(&t, &u)?;
    }

    #[test]
    fn agrees_with_exact_clipping_in_one_plane(t in flat_small(), u in flat_small()) {
        agrees(&t, &u)?;
    }

    #[test]
    fn nearly_flat_pairs_agree_with_exact_clipping(
        t in flat_small(), u in flat_small(), at in 0usize..18, by in -2i64..=2
    ) {
        // One coordinate off by an ulp or two.
        let (mut t, mut u) = (t, u);
        let (corner, k) = (at / 3 % 3, at % 3);
        let x = if at < 9 { &mut t[corner][k] } else { &mut u[corner][k] };
        *x = f64::from_bits((x.to_bits() as i64 + by).max(0) as u64);
        agrees(&t, &u)?;
    }

    #[test]
    fn neighbours_agree_with_exact_clipping(t in small(3), u in small(3), two in any::<bool>()) {
        let u = [t[0], if two { t[1] } else { u[1] }, u[2]];
        agrees(&t, &u)?;
    }
}

#[test]
fn every_kind_of_meeting_occurs_on_the_lattice() {
    let base = [[0.0, 0.0, 0.0], [4.0, 0.0, 0.0], [0.0, 4.0, 0.0]];
    let through = [[1.0, 1.0, -1.0], [1.0, 1.0, 1.0], [1.5, 1.0, 1.0]];
    assert_eq!(meeting(&base, &through), Meeting::Crosses);
    let standing = [[1.0, 1.0, 0.0], [2.0, 1.0, 0.0], [1.0, 1.0, 1.0]];
    let on = |side| Meeting::EdgeOn { first: false, side };
    assert_eq!(meeting(&base, &standing), on(1));
    let hanging = standing.map(|p| [p[0], p[1], -p[2]]);
    assert_eq!(meeting(&base, &hanging), on(-1));
    let beside = [[1.0, 0.0, 0.0], [2.0, 0.0, 0.0], [1.0, 0.0, 1.0]];
    let edges = Meeting::EdgeOnEdge { edges: [0, 0] };
    assert_eq!(meeting(&base, &beside), edges);
    let tip = [[1.0, 1.0, 0.0], [1.0, 1.0, 1.0], [2.0, 1.0, 1.0]];
    assert_eq!(meeting(&base, &tip), Meeting::Apart);
}
