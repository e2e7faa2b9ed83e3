//! The bytes of a file, mapped or owned.

use std::fs::File;
use std::io::Read;
use std::ops::Deref;
use std::path::Path;

use crate::error::{Error, Kind, Result};

/// The bytes of one input. Regular files are mapped, never copied whole; streams are owned.
pub enum Bytes {
    /// A file mapped into memory.
    Mapped(memmap2::Mmap),
    /// Bytes held in memory.
    Owned(Vec<u8>),
}

impl std::fmt::Debug for Bytes {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        write!(f, "Bytes({})", self.len())
    }
}

impl Deref for Bytes {
    type Target = [u8];
    fn deref(&self) -> &[u8] {
        match self {
            Self::Mapped(map) => map,
            Self::Owned(vec) => vec,
        }
    }
}

impl Bytes {
    /// Opens the file at `path`.
    ///
    /// # Errors
    /// `not-found` where it cannot be opened or is a folder, with the system's cause.
    pub fn open(path: &Path) -> Result<Self> {
        let fail = |e: std::io::Error| {
            Error::new(
                Kind::NotFound,
                format!("cannot read the file: {e}"),
                "check the path and the permissions",
            )
            .in_file(path)
        };
        let mut file = File::open(path).map_err(fail)?;
        let meta = file.metadata().map_err(fail)?;
        if meta.is_dir() {
            return Err(Error::new(
                Kind::NotFound,
                "this is a folder, not a mesh file",
                "name a file in it",
            )
            .in_file(path));
        }
        if meta.is_file() && meta.len() > 0 {
            // SAFETY: the map is read-only and private to this process. If another process
            // truncates the file meanwhile the system may stop us, as for any mapped reader;
            // nothing here depends on the bytes staying the same for memory safety.
            #[allow(unsafe_code)]
            if let Ok(map) = unsafe { memmap2::Mmap::map(&file) } {
                return Ok(Self::Mapped(map));
            }
        }
        // Pipes and devices have no length to map.
        let mut all = Vec::new();
        file.read_to_end(&mut all).map_err(fail)?;
        Ok(Self::Owned(all))
    }

    /// Reads all of standard input.
    ///
    /// # Errors
    /// `not-found` where reading fails.
    pub fn from_stdin() -> Result<Self> {
        let mut all = Vec::new();
        std::io::stdin().lock().read_to_end(&mut all).map_err(|e| {
            Error::new(
                Kind::NotFound,
                format!("cannot read standard input: {e}"),
                "pipe a mesh file into it",
            )
            .in_file(Path::new("-"))
        })?;
        Ok(Self::Owned(all))
    }
}

/// The most bytes that one input may take in memory beyond itself: half of what the system says is
/// free, and half of what the process is held to; 2 GiB where neither is said.
pub fn memory_budget() -> u64 {
    let text = |path: &str| std::fs::read_to_string(path).ok();
    let free = text("/proc/meminfo").and_then(|all| {
        let line = all.lines().find(|l| l.starts_with("MemAvailable:"))?;
        let kib: u64 = line.split_ascii_whitespace().nth(1)?.parse().ok()?;
        kib.checked_mul(1024)
    });
    let held = text("/sys/fs/cgroup/memory.max").and_then(|t| t.trim().parse::<u64>().ok());
    match (free, held) {
        (Some(a), Some(b)) => a.min(b) / 2,
        (Some(a), None) | (None, Some(a)) => a / 2,
        (None, None) => 2 << 30,
    }
}
