//! Files that are written whole or not at all.

use std::fs::{File, OpenOptions};
use std::io::{self, BufWriter, Write};
use std::path::{Path, PathBuf};

use crate::error::{Error, Kind, Result};

/// Writes a file beside its place, forces it to the disc, and only then gives it its name: whoever
/// opens `path` finds the old file or the whole new one.
///
/// # Errors
/// `cannot-write`; nothing is left behind then.
pub fn write_whole(
    path: &Path,
    write: impl FnOnce(&mut dyn Write) -> io::Result<()>,
) -> Result<()> {
    let fail = |e: io::Error| {
        Error::new(
            Kind::CannotWrite,
            format!("cannot write: {e}"),
            "check the folder, its permissions and the room on the disc",
        )
        .in_file(path)
    };
    if path.is_dir() {
        return Err(fail(io::Error::other("it is a folder")));
    }
    let (file, beside) = create_beside(path).map_err(fail)?;
    let done = fill(file, write).and_then(|()| std::fs::rename(&beside, path));
    if let Err(e) = done {
        // What cannot be taken away either is in nobody's way: its name is its own.
        let _ = std::fs::remove_file(&beside);
        return Err(fail(e));
    }
    // The new name is on the disc once the folder is; where a folder cannot be opened, the file
    // still is whole.
    if let Ok(folder) = File::open(folder_of(path)) {
        let _ = folder.sync_all();
    }
    Ok(())
}

fn folder_of(path: &Path) -> &Path {
    match path.parent() {
        Some(p) if !p.as_os_str().is_empty() => p,
        _ => Path::new("."),
    }
}

fn create_beside(path: &Path) -> io::Result<(File, PathBuf)> {
    let name = path
        .file_name()
        .ok_or_else(|| io::Error::other("it names no file"))?;
    for n in 0..1000 {
        let mut own = std::ffi::OsString::from(".");
        own.push(name);
        own.push(format!(".{}-{n}.part", std::process::id()));
        let beside = folder_of(path).join(own);
        match OpenOptions::new()
            .write(true)
            .create_new(true)
            .open(&beside)
        {
            Ok(file) => return Ok((file, beside)),
            Err(e) if e.kind() == io::ErrorKind::AlreadyExists => {}
            Err(e) => return Err(e),
        }
    }
    Err(io::Error::other(
        "a thousand unfinished files stand beside it",
    ))
}

fn fill(file: File, write: impl FnOnce(&mut dyn Write) -> io::Result<()>) -> io::Result<()> {
    let mut out = BufWriter::with_capacity(1 << 16, file);
    write(&mut out)?;
    out.into_inner()
        .map_err(io::IntoInnerError::into_error)?
        .sync_all()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_failure_leaves_the_old_file_and_nothing_else() {
        let folder = tempfile::tempdir().unwrap();
        let path = folder.path().join("a.obj");
        write_whole(&path, |w| w.write_all(b"old")).unwrap();
        let e = write_whole(&path, |w| {
            w.write_all(b"half")?;
            Err(io::Error::other("no room"))
        })
        .unwrap_err();
        assert_eq!(e.kind, Kind::CannotWrite);
        assert_eq!(std::fs::read(&path).unwrap(), b"old");
        assert_eq!(std::fs::read_dir(folder.path()).unwrap().count(), 1);
        let nowhere = folder.path().join("none/a.obj");
        assert_eq!(
            write_whole(&nowhere, |_| Ok(())).unwrap_err().kind,
            Kind::CannotWrite
        );
    }
}
