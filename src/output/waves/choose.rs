//! Which nets go on which sheet.

use std::collections::BTreeSet;

use super::{MOST_LANES, MOST_SHEETS, Nets, Picture};
use crate::circuit::NetId;

/// Nets by sheet, in the order of their lanes, and what no sheet shows.
pub(super) struct Choice {
    pub sheets: Vec<Vec<NetId>>,
    pub left_out: Vec<NetId>,
}

/// Chooses nets and spreads them evenly over sheets.
pub(super) fn choose(picture: &Picture<'_>) -> Choice {
    let circuit = &picture.scenario.circuit;
    let mut wanted: Vec<NetId> = match &picture.nets {
        Nets::These(nets) => nets.iter().copied().filter(|net| net.index() < circuit.net_count()).collect(),
        Nets::All | Nets::Telling => circuit.nets().collect(),
    };
    let mut seen = BTreeSet::new();
    wanted.retain(|net| seen.insert(*net));
    let most = if picture.nets == Nets::Telling { MOST_LANES } else { MOST_LANES * MOST_SHEETS };
    let mut left_out = Vec::new();
    if wanted.len() > most {
        let class = classes(picture);
        let mut ranked = wanted.clone();
        ranked.sort_by_key(|net| (class[net.index()], *net));
        left_out = ranked.split_off(most);
        left_out.sort_unstable();
        let left: BTreeSet<NetId> = left_out.iter().copied().collect();
        wanted.retain(|net| !left.contains(net));
    }
    let many = wanted.len().div_ceil(MOST_LANES).max(1);
    let each = wanted.len().div_ceil(many).max(1);
    let mut sheets: Vec<Vec<NetId>> = wanted.chunks(each).map(<[NetId]>::to_vec).collect();
    if sheets.is_empty() {
        sheets.push(Vec::new());
    }
    Choice { sheets, left_out }
}

/// For each net, how much its lane tells; 0 tells most.
fn classes(picture: &Picture<'_>) -> Vec<u8> {
    let (scenario, circuit) = (picture.scenario, &picture.scenario.circuit);
    let mut class = vec![5u8; circuit.net_count()];
    let mut better = |net: NetId, to: u8| class[net.index()] = class[net.index()].min(to);
    for run in picture.runs() {
        for change in &run.trace.changes {
            let to = if circuit.is_input(change.net) {
                2
            } else if circuit.in_loop(change.net) {
                3
            } else {
                4
            };
            better(change.net, to);
        }
        run.facts.iter().filter_map(|fact| fact.subject.net).for_each(|net| better(net, 0));
    }
    scenario.watched.iter().for_each(|net| better(*net, 1));
    class
}
