//! Cut solids against closed forms.

use std::f64::consts::PI;

use nalgebra::{Rotation3, Unit};
use proptest::prelude::*;

use super::*;
use crate::geometry::box_facets;

type Facets = Vec<[[f64; 3]; 3]>;

/// A prism over a regular polygon about z, standing on z = 0; a corner lies on x.
fn prism(n: usize, radius: f64, height: f64) -> Facets {
    let at = |k: usize, z: f64| {
        let a = 2.0 * PI * (k % n) as f64 / n as f64;
        [radius * a.cos(), radius * a.sin(), z]
    };
    let mut out = Vec::new();
    for k in 0..n {
        let (a, b, c, d) = (at(k, 0.0), at(k + 1, 0.0), at(k + 1, height), at(k, height));
        out.extend([[a, b, c], [a, c, d]]);
        out.extend([[[0.0; 3], b, a], [[0.0, 0.0, height], d, c]]);
    }
    out
}

/// A sphere of rings and sectors, its corners on it.
fn sphere(n: usize, r: f64) -> Facets {
    let at = |i: usize, k: usize| {
        let (t, a) = (
            PI * i as f64 / n as f64,
            PI * (k % (2 * n)) as f64 / n as f64,
        );
        if i == 0 || i == n {
            return [0.0, 0.0, if i == 0 { r } else { -r }];
        }
        [r * t.sin() * a.cos(), r * t.sin() * a.sin(), r * t.cos()]
    };
    let mut out = Vec::new();
    for i in 0..n {
        for k in 0..2 * n {
            let (a, b, c, d) = (at(i, k), at(i + 1, k), at(i + 1, k + 1), at(i, k + 1));
            if i + 1 < n {
                out.push([a, b, c]);
            }
            if i > 0 {
                out.push([a, c, d]);
            }
        }
    }
    out
}

fn level(vessel: &Vessel, up: [f64; 3], h: f64) -> Liquid {
    let up = Vector3::from(up).normalize();
    let h = h - vessel.middle.dot(&up);
    vessel.levelled(up).liquid(h, &Matrix3::identity())
}

/// The part of a box [0, size] where n·x ≤ h, all of n above zero, by inclusion and exclusion of
/// the corner simplices (our own closed form; each simplex is textbook).
fn box_below(size: [f64; 3], n: [f64; 3], h: f64) -> Moments {
    let mut sum = Moments::zero(Vector3::from(size) / 2.0);
    for k in 0..8 {
        let on = |i: usize| k >> i & 1 == 1;
        let c = Vector3::from_fn(|i, _| if on(i) { size[i] } else { 0.0 });
        let t = h - Vector3::from(n).dot(&c);
        if t <= 0.0 {
            continue;
        }
        let sign = if (0..3).filter(|i| on(*i)).count() % 2 == 0 {
            1.0
        } else {
            -1.0
        };
        let v = sign * t * t * t / (6.0 * n[0] * n[1] * n[2]);
        let simplex = Moments {
            about: c,
            zeroth: v,
            first: Vector3::from_fn(|i, _| v * t / (4.0 * n[i])),
            second: Matrix3::from_fn(|i, j| {
                let twice = if i == j { 2.0 } else { 1.0 };
                v * t * t * twice / (20.0 * n[i] * n[j])
            }),
        };
        sum = sum.plus(&simplex);
    }
    sum
}

fn close(a: &Moments, b: &Moments, size: f64, tolerance: f64) {
    let b = b.shifted(a.about);
    let v = size.powi(3);
    assert!((a.zeroth - b.zeroth).abs() < tolerance * v, "{a:?} {b:?}");
    assert!(
        (a.first - b.first).norm() < tolerance * v * size,
        "{a:?} {b:?}"
    );
    assert!(
        (a.second - b.second).norm() < tolerance * v * size * size,
        "{a:?} {b:?}"
    );
}

proptest! {
    /// A box at any attitude. The closed form itself cancels where a component of `up` is small
    /// (eight terms of t³/n₁n₂n₃), which is what the tolerance is for.
    #[test]
    fn a_box_at_any_attitude(
        n in [0.05..1.0f64, 0.05..1.0f64, 0.05..1.0f64],
        fill in 0.001..0.999f64,
        flip in any::<[bool; 3]>(),
    ) {
        let size = [2.0, 3.0, 4.0];
        let up = Vector3::from(n).normalize();
        let n: [f64; 3] = up.into();
        let h = fill * up.dot(&Vector3::from(size));
        let want = box_below(size, n, h);
        let vessel = Vessel::new(&box_facets([0.0; 3], size));
        let got = level(&vessel, n, h);
        close(&got.moments, &want, 4.0, 1e-11);
        // And mirrored, so that every octant of attitudes is met.
        let m = Vector3::from(flip.map(|f| if f { -1.0 } else { 1.0 }));
        let mirror = crate::moments::Placement { turn: Matrix3::from_diagonal(&m), at: Vector3::zeros() };
        let [lo, hi] = [Vector3::zeros(), Vector3::from(size).component_mul(&m)];
        let vessel = Vessel::new(&box_facets(lo.inf(&hi).into(), lo.sup(&hi).into()));
        let got = level(&vessel, up.component_mul(&m).into(), h);
        close(&got.moments, &want.placed(&mirror), 4.0, 1e-11);
    }

    /// Both sides of any cut sum to the whole, the level of a volume gives that volume back, more
    /// liquid stands higher, and the surface is the derivative.
    #[test]
    fn cuts_of_a_lumpy_solid(
        axis in [-1.0..1.0f64, -1.0..1.0f64, -1.0..1.0f64],
        fill in 0.001..0.999f64,
        far in -1e6..1e6f64,
    ) {
        prop_assume!(Vector3::from(axis).norm() > 0.1);
        let up = Vector3::from(axis).normalize();
        // A hollow ball beside a prism that it does not touch.
        let mut facets: Facets = sphere(9, 1.0);
        facets.extend(sphere(6, 0.5).into_iter().map(|[a, b, c]| [a, c, b]));
        facets.extend(prism(7, 0.4, 2.0).into_iter().map(|t| t.map(|p| [p[0] + 2.0, p[1], p[2]])));
        let vessel = Vessel::new(&facets);
        let l = vessel.levelled(up);
        let volume = fill * vessel.volume();
        let h = l.level(volume);
        let (below, area) = l.below(h);
        prop_assert!((below - volume).abs() <= 1e-13 * vessel.volume());
        let lower = l.liquid(h, &Matrix3::identity());
        prop_assert!((lower.moments.zeroth - volume).abs() <= 1e-13 * vessel.volume());
        let upper = vessel.levelled(-up).liquid(-h, &Matrix3::identity());
        close(&lower.moments.plus(&upper.moments), vessel.whole(), 3.0, 1e-13);
        prop_assert!(l.level(0.999 * volume) < h);
        let surface = lower.surface.unwrap();
        prop_assert!((surface.area - area).abs() <= 1e-12);
        let of_pools: f64 = l.pools(h).iter().map(|p| p.volume).sum();
        prop_assert!((of_pools - volume).abs() <= 1e-12);
        // The difference over a step is the mean of the surface's centroid on it: no farther from
        // the middle one than the centroid travels there, and by rounding over the step.
        let d = 1e-4 * vessel.volume();
        if fill > 0.01 && fill < 0.99 {
            let at = |v: f64| l.liquid(l.level(v), &Matrix3::identity()).moments.shifted(surface.centroid);
            let slope = (at(volume + d).first - at(volume - d).first) / (2.0 * d);
            let centroid = |v: f64| {
                let surface = l.liquid(l.level(v), &Matrix3::identity()).surface;
                surface.unwrap().centroid
            };
            let travel: f64 = [-1.0, 1.0]
                .map(|s| (centroid(volume + s * d) - surface.centroid).norm())
                .iter()
                .sum();
            prop_assert!(slope.norm() < 2.0 * travel + 1e-7, "{slope} {travel}");
        }
        // A million sizes away the answer is the same as far as the corners kept their digits.
        let away: Facets = facets.iter().map(|t| t.map(|p| p.map(|x| x + far))).collect();
        let moved = Vessel::new(&away);
        let l = moved.levelled(up);
        let m = l.liquid(l.level(volume), &Matrix3::identity()).moments;
        let centre = m.centre().unwrap() - Vector3::repeat(far);
        prop_assert!((centre - lower.moments.centre().unwrap()).norm() < 1e-8);
    }
}

/// REFERENCE: horizontal cylinder r = 1 (closed form of the circular segment, textbook).
#[test]
fn a_lying_cylinder_fills_as_a_circular_segment() {
    let n = 4096;
    let vessel = Vessel::new(&prism(n, 1.0, 3.0));
    for (depth, area, centroid) in [
        (0.1, 0.0587259068776018, -0.940176540254902),
        (0.5, 0.614184849304378, -0.705020161898566),
        (1.0, PI / 2.0, -0.424413181578388),
        (1.5, 2.52740780428541, -0.171326804150091),
    ] {
        let l = level(&vessel, [0.0, 1.0, 0.0], depth - 1.0);
        // The polygon lacks 2π²/3n² of the circle's area, 1.23e-6 in all, near its rim.
        let v = l.moments.zeroth / 3.0;
        assert!((v - area).abs() < 1.3e-6, "{depth}: {v} {area}");
        let c = l.moments.centre().unwrap();
        assert!((c.y - centroid).abs() < 1.5e-6, "{depth}: {c} {centroid}");
        assert!((c.z - 1.5).abs() < 1e-12 && c.x.abs() < 1e-12);
    }
}

/// REFERENCE: the hoof of a cylinder, R 3, h 5: V = 2R²h/3 = 30, centroid 3πR/16 across and
/// 3πh/32 up. The prism over an n-gon has its own exact hoof, which the mesh must meet.
#[test]
fn a_tilted_cylinder_holds_a_hoof() {
    let (n, r, h) = (2048, 3.0, 5.0);
    // Below z = h·x/R, so "up" is (−h/R, 0, 1); the part below the base does not exist.
    let up = Vector3::new(-h / r, 0.0, 1.0).normalize();
    let vessel = Vessel::new(&prism(n, r, h));
    let l = level(&vessel, up.into(), 0.0);
    // ∫ x dA over the half polygon x ≥ 0, exact: triangles (0, p, q).
    let at = |k: usize| {
        let a = 2.0 * PI * k as f64 / n as f64;
        [r * a.cos(), r * a.sin()]
    };
    let quarter = n / 4;
    let mut moment = Sum::ZERO;
    for k in 0..quarter {
        let (p, q) = (at(k), at(k + 1));
        moment.add((p[0] * q[1] - p[1] * q[0]) / 2.0 * (p[0] + q[0]) / 3.0);
    }
    let polygon = 2.0 * moment.value() * h / r;
    assert!(
        (l.moments.zeroth - polygon).abs() < 1e-12,
        "{}",
        l.moments.zeroth
    );
    let off = 2.0 * PI * PI / 3.0 / (n * n) as f64;
    assert!((l.moments.zeroth - 30.0).abs() < 30.0 * 2.0 * off);
    let c = l.moments.centre().unwrap();
    assert!((c.x - 1.76714586764426).abs() < 1e-5, "{c}");
    assert!((c.z - 1.47262155637022).abs() < 1e-5, "{c}");
}

/// REFERENCE: spherical cap R 3, h 1; and r 1 at three depths. The error of the mesh falls with
/// the square of its edges.
#[test]
fn a_sphere_fills_as_a_cap() {
    let mut last = f64::INFINITY;
    for n in [16, 32, 64, 128] {
        let vessel = Vessel::new(&sphere(n, 3.0));
        let l = level(&vessel, [0.3, -0.2, -0.9], -2.0);
        let off = (l.moments.zeroth - 8.37758040957278).abs();
        assert!(off < last / 3.0, "{n}: {off} after {last}");
        last = off;
        if n == 128 {
            assert!(off < 2e-3 * 8.4);
            let c = l.moments.centre().unwrap().norm();
            assert!((c - 2.34375).abs() < 1e-3, "{c}");
        }
    }
    let vessel = Vessel::new(&sphere(256, 1.0));
    for (depth, v, c) in [
        (0.5, 0.654498469497874, -0.675),
        (1.0, 2.0 * PI / 3.0, -0.375),
        (1.5, 3.53429173528852, -0.125),
    ] {
        let l = level(&vessel, [0.0, 0.0, 1.0], depth - 1.0);
        assert!((l.moments.zeroth - v).abs() < 3e-4 * v, "{depth}");
        assert!((l.moments.centre().unwrap().z - c).abs() < 1e-4, "{depth}");
    }
}

/// REFERENCE: box tank, width 1, mean depth 0.5, tilt 10°: the centroid moves B²tanθ/12d sideways
/// and rises B²tan²θ/24d, exactly.
#[test]
fn a_tilted_box_tank_shifts_its_centroid() {
    let vessel = Vessel::new(&box_facets([-0.5, -1.0, 0.0], [0.5, 1.0, 1.0]));
    let a = 10f64.to_radians();
    let l = vessel.levelled(Vector3::new(-a.sin(), 0.0, a.cos()));
    let c = l
        .liquid(l.level(1.0), &Matrix3::identity())
        .moments
        .centre()
        .unwrap();
    assert!((c.x - 0.0293878301180775).abs() < 1e-14, "{c}");
    assert!((c.z - 0.25 - 0.00259093367714695).abs() < 1e-14, "{c}");
}

/// The metacentric relation: tilting liquid of volume V moves its centroid by the second moment of
/// the free surface over V, an independent check of [`Surface::second`].
#[test]
fn the_second_moment_of_the_surface_moves_the_centre() {
    let vessel = Vessel::new(&prism(5, 1.0, 3.0));
    let volume = 0.4 * vessel.volume();
    let at = |a: f64| {
        let l = vessel.levelled(Vector3::new(-f64::sin(a), 0.0, f64::cos(a)));
        l.liquid(l.level(volume), &Matrix3::identity())
    };
    let still = at(0.0);
    let d = 1e-4;
    let slope = (at(d).moments.centre().unwrap() - at(-d).moments.centre().unwrap()).x / (2.0 * d);
    let want = still.surface.unwrap().second[(0, 0)] / volume;
    assert!((slope - want).abs() < 1e-7, "{slope} {want}");
}

#[test]
fn full_empty_and_flat_levels() {
    let vessel = Vessel::new(&box_facets([0.0; 3], [1.0, 1.0, 2.0]));
    let l = vessel.levelled(Vector3::z());
    assert_eq!((l.low(), l.high()), (-1.0, 1.0));
    assert_eq!(
        (l.level(0.0), l.level(-1.0), l.level(f64::NAN)),
        (-1.0, -1.0, -1.0)
    );
    assert_eq!((l.level(2.0), l.level(9.0)), (1.0, 1.0));
    assert_eq!(l.corner_heights(), [-1.0, 1.0]);
    let turn = Matrix3::identity();
    let empty = l.liquid(-1.0, &turn);
    assert_eq!(
        (empty.moments.zeroth, empty.surface, empty.bounds),
        (0.0, None, None)
    );
    // Nothing is taken to be in the lowest corner, so that it widens no box.
    assert_eq!(empty.moments.about, Vector3::zeros());
    let full = l.liquid(1.0, &turn);
    assert_eq!(full.moments.zeroth, 2.0);
    assert_eq!(full.surface, None);
    let half = l.liquid(l.level(1.0), &turn);
    assert_eq!(half.surface.unwrap().area, 1.0);
    assert_eq!(half.surface.unwrap().centroid, Vector3::new(0.5, 0.5, 1.0));
    assert_eq!(half.bounds, Some([[0.0; 3], [1.0, 1.0, 1.0]]));
    // A turn by a quarter about x takes the box with it.
    let quarter = Rotation3::from_axis_angle(&Unit::new_normalize(Vector3::x()), PI / 2.0);
    let b = l.liquid(l.level(1.0), quarter.matrix()).bounds.unwrap();
    assert!(
        (b[0][1] + 1.0).abs() < 1e-15 && (b[1][2] - 1.0).abs() < 1e-15,
        "{b:?}"
    );
    let nothing = Vessel::new(&[]);
    assert_eq!(nothing.volume(), 0.0);
}

/// Two wells side by side under one chamber (a "U" upside down): below the saddle there are two
/// pools, above it one. A pillar and a ball under water make no pools of their own.
#[test]
fn pools_part_at_a_saddle_only() {
    // Section in x and z, one piece of surface: wells 0..1 (down to z = 0) and 2..4 (down to 0.5),
    // saddle at z = 2, lid at z = 3; extruded along y by 1.
    let outline = [
        [0.0, 0.0],
        [1.0, 0.0],
        [1.0, 2.0],
        [2.0, 2.0],
        [2.0, 0.5],
        [4.0, 0.5],
        [4.0, 3.0],
        [0.0, 3.0],
    ];
    let triangles = [
        [0, 1, 2],
        [0, 2, 7],
        [2, 3, 7],
        [3, 6, 7],
        [3, 5, 6],
        [3, 4, 5],
    ];
    let at = |k: usize, y: f64| [outline[k][0], y, outline[k][1]];
    let mut facets: Facets = Vec::new();
    for t in triangles {
        facets.push(t.map(|k| at(k, 0.0)));
        facets.push([t[0], t[2], t[1]].map(|k| at(k, 1.0)));
    }
    for k in 0..8 {
        let l = (k + 1) % 8;
        facets.push([at(k, 0.0), at(k, 1.0), at(l, 1.0)]);
        facets.push([at(k, 0.0), at(l, 1.0), at(l, 0.0)]);
    }
    let vessel = Vessel::new(&facets);
    assert!(
        (vessel.volume() - (3.0 + 5.0 + 1.0)).abs() < 1e-12,
        "{}",
        vessel.volume()
    );
    let l = vessel.levelled(Vector3::z());
    let h = |z: f64| z - vessel.middle.z;
    let volumes = |z: f64| -> Vec<f64> { l.pools(h(z)).iter().map(|p| p.volume).collect() };
    let near = |a: &[f64], b: &[f64]| {
        assert!(
            a.len() == b.len() && a.iter().zip(b).all(|(a, b)| (a - b).abs() < 1e-12),
            "{a:?} {b:?}"
        );
    };
    near(&volumes(0.25), &[0.25]);
    near(&volumes(1.0), &[1.0, 1.0]);
    near(&volumes(1.5), &[2.0, 1.5]);
    near(&volumes(2.5), &[7.0]);
    let pools = l.pools(h(1.5));
    assert!((pools[0].centroid - Vector3::new(3.0, 0.5, 1.0)).norm() < 1e-12);

    // A box with a pillar that stands out of the water and a hollow ball under it.
    let mut facets = box_facets([0.0; 3], [4.0, 4.0, 4.0]);
    let inward = |f: Facets| f.into_iter().map(|[a, b, c]| [a, c, b]);
    facets.extend(inward(box_facets([1.0, 1.0, 0.5], [1.5, 1.5, 3.0])));
    facets.extend(inward(box_facets([2.5, 2.5, 0.5], [3.0, 3.0, 1.0])));
    let vessel = Vessel::new(&facets);
    let pools = vessel.levelled(Vector3::z()).pools(2.0 - 2.0);
    near(
        &pools.iter().map(|p| p.volume).collect::<Vec<_>>(),
        &[32.0 - 0.25 * 1.5 - 0.125],
    );
}
