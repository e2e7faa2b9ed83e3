//! Files that a mesh file names beside itself, and what of them is to be told.

use std::cell::RefCell;
use std::path::{Path, PathBuf};

use super::inputs::digest;
use crate::error::{Error, Kind, Result};
use crate::format::{Bytes, no_neighbours};

/// The neighbours of one mesh file.
pub(super) struct Beside {
    /// None of standard input.
    folder: Option<PathBuf>,
    hash: bool,
    read: RefCell<Vec<Neighbour>>,
}

/// A neighbour that was read.
#[derive(Clone, Debug)]
pub(super) struct Neighbour {
    pub(super) path: PathBuf,
    pub(super) bytes: u64,
    /// Where it was asked for.
    pub(super) sha256: Option<String>,
}

impl Beside {
    /// Of the mesh file at `path`; `-` has none. `hash` asks for the SHA-256 of each.
    pub(super) fn of(path: &Path, hash: bool) -> Self {
        let folder = (path.as_os_str() != "-").then(|| {
            let parent = path.parent().unwrap_or(Path::new(""));
            parent.to_path_buf()
        });
        Self {
            folder,
            hash,
            read: RefCell::default(),
        }
    }

    /// Opens the neighbour of a name, which the reader has seen to be no way out of the folder.
    ///
    /// # Errors
    /// `not-found` where it is not there or no plain file.
    pub(super) fn open(&self, name: &str) -> Result<Bytes> {
        let Some(folder) = &self.folder else {
            return no_neighbours(name);
        };
        let path = folder.join(name);
        if std::fs::metadata(&path).is_ok_and(|m| !m.is_file()) {
            return Err(Error::new(
                Kind::NotFound,
                format!("\"{name}\", which it names beside itself, is no plain file"),
                "put the buffer there",
            ));
        }
        let bytes = Bytes::open(&path)?;
        self.read.borrow_mut().push(Neighbour {
            path,
            bytes: bytes.len() as u64,
            sha256: self.hash.then(|| digest(&bytes)),
        });
        Ok(bytes)
    }

    /// Those that were read.
    pub(super) fn read(self) -> Vec<Neighbour> {
        self.read.into_inner()
    }
}
