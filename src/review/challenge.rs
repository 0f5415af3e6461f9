//! The sweep against the proof: what was seen must be possible, and what was refuted should have been seen.

use super::ReviewError;
use super::report::RunReport;
use super::single::run_one;
use crate::control::Control;
use crate::engine::{End, Program, Trace};
use crate::findings::{Asked, Fact, Kind, Question, RuleKey, Subject};
use crate::instance::Which;
use crate::logic::State;
use crate::proof::{Call, Claim, Proof, Variation, WindowProof};
use crate::scenario::{Scenario, Vary};
use crate::sweep::{Finding, SweepReport, Tie, WindowReport, Worst};
use crate::time::Span;

/// Checks what a sweep with the scenario's own delays saw against what a proof says of every delay in the ranges: settled
/// states against the states that can be reached, settling times against their bounds, findings against claims that are
/// proved. What was seen only with times moved out of their ranges is passed over, and so is a bound that leaves out exactly
/// equal times.
///
/// Errors: something was seen that the proof excludes. One of the two views is wrong: a defect of the program.
pub fn challenge(scenario: &Scenario, asked: &Asked, proof: &Proof, sweep: &SweepReport) -> Result<(), ReviewError> {
    for window in &proof.windows {
        if let Some(seen) = sweep.windows.get(window.moment as usize) {
            settled_states(scenario, window, seen)?;
            settling_times(scenario, window, seen)?;
        }
    }
    let proved = |question: u32| proof.claims.iter().any(|it| it.question == question && excludes(scenario, it));
    for finding in sweep.findings.iter().filter(|it| it.breaks_rule && it.tie != Some(Tie::Appears)) {
        let Some(question) = finding.subject.question.filter(|question| proved(*question)) else { continue };
        let by = finding.shown_by().map_or_else(|| "a draw".to_string(), |which| which.words());
        return Err(against_proof(scenario, asked, question, finding.subject.kind, &by));
    }
    for (question, rule) in (0..).zip(&sweep.rules) {
        if rule.broken > 0 && proved(question) {
            let by = format!("{} draws", rule.broken);
            return Err(contradiction(format!("{} is proved, but broken in {by}", words(scenario, asked, question))));
        }
    }
    Ok(())
}

/// Checks one run inside the ranges in the same way.
///
/// Errors: as [`challenge`].
pub fn challenge_run(scenario: &Scenario, asked: &Asked, proof: &Proof, run: &RunReport) -> Result<(), ReviewError> {
    let name = run.which.words();
    if matches!(run.which, Which::Perturbed(..)) {
        return Ok(());
    }
    windows_of(scenario, proof, &name, &run.trace)?;
    for fact in run.facts.iter().filter(|fact| fact.breaks_rule) {
        let Some(question) = fact.subject.question else { continue };
        if proof.claims.iter().any(|it| it.question == question && excludes(scenario, it)) {
            return Err(against_proof(scenario, asked, question, fact.subject.kind, &name));
        }
    }
    Ok(())
}

/// Does a claim say that no run of this scenario breaks it: for every delay, or for constant ones where all draws have such?
fn excludes(scenario: &Scenario, claim: &Claim) -> bool {
    let constant = claim.variation == Some(Variation::CycleToCycle) && scenario.plan.vary == Vary::PerPart;
    claim.call == Call::Proved || constant
}

fn settled_states(scenario: &Scenario, window: &WindowProof, seen: &WindowReport) -> Result<(), ReviewError> {
    let Some(states) = &window.states else { return Ok(()) };
    match seen.outcomes.iter().find(|it| !possible(states, &it.state)) {
        Some(outcome) => Err(impossible(scenario, window.moment, &format!("sample {}", outcome.first))),
        None => Ok(()),
    }
}

/// States come in order.
fn possible(states: &[State], state: &State) -> bool {
    state.has_unknown() || states.binary_search(state).is_ok()
}

fn settling_times(scenario: &Scenario, window: &WindowProof, seen: &WindowReport) -> Result<(), ReviewError> {
    let (Some((least, most)), Some(settling)) = (window.settling, &seen.settling) else { return Ok(()) };
    // lengths of cut windows are no settling times
    if seen.cut == 0 && beyond(window, most, settling.max) {
        return Err(too_late(scenario, window.moment, "the sweep", settling.max, most));
    }
    match settling.min.filter(|min| !window.settling_but_for_ties && *min < least) {
        Some(min) => {
            let what = format!("settles in {}, less than the {} that the proof allows", min.rounded(), least.rounded());
            Err(after(scenario, window.moment, "the sweep", &what))
        }
        None => Ok(()),
    }
}

/// Is a settling time beyond the bound?
fn beyond(window: &WindowProof, most: Span, time: Span) -> bool {
    !window.settling_but_for_ties && (time > most || (window.settling_below && time == most))
}

fn windows_of(scenario: &Scenario, proof: &Proof, run: &str, trace: &Trace) -> Result<(), ReviewError> {
    for seen in trace.windows.iter().filter(|window| window.end == End::Settled) {
        let Some(window) = proof.windows.iter().find(|window| window.moment == seen.moment) else { continue };
        if window.states.as_ref().is_some_and(|states| !possible(states, &seen.state)) {
            return Err(impossible(scenario, window.moment, run));
        }
        if let (Some((_, most)), Some(time)) = (window.settling, seen.settling)
            && beyond(window, most, time)
        {
            return Err(too_late(scenario, window.moment, run, time, most));
        }
    }
    Ok(())
}

fn impossible(scenario: &Scenario, moment: u32, run: &str) -> ReviewError {
    after(scenario, moment, run, "settles in a state that no delay in the ranges leads to, says the proof")
}

fn too_late(scenario: &Scenario, moment: u32, run: &str, time: Span, most: Span) -> ReviewError {
    let (time, most) = (time.rounded(), most.rounded());
    after(scenario, moment, run, &format!("settles in {time}, beyond the {most} that the proof allows"))
}

fn after(scenario: &Scenario, moment: u32, run: &str, what: &str) -> ReviewError {
    let label = &scenario.stimulus.moments[moment as usize].label;
    contradiction(format!("after \"{label}\" {run} {what}"))
}

fn against_proof(scenario: &Scenario, asked: &Asked, question: u32, kind: Kind, by: &str) -> ReviewError {
    let what = words(scenario, asked, question);
    contradiction(format!("{what} is proved for the delays in the ranges, but {by} shows its {}", kind.word()))
}

fn contradiction(what: String) -> ReviewError {
    ReviewError::Contradiction(what)
}

/// A question in words: its rule, its name or net, its step.
fn words(scenario: &Scenario, asked: &Asked, question: u32) -> String {
    let it = &asked.questions[question as usize];
    let mut text = it.rule.word().to_string();
    match (&it.name, it.net) {
        (Some(name), _) => text += &format!(" \"{name}\""),
        (None, Some(net)) => text += &format!(" {}", scenario.circuit.name(net)),
        (None, None) => {}
    }
    if let Some(moment) = it.moment {
        text += &format!(" after \"{}\"", scenario.stimulus.moments[moment as usize].label);
    }
    text
}

/// What a proof refutes and nothing else met: no draw, no typical, min or max run, no search. Each is a finding with count 0
/// whose case is the witness. What takes exactly equal times is left out: it holds but for them, and the proof says so.
///
/// Errors: a witness does not show what it was found for.
pub(super) fn rare(
    scenario: &Scenario,
    program: &Program,
    asked: &Asked,
    proof: &Proof,
    sweep: &SweepReport,
) -> Result<Vec<Finding>, ReviewError> {
    let mut findings = Vec::new();
    for claim in proof.claims.iter().filter(|claim| !claim.but_for_ties && unmet(claim, sweep)) {
        let Some(witness) = &claim.witness else { continue };
        let which = Which::Given(witness.clone());
        let Some(run) = run_one(scenario, program, asked, which, &Control::default()) else { continue };
        super::contained::run(scenario, "a case of the proof", &run.trace, &Control::default())?;
        let question = &asked.questions[claim.question as usize];
        let shows = |fact: &&Fact| fact.breaks_rule && fact.subject.question == Some(claim.question);
        let fact = run.facts.iter().find(shows);
        let subject = match (fact, question.rule) {
            (Some(fact), _) => fact.subject,
            // no single run shows a race
            (None, RuleKey::CriticalRace) => race(claim.question, question),
            (None, _) => {
                let what = words(scenario, asked, claim.question);
                return Err(contradiction(format!("{what} is refuted by a case that does not break it")));
            }
        };
        findings.push(Finding {
            subject,
            breaks_rule: true,
            count: 0,
            of: sweep.rules[claim.question as usize].judged,
            share: None,
            interval: None,
            boards: None,
            worst: fact.and_then(|fact| fact.measure).map(|measure| Worst::of(subject.kind, measure)),
            against: fact.and_then(|fact| run.against(fact)).cloned(),
            tie: None,
            sample: None,
            worst_sample: None,
            case: Some(Box::new(run.which)),
            rare: true,
        });
    }
    Ok(findings)
}

/// Is a claim refuted that nothing in the sweep broke?
fn unmet(claim: &Claim, sweep: &SweepReport) -> bool {
    let met = |it: &Finding| it.breaks_rule && it.subject.question == Some(claim.question);
    claim.call == Call::Refuted && !sweep.findings.iter().any(met)
}

fn race(number: u32, question: &Question) -> Subject {
    Subject { kind: Kind::CriticalRace, shape: None, question: Some(number), net: None, moment: question.moment }
}
