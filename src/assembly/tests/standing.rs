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
