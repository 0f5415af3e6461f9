//! A case as the random numbers that draw it.
//!
//! Whoever looks for special cases moves these numbers and not the delays themselves: whatever the numbers are, the case
//! made of them is one that a draw could give, with any spread, in any group.

use super::quantity::{Quantities, Quantity};
use super::{Instance, Sampler, Which};
use crate::delay::{DelayRange, Marginal, Together};
use crate::scenario::{Begin, Scenario};
use crate::time::Span;

/// The random numbers of one case: each any `u64`.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Numbers {
    /// One a quantity, in the order of [`Quantities::iter`].
    pub own: Vec<u64>,
    /// One a group: what its delays have in common.
    pub common: Vec<u64>,
    /// The sample whose bounces and start bits the case has.
    pub rest_of: u64,
}

impl Numbers {
    /// How many numbers there are.
    pub fn count(&self) -> usize {
        self.own.len() + self.common.len()
    }

    /// Number `i`: those of quantities first, then those of groups.
    pub fn get(&self, i: usize) -> u64 {
        self.own.get(i).copied().unwrap_or_else(|| self.common[i - self.own.len()])
    }

    /// Sets number `i`.
    pub fn set(&mut self, i: usize, number: u64) {
        let own = self.own.len();
        match self.own.get_mut(i) {
            Some(place) => *place = number,
            None => self.common[i - own] = number,
        }
    }
}

/// Makes cases of one scenario from numbers.
#[derive(Clone, Debug)]
pub struct Cases {
    draw: Marginal,
    quantities: Vec<Quantity>,
    /// Of these the first so many belong to the board.
    of_board: usize,
    sampler: Sampler,
    typical: Instance,
    /// The sample whose bounces and start bits are in `typical`.
    rest_of: Option<u64>,
}

impl Cases {
    /// For the draws of a scenario.
    pub fn new(scenario: &Scenario) -> Cases {
        let Quantities { board, sample, .. } = Quantities::of(scenario);
        let of_board = board.len();
        Cases {
            draw: scenario.plan.draw,
            quantities: board.into_iter().chain(sample).collect(),
            of_board,
            sampler: Sampler::new(scenario),
            typical: Instance::of(scenario, &Which::Typ),
            rest_of: None,
        }
    }

    /// What may vary, in the order of the numbers.
    pub fn quantities(&self) -> &[Quantity] {
        &self.quantities
    }

    /// The group of a quantity, as an index of [`Numbers::common`].
    pub fn group_of(&self, quantity: usize) -> Option<usize> {
        // only what a board draws is in a group
        self.sampler.groups().group_of(quantity).filter(|_| quantity < self.of_board)
    }

    /// Does anything differ between samples that has no number: start bits, bounces?
    pub fn has_rest(scenario: &Scenario) -> bool {
        scenario.begin == Begin::Random || scenario.stimulus.steps.iter().any(|step| step.bounce.is_some())
    }

    /// The numbers of a sample: [`Cases::make`] gives [`Which::Sample`] back, but for firings that draw anew.
    pub fn of_sample(&mut self, sample: u64) -> Numbers {
        let (drawn, common) = self.sampler.numbers(sample);
        let mut drawn = drawn.into_iter();
        // what no sample draws lies in the middle
        let number = |quantity: &Quantity| if self.sampler.draws(quantity) { drawn.next() } else { None };
        let own = self.quantities.iter().map(number).map(|number| number.unwrap_or(1 << 63)).collect();
        Numbers { own, common, rest_of: sample }
    }

    /// All numbers alike: with 0 every quantity is at its least, with `u64::MAX` at its greatest that a draw can give.
    /// Bounces and start bits are those of sample 0.
    pub fn all(&self, number: u64) -> Numbers {
        let groups = self.sampler.groups().how().len();
        Numbers { own: vec![number; self.quantities.len()], common: vec![number; groups], rest_of: 0 }
    }

    /// For every quantity the least number that makes it typical or more, groups being typical; delays of a group that tracks
    /// fully, which have no say of their own, are at their medians. Bounces and start bits are those of sample 0.
    pub fn typical(&self) -> Numbers {
        let mut numbers = self.all(1 << 63);
        for (group, how) in self.sampler.groups().how().iter().enumerate() {
            if let Together::Scale { .. } = how {
                // a stand-in of typical 1 s, far below where products are cut
                let wide = Span::from_fs(1 << 50);
                let range = DelayRange { min: Span::from_fs(1), typ: wide, max: Span::from_fs(1 << 61) };
                numbers.common[group] = first(|u| how.draw(self.draw, range, 1 << 63, u) >= wide);
            }
        }
        for (i, quantity) in self.quantities.iter().enumerate() {
            numbers.own[i] = first(|u| self.span(i, u, &numbers.common) >= quantity.range.typ);
        }
        numbers
    }

    /// The case of these numbers. Where every firing draws its delay anew, those of one gate and edge are alike here.
    pub fn make(&mut self, numbers: &Numbers) -> &Instance {
        if self.rest_of != Some(numbers.rest_of) {
            self.sampler.fill_rest(numbers.rest_of, &mut self.typical);
            // firings that are alike are a case that firings drawn anew could give, too
            self.typical.firings = None;
            self.rest_of = Some(numbers.rest_of);
        }
        for i in 0..self.quantities.len() {
            let span = self.span(i, numbers.own[i], &numbers.common);
            self.typical.set(&self.quantities[i], span);
        }
        &self.typical
    }

    /// The value of quantity `i` at its own number and those of the groups.
    pub fn span(&self, i: usize, own: u64, common: &[u64]) -> Span {
        let range = self.quantities[i].range;
        match i < self.of_board {
            true => self.sampler.groups().span_with(self.draw, i, range, own, common),
            false => self.draw.quantile(range, own),
        }
    }
}

/// The least number for which something holds that holds for all greater ones; the greatest number if it holds for none.
fn first(holds: impl Fn(u64) -> bool) -> u64 {
    let (mut below, mut at) = (None, u64::MAX);
    loop {
        let from = below.map_or(0, |below: u64| below + 1);
        if from >= at {
            return at;
        }
        let middle = from + (at - from) / 2;
        if holds(middle) {
            at = middle;
        } else {
            below = Some(middle);
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::reader;

    const LOCK: &str = r#"
begin = "random"
[inputs]
call = 0
tick = 0
[gates]
hold = { nand = ["call", "back"], rise = [7, 10, 15], fall = [6, 8, 13], wires = { call = [1, 3] } }
back = { nand = ["hold", "tick"], delay = [2, 9] }
lamp = { not = ["hold"], delay = [3, 4, 9] }
horn = { not = ["lamp"], delay = [3, 4, 9] }
exact = { not = ["lamp"], delay = 5 }
GROUP
[[steps]]
at = [10, 30]
set = { call = 1 }
skew = [0, 5]
bounce = { lasting = [1, 20], pulses = [0, 6] }
[[clocks]]
net = "tick"
first = [0, 10]
period = [40, 50]
high = [15, 20]
jitter = 3.5
count = 3
[sweep]
samples = 64
tries = 3
draw = "DRAW"
"#;

    /// A file of the table above with a group and a draw.
    fn scenarios() -> Vec<Scenario> {
        let groups = [
            "",
            "tracking = 0.7",
            "tracking = 1",
            "scale = [0.5, 1.5]\nmismatch = 0.1",
            "scale = [1.2, 1.5]\nmismatch = 0",
        ];
        let mut all = Vec::new();
        for group in groups {
            for draw in Marginal::ALL {
                let group = match group {
                    "" => String::new(),
                    how => format!("[[groups]]\ngates = [\"hold\", \"lamp\", \"horn\"]\n{how}"),
                };
                let text = LOCK.replace("GROUP", &group).replace("DRAW", draw.name());
                all.push(reader::read(&text, "lock.toml").unwrap_or_else(|faults| panic!("{faults}")).scenario);
            }
        }
        all
    }

    #[test]
    fn the_numbers_of_a_sample_make_the_sample() {
        for scenario in scenarios() {
            let mut cases = Cases::new(&scenario);
            for sample in [0, 1, 2, 3, 17, 17, 4, 63] {
                let numbers = cases.of_sample(sample);
                let expected = Instance::of(&scenario, &Which::Sample(sample));
                assert_eq!(*cases.make(&numbers), expected, "{:?} {sample}", scenario.plan.draw);
            }
        }
    }

    #[test]
    fn ends_and_typical_lie_where_they_should() {
        for scenario in scenarios() {
            let mut cases = Cases::new(&scenario);
            let grouped = !scenario.delays.groups.is_empty();
            let scaled = scenario.delays.groups.iter().any(|group| matches!(group.how, Together::Scale { .. }));
            let quantities = cases.quantities().to_vec();
            let [least, typical, greatest] = [cases.all(0), cases.typical(), cases.all(u64::MAX)].map(|numbers| {
                let instance = cases.make(&numbers).clone();
                quantities.iter().map(|quantity| instance.get(quantity)).collect::<Vec<Span>>()
            });
            for (i, quantity) in quantities.iter().enumerate() {
                let range = quantity.range;
                let free = cases.group_of(i).is_none();
                let words = format!("{quantity:?} {:?} {:?}", scenario.plan.draw, scenario.delays.groups);
                if free || !scaled {
                    // of a normal score the last steps of 2^-53 are wider than a femtosecond
                    let near = |a: Span, b: Span| a.fs().abs_diff(b.fs()) <= 2;
                    assert!(near(least[i], range.min) && near(greatest[i], range.max), "{words}: {least:?}");
                    let corner = scenario.plan.draw == Marginal::Corners;
                    let middle = if corner { range.max } else { range.typ };
                    // what tracks fully has no number of its own
                    let own = free
                        || !matches!(scenario.delays.groups[0].how, Together::Tracking(it) if it.0 >= 1_000_000_000);
                    assert!(!own || near(typical[i], middle), "{words}: {:?}", typical[i]);
                } else {
                    assert!(grouped && (range.min..=range.max).contains(&typical[i]), "{words}");
                    assert!(least[i] <= typical[i] && typical[i] <= greatest[i], "{words}");
                }
            }
        }
    }

    #[test]
    fn the_first_number_is_found_at_both_ends() {
        assert_eq!(first(|_| true), 0);
        assert_eq!(first(|_| false), u64::MAX);
        for at in [1, 2, 1 << 40, u64::MAX - 1, u64::MAX] {
            assert_eq!(first(|u| u >= at), at);
        }
    }
}
