//! The bars of a settling histogram, such that a few late windows leave the others their shape.

use super::spread::Spread;
use crate::time::Span;

/// Bars of the common width, about.
const BARS: u64 = 60;
/// One window of so many, at least one, may settle far later than the others and share one bar.
const FAR_OF: u64 = 1000;
/// Far is so many times as far from the earliest as the others are.
const FAR: u64 = 5;

/// A histogram of about [`BARS`] bars of one round width; is there one more for what is far later?
pub(super) fn bars(spread: &Spread) -> (Vec<(Span, Span, u64)>, bool) {
    let (Some(min), Some(latest)) = (spread.min(), spread.max()) else { return (Vec::new(), false) };
    let max = bulk(spread).unwrap_or(latest);
    let needed = ((max - min).fs() / BARS).max(1);
    let mut width = 1u64;
    'found: loop {
        for step in [1, 2, 5] {
            if width * step >= needed {
                width *= step;
                break 'found;
            }
        }
        width *= 10;
    }
    let first = min.fs() / width;
    let mut counts = vec![0u64; (max.fs() / width - first + 1) as usize];
    let mut far = 0;
    for (from, _, count) in spread.classes() {
        match counts.get_mut((from.max(min.fs()) / width - first) as usize) {
            Some(bar) => *bar += count,
            None => far += count,
        }
    }
    let edge = (first + counts.len() as u64) * width;
    let bar = |(i, count)| {
        let from = (first + i as u64) * width;
        (Span::from_fs(from), Span::from_fs(from + width), count)
    };
    let mut bars: Vec<_> = counts.into_iter().enumerate().map(bar).collect();
    // the latest are counted where their class begins
    while far == 0 && bars.last().is_some_and(|bar| bar.2 == 0) {
        bars.pop();
    }
    if far > 0 {
        bars.push((Span::from_fs(edge), latest + Span::from_fs(1), far));
    }
    (bars, far > 0)
}

/// Where some settle far later than the others, the time after which they do.
fn bulk(spread: &Spread) -> Option<Span> {
    let (min, max) = (spread.min()?, spread.max()?);
    let inside = spread.len() - (spread.len() / FAR_OF).max(1);
    let mut counted = 0;
    let (from, wide, _) = spread.classes().into_iter().find(|(_, _, count)| {
        counted += count;
        counted >= inside
    })?;
    // the last time of its class
    let bulk = Span::from_fs((from + wide.saturating_sub(1)).clamp(min.fs(), max.fs()));
    let breadth = (bulk - min).fs();
    // where all others took the same time there is no shape that could become too small to see
    (inside > 0 && breadth > 0 && (max - min).fs() / FAR > breadth).then_some(bulk)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn of(times: impl Iterator<Item = u64>) -> Spread {
        let mut spread = Spread::new();
        spread.add_all(&mut times.collect());
        spread
    }

    fn check(spread: &Spread) -> (Vec<(u64, u64, u64)>, bool) {
        let (bars, far) = bars(spread);
        let bars: Vec<_> = bars.iter().map(|it| (it.0.fs(), it.1.fs(), it.2)).collect();
        assert_eq!(bars.iter().map(|it| it.2).sum::<u64>(), spread.len(), "every window once");
        assert!(bars.windows(2).all(|pair| pair[0].1 == pair[1].0), "no gap: {bars:?}");
        assert!(bars[0].2 > 0 && bars[bars.len() - 1].2 > 0, "no empty ends: {bars:?}");
        let common = &bars[..bars.len() - usize::from(far)];
        assert!(common.iter().all(|it| it.1 - it.0 == common[0].1 - common[0].0), "{bars:?}");
        (bars, far)
    }

    #[test]
    fn one_far_window_has_a_bar_of_its_own() {
        let near = || 10_000..10_200u64;
        let (bars, far) = check(&of(near().chain([900_000])));
        assert!(far && bars.len() > 30, "{bars:?}");
        assert_eq!(bars[bars.len() - 1], (10_200, 900_001, 1));
        // five times as far is not yet far, a little more is
        assert!(!check(&of(near().chain([10_000 + 5 * 199]))).1);
        assert!(check(&of(near().chain([10_000 + 6 * 199]))).1);
    }

    #[test]
    fn more_than_one_of_a_thousand_are_no_tail() {
        let near = (0..2000u64).map(|it| 10_000 + it % 200);
        assert!(check(&of(near.clone().chain([900_000, 900_100]))).1);
        let (bars, far) = check(&of(near.chain([900_000, 900_050, 900_100])));
        assert!(!far && bars.len() <= 61, "three of 2,003: {bars:?}");
    }

    #[test]
    fn what_has_one_value_or_two_has_no_tail() {
        for times in [vec![7u64], vec![7, 900_000], vec![7, 7, 7, 900_000], vec![0, 0], vec![(1 << 63) - 1, 0]] {
            assert!(!check(&of(times.clone().into_iter())).1, "{times:?}");
        }
        assert_eq!(bars(&Spread::new()), (Vec::new(), false));
    }

    /// Many values are kept in classes that are wider than bars would be.
    #[test]
    fn classes_are_no_gap() {
        for end in [50_006_000u64, 50_020_000, 51_000_000, 90_000_000, 1 << 60] {
            for many in [1200u64, 5000] {
                check(&of((0..many).map(|it| 50_000_000 + it).chain([end])));
            }
        }
    }
}
