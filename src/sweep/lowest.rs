//! The lowest sample numbers that show something: bounded, and the same however samples are split.

use serde::{Deserialize, Serialize};

/// Numbers kept.
pub const KEPT: usize = 256;

/// The lowest numbers of all that were added, ascending, at most [`KEPT`].
#[derive(Clone, Debug, Default, PartialEq, Eq, Serialize, Deserialize)]
pub struct Lowest(Vec<u64>);

impl Lowest {
    /// Adds a number that was not added before. Rising numbers are added at once.
    pub fn add(&mut self, number: u64) {
        let full = self.0.len() == KEPT;
        if self.0.last().is_none_or(|last| *last < number) {
            if !full {
                self.0.push(number);
            }
            return;
        }
        if let Err(place) = self.0.binary_search(&number) {
            if full {
                self.0.pop();
            }
            self.0.insert(place, number);
        }
    }

    /// Adds what others have.
    pub fn merge(&mut self, other: &Lowest) {
        other.0.iter().for_each(|number| self.add(*number));
    }

    /// Could these be the lowest of `count` numbers below `end`?
    pub(super) fn fits(&self, count: u64, end: u64) -> bool {
        self.0.len() as u64 == count.min(KEPT as u64)
            && self.0.is_sorted_by(|a, b| a < b)
            && self.0.last().is_none_or(|last| *last < end)
    }

    /// The numbers, ascending.
    pub fn numbers(&self) -> &[u64] {
        &self.0
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn any_split_in_any_order_keeps_the_lowest() {
        for (n, stride) in [(0u64, 1u64), (5, 3), (255, 2), (256, 1), (257, 1), (1000, 7)] {
            let all: Vec<u64> = (0..n).map(|i| i * stride).collect();
            for parts in 1..6 {
                let mut each = vec![Lowest::default(); parts];
                // dealt out like cards, each part in rising order
                all.iter().for_each(|number| each[(number / stride) as usize % parts].add(*number));
                for turned in [false, true] {
                    let mut merged = Lowest::default();
                    let mut merge = |part: &Lowest| merged.merge(part);
                    match turned {
                        true => each.iter().rev().for_each(&mut merge),
                        false => each.iter().for_each(&mut merge),
                    }
                    assert_eq!(merged.numbers(), &all[..all.len().min(KEPT)], "{n} in {parts} parts");
                }
            }
        }
    }
}
