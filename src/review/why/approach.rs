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
    /// First all values by one share of their way from typical to the ends of their ranges (or to the failing case), so that
    /// none stays far out for another's sake; then each alone, to 1 fs, and all of them on in the same direction as long as that helps. In the
    /// end no value can be put back, and none can be moved 1 fs nearer (in its range) with the others as they are.
    pub(super) fn approach(&mut self, set: Set) -> Result<Set, Cut> {
        // shares of ways to the ends of the ranges are fair; those of ways to where a draw happened to be are not
        let stretched = self.stretched(&set);
        let set = if self.shows(&stretched)? { stretched } else { set };
        let (mut low, mut high) = (0, STEPS);
        if self.shows(&self.part(&set, 0))? {
            high = 0;
        }
        while high > low + 1 {
            let middle = low + (high - low) / 2;
            match self.shows(&self.part(&set, middle))? {
                true => high = middle,
                false => low = middle,
            }
        }
        let mut set = self.part(&set, high);
        loop {
            set = self.drop_each(set)?;
            let (before, mut moved) = (set.clone(), false);
            let numbers: Vec<u32> = set.iter().map(|it| it.0).collect();
            for number in numbers {
                moved |= self.nearer(&mut set, number)?;
            }
            // values that have to stay close to each other would creep one by one
            if !moved {
                return Ok(set);
            }
            self.onward(&before, &mut set)?;
        }
    }

    /// The set with all values this many steps of their way out.
    fn part(&self, set: &Set, steps: u64) -> Set {
        let each = set.iter().map(|(number, value)| (*number, between(self.nearest(*number), *value, steps)));
        self.proper(each)
    }

    /// Moves all values on as they moved in the last round, in growing strides (the pattern move of R. Hooke, T. A. Jeeves,
    /// "Direct search solution of numerical and statistical problems", J. ACM 8 (1961) 212-229; from memory).
    fn onward(&mut self, before: &Set, set: &mut Set) -> Result<(), Cut> {
        let moved = |number: u32, to: Span| {
            let from = before.iter().find(|it| it.0 == number).map_or(to, |it| it.1);
            from.fs().abs_diff(to.fs())
        };
        let mut stride = 1u64;
        loop {
            let each = set.iter().map(|(number, value)| {
                let nearest = self.nearest(*number);
                let step = moved(*number, *value).saturating_mul(stride).min(value.fs().abs_diff(nearest.fs()));
                let fs = if nearest <= *value { value.fs() - step } else { value.fs() + step };
                (*number, Span::from_fs(fs))
            });
            let next = self.proper(each.collect::<Vec<_>>());
            if next == *set || !self.shows(&next)? {
                return Ok(());
            }
            (*set, stride) = (next, stride.saturating_mul(2));
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
