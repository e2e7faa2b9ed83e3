//! Reads a table key by key and collects every fault, so that all are reported together.
//!
//! A table's known keys are the keys that were asked for: there is no second list that could
//! drift from the code that reads them.

use std::cell::RefCell;
use std::collections::{BTreeMap, BTreeSet};
use std::path::Path;

use nalgebra::Vector3;

use super::tree::{Entry, Node, Value};
use crate::error::{Error, Kind};
use crate::quantity::{Dimension, LengthUnit, Quantity};

/// What the readers of one file share.
pub(super) struct Shared<'p> {
    pub(super) path: &'p Path,
    /// Unit of bare lengths; millimetres while a missing unit is already among the faults.
    pub(super) unit: LengthUnit,
    /// How many groups and files this file is nested in.
    pub(super) depth: usize,
    /// The text has faults of syntax: what is missing may only have been unreadable.
    broken: bool,
    faults: RefCell<Vec<Error>>,
    /// Every table that was read, by what it is, with the keys asked of it.
    known: RefCell<BTreeMap<&'static str, BTreeSet<&'static str>>>,
}

impl<'p> Shared<'p> {
    pub(super) fn new(path: &'p Path, faults: Vec<Error>) -> Self {
        Self {
            path,
            unit: LengthUnit::Mm,
            depth: 0,
            broken: !faults.is_empty(),
            faults: RefCell::new(faults),
            known: RefCell::default(),
        }
    }

    pub(super) fn fault(&self, line: u64, kind: Kind, message: String, advice: impl Into<String>) {
        self.push(Error::new(kind, message, advice).at_line(line));
    }

    pub(super) fn push(&self, error: Error) {
        self.faults.borrow_mut().push(error.in_file(self.path));
    }

    /// The faults so far, in line order.
    pub(super) fn take_faults(&self) -> Vec<Error> {
        let mut faults = self.faults.take();
        faults.sort_by_key(|e| e.line.unwrap_or(0));
        if self.broken {
            // What was read from a broken line is not what was meant.
            let syntax = |e: &&Error| e.kind == Kind::UnknownFormat;
            let broken: Vec<_> = faults.iter().filter(syntax).map(|e| e.line).collect();
            faults.retain(|e| e.kind == Kind::UnknownFormat || !broken.contains(&e.line));
        }
        faults
    }

    #[cfg(test)]
    pub(super) fn known(&self) -> BTreeMap<&'static str, BTreeSet<&'static str>> {
        self.known.borrow().clone()
    }
}

/// One table being read.
pub(super) struct Reader<'a, 'p> {
    pub(super) shared: &'a Shared<'p>,
    entries: &'a [Entry],
    /// What the table is, such as `part`; `known` is kept by it.
    what: &'static str,
    /// The line on which the table starts.
    pub(super) line: u64,
    /// Where the table starts, in bytes.
    pub(super) offset: usize,
    asked: RefCell<Vec<&'static str>>,
}

impl<'a, 'p> Reader<'a, 'p> {
    pub(super) fn new(
        shared: &'a Shared<'p>,
        entries: &'a [Entry],
        what: &'static str,
        line: u64,
        offset: usize,
    ) -> Self {
        Self {
            shared,
            entries,
            what,
            line,
            offset,
            asked: RefCell::default(),
        }
    }

    /// The table behind a node, or a fault.
    pub(super) fn of(shared: &'a Shared<'p>, node: &'a Node, what: &'static str) -> Option<Self> {
        match &node.value {
            Value::Table(entries) => Some(Self::new(shared, entries, what, node.line, node.offset)),
            other => {
                wrong_type(shared, node.line, what, "a table", other);
                None
            }
        }
    }

    /// The entry of a key. Asking makes the key known.
    pub(super) fn entry(&self, key: &'static str) -> Option<&'a Entry> {
        let mut asked = self.asked.borrow_mut();
        if !asked.contains(&key) {
            asked.push(key);
        }
        self.entries.iter().find(|e| e.key == key)
    }

    pub(super) fn text(&self, key: &'static str) -> Option<(String, u64)> {
        let entry = self.entry(key)?;
        match &entry.node.value {
            Value::Text(s) if s.trim().is_empty() => {
                self.shared.fault(
                    entry.node.line,
                    Kind::Usage,
                    format!("`{key}` is empty"),
                    format!("write a text in `{key}`, or leave the key out"),
                );
                None
            }
            Value::Text(s) => Some((s.clone(), entry.node.line)),
            other => {
                wrong_type(self.shared, entry.node.line, key, "a text", other);
                None
            }
        }
    }

    pub(super) fn quantity(&self, key: &'static str, of: Dimension) -> Option<(Quantity, u64)> {
        let node = &self.entry(key)?.node;
        Some((quantity(self.shared, node, key, of)?, node.line))
    }

    /// A quantity that has no business with a tolerance.
    pub(super) fn exactly(&self, key: &'static str, of: Dimension) -> Option<f64> {
        let (q, line) = self.quantity(key, of)?;
        if q.tolerance.is_some() {
            let message = format!("`{key}` has a tolerance");
            self.shared
                .fault(line, Kind::Usage, message, "state it without ±");
        }
        Some(q.value)
    }

    /// Three lengths.
    pub(super) fn lengths(&self, key: &'static str) -> Option<([Quantity; 3], u64)> {
        let node = &self.entry(key)?.node;
        Some((lengths(self.shared, node, key)?, node.line))
    }

    /// A direction: `"x"`, `"y"`, `"z"`, or three numbers that are not all zero. A unit vector.
    pub(super) fn direction(&self, key: &'static str) -> Option<Vector3<f64>> {
        let node = &self.entry(key)?.node;
        let unit = direction(node);
        if unit.is_none() {
            self.shared.fault(
                node.line,
                Kind::BadNumber,
                format!("`{key}` is no direction"),
                "write \"x\", \"y\" or \"z\", or three finite numbers that are not all zero",
            );
        }
        unit
    }

    /// The table of a key.
    pub(super) fn table(&self, key: &'static str, what: &'static str) -> Option<Self> {
        Self::of(self.shared, &self.entry(key)?.node, what)
    }

    /// The tables of a key that may stand many times, `[[key]]`.
    pub(super) fn tables(&self, key: &'static str) -> Vec<Self> {
        let Some(entry) = self.entry(key) else {
            return Vec::new();
        };
        match &entry.node.value {
            Value::List(list) => {
                let tables = list.iter();
                tables
                    .filter_map(|n| Self::of(self.shared, n, key))
                    .collect()
            }
            other => {
                self.shared.fault(
                    entry.line,
                    Kind::Usage,
                    format!("`{key}` must be a list of tables, and is {}", other.kind()),
                    format!("write [[{key}]] with two brackets, or a list in JSON"),
                );
                Vec::new()
            }
        }
    }

    /// Entries of a table whose keys are the user's own names.
    pub(super) fn own_keys(&self, key: &'static str) -> &'a [Entry] {
        match self.entry(key).map(|e| (&e.node.value, e.line)) {
            None => &[],
            Some((Value::Table(entries), _)) => entries,
            Some((other, line)) => {
                wrong_type(self.shared, line, key, "a table", other);
                &[]
            }
        }
    }

    /// Whether nothing stands in it.
    pub(super) fn is_empty(&self) -> bool {
        self.entries.is_empty()
    }

    /// A fault about this table: a key that it must have is missing.
    pub(super) fn missing(&self, key: &str, kind: Kind, advice: impl Into<String>) {
        if self.shared.broken {
            return;
        }
        let message = format!("this {} has no `{key}`", self.what);
        self.shared.fault(self.line, kind, message, advice);
    }

    /// Every key that was never asked for is a fault that names the nearest known one.
    pub(super) fn finish(self) {
        let asked = self.asked.into_inner();
        let entries = self.entries.iter();
        for entry in entries.filter(|e| !asked.contains(&e.key.as_str())) {
            let key = &entry.key;
            let advice = match nearest(key, asked.iter().copied()) {
                Some(near) => format!("did you mean `{near}`?"),
                None => format!("the keys here are {}", asked.join(", ")),
            };
            let message = format!("unknown key `{key}` in {}", self.what);
            self.shared
                .fault(entry.line, Kind::UnknownKey, message, advice);
        }
        let mut known = self.shared.known.borrow_mut();
        known.entry(self.what).or_default().extend(asked);
    }
}

fn wrong_type(shared: &Shared<'_>, line: u64, key: &str, wanted: &str, found: &Value) {
    shared.fault(
        line,
        Kind::Usage,
        format!("`{key}` must be {wanted}, and is {}", found.kind()),
        format!("write {wanted}"),
    );
}

/// The known name nearest to `word`, if any is near enough to be a slip of it.
pub(super) fn nearest<'n>(word: &str, names: impl Iterator<Item = &'n str>) -> Option<&'n str> {
    let word = word.to_lowercase();
    let scored = names.map(|n| (strsim::damerau_levenshtein(&word, &n.to_lowercase()), n));
    let (distance, name) = scored.min()?;
    let longest = name.chars().count().max(word.chars().count());
    (distance * 2 <= longest).then_some(name)
}

/// A quantity typed as a text, or as a bare number where it is a length.
pub(super) fn quantity(
    shared: &Shared<'_>,
    node: &Node,
    key: &str,
    of: Dimension,
) -> Option<Quantity> {
    let bare = (of == Dimension::Length).then_some(shared.unit);
    let read = match &node.value {
        Value::Text(s) => Quantity::parse(s, of, bare),
        Value::Number(x) if x.is_finite() => Quantity::from_number(*x, of, bare),
        other => {
            let found = match other {
                Value::Number(_) => "not finite",
                _ => other.kind(),
            };
            let [example, _] = of.examples();
            shared.fault(
                node.line,
                Kind::BadNumber,
                format!("`{key}` must be a quantity, and is {found}"),
                format!("write {} such as \"{example}\"", of.name()),
            );
            return None;
        }
    };
    match read {
        Ok(q) => Some(q),
        Err(e) => {
            let message = format!("`{key}`: {}", e.message);
            shared.fault(node.line, e.kind, message, e.advice);
            None
        }
    }
}

/// Three lengths in a list.
pub(super) fn lengths(shared: &Shared<'_>, node: &Node, key: &str) -> Option<[Quantity; 3]> {
    if let Value::List(list) = &node.value
        && let [x, y, z] = list.as_slice()
    {
        // All three are read before any is judged, so that every fault is told.
        let [x, y, z] = [x, y, z].map(|n| quantity(shared, n, key, Dimension::Length));
        return Some([x?, y?, z?]);
    }
    let found = match &node.value {
        Value::List(list) => format!("a list of {}", list.len()),
        other => other.kind().to_string(),
    };
    shared.fault(
        node.line,
        Kind::BadNumber,
        format!("`{key}` must be three lengths, and is {found}"),
        format!("write {key} = [x, y, z]"),
    );
    None
}

pub(super) fn direction(node: &Node) -> Option<Vector3<f64>> {
    match &node.value {
        Value::Text(s) => match s.trim().to_lowercase().as_str() {
            "x" => Some(Vector3::x()),
            "y" => Some(Vector3::y()),
            "z" => Some(Vector3::z()),
            _ => None,
        },
        Value::List(list) => {
            let numbers: Option<Vec<f64>> = list
                .iter()
                .map(|n| match n.value {
                    Value::Number(x) if x.is_finite() => Some(x),
                    _ => None,
                })
                .collect();
            let numbers = numbers.filter(|n| n.len() == 3)?;
            // Divided by the largest first: squares of tiny or huge numbers would not be finite.
            let largest = numbers.iter().fold(0.0_f64, |a, x| a.max(x.abs()));
            if largest == 0.0 {
                return None;
            }
            let scaled = Vector3::new(numbers[0], numbers[1], numbers[2]) / largest;
            let unit = scaled.normalize();
            unit.iter().all(|x| x.is_finite()).then_some(unit)
        }
        _ => None,
    }
}
