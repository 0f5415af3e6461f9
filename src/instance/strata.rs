//! Latin hypercube draws: of each quantity every draw of the sweep has a stratum of its own.
//!
//! With n draws the range of every random number is cut into n parts of equal probability; a permutation of its own gives
//! each draw its part, and the number that an independent draw would take places it inside. Source: M. D. McKay,
//! R. J. Beckman, W. J. Conover, "A comparison of three methods for selecting values of input variables in the analysis of
//! output from a computer code", Technometrics 21 (1979) 239-245.
//!
//! The permutations are computed, not stored, so that a draw still follows from seed, number and n alone: a keyed Feistel
//! network over the next power of four, walked until it comes back below n (M. Luby, C. Rackoff, "How to construct
//! pseudorandom permutations from pseudorandom functions", SIAM J. Comput. 17 (1988) 373-386; cycle walking: J. Black,
//! P. Rogaway, "Ciphers with arbitrary finite domains", CT-RSA 2002; both from memory).

use rand::Rng;
use rand_chacha::ChaCha8Rng;

/// Stream of the keys of what a board draws; no sample has it.
pub(super) const BOARD_KEYS: u64 = u64::MAX;
/// Stream of the keys of what a sample draws.
pub(super) const SAMPLE_KEYS: u64 = u64::MAX - 1;

/// Rounds of the network: more than the four of the theory, since small halves mix slowly.
const ROUNDS: u64 = 10;

/// The strata of some quantities.
#[derive(Clone, Debug)]
pub(super) struct Strata {
    /// Draws, at least 1.
    draws: u64,
    /// Bits of half a block.
    half: u32,
    /// One a quantity.
    keys: Vec<u64>,
}

impl Strata {
    /// Strata of this many draws; the key of a quantity stands at its own place in the stream of keys.
    pub fn new(rng: &mut ChaCha8Rng, stream: u64, places: impl Iterator<Item = u64>, draws: u64) -> Strata {
        rng.set_stream(stream);
        let key = |place: u64| {
            rng.set_word_pos(2 * u128::from(place));
            rng.next_u64()
        };
        let draws = draws.max(1);
        Strata { draws, half: half_of(draws), keys: places.map(key).collect() }
    }

    /// The random number of a quantity in a draw, from the one `u` that an independent draw would take. Draws from `draws`
    /// on have the strata of draw modulo `draws`.
    pub fn number(&self, draw: u64, quantity: usize, u: u64) -> u64 {
        let stratum = self.permuted(draw % self.draws, self.keys[quantity]);
        // the numbers u with ⌊u·n / 2^64⌋ = stratum
        let from = |stratum: u64| (u128::from(stratum) << 64).div_ceil(u128::from(self.draws));
        let (low, high) = (from(stratum), from(stratum + 1));
        (low + ((u128::from(u) * (high - low)) >> 64)) as u64
    }

    fn permuted(&self, index: u64, key: u64) -> u64 {
        walk(self.draws, self.half, index, key)
    }
}

/// Bits of half a block for a permutation of `0 .. size`.
pub(super) fn half_of(size: u64) -> u32 {
    let bits = (64 - (size - 1).leading_zeros()).max(2);
    bits.div_ceil(2)
}

/// Where the permutation of `0 .. size` with this key takes an index; `half` is [`half_of`] the size.
pub(super) fn walk(size: u64, half: u32, mut index: u64, key: u64) -> u64 {
    let mask = (1u64 << half) - 1;
    loop {
        let (mut left, mut right) = (index >> half, index & mask);
        for round in 0..ROUNDS {
            (left, right) = (right, left ^ (mix(key ^ mix((round << 56) ^ right)) & mask));
        }
        index = (left << half) | right;
        if index < size {
            return index;
        }
    }
}

/// The output function of splitmix64 (Steele, Lea, Flood 2014; from memory).
pub(super) fn mix(word: u64) -> u64 {
    let mut z = word.wrapping_add(0x9E37_79B9_7F4A_7C15);
    z = (z ^ (z >> 30)).wrapping_mul(0xBF58_476D_1CE4_E5B9);
    z = (z ^ (z >> 27)).wrapping_mul(0x94D0_49BB_1331_11EB);
    z ^ (z >> 31)
}

#[cfg(test)]
mod tests {
    use rand::SeedableRng;

    use super::*;

    fn strata(seed: u64, quantities: u64, draws: u64) -> Strata {
        Strata::new(&mut ChaCha8Rng::seed_from_u64(seed), BOARD_KEYS, 0..quantities, draws)
    }

    #[test]
    fn every_stratum_is_taken_once() {
        for draws in (1..=70).chain([100, 255, 256, 257, 1000, 4097]) {
            let strata = strata(draws, 3, draws);
            for quantity in 0..3 {
                // the extreme numbers keep to their stratum, too
                for u in [0, 1 << 40, u64::MAX] {
                    let mut taken = vec![false; draws as usize];
                    for draw in 0..draws {
                        let number = strata.number(draw, quantity, u);
                        let stratum = ((u128::from(number) * u128::from(draws)) >> 64) as usize;
                        assert!(!std::mem::replace(&mut taken[stratum], true), "{draws} draws, {draw}, {u}");
                    }
                }
            }
        }
        let huge = strata(1, 1, 1 << 62);
        assert!((0..100).all(|draw| huge.permuted((1 << 62) - 1 - draw, huge.keys[0]) < 1 << 62));
    }

    /// Every draw meets every stratum alike, and pairs of quantities are paired at random: chi-square at 0.1 %.
    #[test]
    fn permutations_are_spread_evenly() {
        for draws in [2u64, 3, 5, 10] {
            let (mut single, mut pairs) = (vec![0u64; draws as usize], vec![0u64; (draws * draws) as usize]);
            let seeds = 20_000;
            for seed in 0..seeds {
                let strata = strata(seed, 2, draws);
                let [a, b] = [0, 1].map(|quantity| strata.permuted(draws / 2, strata.keys[quantity]));
                single[a as usize] += 1;
                pairs[(a * draws + b) as usize] += 1;
            }
            let chi = |counts: &[u64]| {
                let expected = seeds as f64 / counts.len() as f64;
                counts.iter().map(|count| (*count as f64 - expected).powi(2) / expected).sum::<f64>()
            };
            // Wilson and Hilferty 1931: a chi-square of k degrees stays below k(1 − 2/9k + 3.09·√(2/9k))³ in 999 of 1000
            let bound = |k: f64| k * (1.0 - 2.0 / (9.0 * k) + 3.09 * (2.0 / (9.0 * k)).sqrt()).powi(3);
            let (one, two) = (chi(&single), chi(&pairs));
            assert!(one < bound((draws - 1) as f64), "{draws}: {one} {single:?}");
            assert!(two < bound((draws * draws - 1) as f64), "{draws}: {two} {pairs:?}");
        }
    }
}
