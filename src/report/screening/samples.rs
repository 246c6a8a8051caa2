//! Sample by sample: quality, inbreeding, and what the cleaned sheet says.

use super::Screened;
use crate::locus::individuals::inbreeding_from_runs;
use crate::merge::from_fixed;
use crate::report::screen_wire as wire;

/// How many scaled median deviations from the median of its stratum make a heterozygosity odd: of
/// 10 000 good samples, one.
const ODD_HETEROZYGOSITY: f64 = 4.0;
/// Fewest samples of a stratum for that.
const ENOUGH_SAMPLES: usize = 10;
/// Median deviation of a normal variable to its standard deviation.
const TO_STANDARD_DEVIATION: f64 = 1.4826;

impl Screened<'_> {
    pub(super) fn samples(&self) -> Vec<wire::ScreenedSample> {
        let odd = self.odd_heterozygosity();
        (0..self.words.len())
            .map(|slot| self.sample(slot, odd[slot]))
            .collect()
    }

    fn sample(&self, slot: usize, odd: Option<bool>) -> wire::ScreenedSample {
        let sums = &self.sums.samples[slot];
        let expected = from_fixed(sums.expected);
        let room = sums.moment_loci as f64 - expected;
        let scale = from_fixed(sums.uniting_scale);
        let runs = self.runs.as_ref().ok().map(|runs| &runs[slot]);
        let lengths: Option<Vec<u64>> =
            runs.map(|runs| runs.iter().map(|run| run.length()).collect());
        let (used, why) = self.verdict(slot, odd);
        wire::ScreenedSample {
            sample: self.name(slot),
            stratum: self.stratum_name(slot),
            used,
            why,
            typed: sums.typed,
            call_rate: self.call_rate(slot),
            typed_varying: sums.typed_varying,
            heterozygous: sums.heterozygous,
            heterozygosity: self.heterozygosity(slot),
            inbreeding_moments: (room > 0.0).then(|| (sums.homozygous as f64 - expected) / room),
            inbreeding_moments_loci: sums.moment_loci,
            inbreeding_uniting: (scale > 0.0).then(|| from_fixed(sums.uniting) / scale),
            inbreeding_uniting_loci: sums.uniting_loci,
            runs: lengths.as_ref().map(|l| l.len() as u64),
            runs_bp: lengths.as_ref().map(|l| l.iter().sum()),
            f_roh: lengths.and_then(|l| inbreeding_from_runs(&l, self.covered)),
        }
    }

    fn call_rate(&self, slot: usize) -> f64 {
        self.sums.samples[slot].typed as f64 / self.sums.kept.max(1) as f64
    }

    fn heterozygosity(&self, slot: usize) -> Option<f64> {
        let sums = &self.sums.samples[slot];
        (sums.typed_varying > 0).then(|| sums.heterozygous as f64 / sums.typed_varying as f64)
    }

    /// Samples whose heterozygosity lies far from that of their stratum: `true` above.
    fn odd_heterozygosity(&self) -> Vec<Option<bool>> {
        let mut odd = vec![None; self.words.len()];
        for slots in &self.scheme.strata {
            let values: Vec<(usize, f64)> = slots
                .clone()
                .filter_map(|slot| Some((slot, self.heterozygosity(slot)?)))
                .collect();
            if values.len() < ENOUGH_SAMPLES {
                continue;
            }
            let middle = median(values.iter().map(|v| v.1).collect());
            let spread = median(values.iter().map(|v| (v.1 - middle).abs()).collect());
            let limit = ODD_HETEROZYGOSITY * TO_STANDARD_DEVIATION * spread;
            for (slot, value) in values {
                if limit > 0.0 && (value - middle).abs() > limit {
                    odd[slot] = Some(value > middle);
                }
            }
        }
        odd
    }

    /// What the cleaned sheet says: whether to use the sample, and why not or what to know.
    fn verdict(&self, slot: usize, odd: Option<bool>) -> (bool, Vec<String>) {
        let (mut used, mut why) = (true, Vec::new());
        let word = &self.words[slot];
        if !word.used {
            used = false;
            why.push("the sheet says no".to_owned());
        }
        let rate = self.call_rate(slot);
        if self.sums.samples[slot].typed == 0 {
            used = false;
            why.push("no genotype".to_owned());
        } else if rate < self.plan.min_sample_call_rate {
            used = false;
            let least = self.plan.min_sample_call_rate;
            why.push(format!("call rate {rate:.3} is below {least}"));
        }
        if let Some(name) = &word.repeats_name {
            used = false;
            why.push(format!("replicate of {name}"));
            if let Some(other) = word.repeats {
                let (_, all) = self.matching().compare(slot, other);
                let (s, t) = (self.stratum_of[slot], self.stratum_of[other]);
                let limit = self.rule.limit(s, t, all.shared);
                if limit.is_some_and(|limit| all.mismatching > limit) {
                    why.push(format!(
                        "differs from {name} at {} of {} loci: check the labels",
                        all.mismatching, all.shared
                    ));
                }
            }
        }
        why.extend(self.same_as(slot, &mut used));
        why.extend(odd.map(|above| {
            let text = match above {
                true => "unusually heterozygous for its stratum: a mixture of two individuals?",
                false => "unusually homozygous for its stratum: dropout, or inbred?",
            };
            text.to_owned()
        }));
        if let Some(family) = self.families.iter().find(|family| family.contains(&slot)) {
            why.push(format!("in a family of {} full sibs", family.len()));
        }
        (used, why)
    }

    /// What is to be said of other samples of the same individual.
    fn same_as(&self, slot: usize, used: &mut bool) -> Vec<String> {
        let group = self
            .grouped
            .groups
            .iter()
            .find(|group| group.contains(&slot));
        let declared = |a: usize, b: usize| {
            self.words[a].repeats == Some(b) || self.words[b].repeats == Some(a)
        };
        let others = group.into_iter().flatten().filter(|&&other| other != slot);
        let mut why = Vec::new();
        for &other in others.filter(|&&other| !declared(slot, other)) {
            let (_, all) = self.matching().compare(slot, other);
            let same_stratum = self.stratum_of[slot] == self.stratum_of[other];
            let differ = format!("{} of {} loci differ", all.mismatching, all.shared);
            if same_stratum {
                why.push(format!(
                    "same individual as {} ({differ})",
                    self.name(other)
                ));
            } else {
                why.push(format!(
                    "same individual as {} of {} ({differ}): kept in both",
                    self.name(other),
                    self.stratum_name(other)
                ));
            }
        }
        if self.spare[slot] {
            *used = false;
        }
        why
    }
}

/// Median of a list that is not empty.
fn median(mut values: Vec<f64>) -> f64 {
    values.sort_by(f64::total_cmp);
    let middle = values.len() / 2;
    match values.len() % 2 {
        1 => values[middle],
        _ => (values[middle - 1] + values[middle]) / 2.0,
    }
}
