//! Which column and which row: columns in the order of a Gray code from the start on, so that neighbours often differ in one
//! input; boxes whose state variables agree stand in one row where that costs no height.

use rustc_hash::FxHashMap;

use super::Map;
use super::arrows::Place;
use super::choose::{Chosen, inputs};
use crate::circuit::NetId;
use crate::logic::Bits;

/// A box or a sign, in its place.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(super) struct Node {
    pub place: Place,
    pub column: usize,
    pub row: usize,
}

/// An arrow between nodes, by number.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(super) struct Link {
    pub from: usize,
    /// Top to bottom.
    pub to: Vec<usize>,
}

/// All nodes and links.
pub(super) struct Grid {
    /// The input vectors.
    pub columns: Vec<Bits>,
    /// The inputs that are not the same in all columns.
    pub varying: Vec<NetId>,
    pub nodes: Vec<Node>,
    /// Of steps, then of single changes, as they were chosen.
    pub links: Vec<Link>,
    pub rows: usize,
}

/// What makes nodes stand in one row: values of the state variables, and which of several such in their column.
#[derive(Clone, PartialEq, Eq, Hash)]
struct Kin {
    sign: u8,
    variables: Bits,
    turn: usize,
}

impl Grid {
    pub fn new(map: &Map<'_>, chosen: &Chosen) -> Grid {
        let arrows = || chosen.steps.iter().chain(&chosen.single);
        let mut columns: Vec<Bits> = chosen.states.iter().map(|number| inputs(map, *number)).collect();
        columns.extend(arrows().map(|arrow| arrow.inputs.clone()));
        columns.sort_unstable();
        columns.dedup();
        let varying: Vec<NetId> = map
            .scenario
            .circuit
            .inputs()
            .filter(|net| columns.iter().any(|column| column.get(net.index()) != columns[0].get(net.index())))
            .collect();
        let order = significance(map, chosen, &varying);
        let first = chosen.states.iter().find(|number| map.flow.table.start.contains(number));
        let first = first.map_or_else(|| columns.first().cloned().unwrap_or_default(), |number| inputs(map, *number));
        columns.sort_by_cached_key(|column| gray_rank(column, &first, &order));
        let of_inputs: FxHashMap<&Bits, usize> = columns.iter().enumerate().map(|(i, column)| (column, i)).collect();

        let mut nodes = Vec::new();
        let mut known: FxHashMap<(usize, Place), usize> = FxHashMap::default();
        let mut node = |column: usize, place: Place| {
            *known.entry((column, place)).or_insert_with(|| {
                nodes.push(Node { place, column, row: 0 });
                nodes.len() - 1
            })
        };
        for number in &chosen.states {
            node(of_inputs[&inputs(map, *number)], Place::State(*number));
        }
        let mut links: Vec<Link> = arrows()
            .map(|arrow| {
                let from = node(of_inputs[&inputs(map, arrow.from)], Place::State(arrow.from));
                let column = of_inputs[&arrow.inputs];
                Link { from, to: arrow.to.iter().map(|place| node(column, *place)).collect() }
            })
            .collect();
        let rows = rows(map, &mut nodes);
        for link in &mut links {
            link.to.sort_by_key(|to| nodes[*to].row);
        }
        Grid { columns, varying, nodes, links, rows }
    }
}

/// Gives every node its row: kin by kin in the order of their first, each the first row that is free in all its columns.
/// The number of rows.
fn rows(map: &Map<'_>, nodes: &mut [Node]) -> usize {
    let mut turns: FxHashMap<(usize, Kin), usize> = FxHashMap::default();
    let mut number: FxHashMap<Kin, usize> = FxHashMap::default();
    let mut kin: Vec<Vec<usize>> = Vec::new();
    for (i, node) in nodes.iter().enumerate() {
        let mut key = Kin { sign: 0, variables: Bits::default(), turn: 0 };
        match node.place {
            Place::State(state) => {
                let values = &map.flow.table.states[state as usize].values;
                key.variables = Bits::of(map.state_variables.iter().map(|net| values.get(net.index())));
            }
            Place::Loop => key.sign = 1,
            Place::Unknown => key.sign = 2,
        }
        let turn = turns.entry((node.column, key.clone())).or_insert(0);
        key.turn = *turn;
        *turn += 1;
        let group = *number.entry(key).or_insert_with(|| {
            kin.push(Vec::new());
            kin.len() - 1
        });
        kin[group].push(i);
    }
    let mut taken: Vec<Vec<usize>> = Vec::new();
    for group in kin {
        let columns: Vec<usize> = group.iter().map(|i| nodes[*i].column).collect();
        let free = |row: &Vec<usize>| columns.iter().all(|column| !row.contains(column));
        let row = taken.iter().position(free).unwrap_or_else(|| {
            taken.push(Vec::new());
            taken.len() - 1
        });
        taken[row].extend(&columns);
        for i in group {
            nodes[i].row = row;
        }
    }
    taken.len()
}

/// Inputs that steps change most often come last, so that these changes lead to the next column; else in net order.
fn significance(map: &Map<'_>, chosen: &Chosen, varying: &[NetId]) -> Vec<NetId> {
    let mut changes: FxHashMap<NetId, usize> = FxHashMap::default();
    for arrow in &chosen.steps {
        let from = &map.flow.table.states[arrow.from as usize].values;
        for (net, _) in arrow.change.moving(from) {
            *changes.entry(net).or_insert(0) += 1;
        }
    }
    let mut order = varying.to_vec();
    order.sort_by_key(|net| (changes.get(net).copied().unwrap_or(0), *net));
    order
}

/// The place of an input vector in a reflected Gray code over these inputs, the first the most significant, that begins
/// at `first`.
fn gray_rank(inputs: &Bits, first: &Bits, order: &[NetId]) -> Vec<bool> {
    let mut odd = false;
    order
        .iter()
        .map(|net| {
            odd ^= inputs.get(net.index()) != first.get(net.index());
            odd
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    fn bits(text: &str) -> Bits {
        Bits::of(text.bytes().map(|it| it == b'1'))
    }

    #[test]
    fn columns_stand_as_in_a_karnaugh_map() {
        let sorted = |first: &str, order: [u32; 2]| {
            let mut vectors = ["00", "10", "01", "11"];
            vectors.sort_by_key(|it| gray_rank(&bits(it), &bits(first), &order.map(NetId)));
            vectors
        };
        assert_eq!(sorted("00", [0, 1]), ["00", "01", "11", "10"]);
        assert_eq!(sorted("11", [0, 1]), ["11", "10", "00", "01"], "the start stands first");
        assert_eq!(sorted("00", [1, 0]), ["00", "10", "11", "01"], "net 0 changes first");
    }
}
