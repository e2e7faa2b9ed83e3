//! Supports, lines and the limits that come of them, read from a file.

use super::*;
use crate::limits::Verdict;

const FEET: &str = r#"
[assembly]
unit = "m"
[[item]]
name = "load"
mass = "100 kg"
at = [1.5, 0.8, 1.2]
[[support]]
name = "a"
at = [0, 0, 0]
[[support]]
name = "b"
at = [4, 0, 0]
[[support]]
name = "c"
at = [1, 3, 0]
"#;

#[test]
fn reactions_tipping_and_their_limits() {
    let text = format!(
        "{FEET}\n[[limit]]\nname = \"slope\"\ntip = {{ from = \"33.7 deg\" }}\n\
         [[limit]]\nreaction = {{ support = \"b\", from = \"302 N\", to = \"303 N\" }}\n\
         [hang]\nhook = [1.5, 0.4, 1.6]\n"
    );
    let (b, warned) = Bench::new().of(&text);
    assert_eq!(kinds(&warned), Vec::<&str>::new());
    let r = b.statics.reactions.unwrap();
    let weight = 980.665;
    for (row, (name, share)) in r
        .iter()
        .zip([("a", 0.425), ("b", 0.925 / 3.0), ("c", 0.8 / 3.0)])
    {
        assert_eq!(row.support, name);
        near(row.force_n.unwrap(), share * weight);
        near(row.most_n.unwrap(), share * weight);
    }
    let tip = b.statics.tip.unwrap();
    assert_eq!(tip[0].edge, "a to b");
    near(tip[0].margin_m, 0.8);
    near(
        tip[0].angle_deg.unwrap(),
        (0.8_f64 / 1.2).atan().to_degrees(),
    );
    assert_eq!(b.statics.tip_by_direction.unwrap().len(), 24);
    // atan(0.8/1.2) = 33.69°; edge c–a is 1.17 m away.
    assert_eq!(
        (b.limits[0].quantity, b.limits[0].verdict),
        ("tip", Verdict::Broken)
    );
    assert_eq!(
        (b.limits[1].quantity, b.limits[1].verdict),
        ("reaction", Verdict::Holds)
    );
    let hang = b.statics.hang.unwrap().unwrap();
    near(hang.attitude.lean_deg, 45.0);
    assert!(hang.lines.is_empty());
}

#[test]
fn what_tips_is_said() {
    let text = FEET.replace("at = [1.5, 0.8, 1.2]", "at = [1.5, -0.8, 1.2]");
    let mut bench = Bench::new();
    bench.put("it.toml", &text);
    let (b, _) = bench.balance("it.toml").unwrap();
    assert_eq!(b.warnings[0].kind, "tips");
    let r = b.statics.reactions.unwrap();
    assert!(r[2].force_n.unwrap() < 0.0 && r[0].least_n.is_none());
}

#[test]
fn every_limit_has_its_value() {
    let text = format!(
        "{FEET}[[limit]]\nname = \"all\"\n\
         station = {{ datum = [1, 0, 0], along = \"x\", from = 0.4, to = 0.6 }}\n\
         percent = {{ start = [1, 0, 0], end = [3, 0, 0], to = \"24 %\" }}\n\
         distance = {{ line = {{ at = [1.5, 0, 0], along = \"z\" }}, to = 0.9 }}\n\
         envelope = {{ along = \"y\", outline = [[\"90 kg\", 0.5], [\"110 kg\", 0.9], [\"110 kg\", 2], [\"90 kg\", 2]] }}\n\
         inertia = {{ about = [1.5, 0, 1.2], xx = {{ to = \"64 kg m2\" }} }}\n\
         unbalance = {{ at = [1.5, 0.8, 0], along = \"z\", planes = [0, 2], speed = \"3000 rpm\", grade = \"G 6.3\" }}\n"
    );
    let (b, _) = Bench::new().of(&text);
    let got: Vec<_> = b
        .limits
        .iter()
        .map(|l| (l.quantity, l.value, l.verdict))
        .collect();
    let want = [
        ("station", 0.5, Verdict::Holds),
        ("percent", 0.25, Verdict::Broken),
        ("distance.line", 0.8, Verdict::Holds),
        ("mass", 100.0, Verdict::Holds),
        ("envelope", 0.8, Verdict::Holds),
        ("inertia.xx", 64.0, Verdict::Holds),
        ("unbalance.a", 0.0, Verdict::Holds),
        ("unbalance.b", 0.0, Verdict::Holds),
    ];
    assert_eq!(got.len(), want.len());
    for (g, w) in got.iter().zip(want) {
        assert_eq!((g.0, g.2), (w.0, w.2));
        assert!((g.1 - w.1).abs() < 1e-12, "{g:?} {w:?}");
    }
    near(b.limits[4].from.unwrap(), 0.7);
    // G 6.3, 100 kg, 3000 rpm: 2005.352 g mm in all, of which 0.4 and 0.6 by the lever rule.
    assert!((b.limits[6].to.unwrap() * 1e6 - 0.4 * 2005.352).abs() < 5e-4);
    assert!((b.limits[7].to.unwrap() * 1e6 - 0.6 * 2005.352).abs() < 5e-4);
}

/// Three wheels on scales: 475 lb at station 55, 1046 and 1040 lb at 121 in: 2561 lb at 108.75869 in
/// (inputs of a published weighing example, answer by hand).
#[test]
fn scales_under_three_wheels() {
    let wheels = r#"
[assembly]
unit = "in"
[[item]]
name = "model"
mass = "2570 lb"
at = [108, 0, 30]
[[support]]
name = "nose"
at = [55, 0, 0]
[[support]]
name = "left"
at = [121, 40, 0]
[[support]]
name = "right"
at = [121, -40, 0]
[[weighing]]
loads = { nose = "475 lb ± 1 lb (k=1)", left = "1046 lb ± 1 lb (k=1)", right = "1040 lb ± 1 lb (k=1)" }
"#;
    let (b, _) = Bench::new().of(wheels);
    let w = b.statics.weighing.unwrap();
    let (lb, inch) = (0.45359237, 0.0254);
    near(w.mass_kg, 2561.0 * lb);
    near(w.mass_standard_kg, 3.0_f64.sqrt() * lb);
    assert!((w.centre_m[0] / inch - 108.75869).abs() < 5e-6);
    near(w.centre_m[1], 40.0 * 6.0 / 2561.0 * inch);
    near(w.model_mass_off_kg, 9.0 * lb);
    assert!((w.model_centre_off_m[0] / inch - (108.0 - 108.75869)).abs() < 5e-6);
    // The scales say nothing of the height.
    assert_eq!(w.free.map(|f| f[2].abs()), Some(1.0));
    assert_eq!(w.model_centre_off_m[2], 0.0);
    let faults = Bench::new().faults(&wheels.replace("nose = \"475", "nosse = \"475"));
    assert_eq!(faults[0].kind, crate::error::Kind::UnknownName);
}

/// The same thing weighed level and nose up: the height too. Loads by the balance of moments about
/// the line of two supports, worked out for a mass of 100 kg at (1.5, 0.8, 1.2) m.
#[test]
fn two_attitudes_give_the_height() {
    let tilt = Vector3::new(0.3, 0.0, 1.0).normalize();
    let stand = crate::statics::Stand::new(
        [[0.0, 0.0, 0.0], [4.0, 0.0, 0.0], [1.0, 3.0, 0.0]]
            .iter()
            .zip(["a", "b", "c"])
            .map(|(at, name)| crate::statics::Support {
                name: name.into(),
                at: Vector3::from(*at),
            })
            .collect(),
        tilt,
    )
    .unwrap();
    let loads = stand.reactions(&Vector3::new(1.5, 0.8, 1.2), 100.0);
    let loads: Vec<String> = loads
        .reactions
        .iter()
        .map(|r| format!("{} = \"{} kg\"", r.support, r.force.unwrap()))
        .collect();
    let text = format!(
        "{FEET}\n[[weighing]]\nloads = {{ a = \"42.5 kg\", b = \"{} kg\", c = \"{} kg\" }}\n\
         [[weighing]]\nup = [0.3, 0, 1]\nloads = {{ {} }}\n",
        92.5 / 3.0,
        80.0 / 3.0,
        loads.join(", ")
    );
    let (b, _) = Bench::new().of(&text);
    let w = b.statics.weighing.unwrap();
    assert_eq!(w.free, None);
    for (k, want) in [1.5, 0.8, 1.2].into_iter().enumerate() {
        assert!((w.centre_m[k] - want).abs() < 1e-9, "{w:?}");
        assert!(w.model_centre_off_m[k].abs() < 1e-9, "{w:?}");
    }
}
