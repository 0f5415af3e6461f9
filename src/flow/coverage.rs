//! Which single-input changes the steps exercise.

use rustc_hash::FxHashMap;

use super::{Coverage, FlowTable, StateNumber};
use crate::circuit::NetId;

impl Coverage {
    /// Of all single-input changes from reachable states, which the steps make. Steps and clock edges count that change
    /// just one input; one that several inputs share is no such change.
    pub fn of(table: &FlowTable) -> Coverage {
        let input_of = |from: StateNumber, change: &crate::statics::Change| -> Option<NetId> {
            change.single(&table.states[from as usize].values)
        };
        let mut made: FxHashMap<(StateNumber, NetId), bool> = FxHashMap::default();
        for step in &table.steps {
            if let Some(input) = input_of(step.from, &step.change) {
                *made.entry((step.from, input)).or_default() |= step.sure;
            }
        }
        let mut coverage =
            Coverage { truncated: table.states_truncated || table.steps_truncated, ..Coverage::default() };
        for single in table.single.iter().filter(|single| table.states[single.from as usize].reachable) {
            let Some(input) = input_of(single.from, &single.change) else { continue };
            coverage.all += 1;
            match made.get(&(single.from, input)) {
                Some(true) => coverage.exercised += 1,
                Some(false) => coverage.perhaps.push((single.from, input)),
                None => coverage.missing.push((single.from, input)),
            }
        }
        coverage
    }
}
