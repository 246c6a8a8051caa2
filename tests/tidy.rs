//! A tidy genotype table gives what the equivalent VCF gives; its faults are told by row.

mod common;

use std::path::{Path, PathBuf};

use common::{run, without_provenance};
use serde_json::Value;

/// Numbers that look random and are the same every time (Lehmer 1951).
struct Draw(u64);

impl Draw {
    fn below(&mut self, limit: u64) -> u64 {
        self.0 = self.0 * 48_271 % 2_147_483_647;
        self.0 % limit
    }
}

/// Repeats by fragment length and loci of bases, in two visits, as table, map and VCF.
fn write(folder: &Path) -> [PathBuf; 4] {
    let mut draw = Draw(20_031);
    let samples: Vec<String> = (0..40).map(|i| format!("a{i:02}")).collect();
    let mut table = String::from("locus;sample;allele_2;allele_1;note\n");
    let mut map = String::from("locus\tcontig\tposition\n");
    let mut calls = String::from(
        "##fileformat=VCFv4.3\n##FORMAT=<ID=GT,Number=1,Type=String,Description=\"Genotype\">\n",
    );
    calls += "#CHROM\tPOS\tID\tREF\tALT\tQUAL\tFILTER\tINFO\tFORMAT\t";
    calls += &(samples.join("\t") + "\n");
    for l in 0..24u64 {
        let (name, contig, position) = (format!("loc{l}"), format!("c{}", l / 8), 1000 * (l + 1));
        let alleles: Vec<String> = match l % 3 {
            0 => (0..6).map(|i| (96 + 4 * i).to_string()).collect(),
            _ => vec!["A".into(), "G".into()],
        };
        map += &format!("{name}\t{contig}\t{position}\n");
        let codes: Vec<[Option<usize>; 2]> = samples
            .iter()
            .map(|_| {
                let missing = draw.below(12) == 0;
                let mut code = || (draw.below(7) * draw.below(7) / 7) as usize % alleles.len();
                if missing {
                    [None; 2]
                } else {
                    [Some(code()), Some(code())]
                }
            })
            .collect();
        // Alleles that nobody has cannot be known to a table.
        let seen = |a: &usize| codes.iter().flatten().any(|c| *c == Some(*a));
        let kept: Vec<usize> = (0..alleles.len()).filter(seen).collect();
        let listed: Vec<&str> = kept.iter().map(|&a| alleles[a].as_str()).collect();
        let others = if listed.len() > 1 {
            listed[1..].join(",")
        } else {
            ".".into()
        };
        calls += &format!(
            "{contig}\t{position}\t{name}\t{}\t{others}\t.\t.\t.\tGT",
            listed[0]
        );
        for (sample, code) in samples.iter().zip(&codes) {
            let text = |c: Option<usize>| c.map_or("NA".into(), |c| alleles[c].clone());
            let (first, second) = (text(code[0]), text(code[1]));
            table += &format!("{name};{sample};{second};{first};x\n");
            let place = |c: Option<usize>| {
                c.and_then(|c| kept.iter().position(|&k| k == c))
                    .map_or(".".into(), |p| p.to_string())
            };
            calls += &format!("\t{}/{}", place(code[0]), place(code[1]));
        }
        calls += "\n";
    }
    let mut sheet = String::from("sample,population,year\n");
    for (i, sample) in samples.iter().enumerate() {
        sheet += &format!("{sample},Alder,{}\n", if i < 20 { 2003 } else { 2019 });
    }
    let files = [
        ("table.csv", table),
        ("map.tsv", map),
        ("calls.vcf", calls),
        ("sheet.csv", sheet),
    ];
    files.map(|(name, text)| {
        std::fs::write(folder.join(name), text).unwrap();
        folder.join(name)
    })
}

fn told(command: &str, calls: &Path, sheet: &Path, map: Option<&Path>) -> Value {
    let mut arguments = vec![
        command.as_ref(),
        calls.as_os_str(),
        "--samples".as_ref(),
        sheet.as_os_str(),
    ];
    if command == "measure" {
        arguments.extend(["--generation-years", "4"].map(std::ffi::OsStr::new));
    }
    if let Some(map) = map {
        arguments.extend([std::ffi::OsStr::new("--locus-map"), map.as_os_str()]);
    }
    run(arguments).json()
}

#[test]
fn a_table_gives_what_the_equivalent_vcf_gives() {
    let folder = tempfile::tempdir().unwrap();
    let [table, map, calls, sheet] = write(folder.path());
    for command in ["measure", "screen"] {
        let tidy = told(command, &table, &sheet, Some(&map));
        assert_eq!(
            tidy["provenance"]["inputs"][0]["format"],
            "tidy genotype table"
        );
        let (mut tidy, mut vcf) = (
            without_provenance(tidy),
            without_provenance(told(command, &calls, &sheet, None)),
        );
        // The VCF breaks the standard with its lengths, and is told so.
        tidy["warnings"].take();
        vcf["warnings"].take();
        assert_eq!(tidy, vcf, "{command}");
    }
    // Without a map: as many loci, none linked.
    let unlinked = told("measure", &table, &sheet, None);
    assert_eq!(unlinked["loci"]["kept"], 24);
}

#[test]
fn faults_of_a_table_and_a_map_without_use_exit_2() {
    let folder = tempfile::tempdir().unwrap();
    let [_, map, calls, sheet] = write(folder.path());
    let bad = folder.path().join("bad.csv");
    std::fs::write(
        &bad,
        "sample,locus,allele_1,allele_2\na00,l,0,12\na01,l,A/G,12\na02,l,C,12\n",
    )
    .unwrap();
    let arguments = |calls: &Path| -> Vec<std::ffi::OsString> {
        vec![
            "measure".into(),
            calls.into(),
            "--samples".into(),
            sheet.clone().into(),
        ]
    };
    let refused = run(arguments(&bad));
    assert_eq!(refused.code, Some(2));
    for row in ["row 2: ", "row 3: ", "row 4: "] {
        assert!(refused.stderr.contains(row), "{}", refused.stderr);
    }
    let mut with_map = arguments(&calls);
    with_map.extend(["--locus-map".into(), map.into()]);
    let refused = run(with_map);
    assert_eq!(refused.code, Some(2));
    assert!(
        refused.stderr.contains("leave it out"),
        "{}",
        refused.stderr
    );
}
