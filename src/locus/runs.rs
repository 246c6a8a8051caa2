//! Runs of homozygosity along the contigs of one individual (McQuillan et al. 2008).

pub use crate::model::RunRule;

/// A run of homozygosity.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Run {
    /// Contig, as the caller numbers them.
    pub contig: u32,
    /// Position of the first homozygous locus.
    pub start: u64,
    /// Position of the last.
    pub end: u64,
    /// Typed loci inside.
    pub loci: u32,
}

impl Run {
    /// Base pairs from the first to the last locus.
    pub fn length(&self) -> u64 {
        self.end - self.start
    }
}

/// Where loci are: contig number and position, sorted by both.
pub type Place = (u32, u64);

/// Runs of one individual. `states` are dosages by locus: 1 heterozygous, 0 and 2 homozygous, anything
/// else missing. A run begins and ends at a homozygous locus; where it holds more heterozygous or
/// missing loci than allowed it is ended before the last of them, and the next begins behind.
pub fn runs_of_homozygosity(places: &[Place], states: &[u8], rule: &RunRule) -> Vec<Run> {
    let mut runs = Vec::new();
    let mut open: Option<Open> = None;
    let mut last: Option<Place> = None;
    for (&(contig, position), &state) in places.iter().zip(states) {
        let apart =
            last.is_some_and(|(c, p)| c != contig || position.saturating_sub(p) > rule.widest_gap);
        if apart {
            runs.extend(open.take().and_then(|run| run.close(rule)));
        }
        last = Some((contig, position));
        match (state, &mut open) {
            (0 | 2, None) => open = Some(Open::at(contig, position)),
            (0 | 2, Some(run)) => run.homozygous(position),
            (1, Some(run)) => run.heterozygous += 1,
            (_, Some(run)) => run.missing += 1,
            (_, None) => {}
        }
        let over = |run: &Open| {
            run.heterozygous > rule.most_heterozygous || run.missing > rule.most_missing
        };
        if open.as_ref().is_some_and(over) {
            runs.extend(open.take().and_then(|run| run.close(rule)));
        }
    }
    runs.extend(open.and_then(|run| run.close(rule)));
    runs
}

/// Base pairs that loci cover: the distances between neighbours on a contig that are no wider than
/// the gap that ends a run.
pub fn covered(places: &[Place], rule: &RunRule) -> u64 {
    places
        .windows(2)
        .filter(|two| two[0].0 == two[1].0)
        .map(|two| two[1].1 - two[0].1)
        .filter(|&gap| gap <= rule.widest_gap)
        .sum()
}

struct Open {
    run: Run,
    heterozygous: u32,
    missing: u32,
    /// Heterozygous loci before the last homozygous one: those inside.
    inside: u32,
    homozygous: u32,
}

impl Open {
    fn at(contig: u32, position: u64) -> Self {
        Open {
            run: Run {
                contig,
                start: position,
                end: position,
                loci: 1,
            },
            heterozygous: 0,
            missing: 0,
            inside: 0,
            homozygous: 1,
        }
    }

    fn homozygous(&mut self, position: u64) {
        self.run.end = position;
        self.homozygous += 1;
        self.inside = self.heterozygous;
    }

    fn close(mut self, rule: &RunRule) -> Option<Run> {
        self.run.loci = self.homozygous + self.inside;
        let long = self.run.length() >= rule.shortest && self.run.loci >= rule.fewest_loci;
        long.then_some(self.run)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    const RULE: RunRule = RunRule {
        fewest_loci: 4,
        shortest: 300,
        most_heterozygous: 1,
        most_missing: 1,
        widest_gap: 1000,
    };

    fn places(n: u64) -> Vec<Place> {
        (0..n).map(|i| (0, 100 * i)).collect()
    }

    fn found(states: &[u8]) -> Vec<(u64, u64, u32)> {
        let runs = runs_of_homozygosity(&places(states.len() as u64), states, &RULE);
        runs.iter().map(|r| (r.start, r.end, r.loci)).collect()
    }

    // By hand.
    #[test]
    fn runs_begin_and_end_at_homozygous_loci() {
        assert_eq!(found(&[1, 0, 2, 0, 0, 1, 1]), [(100, 400, 4)]);
        assert_eq!(found(&[0, 0, 1, 0, 0]), [(0, 400, 5)]);
        assert_eq!(found(&[0, 0, 3, 0, 0]), [(0, 400, 4)]);
        assert_eq!(found(&[0, 0, 3, 3, 0, 0]), []);
        assert_eq!(found(&[0, 0, 0]), []);
        assert_eq!(
            found(&[0, 0, 0, 0, 1, 1, 2, 2, 2, 2]),
            [(0, 300, 4), (600, 900, 4)]
        );
    }

    #[test]
    fn contig_ends_and_gaps_end_runs() {
        let mut places = places(8);
        places[4..].iter_mut().for_each(|p| p.0 = 1);
        let runs = runs_of_homozygosity(&places, &[0; 8], &RULE);
        let ends: Vec<_> = runs.iter().map(|r| (r.contig, r.start, r.end)).collect();
        assert_eq!(ends, [(0, 0, 300), (1, 400, 700)]);
        assert_eq!(covered(&places, &RULE), 600);
        let mut apart = self::places(8);
        apart[4..].iter_mut().for_each(|p| p.1 += 5000);
        assert_eq!(runs_of_homozygosity(&apart, &[2; 8], &RULE).len(), 2);
        assert_eq!(covered(&apart, &RULE), 600);
    }
}
