//! The map over two parameters: which pairs of values pass. Told by letters and hatching, not by ink alone.
//! [`limit_tables::limit_map`](super::limit_tables::limit_map) has the numbers.

use std::fmt::Write;

use super::charts::fitting;
use super::ink;
use super::limit_words::draws;
use super::measure::{cut_end, width};
use super::words;
use crate::limit::{MapReport, Outcome, Range, model};
use crate::scenario::Scenario;
use crate::time::{Span, Unit};

/// Longest side of the field of cells, pixels.
const FIELD: f64 = 520.0;
/// Largest and smallest side of a cell, pixels.
const CELL: (f64, f64) = (30.0, 4.0);
/// From here on a cell has room for its letter, pixels.
const LETTER: f64 = 13.0;
/// Left of the field, above it, and right of it, pixels.
const LEFT: f64 = 96.0;
const TOP: f64 = 40.0;
const RIGHT: f64 = 24.0;
/// Values written at an axis, at most.
const TICKS: usize = 6;
/// One line of notes, pixels.
const LINE: f64 = 17.0;

/// The map as a picture: across one parameter, up the other, a cell a pair.
pub fn svg(scenario: &Scenario, report: &MapReport) -> String {
    let (columns, rows) = (report.across.1.len().max(1), report.up.1.len().max(1));
    let side = (FIELD / columns.max(rows) as f64).clamp(CELL.1, CELL.0).floor();
    let (wide, high) = (side * columns as f64, side * rows as f64);
    let present: Vec<Outcome> = Outcome::ALL.into_iter().filter(|outcome| report.count(*outcome) > 0).collect();
    let axes = [&report.across.0, &report.up.0].map(|range| (axis(scenario, range), unit(scenario, range)));
    let titles = axes.clone().map(|(name, unit)| format!("{name} [{unit}]"));
    let note = format!("Model: {}. {}.", model(scenario), draws(scenario, report.samples, report.alike));
    let total = (LEFT + wide + RIGHT).max(width(&note, ink::SMALL) + 24.0).max(460.0);
    let bottom = TOP + high + 48.0;
    let height = bottom + LINE * (present.len() as f64 + 1.0) + 12.0;

    let mut svg = String::new();
    let mut put =
        |line: &str| svg.write_str(line).and_then(|()| svg.write_char('\n')).expect("a string takes all text");
    let alternative = alternative(scenario, report);
    put(&format!(
        "<svg xmlns=\"http://www.w3.org/2000/svg\" role=\"img\" aria-label=\"{}\" width=\"{total:.0}\" height=\"{height:.0}\" \
         viewBox=\"0 0 {total:.0} {height:.0}\" font-family=\"sans-serif\" font-size=\"{}\" fill=\"{}\">",
        escaped(&alternative),
        ink::SMALL,
        ink::INK
    ));
    put(&format!(
        "<defs><pattern id=\"limit-map-fails\" width=\"5\" height=\"5\" patternUnits=\"userSpaceOnUse\"><rect width=\"5\" \
         height=\"5\" fill=\"{}\"/><path d=\"M0 5L5 0\" stroke=\"{}\" stroke-width=\"0.8\"/></pattern></defs>",
        ink::BAND,
        ink::QUIET
    ));
    put(&format!("<rect width=\"{total:.0}\" height=\"{height:.0}\" fill=\"#ffffff\"/>"));
    let title = words::clean(&format!("{}: which pairs pass", scenario.title));
    let title = cut_end(&title, 14.0, (total - 24.0) / 1.15).unwrap_or(title);
    put(&format!("<text x=\"12\" y=\"22\" font-size=\"14\" font-weight=\"bold\">{}</text>", escaped(&title)));
    for (row, (_, cells)) in report.up.1.iter().zip(&report.cells).enumerate() {
        let y = TOP + high - side * (row + 1) as f64;
        for (column, cell) in cells.iter().enumerate() {
            let x = LEFT + side * column as f64;
            put(&cell_svg(x, y, side, cell.as_ref().map(|point| point.outcome)));
        }
    }
    put(&format!(
        "<rect x=\"{LEFT}\" y=\"{TOP}\" width=\"{wide}\" height=\"{high}\" fill=\"none\" stroke=\"{}\"/>",
        ink::QUIET
    ));
    for (index, value) in ticks(&report.across.1) {
        let x = LEFT + side * (index as f64 + 0.5);
        let text = number(value, axes[0].1);
        put(&format!("<text x=\"{x}\" y=\"{}\" text-anchor=\"middle\">{text}</text>", TOP + high + 15.0));
        put(&tick(x, TOP + high, x, TOP + high + 4.0));
    }
    for (index, value) in ticks(&report.up.1) {
        let y = TOP + high - side * (index as f64 + 0.5);
        let text = number(value, axes[1].1);
        put(&format!("<text x=\"{}\" y=\"{}\" text-anchor=\"end\">{text}</text>", LEFT - 7.0, y + 4.0));
        put(&tick(LEFT - 4.0, y, LEFT, y));
    }
    let across = cut_end(&titles[0], ink::SMALL, total - LEFT - 8.0).unwrap_or_else(|| titles[0].clone());
    put(&format!("<text x=\"{LEFT}\" y=\"{}\">{}</text>", TOP + high + 34.0, escaped(&across)));
    let up = cut_end(&titles[1], ink::SMALL, high.max(160.0)).unwrap_or_else(|| titles[1].clone());
    let foot = TOP + high.max(160.0);
    put(&format!("<text transform=\"translate(22 {foot}) rotate(-90)\">{}</text>", escaped(&up)));
    for (line, outcome) in present.iter().enumerate() {
        let y = bottom + LINE * line as f64;
        put(&cell_svg(LEFT, y, LETTER, Some(*outcome)));
        let count = words::many(report.count(*outcome) as u64, "pair");
        put(&format!("<text x=\"{}\" y=\"{}\">{}: {count}</text>", LEFT + 20.0, y + 10.5, outcome.words()));
    }
    let y = bottom + LINE * present.len() as f64 + 12.0;
    put(&format!("<text x=\"12\" y=\"{y}\">{}</text>", escaped(&words::clean(&note))));
    put("</svg>");
    svg
}

fn tick(x1: f64, y1: f64, x2: f64, y2: f64) -> String {
    format!("<path d=\"M{x1} {y1}L{x2} {y2}\" stroke=\"{}\"/>", ink::QUIET)
}

/// One cell: white where it passes, hatched where a rule is broken, grey outlined with a letter otherwise.
fn cell_svg(x: f64, y: f64, side: f64, outcome: Option<Outcome>) -> String {
    let fill = match outcome {
        Some(Outcome::Breaks) => "url(#limit-map-fails)",
        Some(Outcome::NotJudged | Outcome::Unsettled) => ink::BAND,
        Some(Outcome::Passes | Outcome::Refused) | None => "#ffffff",
    };
    let mut cell = format!(
        "<rect x=\"{x}\" y=\"{y}\" width=\"{side}\" height=\"{side}\" fill=\"{fill}\" stroke=\"{}\" stroke-width=\"0.5\"/>",
        ink::QUIET
    );
    let letter = outcome.map(Outcome::letter).filter(|letter| *letter != '.' && side >= LETTER);
    if let Some(letter) = letter {
        let (x, y) = (x + side / 2.0, y + side / 2.0 + 3.6);
        cell += &format!("<text x=\"{x}\" y=\"{y}\" font-size=\"10\" text-anchor=\"middle\">{letter}</text>");
    }
    cell
}

/// Some of the values, evenly, from the first on.
fn ticks(values: &[i64]) -> Vec<(usize, i64)> {
    let stride = values.len().div_ceil(TICKS).max(1);
    values.iter().copied().enumerate().step_by(stride).collect()
}

fn unit(scenario: &Scenario, range: &Range) -> Unit {
    let longest = range.legal.from.unsigned_abs().max(range.legal.to.unsigned_abs());
    fitting(Span::from_fs(longest), scenario.unit)
}

fn number(fs: i64, unit: Unit) -> String {
    words::three(fs as f64 / unit.femtoseconds() as f64)
}

fn axis(scenario: &Scenario, range: &Range) -> String {
    words::clean(&range.parameter.words(scenario))
}

fn escaped(text: &str) -> String {
    maud::html! { (text) }.into_string()
}

/// The map in words.
fn alternative(scenario: &Scenario, report: &MapReport) -> String {
    let (across, up) = (axis(scenario, &report.across.0), axis(scenario, &report.up.0));
    let each = Outcome::ALL.into_iter().filter(|outcome| report.count(*outcome) > 0);
    let each: Vec<String> = each.map(|outcome| format!("{} {}", report.count(outcome), outcome.words())).collect();
    format!("Pairs of {across} and {up}: {}.", each.join(", "))
}
