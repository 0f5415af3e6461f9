//! How fast it may go.

use super::Page;
use super::notes;
use super::paper::{Paper, Table, Tone};
use crate::findings::Asked;
use crate::limit::{Beyond, LimitReport, MapReport, Outcome, Range, model};
use crate::output::limit_words::{best, cause, draws, length, question, sentence, value};
use crate::output::words;
use crate::scenario::Scenario;

/// Stretches that are listed, at most.
const STRETCHES: usize = 20;
/// Questions that are named, at most.
const QUESTIONS: usize = 3;
/// Most cells that a map of letters shows across.
const LETTERS: usize = 60;

/// The text of `limit` for one parameter. `case` is the file of the case just beyond the limit, as the user reaches it.
pub fn limit(scenario: &Scenario, asked: &Asked, report: &LimitReport, case: Option<&str>, page: &Page<'_>) -> String {
    let mut paper = page.paper();
    let tone = if report.limit.is_some() || report.everywhere() == Some(true) { Tone::Strong } else { Tone::Bad };
    paper.say(0, tone, &sentence(scenario, report));
    paper.say(
        0,
        Tone::Plain,
        &format!("Model: {}. {}.", model(scenario), draws(scenario, report.samples, report.alike)),
    );
    if !report.alike {
        paper.say(0, Tone::Plain, "What passes was not seen to fail in these draws; that is no proof.");
    }
    if report.interrupted {
        paper.say(0, Tone::Unsure, "Interrupted: only the values below were tried.");
    }

    paper.heading("Stretches of values");
    let mut table = Table::new().number("from", 0).number("to", 0).word("outcome").number("draws failing at most", 0);
    for stretch in report.stretches.iter().take(STRETCHES) {
        let inside = report.points.iter().filter(|it| (stretch.from..=stretch.to).contains(&it.value));
        let mut outcomes: Vec<&str> = Outcome::ALL
            .into_iter()
            .filter(|outcome| inside.clone().any(|point| point.outcome == *outcome))
            .map(Outcome::words)
            .collect();
        outcomes.dedup();
        let most = inside.max_by(|a, b| a.share().total_cmp(&b.share()));
        let at_least = most.is_some_and(|point| point.at_least);
        let share = most.map_or_else(String::new, |point| words::percent(point.share()));
        table.row(
            if stretch.passes { Tone::Plain } else { Tone::Bad },
            vec![
                value(scenario, stretch.from),
                value(scenario, stretch.to),
                outcomes.join(", "),
                if at_least { format!("≥ {share}") } else { share },
            ],
        );
    }
    paper.table(&table);
    super::more(&mut paper, report.stretches.len().saturating_sub(STRETCHES), "limit.csv");
    if report.not_followed > 0 {
        let many = words::many(report.not_followed as u64, "change");
        let text = format!(
            "{many} of passing and not passing not followed: the ends of those stretches are values of the scan."
        );
        paper.say(0, Tone::Unsure, &text);
    }

    if let Some(beyond) = &report.beyond {
        let heading = if report.limit.is_some() { "Just beyond the limit" } else { "At the easy end" };
        paper.heading(heading);
        say_beyond(&mut paper, scenario, asked, beyond);
        if let (Some((sample, _)), Some(case)) = (&beyond.case, case) {
            let text = format!("Sample {sample}, as a case of the scenario as it is:");
            paper.say(2, Tone::Plain, &text);
            paper.whole(2, &replay(page, scenario, beyond, case));
        }
    }

    paper.heading("Searched");
    say_range(&mut paper, scenario, &report.range);
    let within = length(scenario, report.within);
    let scan = length(scenario, report.scan);
    let tried = words::many(report.points.len() as u64, "value");
    paper.item(
        Tone::Plain,
        &format!("{tried} tried: a scan every {scan}, then bisection to within {within}; a stretch narrower than the scan may have been passed over."),
    );
    say_open(&mut paper, scenario, asked, &report.open, report.samples);
    notes::notes(&mut paper, scenario);
    paper.finish()
}

/// The text of `limit` for two parameters.
pub fn limit_map(scenario: &Scenario, asked: &Asked, report: &MapReport, page: &Page<'_>) -> String {
    let mut paper = page.paper();
    let (across, up) = (&report.across.0, &report.up.0);
    let (a, b) = (across.parameter.words(scenario), up.parameter.words(scenario));
    let tried = report.cells.iter().flatten().flatten().count() as u64;
    let passing = report.count(Outcome::Passes) as u64;
    let (passes, pairs) = (words::count(passing), words::many(tried, "pair"));
    paper.say(0, Tone::Strong, &format!("{a}, and {b}: {passes} of {pairs} of values pass"));
    paper.say(
        0,
        Tone::Plain,
        &format!("Model: {}. {}.", model(scenario), draws(scenario, report.samples, report.alike)),
    );
    if report.interrupted() {
        paper.say(0, Tone::Unsure, "Interrupted: not all pairs were tried.");
    }
    paper.heading(&format!("Up: {b}; across: {a}"));
    if report.across.1.len() > LETTERS {
        paper.say(2, Tone::Plain, "Too wide to be shown here; see limit-map.svg and limit-map.csv.");
    } else {
        for (y, row) in report.up.1.iter().zip(&report.cells).rev() {
            let letters: Vec<String> =
                row.iter().map(|cell| cell.as_ref().map_or(' ', |point| point.outcome.letter()).to_string()).collect();
            paper.whole(2, &format!("{:>16}  {}", value(scenario, *y), letters.concat()));
        }
        let (first, last) = (report.across.1.first(), report.across.1.last());
        let ends = [first, last].map(|end| end.map_or_else(String::new, |end| value(scenario, *end)));
        paper.whole(2, &format!("{:>16}  {} to {}", "", ends[0], ends[1]));
    }
    let key = Outcome::ALL.into_iter().filter(|outcome| report.count(*outcome) > 0);
    let key: Vec<String> = key.map(|outcome| format!("{} {}", outcome.letter(), outcome.words())).collect();
    paper.say(2, Tone::Plain, &key.join("   "));
    paper.heading("Searched");
    say_range(&mut paper, scenario, across);
    say_range(&mut paper, scenario, up);
    say_open(&mut paper, scenario, asked, &report.open, report.samples);
    notes::notes(&mut paper, scenario);
    paper.finish()
}

/// The command that runs the case just beyond the limit.
fn replay(page: &Page<'_>, scenario: &Scenario, beyond: &Beyond, case: &str) -> String {
    let condition = beyond.point.breach.as_ref().and_then(|breach| breach.condition);
    let condition = condition.and_then(|number| scenario.conditions.get(number));
    let name = page.scenario.map_or_else(String::new, |name| format!(" {}", super::in_a_shell(name)));
    let condition = condition.map_or_else(String::new, |it| format!(" --condition {}", super::in_a_shell(&it.name)));
    format!("stillgate run{name}{condition} --delays {}", super::in_a_shell(case))
}

fn say_beyond(paper: &mut Paper, scenario: &Scenario, asked: &Asked, beyond: &Beyond) {
    let point = &beyond.point;
    let at = value(scenario, point.value);
    if let Some(breach) = &point.breach {
        let what = cause(scenario, asked, breach);
        let often = format!("{} of {}", words::count(breach.count), words::many(breach.of, "draw"));
        paper.hang(2, 4, Tone::Bad, &format!("{at}: {what}: {often}"));
    }
    if let Some((low, high)) = point.interval {
        let (low, high) = (words::percent(low), words::percent(high));
        paper.say(
            4,
            Tone::Plain,
            &format!("failing in all: {} (95 %: {low} to {high})", words::percent(point.share())),
        );
    }
}

fn say_range(paper: &mut Paper, scenario: &Scenario, range: &Range) {
    let (from, to) = (value(scenario, range.legal.from), value(scenario, range.legal.to));
    let chosen = if range.given { "as asked" } else { "chosen from the scenario where not asked" };
    let words = range.parameter.words(scenario);
    let best = best(range.parameter);
    paper.item(Tone::Plain, &format!("{words} from {from} to {to} ({chosen}); {best} is hardest."));
    let (below, above) = (&range.legal.below, &range.legal.above);
    for (why, side, end) in [(below, "lower", &from), (above, "higher", &to)] {
        if let Some(why) = why {
            paper.item(Tone::Unsure, &format!("No value {side} than {end} is possible: {why}."));
        }
    }
}

fn say_open(paper: &mut Paper, scenario: &Scenario, asked: &Asked, open: &[(u32, u64)], samples: u64) {
    for (number, judged) in open.iter().take(QUESTIONS) {
        let what = question(scenario, asked, *number);
        let often = match judged {
            0 => "in no draw".to_string(),
            n => format!("in {} of {}", words::count(*n), words::many(samples, "draw")),
        };
        paper.item(Tone::Unsure, &format!("{what} is judged {often} at the easy end; no more is asked elsewhere."));
    }
    if open.len() > QUESTIONS {
        let more = words::many((open.len() - QUESTIONS) as u64, "more question");
        paper.item(Tone::Unsure, &format!("So it is with {more} (see limit.json)."));
    }
}
