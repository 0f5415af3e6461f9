//! The functions of nets, as diagrams over inputs and feedback nets.

use rustc_hash::FxHashMap;

use super::GaveUp;
use super::diagram::{Diagram, Edge};
use crate::circuit::{Circuit, Compiled, GateId, NetId};

/// Functions of the nets of a circuit. The leaves are given; every other net is a function of them.
pub(super) struct Functions<'a> {
    circuit: &'a Circuit,
    of: Vec<Option<Edge>>,
}

impl<'a> Functions<'a> {
    /// Begins with the leaves, by net number: they must cut every loop, and include the inputs.
    pub fn new(circuit: &'a Circuit, leaves: Vec<Option<Edge>>) -> Functions<'a> {
        Functions { circuit, of: leaves }
    }

    /// Builds the functions of these nets and of all that lies between them and the leaves.
    pub fn prepare(&mut self, diagram: &mut Diagram, nets: impl Iterator<Item = NetId>) -> Result<(), GaveUp> {
        let mut needed = vec![false; self.circuit.gate_count()];
        let mut open: Vec<NetId> = nets.collect();
        let mut any = false;
        while let Some(net) = open.pop() {
            if self.of[net.index()].is_some() {
                continue;
            }
            let gate = self.circuit.driver(net).expect("inputs are leaves");
            if !std::mem::replace(&mut needed[gate.index()], true) {
                any = true;
                open.extend(self.circuit.sources(gate).iter().map(|source| source.0));
            }
        }
        if any {
            for gate in self.circuit.evaluation_order() {
                if needed[gate.index()] {
                    let function = self.next(diagram, *gate)?;
                    self.of[self.circuit.net_of(*gate).index()] = Some(function);
                }
            }
        }
        Ok(())
    }

    /// The function of a prepared net, or of a leaf.
    pub fn of(&self, net: NetId) -> Edge {
        self.of[net.index()].expect("prepared before it is asked for")
    }

    /// What a gate makes of its sources, all of them prepared: for a feedback net its next value.
    pub fn next(&self, diagram: &mut Diagram, gate: GateId) -> Result<Edge, GaveUp> {
        let sources = self.circuit.sources(gate).iter().map(|(net, weight)| (self.of(*net), *weight)).collect();
        gate_function(diagram, self.circuit.compiled(gate), sources)
    }
}

/// A gate's function of the functions of its sources, each with its weight in the gate's input sum.
fn gate_function(diagram: &mut Diagram, form: &Compiled, mut sources: Vec<(Edge, u64)>) -> Result<Edge, GaveUp> {
    let base: u64 = sources.iter().filter(|source| source.0 == Edge::TRUE).map(|source| source.1).sum();
    sources.retain(|source| !source.0.is_constant() && source.1 > 0);
    // topmost first: what is decided first in the diagram is decided first here
    sources.sort_by_key(|source| diagram.level(source.0));
    match form {
        Compiled::Table(_) | Compiled::Wide(_) => table(diagram, form, base, &sources),
        Compiled::Parity { odd } => {
            let mut parity = Edge::constant((base & 1 == 1) == *odd);
            for (source, weight) in sources.iter().rev() {
                if weight & 1 == 1 {
                    parity = diagram.xor(parity, *source)?;
                }
            }
            Ok(parity)
        }
        Compiled::Count { low, high } => {
            let enough = at_least(diagram, &sources, low.saturating_sub(base))?;
            let too_many = match high.checked_sub(base) {
                Some(left) => at_least(diagram, &sources, left.saturating_add(1))?,
                None => Edge::TRUE,
            };
            diagram.and(enough, !too_many)
        }
    }
}

/// A table, folded source by source from the bottom of the diagram up.
fn table(diagram: &mut Diagram, form: &Compiled, base: u64, sources: &[(Edge, u64)]) -> Result<Edge, GaveUp> {
    let row_sum = |row: usize| -> u64 {
        let bits = sources.iter().rev().enumerate();
        bits.map(|(bit, source)| if row >> bit & 1 == 1 { source.1 } else { 0 }).sum()
    };
    let mut layer: Vec<Edge> =
        (0..1usize << sources.len()).map(|row| Edge::constant(form.value(base + row_sum(row)))).collect();
    let mut folded: FxHashMap<(Edge, Edge), Edge> = FxHashMap::default();
    for (source, _) in sources.iter().rev() {
        folded.clear();
        for pair in 0..layer.len() / 2 {
            let (low, high) = (layer[2 * pair], layer[2 * pair + 1]);
            layer[pair] = match folded.get(&(low, high)) {
                Some(known) => *known,
                None => {
                    let new = diagram.ite(*source, high, low)?;
                    folded.insert((low, high), new);
                    new
                }
            };
        }
        layer.truncate(layer.len() / 2);
    }
    Ok(layer[0])
}

/// Do the sources at 1 weigh at least `need`? A lattice of (source, what is still needed), built from the last source
/// up and only where it can be reached and is still open, so an "and" of thousands stays a chain.
fn at_least(diagram: &mut Diagram, sources: &[(Edge, u64)], need: u64) -> Result<Edge, GaveUp> {
    let mut before: u64 = sources.iter().map(|source| source.1).sum();
    let mut after = 0;
    // the row below: from which need on, and the functions
    let (mut first, mut row): (u64, Vec<Edge>) = (1, Vec::new());
    let look = |first: u64, row: &[Edge], after: u64, need: u64| {
        if need == 0 {
            Edge::TRUE
        } else if need > after {
            Edge::FALSE
        } else {
            row[(need - first) as usize]
        }
    };
    for (source, weight) in sources.iter().rev() {
        before -= weight;
        let new_first = need.saturating_sub(before).max(1);
        let mut new_row = Vec::new();
        for left in new_first..=need.min(after + weight) {
            let with = look(first, &row, after, left.saturating_sub(*weight));
            let without = look(first, &row, after, left);
            new_row.push(diagram.ite(*source, with, without)?);
        }
        (first, row, after) = (new_first, new_row, after + weight);
    }
    Ok(look(first, &row, after, need))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::circuit::{Expr, Function, GateSpec};
    use crate::control::Control;

    /// One gate on the first nets of an input list, its sources replaced by variables in a shuffled order.
    fn check(function: Function, pins: Vec<u32>) {
        let inputs: Vec<String> = (0..=*pins.iter().max().unwrap()).map(|i| format!("i{i}")).collect();
        let n = inputs.len();
        let pins: Vec<NetId> = pins.into_iter().map(NetId).collect();
        let gate = GateSpec { name: "g".into(), function: function.clone(), pins: pins.clone() };
        let circuit = Circuit::new(&inputs, vec![gate], vec![]).unwrap();
        let mut diagram = Diagram::new(&Control::default());
        let level = |i: usize| ((i * 5 + 3) % n) as u32;
        let distinct = (0..n).map(level).collect::<std::collections::BTreeSet<_>>().len() == n;
        let level = |i: usize| if distinct { level(i) } else { (n - 1 - i) as u32 };
        let mut leaves: Vec<Option<Edge>> = (0..n).map(|i| Some(diagram.variable(level(i)).unwrap())).collect();
        leaves.push(None);
        let mut functions = Functions::new(&circuit, leaves);
        functions.prepare(&mut diagram, [NetId(n as u32)].into_iter()).unwrap();
        let built = functions.of(NetId(n as u32));
        for row in 0..1usize << n {
            let pin_values: Vec<bool> = pins.iter().map(|net| row >> net.index() & 1 == 1).collect();
            let value = |at: u32| row >> (0..n).find(|i| level(*i) == at).unwrap() & 1 == 1;
            assert_eq!(diagram.value(built, value), function.value(&pin_values), "{function:?} {pins:?} row {row:b}");
        }
    }

    #[test]
    fn every_form_becomes_its_function() {
        for function in Function::LISTED {
            for n in [1, 2, 3, 5, 7, 9] {
                if function.arity().accepts(n) {
                    check(function.clone(), (0..n as u32).collect());
                }
                // a net on several pins
                let mut pins: Vec<u32> = (0..n as u32).collect();
                pins[n - 1] = 0;
                if n > 6 {
                    pins[n - 2] = 0;
                }
                if function.arity().accepts(n) {
                    check(function.clone(), pins);
                }
            }
        }
        let expr = Expr::parse("(a & !b) ^ (c | d & e) | f & g & !h").unwrap();
        check(Function::Expr(expr), (0..8).collect());
    }

    #[test]
    fn constant_sources_count() {
        let mut diagram = Diagram::new(&Control::default());
        let x = diagram.variable(0).unwrap();
        // majority of 7: three ones and a variable of weight 1 and three zeros
        let form = Compiled::Count { low: 4, high: 7 };
        let sources = vec![(Edge::TRUE, 3), (Edge::FALSE, 3), (x, 1)];
        assert_eq!(gate_function(&mut diagram, &form, sources).unwrap(), x);
        // nor and nand of constants
        let nor = Compiled::Count { low: 0, high: 0 };
        assert_eq!(gate_function(&mut diagram, &nor, vec![(Edge::TRUE, 6), (x, 1)]).unwrap(), Edge::FALSE);
        assert_eq!(gate_function(&mut diagram, &nor, vec![(Edge::FALSE, 6), (x, 1)]).unwrap(), !x);
        let xnor = Compiled::Parity { odd: false };
        assert_eq!(gate_function(&mut diagram, &xnor, vec![(Edge::TRUE, 1), (x, 1), (x, 0)]).unwrap(), x);
    }

    #[test]
    fn wide_counting_gates_stay_small() {
        for function in [Function::And, Function::Or, Function::Nand, Function::Nor, Function::Xor] {
            let n = 5000u32;
            let inputs: Vec<String> = (0..n).map(|i| format!("i{i}")).collect();
            let gate = GateSpec { name: "g".into(), function: function.clone(), pins: (0..n).map(NetId).collect() };
            let circuit = Circuit::new(&inputs, vec![gate], vec![]).unwrap();
            let mut diagram = Diagram::new(&Control::default());
            let mut leaves: Vec<Option<Edge>> = (0..n).map(|i| Some(diagram.variable(i).unwrap())).collect();
            leaves.push(None);
            let mut functions = Functions::new(&circuit, leaves);
            functions.prepare(&mut diagram, [NetId(n)].into_iter()).unwrap();
            assert_eq!(diagram.support(functions.of(NetId(n))).len(), n as usize);
            assert!(diagram.len() < 20 * n as usize, "{function:?}: {} nodes", diagram.len());
        }
    }
}
