//! Which files a survey is of.

use std::collections::HashSet;
use std::ffi::OsStr;
use std::path::{Component, Path, PathBuf};

use globset::{GlobBuilder, GlobMatcher};

use crate::error::{Error, Kind, Result};
use crate::format::Family;

/// The files that `wheres` name, each once, in order: folders with all below them and globs sorted
/// by path, taking files whose extension is a mesh's; a file that is named is taken whatever it is
/// called. A folder that cannot be read comes with its error.
///
/// # Errors
/// `usage` for a pattern that is no glob.
pub fn files(wheres: &[PathBuf]) -> Result<Vec<(PathBuf, Option<Error>)>> {
    let mut out = Vec::new();
    let mut seen = HashSet::new();
    for place in wheres {
        let mut found = Vec::new();
        if place.is_dir() {
            walk(place, &mut found, &|_| true);
        } else if let Some((base, glob)) = pattern(place)? {
            walk(&base, &mut found, &|path| glob.is_match(path));
        } else {
            found.push((place.clone(), None));
        }
        found.sort_by(|a, b| a.0.cmp(&b.0));
        out.extend(found.into_iter().filter(|f| seen.insert(f.0.clone())));
    }
    Ok(out)
}

/// The folder that a glob begins in, and the glob; `None` for a name that is none, or that exists.
fn pattern(place: &Path) -> Result<Option<(PathBuf, GlobMatcher)>> {
    let is_magic = |s: &OsStr| s.as_encoded_bytes().iter().any(|b| b"*?[{".contains(b));
    let Some(text) = place.to_str().filter(|_| !place.exists()) else {
        return Ok(None);
    };
    let before = |c: &Component<'_>| !is_magic(c.as_os_str());
    let base: PathBuf = place.components().take_while(before).collect();
    if base.components().count() == place.components().count() {
        return Ok(None);
    }
    let glob = GlobBuilder::new(text.strip_prefix("./").unwrap_or(text))
        .literal_separator(true)
        .build()
        .map_err(|e| {
            Error::new(
                Kind::Usage,
                format!("`{text}` is no glob: {}", e.kind()),
                "use * and ? for characters, ** for folders, [ab] and {a,b} for a choice",
            )
        })?;
    Ok(Some((base, glob.compile_matcher())))
}

fn walk(folder: &Path, out: &mut Vec<(PathBuf, Option<Error>)>, wanted: &dyn Fn(&Path) -> bool) {
    let here = if folder.as_os_str().is_empty() {
        Path::new(".")
    } else {
        folder
    };
    let entries = match std::fs::read_dir(here) {
        Ok(entries) => entries,
        Err(e) => {
            let error = Error::new(
                Kind::NotFound,
                format!("cannot read the folder: {e}"),
                "check the path and its permissions",
            );
            return out.push((folder.to_path_buf(), Some(error.in_file(folder))));
        }
    };
    for entry in entries.flatten() {
        let path = folder.join(entry.file_name());
        let Ok(kind) = entry.file_type() else {
            continue;
        };
        // A link to a folder may lead back up.
        if kind.is_dir() {
            walk(&path, out, wanted);
        } else if Family::from_path(&path).is_some() && !path.is_dir() && wanted(&path) {
            out.push((path, None));
        }
    }
}
