//! A walk that makes every single-input change from every reachable stable state, each at rest.
//!
//! Where a change has one outcome the walk knows where it is. After a race it does not: then it goes on with changes that
//! lead all outcomes into one state again (a homing sequence; Moore 1956), and where there is none the change waits for
//! the end. Parts of the flow table that cannot be left are entered last.

use std::collections::VecDeque;

use rustc_hash::{FxHashMap, FxHashSet};

use super::{FlowTable, Reached, StateNumber, Transition};
use crate::circuit::{NetId, strong_components};

/// Sets of states looked at for one homing sequence.
const SETS: usize = 2048;
/// States in one set that a homing sequence begins with.
const TOGETHER: usize = 64;
/// Steps of a walk, at most.
pub(super) const MOST_STEPS: usize = 1 << 13;

/// A walk over a flow table.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Tour {
    /// The changes in order: input and new value.
    pub steps: Vec<(NetId, bool)>,
    /// Single-input changes from reachable states that it does not make, or not surely: state and input.
    pub left_out: Vec<(StateNumber, NetId)>,
}

/// How much is known of what follows a change.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
enum Class {
    /// One outcome.
    Sure,
    /// A race, after which further changes lead into one state.
    Homed,
    /// As before, but it might oscillate for ever.
    Risky,
    /// The walk is lost after it.
    Last,
}

/// A change from one state, with what has to follow it so that the walk knows where it is.
struct Way {
    from: StateNumber,
    input: NetId,
    to: StateNumber,
    homing: Vec<NetId>,
    class: Class,
}

struct Walk<'a> {
    table: &'a FlowTable,
    /// of each explored state the first of its transitions in `table.single`
    first: FxHashMap<StateNumber, usize>,
    ways: Vec<Way>,
    /// by state, the ways from it
    from: Vec<Vec<u32>>,
    /// the strongly connected part of each state, by ways of class sure and homed; a part comes after those it leads to
    part: Vec<u32>,
    done: FxHashSet<u32>,
    at: StateNumber,
    tour: Tour,
}

/// Lays a walk over all explored reachable states of a table that begins in one state. Without one certain start: none,
/// and everything is left out.
pub fn tour(table: &FlowTable) -> Tour {
    let mut first = FxHashMap::default();
    for (number, transition) in table.single.iter().enumerate() {
        first.entry(transition.from).or_insert(number);
    }
    let wanted = |transition: &&Transition| table.states[transition.from as usize].reachable;
    let [start] = table.start[..] else {
        let left_out = table.single.iter().filter(wanted).map(|it| (it.from, input(it))).collect();
        return Tour { steps: Vec::new(), left_out };
    };
    let mut walk = Walk {
        table,
        first,
        ways: Vec::new(),
        from: vec![Vec::new(); table.states.len()],
        part: Vec::new(),
        done: FxHashSet::default(),
        at: start,
        tour: Tour::default(),
    };
    for transition in table.single.iter().filter(wanted) {
        let way = walk.way(transition);
        walk.from[transition.from as usize].push(walk.ways.len() as u32);
        walk.ways.push(way);
    }
    walk.parts();
    walk.go();
    let left: Vec<(StateNumber, NetId)> = (0..walk.ways.len() as u32)
        .filter(|way| !walk.done.contains(way))
        .map(|way| (walk.ways[way as usize].from, walk.ways[way as usize].input))
        .collect();
    Tour { left_out: left, ..walk.tour }
}

/// The input of a single-input change.
fn input(transition: &Transition) -> NetId {
    transition.change.set.first().map_or(NetId(0), |it| it.0)
}

impl Walk<'_> {
    fn way(&self, transition: &Transition) -> Way {
        let (from, input) = (transition.from, input(transition));
        if let Some(to) = transition.to.only() {
            return Way { from, input, to, homing: Vec::new(), class: Class::Sure };
        }
        let class = match transition.to {
            Reached::Exact { cycles: 0, .. } => Class::Homed,
            _ => Class::Risky,
        };
        let homing = match &transition.to {
            Reached::Bound { truncated: true, .. } => None,
            to => self.homing(to.states()),
        };
        match homing {
            Some((homing, to)) => Way { from, input, to, homing, class },
            None => Way { from, input, to: from, homing: Vec::new(), class: Class::Last },
        }
    }

    /// The transitions of a state, one an input; none if it is not explored.
    fn changes(&self, state: StateNumber) -> &[Transition] {
        match self.first.get(&state) {
            Some(first) => {
                let rest = &self.table.single[*first..];
                let count = rest.iter().take_while(|it| it.from == state).count();
                &rest[..count]
            }
            None => &[],
        }
    }

    /// Changes that lead from any of these states into one and the same, and that state.
    fn homing(&self, states: &[StateNumber]) -> Option<(Vec<NetId>, StateNumber)> {
        if states.is_empty() || states.len() > TOGETHER {
            return None;
        }
        let mut seen: FxHashMap<Vec<StateNumber>, (usize, NetId)> = FxHashMap::default();
        let mut sets = vec![states.to_vec()];
        let mut before = vec![(0usize, NetId(0))];
        seen.insert(states.to_vec(), before[0]);
        let mut next = 0;
        while next < sets.len() {
            let set = sets[next].clone();
            if let [one] = set[..] {
                let mut path = Vec::new();
                let mut at = next;
                while at != 0 {
                    path.push(before[at].1);
                    at = before[at].0;
                }
                path.reverse();
                return Some((path, one));
            }
            let inputs = set.first().map_or(0, |state| self.changes(*state).len());
            for place in 0..inputs {
                let mut reached: Vec<StateNumber> = Vec::new();
                let mut sound = true;
                for state in &set {
                    // states that a race leads to have the same inputs: the same change is one of the same input
                    match self.changes(*state).get(place).map(|it| &it.to) {
                        Some(Reached::Exact { states, cycles: 0, .. }) => reached.extend(states),
                        Some(bound @ Reached::Bound { .. }) => match bound.only() {
                            Some(only) => reached.push(only),
                            None => sound = false,
                        },
                        _ => sound = false,
                    }
                }
                reached.sort_unstable();
                reached.dedup();
                if !sound || reached.is_empty() || reached.len() > TOGETHER || seen.contains_key(&reached) {
                    continue;
                }
                let input = input(&self.changes(set[0])[place]);
                seen.insert(reached.clone(), (next, input));
                sets.push(reached);
                before.push((next, input));
            }
            next += 1;
            if sets.len() > SETS {
                return None;
            }
        }
        None
    }

    fn parts(&mut self) {
        let mut leads_to: Vec<Vec<u32>> = vec![Vec::new(); self.table.states.len()];
        for way in self.ways.iter().filter(|way| way.class <= Class::Homed) {
            leads_to[way.from as usize].push(way.to);
        }
        self.part = vec![0; leads_to.len()];
        let strong = strong_components(leads_to.len(), |state| &leads_to[state as usize]);
        for (number, group) in strong.groups().enumerate() {
            group.iter().for_each(|state| self.part[*state as usize] = number as u32);
        }
    }

    fn go(&mut self) {
        // what is open stays as long as possible within reach: first what leads back, then what leaves, risks last
        while self.tour.steps.len() < MOST_STEPS {
            let here = self.part[self.at as usize];
            let stays = |way: &Way| self.part[way.to as usize] == here;
            let path = self
                .nearest(|way| way.class == Class::Sure && stays(way))
                .or_else(|| self.nearest(|way| way.class == Class::Homed && stays(way)))
                .or_else(|| self.nearest(|way| way.class == Class::Risky && stays(way)))
                .or_else(|| self.exit());
            match path {
                Some(path) => path.into_iter().for_each(|way| self.take(way)),
                None => break,
            }
        }
        if let Some(path) = self.nearest(|way| way.class == Class::Last) {
            path.into_iter().for_each(|way| self.take(way));
        }
    }

    /// The shortest way, by ways that are known to lead back, to an open change of some kind, and that change.
    fn nearest(&self, wanted: impl Fn(&Way) -> bool) -> Option<Vec<u32>> {
        let here = self.part[self.at as usize];
        let mut before: FxHashMap<StateNumber, u32> = FxHashMap::default();
        let mut open = VecDeque::from([self.at]);
        let mut seen: FxHashSet<StateNumber> = FxHashSet::default();
        seen.insert(self.at);
        while let Some(state) = open.pop_front() {
            let ways = || self.from[state as usize].iter().copied();
            if let Some(way) = ways().find(|way| !self.done.contains(way) && wanted(&self.ways[*way as usize])) {
                let mut path = vec![way];
                let mut at = state;
                while at != self.at {
                    path.push(before[&at]);
                    at = self.ways[before[&at] as usize].from;
                }
                path.reverse();
                return Some(path);
            }
            for way in ways() {
                let it = &self.ways[way as usize];
                let known = it.class <= Class::Homed && self.part[it.to as usize] == here;
                if known && seen.insert(it.to) {
                    before.insert(it.to, way);
                    open.push_back(it.to);
                }
            }
        }
        None
    }

    /// A way out of a part of which all else is done: to where most is open.
    fn exit(&self) -> Option<Vec<u32>> {
        let here = self.part[self.at as usize];
        let leaves = |way: &Way| way.class < Class::Last && way.from != way.to && self.part[way.to as usize] != here;
        let mut open: FxHashMap<u32, usize> = FxHashMap::default();
        let mut best: Option<(usize, u32)> = None;
        for (number, way) in self.ways.iter().enumerate() {
            if self.part[way.from as usize] == here && leaves(way) && !self.done.contains(&(number as u32)) {
                let gain = *open.entry(self.part[way.to as usize]).or_insert_with(|| self.open_beyond(way.to));
                if best.is_none_or(|(most, _)| gain > most) {
                    best = Some((gain, number as u32));
                }
            }
        }
        let chosen = best?.1;
        let target = &self.ways[chosen as usize];
        self.nearest(|way| std::ptr::eq(way, target))
    }

    /// Open changes that can be come by from a state.
    fn open_beyond(&self, state: StateNumber) -> usize {
        let mut seen: FxHashSet<StateNumber> = FxHashSet::default();
        seen.insert(state);
        let mut open = vec![state];
        let mut count = 0;
        while let Some(state) = open.pop() {
            for way in &self.from[state as usize] {
                count += usize::from(!self.done.contains(way));
                let it = &self.ways[*way as usize];
                if it.class <= Class::Homed && seen.insert(it.to) {
                    open.push(it.to);
                }
            }
        }
        count
    }

    fn take(&mut self, way: u32) {
        let it = &self.ways[way as usize];
        self.done.insert(way);
        let mut inputs = vec![it.input];
        inputs.extend(&it.homing);
        let mut values = self.table.states[it.from as usize].values.clone();
        for input in inputs {
            values.flip(input.index());
            self.tour.steps.push((input, values.get(input.index())));
        }
        self.at = it.to;
    }
}
