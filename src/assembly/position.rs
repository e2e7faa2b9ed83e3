//! Where an entry stands, and how often.

use super::file::{Position, Turn};
use super::reader::{self, Reader};
use super::tree::Value;
use crate::error::Kind;
use crate::quantity::{Dimension, Quantity};

/// The most repeats of one entry.
const MOST_REPEATS: f64 = 1e5;

/// Reads `mirror` (where `mirrors`), `turn`, and one of `at`, `places` and `count`.
pub(super) fn read(r: &Reader<'_, '_>, mirrors: bool) -> Position {
    let shared = r.shared;
    let at = r.lengths("at");
    let turn = r.table("turn", "turn").and_then(|t| {
        let axis = t.direction("axis");
        let angle = t.quantity("angle", Dimension::Angle);
        for key in ["axis", "angle"] {
            if t.entry(key).is_none() {
                t.missing(
                    key,
                    Kind::Usage,
                    "write turn = { axis = [0, 0, 1], angle = \"90 deg\" }",
                );
            }
        }
        t.finish();
        Some(Turn {
            axis: axis?,
            angle: angle?.0,
        })
    });
    let mirror = if mirrors { r.direction("mirror") } else { None };
    let mut places = Vec::new();
    if let Some(entry) = r.entry("places") {
        match &entry.node.value {
            Value::List(list) if !list.is_empty() => {
                places.extend(
                    list.iter()
                        .filter_map(|n| reader::lengths(shared, n, "places")),
                );
                if at.is_some() {
                    let message = "`at` and `places` both say where it stands".to_string();
                    let advice = "put the position of `at` into `places`, and leave `at` out";
                    shared.fault(entry.line, Kind::Usage, message, advice);
                }
            }
            _ => {
                let message = "`places` must be a list of positions".to_string();
                shared.fault(
                    entry.line,
                    Kind::Usage,
                    message,
                    "write places = [[x, y, z], …]",
                );
            }
        }
    }
    let mut count = 1;
    if let Some(entry) = r.entry("count") {
        match entry.node.value {
            Value::Number(n) if n >= 1.0 && n.fract() == 0.0 && n <= MOST_REPEATS => {
                count = n as usize;
            }
            _ => {
                let message = "`count` must be a whole number from 1 to 100000".to_string();
                let advice = "leave the entry out if there is none of it";
                shared.fault(entry.line, Kind::BadNumber, message, advice);
            }
        }
        if r.entry("places").is_some() {
            let message = "`count` and `places` both say how many there are".to_string();
            let advice =
                "keep `places` for repeats that stand apart, `count` for repeats in one place";
            shared.fault(entry.line, Kind::Usage, message, advice);
        }
    }
    if places.is_empty() {
        let here = at.map_or([Quantity::exact(0.0); 3], |(at, _)| at);
        places = vec![here; count];
    }
    Position {
        mirror,
        turn,
        at: places,
    }
}
