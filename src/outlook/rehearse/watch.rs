//! Whole populations: their allele copies at visits, and alleles that vanish between the first visit
//! and the last.

use std::collections::BTreeMap;

use super::meiosis::{Haplotypes, Layout};
use super::population::{Generation, History};
use super::scenario::Scenario;

/// An allele that a population lost between its first and its last visit.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Gone {
    /// Locus of the unit.
    pub locus: usize,
    /// Allele code.
    pub allele: u16,
    /// First generation in which no adult has it.
    pub generation: u32,
}

/// Looks at every generation of a unit, from the first to the last visit of each population.
pub struct Watch {
    /// Positions of the generations of the first and last visit by population.
    spans: Vec<Option<(usize, usize)>>,
    settling: usize,
    populations: Vec<Missing>,
}

/// What one population had and lacks.
#[derive(Debug, Clone)]
struct Missing {
    /// By block and allele code: loci that had the allele at the first visit.
    baseline: Vec<u64>,
    /// The same: of these, loci without it now.
    absent: Vec<u64>,
    /// Locus and allele code of everything absent now, and since when.
    since: BTreeMap<(usize, u16), u32>,
}

impl Watch {
    /// Knows the visits, has seen nothing.
    pub fn new(scenario: &Scenario, history: &History, layout: &Layout) -> Self {
        let mut spans = vec![None; scenario.population.len()];
        for stratum in &history.strata {
            let index = history.index(stratum.generation);
            let span = spans[stratum.population].get_or_insert((index, index));
            *span = (span.0.min(index), span.1.max(index));
        }
        let size = (0..layout.blocks())
            .map(|b| layout.most_alleles(b) as usize)
            .sum();
        let nothing = Missing {
            baseline: vec![0; size],
            absent: vec![0; size],
            since: BTreeMap::new(),
        };
        let populations = vec![nothing; spans.len()];
        Watch {
            spans,
            settling: history.settling,
            populations,
        }
    }

    /// Looks at the adults of the generation at `index` of the history.
    pub fn look(
        &mut self,
        layout: &Layout,
        index: usize,
        generation: &Generation,
        adults: &Haplotypes,
    ) {
        for (population, missing) in self.populations.iter_mut().enumerate() {
            let Some((first, last)) = self.spans[population] else {
                continue;
            };
            if !(first..=last).contains(&index) {
                continue;
            }
            let mut place = 0;
            for block in 0..layout.blocks() {
                for code in 0..layout.most_alleles(block) {
                    let mut present = 0;
                    for adult in generation.ranges[population].clone() {
                        for side in 0..2 {
                            let haplotype = adults.get(adult as usize, side);
                            present |= layout.matches(haplotype, block, code);
                        }
                        if present == layout.used(block) {
                            break;
                        }
                    }
                    if index == first {
                        missing.baseline[place] = present;
                    }
                    missing.note(
                        place,
                        (block, code),
                        present,
                        (index - self.settling) as u32,
                    );
                    place += 1;
                }
            }
        }
    }

    /// By population: alleles of the first visit that are gone at the last, by locus and allele.
    pub fn finish(self) -> Vec<Vec<Gone>> {
        let list = |missing: Missing| {
            let gone = missing.since.into_iter();
            gone.map(|((locus, allele), generation)| Gone {
                locus,
                allele,
                generation,
            })
            .collect()
        };
        self.populations.into_iter().map(list).collect()
    }
}

impl Missing {
    fn note(&mut self, place: usize, (block, code): (usize, u16), present: u64, generation: u32) {
        let absent = self.baseline[place] & !present;
        let mut changed = absent ^ self.absent[place];
        self.absent[place] = absent;
        while changed != 0 {
            let bit = changed.trailing_zeros() as usize;
            changed &= changed - 1;
            let key = (64 * block + bit, code);
            if absent >> bit & 1 == 1 {
                self.since.insert(key, generation);
            } else {
                self.since.remove(&key);
            }
        }
    }
}

/// Counts the gene copies of all adults of the strata of this generation.
pub fn count_strata(
    history: &History,
    index: usize,
    generation: &Generation,
    layout: &Layout,
    adults: &Haplotypes,
    copies: &mut [Vec<Vec<u32>>],
) {
    for (stratum, copies) in history.strata.iter().zip(copies) {
        if history.index(stratum.generation) != index {
            continue;
        }
        let range = generation.ranges[stratum.population].clone();
        *copies = layout
            .alleles
            .iter()
            .map(|&a| vec![0; a as usize])
            .collect();
        for block in 0..layout.blocks() {
            for code in 0..layout.most_alleles(block) {
                let mut counter = BitCounter::default();
                for adult in range.clone() {
                    for side in 0..2 {
                        let haplotype = adults.get(adult as usize, side);
                        counter.add(layout.matches(haplotype, block, code));
                    }
                }
                let loci = copies[64 * block..].iter_mut().take(64).enumerate();
                for (bit, copies) in loci.filter(|(_, c)| c.len() > usize::from(code)) {
                    copies[usize::from(code)] = counter.count(bit);
                }
            }
        }
    }
}

/// Counts how often each bit of many words is set: 64 binary counters side by side, a word a digit.
#[derive(Default)]
struct BitCounter {
    digits: Vec<u64>,
}

impl BitCounter {
    fn add(&mut self, word: u64) {
        let mut carry = word;
        for digit in &mut self.digits {
            let next = *digit & carry;
            *digit ^= carry;
            carry = next;
            if carry == 0 {
                return;
            }
        }
        if carry != 0 {
            self.digits.push(carry);
        }
    }

    fn count(&self, bit: usize) -> u32 {
        self.digits
            .iter()
            .enumerate()
            .map(|(d, word)| ((word >> bit & 1) as u32) << d)
            .sum()
    }
}

#[cfg(test)]
mod tests {
    use super::super::dice::{Dice, Purpose};
    use super::*;

    #[test]
    fn bit_counters_count_as_loops_do() {
        let mut dice = Dice::new(1, Purpose::Meiosis, 0, 0);
        let mut counter = BitCounter::default();
        let mut slow = [0; 64];
        for _ in 0..1000 {
            let word = dice.word() & dice.word();
            counter.add(word);
            for (bit, slow) in slow.iter_mut().enumerate() {
                *slow += (word >> bit & 1) as u32;
            }
        }
        assert_eq!(std::array::from_fn(|bit| counter.count(bit)), slow);
    }
}
