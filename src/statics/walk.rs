//! What is read off a finished diagram: support, values, counts, possible completions, disjoint cubes, copies.

use num_bigint::BigUint;
use rustc_hash::{FxHashMap, FxHashSet};

use super::GaveUp;
use super::diagram::{BOTTOM, Diagram, Edge};

impl Diagram {
    /// All functions met on the way down from `root`, constants left out, each after those below it.
    pub fn below(&self, root: Edge) -> Vec<Edge> {
        let mut seen = FxHashSet::default();
        let mut open = vec![root];
        while let Some(edge) = open.pop() {
            if !edge.is_constant() && seen.insert(edge) {
                let (low, high) = self.halves(edge);
                open.extend([high, low]);
            }
        }
        let mut all: Vec<Edge> = seen.into_iter().collect();
        all.sort_unstable();
        all
    }

    /// The levels that a function depends on, topmost first.
    pub fn support(&self, root: Edge) -> Vec<u32> {
        self.extent(root).0
    }

    /// The levels that a function depends on, topmost first, and its number of nodes, constants left out.
    pub fn extent(&self, root: Edge) -> (Vec<u32>, usize) {
        let mut seen = FxHashSet::default();
        let mut open = vec![root];
        let mut levels = Vec::new();
        while let Some(edge) = open.pop() {
            if !edge.is_constant() && seen.insert(edge.node()) {
                levels.push(self.level(edge));
                let (low, high) = self.halves(edge);
                open.extend([high, low]);
            }
        }
        levels.sort_unstable();
        levels.dedup();
        (levels, seen.len())
    }

    /// The value of a function.
    pub fn value(&self, root: Edge, value: impl Fn(u32) -> bool) -> bool {
        let mut edge = root;
        while !edge.is_constant() {
            let (low, high) = self.halves(edge);
            edge = if value(self.level(edge)) { high } else { low };
        }
        edge == Edge::TRUE
    }

    /// Can the function be 1 when the variables that `fixed` (by level) gives are as it says?
    pub fn possible(&self, root: Edge, fixed: &[Option<bool>]) -> bool {
        let mut seen = FxHashSet::default();
        let mut open = vec![root];
        while let Some(edge) = open.pop() {
            if edge == Edge::TRUE {
                return true;
            }
            if edge == Edge::FALSE || !seen.insert(edge) {
                continue;
            }
            let (low, high) = self.halves(edge);
            match fixed[self.level(edge) as usize] {
                Some(bit) => open.push(if bit { high } else { low }),
                None => open.extend([high, low]),
            }
        }
        false
    }

    /// In how many ways can the variables of `levels` (ascending; the support is among them) make the function 1, those
    /// that `fixed` gives being as it says?
    pub fn count(&self, root: Edge, levels: &[u32], fixed: &[Option<bool>]) -> BigUint {
        // number of variables left free from each place on
        let mut free = vec![0u64; levels.len() + 1];
        for (place, level) in levels.iter().enumerate().rev() {
            free[place] = free[place + 1] + u64::from(fixed[*level as usize].is_none());
        }
        let place = |edge: Edge| match self.level(edge) {
            BOTTOM => levels.len(),
            level => levels.binary_search(&level).expect("the support is among the levels"),
        };
        let mut counts: FxHashMap<Edge, BigUint> = FxHashMap::default();
        counts.insert(Edge::FALSE, BigUint::ZERO);
        counts.insert(Edge::TRUE, BigUint::from(1u8));
        // what a half adds to a function that sits `above` it
        let part = |counts: &FxHashMap<Edge, BigUint>, half: Edge, above: usize| {
            &counts[&half] << (free[above] - free[place(half)])
        };
        for edge in self.below(root) {
            let (low, high) = self.halves(edge);
            let next = place(edge) + 1;
            let count = match fixed[self.level(edge) as usize] {
                Some(bit) => part(&counts, if bit { high } else { low }, next),
                None => part(&counts, low, next) + part(&counts, high, next),
            };
            counts.insert(edge, count);
        }
        part(&counts, root, 0)
    }

    /// Disjoint cubes that together are the function: each lists levels with their values.
    pub fn cubes(&self, root: Edge) -> Cubes<'_> {
        Cubes { diagram: self, open: vec![(root, 0, None)], path: Vec::new() }
    }

    /// The same functions in another diagram, with new levels that keep their order.
    pub fn copy(&self, roots: &[Edge], into: &mut Diagram, level: impl Fn(u32) -> u32) -> Result<Vec<Edge>, GaveUp> {
        let mut copies: FxHashMap<Edge, Edge> = FxHashMap::default();
        copies.insert(Edge::FALSE, Edge::FALSE);
        copies.insert(Edge::TRUE, Edge::TRUE);
        let mut of = Vec::with_capacity(roots.len());
        for root in roots {
            for edge in self.below(*root) {
                if !copies.contains_key(&edge) {
                    let (low, high) = self.halves(edge);
                    let copy = into.node(level(self.level(edge)), copies[&low], copies[&high])?;
                    copies.insert(edge, copy);
                }
            }
            of.push(copies[root]);
        }
        Ok(of)
    }
}

/// A level and the value of its variable.
type Step = (u32, bool);

/// See [`Diagram::cubes`].
pub(super) struct Cubes<'a> {
    diagram: &'a Diagram,
    /// functions to look at, with the length of the path above them and the step from there
    open: Vec<(Edge, usize, Option<Step>)>,
    path: Vec<Step>,
}

impl Iterator for Cubes<'_> {
    type Item = Vec<Step>;

    fn next(&mut self) -> Option<Self::Item> {
        while let Some((edge, depth, step)) = self.open.pop() {
            self.path.truncate(depth);
            self.path.extend(step);
            if edge == Edge::TRUE {
                return Some(self.path.clone());
            }
            if edge != Edge::FALSE {
                let (low, high) = self.diagram.halves(edge);
                let (level, depth) = (self.diagram.level(edge), self.path.len());
                self.open.push((high, depth, Some((level, true))));
                self.open.push((low, depth, Some((level, false))));
            }
        }
        None
    }
}

#[cfg(test)]
pub(super) mod tests {
    use super::*;
    use crate::control::Control;

    /// A function of the variables 0 to 3: bit r is its value in row r, and variable v is bit v of r.
    pub type Truth = u16;

    pub fn build(diagram: &mut Diagram, table: Truth) -> Edge {
        let mut layer: Vec<Edge> = (0..16).map(|row| Edge::constant(table >> reversed(row) & 1 == 1)).collect();
        for level in (0..4).rev() {
            layer = layer.chunks(2).map(|pair| diagram.node(level, pair[0], pair[1]).unwrap()).collect();
        }
        layer[0]
    }

    /// Variable 0 as the highest digit.
    fn reversed(row: u32) -> u32 {
        (row as u8).reverse_bits() as u32 >> 4
    }

    pub fn truth(diagram: &Diagram, edge: Edge) -> Truth {
        (0..16).filter(|row| diagram.value(edge, |v| row >> v & 1 == 1)).fold(0, |table, row| table | 1 << row)
    }

    #[test]
    fn counts_cubes_and_completions_agree_with_truth_tables() {
        let mut diagram = Diagram::new(&Control::default());
        for table in (0..=Truth::MAX).step_by(37) {
            let edge = build(&mut diagram, table);
            for mask in 0..81u32 {
                // each variable 0, 1 or open
                let fixed: Vec<Option<bool>> = (0..4)
                    .map(|v| match mask / 3u32.pow(v) % 3 {
                        0 => Some(false),
                        1 => Some(true),
                        _ => None,
                    })
                    .collect();
                let agrees = |row: u32| (0..4).all(|v| fixed[v].is_none_or(|bit| (row >> v & 1 == 1) == bit));
                let want = (0..16).filter(|row| agrees(*row) && table >> row & 1 == 1).count();
                assert_eq!(diagram.count(edge, &[0, 1, 2, 3], &fixed), want.into(), "{table:04x} {fixed:?}");
                assert_eq!(diagram.possible(edge, &fixed), want > 0, "{table:04x} {fixed:?}");
            }
            let mut met = 0u16;
            for cube in diagram.cubes(edge) {
                let rows = (0..16).filter(|row| cube.iter().all(|(v, bit)| (row >> v & 1 == 1) == *bit));
                for row in rows {
                    assert_eq!(met >> row & 1, 0, "{table:04x}: row {row} twice");
                    met |= 1 << row;
                }
            }
            assert_eq!(met, table, "the cubes together");
        }
    }

    #[test]
    fn a_copy_is_the_same_function_of_renamed_variables() {
        let control = Control::default();
        let (mut from, mut into) = (Diagram::new(&control), Diagram::new(&control));
        let tables = [0x8001u16, 0x6996, 0x0ff0, 0xfffe, 0, 0xffff];
        let roots: Vec<Edge> = tables.iter().map(|table| build(&mut from, *table)).collect();
        let copies = from.copy(&roots, &mut into, |level| level * 3 + 5).unwrap();
        for (table, copy) in tables.iter().zip(&copies) {
            for row in 0..16u32 {
                let value = into.value(*copy, |level| row >> ((level - 5) / 3) & 1 == 1);
                assert_eq!(value, table >> row & 1 == 1, "{table:04x} row {row:04b}");
            }
        }
    }

    #[test]
    fn counts_go_beyond_machine_words() {
        let mut diagram = Diagram::new(&Control::default());
        let levels: Vec<u32> = (0..300).collect();
        let ones = diagram.cube(&levels).unwrap();
        let all = num_bigint::BigUint::from(1u8) << 300;
        assert_eq!(diagram.count(!ones, &levels, &vec![None; 300]), all - 1u8);
    }
}
