//! Where listed steps are, as far as that is known before a run.

use crate::scenario::{Place, Stimulus};

/// For each step its distance from the start of its chain: 0 is the start of the run; a step that is drawn, or waits for
/// the circuit, begins a chain of its own. Two steps of one chain are always the same time apart.
#[derive(Debug)]
pub(super) struct Places {
    exact: Vec<(usize, i128)>,
    typical: Vec<Option<i128>>,
}

impl Places {
    pub fn of(stimulus: &Stimulus) -> Places {
        let mut places = Places { exact: Vec::new(), typical: Vec::new() };
        for (s, step) in stimulus.steps.iter().enumerate() {
            let (before, typical) = (places.before(s), places.typical_before(s));
            let own_chain = (s + 1, 0);
            let (exact, typical) = match &step.place {
                Place::At(range) if range.is_exact() => ((0, fs(range.typ)), Some(fs(range.typ))),
                Place::At(range) => (own_chain, Some(fs(range.typ))),
                Place::After(range) if range.is_exact() => {
                    ((before.0, before.1 + fs(range.typ)), typical.map(|at| at + fs(range.typ)))
                }
                Place::After(range) => (own_chain, typical.map(|at| at + fs(range.typ))),
                Place::Rest(_) | Place::When { .. } => (own_chain, None),
            };
            places.exact.push(exact);
            places.typical.push(typical);
        }
        places
    }

    /// Chain and place in it of a step.
    pub fn at(&self, step: usize) -> (usize, i128) {
        self.exact[step]
    }

    /// The same of the step before; the start of the run before the first.
    pub fn before(&self, step: usize) -> (usize, i128) {
        step.checked_sub(1).map_or((0, 0), |before| self.exact[before])
    }

    /// When the step before comes in a typical run, if it waits for nothing; 0 before the first.
    pub fn typical_before(&self, step: usize) -> Option<i128> {
        step.checked_sub(1).map_or(Some(0), |before| self.typical[before])
    }

    /// From the step before, or the start, to this step, in fs; `None` if that is drawn or not known.
    pub fn distance(&self, step: usize) -> Option<i128> {
        let (before, here) = (self.before(step), self.exact[step]);
        (before.0 == here.0).then_some(here.1 - before.1)
    }
}

/// A time as a signed number.
pub(super) fn fs(span: crate::time::Span) -> i128 {
    i128::from(span.fs())
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::circuit::Function;
    use crate::scenario::{Builder, NewStep};

    #[test]
    fn chains_end_where_something_is_drawn_or_waits() {
        let mut told = Builder::new("a chain");
        told.input("a", false);
        told.gate("q", Function::Buf, ["a"]).delay("1");
        for (n, step) in [
            NewStep::at("10"),
            NewStep::after("5"),
            NewStep::after(["4", "8"]),
            NewStep::after("2"),
            NewStep::at("100"),
            NewStep::rest("3"),
            NewStep::after("7"),
        ]
        .into_iter()
        .enumerate()
        {
            told.step(step.set("a", n % 2 == 0));
        }
        let places = Places::of(&told.finish().unwrap().stimulus);
        let ns = 1_000_000;
        let distances: Vec<Option<i128>> = (0..7).map(|s| places.distance(s)).collect();
        assert_eq!(distances, [Some(10 * ns), Some(5 * ns), None, Some(2 * ns), None, None, Some(7 * ns)]);
        assert_eq!((places.at(3), places.at(4)), ((3, 2 * ns), (0, 100 * ns)));
        assert_eq!((places.typical_before(4), places.typical_before(6)), (Some(23 * ns), None));
    }
}
