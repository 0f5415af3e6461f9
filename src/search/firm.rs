//! Is a breach more than a tie of exactly equal times?
//!
//! A search walks to where paths are exactly equal, as at corners, and there the model does what no part does. So a breach
//! counts only if it shows in one of eight cases in which every quantity is moved by some femtoseconds, each by its own; or,
//! of a rule with a number, if it only was broken by less than they were moved.

use rand::RngExt;

use super::bench::{Bench, Shown};
use crate::delay::Marginal;
use crate::instance::{Instance, Numbers};
use crate::time::Span;

/// Cases tried.
pub(super) const MOVED: u64 = 8;
/// Most that a quantity is moved by.
const FARTHEST: u64 = 1_000;

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
    /// Tries a case that broke the question once more with its times moved a little.
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
            let (other, seen) = match corners {
                true => {
                    let moved = self.beside(&instance, most);
                    (numbers.clone(), self.try_case(&moved))
                }
                false => {
                    let moved = self.moved(numbers, most);
                    let seen = self.try_numbers(&moved);
                    (moved, seen)
                }
            };
            let Some(seen) = seen else { return Firm::Untold };
            if seen.broken {
                count += 1;
                stands.get_or_insert((other, if corners { shown } else { seen }));
            } else if let (Some(a), Some(b)) = (shown.slack, seen.slack) {
                // each event waits for no more delays than there are transitions; a few times all of them is room enough
                let room = most.saturating_mul(16 * (self.movable.len() as u64 + 1));
                near |= a.abs_diff(b) <= room;
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
            let by = u64::try_from(by).unwrap_or(u64::MAX).max(1);
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
            let by = Span::from_fs(self.rng.random_range(1..=most));
            let span = instance.get(&quantity);
            let (least, greatest) = (quantity.range.min, quantity.range.max);
            let up = if span + by > greatest { false } else { self.rng.random() || span < least + by };
            let span = if up { span + by } else { span.max(least + by) - by };
            moved.set(&quantity, span.clamp(least, greatest));
        }
        moved
    }
}
