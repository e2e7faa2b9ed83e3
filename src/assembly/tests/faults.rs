//! Every fault with its kind, its line, and the words that help.

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
        &format!("{ITEM}[[support]]\nname = \"t\"\n"),
        Kind::UnknownKey,
        6,
        &["this version"],
    );
    fault(
        &format!("{ITEM}[hang]\n"),
        Kind::UnknownKey,
        6,
        &["this version"],
    );
    fault(
        &format!("{PART}[part.made]\nwall = 1\n"),
        Kind::UnknownKey,
        7,
        &["this version"],
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
fn quantities() {
    fault(
        "[[item]]\nname = \"i\"\nmass = 4\n",
        Kind::Unit,
        5,
        &["mass"],
    );
    fault(
        "[[item]]\nname = \"i\"\nmass = \"4 mm\"\n",
        Kind::Unit,
        5,
        &["mass"],
    );
    fault(
        "[[item]]\nname = \"i\"\nmass = \"-4 kg\"\n",
        Kind::BadNumber,
        5,
        &["mass"],
    );
    fault(
        "[[item]]\nname = \"i\"\nmass = \"four kg\"\n",
        Kind::BadNumber,
        5,
        &["mass"],
    );
    fault(
        "[[item]]\nname = \"i\"\nmass = [1]\n",
        Kind::BadNumber,
        5,
        &["a list"],
    );
    fault(
        &format!("{ITEM}at = [0, 0]\n"),
        Kind::BadNumber,
        6,
        &["a list of 2"],
    );
    fault(
        &format!("{ITEM}at = [0,\n 0,\n nan]\n"),
        Kind::BadNumber,
        8,
        &["not finite"],
    );
    fault(
        &format!("{ITEM}at = [0, 0, \"3 kg\"]\n"),
        Kind::Unit,
        6,
        &["at"],
    );
    fault(
        &format!("{ITEM}turn = {{ axis = \"z\", angle = 90 }}\n"),
        Kind::Unit,
        6,
        &["angle"],
    );
    fault(
        &format!("{ITEM}turn = {{ axis = [0, 0, 0], angle = \"9 deg\" }}\n"),
        Kind::BadNumber,
        6,
        &["axis"],
    );
    fault(
        &format!("{PART}mirror = \"w\"\n"),
        Kind::BadNumber,
        7,
        &["mirror"],
    );
    fault(
        &format!("{PART}measured = \"0 kg\"\n"),
        Kind::BadNumber,
        7,
        &["measured"],
    );
    fault(
        &format!("{ITEM}count = 0\n"),
        Kind::BadNumber,
        6,
        &["count"],
    );
    fault(
        &format!("{ITEM}count = 1.5\n"),
        Kind::BadNumber,
        6,
        &["count"],
    );
    fault(&format!("{ITEM}places = []\n"), Kind::Usage, 6, &["places"]);
    fault(
        &format!("{ITEM}places = [[0, 0, 0]]\ncount = 2\n"),
        Kind::Usage,
        7,
        &["count"],
    );
    fault(
        &format!("{ITEM}at = [0, 0, 0]\nplaces = [[0, 0, 0]]\n"),
        Kind::Usage,
        7,
        &["at"],
    );
    fault(
        &format!("{ITEM}box = [1, 0, 1]\n"),
        Kind::BadNumber,
        6,
        &["box"],
    );
    fault(
        &format!("{ITEM}sphere = -1\n"),
        Kind::BadNumber,
        6,
        &["sphere"],
    );
    fault(
        &format!("{ITEM}sphere = 1\nbox = [1, 1, 1]\n"),
        Kind::Usage,
        3,
        &["sphere", "box"],
    );
    fault(
        &format!("{ITEM}each = \"alone\"\n"),
        Kind::Usage,
        6,
        &["independent"],
    );
    fault(
        &format!("{ITEM}[material.x]\ndensity = \"0 kg/m3\"\n"),
        Kind::BadNumber,
        7,
        &["density"],
    );
    fault(
        &format!("{ITEM}[material.x]\ndensity = 7850\n"),
        Kind::Unit,
        7,
        &["density"],
    );
}

#[test]
fn types_and_globs() {
    fault(
        &format!("{ITEM}turn = 4\n"),
        Kind::Usage,
        6,
        &["a table", "a number"],
    );
    fault("[part]\nname = \"f\"\n", Kind::Usage, 3, &["[[part]]"]);
    fault(
        "[[item]]\nname = 4\nmass = \"1 kg\"\n",
        Kind::Usage,
        4,
        &["a text"],
    );
    fault(
        "[[item]]\nname = \" \"\nmass = \"1 kg\"\n",
        Kind::Usage,
        4,
        &["empty"],
    );
    fault(
        &format!("{ITEM}[[assign]]\nbody = \"[\"\nmaterial = \"steel S235\"\n"),
        Kind::Usage,
        7,
        &["glob"],
    );
}

#[test]
fn limits() {
    let l = |text: &str| format!("{ITEM}[[limit]]\n{text}\n");
    fault(&l("mass = { to = 95 }"), Kind::Unit, 7, &["to"]);
    fault(
        &l("centre.x = { from = 3, to = -3 }"),
        Kind::BadNumber,
        7,
        &["exchange"],
    );
    fault(
        &l("mass = { to = \"9 kg ± 1 %\" }"),
        Kind::Usage,
        7,
        &["tolerance"],
    );
    fault(&l("centre.w = { to = 1 }"), Kind::UnknownKey, 7, &["`w`"]);
    fault(
        &l(
            "name = \"a\"\nmass = { to = \"9 kg\" }\n[[limit]]\nname = \"a\"\ncentre.x = { to = 1 }",
        ),
        Kind::AmbiguousName,
        9,
        &["line 6"],
    );
    fault(
        &l("mass = { to = \"9 kg\" }\n[[limit]]\nmass = { from = \"1 kg\" }"),
        Kind::AmbiguousName,
        8,
        &["mass"],
    );
}

#[test]
fn units() {
    let errors =
        bench().faults("[assembly]\nname = \"x\"\n[[item]]\nname = \"i\"\nmass = \"1 kg\"\n");
    assert_eq!(
        (errors[0].kind, errors[0].line, errors.len()),
        (Kind::Unit, Some(1), 1)
    );
    let errors = bench().faults("[[item]]\nname = \"i\"\nmass = \"1 kg\"\n");
    assert_eq!(
        (errors[0].kind, errors[0].line, errors.len()),
        (Kind::Unit, Some(1), 1)
    );
    let errors =
        bench().faults("[assembly]\nunit = \"mile\"\n[[item]]\nname = \"i\"\nmass = \"1 kg\"\n");
    assert_eq!(
        (errors[0].kind, errors[0].line, errors.len()),
        (Kind::Unit, Some(2), 1)
    );
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
fn inertia_that_no_body_has() {
    let inertia = |text: &str| format!("{ITEM}inertia = {{ {text} }}\n");
    let kg = |xx, yy, zz| format!("xx = \"{xx} kg m2\", yy = \"{yy} kg m2\", zz = \"{zz} kg m2\"");
    fault(
        &inertia(&kg(1, 1, 3)),
        Kind::ImpossibleInertia,
        6,
        &["zz ≤ xx + yy", "3 > 2"],
    );
    fault(
        &inertia(&kg(5, 1, 3)),
        Kind::ImpossibleInertia,
        6,
        &["xx ≤ yy + zz"],
    );
    fault(
        &inertia(&kg(-1, 1, 1)),
        Kind::ImpossibleInertia,
        6,
        &["xx is negative"],
    );
    let skew = format!("{}, xy = \"0.9 kg m2\"", kg(1, 1, 1));
    fault(
        &inertia(&skew),
        Kind::ImpossibleInertia,
        6,
        &["largest principal moment"],
    );
    let negative = format!("{}, xy = \"2 kg m2\"", kg(1, 1, 1));
    fault(
        &inertia(&negative),
        Kind::ImpossibleInertia,
        6,
        &["least principal moment"],
    );
    let massless = inertia(&kg(1, 1, 1)).replace("mass = \"1 kg\"", "mass = \"0 kg\"");
    fault(&massless, Kind::ImpossibleInertia, 6, &["no mass"]);
    // A plate and a rod stand on the edge of what is possible.
    for text in [kg(1, 2, 3), kg(1, 1, 0)] {
        bench().of(&format!("[assembly]\nunit = \"mm\"\n{}", inertia(&text)));
    }
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

#[test]
fn syntax() {
    let errors = bench().faults("[assembly]\nunit = \"mm\"\n[[item]]\nname = \nmass = 3\n");
    let found: Vec<_> = errors.iter().map(|e| (e.line.unwrap(), e.kind)).collect();
    assert_eq!(
        found,
        [(4, Kind::UnknownFormat), (5, Kind::Unit)],
        "{errors:#?}"
    );
    let bench = bench();
    bench.put("it.json", "{\n \"assembly\": {\n  \"unit\": mm }\n}");
    let errors = bench.load("it.json").unwrap_err();
    assert_eq!(
        (errors[0].kind, errors[0].line),
        (Kind::UnknownFormat, Some(3))
    );
    bench.put(
        "it.json",
        "{\"assembly\": {\"unit\": \"mm\"},\n \"assembly\": 1}",
    );
    let errors = bench.load("it.json").unwrap_err();
    assert_eq!(
        (errors[0].kind, errors[0].line),
        (Kind::UnknownFormat, Some(2))
    );
    bench.put(
        "it.json",
        "{\"assembly\":\n {\"unit\": \"mm\",\n \"nam\": \"x\"}}",
    );
    let errors = bench.load("it.json").unwrap_err();
    assert_eq!(
        (errors[0].kind, errors[0].line),
        (Kind::UnknownKey, Some(3))
    );
    for text in [
        "[1]",
        "{",
        "{\"a\":1",
        &"[".repeat(5000),
        &format!("{{\"a\":{}", "[".repeat(5000)),
    ] {
        bench.put("deep.json", text);
        bench.put("deep.toml", &format!("a = {text}"));
        assert!(bench.load("deep.json").is_err());
        assert!(bench.load("deep.toml").is_err());
    }
    std::fs::write(bench.dir.path().join("bytes.toml"), b"[assembly]\n\xff\xfe").unwrap();
    let errors = bench.load("bytes.toml").unwrap_err();
    assert_eq!(
        (errors[0].kind, errors[0].line),
        (Kind::UnknownFormat, Some(2))
    );
    let errors = bench.load("none.toml").unwrap_err();
    assert_eq!(errors[0].kind, Kind::NotFound);
}

#[test]
fn includes() {
    let bench = bench();
    let head = "[assembly]\nunit = \"mm\"\n";
    bench.put(
        "a.toml",
        &format!("{head}[[group]]\ninclude = \"sub/b.toml\"\n"),
    );
    bench.put(
        "sub/b.toml",
        &format!("{head}[[group]]\ninclude = \"../a.toml\"\n"),
    );
    let errors = bench.load("a.toml").unwrap_err();
    assert_eq!(
        (errors[0].kind, errors[0].line),
        (Kind::Cycle, Some(4)),
        "{errors:#?}"
    );
    assert!(
        errors[0].message.contains("a.toml → b.toml → a.toml"),
        "{errors:#?}"
    );
    assert!(errors[0].path.as_ref().unwrap().ends_with("sub/b.toml"));
    bench.put(
        "c.toml",
        &format!("{head}[[group]]\ninclude = \"d.toml\"\n"),
    );
    let errors = bench.load("c.toml").unwrap_err();
    assert_eq!((errors[0].kind, errors[0].line), (Kind::NotFound, Some(4)));
    assert!(errors[0].advice.contains("a.toml"));
    // Faults of both files together: the outer's first, then the inner's by line.
    bench.put(
        "e.toml",
        &format!("{head}x = 1\n[[group]]\ninclude = \"f.toml\"\n"),
    );
    bench.put("f.toml", "[[item]]\nname = \"i\"\nmass = 1\n");
    let errors = bench.load("e.toml").unwrap_err();
    let lines: Vec<_> = errors.iter().map(|e| e.line.unwrap()).collect();
    assert_eq!(lines, [3, 1, 3], "{errors:#?}");
    // Thirty-two files deep is read, one more is not.
    let chain = |n: usize| {
        for k in 0..n {
            let text = format!(
                "{head}[[group]]\nname = \"g\"\ninclude = \"n{}.toml\"\n",
                k + 1
            );
            bench.put(&format!("n{k}.toml"), &text);
        }
        bench.put(&format!("n{n}.toml"), &format!("{head}{ITEM}"));
        bench.load("n0.toml")
    };
    assert!(chain(DEEPEST).is_ok());
    let errors = chain(DEEPEST + 1).unwrap_err();
    assert_eq!(
        (errors[0].kind, errors.len()),
        (Kind::Cycle, 1),
        "{errors:#?}"
    );
    // Each includes the next twice: two to the thirtieth, and refused before memory is taken.
    for k in 0..30 {
        let group = |n: &str| format!("[[group]]\nname = \"{n}\"\ninclude = \"m{}.toml\"\n", k + 1);
        bench.put(
            &format!("m{k}.toml"),
            &format!("{head}{}{}", group("a"), group("b")),
        );
    }
    bench.put("m30.toml", &format!("{head}{ITEM}"));
    let errors = bench.load("m0.toml").unwrap_err();
    assert_eq!((errors[0].kind, errors.len()), (Kind::TooLarge, 1));
    let nest = "[[group]]\nname = \"g\"\ncount = 1000\n[[group.group]]\nname = \"h\"\ncount = 1000\n\
                [[group.group.item]]\nname = \"i\"\nmass = \"1 g\"\n";
    bench.put("o.toml", &format!("{head}{nest}"));
    assert_eq!(bench.load("o.toml").unwrap_err()[0].kind, Kind::TooLarge);
}

#[test]
fn open_bodies_and_broken_meshes() {
    let mut open = block("frame", [0.0; 3], [1.0; 3]);
    open.refused = true;
    let mut bench = Bench::new().mesh("rover.obj", vec![open, block("lid", [0.0; 3], [1.0; 3])]);
    let lid = PART.replace("frame", "lid").replace("\"f\"", "\"l\"");
    let (b, _) = bench.of(&format!(
        "[assembly]\nunit = \"mm\"\n{PART}{lid}[[limit]]\nmass = {{ to = \"1 t\" }}\n"
    ));
    assert_eq!(b.exit(), 2);
    let error = b.error.unwrap();
    assert_eq!((error.kind, error.line), (Kind::NotClosed, Some(5)));
    assert!(error.message.contains("4 open edges"));
    // The lid still gets its answer; nothing is said of the whole.
    assert_eq!(b.parts.len(), 1);
    assert_eq!(
        (b.parts[0].share_of_mass, b.total, b.limits.len()),
        (None, None, 0)
    );
    let mut bench = Bench::new();
    bench.put("rover.obj", "");
    let errors = bench.faults(&format!("[assembly]\nunit = \"mm\"\n{PART}{lid}"));
    assert_eq!((errors[0].kind, errors.len()), (Kind::Truncated, 1));
}
