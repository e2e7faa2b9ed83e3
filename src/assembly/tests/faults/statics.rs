//! Supports, hooks and the limits that stand on them.

use super::*;

#[test]
fn statics_and_their_limits() {
    let l = |text: &str| format!("{ITEM}[[limit]]\n{text}\n");
    fault(&l("centre = {}"), Kind::Usage, 7, &["centre.x"]);
    fault(&l("name = \"x\""), Kind::Usage, 6, &["mass"]);
    fault(&l("station = { from = 1 }"), Kind::Usage, 7, &["along"]);
    fault(
        &l("percent = { start = [0,0,0], end = [0,0,0], to = \"1 %\" }"),
        Kind::BadNumber,
        7,
        &["nothing"],
    );
    fault(
        &l("distance = { to = 1 }"),
        Kind::Usage,
        7,
        &["from nothing"],
    );
    fault(
        &l("distance = { point = [0,0,0], plane = { normal = \"x\" }, to = 1 }"),
        Kind::Usage,
        7,
        &["several"],
    );
    fault(
        &l(
            "envelope = { along = \"x\", outline = [[\"1 kg\", 0], [\"2 kg\", 1], [\"2 kg\", 0], [\"1 kg\", 1]] }",
        ),
        Kind::BadNumber,
        7,
        &["meets"],
    );
    fault(
        &l("ratio = { moments = [1, 1], to = \"1 %\" }"),
        Kind::BadNumber,
        7,
        &["different"],
    );
    fault(
        &l("tip = { from = \"20 deg\" }"),
        Kind::Usage,
        7,
        &["supports"],
    );
    fault(
        &l("unbalance = { along = \"x\", planes = [1, 1], speed = \"1 rpm\", grade = \"G 1\" }"),
        Kind::BadNumber,
        7,
        &["one place"],
    );
    fault(
        &l("unbalance = { along = \"x\", planes = [1, 2], speed = \"1\", grade = \"G 1\" }"),
        Kind::BadNumber,
        7,
        &["rpm"],
    );
    let s = |at: &str| format!("[[support]]\nname = \"{at}\"\nat = {at}\n");
    let line = s("[0, 0, 0]") + &s("[1, 0, 0]") + &s("[2, 0, 0]");
    fault(&format!("{ITEM}{line}"), Kind::Usage, 6, &["one line"]);
    fault(
        &format!("{ITEM}{}", s("[0, 0, 0]")),
        Kind::Usage,
        6,
        &["three"],
    );
    let stand = s("[0, 0, 0]") + &s("[1, 0, 0]") + &s("[0, 1, 0]") + &s("[1, 1, 0]");
    fault(
        &format!(
            "{stand}{}",
            l("reaction = { support = \"q\", to = \"1 N\" }")
        ),
        Kind::UnknownName,
        19,
        &["the supports are"],
    );
    fault(
        &format!(
            "{stand}{}",
            l("reaction = { support = \"[0, 0, 0]\", to = \"1 N\" }")
        ),
        Kind::Usage,
        19,
        &["4"],
    );
    fault(&format!("{ITEM}[hang]\n"), Kind::Usage, 6, &["hook"]);
    fault(
        &format!("{ITEM}[hang]\nhook = [0,0,1]\n[[hang.line]]\nname = \"a\"\nat = [0,0,0]\n"),
        Kind::Usage,
        6,
        &["two to four"],
    );
}
