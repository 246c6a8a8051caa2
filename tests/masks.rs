//! Masks: a file read with masks gives what the file masked by hand gives, as text and as BCF.

mod common;

use std::path::Path;

use common::{fixture, measure, measure_run, without_provenance};
use noodles_bcf as bcf;
use noodles_vcf as vcf;
use serde_json::Value;
use vcf::variant::io::Write as _;

const HEAD: &str = "##fileformat=VCFv4.3\n##contig=<ID=1>\n##contig=<ID=X>\n\
##FILTER=<ID=low,Description=\"Low quality\">\n##FILTER=<ID=far,Description=\"Far\">\n\
##FORMAT=<ID=GT,Number=1,Type=String,Description=\"Genotype\">\n\
##FORMAT=<ID=DP,Number=1,Type=Integer,Description=\"Reads\">\n\
##FORMAT=<ID=GQ,Number=1,Type=Integer,Description=\"Quality\">\n\
##FORMAT=<ID=AD,Number=R,Type=Integer,Description=\"Reads by allele\">\n\
#CHROM\tPOS\tID\tREF\tALT\tQUAL\tFILTER\tINFO\tFORMAT\ta1\ta2\ta3\ta4\ta5\ta6\n";

/// Sites before the genotypes, and what they are here for.
const SITES: [&str; 7] = [
    "1\t100\tplain\tA\tC\t.\tPASS",
    "1\t200\tlow\tA\tC\t.\tlow",
    "1\t300\tboth\tA\tC\t.\tlow;far",
    "1\t400\tdot\tA\tC\t.\t.",
    "1\t500\tthree\tA\tC,G\t.\tPASS",
    "1\t600\tlong\tA\tCT\t.\tPASS",
    "X\t100\tsex\tA\tC\t.\tPASS",
];

/// GT, GQ, DP, AD of each sample: good; low quality; shallow; deep; unbalanced; balanced heterozygote.
const CALLS: [&str; 6] = [
    "0/0:40:20:20,0",
    "1/1:9:20:0,20",
    "0/1:30:4:2,2",
    "1/1:60:200:0,200",
    "0/1:30:20:18,2",
    "0/1:30:20:11,9",
];

/// The calls with the records that `keep` names, genotypes of the columns in `masked` missing.
fn calls(keep: impl Fn(&str) -> bool, masked: &[usize]) -> String {
    let mut text = HEAD.to_owned();
    for site in SITES
        .iter()
        .filter(|site| keep(site.split('\t').nth(2).unwrap()))
    {
        text += &format!("{site}\t.\tGT:GQ:DP:AD");
        for (column, call) in CALLS.iter().enumerate() {
            let (genotype, rest) = call.split_once(':').unwrap();
            let genotype = if masked.contains(&column) {
                "./."
            } else {
                genotype
            };
            let third = if site.contains("C,G") { ",0" } else { "" };
            text += &format!("\t{genotype}:{rest}{third}");
        }
        text += "\n";
    }
    text
}

fn bcf_of(text: &str) -> Vec<u8> {
    let mut reader = vcf::io::Reader::new(text.as_bytes());
    let header = reader.read_header().unwrap();
    let mut writer = bcf::io::Writer::from(Vec::new());
    writer.write_header(&header).unwrap();
    for record in reader.record_bufs(&header) {
        writer
            .write_variant_record(&header, &record.unwrap())
            .unwrap();
    }
    writer.into_inner()
}

fn told(folder: &Path, name: &str, bytes: &[u8], options: &[&str]) -> Value {
    let (calls, sheet) = (folder.join(name), folder.join("sheet.csv"));
    std::fs::write(&calls, bytes).unwrap();
    let mut rows = String::from("sample,population,year\n");
    (1..=6).for_each(|i| rows += &format!("a{i},Alder,{}\n", 2003 + i / 4));
    std::fs::write(&sheet, rows).unwrap();
    measure(&calls, &sheet, options)
}

#[test]
fn masks_give_what_masking_by_hand_gives() {
    let all = |_: &str| true;
    type Keep = fn(&str) -> bool;
    // Options; what is left by hand; the reason counted, and how often.
    type Case<'a> = (&'a [&'a str], Keep, &'a [usize], &'a str, u64);
    let cases: [Case; 9] = [
        (
            &["--mask-below-gq", "10"],
            |_| true,
            &[1],
            "masked_below_gq",
            7,
        ),
        (
            &["--mask-below-dp", "5"],
            |_| true,
            &[2],
            "masked_below_dp",
            7,
        ),
        (
            &["--mask-above-dp", "100"],
            |_| true,
            &[3],
            "masked_above_dp",
            7,
        ),
        (
            &["--mask-below-balance", "0.2"],
            |_| true,
            &[4],
            "masked_below_balance",
            7,
        ),
        (
            &["--filters", "PASS,."],
            |id| id != "low" && id != "both",
            &[],
            "masked_filter",
            2,
        ),
        (
            &["--filters", "PASS,low"],
            |id| id != "dot" && id != "both",
            &[],
            "masked_filter",
            2,
        ),
        (
            &["--biallelic-only"],
            |id| id != "three",
            &[],
            "masked_more_than_two_alleles",
            1,
        ),
        (
            &["--snv-only"],
            |id| id != "long",
            &[],
            "masked_not_single_base",
            1,
        ),
        (
            &["--without-contigs", "X"],
            |id| id != "sex",
            &[],
            "masked_contig",
            1,
        ),
    ];
    let folder = tempfile::tempdir().unwrap();
    let text = calls(all, &[]);
    for (options, keep, masked, reason, times) in cases {
        let by_hand = told(
            folder.path(),
            "hand.vcf",
            calls(keep, masked).as_bytes(),
            &[],
        );
        let read = told(folder.path(), "calls.vcf", text.as_bytes(), options);
        let binary = told(folder.path(), "calls.bcf", &bcf_of(&text), options);
        let kind = if masked.is_empty() {
            "set_aside"
        } else {
            "genotypes"
        };
        assert_eq!(
            read["loci"][kind][reason], times,
            "{options:?}: {}",
            read["loci"]
        );
        for key in ["strata", "comparisons", "losses"] {
            assert_eq!(read[key], by_hand[key], "{options:?} {key}");
        }
        assert_eq!(read["loci"]["kept"], by_hand["loci"]["kept"]);
        assert_eq!(read["loci"]["read"], 7);
        assert_eq!(
            without_provenance(read),
            without_provenance(binary),
            "{options:?}"
        );
    }
    // One contig alone: what is left is the rest of the case before it.
    let one = told(
        folder.path(),
        "calls.vcf",
        text.as_bytes(),
        &["--contigs", "X"],
    );
    assert_eq!(
        (
            &one["loci"]["kept"],
            &one["loci"]["set_aside"]["masked_contig"]
        ),
        (&1.into(), &6.into())
    );
}

#[test]
fn masks_that_leave_nothing_are_told_and_masks_of_absent_fields_change_nothing() {
    let folder = tempfile::tempdir().unwrap();
    told(
        folder.path(),
        "calls.vcf",
        calls(|_| true, &[]).as_bytes(),
        &[],
    );
    let (file, sheet) = (
        folder.path().join("calls.vcf"),
        folder.path().join("sheet.csv"),
    );
    let nothing = measure_run(&file, &sheet, &["--mask-below-gq", "99"]);
    assert_eq!(nothing.code, Some(1));
    assert!(
        nothing.stderr.contains("nothing_left_unmasked 7"),
        "{}",
        nothing.stderr
    );
    // The demonstration has genotypes alone.
    let demo = [fixture("demo/calls.vcf.gz"), fixture("demo/samples.tsv")];
    let plain = measure(&demo[0], &demo[1], &[]);
    let masked = measure(
        &demo[0],
        &demo[1],
        &["--mask-below-gq", "20", "--threads", "3"],
    );
    assert_eq!(without_provenance(plain), without_provenance(masked));
}
