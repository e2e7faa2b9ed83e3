//! The checks most likely to catch a wrong tool, through the command line; those of them that the
//! commands reach.
#![allow(clippy::unwrap_used, clippy::panic)]

#[path = "support/program.rs"]
mod program;

use std::f64::consts::TAU;

use program::json;
use serde_json::Value;

/// The one body of a file, weighed in metres with a density.
fn weighed(file: &str, density: &str) -> Value {
    let path = format!("fixtures/{file}");
    let (doc, exit) = json(&[
        "weigh",
        "--json",
        "--unit",
        "m",
        "--density",
        density,
        &path,
    ]);
    assert_eq!(exit, 0, "{doc}");
    let bodies = doc["files"][0]["bodies"].as_array().unwrap();
    assert_eq!(bodies.len(), 1);
    bodies[0].clone()
}

fn number(v: &Value) -> f64 {
    v.as_f64().unwrap_or_else(|| panic!("{v} is no number"))
}

#[track_caller]
fn near(v: &Value, want: f64, tolerance: f64) {
    let got = number(v);
    assert!(
        (got - want).abs() <= tolerance,
        "{got} instead of {want}, allowed {tolerance:e}"
    );
}

/// Check 1: Tonon's tetrahedron (numbers as quoted by public test suites of the 2004 paper, recomputed
/// in exact rationals) moved by 1e6 on each axis. The coordinates are rounded to 6e-11 there, over
/// a surface of 2400: the printed digits stand to 1e-7. A naive sum gives 1842.684.
#[test]
fn check_1_a_body_far_from_the_origin_keeps_its_volume() {
    let b = weighed("tonon-moved-by-1e6.obj", "1 kg/m3");
    near(&b["volume_m3"], 1873.2333642, 1e-7);
    for (k, want) in [15.9249475, 0.7828125, 3.7296175].into_iter().enumerate() {
        near(&b["centroid_m"][k], 1e6 + want, 5e-10);
    }
}

/// Check 2: The signs of its tensor (elements, −∫) and the principal moments that tell them from the
/// flipped and the swapped ones. Eight decimals are known; 3e-8 is 1e-13 of the norm.
#[test]
fn check_2_signs_of_the_tensor_and_principal_moments() {
    let b = weighed("tonon-tetrahedron.obj", "1 kg/m3");
    let want = [
        [43520.33328539, -11996.20139323, 46343.16738139],
        [-11996.20139323, 194711.29259079, -4417.66156969],
        [46343.16738139, -4417.66156969, 191168.76488608],
    ];
    for (i, row) in want.iter().enumerate() {
        for (j, x) in row.iter().enumerate() {
            near(&b["volume_inertia_m5"][i][j], *x, 3.5e-8);
            near(&b["inertia_kg_m2"][i][j], *x, 3.5e-8);
        }
    }
    for (k, want) in [29535.43, 191103.65, 208761.31].into_iter().enumerate() {
        near(&b["principal_moments_kg_m2"][k], want, 0.0051);
    }
    // The axes are rows, right-handed, and turn the tensor into the moments.
    let axis = |k: usize| [0, 1, 2].map(|i| number(&b["principal_axes"][k][i]));
    let times = |a: [f64; 3]| [0, 1, 2].map(|i| (0..3).map(|j| want[i][j] * a[j]).sum::<f64>());
    for k in 0..3 {
        let (a, m) = (axis(k), number(&b["principal_moments_kg_m2"][k]));
        assert!((0..3).all(|i| (times(a)[i] - m * a[i]).abs() < 1e-7));
    }
    let (a, b, c) = (axis(0), axis(1), axis(2));
    let det = a[0] * (b[1] * c[2] - b[2] * c[1])
        + a[1] * (b[2] * c[0] - b[0] * c[2])
        + a[2] * (b[0] * c[1] - b[1] * c[0]);
    assert!((det - 1.0).abs() < 1e-14);
}

/// Check 3: The right-triangle prism with legs 3 (x) and 4 (y) and height 5: Ixy +10 as the tensor's own
/// element (exact in rationals). The corners are whole numbers and the terms a few hundred.
#[test]
fn check_3_the_prism_has_a_positive_element() {
    let b = weighed("prism-3-4-5.obj", "1 kg/m3");
    near(&b["volume_m3"], 30.0, 3e-12);
    near(&b["volume_inertia_m5"][0][1], 10.0, 1e-11);
    near(&b["volume_inertia_m5"][0][2], 0.0, 1e-11);
    near(&b["volume_inertia_m5"][1][2], 0.0, 1e-11);
    let diagonal = [535.0 / 6.0, 77.5, 125.0 / 3.0];
    for (k, want) in diagonal.into_iter().enumerate() {
        near(&b["volume_inertia_m5"][k][k], want, 1e-11);
    }
}

/// Check 4: Prisms on regular polygons against the polygon's own closed form at 1e-13, not the circle's.
/// The corners in the files are doubles written to their last digit.
#[test]
fn check_4_a_polygon_prism_has_the_polygons_volume() {
    for n in [12, 64] {
        let b = weighed(&format!("prism-{n}-gon.obj"), "1 kg/m3");
        let [lo, hi] = [0, 1].map(|e| [0, 1, 2].map(|k| number(&b["bounds_m"][e][k])));
        // A corner lies on the x axis and, as n is a multiple of four, others on ±x and ±y.
        let (r, h) = ((hi[0] - lo[0]) / 2.0, hi[2] - lo[2]);
        let step = TAU / f64::from(n);
        let v = f64::from(n) / 2.0 * r * r * step.sin() * h;
        near(&b["volume_m3"], v, 1e-13 * v);
        let iz = v * r * r * (2.0 + step.cos()) / 6.0;
        near(&b["volume_inertia_m5"][2][2], iz, 1e-13 * iz);
        let ix = iz / 2.0 + v * h * h / 12.0;
        near(&b["volume_inertia_m5"][0][0], ix, 1e-13 * ix);
        near(&b["volume_inertia_m5"][1][1], ix, 1e-13 * ix);
        let circle = std::f64::consts::PI * r * r * h;
        assert!((number(&b["volume_m3"]) / circle - 1.0).abs() > 1e-3);
    }
}

/// Check 9: A density other than 1 with products of inertia about the centre: a published code once got
/// each of them wrong, as its own revision history records (Mirtich 1996).
#[test]
fn check_9_density_scales_products_about_the_centre() {
    let b = weighed("tonon-moved-by-1e6.obj", "7850 kg/m3");
    let near_home = weighed("tonon-tetrahedron.obj", "7850 kg/m3");
    let products = [
        (0, 1, -11996.20139323),
        (0, 2, 46343.16738139),
        (1, 2, -4417.66156969),
    ];
    for (i, j, want) in products {
        near(
            &near_home["inertia_kg_m2"][i][j],
            7850.0 * want,
            7850.0 * 3.5e-8,
        );
        // Far away the corners are rounded by 6e-11, which the second moment takes by its
        // derivative: of the order of area × size² × rounding, 2400 · 2500 · 6e-11.
        near(&b["inertia_kg_m2"][i][j], 7850.0 * want, 7850.0 * 4e-4);
    }
    near(
        &near_home["mass_kg"],
        7850.0 * 1873.2333642164654,
        1e-13 * 1.5e7,
    );
    for k in 0..3 {
        let centre = number(&near_home["centroid_m"][k]);
        near(&near_home["centre_of_mass_m"][k], centre, 0.0);
    }
}
