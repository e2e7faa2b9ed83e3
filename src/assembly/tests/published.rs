//! Roll-ups with known answers.

use super::*;

/// Three items of 12, 7.5 and 3.25 kg at 100, 250 and −80 mm: M 22.75 kg and X = Σmx/M =
/// 2815/22.75 = 123.736264 mm (law of propagation example, our own numbers, computed by hand).
#[test]
fn three_items() {
    let (b, warned) = Bench::new().of("[assembly]\nname = \"three\"\nunit = \"mm\"\n\
         [[item]]\nname = \"a\"\nmass = \"12 kg ± 0.12 kg\"\nat = [100, 0, 0]\n\
         [[item]]\nname = \"b\"\nmass = \"7.5 kg\"\nat = [250, 0, 0]\n\
         [[item]]\nname = \"c\"\nmass = \"3.25 kg\"\nat = [\"-80 mm\", 0, 0]\n\
         [[limit]]\nmass = { to = \"22.75 kg\" }\ncentre.x = { from = 100, to = 120 }\n");
    let total = b.total.as_ref().unwrap();
    assert_eq!(total.mass_kg, 22.75);
    near(total.centre_of_mass_m[0], 2.815 / 22.75);
    assert!((total.centre_of_mass_m[0] * 1e3 - 123.736_264).abs() < 5e-7);
    assert!(warned.is_empty());
    // The mass stands on its limit, which holds; the centre is 3.736264 mm past its.
    let [mass, centre] = b.limits.as_slice() else {
        panic!()
    };
    assert_eq!(
        (mass.margin, mass.verdict),
        (0.0, crate::limits::Verdict::Holds)
    );
    assert_eq!(
        (mass.name.as_str(), centre.name.as_str()),
        ("mass", "centre.x")
    );
    assert_eq!(centre.verdict, crate::limits::Verdict::Broken);
    assert!((centre.margin * 1e3 + 3.736_264).abs() < 5e-7);
    assert!((centre.margin_percent.unwrap() + 100.0 * 3.736_264 / 20.0).abs() < 1e-5);
    assert_eq!(b.exit(), 1);
}

/// Centre of three wheels: 475 lb at 55 in, 1046 and 1040 lb at 121 in: 2561 lb at 108.75869 in
/// (inputs from a public aviation handbook, answer computed here).
#[test]
fn three_wheels_in_pounds_and_inches() {
    let (b, _) = Bench::new().of("[assembly]\nunit = \"in\"\n\
         [[item]]\nname = \"nose\"\nmass = \"475 lb\"\nat = [55, 0, 0]\n\
         [[item]]\nname = \"left\"\nmass = \"1046 lb\"\nat = [121, 0, 0]\n\
         [[item]]\nname = \"right\"\nmass = \"1040 lb\"\nat = [121, 0, 0]\n");
    let total = b.total.unwrap();
    // A pound is 0.45359237 kg exactly.
    near(total.mass_kg, 2561.0 * 0.453_592_37);
    assert!((total.centre_of_mass_m[0] / 0.0254 - 108.758_69).abs() < 5e-6);
    assert_eq!(b.name, "it");
}

/// 0.1 kg and 0.2 kg keep a limit of 0.3 kg, though their doubles add up to more.
#[test]
fn decimals_keep_a_decimal_limit() {
    let (b, _) = Bench::new().of("[assembly]\nunit = \"m\"\n\
         [[item]]\nname = \"a\"\nmass = \"0.1 kg\"\n[[item]]\nname = \"b\"\nmass = \"0.2 kg\"\n\
         [[limit]]\nmass = { to = \"0.3 kg\" }\n");
    assert_eq!(b.exit(), 0);
    assert_eq!(b.limits[0].margin, 0.0);
}

/// The 2×3×4 box of density 1 has V 24 and inertia 50, 40, 26 about its middle (closed form), also
/// a million of its sizes from the origin.
#[test]
fn box_far_from_the_origin() {
    for at in [0.0, 4e6] {
        let mut bench = Bench::new().mesh("b.obj", vec![block("b", [0.0; 3], [2.0, 3.0, 4.0])]);
        let (b, _) = bench.of(&format!(
            "[assembly]\nunit = \"m\"\n[material.one]\ndensity = \"1 kg/m3\"\n\
             [[part]]\nmesh = \"b.obj\"\nmaterial = \"one\"\nat = [{at}, {at}, {at}]\n"
        ));
        let total = b.total.unwrap();
        near(total.mass_kg, 24.0);
        near3(
            total.centre_of_mass_m,
            [at + 1.0, at + 1.5, at + 2.0],
            at.max(1.0),
        );
        for (n, wanted) in [50.0, 40.0, 26.0].into_iter().enumerate() {
            near(total.inertia_kg_m2[n][n], wanted);
        }
        assert_eq!(total.principal_axes[0], [0.0, 0.0, 1.0]);
        near3(total.principal_moments_kg_m2, [26.0, 40.0, 50.0], 50.0);
        near(total.radii_of_gyration_m[0], (26.0_f64 / 24.0).sqrt());
    }
}
