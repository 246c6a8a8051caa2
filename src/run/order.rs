//! What the order of the records shows: unsorted positions, duplicates, contigs that come back.

use std::collections::HashSet;

use crate::model::Locus;

/// Contigs remembered to notice one that comes back; beyond, it goes unnoticed.
const MOST_CONTIGS: usize = 1 << 20;

/// What the order of one batch showed.
#[derive(Debug, Default)]
pub struct BatchPlaces {
    first: Option<(u64, u64)>,
    last: Option<(u64, u64)>,
    contigs: Vec<u64>,
    backwards: u64,
    repeated: u64,
}

impl BatchPlaces {
    /// Takes note of the next record.
    pub fn visit(&mut self, locus: &Locus) {
        let here = (locus.contig_hash, locus.position);
        match self.last {
            Some(last) => {
                self.backwards += u64::from(last.0 == here.0 && here.1 < last.1);
                self.repeated += u64::from(last == here);
                if last.0 != here.0 {
                    self.contigs.push(here.0);
                }
            }
            None => {
                self.first = Some(here);
                self.contigs.push(here.0);
            }
        }
        self.last = Some(here);
    }
}

/// What the order of all records showed, batch after batch.
#[derive(Debug, Default)]
pub struct Places {
    last: Option<(u64, u64)>,
    seen: HashSet<u64>,
    /// Records before the one ahead of them on the same contig.
    pub backwards: u64,
    /// Records at the place of the one ahead of them.
    pub repeated: u64,
    /// Times that a contig came back after another.
    pub contigs_again: u64,
}

impl Places {
    /// Takes note of the next batch in file order.
    pub fn follow(&mut self, batch: BatchPlaces) {
        let (Some(first), Some(last)) = (batch.first, batch.last) else {
            return;
        };
        self.backwards += batch.backwards;
        self.repeated += batch.repeated;
        let goes_on = self.last.is_some_and(|before| before.0 == first.0);
        if let Some(before) = self.last.filter(|_| goes_on) {
            self.backwards += u64::from(first.1 < before.1);
            self.repeated += u64::from(first == before);
        }
        for contig in batch.contigs.into_iter().skip(usize::from(goes_on)) {
            if self.seen.len() < MOST_CONTIGS && !self.seen.insert(contig) {
                self.contigs_again += 1;
            }
        }
        self.last = Some(last);
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn batch(places: &[(u64, u64)]) -> BatchPlaces {
        let mut batch = BatchPlaces::default();
        for &(contig_hash, position) in places {
            batch.visit(&Locus {
                contig_hash,
                position,
                ..Locus::default()
            });
        }
        batch
    }

    #[test]
    fn splitting_into_batches_changes_nothing() {
        let records = [
            (1, 5),
            (1, 5),
            (1, 9),
            (1, 7),
            (2, 1),
            (1, 3),
            (1, 2),
            (3, 1),
        ];
        for cut in 0..=records.len() {
            let mut places = Places::default();
            places.follow(batch(&records[..cut]));
            places.follow(batch(&records[cut..]));
            let found = (places.backwards, places.repeated, places.contigs_again);
            assert_eq!(found, (2, 1, 1), "cut at {cut}");
        }
    }
}
