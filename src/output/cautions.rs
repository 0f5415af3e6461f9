//! What no result of this program says: cautions that every text carries.

use crate::scenario::Scenario;

/// What the models leave out, for a sentence.
pub(super) const NOT_MODELLED: [&str; 7] = [
    "metastable dwell: a real latch that is hit by a runt may hang between 0 and 1 for a while; here it decides at once",
    "voltage levels and noise: a net is 0, 1 or unknown",
    "tri-state and wired nets: every net has one driver",
    "supply ramps: at power-up all parts begin at one instant",
    "contact bridges and shorts between nets",
    "failures of parts: every gate computes its function for ever",
    "delays outside the ranges of the file: their figures are the user's",
];

/// A logic simulation is no safety case.
const CAUTION: &str = "Caution: a logic simulation is no safety case. Left out are metastable dwell, voltage levels, \
                       noise, supply ramps and part failures.";

/// Who answers for an interlock.
const INTERLOCKS: &str = "Interlocks: the safety function follows the local code and is signed off by licensed people; \
                          mechanical interlocks and emergency stops stay independent of the logic.";

/// The cautions for one screen: more where an interlock is spoken of.
pub(super) fn cautions(scenario: &Scenario) -> Vec<&'static str> {
    let names = scenario.circuit.nets().map(|net| scenario.circuit.name(net));
    let labels = scenario.stimulus.moments.iter().map(|moment| moment.label.as_str());
    let mut words = names.chain(labels).chain([scenario.title.as_str()]);
    let interlock = words.any(|text| text.to_lowercase().contains("interlock"));
    if interlock { vec![CAUTION, INTERLOCKS] } else { vec![CAUTION] }
}

/// What a result is good for.
const TESTS: &str = "Analysis supports a review; it does not replace tests on the real hardware, nor the judgement of those \
                     who are licensed to sign for it.";

/// All cautions, whatever the circuit is for.
pub(super) const ALL: [&str; 3] = [CAUTION, INTERLOCKS, TESTS];
