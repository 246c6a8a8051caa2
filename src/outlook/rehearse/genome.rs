//! The genome: contigs, places of loci, and units that are simulated apart.

use super::dice::{Dice, Purpose};
use super::scenario::{Frequencies, Scenario, Spacing};

/// Loci of one contig without linkage that make one unit: 16 words of 64.
const FREE_LOCI_IN_A_UNIT: usize = 1024;
/// Bases at the end of a contig without a locus, so that no repeat runs over the end.
pub const CONTIG_MARGIN: u64 = 400;

/// A contig of the calls.
#[derive(Debug, Clone, PartialEq)]
pub struct Contig {
    /// Its name.
    pub name: String,
    /// Its length in base pairs.
    pub length_bp: u64,
    /// Length of its map in morgans; `None` when its loci are unlinked.
    pub map_morgans: Option<f64>,
}

/// The place of one locus.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub struct Site {
    /// 1-based position.
    pub position: u32,
    /// Index of its set in the scenario.
    pub set: u32,
    /// The second copy of a duplicated locus: simulated, never written on its own.
    pub shadow: bool,
}

/// Loci that are inherited together, or a share of the unlinked ones of a contig.
#[derive(Debug, Clone, PartialEq)]
pub struct Unit {
    /// Number among the units, which names its streams of chance.
    pub number: u64,
    /// Index of its contig.
    pub contig: usize,
    /// Its loci by position; a shadow follows its locus.
    pub sites: Vec<Site>,
}

/// Contigs and units in the order of the calls.
#[derive(Debug, Clone, PartialEq)]
pub struct Genome {
    /// The contigs.
    pub contigs: Vec<Contig>,
    /// The units, by contig and position.
    pub units: Vec<Unit>,
}

impl Genome {
    /// Places the loci of a checked scenario.
    pub fn place(scenario: &Scenario, seed: u64) -> Genome {
        let contigs = contigs(scenario);
        let mut dice = Dice::new(seed, Purpose::Places, 0, 0);
        let mut sites: Vec<Vec<Site>> = vec![Vec::new(); contigs.len()];
        for (index, set) in scenario.loci.iter().enumerate() {
            let carriers = carriers(&contigs, &set.chromosomes, scenario);
            let lengths: Vec<f64> = carriers.iter().map(|&c| room(&contigs[c]) as f64).collect();
            let total: f64 = lengths.iter().sum();
            for number in 0..set.count {
                let mut along = match set.spacing {
                    Spacing::Random => dice.uniform() * total,
                    Spacing::Even => (f64::from(number) + 0.5) / f64::from(set.count) * total,
                };
                let mut which = 0;
                while which + 1 < lengths.len() && along >= lengths[which] {
                    along -= lengths[which];
                    which += 1;
                }
                let last = room(&contigs[carriers[which]]) - 1;
                let position = (along as u64).min(last) as u32 + 1;
                sites[carriers[which]].push(Site {
                    position,
                    set: index as u32,
                    shadow: false,
                });
            }
        }
        let mut units = Vec::new();
        for (contig, mut list) in sites.into_iter().enumerate() {
            list.sort_unstable();
            spread_out(&mut list, room(&contigs[contig]) as u32);
            let list = with_shadows(list, scenario);
            let size = match contigs[contig].map_morgans {
                Some(_) => list.len().max(1),
                None => FREE_LOCI_IN_A_UNIT,
            };
            for part in list.chunks(size) {
                units.push(Unit {
                    number: units.len() as u64,
                    contig,
                    sites: part.to_vec(),
                });
            }
        }
        Genome { contigs, units }
    }
}

/// Positions a locus may take.
fn room(contig: &Contig) -> u64 {
    contig.length_bp - CONTIG_MARGIN
}

/// The contigs of a scenario, copies written out.
pub fn contigs(scenario: &Scenario) -> Vec<Contig> {
    let mut contigs = Vec::new();
    for chromosome in &scenario.chromosome {
        let map_cm = chromosome
            .map_length_cm
            .unwrap_or(chromosome.length_bp as f64 / 1e6);
        for copy in 1..=chromosome.copies {
            let name = if chromosome.copies == 1 {
                chromosome.name.clone()
            } else {
                format!("{}_{copy}", chromosome.name)
            };
            let map_morgans = (!chromosome.unlinked).then_some(map_cm / 100.0);
            contigs.push(Contig {
                name,
                length_bp: chromosome.length_bp,
                map_morgans,
            });
        }
    }
    contigs
}

/// Indices of the contigs made from the named chromosomes; all where none is named.
pub fn carriers(contigs: &[Contig], names: &[String], scenario: &Scenario) -> Vec<usize> {
    let mut origin = Vec::with_capacity(contigs.len());
    for chromosome in &scenario.chromosome {
        origin.extend((0..chromosome.copies).map(|_| chromosome.name.as_str()));
    }
    (0..contigs.len())
        .filter(|&c| {
            names.is_empty()
                || names
                    .iter()
                    .any(|n| *n == contigs[c].name || n == origin[c])
        })
        .collect()
}

/// Moves loci that fell on the same base to the next free one; `last` is the highest position.
fn spread_out(sites: &mut [Site], last: u32) {
    for i in 1..sites.len() {
        sites[i].position = sites[i].position.max(sites[i - 1].position + 1);
    }
    let mut limit = last;
    for site in sites.iter_mut().rev() {
        site.position = site.position.min(limit);
        limit = site.position - 1;
    }
}

fn with_shadows(sites: Vec<Site>, scenario: &Scenario) -> Vec<Site> {
    let mut all = Vec::with_capacity(sites.len());
    for site in sites {
        all.push(site);
        if scenario.loci[site.set as usize].duplicated {
            all.push(Site {
                shadow: true,
                ..site
            });
        }
    }
    all
}

/// First frequencies of the alleles of one locus, all populations together.
pub fn common_frequencies(frequencies: &Frequencies, alleles: usize, dice: &mut Dice) -> Vec<f64> {
    match frequencies {
        Frequencies::Beta([a, b]) => dice.dirichlet(&[*b, *a]),
        Frequencies::Dirichlet(shape) => dice.dirichlet(&vec![*shape; alleles]),
        Frequencies::List(list) => list.clone(),
        Frequencies::Minor([low, high]) => {
            let minor = low + (high - low) * dice.uniform();
            if dice.word() & 1 == 0 {
                vec![1.0 - minor, minor]
            } else {
                vec![minor, 1.0 - minor]
            }
        }
    }
}

/// Frequencies of one population that drifted to `divergence` on the scale of FST: Dirichlet with
/// shapes p (1 - F)/F (Balding & Nichols 1995).
pub fn diverged(common: &[f64], divergence: f64, dice: &mut Dice) -> Vec<f64> {
    if divergence <= 0.0 {
        return common.to_vec();
    }
    let scale = (1.0 - divergence) / divergence;
    let present: Vec<usize> = (0..common.len()).filter(|&i| common[i] > 0.0).collect();
    let shapes: Vec<f64> = present.iter().map(|&i| common[i] * scale).collect();
    let mut frequencies = vec![0.0; common.len()];
    for (&i, weight) in present.iter().zip(dice.dirichlet(&shapes)) {
        frequencies[i] = weight;
    }
    frequencies
}

/// Texts of the alleles of a locus: two bases, or repeats of a pair of bases behind an anchor.
pub fn allele_texts(alleles: usize, dice: &mut Dice) -> Vec<String> {
    const BASES: [char; 4] = ['A', 'C', 'G', 'T'];
    let first = dice.below(4) as usize;
    let second = (first + 1 + dice.below(3) as usize) % 4;
    if alleles == 2 {
        return vec![BASES[first].to_string(), BASES[second].to_string()];
    }
    let anchor = BASES[dice.below(4) as usize];
    let shortest = 6 + dice.below(8) as usize;
    let mut repeats: Vec<usize> = (shortest..shortest + alleles).collect();
    repeats.swap(0, alleles / 2);
    let unit: String = [BASES[first], BASES[second]].iter().collect();
    repeats
        .iter()
        .map(|&n| format!("{anchor}{}", unit.repeat(n)))
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn equal_places_move_apart_and_stay_inside() {
        let mut sites: Vec<Site> = [5, 5, 5, 9, 10, 10]
            .map(|position| Site {
                position,
                set: 0,
                shadow: false,
            })
            .to_vec();
        spread_out(&mut sites, 10);
        let places: Vec<u32> = sites.iter().map(|s| s.position).collect();
        assert_eq!(places, [5, 6, 7, 8, 9, 10]);
    }

    #[test]
    fn alleles_of_a_locus_differ() {
        let mut dice = Dice::new(9, Purpose::Frequencies, 0, 0);
        for alleles in [2, 3, 8, 40] {
            let mut texts = allele_texts(alleles, &mut dice);
            texts.sort();
            texts.dedup();
            assert_eq!(texts.len(), alleles);
        }
    }

    /// Balding & Nichols (1995): variance p(1 - p) F; 5 standard errors.
    #[test]
    fn divergence_has_its_variance() {
        let mut dice = Dice::new(9, Purpose::Frequencies, 0, 0);
        let n = 100_000;
        let draws: Vec<f64> = (0..n)
            .map(|_| diverged(&[0.7, 0.3], 0.1, &mut dice)[1])
            .collect();
        let mean = draws.iter().sum::<f64>() / n as f64;
        let variance = draws.iter().map(|d| (d - mean).powi(2)).sum::<f64>() / n as f64;
        assert!((mean - 0.3).abs() < 0.003 && (variance - 0.021).abs() < 0.0006);
    }
}
