//! An assembly with every feature, its figures worked out by hand.

use super::*;

/// The inner file is in inches, with a material and a rule of its own and a limit.
const INNER: &str = r#"
[assembly]
name = "boom"
unit = "in"
[material.plastic]
density = "1000 kg/m3"
[[assign]]
body = "arm"
material = "plastic"
[[part]]
mesh = "arm.stl"
[[limit]]
name = "boom alone"
mass = { to = "1 g" }
"#;

const OUTER: &str = r#"
[assembly]
name = "rover"
unit = "mm"

[[assign]]
body = "*"
material = "steel"

[material.steel]
density = "8000 kg/m3"

# 100 × 200 × 300 mm = 6e-3 m3: 48 kg, middle (50, 100, 150).
[[part]]
name = "frame"
mesh = "rover.obj#frame"
expect = { volume = "6 dm3", size = [100, 200, 300] }

# A cube of 100 mm, 8 kg, whose middle (150, 0, 0) is mirrored in x, turned 90° about z and moved.
[[part]]
name = "lug"
mesh = "rover.obj#lug"
mirror = "x"
turn = { axis = [0, 0, 2], angle = "90 deg" }
at = [10, 20, 30]

[[item]]
name = "battery"
mass = "6 kg"
box = [100, 200, 300]
turn = { axis = "x", angle = "90 deg" }
places = [[0, 0, 500], [0, 0, -500]]

[[group]]
name = "left"
at = [0, 1000, 0]

[[group.item]]
name = "ballast"
mass = "2 kg"
at = [0, 0, 100]
sphere = 50
count = 2

[[group.group]]
name = "boom"
turn = { axis = "z", angle = "180 deg" }
include = "sub/inner.toml"

[[limit]]
name = "load"
mass = { to = "80 kg" }
centre.y = { from = 0, to = 50 }
"#;

fn bench() -> Bench {
    let bench = Bench::new()
        .mesh(
            "rover.obj",
            vec![
                block("frame", [0.0; 3], [100.0, 200.0, 300.0]),
                block("lug", [100.0, -50.0, -50.0], [200.0, 50.0, 50.0]),
            ],
        )
        // 10 in × 1 in × 1 in = 10 · 0.0254³ m3.
        .mesh(
            "sub/arm.stl",
            vec![block("arm", [0.0; 3], [10.0, 1.0, 1.0])],
        );
    let mut bench = bench;
    let arm = bench.meshes.remove("sub/arm.stl").unwrap();
    bench.meshes.insert("arm.stl".into(), arm);
    bench.put("sub/inner.toml", INNER);
    bench
}

#[test]
fn everything() {
    let (b, warned) = bench().of(OUTER);
    let paths: Vec<&str> = b.parts.iter().map(|p| p.path.as_str()).collect();
    let wanted = [
        "frame",
        "lug",
        "battery",
        "battery#2",
        "left/ballast",
        "left/ballast#2",
        "left/boom/arm",
    ];
    assert_eq!(paths, wanted);
    let inch = 0.0254_f64;
    let arm = 10.0 * inch.powi(3) * 1000.0;
    let masses = [48.0, 8.0, 6.0, 6.0, 2.0, 2.0, arm];
    // The lug: (150,0,0) → mirror (−150,0,0) → turn (0,−150,0) → move (10,−130,30).
    // The arm: middle (5,.5,.5) in → turned 180° about z → (−5,−.5,.5) in + (0, 1 m, 0).
    let centres = [
        [0.05, 0.1, 0.15],
        [0.01, -0.13, 0.03],
        [0.0, 0.0, 0.5],
        [0.0, 0.0, -0.5],
        [0.0, 1.0, 0.1],
        [0.0, 1.0, 0.1],
        [-5.0 * inch, 1.0 - 0.5 * inch, 0.5 * inch],
    ];
    // m(b² + c²)/12 for boxes, 2mr²/5 for the sphere; the battery's sides are (100, 300, 200)
    // after its turn.
    let block = |m: f64, a: f64, b: f64, c: f64| {
        [b * b + c * c, a * a + c * c, a * a + b * b].map(|s| m * s / 12.0)
    };
    let ball = [2.0 * 2.0 * 0.05 * 0.05 / 5.0; 3];
    let own = [
        block(48.0, 0.1, 0.2, 0.3),
        block(8.0, 0.1, 0.1, 0.1),
        block(6.0, 0.1, 0.3, 0.2),
        block(6.0, 0.1, 0.3, 0.2),
        ball,
        ball,
        block(arm, 10.0 * inch, inch, inch),
    ];
    for (n, part) in b.parts.iter().enumerate() {
        near(part.mass_kg, masses[n]);
        near3(part.centre_of_mass_m.unwrap(), centres[n], 1.0);
        for (axis, wanted) in own[n].into_iter().enumerate() {
            assert!((part.inertia_kg_m2.unwrap()[axis][axis] - wanted).abs() < 1e-14);
        }
    }
    // The sums, plainly.
    let mass: f64 = masses.iter().sum();
    let centre = |axis: usize| (0..7).map(|n| masses[n] * centres[n][axis]).sum::<f64>() / mass;
    let c = [centre(0), centre(1), centre(2)];
    let total = b.total.as_ref().unwrap();
    near(total.mass_kg, mass);
    near3(total.centre_of_mass_m, c, 1.0);
    let d = |n: usize, axis: usize| centres[n][axis] - c[axis];
    for (i, row) in total.inertia_kg_m2.iter().enumerate() {
        for (j, found) in row.iter().enumerate() {
            let product = |n: usize| masses[n] * d(n, i) * d(n, j);
            let steiner = |n: usize| masses[n] * (0..3).map(|k| d(n, k).powi(2)).sum::<f64>();
            let sum: f64 = (0..7)
                .map(|n| {
                    if i == j {
                        own[n][i] + steiner(n) - product(n)
                    } else {
                        -product(n)
                    }
                })
                .sum();
            assert!(
                (found - sum).abs() < 1e-13 * 20.0,
                "{i}{j}: {found} is not {sum}"
            );
        }
    }
    // Least and greatest corners: arm and lug in x, lug and ballast in y, the batteries in z.
    near3(total.bounds_m[0], [-10.0 * inch, -0.18, -0.6], 1.0);
    near3(total.bounds_m[1], [0.1, 1.05, 0.6], 1.0);
    // The outer `*` does not reach the inner arm, whose own rule comes first.
    let materials: Vec<_> = b
        .by_material
        .iter()
        .map(|r| (r.material.as_deref(), r.parts))
        .collect();
    assert_eq!(
        materials,
        [(Some("steel"), 2), (None, 4), (Some("plastic"), 1)]
    );
    near(b.by_material.iter().map(|r| r.mass_kg).sum(), mass);
    let groups: Vec<_> = b
        .by_group
        .iter()
        .map(|r| (r.group.as_deref(), r.depth, r.parts))
        .collect();
    assert_eq!(
        groups,
        [
            (None, 0, 4),
            (Some("left"), 1, 3),
            (Some("left/boom"), 2, 1)
        ]
    );
    near(b.by_group[0].mass_kg + b.by_group[1].mass_kg, mass);
    let basis: Vec<_> = b.by_basis.iter().map(|r| (r.basis, r.parts)).collect();
    assert_eq!(basis, [(Basis::Computed, 3), (Basis::Stated, 4)]);
    near(b.parts.iter().map(|p| p.share_of_mass.unwrap()).sum(), 1.0);
    // Both quantities of one limit keep its name; the inner file's limit is not judged, and said.
    let limits: Vec<_> = b
        .limits
        .iter()
        .map(|l| (l.name.as_str(), l.quantity))
        .collect();
    assert_eq!(limits, [("load", "mass"), ("load", "centre.y")]);
    near(b.limits[0].margin, 80.0 - mass);
    // y: 4.8 − 1.04 + 4 + arm over the mass: about 0.107 m, past 50 mm.
    assert_eq!(b.limits[1].verdict, crate::limits::Verdict::Broken);
    assert_eq!(kinds(&warned), ["limits-ignored"]);
    assert!(warned[0].1.contains("boom alone"));
    assert_eq!(b.expectations.len(), 4);
    assert_eq!((b.exit(), b.name.as_str()), (1, "rover"));
}

/// The document has the names of the contract, and nothing is omitted.
#[test]
fn the_document() {
    let (b, _) = bench().of(OUTER);
    let json = serde_json::to_value(&b).unwrap();
    let keys = |v: &serde_json::Value| {
        v.as_object()
            .unwrap()
            .keys()
            .cloned()
            .collect::<Vec<_>>()
            .join(" ")
    };
    assert_eq!(
        keys(&json),
        "by_basis by_group by_material error expectations limits name overlaps parts total uncertainty"
    );
    assert_eq!(
        keys(&json["total"]),
        "axes_free bounds_m centre_of_mass_m inertia_kg_m2 mass_kg principal_axes \
         principal_moments_kg_m2 radii_of_gyration_m"
    );
    assert_eq!(
        keys(&json["parts"][0]),
        "basis bounds_m centre_of_mass_m centre_standard_m density_kg_m3 inertia_kg_m2 mass_kg \
         mass_standard_kg material path share_of_mass source volume_m3"
    );
    assert_eq!(
        keys(&json["limits"][0]),
        "from margin margin_percent name nearest percent_of probability quantity standard to unit value verdict"
    );
    assert_eq!(json["parts"][0]["source"]["file"], "rover.obj");
    assert_eq!(json["parts"][0]["source"]["body"], "frame");
    assert_eq!(json["parts"][2]["source"], "item");
    assert_eq!(json["parts"][0]["basis"], "computed");
    assert_eq!(json["limits"][1]["quantity"], "centre.y");
    assert_eq!(json["limits"][1]["verdict"], "broken");
    assert_eq!(json["limits"][1]["nearest"], "to");
    assert!(json["overlaps"] == serde_json::json!([]) && json["uncertainty"].is_null());
}

/// A file whose name holds `#` is taken as a whole; else the last `#` splits; bodies go by name,
/// by id, and, unnamed, by the stem of the file.
#[test]
fn names_of_bodies() {
    let unnamed = |id: &str| Block {
        id: id.into(),
        name: None,
        ..block("", [0.0; 3], [1.0; 3])
    };
    let named = |id: &str| Block {
        id: id.into(),
        ..block("pin", [0.0; 3], [1.0; 3])
    };
    let mut bench = Bench::new()
        .mesh("a#1.stl", vec![unnamed("a#1"), unnamed("a#1/2")])
        .mesh("p.obj", vec![named("pin"), named("pin/2"), named("pin/3")]);
    let mut count = |mesh: &str| {
        let (b, _) = bench.of(&format!(
            "[assembly]\nunit = \"m\"\n[material.m]\ndensity = \"1 kg/m3\"\n\
             [[part]]\nmesh = \"{mesh}\"\nmaterial = \"m\"\n"
        ));
        b.total.unwrap().mass_kg
    };
    assert_eq!(count("a#1.stl"), 2.0);
    assert_eq!(count("a#1.stl#a#1"), 2.0);
    assert_eq!(count("p.obj"), 3.0);
    assert_eq!(count("p.obj#pin"), 3.0);
    assert_eq!(count("p.obj#pin/2"), 1.0);
}

/// Groups are mirrored as one: the left boom becomes the right.
#[test]
fn a_mirrored_group() {
    let group = |name: &str, mirror: &str| {
        format!(
            "[[group]]\nname = \"{name}\"\n{mirror}[[group.part]]\nmesh = \"rover.obj#lug\"\n\
             material = \"s\"\nat = [0, 500, 7]\n"
        )
    };
    let (b, _) = bench().of(&format!(
        "[assembly]\nunit = \"mm\"\n[material.s]\ndensity = \"8000 kg/m3\"\n{}{}",
        group("left", ""),
        group("right", "mirror = [0, -3, 0]\n")
    ));
    let total = b.total.unwrap();
    near3(
        b.parts[1].centre_of_mass_m.unwrap(),
        [0.15, -0.5, 0.007],
        1.0,
    );
    near3(total.centre_of_mass_m, [0.15, 0.0, 0.007], 1.0);
    near(total.mass_kg, 16.0);
}
