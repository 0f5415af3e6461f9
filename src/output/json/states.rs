//! Stable states.

use serde::Serialize;

use super::parts::{Level, Lines, Object, OneLine, values};
use crate::circuit::NetId;
use crate::logic::Value;
use crate::output::words;
use crate::review::StatesReport;
use crate::scenario::Scenario;

#[derive(Serialize)]
pub(super) struct States<'a> {
    #[serde(skip_serializing_if = "Option::is_none")]
    format: Option<u32>,
    count: Option<&'a str>,
    feedback: OneLine<Vec<&'a str>>,
    state_variables: OneLine<Vec<&'a str>>,
    state_variables_exact: bool,
    vectors: Option<Vectors<'a>>,
    rows: Lines<Object<&'a str, &'static str>>,
    rows_truncated: bool,
    inputs: Vec<Vector<'a>>,
    truncated: bool,
    transitions: [(); 0],
    transitions_truncated: bool,
    transitions_analysed: bool,
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
    pub fn of(scenario: &'a Scenario, report: &'a StatesReport, format: Option<u32>) -> States<'a> {
        let circuit = &*scenario.circuit;
        let row = |row: &Vec<Option<bool>>| {
            let letter = |value: &Option<bool>| match value {
                None => "-",
                Some(false) => "0",
                Some(true) => "1",
            };
            let names = words::nets(scenario, &report.variables);
            Object(names.into_iter().zip(row.iter().map(letter)).collect())
        };
        let vector = |(inputs, states): &'a (Vec<bool>, _)| {
            let input = |net: NetId| inputs.get(net.index()).map_or(Value::X, |bit| Value::from(*bit));
            let states: &Vec<crate::logic::Bits> = states;
            Vector {
                inputs: values(circuit, circuit.inputs(), input),
                states: states
                    .iter()
                    .map(|bits| values(circuit, circuit.nets(), |net| Value::from(bits.get(net.index()))))
                    .collect(),
            }
        };
        States {
            format,
            count: report.count.as_deref(),
            feedback: OneLine(words::nets(scenario, &report.feedback)),
            state_variables: OneLine(words::nets(scenario, &report.state_variables)),
            state_variables_exact: report.state_variables_exact,
            vectors: report.vectors.as_ref().map(|[none, one, several]| Vectors { none, one, several }),
            rows: Lines(report.rows.iter().map(row).collect()),
            rows_truncated: report.rows_truncated,
            inputs: report.inputs.iter().map(vector).collect(),
            truncated: report.inputs_truncated,
            transitions: [],
            transitions_truncated: false,
            transitions_analysed: false,
        }
    }
}

/// The document of `states`.
pub fn states(scenario: &Scenario, report: &StatesReport) -> String {
    super::document(&States::of(scenario, report, Some(super::FORMAT)))
}
