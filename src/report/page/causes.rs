//! What the page says of loci that changed more than drift explains.

use crate::report::figures::numbers::counted;
use crate::report::wire::Report;

/// How many loci are out of line, and what to rule out before selection is thought of.
pub fn outlier_words(report: &Report) -> Vec<String> {
    let tested: Vec<_> = report
        .comparisons
        .iter()
        .filter_map(|c| c.outlier_loci.as_ref())
        .collect();
    if tested.is_empty() {
        return vec![
            "Not tested: it takes two visits of a population and a known effective size."
                .to_owned(),
        ];
    }
    let found: u64 = tested.iter().map(|o| o.found).sum();
    let of = counted(tested.len() as u64, "comparison", "comparisons");
    match found {
        0 => vec![format!(
            "{of} tested: no locus changed more than drift explains."
        )],
        n => {
            let mut causes: Vec<&str> = Vec::new();
            for cause in tested.iter().flat_map(|o| &o.other_causes) {
                if !causes.contains(&cause.as_str()) {
                    causes.push(cause);
                }
            }
            let words = format!(
                "{of} tested: {} out of line. Before selection is thought of, rule out: {}.",
                counted(n, "locus is", "loci are"),
                causes.join("; ")
            );
            vec![words]
        }
    }
}
