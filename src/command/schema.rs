//! `bismar schema`: the JSON Schema of the assembly file.

use super::Answer;

/// Runs the command.
pub(super) fn run() -> Answer {
    // A value without floats or foreign keys always serialises.
    let mut text = serde_json::to_string_pretty(&crate::assembly::schema()).unwrap_or_default();
    text.push('\n');
    Answer::of_text(text.into_bytes())
}
