//! The limits of an assembly file.

use std::collections::HashMap;

use super::reader::Reader;
use crate::error::Kind;
use crate::limits::{Limit, Measured};
use crate::quantity::Dimension;

/// Reads every `[[limit]]`: one limit a quantity, in file order.
pub(super) fn read(root: &Reader<'_, '_>) -> Vec<Limit> {
    let mut limits: Vec<Limit> = Vec::new();
    let mut taken: HashMap<String, u64> = HashMap::new();
    for r in root.tables("limit") {
        let name = r.text("name").map(|(name, _)| name);
        let first = limits.len();
        limits.extend(band(&r, "mass", Measured::Mass, Dimension::Mass));
        let mut stated = r.entry("mass").is_some();
        if let Some(centre) = r.table("centre", "centre of a limit") {
            for (axis, key) in ["x", "y", "z"].into_iter().enumerate() {
                limits.extend(band(
                    &centre,
                    key,
                    Measured::Centre(axis),
                    Dimension::Length,
                ));
                stated |= centre.entry(key).is_some();
            }
            centre.finish();
        }
        stated |= r.entry("centre").is_some();
        if !stated {
            let advice = "write mass = { to = \"95 kg\" } or centre.x = { from = -40, to = 25 }";
            r.missing("mass` or `centre", Kind::Usage, advice);
        }
        let mut names: Vec<String> = Vec::new();
        for limit in &mut limits[first..] {
            if let Some(name) = &name {
                limit.name.clone_from(name);
            }
            if !names.contains(&limit.name) {
                names.push(limit.name.clone());
            }
        }
        for name in names {
            if let Some(line) = taken.get(&name) {
                let message = format!("the limit `{name}` of line {line} has the same name");
                let advice = "give each [[limit]] a name of its own; an unnamed one is called after its quantity";
                r.shared.fault(r.line, Kind::AmbiguousName, message, advice);
            } else {
                taken.insert(name, r.line);
            }
        }
        r.finish();
    }
    limits
}

fn band(r: &Reader<'_, '_>, key: &'static str, quantity: Measured, of: Dimension) -> Option<Limit> {
    let band = r.table(key, "band of a limit")?;
    let (from, to) = (band.quantity("from", of), band.quantity("to", of));
    let stated = band.entry("from").is_some() || band.entry("to").is_some();
    let line = band.line;
    if !stated {
        band.missing(
            "from` or `to",
            Kind::Usage,
            "state at least one end of the band",
        );
    }
    for (end, line) in [from, to].into_iter().flatten() {
        if end.tolerance.is_some() {
            let message = "the end of a limit has a tolerance".to_string();
            r.shared.fault(
                line,
                Kind::Usage,
                message,
                "state the end itself, without ±",
            );
        }
    }
    if let (Some((from, _)), Some((to, line))) = (from, to)
        && from.value > to.value
    {
        let message = format!(
            "`from` is above `to` in `{}`, which nothing can hold",
            quantity.name()
        );
        r.shared
            .fault(line, Kind::BadNumber, message, "exchange the two ends");
    }
    band.finish();
    Some(Limit {
        name: quantity.name().into(),
        quantity,
        from: from.map(|(q, _)| q.value),
        to: to.map(|(q, _)| q.value),
        line,
    })
}
