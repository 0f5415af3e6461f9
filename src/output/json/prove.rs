//! What a proof says.

use serde::Serialize;

use super::parts::{Exact, Level, Object, OneLine, state};
use crate::findings::Asked;
use crate::output::{deciding, words};
use crate::proof::{Claim, Margin, Padding, PaddingEnd, Proof, Race, Sum};
use crate::scenario::{Padded, Scenario};
use crate::time::Span;

/// A proof; `format`, `title` and `unit` are those of its own document.
#[derive(Serialize)]
pub(super) struct Document<'a> {
    #[serde(skip_serializing_if = "Option::is_none")]
    format: Option<u32>,
    #[serde(skip_serializing_if = "Option::is_none")]
    title: Option<&'a str>,
    #[serde(skip_serializing_if = "Option::is_none")]
    unit: Option<&'a str>,
    claims: Vec<Told<'a>>,
    windows: Vec<Window<'a>>,
    padding: Option<ThePadding>,
    zones: u64,
    zones_in_all: Option<u64>,
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
    race: Option<TheRace>,
    margin: Option<TheMargin>,
}

/// An inequality between two sums; `short`: how far the first can exceed the second.
#[derive(Serialize)]
struct TheRace {
    text: String,
    first: TheSum,
    relation: &'static str,
    second: TheSum,
    short: Exact,
}

#[derive(Serialize)]
struct TheSum {
    terms: Vec<OneLine<Term>>,
    constant: Exact,
    range: OneLine<[Exact; 2]>,
}

#[derive(Serialize)]
struct Term {
    what: String,
    times: u64,
}

#[derive(Serialize)]
struct TheMargin {
    factor: f64,
    exact: String,
    end: &'static str,
    first: Option<TheRace>,
}

#[derive(Serialize)]
struct ThePadding {
    result: &'static str,
    reason: Option<String>,
    pads: Vec<OneLine<Pad>>,
    total: Exact,
    cut: bool,
    proofs: u32,
    patch: Vec<String>,
}

#[derive(Serialize)]
struct Pad {
    at: String,
    add: Exact,
}

fn race(scenario: &Scenario, race: &Race) -> TheRace {
    let unit = scenario.unit;
    let sum = |sum: &Sum| TheSum {
        terms: sum
            .terms
            .iter()
            .map(|(of, times)| OneLine(Term { what: deciding::quantity(scenario, *of), times: *times }))
            .collect(),
        constant: Exact::signed(sum.constant as i128, unit),
        range: OneLine(sum.range(scenario).map(|fs| Exact::signed(fs, unit))),
    };
    TheRace {
        text: deciding::race(scenario, race),
        first: sum(&race.first),
        relation: race.relation.word(),
        second: sum(&race.second),
        short: Exact::signed(race.short(scenario), unit),
    }
}

fn margin(scenario: &Scenario, margin: &Margin) -> TheMargin {
    TheMargin {
        factor: words::six(margin.factor.to_f64()),
        exact: margin.factor.to_string(),
        end: margin.end.word(),
        first: margin.first.as_ref().map(|it| race(scenario, it)),
    }
}

fn padding(scenario: &Scenario, padding: &Padding) -> ThePadding {
    let total = padding.pads.iter().fold(Span::ZERO, |total, (_, pad)| total + *pad);
    let pad = |(place, pad): &(Padded, Span)| {
        OneLine(Pad { at: deciding::place(scenario, *place), add: Exact::span(*pad, scenario.unit) })
    };
    let lines = padding.pads.iter().flat_map(|(place, pad)| deciding::patch(scenario, *place, *pad));
    let reason = match &padding.end {
        PaddingEnd::Impossible(why) | PaddingEnd::Undecided(why) => Some(why.clone()),
        PaddingEnd::NotNeeded | PaddingEnd::Found => None,
    };
    ThePadding {
        result: padding.end.word(),
        reason,
        pads: padding.pads.iter().map(pad).collect(),
        total: Exact::span(total, scenario.unit),
        cut: padding.cut,
        proofs: padding.rounds,
        patch: lines.collect(),
    }
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
pub fn prove(scenario: &Scenario, asked: &Asked, proof: &Proof, files: &[Option<String>]) -> String {
    super::document(&Document {
        format: Some(super::FORMAT),
        title: Some(&scenario.title),
        unit: Some(scenario.unit.name()),
        ..document(scenario, asked, proof, files)
    })
}

/// The proof of a review: the same keys.
pub(super) fn document<'a>(
    scenario: &'a Scenario,
    asked: &'a Asked,
    proof: &'a Proof,
    files: &'a [Option<String>],
) -> Document<'a> {
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
            race: claim.race.as_ref().map(|it| race(scenario, it)),
            margin: claim.margin.as_ref().map(|it| margin(scenario, it)),
        }
    };
    let windows = proof.windows.iter().map(|window| Window {
        step: &scenario.stimulus.moments[window.moment as usize].label,
        states: window.states.as_ref().map(|states| states.iter().map(|it| state(circuit, it)).collect()),
        settling: window.settling.map(|(least, most)| OneLine([Exact::span(least, unit), Exact::span(most, unit)])),
        settling_below: window.settling_below,
        settling_but_for_ties: window.settling_but_for_ties,
    });
    Document {
        format: None,
        title: None,
        unit: None,
        claims: proof.claims.iter().zip(files).map(told).collect(),
        windows: windows.collect(),
        padding: proof.padding.as_ref().map(|it| padding(scenario, it)),
        zones: proof.zones,
        zones_in_all: proof.allowed,
        notes: &proof.notes,
    }
}
