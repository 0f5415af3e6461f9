//! From numbers to the names and words that every output shares.

use crate::circuit::{GateId, NetId};
use crate::findings::{Asked, Fact, Question, Subject};
use crate::instance::{Quantity, Target, Which};
use crate::review::Cut;
pub(super) use crate::review::grouped as count;
use crate::scenario::{MomentKind, Place, Scenario};
use crate::sweep::{Tie, Worst};
use crate::time::Span;

/// The label of a moment; `None` at rest before the first step.
pub(super) fn step(scenario: &Scenario, moment: Option<u32>) -> Option<&str> {
    let moment = scenario.stimulus.moments.get(moment? as usize)?;
    Some(&moment.label)
}

/// A step by its label: `step upper calls`; a label that says by itself what it is (`step 4`, `power-up`) stands alone.
pub(super) fn the_step(label: &str) -> String {
    if label.starts_with("step ") || label == "power-up" { label.to_string() } else { format!("step {label}") }
}

/// How many steps a scenario has: clock edges are steps, power-up is none.
pub(super) fn steps(scenario: &Scenario) -> String {
    let moments = &scenario.stimulus.moments;
    many(moments.iter().filter(|moment| moment.kind != MomentKind::PowerUp).count() as u64, "step")
}

/// The name of a net.
pub(super) fn net(scenario: &Scenario, net: NetId) -> &str {
    scenario.circuit.name(net)
}

/// The names of some nets.
pub(super) fn nets<'a>(scenario: &'a Scenario, nets: &[NetId]) -> Vec<&'a str> {
    nets.iter().map(|id| net(scenario, *id)).collect()
}

/// Some of the names, and how many more there are.
pub(super) fn some_names(names: &[&str], most: usize) -> String {
    if names.len() <= most {
        return names.join(", ");
    }
    format!("{} and {} more", names[..most].join(", "), count((names.len() - most) as u64))
}

/// Steps by their labels, for a note: `“upper calls”, “lower calls”`; of more than `most` the number of the others.
pub(super) fn labels(steps: &[&str], most: usize) -> String {
    let quoted: Vec<String> = steps.iter().map(|step| format!("“{step}”")).collect();
    some_names(&quoted.iter().map(String::as_str).collect::<Vec<_>>(), most)
}

/// What a finding or fact is about, in words.
pub(super) struct Named<'a> {
    pub kind: &'static str,
    pub shape: Option<&'static str>,
    pub rule_name: Option<&'a str>,
    pub pattern: Option<String>,
    pub net: Option<&'a str>,
    pub step: Option<&'a str>,
}

/// The words of a subject.
pub(super) fn subject<'a>(scenario: &'a Scenario, asked: &'a Asked, subject: &Subject) -> Named<'a> {
    let question = subject.question.and_then(|number| asked.questions.get(number as usize));
    Named {
        kind: subject.kind.word(),
        shape: subject.shape.map(|shape| shape.word()),
        rule_name: question.and_then(|question| question.name.as_deref()),
        pattern: question
            .and_then(|question| question.pattern.as_ref())
            .map(|pattern| pattern.words(&scenario.circuit)),
        net: subject.net.map(|id| net(scenario, id)),
        step: step(scenario, subject.moment),
    }
}

/// What a quantity of a case is: `open_lower fall`, `wire a to b rise`, `wait of step 2`, `skew of call in step 2`.
pub(super) fn quantity(scenario: &Scenario, target: Target) -> String {
    let (circuit, stimulus) = (&scenario.circuit, &scenario.stimulus);
    let gate = |gate: u32| circuit.name(circuit.net_of(GateId(gate)));
    let wire = |wire: u32| {
        let (from, to) = circuit.wires()[wire as usize];
        format!("wire {} to {}", circuit.name(from), circuit.name(circuit.net_of(to)))
    };
    let edge = |edge: u8| if edge == 0 { "fall" } else { "rise" };
    let clock = |clock: u32| circuit.name(stimulus.clocks[clock as usize].net);
    match target {
        Target::Gate { gate: it, edge: e } => format!("{} {}", gate(it), edge(e)),
        Target::GateBoth(it) => format!("{} delay", gate(it)),
        Target::Wire { wire: it, edge: e } => format!("{} {}", wire(it), edge(e)),
        Target::WireBoth(it) => wire(it),
        Target::Period(it) => format!("period of {}", clock(it)),
        Target::High(it) => format!("high of {}", clock(it)),
        Target::First(it) => format!("first edge of {}", clock(it)),
        Target::Jitter { clock: it, edge } => format!("jitter of edge {} of {}", edge + 1, clock(it)),
        Target::Place(it) => {
            let step = &stimulus.steps[it as usize];
            let what = if matches!(step.place, Place::At(_)) { "place" } else { "wait" };
            format!("{what} of {}", the_step(&step.label))
        }
        Target::Skew { step, entry } => {
            let step = &stimulus.steps[step as usize];
            format!("skew of {} in {}", circuit.name(step.set[entry as usize].0), the_step(&step.label))
        }
    }
}

/// The value of a quantity in fs; jitter counts from no jitter, so it has a sign.
pub(super) fn value(quantity: &Quantity, span: Span) -> i128 {
    let middle = match quantity.target {
        Target::Jitter { .. } => quantity.range.max.fs() / 2,
        _ => 0,
    };
    i128::from(span.fs()) - i128::from(middle)
}

/// What cut a search, in words.
pub(super) fn cut(cut: Cut) -> String {
    match cut {
        Cut::Runs(runs) => format!("budget of {} ran out", many(runs, "run")),
        Cut::Events(events) => format!("budget of {} ran out", many(events, "event")),
        Cut::Interrupted => "interrupted".to_string(),
    }
}

/// A question in words: `timing "dead time"`, `glitch_free lamp after "step 3"`.
pub(super) fn question(scenario: &Scenario, question: &Question) -> String {
    let mut text = question.rule.word().to_string();
    match (&question.name, question.net, &question.pattern) {
        (Some(name), _, _) => text += &format!(" \"{name}\""),
        (None, Some(name), _) => text += &format!(" {}", net(scenario, name)),
        (None, None, Some(pattern)) => text += &format!(" {}", pattern.words(&scenario.circuit)),
        (None, None, None) => {}
    }
    if let Some(label) = step(scenario, question.moment) {
        text += &format!(" after \"{label}\"");
    }
    text
}

/// The measured value of a fact: a time, or a share of a delay.
pub(super) fn worst_of(fact: &Fact) -> Option<Worst> {
    fact.measure.map(|measure| Worst::of(fact.subject.kind, measure))
}

/// The word of a tie in every file.
pub(super) const fn tie(tie: Tie) -> &'static str {
    match tie {
        Tie::Vanishes => "vanishes",
        Tie::Appears => "appears",
    }
}

/// Letters that XML cannot hold become the replacement sign; line breaks become spaces.
pub(super) fn clean(text: &str) -> String {
    let fit = |letter: char| match letter {
        '\n' | '\r' | '\t' => ' ',
        letter if letter.is_control() || matches!(letter, '\u{fffe}' | '\u{ffff}') => '\u{fffd}',
        letter => letter,
    };
    text.chars().map(fit).collect()
}

/// Which delays a run took, as titles say it: `typical delays`, `sample 8123`.
pub(super) fn delays(which: &Which) -> String {
    match which {
        Which::Typ | Which::Min | Which::Max => format!("{} delays", which.words()),
        Which::Sample(_) | Which::Given(_) => which.words(),
        Which::Perturbed(which, number) => format!("{}, perturbation {number}", delays(which)),
    }
}

/// Six significant digits of a share, as the nearest float.
pub(super) fn six(share: f64) -> f64 {
    format!("{share:.5e}").parse().unwrap_or(share)
}

/// Three significant digits of a plain number.
pub(super) fn three(number: f64) -> String {
    if number == 0.0 || !number.is_finite() {
        return format!("{number}");
    }
    let rounded: f64 = format!("{number:.2e}").parse().unwrap_or(number);
    let size = rounded.abs();
    if size < 1e-4 { format!("{rounded:e}") } else { format!("{rounded}") }
}

/// A share in percent with three significant digits: `1.23 %`.
pub(super) fn percent(share: f64) -> String {
    match three(share * 100.0).as_str() {
        "100" if share < 1.0 => "above 99.9 %".to_string(),
        digits => format!("{digits} %"),
    }
}

/// A sentence: a capital at its beginning and a full stop at its end.
pub(super) fn sentence(text: &str) -> String {
    let mut letters = text.trim().chars();
    let first = letters.next().map_or_else(String::new, |first| first.to_uppercase().collect());
    let stop = if text.trim_end().ends_with(['.', '!', '?']) { "" } else { "." };
    format!("{first}{}{stop}", letters.as_str())
}

/// `1 step`, `3 steps`: a count with its noun.
pub(super) fn many(number: u64, noun: &str) -> String {
    format!("{} {noun}{}", count(number), if number == 1 { "" } else { "s" })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_step_is_not_called_a_step_twice() {
        assert_eq!(the_step("upper calls"), "step upper calls");
        assert_eq!((the_step("step 4"), the_step("power-up")), ("step 4".to_string(), "power-up".to_string()));
        assert_eq!(the_step("stepping"), "step stepping");
    }

    #[test]
    fn numbers_for_people() {
        assert_eq!(three(0.123_456), "0.123");
        assert_eq!(three(99.96), "100");
        assert_eq!(three(0.000_012_345), "1.23e-5");
        assert_eq!(percent(0.0), "0 %");
        assert_eq!(percent(0.012_345), "1.23 %");
        assert_eq!(percent(1.0), "100 %");
        assert_eq!(percent(0.999_9), "above 99.9 %", "not all is not 100 %");
        assert_eq!(count(1_234_567), "1,234,567");
        assert_eq!(count(999), "999");
        assert_eq!(many(1, "gate"), "1 gate");
        assert_eq!(sentence("steps come at rest"), "Steps come at rest.");
        assert_eq!(sentence("Two steps."), "Two steps.");
        assert_eq!(six(1.0 / 3.0), 0.333_333);
    }
}
