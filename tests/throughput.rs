//! How fast calls are read, against bare inflation of the same file. Run by hand, on Linux:
//! `cargo test --release --test throughput -- --ignored --nocapture`.

use std::io::{Read, Write};

use genewane::ingest::{self, Decoder, RecordBatch, Selection};
use genewane::model::Locus;
use noodles_bgzf as bgzf;
use rand::{Rng, RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;

const SAMPLES: usize = 200;
const RECORDS: usize = 200_000;

/// Text of biallelic records, of GT only or with three more keys.
fn synthetic(keys: bool, records: usize) -> Vec<u8> {
    let mut random = ChaCha8Rng::seed_from_u64(7);
    let mut out = b"##fileformat=VCFv4.2\n##contig=<ID=lake>\n##FORMAT=<ID=GT,Number=1,Type=String,Description=\"g\">\n#CHROM\tPOS\tID\tREF\tALT\tQUAL\tFILTER\tINFO\tFORMAT".to_vec();
    (0..SAMPLES).for_each(|i| write!(out, "\ts{i}").unwrap());
    for record in 0..records {
        let format = if keys { "GT:AD:DP:GQ" } else { "GT" };
        write!(
            out,
            "\nlake\t{}\t.\tA\tC\t50\tPASS\tDP=100\t{format}",
            100 * record + 1
        )
        .unwrap();
        let frequency = f64::from(random.random::<u16>()) / 65536.0 * 0.5;
        for _ in 0..SAMPLES {
            let mut allele = || u8::from(random.random_bool(frequency));
            let (a, b) = (allele(), allele());
            match random.next_u32() % 50 {
                0 => write!(out, "\t./.").unwrap(),
                _ => write!(out, "\t{a}/{b}").unwrap(),
            }
            if keys {
                let depth = random.next_u32() % 30;
                write!(
                    out,
                    ":{},{}:{depth}:{}",
                    depth / 2,
                    depth - depth / 2,
                    depth * 3
                )
                .unwrap();
            }
        }
    }
    out.push(b'\n');
    out
}

/// Seconds of processor time, best of five: other work on the machine does not count.
fn seconds(mut work: impl FnMut()) -> f64 {
    (0..5)
        .map(|_| {
            let start = processor_time();
            work();
            processor_time() - start
        })
        .fold(f64::INFINITY, f64::min)
}

/// Seconds this thread has been running.
fn processor_time() -> f64 {
    let told = std::fs::read_to_string("/proc/thread-self/schedstat").unwrap();
    told.split(' ').next().unwrap().parse::<f64>().unwrap() / 1e9
}

#[test]
#[ignore = "a measurement"]
fn throughput() {
    for (name, keys, records) in [("GT", false, RECORDS), ("GT:AD:DP:GQ", true, RECORDS / 4)] {
        let text = synthetic(keys, records);
        let folder = tempfile::tempdir().unwrap();
        let path = folder.path().join("calls");
        let mut writer = bgzf::io::Writer::new(std::fs::File::create(&path).unwrap());
        writer.write_all(&text).unwrap();
        writer.finish().unwrap();
        let plain = folder.path().join("plain");
        std::fs::write(&plain, &text).unwrap();
        let size = text.len() as f64 / 1e6;
        let packed = std::fs::metadata(&path).unwrap().len() as f64 / 1e6;
        println!("{name}: {records} records, {size:.0} MB in {packed:.1} MB");
        let told =
            |what: &str, time: f64| println!("  {what:28} {:7.0} MB/s {time:.3} s", size / time);
        told(
            "noodles BGZF reader alone",
            seconds(|| {
                let mut reader = bgzf::io::Reader::new(std::fs::File::open(&path).unwrap());
                let mut buffer = vec![0; 1 << 16];
                while reader.read(&mut buffer).unwrap() > 0 {}
            }),
        );
        for (kind, path) in [("BGZF", &path), ("plain", &plain)] {
            told(
                &format!("{kind} next_batch alone"),
                seconds(|| {
                    let mut reader = ingest::open(path).unwrap();
                    let mut batch = RecordBatch::default();
                    while reader.next_batch(&mut batch).unwrap() {}
                }),
            );
            told(
                &format!("{kind} next_batch and decode"),
                seconds(|| {
                    let mut reader = ingest::open(path).unwrap();
                    let mut decoder = Decoder::new(&reader, Selection::all(reader.header()));
                    let (mut batch, mut locus) = (RecordBatch::default(), Locus::default());
                    while reader.next_batch(&mut batch).unwrap() {
                        for index in 0..batch.len() {
                            decoder.decode(&batch, index, &mut locus).unwrap();
                        }
                    }
                }),
            );
        }
    }
}
