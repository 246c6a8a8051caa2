//! The files of a rehearsal: calls with their index, sample sheet, truth.

use std::io::{BufWriter, Write};
use std::path::{Path, PathBuf};

use noodles_bgzf as bgzf;
use noodles_core::Position;
use noodles_csi::binning_index::index::header::Builder as IndexHeader;
use noodles_csi::binning_index::index::reference_sequence::bin::Chunk;
use noodles_tabix as tabix;
use rayon::prelude::*;
use tempfile::NamedTempFile;

use super::calls::{CallRow, MISSING, phred_likelihoods};
use super::check::read_scenario;
use super::genome::Contig;
use super::scenario::{Field, Genotyping, Scenario};
use super::simulation::{Outcome, SimulatedLocus, Stage};
use super::truth::{Truth, visit_label};
use crate::error::{Error, Result};
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
    // A few units a thread are in memory at a time.
    for units in stage.genome.units.chunks(2 * threads.max(1)) {
        let done: Vec<(Outcome, Vec<Line>)> = pool.install(|| {
            let run = |unit| {
                let outcome = stage.run(unit);
                let lines = format_unit(&stage, &outcome);
                (outcome, lines)
            };
            units.par_iter().map(run).collect()
        });
        for (outcome, lines) in done {
            calls.write(&lines)?;
            truth.loci.extend(outcome.truth);
            truth.gone.extend(outcome.gone);
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
    for (file, path) in files {
        file.persist(&path)
            .map_err(|e| Error::io(&path, "rename into place", e.error))?;
    }
    Ok(summary)
}

/// A temporary file beside its later place, readable as any other new file.
fn temporary(path: &Path) -> Result<NamedTempFile> {
    let directory = path.parent().unwrap_or(Path::new("."));
    let mut builder = tempfile::Builder::new();
    builder.prefix(".rehearse-");
    #[cfg(unix)]
    let permissions = std::os::unix::fs::PermissionsExt::from_mode(0o666);
    #[cfg(unix)]
    builder.permissions(permissions);
    builder
        .tempfile_in(directory)
        .map_err(|e| Error::io(path, "create", e))
}

/// One record, formatted.
struct Line {
    contig: String,
    start: usize,
    end: usize,
    text: Vec<u8>,
}

struct CallsFile {
    path: PathBuf,
    writer: bgzf::io::Writer<NamedTempFile>,
    indexer: tabix::index::Indexer,
}

impl CallsFile {
    fn create(path: &Path, stage: &Stage) -> Result<Self> {
        let mut writer = bgzf::io::Writer::new(temporary(path)?);
        writer
            .write_all(header(stage).as_bytes())
            .map_err(|e| Error::io(path, "write", e))?;
        let mut indexer = tabix::index::Indexer::default();
        indexer.set_header(IndexHeader::vcf().build());
        Ok(CallsFile {
            path: path.into(),
            writer,
            indexer,
        })
    }

    fn write(&mut self, lines: &[Line]) -> Result<()> {
        for line in lines {
            self.write_line(line)
                .map_err(|e| Error::io(&self.path, "write", e))?;
        }
        Ok(())
    }

    fn write_line(&mut self, line: &Line) -> std::io::Result<()> {
        let start = self.writer.virtual_position();
        self.writer.write_all(&line.text)?;
        let chunk = Chunk::new(start, self.writer.virtual_position());
        let place = |n: usize| Position::try_from(n).map_err(std::io::Error::other);
        self.indexer
            .add_record(&line.contig, place(line.start)?, place(line.end)?, chunk)
    }

    fn finish(self) -> Result<(NamedTempFile, NamedTempFile)> {
        let path = self.path;
        let calls = self
            .writer
            .finish()
            .map_err(|e| Error::io(&path, "write", e))?;
        let index_path = path.with_extension("gz.tbi");
        let mut index = tabix::io::Writer::new(temporary(&index_path)?);
        index
            .write_index(&self.indexer.build())
            .map_err(|e| Error::io(&index_path, "write", e))?;
        let index = index
            .into_inner()
            .finish()
            .map_err(|e| Error::io(&index_path, "write", e))?;
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

fn format_unit(stage: &Stage, outcome: &Outcome) -> Vec<Line> {
    let genotyping = &stage.scenario.genotyping;
    let lines = outcome.loci.iter().zip(&outcome.rows).map(|(locus, row)| {
        let contig = stage.genome.contigs[locus.contig].name.clone();
        let start = locus.position as usize;
        let end = start + locus.alleles[0].len() - 1;
        let text = format_record(&contig, locus, row, genotyping);
        Line {
            contig,
            start,
            end,
            text,
        }
    });
    lines.collect()
}

fn format_record(
    contig: &str,
    locus: &SimulatedLocus,
    row: &CallRow,
    genotyping: &Genotyping,
) -> Vec<u8> {
    let (reference, alternates) = (&locus.alleles[0], locus.alleles[1..].join(","));
    let mut text = format!(
        "{contig}\t{}\t.\t{reference}\t{alternates}\t.\tPASS\t.\tGT",
        locus.position
    )
    .into_bytes();
    for field in &genotyping.fields {
        text.extend_from_slice(format!(":{field:?}").as_bytes());
    }
    let alleles = locus.alleles.len();
    for (sample, call) in row.calls.iter().enumerate() {
        text.push(b'\t');
        match *call {
            MISSING => text.extend_from_slice(b"./."),
            [a, b] => {
                push_number(&mut text, u32::from(a));
                text.push(b'/');
                push_number(&mut text, u32::from(b));
            }
        }
        if !genotyping.fields.is_empty() {
            let reads = &row.reads[sample * alleles..(sample + 1) * alleles];
            push_fields(&mut text, *call, reads, genotyping);
        }
    }
    text.push(b'\n');
    text
}

fn push_fields(text: &mut Vec<u8>, call: [u8; 2], reads: &[u16], genotyping: &Genotyping) {
    let scores = phred_likelihoods(reads, genotyping.read_error_rate);
    for field in &genotyping.fields {
        text.push(b':');
        match field {
            Field::AD => push_list(text, reads.iter().map(|&n| u32::from(n))),
            Field::DP => push_number(text, reads.iter().map(|&n| u32::from(n)).sum()),
            Field::GQ | Field::PL if call == MISSING => text.push(b'.'),
            Field::GQ => {
                let mut sorted = scores.clone();
                sorted.sort_unstable();
                push_number(text, sorted[1].min(99));
            }
            Field::PL => push_list(text, scores.iter().copied()),
        }
    }
}

fn push_list(text: &mut Vec<u8>, numbers: impl Iterator<Item = u32>) {
    for (i, number) in numbers.enumerate() {
        if i > 0 {
            text.push(b',');
        }
        push_number(text, number);
    }
}

fn push_number(text: &mut Vec<u8>, number: u32) {
    if number < 10 {
        text.push(b'0' + number as u8);
    } else {
        text.extend_from_slice(number.to_string().as_bytes());
    }
}

/// A field of the sheet that has no value.
const BLANK: &str = "";

fn write_sheet(stage: &Stage, out: &Path) -> Result<(NamedTempFile, PathBuf)> {
    let path = out.join("samples.tsv");
    let text = sheet(stage.scenario, stage);
    let mut file = temporary(&path)?;
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

fn write_truth(truth: &Truth, out: &Path) -> Result<(NamedTempFile, PathBuf)> {
    let path = out.join("truth.json");
    let mut file = BufWriter::new(temporary(&path)?);
    serde_json::to_writer(&mut file, truth)
        .map_err(std::io::Error::from)
        .and_then(|()| file.write_all(b"\n"))
        .map_err(|e| Error::io(&path, "write", e))?;
    let file = file
        .into_inner()
        .map_err(|e| Error::io(&path, "write", e.into_error()))?;
    Ok((file, path))
}
