//! Words that every report carries.

use std::collections::BTreeMap;

/// The standing cautions.
pub const CAUTIONS: [&str; 5] = [
    "Estimates describe the sampled years and places and rest on assumptions: discrete generations \
     unless stated otherwise, no migration for temporal effective size, neutral loci.",
    "They support, and do not replace, the judgement of a qualified geneticist and the decisions of \
     the authority in charge.",
    "Thresholds are published rules of thumb, not law.",
    "National law, permits for sampling, transport or release of protected species, animal welfare \
     rules and biosecurity come first.",
    "Never move, cull or breed animals on one number.",
];

/// Unit and source of each kind of estimate, by field name.
pub fn methods() -> BTreeMap<String, String> {
    let all = [
        (
            "intervals",
            "estimate +- Student's t x standard error; variance = weighted block jackknife over the genome (Busing, Meijer & van der Leeden 1999) + delete-one jackknife over the individuals of each sample; degrees of freedom by Satterthwaite (1946)",
        ),
        (
            "observed_heterozygosity",
            "share of typed individuals, mean over loci",
        ),
        (
            "expected_heterozygosity",
            "probability that two gene copies differ, unbiased (Nei 1978), mean over loci",
        ),
        (
            "inbreeding_coefficient",
            "1 - sum of observed / sum of expected heterozygosity, no unit",
        ),
        (
            "allelic_richness",
            "alleles in a fixed number of gene copies (Hurlbert 1971; El Mousadik & Petit 1996), mean over loci",
        ),
        (
            "private_allelic_richness",
            "alleles in a fixed number of gene copies of this stratum and in none of the others' (Kalinowski 2004), mean over loci",
        ),
        (
            "effective_alleles",
            "1 / (1 - mean expected heterozygosity), alleles",
        ),
        (
            "hardy_weinberg",
            "exact test, mid-p (Wigginton et al. 2005; Graffelman & Moreno 2013; Guo & Thompson 1992), false discovery rate by Benjamini & Hochberg (1995)",
        ),
        (
            "fst_weir_cockerham",
            "theta of Weir & Cockerham (1984), ratio of sums, no unit",
        ),
        (
            "fst_hudson",
            "Hudson, Slatkin & Maddison (1992) as ratio of sums (Bhatia et al. 2013), no unit",
        ),
        (
            "gst_nei",
            "Nei (1973) with the estimators of Nei & Chesser (1983), no unit",
        ),
        ("gst_hedrick", "Hedrick (2005), no unit"),
        ("jost_d", "Jost (2008), no unit"),
        (
            "fc",
            "Nei & Tajima (1981), weighted by independent alleles, no unit",
        ),
        (
            "fk",
            "Pollak (1983), weighted by independent alleles, no unit",
        ),
        ("fs", "Jorde & Ryman (2007), ratio of sums, no unit"),
        (
            "effective_size",
            "diploid individuals; intervals are made for 1/(2Ne) and inverted last",
        ),
        (
            "temporal_fs",
            "Jorde & Ryman (2007), inverted exactly as 1 - (1 - 1/(2Ne))^t",
        ),
        ("temporal_fc", "Nei & Tajima (1981); Waples (1989)"),
        ("temporal_fk", "Pollak (1983); Waples (1989)"),
    ];
    all.map(|(name, text)| {
        (
            name.to_owned(),
            text.split_whitespace().collect::<Vec<_>>().join(" "),
        )
    })
    .into()
}

/// Unit and source of what screening reports, by field name.
pub fn screen_methods() -> BTreeMap<String, String> {
    let all = [
        (
            "inbreeding_moments",
            "(O - E)/(L - E), expected homozygosity without bias (Nei 1978), no unit",
        ),
        (
            "inbreeding_uniting",
            "correlation of uniting gametes (Yang et al. 2011), ratio of sums, no unit",
        ),
        (
            "f_roh",
            "share of the covered genome in runs of homozygosity (McQuillan et al. 2008)",
        ),
        (
            "kinship",
            "robust, between families (Manichaikul et al. 2010); block jackknife (Busing et al. 1999)",
        ),
        (
            "probability_of_identity",
            "Paetkau & Strobeck (1994) without bias (Paetkau et al. 1998); sibs: Evett & Weir (1998); guideline: Waits, Luikart & Taberlet (2001)",
        ),
        (
            "odd_heterozygotes",
            "one-sided mid-p (Graffelman & Moreno 2013) by stratum, combined (Stouffer et al. 1949); false discovery rate by Benjamini & Hochberg (1995)",
        ),
        ("unseen_allele_frequency", "Brookfield (1996)"),
        (
            "missing_together",
            "exact test (Fisher 1935) of the worst group, Bonferroni",
        ),
        (
            "shares",
            "exact binomial intervals (Clopper & Pearson 1934)",
        ),
    ];
    all.map(|(name, text)| (name.to_owned(), text.to_owned()))
        .into()
}
