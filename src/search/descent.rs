//! The moves: coordinates to their ends, coordinates by steps that shrink, patterns, pairs.
//!
//! Source: R. Hooke, T. A. Jeeves, "'Direct search' solution of numerical and statistical problems", J. ACM 8 (1961)
//! 212-229 (from memory). Coordinates are the random numbers of a case over the whole range of a `u64`; to it are added moves
//! to both ends, since margins are mostly least at corners, and moves of two coordinates at once, since a race is one path
//! against another.

use rand::RngExt;
use rand::seq::SliceRandom;

use super::bench::{BLIND, Guide, Score, Shown};
use super::job::Job;
use crate::instance::{Instance, Numbers};

/// Rounds over all ends, at most.
const ENDS: usize = 3;
/// The first step: a quarter of the range.
const FIRST: u64 = 1 << 62;
/// Below this step, about a ten-thousandth of the range, the search of a start ends.
const LAST: u64 = 1 << 50;
/// Pairs tried at one step, at most.
const PAIRS: usize = 16;

/// The nearest case so far, of one start.
struct Base {
    numbers: Numbers,
    instance: Instance,
    score: Score,
}

/// One number moved by a step up or down, stopped at the ends.
fn moved(number: u64, step: u64, up: bool) -> u64 {
    if up { number.saturating_add(step) } else { number.saturating_sub(step) }
}

impl Job<'_> {
    /// Descends from a start, which showed this, as long as a guide says nearer and runs are left.
    pub(super) fn descend(&mut self, numbers: Numbers, shown: &Shown, guide: Guide) {
        let instance = self.bench.case(&numbers);
        // the guide may follow something that was told after that run
        let score = match guide {
            Guide::Meeting(meeting) => Score::from(meeting.away),
            _ => self.bench.score(shown, &guide),
        };
        if score == BLIND || self.done {
            return;
        }
        let mut base = Base { numbers, instance, score };
        let mut order = self.bench.movable.clone();
        order.shuffle(&mut self.bench.rng);
        for _ in 0..ENDS {
            let before = base.score;
            for i in order.iter().copied() {
                for end in [0, u64::MAX] {
                    self.step(&mut base, &guide, &[(i, end)]);
                }
            }
            if base.score == before || self.is_over() {
                break;
            }
        }
        let mut step = FIRST;
        while step >= LAST && !self.is_over() {
            let from = base.numbers.clone();
            if self.explore(&mut base, &guide, &order, step) {
                self.patterns(&mut base, &guide, &order, step, from);
            } else if !self.pairs(&mut base, &guide, &order, step) && !self.chance(&mut base, &guide) {
                step /= 4;
            }
        }
    }

    /// Each number a step up or down.
    fn explore(&mut self, base: &mut Base, guide: &Guide, order: &[usize], step: u64) -> bool {
        let mut any = false;
        for i in order.iter().copied() {
            let number = base.numbers.get(i);
            for up in [true, false] {
                if self.step(base, guide, &[(i, moved(number, step, up))]) {
                    any = true;
                    break;
                }
            }
        }
        any
    }

    /// As far again in the direction that helped, with a step of each number around it, as long as that helps.
    fn patterns(&mut self, base: &mut Base, guide: &Guide, order: &[usize], step: u64, mut from: Numbers) {
        while !self.is_over() {
            let ahead = |i: usize| {
                let (old, new) = (from.get(i), base.numbers.get(i));
                moved(new, new.abs_diff(old), new > old)
            };
            let moves: Vec<(usize, u64)> = order.iter().map(|i| (*i, ahead(*i))).collect();
            from = base.numbers.clone();
            let mut numbers = base.numbers.clone();
            moves.iter().for_each(|(i, number)| numbers.set(*i, *number));
            let instance = self.bench.case(&numbers);
            if instance == base.instance {
                return;
            }
            let Some(score) = self.tried(&numbers, guide) else { return };
            let mut trial = Base { numbers, instance, score };
            self.explore(&mut trial, guide, order, step);
            if trial.score >= base.score {
                return;
            }
            *base = trial;
        }
    }

    /// Two numbers at once, drawn by lot.
    fn pairs(&mut self, base: &mut Base, guide: &Guide, order: &[usize], step: u64) -> bool {
        if order.len() < 2 {
            return false;
        }
        let mut any = false;
        for _ in 0..order.len().min(PAIRS) {
            let a = self.bench.rng.random_range(0..order.len());
            let b = (a + self.bench.rng.random_range(1..order.len())) % order.len();
            let (a, b) = (order[a], order[b]);
            for (up_a, up_b) in [(true, false), (false, true), (true, true), (false, false)] {
                let to = |i: usize, up: bool| (i, moved(base.numbers.get(i), step, up));
                if self.step(base, guide, &[to(a, up_a), to(b, up_b)]) {
                    any = true;
                    break;
                }
            }
        }
        any
    }

    /// Other start bits and bounces, which no number moves: by lot.
    fn chance(&mut self, base: &mut Base, guide: &Guide) -> bool {
        if !self.bench.has_rest {
            return false;
        }
        let mut numbers = base.numbers.clone();
        numbers.rest_of = self.any_sample();
        self.take_if_nearer(base, guide, numbers)
    }

    fn step(&mut self, base: &mut Base, guide: &Guide, moves: &[(usize, u64)]) -> bool {
        if moves.iter().all(|(i, number)| base.numbers.get(*i) == *number) {
            return false;
        }
        let mut numbers = base.numbers.clone();
        moves.iter().for_each(|(i, number)| numbers.set(*i, *number));
        self.take_if_nearer(base, guide, numbers)
    }

    /// Tries a case, if it is another, and stays there if it is nearer.
    fn take_if_nearer(&mut self, base: &mut Base, guide: &Guide, numbers: Numbers) -> bool {
        if self.is_over() {
            return false;
        }
        let instance = self.bench.case(&numbers);
        if instance == base.instance {
            return false;
        }
        match self.tried(&numbers, guide) {
            Some(score) if score < base.score => {
                *base = Base { numbers, instance, score };
                true
            }
            _ => false,
        }
    }
}
