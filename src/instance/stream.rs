//! The numbers that a plan takes from the streams of its draws: of each stream only the blocks that hold one.
//!
//! The streams are those of [`ChaCha8Rng`], which always makes four blocks of a stream in a row. A small case needs one
//! block of each of many streams, so here four blocks of any streams are made at once: where a draw needs less than four,
//! those of the draws that follow are made with them. Where it needs more, the crate makes them. Source of the cipher: D. J. Bernstein, "ChaCha, a variant of
//! Salsa20" (2008), with a counter of 64 bits and a stream number of 64 bits, as in crate `rand_chacha`; the tests hold
//! the two against each other.

use rand::Rng;
use rand_chacha::ChaCha8Rng;

/// Numbers (u64) in a block.
const BLOCK: u64 = 8;
/// Blocks made at once.
const LANES: usize = 4;
/// One word of each of the blocks made at once.
type Lanes = [u32; LANES];

/// The numbers of one plan, draw after draw.
#[derive(Clone, Debug)]
pub(super) struct Stream {
    rng: ChaCha8Rng,
    key: [u32; 8],
    /// Draw `n` takes its numbers from stream 2n, or 2n + 1.
    odd: u64,
    /// The blocks of a stream that hold numbers of the plan, in rising order.
    blocks: Vec<u64>,
    /// For each number of the plan where it stands among those of its draw in `made`.
    places: Vec<u32>,
    /// The draws that are made, and how many are made at once.
    first: Option<u64>,
    at_once: u64,
    /// Their blocks, draw by draw.
    made: Vec<u64>,
}

impl Stream {
    /// The streams of a generator, for a plan whose numbers stand at these places, in rising order.
    pub fn new(rng: &ChaCha8Rng, odd: bool, places: impl Iterator<Item = u64> + Clone) -> Stream {
        let seed = rng.get_seed();
        let mut blocks: Vec<u64> = places.clone().map(|place| place / BLOCK).collect();
        blocks.dedup();
        let block = |place: u64| blocks.partition_point(|block| *block < place / BLOCK) as u32;
        let places = places.map(|place| block(place) * BLOCK as u32 + (place % BLOCK) as u32).collect();
        let at_once = if blocks.len() < LANES { LANES } else { 1 };
        Stream {
            rng: rng.clone(),
            key: std::array::from_fn(|i| u32::from_le_bytes(std::array::from_fn(|byte| seed[4 * i + byte]))),
            odd: u64::from(odd),
            places,
            first: None,
            at_once: at_once as u64,
            made: vec![0; at_once * blocks.len() * BLOCK as usize],
            blocks,
        }
    }

    /// The numbers of a draw, in the order of the plan.
    #[inline]
    pub fn numbers(&mut self, draw: u64) -> impl Iterator<Item = u64> + '_ {
        let first = match self.first {
            Some(first) if draw.wrapping_sub(first) < self.at_once => first,
            _ => {
                self.make(draw);
                draw
            }
        };
        let of_draw = self.blocks.len() * BLOCK as usize;
        let made = &self.made[(draw - first) as usize * of_draw..][..of_draw];
        self.places.iter().map(move |place| made[*place as usize])
    }

    /// Makes the blocks of this draw and of those after it that are made at once.
    fn make(&mut self, draw: u64) {
        self.first = Some(draw);
        let count = self.blocks.len();
        if count >= LANES {
            self.rng.set_stream(draw.wrapping_mul(2) | self.odd);
            let mut next = None;
            for (block, made) in self.blocks.iter().zip(self.made.chunks_mut(BLOCK as usize)) {
                if next != Some(*block) {
                    self.rng.set_word_pos(2 * u128::from(BLOCK) * u128::from(*block));
                }
                made.fill_with(|| self.rng.next_u64());
                next = Some(block + 1);
            }
            return;
        }
        let all = self.at_once as usize * count;
        for from in (0..all).step_by(LANES) {
            // past the last one the last is made again
            let of = |lane: usize| (from + lane).min(all - 1);
            let stream = |lane: usize| draw.wrapping_add((of(lane) / count) as u64).wrapping_mul(2) | self.odd;
            let made = four(&self.key, std::array::from_fn(|i| (stream(i), self.blocks[of(i) % count])));
            for (block, made) in self.made[from * BLOCK as usize..].chunks_mut(BLOCK as usize).zip(made) {
                block.copy_from_slice(&made);
            }
        }
    }
}

/// Four blocks of ChaCha8, each given by stream and block number, as numbers in their order.
fn four(key: &[u32; 8], which: [(u64, u64); LANES]) -> [[u64; BLOCK as usize]; LANES] {
    /// "expand 32-byte k"
    const NAME: [u32; 4] = [0x6170_7865, 0x3320_646E, 0x7962_2D32, 0x6B20_6574];
    let (low, high) = (|word: u64| word as u32, |word: u64| (word >> 32) as u32);
    let start: [Lanes; 16] = std::array::from_fn(|word| match word {
        0..4 => [NAME[word]; LANES],
        4..12 => [key[word - 4]; LANES],
        12 => which.map(|it| low(it.1)),
        13 => which.map(|it| high(it.1)),
        14 => which.map(|it| low(it.0)),
        _ => which.map(|it| high(it.0)),
    });
    let mut all = start;
    for _ in 0..4 {
        for [a, b, c, d] in [[0, 4, 8, 12], [1, 5, 9, 13], [2, 6, 10, 14], [3, 7, 11, 15]] {
            quarter(&mut all, a, b, c, d);
        }
        for [a, b, c, d] in [[0, 5, 10, 15], [1, 6, 11, 12], [2, 7, 8, 13], [3, 4, 9, 14]] {
            quarter(&mut all, a, b, c, d);
        }
    }
    let word = |lane: usize, word: usize| u64::from(all[word][lane].wrapping_add(start[word][lane]));
    std::array::from_fn(|lane| std::array::from_fn(|i| word(lane, 2 * i) | word(lane, 2 * i + 1) << 32))
}

/// The quarter round, on all lanes.
#[inline(always)]
fn quarter(all: &mut [Lanes; 16], a: usize, b: usize, c: usize, d: usize) {
    let add = |x: Lanes, y: Lanes| -> Lanes { std::array::from_fn(|i| x[i].wrapping_add(y[i])) };
    let turn = |x: Lanes, y: Lanes, by: u32| -> Lanes { std::array::from_fn(|i| (x[i] ^ y[i]).rotate_left(by)) };
    all[a] = add(all[a], all[b]);
    all[d] = turn(all[d], all[a], 16);
    all[c] = add(all[c], all[d]);
    all[b] = turn(all[b], all[c], 12);
    all[a] = add(all[a], all[b]);
    all[d] = turn(all[d], all[a], 8);
    all[c] = add(all[c], all[d]);
    all[b] = turn(all[b], all[c], 7);
}

#[cfg(test)]
mod tests {
    use rand::SeedableRng;

    use super::*;

    /// Outside check: the numbers at every place of a stream are those of crate `rand_chacha`.
    #[test]
    fn numbers_are_those_of_the_crate() {
        let far = (1u64 << 40) + 5;
        let plans: [&[u64]; 6] =
            [&[], &[0, 1, 2, 3], &[7, 8], &[3, 9, 17, 18], &[0, 8, 16, 24, 33], &[1, far, u64::MAX >> 5]];
        for seed in [0, 1, u64::MAX] {
            let mut rng = ChaCha8Rng::seed_from_u64(seed);
            for (plan, odd) in plans.iter().flat_map(|plan| [(plan, false), (plan, true)]) {
                let mut stream = Stream::new(&rng, odd, plan.iter().copied());
                // in order, back, the same again, and far away
                for draw in [0, 1, 2, 3, 4, 9, 10, 8, 8, 11, 12, (1 << 61) - 1, 0] {
                    let numbers: Vec<u64> = stream.numbers(draw).collect();
                    let wanted = plan.iter().map(|place| {
                        rng.set_stream(2 * draw + u64::from(odd));
                        rng.set_word_pos(2 * u128::from(*place));
                        rng.next_u64()
                    });
                    assert_eq!(numbers, wanted.collect::<Vec<u64>>(), "seed {seed}, {plan:?}, draw {draw}, odd {odd}");
                }
            }
        }
    }
}
