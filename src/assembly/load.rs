//! Reads an assembly file and the files that it includes; all faults of all of them together.

use std::fmt::Write as _;
use std::fs::File;
use std::io::Read as _;
use std::path::{Path, PathBuf};

use serde::Serialize;
use sha2::{Digest as _, Sha256};

use super::expand;
use super::file::{AssemblyFile, MeshChoice};
use super::reader::Shared;
use super::{read, service, smear, tree};
use crate::error::{Error, Kind, Warning};
use crate::format::{Family, detect};

/// The deepest nesting of groups and included files.
pub const DEEPEST: usize = 32;
/// The largest assembly file, in bytes.
const LARGEST: u64 = 16 << 20;
/// The most inclusions of files in one assembly, repeats counted.
const MOST_FILES: usize = 1000;

/// A file that a result was computed from.
#[derive(Clone, Debug, PartialEq, Eq, Serialize)]
pub struct Input {
    /// As shown to the user.
    pub path: String,
    /// Its length.
    pub bytes: u64,
    /// SHA-256 in hexadecimal.
    pub sha256: Option<String>,
}

/// An assembly whose files are without fault; no mesh has been read yet.
#[derive(Clone, Debug)]
pub struct Loaded {
    /// The file itself.
    pub file: AssemblyFile,
    /// What was ignored or looks odd.
    pub warnings: Vec<Warning>,
    /// The assembly file and those that it includes.
    pub inputs: Vec<Input>,
}

/// Reads the assembly at `path` (TOML, or JSON of the same shape) with all that it includes.
///
/// # Errors
/// Every fault found: file by file in the order of their inclusion, by line within a file.
pub fn load(path: &Path) -> Result<Loaded, Vec<Error>> {
    let mut loader = Loader::default();
    let file = loader.file(path, 0);
    let mut errors: Vec<Error> = loader.errors.into_iter().flatten().collect();
    let Some(file) = file.filter(|_| errors.is_empty()) else {
        return Err(errors);
    };
    errors.extend(expand::faults(&file));
    if errors.is_empty() {
        errors.extend(service::faults(&file));
        errors.extend(smear::faults(&file));
    }
    if !errors.is_empty() {
        return Err(errors);
    }
    Ok(Loaded {
        file,
        warnings: loader.warnings,
        inputs: loader.inputs,
    })
}

/// What is carried while files include each other.
#[derive(Default)]
pub(super) struct Loader {
    /// Resolved paths of the files being read, outermost first.
    open: Vec<PathBuf>,
    /// One list a file, in the order in which they were begun.
    errors: Vec<Vec<Error>>,
    warnings: Vec<Warning>,
    inputs: Vec<Input>,
    included: usize,
    /// That there are too many is said once.
    too_many_said: bool,
}

impl Loader {
    /// Reads one file; `None` where nothing of it could be read.
    fn file(&mut self, path: &Path, depth: usize) -> Option<AssemblyFile> {
        let slot = self.errors.len();
        self.errors.push(Vec::new());
        let text = match self.text(path) {
            Ok(text) => text,
            Err(e) => {
                self.errors[slot].push(e.in_file(path));
                return None;
            }
        };
        let json = path
            .extension()
            .is_some_and(|e| e.eq_ignore_ascii_case("json"));
        let (entries, faults) = tree::parse(&text, json);
        let faults = faults.into_iter().map(|e| e.in_file(path)).collect();
        let Some(entries) = entries else {
            self.errors[slot] = faults;
            return None;
        };
        let mut shared = Shared::new(path, faults);
        shared.depth = depth;
        self.open
            .push(path.canonicalize().unwrap_or_else(|_| path.to_path_buf()));
        let file = read::file(&mut shared, &entries, self);
        self.open.pop();
        self.errors[slot] = shared.take_faults();
        if let (true, Some(line)) = (depth > 0, file.service.first_line()) {
            self.warnings.push(Warning {
                kind: "service-ignored".into(),
                message:
                    "gravity, cases, motions, phases and frames of an included file are not used"
                        .into(),
                path: Some(path.to_string_lossy().into_owned()),
                line: Some(line),
                advice: "state them in the outer file, with the paths that things have there"
                    .into(),
            });
        }
        if depth > 0 && !file.limits.is_empty() {
            let names: Vec<&str> = file.limits.iter().map(|l| l.name.as_str()).collect();
            self.warnings.push(Warning {
                kind: "limits-ignored".into(),
                message: format!(
                    "limits of an included file are not judged: {}",
                    super::listed(&names)
                ),
                path: Some(path.to_string_lossy().into_owned()),
                line: file.limits.first().map(|l| l.line),
                advice:
                    "balance that file by itself to judge them, or state them in the outer file"
                        .into(),
            });
        }
        if depth > 0 && (file.stand.is_some() || file.hang.is_some()) {
            self.warnings.push(Warning {
                kind: "supports-ignored".into(),
                message: "an included file states supports or a hook, and only those of the outer file count".into(),
                path: Some(path.to_string_lossy().into_owned()),
                line: file.hang.as_ref().map(|h| h.line),
                advice: "balance that file by itself, or state them in the outer file".into(),
            });
        }
        Some(file)
    }

    fn text(&mut self, path: &Path) -> Result<String, Error> {
        let cannot = |e: std::io::Error| {
            Error::new(
                Kind::NotFound,
                format!("the assembly file cannot be read: {e}"),
                "check the path and its permissions",
            )
        };
        let file = File::open(path).map_err(cannot)?;
        let mut bytes = Vec::new();
        // A file named as a mesh may be far larger than any assembly.
        let a_mesh = || {
            Error::new(
                Kind::UnknownFormat,
                "this is a mesh, not an assembly file",
                "weigh it with `bismar weigh`, or name it as the `mesh` of a part in an assembly file (TOML)",
            )
        };
        if Family::from_path(path).is_some() {
            return Err(a_mesh());
        }
        // One byte more than allowed is enough to know, whatever the file claims its length to be.
        file.take(LARGEST + 1)
            .read_to_end(&mut bytes)
            .map_err(cannot)?;
        if bytes.len() as u64 > LARGEST {
            return Err(Error::new(
                Kind::TooLarge,
                format!(
                    "an assembly file of more than {} MiB is not read",
                    LARGEST >> 20
                ),
                "split it with `include`; meshes stay in files of their own",
            ));
        }
        let shown = path.to_string_lossy().into_owned();
        if !self.inputs.iter().any(|i| i.path == shown) {
            let mut sha256 = String::new();
            for byte in Sha256::digest(&bytes) {
                let _ = write!(sha256, "{byte:02x}");
            }
            self.inputs.push(Input {
                path: shown,
                bytes: bytes.len() as u64,
                sha256: Some(sha256),
            });
        }
        String::from_utf8(bytes).map_err(|e| {
            if detect(e.as_bytes(), path, None).is_ok() {
                return a_mesh();
            }
            let valid = e.utf8_error().valid_up_to();
            let before = &e.as_bytes()[..valid];
            let line = before.iter().filter(|b| **b == b'\n').count() as u64 + 1;
            Error::new(
                Kind::UnknownFormat,
                "an assembly file is UTF-8 text, and this is not",
                "save it as UTF-8",
            )
            .at_line(line)
        })
    }

    /// Whether an entry nests too deep; a fault then.
    pub(super) fn deep(&mut self, shared: &Shared<'_>, depth: usize, line: u64) -> bool {
        let deep = shared.depth + depth >= DEEPEST;
        if deep {
            shared.fault(
                line,
                Kind::Cycle,
                format!("groups and included files nest more than {DEEPEST} deep"),
                "nest less deep",
            );
        }
        deep
    }

    /// Reads the file that a group includes.
    pub(super) fn include(
        &mut self,
        shared: &Shared<'_>,
        typed: &str,
        line: u64,
        depth: usize,
    ) -> Option<AssemblyFile> {
        let path = beside(shared.path, typed);
        if !path.is_file() {
            let list = neighbours(&path, &["toml", "json"]);
            let message = format!("there is no assembly file `{typed}`");
            shared.fault(line, Kind::NotFound, message, here("assembly files", &list));
            return None;
        }
        let resolved = path.canonicalize().unwrap_or_else(|_| path.clone());
        if let Some(first) = self.open.iter().position(|p| *p == resolved) {
            let circle = self.open[first..].iter().chain([&resolved]);
            let names: Vec<String> = circle
                .map(|p| {
                    p.file_name()
                        .unwrap_or_default()
                        .to_string_lossy()
                        .into_owned()
                })
                .collect();
            let message = format!(
                "files include each other in a circle: {}",
                names.join(" → ")
            );
            shared.fault(
                line,
                Kind::Cycle,
                message,
                "take one `include` out of the circle",
            );
            return None;
        }
        self.included += 1;
        if self.included > MOST_FILES {
            if !self.too_many_said {
                self.too_many_said = true;
                let message = format!("files are included more than {MOST_FILES} times");
                shared.fault(
                    line,
                    Kind::TooLarge,
                    message,
                    "repeat a group with `places` instead",
                );
            }
            return None;
        }
        self.file(&path, shared.depth + depth)
    }

    /// The mesh file and body that `mesh =` names. A file that has the whole text as its name is
    /// meant; else the text is split at its last `#`. Where no file stands before that one, an
    /// earlier `#` before which there is one splits it: names of bodies may hold `#` too.
    pub(super) fn mesh(
        &mut self,
        shared: &Shared<'_>,
        typed: &str,
        line: u64,
    ) -> Option<MeshChoice> {
        let whole = beside(shared.path, typed);
        let splits = typed
            .rmatch_indices('#')
            .map(|(at, _)| (&typed[..at], &typed[at + 1..]));
        let split = splits
            .clone()
            .find(|(file, _)| beside(shared.path, file).is_file());
        let (file, body) = match split.or_else(|| splits.clone().next()) {
            Some((file, body)) if !whole.is_file() => (file, Some(body)),
            _ => (typed, None),
        };
        if body.is_some_and(str::is_empty) {
            let advice = "name the body after #, or leave # out for all bodies of the file";
            shared.fault(
                line,
                Kind::Usage,
                format!("`{typed}` names no body after #"),
                advice,
            );
            return None;
        }
        let path = beside(shared.path, file);
        if !path.is_file() {
            let list = neighbours(&path, &["stl", "obj", "3mf", "ply", "off", "gltf", "glb"]);
            let message = if path.is_dir() {
                format!("`{file}` is a folder, and a part's mesh is a file")
            } else {
                format!("there is no mesh file `{file}`")
            };
            shared.fault(line, Kind::NotFound, message, here("mesh files", &list));
            return None;
        }
        Some(MeshChoice {
            path,
            typed: file.to_string(),
            body: body.map(str::to_string),
            line,
        })
    }
}

/// A path typed in a file, from that file's folder.
fn beside(file: &Path, typed: &str) -> PathBuf {
    file.parent().unwrap_or(Path::new("")).join(typed)
}

/// Names of the files of some kinds in the folder where `path` was looked for, sorted.
fn neighbours(path: &Path, kinds: &[&str]) -> Vec<String> {
    let folder = path.parent().filter(|p| !p.as_os_str().is_empty());
    let Ok(folder) = std::fs::read_dir(folder.unwrap_or(Path::new("."))) else {
        return Vec::new();
    };
    let mut names: Vec<String> = folder
        .flatten()
        .map(|entry| PathBuf::from(entry.file_name()))
        .filter(|name| {
            let kind = name.extension().unwrap_or_default();
            kinds.iter().any(|k| kind.eq_ignore_ascii_case(k))
        })
        .map(|name| name.to_string_lossy().into_owned())
        .collect();
    names.sort_unstable();
    names
}

fn here(what: &str, names: &[String]) -> String {
    if names.is_empty() {
        return format!("there are no {what} in that folder; paths are relative to this file");
    }
    let names: Vec<&str> = names.iter().map(String::as_str).collect();
    format!("the {what} in that folder are {}", super::listed(&names))
}
