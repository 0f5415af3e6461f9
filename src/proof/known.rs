//! The keys that were met, and what follows from each.

use rustc_hash::FxHashMap;

use super::explored::Explored;
use super::joint::Joint;
use super::key::{self, Info, Key};
use super::passed::Kept;
use super::plant::Plant;
use super::semantics::Semantics;
use super::watch::Watch;

/// What follows from each known key, by its number.
#[derive(Default)]
pub(super) struct Known {
    /// By hash the last key of that hash; others are told apart word by word.
    last: FxHashMap<u64, u32>,
    /// The key of the same hash before it.
    before: Vec<u32>,
    pub infos: Vec<Info>,
    /// The zones of each key that are kept.
    pub zones: Vec<Vec<Kept>>,
    pub joint: Vec<Joint>,
}

/// A word for the words of a key (multiplied and turned as rustc-hash 1 does).
fn hash(words: &[u64]) -> u64 {
    let mixed = words.iter().fold(0u64, |hash, word| (hash.rotate_left(5) ^ word).wrapping_mul(0x517c_c1b7_2722_0a95));
    mixed ^ mixed >> 32
}

impl Known {
    /// The number of a key, and whether it is new. Its words go to `found`, its memory is counted there.
    pub fn number<W: Watch, S: Semantics>(
        &mut self,
        plant: &Plant,
        watch: &W,
        semantics: &S,
        words: &[u64],
        excited: &[u64],
        found: &mut Explored,
    ) -> (u32, bool) {
        let hash = hash(words);
        let mut number = self.last.get(&hash).copied().unwrap_or(u32::MAX);
        while number != u32::MAX {
            if found.key(number).words == words {
                return (number, false);
            }
            number = self.before[number as usize];
        }
        let number = self.infos.len() as u32;
        let key = Key { words, layout: found.layout };
        let mut info = key::info(plant, key, excited.to_vec(), watch.clocks(key.watch()));
        info.waits(plant, key, |min| semantics.old(min));
        found.bytes += (words.len() * 8 + info.memory() + std::mem::size_of::<Joint>() + 64) as u64;
        self.before.push(self.last.insert(hash, number).unwrap_or(u32::MAX));
        self.infos.push(info);
        self.zones.push(Vec::new());
        self.joint.push(Joint::default());
        found.keys.extend_from_slice(words);
        (number, true)
    }
}
