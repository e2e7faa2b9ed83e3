//! Printed parts in an assembly.

use super::*;

const MATERIAL: &str = "[material.p]\ndensity = \"1.24 g/cm3\"\n";

fn cube(made: &str, more: &str) -> (Bench, String) {
    let bench = Bench::new().mesh("cube.stl", vec![block("cube", [0.0; 3], [20.0; 3])]);
    let text = format!(
        "[assembly]\nunit = \"mm\"\n{MATERIAL}[[part]]\nname = \"cube\"\nmesh = \"cube.stl\"\n\
         material = \"p\"\nmade = {made}\n{more}"
    );
    (bench, text)
}

fn balanced(made: &str, more: &str) -> (Balance, Vec<Warned>) {
    let (mut bench, text) = cube(made, more);
    bench.put("it.toml", &text);
    bench.balance("it.toml").unwrap()
}

const LAYERS: &str = "{ layers = \"0.2 mm\", wall = 0.9, skin = { top = 1, bottom = \"0.8 mm\" }, \
                      infill = \"20 %\", up = [0, 0, 1] }";

#[test]
fn the_cube_has_its_mass_and_centre_also_turned_and_repeated() {
    // Reference values of the shell model, our construction: 3.939661 g, centre at 10.151798 mm.
    let (b, _) = balanced(
        LAYERS,
        "turn = { axis = \"x\", angle = \"90 deg\" }\nplaces = [[0, 0, 0], [100, 0, 0]]\n",
    );
    for p in &b.parts {
        assert!((p.mass_kg - 3.939661e-3).abs() < 6e-10, "{}", p.mass_kg);
        let c = p.centre_of_mass_m.unwrap();
        assert!((c[1] + 10.151798e-3).abs() < 6e-10, "{c:?}");
        let made = p.made.as_ref().unwrap();
        assert_eq!((made.method, made.layers), ("layers", Some(100)));
        assert!((p.volume_m3.unwrap() - 8e-6).abs() < 1e-18);
        // Metres of 1.75 mm filament: 2.405282 cm³ each.
        assert!((made.filament_m.unwrap() - 3.1771456 / 2.405_281_875).abs() < 1e-6);
    }
}

#[test]
fn a_measured_print_shows_its_infill_and_density() {
    let (b, warnings) = balanced(LAYERS, "measured = \"6.182288 g\"\n");
    let made = b.parts[0].made.as_ref().unwrap();
    assert!((made.implied_infill.unwrap() - 0.5).abs() < 1e-6);
    assert!((made.implied_density_kg_m3.unwrap() - 1240.0 * 6.182288 / 3.939661).abs() < 1e-3);
    assert_eq!(b.parts[0].mass_kg, 6.182288e-3);
    assert!(warnings.iter().all(|w| w.0 != "implied-density"));
    let (_, warnings) = balanced(LAYERS, "measured = \"12 g\"\n");
    assert!(warnings.iter().any(|w| w.0 == "implied-infill"));
}

#[test]
fn a_hollow_keeps_its_fill_unless_it_is_drained() {
    let shell = (8000.0 - 4096.0) * 1.24e-6;
    let near = |x: f64, want: f64| assert!((x - want).abs() < 1e-9 * want, "{x} {want}");
    let (b, w) = balanced("{ shell = \"2 mm\" }", "");
    // What it keeps is told beside the mass, and in it where its density is known.
    near(b.parts[0].mass_kg, shell);
    let t = b.parts[0].made.as_ref().unwrap().trapped.clone().unwrap();
    near(t.mass_without_kg.unwrap(), shell);
    assert!(t.density_assumed && t.hollows == 1);
    assert!(w.iter().any(|w| w.0 == "trapped"));
    let (b, _) = balanced("{ shell = \"2 mm\", fill = \"0.5 g/cm3\" }", "");
    near(b.parts[0].mass_kg, shell + 4096.0 * 0.5e-6);
    for made in [
        "{ shell = \"2 mm\", drain = [[10, 10, 0]] }",
        "{ shell = \"2 mm\", infill = \"0 %\" }",
    ] {
        let (b, w) = balanced(made, "");
        near(b.parts[0].mass_kg, shell);
        assert!(b.parts[0].made.as_ref().unwrap().trapped.is_none());
        assert!(w.iter().all(|w| w.0 != "trapped"));
    }
}

#[test]
fn plans_that_make_no_sense_are_told_with_their_line() {
    for (made, word) in [
        ("{}", "layers"),
        ("{ layers = 0.2, shell = 1 }", "one of"),
        ("{ layers = 0.2, wall = 1, skin = 1 }", "infill"),
        (
            "{ layers = 0, wall = 1, skin = 1, infill = \"20 %\" }",
            "zero",
        ),
        (
            "{ layers = 0.2, wall = 1, skin = 1, infill = \"120 %\" }",
            "infill",
        ),
        (
            "{ layers = 0.2, wall = 1, skin = 1, infill = 0.2 }",
            "infill",
        ),
        (
            "{ layers = 0.2, wall = 1, skin = { top = 1 }, infill = \"0 %\" }",
            "bottom",
        ),
        ("{ shell = 2, wall = 1 }", "wall"),
        ("{ shell = 2, drain = [1, 2, 3] }", "drain"),
        ("{ shell = 2, drain = [[10, 10, 90]] }", "drain"),
        (
            "{ layers = 0.2, wall = 0, skin = 0, infill = \"0 %\" }",
            "printed",
        ),
        ("{ layer = 0.2 }", "layers"),
    ] {
        let (mut bench, text) = cube(made, "");
        bench.put("it.toml", &text);
        let errors = bench.balance("it.toml").unwrap_err();
        let told = |e: &Error| format!("{} {}", e.message, e.advice).contains(word);
        assert!(errors.iter().any(told), "{made}: {errors:?}");
        assert!(
            errors.iter().all(|e| e.line.is_some()),
            "{made}: {errors:?}"
        );
    }
}
