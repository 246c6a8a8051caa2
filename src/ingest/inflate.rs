//! Decompression: plain bytes, gzip of one or many members, and BGZF, told apart by their bytes.
//!
//! BGZF blocks are inflated here, not by a library, for three reasons: a file cut inside the header
//! of a block must be noticed, the end-of-file marker must be asked for, and a block can be inflated
//! straight into the batch with one decompressor for all blocks.
#![expect(
    clippy::indexing_slicing,
    reason = "lengths were asked of the same buffer"
)]

use std::ops::Range;

use flate2::{Decompress, FlushDecompress, Status};
use libdeflater::{Crc, Decompressor, crc32};

use super::fault::{COPY_AGAIN, Fault};
use super::gzip::{GZIP_MAGIC, MemberHead, member_head};
use super::source::{InputDigest, Source};
use crate::error::{Place, Result};

/// Most bytes a BGZF block may hold, compressed or not.
const MAX_BLOCK_BYTES: usize = 1 << 16;
/// Bytes that are passed on at a time where the format has no blocks.
const PIECE_BYTES: usize = 64 << 10;

/// How a file is packed.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Packing {
    /// Not compressed.
    Plain,
    /// gzip, one member or more.
    Gzip,
    /// Blocked gzip.
    Bgzf,
}

impl Packing {
    /// The name for messages and reports.
    pub fn name(self) -> &'static str {
        match self {
            Packing::Plain => "uncompressed",
            Packing::Gzip => "gzip",
            Packing::Bgzf => "BGZF",
        }
    }
}

/// A gzip member that is being read.
struct Member {
    start: u64,
    crc: Crc,
    length: u64,
}

/// Gives the decompressed bytes of a file, piece by piece.
pub(super) struct Inflater {
    source: Source,
    packing: Packing,
    member: Option<Member>,
    /// Whether the last BGZF block held anything; the file must not end on such a block.
    block_pending: bool,
    /// Where reading stops for now: the offset of a block, and how much of that block is still wanted.
    limit: Option<(u64, usize)>,
    blocks: Decompressor,
    stream: Decompress,
}

impl Inflater {
    /// Looks at the first bytes of the file.
    ///
    /// # Errors
    /// The file is empty, or begins like another kind of archive.
    pub fn new(mut source: Source) -> Result<Self> {
        let start = source.peek(6)?;
        if start.is_empty() {
            let fault = Fault::new("the file is empty", "name a file with genotype calls");
            return Err(fault.at(source.path(), Place::End));
        }
        if let Some(name) = other_archive(start) {
            let fault = Fault::new(
                format!("the file is packed with {name}"),
                "unpack it first, or pipe it: calls may come from standard input as `-`",
            );
            return Err(fault.at(source.path(), Place::Byte(0)));
        }
        let packing = if !start.starts_with(&GZIP_MAGIC) {
            Packing::Plain
        } else if matches!(member_head(&mut source)?, MemberHead::Block { .. }) {
            Packing::Bgzf
        } else {
            Packing::Gzip
        };
        Ok(Inflater {
            source,
            packing,
            member: None,
            block_pending: false,
            limit: None,
            blocks: Decompressor::new(),
            stream: Decompress::new(false),
        })
    }

    /// How the file is packed.
    pub fn packing(&self) -> Packing {
        self.packing
    }

    /// The name under which the user knows the file.
    pub fn path(&self) -> &std::path::Path {
        self.source.path()
    }

    /// Compressed bytes taken so far.
    pub fn offset(&self) -> u64 {
        self.source.offset()
    }

    /// Size and digest of the compressed bytes read so far.
    pub fn digest(&self) -> InputDigest {
        self.source.digest()
    }

    /// Appends the next piece to `out`, at most 64 KiB; 0 at the end of the file, which is then known
    /// to be whole as far as its format can tell.
    pub fn fill(&mut self, out: &mut Vec<u8>) -> Result<usize> {
        if self.packing == Packing::Plain {
            return self.fill_plain(out);
        }
        loop {
            let at = self.source.offset();
            if self
                .limit
                .is_some_and(|(block, n)| at > block || (at == block && n == 0))
            {
                return Ok(0);
            }
            let added = if self.member.is_some() {
                self.fill_member(out)?
            } else if self.source.peek(1)?.is_empty() {
                self.check_end()?;
                return Ok(0);
            } else {
                match member_head(&mut self.source)? {
                    MemberHead::Block { header, block } => {
                        let known = out.len();
                        let added = self.fill_block(header, block, out)?;
                        match self.limit {
                            Some((last, wanted)) if last == at && wanted < added => {
                                out.truncate(known + wanted);
                                wanted
                            }
                            _ => added,
                        }
                    }
                    MemberHead::Stream { header } => {
                        self.begin_member(header);
                        0
                    }
                }
            };
            if added > 0 {
                return Ok(added);
            }
        }
    }

    /// Whether no stretch has been gone to yet.
    pub fn limit_is_unset(&self) -> bool {
        self.limit.is_none()
    }

    /// Goes on with a stretch of a BGZF file between two virtual offsets, until [`Inflater::fill`] says 0.
    /// What the stretch has of its first block is appended to `out`.
    pub fn go_to(&mut self, chunk: &Range<u64>, out: &mut Vec<u8>) -> Result<()> {
        let parts = |at: u64| (at >> 16, (at & 0xffff) as usize);
        let (block, skipped) = parts(chunk.start);
        self.source.seek(block)?;
        self.limit = Some(parts(chunk.end));
        let known = out.len();
        self.fill(out)?;
        let end = out.len().min(known + skipped);
        out.drain(known..end);
        Ok(())
    }

    fn fill_plain(&mut self, out: &mut Vec<u8>) -> Result<usize> {
        let bytes = self.source.peek(1)?;
        let n = bytes.len().min(PIECE_BYTES);
        out.extend_from_slice(&bytes[..n]);
        self.source.consume(n);
        Ok(n)
    }

    /// Inflates one BGZF block behind `out` and checks its size and checksum.
    fn fill_block(&mut self, header: usize, block: usize, out: &mut Vec<u8>) -> Result<usize> {
        let offset = self.source.offset();
        let bytes = self.source.peek(block)?;
        let found = match bytes.get(..block) {
            None => Err(Fault::new(
                "the file ends inside a compressed block",
                COPY_AGAIN,
            )),
            Some(bytes) => inflate_block(&mut self.blocks, &bytes[header..], out),
        };
        let size = found.map_err(|f| f.at(self.source.path(), Place::Byte(offset)))?;
        self.block_pending = size > 0;
        self.source.consume(block);
        Ok(size)
    }

    fn begin_member(&mut self, header: usize) {
        self.member = Some(Member {
            start: self.source.offset(),
            crc: Crc::new(),
            length: 0,
        });
        self.source.consume(header);
        self.stream.reset(false);
    }

    /// Inflates the next piece of a gzip member; at its end, checks size and checksum.
    fn fill_member(&mut self, out: &mut Vec<u8>) -> Result<usize> {
        let Some(member) = &mut self.member else {
            return Ok(0);
        };
        let start = member.start;
        let known = out.len();
        let bytes = self.source.peek(1)?;
        let at_end = bytes.is_empty();
        let (in_before, out_before) = (self.stream.total_in(), self.stream.total_out());
        out.resize(known + PIECE_BYTES, 0);
        let status = self
            .stream
            .decompress(bytes, &mut out[known..], FlushDecompress::None);
        let taken = (self.stream.total_in() - in_before) as usize;
        let made = (self.stream.total_out() - out_before) as usize;
        out.truncate(known + made);
        member.crc.update(&out[known..]);
        member.length += made as u64;
        self.source.consume(taken);
        let problem = match status {
            Ok(Status::StreamEnd) => return self.end_member().map(|()| made),
            Ok(_) if taken > 0 || made > 0 => return Ok(made),
            _ if at_end => "the file ends inside its compressed data",
            _ => "the compressed data are damaged",
        };
        Err(Fault::new(problem, COPY_AGAIN).at(self.source.path(), Place::Byte(start)))
    }

    fn end_member(&mut self) -> Result<()> {
        let Some(member) = self.member.take() else {
            return Ok(());
        };
        let trailer = self.source.peek(8)?;
        let problem = match trailer.first_chunk::<8>() {
            None => "the file ends inside its compressed data",
            Some(trailer) if read_trailer(trailer) == (member.crc.sum(), member.length as u32) => {
                self.source.consume(8);
                return Ok(());
            }
            Some(_) => "the checksum of the compressed data does not match",
        };
        Err(Fault::new(problem, COPY_AGAIN).at(self.source.path(), Place::Byte(member.start)))
    }

    fn check_end(&self) -> Result<()> {
        if !self.block_pending {
            return Ok(());
        }
        let fault = Fault::new(
            "the end-of-file marker of BGZF is missing, so the file may have lost its end",
            "copy or make the file again; if it is whole as it is, recompress it with a BGZF writer",
        );
        Err(fault.at(self.source.path(), Place::End))
    }
}

/// Checksum and size (modulo 2^32) from the end of a member.
fn read_trailer(trailer: &[u8; 8]) -> (u32, u32) {
    let [a, b, c, d, e, f, g, h] = *trailer;
    (
        u32::from_le_bytes([a, b, c, d]),
        u32::from_le_bytes([e, f, g, h]),
    )
}

/// Inflates a block without its header behind `out`.
fn inflate_block(
    inflater: &mut Decompressor,
    block: &[u8],
    out: &mut Vec<u8>,
) -> std::result::Result<usize, Fault> {
    let Some((data, trailer)) = block.split_last_chunk::<8>() else {
        return Err(Fault::new("a compressed block is too short", COPY_AGAIN));
    };
    let (checksum, size) = read_trailer(trailer);
    let size = size as usize;
    if size > MAX_BLOCK_BYTES {
        return Err(Fault::new(
            "a compressed block claims to hold more than 64 KiB",
            COPY_AGAIN,
        ));
    }
    let known = out.len();
    out.resize(known + size, 0);
    let made = inflater.deflate_decompress(data, &mut out[known..]);
    if made != Ok(size) {
        return Err(Fault::new(
            "the data of a compressed block are damaged",
            COPY_AGAIN,
        ));
    }
    if crc32(&out[known..]) != checksum {
        return Err(Fault::new(
            "the checksum of a compressed block does not match",
            COPY_AGAIN,
        ));
    }
    Ok(size)
}

/// The name of another compression, by its first bytes.
fn other_archive(start: &[u8]) -> Option<&'static str> {
    const KINDS: [(&[u8], &str); 6] = [
        (b"\x28\xb5\x2f\xfd", "Zstandard"),
        (b"BZh", "bzip2"),
        (b"\xfd7zXZ\x00", "xz"),
        (b"PK\x03\x04", "ZIP"),
        (b"\x04\x22\x4d\x18", "LZ4"),
        (b"7z\xbc\xaf", "7-Zip"),
    ];
    KINDS
        .iter()
        .find(|(magic, _)| start.starts_with(magic))
        .map(|&(_, name)| name)
}
