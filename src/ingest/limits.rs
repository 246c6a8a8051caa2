//! How much of a file is believed: every buffer of the reader is bounded by one of these.

/// Bytes of one record (a line of text, or the two blocks of a binary record): 256 MiB.
///
/// A million samples with ten FORMAT keys fit. Batches address records with 32 bits, so this must stay below 4 GiB.
pub const MAX_RECORD_BYTES: usize = 256 << 20;
/// Bytes of the header, all lines together: 128 MiB.
pub const MAX_HEADER_BYTES: usize = 128 << 20;
/// Sample columns, about a million: double the largest cohorts of today.
pub const MAX_SAMPLES: usize = 1 << 20;
/// Contigs, or INFO, FILTER and FORMAT names together, that a header may list: about two million,
/// so that a hostile header costs less than a gigabyte.
pub const MAX_NAMES: usize = 1 << 21;
/// Alleles of one record, the reference included; beyond, the record is set aside as
/// [`crate::model::Verdict::TooManyAlleles`].
pub const MAX_ALLELES: usize = 4096;
/// Bytes of a batch from which on no further record is added: 256 KiB.
pub const BATCH_BYTES: usize = 256 << 10;
/// Contigs whose order is remembered; beyond, scattered contigs are no longer looked for.
pub const MAX_CONTIGS_WATCHED: usize = 1 << 20;
/// Changes of sequence remembered at one position; beyond, repeats are no longer looked for.
pub const MAX_VARIANTS_WATCHED: usize = 64;
/// Header warnings that are spelled out; the rest is only counted.
pub const MAX_HEADER_WARNINGS: usize = 20;
/// Characters of a file that are quoted in a message.
pub const MAX_QUOTED: usize = 40;
