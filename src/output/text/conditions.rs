//! Conditions of temperature and supply side by side.

use super::Page;
use super::findings::about;
use super::paper::{Paper, Table, Tone};
use super::rules;
use crate::findings::Asked;
use crate::output::words;
use crate::review::{Call, Cell, Compared, compare, without_draws};
use crate::scenario::Scenario;
use crate::sweep::SweepReport;
use crate::time::rounded;

/// Most rows of a kind.
const MOST: usize = 5;
/// Most conditions side by side, the file's own delays counted.
const COLUMNS: usize = 5;

/// The table, and what only a condition shows.
pub(super) fn conditions(paper: &mut Paper, page: &Page<'_>, scenario: &Scenario, asked: &Asked, report: &SweepReport) {
    let Some(comparison) = compare(scenario, report) else { return };
    paper.heading("Conditions, each with the same draws");
    let shown = comparison.columns.len().min(COLUMNS);
    let mut table = Table::new().text("");
    for (name, scale) in comparison.columns.iter().take(shown) {
        table = table.number(format!("{name} (x {scale})"), 0);
    }
    let mut left = 0;
    let mut counts = [0usize; 5];
    for (what, cells) in &comparison.rows {
        let count = &mut counts[match what {
            Compared::Verdict => 0,
            Compared::Share(_) => 1,
            Compared::Margin(_) => 2,
            Compared::Median(_) => 3,
            Compared::Longest(_) => 4,
        }];
        *count += 1;
        // the table speaks of the longest; the file has the median, too
        if *count > MOST || matches!(what, Compared::Median(_)) {
            left += 1;
            continue;
        }
        let mut row = vec![title(scenario, asked, report, *what)];
        row.extend(cells.iter().take(shown).map(|it| it.map_or_else(String::new, cell)));
        let broken = cells.iter().any(|it| matches!(it, Some(Cell::Call(Call::Broken))));
        table.row(if broken { Tone::Bad } else { Tone::Plain }, row);
    }
    paper.table(&table);
    super::more(paper, comparison.columns.len() - shown, "conditions.csv");
    if left > 0 {
        paper.say(2, Tone::Plain, &format!("... and {} more (see conditions.csv)", words::many(left, "figure")));
    }
    only(paper, page, scenario, asked, report);
}

/// Findings that break a rule under a condition, and not with the file's own delays.
fn only(paper: &mut Paper, page: &Page<'_>, scenario: &Scenario, asked: &Asked, report: &SweepReport) {
    let nominal = |subject| report.findings.iter().any(|it| it.breaks_rule && it.subject == subject);
    let all = report.conditions.iter().flat_map(|it| it.sweep.findings.iter().map(move |found| (it, found)));
    let only: Vec<_> = all.filter(|(_, found)| found.breaks_rule && !nominal(found.subject)).collect();
    for (condition, finding) in only.iter().take(MOST) {
        let name = &condition.condition.name;
        let seen = match finding.case.as_deref().filter(|_| finding.count == 0) {
            Some(case) => format!("in no draw, {}", without_draws(finding, case)),
            None => format!("{} of {} draws", words::count(finding.count), words::count(finding.of)),
        };
        let text = format!("only under condition {name}: {}: {seen}", about(scenario, asked, &finding.subject));
        paper.item(Tone::Bad, &text);
        if let Some(case) = finding.shown_by() {
            paper.whole(4, &page.replay(&case, Some(name)));
        }
    }
    super::more(paper, only.len().saturating_sub(MOST), "findings.csv");
}

fn title(scenario: &Scenario, asked: &Asked, report: &SweepReport, what: Compared) -> String {
    let step = |moment| words::step(scenario, Some(moment)).unwrap_or_default();
    match what {
        Compared::Verdict => "verdict".to_string(),
        Compared::Share(subject) => about(scenario, asked, &subject),
        Compared::Margin(number) => match report.rules.get(number as usize) {
            Some(rule) => format!("margin, {}", rules::about(scenario, &rule.question, false)),
            None => "margin".to_string(),
        },
        Compared::Median(moment) => format!("median settling, step {}", step(moment)),
        Compared::Longest(moment) => format!("longest settling, step {}", step(moment)),
    }
}

fn cell(cell: Cell) -> String {
    match cell {
        Cell::Call(call) => call.words().to_string(),
        Cell::Count(count, of) => format!("{} of {}", words::count(count), words::count(of)),
        Cell::Margin(fs) => rounded(fs),
        Cell::Time(time, at_least) => format!("{}{}", if at_least { "≥ " } else { "" }, time.rounded()),
    }
}
