//! What scales under the supports showed.
//!
//! ```toml
//! [[weighing]]                       # one an attitude; two attitudes give the height too
//! name = "level"
//! loads = { front = "250 N ± 2 N", "rear left" = "14.2 kg ± 50 g", "rear right" = "14.5 kg ± 50 g" }
//! [[weighing]]
//! name = "nose up"
//! up = [0.3, 0, 1]                   # against gravity, in the assembly's axes; as it stands where left out
//! loads = { … }
//! ```
//!
//! Loads are by name of support, as masses, or as forces in the gravity of the file.

use nalgebra::Vector3;

use super::read_statics::Standing;
use super::reader::Reader;
use super::tree::Value;
use crate::error::Kind;
use crate::quantity::{Dimension, Quantity};
use crate::statics::{Attitude, Load};

/// Reads every `[[weighing]]`.
pub(super) fn read(root: &Reader<'_, '_>, standing: &Standing) -> Vec<Attitude> {
    let tables = root.tables("weighing").into_iter();
    tables.filter_map(|r| attitude(r, standing)).collect()
}

fn attitude(r: Reader<'_, '_>, standing: &Standing) -> Option<Attitude> {
    // A name is for people; nothing refers to it.
    r.text("name");
    let up = r.direction("up");
    let own = r.own_keys("loads");
    if r.entry("loads").is_none() {
        r.missing(
            "loads",
            Kind::Usage,
            "say what each scale showed: loads = { front = \"250 N\" }",
        );
    }
    let shared = r.shared;
    let line = r.line;
    r.finish();
    let Some(stand) = &standing.stand else {
        if !standing.faulty {
            let message = "a weighing names supports, and the file has none".into();
            shared.fault(
                line,
                Kind::Usage,
                message,
                "add a [[support]] for each scale",
            );
        }
        return None;
    };
    let supports = stand.supports();
    let mut loads = Vec::new();
    for entry in own {
        let at = supports.iter().find(|s| s.name == entry.key).map(|s| s.at);
        let Some(at) = at else {
            let names: Vec<&str> = supports.iter().map(|s| s.name.as_str()).collect();
            shared.fault(
                entry.line,
                Kind::UnknownName,
                format!("there is no support `{}`", entry.key),
                format!("the supports are {}", names.join(", ")),
            );
            continue;
        };
        let Value::Text(text) = &entry.node.value else {
            let message = format!("the load of `{}` is not a text", entry.key);
            shared.fault(
                entry.line,
                Kind::Unit,
                message,
                "write \"250 N\" or \"25.5 kg\"",
            );
            continue;
        };
        match Quantity::parse_one_of(text, &[Dimension::Mass, Dimension::Force], None) {
            Ok((of, q)) => {
                let per = match of {
                    Dimension::Force => 1.0 / standing.gravity,
                    _ => 1.0,
                };
                loads.push(Load {
                    at,
                    mass: q.value * per,
                    standard: q.standard() * per,
                });
            }
            Err(e) => {
                let message = format!("the load of `{}`: {}", entry.key, e.message);
                shared.fault(entry.line, e.kind, message, e.advice);
            }
        }
    }
    if own.len() < 3 {
        let message = format!("{} measured loads leave the centre open", own.len());
        let advice = "state the loads of three supports or more that do not stand in one line";
        shared.fault(line, Kind::Usage, message, advice);
    }
    // What could not be read was said.
    if loads.len() < own.len().max(3) {
        return None;
    }
    Some(Attitude {
        up: up.map_or(standing.up, |u: Vector3<f64>| u.normalize()),
        loads,
    })
}
