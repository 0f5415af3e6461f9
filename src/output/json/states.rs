//! Stable states, and what may follow what.

use serde::ser::SerializeMap;
use serde::{Serialize, Serializer};

use super::flow;
use super::listed::beginning;
use super::parts::{Level, Lines, Object, OneLine, values};
use crate::circuit::NetId;
use crate::logic::{Bits, Value};
use crate::output::words;
use crate::review::StatesReport;
use crate::scenario::Scenario;

/// The document, or the part of a review without `format`.
pub(super) struct States<'a> {
    scenario: &'a Scenario,
    report: &'a StatesReport,
    format: Option<u32>,
    most: usize,
}

/// Number of input vectors by how many stable states they have.
#[derive(Serialize)]
struct Vectors<'a> {
    none: &'a str,
    one: &'a str,
    several: &'a str,
}

#[derive(Serialize)]
struct Vector<'a> {
    inputs: OneLine<Object<&'a str, Level>>,
    states: Vec<OneLine<Object<&'a str, Level>>>,
}

impl<'a> States<'a> {
    pub fn of(scenario: &'a Scenario, report: &'a StatesReport, format: Option<u32>, most: usize) -> States<'a> {
        States { scenario, report, format, most }
    }

    /// The rows that are listed.
    fn first_rows(&self) -> &'a [Vec<Option<bool>>] {
        beginning(&self.report.rows, self.most, Vec::len)
    }

    /// The input vectors that are listed.
    fn first_inputs(&self) -> &'a [(Vec<bool>, Vec<Bits>)] {
        let nets = self.scenario.circuit.net_count();
        beginning(&self.report.inputs, self.most, |(inputs, states)| inputs.len() + states.len() * nets)
    }

    fn rows(&self) -> Lines<Object<&'a str, &'static str>> {
        let names = words::nets(self.scenario, &self.report.variables);
        let row = |row: &Vec<Option<bool>>| {
            let letter = |value: &Option<bool>| match value {
                None => "-",
                Some(false) => "0",
                Some(true) => "1",
            };
            Object(names.iter().copied().zip(row.iter().map(letter)).collect())
        };
        Lines(self.first_rows().iter().map(row).collect())
    }

    fn vector(&self, (inputs, states): &'a (Vec<bool>, Vec<Bits>)) -> Vector<'a> {
        let circuit = &*self.scenario.circuit;
        let input = |net: NetId| inputs.get(net.index()).map_or(Value::X, |bit| Value::from(*bit));
        Vector {
            inputs: values(circuit, circuit.inputs(), input),
            states: states
                .iter()
                .map(|bits| values(circuit, circuit.nets(), |net| Value::from(bits.get(net.index()))))
                .collect(),
        }
    }
}

impl Serialize for States<'_> {
    fn serialize<S: Serializer>(&self, to: S) -> Result<S::Ok, S::Error> {
        let (scenario, report, flow) = (self.scenario, self.report, &self.report.flow);
        let vectors = report.vectors.as_ref().map(|[none, one, several]| Vectors { none, one, several });
        let mut map = to.serialize_map(None)?;
        if let Some(format) = self.format {
            map.serialize_entry("format", &format)?;
        }
        map.serialize_entry("count", &report.count)?;
        map.serialize_entry("feedback", &OneLine(words::nets(scenario, &report.feedback)))?;
        map.serialize_entry("state_variables", &OneLine(words::nets(scenario, &report.state_variables)))?;
        map.serialize_entry("state_variables_exact", &report.state_variables_exact)?;
        map.serialize_entry("vectors", &vectors)?;
        map.serialize_entry("rows", &self.rows())?;
        let (rows, inputs) = (self.first_rows().len(), self.first_inputs());
        map.serialize_entry("rows_truncated", &(report.rows_truncated || rows < report.rows.len()))?;
        map.serialize_entry("inputs", &inputs.iter().map(|it| self.vector(it)).collect::<Vec<_>>())?;
        map.serialize_entry("truncated", &(report.inputs_truncated || inputs.len() < report.inputs.len()))?;
        let (most, cuts) = (self.most, flow::cuts(scenario, flow, self.most));
        map.serialize_entry("table", &flow::table(scenario, flow, most))?;
        map.serialize_entry("table_count", &flow.table.states.len())?;
        map.serialize_entry("table_truncated", &(flow.table.states_truncated || cuts.table))?;
        map.serialize_entry("start", &flow::start(scenario, flow, most))?;
        map.serialize_entry("start_truncated", &cuts.start)?;
        map.serialize_entry("transitions", &flow::transitions(scenario, flow, most))?;
        map.serialize_entry("transitions_count", &(flow.table.steps.len() + flow.table.single.len()))?;
        let truncated = flow.table.states_truncated || flow.table.steps_truncated || cuts.transitions;
        map.serialize_entry("transitions_truncated", &truncated)?;
        map.serialize_entry("transition_notes", &flow.table.notes)?;
        map.serialize_entry("coverage", &flow::coverage(scenario, flow, most))?;
        map.serialize_entry("automaton", &flow::automaton(scenario, flow, most))?;
        map.serialize_entry("hazards", &flow::hazards(scenario, flow, most))?;
        map.serialize_entry("hazards_truncated", &(flow.hazards_truncated || cuts.hazards))?;
        map.serialize_entry("hazards_not_judged", &flow.hazards_not_judged)?;
        map.serialize_entry("reference", &flow::reference(scenario, flow, most))?;
        map.end()
    }
}

/// The document of `states`. A list of states ends before it holds more than `most` values of nets
/// ([`MOST_VALUES`](super::MOST_VALUES) by default), but not before its first entry; counts are exact all the same.
pub fn states(scenario: &Scenario, report: &StatesReport, most: usize) -> String {
    super::document(&States::of(scenario, report, Some(super::FORMAT), most))
}
