//! `made`: how a part is printed.

use nalgebra::{Unit, Vector3};

use super::reader::{Reader, lengths, quantity};
use super::tree::Value;
use crate::error::Kind;
use crate::printed::{LayerPlan, Made, ShellPlan};
use crate::quantity::{Dimension, Quantity};

/// Diameter of common filament, m.
const FILAMENT: f64 = 1.75e-3;

const ADVICE: &str = "write layers, wall, skin and infill for a part laid in layers, or shell for \
                      a hollowed one";

/// A thickness or a fraction of a plan that has a tolerance.
#[derive(Clone, Debug)]
pub struct Off {
    /// Its key.
    pub(super) what: &'static str,
    /// Its SI unit.
    pub(super) unit: &'static str,
    /// As stated.
    pub(super) quantity: Quantity,
    /// The plan with this much more of it.
    pub(super) varied: fn(&Made, f64) -> Made,
}

fn thicker_wall(made: &Made, by: f64) -> Made {
    let mut made = made.clone();
    match &mut made {
        Made::Layers(plan) => plan.wall += by,
        Made::Shell(plan) => plan.thickness += by,
    }
    made
}

/// More infill, or less where there is no room for more.
fn more_infill(made: &Made, by: f64) -> Made {
    let mut made = made.clone();
    match &mut made {
        Made::Layers(plan) => plan.infill += by,
        Made::Shell(plan) => plan.infill = plan.infill.map(|f| f + by),
    }
    made
}

/// Reads `made` of a part, lengths in m, and what of it has a tolerance.
pub(super) fn read(part: &Reader<'_, '_>) -> Option<(Made, Vec<Off>)> {
    let r = part.table("made", "made")?;
    let length = |key: &'static str| r.quantity(key, Dimension::Length);
    let layer = length("layers");
    let wall_stated = length("wall").map(|(q, _)| q);
    let wall = wall_stated.map(|q| q.value);
    let skin = skin(&r);
    let infill = r.quantity("infill", Dimension::Fraction);
    let up = r.direction("up");
    let filament = length("filament");
    let shell = length("shell");
    let drain = drain(&r);
    let fill = r.quantity("fill", Dimension::Density).map(|(q, _)| q.value);
    let stated = |key: &'static str| r.entry(key).is_some();
    let made = match (stated("layers"), stated("shell")) {
        (true, false) => {
            for key in ["wall", "skin", "infill"] {
                if !stated(key) {
                    r.missing(
                        key,
                        Kind::Usage,
                        format!("state it, zero included; {ADVICE}"),
                    );
                }
            }
            foreign(&r, &["drain", "fill"], "layers");
            let part = |top: bool| skin.map(|s| s[usize::from(top)]);
            (|| {
                Some(Made::Layers(LayerPlan {
                    layer: layer?.0.value,
                    wall: wall?,
                    skin_top: part(true)?,
                    skin_bottom: part(false)?,
                    infill: infill?.0.value,
                    up: up.map_or_else(Vector3::z_axis, Unit::new_normalize),
                    filament: filament.map_or(FILAMENT, |f| f.0.value),
                }))
            })()
        }
        (false, true) => {
            foreign(&r, &["wall", "skin", "up", "filament"], "shell");
            shell.map(|(q, _)| {
                Made::Shell(ShellPlan {
                    thickness: q.value,
                    infill: infill.map(|(q, _)| q.value),
                    drains: drain,
                    fill_density: fill,
                })
            })
        }
        _ => {
            r.shared.fault(
                r.line,
                Kind::Usage,
                "`made` must have one of `layers` and `shell`".into(),
                ADVICE,
            );
            None
        }
    };
    for (q, key) in [(&layer, "layers"), (&filament, "filament")] {
        if let Some((q, line)) = q
            && q.value <= 0.0
        {
            r.shared.fault(
                *line,
                Kind::BadNumber,
                format!("`{key}` is not above zero"),
                "write a length above zero",
            );
        }
    }
    if let Some((q, line)) = &infill
        && !(0.0..=1.0).contains(&q.value)
    {
        r.shared.fault(
            *line,
            Kind::BadNumber,
            "`infill` is no share of the inside".into(),
            "write a share from 0 % to 100 %",
        );
    }
    for (key, q) in [("layers", &layer), ("filament", &filament)] {
        if let Some((q, line)) = q {
            exact(&r, key, q, *line);
        }
    }
    r.finish();
    let mut off = Vec::new();
    let stated = [
        ("wall", "m", wall_stated),
        ("shell", "m", shell.map(|(q, _)| q)),
        ("infill", "1", infill.map(|(q, _)| q)),
    ];
    for (what, unit, quantity) in stated {
        let Some(quantity) = quantity.filter(|q| q.tolerance.is_some()) else {
            continue;
        };
        let varied = if what == "infill" {
            more_infill
        } else {
            thicker_wall
        };
        off.push(Off {
            what,
            unit,
            quantity,
            varied,
        });
    }
    Some((made?, off))
}

/// Layers and skins are whole layers of a stated height: a tolerance of them says nothing of the
/// mass that could be worked out.
fn exact(r: &Reader<'_, '_>, key: &str, q: &Quantity, line: u64) {
    if q.tolerance.is_some() {
        r.shared.fault(
            line,
            Kind::Usage,
            format!("`{key}` cannot have a tolerance: it is laid in whole layers"),
            "take the tolerance out; wall, shell and infill may have one",
        );
    }
}

fn foreign(r: &Reader<'_, '_>, keys: &[&'static str], method: &str) {
    for key in keys {
        if let Some(entry) = r.entry(key) {
            r.shared.fault(
                entry.line,
                Kind::Usage,
                format!("`{key}` has no meaning beside `{method}`"),
                ADVICE,
            );
        }
    }
}

/// Bottom and top thickness.
fn skin(r: &Reader<'_, '_>) -> Option<[f64; 2]> {
    let entry = r.entry("skin")?;
    if let Value::Table(_) = entry.node.value {
        let t = Reader::of(r.shared, &entry.node, "skin")?;
        let [bottom, top] = ["bottom", "top"].map(|key| {
            if t.entry(key).is_none() {
                t.missing(key, Kind::Usage, "state it, zero included");
            }
            t.quantity(key, Dimension::Length).map(|(q, line)| {
                exact(r, "skin", &q, line);
                q.value
            })
        });
        t.finish();
        return Some([bottom?, top?]);
    }
    let both = quantity(r.shared, &entry.node, "skin", Dimension::Length)?;
    exact(r, "skin", &both, entry.line);
    Some([both.value; 2])
}

/// Positions of drains.
fn drain(r: &Reader<'_, '_>) -> Vec<[f64; 3]> {
    let Some(entry) = r.entry("drain") else {
        return Vec::new();
    };
    let Value::List(list) = &entry.node.value else {
        r.shared.fault(
            entry.line,
            Kind::Usage,
            format!(
                "`drain` must be a list of positions, and is {}",
                entry.node.value.kind()
            ),
            "write drain = [[x, y, z], …]",
        );
        return Vec::new();
    };
    list.iter()
        .filter_map(|n| lengths(r.shared, n, "drain"))
        .map(|p| p.map(|q| q.value))
        .collect()
}
