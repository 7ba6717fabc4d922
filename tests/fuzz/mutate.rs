//! Seeds changed at random: bits, numbers, pieces cut, doubled, moved and taken from other seeds.

use rand::{Rng, SeedableRng};
use rand_chacha::ChaCha8Rng;

/// Bytes and words that readers treat in a special way.
const WORDS: [&[u8]; 24] = [
    b"\xff\xd8",
    b"\xff\xc2",
    b"\xff\xda",
    b"\xff\xd9",
    b"II*\0",
    b"MM\0*",
    b"IHDR",
    b"IDAT",
    b"Exif\0\0",
    b"\xff\xff\xff\xff",
    b"\0\0\0\0",
    b"\x7f\xff\xff\xff",
    b"(",
    b")",
    b"\xc2\xb1",
    b"(k=2)",
    b"(limits)",
    b"NaN",
    b"1e999",
    b"-0",
    b"[[photo]]",
    b" = ",
    b"\"",
    b"\n",
];

/// Inputs longer than this are cut.
const LONGEST: usize = 1 << 16;

/// A seeded source of mutations.
pub(crate) struct Mutator {
    random: ChaCha8Rng,
}

impl Mutator {
    pub(crate) fn new(seed: u64) -> Self {
        Self { random: ChaCha8Rng::seed_from_u64(seed) }
    }

    /// One of the seeds with one to eight changes.
    pub(crate) fn mutated(&mut self, seeds: &[Vec<u8>]) -> Vec<u8> {
        let mut input = seeds[self.random.random_range(0..seeds.len())].clone();
        for _ in 0..self.random.random_range(1..=8) {
            self.change(&mut input, seeds);
        }
        input.truncate(LONGEST);
        input
    }

    fn change(&mut self, input: &mut Vec<u8>, seeds: &[Vec<u8>]) {
        let at = self.random.random_range(0..=input.len());
        let end = self.random.random_range(at..=input.len().min(at + 64));
        match self.random.random_range(0..8) {
            0 if at < input.len() => input[at] ^= 1 << self.random.random_range(0..8),
            1 if at < input.len() => input[at] = self.random.random(),
            2 => drop(input.drain(at..end)),
            3 => {
                let piece = input[at..end].to_vec();
                let place = self.random.random_range(0..=input.len());
                drop(input.splice(place..place, piece));
            }
            4 => input.truncate(at),
            5 => {
                let other = &seeds[self.random.random_range(0..seeds.len())];
                let from = self.random.random_range(0..=other.len());
                let to = self.random.random_range(from..=other.len().min(from + 256));
                drop(input.splice(at..end, other[from..to].iter().copied()));
            }
            6 => self.other_digit(input),
            _ => {
                let word = WORDS[self.random.random_range(0..WORDS.len())];
                let reach = if self.random.random() { at } else { end };
                drop(input.splice(at..reach, word.iter().copied()));
            }
        }
    }

    /// Puts another digit, sign or point in the place of one: texts stay readable and mean something else.
    fn other_digit(&mut self, input: &mut [u8]) {
        let digits: Vec<usize> = (0..input.len()).filter(|&i| input[i].is_ascii_digit()).collect();
        if let Some(&place) = digits.get(self.random.random_range(0..=digits.len())) {
            let others = b"0123456789.-e,";
            input[place] = others[self.random.random_range(0..others.len())];
        }
    }
}
