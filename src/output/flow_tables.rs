//! The flow table as CSV: states with what follows each change of one input, and transitions one by one.

use crate::circuit::NetId;
use crate::flow::Transition;
use crate::logic::Bits;
use crate::output::tables::{write, yes_no};
use crate::output::{flow_words, words};
use crate::review::StatesReport;
use crate::scenario::Scenario;

/// The flow table: one row a stable state, in the order of the table; then one row, with empty gates, for every input
/// vector that has no stable state.
///
/// Columns: state (`S1`), reachable (from the start; yes or no), start (may a run begin there?), then every net with its
/// value, in net order; then for each input one headed `change NET`: what follows when this input alone changes.
/// `S4`; after a critical race `S4 or S5`; `oscillates`, or `S4 or oscillates`; where only a bound is known `?` and the
/// states that agree with it, `? S4 or S5`, with `or more` if a limit cut them; empty if it was not looked at. A list that
/// a limit cut ends early; the text and the JSON say so.
pub fn states(scenario: &Scenario, report: &StatesReport) -> String {
    let circuit = &scenario.circuit;
    let table = &report.flow.table;
    write(|to| {
        let fixed = ["state", "reachable", "start"].map(String::from).into_iter();
        let nets = circuit.nets().map(|net| circuit.name(net).to_string());
        let changes = circuit.inputs().map(|net| format!("change {}", circuit.name(net)));
        to.write_record(fixed.chain(nets).chain(changes))?;
        let mut starts = vec![false; table.states.len()];
        for start in &table.start {
            starts[*start as usize] = true;
        }
        let mut rest = &table.single[..];
        for (number, state) in (0..).zip(&table.states) {
            // transitions are sorted by state
            let own = rest.iter().take_while(|transition| transition.from == number).count();
            let (own, others) = rest.split_at(own);
            rest = others;
            let mut row = vec![flow_words::state(number), yes_no(state.reachable), yes_no(starts[number as usize])];
            row.extend(circuit.nets().map(|net| digit(&state.values, net)));
            let mut outcomes = vec![String::new(); circuit.input_count()];
            for transition in own {
                if let Some(input) = transition.change.single(&state.values) {
                    outcomes[input.index()] = flow_words::outcome(&transition.to);
                }
            }
            row.extend(outcomes);
            to.write_record(&row)?;
        }
        for (inputs, _) in report.inputs.iter().filter(|(_, states)| states.is_empty()) {
            let values = circuit.nets().map(|net| match inputs.get(net.index()) {
                Some(bit) => u8::from(*bit).to_string(),
                None => String::new(),
            });
            let changes = circuit.inputs().map(|_| String::new());
            to.write_record(std::iter::repeat_n(String::new(), 3).chain(values).chain(changes))?;
        }
        Ok(())
    })
}

/// Transitions: one row each, those of steps first, in their order, then those of single inputs by state.
///
/// Columns: step (its label; empty for a change of a single input), from (the state), change (`a=1 b=0`, the inputs that
/// are set), outcomes (`S4`, `S4 or S5`, as in [`states`]), oscillation, race (none, non-critical, critical), method
/// (multiple-winner, or ternary: then oscillation and race are not known and empty), essential (hazard, by Unger's test;
/// empty where that does not say), sure (for steps: is it sure that the step meets this state?).
pub fn transitions(scenario: &Scenario, report: &StatesReport) -> String {
    let table = &report.flow.table;
    write(|to| {
        to.write_record(["step", "from", "change", "outcomes", "oscillation", "race", "method", "essential", "sure"])?;
        for transition in table.steps.iter().chain(&table.single) {
            to.write_record(row(scenario, transition))?;
        }
        Ok(())
    })
}

fn row(scenario: &Scenario, transition: &Transition) -> [String; 9] {
    let reached = &transition.to;
    [
        words::step(scenario, transition.moment).unwrap_or_default().to_string(),
        flow_words::state(transition.from),
        flow_words::sets(scenario, &transition.change),
        flow_words::outcome(reached),
        flow_words::oscillates(reached).map_or_else(String::new, yes_no),
        flow_words::race(reached).map_or("", |race| race.word()).to_string(),
        flow_words::method(reached).to_string(),
        transition.essential.map_or_else(String::new, yes_no),
        if transition.moment.is_some() { yes_no(transition.sure) } else { String::new() },
    ]
}

fn digit(values: &Bits, net: NetId) -> String {
    u8::from(values.get(net.index())).to_string()
}
