//! From transitions to arrows: what makes the same change with the same outcome is one.

use rustc_hash::{FxHashMap, FxHashSet};

use crate::flow::{FlowTable, Reached, StateNumber, Transition};
use crate::logic::Bits;
use crate::scenario::Scenario;
use crate::statics::Change;

/// Where an arrow may end, in its column.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub(super) enum Place {
    /// At the box of a stable state.
    State(StateNumber),
    /// It never comes to rest.
    Loop,
    /// Only a bound is known.
    Unknown,
}

/// One arrow: a change from a state, with all that may follow.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(super) struct Arrow {
    pub from: StateNumber,
    /// The inputs after the change.
    pub inputs: Bits,
    pub to: Vec<Place>,
    pub change: Change,
    /// The moments that make it; none for a change that no step makes.
    pub moments: Vec<u32>,
    /// Is it sure that some step of these meets the state?
    pub sure: bool,
}

impl Arrow {
    fn new(scenario: &Scenario, table: &FlowTable, transition: &Transition) -> Arrow {
        let from = &table.states[transition.from as usize].values;
        let inputs = scenario.circuit.inputs().map(|net| from.get(net.index()));
        let mut inputs = Bits::of(inputs);
        for (net, bit) in &transition.change.set {
            inputs.set(net.index(), *bit);
        }
        Arrow {
            from: transition.from,
            inputs,
            to: places(&transition.to),
            change: transition.change.clone(),
            moments: transition.moment.into_iter().collect(),
            sure: transition.sure,
        }
    }

    /// Does it fork?
    pub fn is_race(&self) -> bool {
        self.to.len() > 1
    }
}

/// Where a transition ends.
fn places(reached: &Reached) -> Vec<Place> {
    match reached {
        Reached::Exact { states, cycles, .. } => {
            let rests = states.iter().map(|number| Place::State(*number));
            // where nothing is known to follow, nothing is known
            let other = if *cycles > 0 { Some(Place::Loop) } else { states.is_empty().then_some(Place::Unknown) };
            rests.chain(other).collect()
        }
        Reached::Bound { .. } => vec![reached.only().map_or(Place::Unknown, Place::State)],
    }
}

/// All arrows of a table.
pub(super) struct Arrows {
    /// Of steps, in the order in which they come.
    pub steps: Vec<Arrow>,
    /// Of single-input changes that no step makes, by state, then by input.
    pub single: Vec<Arrow>,
    /// Steps that change nothing where they come.
    pub idle: usize,
}

impl Arrows {
    pub fn of(scenario: &Scenario, table: &FlowTable) -> Arrows {
        let mut all = Arrows { steps: Vec::new(), single: Vec::new(), idle: 0 };
        let mut index: FxHashMap<(StateNumber, Bits, Vec<Place>), usize> = FxHashMap::default();
        let mut made: FxHashSet<(StateNumber, Bits)> = FxHashSet::default();
        for transition in &table.steps {
            let from = &table.states[transition.from as usize].values;
            if transition.change.moving(from).next().is_none() {
                all.idle += 1;
                continue;
            }
            let arrow = Arrow::new(scenario, table, transition);
            if transition.change.single(from).is_some() {
                made.insert((arrow.from, arrow.inputs.clone()));
            }
            let key = (arrow.from, arrow.inputs.clone(), arrow.to.clone());
            match index.get(&key) {
                Some(known) => {
                    let known: &mut Arrow = &mut all.steps[*known];
                    known.moments.extend(arrow.moments);
                    known.sure |= arrow.sure;
                }
                None => {
                    index.insert(key, all.steps.len());
                    all.steps.push(arrow);
                }
            }
        }
        let single = table.single.iter().map(|transition| Arrow::new(scenario, table, transition));
        all.single = single.filter(|arrow| !made.contains(&(arrow.from, arrow.inputs.clone()))).collect();
        all
    }
}
