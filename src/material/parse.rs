//! Reads and validates the two data files of the table.

use std::collections::HashMap;

use super::table::Material;
use crate::error::{Error, Kind, Result};
use crate::quantity::{Dimension, Quantity};

const DENSITIES: &str = include_str!("materials.tsv");
const ALIASES: &str = include_str!("aliases.tsv");

const DENSITY_HEAD: &str = "id\tname\tdensity_kg_m3\ttolerance_percent\tsource";
const ALIAS_HEAD: &str = "id\tprinting\taliases";

/// How every source begins: what its figure rests on.
const STANDINGS: [&str; 3] = ["published: ", "computed: ", "from memory, unverified: "];

/// The materials that come with the program.
pub(super) fn standard() -> Result<Vec<Material>> {
    read(DENSITIES, ALIASES)
}

fn read(densities: &str, aliases: &str) -> Result<Vec<Material>> {
    let mut words: HashMap<&str, (bool, Vec<String>)> = HashMap::new();
    for (line, [id, printing, names]) in rows::<3>(aliases, ALIAS_HEAD)? {
        let printing = match printing {
            "yes" => true,
            "no" => false,
            other => return Err(fault(line, format!("`{other}` is neither yes nor no"))),
        };
        let names = names.split("; ").filter(|n| !n.is_empty());
        let entry = (printing, names.map(str::to_owned).collect());
        if words.insert(id, entry).is_some() {
            return Err(fault(line, format!("`{id}` stands twice")));
        }
    }
    let mut out = Vec::new();
    for (line, [id, name, density, percent, source]) in rows::<5>(densities, DENSITY_HEAD)? {
        let text = format!("{density} kg/m3 ± {percent} %");
        let density = Quantity::parse(&text, Dimension::Density, None)
            .map_err(|e| Error::from(e).at_line(line))?;
        if density.value <= 0.0 {
            return Err(fault(
                line,
                format!("the density of `{id}` is not above zero"),
            ));
        }
        if !STANDINGS.iter().any(|s| source.starts_with(s)) {
            return Err(fault(
                line,
                format!("the source of `{id}` does not say what it rests on"),
            ));
        }
        let (printing, aliases) = words
            .remove(id)
            .ok_or_else(|| fault(line, format!("`{id}` has no line of aliases")))?;
        out.push(Material {
            id: id.to_owned(),
            name: name.to_owned(),
            density,
            source: source.to_owned(),
            aliases,
            printing,
        });
    }
    match words.keys().next() {
        Some(id) => Err(fault(0, format!("aliases of `{id}`, which has no density"))),
        None => Ok(out),
    }
}

/// The lines after the heading, cut at tabs into `N` cells that are not all blank.
fn rows<'a, const N: usize>(text: &'a str, head: &str) -> Result<Vec<(u64, [&'a str; N])>> {
    let mut lines = (1..).zip(text.lines());
    if lines.next().map(|(_, l)| l) != Some(head) {
        return Err(fault(1, format!("the heading is not `{head}`")));
    }
    lines
        .map(|(number, line)| {
            let cells: Vec<&str> = line.split('\t').collect();
            cells
                .try_into()
                .map(|cells| (number, cells))
                .map_err(|_| fault(number, format!("the line has not {N} cells")))
        })
        .collect()
}

fn fault(line: u64, message: String) -> Error {
    Error::new(Kind::BadNumber, message, "mend the table of materials").at_line(line)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn faults_of_the_data_are_found() {
        let aliases = "id\tprinting\taliases\na\tno\tb; c\n";
        let good = format!("{DENSITY_HEAD}\na\tA\t1000\t2\tpublished: x\n");
        let read_good = read(&good, aliases).unwrap();
        assert_eq!(read_good[0].density.tolerance.unwrap().amount, 20.0);
        assert_eq!(read_good[0].aliases, ["b", "c"]);
        for (from, to) in [
            ("1000", "heavy"),
            ("1000", "0"),
            ("1000", "-5"),
            ("published", "seen"),
            ("\t2\t", "\t"),
            ("a\tA", "d\tA"),
            ("density", "mass"),
        ] {
            assert!(
                read(&good.replacen(from, to, 1), aliases).is_err(),
                "{from} {to}"
            );
        }
        assert!(read(&good, "id\tprinting\taliases\na\tmaybe\t\n").is_err());
        assert!(read(&good, "id\tprinting\taliases\na\tno\t\nz\tno\t\n").is_err());
    }
}
