//! Faults of single values: quantities, units, types, limits, tensors.

use super::*;

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
