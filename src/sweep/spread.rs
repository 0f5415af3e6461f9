//! How times spread: bounded memory, mergeable in any order.
//!
//! Up to [`DISTINCT`] different values are kept exactly; beyond, values are counted in classes of 1/1024 of an octave.
//! Both forms depend only on the values seen, so neither the split nor the order of a merge can show.

use std::collections::BTreeMap;

use serde::{Deserialize, Serialize};

use crate::time::Span;

/// Different values kept exactly.
const DISTINCT: usize = 1024;
/// Classes an octave, as a power of two.
const CLASS_BITS: u32 = 10;
/// Classes an octave.
const CLASSES: usize = 1 << CLASS_BITS;

/// Relative width of a class: median and percentiles are lower edges of classes.
pub(super) const RESOLUTION: f64 = 1.0 / CLASSES as f64;

/// The spread of some times.
#[derive(Clone, Debug, Default, PartialEq, Eq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Spread {
    n: u64,
    min: Option<u64>,
    max: Option<u64>,
    /// Value to count; `None` once there are too many different ones.
    #[serde(with = "super::pairs::optional")]
    exact: Option<BTreeMap<u64, u64>>,
    /// Octave to counts of its classes.
    #[serde(with = "super::pairs")]
    pages: BTreeMap<u8, Vec<u64>>,
}

/// Times stay below this: a run ends below 2^63 fs.
const LONGEST: u64 = 1 << 63;

fn class_of(fs: u64) -> (u8, usize) {
    let octave = (u64::BITS - fs.leading_zeros()).saturating_sub(CLASS_BITS + 1);
    let class = if fs < CLASSES as u64 { fs as usize } else { (fs >> octave) as usize - CLASSES };
    // octave 0 holds the values below 1024 exactly; its successor those below 2048
    if fs < CLASSES as u64 { (0, class) } else { (octave as u8 + 1, class) }
}

fn lower_edge(octave: u8, class: usize) -> u64 {
    match octave {
        0 => class as u64,
        _ => (CLASSES as u64 + class as u64) << (octave - 1),
    }
}

fn width(octave: u8) -> u64 {
    1 << octave.saturating_sub(1)
}

impl Spread {
    /// Nothing yet.
    pub fn new() -> Spread {
        Spread { exact: Some(BTreeMap::new()), ..Spread::default() }
    }

    /// Many more times, in fs; the list is emptied.
    pub(super) fn add_all(&mut self, times: &mut Vec<u64>) {
        if times.is_empty() {
            return;
        }
        match self.exact.take() {
            None => {
                let (min, max) = times.iter().fold((u64::MAX, 0), |(min, max), fs| (min.min(*fs), max.max(*fs)));
                self.widen(times.len() as u64, Some(min), Some(max));
                self.count_all(times.iter().map(|fs| (*fs, 1)));
            }
            Some(exact) => {
                times.sort_unstable();
                self.widen(times.len() as u64, times.first().copied(), times.last().copied());
                self.add_exact(exact, times.chunk_by(|a, b| a == b).map(|same| (same[0], same.len() as u64)));
            }
        }
        times.clear();
    }

    /// More times, between these.
    fn widen(&mut self, n: u64, min: Option<u64>, max: Option<u64>) {
        self.n += n;
        self.min = [self.min, min].into_iter().flatten().min();
        self.max = self.max.max(max);
    }

    /// To the values of this spread, kept exactly so far, others in rising order.
    fn add_exact(&mut self, ours: BTreeMap<u64, u64>, others: impl Iterator<Item = (u64, u64)>) {
        let all = both(ours.into_iter(), others);
        if all.len() <= DISTINCT {
            self.exact = Some(all.into_iter().collect());
        } else {
            self.count_all(all.into_iter());
        }
    }

    /// Counts values in classes. Times of one place are mostly of one octave.
    fn count_all(&mut self, times: impl Iterator<Item = (u64, u64)>) {
        let mut times = times.peekable();
        while let Some((fs, _)) = times.peek() {
            let octave = class_of(*fs).0;
            let page = self.pages.entry(octave).or_insert_with(|| vec![0; CLASSES]);
            while let Some((fs, count)) = times.next_if(|(fs, _)| class_of(*fs).0 == octave) {
                page[class_of(fs).1] += count;
            }
        }
    }

    /// All times of another spread.
    pub fn merge(&mut self, other: &Spread) {
        if let Some(exact) = &other.exact {
            let others = exact.iter().map(|(fs, count)| (*fs, *count));
            self.widen(other.n, other.min, other.max);
            match self.exact.take() {
                Some(ours) => self.add_exact(ours, others),
                None => self.count_all(others),
            }
            return;
        }
        let ours = self.exact.take();
        self.count_all(ours.into_iter().flatten());
        for (octave, page) in &other.pages {
            let ours = self.pages.entry(*octave).or_insert_with(|| vec![0; CLASSES]);
            for (ours, theirs) in ours.iter_mut().zip(page) {
                *ours += theirs;
            }
        }
        self.widen(other.n, other.min, other.max);
    }

    /// Could these be the times of this many windows at most?
    pub(super) fn fits(&self, samples: u64) -> bool {
        if !self.has_sound_pages() {
            return false;
        }
        let counts = self.classes();
        let sum = counts.iter().try_fold(0u64, |sum, (_, _, count)| sum.checked_add(*count));
        let ends = match (counts.first(), counts.last(), self.min, self.max) {
            (None, None, None, None) => true,
            (Some(first), Some(last), Some(min), Some(max)) => {
                let within = |class: &(u64, u64, u64), fs: u64| fs >= class.0 && fs - class.0 < class.1.max(1);
                max < LONGEST && within(first, min) && within(last, max) && min <= max
            }
            _ => false,
        };
        let form = match &self.exact {
            Some(exact) => exact.len() <= DISTINCT && exact.values().all(|it| *it > 0) && self.pages.is_empty(),
            None => true,
        };
        form && ends && sum == Some(self.n) && self.n <= samples
    }

    /// Are pages such as this program makes?
    fn has_sound_pages(&self) -> bool {
        let last = class_of(LONGEST - 1).0;
        self.pages.iter().all(|(octave, page)| *octave <= last && page.len() == CLASSES)
    }

    /// Number of times.
    pub fn len(&self) -> u64 {
        self.n
    }

    /// No time at all?
    pub fn is_empty(&self) -> bool {
        self.n == 0
    }

    /// Shortest.
    pub fn min(&self) -> Option<Span> {
        self.min.map(Span::from_fs)
    }

    /// Longest.
    pub fn max(&self) -> Option<Span> {
        self.max.map(Span::from_fs)
    }

    /// How many were not longer than this; of classes, those that begin no later.
    pub fn up_to(&self, span: Span) -> u64 {
        self.classes().iter().take_while(|(from, _, _)| *from <= span.fs()).map(|(_, _, count)| count).sum()
    }

    /// Are values kept exactly?
    pub fn is_exact(&self) -> bool {
        self.exact.is_some()
    }

    /// Classes with a count: (from, width, count), in order. A width of 0 is an exact value.
    pub fn classes(&self) -> Vec<(u64, u64, u64)> {
        match &self.exact {
            Some(exact) => exact.iter().map(|(fs, count)| (*fs, 0, *count)).collect(),
            None => {
                let pages = self.pages.iter();
                let each = pages.flat_map(|(octave, page)| {
                    let counted = page.iter().enumerate().filter(|(_, count)| **count > 0);
                    counted.map(|(class, count)| (lower_edge(*octave, class), width(*octave), *count))
                });
                each.collect()
            }
        }
    }
}

/// Two lists of values in rising order, each with a count, as one.
fn both(a: impl Iterator<Item = (u64, u64)>, b: impl Iterator<Item = (u64, u64)>) -> Vec<(u64, u64)> {
    let (mut a, mut b) = (a.peekable(), b.peekable());
    let mut all = Vec::new();
    while let Some(fs) = a.peek().into_iter().chain(b.peek()).map(|it| it.0).min() {
        let count = [a.next_if(|it| it.0 == fs), b.next_if(|it| it.0 == fs)].iter().flatten().map(|it| it.1).sum();
        all.push((fs, count));
    }
    all
}

/// The nearest rank of a share (0 to 1) of `n` values, from 1.
pub(super) fn rank(n: u64, share: f64) -> u64 {
    ((share * n as f64).ceil() as u64).clamp(1, n.max(1))
}

/// The value of nearest rank `share` (0 to 1) of two spreads taken together, as the lower edge of its class.
pub(super) fn nearest_rank(parts: &[&Spread], share: f64) -> Option<Span> {
    let n: u64 = parts.iter().map(|part| part.n).sum();
    if n == 0 {
        return None;
    }
    let mut together = Spread::new();
    parts.iter().for_each(|part| together.merge(part));
    let rank = rank(n, share);
    let mut below = 0;
    for (from, _, count) in together.classes() {
        below += count;
        if below >= rank {
            return Some(Span::from_fs(from.max(together.min.unwrap_or(0))));
        }
    }
    together.max()
}

#[cfg(test)]
mod tests {
    use proptest::prelude::*;

    use super::*;

    #[test]
    fn classes_cover_every_value_once() {
        for fs in (0..5000).chain([1 << 20, (1 << 40) + 12_345, (1 << 62) - 1, u64::MAX]) {
            let (octave, class) = class_of(fs);
            let edge = lower_edge(octave, class);
            assert!(class < CLASSES && edge <= fs && fs - edge < width(octave), "{fs}");
            assert!(width(octave) as f64 <= RESOLUTION * fs.max(CLASSES as u64) as f64, "{fs}");
        }
    }

    proptest! {
        #![proptest_config(ProptestConfig { cases: 60, failure_persistence: None, rng_seed: proptest::test_runner::RngSeed::Fixed(3), ..ProptestConfig::default() })]
        #[test]
        fn merging_any_split_in_any_order_is_the_whole(values in proptest::collection::vec(0u64..1_000_000, 0..4000), chunk in 1usize..3000, cuts in proptest::collection::vec(0usize..4000, 0..5), turn in any::<bool>()) {
            let mut whole = Spread::new();
            values.chunks(chunk).for_each(|some| whole.add_all(&mut some.to_vec()));
            let mut cuts: Vec<usize> = cuts.into_iter().map(|c| c.min(values.len())).chain([0, values.len()]).collect();
            cuts.sort_unstable();
            let mut parts: Vec<Spread> = cuts.windows(2).map(|w| {
                let mut part = Spread::new();
                part.add_all(&mut values[w[0]..w[1]].to_vec());
                part
            }).collect();
            if turn { parts.reverse(); }
            let mut merged = Spread::new();
            parts.iter().for_each(|part| merged.merge(part));
            prop_assert_eq!(&merged, &whole);
            let mut sorted = values.clone();
            sorted.sort_unstable();
            for share in [0.5, 0.99, 1.0] {
                let rank = ((share * sorted.len() as f64).ceil() as usize).max(1);
                let told = nearest_rank(&[&whole], share).map(Span::fs);
                match sorted.get(rank - 1) {
                    None => prop_assert_eq!(told, None),
                    Some(true_value) => {
                        let told = told.unwrap();
                        prop_assert!(told <= *true_value && (*true_value - told) as f64 <= RESOLUTION * *true_value as f64, "{} {}", told, true_value);
                    }
                }
            }
        }
    }
}
