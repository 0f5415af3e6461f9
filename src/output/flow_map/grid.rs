//! Which column and which row: boxes whose state variables agree stand in one row where that costs no height.

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
        columns.sort_by_cached_key(|column| gray_rank(column, &varying));
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

/// The place of an input vector in the reflected Gray code over these inputs, the first the most significant.
fn gray_rank(inputs: &Bits, varying: &[NetId]) -> Vec<bool> {
    let mut odd = false;
    varying
        .iter()
        .map(|net| {
            odd ^= inputs.get(net.index());
            odd
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn columns_stand_as_in_a_karnaugh_map() {
        let vectors = ["00", "10", "01", "11"].map(|text| Bits::of(text.chars().map(|it| it == '1').collect::<Vec<_>>().into_iter()));
        let mut order = vectors.to_vec();
        order.sort_by_cached_key(|it| gray_rank(it, &[NetId(0), NetId(1)]));
        let [a, b, c, d] = vectors;
        assert_eq!(order, [a, c, d, b], "00 01 11 10");
    }
}
