//! Bytes to genotypes. The only place that knows the formats.
//!
//! ```text
//! source -> inflate (gzip) -> reader (header, dictionary) -> batch -> decoder (text | binary, scan)
//!   one thread, in file order                                  any number of threads
//! ```
//! [`open`] looks at the bytes of a file, never at its name: VCF 4.1 to 4.5 as text or BCF 2, each
//! plain, as gzip of any number of members, or as BGZF. [`CallsReader::next_batch`] hands out whole
//! records undecoded; a [`Decoder`] turns one into a [`crate::model::Locus`] and the
//! [`crate::model::Verdict`] under which it is counted.
//!
//! A record without usable genotypes is set aside by verdict. A file that contradicts itself or the
//! standard where genotypes are concerned stops the run with [`crate::Error::Calls`]: the counts of
//! a file that is wrong in one place cannot be trusted in another. What breaks the standard without
//! touching a genotype is let through and told ([`CallsReader::warnings`], [`Remarks`]).
//!
//! What cannot be noticed: text without compression that was cut exactly at the end of a line, plain
//! gzip cut exactly between two members, and a flipped bit that makes one valid field of an
//! uncompressed file into another.
#![cfg_attr(not(test), deny(clippy::indexing_slicing))]

mod alleles;
mod batch;
mod binary;
mod call;
mod cursor;
mod decoder;
mod dictionary;
mod fault;
mod gzip;
mod header;
mod inflate;
pub mod limits;
mod order;
mod preamble;
pub mod programme;
mod reader;
mod regions;
mod remarks;
mod scan;
pub mod settings;
pub mod sheet;
mod source;
mod split;
mod text;
mod tidy;

pub use batch::RecordBatch;
pub use decoder::{Decoder, Selection};
pub use header::CallsHeader;
pub use inflate::Packing;
pub use reader::{CallsReader, open, open_stream, open_with_map};
pub use regions::regions_of;
pub use remarks::{Remark, Remarks};
pub use source::InputDigest;
