//! The smallest set of columns that meets every one of some sets.

use rustc_hash::FxHashSet;

use crate::logic::Bits;

/// Work that the exact search may spend, in sets looked at.
const SEARCH_STEPS: u64 = 20_000_000;
/// Sets up to which supersets are sorted out (the effort is quadratic).
const SORTED_OUT: usize = 3_000;

/// A smallest list of columns (ascending) such that every set has one of them, and whether it is proved to be smallest.
/// Of equally small ones the first in lexicographic order is found, unless the search runs out of steps: then it is the
/// one that taking the most useful column first gives.
///
/// Every set has a member. No answer can have fewer than `bound` columns.
pub(super) fn fewest(sets: FxHashSet<Bits>, columns: usize, bound: usize) -> (Vec<usize>, bool) {
    let sets = without_supersets(sets);
    if sets.is_empty() {
        return (Vec::new(), true);
    }
    let greedy = greedy(&sets, columns);
    let greatest = sets.iter().map(|set| set.ones().last().expect("no set is empty")).collect();
    let mut search = Search { sets: &sets, greatest, steps: SEARCH_STEPS };
    for size in bound.max(1)..=greedy.len() {
        let mut chosen = Vec::new();
        match search.extend(&mut chosen, size, 0, &(0..sets.len()).collect::<Vec<_>>()) {
            Some(true) => return (chosen, true),
            Some(false) => {}
            None => {
                let proved = size == greedy.len();
                return (greedy, proved);
            }
        }
    }
    (greedy, true)
}

/// Sorted by size, and free of sets that hold another one.
fn without_supersets(sets: FxHashSet<Bits>) -> Vec<Bits> {
    let mut sets: Vec<Bits> = sets.into_iter().collect();
    sets.sort_by_cached_key(|set| (set.ones().count(), set.clone()));
    if sets.len() > SORTED_OUT {
        return sets;
    }
    let mut kept: Vec<Bits> = Vec::new();
    for set in sets {
        if !kept.iter().any(|small| small.words().iter().zip(set.words()).all(|(s, w)| s & !w == 0)) {
            kept.push(set);
        }
    }
    kept
}

/// Takes the column that meets most of what is left, the first of equals; then drops what turned out to be needless.
fn greedy(sets: &[Bits], columns: usize) -> Vec<usize> {
    let mut left: Vec<&Bits> = sets.iter().collect();
    let mut chosen = Vec::new();
    while !left.is_empty() {
        let mut meets = vec![0usize; columns];
        for column in left.iter().flat_map(|set| set.ones()) {
            meets[column] += 1;
        }
        let best = (0..columns).rev().max_by_key(|column| meets[*column]).expect("some column meets a set");
        left.retain(|set| !set.get(best));
        chosen.push(best);
    }
    chosen.sort_unstable();
    for at in (0..chosen.len()).rev() {
        let others = |set: &Bits| chosen.iter().enumerate().any(|(i, column)| i != at && set.get(*column));
        if sets.iter().all(others) {
            chosen.remove(at);
        }
    }
    chosen
}

struct Search<'a> {
    sets: &'a [Bits],
    /// the greatest column of each set
    greatest: Vec<usize>,
    steps: u64,
}

impl Search<'_> {
    /// Chooses at most `size` more columns, from column `from` on, to meet the sets that are `left`: the first choice in
    /// lexicographic order. `None` when the steps are used up.
    fn extend(&mut self, chosen: &mut Vec<usize>, size: usize, from: usize, left: &[usize]) -> Option<bool> {
        let Some(last) = left.iter().map(|set| self.greatest[*set]).min() else { return Some(true) };
        self.steps = self.steps.checked_sub(left.len() as u64)?;
        if size == 0 || last < from || self.disjoint_more_than(size, left) {
            return Some(false);
        }
        for column in from..=last {
            let still: Vec<usize> = left.iter().copied().filter(|set| !self.sets[*set].get(column)).collect();
            self.steps = self.steps.checked_sub(left.len() as u64)?;
            if still.len() == left.len() {
                continue;
            }
            chosen.push(column);
            if self.extend(chosen, size - 1, column + 1, &still)? {
                return Some(true);
            }
            chosen.pop();
        }
        Some(false)
    }

    /// Are there more than `size` sets without a common column? Each needs a column of its own.
    fn disjoint_more_than(&self, size: usize, left: &[usize]) -> bool {
        let Some(first) = left.first() else { return false };
        let mut union = self.sets[*first].clone();
        let mut found = 1;
        for set in left {
            let words = self.sets[*set].words();
            if union.words().iter().zip(words).all(|(u, w)| u & w == 0) {
                found += 1;
                if found > size {
                    return true;
                }
                union.words_mut().iter_mut().zip(words).for_each(|(u, w)| *u |= w);
            }
        }
        found > size
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn set(columns: &[usize]) -> Bits {
        let mut bits = Bits::zeros(12);
        columns.iter().for_each(|column| bits.set(*column, true));
        bits
    }

    #[test]
    fn agrees_with_trying_every_choice() {
        let mut word = 0x9876_5432_10fe_dcbau64;
        let mut random = move |below: u64| {
            word ^= word << 13;
            word ^= word >> 7;
            word ^= word << 17;
            word % below
        };
        for case in 0..300 {
            let density = 2 + random(4);
            let sets: FxHashSet<Bits> = (0..1 + random(20))
                .map(|_| {
                    let mut members: Vec<usize> = (0..12).filter(|_| random(density) == 0).collect();
                    if members.is_empty() {
                        members.push(random(12) as usize);
                    }
                    set(&members)
                })
                .collect();
            let meets_all = |choice: u32| sets.iter().all(|set| set.ones().any(|column| choice >> column & 1 == 1));
            let least = (0..1 << 12).filter(|choice| meets_all(*choice)).map(u32::count_ones).min().unwrap();
            let best = (0..1u32 << 12)
                .filter(|choice| choice.count_ones() == least && meets_all(*choice))
                .map(|choice| (0..12).filter(|column| choice >> column & 1 == 1).collect::<Vec<usize>>())
                .min()
                .unwrap();
            assert_eq!(fewest(sets.clone(), 12, 1), (best, true), "case {case}: {sets:?}");
        }
    }

    #[test]
    fn a_search_that_is_too_long_says_so() {
        // every two of 64 columns differ: 63 are needed, and no bound shows it quickly
        let sets = (0..64).flat_map(|a| (a + 1..64).map(move |b| (a, b)));
        let sets: FxHashSet<Bits> = sets
            .map(|(a, b)| {
                let mut bits = Bits::zeros(64);
                bits.set(a, true);
                bits.set(b, true);
                bits
            })
            .collect();
        let (chosen, proved) = fewest(sets, 64, 6);
        assert_eq!((chosen.len(), proved), (63, false));
    }
}
