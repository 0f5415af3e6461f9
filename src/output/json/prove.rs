//! What a proof says.

use serde::Serialize;

use super::parts::{Exact, Level, Object, OneLine, state};
use crate::findings::Asked;
use crate::output::words;
use crate::proof::{Claim, Proof};
use crate::scenario::Scenario;

#[derive(Serialize)]
struct Document<'a> {
    format: u32,
    title: &'a str,
    unit: &'a str,
    claims: Vec<Told<'a>>,
    windows: Vec<Window<'a>>,
    zones: u64,
    notes: &'a [String],
}

#[derive(Serialize)]
struct Told<'a> {
    claim: String,
    rule: &'static str,
    rule_name: Option<&'a str>,
    net: Option<&'a str>,
    step: Option<&'a str>,
    verdict: &'static str,
    but_for_ties: bool,
    variation: Option<&'static str>,
    witness: Option<&'a str>,
    reason: Option<&'a str>,
}

#[derive(Serialize)]
struct Window<'a> {
    step: &'a str,
    states: Option<Vec<OneLine<Object<&'a str, Level>>>>,
    settling: Option<OneLine<[Exact; 2]>>,
    settling_below: bool,
    settling_but_for_ties: bool,
}

/// The document of `prove`. `files` are the names of the files of the witnesses, by claim.
pub fn prove<'a>(scenario: &'a Scenario, asked: &'a Asked, proof: &'a Proof, files: &'a [Option<String>]) -> String {
    let (circuit, unit) = (&*scenario.circuit, scenario.unit);
    let told = |(claim, file): (&'a Claim, &'a Option<String>)| {
        let question = &asked.questions[claim.question as usize];
        Told {
            claim: words::question(scenario, question),
            rule: question.rule.word(),
            rule_name: question.name.as_deref(),
            net: question.net.map(|net| words::net(scenario, net)),
            step: words::step(scenario, question.moment),
            verdict: claim.call.word(),
            but_for_ties: claim.but_for_ties,
            variation: claim.variation.map(|it| it.word()),
            witness: file.as_deref(),
            reason: claim.reason.as_deref(),
        }
    };
    let windows = proof.windows.iter().map(|window| Window {
        step: &scenario.stimulus.moments[window.moment as usize].label,
        states: window.states.as_ref().map(|states| states.iter().map(|it| state(circuit, it)).collect()),
        settling: window.settling.map(|(least, most)| OneLine([Exact::span(least, unit), Exact::span(most, unit)])),
        settling_below: window.settling_below,
        settling_but_for_ties: window.settling_but_for_ties,
    });
    super::document(&Document {
        format: super::FORMAT,
        title: &scenario.title,
        unit: unit.name(),
        claims: proof.claims.iter().zip(files).map(told).collect(),
        windows: windows.collect(),
        zones: proof.zones,
        notes: &proof.notes,
    })
}
