//! Moving the values of a reduced case toward typical as far as the finding stays.

use super::probe::Cut;
use super::reduce::{Search, Set};
use crate::time::Span;

/// Steps of the way from typical outward that all values take together.
const STEPS: u64 = 1 << 20;

/// The value this many steps of the way from one to another.
fn between(from: Span, to: Span, steps: u64) -> Span {
    let part = |way: u64| ((u128::from(way) * u128::from(steps)) / u128::from(STEPS)) as u64;
    match from <= to {
        true => Span::from_fs(from.fs() + part(to.fs() - from.fs())),
        false => Span::from_fs(from.fs() - part(from.fs() - to.fs())),
    }
}

impl Search<'_> {
    /// First all values by one share of their way from typical to the ends of their ranges (or to the failing case), so that none stays far out for another's sake; then each alone, to 1 fs.
    /// In the end no value can be put back, and none can be moved 1 fs nearer (in its range) with the others as they are.
    pub(super) fn approach(&mut self, set: Set) -> Result<Set, Cut> {
        // shares of ways to the ends of the ranges are fair; those of ways to where a draw happened to be are not
        let stretched = self.stretched(&set);
        let set = if self.shows(&stretched)? { stretched } else { set };
        let part = |search: &Search<'_>, steps: u64| {
            let each = set.iter().map(|(number, value)| (*number, between(search.nearest(*number), *value, steps)));
            search.proper(each)
        };
        let (mut low, mut high) = (0, STEPS);
        if self.shows(&part(self, 0))? {
            high = 0;
        }
        while high > low + 1 {
            let middle = low + (high - low) / 2;
            match self.shows(&part(self, middle))? {
                true => high = middle,
                false => low = middle,
            }
        }
        let mut set = part(self, high);
        loop {
            set = self.drop_each(set)?;
            let mut moved = false;
            let numbers: Vec<u32> = set.iter().map(|it| it.0).collect();
            for number in numbers {
                moved |= self.nearer(&mut set, number)?;
            }
            if !moved {
                return Ok(set);
            }
        }
    }

    /// Moves one value toward typical, in growing strides and then by halves, until 1 fs more would end it. Did it move?
    fn nearer(&mut self, set: &mut Set, number: u32) -> Result<bool, Cut> {
        let Some(value) = set.iter().find(|it| it.0 == number).map(|it| it.1) else { return Ok(false) };
        let nearest = self.nearest(number);
        let at = |distance: u64| match nearest <= value {
            true => Span::from_fs(nearest.fs() + distance),
            false => Span::from_fs(nearest.fs() - distance),
        };
        let with = |search: &Search<'_>, set: &Set, distance: u64| {
            search.proper(set.iter().map(|it| if it.0 == number { (number, at(distance)) } else { *it }))
        };
        let whole = value.fs().abs_diff(nearest.fs());
        // what is known to show it, and what is known not to
        let (mut good, mut bad, mut stride) = (whole, None, 1u64);
        while good > 0 && bad.is_none() {
            let next = good.saturating_sub(stride);
            match self.shows(&with(self, set, next))? {
                true => (good, stride) = (next, stride.saturating_mul(2)),
                false => bad = Some(next),
            }
        }
        if let Some(mut bad) = bad {
            while good - bad > 1 {
                let middle = bad + (good - bad) / 2;
                match self.shows(&with(self, set, middle))? {
                    true => good = middle,
                    false => bad = middle,
                }
            }
        }
        *set = with(self, set, good);
        Ok(good < whole)
    }
}
