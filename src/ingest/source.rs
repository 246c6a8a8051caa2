//! The bytes of a file or of standard input as they are, counted and digested on the way.
#![expect(
    clippy::indexing_slicing,
    reason = "start and end stay within the buffer"
)]

use std::fs::File;
use std::io::{self, Read, Seek, SeekFrom};
use std::path::{Path, PathBuf};

use sha2::{Digest, Sha256};

use crate::error::{Error, Result};
use crate::model::hexadecimal;

/// Bytes held at a time: four of the largest compressed blocks.
const BUFFER_BYTES: usize = 256 << 10;

/// Size and digest of everything read, for the provenance of a report.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct InputDigest {
    /// Bytes of the file as it is on disk; of its parts that were read, where only regions were.
    pub bytes: u64,
    /// SHA-256 of these bytes, as 64 hexadecimal digits.
    pub sha256: String,
}

/// A stream of bytes that can be looked at before they are taken.
pub(super) struct Source {
    path: PathBuf,
    stream: Box<dyn Read + Send>,
    buffer: Vec<u8>,
    start: usize,
    end: usize,
    offset: u64,
    taken: u64,
    digest: Sha256,
}

impl Source {
    /// Opens a file, or standard input for `-`.
    pub fn open(path: &Path) -> Result<Self> {
        let stream: Box<dyn Read + Send> = if path == Path::new("-") {
            Box::new(io::stdin())
        } else {
            Box::new(File::open(path).map_err(|e| Error::io(path, "open", e))?)
        };
        Ok(Source::new(path, stream))
    }

    /// Reads any stream under the name `path`.
    pub fn new(path: &Path, stream: Box<dyn Read + Send>) -> Self {
        Source {
            path: path.into(),
            stream,
            buffer: vec![0; BUFFER_BYTES],
            start: 0,
            end: 0,
            offset: 0,
            taken: 0,
            digest: Sha256::new(),
        }
    }

    /// The name under which the user knows this input.
    pub fn path(&self) -> &Path {
        &self.path
    }

    /// Where the next byte stands in the file.
    pub fn offset(&self) -> u64 {
        self.offset
    }

    /// The next bytes: at least `wanted` of them unless the file ends before.
    pub fn peek(&mut self, wanted: usize) -> Result<&[u8]> {
        debug_assert!(wanted <= BUFFER_BYTES);
        if self.start + wanted > self.buffer.len() {
            self.buffer.copy_within(self.start..self.end, 0);
            self.end -= self.start;
            self.start = 0;
        }
        while self.end - self.start < wanted {
            match self.stream.read(&mut self.buffer[self.end..]) {
                Ok(0) => break,
                Ok(n) => self.end += n,
                Err(e) if e.kind() == io::ErrorKind::Interrupted => {}
                Err(e) => return Err(Error::io(&self.path, "read", e)),
            }
        }
        Ok(&self.buffer[self.start..self.end])
    }

    /// Takes `n` bytes that were looked at.
    pub fn consume(&mut self, n: usize) {
        debug_assert!(n <= self.end - self.start);
        self.digest.update(&self.buffer[self.start..self.start + n]);
        self.start += n;
        self.offset += n as u64;
        self.taken += n as u64;
        if self.start == self.end {
            self.start = 0;
            self.end = 0;
        }
    }

    /// Goes on at another place of the file, which must be one that has places.
    pub fn seek(&mut self, offset: u64) -> Result<()> {
        let mut file = File::open(&self.path).map_err(|e| Error::io(&self.path, "open", e))?;
        file.seek(SeekFrom::Start(offset))
            .map_err(|e| Error::io(&self.path, "read", e))?;
        self.stream = Box::new(file);
        (self.start, self.end, self.offset) = (0, 0, offset);
        Ok(())
    }

    /// Size and digest of all that was taken from the stream so far.
    pub fn digest(&self) -> InputDigest {
        InputDigest {
            bytes: self.taken,
            sha256: hexadecimal(&self.digest.clone().finalize()),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Gives one byte at a time, as a pipe may.
    struct Drip(Vec<u8>, usize);

    impl Read for Drip {
        fn read(&mut self, out: &mut [u8]) -> io::Result<usize> {
            let Some(&byte) = self.0.get(self.1) else {
                return Ok(0);
            };
            self.1 += 1;
            out[0] = byte;
            Ok(1)
        }
    }

    #[test]
    fn looks_ahead_and_digests() {
        let mut source = Source::new(Path::new("x"), Box::new(Drip(b"abc".to_vec(), 0)));
        assert_eq!(source.peek(2).unwrap(), b"ab");
        source.consume(1);
        assert_eq!(source.offset(), 1);
        assert_eq!(source.peek(5).unwrap(), b"bc");
        source.consume(2);
        // FIPS 180-2, appendix B.1: the digest of "abc".
        assert_eq!(
            source.digest(),
            InputDigest {
                bytes: 3,
                sha256: "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad".into()
            }
        );
    }
}
