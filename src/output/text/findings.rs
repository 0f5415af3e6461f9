//! Findings of a sweep, worst first.

use super::Page;
use super::paper::{Paper, Tone, WIDEST};
use super::search::Searching;
use super::why::{Causes, Told};
use crate::findings::{Against, Asked, Kind, RacePair, RuleKey, Subject};
use crate::instance::Which;
use crate::output::search::{CaseFile, file_of, rare_file};
use crate::output::{races, words};
use crate::review::{Review, Why, departure_words, without_draws};
use crate::scenario::{Scenario, Vary};
use crate::sweep::{Cause, Finding, RuleReport, SweepReport, Tie, Worst};

/// Most findings told in full.
const FULL: usize = 5;
/// Of how many of them the paths that race are told; the JSON has all.
const TOLD: usize = 3;
/// Lines that a path of the first finding takes, at most; those of others are cut to one.
const LINES: usize = 2;
/// With more findings that break a rule than this, paths of others are told in the JSON only.
const FEW: usize = 2;
/// Most findings listed that break no rule; two less where more than a few break one.
const LISTED: usize = 3;

/// What a finding is about: `glitch static-0, open_lower, step together`.
pub(in crate::output) fn about(scenario: &Scenario, asked: &Asked, subject: &Subject) -> String {
    let named = words::subject(scenario, asked, subject);
    let mut text = named.kind.to_string();
    if wants_oscillation(asked, subject) {
        text = "no oscillation where it is required".to_string();
    }
    if let Some(shape) = named.shape {
        text += &format!(" {shape}");
    }
    if let Some(name) = named.rule_name {
        text += &format!(" \"{name}\"");
    }
    if let Some(pattern) = named.pattern {
        text += &format!(" ({pattern})");
    }
    if let Some(net) = named.net {
        text += &format!(", {net}");
    }
    if let Some(step) = named.step {
        text += &format!(", {}", words::the_step(step));
    }
    text
}

/// Is it the absence of an oscillation that breaks the rule?
fn wants_oscillation(asked: &Asked, subject: &Subject) -> bool {
    let question = subject.question.and_then(|number| asked.questions.get(number as usize));
    question.is_some_and(|question| question.wants_oscillation)
}

/// The worst value in words, by what it measures.
pub(super) fn worst(kind: Kind, worst: Worst) -> String {
    match (kind, worst) {
        (Kind::Never, Worst::Endless) => "for ever".to_string(),
        (_, Worst::Endless) => "the second edge never came".to_string(),
        (Kind::Glitch, Worst::Time(width)) => format!("pulses up to {} wide", width.rounded()),
        (Kind::MinPulse, Worst::Time(width)) => format!("narrowest {}", width.rounded()),
        (Kind::SettleWithin, Worst::Time(time)) => format!("latest {}", time.rounded()),
        (Kind::Never, Worst::Time(time)) => format!("longest {}", time.rounded()),
        (Kind::Oscillation, Worst::Time(period)) => format!("longest period {}", period.rounded()),
        (_, Worst::Time(time)) => format!("worst {}", time.rounded()),
        (_, Worst::Share(share)) => format!("at worst {} of the delay", words::percent(share)),
    }
}

/// How often, how surely, how bad.
pub(in crate::output) fn figures(scenario: &Scenario, finding: &Finding) -> String {
    let mut text = match finding.case.as_deref().filter(|_| finding.count == 0) {
        Some(case) => format!("in no draw, {}", without_draws(finding, case)),
        None => format!("{} of {} draws", words::count(finding.count), words::count(finding.of)),
    };
    if let Some(share) = finding.share {
        text += &format!(", {}", words::percent(share));
    }
    if let Some((low, high)) = finding.interval {
        text += &format!(" (95 %: {} to {})", words::percent(low), words::percent(high));
    }
    if let Some(boards) = finding.boards {
        let (failing, of) = (words::count(boards.failing), words::count(boards.of));
        let (mean, worst) = (words::percent(boards.mean_share), words::percent(boards.worst_share));
        text += &format!("; {failing} of {of} boards");
        if let Some((low, high)) = boards.interval {
            text += &format!(" (95 %: {} to {})", words::percent(low), words::percent(high));
        }
        text += &format!(", in {mean} of their tries, the worst in {worst}");
        text += match boards.cause() {
            Cause::Parts => ": it lies in their parts",
            Cause::Moment if scenario.plan.vary == Vary::PerEvent => {
                ": it lies in the moment of the step or in the firings"
            }
            Cause::Moment => ": it lies in the moment of the step",
            Cause::Mixed => "",
        };
    }
    if let Some(value) = finding.worst {
        text += &format!("; {}", worst(finding.subject.kind, value));
    }
    if finding.tie == Some(Tie::Vanishes) && finding.count > 0 {
        text += "; gone when times are moved by single femtoseconds (exactly equal times)";
    }
    text
}

/// The command that replays the case that shows a finding worst; `files` are those of the directed search.
pub(in crate::output) fn replay(
    page: &Page<'_>,
    review: &Review,
    files: &[CaseFile<'_>],
    finding: &Finding,
) -> Option<String> {
    if let Some(file) = rare_file(review, finding) {
        return Some(page.replay_file(&file));
    }
    match finding.shown_by()? {
        Which::Given(_) => file_of(files, finding.subject.question).map(|file| page.replay_file(file)),
        case => Some(page.replay(&case, None)),
    }
}

/// Findings of one kind, rule and net after several steps: the worst, and how many more.
struct Group<'a> {
    worst: &'a Finding,
    more_steps: usize,
    /// How the whole rule fared, where it is judged once a run.
    whole: Option<&'a RuleReport>,
}

/// What departed from the reference: `from call=1 permit=1 to permit=0; the reference allows permit=1`.
pub(in crate::output) fn departure(scenario: &Scenario, against: &Against) -> String {
    let words = departure_words(scenario, against, false);
    let before = words.before.map_or_else(String::new, |before| format!("from {before} "));
    format!("{before}to {}; the reference allows {}", words.reached, words.allowed)
}

/// Groups in the order of their worst findings.
fn groups<'a>(asked: &Asked, report: &'a SweepReport, broken: bool) -> Vec<Group<'a>> {
    let rule = |subject: &Subject| {
        let question = subject.question.and_then(|number| asked.questions.get(number as usize));
        // what a step expects is its own; other rules are one rule for all steps
        let own = question
            .filter(|it| matches!(it.rule, RuleKey::Expect | RuleKey::Edges | RuleKey::When))
            .and(subject.moment);
        (question.map(|it| (it.rule, it.index)), own)
    };
    let mut groups: Vec<Group<'a>> = Vec::new();
    for finding in report.findings.iter().filter(|it| it.breaks_rule == broken) {
        let whole = finding.subject.question.and_then(|number| report.rules.get(number as usize));
        let whole = whole.filter(|rule| rule.question.moment.is_none() && rule.margin_sample.is_some());
        let key = |it: &Finding| (it.subject.kind, it.subject.shape, it.subject.net, rule(&it.subject));
        match groups.iter_mut().find(|group| key(group.worst) == key(finding)) {
            Some(group) => {
                group.more_steps += 1;
                // of a rule for the whole run the step with the worst value speaks for all
                if whole.is_some_and(|rule| rule.margin_sample == finding.worst_sample) {
                    group.worst = finding;
                }
            }
            None => groups.push(Group { worst: finding, more_steps: 0, whole }),
        }
    }
    groups
}

impl Group<'_> {
    fn about(&self, scenario: &Scenario, asked: &Asked) -> String {
        let also = match self.more_steps {
            0 => String::new(),
            n => format!(" (and {})", words::many(n as u64, "more step")),
        };
        about(scenario, asked, &self.worst.subject) + &also
    }

    fn figures(&self, scenario: &Scenario) -> String {
        match self.whole.filter(|_| self.more_steps > 0) {
            Some(rule) => {
                let (broken, judged) = (words::count(rule.broken), words::count(rule.judged));
                format!("{broken} of {judged} draws over all steps; at this step {}", figures(scenario, self.worst))
            }
            None => figures(scenario, self.worst),
        }
    }
}

/// The two paths that race, one line each; a pair that was told before is told by the number of its finding.
fn race<'a>(paper: &mut Paper, scenario: &Scenario, why: Option<&'a Why>, told: &mut Vec<Option<&'a RacePair>>) {
    let pair = why.and_then(|why| why.race.as_ref());
    let before = told.iter().position(|it| pair.is_some() && *it == pair);
    told.push(pair);
    let Some(pair) = pair else { return };
    if let Some(before) = before {
        return paper.say(4, Tone::Plain, &format!("The paths that race are those of {}.", before + 1));
    }
    // the same legs are told however wide the terminal is
    let width = if told.len() == 1 { LINES * (WIDEST - 8) } else { WIDEST - 4 };
    for line in races::lines(scenario, pair, width) {
        paper.hang(4, 6, Tone::Plain, &line);
    }
}

/// Findings that break a rule in full, with their causes if they are known, then those that break none.
pub(super) fn findings(
    paper: &mut Paper,
    page: &Page<'_>,
    scenario: &Scenario,
    asked: &Asked,
    report: &SweepReport,
    searching: Option<Searching<'_>>,
    mut causes: Option<&mut Causes<'_>>,
) {
    let why = causes.as_ref().map_or(&[][..], |causes| causes.why());
    let of = |finding: &Finding| {
        let index = report.findings.iter().position(|it| std::ptr::eq(it, finding))?;
        why.get(index)?.as_ref()
    };
    let (broken, listed) = (groups(asked, report, true), groups(asked, report, false));
    if !broken.is_empty() {
        paper.heading("Findings that break a rule, worst first");
        let mut told = Vec::new();
        for (i, group) in broken.iter().take(FULL).enumerate() {
            let finding = group.worst;
            paper.hang(2, 4, Tone::Bad, &format!("{} {}", i + 1, group.about(scenario, asked)));
            let cause = causes.as_mut().map(|causes| causes.next(page, scenario, finding));
            let beside = cause.as_ref().map_or_else(String::new, Told::beside);
            paper.say(4, Tone::Plain, &(group.figures(scenario) + &beside));
            if let Some(against) = &finding.against {
                let first = if finding.count > 1 { "the first: " } else { "" };
                paper.say(4, Tone::Plain, &format!("{first}{}", departure(scenario, against)));
            }
            if i < TOLD {
                race(paper, scenario, of(finding), &mut told);
            }
            if let Some((race, replay)) = causes.as_ref().and_then(|causes| causes.rare(page, scenario, finding)) {
                race.iter().for_each(|race| paper.hang(4, 6, Tone::Plain, race));
                paper.whole(4, &replay);
            } else {
                match finding.shown_by() {
                    Some(Which::Given(_)) => {
                        let file = searching.and_then(|it| file_of(it.files, finding.subject.question));
                        if let Some(file) = file {
                            paper.whole(4, &page.replay_file(file));
                        }
                    }
                    Some(case) => paper.whole(4, &page.replay(&case, None)),
                    None => {}
                }
            }
            if let Some(cause) = cause {
                cause.say(paper);
            }
        }
        let rest =
            if causes.as_ref().is_some_and(|causes| causes.more()) { "; what each takes: causes.csv" } else { "" };
        match broken.len().saturating_sub(FULL) {
            0 if rest.is_empty() => {}
            0 => paper.say(2, Tone::Plain, "What each of the others takes: causes.csv."),
            left => paper.say(
                2,
                Tone::Plain,
                &format!("... and {} more (see findings.csv){rest}", words::count(left as u64)),
            ),
        }
        let looked_for = report.findings.iter().zip(why).filter(|(it, why)| it.breaks_rule && why.is_some()).count();
        if !why.is_empty() && looked_for < report.findings.iter().filter(|it| it.breaks_rule).count() {
            let broken = report.findings.iter().filter(|it| it.breaks_rule).count() as u64;
            let (some, all) = (words::count(looked_for as u64), words::many(broken, "finding"));
            paper.say(2, Tone::Plain, &format!("The paths that race were looked for in {some} of {all}."));
        }
    }
    if !listed.is_empty() {
        paper.heading("Also seen, breaks no rule");
        // where much is broken less is said of the rest
        let most = if broken.len() > FEW { LISTED - 2 } else { LISTED };
        for (i, group) in listed.iter().take(most).enumerate() {
            paper.item(Tone::Plain, &format!("{}: {}", group.about(scenario, asked), group.figures(scenario)));
            if i == 0 && broken.len() <= FEW {
                race(paper, scenario, of(group.worst), &mut Vec::new());
            }
        }
        super::more(paper, listed.len().saturating_sub(most), "findings.csv");
    }
}
