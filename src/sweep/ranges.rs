//! Which samples are done: ranges of sample numbers, mergeable in any order.

use std::ops::Range;

use serde::{Deserialize, Serialize};

/// A set of sample numbers as ranges that do not touch, in rising order; ends are not included.
#[derive(Clone, Debug, Default, PartialEq, Eq, Serialize, Deserialize)]
#[serde(try_from = "Vec<(u64, u64)>", into = "Vec<(u64, u64)>")]
pub struct Ranges(Vec<Range<u64>>);

impl Ranges {
    /// One range; none if it is empty.
    pub fn of(range: Range<u64>) -> Ranges {
        Ranges(if range.is_empty() { Vec::new() } else { vec![range] })
    }

    /// The ranges, lowest first.
    pub fn iter(&self) -> impl Iterator<Item = Range<u64>> + '_ {
        self.0.iter().cloned()
    }

    /// No sample at all?
    pub fn is_empty(&self) -> bool {
        self.0.is_empty()
    }

    /// Number of samples.
    pub fn count(&self) -> u64 {
        self.0.iter().map(|it| it.end - it.start).sum()
    }

    /// From the lowest sample to behind the highest; `None` if there is none.
    pub fn hull(&self) -> Option<Range<u64>> {
        Some(self.0.first()?.start..self.0.last()?.end)
    }

    /// Adds the samples of another set; those in both count once.
    pub fn add(&mut self, other: &Ranges) {
        let mut all: Vec<Range<u64>> = self.iter().chain(other.iter()).collect();
        all.sort_unstable_by_key(|it| (it.start, it.end));
        self.0.clear();
        for range in all {
            match self.0.last_mut() {
                Some(last) if range.start <= last.end => last.end = last.end.max(range.end),
                _ => self.0.push(range),
            }
        }
    }

    /// The samples in both sets.
    pub fn common(&self, other: &Ranges) -> Ranges {
        let (mut ours, mut theirs) = (self.0.iter().peekable(), other.0.iter().peekable());
        let mut common = Vec::new();
        while let (Some(a), Some(b)) = (ours.peek(), theirs.peek()) {
            let both = a.start.max(b.start)..a.end.min(b.end);
            if !both.is_empty() {
                common.push(both);
            }
            if a.end < b.end {
                ours.next()
            } else {
                theirs.next()
            };
        }
        Ranges(common)
    }

    /// The samples of a range that are not in the set.
    pub fn missing(&self, within: Range<u64>) -> Ranges {
        let mut missing = Vec::new();
        let mut from = within.start;
        for range in self.0.iter().filter(|it| it.end > within.start) {
            let to = range.start.min(within.end);
            if from < to {
                missing.push(from..to);
            }
            from = from.max(range.end);
        }
        if from < within.end {
            missing.push(from..within.end);
        }
        Ranges(missing)
    }
}

impl TryFrom<Vec<(u64, u64)>> for Ranges {
    type Error = &'static str;

    fn try_from(pairs: Vec<(u64, u64)>) -> Result<Ranges, &'static str> {
        let rising = pairs.windows(2).all(|two| two[0].1 < two[1].0);
        if !rising || pairs.iter().any(|(from, to)| from >= to) {
            return Err("ranges of samples are not in rising order");
        }
        Ok(Ranges(pairs.into_iter().map(|(from, to)| from..to).collect()))
    }
}

impl From<Ranges> for Vec<(u64, u64)> {
    fn from(ranges: Ranges) -> Vec<(u64, u64)> {
        ranges.iter().map(|it| (it.start, it.end)).collect()
    }
}

#[cfg(test)]
mod tests {
    use std::collections::BTreeSet;

    use proptest::prelude::*;

    use super::*;

    fn set(ranges: &Ranges) -> BTreeSet<u64> {
        ranges.iter().flatten().collect()
    }

    fn any_ranges() -> impl Strategy<Value = Ranges> {
        proptest::collection::vec((0u64..60, 0u64..12), 0..6).prop_map(|all| {
            let mut ranges = Ranges::default();
            all.into_iter().for_each(|(from, long)| ranges.add(&Ranges::of(from..from + long)));
            ranges
        })
    }

    proptest! {
        #![proptest_config(ProptestConfig { cases: 300, failure_persistence: None, rng_seed: proptest::test_runner::RngSeed::Fixed(5), ..ProptestConfig::default() })]
        #[test]
        fn they_are_sets_of_numbers(a in any_ranges(), b in any_ranges(), from in 0u64..70, long in 0u64..70) {
            let (x, y) = (set(&a), set(&b));
            prop_assert_eq!(set(&a.common(&b)), &x & &y);
            prop_assert_eq!(set(&a.missing(from..from + long)), &(from..from + long).collect::<BTreeSet<u64>>() - &x);
            prop_assert_eq!(a.count(), x.len() as u64);
            prop_assert_eq!(a.hull().map(|it| (it.start, it.end - 1)), x.first().map(|first| (*first, *x.last().unwrap())));
            let mut both = a.clone();
            both.add(&b);
            prop_assert_eq!(set(&both), &x | &y);
            let mut turned = b;
            turned.add(&a);
            prop_assert_eq!(&turned, &both, "one form of one set");
            prop_assert_eq!(Ranges::try_from(Vec::from(both.clone())), Ok(both));
        }
    }

    #[test]
    fn what_is_no_set_of_ranges_is_not_taken_for_one() {
        for wrong in [vec![(3, 3)], vec![(4, 3)], vec![(0, 5), (5, 6)], vec![(4, 6), (0, 2)]] {
            assert!(Ranges::try_from(wrong.clone()).is_err(), "{wrong:?}");
        }
    }
}
