//! Whether records come in order, and none twice: told, since single loci do not suffer from it.
//!
//! Watched by the reader, who alone sees all records in the order of the file.
#![expect(
    clippy::indexing_slicing,
    reason = "places were found in the same line"
)]

use std::collections::HashSet;

use memchr::memchr;

use super::alleles::is_bases;
use super::binary::Site;
use super::limits::{MAX_CONTIGS_WATCHED, MAX_VARIANTS_WATCHED};
use super::remarks::{Remark, Remarks};
use crate::model::stable_hash;

/// Remembers the contigs so far, and the changes of sequence from the present position on.
#[derive(Debug, Default)]
pub(super) struct OrderWatch {
    contig: Vec<u8>,
    position: u64,
    contigs: HashSet<u64>,
    /// Position and hash of each change, in its shortest form.
    changes: Vec<(u64, u64)>,
    remarks: Remarks,
    scratch: Vec<u8>,
}

impl OrderWatch {
    /// What was remarked so far.
    pub fn remarks(&self) -> &Remarks {
        &self.remarks
    }

    /// Looks at a line of text; a line that cannot be taken apart is left to the decoder.
    pub fn line(&mut self, record: u64, line: &[u8]) {
        let mut fields: [&[u8]; 5] = [&[]; 5];
        let mut rest = line;
        for field in &mut fields {
            let Some(tab) = memchr(b'\t', rest) else {
                return;
            };
            *field = &rest[..tab];
            rest = &rest[tab + 1..];
        }
        let [contig, position, _, reference, alternates] = fields;
        let text = std::str::from_utf8(position).ok();
        let Some(position) = text.and_then(|t| t.parse().ok()) else {
            return;
        };
        self.place(record, contig, position);
        let known = self.changes.len();
        let mut repeated = false;
        for alternate in alternates.split(|&byte| byte == b',') {
            repeated |= self.change(known, reference, alternate);
        }
        if repeated {
            self.remarks.add(Remark::RepeatedVariant, record);
        }
    }

    /// Looks at a binary record, likewise.
    pub fn binary(&mut self, record: u64, bytes: &[u8]) {
        let Ok(site) = Site::split(bytes) else { return };
        self.place(record, &site.contig.to_le_bytes(), site.position);
        let known = self.changes.len();
        let (mut reference, mut repeated) = (None, false);
        let whole = site.alleles(|allele| match reference {
            None => reference = Some(allele),
            Some(reference) => repeated |= self.change(known, reference, allele),
        });
        if repeated && whole.is_ok() {
            self.remarks.add(Remark::RepeatedVariant, record);
        }
    }

    fn place(&mut self, record: u64, contig: &[u8], position: u64) {
        if contig != self.contig {
            self.contig.clear();
            self.contig.extend_from_slice(contig);
            self.changes.clear();
            let known = self.contigs.len();
            let hash = stable_hash(contig);
            if known < MAX_CONTIGS_WATCHED && !self.contigs.insert(hash) {
                self.remarks.add(Remark::ScatteredContig, record);
            }
        } else if position < self.position {
            self.changes.clear();
            self.remarks.add(Remark::OutOfOrder, record);
        }
        self.position = position;
        self.changes.retain(|&(at, _)| at >= position);
    }

    /// Remembers a change of sequence; true when it was among the first `known` already.
    fn change(&mut self, known: usize, reference: &[u8], alternate: &[u8]) -> bool {
        if !is_bases(alternate) {
            return false;
        }
        let (skipped, from, to) = shortest(reference, alternate);
        self.scratch.clear();
        self.scratch.extend_from_slice(from);
        self.scratch.push(b'>');
        self.scratch.extend_from_slice(to);
        let change = (
            self.position.saturating_add(skipped),
            stable_hash(&self.scratch),
        );
        if self.changes.len() < MAX_VARIANTS_WATCHED {
            self.changes.push(change);
        }
        self.changes[..known].contains(&change)
    }
}

/// A change without the bases that both sides share, at least one being kept; with the number of
/// bases skipped at the front.
fn shortest<'a>(mut from: &'a [u8], mut to: &'a [u8]) -> (u64, &'a [u8], &'a [u8]) {
    while let ([from_rest @ .., a], [to_rest @ .., b]) = (from, to)
        && a == b
        && !from_rest.is_empty()
        && !to_rest.is_empty()
    {
        (from, to) = (from_rest, to_rest);
    }
    let mut skipped = 0;
    while let ([a, from_rest @ ..], [b, to_rest @ ..]) = (from, to)
        && a == b
        && !from_rest.is_empty()
        && !to_rest.is_empty()
    {
        (from, to) = (from_rest, to_rest);
        skipped += 1;
    }
    (skipped, from, to)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn remarks(lines: &[&str]) -> [u64; 3] {
        let mut watch = OrderWatch::default();
        for (record, line) in (1..).zip(lines) {
            watch.line(record, line.replace(' ', "\t").as_bytes());
        }
        [
            Remark::OutOfOrder,
            Remark::ScatteredContig,
            Remark::RepeatedVariant,
        ]
        .map(|remark| watch.remarks().count(remark))
    }

    #[test]
    fn order_and_repeats() {
        assert_eq!(
            remarks(&["a 1 . A C .", "a 1 . A G .", "a 2 . A C .", "b 1 . A C ."]),
            [0, 0, 0]
        );
        assert_eq!(
            remarks(&["a 5 . A C .", "a 4 . A C .", "a 5 . A C ."]),
            [1, 0, 0]
        );
        assert_eq!(
            remarks(&["a 5 . A C .", "b 5 . A C .", "a 6 . A C ."]),
            [0, 1, 0]
        );
        assert_eq!(remarks(&["a 5 . A C .", "a 5 . A G,C ."]), [0, 0, 1]);
        // The same change under another anchor: TAT>TGT at 123 is A>G at 124.
        assert_eq!(remarks(&["a 123 . TAT TGT .", "a 124 . A G ."]), [0, 0, 1]);
        assert_eq!(
            remarks(&["a 5 . A <DEL> .", "a 5 . A <DEL> .", "x", "a . . A C ."]),
            [0, 0, 0]
        );
    }

    #[test]
    fn shared_bases_go() {
        assert_eq!(shortest(b"AT", b"AA"), (1, &b"T"[..], &b"A"[..]));
        assert_eq!(shortest(b"AT", b"AAT"), (0, &b"A"[..], &b"AA"[..]));
        assert_eq!(shortest(b"A", b"A"), (0, &b"A"[..], &b"A"[..]));
    }
}
