//! None, one or several: how often a relation holds for each choice of some of its variables.

use rustc_hash::FxHashMap;

use super::GaveUp;
use super::diagram::{Diagram, Edge};

/// Two functions of the outer variables: for which the relation holds for at least one choice of the inner ones, and
/// for at least two.
pub(super) struct Multiplicity {
    pub some: Edge,
    pub several: Edge,
}

/// A relation over some levels, laid out to be walked again and again.
pub(super) struct Choices<'a> {
    levels: &'a [u32],
    /// its functions, each after its halves
    functions: Vec<Function>,
}

/// A function: halves by number, and the place of its level among the levels. Numbers 0 and 1 are the constants.
struct Function {
    place: usize,
    low: usize,
    high: usize,
}

impl<'a> Choices<'a> {
    /// The relation `root`; its support is among the levels, which ascend.
    pub fn of(from: &Diagram, root: Edge, levels: &'a [u32]) -> Choices<'a> {
        let mut number: FxHashMap<Edge, usize> = FxHashMap::default();
        number.insert(Edge::FALSE, 0);
        number.insert(Edge::TRUE, 1);
        let constant = || Function { place: levels.len(), low: 0, high: 0 };
        let mut functions = vec![constant(), constant()];
        if root == Edge::FALSE {
            functions.truncate(1); // the last one is the root
        }
        for edge in from.below(root) {
            let (low, high) = from.halves(edge);
            let place = levels.binary_search(&from.level(edge)).expect("the support is among the levels");
            number.insert(edge, functions.len());
            functions.push(Function { place, low: number[&low], high: number[&high] });
        }
        debug_assert_eq!(number[&root], functions.len() - 1, "the root comes last");
        Choices { levels, functions }
    }

    /// Splits the levels into outer and inner, and looks how many choices of the inner ones there are. The result is
    /// made in another diagram, with the same levels.
    pub fn multiplicity(&self, outer: impl Fn(u32) -> bool, into: &mut Diagram) -> Result<Multiplicity, GaveUp> {
        // number of inner variables from each place on: one that is skipped is free, and doubles the choices
        let mut inner = vec![0u32; self.levels.len() + 1];
        for (place, level) in self.levels.iter().enumerate().rev() {
            inner[place] = inner[place + 1] + u32::from(!outer(*level));
        }
        let mut found: Vec<(Edge, Edge)> = Vec::with_capacity(self.functions.len());
        let seen_from = |found: &[(Edge, Edge)], function: usize, above: usize| {
            let (some, several) = found[function];
            (some, if inner[above] > inner[self.functions[function].place] { some } else { several })
        };
        for (number, function) in self.functions.iter().enumerate() {
            if number < 2 {
                found.push((Edge::constant(number == 1), Edge::FALSE));
                continue;
            }
            let next = function.place + 1;
            let (some_low, several_low) = seen_from(&found, function.low, next);
            let (some_high, several_high) = seen_from(&found, function.high, next);
            let level = self.levels[function.place];
            found.push(if outer(level) {
                (into.node(level, some_low, some_high)?, into.node(level, several_low, several_high)?)
            } else {
                let both = into.and(some_low, some_high)?;
                let several = into.or(several_low, several_high)?;
                (into.or(some_low, some_high)?, into.or(several, both)?)
            });
        }
        let (some, several) = seen_from(&found, self.functions.len() - 1, 0);
        Ok(Multiplicity { some, several })
    }
}
