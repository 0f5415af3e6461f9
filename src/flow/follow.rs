//! What may follow a change of a scenario's circuit, by the method that its parts allow.

use super::FlowError;
use crate::circuit::Circuit;
use crate::control::Control;
use crate::delay::Filter;
use crate::logic::{Bits, State};
use crate::scenario::Scenario;
use crate::statics::{self, Change, GaveUp, Outcome};

/// Is the multiple-winner method valid for this scenario: is every gate inertial, and has no wire a delay? Else a pulse may
/// arrive after its cause is over, and only ternary simulation bounds what follows (Mendler, Shiple, Berry, "Constructive
/// Boolean circuits and the exactness of timed ternary simulation", Formal Methods in System Design 40, 2012).
pub fn winners_are_valid(scenario: &Scenario) -> bool {
    let inertial = |filter: &Filter| *filter == Filter::Inertial;
    scenario.circuit.wire_count() == 0 && scenario.delays.filter.iter().all(inertial)
}

/// What may follow a change from a stable state of the scenario's circuit: exact where that is valid and within budget,
/// else the ternary bound. `restless`: inputs may move back and forth before they stay, which only the bound covers.
///
/// Errors: the two methods contradict each other, or the caller asked to stop.
pub fn follow(
    scenario: &Scenario,
    from: &Bits,
    change: &Change,
    restless: bool,
    control: &Control,
) -> Result<Outcome, FlowError> {
    let circuit = &*scenario.circuit;
    if restless {
        return Ok(Outcome::Bound(statics::bound_restless(circuit, from, change).1));
    }
    let bound = statics::bound(circuit, from, change).1;
    if !winners_are_valid(scenario) {
        return Ok(Outcome::Bound(bound));
    }
    let outcome = statics::outcome(circuit, from, change, control).map_err(|_: GaveUp| FlowError::Cancelled)?;
    match contradiction(circuit, &outcome, &bound) {
        Some(what) => Err(FlowError::Contradiction(what)),
        None => Ok(outcome),
    }
}

/// What is wrong with an outcome beside its ternary bound: every state that the exact method reaches is stable and agrees
/// with the bound, nothing oscillates where all is known, and something follows.
pub(super) fn contradiction(circuit: &Circuit, outcome: &Outcome, bound: &State) -> Option<String> {
    let Outcome::Exact { states, cycles, .. } = outcome else { return None };
    for state in states {
        if let Some(net) = outside(circuit, state, bound) {
            return Some(format!(
                "the multiple-winner method reaches a state in which `{net}` has another value than ternary simulation gives"
            ));
        }
        if !statics::is_stable(circuit, &State::known(state.clone())) {
            return Some("the multiple-winner method ends in a state that is not stable".into());
        }
    }
    if *cycles > 0 && !bound.has_unknown() {
        return Some(
            "the multiple-winner method finds a lasting cycle where ternary simulation gives one state".into(),
        );
    }
    let nothing = states.is_empty() && *cycles == 0;
    nothing.then(|| "the multiple-winner method finds neither rest nor a lasting cycle".into())
}

/// The first net of a state that has another value than the bound, where that is known.
pub fn outside<'a>(circuit: &'a Circuit, state: &Bits, bound: &State) -> Option<&'a str> {
    let differs = |net: usize| !bound.unknown.get(net) && bound.ones.get(net) != state.get(net);
    circuit.nets().find(|net| differs(net.index())).map(|net| circuit.name(net))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::flow::tests::scenario;
    use crate::logic::Value;
    use crate::statics::Race;

    #[test]
    fn methods_that_contradict_each_other_are_caught() {
        let latch = scenario(
            "outputs = [\"q\"]\n[inputs]\nr = 0\ns = 0\n[initial]\nq = 0\n[gates]\nq = { nor = [\"r\", \"qn\"] }\n\
             qn = { nor = [\"s\", \"q\"] }\n",
        );
        let bits = |word: &str| Bits::of(word.chars().map(|letter| letter == '1').collect::<Vec<_>>().into_iter());
        let said = |states: &[&str], cycles, bound: &State| {
            let states = states.iter().map(|word| bits(word)).collect();
            contradiction(&latch.circuit, &Outcome::Exact { states, cycles, race: Race::None }, bound)
        };
        let set = State::known(bits("0110"));
        let mut open = State::known(bits("0000"));
        for net in [2, 3] {
            open.set(net, Value::X);
        }
        assert_eq!(said(&["0110"], 0, &set), None);
        assert_eq!(said(&["0001", "0010"], 1, &open), None);
        for (states, cycles, bound, what) in [
            (&["0010"][..], 0, &set, "`s` has another value"),
            (&["0011"], 0, &open, "not stable"),
            (&["0110"], 1, &set, "lasting cycle"),
            (&[], 0, &open, "neither rest"),
        ] {
            let said = said(states, cycles, bound).unwrap_or_default();
            assert!(said.contains(what), "{said}");
        }
        assert_eq!(contradiction(&latch.circuit, &Outcome::Bound(open.clone()), &open), None);
    }
}
