//! The built program, run inside the repository.
#![allow(dead_code, reason = "each test uses some of it")]

use std::path::{Path, PathBuf};
use std::process::{Command, Output};

use serde_json::Value;

/// The repository's folder.
pub(crate) fn repository() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).to_path_buf()
}

/// Runs the program in the repository's folder.
pub(crate) fn bismar(arguments: &[&str]) -> Output {
    Command::new(env!("CARGO_BIN_EXE_bismar"))
        .args(arguments)
        .current_dir(repository())
        .env_remove("RAYON_NUM_THREADS")
        .output()
        .unwrap()
}

/// Its answer as JSON, with the exit code.
pub(crate) fn json(arguments: &[&str]) -> (Value, i32) {
    let out = bismar(arguments);
    let text = String::from_utf8(out.stdout).unwrap();
    let value = serde_json::from_str(&text).unwrap_or_else(|e| {
        panic!(
            "{arguments:?}: {e}: {text} {:?}",
            String::from_utf8_lossy(&out.stderr)
        )
    });
    (value, out.status.code().unwrap())
}

/// Files in a folder of the repository (and below, if `deep`) with one of the extensions, as
/// paths from the repository, sorted.
pub(crate) fn files(folder: &str, extensions: &[&str], deep: bool) -> Vec<String> {
    let mut out = Vec::new();
    for entry in std::fs::read_dir(repository().join(folder)).unwrap() {
        let entry = entry.unwrap();
        let name = format!("{folder}/{}", entry.file_name().to_str().unwrap());
        if entry.path().is_dir() {
            if deep {
                out.extend(files(&name, extensions, true));
            }
        } else if extensions.iter().any(|e| name.ends_with(&format!(".{e}"))) {
            out.push(name);
        }
    }
    out.sort();
    out
}
