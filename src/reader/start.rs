//! Is there just one stable state to begin in?

use crate::circuit::NetId;
use crate::control::Control;
use crate::logic::Bits;
use crate::scenario::{Begin, Fault, Mark, Scenario};
use crate::statics::{self, GaveUp, NoRest};

/// Candidates that are written out.
const LISTED: usize = 6;
/// Nets of one candidate that are written out.
const NETS: usize = 12;

/// The fault of a scenario that begins at rest, but not in one certain stable state.
pub(super) fn check(scenario: &Scenario, mark: Mark) -> Option<Fault> {
    let Begin::AtRest { named } = &scenario.begin else { return None };
    let circuit = &*scenario.circuit;
    let error = statics::rest(circuit, &scenario.stimulus.initial, named, &Control::default()).err()?;
    Some(match error {
        NoRest::None => Fault::new(
            mark,
            "the circuit has no stable state with these inputs, so it cannot begin at rest",
            "give the inputs other values, or write `begin = \"random\"`",
        ),
        NoRest::Contradiction { net } => Fault::new(
            mark,
            format!("no stable state with these inputs has the values in `[initial]`, up to `{}`", circuit.name(net)),
            format!("give `{}` the other value, or leave it out", circuit.name(net)),
        ),
        NoRest::Several { candidates, total, open } => {
            let states: Vec<String> =
                candidates.iter().take(LISTED).map(|state| written(scenario, state, &open)).collect();
            let more = if total > states.len().into() { ", ..." } else { "" };
            Fault::new(
                mark,
                format!("the circuit can begin in {total} stable states: {}{more}", states.join(", ")),
                "name enough nets in `[initial]` to leave one, or write `begin = \"random\"`",
            )
        }
        NoRest::GaveUp(GaveUp::Budget { .. } | GaveUp::Cancelled) => Fault::new(
            mark,
            "the stable state to begin in could not be found: the circuit is too large for its decision diagram",
            "name more nets in `[initial]`, or write `begin = \"random\"`",
        ),
    })
}

/// The values of the nets on which candidates differ, as they would stand in `[initial]`.
fn written(scenario: &Scenario, state: &Bits, open: &[NetId]) -> String {
    let each = open
        .iter()
        .take(NETS)
        .map(|net| format!("{} = {}", scenario.circuit.name(*net), u8::from(state.get(net.index()))));
    let more = if open.len() > NETS { ", ..." } else { "" };
    format!("{{ {}{more} }}", each.collect::<Vec<_>>().join(", "))
}
