//! The sums of a tally, damaged behind a checksum that holds: what a broken writer or an enemy would give.

use std::path::PathBuf;
use std::sync::LazyLock;

use genewane::cli::{self, Work};
use genewane::ingest::sheet::parse_sheet;
use genewane::model::{MeasurePlan, Strata, match_samples};
use genewane::report::tally::{TallyHeader, TallyRows, read_tally};
use genewane::run;

use crate::targets::{OF_A_SURVEY, Outcome, SMALL, made, words};

/// A tally whose sums are replaced, and what is asked of it.
struct Survey {
    header: TallyHeader,
    state: Vec<u8>,
    strata: Strata,
    plan: MeasurePlan,
    tally: PathBuf,
}

static SURVEY: LazyLock<Survey> = LazyLock::new(|| {
    let options = [&OF_A_SURVEY[..], &["fd8", "--list-losses", "3"]].concat();
    made("tally", "whole.parquet", &options);
    let (header, state) = read_tally(&SMALL.join("whole.parquet")).expect("a tally");
    let sheet = std::fs::read(SMALL.join("sheet.tsv")).expect("a sheet");
    let (rows, _) = parse_sheet(&sheet).expect("rows");
    let matched = match_samples(&header.samples_in_calls, &rows, false).expect("strata");
    let tally = SMALL.join("sums.parquet");
    let mut arguments = vec!["genewane".into(), "measure".into(), tally.clone().into()];
    arguments.extend(["--samples".into(), SMALL.join("sheet.tsv").into_os_string()]);
    arguments.extend(["-o".into(), SMALL.join("sums.json").into_os_string()]);
    let more = ["--quiet", "--generation-years", "2", "--list-losses", "3"];
    arguments.extend(more.map(Into::into));
    let Ok(Work::Measure(plan)) = cli::parse_from(&arguments) else {
        panic!("the plan of a report");
    };
    Survey {
        header,
        state,
        strata: matched.strata,
        plan: *plan,
        tally,
    }
});

pub fn states() -> Vec<Vec<u8>> {
    vec![SURVEY.state.clone()]
}

/// A report of a tally with these sums.
pub fn report(state: &[u8]) -> Outcome {
    let survey = &*SURVEY;
    TallyRows::create(&survey.tally, &survey.strata)
        .and_then(|rows| rows.finish(&survey.tally, survey.header.clone(), state))
        .expect("the scratch folder takes it");
    run::measure(&survey.plan, Vec::new())
        .map(drop)
        .map_err(words)
}

/// One to three whole numbers, as the sums are written (seven bits a byte, the lowest first), changed to
/// numbers at the edges of their types. Damage anywhere mostly breaks the shape; this keeps it.
pub fn renumbered(number: u64) -> Vec<u8> {
    const EDGES: [u128; 8] = [
        0,
        1,
        127,
        u32::MAX as u128,
        u64::MAX as u128 - 1,
        u64::MAX as u128,
        u128::MAX / 2,
        u128::MAX,
    ];
    let mut bytes = SURVEY.state.clone();
    let mut chance = number.wrapping_mul(0x9e37_79b9_7f4a_7c15);
    let mut below = |n: usize| {
        chance ^= chance << 13;
        chance ^= chance >> 7;
        chance ^= chance << 17;
        (chance % n as u64) as usize
    };
    for _ in 0..=below(3) {
        let at = below(bytes.len() - 8) + 8;
        let start = bytes[..at]
            .iter()
            .rposition(|b| b & 0x80 == 0)
            .map_or(0, |i| i + 1);
        let end = start
            + bytes[start..]
                .iter()
                .take_while(|&&b| b & 0x80 != 0)
                .count();
        let new = written(EDGES[below(EDGES.len())]);
        bytes.splice(start..(end + 1).min(bytes.len()), new);
    }
    bytes
}

fn written(mut number: u128) -> Vec<u8> {
    let mut bytes = Vec::new();
    while number > 0x7f {
        bytes.push(number as u8 | 0x80);
        number >>= 7;
    }
    bytes.push(number as u8);
    bytes
}
