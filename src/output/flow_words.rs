//! Names and phrases of a flow table, shared by its picture, its tables and its text.

use crate::circuit::NetId;
use crate::flow::{FlowTable, Reached, StateNumber, Transition};
use crate::logic::{Bits, Value};
use crate::output::words;
use crate::scenario::Scenario;
use crate::statics::{Change, Race};

/// A state of the table as every file names it: `S1` is the first.
pub(super) fn state(number: StateNumber) -> String {
    format!("S{}", u64::from(number) + 1)
}

/// Some states: `S1, S4 and 3 more`.
pub(super) fn some_states(numbers: &[StateNumber], most: usize) -> String {
    let names: Vec<String> = numbers.iter().take(most).map(|number| state(*number)).collect();
    match numbers.len().saturating_sub(most) {
        0 => names.join(", "),
        left => format!("{} and {} more", names.join(", "), words::count(left as u64)),
    }
}

/// What moves: `call_upper 0→1, call_lower 1→0`; `nothing` if nothing does.
pub(super) fn moves(scenario: &Scenario, from: &Bits, change: &Change) -> String {
    let each = change.moving(from).map(|(net, bit)| {
        let (old, new) = (Value::from(!bit), Value::from(bit));
        format!("{} {old}→{new}", words::net(scenario, net))
    });
    let text = each.collect::<Vec<_>>().join(", ");
    if text.is_empty() { "nothing".to_string() } else { text }
}

/// What is set: `call_upper=1 call_lower=0`.
pub(super) fn sets(scenario: &Scenario, change: &Change) -> String {
    let each = change.set.iter().map(|(net, bit)| format!("{}={}", words::net(scenario, *net), u8::from(*bit)));
    each.collect::<Vec<_>>().join(" ")
}

/// Most states of a bound in one field of a text.
const BOUND_STATES: usize = 6;

/// The outcome as [`outcome`] has it, but of a bound only the first states.
pub(super) fn short_outcome(reached: &Reached) -> String {
    match reached {
        Reached::Bound { states, .. } if reached.only().is_none() && states.len() > BOUND_STATES => {
            let first: Vec<String> = states[..BOUND_STATES].iter().map(|number| state(*number)).collect();
            format!("? {} or one of {} more", first.join(" or "), states.len() - BOUND_STATES)
        }
        _ => outcome(reached),
    }
}

/// The outcome in one field: `S4`, `S4 or S5`, `S4 or oscillates`, `oscillates`; a bound: `? S4 or S5`, `?` if no state of
/// the table agrees with it, `? S4 or S5 or more` if a limit cut the states.
pub(super) fn outcome(reached: &Reached) -> String {
    let mut words: Vec<String> = reached.states().iter().map(|number| state(*number)).collect();
    match reached {
        Reached::Exact { cycles, .. } => {
            if *cycles > 0 {
                words.push("oscillates".to_string());
            }
            words.join(" or ")
        }
        Reached::Bound { truncated, .. } => {
            if reached.only().is_some() {
                return words.concat();
            }
            if *truncated {
                words.push("more".to_string());
            }
            format!("? {}", words.join(" or ")).trim_end().to_string()
        }
    }
}

/// The word of the method.
pub(super) const fn method(reached: &Reached) -> &'static str {
    match reached {
        Reached::Exact { .. } => "multiple-winner",
        Reached::Bound { .. } => "ternary",
    }
}

/// The race, where it is known.
pub(super) const fn race(reached: &Reached) -> Option<Race> {
    match reached {
        Reached::Exact { race, .. } => Some(*race),
        Reached::Bound { .. } => None,
    }
}

/// May it oscillate for ever, where that is known?
pub(super) const fn oscillates(reached: &Reached) -> Option<bool> {
    match reached {
        Reached::Exact { cycles, .. } => Some(*cycles > 0),
        Reached::Bound { .. } => None,
    }
}

/// The values of a state of the table. A number that the table does not have is a defect of who made it.
pub(super) fn values(table: &FlowTable, number: StateNumber) -> &Bits {
    &table.states[number as usize].values
}

/// From where, and what moves: `from S1 call_upper 0→1`.
pub(super) fn from(scenario: &Scenario, table: &FlowTable, number: StateNumber, change: &Change) -> String {
    format!("from {} {}", state(number), moves(scenario, values(table, number), change))
}

/// The change of one input away from its value in a state: `from S1 call_upper 0→1`.
pub(super) fn single(scenario: &Scenario, table: &FlowTable, number: StateNumber, input: NetId) -> String {
    from(scenario, table, number, &Change::of_one(values(table, number), input))
}

/// The step of a transition in words, or what moves.
pub(super) fn what(scenario: &Scenario, table: &FlowTable, transition: &Transition) -> String {
    let moves = from(scenario, table, transition.from, &transition.change);
    match words::step(scenario, transition.moment) {
        Some(step) => format!("{} ({moves})", words::the_step(step)),
        None => moves,
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::logic::State;

    #[test]
    fn outcomes_in_one_field() {
        let exact = |states: &[u32], cycles| Reached::Exact { states: states.into(), cycles, race: Race::None };
        assert_eq!(outcome(&exact(&[3], 0)), "S4");
        assert_eq!(outcome(&exact(&[3, 4], 0)), "S4 or S5");
        assert_eq!(outcome(&exact(&[3], 2)), "S4 or oscillates");
        assert_eq!(outcome(&exact(&[], 1)), "oscillates");
        let bound = |letter: Value, states: &[u32], truncated| {
            let mut state = State::zeros(2);
            state.set(0, letter);
            Reached::Bound { state, states: states.into(), truncated }
        };
        assert_eq!(outcome(&bound(Value::X, &[0, 1], false)), "? S1 or S2");
        assert_eq!(outcome(&bound(Value::X, &[0], true)), "? S1 or more");
        assert_eq!(outcome(&bound(Value::X, &[], false)), "?");
        assert_eq!(outcome(&bound(Value::One, &[6], false)), "S7", "known everywhere");
    }

    #[test]
    fn lists_of_states_are_cut() {
        assert_eq!(some_states(&[0, 4], 2), "S1, S5");
        assert_eq!(some_states(&[0, 4, 5, 6], 2), "S1, S5 and 2 more");
    }
}
