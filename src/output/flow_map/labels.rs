//! What stands at the beginning of an arrow.

use super::arrows::Arrow;
use crate::circuit::NetId;
use crate::logic::Bits;
use crate::output::ink::SMALL;
use crate::output::measure::{cut_end, cut_middle, width};
use crate::output::{flow_words, words};
use crate::scenario::Scenario;
use crate::statics::Change;

/// Bold letters are wider than the estimate.
pub(super) const BOLD: f64 = 1.15;
/// Widest label, pixels.
const ROOM: f64 = 150.0;
/// Most lines for what moves.
const MOVES: usize = 4;
/// Height of a line below an arrow.
pub(super) const BELOW: f64 = 12.0;
/// Radius of the disc around the number of a step.
pub(super) const DISC: f64 = 8.0;

/// Do labels say all, or only give a sign that the key below the picture explains?
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Style {
    Words,
    Signs,
}

/// A label: above its line, below it, or a number in a disc on it.
#[derive(Clone, Debug, Default, PartialEq)]
pub(super) struct Label {
    pub above: String,
    pub below: Vec<String>,
    /// The number of a step in the key.
    pub number: Option<usize>,
    /// The label above is that of a step.
    pub bold: bool,
}

impl Label {
    /// The label of the step arrow with this number in the key, or of a single change.
    pub fn of(scenario: &Scenario, arrow: &Arrow, from: &Bits, style: Style, number: usize) -> Label {
        match (style, arrow.moments.is_empty()) {
            (Style::Words, false) => Label {
                above: steps_within(scenario, arrow, ROOM / BOLD),
                below: moves(scenario, arrow, from),
                number: None,
                bold: true,
            },
            (Style::Words, true) => {
                Label { above: fit(&flow_words::moves(scenario, from, &arrow.change), ROOM), ..Label::default() }
            }
            (Style::Signs, false) => Label { number: Some(number), ..Label::default() },
            (Style::Signs, true) => Label { above: sign(scenario, arrow, from), ..Label::default() },
        }
    }

    pub fn width(&self) -> f64 {
        let disc = if self.number.is_some() { 2.0 * DISC } else { 0.0 };
        let above = width(&self.above, SMALL) * if self.bold { BOLD } else { 1.0 };
        self.below.iter().map(|line| width(line, SMALL)).fold(above.max(disc), f64::max)
    }

    /// How much height it takes above and below its line.
    pub fn heights(&self) -> (f64, f64) {
        let above: f64 = if self.above.is_empty() { 5.0 } else { 14.0 };
        let below: f64 = if self.below.is_empty() { 4.0 } else { 7.0 + BELOW * self.below.len() as f64 };
        let disc = if self.number.is_some() { DISC + 2.0 } else { 0.0 };
        (above.max(disc), below.max(disc))
    }
}

fn fit(text: &str, room: f64) -> String {
    let text = words::clean(text);
    cut_middle(&text, SMALL, room).unwrap_or(text)
}

/// What moves, an input a line.
fn moves(scenario: &Scenario, arrow: &Arrow, from: &Bits) -> Vec<String> {
    let moving: Vec<_> = arrow.change.moving(from).collect();
    let one = |(net, bit)| Change { set: vec![(net, bit)], apart: false };
    let line = |it: &(NetId, bool)| fit(&flow_words::moves(scenario, from, &one(*it)), ROOM);
    let most = if moving.len() > MOVES { MOVES - 1 } else { MOVES };
    let mut lines: Vec<String> = moving.iter().take(most).map(line).collect();
    if moving.len() > most {
        lines.push(format!("and {} more", words::count((moving.len() - most) as u64)));
    }
    lines
}

/// As [`steps`], no wider than this: the label is cut, not the number.
fn steps_within(scenario: &Scenario, arrow: &Arrow, room: f64) -> String {
    let first = words::step(scenario, arrow.moments.first().copied()).unwrap_or_default();
    let more = match arrow.moments.len() {
        0 | 1 => String::new(),
        many => format!(" +{}", words::count(many as u64 - 1)),
    };
    let first = words::clean(first);
    cut_end(&first, SMALL, room - width(&more, SMALL)).unwrap_or(first) + &more
}

/// The labels of the steps that an arrow stands for: the first, and how many more.
pub(super) fn steps(scenario: &Scenario, arrow: &Arrow) -> String {
    let first = words::step(scenario, arrow.moments.first().copied()).unwrap_or_default();
    match arrow.moments.len() {
        0 | 1 => first.to_string(),
        many => format!("{first} and {} more", words::count(many as u64 - 1)),
    }
}

/// The sign of a single change: the letter of its input, and whether it rises.
fn sign(scenario: &Scenario, arrow: &Arrow, from: &Bits) -> String {
    let each =
        arrow.change.moving(from).map(|(net, bit)| format!("{}{}", letter(scenario, net), if bit { '↑' } else { '↓' }));
    each.collect()
}

/// Are the names of all inputs as short as letters, so that they stand for themselves? Other letters would be mistaken
/// for them.
pub(super) fn names_are_letters(scenario: &Scenario) -> bool {
    scenario.circuit.inputs().all(|net| words::net(scenario, net).len() <= 2)
}

/// The letter of an input; its name where names are that short.
pub(super) fn letter(scenario: &Scenario, net: NetId) -> String {
    if names_are_letters(scenario) { words::net(scenario, net).to_string() } else { numbered(net) }
}

/// a to z, then aa, ab, …
fn numbered(net: NetId) -> String {
    let mut letters = Vec::new();
    let mut rest = u64::from(net.0) + 1;
    while rest > 0 {
        rest -= 1;
        letters.push(char::from(b'a' + (rest % 26) as u8));
        rest /= 26;
    }
    letters.iter().rev().collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn letters_of_inputs() {
        let letters = [0, 1, 25, 26, 27, 701, 702].map(|net| numbered(NetId(net)));
        assert_eq!(letters, ["a", "b", "z", "aa", "ab", "zz", "aaa"]);
    }

    #[test]
    fn names_as_short_as_letters_stand_for_themselves() {
        let letters = |names: [&str; 3]| {
            let mut draft = crate::scenario::Builder::new("letters");
            names.iter().for_each(|name| {
                draft.input(*name, false);
            });
            draft.gate("out", crate::circuit::Function::And, names).delay("1");
            let scenario = draft.finish().unwrap();
            [0, 1, 2].map(|net| letter(&scenario, NetId(net)))
        };
        assert_eq!(letters(["s", "a", "b"]), ["s", "a", "b"], "not a, b and c");
        assert_eq!(letters(["s", "a", "bus"]), ["a", "b", "c"]);
    }
}
