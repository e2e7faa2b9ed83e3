//! Laws of moments, as properties; and what a rigid motion or another order of triangles must not
//! change in the whole chain from mesh to findings.
#![allow(clippy::unwrap_used, clippy::panic)]

#[path = "support/solids.rs"]
mod solids;

use bismar::mesh::{Mesh, Soup};
use bismar::moments::{Moments, Placement, principal};
use bismar::soundness::audit;
use nalgebra::{Matrix3, Rotation3, Unit, Vector3};
use proptest::prelude::*;
use solids::*;

/// Points with weights of both signs: any moments there can be.
fn points() -> impl Strategy<Value = Vec<(Vector3<f64>, f64)>> {
    prop::collection::vec((vector(10.0), 0.1..5.0f64), 2..12)
}

fn vector(size: f64) -> impl Strategy<Value = Vector3<f64>> {
    [-size..size, -size..size, -size..size].prop_map(Vector3::from)
}

/// Turns, half of them with a mirror.
fn turn() -> impl Strategy<Value = Matrix3<f64>> {
    (vector(1.0), 0.0..6.3f64, any::<bool>()).prop_filter_map("no axis", |(axis, angle, mirror)| {
        let axis = Unit::try_new(axis, 0.1)?;
        let turn = Rotation3::from_axis_angle(&axis, angle).into_inner();
        let flip = if mirror { -1.0 } else { 1.0 };
        Some(turn * Matrix3::from_diagonal(&Vector3::new(flip, 1.0, 1.0)))
    })
}

/// Straight from the definition: ∑ w, ∑ w·d, ∑ w·d·dᵀ.
fn direct(points: &[(Vector3<f64>, f64)], about: Vector3<f64>) -> Moments {
    let mut m = Moments::zero(about);
    for (p, w) in points {
        let d = p - about;
        m.zeroth += w;
        m.first += *w * d;
        m.second += *w * d * d.transpose();
    }
    m
}

fn summed(points: &[(Vector3<f64>, f64)]) -> Moments {
    points.iter().fold(Moments::zero(points[0].0), |m, (p, w)| {
        m.plus(&Moments::point(*p, *w))
    })
}

/// Equal to a few hundred roundings of the largest terms: weights to 60, distances to 60.
fn alike(a: &Moments, b: &Moments) -> Result<(), TestCaseError> {
    let b = b.shifted(a.about);
    let reach = a.about.norm() + b.about.norm() + 20.0;
    let size = a.zeroth.abs().max(1.0);
    prop_assert_eq!(b.second, b.second.transpose());
    prop_assert!((a.zeroth - b.zeroth).abs() <= 1e-14 * size, "{a:?} {b:?}");
    prop_assert!(
        (a.first - b.first).amax() <= 1e-13 * size * reach,
        "{a:?} {b:?}"
    );
    prop_assert!(
        (a.second - b.second).amax() <= 1e-13 * size * reach * reach,
        "{a:?} {b:?}"
    );
    Ok(())
}

/// A closed mesh of integers: a box with every corner moved a little stays closed and sound.
fn odd_box() -> impl Strategy<Value = Vec<Tri>> {
    [
        [-3..4i32, -3..4, -3..4],
        [-3..4, -3..4, -3..4],
        [-3..4, -3..4, -3..4],
    ]
    .prop_map(|m| {
        let m = m.map(|r| r.map(f64::from));
        mapped(&cuboid([0.0; 3], [10.0; 3]), |p| {
            // Each face keeps its side of the middle, so the surface cannot turn over.
            [0, 1, 2].map(|k| 8.0 * p[k] + m[k][0] * p[(k + 1) % 3] / 10.0 + m[k][1] * p[k] / 10.0)
        })
    })
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(256))]

    #[test]
    fn points_add_up_to_the_definition(p in points(), about in vector(20.0)) {
        alike(&direct(&p, about), &summed(&p))?;
    }

    #[test]
    fn shifting_there_and_back_changes_nothing(p in points(), to in vector(20.0)) {
        let m = summed(&p);
        let back = m.shifted(to).shifted(m.about);
        alike(&m, &back)?;
        prop_assert_eq!(m.zeroth, back.zeroth);
        alike(&direct(&p, to), &m.shifted(to))?;
    }

    /// The parallel-axis theorem (Huygens–Steiner): I about a point = I about the centre
    /// + m(d²·1 − d·dᵀ). Textbook, from memory.
    #[test]
    fn the_parallel_axis_theorem_holds(p in points(), about in vector(20.0)) {
        let m = summed(&p);
        let (c, i) = (m.centre().unwrap(), m.inertia().unwrap());
        let d = about - c;
        let steiner = i + m.zeroth * (Matrix3::identity() * d.norm_squared() - d * d.transpose());
        let here = m.shifted(about).inertia_here();
        prop_assert!((here - steiner).amax() <= 1e-13 * steiner.norm().max(1.0) * 10.0);
        // About no point is a moment smaller than about the centre.
        prop_assert!((0..3).all(|k| here[(k, k)] >= i[(k, k)] - 1e-9));
    }

    /// Inertia turns as I′ = R·I·Rᵀ, mirrors included; principal moments stay.
    #[test]
    fn placing_moves_the_points(p in points(), turn in turn(), at in vector(20.0)) {
        let place = Placement { turn, at };
        let there: Vec<_> = p.iter().map(|(x, w)| (place.apply(x), *w)).collect();
        let m = summed(&p);
        let placed = m.placed(&place);
        alike(&direct(&there, placed.about), &placed)?;
        let (i, j) = (m.inertia().unwrap(), placed.inertia().unwrap());
        prop_assert!((turn * i * turn.transpose() - j).amax() <= 1e-12 * i.norm().max(1.0));
        let (a, b) = (principal(&i).moments, principal(&j).moments);
        prop_assert!((0..3).all(|k| (a[k] - b[k]).abs() <= 1e-12 * i.norm().max(1.0)));
    }

    #[test]
    fn placements_chain(p in points(), a in turn(), b in turn(), s in vector(9.0), t in vector(9.0)) {
        let (a, b) = (Placement { turn: a, at: s }, Placement { turn: b, at: t });
        let m = summed(&p);
        alike(&m.placed(&a.then(&b)), &m.placed(&a).placed(&b))?;
    }

    #[test]
    fn addition_is_that_of_the_things(p in points(), q in points()) {
        let (a, b) = (summed(&p), summed(&q));
        let both: Vec<_> = p.iter().chain(&q).copied().collect();
        alike(&direct(&both, a.about), &a.plus(&b))?;
        alike(&a.plus(&b), &b.plus(&a))?;
        alike(&a.plus(&b).plus(&b.weighted(-1.0)), &a)?;
    }

    /// Volume moments go with k³, k⁴, k⁵.
    #[test]
    fn scaling_is_by_the_third_fourth_and_fifth_power(t in odd_box(), k in 0.01..30.0f64) {
        let m = solid(t.clone()).moments;
        let s = m.scaled(k);
        let near = |a: f64, b: f64, size: f64| (a - b).abs() <= 1e-14 * size.abs();
        prop_assert!(near(s.zeroth, m.zeroth * k.powi(3), s.zeroth));
        prop_assert!((0..3).all(|i| near(s.first[i], m.first[i] * k.powi(4), s.first.norm())));
        prop_assert!((0..9).all(|i| near(s.second[i], m.second[i] * k.powi(5), s.second.norm())));
        // And the scaled mesh has them, up to the rounding of its corners.
        let mesh = solid(mapped(&t, |p| p.map(|x| x * k))).moments.shifted(s.about);
        prop_assert!((mesh.zeroth - s.zeroth).abs() <= 1e-13 * s.zeroth);
        prop_assert!((mesh.second - s.second).amax() <= 1e-12 * s.second.norm());
    }

    /// A point put on a facet's plane at integers cuts it in three and changes nothing.
    #[test]
    fn splitting_a_triangle_changes_nothing(t in odd_box(), which in 0..12usize) {
        let whole = solid(t.clone());
        let mut cut = mapped(&t, |p| p.map(|x| x * 3.0));
        let same = solid(cut.clone());
        let [a, b, c] = cut[which];
        let m = [0, 1, 2].map(|k| (a[k] + b[k] + c[k]) / 3.0);
        cut[which] = [a, b, m];
        cut.extend([[b, c, m], [c, a, m]]);
        let parts = solid(cut);
        let near = |x: f64, y: f64, size: f64| (x - y).abs() <= 1e-14 * size.abs();
        let (p, q) = (parts.moments.shifted(same.moments.about), same.moments);
        prop_assert!(near(p.zeroth, q.zeroth, q.zeroth));
        prop_assert!((p.first - q.first).amax() <= 1e-13 * q.zeroth * 300.0);
        prop_assert!((p.second - q.second).amax() <= 1e-13 * q.second.norm());
        prop_assert!(near(parts.area, same.area, same.area * 10.0));
        prop_assert!(near(q.zeroth, 27.0 * whole.moments.zeroth, q.zeroth));
    }

    /// A box cut in two by a plane: the halves sum to the whole.
    #[test]
    fn two_halves_are_the_whole(hi in [1..50u32, 1..50u32, 2..50u32], at in 1..50u32) {
        let hi = hi.map(f64::from);
        let z = f64::from(at).min(hi[2] - 1.0);
        let low = solid(cuboid([0.0; 3], [hi[0], hi[1], z])).moments;
        let high = solid(cuboid([0.0, 0.0, z], hi)).moments;
        let whole = solid(cuboid([0.0; 3], hi)).moments;
        let sum = low.plus(&high).shifted(whole.about);
        prop_assert!((sum.zeroth - whole.zeroth).abs() <= 1e-15 * whole.zeroth * 4.0);
        prop_assert!((sum.first - whole.first).amax() <= 1e-14 * whole.first.norm());
        prop_assert!((sum.second - whole.second).amax() <= 1e-14 * whole.second.norm());
    }
}

/// Closed, turned; shells, voids, triangles; volume in grains; findings.
type SaidOfBody = (bool, bool, usize, usize, usize, Option<i64>, Vec<String>);

/// What is said of a mesh that does not depend on where it stands: bodies by volume, findings.
#[derive(Debug, PartialEq)]
struct Said {
    bodies: Vec<SaidOfBody>,
    file: Vec<String>,
}

fn said(soup: Soup, grain: f64) -> Said {
    let mesh = Mesh::new(soup, "it").unwrap();
    let found = audit(&mesh, 1.0, 3, bismar::soundness::Depth::Surface);
    let name =
        |f: &bismar::soundness::Finding| format!("{:?} {:?} {}", f.kind, f.severity, f.count);
    let mut bodies: Vec<_> = mesh
        .bodies()
        .iter()
        .zip(&found.bodies)
        .map(|(b, f)| {
            let v = mesh
                .solid(b, None)
                .ok()
                .map(|s| (s.moments.zeroth / grain).round() as i64);
            let f = f.iter().map(name).collect();
            (
                b.closed,
                b.turned,
                b.shell_count(),
                b.void_count(),
                b.triangles,
                v,
                f,
            )
        })
        .collect();
    bodies.sort();
    Said {
        bodies,
        file: found.file.iter().map(name).collect(),
    }
}

/// Meshes with all that can be odd: voids, nested solids, touching edges, holes, flips, duplicates.
fn zoo() -> Vec<(&'static str, Vec<Tri>)> {
    let cube = |lo: f64, hi: f64| cuboid([lo; 3], [hi; 3]);
    let join = |lists: &[Vec<Tri>]| lists.concat();
    let mut holed = cube(0.0, 8.0);
    holed.remove(3);
    let mut flipped = cube(0.0, 8.0);
    flipped[4].swap(0, 1);
    let mut doubled = cube(0.0, 8.0);
    doubled.push(doubled[5]);
    vec![
        ("cube", cube(0.0, 8.0)),
        ("inside out", reversed(&cube(0.0, 8.0))),
        ("void", join(&[cube(0.0, 8.0), reversed(&cube(2.0, 4.0))])),
        ("nested", join(&[cube(0.0, 8.0), cube(2.0, 4.0)])),
        (
            "edge",
            join(&[cube(0.0, 8.0), cuboid([8.0, 8.0, 0.0], [16.0, 16.0, 8.0])]),
        ),
        ("vertex", join(&[cube(0.0, 8.0), cube(8.0, 16.0)])),
        (
            "face",
            join(&[cube(0.0, 8.0), cuboid([8.0, 0.0, 0.0], [16.0, 8.0, 8.0])]),
        ),
        ("hole", holed),
        ("flip", flipped),
        ("doubled", doubled),
        ("twice", join(&[cube(0.0, 8.0), cube(0.0, 8.0)])),
        ("torus", torus(4.0, 1.0, 24)),
    ]
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(24))]

    /// Motions that keep the coordinates exact: quarter turns by a signed permutation of the axes
    /// with determinant +1, and whole steps.
    #[test]
    fn a_rigid_move_changes_no_body_and_no_finding(
        axes in Just([0usize, 1, 2]).prop_shuffle(),
        signs in [any::<bool>(), any::<bool>()],
        by in [-99..99i32, -99..99, -99..99],
    ) {
        let even = matches!(axes, [0, 1, 2] | [1, 2, 0] | [2, 0, 1]);
        let s = [signs[0], signs[1], (signs[0] == signs[1]) == even].map(|b| if b { 1.0 } else { -1.0 });
        for (name, t) in zoo() {
            // The torus has no exact coordinates to move by whole steps.
            let by = if name == "torus" { [0.0; 3] } else { by.map(f64::from) };
            let there = mapped(&t, |p| [0, 1, 2].map(|k| s[k] * p[axes[k]] + by[k]));
            prop_assert_eq!(said(soup(t), 1e-6), said(soup(there), 1e-6), "{}", name);
        }
    }

    #[test]
    fn the_order_of_triangles_and_of_corners_changes_no_body_and_no_finding(
        order in Just((0..1000u32).collect::<Vec<_>>()).prop_shuffle(),
        starts in prop::collection::vec(0..3usize, 1000),
    ) {
        for (name, t) in zoo() {
            let mut mixed: Vec<Tri> = order
                .iter()
                .filter_map(|&i| t.get(i as usize))
                .zip(&starts)
                .map(|(t, &k)| [t[k], t[(k + 1) % 3], t[(k + 2) % 3]])
                .collect();
            mixed.extend(t.iter().skip(1000));
            prop_assert_eq!(said(soup(t), 1e-6), said(soup(mixed), 1e-6), "{}", name);
        }
    }
}
