//! One run.

use super::Page;
use super::findings::{about, departure, worst};
use super::paper::{Paper, Table, Tone, WIDEST};
use super::{notes, rules, steps};
use crate::engine::{End, Window};
use crate::findings::{Asked, Fact};
use crate::instance::Firings;
use crate::output::{races, words};
use crate::review::RunReport;
use crate::scenario::Scenario;

/// Most windows told of.
const WINDOWS: usize = 20;
/// Most findings told of.
const FACTS: usize = 8;

/// The text of `run`: its windows, then what was found in it.
pub fn run(scenario: &Scenario, asked: &Asked, report: &RunReport, page: &Page<'_>) -> String {
    let mut paper = page.paper();
    let broken = report.facts.iter().filter(|fact| fact.breaks_rule).count() as u64;
    let (tone, text) = match broken {
        0 if !report.not_judged.is_empty() => {
            let questions = words::many(report.not_judged.len() as u64, "question");
            (Tone::Unsure, format!("undecided, {questions} not judged in this run"))
        }
        0 if report.judged == 0 => (Tone::Unsure, "undecided, nothing was put to the test in this run".to_string()),
        0 => (Tone::Strong, "no failure found in this one run".to_string()),
        1 => (Tone::Bad, "1 finding breaks a rule in this run".to_string()),
        n => (Tone::Bad, format!("{} findings break a rule in this run", words::count(n))),
    };
    let title = format!("{}, {}: {text}.", scenario.title, words::delays(&report.which));
    paper.say(0, tone, &title);

    paper.heading("Steps");
    let windows = &report.trace.windows;
    if windows.is_empty() {
        paper.say(2, Tone::Plain, "There is no step.");
    } else {
        table(&mut paper, scenario, windows);
        super::more(&mut paper, windows.len().saturating_sub(WINDOWS), "the JSON, with --json");
    }
    if let Some(cut) = report.trace.cut {
        let until = cut.after.from_start().rounded();
        let (moves, later) = (words::many(cut.transitions, "transition"), words::many(cut.windows, "window"));
        paper.say(2, Tone::Unsure, &format!("Kept until {until}; {moves} and {later} came later and are judged, too."));
    }
    if let Some(step) = words::step(scenario, report.trace.never_came) {
        paper.say(2, Tone::Bad, &format!("The run ends before step {step}: what it waits for never came."));
    }
    if !report.facts.is_empty() {
        paper.heading("Found in this run, worst first");
        for fact in report.facts.iter().take(FACTS) {
            let (tone, words) = told(scenario, asked, report, fact);
            paper.item(tone, &words);
            if let Some(pair) = report.race(scenario, asked, fact) {
                for line in races::lines(scenario, &pair, 2 * (WIDEST - 8)) {
                    paper.hang(4, 6, Tone::Plain, &line);
                }
            }
        }
        super::more(&mut paper, report.facts.len().saturating_sub(FACTS), "the JSON, with --json");
    }
    if !report.not_judged.is_empty() {
        paper.heading("Not judged in this run");
        let questions =
            report.not_judged.iter().filter_map(|(q, reason)| Some((asked.questions.get(*q as usize)?, reason)));
        for (question, reason) in questions.take(FACTS) {
            paper.item(Tone::Unsure, &format!("{}: {}", rules::about(scenario, question, true), reason.words()));
        }
        super::more(&mut paper, report.not_judged.len().saturating_sub(FACTS), "the JSON, with --json");
    }
    paper.gap();
    match &report.instance.firings {
        None => {}
        Some(Firings::Drawn(_)) => {
            paper.say(0, Tone::Plain, "Every firing of a gate has a delay of its own, drawn anew.")
        }
        Some(Firings::Given(given)) => {
            let many = words::many(given.len() as u64, "firing");
            paper.say(0, Tone::Plain, &format!("{many} of this case may have delays of their own."));
        }
    }
    let events = words::many(report.trace.events, "event");
    let end = report.trace.end.from_start().rounded();
    paper.say(0, Tone::Plain, &format!("{events} until {end}. One run says nothing of other delays."));
    notes::notes(&mut paper, scenario);
    paper.finish()
}

fn table(paper: &mut Paper, scenario: &Scenario, windows: &[Window]) {
    let mut table = Table::new().text("step").number("from", 1).word("end").number("settling", 0).text("at rest");
    for window in windows.iter().take(WINDOWS) {
        let (tone, rest) = match window.end {
            End::Settled => (Tone::Plain, steps::state(scenario, &scenario.outputs, &window.state)),
            End::Oscillating { period, .. } => (Tone::Unsure, format!("period {}", period.rounded())),
            End::Unsettled(hit) => (Tone::Unsure, format!("reached {}", hit.words())),
            End::Cut => (Tone::Unsure, "cut before rest".to_string()),
        };
        let early = if window.began_at_rest { "" } else { " (applied before rest)" };
        table.row(
            tone,
            vec![
                words::step(scenario, Some(window.moment)).unwrap_or_default().to_string(),
                window.start.from_start().rounded(),
                window.end.word().to_string(),
                window.settling.map_or_else(String::new, |time| time.rounded()),
                format!("{rest}{early}"),
            ],
        );
    }
    paper.table(&table);
}

/// One finding of the run.
fn told(scenario: &Scenario, asked: &Asked, report: &RunReport, fact: &Fact) -> (Tone, String) {
    let mut text = about(scenario, asked, &fact.subject);
    if let Some(value) = words::worst_of(fact) {
        text += &format!(": {}", worst(fact.subject.kind, value));
    }
    if let Some(against) = report.against(fact) {
        text += &format!(": {}", departure(scenario, against));
    }
    if let Some((from, to)) = fact.place {
        let unit = scenario.unit;
        let time = |at: crate::time::Time| at.from_start().decimal(unit);
        text += &format!(", from {} to {} {unit}", time(from), time(to));
    }
    let (tone, rule) = if fact.breaks_rule { (Tone::Bad, "breaks a rule") } else { (Tone::Plain, "breaks no rule") };
    (tone, format!("{text} ({rule})"))
}
