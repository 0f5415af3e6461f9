//! Does every window come to rest?
//!
//! If the graph of zones has no cycle, where a zone that lies in another leads on as that one does, every run ends. A
//! cycle there is only a suspicion: the way back may lead into a part of the zone from which it does not lead back again.
//! It is settled by a second exploration that joins equal zones only: what is reached again is then the very same set.

use std::collections::BTreeSet;

use super::explore::explore;
use super::explored::{Budget, Ended, Explored, Fired, Merge, Mode};
use super::key::bit;
use super::plant::Plant;
use super::watch::Nothing;

/// Whether all windows come to rest.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum RestVerdict {
    /// All of them, always.
    Always,
    /// Some run for ever: one cycle for each number of steps taken, least first.
    Cycles(Vec<Cycle>),
    /// It was not decided.
    Undecided(Ended),
}

/// An oscillation.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Cycle {
    /// The window, as in [`Rest`](super::Rest): steps taken, 0 in the power-up window.
    pub steps: u32,
    /// Does it need several things at exactly one instant, so that no design is meant to show it? `None`: not decided.
    pub needs_ties: Option<bool>,
    /// The nets that move in it, by their number in the plant, ascending.
    pub nets: Vec<u32>,
    /// The values of the signals at the start of the run that leads to it.
    pub start: Vec<u64>,
    /// What leads to it.
    pub lead: Vec<Fired>,
    /// The values of all signals after each of its blocks.
    pub round: Vec<Vec<u64>>,
}

/// Does every window come to rest, from any of these start states? Where one does not, it is also found out whether a
/// cycle is left when nothing happens together. Each of a few explorations may spend the whole budget; if one of them ends
/// early, the cycles found are real, but there may be others.
pub fn comes_to_rest(plant: &Plant, starts: &[Vec<bool>], budget: &Budget) -> RestVerdict {
    comes_to_rest_within(plant, starts, budget).verdict
}

/// What was found out, how much it took, and what is open.
pub(super) struct Looked {
    pub verdict: RestVerdict,
    /// Zones that were kept.
    pub zones: u64,
    /// Numbers of steps taken after which there may be a cycle although none was found, since an exploration ended early.
    pub open: BTreeSet<u32>,
}

/// As [`comes_to_rest`].
pub(super) fn comes_to_rest_within(plant: &Plant, starts: &[Vec<bool>], budget: &Budget) -> Looked {
    let (mut zones, mut open) = (0, BTreeSet::new());
    let verdict = verdict(plant, starts, budget, &mut zones, &mut open);
    Looked { verdict, zones, open }
}

fn verdict(
    plant: &Plant,
    starts: &[Vec<bool>],
    budget: &Budget,
    zones: &mut u64,
    open: &mut BTreeSet<u32>,
) -> RestVerdict {
    let (mut cycles, ended) = cycles(plant, starts, true, budget, (zones, open));
    if cycles.is_empty() {
        return if ended == Ended::Complete { RestVerdict::Always } else { RestVerdict::Undecided(ended) };
    }
    let (apart, ended) = self::cycles(plant, starts, false, budget, (zones, &mut BTreeSet::new()));
    for cycle in &mut cycles {
        let found = apart.iter().any(|it| it.steps == cycle.steps);
        cycle.needs_ties = (found || ended == Ended::Complete).then_some(!found);
    }
    RestVerdict::Cycles(cycles)
}

/// Real cycles, one for each number of steps taken, with or without things that happen together; and whether they are all.
fn cycles(
    plant: &Plant,
    starts: &[Vec<bool>],
    joint: bool,
    budget: &Budget,
    (zones, open): (&mut u64, &mut BTreeSet<u32>),
) -> (Vec<Cycle>, Ended) {
    let mode = Mode { joint, edges: true, ..Mode::default() };
    let found = explore(plant, starts, &Nothing, mode, budget);
    *zones += found.zones;
    if found.ended != Ended::Complete {
        return (Vec::new(), found.ended);
    }
    let suspects = trimmed(&found).1;
    if suspects.is_empty() {
        return (Vec::new(), Ended::Complete);
    }
    // every real cycle is one of this graph
    let suspects: BTreeSet<u32> = suspects.into_iter().map(|node| found.window(node)).collect();
    // most real cycles show soon; whatever comes back in a part of the graph is a cycle of the whole
    let soon = Budget { zones: budget.zones.min(1000 + 20 * found.zones), ..budget.clone() };
    let mode = Mode { merge: Merge::Equality, ..mode };
    for budget in [&soon, budget] {
        let found = explore(plant, starts, &Nothing, mode, budget);
        *zones += found.zones;
        let (leads, lasting) = trimmed(&found);
        if !lasting.is_empty() || !matches!(found.ended, Ended::Zones) {
            let cycles = first_cycles(plant, &found, &leads, &lasting);
            if found.ended != Ended::Complete {
                open.extend(suspects.iter().filter(|steps| !cycles.iter().any(|it| it.steps == **steps)));
            }
            return (cycles, found.ended);
        }
    }
    (Vec::new(), Ended::Zones)
}

/// For each node those that it leads to before the next step, and the nodes that lie on cycles or between two of them.
///
/// No cycle goes past a step, and a way from one cycle past a step to another must not hide the first.
fn trimmed(found: &Explored) -> (Vec<Vec<u32>>, Vec<u32>) {
    let count = found.nodes();
    let mut leads: Vec<Vec<u32>> = vec![Vec::new(); count];
    let mut comes: Vec<Vec<u32>> = vec![Vec::new(); count];
    for (from, to) in found.edges.iter().filter(|(from, to)| found.window(*from) == found.window(*to)) {
        leads[*from as usize].push(*to);
        comes[*to as usize].push(*from);
    }
    let mut live = vec![true; count];
    for (ahead, behind) in [(&leads, &comes), (&comes, &leads)] {
        let mut left: Vec<usize> = behind.iter().map(|to| to.iter().filter(|it| live[**it as usize]).count()).collect();
        let mut bare: Vec<u32> = (0..count as u32).filter(|at| live[*at as usize] && left[*at as usize] == 0).collect();
        while let Some(at) = bare.pop() {
            live[at as usize] = false;
            for to in ahead[at as usize].iter().filter(|to| live[**to as usize]) {
                left[*to as usize] -= 1;
                if left[*to as usize] == 0 {
                    bare.push(*to);
                }
            }
        }
    }
    let lasting = (0..count as u32).filter(|at| live[*at as usize]).collect();
    (leads, lasting)
}

/// One cycle for each number of steps taken.
fn first_cycles(plant: &Plant, found: &Explored, leads: &[Vec<u32>], lasting: &[u32]) -> Vec<Cycle> {
    let mut live = vec![false; leads.len()];
    lasting.iter().for_each(|at| live[*at as usize] = true);
    let mut cycles: Vec<Cycle> = Vec::new();
    let mut walked = vec![false; leads.len()];
    for &root in lasting {
        if walked[root as usize] {
            continue;
        }
        // each of them leads to another after as many steps
        let mut path: Vec<u32> = Vec::new();
        let mut at = root;
        while !std::mem::replace(&mut walked[at as usize], true) {
            path.push(at);
            match leads[at as usize].iter().find(|to| live[**to as usize]) {
                Some(next) => at = *next,
                None => break,
            }
        }
        // else it runs into a cycle that is known
        let Some(place) = path.iter().position(|it| *it == at) else { continue };
        let round = &path[place..];
        let steps = found.window(at);
        if cycles.iter().any(|cycle| cycle.steps == steps) {
            continue;
        }
        let values: Vec<Vec<u64>> = round.iter().skip(1).chain(&round[..1]).map(|node| found.values(*node)).collect();
        let moves = |net: &u32| values.iter().any(|it| bit(it, *net as usize) != bit(&values[0], *net as usize));
        let nets = (0..plant.nets.len() as u32).filter(moves).collect();
        cycles.push(Cycle {
            steps,
            needs_ties: None,
            nets,
            start: found.start(round[0]),
            lead: found.trace(round[0]),
            round: values,
        });
    }
    cycles.sort_by_key(|cycle| cycle.steps);
    cycles
}
