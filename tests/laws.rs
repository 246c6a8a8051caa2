//! Laws of the sums: any order, any splitting, any labelling gives the same bytes; leaving out an
//! individual from the sums is the same as counting without it.

use std::sync::Arc;

use genewane::locus::{PairTerms, StratumTerms};
use genewane::merge::gram::FrequencyCutoff;
use genewane::merge::{Pair, Scheme, StratumSums, Sums};
use genewane::model::{Genotypes, Locus, stable_hash};
use proptest::prelude::*;

/// Slots of the two strata in these tests.
const FIRST: usize = 5;
const SECOND: usize = 4;
const SLOTS: usize = FIRST + SECOND;

type Call = Option<[u16; 2]>;

#[derive(Debug, Clone)]
struct Record {
    contig: u8,
    position: u64,
    alleles: u16,
    calls: Vec<Call>,
}

fn scheme() -> Arc<Scheme> {
    Arc::new(Scheme {
        strata: vec![0..FIRST, FIRST..SLOTS],
        pairs: vec![Pair {
            from: 0,
            to: 1,
            in_time: true,
        }],
        latest: vec![1],
        visits: vec![vec![0, 1]],
        min_call_rate: 0.0,
        gene_copies: 4,
        most_listed: 20,
    })
}

fn locus(record: &Record) -> Locus {
    let contig = format!("contig{}", record.contig);
    let mut genotypes = Genotypes::default();
    genotypes.reset(record.calls.len(), record.alleles.into());
    for (slot, call) in record.calls.iter().enumerate() {
        if let Some([a, b]) = call {
            genotypes.set(slot, *a, *b);
        }
    }
    let mut locus = Locus::default();
    locus.contig_hash = stable_hash(contig.as_bytes());
    locus.contig = contig;
    locus.position = record.position;
    locus.genotypes = genotypes;
    locus
}

fn sums<'a>(scheme: &Arc<Scheme>, records: impl IntoIterator<Item = &'a Record>) -> Sums {
    let mut sums = Sums::new(Arc::clone(scheme));
    for record in records {
        sums.add(&locus(record));
    }
    sums.flush();
    sums
}

fn assert_same(a: &Sums, b: &Sums) {
    for (x, y) in a.strata.iter().zip(&b.strata) {
        assert_eq!(x.diversity, y.diversity);
        assert_eq!(x.typed_genotypes, y.typed_genotypes);
        assert_eq!(x.hardy_weinberg, y.hardy_weinberg);
        let pairs = |s: &StratumSums| {
            let mut gram = s
                .linkage
                .clone()
                .expect("strata of at least three individuals");
            FrequencyCutoff::ALL.map(|cutoff| gram.pairs(cutoff).all())
        };
        assert_eq!(pairs(x), pairs(y));
    }
    assert_eq!(a.spectra, b.spectra);
    assert_eq!(a.pairs, b.pairs);
    assert_eq!(a.private, b.private);
    assert_eq!(a.carriers, b.carriers);
    assert_eq!(a.panel, b.panel);
    assert_eq!((a.kept, a.polymorphic), (b.kept, b.polymorphic));
}

fn record() -> impl Strategy<Value = Record> {
    (0u8..4, 1u64..3_000_000, 2u16..5)
        .prop_flat_map(|(contig, position, alleles)| {
            let call = prop_oneof![
                1 => Just(None),
                6 => (0..alleles, 0..alleles).prop_map(|(a, b)| Some([a.min(b), a.max(b)])),
            ];
            (
                Just((contig, position, alleles)),
                prop::collection::vec(call, SLOTS),
            )
        })
        .prop_map(|((contig, position, alleles), calls)| Record {
            contig,
            position,
            alleles,
            calls,
        })
}

fn records() -> impl Strategy<Value = Vec<Record>> {
    prop::collection::vec(record(), 1..40)
}

fn close(a: f64, b: f64) -> bool {
    (a - b).abs() <= 1e-10 * (1.0 + a.abs())
}

fn values<T: genewane::merge::Terms>(terms: &T) -> Vec<f64> {
    let mut values = vec![0.0; T::LEN];
    terms.write(&mut values);
    values
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(64))]

    #[test]
    fn merging_any_split_in_any_order_is_the_whole(
        mut records in records(), cut in 0usize..40, seed in any::<u64>(),
    ) {
        let scheme = scheme();
        let whole = sums(&scheme, &records);
        // A reproducible shuffle, then a cut.
        records.sort_by_key(|r| stable_hash(&(r.position ^ seed).to_le_bytes()));
        let cut = cut.min(records.len());
        let (a, b) = (sums(&scheme, &records[..cut]), sums(&scheme, &records[cut..]));
        let mut there = a.clone();
        there.merge(b.clone());
        there.flush();
        assert_same(&there, &whole);
        let mut back = b;
        back.merge(a);
        back.flush();
        assert_same(&back, &whole);
    }

    #[test]
    fn nothing_added_is_the_identity(records in records()) {
        let scheme = scheme();
        let whole = sums(&scheme, &records);
        let mut merged = Sums::new(Arc::clone(&scheme));
        merged.merge(whole.clone());
        merged.flush();
        assert_same(&merged, &whole);
    }

    /// Bounds for what comes from files refuse nothing that loci can make.
    #[test]
    fn what_is_stored_reads_back(records in records()) {
        let scheme = scheme();
        let whole = sums(&scheme, &records);
        let bytes = whole.clone().store().expect("bytes");
        let read = Sums::restore(scheme, &bytes).expect("sums");
        assert_same(&read, &whole);
    }

    /// The heart of the intervals over individuals: a delete-one value read from the sums is what a
    /// recount without the individual gives (the set of loci that vary among all held fixed).
    #[test]
    fn leaving_out_an_individual_is_a_recount_without_it(records in records(), slot in 0..SLOTS) {
        let scheme = scheme();
        let mut records = records;
        // Two monomorphic-proof individuals keep every locus in the headline set on both sides.
        for record in &mut records {
            record.calls[(slot + 1) % SLOTS] = Some([0, 1]);
        }
        let whole = sums(&scheme, &records);
        let without: Vec<Record> = records
            .iter()
            .cloned()
            .map(|mut r| { r.calls[slot] = None; r })
            .collect();
        let recount = sums(&scheme, &without);
        let s = usize::from(slot >= FIRST);
        let individual = if s == 0 { slot } else { slot - FIRST };
        let diversity: StratumTerms = whole.strata[s].diversity.without_individual(individual);
        for (a, b) in values(&diversity).iter().zip(values(&recount.strata[s].diversity.total())) {
            prop_assert!(close(*a, b), "{diversity:?}");
        }
        let pair: PairTerms = whole.pairs[0].change.without_individual(slot);
        for (a, b) in values(&pair).iter().zip(values(&recount.pairs[0].change.total())) {
            prop_assert!(close(*a, b), "{pair:?}");
        }
        for member in 0..2 {
            let private = whole.private[0][member].without_individual(slot);
            let again = recount.private[0][member].total();
            prop_assert!(close(private.private_richness, again.private_richness));
            prop_assert!(close(private.loci, again.loci));
        }
    }

    /// Which allele is called the reference changes no statistic.
    #[test]
    fn relabelling_alleles_changes_no_sum(records in records()) {
        let scheme = scheme();
        let relabelled: Vec<Record> = records
            .iter()
            .cloned()
            .map(|mut r| {
                for call in r.calls.iter_mut().flatten() {
                    let [a, b] = call.map(|allele| r.alleles - 1 - allele);
                    *call = [a.min(b), a.max(b)];
                }
                r
            })
            .collect();
        let (a, b) = (sums(&scheme, &records), sums(&scheme, &relabelled));
        for s in 0..2 {
            let (x, y) = (a.strata[s].diversity.total(), b.strata[s].diversity.total());
            for (x, y) in values(&x).iter().zip(values(&y)) {
                prop_assert!(close(*x, y));
            }
        }
        let (x, y) = (a.pairs[0].change.total(), b.pairs[0].change.total());
        for (x, y) in values(&x).iter().zip(values(&y)) {
            prop_assert!(close(*x, y));
        }
    }

    /// Two copies of every locus leave every ratio as it was.
    #[test]
    fn duplicating_every_locus_changes_no_ratio(records in records()) {
        let scheme = scheme();
        let once = sums(&scheme, &records).pairs[0].change.total();
        let twice = sums(&scheme, records.iter().chain(&records)).pairs[0].change.total();
        for (x, y) in values(&once).iter().zip(values(&twice)) {
            prop_assert!(close(2.0 * x, y));
        }
    }

    #[test]
    fn means_stay_in_range(records in records()) {
        let t = sums(&scheme(), &records).strata[0].diversity.total();
        prop_assert!(t.expected_heterozygosity >= 0.0 && t.expected_heterozygosity <= t.loci);
        prop_assert!(t.observed_heterozygosity >= 0.0 && t.observed_heterozygosity <= t.loci);
        prop_assert!(t.richness >= t.richness_loci - 1e-9);
        prop_assert!(t.richness <= 4.0 * t.richness_loci + 1e-9);
    }
}

/// Each would overflow, or take more from a number than it is, if it were read.
#[test]
fn stored_sums_that_no_loci_make_are_refused() {
    let record = Record {
        contig: 1,
        position: 5,
        alleles: 2,
        calls: vec![Some([0, 1]); SLOTS],
    };
    let refused = |what: &str, spoil: fn(&mut Sums)| {
        let mut spoilt = sums(&scheme(), [&record]);
        spoil(&mut spoilt);
        let bytes = spoilt.store().expect("bytes");
        let told = Sums::restore(scheme(), &bytes).map(drop).expect_err(what);
        assert!(told.contains("larger than loci"), "{what}: {told}");
    };
    refused("records", |s| s.kept = u64::MAX);
    refused("more vary than there are", |s| s.polymorphic = 2);
    refused("genotypes", |s| s.strata[0].typed_genotypes = u64::MAX);
    refused("typed at more than there are", |s| s.typed_records[3] = 2);
    refused("heterozygous where not typed", |s| s.heterozygous[8] = 2);
    refused("loci of a spectrum", |s| s.spectra[0].loci = u64::MAX);
    refused("fixed loci", |s| s.pairs[0].fates.loci_fixed = u64::MAX);
    refused("scarce alleles", |s| s.carriers[0].scarce = u64::MAX);
    refused("only carriers", |s| s.carriers[0].only_carrier[1] = 1 << 60);
    refused("tests", |s| {
        let test = &mut s.strata[1].hardy_weinberg;
        let side = genewane::locus::hardy_weinberg::Direction::Excess;
        test.add_to_bin(7, side, u64::MAX - 9).expect("a bin");
    });
}
