//! Which material goes on which body, and what is said about it.

use super::*;

const OWN: &str =
    "[material.light]\ndensity = \"1000 kg/m3\"\n[material.heavy]\ndensity = \"3000 kg/m3\"\n";

fn cubes(names: &[&str]) -> Vec<Block> {
    names.iter().map(|n| block(n, [0.0; 3], [1.0; 3])).collect()
}

fn of(blocks: Vec<Block>, text: &str) -> (Balance, Vec<Warned>) {
    let mut bench = Bench::new().mesh("a.obj", blocks);
    bench.of(&format!("[assembly]\nunit = \"m\"\n{OWN}{text}"))
}

fn masses(b: &Balance) -> Vec<(&str, f64)> {
    b.parts
        .iter()
        .map(|p| (p.path.as_str(), p.mass_kg))
        .collect()
}

#[test]
fn first_rule_wins_and_the_part_wins_over_all() {
    let (b, warned) = of(
        cubes(&["frame", "frame lid", "pin"]),
        "[[assign]]\nbody = \"frame\"\nmaterial = \"heavy\"\n\
         [[assign]]\nbody = \"frame*\"\nmaterial = \"LIGHT\"\n\
         [[part]]\nmesh = \"a.obj#frame\"\n[[part]]\nmesh = \"a.obj#frame lid\"\n\
         [[part]]\nmesh = \"a.obj#pin\"\nmaterial = \"heavy\"\n",
    );
    assert_eq!(
        masses(&b),
        [("frame", 3000.0), ("frame lid", 1000.0), ("pin", 3000.0)]
    );
    assert_eq!(kinds(&warned), [""; 0]);
    let rows: Vec<_> = b
        .by_material
        .iter()
        .map(|r| (r.material.as_deref(), r.mass_kg, r.parts))
        .collect();
    assert_eq!(
        rows,
        [(Some("heavy"), 6000.0, 2), (Some("light"), 1000.0, 1)]
    );
}

#[test]
fn globs_on_ids_and_on_paths() {
    let mut second = block("frame", [0.0; 3], [1.0; 3]);
    second.id = "frame/2".into();
    let blocks = vec![block("frame", [0.0; 3], [1.0; 3]), second];
    // `*` reaches over the `/` of an id; one rule may name a single body of two.
    let (b, _) = of(
        blocks,
        "[[assign]]\nbody = \"frame/2\"\nmaterial = \"heavy\"\n[[assign]]\nbody = \"fr*\"\nmaterial = \"light\"\n\
         [[part]]\nmesh = \"a.obj#frame\"\n[[part]]\nname = \"two\"\nmesh = \"a.obj#frame/2\"\nat = [9, 0, 0]\n",
    );
    assert_eq!(masses(&b), [("frame", 4000.0), ("two", 3000.0)]);
    assert_eq!(
        b.parts[0].materials,
        [Some("light".to_string()), Some("heavy".to_string())]
    );
    assert_eq!(b.parts[0].material, None);
    // A part rule names a repeat, an entry with all its repeats, or anything in a group.
    let (b, _) = of(
        cubes(&["w"]),
        "[[assign]]\npart = \"g/w#2\"\nmaterial = \"heavy\"\n[[assign]]\npart = \"g/w\"\nmaterial = \"light\"\n\
         [[group]]\nname = \"g\"\n[[group.part]]\nmesh = \"a.obj\"\nname = \"w\"\nplaces = [[0,0,0],[2,0,0],[4,0,0]]\n",
    );
    assert_eq!(
        masses(&b),
        [("g/w", 1000.0), ("g/w#2", 3000.0), ("g/w#3", 1000.0)]
    );
    // Both must match where both are given.
    let (b, _) = of(
        cubes(&["w"]),
        "[[assign]]\npart = \"b\"\nbody = \"w\"\nmaterial = \"heavy\"\n[[assign]]\nbody = \"*\"\nmaterial = \"light\"\n\
         [[part]]\nname = \"a\"\nmesh = \"a.obj\"\n[[part]]\nname = \"b\"\nmesh = \"a.obj\"\nat = [3, 0, 0]\n",
    );
    assert_eq!(masses(&b), [("a", 1000.0), ("b", 3000.0)]);
}

#[test]
fn materials_of_the_mesh_file_and_joined_names() {
    let mut cube = block("frame", [0.0; 3], [1.0; 3]);
    cube.materials = vec!["paint".into(), "zinc".into()];
    let part = "[[part]]\nmesh = \"a.obj\"\n";
    let rule = |body: &str, material: &str| {
        format!("[[assign]]\nbody = \"{body}\"\nmaterial = \"{material}\"\n")
    };
    let head = format!("[assembly]\nunit = \"m\"\n{OWN}");
    let both = rule("paint", "light") + &rule("zinc", "light");
    assert_eq!(
        of(vec![cube.clone()], &(both + part)).0.parts[0].mass_kg,
        1000.0
    );
    let mut bench = Bench::new().mesh("a.obj", vec![cube.clone()]);
    let differ = rule("paint", "light") + &rule("zinc", "heavy");
    let errors = bench.faults(&format!("{head}{differ}{part}"));
    assert_eq!(errors[0].kind, Kind::AmbiguousName, "{errors:#?}");
    let errors = bench.faults(&format!("{head}{}{part}", rule("paint", "light")));
    assert_eq!(errors[0].kind, Kind::AmbiguousName, "{errors:#?}");
    // A rule on the body's own name that comes first settles it.
    let settled = rule("frame", "heavy") + &differ;
    assert_eq!(of(vec![cube], &(settled + part)).0.parts[0].mass_kg, 3000.0);
    let mut split = block("frame", [0.0; 3], [1.0; 3]);
    split.joined = vec!["lid".into()];
    let mut bench = Bench::new().mesh("a.obj", vec![split]);
    let differ = rule("frame", "light") + &rule("lid", "heavy");
    let errors = bench.faults(&format!("{head}{differ}{part}"));
    assert_eq!(errors[0].kind, Kind::AmbiguousName, "{errors:#?}");
    let own = format!("{head}{differ}{part}material = \"heavy\"\n");
    bench.of(&own);
}

#[test]
fn warnings() {
    let (_, warned) = of(
        cubes(&["frame", "left", "over"]),
        "[[assign]]\nbody = \"nothing*\"\nmaterial = \"light\"\n[[part]]\nmesh = \"a.obj#frame\"\nmaterial = \"light\"\n",
    );
    assert_eq!(kinds(&warned), ["body-unused", "assign-unused"]);
    assert!(warned[0].1.contains("`left`, `over`"), "{warned:?}");
    assert_eq!(warned[1].2, Some(7));
    // The same body twice in one place is counted twice, which is hardly meant.
    let text = "[[part]]\nname = \"a\"\nmesh = \"a.obj#frame\"\nmaterial = \"light\"\n\
                [[part]]\nname = \"b\"\nmesh = \"a.obj\"\nmaterial = \"light\"\n";
    let (_, warned) = of(cubes(&["frame"]), text);
    assert_eq!(kinds(&warned), ["counted-twice"]);
    let (_, warned) = of(cubes(&["frame"]), &format!("{text}at = [1, 0, 0]\n"));
    assert_eq!(kinds(&warned), [""; 0]);
    let (_, warned) = of(
        cubes(&["frame"]),
        "[[part]]\nmesh = \"a.obj\"\nmaterial = \"light\"\ncount = 2\n",
    );
    assert_eq!(kinds(&warned), [""; 0]);
}

#[test]
fn measured_scales_and_shows_the_density() {
    let measured = |mass: &str, more: &str| {
        of(
            cubes(&["f"]),
            &format!("[[part]]\nmesh = \"a.obj\"\nmeasured = \"{mass}\"\n{more}"),
        )
    };
    let (b, warned) = measured("1040 kg", "material = \"light\"\n");
    let part = &b.parts[0];
    assert_eq!((part.mass_kg, part.basis), (1040.0, Basis::Measured));
    assert_eq!(part.implied_density_kg_m3, Some(1040.0));
    near(part.inertia_kg_m2.unwrap()[0][0], 1040.0 / 6.0);
    assert_eq!(kinds(&warned), [""; 0]);
    // Past 5 % where the material has no spread of its own.
    let (_, warned) = measured("1060 kg", "material = \"light\"\n");
    assert_eq!(kinds(&warned), ["implied-density"]);
    // 7850 ± 1 %: three spreads are 235.5 kg/m³.
    let own = "material = \"s\"\n[material.s]\ndensity = \"7850 kg/m3 ± 1 %\"\n";
    assert_eq!(kinds(&measured("8080 kg", own).1), [""; 0]);
    assert_eq!(kinds(&measured("8090 kg", own).1), ["implied-density"]);
    // Without a material the mass is spread evenly, and no density is claimed.
    let (b, _) = measured("12 kg", "");
    assert_eq!(
        (b.parts[0].mass_kg, b.parts[0].material.as_deref()),
        (12.0, None)
    );
    assert_eq!(b.by_material[0].material, None);
}

#[test]
fn expectations() {
    let expect = |text: &str| {
        let (b, _) = of(
            vec![block("f", [0.0; 3], [0.1, 0.2, 0.4])],
            &format!(
                "[[part]]\nmesh = \"a.obj\"\nmaterial = \"light\"\nat = [7, 7, 7]\n\
                      turn = {{ axis = \"x\", angle = \"90 deg\" }}\nexpect = {{ {text} }}\n"
            ),
        );
        let broken = |e: &&Expectation| e.verdict == crate::limits::Verdict::Broken;
        let names = b
            .expectations
            .iter()
            .filter(broken)
            .map(|e| e.quantity)
            .collect::<Vec<_>>();
        assert_eq!(b.exit(), u8::from(!names.is_empty()));
        names.join(" ")
    };
    // The part's own frame: neither turned nor moved.
    let good =
        "volume = \"8000 cm3\", mass = \"8 kg\", size = [0.1, 0.2, 0.4], centre = [0.05, 0.1, 0.2]";
    assert_eq!(expect(good), "");
    // ± 0.1 % where no tolerance is stated.
    assert_eq!(expect("volume = \"8008 cm3\", mass = \"8.007 kg\""), "");
    assert_eq!(
        expect("volume = \"8009 cm3\", mass = \"8.01 kg\""),
        "volume mass"
    );
    assert_eq!(expect("mass = \"8.1 kg ± 2 %\""), "");
    assert_eq!(expect("mass = \"8.1 kg ± 99 g\""), "mass");
    assert_eq!(expect("size = [0.1, 0.4, 0.2]"), "size.y size.z");
    assert_eq!(expect("centre = [0.05, 0.1, 0.2003]"), "centre.z");
    // A wrong unit.
    assert_eq!(
        expect("size = [\"100 mm\", \"200 mm\", \"400 in\"]"),
        "size.z"
    );
    // Nothing is 0.1 % of zero: 0.1 % of the diagonal (0.458 m) then.
    let at_zero = |x: f64| {
        let (b, _) = of(
            vec![block("f", [x - 0.05, 0.0, 0.0], [x + 0.05, 0.2, 0.4])],
            "[[part]]\nmesh = \"a.obj\"\nmaterial = \"light\"\nexpect = { centre = [0, 0.1, 0.2] }\n",
        );
        b.exit()
    };
    assert_eq!((at_zero(0.000_45), at_zero(0.000_47)), (0, 1));
}
