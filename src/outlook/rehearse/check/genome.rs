//! Chromosomes and loci.

use std::collections::BTreeSet;

use super::super::genome::{CONTIG_MARGIN, carriers, contigs};
use super::super::scenario::{Frequencies, LocusSet, Scenario};
use super::{Found, LONGEST_CONTIG, inside};

impl Found {
    pub(super) fn chromosomes(&mut self, s: &Scenario) {
        self.need(
            !s.chromosome.is_empty(),
            "no `chromosome`",
            "add a [[chromosome]] table",
        );
        for (i, c) in s.chromosome.iter().enumerate() {
            let key = format!("chromosome[{}]", i + 1);
            self.need(
                contig_name(&c.name),
                format!("`{key}.name` is \"{}\"", c.name),
                "use letters, digits, _ - and . without spaces",
            );
            self.range(
                &format!("{key}.length_bp"),
                c.length_bp as f64,
                1000.0,
                LONGEST_CONTIG as f64,
            );
            self.range(&format!("{key}.copies"), f64::from(c.copies), 1.0, 10_000.0);
            if let Some(length) = c.map_length_cm {
                self.range(&format!("{key}.map_length_cm"), length, 0.0, 100_000.0);
                self.need(
                    !c.unlinked,
                    format!("`{key}` has both `map_length_cm` and `unlinked`"),
                    "leave one out",
                );
            }
        }
        if self.0.is_empty() {
            let mut names = BTreeSet::new();
            for contig in contigs(s) {
                let once = names.insert(contig.name.clone());
                self.need(
                    once,
                    format!("two chromosomes named {}", contig.name),
                    "rename one",
                );
            }
        }
    }

    pub(super) fn loci(&mut self, s: &Scenario, set: &LocusSet, key: &str) {
        self.range(
            &format!("{key}.count"),
            f64::from(set.count),
            1.0,
            50_000_000.0,
        );
        self.range(&format!("{key}.alleles"), f64::from(set.alleles), 2.0, 64.0);
        for name in &set.chromosomes {
            let known = s.chromosome.iter().any(|c| c.name == *name);
            self.need(
                known,
                format!("`{key}.chromosomes` names {name}, which is no chromosome"),
                "use the `name` of a [[chromosome]]",
            );
        }
        let two = |found: &mut Self, kind: &str| {
            found.need(
                set.alleles == 2,
                format!(
                    "`{key}.frequencies` is `{kind}` for {} alleles",
                    set.alleles
                ),
                "use `dirichlet` or `list` for more than two alleles",
            );
        };
        let shape = format!("{key}.frequencies");
        match &set.frequencies {
            Frequencies::Beta([a, b]) => {
                two(self, "beta");
                self.range(&shape, *a, 1e-3, 1e6);
                self.range(&shape, *b, 1e-3, 1e6);
            }
            Frequencies::Dirichlet(a) => self.range(&shape, *a, 1e-3, 1e6),
            Frequencies::Minor([low, high]) => {
                two(self, "minor");
                self.need(
                    inside(*low, 0.0, *high) && inside(*high, *low, 0.5),
                    format!("`{shape}` is minor = [{low}, {high}]"),
                    "give two numbers from 0 to 0.5, the lower first",
                );
            }
            Frequencies::List(list) => {
                let sum: f64 = list.iter().sum();
                let fine = list.iter().all(|&f| inside(f, 0.0, 1.0)) && (sum - 1.0).abs() < 1e-6;
                self.need(
                    fine && list.len() == set.alleles as usize,
                    format!("`{shape}` lists {} numbers of sum {sum}", list.len()),
                    format!("give {} numbers from 0 to 1 of sum 1", set.alleles),
                );
            }
        }
        // Room for the loci, with all sets on the smallest chromosome in mind.
        let all = contigs(s);
        let room: u64 = carriers(&all, &set.chromosomes, s)
            .into_iter()
            .map(|c| all[c].length_bp.saturating_sub(CONTIG_MARGIN))
            .sum();
        let wanted: u64 = s.loci.iter().map(|l| u64::from(l.count)).sum();
        self.need(
            wanted * 4 <= room,
            format!("`{key}`: {wanted} loci in all for {room} bases of its chromosomes"),
            "have four bases a locus or more",
        );
    }
}

fn contig_name(name: &str) -> bool {
    let fine = |c: char| c.is_ascii_alphanumeric() || "_-.".contains(c);
    name.starts_with(|c: char| c.is_ascii_alphanumeric()) && name.chars().all(fine)
}
