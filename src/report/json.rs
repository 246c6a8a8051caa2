//! Writes JSON: to a temporary file renamed into place, or to standard output.

use std::io::{self, Write};
use std::path::{Path, PathBuf};

use serde::Serialize;

use crate::error::{Error, Result};

/// Where a document goes: standard output, or a file that appears whole or not at all.
#[derive(Debug)]
pub struct Output {
    name: PathBuf,
    file: Option<WholeFile>,
}

impl Output {
    /// Prepares the place before the work; `None` is standard output.
    pub fn create(path: Option<&Path>) -> Result<Self> {
        let file = path.map(WholeFile::create).transpose()?;
        Ok(Output {
            name: path.unwrap_or(Path::new("standard output")).to_owned(),
            file,
        })
    }

    /// Writes a value as indented JSON with a final line end.
    pub fn json<T: Serialize>(self, value: &T) -> Result<()> {
        let text = serde_json::to_vec_pretty(value)
            .map_err(|e| Error::io(&self.name, "write", io::Error::other(e)))?;
        self.bytes(&[text.as_slice(), b"\n"].concat())
    }

    /// Writes bytes as they are.
    pub fn bytes(self, bytes: &[u8]) -> Result<()> {
        let failed = |e| Error::io(&self.name, "write", e);
        match self.file {
            Some(mut file) => {
                file.write_all(bytes).map_err(failed)?;
                file.finish()
            }
            None => {
                let mut out = io::stdout().lock();
                out.write_all(bytes)
                    .and_then(|()| out.flush())
                    .map_err(failed)
            }
        }
    }
}

/// A file that appears under its name only when it is complete.
#[derive(Debug)]
pub struct WholeFile {
    path: PathBuf,
    file: tempfile::NamedTempFile,
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
