//! `[[smear]]`: mass that no mesh shows, placed with what it covers.

use std::collections::HashMap;
use std::path::PathBuf;

use super::expand::{self, Instance, What};
use super::file::{AssemblyFile, SmearEntry, SmearMass};
use super::listed;
use super::read::pattern;
use super::reader::Reader;
use super::resolve::{Basis, Piece, Source, Weighed};
use crate::error::{Error, Kind};
use crate::moments::Moments;
use crate::quantity::{Dimension, Quantity};

/// A smear among the things that were weighed.
#[derive(Clone, Debug)]
pub struct Smeared {
    /// Its place among them.
    pub at: usize,
    /// The places of what it covers.
    pub covers: Vec<usize>,
    /// How much there is of it.
    pub mass: SmearMass,
    /// Address of its entry: repeats of an included file share one.
    pub(super) entry: usize,
    /// Its name without the path of its file.
    pub(super) name: String,
}

/// Reads every `[[smear]]`.
pub(super) fn read(root: &Reader<'_, '_>) -> Vec<SmearEntry> {
    let entries = root.tables("smear").into_iter().filter_map(|r| {
        let name = r.text("name").map(|(name, _)| name);
        let of = pattern(&r, "of");
        let mass = mass(&r);
        for (key, advice) in [
            ("of", "say what it covers: of = \"frame*\""),
            ("mass", "say how much: mass = \"3 %\" or \"1.2 kg\""),
        ] {
            if r.entry(key).is_none() {
                r.missing(key, Kind::Usage, advice);
            }
        }
        let line = r.line;
        r.finish();
        let of = of?;
        Some(SmearEntry {
            line,
            name: name.unwrap_or_else(|| format!("smear of {}", of.text)),
            of,
            mass: mass?,
        })
    });
    let entries: Vec<SmearEntry> = entries.collect();
    for (n, entry) in entries.iter().enumerate() {
        if let Some(first) = entries[..n].iter().find(|e| e.name == entry.name) {
            root.shared.fault(
                entry.line,
                Kind::AmbiguousName,
                format!(
                    "the smear `{}` of line {} has the same name",
                    entry.name, first.line
                ),
                "give each [[smear]] a name of its own; an unnamed one is called after what it covers",
            );
        }
    }
    entries
}

fn mass(r: &Reader<'_, '_>) -> Option<SmearMass> {
    let (text, line) = r.text("mass")?;
    match Quantity::parse_one_of(&text, &[Dimension::Fraction, Dimension::Mass], None) {
        Ok((_, q)) if q.value < 0.0 => {
            let advice = "write what is added, in per cent of what it covers or as a mass";
            let message = format!("`mass`: `{text}` is negative");
            r.shared.fault(line, Kind::BadNumber, message, advice);
            None
        }
        Ok((Dimension::Fraction, q)) => Some(SmearMass::Fraction(q)),
        Ok((_, q)) => Some(SmearMass::Mass(q)),
        Err(e) => {
            let message = format!("`mass`: {}", e.message);
            r.shared.fault(line, e.kind, message, e.advice);
            None
        }
    }
}

/// One smear of one appearance of its file.
struct Appearance<'f> {
    entry: &'f SmearEntry,
    file: &'f AssemblyFile,
    /// What paths in its file begin with.
    prefix: String,
    /// Paths of the groups that its file stands in.
    groups: Vec<String>,
    /// Which instances it covers.
    covers: Vec<usize>,
}

/// Every smear with what it covers, in the order of files and lines.
fn appearances<'f>(instances: &[Instance<'f>]) -> Vec<Appearance<'f>> {
    let mut all: Vec<Appearance<'f>> = Vec::new();
    let mut known: HashMap<(*const SmearEntry, String), usize> = HashMap::new();
    for (n, instance) in instances.iter().enumerate() {
        for scope in instance.scopes.iter() {
            for entry in &scope.file.smears {
                let prefix = instance.path[..scope.path_from].to_owned();
                let key = (std::ptr::from_ref(entry), prefix.clone());
                let at = *known.entry(key).or_insert_with(|| {
                    let groups = instance.groups.iter();
                    let groups = groups.take_while(|g| g.len() < prefix.len());
                    all.push(Appearance {
                        entry,
                        file: scope.file,
                        groups: groups.cloned().collect(),
                        prefix,
                        covers: Vec::new(),
                    });
                    all.len() - 1
                });
                let own = &instance.path[scope.path_from..];
                let plain = &instance.entry_path[scope.entry_path_from..];
                let matcher = &entry.of.matcher;
                // Paint and harness do not lie on what a tank holds.
                let solid = !matches!(instance.what, What::Tank(_));
                if solid && (matcher.is_match(own) || matcher.is_match(plain)) {
                    all[at].covers.push(n);
                }
            }
        }
    }
    all
}

/// Smears that cover nothing, and those whose name is taken.
pub(super) fn faults(file: &AssemblyFile) -> Vec<Error> {
    let instances = expand::expand(file);
    let mut errors = Vec::new();
    for a in appearances(&instances) {
        let error = |kind, message: String, advice: String| {
            Error::new(kind, message, advice)
                .at_line(a.entry.line)
                .in_file(&a.file.path)
        };
        if a.covers.is_empty() {
            let paths = instances
                .iter()
                .filter_map(|i| i.path.strip_prefix(a.prefix.as_str()));
            let paths: Vec<&str> = paths.collect();
            errors.push(error(
                Kind::UnknownName,
                format!("the smear of `{}` covers nothing", a.entry.of.text),
                format!("the parts and items here are {}", listed(&paths)),
            ));
        }
        let path = format!("{}{}", a.prefix, a.entry.name);
        if instances.iter().any(|i| i.path == path) {
            errors.push(error(
                Kind::AmbiguousName,
                format!("the smear `{path}` has the name of a part or item"),
                "give it a name of its own".into(),
            ));
        }
    }
    errors
}

/// A smear that is worked out anew in every state of the assembly.
#[derive(Clone, Debug)]
pub(super) struct Planned {
    /// With the path of its file.
    pub(super) path: String,
    groups: Vec<String>,
    name: String,
    entry: usize,
    mass: SmearMass,
    /// Which of the things it covers, by their numbers.
    pub(super) covers: Vec<usize>,
    /// Its file and line.
    place: (PathBuf, u64),
}

impl Planned {
    /// Its moments, from those of all that it covers; `None` where a stated mass covers nothing
    /// that has any.
    pub(super) fn moments(&self, covered: &Moments) -> Option<Moments> {
        match self.mass {
            SmearMass::Fraction(q) => Some(covered.weighted(q.value)),
            SmearMass::Mass(q) => {
                (covered.zeroth > 0.0).then(|| covered.weighted(q.value / covered.zeroth))
            }
        }
    }

    /// Whether there is more of it where what it covers grows.
    pub(super) fn grows(&self) -> bool {
        matches!(self.mass, SmearMass::Fraction(_))
    }

    /// As a thing, `at` this place among what was weighed, over those places.
    pub(super) fn weighed(
        &self,
        moments: Moments,
        bounds: [[f64; 3]; 2],
        at: usize,
        covers: Vec<usize>,
    ) -> (Weighed, Smeared) {
        let smeared = Smeared {
            at,
            covers,
            mass: self.mass,
            entry: self.entry,
            name: self.name.clone(),
        };
        let weighed = Weighed {
            path: self.path.clone(),
            groups: self.groups.clone(),
            source: Source::Smear,
            basis: Basis::Stated,
            pieces: vec![Piece {
                material: None,
                moments,
            }],
            stands: Vec::new(),
            moments,
            uneven: false,
            estimate: None,
            facets: None,
            volume: None,
            implied_density: None,
            made: None,
            rates: Vec::new(),
            bounds,
        };
        (weighed, smeared)
    }

    /// The error where nothing that it covers has any mass.
    pub(super) fn unplaced(&self) -> Error {
        let message = format!(
            "the smear `{}` covers things without any mass, and cannot be placed",
            self.path
        );
        let advice = "state it in an [[item]] with its own place";
        let (path, line) = &self.place;
        Error::new(Kind::Empty, message, advice)
            .at_line(*line)
            .in_file(path)
    }
}

/// Every smear, over the instances that it covers.
pub(super) fn planned(instances: &[Instance<'_>]) -> Vec<Planned> {
    let all = appearances(instances).into_iter();
    all.map(|a| Planned {
        path: format!("{}{}", a.prefix, a.entry.name),
        groups: a.groups,
        name: a.entry.name.clone(),
        entry: std::ptr::from_ref(a.entry).addr(),
        mass: a.entry.mass,
        covers: a.covers,
        place: (a.file.path.clone(), a.entry.line),
    })
    .collect()
}
