//! The materials of an assembly file: its own, then those of the table.

use std::collections::HashSet;

use super::file::Substance;
use super::reader::Reader;
use crate::error::Kind;
use crate::material::{Material, Table};
use crate::quantity::{Dimension, Quantity};

/// The file's own materials, found as those of the table are: without regard to case, spaces and
/// hyphens.
pub(super) struct OwnMaterials {
    table: Table,
    /// Names of those whose density is among the faults.
    at_fault: HashSet<String>,
}

/// Reads `[material."name"]` of the file.
pub(super) fn own_materials(root: &Reader<'_, '_>) -> OwnMaterials {
    let entries = root.own_keys("material");
    let mut own = Vec::with_capacity(entries.len());
    let mut at_fault = HashSet::new();
    for entry in entries {
        let name = &entry.key;
        let read = Reader::of(root.shared, &entry.node, "material").and_then(|r| {
            let density = r.quantity("density", Dimension::Density);
            let source = r.text("source").map(|(source, _)| source);
            r.text("note");
            if r.entry("density").is_none() {
                r.missing(
                    "density",
                    Kind::Usage,
                    "state it: density = \"7850 kg/m3 ± 1 %\"",
                );
            }
            r.finish();
            let (density, line) = density?;
            if density.value <= 0.0 {
                let message = format!("the density of `{name}` is not above zero");
                let advice = "write a density above zero";
                root.shared.fault(line, Kind::BadNumber, message, advice);
            }
            Some((density, source.unwrap_or_default()))
        });
        if read.is_none() {
            at_fault.insert(name.clone());
        }
        let (density, source) = read.unwrap_or((Quantity::exact(1.0), String::new()));
        own.push(Material {
            id: name.clone(),
            name: name.clone(),
            density,
            source,
            aliases: Vec::new(),
            printing: false,
        });
    }
    let table = Table::new(own.clone()).unwrap_or_else(|e| {
        // The shortest list that fails ends with the one that clashes.
        let sizes: Vec<usize> = (0..own.len()).collect();
        let good = sizes.partition_point(|n| Table::new(own[..=*n].to_vec()).is_ok());
        let line = entries.get(good).map_or(root.line, |entry| entry.line);
        root.shared.fault(line, e.kind, e.message, e.advice);
        own.truncate(good);
        Table::new(own).unwrap_or_default()
    });
    OwnMaterials { table, at_fault }
}

/// The substance that `material =` of a table names.
pub(super) fn chosen(r: &Reader<'_, '_>, own: &OwnMaterials) -> Option<Substance> {
    chosen_by(r, "material", own)
}

/// The substance that the `key` of a table names.
pub(super) fn chosen_by(
    r: &Reader<'_, '_>,
    key: &'static str,
    own: &OwnMaterials,
) -> Option<Substance> {
    let (word, line) = r.text(key)?;
    let standard = Table::standard();
    if let Some(material) = own.table.find(&word).or_else(|| standard.find(&word)) {
        if own.at_fault.contains(&material.name) {
            return None;
        }
        return Some(Substance {
            name: material.name.clone(),
            density: material.density,
            source: Some(material.source.clone()).filter(|s| !s.is_empty()),
        });
    }
    let near: Vec<&str> = own
        .table
        .nearest(&word)
        .into_iter()
        .chain(standard.nearest(&word))
        .collect();
    let mut advice = String::new();
    if !near.is_empty() {
        advice += &format!(
            "did you mean {}? ",
            near[..near.len().min(3)]
                .iter()
                .map(|n| format!("`{n}`"))
                .collect::<Vec<_>>()
                .join(" or ")
        );
    }
    let names: Vec<&str> = own.table.all().iter().map(|m| m.name.as_str()).collect();
    if !names.is_empty() {
        advice += &format!("this file's own materials are {}; ", super::listed(&names));
    }
    advice += &format!(
        "`bismar materials` lists the {} of the table, and [material.\"{word}\"] with a density \
         makes one of your own",
        standard.all().len()
    );
    let message = format!("there is no material `{word}`");
    r.shared.fault(line, Kind::UnknownName, message, advice);
    None
}
