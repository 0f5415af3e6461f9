//! How the margins of a rule spread: bounded memory, mergeable in any order, a few instructions a margin.
//!
//! A margin is counted in a class of 1/128 of an octave of its size; margins below 256 fs have classes of their own. A
//! negative margin `m` is counted by the size of `-1 - m`, so that classes are half-open alike on both sides and none holds
//! both broken and kept runs. Which class a margin is in depends on the margin alone, so neither the split nor the order of
//! a merge can show.

use serde::{Deserialize, Serialize};

/// Classes an octave, as a power of two.
const CLASS_BITS: u32 = 7;
/// Classes an octave.
const CLASSES: u64 = 1 << CLASS_BITS;
/// The last class: that of the greatest margin there is.
const LAST: i32 = class_of_size(i64::MAX as u64) as i32;

/// The margins of the runs that judged a rule and measured something: exact counts in classes, for pictures and tables. The
/// least margin is known exactly beside it ([`RuleReport::margin`](super::RuleReport::margin)).
///
/// At most 14,592 counts, 117 kB; where all margins are of one octave, 128 counts.
///
/// ```
/// use stillgate::sweep::Margins;
/// let mut margins = Margins::default();
/// for fs in [-1, 0, 0, 20_000_000] {
///     margins.add(fs);
/// }
/// assert_eq!((margins.len(), margins.broken()), (4, 1));
/// let classes: Vec<(i128, i128, u64)> = margins.classes().collect();
/// assert_eq!(classes, [(-1, 0, 1), (0, 1, 2), (19_922_944, 20_054_016, 1)]);
/// ```
#[derive(Clone, Debug, Default, PartialEq, Eq, Serialize, Deserialize)]
#[serde(try_from = "Vec<(i32, u64)>", into = "Vec<(i32, u64)>")]
pub struct Margins {
    /// The class of the first count.
    first: i32,
    /// Counts of classes one after the other; neither the first nor the last is 0.
    counts: Vec<u64>,
}

/// The number of the class of a size, from 0.
const fn class_of_size(size: u64) -> u64 {
    let octave = ((size | 1).ilog2()).saturating_sub(CLASS_BITS);
    ((octave as u64) << CLASS_BITS) + (size >> octave)
}

/// The smallest size of a class, and how many sizes it has.
fn sizes(class: u64) -> (u64, u64) {
    let octave = (class >> CLASS_BITS).saturating_sub(1);
    ((class - (octave << CLASS_BITS)) << octave, 1 << octave)
}

/// The class of a margin: 0 and above for what is kept, below 0 for what is broken. It rises with the margin.
#[inline]
fn class_of(fs: i64) -> i32 {
    if fs < 0 { -1 - class_of_size(!fs as u64) as i32 } else { class_of_size(fs as u64) as i32 }
}

/// The margins of a class: from, and up to but not including.
fn edges(class: i32) -> (i128, i128) {
    let (from, width) = sizes(if class < 0 { (-1 - class) as u64 } else { class as u64 });
    let (from, to) = (i128::from(from), i128::from(from) + i128::from(width));
    if class < 0 { (-to, -from) } else { (from, to) }
}

impl Margins {
    /// Relative width of a class.
    pub const RESOLUTION: f64 = 1.0 / CLASSES as f64;

    /// One more margin, in fs; below 0 the rule is broken.
    #[inline]
    pub fn add(&mut self, fs: i64) {
        let class = class_of(fs);
        // a class before the first one is far behind the last one
        match self.counts.get_mut(class.wrapping_sub(self.first) as u32 as usize) {
            Some(count) => *count += 1,
            None => self.count(class, 1),
        }
    }

    /// Counts in a class that may be new.
    #[cold]
    fn count(&mut self, class: i32, count: u64) {
        if self.counts.is_empty() {
            self.first = class;
        }
        if class < self.first {
            let more = (self.first - class) as usize;
            self.counts.splice(..0, std::iter::repeat_n(0, more));
            self.first = class;
        }
        let at = (class - self.first) as usize;
        if at >= self.counts.len() {
            self.counts.resize(at + 1, 0);
        }
        self.counts[at] += count;
    }

    /// All margins of other runs.
    pub fn merge(&mut self, other: &Margins) {
        for (class, count) in other.counted() {
            self.count(class, count);
        }
    }

    fn counted(&self) -> impl DoubleEndedIterator<Item = (i32, u64)> + '_ {
        let each = self.counts.iter().enumerate().map(|(i, count)| (self.first + i as i32, *count));
        each.filter(|(_, count)| *count > 0)
    }

    /// Runs with a margin.
    pub fn len(&self) -> u64 {
        self.counts.iter().sum()
    }

    /// No run has one?
    pub fn is_empty(&self) -> bool {
        self.counts.is_empty()
    }

    /// Runs whose margin is below 0: those that break the rule.
    pub fn broken(&self) -> u64 {
        self.counted().take_while(|(class, _)| *class < 0).map(|(_, count)| count).sum()
    }

    /// Classes with a count: margins in fs from, up to but not including, how many runs; rising.
    pub fn classes(&self) -> impl DoubleEndedIterator<Item = (i128, i128, u64)> + '_ {
        self.counted().map(|(class, count)| {
            let (from, to) = edges(class);
            (from, to, count)
        })
    }

    /// A histogram with bars of one width: that width in fs, and the bars with a count as in [`Margins::classes`].
    ///
    /// The width is the least power of two that is no finer than the coarsest class, no finer than the spread of the margins
    /// over `most`, and no finer than the stretch from them to 0 over `4 * most`. Classes are whole within such bars, so
    /// every count is exact, and 0 is between two bars.
    pub fn bars(&self, most: u64) -> (i128, Vec<(i128, i128, u64)>) {
        let (mut classes, mut last) = (self.classes(), self.classes());
        let (Some(first), Some(last)) = (classes.next(), last.next_back()) else { return (1, Vec::new()) };
        let most = i128::from(most.max(1));
        let (from, to) = (first.0, last.1);
        let finest = (first.1 - first.0).max(last.1 - last.0);
        let spread = (to - from).div_euclid(most);
        let to_zero = (to.max(0) - from.min(0)).div_euclid(4 * most);
        let width = finest.max(spread).max(to_zero).unsigned_abs().next_power_of_two() as i128;
        let mut bars: Vec<(i128, i128, u64)> = Vec::new();
        for (from, _, count) in self.classes() {
            let from = from.div_euclid(width) * width;
            match bars.last_mut() {
                Some(bar) if bar.0 == from => bar.2 += count,
                _ => bars.push((from, from + width, count)),
            }
        }
        (width, bars)
    }

    /// Could these be the margins of a rule that was judged and broken so often, the least of which is this?
    pub(super) fn fits(&self, judged: u64, broken: u64, least: Option<i64>) -> bool {
        let sum = self.counts.iter().try_fold(0u64, |sum, count| sum.checked_add(*count));
        let first = self.counted().next().map(|it| it.0);
        let below = |len: u64| self.broken() <= broken && len - self.broken() <= judged - broken;
        broken <= judged && sum.is_some_and(below) && first == least.map(class_of)
    }
}

impl From<Margins> for Vec<(i32, u64)> {
    fn from(margins: Margins) -> Vec<(i32, u64)> {
        margins.counted().collect()
    }
}

impl TryFrom<Vec<(i32, u64)>> for Margins {
    type Error = &'static str;

    fn try_from(written: Vec<(i32, u64)>) -> Result<Margins, &'static str> {
        let known = |(class, count): &(i32, u64)| (-1 - LAST..=LAST).contains(class) && *count > 0;
        if !written.iter().all(known) || !written.is_sorted_by(|a, b| a.0 < b.0) {
            return Err("classes of margins that cannot be");
        }
        let mut margins = Margins::default();
        written.into_iter().for_each(|(class, count)| margins.count(class, count));
        Ok(margins)
    }
}

#[cfg(test)]
mod tests {
    use proptest::prelude::*;

    use super::*;

    fn of(values: &[i64]) -> Margins {
        let mut margins = Margins::default();
        values.iter().for_each(|fs| margins.add(*fs));
        margins
    }

    #[test]
    fn classes_are_as_fine_as_they_say_and_have_no_gaps() {
        for class in -1 - LAST..=LAST {
            let (from, to) = edges(class);
            assert_eq!((class_of(from as i64), class_of((to - 1) as i64)), (class, class));
            if class < LAST {
                assert_eq!(edges(class + 1).0, to, "behind class {class}");
            }
            let least = from.abs().min((to - 1).abs());
            assert!(to - from == 1 || (to - from) as f64 <= Margins::RESOLUTION * (least + 1) as f64, "{from} to {to}");
        }
        assert_eq!((edges(-1 - LAST).0, edges(LAST).1), (-(1 << 63), 1 << 63), "all numbers have a class");
    }

    #[test]
    fn bars_end_at_zero() {
        let margins = of(&[-900, -1, 0, 5_000]);
        let (width, bars) = margins.bars(60);
        assert_eq!((width, bars), (128, vec![(-1_024, -896, 1), (-128, 0, 1), (0, 128, 1), (4_992, 5_120, 1)]));
        assert_eq!(of(&[]).bars(60), (1, vec![]));
        // far from 0 the classes are the finest that can be said
        assert_eq!(of(&[1 << 30, (1 << 30) + 1]).bars(60).0, 1 << 23);
        assert_eq!(of(&[i64::MIN, i64::MAX]).bars(60).1.len(), 2);
    }

    #[test]
    fn forged_classes_are_refused() {
        for forged in
            [vec![(LAST + 1, 1)], vec![(-2 - LAST, 1)], vec![(0, 0)], vec![(1, 1), (1, 1)], vec![(2, 1), (1, 1)]]
        {
            assert!(Margins::try_from(forged.clone()).is_err(), "{forged:?}");
        }
        let margins = of(&[-3, 4, 4]);
        assert!(margins.fits(3, 1, Some(-3)) && margins.fits(9, 2, Some(-3)));
        for (judged, broken, least) in
            [(2, 1, Some(-3)), (3, 0, Some(-3)), (3, 2, Some(-3)), (3, 1, Some(-2)), (3, 1, None)]
        {
            assert!(!margins.fits(judged, broken, least), "{judged} {broken} {least:?}");
        }
        let many = Margins::try_from(vec![(0, u64::MAX), (1, 1)]).unwrap();
        assert!(!many.fits(u64::MAX, 0, Some(0)), "counts that overflow");
    }

    proptest! {
        #![proptest_config(ProptestConfig { cases: 40, failure_persistence: None, rng_seed: proptest::test_runner::RngSeed::Fixed(5), ..ProptestConfig::default() })]
        #[test]
        fn merging_any_split_in_any_order_is_the_whole(
            sizes in proptest::collection::vec((any::<i64>(), 0u32..64), 0..400),
            cuts in proptest::collection::vec(0usize..400, 0..5),
            turn in any::<bool>(),
            most in 1u64..100,
        ) {
            let values: Vec<i64> = sizes.into_iter().map(|(value, shift)| value >> shift).collect();
            let whole = of(&values);
            let mut cuts: Vec<usize> = cuts.into_iter().map(|c| c.min(values.len())).chain([0, values.len()]).collect();
            cuts.sort_unstable();
            let mut parts: Vec<Margins> = cuts.windows(2).map(|w| of(&values[w[0]..w[1]])).collect();
            if turn { parts.reverse(); }
            let mut merged = Margins::default();
            parts.iter().for_each(|part| merged.merge(part));
            prop_assert_eq!(&merged, &whole);
            let written = serde_json::to_string(&whole).unwrap();
            prop_assert_eq!(&serde_json::from_str::<Margins>(&written).unwrap(), &whole);
            prop_assert_eq!(whole.len(), values.len() as u64);
            prop_assert_eq!(whole.broken(), values.iter().filter(|it| **it < 0).count() as u64);
            let (width, bars) = whole.bars(most);
            for (from, to, count) in whole.classes().chain(bars.iter().copied()) {
                let within = values.iter().filter(|it| (from..to).contains(&i128::from(**it))).count();
                prop_assert_eq!(count, within as u64, "{} to {}", from, to);
            }
            prop_assert!(bars.iter().all(|bar| bar.1 - bar.0 == width && (bar.0 >= 0 || bar.1 <= 0)));
            prop_assert_eq!(bars.iter().map(|bar| bar.2).sum::<u64>(), whole.len());
        }
    }
}
