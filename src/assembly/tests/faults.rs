//! Every fault with its kind, its line, and the words that help.

mod files;
mod statics;
mod values;

use super::*;

fn bench() -> Bench {
    Bench::new().mesh("rover.obj", vec![block("frame", [0.0; 3], [1.0; 3])])
}

/// The text after `[assembly]` and `unit` (lines 1 and 2), the kind, the line, and words that
/// message or advice must hold.
#[track_caller]
fn fault(text: &str, kind: Kind, line: u64, words: &[&str]) {
    let text = format!("[assembly]\nunit = \"mm\"\n{text}");
    let errors = bench().faults(&text);
    let [error] = errors.as_slice() else {
        panic!("{errors:#?}");
    };
    assert_eq!((error.kind, error.line), (kind, Some(line)), "{error:#?}");
    assert!(
        error.path.as_ref().is_some_and(|p| p.ends_with("it.toml")),
        "{error:#?}"
    );
    let all = format!("{} {}", error.message, error.advice);
    for word in words {
        assert!(all.contains(word), "`{word}` is not in: {all}");
    }
}

const PART: &str =
    "[[part]]\nname = \"f\"\nmesh = \"rover.obj#frame\"\nmaterial = \"steel S235\"\n";
const ITEM: &str = "[[item]]\nname = \"i\"\nmass = \"1 kg\"\n";

#[test]
fn keys() {
    fault(
        &format!("{PART}matrial = \"x\"\n"),
        Kind::UnknownKey,
        7,
        &["matrial", "`material`"],
    );
    fault(
        &format!("{ITEM}qqqqqqq = 1\n"),
        Kind::UnknownKey,
        6,
        &["the keys here are"],
    );
    fault(
        &format!("{ITEM}turn = {{ axis = \"z\", angl = \"1 deg\", angle = \"1 deg\" }}\n"),
        Kind::UnknownKey,
        6,
        &["`angle`"],
    );
    fault(
        &format!("{ITEM}mirror = \"x\"\n"),
        Kind::UnknownKey,
        6,
        &["mirror"],
    );
}

#[test]
fn missing() {
    fault("[[part]]\nname = \"f\"\n", Kind::Usage, 3, &["`mesh`"]);
    fault("[[item]]\nname = \"f\"\n", Kind::Usage, 3, &["`mass`"]);
    fault("[[item]]\nmass = \"1 kg\"\n", Kind::Usage, 3, &["`name`"]);
    fault("[[group]]\n", Kind::Usage, 3, &["`name`"]);
    fault(
        &format!("{ITEM}[[assign]]\nmaterial = \"steel S235\"\n"),
        Kind::Usage,
        6,
        &["body", "part"],
    );
    fault(
        &format!("{ITEM}[[assign]]\nbody = \"*\"\n"),
        Kind::Usage,
        6,
        &["material"],
    );
    fault(
        &format!("{ITEM}[material.x]\n"),
        Kind::Usage,
        6,
        &["density"],
    );
    fault(
        &format!("{ITEM}[[limit]]\nname = \"n\"\n"),
        Kind::Usage,
        6,
        &["mass", "centre"],
    );
    fault(
        &format!("{ITEM}[[limit]]\nmass = {{}}\n"),
        Kind::Usage,
        7,
        &["from", "to"],
    );
    fault(
        &format!("{ITEM}turn = {{ axis = \"z\" }}\n"),
        Kind::Usage,
        6,
        &["angle"],
    );
    fault(
        &format!("{ITEM}cylinder = {{ radius = 1 }}\n"),
        Kind::Usage,
        6,
        &["height"],
    );
    fault(
        &format!("{ITEM}inertia = {{ xx = \"1 kg m2\", yy = \"1 kg m2\" }}\n"),
        Kind::Usage,
        6,
        &["zz"],
    );
    let errors = bench().faults("[assembly]\nunit = \"mm\"\n");
    assert_eq!((errors[0].kind, errors.len()), (Kind::Empty, 1));
    let errors =
        bench().faults("[assembly]\nunit = \"mm\"\n[[item]]\nname = \"i\"\nmass = \"0 kg\"\n");
    assert_eq!((errors[0].kind, errors.len()), (Kind::Empty, 1));
}

#[test]
fn names() {
    fault(
        "[[part]]\nmesh = \"rover.stl\"\nmaterial = \"steel S235\"\n",
        Kind::NotFound,
        4,
        &["rover.stl", "`rover.obj`"],
    );
    fault(
        "[[part]]\nmesh = \".\"\nmaterial = \"steel S235\"\n",
        Kind::NotFound,
        4,
        &["folder"],
    );
    fault(
        "[[part]]\nmesh = \"rover.obj#\"\nmaterial = \"steel S235\"\n",
        Kind::Usage,
        4,
        &["#"],
    );
    fault(
        "[[part]]\nmesh = \"rover.obj#wheel\"\nmaterial = \"steel S235\"\n",
        Kind::NotFound,
        4,
        &["wheel", "`frame`"],
    );
    fault(
        &PART.replace("S235", "S253"),
        Kind::UnknownName,
        6,
        &["steel S253", "did you mean"],
    );
    fault(
        &format!(
            "{}[material.\"trim alloy\"]\ndensity = \"2700 kg/m3\"\n",
            PART.replace("steel S235", "trim aloy")
        ),
        Kind::UnknownName,
        6,
        &[
            "did you mean `trim alloy`",
            "own materials are `trim alloy`",
        ],
    );
    fault(
        &PART.replace("S235", "S253"),
        Kind::UnknownName,
        6,
        &["`bismar materials`"],
    );
    fault(
        &format!(
            "{ITEM}[material.alu]\ndensity = \"2 g/cm3\"\n[material.ALU]\ndensity = \"2 g/cm3\"\n"
        ),
        Kind::AmbiguousName,
        8,
        &["case"],
    );
    fault(
        &format!("{ITEM}{ITEM}"),
        Kind::AmbiguousName,
        6,
        &["line 3"],
    );
    fault(
        &format!("{ITEM}count = 2\n[[item]]\nname = \"i#2\"\nmass = \"1 kg\"\n"),
        Kind::AmbiguousName,
        7,
        &["i#2", "line 3"],
    );
    fault(
        "[[part]]\nname = \"f\"\nmesh = \"rover.obj\"\n",
        Kind::UnknownName,
        3,
        &["no material", "`frame`"],
    );
}

#[test]
fn all_at_once_in_line_order() {
    let errors = bench().faults(
        "[assembly]\nname = \"x\"\n[[item]]\nname = \"i\"\nmass = 3\nboxx = [1, 1, 1]\n\
         [[part]]\nmesh = \"none.stl\"\nmaterial = \"stel\"\n[[limit]]\nmass = { to = 9 }\n",
    );
    let found: Vec<_> = errors.iter().map(|e| (e.line.unwrap(), e.kind)).collect();
    let wanted = [
        (1, Kind::Unit),
        (5, Kind::Unit),
        (6, Kind::UnknownKey),
        (8, Kind::NotFound),
        (9, Kind::UnknownName),
        (11, Kind::Unit),
    ];
    assert_eq!(found, wanted, "{errors:#?}");
}
