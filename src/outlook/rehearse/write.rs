//! The files of a rehearsal: calls with their index, sample sheet, truth.

use std::io::{BufWriter, Write};
use std::path::{Path, PathBuf};

use noodles_csi::binning_index::index::header::Builder as IndexHeader;
use noodles_tabix as tabix;
use rayon::prelude::*;

use super::check::read_scenario;
use super::genome::Contig;
use super::records::{END_OF_FILE, Part, compress};
use super::scenario::{Field, Scenario};
use super::simulation::Stage;
use super::truth::{Truth, visit_label};
use crate::error::{Error, Result};
use crate::files::WholeFile;
use crate::model::Sex;

/// What a rehearsal wrote.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Summary {
    /// Seed that was used.
    pub seed: u64,
    /// Loci in the calls.
    pub loci: u64,
    /// Samples in the calls.
    pub samples: u64,
    /// Populations at visits.
    pub strata: u64,
    /// Alleles gone from a population between its first and last visit.
    pub alleles_gone: u64,
    /// Files written.
    pub files: Vec<PathBuf>,
}

/// Simulates a scenario file and writes `calls.vcf.gz`, `calls.vcf.gz.tbi`, `samples.tsv` and
/// `truth.json` into a directory, which is made where it is not there. Files appear under their
/// names only when all are complete. The bytes depend on the scenario and the seed alone.
///
/// # Errors
///
/// [`Error::Sheet`] for a scenario that cannot be run, [`Error::Io`] where reading or writing
/// fails.
pub fn rehearse(scenario: &Path, out: &Path, seed: Option<u64>, threads: usize) -> Result<Summary> {
    let scenario = read_scenario(scenario)?;
    let stage = Stage::new(&scenario, seed.unwrap_or(scenario.seed))?;
    std::fs::create_dir_all(out).map_err(|e| Error::io(out, "create", e))?;
    let pool = rayon::ThreadPoolBuilder::new()
        .num_threads(threads.max(1))
        .build()
        .map_err(|e| Error::Usage(format!("cannot start {threads} threads: {e}")))?;
    let mut truth = stage.truth();
    let calls_path = out.join("calls.vcf.gz");
    let mut calls = CallsFile::create(&calls_path, &stage)?;
    // One unit a thread is in memory at a time, its records compressed already.
    for units in stage.genome.units.chunks(threads.max(1)) {
        let run = |unit| {
            let outcome = stage.run(unit);
            let contig = &stage.genome.contigs[unit.contig].name;
            let part = Part::new(contig, &outcome, &scenario.genotyping)?;
            Ok((contig, part, outcome.truth, outcome.gone))
        };
        let done: std::io::Result<Vec<_>> = pool.install(|| units.par_iter().map(run).collect());
        for (contig, part, loci, gone) in done.map_err(|e| Error::io(&calls_path, "compress", e))? {
            calls.write(contig, &part)?;
            truth.loci.extend(loci);
            truth.gone.extend(gone);
        }
    }
    truth.finish();
    let (calls, index) = calls.finish()?;
    let files = vec![
        (calls, calls_path),
        (index, out.join("calls.vcf.gz.tbi")),
        write_sheet(&stage, out)?,
        write_truth(&truth, out)?,
    ];
    let summary = Summary {
        seed: stage.seed,
        loci: truth.loci.len() as u64,
        samples: stage.history.samples.len() as u64,
        strata: stage.history.strata.len() as u64,
        alleles_gone: truth.gone.len() as u64,
        files: files.iter().map(|(_, path)| path.clone()).collect(),
    };
    for (file, _) in files {
        file.finish()?;
    }
    Ok(summary)
}

/// The growing file of calls and its index.
struct CallsFile {
    path: PathBuf,
    file: BufWriter<WholeFile>,
    /// Bytes written so far.
    length: u64,
    indexer: tabix::index::Indexer,
}

impl CallsFile {
    fn create(path: &Path, stage: &Stage) -> Result<Self> {
        let mut indexer = tabix::index::Indexer::default();
        indexer.set_header(IndexHeader::vcf().build());
        let file = BufWriter::new(WholeFile::create(path)?);
        let mut calls = CallsFile {
            path: path.into(),
            file,
            length: 0,
            indexer,
        };
        let fail = |e| Error::io(path, "write", e);
        calls.append(&compress(header(stage).as_bytes()).map_err(fail)?)?;
        Ok(calls)
    }

    fn append(&mut self, blocks: &[u8]) -> Result<()> {
        self.length += blocks.len() as u64;
        let done = self.file.write_all(blocks);
        done.map_err(|e| Error::io(&self.path, "write", e))
    }

    /// Appends the records of one unit and notes their places.
    fn write(&mut self, contig: &str, part: &Part) -> Result<()> {
        let fail = |e| Error::io(&self.path, "index", e);
        for record in &part.records {
            record
                .index(contig, self.length, &mut self.indexer)
                .map_err(fail)?;
        }
        self.append(&part.blocks)
    }

    fn finish(mut self) -> Result<(WholeFile, WholeFile)> {
        self.append(&END_OF_FILE)?;
        let path = self.path;
        let calls = self
            .file
            .into_inner()
            .map_err(|e| Error::io(&path, "write", e.into_error()))?;
        let index_path = path.with_extension("gz.tbi");
        let mut index = tabix::io::Writer::new(WholeFile::create(&index_path)?);
        index
            .write_index(&self.indexer.build())
            .map_err(|e| Error::io(&index_path, "write", e))?;
        let index = index.into_inner().finish();
        let index = index.map_err(|e| Error::io(&index_path, "write", e))?;
        Ok((calls, index))
    }
}

fn header(stage: &Stage) -> String {
    let mut text = String::from("##fileformat=VCFv4.3\n##source=genewane rehearse\n");
    text.push_str("##FILTER=<ID=PASS,Description=\"All filters passed\">\n");
    for Contig {
        name, length_bp, ..
    } in &stage.genome.contigs
    {
        text.push_str(&format!("##contig=<ID={name},length={length_bp}>\n"));
    }
    text.push_str("##FORMAT=<ID=GT,Number=1,Type=String,Description=\"Genotype\">\n");
    for field in &stage.scenario.genotyping.fields {
        text.push_str(match field {
            Field::AD => "##FORMAT=<ID=AD,Number=R,Type=Integer,Description=\"Reads by allele\">\n",
            Field::DP => "##FORMAT=<ID=DP,Number=1,Type=Integer,Description=\"Reads\">\n",
            Field::GQ => "##FORMAT=<ID=GQ,Number=1,Type=Integer,Description=\"Genotype quality\">\n",
            Field::PL => "##FORMAT=<ID=PL,Number=G,Type=Integer,Description=\"Phred-scaled genotype likelihoods\">\n",
        });
    }
    text.push_str("#CHROM\tPOS\tID\tREF\tALT\tQUAL\tFILTER\tINFO\tFORMAT");
    for sample in &stage.history.samples {
        text.push('\t');
        text.push_str(&sample.name);
    }
    text.push('\n');
    text
}

/// A field of the sheet that has no value.
const BLANK: &str = "";

fn write_sheet(stage: &Stage, out: &Path) -> Result<(WholeFile, PathBuf)> {
    let path = out.join("samples.tsv");
    let text = sheet(stage.scenario, stage);
    let mut file = WholeFile::create(&path)?;
    file.write_all(text.as_bytes())
        .map_err(|e| Error::io(&path, "write", e))?;
    Ok((file, path))
}

fn sheet(scenario: &Scenario, stage: &Stage) -> String {
    let samples = &stage.history.samples;
    let with_visit = scenario.visit.iter().any(|v| v.label.is_some());
    let with_sex = samples.iter().any(|s| s.sex.is_some());
    let with_replicates = samples.iter().any(|s| s.replicate_of.is_some());
    let mut columns = vec!["sample", "population", "year", "generation"];
    columns.extend(with_visit.then_some("visit"));
    columns.extend(with_sex.then_some("sex"));
    columns.extend(with_replicates.then_some("replicate_of"));
    let mut text = columns.join("\t") + "\n";
    for sample in samples {
        let stratum = &stage.history.strata[sample.stratum];
        let population = &scenario.population[stratum.population].name;
        let mut row = vec![sample.name.clone(), population.clone()];
        row.push(stratum.year.to_string());
        row.push(stratum.generation.to_string());
        row.extend(with_visit.then(|| visit_label(scenario, stratum.visit)));
        row.extend(with_sex.then(|| {
            let word = |s| if s == Sex::Female { "female" } else { "male" };
            sample.sex.map_or(BLANK, word).to_string()
        }));
        row.extend(with_replicates.then(|| {
            sample
                .replicate_of
                .map_or(BLANK.to_string(), |s| samples[s].name.clone())
        }));
        text.push_str(&(row.join("\t") + "\n"));
    }
    text
}

fn write_truth(truth: &Truth, out: &Path) -> Result<(WholeFile, PathBuf)> {
    let path = out.join("truth.json");
    let mut file = BufWriter::new(WholeFile::create(&path)?);
    serde_json::to_writer(&mut file, truth)
        .map_err(std::io::Error::from)
        .and_then(|()| file.write_all(b"\n"))
        .map_err(|e| Error::io(&path, "write", e))?;
    let file = file
        .into_inner()
        .map_err(|e| Error::io(&path, "write", e.into_error()))?;
    Ok((file, path))
}

#[cfg(test)]
mod tests {
    use std::io::{BufRead, BufReader, Read};

    use noodles_bgzf as bgzf;
    use noodles_core::Position;
    use noodles_csi::BinningIndex;

    use super::*;

    const SCENARIO: &str = r#"
start_year = 2001
generation_years = 1.5
chromosome = [{ name = "k", length_bp = 3_000_000, copies = 2 }, { name = "z", length_bp = 50_000 }]
loci = [{ count = 3000, chromosomes = ["k"] }, { count = 40, alleles = 12, chromosomes = ["k"] }]
population = [{ name = "Over Wick", size = 20 }]
visit = [
    { generation = 0, individuals = 8, label = "before" },
    { generation = 3, individuals = 8, replicates = 1, recaptured = 1 },
]
genotyping = { depth = 6, missing_rate = 0.1, fields = ["DP", "AD", "GQ", "PL"] }
"#;

    fn written(seed: u64) -> (tempfile::TempDir, Summary) {
        let folder = tempfile::tempdir().unwrap();
        let scenario = folder.path().join("scenario.toml");
        std::fs::write(&scenario, SCENARIO).unwrap();
        let summary = rehearse(&scenario, &folder.path().join("new/out"), Some(seed), 2).unwrap();
        (folder, summary)
    }

    fn lines(path: &Path) -> Vec<String> {
        let file = std::fs::File::open(path).unwrap();
        BufReader::new(flate2::read::MultiGzDecoder::new(file))
            .lines()
            .map(|l| l.unwrap())
            .collect()
    }

    /// Records, through a reader of text of its own, against the simulation in memory.
    #[test]
    fn the_calls_are_those_of_the_simulation() {
        let (_folder, summary) = written(4);
        assert_eq!((summary.seed, summary.loci, summary.samples), (4, 3040, 17));
        let lines = lines(&summary.files[0]);
        assert_eq!(lines[0], "##fileformat=VCFv4.3");
        assert!(lines.contains(&"##contig=<ID=k_2,length=3000000>".to_string()));
        let scenario = super::super::read_scenario(&_folder.path().join("scenario.toml")).unwrap();
        let simulation = super::super::simulate(&scenario, 4).unwrap();
        let records: Vec<&String> = lines.iter().filter(|l| !l.starts_with('#')).collect();
        assert_eq!(records.len(), simulation.loci.len());
        for (index, record) in records.iter().enumerate() {
            let columns: Vec<&str> = record.split('\t').collect();
            let locus = &simulation.loci[index];
            assert_eq!(columns[0], simulation.contigs[locus.contig].name);
            assert_eq!(columns[1], locus.position.to_string());
            assert_eq!(
                format!("{},{}", columns[3], columns[4]),
                locus.alleles.join(",")
            );
            assert_eq!(columns[8], "GT:DP:AD:GQ:PL");
            let alleles = locus.alleles.len();
            for (column, call) in columns[9..].iter().zip(simulation.genotypes(index)) {
                let fields: Vec<&str> = column.split(':').collect();
                let reads: Vec<u32> = fields[2].split(',').map(|n| n.parse().unwrap()).collect();
                assert_eq!(reads.len(), alleles);
                assert_eq!(fields[1], reads.iter().sum::<u32>().to_string());
                let Some([a, b]) = call else {
                    assert_eq!((fields[0], fields[3], fields[4]), ("./.", ".", "."));
                    continue;
                };
                assert_eq!(fields[0], format!("{a}/{b}"));
                let scores: Vec<u32> = fields[4].split(',').map(|n| n.parse().unwrap()).collect();
                assert_eq!(scores.len(), alleles * (alleles + 1) / 2);
                // The standard puts genotype a/b, a <= b, at b(b + 1)/2 + a.
                assert_eq!(scores[usize::from(b * (b + 1) / 2 + a)], 0);
            }
        }
    }

    /// Every region asked of the index holds the records a scan of the file finds there.
    #[test]
    fn the_index_finds_what_a_scan_finds() {
        let (_folder, summary) = written(5);
        let index = tabix::fs::read(&summary.files[1]).unwrap();
        let names = index.header().unwrap().reference_sequence_names().clone();
        let all = lines(&summary.files[0]);
        let place = |line: &str| {
            let mut columns = line.split('\t');
            (
                columns.next().unwrap().to_string(),
                columns.next().unwrap().parse::<usize>().unwrap(),
            )
        };
        for (name, from, to) in [
            ("k_1", 1, 70_000),
            ("k_1", 2_900_000, 3_000_000),
            ("k_2", 1_500_000, 1_600_000),
            ("k_2", 2_999_000, 3_000_000),
        ] {
            let id = names.get_index_of(name.as_bytes()).unwrap();
            let [start, end] = [from, to].map(|n| Position::try_from(n).unwrap());
            let chunks = index.query(id, (start..=end).into()).unwrap();
            let mut found = Vec::new();
            for chunk in chunks {
                let file = std::fs::File::open(&summary.files[0]).unwrap();
                let mut reader = bgzf::io::Reader::new(file);
                reader.seek(chunk.start()).unwrap();
                while reader.virtual_position() < chunk.end() {
                    let mut line = String::new();
                    reader.read_line(&mut line).unwrap();
                    let (contig, position) = place(&line);
                    if contig == name && (from..=to).contains(&position) {
                        found.push(line.trim_end().to_string());
                    }
                }
            }
            let scanned: Vec<&String> = all
                .iter()
                .filter(|l| !l.starts_with('#'))
                .filter(|l| place(l).0 == name && (from..=to).contains(&place(l).1))
                .collect();
            assert!(found.iter().eq(scanned), "{name}:{from}-{to}");
        }
    }

    #[test]
    fn sheet_and_truth_tell_of_every_sample() {
        let (folder, summary) = written(6);
        let sheet = std::fs::read_to_string(&summary.files[2]).unwrap();
        let rows: Vec<Vec<&str>> = sheet.lines().map(|l| l.split('\t').collect()).collect();
        let columns = [
            "sample",
            "population",
            "year",
            "generation",
            "visit",
            "sex",
            "replicate_of",
        ];
        assert_eq!(rows[0], columns);
        assert_eq!(rows.len(), 18);
        assert_eq!(
            rows[1][..5],
            ["overwick-2001-01", "Over Wick", "2001", "0", "before"]
        );
        assert_eq!(
            rows[9][..5],
            ["overwick-2005.5-01", "Over Wick", "2005.5", "3", "2005.5"]
        );
        assert!(rows[17][0] == format!("{}-again", rows[17][6]));
        let header = lines(&summary.files[0])
            .into_iter()
            .find(|l| l.starts_with("#CHROM"))
            .unwrap();
        let named: Vec<&str> = header.split('\t').skip(9).collect();
        assert!(rows[1..].iter().map(|r| r[0]).eq(named));
        let mut text = String::new();
        std::fs::File::open(&summary.files[3])
            .unwrap()
            .read_to_string(&mut text)
            .unwrap();
        let truth: serde_json::Value = serde_json::from_str(&text).unwrap();
        assert_eq!(truth["format"], "genewane-truth");
        assert_eq!(truth["seed"], 6);
        assert_eq!(truth["strata"][1]["stratum"], "Over Wick@2005.5");
        assert_eq!(truth["loci"].as_array().unwrap().len(), 3040);
        assert_eq!(
            truth["gone"].as_array().unwrap().len() as u64,
            summary.alleles_gone
        );
        let left = std::fs::read_dir(folder.path().join("new/out"))
            .unwrap()
            .count();
        assert_eq!(left, 4, "temporary files were left behind");
    }
}
