//! Samples that are one individual.

use std::collections::{BTreeMap, HashSet};

use super::matching::{PairFound, PairKind};

/// Samples put together, and what would not fit.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Grouped {
    /// Slots of each individual with several samples, ascending; groups by their first slot.
    pub groups: Vec<Vec<usize>>,
    /// Matching pairs whose groups do not match as a whole: a chain, told and not joined.
    pub chains: Vec<(usize, usize)>,
}

/// Joins matching pairs, the least mismatching first, where every pair across would match too.
pub fn groups_of(pairs: &[PairFound]) -> Grouped {
    let mut edges: Vec<&PairFound> = pairs.iter().filter(|p| p.kind == PairKind::Match).collect();
    let share = |p: &PairFound| f64::from(p.all.mismatching) / f64::from(p.all.shared.max(1));
    edges.sort_by(|a, b| {
        let ties = (a.first, a.second).cmp(&(b.first, b.second));
        share(a).total_cmp(&share(b)).then(ties)
    });
    let matching: HashSet<(usize, usize)> = edges.iter().map(|p| (p.first, p.second)).collect();
    let mut group_of: BTreeMap<usize, usize> = BTreeMap::new();
    let mut members: Vec<Vec<usize>> = Vec::new();
    for edge in &edges {
        for slot in [edge.first, edge.second] {
            group_of.entry(slot).or_insert_with(|| {
                members.push(vec![slot]);
                members.len() - 1
            });
        }
        let (a, b) = (group_of[&edge.first], group_of[&edge.second]);
        if a == b {
            continue;
        }
        let across = |&x: &usize| {
            let pair = |&y: &usize| matching.contains(&(x.min(y), x.max(y)));
            members[b].iter().all(pair)
        };
        if members[a].iter().all(across) {
            let moved = std::mem::take(&mut members[b]);
            for slot in &moved {
                group_of.insert(*slot, a);
            }
            members[a].extend(moved);
        }
    }
    let mut groups: Vec<Vec<usize>> = members.into_iter().filter(|m| m.len() > 1).collect();
    groups.iter_mut().for_each(|group| group.sort_unstable());
    groups.sort_unstable();
    let mut chains: Vec<(usize, usize)> = edges
        .iter()
        .filter(|p| group_of[&p.first] != group_of[&p.second])
        .map(|p| (p.first, p.second))
        .collect();
    chains.sort_unstable();
    Grouped { groups, chains }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::locus::individuals::PairCounts;

    fn pair(first: usize, second: usize, mismatching: u32) -> PairFound {
        let counts = PairCounts {
            shared: 100,
            mismatching,
            ..PairCounts::default()
        };
        PairFound {
            first,
            second,
            biallelic: counts,
            all: counts,
            kind: PairKind::Match,
        }
    }

    #[test]
    fn a_group_needs_every_pair() {
        let whole = groups_of(&[pair(0, 4, 1), pair(0, 7, 2), pair(4, 7, 3)]);
        assert_eq!(whole.groups, [vec![0, 4, 7]]);
        assert!(whole.chains.is_empty());
        // 4 and 7 do not match: the closer pair is joined, the other is told.
        let chain = groups_of(&[pair(0, 4, 5), pair(0, 7, 2)]);
        assert_eq!(chain.groups, [vec![0, 7]]);
        assert_eq!(chain.chains, [(0, 4)]);
        assert_eq!(groups_of(&[]), Grouped::default());
    }
}
