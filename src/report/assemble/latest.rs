//! The sections on the latest sample of each population: its spectrum, what is scarce in it, and who
//! carries that.

use super::Findings;
use crate::model::{Sex, Stratum};
use crate::report::wire;

/// Alleles named in the section at most, over all populations; the individuals' sums count all.
const MOST_LISTED: usize = 500;

/// Pairs of carriers named for each population.
const MOST_PAIRS: usize = 20;

impl Findings<'_> {
    fn latest(&self) -> impl Iterator<Item = &Stratum> {
        self.sums
            .scheme()
            .latest
            .iter()
            .map(|&s| &self.strata.strata[s])
    }
}

/// The frequency spectrum of each latest sample.
pub fn allele_spectra(findings: &Findings) -> Vec<wire::AlleleSpectrum> {
    let all = findings.latest().zip(&findings.sums.spectra);
    all.map(|(stratum, spectrum)| wire::AlleleSpectrum {
        population: stratum.population.clone(),
        stratum: stratum.name.clone(),
        loci: spectrum.loci,
        classes: spectrum
            .classes()
            .map(|(copies, typed, alleles)| [copies.into(), typed.into(), alleles])
            .collect(),
    })
    .collect()
}

/// Alleles in few carriers, the scarcest of each population first.
pub fn at_risk(findings: &Findings) -> Vec<wire::AtRisk> {
    let latest = findings.sums.carriers.len().max(1);
    let mut at_risk = Vec::new();
    for (stratum, carriers) in findings.latest().zip(&findings.sums.carriers) {
        let name = |i: &u32| {
            let slot = carriers.slots().start + *i as usize;
            findings.strata.individuals[slot].sample.clone()
        };
        for allele in carriers.list().take(MOST_LISTED / latest) {
            at_risk.push(wire::AtRisk {
                population: stratum.population.clone(),
                stratum: stratum.name.clone(),
                contig: allele.contig.clone(),
                position: allele.position,
                allele: String::from_utf8_lossy(&allele.allele).into_owned(),
                copies: allele.copies.into(),
                gene_copies: allele.typed.into(),
                carriers: allele.carriers.iter().map(name).collect(),
            });
        }
    }
    at_risk
}

/// Individuals of each latest sample, those with the most to lose first.
pub fn carriers(findings: &Findings) -> Vec<wire::Carrier> {
    let mut all = Vec::new();
    for (stratum, carriers) in findings.latest().zip(&findings.sums.carriers) {
        let mut of_population: Vec<_> = carriers
            .slots()
            .enumerate()
            .map(|(i, slot)| wire::Carrier {
                population: stratum.population.clone(),
                stratum: stratum.name.clone(),
                sample: findings.strata.individuals[slot].sample.clone(),
                only_carrier: carriers.only_carrier[i],
                would_vanish: carriers.would_vanish(i),
            })
            .filter(|c| c.would_vanish > 0.0)
            .collect();
        of_population.sort_by(|a, b| {
            b.would_vanish
                .total_cmp(&a.would_vanish)
                .then_with(|| a.sample.cmp(&b.sample))
        });
        all.extend(of_population);
    }
    all
}

/// Pairs of a female and a male that hold the most scarce alleles together, each some that the other
/// lacks; the first 20 of each population.
pub fn carrier_pairs(findings: &Findings) -> Vec<wire::CarrierPair> {
    let mut all = Vec::new();
    for (stratum, carriers) in findings.latest().zip(&findings.sums.carriers) {
        let of_sex = |sex: Sex| {
            let slots = carriers.slots().enumerate();
            slots
                .filter(move |&(_, slot)| findings.strata.individuals[slot].sex == Some(sex))
                .map(|(i, _)| i)
                .filter(|&i| carriers.scarce_carried[i] > 0)
                .collect::<Vec<usize>>()
        };
        let name = |i: usize| &findings.strata.individuals[carriers.slots().start + i].sample;
        let (females, males) = (of_sex(Sex::Female), of_sex(Sex::Male));
        let mut pairs = Vec::new();
        for (&f, &m) in females
            .iter()
            .flat_map(|f| males.iter().map(move |m| (f, m)))
        {
            let both = carriers.shared(f, m);
            let only_female = carriers.scarce_carried[f] - both;
            let only_male = carriers.scarce_carried[m] - both;
            if only_female > 0 && only_male > 0 {
                pairs.push((
                    only_female + only_male + both,
                    only_female,
                    only_male,
                    both,
                    f,
                    m,
                ));
            }
        }
        // The most together first, then the most even, then by name.
        let order = |p: &(u64, u64, u64, u64, usize, usize)| {
            (std::cmp::Reverse((p.0, p.1.min(p.2))), name(p.4), name(p.5))
        };
        pairs.sort_by(|a, b| order(a).cmp(&order(b)));
        let listed = pairs.into_iter().take(MOST_PAIRS);
        all.extend(
            listed.map(
                |(together, only_female, only_male, both, f, m)| wire::CarrierPair {
                    population: stratum.population.clone(),
                    stratum: stratum.name.clone(),
                    female: name(f).clone(),
                    male: name(m).clone(),
                    only_female,
                    only_male,
                    both,
                    together,
                },
            ),
        );
    }
    all
}
