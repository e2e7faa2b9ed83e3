//! The foot of every sheet: what was run on what, so that a signed copy can be traced.

use super::document::{Document, InputFact};
use super::table::{Look, Mark};
use crate::error::Warning;
use crate::text::shown;

/// The usual caution, said once on every sheet with masses.
pub const CAUTION: &str = "Figures are estimates from the meshes and the stated densities; verify by weighing; local codes and a licensed professional decide.";

/// What a printed sheet must not lose with the standard error: tolerances that are not in it, and
/// what throws doubt on its meshes.
pub(super) fn nominal(warnings: &[Warning]) -> String {
    let kept = |w: &&Warning| {
        w.path.is_some() || ["tolerances-ignored", "printed-as-solid"].contains(&w.kind.as_str())
    };
    let quiet = |w: &&Warning| w.kind != "unit-assumed" && w.kind != "body-unused";
    warnings
        .iter()
        .filter(kept)
        .filter(quiet)
        .map(|w| format!("mind: {}\n", shown(&w.message)))
        .collect()
}

/// Version, options, inputs with size and hash.
pub fn footer<B>(document: &Document<B>, look: Look) -> String {
    let mut lines = vec![format!(
        "{} {} · options: {}",
        document.program.name,
        document.program.version,
        options()
    )];
    lines.extend(document.inputs.iter().map(input));
    lines
        .iter()
        .map(|l| look.marked(&shown(l), Mark::Dim) + "\n")
        .collect()
}

fn input(fact: &InputFact) -> String {
    let size = fact
        .bytes
        .map_or("not read".to_owned(), |b| format!("{b} bytes"));
    let hash = match (&fact.sha256, fact.bytes) {
        (Some(h), _) => format!(" · sha256 {h}"),
        (None, Some(_)) => " · sha256 not taken (--hash)".to_owned(),
        (None, None) => String::new(),
    };
    format!("input {} · {size}{hash}", fact.path)
}

/// The command line after the program's name, as it was given.
fn options() -> String {
    let words: Vec<String> = std::env::args_os()
        .skip(1)
        .map(|a| {
            let a = a.to_string_lossy().into_owned();
            if a.contains(char::is_whitespace) {
                format!("\"{a}\"")
            } else {
                a
            }
        })
        .collect();
    words.join(" ")
}
