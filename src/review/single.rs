//! Single runs, and the delay-free view.

use super::ReviewError;
use super::report::{RunReport, StatesReport};
use crate::control::Control;
use crate::engine::{Deaf, Observer, Program, Trace};
use crate::findings::{Answers, Asked, Judge};
use crate::flow::{Flow, flow};
use crate::instance::{Instance, Which};
use crate::scenario::Scenario;
use crate::statics::{GaveUp, StateSet};

/// Input vectors whose stable states are listed, at most.
const VECTORS: usize = 1024;
/// Values listed in all of them.
const VALUES: usize = 1 << 20;
/// Stable states listed for one input vector.
const STATES: usize = 64;
/// Rows of the state set that are listed, and values in all of them.
const ROWS: usize = 4096;
const ROW_VALUES: usize = 1 << 18;
/// Stable states looked at to find the fewest state variables.
const LOOKED_AT: usize = 1 << 16;

/// Most entries of the trace of a run; see [`Trace::at_most`]. What comes later is judged and counted, and not kept.
pub const MOST_KEPT: u64 = 1 << 20;

/// Runs one case with all judges. `None`: the control cancelled it.
pub fn run_one(
    scenario: &Scenario,
    program: &Program,
    asked: &Asked,
    which: Which,
    control: &Control,
) -> Option<RunReport> {
    run_heard(scenario, program, asked, which, control, Deaf).0
}

/// As [`run_one`], with one more observer, which is given back.
pub fn run_heard<O: Observer<Tag = ()>>(
    scenario: &Scenario,
    program: &Program,
    asked: &Asked,
    which: Which,
    control: &Control,
    observer: O,
) -> (Option<RunReport>, O) {
    let instance = Instance::of(scenario, &which);
    let judge = Judge::new(scenario, asked, Answers::default());
    let mut observers = ((Trace::at_most(MOST_KEPT), judge), observer);
    if !program.machine().hear(&instance, control, &mut observers) {
        return (None, observers.1);
    }
    let ((trace, judge), observer) = observers;
    let Answers { mut facts, judged, mut not_judged, departures } = judge.sink;
    not_judged.sort_unstable();
    facts.sort_by_key(|fact| (!fact.breaks_rule, fact.subject.kind, std::cmp::Reverse(fact.measure), fact.subject));
    let allowed = asked.allowed.iter();
    let against = allowed.flat_map(|allowed| departures.iter().map(|it| it.against(allowed))).collect();
    (Some(RunReport { which, instance, trace, facts, judged, not_judged, against }), observer)
}

/// All stable states of a circuit, and what may follow what. What a budget or limit cuts is said in the report.
///
/// Errors: two delay-free methods contradict each other, or the caller asked to stop.
pub fn states(scenario: &Scenario, control: &Control) -> Result<StatesReport, ReviewError> {
    let circuit = &*scenario.circuit;
    let mut report = StatesReport {
        count: None,
        feedback: circuit.feedback().to_vec(),
        state_variables: Vec::new(),
        state_variables_exact: false,
        variables: circuit.inputs().chain(circuit.feedback().iter().copied()).collect(),
        rows: Vec::new(),
        rows_truncated: true,
        inputs: Vec::new(),
        inputs_truncated: true,
        vectors: None,
        flow: Flow::default(),
    };
    // where they are not known, feedback nets tell the states apart as well
    let mut variables = circuit.feedback().to_vec();
    match StateSet::of(circuit, control) {
        Ok(set) => {
            list(&set, circuit.net_count(), &mut report);
            if let Ok(found) = set.state_variables(LOOKED_AT) {
                variables.clone_from(&found.nets);
                (report.state_variables, report.state_variables_exact) = (found.nets, found.exact);
            }
        }
        Err(GaveUp::Cancelled) => return Err(ReviewError::Cancelled),
        Err(GaveUp::Budget { .. }) => {}
    }
    report.flow = flow(scenario, &variables, control)?;
    Ok(report)
}

/// Counts and lists the states of a set, each list as far as its limit goes.
fn list(set: &StateSet<'_>, nets: usize, report: &mut StatesReport) {
    report.count = Some(set.count().to_string());
    let rows = set.rows(ROWS.min(ROW_VALUES / set.variables().len().max(1)).max(1));
    (report.rows, report.rows_truncated) = (rows.rows, rows.truncated);
    let mut left = VALUES;
    let mut vectors = set.by_inputs(VECTORS, STATES);
    report.inputs_truncated = vectors.truncated();
    for vector in &mut vectors {
        let values = vector.states.len().max(1) * nets;
        report.inputs_truncated |= vector.truncated || values > left;
        if values > left {
            break;
        }
        left -= values;
        report.inputs.push((vector.inputs, vector.states));
    }
    if let Ok(counts) = set.vector_counts() {
        report.vectors = Some([counts.none.to_string(), counts.one.to_string(), counts.several.to_string()]);
    }
}
