//! Typed values of BCF (VCF 4.3, section 6.3.3), with every length checked.
#![expect(
    clippy::indexing_slicing,
    reason = "`take` gives as many bytes as were asked for"
)]

use super::fault::{Fault, WRITE_AGAIN};

/// The types of BCF values.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Kind {
    /// No value.
    Missing,
    /// Integers of 1, 2 or 4 bytes.
    Int(usize),
    /// 32-bit floating point.
    Float,
    /// Characters.
    Text,
}

impl Kind {
    /// Bytes of one value.
    pub fn width(self) -> usize {
        match self {
            Kind::Missing => 0,
            Kind::Int(width) => width,
            Kind::Float => 4,
            Kind::Text => 1,
        }
    }
}

/// Reads a block from its start to its end.
#[derive(Debug, Clone, Copy)]
pub(super) struct Cursor<'a> {
    bytes: &'a [u8],
}

fn cut() -> Fault {
    Fault::new("a value of the record reaches beyond its end", WRITE_AGAIN)
}

impl<'a> Cursor<'a> {
    pub fn new(bytes: &'a [u8]) -> Self {
        Cursor { bytes }
    }

    /// Bytes that are left.
    pub fn left(&self) -> usize {
        self.bytes.len()
    }

    /// The next `n` bytes.
    pub fn take(&mut self, n: usize) -> Result<&'a [u8], Fault> {
        let (taken, rest) = self.bytes.split_at_checked(n).ok_or_else(cut)?;
        self.bytes = rest;
        Ok(taken)
    }

    /// The next four bytes as an integer.
    pub fn int32(&mut self) -> Result<i32, Fault> {
        let (taken, rest) = self.bytes.split_first_chunk::<4>().ok_or_else(cut)?;
        self.bytes = rest;
        Ok(i32::from_le_bytes(*taken))
    }

    /// A type and how many values of it follow.
    pub fn typed(&mut self) -> Result<(Kind, usize), Fault> {
        let (kind, length) = self.descriptor()?;
        if length < 15 {
            return Ok((kind, length));
        }
        // Fifteen and more: the number follows as a typed integer of its own.
        let length = match self.descriptor()? {
            (Kind::Int(width), 1) => self.int(width)?,
            _ => {
                return Err(Fault::new(
                    "a length in the record is no integer",
                    WRITE_AGAIN,
                ));
            }
        };
        let length = usize::try_from(length)
            .map_err(|_| Fault::new("a length in the record is negative", WRITE_AGAIN))?;
        Ok((kind, length))
    }

    fn descriptor(&mut self) -> Result<(Kind, usize), Fault> {
        let byte = self.take(1)?[0];
        let kind = match byte & 15 {
            0 => Kind::Missing,
            1 => Kind::Int(1),
            2 => Kind::Int(2),
            3 => Kind::Int(4),
            5 => Kind::Float,
            7 => Kind::Text,
            _ => {
                return Err(Fault::new(
                    "the record holds a value of unknown type",
                    WRITE_AGAIN,
                ));
            }
        };
        Ok((kind, usize::from(byte >> 4)))
    }

    fn int(&mut self, width: usize) -> Result<i32, Fault> {
        Ok(match *self.take(width)? {
            [a] => i32::from(a as i8),
            [a, b] => i32::from(i16::from_le_bytes([a, b])),
            [a, b, c, d] => i32::from_le_bytes([a, b, c, d]),
            _ => return Err(cut()),
        })
    }

    /// The number of a name of the header.
    pub fn key(&mut self) -> Result<u32, Fault> {
        let bad = || Fault::new("a key of the record is no number of a name", WRITE_AGAIN);
        match self.typed()? {
            (Kind::Int(width), 1) => u32::try_from(self.int(width)?).map_err(|_| bad()),
            _ => Err(bad()),
        }
    }

    /// A text, empty when missing.
    pub fn text(&mut self) -> Result<&'a [u8], Fault> {
        match self.typed()? {
            (Kind::Text, length) => self.take(length),
            (Kind::Missing, _) => Ok(&[]),
            _ => Err(Fault::new(
                "the record has a number where a text belongs",
                WRITE_AGAIN,
            )),
        }
    }

    /// Passes over one typed value for each of `times`.
    pub fn skip(&mut self, times: usize) -> Result<(), Fault> {
        let (kind, length) = self.typed()?;
        self.values(kind, length, times).map(|_| ())
    }

    /// The bytes of `times` vectors of `length` values each.
    pub fn values(&mut self, kind: Kind, length: usize, times: usize) -> Result<&'a [u8], Fault> {
        let size = kind
            .width()
            .checked_mul(length)
            .and_then(|n| n.checked_mul(times));
        self.take(size.ok_or_else(cut)?)
    }
}
