//! The header of a gzip member (RFC 1952), and whether it is a BGZF block.
#![expect(
    clippy::indexing_slicing,
    reason = "`need` gives at least as many bytes as were asked for, or a fault"
)]

use libdeflater::crc32;

use super::fault::{COPY_AGAIN, Fault};
use super::source::Source;
use crate::error::{Error, Place, Result};

/// First two bytes of every gzip member.
pub(super) const GZIP_MAGIC: [u8; 2] = [0x1f, 0x8b];
/// Method 8, deflate: the only one there is.
const DEFLATE: u8 = 8;
const HEADER_CHECKED: u8 = 1 << 1;
const HAS_EXTRA: u8 = 1 << 2;
const HAS_NAME: u8 = 1 << 3;
const HAS_COMMENT: u8 = 1 << 4;
const RESERVED: u8 = 0b1110_0000;
/// Longest header that is read: a full extra field and as much again for name and comment.
const MAX_MEMBER_HEADER: usize = 128 << 10;

/// What the header of a member says.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum MemberHead {
    /// A BGZF block: bytes of the header, and of the whole block.
    Block { header: usize, block: usize },
    /// Any other member: bytes of the header.
    Stream { header: usize },
}

/// Reads the header of the member that begins at the next byte; takes nothing.
///
/// # Errors
/// The header is cut, or is none.
pub(super) fn member_head(source: &mut Source) -> Result<MemberHead> {
    let start = source.peek(2)?;
    if !GZIP_MAGIC.starts_with(&start[..start.len().min(2)]) {
        let fault = Fault::new(
            "bytes that are not compressed data follow the compressed data",
            "the end of the file is damaged, or something was appended: make the file again",
        );
        return Err(fault.at(source.path(), Place::Byte(source.offset())));
    }
    let head = need(source, 12)?;
    let (method, flags) = (head[2], head[3]);
    let mut length = 10;
    let mut block = None;
    if method != DEFLATE || flags & RESERVED != 0 {
        return Err(damaged(
            source,
            "the header of a compressed block is damaged",
        ));
    }
    if flags & HAS_EXTRA != 0 {
        length = 12 + usize::from(u16::from_le_bytes([head[10], head[11]]));
        block = block_size(&need(source, length)?[12..length]);
    }
    for flag in [HAS_NAME, HAS_COMMENT] {
        if flags & flag != 0 {
            length = after_nul(source, length)?;
        }
    }
    if flags & HEADER_CHECKED != 0 {
        let bytes = need(source, length + 2)?;
        let stated = u16::from_le_bytes([bytes[length], bytes[length + 1]]);
        if crc32(&bytes[..length]) as u16 != stated {
            return Err(damaged(
                source,
                "the checksum of a block header does not match",
            ));
        }
        length += 2;
    }
    match block {
        // The eight bytes of checksum and size are the least that follow a header.
        Some(block) if block < length + 8 => Err(damaged(
            source,
            "a compressed block claims to be shorter than its header",
        )),
        Some(block) => Ok(MemberHead::Block {
            header: length,
            block,
        }),
        None => Ok(MemberHead::Stream { header: length }),
    }
}

fn damaged(source: &Source, problem: &str) -> Error {
    Fault::new(problem, COPY_AGAIN).at(source.path(), Place::Byte(source.offset()))
}

/// The bytes of the header, at least `wanted` of them.
fn need(source: &mut Source, wanted: usize) -> Result<&[u8]> {
    if source.peek(wanted)?.len() < wanted {
        return Err(damaged(
            source,
            "the file ends inside the header of a compressed block",
        ));
    }
    source.peek(wanted)
}

/// The size of the whole block, from the `BC` field of BGZF (SAM specification, section 4.1).
fn block_size(mut extra: &[u8]) -> Option<usize> {
    while let [first, second, low, high, rest @ ..] = extra {
        let length = usize::from(u16::from_le_bytes([*low, *high]));
        let value = rest.get(..length)?;
        if (*first, *second, length) == (b'B', b'C', 2) {
            return Some(usize::from(u16::from_le_bytes([value[0], value[1]])) + 1);
        }
        extra = &rest[length..];
    }
    None
}

/// Where the text that begins at `from` ends, its NUL included.
fn after_nul(source: &mut Source, from: usize) -> Result<usize> {
    let mut wanted = from + 256;
    loop {
        let bytes = source.peek(wanted.min(MAX_MEMBER_HEADER))?;
        if let Some(at) = bytes.get(from..).and_then(|b| memchr::memchr(0, b)) {
            return Ok(from + at + 1);
        }
        if bytes.len() < wanted {
            return Err(damaged(
                source,
                "the header of a compressed block has no end",
            ));
        }
        wanted *= 2;
    }
}
