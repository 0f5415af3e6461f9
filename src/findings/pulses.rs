//! The pulses of one net in one window, in a fixed number of words.
//!
//! With a bound, pulses shorter than it are struck out narrowest first, of equally narrow ones the earlier; striking a
//! pulse joins it and its two neighbours into one. A pulse that is narrower than both neighbours goes before them
//! whatever happens elsewhere, so this can be done on a stack while the pulses come in.

use crate::time::{Span, Time};

/// A pulse: from one transition to the next.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Pulse {
    /// The transition that begins it.
    pub start: Time,
    /// Its width.
    pub width: Span,
}

/// Words kept for pulses that may still be struck out. Only a row of ever shorter pulses can fill them; the oldest is
/// then taken as left standing, which is never optimistic.
const KEPT: usize = 64;

const ENDLESS: Span = Span::from_fs(u64::MAX);

/// The pulses seen since the window began. Up to the first pulse of a window only `transitions`, `first` and `last` are its
/// own: most windows have none, and then nothing else is touched.
#[derive(Clone, Debug)]
pub struct Pulses {
    bound: Span,
    transitions: u64,
    first: Time,
    last: Time,
    stack: Vec<Pulse>,
    left: Left,
    widest_struck: Option<Span>,
}

/// What is left after striking out.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Left {
    /// Number of pulses.
    pub pulses: u64,
    /// The narrowest of them; of equally narrow ones the earliest.
    pub narrowest: Option<Pulse>,
    /// The width of the widest.
    pub widest: Option<Span>,
}

impl Left {
    fn add(&mut self, pulse: Pulse) {
        self.pulses += 1;
        if self.narrowest.is_none_or(|narrowest| pulse.width < narrowest.width) {
            self.narrowest = Some(pulse);
        }
        self.widest = self.widest.max(Some(pulse.width));
    }
}

impl Pulses {
    /// Pulses shorter than `bound` are struck out; 0 strikes none.
    pub fn new(bound: Span) -> Pulses {
        let stack = if bound == Span::ZERO { Vec::new() } else { Vec::with_capacity(KEPT + 4) };
        Pulses {
            bound,
            transitions: 0,
            first: Time::ZERO,
            last: Time::ZERO,
            stack,
            left: Left::default(),
            widest_struck: None,
        }
    }

    /// Pulses of any width are struck out.
    pub fn all() -> Pulses {
        Pulses::new(Span::from_fs(u64::MAX - 1))
    }

    /// A window begins.
    #[inline]
    pub fn clear(&mut self) {
        self.transitions = 0;
    }

    /// No pulse: at most one transition.
    #[inline]
    pub fn is_empty(&self) -> bool {
        self.transitions <= 1
    }

    /// The net changes.
    #[inline]
    pub fn change(&mut self, at: Time) {
        match self.transitions {
            0 => self.first = at,
            _ => self.pulse(at),
        }
        self.transitions += 1;
        self.last = at;
    }

    /// A pulse ends.
    fn pulse(&mut self, at: Time) {
        if self.transitions == 1 {
            self.left = Left::default();
            self.widest_struck = None;
            self.stack.clear();
        }
        let pulse = Pulse { start: self.last, width: at.since(self.last) };
        if self.bound == Span::ZERO {
            self.left.add(pulse);
        } else {
            self.push(pulse);
        }
    }

    /// From the first transition to the last, if there were any.
    pub fn whole(&self) -> Option<Span> {
        (self.transitions > 0).then(|| self.last.since(self.first))
    }

    /// The widest pulse struck out.
    pub fn widest_struck(&self) -> Option<Span> {
        self.widest_struck.filter(|_| !self.is_empty())
    }

    /// The window ends: what is left.
    pub fn finish(&mut self) -> Left {
        if self.is_empty() {
            return Left::default();
        }
        if self.bound > Span::ZERO && !self.stack.is_empty() {
            self.push(Pulse { start: self.last, width: ENDLESS });
            for pulse in self.stack.drain(..).filter(|pulse| pulse.width != ENDLESS) {
                self.left.add(pulse);
            }
        }
        self.left
    }

    fn push(&mut self, pulse: Pulse) {
        if self.stack.is_empty() {
            // the level before the first transition
            self.stack.push(Pulse { start: Time::ZERO, width: ENDLESS });
        }
        self.stack.push(pulse);
        while let [.., before, middle, after] = self.stack[..] {
            let goes = middle.width < self.bound && middle.width < before.width && middle.width <= after.width;
            if !goes {
                break;
            }
            self.widest_struck = self.widest_struck.max(Some(middle.width));
            let endless = before.width == ENDLESS || after.width == ENDLESS;
            let width = if endless { ENDLESS } else { before.width + middle.width + after.width };
            self.stack.truncate(self.stack.len() - 3);
            self.stack.push(Pulse { start: before.start, width });
        }
        if self.stack.len() > KEPT {
            let oldest = self.stack.remove(1);
            self.left.add(oldest);
        }
    }
}

#[cfg(test)]
mod tests {
    use proptest::prelude::*;

    use super::*;

    /// The rule as written: strike the narrowest pulse shorter than the bound, the earlier at equal width, until none is.
    fn by_the_book(times: &[u64], bound: u64) -> Vec<u64> {
        let mut times = times.to_vec();
        loop {
            let narrowest = (0..times.len().saturating_sub(1)).min_by_key(|i| (times[i + 1] - times[*i], *i));
            match narrowest {
                Some(i) if times[i + 1] - times[i] < bound => drop(times.drain(i..i + 2)),
                _ => return times,
            }
        }
    }

    proptest! {
        #![proptest_config(ProptestConfig { cases: 2000, failure_persistence: None, rng_seed: proptest::test_runner::RngSeed::Fixed(2), ..ProptestConfig::default() })]
        #[test]
        fn striking_on_a_stack_is_striking_by_the_book(gaps in proptest::collection::vec(1u64..8, 0..30), bound in 0u64..9) {
            let times: Vec<u64> = gaps.iter().scan(0, |at, gap| { *at += gap; Some(*at) }).collect();
            let mut pulses = Pulses::new(Span::from_fs(bound));
            pulses.clear();
            for at in &times {
                pulses.change(Time::from_fs(*at));
            }
            let left = pulses.finish();
            let book = by_the_book(&times, bound);
            prop_assert_eq!(left.pulses, book.len().saturating_sub(1) as u64);
            let narrowest = book.windows(2).map(|w| w[1] - w[0]).min();
            prop_assert_eq!(left.narrowest.map(|p| p.width.fs()), narrowest);
        }
    }
}
