//! Against closed forms: boxes by inclusion and exclusion, the lens of two spheres, the solid that
//! two equal cylinders share.

use super::*;
use crate::soundness::filled;
use nalgebra::Vector3;
use proptest::prelude::*;
use std::f64::consts::{PI, TAU};

type Facet = [Point; 3];

fn block(low: Point, high: Point) -> Vec<Facet> {
    let at = |i: usize| [0, 1, 2].map(|k| if i >> k & 1 == 0 { low[k] } else { high[k] });
    [
        [0, 2, 3, 1],
        [4, 5, 7, 6],
        [0, 1, 5, 4],
        [2, 6, 7, 3],
        [0, 4, 6, 2],
        [1, 3, 7, 5],
    ]
    .iter()
    .flat_map(|q| [[q[0], q[1], q[2]], [q[0], q[2], q[3]]])
    .map(|t| t.map(at))
    .collect()
}

/// A unit sphere by `n` rings of 2n, vertices on the sphere; and the radius of a ball inside it.
fn sphere(n: usize, centre: Point) -> (Vec<Facet>, f64) {
    let at = |i: usize, j: usize| {
        if i == 0 || i == n {
            let z = if i == 0 { 1.0 } else { -1.0 };
            return [centre[0], centre[1], centre[2] + z];
        }
        let (a, b) = (
            PI * i as f64 / n as f64,
            PI * (j % (2 * n)) as f64 / n as f64,
        );
        [
            centre[0] + a.sin() * b.cos(),
            centre[1] + a.sin() * b.sin(),
            centre[2] + a.cos(),
        ]
    };
    let mut out = Vec::new();
    for i in 0..n {
        for j in 0..2 * n {
            let (a, b, c, d) = (at(i, j), at(i + 1, j), at(i + 1, j + 1), at(i, j + 1));
            if i + 1 < n {
                out.push([a, b, c]);
            }
            if i > 0 {
                out.push([a, c, d]);
            }
        }
    }
    // Of each facet's plane, its distance from the centre.
    let inner = out
        .iter()
        .map(|t| {
            let [a, b, c] = t.map(|p| Vector3::from(p) - Vector3::from(centre));
            (b - a).cross(&(c - a)).normalize().dot(&a)
        })
        .fold(f64::INFINITY, f64::min);
    (out, inner)
}

/// A cylinder of unit radius along an axis, of length 6 about the origin, by `n` strips.
fn cylinder(n: usize, axis: usize) -> Vec<Facet> {
    let at = |j: usize, along: f64, r: f64| {
        let w = TAU * (j % n) as f64 / n as f64;
        let mut p = [0.0; 3];
        p[axis] = along;
        p[(axis + 1) % 3] = r * w.cos();
        p[(axis + 2) % 3] = r * w.sin();
        p
    };
    (0..n)
        .flat_map(|j| {
            let (a, b) = (at(j, -3.0, 1.0), at(j + 1, -3.0, 1.0));
            let (c, d) = (at(j + 1, 3.0, 1.0), at(j, 3.0, 1.0));
            let (low, high) = (at(0, -3.0, 0.0), at(0, 3.0, 0.0));
            [[a, b, c], [a, c, d], [low, b, a], [high, d, c]]
        })
        .collect()
}

#[test]
fn two_spheres_share_a_lens() {
    for d in [0.3, 1.0, 1.7] {
        let (a, inner) = sphere(120, [0.1, -0.2, 0.3]);
        let (b, _) = sphere(120, [0.1 + d, -0.2, 0.3]);
        let found = shared_spaces(&[&a, &b], 1e-4);
        assert_eq!(found.len(), 1);
        let (v, error) = (found[0].moments.zeroth, found[0].volume_error);
        // π(4R + d)(2R − d)²/12 for spheres of radius R (elementary: two equal caps); the facets
        // lie between the spheres of radius `inner` and 1.
        let lens = |r: f64| PI * (4.0 * r + d) * (2.0 * r - d).powi(2) / 12.0;
        assert!(
            v > lens(inner) - error && v < lens(1.0) + error,
            "{d}: {v} ± {error}"
        );
        assert!(error <= 1e-4 * 4.2, "{error}");
        let centre = found[0].moments.centre().unwrap();
        assert!((centre - Vector3::new(0.1 + d / 2.0, -0.2, 0.3)).norm() < 1e-3);
    }
}

#[test]
fn equal_cylinders_that_cross_share_sixteen_thirds() {
    // 16 r³/3 (Archimedes, The Method); prisms of n sides lie between r cos(π/n) and r.
    let n = 720;
    let (a, b) = (cylinder(n, 0), cylinder(n, 1));
    let (m, error) = common_space(&a, &b, [[-1.0; 3], [1.0; 3]], 0.0);
    let inner = (PI / n as f64).cos().powi(3);
    let exact = 16.0 / 3.0;
    assert!(
        m.zeroth > exact * inner - error && m.zeroth < exact + error,
        "{}",
        m.zeroth
    );
    assert!(error < 1e-4, "{error}");
    let both = [a, b].concat();
    let f = filled(&both, 1e-5);
    let union = |r: f64| 2.0 * PI * r * r * 6.0 - exact * r.powi(3);
    let v = f.moments.zeroth;
    assert!(
        v < union(1.0) + f.volume_error && v > union(inner.cbrt()) - f.volume_error,
        "{v} ± {}",
        f.volume_error
    );
}

fn sides(a: (Point, Point), b: (Point, Point)) -> f64 {
    (0..3)
        .map(|k| (a.1[k].min(b.1[k]) - a.0[k].max(b.0[k])).max(0.0))
        .product()
}

#[test]
fn the_error_of_boxes_holds_and_shrinks() {
    let (a, b) = (
        ([0.0; 3], [4.0, 3.0, 2.0]),
        ([1.0, 1.0, -1.0], [3.0, 5.0, 1.5]),
    );
    let exact = sides(a, b);
    let (x, y) = (block(a.0, a.1), block(b.0, b.1));
    let mut last = f64::INFINITY;
    for wanted in [1e-2, 1e-3, 1e-4] {
        let (m, error) = common_space(&x, &y, [[1.0, 1.0, 0.0], [3.0, 3.0, 1.5]], wanted * exact);
        assert!((m.zeroth - exact).abs() <= error, "{} {error}", m.zeroth);
        assert!(error <= wanted * exact && error < last);
        last = error;
    }
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(40))]

    #[test]
    fn boxes_share_and_fill_by_inclusion_and_exclusion(
        low in prop::array::uniform3(-3i8..=3), size in prop::array::uniform3(1i8..=4)
    ) {
        // Small whole numbers: faces in contact, flush and nested are common.
        let a = ([0.0; 3], [3.0; 3]);
        let low = low.map(f64::from);
        let b = (low, [0, 1, 2].map(|k| low[k] + f64::from(size[k])));
        let (x, y) = (block(a.0, a.1), block(b.0, b.1));
        let exact = sides(a, b);
        let found = shared_spaces(&[&x, &y], 1e-3);
        prop_assert_eq!(found.len(), usize::from(exact > 0.0));
        if let Some(s) = found.first() {
            // Three standard errors of eight replicates hold 98 times of 100; twice them always.
            prop_assert!(
                (s.moments.zeroth - exact).abs() <= 2.0 * s.volume_error + 1e-12,
                "{} {} {}", s.moments.zeroth, exact, s.volume_error
            );
        }
        let both = [x, y].concat();
        let f = filled(&both, 1e-3);
        let volume = |c: (Point, Point)| (0..3).map(|k| c.1[k] - c.0[k]).product::<f64>();
        let union = volume(a) + volume(b) - exact;
        prop_assert!((f.moments.zeroth - union).abs() <= 2.0 * f.volume_error + 1e-12);
        let first = |c: (Point, Point)| {
            Vector3::from([0, 1, 2].map(|k| (c.0[k] + c.1[k]) / 2.0)) * volume(c)
        };
        let common = (
            [0, 1, 2].map(|k| a.0[k].max(b.0[k])),
            [0, 1, 2].map(|k| a.1[k].min(b.1[k])),
        );
        let shared = if exact > 0.0 { first(common) } else { Vector3::zeros() };
        let centre = (first(a) + first(b) - shared) / union;
        let off = (f.moments.centre().unwrap() - centre).norm();
        prop_assert!(off <= 2.0 * f.centre_error + 1e-12, "{off} {}", f.centre_error);
    }
}

#[test]
fn a_thousand_parts_are_sorted_by_their_boxes() {
    // A row of plates in contact, of which every hundredth reaches into the next.
    let parts: Vec<Vec<Facet>> = (0..1000)
        .map(|i| {
            let x = f64::from(i);
            let end = if i % 100 == 50 { 1.25 } else { 1.0 };
            block([x, 0.0, 0.0], [x + end, 2.0, 3.0])
        })
        .collect();
    let solids: Vec<&[Facet]> = parts.iter().map(Vec::as_slice).collect();
    let found = shared_spaces(&solids, 1e-3);
    let pairs: Vec<_> = found.iter().map(|s| (s.a, s.b)).collect();
    let wanted: Vec<_> = (0..10).map(|k| (100 * k + 50, 100 * k + 51)).collect();
    assert_eq!(pairs, wanted);
    for s in &found {
        assert!((s.moments.zeroth - 1.5).abs() <= 2.0 * s.volume_error);
    }
}

#[test]
fn a_solid_wholly_inside_is_shared_exactly_and_one_in_a_hollow_is_not() {
    let outer = block([0.0; 3], [5.0; 3]);
    let inner = block([1.0; 3], [2.0, 3.0, 4.0]);
    let found = shared_spaces(&[&inner, &outer], 1e-4);
    assert_eq!((found.len(), found[0].volume_error), (1, 0.0));
    assert_eq!(found[0].moments.zeroth, 6.0);
    // The same in a hollow that is larger, and in one that it fills to the walls.
    for hollow in [block([0.5; 3], [4.5; 3]), inner.clone()] {
        let mut shell = outer.clone();
        shell.extend(hollow.iter().map(|t| [t[0], t[2], t[1]]));
        assert!(shared_spaces(&[&inner, &shell], 1e-4).is_empty());
    }
}

#[test]
fn three_standard_errors_hold_nearly_always() {
    // Bars of many proportions through a cube: the share of results within their own error.
    let cube = block([0.0; 3], [1.0; 3]);
    let (mut inside, mut worst) = (0, 0.0f64);
    let all = 200;
    for i in 0..all {
        let part = |k: f64| (f64::from(i) * k).fract();
        let low = [part(0.754_877) - 0.04, part(0.569_840) - 0.04, -0.5];
        let size = [
            0.05 + part(0.819_172),
            0.05 + part(0.671_043),
            0.6 + part(0.549_700),
        ];
        let high = [0, 1, 2].map(|k| low[k] + size[k]);
        let exact = sides((low, high), ([0.0; 3], [1.0; 3]));
        let common = common(&[low, high], &[[0.0; 3], [1.0; 3]]).unwrap();
        // The spread alone, without the allowance for what rays may have missed.
        let other = block(low, high);
        let (fa, fb) = (LooseFacets(&other), LooseFacets(&cube));
        let piece = |facets, group| Piece {
            facets,
            select: Select::All,
            weight: 1,
            group,
        };
        let lattice = Lattice {
            bounds: common,
            side: 32,
        };
        let found = integrate(&[piece(&fa, 0), piece(&fb, 1)], lattice, &|w| {
            f64::from(u8::from(w[0] > 0 && w[1] > 0))
        });
        let ratio =
            (mean(&found.replicates).zeroth - exact).abs() / (found.volume_error() - found.unseen);
        inside += usize::from(ratio <= 1.0);
        worst = worst.max(ratio);
    }
    println!("{inside} of {all} within the error; worst {worst:.2} times");
    // Student's t of seven degrees: beyond three standard errors 2 times of 100.
    assert!(inside >= 190 && worst < 3.0, "{inside} {worst}");
}
