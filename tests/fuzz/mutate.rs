//! Random damage that is the same for the same seed.

use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;

/// Most bytes of an input.
const MOST_BYTES: usize = 1 << 16;
/// Inputs kept beside those that were given.
const MOST_KEPT: usize = 400;

/// Numbers at the edges of types and limits.
const EDGES: [i64; 16] = [
    0,
    1,
    -1,
    2,
    127,
    128,
    255,
    256,
    32767,
    65535,
    65536,
    2_147_483_647,
    2_147_483_648,
    4_294_967_295,
    i64::MAX,
    i64::MIN,
];

/// Words that mean something in one of the formats.
const WORDS: [&[u8]; 20] = [
    b".",
    b"./.",
    b"0|1",
    b"1/1/1",
    b"/0/1",
    b"GT",
    b"NaN",
    b"inf",
    b"1e999",
    b"\t",
    b"\n",
    b"\r\n",
    b"\"",
    b"\xef\xbb\xbf",
    b"\xff",
    b"\0",
    b"[[",
    b"null",
    b"PASS",
    b"-",
];

/// Makes inputs out of inputs.
pub struct Mutator {
    chance: ChaCha8Rng,
    given: usize,
    corpus: Vec<Vec<u8>>,
}

impl Mutator {
    pub fn new(seed: u64, corpus: Vec<Vec<u8>>) -> Self {
        Mutator {
            chance: ChaCha8Rng::seed_from_u64(seed),
            given: corpus.len(),
            corpus,
        }
    }

    /// The next input: one of the corpus with one to six damages.
    pub fn next(&mut self) -> Vec<u8> {
        let mut bytes = self.pick();
        let most = self.chance.random_range(1..=6);
        for _ in 0..self.chance.random_range(1..=most) {
            self.damage(&mut bytes);
        }
        bytes.truncate(MOST_BYTES);
        bytes
    }

    /// An input that went a new way is damaged further.
    pub fn keep(&mut self, bytes: Vec<u8>) {
        if self.corpus.len() < self.given + MOST_KEPT {
            self.corpus.push(bytes);
        } else {
            let at = self.chance.random_range(self.given..self.corpus.len());
            self.corpus[at] = bytes;
        }
    }

    fn pick(&mut self) -> Vec<u8> {
        // Every other time one that was given: what was damaged once is mostly refused.
        let among = match self.chance.random_bool(0.5) {
            true => self.given,
            false => self.corpus.len(),
        };
        self.corpus[self.chance.random_range(0..among)].clone()
    }

    /// A stretch of at most `most` bytes.
    fn stretch(&mut self, length: usize, most: usize) -> std::ops::Range<usize> {
        let start = self.chance.random_range(0..=length);
        let n = self.chance.random_range(0..=most.min(length - start));
        start..start + n
    }

    fn damage(&mut self, bytes: &mut Vec<u8>) {
        if bytes.is_empty() {
            bytes.extend_from_slice(WORDS[self.chance.random_range(0..WORDS.len())]);
            return;
        }
        let at = self.chance.random_range(0..bytes.len());
        match self.chance.random_range(0..10) {
            0 => bytes[at] ^= 1 << self.chance.random_range(0..8),
            1 => bytes[at] = self.chance.random(),
            2 => drop(bytes.drain(self.stretch(bytes.len(), 40))),
            3 => {
                let copy = bytes[self.stretch(bytes.len(), 200)].to_vec();
                bytes.splice(at..at, copy);
            }
            4 => {
                let word = WORDS[self.chance.random_range(0..WORDS.len())];
                bytes.splice(at..at, word.iter().copied());
            }
            5 => {
                let other = self.pick();
                let piece = other[self.stretch(other.len(), 400)].to_vec();
                let here = self.stretch(bytes.len(), 400);
                bytes.splice(here, piece);
            }
            6 => self.number_in_text(bytes, at),
            7 => {
                // A number in binary, of one, two, four or eight bytes.
                let edge = EDGES[self.chance.random_range(0..EDGES.len())].to_le_bytes();
                let n = (1 << self.chance.random_range(0..4)).min(bytes.len() - at);
                bytes[at..at + n].copy_from_slice(&edge[..n]);
            }
            8 => bytes.truncate(at),
            _ => self.swap_cells(bytes, at),
        }
    }

    /// Another number in the place of the digits from `at` on.
    fn number_in_text(&mut self, bytes: &mut Vec<u8>, at: usize) {
        let Some(start) = bytes[at..].iter().position(u8::is_ascii_digit) else {
            return;
        };
        let start = at + start;
        let digits = bytes[start..].iter().take_while(|b| b.is_ascii_digit());
        let end = start + digits.count();
        let edge = EDGES[self.chance.random_range(0..EDGES.len())];
        bytes.splice(start..end, edge.to_string().into_bytes());
    }

    /// The cell behind `at` changes places with the next.
    fn swap_cells(&mut self, bytes: &mut [u8], at: usize) {
        let is_edge = |b: &u8| matches!(b, b'\t' | b',' | b'\n' | b':' | b';');
        let edges: Vec<usize> = (at..bytes.len())
            .filter(|&i| is_edge(&bytes[i]))
            .take(3)
            .collect();
        if let [a, b, c] = edges[..] {
            bytes[a + 1..c].rotate_left(b - a);
        }
    }
}
