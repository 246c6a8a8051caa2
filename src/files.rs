//! Files that appear under their name only when they are whole.
//!
//! A file is written beside its place under a temporary name and renamed at the end. What a failure
//! leaves is removed as values are dropped; what a signal would leave is removed by
//! [`remove_unfinished`], for which the temporary names are kept in the one list of this module: the
//! only state of the program that is not passed from hand to hand.

use std::collections::BTreeSet;
use std::io::{self, Write};
use std::path::{Path, PathBuf};
use std::sync::{Mutex, PoisonError};

use crate::error::{Error, Result};

/// Temporary names in use.
static UNFINISHED: Mutex<BTreeSet<PathBuf>> = Mutex::new(BTreeSet::new());

/// A file that appears under its name only when it is complete.
#[derive(Debug)]
pub struct WholeFile {
    path: PathBuf,
    file: tempfile::NamedTempFile,
    _listed: Listed,
}

/// A name in the list, as long as this value lives.
#[derive(Debug)]
struct Listed(PathBuf);

impl Listed {
    fn new(path: &Path) -> Self {
        list().insert(path.to_owned());
        Listed(path.to_owned())
    }
}

impl Drop for Listed {
    fn drop(&mut self) {
        list().remove(&self.0);
    }
}

fn list() -> std::sync::MutexGuard<'static, BTreeSet<PathBuf>> {
    UNFINISHED.lock().unwrap_or_else(PoisonError::into_inner)
}

/// Removes every file that is not finished; for the moment before a signal ends the program.
pub fn remove_unfinished() {
    for path in list().iter() {
        // Gone already, or not ours to remove any more: nothing is left to do either way.
        let _ = std::fs::remove_file(path);
    }
}

impl WholeFile {
    /// Creates the temporary file beside the final one, so that a wrong folder is told before the work.
    pub fn create(path: &Path) -> Result<Self> {
        let folder = match path.parent() {
            Some(p) if !p.as_os_str().is_empty() => p,
            _ => Path::new("."),
        };
        let mut builder = tempfile::Builder::new();
        builder.prefix(".genewane-");
        #[cfg(unix)]
        {
            use std::os::unix::fs::PermissionsExt;
            // The process mask narrows this, as for any file a program creates.
            builder.permissions(std::fs::Permissions::from_mode(0o666));
        }
        let file = builder
            .tempfile_in(folder)
            .map_err(|e| Error::io(path, "create", e))?;
        Ok(WholeFile {
            path: path.to_owned(),
            _listed: Listed::new(file.path()),
            file,
        })
    }

    /// Puts the file under its name.
    pub fn finish(self) -> Result<()> {
        let path = self.path;
        self.file
            .as_file()
            .sync_all()
            .map_err(|e| Error::io(&path, "write", e))?;
        self.file
            .persist(&path)
            .map_err(|e| Error::io(&path, "rename into place", e.error))?;
        Ok(())
    }
}

impl Write for WholeFile {
    fn write(&mut self, bytes: &[u8]) -> io::Result<usize> {
        self.file.write(bytes)
    }

    fn flush(&mut self) -> io::Result<()> {
        self.file.flush()
    }
}
