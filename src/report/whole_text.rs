//! What `weigh --whole` prints for people.

use super::digits::Scale;
use super::table::{Look, Mark};
use super::weigh::{WeighedFile, Whole};
use super::weigh_text::{cells, columns, in_full};
use crate::quantity::LengthUnit;

/// The word for why there are no figures; empty where there are.
pub(super) fn refusal(file: &WeighedFile) -> &'static str {
    match (&file.whole, file.proved.flatten()) {
        (Some(_), _) => "",
        (None, Some(_)) => "degenerate",
        (None, None) => "not-closed",
    }
}

/// The totals of a file, and what was proved of it.
pub(super) fn render(file: &WeighedFile, unit: LengthUnit, look: Look) -> String {
    let mut out = String::from("\n");
    if let Some(Whole {
        figures: whole,
        uncertainty,
        ..
    }) = &file.whole
    {
        let u = uncertainty.as_ref();
        let scale = Scale::for_mass(whole.mass_kg.unwrap_or(0.0).abs());
        let mut table = columns("all together", unit, scale);
        table.row(cells("total", whole, None, u, unit, scale));
        out.push_str(&table.render(look));
        if file.turned == Some(true) {
            out.push_str(&format!(
                "{} the surface faces inward as a whole: its signs were turned\n",
                look.marked("note", Mark::Fail)
            ));
        }
        out.push_str(&in_full("all together", whole, None, u, unit, look));
    } else {
        out.push_str(&format!(
            "{} {}\n",
            look.marked("REFUSED", Mark::Fail),
            match refusal(file) {
                "degenerate" => "the surface is closed but holds no volume beyond rounding",
                _ => "not closed: directed edges do not cancel; `bismar check` says where",
            }
        ));
    }
    if file.proved.flatten().is_some() {
        out.push_str(
            "\nproved: the directed edges cancel, so the surface has no rim (by a 128-bit sum; the \
             default path compares the edges themselves)\n\
             not looked at: facets or whole meshes written twice, shells inside out among others, \
             solids in solids, surfaces that cut each other, which body is which; leave out --whole \
             for all of these but surfaces that cut each other\n",
        );
    }
    out
}
