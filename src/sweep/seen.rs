//! Which things were seen, how often, and in which sample first: bounded memory, mergeable in any order.
//!
//! Up to [`KEPT`] different keys are kept. With more, only keys whose hash has its top `level` bits clear are kept, with
//! the least level that leaves at most [`KEPT`]. A part's level never exceeds that of the whole, so the counts of kept
//! keys are exact whatever the split.

use std::collections::BTreeMap;

use serde::{Deserialize, Serialize};

/// Different keys kept.
const KEPT: usize = 4096;

/// A key with a hash that never changes between versions.
pub trait Key: Ord + Clone {
    /// The hash.
    fn hash(&self) -> u64;
}

/// Mixes one word into a hash; the constants are those of splitmix64 (Steele, Lea, Flood 2014; from memory).
pub fn mix(hash: u64, word: u64) -> u64 {
    let mut z = (hash ^ word).wrapping_add(0x9E37_79B9_7F4A_7C15);
    z = (z ^ (z >> 30)).wrapping_mul(0xBF58_476D_1CE4_E5B9);
    z = (z ^ (z >> 27)).wrapping_mul(0x94D0_49BB_1331_11EB);
    z ^ (z >> 31)
}

/// How often a key was seen, and in which sample first.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Count {
    /// Times.
    pub count: u64,
    /// The lowest sample.
    pub first: u64,
}

/// Keys with their counts.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
#[serde(bound(serialize = "K: Serialize", deserialize = "K: Deserialize<'de>"), deny_unknown_fields)]
pub struct Seen<K: Ord> {
    level: u32,
    #[serde(with = "super::pairs")]
    kept: BTreeMap<K, Count>,
    all: u64,
}

/// Does a key stay at this level? At level 64 none does.
fn keeps(level: u32, key: &impl Key) -> bool {
    match level {
        0 => true,
        1..64 => key.hash() >> (64 - level) == 0,
        _ => false,
    }
}

impl<K: Key> Default for Seen<K> {
    fn default() -> Self {
        Seen { level: 0, kept: BTreeMap::new(), all: 0 }
    }
}

impl<K: Key> Seen<K> {
    /// Sees a key `count` times, in sample `first` first.
    pub fn add(&mut self, key: &K, count: u64, first: u64) {
        self.all += count;
        if let Some(seen) = self.kept.get_mut(key) {
            seen.count += count;
            seen.first = seen.first.min(first);
        } else if self.keeps(key) {
            self.kept.insert(key.clone(), Count { count, first });
            self.shrink();
        }
    }

    fn keeps(&self, key: &K) -> bool {
        keeps(self.level, key)
    }

    fn shrink(&mut self) {
        while self.kept.len() > KEPT {
            self.level += 1;
            let level = self.level;
            self.kept.retain(|key, _| keeps(level, key));
        }
    }

    /// All that another has seen.
    pub fn merge(&mut self, other: &Seen<K>) {
        if other.level > self.level {
            self.level = other.level;
            let level = self.level;
            self.kept.retain(|key, _| keeps(level, key));
        }
        for (key, seen) in &other.kept {
            if let Some(ours) = self.kept.get_mut(key) {
                ours.count += seen.count;
                ours.first = ours.first.min(seen.first);
            } else if self.keeps(key) {
                self.kept.insert(key.clone(), *seen);
            }
        }
        self.all += other.all;
        self.shrink();
    }

    /// The kept keys, in order.
    pub fn iter(&self) -> impl Iterator<Item = (&K, Count)> {
        self.kept.iter().map(|(key, seen)| (key, *seen))
    }

    /// Was this key seen, and is it kept?
    pub fn has(&self, key: &K) -> bool {
        self.kept.contains_key(key)
    }

    /// Were there more keys than are kept?
    pub fn is_truncated(&self) -> bool {
        self.level > 0
    }

    /// Could samples below `planned`, `samples` of them, have been seen like this, each at most once? `known` tells whether
    /// a key is one at all.
    pub(super) fn fits(&self, samples: u64, planned: u64, known: impl Fn(&K) -> bool) -> bool {
        let counts = self.kept.values().try_fold(0u64, |sum, seen| sum.checked_add(seen.count));
        let all = if self.level == 0 { counts == Some(self.all) } else { counts.is_some_and(|sum| sum <= self.all) };
        let each =
            |(key, seen): (&K, &Count)| keeps(self.level, key) && seen.count > 0 && seen.first < planned && known(key);
        all && self.level <= 64 && self.all <= samples && self.kept.len() <= KEPT && self.kept.iter().all(each)
    }

    /// Sum of all counts, kept or not.
    pub fn total(&self) -> u64 {
        self.all
    }
}

#[cfg(test)]
mod tests {
    use proptest::prelude::*;

    use super::*;

    impl Key for u64 {
        fn hash(&self) -> u64 {
            mix(0, *self)
        }
    }

    #[test]
    fn the_hash_never_changes() {
        // golden values: results of different versions are merged by them
        assert_eq!(mix(0, 0), 0xE220_A839_7B1D_CDAF, "first output of splitmix64 from seed 0 (from memory)");
    }

    proptest! {
        #![proptest_config(ProptestConfig { cases: 40, failure_persistence: None, rng_seed: proptest::test_runner::RngSeed::Fixed(4), ..ProptestConfig::default() })]
        #[test]
        fn merging_any_split_in_any_order_is_the_whole(spread in 1u64..20_000, n in 0u64..20_000, cuts in proptest::collection::vec(0u64..20_000, 0..5), turn in any::<bool>()) {
            let key = |sample: u64| mix(7, sample) % spread;
            let of = |from: u64, to: u64| {
                let mut part = Seen::default();
                (from..to).for_each(|sample| part.add(&key(sample), 1, sample));
                part
            };
            let whole = of(0, n);
            let mut cuts: Vec<u64> = cuts.into_iter().map(|c| c.min(n)).chain([0, n]).collect();
            cuts.sort_unstable();
            let mut parts: Vec<Seen<u64>> = cuts.windows(2).map(|w| of(w[0], w[1])).collect();
            if turn { parts.reverse(); }
            let mut merged = Seen::default();
            parts.iter().for_each(|part| merged.merge(part));
            prop_assert_eq!(&merged, &whole);
            for (k, seen) in whole.iter() {
                let truth: Vec<u64> = (0..n).filter(|sample| key(*sample) == *k).collect();
                prop_assert_eq!(seen.count, truth.len() as u64);
                prop_assert_eq!(seen.first, truth[0]);
            }
        }
    }
}
