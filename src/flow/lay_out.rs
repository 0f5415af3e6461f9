//! Steps that make every single-input change from every reachable stable state.

use std::sync::Arc;

use super::table::{Limits, table};
use super::tour::{MOST_STEPS, tour};
use super::{FlowError, StateNumber};
use crate::circuit::NetId;
use crate::control::Control;
use crate::logic::Bits;
use crate::scenario::{Place, Scenario, Step, Walk};

/// Changes that are named where they are left out.
const NAMED: usize = 4;

/// Adds the steps that a scenario with [`Walk::ToLayOut`] asks for: each changes one input at rest, and together they make
/// every such change from every stable state that can be reached. Any other scenario comes back as it is.
///
/// What cannot be walked (beyond a state that cannot be left, after an outcome from which no sequence of changes leads
/// back into one certain state, or past a limit) is named in [`Scenario::not_analysed`], since it was asked for.
///
/// ```
/// use stillgate::control::Control;
/// use stillgate::scenario::{Builder, Mark, Walk};
/// use stillgate::circuit::Function;
///
/// let mut c_element = Builder::new("C-element");
/// c_element.input("a", false).input("b", false);
/// c_element.gate("c", Function::Majority, ["a", "b", "c"]);
/// c_element.every_single_change(Mark::default());
/// let asked = c_element.finish().unwrap();
/// let walked = stillgate::flow::lay_out(asked, &Control::default()).unwrap();
/// assert_eq!(walked.stimulus.walk, Walk::LaidOut);
/// // six stable states, two inputs
/// let flow = stillgate::flow::flow(&walked, &[], &Control::default()).unwrap();
/// assert_eq!((flow.coverage.exercised, flow.coverage.all), (12, 12));
/// assert!(walked.not_analysed.is_empty());
/// ```
///
/// Errors: see [`FlowError`].
pub fn lay_out(mut scenario: Scenario, control: &Control) -> Result<Scenario, FlowError> {
    let Walk::ToLayOut { rest, mark } = scenario.stimulus.walk else { return Ok(scenario) };
    let table = table(&scenario, Limits::default(), control)?;
    let tour = tour(&table);
    let wanted = table.single.iter().filter(|it| table.states[it.from as usize].reachable).count();
    let circuit = Arc::clone(&scenario.circuit);

    let stimulus = Arc::make_mut(&mut scenario.stimulus);
    stimulus.walk = Walk::LaidOut;
    let mut edges = vec![[0u32; 2]; circuit.input_count()];
    for (input, bit) in &tour.steps {
        let number = &mut edges[input.index()][usize::from(*bit)];
        *number += 1;
        stimulus.add_step(Step {
            label: format!("{} {} #{number}", circuit.name(*input), if *bit { "rise" } else { "fall" }),
            place: Place::Rest(rest),
            set: vec![(*input, *bit)],
            skew: None,
            bounce: None,
            expect: None,
            edges: Vec::new(),
            settle_within: None,
            oscillation: None,
            mark,
        });
    }

    let made = wanted - tour.left_out.len();
    let steps = tour.steps.len();
    let make = if steps == 1 { "step makes" } else { "steps make" };
    scenario
        .notes
        .push(format!("stimulus: {steps} {make} {made} of {wanted} single-input changes from reachable stable states"));
    if !tour.left_out.is_empty() {
        let said = |(state, input): &(StateNumber, NetId)| {
            let values = &table.states[*state as usize].values;
            format!("{} at {}", circuit.name(*input), at(&scenario, values))
        };
        let named: Vec<String> = tour.left_out.iter().take(NAMED).map(said).collect();
        let more = match tour.left_out.len().saturating_sub(NAMED) {
            0 => String::new(),
            more => format!(" and {more} more"),
        };
        let why = if steps >= MOST_STEPS {
            "too many steps"
        } else if table.states_truncated {
            "a limit cut the flow table, or no sequence of changes leads there for sure"
        } else {
            "no sequence of changes leads there for sure, whatever the delays"
        };
        let sentence = format!("stimulus: not every single change is walked ({why}): {}{more}", named.join("; "));
        scenario.not_analysed.push(sentence);
    }
    if table.states_truncated {
        let sentence = "stimulus: not every single change is walked: a limit cut the flow table";
        scenario.not_analysed.push(sentence.to_string());
    }
    Ok(scenario)
}

/// A state by its inputs and outputs.
fn at(scenario: &Scenario, values: &Bits) -> String {
    const NETS: usize = 8;
    let nets: Vec<NetId> = scenario.circuit.inputs().chain(scenario.outputs.iter().copied()).collect();
    let some = nets
        .iter()
        .take(NETS)
        .map(|net| format!("{}={}", scenario.circuit.name(*net), u8::from(values.get(net.index()))));
    let more = if nets.len() > NETS { " ..." } else { "" };
    some.collect::<Vec<_>>().join(" ") + more
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::flow::flow;

    fn walked(text: &str) -> Scenario {
        let text = format!("stimulus = \"every single change\"\n{text}");
        crate::reader::read(&text, "walk.toml").unwrap_or_else(|it| panic!("{}", it.render(false))).scenario
    }

    /// Of how many changes how many are surely made, by the flow table of the laid out steps.
    fn covered(scenario: &Scenario) -> (u64, u64) {
        let coverage = flow(scenario, &[], &Control::default()).unwrap().coverage;
        (coverage.exercised, coverage.all)
    }

    const SELECTOR: &str = r#"
        [inputs]
        a = 0
        b = 0
        [gates]
        q = { nand = ["a", "qn"] }
        qn = { nand = ["b", "q"] }
        out = { and = ["q", "qn"] }
    "#;

    #[test]
    fn a_latch_without_races_is_walked_as_a_whole() {
        let scenario = walked(SELECTOR);
        assert_eq!(covered(&scenario), (10, 10));
        assert!(scenario.not_analysed.is_empty(), "{:?}", scenario.not_analysed);
        assert!(scenario.notes.iter().any(|note| note.contains("10 of 10")), "{:?}", scenario.notes);
        let labels: Vec<&str> = scenario.stimulus.moments.iter().map(|moment| moment.label.as_str()).collect();
        assert_eq!(labels[0], "a rise #1");
        let mut unique = labels.clone();
        unique.sort_unstable();
        unique.dedup();
        assert_eq!(unique.len(), labels.len());
    }

    #[test]
    fn a_long_walk_is_covered_as_a_whole() {
        // 512 input vectors, 9 changes each: the steps alone are more than half of a table's usual limit
        let names: Vec<String> = (0..8).map(|i| format!("i{i}")).collect();
        let inputs: String = names.iter().map(|name| format!("{name} = 0\n")).collect();
        let pins = names.iter().map(|name| format!("\"{name}\"")).collect::<Vec<_>>().join(", ");
        let scenario = walked(&format!("[inputs]\n{inputs}j = 0\n[gates]\nout = {{ xor = [{pins}, \"j\"] }}\n"));
        assert!(scenario.stimulus.steps.len() > 4096);
        assert_eq!(covered(&scenario), (4608, 4608));
        assert!(scenario.not_analysed.is_empty(), "{:?}", scenario.not_analysed);
    }

    #[test]
    fn after_a_race_the_walk_finds_its_way_back() {
        // a falls: q = a & !n (n follows a late) may pulse and set the latch, or not; set or reset decides it again
        let text = r#"
            [inputs]
            a = 0
            set = 0
            reset = 0
            [initial]
            q = 0
            [gates]
            n = { not = ["a"] }
            p = { and = ["a", "n"] }
            q = { expr = "(p | q | set) & !reset" }
        "#;
        let scenario = walked(text);
        let (made, all) = covered(&scenario);
        // two states where neither set nor reset says which, else one: 10 states, 3 inputs
        assert_eq!((made, all), (30, 30), "{:?} {:?}", scenario.notes, scenario.not_analysed);
        assert!(scenario.not_analysed.is_empty(), "{:?}", scenario.not_analysed);
    }

    #[test]
    fn what_cannot_be_walked_is_named() {
        // each push may set the latch, and nothing clears it: after the first one nobody knows
        let text = r#"
            outputs = ["q"]
            [inputs]
            push = 0
            [initial]
            q = 0
            [gates]
            late = { not = ["push"] }
            pulse = { and = ["push", "late"] }
            q = { or = ["pulse", "q"] }
        "#;
        let scenario = walked(text);
        assert_eq!(scenario.stimulus.steps.len(), 1);
        let said = scenario.not_analysed.join("\n");
        assert!(said.contains("push at push=1 q=0"), "{said}");
        assert_eq!(covered(&scenario), (1, 4));
    }

    #[test]
    fn what_leaves_for_good_comes_last() {
        // a trap: once armed and fired it stays so; before, all else is walked
        let text = r#"
            outputs = ["fired"]
            [inputs]
            arm = 0
            look = 0
            [initial]
            fired = 0
            [gates]
            fired = { expr = "fired | arm & look" }
        "#;
        let scenario = walked(text);
        let (made, all) = covered(&scenario);
        // unfired: 3 input vectors; of the two ways to fire only one can be taken
        assert_eq!((made, all), (13, 14), "{:?}", scenario.stimulus.moments);
        assert_eq!(scenario.not_analysed.len(), 1);
    }
}
