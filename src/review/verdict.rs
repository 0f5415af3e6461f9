//! The verdict: broken, undecided, or no failure found in so many draws.

use std::collections::BTreeMap;

use super::conditions::{by_condition, together};
use super::departure::departure_words;
use super::report::{Call, Verdict};
use crate::circuit::NetId;
use crate::delay::Marginal;
use crate::findings::{Against, Asked, Kind, Question, Reason, RuleKey, Subject};
use crate::instance::Which;
use crate::proof::{Call as Claimed, Proof};
use crate::scenario::Scenario;
use crate::sweep::{Finding, RuleReport, SweepReport, Tie};

/// The verdict of a sweep, of all its conditions together.
pub fn verdict(scenario: &Scenario, sweep: &SweepReport) -> Verdict {
    together(by_condition(scenario, sweep)).unwrap_or_else(|| of_one(scenario, sweep))
}

/// The verdict of a sweep with the delays that it drew, whatever its conditions say.
pub(super) fn of_one(scenario: &Scenario, sweep: &SweepReport) -> Verdict {
    let broken = broken(scenario, sweep);
    let open = open(scenario, sweep);
    let draws = format!("{} {}", grouped(sweep.samples), draws_word(scenario.plan.draw, sweep.samples));
    let stimulus = stimulus(scenario);
    let runts = runts(scenario, sweep);
    let (call, mut sentence) = if let Some(first) = broken.first() {
        let more = match broken.len() - 1 {
            0 => String::new(),
            1 => ", and 1 more".to_string(),
            n => format!(", and {n} more"),
        };
        (Call::Broken, format!("broken: {first}{more}; Monte Carlo, {draws}, {stimulus}"))
    } else if let Some(first) = open.first() {
        let more = if open.len() > 1 { format!(", and {} more reasons", open.len() - 1) } else { String::new() };
        (Call::Undecided, format!("undecided: {first}{more}; Monte Carlo, {draws}, {stimulus}"))
    } else {
        (Call::NoFailureFound, format!("no failure found in {draws} (Monte Carlo), {stimulus}"))
    };
    if let Some(runts) = runts {
        sentence = format!("{sentence}; {runts}");
    }
    let reasons = broken.into_iter().chain(open).collect();
    Verdict { call, sentence, reasons }
}

/// The verdict of a review: that of its sweep, but *proved* where nothing was found and a proof says so of every question.
/// A claim that is undecided or not covered leaves *no failure found*: a draw answered it.
pub fn reviewed(scenario: &Scenario, asked: &Asked, sweep: &SweepReport, proof: Option<&Proof>) -> Verdict {
    let said = verdict(scenario, sweep);
    // under other conditions delays have other ranges
    let all = proof.filter(|proof| {
        let proved =
            |question: u32| proof.claims.iter().any(|it| it.question == question && it.call == Claimed::Proved);
        sweep.conditions.is_empty()
            && !asked.questions.is_empty()
            && (0..asked.questions.len() as u32).all(proved)
            && proof.claims.iter().all(|it| it.call == Claimed::Proved)
    });
    match all {
        Some(_) if said.call == Call::NoFailureFound => {
            let sentence = format!("proved for every delay in the ranges; {}", said.sentence);
            Verdict { call: Call::Proved, sentence, ..said }
        }
        _ => said,
    }
}

fn draws_word(draw: Marginal, n: u64) -> &'static str {
    match (draw, n) {
        (Marginal::Corners, 1) => "draw of corners",
        (Marginal::Corners, _) => "draws of corners",
        (Marginal::Hypercube, 1) => "draw of a Latin hypercube",
        (Marginal::Hypercube, _) => "draws of a Latin hypercube",
        (_, 1) => "draw",
        _ => "draws",
    }
}

/// `for the 5 steps and 2 clocks of this scenario`.
fn stimulus(scenario: &Scenario) -> String {
    let plural = |n: usize, word: &str| format!("{} {word}{}", grouped(n as u64), if n == 1 { "" } else { "s" });
    let (steps, clocks) = (scenario.stimulus.steps.len(), scenario.stimulus.clocks.len());
    let what = match (steps, clocks) {
        (0, 0) => return "for its start alone".to_string(),
        (steps, 0) => plural(steps, "step"),
        (0, clocks) => plural(clocks, "clock"),
        (steps, clocks) => format!("{} and {}", plural(steps, "step"), plural(clocks, "clock")),
    };
    format!("for the {what} of this scenario")
}

/// A whole number with thousands set apart.
pub fn grouped(n: u64) -> String {
    let digits = n.to_string();
    let mut text = String::new();
    for (i, digit) in digits.chars().enumerate() {
        if i > 0 && (digits.len() - i).is_multiple_of(3) {
            text.push(',');
        }
        text.push(digit);
    }
    text
}

/// What is broken: one sentence for each rule pattern or net, the most important first.
fn broken(scenario: &Scenario, sweep: &SweepReport) -> Vec<String> {
    let mut seen = Vec::new();
    let mut reasons = Vec::new();
    for finding in sweep.findings.iter().filter(|finding| finding.breaks_rule) {
        let subject = finding.subject;
        let rule = subject.question.and_then(|q| sweep.rules.get(q as usize));
        let question = rule.map(|rule| &rule.question);
        let key = (subject.kind, question.map(|q| (q.index, q.name.clone())), subject.net);
        if seen.contains(&key) {
            continue;
        }
        seen.push(key);
        reasons.push(sentence(scenario, finding, rule));
    }
    reasons
}

fn sentence(scenario: &Scenario, finding: &Finding, rule: Option<&RuleReport>) -> String {
    let what = what(
        scenario,
        &finding.subject,
        rule.map(|rule| &rule.question),
        finding.against.as_ref().map(|it| (it, finding.count > 1)),
    );
    if let Some(case) = finding.case.as_deref().filter(|_| finding.count == 0) {
        if let Which::Given(_) = case {
            return format!("{what} in no draw of {}, {}", grouped(finding.of), without_draws(finding, case));
        }
        return format!("{what} in no draw, {}", without_draws(finding, case));
    }
    let equal = if finding.tie == Some(Tie::Vanishes) { " (only with exactly equal times)" } else { "" };
    // a rule for the whole run may break after several steps: its share is that of the rule
    match rule.filter(|rule| rule.question.moment.is_none() && rule.broken > finding.count) {
        Some(rule) => {
            format!("{what} and elsewhere in {} of {} draws{equal}", grouped(rule.broken), grouped(rule.judged))
        }
        None => format!("{what} in {} of {} draws{equal}", grouped(finding.count), grouped(finding.of)),
    }
}

/// What shows a finding that no draw shows: this case of it.
pub fn without_draws(finding: &Finding, case: &Which) -> String {
    if finding.rare {
        return "but refuted by the proof (rare)".to_string();
    }
    let tie = finding.tie;
    let delays = match case {
        Which::Given(_) => return "but met by directed search".to_string(),
        Which::Typ | Which::Min | Which::Max => format!("{} delays", case.words()),
        _ => case.words(),
    };
    match tie {
        Some(Tie::Appears) => "only when times are moved by single femtoseconds".to_string(),
        Some(Tie::Vanishes) => format!("but with {delays} (only with exactly equal times)"),
        None => format!("but with {delays}"),
    }
}

/// What was found, where, after which step.
fn what(
    scenario: &Scenario,
    subject: &Subject,
    question: Option<&Question>,
    against: Option<(&Against, bool)>,
) -> String {
    let circuit = &scenario.circuit;
    let what = match (question.and_then(|q| q.name.as_ref()), subject.shape) {
        (Some(name), _) => format!("\"{name}\" ({})", subject.kind.word()),
        (None, Some(shape)) => format!("{} {}", shape.word(), subject.kind.word()),
        (None, None) if question.is_some_and(|question| question.wants_oscillation) => {
            "no oscillation where it is required".to_string()
        }
        (None, None) => {
            let pattern = question.and_then(|q| q.pattern.as_ref()).filter(|_| subject.kind != Kind::Edges);
            match pattern {
                Some(pattern) => format!("{} {}", subject.kind.word(), pattern.words(circuit)),
                None => subject.kind.word().to_string(),
            }
        }
    };
    let net = subject.net.map_or_else(String::new, |net| format!(" at {}", circuit.name(net)));
    let step = match subject.moment {
        Some(moment) => format!(" after \"{}\"", scenario.stimulus.moments[moment as usize].label),
        None => String::new(),
    };
    // of several draws only the first is told: others may rest elsewhere
    let against = against.map_or_else(String::new, |(against, several)| {
        let words = departure_words(scenario, against, false);
        let rests = if several { "the first rests" } else { "rests" };
        format!(" ({rests} at {}, the reference allows {})", words.reached, words.allowed)
    });
    format!("{what}{net}{step}{against}")
}

/// Questions that belong together: a rule, which of several, its net, and the step if it is a clause of its own.
type Group = (RuleKey, u32, Option<NetId>, Option<u32>);

/// The moment of a question that is a step's own clause and not one rule for all steps.
fn own_clause(scenario: &Scenario, question: &Question) -> Option<u32> {
    let moment = question.moment?;
    let step = scenario.stimulus.step_of(&scenario.stimulus.moments[moment as usize])?;
    let own = match question.rule {
        RuleKey::Expect | RuleKey::Edges | RuleKey::When => true,
        RuleKey::SettleWithin => step.settle_within.is_some(),
        RuleKey::Oscillation => step.oscillation.is_some(),
        _ => false,
    };
    own.then_some(moment)
}

/// Why the verdict cannot be better than undecided, whatever else was found.
fn open(scenario: &Scenario, sweep: &SweepReport) -> Vec<String> {
    let mut reasons = Vec::new();
    if scenario.stimulus.moments.is_empty() {
        reasons.push("there is no step and no clock, so nothing was asked of the block in motion".to_string());
    }
    if sweep.samples == 0 {
        reasons.push("no draw was run".to_string());
    }
    reasons.extend(scenario.not_analysed.iter().cloned());
    let mut unsettled = Vec::new();
    for window in sweep.windows.iter().filter(|window| window.unsettled > 0) {
        let label = &scenario.stimulus.moments[window.moment as usize].label;
        let hits: Vec<&str> = window.hits.iter().map(|(hit, _)| hit.words()).collect();
        let (hits, draws) = (hits.join(" or "), grouped(window.unsettled));
        unsettled.push(format!("\"{label}\" did not settle before the limit {hits} in {draws} draws"));
    }
    reasons.extend(unsettled);
    for finding in sweep.findings.iter().filter(|it| it.subject.kind == Kind::Unsettled && it.count == 0) {
        reasons.push(sentence(scenario, finding, None));
    }
    for finding in sweep.findings.iter().filter(|finding| finding.subject.kind == Kind::Unresolved) {
        reasons.push(format!("a settled state with an X: {}", sentence(scenario, finding, None)));
    }

    let mut groups: BTreeMap<Group, (u64, BTreeMap<Reason, u64>, bool, String)> = BTreeMap::new();
    for rule in &sweep.rules {
        let question = &rule.question;
        let group = (question.rule, question.index, question.net, own_clause(scenario, question));
        let named = question.moment.is_none_or(|moment| {
            let window = &sweep.windows[moment as usize];
            window.named > 0 || window.reached == 0
        });
        let entry = groups.entry(group).or_insert_with(|| (0, BTreeMap::new(), false, describe(scenario, question)));
        entry.0 += rule.judged;
        entry.2 |= question.written && named;
        for (reason, count) in &rule.not_judged {
            let most = entry.1.entry(*reason).or_insert(0);
            *most = (*most).max(*count);
        }
    }
    for (judged, not_judged, written, what) in groups.values() {
        let accepted = scenario.rules.accept_not_judged && *judged > 0;
        if !not_judged.is_empty() && !accepted {
            let each: Vec<String> = not_judged
                .iter()
                .map(|(reason, count)| format!("{} in up to {} draws", reason.words(), grouped(*count)))
                .collect();
            reasons.push(format!("{what} not judged: {}", each.join(", ")));
        } else if *judged == 0 && *written {
            reasons.push(format!("{what} was never put to the test"));
        }
    }
    let mut untouched = Vec::new();
    if scenario.rules.glitch_free_written {
        untouched.extend(scenario.rules.glitch_free.iter().map(|rule| (RuleKey::GlitchFree, rule.net)));
    }
    if scenario.rules.settle_within.is_some() {
        untouched.extend(scenario.watched.iter().map(|net| (RuleKey::SettleWithin, *net)));
    }
    for (rule, net) in untouched {
        if !sweep.rules.iter().any(|r| r.question.rule == rule && r.question.net == Some(net)) {
            let net = scenario.circuit.name(net);
            reasons.push(format!("{} {net} was never put to the test: no step touches it", rule.word()));
        }
    }
    reasons
}

/// A rule in words: `glitch_free lamp`, `timing "dead time"`.
fn describe(scenario: &Scenario, question: &Question) -> String {
    let mut text = question.rule.word().to_string();
    match (&question.name, question.net, &question.pattern) {
        (Some(name), _, _) => text.push_str(&format!(" \"{name}\"")),
        (None, Some(net), _) => text.push_str(&format!(" {}", scenario.circuit.name(net))),
        (None, None, Some(pattern))
            if matches!(question.rule, RuleKey::Never | RuleKey::NeverAtRest | RuleKey::Timing) =>
        {
            text.push_str(&format!(" {}", pattern.words(&scenario.circuit)));
        }
        _ => {}
    }
    if let Some(moment) = own_clause(scenario, question) {
        text.push_str(&format!(" of \"{}\"", scenario.stimulus.moments[moment as usize].label));
    }
    text
}

/// Swallowed pulses where a real part may hang, or where somebody looks.
fn runts(scenario: &Scenario, sweep: &SweepReport) -> Option<String> {
    let mut at_loops: Vec<&str> = Vec::new();
    let mut watched: Vec<&str> = Vec::new();
    for finding in sweep.findings.iter().filter(|finding| finding.subject.kind == Kind::Swallowed) {
        let Some(net) = finding.subject.net else { continue };
        let name = scenario.circuit.name(net);
        if scenario.circuit.in_loop(net) {
            at_loops.push(name);
        } else if scenario.watched.contains(&net) {
            watched.push(name);
        }
    }
    for list in [&mut at_loops, &mut watched] {
        list.sort_unstable();
        list.dedup();
    }
    let few = |list: &[&str]| match list {
        [.., _] if list.len() > 4 => format!("{} and {} more", list[..4].join(", "), list.len() - 4),
        _ => list.join(", "),
    };
    let mut parts = Vec::new();
    if !at_loops.is_empty() {
        parts.push(format!(
            "runts at loop nets {}: a real part may hang here (metastable); this model never does",
            few(&at_loops)
        ));
    }
    if !watched.is_empty() {
        parts.push(format!("pulses swallowed at watched nets {}", few(&watched)));
    }
    (!parts.is_empty()).then(|| parts.join("; "))
}
