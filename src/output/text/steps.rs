//! Steps with their outcomes and settling times.

use super::paper::{Paper, Table, Tone};
use crate::circuit::NetId;
use crate::logic::State;
use crate::output::words;
use crate::scenario::Scenario;
use crate::sweep::{Settling, SweepReport, WindowReport};

/// Most rows of the table.
const ROWS: usize = 16;
const ROWS_OF_A_PAGE: usize = 120;
/// Most outcomes of one step.
const OUTCOMES: usize = 4;
/// Most nets of a state.
const NETS: usize = 8;

/// The nets of a state in words: `open_upper=1 open_lower=0`.
pub(super) fn state(scenario: &Scenario, nets: &[NetId], state: &State) -> String {
    let each = nets.iter().take(NETS).map(|net| format!("{}={}", words::net(scenario, *net), state.get(net.index())));
    let mut text = each.collect::<Vec<_>>().join(" ");
    if nets.len() > NETS {
        text += " …";
    }
    text
}

/// The nets to name so that the outcomes of a window can be told apart: outputs, and more where those agree.
fn telling(scenario: &Scenario, window: &WindowReport) -> Vec<NetId> {
    let mut nets = scenario.outputs.clone();
    let states: Vec<&State> = window.outcomes.iter().take(OUTCOMES).map(|outcome| &outcome.state).collect();
    for (i, one) in states.iter().enumerate() {
        for other in &states[..i] {
            let differs = |net: &NetId| one.get(net.index()) != other.get(net.index());
            if !nets.iter().any(differs) {
                let loops = scenario.circuit.nets().filter(|net| scenario.circuit.in_loop(*net)).find(differs);
                nets.extend(loops.or_else(|| scenario.circuit.nets().find(differs)));
            }
        }
    }
    // what was added stays in sight when there are many outputs
    let added = nets.split_off(scenario.outputs.len());
    nets.truncate(NETS.saturating_sub(added.len()));
    nets.extend(added);
    nets
}

/// One row an outcome, the first of a step with its label and settling times.
pub(super) fn steps(paper: &mut Paper, scenario: &Scenario, report: &SweepReport) {
    let mut table = Table::new()
        .text("step")
        .number("draws", 0)
        .text("at rest")
        .number("median", 2)
        .number("99th perc.", 3)
        .number("longest", 1);
    let all: Vec<Vec<Line>> = report.windows.iter().map(|window| lines(scenario, window)).collect();
    let shown = chosen(&report.windows, &all, paper.most(ROWS, ROWS_OF_A_PAGE));
    for ((window, lines), _) in report.windows.iter().zip(&all).zip(&shown).filter(|it| *it.1) {
        for (i, Line { tone, draws, words }) in lines.iter().enumerate() {
            let first = i == 0;
            let label = if first { words::step(scenario, Some(window.moment)).unwrap_or_default() } else { "" };
            let settling = window.settling.as_ref().filter(|_| first);
            let [median, p99, longest] = settling.map_or_else(Default::default, times);
            table.row(*tone, vec![label.to_string(), words::count(*draws), words.clone(), median, p99, longest]);
        }
    }
    if all.is_empty() {
        paper.say(2, Tone::Plain, "There is no step.");
        return;
    }
    paper.table(&table);
    let left = shown.iter().filter(|shown| !**shown).count();
    super::more(paper, left, "outcomes.csv and settling.csv");
}

/// Which windows are shown: where a rule is broken first, then in order, until the rows are used up.
fn chosen(windows: &[WindowReport], lines: &[Vec<Line>], most: usize) -> Vec<bool> {
    let mut shown = vec![false; windows.len()];
    let mut rows = 0;
    for wanted in [true, false] {
        for (shown, (window, lines)) in shown.iter_mut().zip(windows.iter().zip(lines)) {
            let broken = window.unsettled > 0 || window.outcomes.iter().any(|outcome| outcome.breaks_rule);
            if broken == wanted && (rows == 0 || rows + lines.len() <= most) {
                rows += lines.len();
                *shown = true;
            }
        }
    }
    shown
}

/// One thing that became of a step's windows, and how often.
struct Line {
    tone: Tone,
    draws: u64,
    words: String,
}

/// What became of a step's windows; at least one line.
fn lines(scenario: &Scenario, window: &WindowReport) -> Vec<Line> {
    let line = |tone, draws, words: &str| Line { tone, draws, words: words.to_string() };
    let nets = telling(scenario, window);
    let mut lines = Vec::new();
    for outcome in window.outcomes.iter().take(OUTCOMES) {
        let words = if nets.is_empty() { "at rest".into() } else { state(scenario, &nets, &outcome.state) };
        lines.push(match outcome.breaks_rule {
            true => line(Tone::Bad, outcome.count, &format!("! {words}")),
            false => line(Tone::Plain, outcome.count, &words),
        });
    }
    if window.outcomes.len() > OUTCOMES || window.outcomes_truncated {
        let told: u64 = window.outcomes.iter().take(OUTCOMES).map(|outcome| outcome.count).sum();
        let least = if window.outcomes_truncated { "at least " } else { "" };
        let many = window.outcomes.len().saturating_sub(OUTCOMES);
        lines.push(line(Tone::Plain, window.settled.saturating_sub(told), &format!("{least}{many} more outcomes")));
    }
    let ends = [
        (window.oscillating, "oscillating"),
        (window.unsettled, "unsettled (limit reached)"),
        (window.cut, "cut before rest"),
    ];
    lines.extend(ends.into_iter().filter(|it| it.0 > 0).map(|(draws, words)| line(Tone::Unsure, draws, words)));
    let together = window.reached.saturating_sub(window.named);
    if together > 0 {
        lines.push(line(Tone::Plain, together, "together with an earlier step"));
    }
    if lines.is_empty() {
        lines.push(line(Tone::Unsure, window.reached, "not reached"));
    }
    lines
}

/// Median, 99th percentile and longest, `≥` where a cut window could make them longer.
fn times(settling: &Settling) -> [String; 3] {
    let text =
        |time: crate::time::Span, at_least: bool| format!("{}{}", if at_least { "≥ " } else { "" }, time.rounded());
    [
        text(settling.median, settling.median_at_least),
        text(settling.p99, settling.p99_at_least),
        text(settling.max, settling.max_at_least),
    ]
}
