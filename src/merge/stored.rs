//! Sums as bytes and back: what a tally keeps of its loci.
//!
//! The bytes are those of every integer of the state, so what is read merges exactly like what was
//! written. Whoever keeps them says which version of this program wrote them and guards them with a
//! checksum; here it is only checked that they have the shape that the scheme asks for.
#![cfg_attr(not(test), deny(clippy::indexing_slicing))]

use std::sync::Arc;

use serde::{Deserialize, Serialize};

use super::carriers::Carriers;
use super::panel::Panel;
use super::scheme::Scheme;
use super::spectrum::Spectrum;
use super::sums::{PairSums, StratumSums, Sums};
use super::two_way::TwoWay;
use crate::locus::PrivateTerms;

/// Everything of [`Sums`] but the scheme and the scratch.
#[derive(Serialize, Deserialize)]
struct Stored {
    strata: Vec<StratumSums>,
    pairs: Vec<PairSums>,
    private: Vec<Vec<TwoWay<PrivateTerms>>>,
    spectra: Vec<Spectrum>,
    carriers: Vec<Carriers>,
    panel: Panel,
    typed_records: Vec<u64>,
    typed_polymorphic: Vec<u64>,
    heterozygous: Vec<u64>,
    kept: u64,
    polymorphic: u64,
}

impl Sums {
    /// The state as bytes.
    ///
    /// # Errors
    /// A text, should the encoder fail; it has no reason to.
    pub fn store(self) -> Result<Vec<u8>, String> {
        let mut sums = self;
        sums.settle();
        let stored = Stored {
            strata: sums.strata,
            pairs: sums.pairs,
            private: sums.private,
            spectra: sums.spectra,
            carriers: sums.carriers,
            panel: sums.panel,
            typed_records: sums.typed_records,
            typed_polymorphic: sums.typed_polymorphic,
            heterozygous: sums.heterozygous,
            kept: sums.kept,
            polymorphic: sums.polymorphic,
        };
        postcard::to_stdvec(&stored).map_err(|e| e.to_string())
    }

    /// The sums of a scheme from the bytes of [`Sums::store`].
    ///
    /// # Errors
    /// A text when the bytes are no such state, or one of another scheme.
    pub fn restore(scheme: Arc<Scheme>, bytes: &[u8]) -> Result<Sums, String> {
        let (stored, rest): (Stored, &[u8]) =
            postcard::take_from_bytes(bytes).map_err(|e| e.to_string())?;
        if !rest.is_empty() {
            return Err("there is more than sums".to_owned());
        }
        let mut sums = Sums::new(Arc::clone(&scheme));
        if !same_shape(&sums, &stored, scheme.slots()) {
            return Err("the sums have another shape than the samples ask for".to_owned());
        }
        let mut read = Sums::new(scheme);
        read.strata = stored.strata;
        read.pairs = stored.pairs;
        read.private = stored.private;
        read.spectra = stored.spectra;
        read.carriers = stored.carriers;
        read.panel = stored.panel;
        read.typed_records = stored.typed_records;
        read.typed_polymorphic = stored.typed_polymorphic;
        read.heterozygous = stored.heterozygous;
        read.kept = stored.kept;
        read.polymorphic = stored.polymorphic;
        if !read.is_bounded() {
            return Err("they are larger than loci of these samples can make them".to_owned());
        }
        // Merged into empty sums, which have the buffers that were not kept.
        sums.merge(read);
        sums.flush();
        Ok(sums)
    }
}

/// Whether every list is as long as that of the empty sums of the scheme.
fn same_shape(empty: &Sums, stored: &Stored, slots: usize) -> bool {
    let strata = empty.strata.len() == stored.strata.len()
        && empty.strata.iter().zip(&stored.strata).all(|(a, b)| {
            let linkage = match (&a.linkage, &b.linkage) {
                (Ok(a), Ok(b)) => a.same_shape(b),
                (Err(a), Err(b)) => a == b,
                _ => false,
            };
            linkage
                && a.diversity.same_shape(&b.diversity)
                && a.hardy_weinberg.same_shape(&b.hardy_weinberg)
        });
    let pairs = empty.pairs.len() == stored.pairs.len()
        && empty
            .pairs
            .iter()
            .zip(&stored.pairs)
            .all(|(a, b)| a.change.same_shape(&b.change));
    let private = empty.private.len() == stored.private.len()
        && empty
            .private
            .iter()
            .zip(&stored.private)
            .all(|(a, b)| a.len() == b.len() && a.iter().zip(b).all(|(a, b)| a.same_shape(b)));
    let carriers = empty.carriers.len() == stored.carriers.len()
        && empty
            .carriers
            .iter()
            .zip(&stored.carriers)
            .all(|(a, b)| a.same_shape(b));
    let lengths = [
        &stored.typed_records,
        &stored.typed_polymorphic,
        &stored.heterozygous,
    ];
    strata
        && pairs
        && private
        && carriers
        && empty.spectra.len() == stored.spectra.len()
        && lengths.iter().all(|list| list.len() == slots)
        && stored.panel.loci().all(|l| l.genotypes.is_sound(slots))
}
