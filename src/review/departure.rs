//! What a departure from the reference is, in words.

use crate::circuit::NetId;
use crate::findings::Against;
use crate::logic::{State, Value};
use crate::scenario::Scenario;

/// Nets named of one state, at most.
const NETS: usize = 8;
/// Alternatives named, at most.
const ALTERNATIVES: usize = 3;

/// The states of a departure in words, on the nets that tell them apart.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct DepartureWords {
    /// Inputs and compared nets before: `call=0 permit=1`; `None` if the step did not come at rest.
    pub before: Option<String>,
    /// Compared nets where it ended: `permit=0`.
    pub reached: String,
    /// What the reference allows of them: `permit=1 or permit=0 lamp=0`, or why there is nothing.
    pub allowed: String,
}

/// The states of a departure in words. With `all` nothing is cut, and the states before and reached show every net.
///
/// Panics if the scenario has no reference: then nothing departs from it.
pub fn departure_words(scenario: &Scenario, against: &Against, all: bool) -> DepartureWords {
    let reference = scenario.reference.as_ref().expect("what departs from a reference has one");
    let (circuit, departure, allowed) = (&*scenario.circuit, &against.departure, &against.allowed);
    let compared: Vec<NetId> = reference.compare.iter().map(|(net, _)| *net).collect();
    // of many nets those that differ come first
    let differs = |at: usize| {
        let reached = departure.reached.get(compared[at].index());
        allowed.values.iter().any(|values| Value::from(values[at]) != reached)
    };
    let mut columns: Vec<usize> = (0..compared.len()).collect();
    let cut = !all && columns.len() > NETS;
    if cut {
        columns.sort_by_key(|at| !differs(*at));
        columns.truncate(NETS);
        columns.sort_unstable();
    }
    let join = |parts: Vec<String>, cut: bool| parts.join(" ") + if cut { " …" } else { "" };
    let value = |net: NetId, value: Value| format!("{}={value}", circuit.name(net));
    let shown = |values: &dyn Fn(usize) -> Value| {
        join(columns.iter().map(|at| value(compared[*at], values(*at))).collect(), cut)
    };
    let whole = |state: &State| join(circuit.nets().map(|net| value(net, state.get(net.index()))).collect(), false);

    let before = departure.before.as_ref().map(|state| match all {
        true => whole(state),
        false => {
            let inputs = circuit.inputs().take(NETS).map(|net| value(net, state.get(net.index())));
            let inputs = join(inputs.collect(), circuit.input_count() > NETS);
            let gates = columns.iter().map(|at| compared[*at]).filter(|net| !circuit.is_input(*net));
            let gates = join(gates.map(|net| value(net, state.get(net.index()))).collect(), cut);
            [inputs, gates].into_iter().filter(|it| !it.is_empty()).collect::<Vec<_>>().join(" ")
        }
    });
    let reached = match all {
        true => whole(&departure.reached),
        false => shown(&|at| departure.reached.get(compared[at].index())),
    };
    let most = if all { usize::MAX } else { ALTERNATIVES };
    let mut alternatives: Vec<String> =
        allowed.values.iter().map(|values| shown(&|at| Value::from(values[at]))).collect();
    if cut {
        alternatives.sort_unstable();
        alternatives.dedup();
    }
    let more = alternatives.len().saturating_sub(most);
    alternatives.truncate(most);
    let mut text = alternatives.join(" or ");
    match (text.is_empty(), allowed.open) {
        (true, true) => text = "other states (too many to list)".to_string(),
        (true, false) if departure.before.is_some() => text = "nothing from there".to_string(),
        (true, false) => text = "nothing with these inputs".to_string(),
        (false, true) => text += " or others",
        (false, false) if more > 0 => text += &format!(" or {more} others"),
        (false, false) => {}
    }
    DepartureWords { before, reached, allowed: text }
}
