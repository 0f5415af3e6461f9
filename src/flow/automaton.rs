//! The circuit read as an automaton: Moore or Mealy, what cannot be reached, what cannot be left, what behaves alike.

use std::collections::BTreeMap;

use rustc_hash::FxHashMap;

use super::classes::{Ways, refine};
use super::{Automaton, FlowTable, Reached, Reading, StateNumber};
use crate::circuit::{NetId, strong_components};
use crate::logic::Bits;
use crate::scenario::Scenario;

impl Automaton {
    /// Reads the flow table of a scenario as an automaton. `variables` determine the state where inputs are given; see
    /// [`flow`](super::flow).
    pub fn of(scenario: &Scenario, table: &FlowTable, variables: &[NetId]) -> Automaton {
        let graph = Graph::of(table);
        Automaton {
            reading: reading(table, &scenario.outputs, variables),
            unreachable: numbers(table).filter(|state| !table.states[*state as usize].reachable).collect(),
            dead_ends: dead_ends(table, &graph, variables),
            equal: equal(table, graph, scenario.circuit.input_count(), &scenario.outputs),
            truncated: table.states_truncated || table.steps_truncated,
        }
    }
}

fn numbers(table: &FlowTable) -> impl Iterator<Item = StateNumber> + use<> {
    0..table.states.len() as StateNumber
}

fn reachable(table: &FlowTable) -> impl Iterator<Item = StateNumber> + '_ {
    numbers(table).filter(|state| table.states[*state as usize].reachable)
}

fn values(state: &Bits, nets: &[NetId]) -> Vec<bool> {
    nets.iter().map(|net| state.get(net.index())).collect()
}

/// Where single-input changes lead from each reachable state.
struct Graph {
    /// For each state, for each input, the states that may follow.
    ways: Vec<Ways>,
    /// May the circuit be elsewhere than in these states, too: does it perhaps oscillate, or did a limit cut?
    open: Vec<bool>,
}

impl Graph {
    fn of(table: &FlowTable) -> Graph {
        let mut graph = Graph {
            ways: vec![Ways::new(); table.states.len()],
            open: table.states.iter().map(|state| !state.explored).collect(),
        };
        for single in &table.single {
            let from = single.from as usize;
            if !table.states[from].reachable {
                continue;
            }
            graph.ways[from].push(single.to.states().to_vec());
            graph.open[from] |= match &single.to {
                Reached::Exact { cycles, .. } => *cycles > 0,
                // what agrees with a bound need not be possible, and what is possible need not rest
                Reached::Bound { .. } => single.to.only().is_none(),
            };
        }
        graph
    }
}

fn reading(table: &FlowTable, outputs: &[NetId], variables: &[NetId]) -> Reading {
    if variables.is_empty() {
        return Reading::Combinational;
    }
    let mut first: FxHashMap<Vec<bool>, StateNumber> = FxHashMap::default();
    for number in reachable(table) {
        let state = &table.states[number as usize].values;
        let other = *first.entry(values(state, variables)).or_insert(number);
        if values(state, outputs) != values(&table.states[other as usize].values, outputs) {
            return Reading::Mealy(other, number);
        }
    }
    Reading::Moore
}

/// Terminal groups of the graph of single-input changes in which the state variables stand still.
fn dead_ends(table: &FlowTable, graph: &Graph, variables: &[NetId]) -> Vec<Vec<StateNumber>> {
    let state = |number: StateNumber| values(&table.states[number as usize].values, variables);
    let all_alike = {
        let mut all = reachable(table).map(state);
        let first = all.next();
        all.all(|other| Some(other) == first)
    };
    if all_alike {
        return Vec::new();
    }
    let targets: Vec<Vec<u32>> = graph.ways.iter().map(|ways| ways.iter().flatten().copied().collect()).collect();
    let mut group_of = vec![0; targets.len()];
    let strong = strong_components(targets.len(), |state| &targets[state as usize]);
    for (number, group) in strong.groups().enumerate() {
        for member in group {
            group_of[*member as usize] = number;
        }
    }
    let is_dead_end = |number: usize, group: &[StateNumber]| {
        let first = state(group[0]);
        group.iter().all(|member| {
            let m = *member as usize;
            table.states[m].reachable
                && !graph.open[m]
                && targets[m].iter().all(|target| group_of[*target as usize] == number)
                && state(*member) == first
        })
    };
    let mut ends: Vec<Vec<StateNumber>> = strong
        .groups()
        .enumerate()
        .filter(|(number, group)| is_dead_end(*number, group))
        .map(|(_, group)| group.to_vec())
        .collect();
    ends.sort_unstable();
    ends
}

/// Classes of reachable states that behave alike. A state that may oscillate, or of which not all is known, is alike to
/// no other.
fn equal(table: &FlowTable, graph: Graph, inputs: usize, outputs: &[NetId]) -> Vec<Vec<StateNumber>> {
    let mut seen: FxHashMap<Vec<bool>, u32> = FxHashMap::default();
    let mut next = 0;
    let class = numbers(table)
        .map(|number| {
            let state = &table.states[number as usize];
            let new = next;
            if state.reachable && !graph.open[number as usize] {
                let shown = (0..inputs).chain(outputs.iter().map(|net| net.index()));
                let key: Vec<bool> = shown.map(|net| state.values.get(net)).collect();
                let class = *seen.entry(key).or_insert(new);
                next += u32::from(class == new);
                class
            } else {
                next += 1;
                new
            }
        })
        .collect();
    let mut classes: BTreeMap<u32, Vec<StateNumber>> = BTreeMap::new();
    for (number, class) in refine(class, &graph.ways).into_iter().enumerate() {
        classes.entry(class).or_default().push(number as StateNumber);
    }
    let mut equal: Vec<Vec<StateNumber>> = classes.into_values().filter(|class| class.len() > 1).collect();
    equal.sort_unstable();
    equal
}
