//! Writes JSON: to a temporary file renamed into place, or to standard output.

use std::io::{self, Write};
use std::path::{Path, PathBuf};

use serde::Serialize;

use crate::error::{Error, Result};
use crate::files::WholeFile;

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
