//! Solids in closed form, printed.

use nalgebra::{Unit, Vector3};
use proptest::prelude::*;

use super::{LayerPlan, Printed, ShellPlan, hollowed, layered};
use crate::geometry::{LooseFacets, Select};
use crate::moments::{Moments, integrate};

pub(crate) type Facet = [[f64; 3]; 3];

pub(crate) fn cuboid(low: [f64; 3], high: [f64; 3]) -> Vec<Facet> {
    let p = |i: usize| [0, 1, 2].map(|k| if i >> k & 1 == 1 { high[k] } else { low[k] });
    let faces = [
        [0, 2, 3, 1],
        [4, 5, 7, 6],
        [0, 1, 5, 4],
        [2, 6, 7, 3],
        [0, 4, 6, 2],
        [1, 3, 7, 5],
    ];
    faces
        .iter()
        .flat_map(|f| {
            let [a, b, c, d] = f.map(p);
            [[a, b, c], [a, c, d]]
        })
        .collect()
}

/// A surface of revolution about z through (radius, height) points from bottom to top, `n` around.
fn revolved(profile: &[[f64; 2]], n: usize) -> Vec<Facet> {
    let at = |[r, z]: [f64; 2], j: usize| {
        let (s, c) = (std::f64::consts::TAU * (j % n) as f64 / n as f64).sin_cos();
        if r == 0.0 {
            [0.0, 0.0, z]
        } else {
            [r * c, r * s, z]
        }
    };
    let mut out = Vec::new();
    for w in profile.windows(2) {
        for j in 0..n {
            let [a, b, c, d] = [at(w[0], j), at(w[0], j + 1), at(w[1], j + 1), at(w[1], j)];
            if w[0][0] != 0.0 {
                out.push([a, b, c]);
            }
            if w[1][0] != 0.0 {
                out.push([a, c, d]);
            }
        }
    }
    out
}

pub(super) fn sphere(r: f64, rings: usize, at: [f64; 3]) -> Vec<Facet> {
    let profile: Vec<[f64; 2]> = (0..=rings)
        .map(|i| {
            let (s, c) = (std::f64::consts::PI * i as f64 / rings as f64).sin_cos();
            [if i == 0 || i == rings { 0.0 } else { r * s }, -r * c]
        })
        .collect();
    moved(&revolved(&profile, 2 * rings), at)
}

fn cylinder(r: f64, h: f64, n: usize) -> Vec<Facet> {
    revolved(&[[0.0, 0.0], [r, 0.0], [r, h], [0.0, h]], n)
}

fn cone(r: f64, h: f64, n: usize) -> Vec<Facet> {
    revolved(&[[0.0, 0.0], [r, 0.0], [0.0, h]], n)
}

fn torus(big: f64, small: f64, n: usize) -> Vec<Facet> {
    let profile: Vec<[f64; 2]> = (0..=n)
        .map(|i| {
            let (s, c) = (std::f64::consts::TAU * (i % n) as f64 / n as f64).sin_cos();
            [big + small * c, small * s]
        })
        .collect();
    revolved(&profile, n)
}

fn moved(facets: &[Facet], by: [f64; 3]) -> Vec<Facet> {
    facets
        .iter()
        .map(|f| f.map(|p| [0, 1, 2].map(|k| p[k] + by[k])))
        .collect()
}

fn inverted(facets: &[Facet]) -> Vec<Facet> {
    facets.iter().map(|&[a, b, c]| [a, c, b]).collect()
}

fn solid(facets: &[Facet]) -> Moments {
    let f = LooseFacets(facets);
    integrate(&f, Select::All, facets[0][0], facets[0][0]).moments
}

fn plan(layer: f64, wall: f64, skin: [f64; 2], infill: f64) -> LayerPlan {
    LayerPlan {
        layer,
        wall,
        skin_bottom: skin[0],
        skin_top: skin[1],
        infill,
        up: Vector3::z_axis(),
        filament: 1.75,
    }
}

fn print(facets: &[Facet], plan: &LayerPlan) -> Printed {
    layered(&LooseFacets(facets), &solid(facets), plan, None).unwrap()
}

fn shell(facets: &[Facet], thickness: f64, infill: Option<f64>, drains: &[[f64; 3]]) -> Printed {
    let plan = ShellPlan {
        thickness,
        infill,
        drains: drains.to_vec(),
        fill_density: None,
    };
    hollowed(&LooseFacets(facets), &solid(facets), &plan, None).unwrap()
}

fn near(got: f64, want: f64, relative: f64) {
    assert!((got - want).abs() <= relative * want.abs(), "{got} {want}");
}

/// g/mm³ of a common feedstock, as in the series of reference values.
const DENSITY: f64 = 1.24e-3;

#[test]
fn the_cube_has_its_series_of_masses() {
    // Reference values by the shell model ρ[V − (1 − f)·core], our construction; printed to six
    // decimals, so that half a unit of the last is the tolerance.
    let cube = cuboid([0.0; 3], [20.0; 3]);
    for (infill, want) in [
        (0.0, 2.444576),
        (0.15, 3.565889),
        (0.2, 3.939661),
        (0.5, 6.182288),
        (1.0, 9.920000),
    ] {
        let p = print(&cube, &plan(0.2, 0.9, [0.8, 1.0], infill));
        assert_eq!(p.layers, Some(100));
        let mass = p.mass(DENSITY);
        assert!(
            (mass.zeroth - want).abs() < 6e-7,
            "{infill} {}",
            mass.zeroth
        );
        near(p.filament.unwrap(), p.moments.zeroth / 2.405_281_875, 1e-9);
        near(p.bed_contact.unwrap(), 400.0, 1e-12);
        let s = p.shares;
        near(s.wall + s.skin + s.infill, 1.0, 1e-14);
    }
    let p = print(&cube, &plan(0.2, 0.9, [0.8, 1.0], 0.2));
    assert!((p.moments.centre().unwrap() - Vector3::new(10.0, 10.0, 10.151_798)).norm() < 6e-7);
    // Inertia: the cube's less that of a box of 18.2³ (parallel axes, textbook).
    let (v, c, z) = (8000.0, 0.8 * 18.2_f64.powi(3), 10.151_798_f64);
    let about_z = v * 400.0 / 6.0 - c * 18.2_f64.powi(2) / 6.0;
    let about_x = about_z + v * (z - 10.0).powi(2) - c * (z - 9.9).powi(2);
    let i = p.moments.inertia().unwrap();
    near(i[(2, 2)], about_z, 1e-9);
    near(i[(0, 0)], about_x, 1e-7);
    let walls = (400.0 - 18.2 * 18.2) * 20.0;
    near(p.shares.wall, walls / p.moments.zeroth, 1e-9);
    let big = print(
        &cuboid([0.0; 3], [50.0; 3]),
        &plan(0.2, 0.9, [0.8, 1.0], 0.2),
    );
    assert!((big.moments.zeroth * DENSITY - 43.915_673).abs() < 6e-7);
}

#[test]
fn all_directions_of_up_agree_and_any_place() {
    let want = print(
        &cuboid([0.0; 3], [20.0; 3]),
        &plan(0.2, 0.9, [0.8, 1.0], 0.2),
    );
    for (up, at) in [
        ([0.0, 0.0, 1.0], [0.0; 3]),
        ([0.0, 0.0, -1.0], [3.0, 1.0, -7.0]),
        ([1.0, 0.0, 0.0], [1e4, -1e4, 2e4]),
        ([0.0, -1.0, 0.0], [5.0, 6.0, 7.0]),
        ([0.6, 0.0, 0.8], [0.0; 3]),
        ([0.48, -0.6, 0.64], [1e3, 2e3, 3e3]),
    ] {
        let up = Unit::new_normalize(Vector3::from(up));
        // The cube stands with its z along `up`.
        let turn = super::frame::frame(&up).transpose();
        let cube: Vec<Facet> = cuboid([0.0; 3], [20.0; 3])
            .iter()
            .map(|f| f.map(|p| (turn * Vector3::from(p) + Vector3::from(at)).into()))
            .collect();
        let p = print(
            &cube,
            &LayerPlan {
                up,
                ..plan(0.2, 0.9, [0.8, 1.0], 0.2)
            },
        );
        near(p.moments.zeroth, want.moments.zeroth, 1e-9);
        let lean = p.moments.centre().unwrap() - Vector3::from(at) - turn * Vector3::repeat(10.0);
        assert!((lean - up.into_inner() * 0.151_798).norm() < 1e-6, "{lean}");
    }
}

#[test]
fn the_sphere_tends_to_its_thin_layer_limit() {
    // Reference values for the round sphere in the limit of thin layers; the mesh's own volume is
    // short of the sphere's by about 1.6e-4 at 144 rings, and the cores alike.
    let ball = sphere(15.0, 144, [0.0; 3]);
    for (skin, want) in [(1.2, 6.322143), (0.8, 6.121660)] {
        let p = print(&ball, &plan(0.1, 1.2, [skin; 2], 0.2));
        near(p.moments.zeroth * DENSITY, want, 4e-4);
        assert!(p.moments.centre().unwrap().norm() < 1e-9);
    }
}

#[test]
fn cores_converge_with_the_square_of_the_layer_height() {
    // A cone of 64 sides whose core is its section a skin's height up, from a skin above the bed
    // to where that section ends; all of these whole layers of each height. The limit is a cone
    // again: corners at 8.8 from the axis at the bottom, half a unit less for each unit up.
    let (n, skin) = (64, 3.2);
    let facets = cone(12.0, 24.0, n);
    let polygon = n as f64 / 2.0 * (std::f64::consts::TAU / n as f64).sin();
    let limit = polygon * 2.0 * 8.8_f64.powi(3) / 3.0;
    let error = |layer: f64| {
        print(&facets, &plan(layer, 0.0, [skin; 2], 0.2))
            .core
            .zeroth
            - limit
    };
    let errors: Vec<f64> = [1.6, 0.8, 0.4, 0.2].map(error).to_vec();
    for w in errors.windows(2) {
        // The integrand is a square: the midpoint rule's error is its h² term alone.
        assert!((w[0] / w[1] - 4.0).abs() < 1e-6, "{errors:?}");
    }
}

#[test]
fn cylinder_cone_and_torus_have_their_cores() {
    let n = 360_usize;
    let half = std::f64::consts::PI / n as f64;
    // An n-gon of circumradius r moved inward by w: its apothem shrinks by w.
    let inner = |r: f64, w: f64| n as f64 * half.tan() * (r * half.cos() - w).max(0.0).powi(2);
    let p = print(&cylinder(12.0, 10.0, n), &plan(0.25, 1.0, [1.0, 0.5], 0.3));
    near(p.core.zeroth, inner(12.0, 1.0) * 8.5, 1e-9);
    near(p.core.centre().unwrap().z, 5.25, 1e-9);
    near(
        p.moments.zeroth,
        inner(12.0, 0.0) * 10.0 - 0.7 * p.core.zeroth,
        1e-12,
    );
    // A cone of the slope r = R(1 − z/h): the wall is a plain shift of the radius, and the skin
    // above the section a skin's height up, which is smaller.
    let (r, h) = (12.0, 24.0);
    let (wall, skin) = (0.8, 2.4);
    let p = print(&cone(r, h, n), &plan(0.1, wall, [skin; 2], 0.0));
    let core = |k: usize| {
        let z = (k as f64 + 0.5) * 0.1;
        let radius = |z: f64| r * (1.0 - z / h);
        if k < 24 || z + skin >= h {
            return 0.0;
        }
        inner(radius(z), wall).min(inner(radius(z + skin), 0.0))
    };
    let want: f64 = (0..240).map(core).sum::<f64>() * 0.1;
    near(p.core.zeroth, want, 1e-9);
    // The torus lying flat: at the height z a ring between R ± √(r² − z²), walls on both sides;
    // the round one's closed form, which 360 × 360 facets miss by 3e-4 at most.
    let (big, small, wall) = (20.0, 6.0, 1.0);
    let p = print(&torus(big, small, n), &plan(0.2, wall, [0.0; 2], 0.1));
    let core = |k: usize| {
        let z = -small + (f64::from(k as u32) + 0.5) * 0.2;
        let w = ((small * small - z * z).sqrt() - wall).max(0.0);
        4.0 * std::f64::consts::PI * big * w
    };
    let want: f64 = (0..60).map(core).sum::<f64>() * 0.2;
    near(p.core.zeroth, want, 6e-4);
}

#[test]
fn a_cone_on_its_side_has_the_core_of_its_sections() {
    // Layers along x: the section of a cone by a plane along its axis is a hyperbola; where that
    // is turned, what is summed here is the distance to it, by brute force over a fine grid.
    let (r, h, wall) = (6.0, 12.0, 1.0);
    let n = 180;
    let facets = cone(r, h, n);
    let up = Vector3::x_axis();
    let p = print(
        &facets,
        &LayerPlan {
            up,
            ..plan(1.0, wall, [0.0; 2], 0.0)
        },
    );
    let half = std::f64::consts::PI / f64::from(n as u32);
    let mut want = 0.0;
    for k in 0..12 {
        let x = -6.0 + f64::from(k) + 0.5;
        // Corners of the section: the base line and the flanks y = ±√(ρ(z)² − x²).
        let top = h * (1.0 - x.abs() / r);
        let flank = |z: f64| ((r * (1.0 - z / h)).powi(2) - x * x).max(0.0).sqrt();
        let samples: Vec<[f64; 2]> = (0..=4000)
            .map(|i| {
                // Dense near the top, where the flank is steep.
                let s = 1.0 - (1.0 - f64::from(i) / 4000.0).powi(2);
                [flank(top * s), top * s]
            })
            .collect();
        let cell = 0.02;
        let (mut j, mut area) = (0.5 * cell, 0.0);
        while j < top {
            if j >= wall {
                // The largest y of the core at this height, by bisection on the distance.
                let far = |y: f64| {
                    samples
                        .iter()
                        .map(|q| (q[0] - y).hypot(q[1] - j))
                        .fold(f64::INFINITY, f64::min)
                        >= wall
                };
                let (mut low, mut high) = (0.0, flank(j));
                if far(0.0) {
                    for _ in 0..30 {
                        let y = (low + high) / 2.0;
                        if far(y) { low = y } else { high = y }
                    }
                    area += 2.0 * low * cell;
                }
            }
            j += cell;
        }
        want += area;
    }
    let _ = half;
    // The 180-gon is 2e-4 short of the circle, the grid good to a few 1e-3.
    near(p.core.zeroth, want, 4e-3);
}

#[test]
fn fins_are_filled_once() {
    // A fin of 1 mm between walls of 0.8: all of it wall, once.
    let fin = cuboid([0.0; 3], [1.0, 20.0, 10.0]);
    let p = print(&fin, &plan(0.2, 0.8, [0.8; 2], 0.0));
    assert_eq!(p.moments, solid(&fin));
    assert_eq!(p.shares.wall, 1.0);
    // A block with such a fin on it, one outline: the block's core is not reached by the fin's.
    let t = [
        [0.0, 0.0],
        [20.0, 0.0],
        [20.0, 10.0],
        [10.5, 10.0],
        [10.5, 20.0],
        [9.5, 20.0],
        [9.5, 10.0],
        [0.0, 10.0],
    ];
    let w = 0.8_f64;
    let p = print(&extruded(&t, 4.0), &plan(0.2, w, [0.0; 2], 0.0));
    // Below the fin's foot the core bulges between the arcs around its two corners (see the
    // inset's own test).
    let bulge = w - (0.5 * (w * w - 0.25).sqrt() + w * w * (0.5 / w).asin());
    near(
        p.core.zeroth,
        ((20.0 - 2.0 * w) * (10.0 - 2.0 * w) + bulge) * 4.0,
        2e-6,
    );
}

/// A prism over an anticlockwise outline, capped by triangulation.
fn extruded(outline: &[[f64; 2]], height: f64) -> Vec<Facet> {
    let mut cap = Vec::<u32>::new();
    earcut::Earcut::new().earcut(outline.iter().copied(), &[], &mut cap);
    let at = |i: usize, z: f64| [outline[i][0], outline[i][1], z];
    let n = outline.len();
    let mut out = Vec::new();
    for t in cap.chunks(3) {
        let [a, b, c] = [0, 1, 2].map(|k| outline[t[k] as usize]);
        let turn = (b[0] - a[0]) * (c[1] - a[1]) - (b[1] - a[1]) * (c[0] - a[0]);
        let top = [0, 1, 2].map(|k| at(t[k] as usize, height));
        let low = [0, 1, 2].map(|k| at(t[k] as usize, 0.0));
        let back = |t: Facet| [t[0], t[2], t[1]];
        if turn > 0.0 {
            out.extend([top, back(low)]);
        } else {
            out.extend([back(top), low]);
        }
    }
    for i in 0..n {
        let j = (i + 1) % n;
        let [a, b, c, d] = [at(i, 0.0), at(j, 0.0), at(j, height), at(i, height)];
        out.extend([[a, b, c], [a, c, d]]);
    }
    out
}

#[test]
fn the_ends_of_the_range_are_exact() {
    for facets in [
        sphere(15.0, 24, [100.0, 3.0, -40.0]),
        torus(20.0, 6.0, 36),
        cone(5.0, 8.0, 30),
        cuboid([1.0, 2.0, 3.0], [11.0, 7.0, 10.0]),
    ] {
        let whole = solid(&facets);
        // All full: the solid, to the last bit.
        for skin in [[0.0; 2], [0.8, 1.2]] {
            assert_eq!(print(&facets, &plan(0.3, 0.8, skin, 1.0)).moments, whole);
        }
        assert_eq!(shell(&facets, 0.8, Some(1.0), &[]).moments, whole);
        // Walls thicker than half the part.
        for infill in [0.0, 0.2] {
            let p = print(&facets, &plan(0.3, 30.0, [0.0; 2], infill));
            assert_eq!(p.moments, whole);
            assert_eq!(
                print(&facets, &plan(0.3, 0.0, [40.0; 2], infill)).moments,
                whole
            );
        }
        assert_eq!(shell(&facets, 30.0, Some(0.0), &[]).moments, whole);
        // Nothing at all.
        let none = print(&facets, &plan(0.3, 0.0, [0.0; 2], 0.0));
        assert_eq!(none.moments, Moments::zero(whole.about));
        assert_eq!(none.filament, Some(0.0));
        assert_eq!(shell(&facets, 0.0, Some(0.0), &[]).moments.zeroth, 0.0);
        // Infill alone: the solid at its fraction.
        let sparse = print(&facets, &plan(0.3, 0.0, [0.0; 2], 0.25)).moments;
        near(sparse.zeroth, whole.zeroth / 4.0, 1e-15);
    }
}

#[test]
fn the_triangulation_makes_no_difference() {
    let l = [
        [0.0, 0.0],
        [20.0, 0.0],
        [20.0, 8.0],
        [8.0, 8.0],
        [8.0, 20.0],
        [0.0, 20.0],
    ];
    let coarse = extruded(&l, 6.0);
    // Each facet in four, through the middles of its sides.
    let fine: Vec<Facet> = coarse
        .iter()
        .flat_map(|&[a, b, c]| {
            let mid = |p: [f64; 3], q: [f64; 3]| [0, 1, 2].map(|k| (p[k] + q[k]) / 2.0);
            let (ab, bc, ca) = (mid(a, b), mid(b, c), mid(c, a));
            [[a, ab, ca], [ab, b, bc], [ca, bc, c], [ab, bc, ca]]
        })
        .collect();
    let up = Unit::new_normalize(Vector3::new(0.3, 0.2, 0.9));
    let plan = LayerPlan {
        up,
        ..plan(0.2, 0.9, [0.6; 2], 0.2)
    };
    let (a, b) = (print(&coarse, &plan), print(&fine, &plan));
    near(a.core.zeroth, b.core.zeroth, 1e-9);
    let apart = a.moments.centre().unwrap() - b.moments.centre().unwrap();
    assert!(apart.norm() < 1e-9, "{apart}");
}

#[test]
fn voids_and_solids_that_touch_are_one_section() {
    // Two cubes that share a face, as one body without the face between: as a cuboid.
    let (a, b) = (
        cuboid([0.0; 3], [10.0; 3]),
        cuboid([10.0, 0.0, 0.0], [20.0, 10.0, 10.0]),
    );
    let mut both = a.clone();
    both.extend(b);
    let one = cuboid([0.0; 3], [20.0, 10.0, 10.0]);
    let plan = plan(0.5, 1.0, [1.0; 2], 0.1);
    near(
        print(&both, &plan).core.zeroth,
        print(&one, &plan).core.zeroth,
        1e-9,
    );
    // A cavity in a cube has walls and skins of its own.
    let mut hollow = cuboid([0.0; 3], [20.0; 3]);
    hollow.extend(inverted(&cuboid([8.0; 3], [12.0; 3])));
    let p = print(&hollow, &plan);
    // Layers beside the cavity: its square grown by a rounded wall; and the layers within the
    // skins' reach of it lose its own square.
    let grown = 16.0 + 4.0 * 4.0 + std::f64::consts::PI;
    let want = 18.0 * 18.0 * 18.0 - grown * 4.0 - 16.0 * 2.0;
    near(p.core.zeroth, want, 1e-7);
}

#[test]
fn threads_make_no_difference() {
    let facets = torus(20.0, 6.0, 60);
    let up = Unit::new_normalize(Vector3::new(0.3, 0.2, 0.9));
    let plan = LayerPlan {
        up,
        ..plan(0.5, 0.9, [1.0; 2], 0.2)
    };
    let with = |threads: usize| {
        let pool = rayon::ThreadPoolBuilder::new()
            .num_threads(threads)
            .build()
            .unwrap();
        pool.install(|| (print(&facets, &plan), shell(&facets, 2.0, None, &[])))
    };
    assert_eq!(with(1), with(4));
}

#[test]
fn progress_ends_at_its_total() {
    let facets = cuboid([0.0; 3], [5.0; 3]);
    let seen = std::sync::Mutex::new(Vec::new());
    let tell = |done: usize, of: usize| seen.lock().unwrap().push((done, of));
    let plan = plan(0.5, 0.9, [1.0; 2], 0.2);
    layered(&LooseFacets(&facets), &solid(&facets), &plan, Some(&tell)).unwrap();
    let mut seen = seen.into_inner().unwrap();
    seen.sort_unstable();
    assert_eq!(seen, (1..=20).map(|i| (i, 20)).collect::<Vec<_>>());
}

#[test]
fn figures_that_no_print_has_are_refused() {
    let cube = cuboid([0.0; 3], [5.0; 3]);
    let good = plan(0.5, 0.9, [1.0; 2], 0.2);
    for bad in [
        LayerPlan {
            layer: 0.0,
            ..good.clone()
        },
        LayerPlan {
            layer: f64::NAN,
            ..good.clone()
        },
        LayerPlan {
            wall: -1.0,
            ..good.clone()
        },
        LayerPlan {
            infill: 1.5,
            ..good.clone()
        },
        LayerPlan {
            filament: 0.0,
            ..good.clone()
        },
        LayerPlan {
            layer: 1e-9,
            ..good.clone()
        },
    ] {
        assert!(layered(&LooseFacets(&cube), &solid(&cube), &bad, None).is_err());
    }
    // An open surface has no sections.
    assert!(layered(&LooseFacets(&cube[..11]), &solid(&cube), &good, None).is_err());
    let drains = vec![[2.5, 2.5, 40.0]];
    let far = ShellPlan {
        thickness: 1.0,
        infill: None,
        drains,
        fill_density: None,
    };
    assert!(hollowed(&LooseFacets(&cube), &solid(&cube), &far, None).is_err());
}

#[test]
fn a_sphere_in_a_uniform_shell() {
    // Reference value for the round sphere: 6.609712 g at an infill of 20 %. The mesh is short of
    // it by 1.6e-4, the octree by its error figure.
    let ball = sphere(15.0, 96, [3.0, -2.0, 50.0]);
    let p = shell(&ball, 1.2, Some(0.2), &[]);
    let error = p.core_error.unwrap();
    let whole = solid(&ball);
    assert!(error > 0.0 && error < 2e-4 * whole.zeroth, "{error}");
    // The facets' own core: planes 1.2 deeper. By similarity the core is the mesh shrunk about
    // its middle, but for facets' distances that differ by at most 5e-4 of the radius.
    let inner = 4.0 / 3.0 * std::f64::consts::PI * 13.8_f64.powi(3);
    near(p.core.zeroth, inner, 1e-3);
    near(p.moments.zeroth * DENSITY, 6.609712, 1e-3);
    assert!((p.moments.centre().unwrap() - Vector3::new(3.0, -2.0, 50.0)).norm() < 1e-2);
}

#[test]
fn a_box_in_a_uniform_shell_is_exact_and_so_is_a_hole_through_it() {
    let cube = cuboid([0.0; 3], [20.0, 30.0, 40.0]);
    let p = shell(&cube, 2.0, Some(0.0), &[]);
    near(p.core.zeroth, 16.0 * 26.0 * 36.0, 1e-9);
    let i = p.core.inertia().unwrap();
    near(
        i[(0, 0)] / p.core.zeroth,
        (26.0_f64.powi(2) + 36.0_f64.powi(2)) / 12.0,
        1e-9,
    );
    // A cavity juts into the material: its shell is rounded at edges and corners (Steiner's
    // formula for a cube of side a grown by w: a³ + 6a²w + 3πaw² + 4πw³/3).
    let mut hollow = cuboid([0.0; 3], [30.0; 3]);
    hollow.extend(inverted(&cuboid([12.0; 3], [18.0; 3])));
    let p = shell(&hollow, 2.0, Some(0.0), &[]);
    let pi = std::f64::consts::PI;
    let grown = 216.0 + 6.0 * 36.0 * 2.0 + 3.0 * pi * 6.0 * 4.0 + 4.0 * pi * 8.0 / 3.0;
    let want = 26.0_f64.powi(3) - grown;
    let error = p.core_error.unwrap();
    assert!(error < 2e-4 * 27000.0);
    assert!(
        (p.core.zeroth - want).abs() <= error,
        "{} {want} {error}",
        p.core.zeroth
    );
}

#[test]
fn a_long_thin_rod_keeps_its_core() {
    // 3 mm wide and a metre long: the first cells are ten times as wide as the rod.
    let rod = cuboid([0.1, 0.2, 0.3], [1000.1, 3.2, 3.3]);
    let p = shell(&rod, 1.0, Some(0.0), &[]);
    assert!(p.core_error.unwrap() < 2e-4 * 9000.0, "{:?}", p.core_error);
    near(p.core.zeroth, 998.0, 1e-3);
}

#[test]
fn a_torus_and_a_cylinder_in_a_uniform_shell_are_within_the_error() {
    let pi = std::f64::consts::PI;
    let n = 96;
    let p = shell(&torus(20.0, 6.0, n), 1.5, Some(0.0), &[]);
    // Both circles are 96-gons: 1.4e-3 short together.
    near(p.core.zeroth, 2.0 * pi * pi * 20.0 * 4.5 * 4.5, 4e-3);
    let half = pi / n as f64;
    let p = shell(&cylinder(10.0, 12.0, n), 1.0, Some(0.0), &[]);
    let want = n as f64 * half.tan() * (10.0 * half.cos() - 1.0).powi(2) * 10.0;
    let error = p.core_error.unwrap();
    assert!(
        (p.core.zeroth - want).abs() <= error + 1e-9 * want,
        "{} {want} {error}",
        p.core.zeroth
    );
}

#[test]
fn each_hollow_needs_a_drain_of_its_own() {
    // Two cubes of 20 joined by a bar of 4: shells of 3 leave two hollows.
    let outline = [
        [0.0, 0.0],
        [20.0, 0.0],
        [20.0, 8.0],
        [30.0, 8.0],
        [30.0, 0.0],
        [50.0, 0.0],
        [50.0, 20.0],
        [30.0, 20.0],
        [30.0, 12.0],
        [20.0, 12.0],
        [20.0, 20.0],
        [0.0, 20.0],
    ];
    let part = extruded(&outline, 20.0);
    let sealed = shell(&part, 3.0, None, &[]);
    let kept = sealed.trapped.clone().unwrap();
    assert_eq!(kept.count, 2);
    near(kept.hollow.zeroth, sealed.core.zeroth, 1e-9);
    // With what it keeps of the part's own material it weighs as the solid does.
    near(
        sealed.mass(DENSITY).zeroth + kept.hollow.zeroth * DENSITY,
        solid(&part).zeroth * DENSITY,
        1e-12,
    );
    let half = shell(&part, 3.0, None, &[[0.0, 10.0, 10.0]]);
    let kept = half.trapped.clone().unwrap();
    assert_eq!(kept.count, 1);
    // At the bar's mouth the core bulges between the arcs around its edges (see the inset's own
    // test), 14 high.
    let bulge = 2.0 * 2.0 * 3.0 - (2.0 * 5.0_f64.sqrt() + 9.0 * (2.0_f64 / 3.0).asin());
    near(kept.hollow.zeroth, 14.0_f64.powi(3) + 14.0 * bulge, 1e-4);
    assert!(kept.hollow.centre().unwrap().x > 30.0);
    let open = shell(&part, 3.0, None, &[[0.0, 10.0, 10.0], [40.0, 10.0, 20.0]]);
    assert_eq!(open.trapped, None);
    near(open.moments.zeroth, half.moments.zeroth, 1e-15);
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(48))]
    #[test]
    fn random_boxes_have_their_closed_form(
        low in prop::array::uniform3(-50.0..50.0_f64),
        layers in 4..40_usize,
        sides in prop::array::uniform2(1.0..30.0_f64),
        wall in 0.0..4.0_f64,
        skins in prop::array::uniform2(0..6_usize),
        infill in 0.0..1.0_f64,
    ) {
        let h = 0.25;
        let high = [low[0] + sides[0], low[1] + sides[1], low[2] + layers as f64 * h];
        let facets = cuboid(low, high);
        let skin = skins.map(|n| n as f64 * h);
        let p = print(&facets, &plan(h, wall, skin, infill));
        let inner = |s: f64| (s - 2.0 * wall).max(0.0);
        let high = (layers as f64 - (skins[0] + skins[1]) as f64).max(0.0) * h;
        let core = inner(sides[0]) * inner(sides[1]) * high;
        let volume = sides[0] * sides[1] * layers as f64 * h;
        // The box is cut from coordinates that carry 1e-14 of themselves.
        prop_assert!((p.core.zeroth - core).abs() < 1e-9 * volume, "{} {core}", p.core.zeroth);
        prop_assert!(p.moments.zeroth <= volume * (1.0 + 1e-12));
    }

    #[test]
    fn prisms_print_as_their_outline(
        radii in prop::collection::vec(3.0..20.0_f64, 3..12), wall in 0.1..2.0_f64,
    ) {
        let n = radii.len() as f64;
        let outline: Vec<[f64; 2]> = radii.iter().enumerate().map(|(i, r)| {
            let (s, c) = (std::f64::consts::TAU * i as f64 / n).sin_cos();
            [r * c, r * s]
        }).collect();
        let facets = extruded(&outline, 4.0);
        let one = print(&facets, &plan(4.0, wall, [0.0; 2], 0.0));
        let many = print(&facets, &plan(0.5, wall, [0.0; 2], 0.0));
        prop_assert!((one.core.zeroth - many.core.zeroth).abs() < 1e-9 * solid(&facets).zeroth);
        prop_assert!(one.core.zeroth < solid(&facets).zeroth);
    }
}
