//! The sections on the latest sample of each population: its spectrum, what is scarce in it, and who
//! carries that.

use super::Findings;
use crate::model::Stratum;
use crate::report::wire;

/// Alleles named in the section at most, over all populations; the individuals' sums count all.
const MOST_LISTED: usize = 500;

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
