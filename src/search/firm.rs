//! Is a breach more than a tie of exactly equal times?
//!
//! A search walks to where paths are exactly equal, as at corners, and there the model does what no part does. So a breach
//! counts only if it shows in one of eight cases in which every quantity is moved a little, each by its own: by some
//! femtoseconds, and by up to a thousandth of its range, since gates that are equal to a femtosecond still oscillate for long.
//! Of a rule with a number it also counts if it was only broken by less than they were moved.

use rand::RngExt;

use super::bench::{Bench, Shown};
use crate::delay::Marginal;
use crate::instance::{Instance, Numbers};
use crate::time::Span;

/// Cases tried.
pub(super) const MOVED: u64 = 8;
/// Femtoseconds that a quantity is moved by at least where its range is short, at most.
const FARTHEST: u64 = 1_000;
/// A range is moved over by up to this part of it: 2^-10.
const PART: u32 = 10;

/// What became of a breach.
pub(super) enum Firm {
    /// It stands in this case, which showed that.
    Stands(Numbers, Shown),
    /// It was a tie.
    Tie,
    /// No run was left to tell.
    Untold,
}

impl Bench<'_> {
    /// Tries a case that broke the question again, with its times moved a little.
    pub(super) fn confirm(&mut self, numbers: &Numbers, shown: Shown) -> Firm {
        if self.left() < MOVED {
            return Firm::Untold;
        }
        let instance = self.case(numbers);
        let gates = instance.delays.gate.iter().flatten();
        let least = gates.map(|delay| delay.fs()).min().unwrap_or(1);
        let most = (least / 100).clamp(1, FARTHEST);
        let corners = self.shared.scenario.plan.draw == Marginal::Corners;
        let mut stands: Option<(Numbers, Shown)> = None;
        let (mut count, mut near) = (0, false);
        for _ in 0..MOVED {
            // of corners no case lies between: the tie is looked for beside them, and the corner is kept
            let (other, case) = match corners {
                true => (numbers.clone(), self.beside(&instance, most)),
                false => {
                    let moved = self.moved(numbers, most);
                    let case = self.case(&moved);
                    (moved, case)
                }
            };
            let Some(seen) = self.try_case(&case) else { return Firm::Untold };
            if seen.broken {
                count += 1;
                stands.get_or_insert((other, if corners { shown } else { seen }));
            } else if let (Some(a), Some(b)) = (shown.slack, seen.slack) {
                // a path may go through a gate several times
                let quantities = self.cases.quantities().iter();
                let moved = quantities.map(|it| instance.get(it).fs().abs_diff(case.get(it).fs()));
                near |= a.abs_diff(b) <= moved.fold(0, u64::saturating_add).saturating_mul(16);
            }
        }
        match stands {
            _ if count == MOVED => Firm::Stands(numbers.clone(), shown),
            Some((other, seen)) => Firm::Stands(other, seen),
            None if near => Firm::Stands(numbers.clone(), shown),
            None => Firm::Tie,
        }
    }

    /// Every quantity moved by up to `most` femtoseconds, by its number, so that it is drawn still.
    fn moved(&mut self, numbers: &Numbers, most: u64) -> Numbers {
        let mut moved = numbers.clone();
        for i in 0..numbers.count() {
            let width = match self.cases.quantities().get(i) {
                Some(quantity) => (quantity.range.max - quantity.range.min).fs() + 1,
                // what a group has in common moves all of it
                None => 1 << 40,
            };
            let by = (u128::from(self.rng.random_range(1..=most)) << 64) / u128::from(width);
            let part = self.rng.random_range(0..=u64::MAX >> PART);
            let by = u64::try_from(by).unwrap_or(u64::MAX).max(part).max(1);
            let number = numbers.get(i);
            let up = if self.rng.random() { number.checked_add(by).is_some() } else { number < by };
            moved.set(i, if up { number.saturating_add(by) } else { number.saturating_sub(by) });
        }
        moved
    }

    /// Every quantity of a case moved by up to `most` femtoseconds within its range.
    fn beside(&mut self, instance: &Instance, most: u64) -> Instance {
        let mut moved = instance.clone();
        for i in 0..self.cases.quantities().len() {
            let quantity = self.cases.quantities()[i];
            let (least, greatest) = (quantity.range.min, quantity.range.max);
            let most = most.max((greatest - least).fs() >> PART);
            let by = Span::from_fs(self.rng.random_range(1..=most));
            let span = instance.get(&quantity);
            let up = if span + by > greatest { false } else { self.rng.random() || span < least + by };
            let span = if up { span + by } else { span.max(least + by) - by };
            moved.set(&quantity, span.clamp(least, greatest));
        }
        moved
    }
}
