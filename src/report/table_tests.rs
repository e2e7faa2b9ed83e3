//! Tables as they stand on paper.

use proptest::prelude::*;
use unicode_width::UnicodeWidthStr;

use super::{Cell, Column, Look, Mark, Table, wrapped};

fn sample() -> Table {
    let mut table = Table::new(vec![
        Column::text("part", "part"),
        Column::counts("triangles", "triangles"),
        Column::figures("mass_kg", "mass", "kg"),
        Column::text("verdict", "verdict"),
    ]);
    table.row(vec![
        Cell::text("frame"),
        Cell::count(1284),
        Cell::figure("12.345", 12.345_678),
        Cell::text("holds").marked(Mark::Pass),
    ]);
    table.row(vec![
        Cell::text("槽 left"),
        Cell::count(12),
        Cell::figure("0.5", 0.5),
        Cell::text("broken").marked(Mark::Fail),
    ]);
    table.total(vec![
        Cell::text("total"),
        Cell::count(1296),
        Cell::figure("12.846", 12.845_678),
    ]);
    table
}

#[test]
fn points_and_edges_are_aligned() {
    let expected = "\
part     triangles    mass  verdict
                        kg
-------  ---------  ------  -------
frame         1284  12.345  holds
槽 left         12   0.5    broken
-------  ---------  ------  -------
total         1296  12.846
";
    assert_eq!(sample().render(Look::default()), expected);
}

#[test]
fn colour_adds_nothing_but_colour() {
    let look = Look {
        width: None,
        colour: true,
    };
    let coloured = sample().render(look);
    assert!(coloured.contains("\u{1b}[1;31mbroken\u{1b}[0m"));
    let mut plain = String::new();
    let mut rest = coloured.as_str();
    while let Some((before, after)) = rest.split_once("\u{1b}[") {
        plain.push_str(before);
        rest = after.split_once('m').unwrap().1;
    }
    plain.push_str(rest);
    assert_eq!(plain, sample().render(Look::default()));
    assert!(!sample().render(Look::default()).contains('\u{1b}'));
}

#[test]
fn csv_is_full_and_harmless() {
    let mut table = sample();
    table.row(vec![
        Cell::text("=cmd()|x"),
        Cell::count(0),
        Cell::figure("-1.5e-7", -1.5e-7),
        Cell::text("a, \"b\"\u{1b}"),
    ]);
    table.row(vec![
        Cell::text("-bracket"),
        Cell::empty(),
        Cell::figure("n/a", f64::NAN),
    ]);
    let expected = "\
part,triangles,mass_kg,verdict
frame,1284,12.345678,holds
槽 left,12,0.5,broken
'=cmd()|x,0,-1.5e-7,\"a, \"\"b\"\"\\u{1b}\"
'-bracket,,,
";
    assert_eq!(table.csv().unwrap(), expected);
}

#[test]
fn long_names_wrap_and_narrow_terminals_get_blocks() {
    let mut table = sample();
    table.row(vec![Cell::text("spray tank bracket, rear left, printed")]);
    let look = |w| Look {
        width: Some(w),
        colour: false,
    };
    let text = table.render(look(50));
    assert!(text.lines().all(|l| l.width() <= 50), "{text}");
    for word in ["spray", "bracket,", "printed", "12.846"] {
        assert!(text.contains(word), "{text}");
    }
    let blocks = table.render(look(30));
    assert!(blocks.lines().all(|l| l.width() <= 30), "{blocks}");
    assert!(blocks.contains("mass [kg]  12.345"), "{blocks}");
    assert!(blocks.contains("broken"), "{blocks}");
}

proptest! {
    #[test]
    fn wrapping_loses_nothing(text in "\\PC{0,60}", width in 2..20_usize) {
        let lines = wrapped(&text, width);
        let keep = |t: &str| t.chars().filter(|c| *c != ' ').collect::<String>();
        prop_assert_eq!(keep(&lines.concat()), keep(&text));
    }

    #[test]
    fn any_table_renders(
        rows in proptest::collection::vec((".{0,20}", any::<f64>(), "\\PC{0,8}"), 0..6),
        width in proptest::option::of(0..80_usize),
    ) {
        let mut table = Table::new(vec![Column::text("a", "a"), Column::figures("b", "b", "kg")]);
        for (name, value, figure) in &rows {
            table.row(vec![Cell::text(name), Cell::figure(figure.clone(), *value)]);
        }
        let text = table.render(Look { width, colour: false });
        let plain = !text.contains('\u{1b}');
        prop_assert!(plain);
        prop_assert_eq!(csv_rows(&table), rows.len());
    }
}

fn csv_rows(table: &Table) -> usize {
    let text = table.csv().unwrap();
    csv::Reader::from_reader(text.as_bytes())
        .records()
        .filter(|r| r.is_ok())
        .count()
}
