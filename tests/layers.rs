//! Data flows one way: no module of the library names one that stands above it, and none stand in
//! a circle.
#![allow(clippy::unwrap_used, clippy::panic)]

use std::collections::{BTreeMap, BTreeSet};
use std::path::{Path, PathBuf};

/// Lowest first; modules of one row may not name each other.
const ROWS: &[&[&str]] = &[
    &["text"],
    &["error", "progress"],
    &["bytes", "geometry", "quantity"],
    &["moments", "statics"],
    &["mesh"],
    &["printed"],
    &["format"],
    &["stream"],
    &["curvature", "soundness"],
    &["masses", "material"],
    &["gravity", "limits", "uncertainty"],
    &["ballast"],
    &["assembly"],
    &["survey"],
    &["report"],
    &["command"],
];

fn source() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("src")
}

fn rust_files(folder: &Path, out: &mut Vec<PathBuf>) {
    for entry in std::fs::read_dir(folder).unwrap() {
        let path = entry.unwrap().path();
        if path.is_dir() {
            rust_files(&path, out);
        } else if path.extension().is_some_and(|e| e == "rs") {
            out.push(path);
        }
    }
}

/// The module of the crate that a file belongs to: the first step of its path.
fn module(path: &Path) -> String {
    let inner = path.strip_prefix(source()).unwrap();
    let first = inner
        .components()
        .next()
        .unwrap()
        .as_os_str()
        .to_str()
        .unwrap();
    first.trim_end_matches(".rs").to_owned()
}

/// Code without comments. Strings stay: none of this crate's holds `crate::`.
fn code(text: &str) -> String {
    let lines = text
        .lines()
        .map(|l| l.split("//").next().unwrap_or_default());
    lines.collect::<Vec<_>>().join("\n")
}

/// Every module that the code names as `crate::NAME` or in `crate::{…}`.
fn named(code: &str) -> BTreeSet<String> {
    let word = |s: &str| -> String {
        s.chars()
            .take_while(|c| c.is_alphanumeric() || *c == '_')
            .collect()
    };
    let mut out = BTreeSet::new();
    for (at, _) in code.match_indices("crate::") {
        let rest = &code[at + "crate::".len()..];
        if let Some(list) = rest.strip_prefix('{') {
            // Only the first names in a list are modules; what stands in inner braces is theirs.
            let mut depth = 0;
            let mut begins = true;
            for (i, c) in list.char_indices() {
                match c {
                    '{' => depth += 1,
                    '}' if depth == 0 => break,
                    '}' => depth -= 1,
                    ',' if depth == 0 => begins = true,
                    c if begins && !c.is_whitespace() => {
                        out.insert(word(&list[i..]));
                        begins = false;
                    }
                    _ => {}
                }
            }
        } else {
            out.insert(word(rest));
        }
    }
    out
}

/// module → (module it names → the files that do).
fn arrows() -> BTreeMap<String, BTreeMap<String, BTreeSet<PathBuf>>> {
    let mut files = Vec::new();
    rust_files(&source(), &mut files);
    let modules: BTreeSet<String> = files.iter().map(|f| module(f)).collect();
    let mut out: BTreeMap<String, BTreeMap<String, BTreeSet<PathBuf>>> = BTreeMap::new();
    for file in files {
        let from = module(&file);
        if from == "lib" || from == "main" {
            continue;
        }
        let of = out.entry(from.clone()).or_default();
        for to in named(&code(&std::fs::read_to_string(&file).unwrap())) {
            // `crate::Error` and the like are re-exports of the crate's root, out of `error`.
            let to = if modules.contains(&to) {
                to
            } else {
                "error".to_owned()
            };
            if to != from {
                of.entry(to).or_default().insert(file.clone());
            }
        }
    }
    out
}

fn row(module: &str) -> usize {
    ROWS.iter()
        .position(|row| row.contains(&module))
        .unwrap_or_else(|| panic!("the module {module} stands in no row of this test"))
}

#[test]
fn no_module_names_one_above_it() {
    let mut faults = Vec::new();
    let arrows = arrows();
    for (from, targets) in &arrows {
        for (to, files) in targets {
            if row(to) >= row(from) {
                faults.push(format!("{from} → {to} in {files:?}"));
            }
        }
    }
    assert!(faults.is_empty(), "arrows back:\n{}", faults.join("\n"));
    // All rows are there, so that the list above cannot go stale.
    for module in ROWS.iter().flat_map(|r| r.iter()) {
        assert!(arrows.contains_key(*module), "no module {module}");
    }
    assert!(
        arrows.values().map(BTreeMap::len).sum::<usize>() > 20,
        "{arrows:?}"
    );
}

#[test]
fn no_modules_stand_in_a_circle() {
    // Modules that name only such as are gone already go too; a circle never goes.
    let mut left: BTreeMap<String, BTreeSet<String>> = arrows()
        .into_iter()
        .map(|(from, to)| (from, to.into_keys().collect()))
        .collect();
    loop {
        let free: Vec<String> = left
            .iter()
            .filter(|(_, to)| to.iter().all(|t| !left.contains_key(t)))
            .map(|(from, _)| from.clone())
            .collect();
        if free.is_empty() {
            break;
        }
        free.iter().for_each(|f| drop(left.remove(f)));
    }
    assert!(left.is_empty(), "in a circle: {left:?}");
}

#[test]
fn names_are_found_however_they_are_written() {
    let text = "use crate::{error::{Error, Kind}, mesh,\n quantity::Unit};\n\
        // crate::report\n let x = crate::moments::integrate(f); pub(in crate::format::obj) fn";
    let found: Vec<_> = named(&code(text)).into_iter().collect();
    assert_eq!(found, ["error", "format", "mesh", "moments", "quantity"]);
}
