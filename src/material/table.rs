//! Materials and how they are found by name.

use std::collections::HashMap;
use std::sync::LazyLock;

use super::parse;
use crate::error::{Error, Kind, Result};
use crate::quantity::Quantity;

/// A material of the table, or one of an assembly file's own.
#[derive(Clone, Debug, PartialEq)]
pub struct Material {
    /// Short and unique, such as `al-6061`.
    pub id: String,
    /// As a person writes it on a sheet.
    pub name: String,
    /// kg/m³; the tolerance is the half-width of the range that the source states.
    pub density: Quantity,
    /// Where the density comes from, and whether that was published, computed or remembered.
    pub source: String,
    /// Other words for it.
    pub aliases: Vec<String>,
    /// It is sold as feedstock for printing.
    pub printing: bool,
}

impl Material {
    /// Every word by which it is found: id, name, aliases.
    pub fn words(&self) -> impl Iterator<Item = &str> {
        [self.id.as_str(), self.name.as_str()]
            .into_iter()
            .chain(self.aliases.iter().map(String::as_str))
    }
}

/// Materials in order, found by id, alias or name.
#[derive(Clone, Debug, Default)]
pub struct Table {
    materials: Vec<Material>,
    by_word: HashMap<String, usize>,
}

/// Without case, spaces, hyphens, underscores and slashes.
fn key(word: &str) -> String {
    word.chars()
        .filter(|c| !c.is_whitespace() && !matches!(c, '-' | '_' | '/' | '\u{2010}'..='\u{2013}'))
        .flat_map(char::to_lowercase)
        .collect()
}

impl Table {
    /// The table that comes with the program.
    pub fn standard() -> &'static Self {
        static STANDARD: LazyLock<Table> = LazyLock::new(|| {
            // The data is compiled in, and a test reads it: it cannot fail at run time. Should it,
            // an empty table refuses every name, which no one can mistake for a density.
            parse::standard().and_then(Table::new).unwrap_or_default()
        });
        &STANDARD
    }

    /// A table of `materials`.
    ///
    /// # Errors
    /// `ambiguous-name` where one word would mean two materials.
    pub fn new(materials: Vec<Material>) -> Result<Self> {
        let mut by_word: HashMap<String, usize> = HashMap::new();
        for (i, material) in materials.iter().enumerate() {
            for word in material.words() {
                let other = *by_word.entry(key(word)).or_insert(i);
                if other != i {
                    return Err(Error::new(
                        Kind::AmbiguousName,
                        format!(
                            "`{word}` would mean both `{}` and `{}`",
                            materials[other].name, material.name
                        ),
                        "give the two materials names that differ in more than case, spaces and hyphens",
                    ));
                }
            }
        }
        Ok(Self { materials, by_word })
    }

    /// This table with `own` materials in front: where a word names one of them, it no longer
    /// names one of this table.
    ///
    /// # Errors
    /// `ambiguous-name` where two of `own` go by one word.
    pub fn with_own(&self, own: Vec<Material>) -> Result<Self> {
        let mut joined = Self::new(own)?;
        let shift = joined.materials.len();
        joined.materials.extend(self.materials.iter().cloned());
        for (word, i) in &self.by_word {
            joined.by_word.entry(word.clone()).or_insert(i + shift);
        }
        Ok(joined)
    }

    /// All materials, in order.
    pub fn all(&self) -> &[Material] {
        &self.materials
    }

    /// The material that goes by `word`: its id, an alias or its name.
    pub fn find(&self, word: &str) -> Option<&Material> {
        self.by_word
            .get(&key(word))
            .and_then(|i| self.materials.get(*i))
    }

    /// The materials with `word` in their id, name or an alias, in the table's order.
    pub fn search(&self, word: &str) -> Vec<&Material> {
        let wanted = key(word);
        self.materials
            .iter()
            .filter(|m| m.words().any(|w| key(w).contains(&wanted)))
            .collect()
    }

    /// Up to three words of different materials that `word` may be meant for, the nearest first;
    /// none where nothing is near.
    pub fn nearest(&self, word: &str) -> Vec<&str> {
        /// Below this likeness two words have little in common; common practice, no source.
        const LIKE: f64 = 0.75;
        let wanted = key(word);
        if wanted.is_empty() {
            return Vec::new();
        }
        let mut near: Vec<(f64, &str)> = self
            .materials
            .iter()
            .filter_map(|m| {
                m.words()
                    .map(|w| (likeness(&wanted, &key(w)), w))
                    .max_by(|a, b| a.0.total_cmp(&b.0))
            })
            .filter(|(score, _)| *score >= LIKE)
            .collect();
        // Stable: equal scores keep the table's order.
        near.sort_by(|a, b| b.0.total_cmp(&a.0));
        near.into_iter().take(3).map(|(_, w)| w).collect()
    }

    /// The material that goes by `word`.
    ///
    /// # Errors
    /// `unknown-name` with the nearest names as advice.
    pub fn get(&self, word: &str) -> Result<&Material> {
        self.find(word).ok_or_else(|| {
            let near = self.nearest(word);
            let advice = if near.is_empty() {
                "list the known materials with `bismar materials`, or state a density".to_owned()
            } else {
                format!("did you mean {}?", quoted(&near))
            };
            Error::new(
                Kind::UnknownName,
                format!("no material goes by `{word}`"),
                advice,
            )
        })
    }
}

/// 0 to 1. A word within the other is near, more so the more of it is the same.
fn likeness(a: &str, b: &str) -> f64 {
    let whole = strsim::normalized_damerau_levenshtein(a, b).max(strsim::jaro_winkler(a, b) - 0.1);
    let (short, long) = if a.len() < b.len() { (a, b) } else { (b, a) };
    if short.chars().count() >= 3 && long.contains(short) {
        whole.max(0.75 + 0.2 * short.len() as f64 / long.len() as f64)
    } else {
        whole
    }
}

fn quoted(words: &[&str]) -> String {
    let quoted: Vec<String> = words.iter().map(|w| format!("`{w}`")).collect();
    quoted.join(", ")
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_word_means_one_material() {
        let table = Table::new(parse::standard().unwrap()).unwrap();
        assert!(table.all().len() >= 60);
        assert_eq!(Table::standard().all(), table.all());
        for material in table.all() {
            for word in material.words() {
                assert_eq!(table.find(word), Some(material), "{word}");
                assert_eq!(table.find(&word.to_uppercase()), Some(material), "{word}");
            }
        }
    }

    #[test]
    fn words_of_the_trade() {
        for (word, id) in [
            ("steel S235", "steel-carbon"),
            ("Steel-S355", "steel-carbon"),
            ("aluminum 6061", "al-6061"),
            ("6061-T6", "al-6061"),
            ("nylon 12", "pa12"),
            ("1.4301", "steel-304"),
            ("AISI 304", "steel-304"),
            ("aisi316l", "steel-316"),
            ("CuZn37", "brass"),
            ("Ti64", "ti-6al-4v"),
            ("grade 5 titanium", "ti-6al-4v"),
            ("pla", "pla"),
            ("Water", "water"),
        ] {
            let found = Table::standard().find(word).map(|m| m.id.as_str());
            assert_eq!(found, Some(id), "{word}");
        }
        assert!(Table::standard().find("unobtainium").is_none());
        assert!(Table::standard().find("").is_none());
    }

    /// Published densities, each inside the table's range. The source stands beside each.
    #[test]
    fn ranges_hold_the_published_values() {
        for (id, published) in [
            ("al-1050", 2705.0),                // ASM Handbook vol 2 (1990) p 62
            ("al-6061", 0.098 * 27679.9047),    // Aluminum Association, from memory, unverified
            ("al-7075", 0.101 * 27679.9047),    // MMPDS, from memory, unverified
            ("steel-4130", 0.283 * 27679.9047), // MMPDS, from memory, unverified
            ("ti-6al-4v", 0.160 * 27679.9047),  // MMPDS, from memory, unverified
            ("douglas-fir", 545.0),             // Oregon State University table
            ("concrete-rc", 25e3 / 9.80665),    // EN 1991-1-1, as quoted
            ("concrete", 24e3 / 9.80665),       // EN 1991-1-1, from memory, unverified
            ("diesel", 820.0),                  // EN 590, low end, as quoted
            ("diesel", 845.0),                  // EN 590, high end, as quoted
            ("water", 998.207),                 // Tanaka et al 2001, Metrologia 38:301
            ("sea-water", 1025.98),             // TEOS-10 at 15 C
            ("hydrazine", 1007.0),              // MIL-HDBK-1022A
        ] {
            let density = Table::standard().find(id).unwrap().density;
            let spread = density.tolerance.unwrap().amount;
            // An end of a range is held to the rounding of the per cent in the table, 0.05 %.
            let slack = 5e-4 * published;
            assert!((density.value - published).abs() <= spread + slack, "{id}");
        }
    }

    #[test]
    fn unknown_names_get_the_nearest() {
        let table = Table::standard();
        assert_eq!(
            table.nearest("aluminum 6016").first(),
            Some(&"aluminum 6061")
        );
        assert_eq!(table.nearest("steel S253").first(), Some(&"steel S235"));
        assert!(
            table
                .nearest("stainless steel")
                .iter()
                .any(|w| w.contains("304"))
        );
        assert!(table.nearest("qqqqqqqq").is_empty());
        let e = table.get("brss").unwrap_err();
        assert_eq!(e.kind, Kind::UnknownName);
        assert!(e.advice.contains("`brass`"), "{}", e.advice);
    }

    #[test]
    fn search_finds_parts_of_words() {
        let found = Table::standard().search("Stainless");
        let ids: Vec<&str> = found.iter().map(|m| m.id.as_str()).collect();
        assert_eq!(ids, ["steel-304", "steel-316", "steel-17-4"]);
        assert_eq!(
            Table::standard().search("").len(),
            Table::standard().all().len()
        );
    }

    #[test]
    fn own_materials_come_first() {
        let own = |name: &str| Material {
            id: name.to_owned(),
            name: name.to_owned(),
            density: Quantity::exact(7000.0),
            source: "the assembly file".to_owned(),
            aliases: Vec::new(),
            printing: false,
        };
        let table = Table::standard().with_own(vec![own("Steel S235")]).unwrap();
        assert_eq!(table.find("steel s235").unwrap().density.value, 7000.0);
        assert_eq!(table.find("S235").unwrap().density.value, 7850.0);
        let e = Table::standard().with_own(vec![own("my-alloy"), own("My alloy")]);
        assert_eq!(e.unwrap_err().kind, Kind::AmbiguousName);
    }
}
