//! Reduced ordered binary decision diagrams: the kernel of the exact delay-free analysis.
//!
//! One table of nodes is shared by all functions, so equal functions are the same edge (Bryant 1986); an edge may invert
//! its function, so a complement costs nothing (Brace, Rudell, Bryant 1990). Every operation works off a list of tasks
//! instead of calling itself: the depth of a diagram is its number of variables, and circuits have thousands.
//!
//! Nodes are never freed. A budget bounds their number, so an operation either gives the exact result or gives up.

use std::ops::Not;

use super::GaveUp;
use crate::control::Control;

/// Nodes a diagram may have by default: about 400 MB with table and cache.
const DEFAULT_BUDGET: usize = 1 << 24;
/// Edges keep one bit for the inversion and one for the kind of a cached operation.
const GREATEST_BUDGET: usize = 1 << 30;
/// Most slots of the cache of results.
const CACHE_LIMIT: usize = 1 << 22;
/// Steps per node of the budget: the cache forgets, so work could repeat without making nodes.
const STEPS_PER_NODE: u64 = 64;
/// The level of the constants: below every variable.
pub(super) const BOTTOM: u32 = u32::MAX;

/// A Boolean function: a node, perhaps inverted.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub(super) struct Edge(u32);

impl Edge {
    /// The constant 0.
    pub const FALSE: Edge = Edge(0);
    /// The constant 1.
    pub const TRUE: Edge = Edge(1);

    /// The constant of this value.
    pub fn constant(value: bool) -> Edge {
        Edge(u32::from(value))
    }

    /// The node, by number. A node's children have smaller numbers.
    pub fn node(self) -> usize {
        (self.0 >> 1) as usize
    }

    fn inverted(self) -> bool {
        self.0 & 1 == 1
    }

    fn invert_if(self, invert: bool) -> Edge {
        Edge(self.0 ^ u32::from(invert))
    }

    /// Is it 0 or 1?
    pub fn is_constant(self) -> bool {
        self.0 <= 1
    }
}

impl Not for Edge {
    type Output = Edge;

    fn not(self) -> Edge {
        Edge(self.0 ^ 1)
    }
}

/// "If the variable of this level is 0 then `low` else `high`". To be unique, `low` is never inverted.
#[derive(Clone, Copy)]
struct Node {
    level: u32,
    low: Edge,
    high: Edge,
}

/// The operands of a cached operation; the top bit of the first tells the operations apart.
type Key = [u32; 3];
const QUANTIFIED: u32 = 1 << 31;

#[derive(Clone, Copy)]
struct Cached {
    key: Key,
    result: Edge,
}

/// No operation has it: a constant condition is never cached.
const NOTHING: Cached = Cached { key: [0; 3], result: Edge::FALSE };

/// What is left to do, last first. Results wait on a second list.
#[derive(Clone, Copy)]
enum Task {
    /// if-then-else
    Ite(Edge, Edge, Edge),
    /// conjunction of two, then some value of the variables of the third (a conjunction of variables)
    AndExists(Edge, Edge, Edge),
    /// joins the last two results in a node
    Join { level: u32, key: Key, invert: bool },
    /// the last result is one half of a quantified variable; these operands give the other
    OtherHalf { f: Edge, g: Edge, cube: Edge, key: Key },
    /// joins the last two results by "or"
    Either { key: Key },
    /// notes the last result
    Note { key: Key },
}

/// A table of nodes with the operations on them. Variables are named by their level, 0 on top.
pub(super) struct Diagram {
    nodes: Vec<Node>,
    /// Open addressing; 0 marks an empty slot, since the constants are never looked up.
    table: Vec<u32>,
    cache: Vec<Cached>,
    budget: usize,
    steps: u64,
    control: Control,
    tasks: Vec<Task>,
    results: Vec<Edge>,
}

impl Diagram {
    /// The most nodes that a diagram under this control may have.
    pub fn budget(control: &Control) -> usize {
        if control.nodes == 0 { DEFAULT_BUDGET } else { control.nodes.min(GREATEST_BUDGET) }
    }

    /// An empty diagram with the budget and the cancel flag of `control`.
    pub fn new(control: &Control) -> Diagram {
        Diagram {
            nodes: vec![Node { level: BOTTOM, low: Edge::FALSE, high: Edge::FALSE }],
            table: vec![0; 256],
            cache: vec![NOTHING; 256],
            budget: Diagram::budget(control),
            steps: 0,
            control: control.clone(),
            tasks: Vec::new(),
            results: Vec::new(),
        }
    }

    /// The level of the topmost variable of a function, [`BOTTOM`] for constants.
    pub fn level(&self, f: Edge) -> u32 {
        self.nodes[f.node()].level
    }

    /// The two halves of a function that is no constant: its topmost variable at 0, and at 1.
    pub fn halves(&self, f: Edge) -> (Edge, Edge) {
        let node = self.nodes[f.node()];
        (node.low.invert_if(f.inverted()), node.high.invert_if(f.inverted()))
    }

    /// Number of nodes made so far, the constant included.
    pub fn len(&self) -> usize {
        self.nodes.len()
    }

    /// The function that is the variable of this level.
    pub fn variable(&mut self, level: u32) -> Result<Edge, GaveUp> {
        self.node(level, Edge::FALSE, Edge::TRUE)
    }

    /// "If the variable of this level is 0 then `low` else `high`", where both lie below the level.
    pub fn node(&mut self, level: u32, low: Edge, high: Edge) -> Result<Edge, GaveUp> {
        debug_assert!(level < self.level(low) && level < self.level(high), "children lie below");
        if low == high {
            return Ok(low);
        }
        let invert = low.inverted();
        let (low, high) = (low.invert_if(invert), high.invert_if(invert));
        let mut slot = self.slot(level, low, high);
        loop {
            match self.table[slot] {
                0 => break,
                at => {
                    let node = self.nodes[at as usize];
                    if node.level == level && node.low == low && node.high == high {
                        return Ok(Edge(at << 1).invert_if(invert));
                    }
                }
            }
            slot = (slot + 1) & (self.table.len() - 1);
        }
        if self.nodes.len() >= self.budget {
            return Err(GaveUp::Budget { nodes: self.budget });
        }
        let at = self.nodes.len() as u32;
        self.nodes.push(Node { level, low, high });
        self.table[slot] = at;
        if self.nodes.len() * 4 > self.table.len() * 3 {
            self.grow();
        }
        Ok(Edge(at << 1).invert_if(invert))
    }

    /// Conjunction.
    pub fn and(&mut self, f: Edge, g: Edge) -> Result<Edge, GaveUp> {
        self.ite(f, g, Edge::FALSE)
    }

    /// Disjunction.
    pub fn or(&mut self, f: Edge, g: Edge) -> Result<Edge, GaveUp> {
        self.ite(f, Edge::TRUE, g)
    }

    /// Exclusive or.
    pub fn xor(&mut self, f: Edge, g: Edge) -> Result<Edge, GaveUp> {
        self.ite(f, !g, g)
    }

    /// If `f` then `g` else `h`.
    pub fn ite(&mut self, f: Edge, g: Edge, h: Edge) -> Result<Edge, GaveUp> {
        self.run(Task::Ite(f, g, h))
    }

    /// The conjunction of the variables of these levels, in any order.
    pub fn cube(&mut self, levels: &[u32]) -> Result<Edge, GaveUp> {
        let mut sorted = levels.to_vec();
        sorted.sort_unstable();
        sorted.dedup();
        let mut cube = Edge::TRUE;
        for level in sorted.into_iter().rev() {
            cube = self.node(level, Edge::FALSE, cube)?;
        }
        Ok(cube)
    }

    /// Is there a value of the variables of `cube` for which both `f` and `g` hold? A function of the other variables.
    pub fn and_exists(&mut self, f: Edge, g: Edge, cube: Edge) -> Result<Edge, GaveUp> {
        self.run(Task::AndExists(f, g, cube))
    }

    fn run(&mut self, first: Task) -> Result<Edge, GaveUp> {
        let (mut tasks, mut results) = (std::mem::take(&mut self.tasks), std::mem::take(&mut self.results));
        tasks.clear();
        results.clear();
        tasks.push(first);
        let outcome = self.work_off(&mut tasks, &mut results);
        (self.tasks, self.results) = (tasks, results);
        outcome
    }

    fn work_off(&mut self, tasks: &mut Vec<Task>, results: &mut Vec<Edge>) -> Result<Edge, GaveUp> {
        const PAIR: &str = "each half left a result";
        while let Some(task) = tasks.pop() {
            self.tick()?;
            match task {
                Task::Ite(f, g, h) => match simplified(f, g, h) {
                    Ok(done) => results.push(done),
                    Err(([f, g, h], invert)) => {
                        let key = [f.0, g.0, h.0];
                        if let Some(known) = self.known(key) {
                            results.push(known.invert_if(invert));
                            continue;
                        }
                        let level = self.level(f).min(self.level(g)).min(self.level(h));
                        let ((f0, f1), (g0, g1)) = (self.cofactors(f, level), self.cofactors(g, level));
                        let (h0, h1) = self.cofactors(h, level);
                        tasks.push(Task::Join { level, key, invert });
                        tasks.push(Task::Ite(f1, g1, h1));
                        tasks.push(Task::Ite(f0, g0, h0));
                    }
                },
                Task::Join { level, key, invert } => {
                    let (high, low) = (results.pop().expect(PAIR), results.pop().expect(PAIR));
                    let joined = self.node(level, low, high)?;
                    self.remember(key, joined);
                    results.push(joined.invert_if(invert));
                }
                Task::AndExists(f, g, cube) => self.and_exists_step(f, g, cube, tasks, results),
                Task::OtherHalf { f, g, cube, key } => {
                    // the first half stays on the list
                    if results.last() == Some(&Edge::TRUE) {
                        self.remember(key, Edge::TRUE);
                    } else {
                        tasks.push(Task::Either { key });
                        tasks.push(Task::AndExists(f, g, cube));
                    }
                }
                Task::Either { key } => {
                    let (high, low) = (results.pop().expect(PAIR), results.pop().expect(PAIR));
                    tasks.push(Task::Note { key });
                    tasks.push(Task::Ite(low, Edge::TRUE, high));
                }
                Task::Note { key } => self.remember(key, *results.last().expect(PAIR)),
            }
        }
        Ok(results.pop().expect("the first task leaves one result"))
    }

    fn and_exists_step(&self, f: Edge, g: Edge, cube: Edge, tasks: &mut Vec<Task>, results: &mut Vec<Edge>) {
        if f == Edge::FALSE || g == Edge::FALSE || f == !g {
            return results.push(Edge::FALSE);
        }
        let g = if f == g { Edge::TRUE } else { g };
        let (f, g) = if g < f { (g, f) } else { (f, g) };
        let level = self.level(f).min(self.level(g));
        let mut cube = cube;
        while self.level(cube) < level {
            cube = self.halves(cube).1;
        }
        if cube == Edge::TRUE {
            return tasks.push(Task::Ite(f, g, Edge::FALSE));
        }
        let key = [f.0 | QUANTIFIED, g.0, cube.0];
        if let Some(known) = self.known(key) {
            return results.push(known);
        }
        let ((f0, f1), (g0, g1)) = (self.cofactors(f, level), self.cofactors(g, level));
        if self.level(cube) == level {
            let cube = self.halves(cube).1;
            tasks.push(Task::OtherHalf { f: f1, g: g1, cube, key });
            tasks.push(Task::AndExists(f0, g0, cube));
        } else {
            tasks.push(Task::Join { level, key, invert: false });
            tasks.push(Task::AndExists(f1, g1, cube));
            tasks.push(Task::AndExists(f0, g0, cube));
        }
    }

    fn cofactors(&self, f: Edge, level: u32) -> (Edge, Edge) {
        if self.level(f) == level { self.halves(f) } else { (f, f) }
    }

    /// Counts a step; looks now and then whether to stop.
    fn tick(&mut self) -> Result<(), GaveUp> {
        self.steps += 1;
        if self.steps & 0xfff == 0 {
            if self.control.cancelled() {
                return Err(GaveUp::Cancelled);
            }
            if self.steps > STEPS_PER_NODE * (self.budget as u64).max(1 << 16) {
                return Err(GaveUp::Budget { nodes: self.budget });
            }
        }
        Ok(())
    }

    fn slot(&self, level: u32, low: Edge, high: Edge) -> usize {
        spread([level, low.0, high.0]) as usize & (self.table.len() - 1)
    }

    fn grow(&mut self) {
        self.table = vec![0; self.table.len() * 2];
        for at in 1..self.nodes.len() {
            let node = self.nodes[at];
            let mut slot = self.slot(node.level, node.low, node.high);
            while self.table[slot] != 0 {
                slot = (slot + 1) & (self.table.len() - 1);
            }
            self.table[slot] = at as u32;
        }
        if self.cache.len() < CACHE_LIMIT {
            let old = std::mem::take(&mut self.cache);
            self.cache = vec![NOTHING; old.len() * 2];
            for entry in old.into_iter().filter(|entry| entry.key != NOTHING.key) {
                self.remember(entry.key, entry.result);
            }
        }
    }

    fn known(&self, key: Key) -> Option<Edge> {
        let entry = self.cache[spread(key) as usize & (self.cache.len() - 1)];
        (entry.key == key).then_some(entry.result)
    }

    fn remember(&mut self, key: Key, result: Edge) {
        let slot = spread(key) as usize & (self.cache.len() - 1);
        self.cache[slot] = Cached { key, result };
    }
}

/// A hash whose low bits depend on all bits.
fn spread([a, b, c]: Key) -> u64 {
    let mixed = (u64::from(a) << 32 | u64::from(b)).wrapping_mul(0x9e37_79b9_7f4a_7c15) ^ u64::from(c);
    let mixed = (mixed ^ mixed >> 29).wrapping_mul(0xbf58_476d_1ce4_e5b9);
    mixed ^ mixed >> 32
}

/// An if-then-else that is an operand or a constant, or else its standard operands (the condition and the first branch
/// not inverted) and whether the result is to be inverted: equal functions should meet in the cache.
fn simplified(f: Edge, g: Edge, h: Edge) -> Result<Edge, ([Edge; 3], bool)> {
    if f.is_constant() {
        return Ok(if f == Edge::TRUE { g } else { h });
    }
    let same = |e: Edge| e.node() == f.node();
    let (mut f, mut g, mut h) =
        (f, if same(g) { Edge::constant(g == f) } else { g }, if same(h) { Edge::constant(h != f) } else { h });
    if g == h {
        return Ok(g);
    }
    if g.is_constant() && g == !h {
        return Ok(f.invert_if(g == Edge::FALSE));
    }
    // symmetric operations: the older node is the condition
    if g == Edge::TRUE && h.node() < f.node() {
        (f, h) = (h, f);
    } else if h == Edge::FALSE && g.node() < f.node() {
        (f, g) = (g, f);
    } else if h == Edge::TRUE && g.node() < f.node() {
        (f, g) = (!g, !f);
    } else if g == Edge::FALSE && h.node() < f.node() {
        (f, h) = (!h, !f);
    } else if g == !h && g.node() < f.node() {
        (f, g, h) = (g, f, !f);
    }
    if f.inverted() {
        (f, g, h) = (!f, h, g);
    }
    let invert = g.inverted();
    Err(([f, g.invert_if(invert), h.invert_if(invert)], invert))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::statics::walk::tests::{Truth, build, truth};

    /// Functions of 4 variables as 16-bit truth tables, many of them, in a fixed order.
    fn samples() -> Vec<Truth> {
        let mut word = 0x1234_5678_9abc_def0u64;
        let random = (0..60).map(|_| {
            word ^= word << 13;
            word ^= word >> 7;
            word ^= word << 17;
            word as u16
        });
        [0, 0xffff, 0xaaaa, 0xcccc, 0xf0f0, 0xff00, 0x8000, 0x6996].into_iter().chain(random).collect()
    }

    #[test]
    fn every_function_of_three_variables_has_one_edge() {
        let mut diagram = Diagram::new(&Control::default());
        let table = |t: u16| t & 0xff | t << 8; // the fourth variable does not matter
        let edges: Vec<Edge> = (0..256).map(|t| build(&mut diagram, table(t))).collect();
        for (t, edge) in edges.iter().enumerate() {
            assert_eq!(truth(&diagram, *edge), table(t as u16));
            assert_eq!(!*edge, edges[255 - t], "a complement is the inverted edge");
        }
        // Bryant 1986: reduced diagrams are canonical, so 256 functions are 256 edges, 128 nodes with inversion
        assert_eq!(edges.iter().collect::<std::collections::HashSet<_>>().len(), 256);
        assert_eq!(diagram.len(), 128);
    }

    #[test]
    fn operations_agree_with_truth_tables() {
        let mut diagram = Diagram::new(&Control::default());
        let tables = samples();
        let edges: Vec<Edge> = tables.iter().map(|t| build(&mut diagram, *t)).collect();
        for (f, ef) in tables.iter().zip(&edges) {
            for (g, eg) in tables.iter().zip(&edges) {
                let results = [
                    (diagram.and(*ef, *eg).unwrap(), f & g, "and"),
                    (diagram.or(*ef, *eg).unwrap(), f | g, "or"),
                    (diagram.xor(*ef, *eg).unwrap(), f ^ g, "xor"),
                ];
                for (edge, want, name) in results {
                    assert_eq!(truth(&diagram, edge), want, "{f:04x} {name} {g:04x}");
                    assert_eq!(edge, build(&mut diagram, want), "{f:04x} {name} {g:04x} is not canonical");
                }
                for (h, eh) in tables.iter().zip(&edges).step_by(7) {
                    let edge = diagram.ite(*ef, *eg, *eh).unwrap();
                    assert_eq!(truth(&diagram, edge), f & g | !f & h, "if {f:04x} then {g:04x} else {h:04x}");
                }
            }
        }
    }

    #[test]
    fn quantification_agrees_with_truth_tables() {
        let mut diagram = Diagram::new(&Control::default());
        // some value of variable `v`: the table or-ed with itself where the variable is turned over
        let exists = |t: u16, v: u32| {
            let shift = 1 << v;
            let ones = [0xaaaau16, 0xcccc, 0xf0f0, 0xff00][v as usize];
            t | (t & ones) >> shift | (t & !ones) << shift
        };
        let tables = samples();
        for (at, f) in tables.iter().enumerate() {
            for g in &tables[at / 2..] {
                for set in 0..16u32 {
                    let levels: Vec<u32> = (0..4).filter(|v| set >> v & 1 == 1).collect();
                    let want = levels.iter().fold(f & g, |t, v| exists(t, *v));
                    let (ef, eg) = (build(&mut diagram, *f), build(&mut diagram, *g));
                    let cube = diagram.cube(&levels).unwrap();
                    let edge = diagram.and_exists(ef, eg, cube).unwrap();
                    assert_eq!(truth(&diagram, edge), want, "{f:04x} and {g:04x}, some value of {levels:?}");
                }
            }
        }
    }

    #[test]
    fn the_budget_holds_and_cancelling_stops() {
        // a function whose diagram is exponential in this order: pairs of variables that lie far apart
        let far_pairs = |diagram: &mut Diagram| -> Result<Edge, GaveUp> {
            let mut all = Edge::TRUE;
            for pair in 0..20 {
                let (a, b) = (diagram.variable(pair)?, diagram.variable(pair + 20)?);
                let same = !diagram.xor(a, b)?;
                all = diagram.and(all, same)?;
            }
            Ok(all)
        };
        let mut control = Control { nodes: 10_000, ..Control::default() };
        let mut diagram = Diagram::new(&control);
        assert_eq!(far_pairs(&mut diagram), Err(GaveUp::Budget { nodes: 10_000 }));
        assert!(diagram.len() <= 10_000);
        control.nodes = 0;
        control.cancel.store(true, std::sync::atomic::Ordering::Relaxed);
        assert_eq!(far_pairs(&mut Diagram::new(&control)), Err(GaveUp::Cancelled));
    }

    #[test]
    fn hundred_thousand_variables_do_not_overflow_the_stack() {
        const N: u32 = 100_000;
        let mut diagram = Diagram::new(&Control::default());
        let all: Vec<u32> = (0..N).collect();
        let ones = diagram.cube(&all).unwrap();
        let mut parity = Edge::FALSE;
        for level in all.iter().rev() {
            parity = diagram.node(*level, parity, !parity).unwrap();
        }
        let both = diagram.and(ones, parity).unwrap();
        assert_eq!(both, Edge::FALSE, "an even number of ones has even parity");
        let odd = diagram.xor(ones, parity).unwrap();
        assert_eq!(diagram.support(odd).len(), N as usize);
        assert_eq!(diagram.and_exists(odd, !ones, ones).unwrap(), Edge::TRUE);
        assert_eq!(diagram.cubes(ones).next().map(|cube| cube.len()), Some(N as usize));
    }
}
