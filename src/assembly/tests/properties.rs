//! What must hold of any assembly.

use proptest::prelude::*;

use super::*;

fn number() -> impl Strategy<Value = f64> {
    // Whole thousandths, so that the text of the file holds them exactly.
    (-3000_i32..3000).prop_map(|n| f64::from(n) / 1000.0)
}

fn position() -> impl Strategy<Value = String> {
    let vector = || (number(), number(), number());
    let axis = vector().prop_filter("an axis", |(x, y, z)| x.abs() + y.abs() + z.abs() > 0.1);
    let normal = vector().prop_filter("a normal", |(x, y, z)| x.abs() + y.abs() + z.abs() > 0.1);
    (vector(), axis, -360_i32..360, proptest::option::of(normal)).prop_map(|(at, axis, angle, mirror)| {
        let mirror = mirror.map_or(String::new(), |m| format!("mirror = [{}, {}, {}]\n", m.0, m.1, m.2));
        format!(
            "at = [{}, {}, {}]\nturn = {{ axis = [{}, {}, {}], angle = \"{angle} deg\" }}\n{mirror}",
            at.0, at.1, at.2, axis.0, axis.1, axis.2
        )
    })
}

fn bench() -> Bench {
    Bench::new().mesh("a.obj", vec![block("a", [0.1, -0.2, 0.3], [1.1, 0.5, 2.0])])
}

const HEAD: &str = "[assembly]\nunit = \"m\"\n[material.m]\ndensity = \"2 kg/m3\"\n";
const PART: &str = "name = \"a\"\nmesh = \"a.obj\"\nmaterial = \"m\"\n";

#[track_caller]
fn alike(a: &Total, b: &Total) {
    // Things of size 3 at distances up to 15: a few hundred roundings of what passes through.
    let scale = 20.0;
    assert!((a.mass_kg - b.mass_kg).abs() <= 1e-13 * a.mass_kg);
    for n in 0..3 {
        assert!((a.centre_of_mass_m[n] - b.centre_of_mass_m[n]).abs() <= 1e-13 * scale);
        for m in 0..3 {
            let d = a.inertia_kg_m2[n][m] - b.inertia_kg_m2[n][m];
            assert!(d.abs() <= 1e-13 * scale * scale * a.mass_kg, "{a:?} {b:?}");
        }
        for end in 0..2 {
            assert!((a.bounds_m[end][n] - b.bounds_m[end][n]).abs() <= 1e-13 * scale);
        }
    }
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(48))]

    /// A part in groups in groups stands where the composed placement puts it.
    #[test]
    fn nested_is_composed(p in position(), q in position(), r in position()) {
        let mut bench = bench();
        let (nested, _) = bench.of(&format!(
            "{HEAD}[[group]]\nname = \"g\"\n{r}[[group.group]]\nname = \"h\"\n{q}[[group.group.part]]\n{PART}{p}"
        ));
        let alone = |bench: &mut Bench, p: &str| {
            bench.put("one.toml", &format!("{HEAD}[[part]]\n{PART}{p}"));
            let loaded = bench.load("one.toml").unwrap();
            loaded.file.entries[0].position().placements().next().unwrap()
        };
        let placement = alone(&mut bench, &p)
            .then(&alone(&mut bench, &q))
            .then(&alone(&mut bench, &r));
        let body = block("a", [0.1, -0.2, 0.3], [1.1, 0.5, 2.0]).read(LengthUnit::M);
        let moments = body.figures().moments.weighted(2.0).placed(&placement);
        let total = nested.total.unwrap();
        near3(total.centre_of_mass_m, moments.centre().unwrap().into(), 20.0);
        let inertia = moments.inertia().unwrap();
        for n in 0..3 {
            near3(total.inertia_kg_m2[n], inertia.row(n).transpose().into(), 20.0);
        }
        let turned = body.bounds_turned(&placement.turn).map(|c| Vector3::from(c) + placement.at);
        for (found, wanted) in total.bounds_m.into_iter().zip(turned) {
            near3(found, wanted.into(), 20.0);
        }
        prop_assert_eq!(&nested.parts[0].path, "g/h/a");
    }

    /// A placement changes neither mass nor principal moments, mirrored or not.
    #[test]
    fn placement_keeps_mass_and_principal_moments(p in position()) {
        let mut bench = bench();
        let (plain, _) = bench.of(&format!("{HEAD}[[part]]\n{PART}"));
        let (placed, _) = bench.of(&format!("{HEAD}[[part]]\n{PART}{p}"));
        let (a, b) = (plain.total.unwrap(), placed.total.unwrap());
        prop_assert_eq!(a.mass_kg, b.mass_kg);
        near3(a.principal_moments_kg_m2, b.principal_moments_kg_m2, 10.0 * a.principal_moments_kg_m2[2]);
    }

    /// `places` is the same as parts of their own, and their order matters to rounding alone.
    #[test]
    fn places_are_parts(
        places in proptest::collection::vec((number(), number(), number()), 1..6),
        p in position(),
    ) {
        let mut bench = bench();
        let turn: String = p.lines().skip(1).map(|l| format!("{l}\n")).collect();
        let list: Vec<_> = places.iter().map(|(x, y, z)| format!("[{x}, {y}, {z}]")).collect();
        let (repeated, _) = bench.of(&format!("{HEAD}[[part]]\n{PART}{turn}places = [{}]\n", list.join(", ")));
        let part = |n: usize| {
            format!("[[part]]\n{}{turn}at = {}\n", PART.replace("\"a\"", &format!("\"a{n}\"")), list[n])
        };
        let parts: String = (0..list.len()).map(part).collect();
        let (apart, _) = bench.of(&format!("{HEAD}{parts}"));
        prop_assert_eq!(repeated.total.as_ref().unwrap(), apart.total.as_ref().unwrap());
        let backward: String = (0..list.len()).rev().map(part).collect();
        let (backward, _) = bench.of(&format!("{HEAD}{backward}"));
        alike(repeated.total.as_ref().unwrap(), backward.total.as_ref().unwrap());
        let grouped: String = format!("{HEAD}[[group]]\nname = \"g\"\nplaces = [{}]\n[[group.part]]\n{PART}{turn}", list.join(", "));
        let (grouped, _) = bench.of(&grouped);
        alike(repeated.total.as_ref().unwrap(), grouped.total.as_ref().unwrap());
        prop_assert_eq!(grouped.by_group.len(), list.len());
    }

    /// No text makes it panic.
    #[test]
    fn any_text(text in "(\\[\\[?(part|item|assembly|group|limit)\\]?\\]|[a-z]{1,4}|=|\"|\\{|\\}|,|[0-9.]+|\n| ){0,60}") {
        let bench = bench();
        for name in ["it.toml", "it.json"] {
            bench.put(name, &text);
            let _ = bench.load(name);
        }
    }
}
