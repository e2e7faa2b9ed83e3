//! TOML or JSON text as one tree whose every key and value knows its line.

use jsonc_parser::ast;
use toml::Spanned;
use toml::de::{DeTable, DeValue};

use crate::error::{Error, Kind};

/// A value as it was typed, and the line on which it starts.
#[derive(Clone, Debug)]
pub(super) struct Node {
    pub(super) value: Value,
    pub(super) line: u64,
    /// Byte offset, which orders values as they were typed.
    pub(super) offset: usize,
}

/// What was typed.
#[derive(Clone, Debug)]
pub(super) enum Value {
    Text(String),
    Number(f64),
    Flag,
    Date,
    Null,
    List(Vec<Node>),
    Table(Vec<Entry>),
}

/// A key of a table and its value; entries stand in file order.
#[derive(Clone, Debug)]
pub(super) struct Entry {
    pub(super) key: String,
    pub(super) line: u64,
    /// Byte offset of the key, which orders entries as they were typed.
    pub(super) offset: usize,
    pub(super) node: Node,
}

impl Value {
    /// What this is, for messages.
    pub(super) fn kind(&self) -> &'static str {
        match self {
            Self::Text(_) => "a text",
            Self::Number(_) => "a number",
            Self::Flag => "true or false",
            Self::Date => "a date",
            Self::Null => "null",
            Self::List(_) => "a list",
            Self::Table(_) => "a table",
        }
    }
}

/// Line numbers by byte offset.
struct Lines(Vec<usize>);

impl Lines {
    fn new(text: &str) -> Self {
        let breaks = text.bytes().enumerate().filter(|(_, b)| *b == b'\n');
        Self(breaks.map(|(i, _)| i).collect())
    }

    /// The line (from 1) of a byte.
    fn of(&self, byte: usize) -> u64 {
        self.0.partition_point(|b| *b < byte) as u64 + 1
    }
}

/// Reads the text, JSON where it starts with `{` and TOML elsewhere.
///
/// Faults of syntax come back with what could be read around them; nothing is `None` but a text
/// of which nothing could be read.
pub(super) fn parse(text: &str, json: bool) -> (Option<Vec<Entry>>, Vec<Error>) {
    let text = text.strip_prefix('\u{feff}').unwrap_or(text);
    let json = json || text.trim_start().starts_with('{');
    if json {
        parse_json(text)
    } else {
        parse_toml(text)
    }
}

fn syntax(language: &str, message: &str, line: u64) -> Error {
    // Some parsers break their message over lines; a message here is one sentence.
    let message = message.split_whitespace().collect::<Vec<_>>().join(" ");
    Error::new(
        Kind::UnknownFormat,
        format!("this is not valid {language}: {message}"),
        format!("mend the {language} at this line"),
    )
    .at_line(line)
}

fn parse_toml(text: &str) -> (Option<Vec<Entry>>, Vec<Error>) {
    let lines = Lines::new(text);
    let (table, faults) = DeTable::parse_recoverable(text);
    let mut errors: Vec<Error> = faults
        .iter()
        .map(|e| {
            syntax(
                "TOML",
                e.message(),
                lines.of(e.span().map_or(0, |s| s.start)),
            )
        })
        .collect();
    let entries = toml_table(table.get_ref(), &lines, &mut errors);
    (Some(entries), errors)
}

fn toml_table(table: &DeTable<'_>, lines: &Lines, errors: &mut Vec<Error>) -> Vec<Entry> {
    let mut entries: Vec<Entry> = table
        .iter()
        .map(|(key, value)| Entry {
            key: key.get_ref().to_string(),
            line: lines.of(key.span().start),
            offset: key.span().start,
            node: toml_node(value, lines, errors),
        })
        .collect();
    entries.sort_by_key(|e| e.offset);
    entries
}

fn toml_node(value: &Spanned<DeValue<'_>>, lines: &Lines, errors: &mut Vec<Error>) -> Node {
    let offset = value.span().start;
    let line = lines.of(offset);
    let number = |parsed: Option<f64>, errors: &mut Vec<Error>| match parsed {
        Some(x) => Value::Number(x),
        None => {
            errors.push(syntax("TOML", "this number cannot be read", line));
            Value::Null
        }
    };
    let value = match value.get_ref() {
        DeValue::String(s) => Value::Text(s.to_string()),
        DeValue::Integer(i) => {
            let parsed = match i.radix() {
                10 => i.as_str().parse().ok(),
                r => i64::from_str_radix(i.as_str(), r).ok().map(|x| x as f64),
            };
            number(parsed, errors)
        }
        DeValue::Float(f) => number(f.as_str().parse().ok(), errors),
        DeValue::Boolean(_) => Value::Flag,
        DeValue::Datetime(_) => Value::Date,
        DeValue::Array(a) => Value::List(a.iter().map(|v| toml_node(v, lines, errors)).collect()),
        DeValue::Table(t) => Value::Table(toml_table(t, lines, errors)),
    };
    Node {
        value,
        line,
        offset,
    }
}

fn parse_json(text: &str) -> (Option<Vec<Entry>>, Vec<Error>) {
    // serde_json decides what is JSON, and bounds the nesting; the other parser only adds places.
    if let Err(e) = serde_json::from_str::<serde::de::IgnoredAny>(text) {
        let message = e.to_string();
        let message = message.split(" at line ").next().unwrap_or_default();
        return (None, vec![syntax("JSON", message, e.line() as u64)]);
    }
    let lines = Lines::new(text);
    let mut errors = Vec::new();
    match jsonc_parser::parse_to_ast(text, &Default::default(), &Default::default()) {
        Ok(parsed) => match parsed.value {
            Some(ast::Value::Object(o)) => {
                let entries = json_table(&o, &lines, &mut errors);
                (Some(entries), errors)
            }
            _ => (
                None,
                vec![syntax("JSON", "an assembly is a JSON object", 1)],
            ),
        },
        Err(e) => (
            None,
            vec![syntax(
                "JSON",
                &e.kind().to_string(),
                lines.of(e.range().start),
            )],
        ),
    }
}

fn json_table(object: &ast::Object<'_>, lines: &Lines, errors: &mut Vec<Error>) -> Vec<Entry> {
    let mut entries: Vec<Entry> = Vec::with_capacity(object.properties.len());
    let mut seen = std::collections::HashSet::new();
    for property in &object.properties {
        let key = property.name.as_str().to_string();
        let line = lines.of(property.range.start);
        if !seen.insert(key.clone()) {
            errors.push(syntax(
                "JSON",
                &format!("the key `{key}` stands twice"),
                line,
            ));
            continue;
        }
        entries.push(Entry {
            key,
            line,
            offset: property.range.start,
            node: json_node(&property.value, lines, errors),
        });
    }
    entries
}

fn json_node(value: &ast::Value<'_>, lines: &Lines, errors: &mut Vec<Error>) -> Node {
    let (value, start) = match value {
        ast::Value::StringLit(s) => (Value::Text(s.value.to_string()), s.range.start),
        ast::Value::NumberLit(n) => match n.value.parse() {
            Ok(x) => (Value::Number(x), n.range.start),
            Err(_) => {
                let line = lines.of(n.range.start);
                errors.push(syntax("JSON", "this number cannot be read", line));
                (Value::Null, n.range.start)
            }
        },
        ast::Value::BooleanLit(b) => (Value::Flag, b.range.start),
        ast::Value::NullKeyword(k) => (Value::Null, k.range.start),
        ast::Value::Array(a) => {
            let list = a.elements.iter().map(|v| json_node(v, lines, errors));
            (Value::List(list.collect()), a.range.start)
        }
        ast::Value::Object(o) => (Value::Table(json_table(o, lines, errors)), o.range.start),
    };
    Node {
        value,
        line: lines.of(start),
        offset: start,
    }
}
