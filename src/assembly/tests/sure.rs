//! Tolerances of an assembly file: who shares them, what they act on, growth and smears.

use super::*;
use crate::limits::Verdict;
use crate::uncertainty::{Sampling, Uncertainty};

const HEAD: &str = "[assembly]\nunit = \"mm\"\n";

fn uncertainty(text: &str) -> (Balance, Uncertainty) {
    let (b, warned) = bench().of(&format!("{HEAD}{text}"));
    assert!(warned.is_empty(), "{warned:?}");
    let u = b.uncertainty.clone().unwrap();
    (b, u)
}

/// A cube of 1 m side, and a plate.
fn bench() -> Bench {
    Bench::new()
        .mesh("cube.obj", vec![block("cube", [0.0; 3], [1e3; 3])])
        .mesh(
            "plate.obj",
            vec![block("plate", [0.0; 3], [1e3, 500.0, 20.0])],
        )
}

fn close(a: f64, b: f64, within: f64) {
    assert!((a - b).abs() <= within, "{a} is not {b}");
}

/// The three items of the worked propagation, typed with coverage factors; 5 mm (k=1) and
/// 10 mm (k=2) are the same standard uncertainty.
#[test]
fn three_items_with_coverage_factors() {
    let (_, u) = uncertainty(
        "[[item]]\nname = \"a\"\nmass = \"12 kg ± 0.12 kg (k=1)\"\nat = [\"100 mm ± 2 mm (k=2)\", 0, 0]\n\
         [[item]]\nname = \"b\"\nmass = \"7.5 kg ± 4 % (k=2)\"\nat = [\"250 mm ± 2 mm (k=1)\", 0, 0]\n\
         [[item]]\nname = \"c\"\nmass = \"3.25 kg ± 200 g (k=2)\"\nat = [\"-80 mm ± 5 mm (k=1)\", 0, 0]\n",
    );
    close(u.mass_kg.standard, 0.216_564, 5e-7);
    close(u.centre_of_mass_m.standard[0] * 1e3, 1.653_453, 5e-7);
    close(u.correlation[0][1], 0.056_685, 5e-7);
    assert_eq!(u.sources.len(), 6);
    assert_eq!(u.sources[1].source, "position x of a");
    assert_eq!(u.mass_kg.drivers[0].source, "mass of b");
}

/// A plain ± is a half-width: 2 % of 1000 kg has u 11.54701 kg, and 95 % lie within 19 kg.
#[test]
fn a_plain_tolerance_is_a_half_width() {
    let (b, u) = uncertainty(
        "[material.heavy]\ndensity = \"1000 kg/m3 ± 2 %\"\n\
         [[part]]\nmesh = \"cube.obj\"\nmaterial = \"heavy\"\n\
         [[limit]]\nmass = { to = \"1010 kg\" }\n",
    );
    close(u.mass_kg.standard, 11.547_005, 1e-6);
    close(u.mass_kg.high_95, 1019.0, 1e-9);
    assert_eq!(u.sources[0].distribution, "rectangular");
    assert_eq!(u.sources[0].source, "density of heavy");
    // The density scales everything: no centre, no radius moves.
    assert_eq!(u.centre_of_mass_m.standard, [0.0; 3]);
    // A cube of 1 m: I = m/6.
    let i = u.inertia_kg_m2.unwrap();
    close(i.standard[0][0], 11.547_005 / 6.0, 1e-6);
    close(b.limits[0].probability.unwrap(), 0.75, 1e-12);
    assert_eq!(b.limits[0].verdict, Verdict::Holds);
    assert_eq!(b.parts[0].mass_standard_kg, Some(u.mass_kg.standard));
}

/// Two parts of one material move together; a measured part does not care for its density; a
/// tolerance of the built-in table counts.
#[test]
fn densities_are_shared() {
    let (_, u) = uncertainty(
        "[material.m]\ndensity = \"1000 kg/m3 ± 1 % (k=1)\"\n\
         [[part]]\nname = \"a\"\nmesh = \"cube.obj\"\nmaterial = \"m\"\n\
         [[part]]\nname = \"b\"\nmesh = \"plate.obj\"\nmaterial = \"M\"\nat = [5000, 0, 0]\n\
         [[part]]\nname = \"c\"\nmesh = \"plate.obj\"\nmaterial = \"m\"\nat = [0, 3000, 0]\n\
         measured = \"10 kg ± 50 g (k=1)\"\n",
    );
    close(
        u.mass_kg.standard,
        (10.1_f64.powi(2) + 0.05_f64.powi(2)).sqrt(),
        1e-12,
    );
    let names: Vec<&str> = u.sources.iter().map(|s| s.source.as_str()).collect();
    assert_eq!(names, ["density of m", "measured mass of c"]);
    let (_, u) = uncertainty("[[part]]\nmesh = \"cube.obj\"\nmaterial = \"al-6061\"\n");
    close(u.mass_kg.standard, 27.0 / 3.0_f64.sqrt(), 1e-9);
}

/// One entry is one variable, unless each repeat is said to be off by itself.
#[test]
fn repeats_share_or_not() {
    let item = "[[item]]\nname = \"nozzle\"\nmass = \"38 g ± 2 g (k=1)\"\ncount = 16\n";
    let (_, shared) = uncertainty(item);
    close(shared.mass_kg.standard, 0.032, 1e-15);
    assert_eq!(shared.sources.len(), 1);
    let (_, apart) = uncertainty(&format!("{item}each = \"independent\"\n"));
    close(apart.mass_kg.standard, 0.008, 1e-15);
    assert_eq!(apart.sources.len(), 16);
    assert_eq!(apart.sources[15].source, "mass of nozzle#16");
}

/// A group's place and turn take all in it along. Two items of 1 kg at x = ±1 m in a group that
/// is turned by 90 deg ± 0.01 rad: each moves by 1 m × 0.01 sideways, the centre not at all; at
/// x = 1 and 3 m it moves by 0.02.
#[test]
fn groups_move_as_one() {
    let group = |a: i32, b: i32| {
        uncertainty(&format!(
            "[[group]]\nname = \"g\"\nat = [\"0 mm ± 3 mm (k=1)\", 0, 0]\n\
             turn = {{ axis = \"z\", angle = \"90 deg ± 0.57295779513 deg (k=1)\" }}\n\
             [[group.item]]\nname = \"a\"\nmass = \"1 kg\"\nat = [{a}, 0, 0]\n\
             [[group.item]]\nname = \"b\"\nmass = \"1 kg\"\nat = [{b}, 0, 0]\n"
        ))
        .1
    };
    let u = group(-1000, 1000).centre_of_mass_m;
    close(u.standard[0], 0.003, 1e-12);
    assert_eq!(u.standard[1], 0.0);
    // Turned to y = 2 m, the group's turn moves the centre along x.
    let u = group(1000, 3000);
    let x = (0.003_f64.powi(2) + 0.02_f64.powi(2)).sqrt();
    close(u.centre_of_mass_m.standard[0], x, 1e-12);
    assert_eq!(u.sources.len(), 2);
    // Of the inertia, yy alone stays nearly; xx about z turns: d(Ixy) = (Iyy − Ixx) dθ = ∓2 × 0.01.
    let i = u.inertia_kg_m2.unwrap().standard;
    close(i[0][1], 0.02, 1e-10);
    close(i[2][2], 0.0, 1e-12);
}

/// Sizes of items: a box of 2 kg with side a = 600 mm ± 6 mm has ∫x² = m a²/12, so the moment yy
/// is off by m a δ/6.
#[test]
fn sizes_of_items() {
    let (_, u) = uncertainty(
        "[[item]]\nname = \"b\"\nmass = \"2 kg\"\nbox = [\"600 mm ± 6 mm (k=1)\", 100, 200]\n",
    );
    let i = u.inertia_kg_m2.unwrap().standard;
    close(i[1][1], 2.0 * 0.6 * 0.006 / 6.0, 1e-15);
    assert_eq!(i[0][0], 0.0);
    assert_eq!(u.mass_kg.standard, 0.0);
    let (_, u) = uncertainty(
        "[[item]]\nname = \"m\"\nmass = \"2 kg\"\n\
         inertia = { xx = \"1 kg m2 ± 0.1 kg m2 (k=1)\", yy = \"1.2 kg m2\", zz = \"1.5 kg m2\" }\n",
    );
    let i = u.inertia_kg_m2.unwrap().standard;
    close(i[0][0], 0.1, 1e-15);
    assert_eq!([i[1][1], i[2][2], i[0][1]], [0.0; 3]);
}

/// Nothing that is off: nothing is computed. Something of no mass has a tolerance all the same.
#[test]
fn nothing_stated_and_nothing_there() {
    let (b, _) = Bench::new().of(&format!("{HEAD}[[item]]\nname = \"a\"\nmass = \"1 kg\"\n"));
    assert_eq!(b.uncertainty, None);
    let (_, u) = uncertainty(
        "[[item]]\nname = \"a\"\nmass = \"1 kg\"\n\
         [[item]]\nname = \"b\"\nmass = \"0 kg ± 30 g (k=1)\"\nat = [2000, 0, 0]\n",
    );
    close(u.mass_kg.standard, 0.03, 1e-15);
    close(u.centre_of_mass_m.standard[0], 0.06, 1e-15);
}

/// 3 % ± 1 % of paint on the cube, and 2 kg of harness over cube and plate, where they are.
#[test]
fn smears_lie_on_what_they_cover() {
    let (b, u) = uncertainty(
        "[material.m]\ndensity = \"1000 kg/m3\"\n\
         [[part]]\nname = \"frame/a\"\nmesh = \"cube.obj\"\nmaterial = \"m\"\n\
         [[part]]\nname = \"plate\"\nmesh = \"plate.obj\"\nmaterial = \"m\"\nat = [5000, 0, 0]\n\
         [[smear]]\nname = \"paint\"\nof = \"frame*\"\nmass = \"3 % ± 1 % (k=1)\"\n\
         [[smear]]\nof = \"*\"\nmass = \"2 kg ± 0.5 kg (k=1)\"\n",
    );
    let paths: Vec<&str> = b.parts.iter().map(|p| p.path.as_str()).collect();
    assert_eq!(paths, ["frame/a", "plate", "paint", "smear of *"]);
    close(b.parts[2].mass_kg, 30.0, 1e-12);
    assert_eq!(b.parts[2].centre_of_mass_m, Some([0.5; 3]));
    // (1000·0.5 + 10·5.5)/1010 along x.
    close(
        b.parts[3].centre_of_mass_m.unwrap()[0],
        555.0 / 1010.0,
        1e-13,
    );
    close(b.total.as_ref().unwrap().mass_kg, 1042.0, 1e-10);
    close(u.mass_kg.standard, 10.0_f64.hypot(0.5), 1e-12);
    assert_eq!(b.parts[2].basis, Basis::Stated);
    let faults = bench().faults(&format!(
        "{HEAD}[[item]]\nname = \"a\"\nmass = \"1 kg\"\n[[smear]]\nof = \"b*\"\nmass = \"3 %\"\n"
    ));
    assert_eq!(faults[0].kind, Kind::UnknownName);
    assert!(faults[0].advice.contains("`a`"), "{}", faults[0].advice);
}

/// 100 kg of basic mass, of which 60 may grow by 15 % and 40 by 5 %: predicted 111 kg, and a limit
/// of 110 kg is broken though the basic mass keeps it.
#[test]
fn growth_allowances() {
    let (b, u) = uncertainty(
        "[allowance]\nlayout = \"15 %\"\nreleased = \"5 %\"\n\
         [[item]]\nname = \"a\"\nmass = \"60 kg\"\nmaturity = \"layout\"\nat = [1000, 0, 0]\n\
         [[item]]\nname = \"b\"\nmass = \"40 kg\"\nmaturity = \"released\"\n\
         [[limit]]\nmass = { to = \"110 kg\" }\n",
    );
    let growth = b.growth.as_ref().unwrap();
    close(growth.basic.mass_kg, 100.0, 1e-12);
    close(growth.predicted.mass_kg, 111.0, 1e-12);
    close(growth.allowance_kg, 11.0, 1e-12);
    close(growth.predicted.centre_of_mass_m[0], 69.0 / 111.0, 1e-13);
    // Two points 1 m apart: I = m₁m₂/(m₁ + m₂).
    close(growth.basic.inertia_kg_m2[1][1], 24.0, 1e-12);
    close(
        growth.predicted.inertia_kg_m2[1][1],
        69.0 * 42.0 / 111.0,
        1e-12,
    );
    close(growth.by_maturity[1].predicted_mass_kg, 42.0, 1e-12);
    assert_eq!(b.total.as_ref().unwrap().mass_kg, 100.0);
    let limit = &b.limits[0];
    assert_eq!((limit.verdict, limit.basic), (Verdict::Broken, Some(100.0)));
    close(limit.margin, -1.0, 1e-12);
    assert_eq!(b.exit(), 1);
    // It may grow by anything from nothing to the whole allowance.
    assert_eq!((u.mass_kg.low_95, u.mass_kg.high_95), (100.0, 111.0));
    // Any part of each allowance is as likely as any other: 9 kg and 2 kg over 100 kg.
    close(
        limit.probability.unwrap(),
        1.0 - 1.0 / (2.0 * 9.0 * 2.0),
        1e-5,
    );
    let faults = Bench::new().faults(&format!(
        "{HEAD}[allowance]\nlayout = \"15 %\"\n\
         [[item]]\nname = \"a\"\nmass = \"1 kg\"\nmaturity = \"layuot\"\n"
    ));
    assert_eq!(faults[0].kind, Kind::UnknownName);
    assert!(faults[0].advice.contains("layout"));
}

/// The bound of an open mesh that is accepted counts as a source, and what nothing bounds is null.
#[test]
fn accepted_open_meshes() {
    let mut open = block("open", [0.0; 3], [1e3; 3]);
    open.refused = true;
    let mut bench = Bench::new().mesh("open.obj", vec![open]);
    let (b, warned) = bench.of(&format!(
        "{HEAD}[material.m]\ndensity = \"1000 kg/m3\"\n\
         [[part]]\nmesh = \"open.obj\"\nmaterial = \"m\"\naccept-open = \"2 %\"\n"
    ));
    assert!(warned.is_empty());
    let u = b.uncertainty.unwrap();
    close(u.mass_kg.standard, 10.0 / 3.0_f64.sqrt(), 1e-9);
    close(u.centre_of_mass_m.standard[2], 0.02 / 3.0_f64.sqrt(), 1e-12);
    assert_eq!(u.inertia_kg_m2, None);
}

/// Draws agree with propagation, limit by limit.
#[test]
fn draws_of_an_assembly() {
    let bench = bench();
    bench.put(
        "it.toml",
        &format!(
            "{HEAD}[material.m]\ndensity = \"1000 kg/m3 ± 2 %\"\n\
             [[part]]\nmesh = \"cube.obj\"\nmaterial = \"m\"\n\
             [[item]]\nname = \"a\"\nmass = \"60 kg ± 2 kg\"\nat = [\"1 m ± 5 mm\", 0, 0]\n\
             [[smear]]\nof = \"cube\"\nmass = \"1 % ± 0.5 %\"\n\
             [[limit]]\nmass = {{ to = \"1075 kg\" }}\ncentre.x = {{ from = 528 }}\n"
        ),
    );
    let loaded = bench.load("it.toml").unwrap();
    let mut bench = bench;
    let resolved = resolve(&loaded, &mut bench).unwrap();
    let n = 20_000;
    let b = balance_with(
        &loaded,
        &resolved,
        Some(Sampling { n, seed: 1 }),
        crate::progress::Progress::NONE,
    )
    .unwrap();
    let u = b.uncertainty.unwrap();
    let s = u.sampled.unwrap();
    close(s.mass_kg.standard / u.mass_kg.standard, 1.0, 0.02);
    close(s.mass_kg.low_95, u.mass_kg.low_95, 0.1 * u.mass_kg.standard);
    for k in 0..3 {
        let linear = u.centre_of_mass_m.standard[k];
        close(
            s.centre_of_mass_m.standard[k],
            linear,
            0.02 * linear + 1e-12,
        );
    }
    for (limit, drawn) in b.limits.iter().zip(&s.limits) {
        let p = limit.probability.unwrap();
        assert!(p > 0.05 && p < 0.95, "{limit:?}");
        close(drawn.probability, p, 0.02);
    }
}

/// The greatest mass is held against the predicted mass, the least against the basic one.
#[test]
fn growth_fills_no_lower_limit() {
    let file = |limit: &str| {
        format!(
            "{HEAD}[allowance]\nnew = \"15 %\"\n[[item]]\nname = \"a\"\nmass = \"10 kg\"\n\
             maturity = \"new\"\n[[limit]]\n{limit}\n"
        )
    };
    let judged = |limit: &str| Bench::new().of(&file(limit)).0.limits[0].clone();
    let least = judged("mass = { from = \"11 kg\" }");
    assert_eq!((least.verdict, least.value), (Verdict::Broken, 10.0));
    let most = judged("mass = { to = \"11 kg\" }");
    assert_eq!((most.verdict, most.basic), (Verdict::Broken, Some(10.0)));
    close(most.value, 11.5, 1e-12);
    let both = judged("mass = { from = \"10.5 kg\", to = \"12 kg\" }");
    assert_eq!((both.verdict, both.value), (Verdict::Broken, 10.0));
}
