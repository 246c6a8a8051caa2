//! The only place that starts threads: one reader, some workers, results in file order.
//!
//! The reader inflates and cuts the calls into batches of whole records; workers decode them and add
//! to sums of their own, which are integers, so it does not matter which worker saw which batch.
//! What must keep the order of the file (the per-locus table, the first error) is numbered by batch.

use std::collections::BTreeMap;
use std::io::Write;
use std::sync::Arc;
use std::sync::atomic::{AtomicBool, Ordering};
use std::thread;

use crossbeam_channel::{Receiver, Sender, bounded, unbounded};

use crate::error::Result;
use crate::ingest::{CallsReader, Decoder, RecordBatch, Remarks, Selection};
use crate::merge::{LocusView, Scheme, Sums};
use crate::model::{CallTally, Locus, MaskTally, Masks, Verdict};

/// Batches in flight for each worker: enough that nobody waits, few enough to bound memory.
const BATCHES_A_WORKER: usize = 3;

/// One file of calls, opened and matched with the sample sheet.
pub struct Source {
    /// The open file.
    pub reader: CallsReader,
    /// Which of its columns are in use.
    pub selection: Selection,
}

/// What is gathered over loci: every worker fills its own, and merging in any order gives the same.
pub trait Gather: Send + Sized {
    /// Adds one locus; a row of the per-locus table, where one is asked for, goes behind `rows`.
    fn take(&mut self, locus: &Locus, row: Option<RowMaker>, rows: &mut Vec<u8>);
    /// Adds what another worker gathered.
    fn merge(&mut self, other: Self);
    /// Makes what was gathered ready to be read or merged.
    fn flush(&mut self) {}
}

impl Gather for Sums {
    fn take(&mut self, locus: &Locus, row: Option<RowMaker>, rows: &mut Vec<u8>) {
        let view = self.add(locus);
        if let Some(row) = row {
            row(locus, &view, rows);
        }
    }

    fn merge(&mut self, other: Self) {
        Sums::merge(self, other);
    }

    fn flush(&mut self) {
        Sums::flush(self);
    }
}

/// What came out of all records.
#[derive(Debug)]
pub struct Collected<S = Sums> {
    /// Sums over loci, flushed.
    pub sums: S,
    /// Records by verdict.
    pub verdicts: BTreeMap<Verdict, u64>,
    /// Genotypes by what became of them.
    pub tally: CallTally,
    /// Records and genotypes by what masked them.
    pub masked: MaskTally,
    /// What was remarked on records, by source.
    pub remarks: Vec<Remarks>,
}

/// Makes the row of one locus for the per-locus table, appending to the bytes.
pub type RowMaker<'a> = &'a (dyn Fn(&Locus, &LocusView, &mut Vec<u8>) + Sync);

/// A per-locus table: where it goes and how a row is made.
pub struct LocusTable<'a> {
    /// Where rows go, in file order.
    pub out: &'a mut dyn Write,
    /// How a row is made.
    pub row: RowMaker<'a>,
    /// Wraps a failure to write with the name of the table.
    pub failed: &'a dyn Fn(std::io::Error) -> crate::Error,
}

/// Reads every record of every source once.
///
/// # Errors
/// The first failure in file order, whichever worker met it.
pub fn collect(
    sources: &mut [Source],
    scheme: &Arc<Scheme>,
    masks: &Masks,
    threads: usize,
    table: Option<LocusTable>,
    progress: &(dyn Fn(u64) + Sync),
) -> Result<Collected> {
    let empty = || Sums::new(Arc::clone(scheme));
    collect_into(sources, &empty, masks, threads, table, progress)
}

/// The same for anything that gathers; `empty` makes the identity of its merge.
///
/// # Errors
/// As [`collect`].
pub fn collect_into<S: Gather>(
    sources: &mut [Source],
    empty: &(dyn Fn() -> S + Sync),
    masks: &Masks,
    threads: usize,
    mut table: Option<LocusTable>,
    progress: &(dyn Fn(u64) + Sync),
) -> Result<Collected<S>> {
    let workers = threads.max(1);
    let row = table.as_ref().map(|t| t.row);
    let stop = AtomicBool::new(false);
    let (work_out, work_in) = bounded::<Work>(workers * BATCHES_A_WORKER);
    let (done_out, done_in) = unbounded::<Done>();
    let (spent_out, spent_in) = unbounded::<RecordBatch>();

    thread::scope(|scope| {
        let handles: Vec<_> = (0..workers)
            .map(|_| {
                let decoder = |s: &Source| Decoder::new(&s.reader, s.selection.clone());
                let decoders = sources.iter().map(decoder).collect();
                let mut worker = Worker::new(decoders, empty(), masks, row);
                let (work_in, done_out, spent_out) =
                    (work_in.clone(), done_out.clone(), spent_out.clone());
                scope.spawn(move || {
                    for work in work_in {
                        let done = worker.process(&work);
                        // A closed channel means that the run has failed already.
                        let _ = spent_out.send(work.batch);
                        let _ = done_out.send(done);
                    }
                    worker.finish()
                })
            })
            .collect();
        drop((work_in, spent_out));
        let stop = &stop;
        scope.spawn(move || read_all(sources, work_out, spent_in, done_out, stop, progress));

        let outcome = in_file_order(done_in, &mut table);
        if outcome.is_err() {
            stop.store(true, Ordering::Relaxed);
        }
        let mut parts = Vec::new();
        for handle in handles {
            parts.push(
                handle
                    .join()
                    .unwrap_or_else(|panic| std::panic::resume_unwind(panic)),
            );
        }
        outcome?;
        Ok(add_up(empty(), parts))
    })
}

struct Work {
    index: u64,
    source: usize,
    batch: RecordBatch,
}

struct Done {
    index: u64,
    /// Rows of the per-locus table.
    outcome: Result<Vec<u8>>,
}

/// Reads batch after batch of source after source, until the end, a failure, or the word to stop.
fn read_all(
    sources: &mut [Source],
    work: Sender<Work>,
    spent: Receiver<RecordBatch>,
    done: Sender<Done>,
    stop: &AtomicBool,
    progress: &(dyn Fn(u64) + Sync),
) {
    let mut index = 0;
    let mut before = 0;
    for (source, Source { reader, .. }) in sources.iter_mut().enumerate() {
        loop {
            if stop.load(Ordering::Relaxed) {
                return;
            }
            let mut batch = spent.try_recv().unwrap_or_default();
            match reader.next_batch(&mut batch) {
                Ok(true) => {
                    progress(before + reader.bytes_read());
                    if work
                        .send(Work {
                            index,
                            source,
                            batch,
                        })
                        .is_err()
                    {
                        return;
                    }
                    index += 1;
                }
                Ok(false) => break,
                Err(error) => {
                    let _ = done.send(Done {
                        index,
                        outcome: Err(error),
                    });
                    return;
                }
            }
        }
        before += reader.bytes_read();
    }
}

/// Takes results in the order of the file, whatever the order in which they come.
fn in_file_order(done: Receiver<Done>, table: &mut Option<LocusTable>) -> Result<()> {
    let mut waiting = BTreeMap::new();
    let mut next = 0;
    for Done { index, outcome } in done {
        waiting.insert(index, outcome);
        while let Some(outcome) = waiting.remove(&next) {
            let rows = outcome?;
            if let Some(table) = table {
                table.out.write_all(&rows).map_err(table.failed)?;
            }
            next += 1;
        }
    }
    Ok(())
}

/// One worker: everything it needs to turn batches into sums.
struct Worker<'a, S> {
    masks: Option<&'a Masks>,
    decoders: Vec<Decoder>,
    row: Option<RowMaker<'a>>,
    locus: Locus,
    part: Part<S>,
}

/// What a worker has collected.
struct Part<S> {
    sums: S,
    verdicts: BTreeMap<Verdict, u64>,
    tally: CallTally,
    masked: MaskTally,
    remarks: Vec<Remarks>,
}

impl<'a, S: Gather> Worker<'a, S> {
    fn new(decoders: Vec<Decoder>, sums: S, masks: &'a Masks, row: Option<RowMaker<'a>>) -> Self {
        let part = Part {
            sums,
            verdicts: BTreeMap::new(),
            tally: CallTally::default(),
            masked: MaskTally::default(),
            remarks: Vec::new(),
        };
        Worker {
            masks: (!masks.is_empty()).then_some(masks),
            decoders,
            row,
            locus: Locus::default(),
            part,
        }
    }

    fn process(&mut self, work: &Work) -> Done {
        Done {
            index: work.index,
            outcome: self.records(work),
        }
    }

    fn records(&mut self, work: &Work) -> Result<Vec<u8>> {
        let decoder = &mut self.decoders[work.source];
        let mut rows = Vec::new();
        for i in 0..work.batch.len() {
            let verdict = decoder.decode(&work.batch, i, &mut self.locus)?;
            if verdict == Verdict::Elsewhere {
                continue;
            }
            *self.part.verdicts.entry(verdict).or_default() += 1;
            if let Some(masks) = self.masks.filter(|_| verdict == Verdict::Kept) {
                let masked = &mut self.part.masked;
                if !decoder.mask(masks, &work.batch, i, &mut self.locus, masked)? {
                    continue;
                }
            }
            if verdict == Verdict::Kept {
                self.part.sums.take(&self.locus, self.row, &mut rows);
            }
        }
        Ok(rows)
    }

    fn finish(mut self) -> Part<S> {
        for decoder in &mut self.decoders {
            self.part.tally.merge(&decoder.take_tally());
            self.part.remarks.push(decoder.take_remarks());
        }
        self.part.sums.flush();
        self.part
    }
}

fn add_up<S: Gather>(sums: S, parts: Vec<Part<S>>) -> Collected<S> {
    let mut all = Collected {
        sums,
        verdicts: BTreeMap::new(),
        tally: CallTally::default(),
        masked: MaskTally::default(),
        remarks: Vec::new(),
    };
    for part in parts {
        all.sums.merge(part.sums);
        all.tally.merge(&part.tally);
        all.masked.merge(&part.masked);
        for (verdict, n) in part.verdicts {
            *all.verdicts.entry(verdict).or_default() += n;
        }
        all.remarks
            .resize_with(part.remarks.len(), Remarks::default);
        for (sum, remarks) in all.remarks.iter_mut().zip(&part.remarks) {
            sum.merge(remarks);
        }
    }
    all.sums.flush();
    all
}
