//! What stands in a box, and above a column.

use super::Map;
use super::labels::{BOLD, letter, names_are_letters};
use crate::circuit::NetId;
use crate::logic::Bits;
use crate::output::ink::{BODY, SMALL};
use crate::output::measure::{cut_middle, width};
use crate::output::words;

/// Most nets that get a line each; more are written as digits.
pub(super) const NAMED: usize = 4;
/// Digits of one line, in groups of four.
const DIGITS: usize = 12;
/// Most lines of digits.
const LINES: usize = 4;
/// Widest and narrowest inside of a box.
const ROOM: f64 = 122.0;
const LEAST: f64 = 62.0;
/// From a name to its value.
const SPACE: f64 = 8.0;

/// Nets of which boxes or headings tell the values.
pub(super) struct Nets {
    pub nets: Vec<NetId>,
    /// Values without names.
    pub digits: bool,
    /// Lines that they take.
    pub lines: usize,
    pub width: f64,
    names: Vec<String>,
    /// Not all digits have room.
    pub cut: bool,
}

/// One line: a name and its value, or digits.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(super) struct Line {
    pub name: String,
    pub value: String,
}

impl Nets {
    /// These nets, their names after a prefix, at a font size.
    fn new(nets: Vec<NetId>, name: impl Fn(NetId) -> String, named: usize, size: f64) -> Nets {
        let digits = nets.len() > named;
        if digits {
            let all = nets.len().div_ceil(DIGITS);
            let width = width("0000 0000 0000", size);
            return Nets { nets, digits, lines: all.min(LINES), width, names: Vec::new(), cut: all > LINES };
        }
        let value = width("0", size);
        let names: Vec<String> = nets
            .iter()
            .map(|net| {
                let name = words::clean(&name(*net));
                cut_middle(&name, size, ROOM - SPACE - value).unwrap_or(name)
            })
            .collect();
        let widest = names.iter().map(|name| width(name, size) + SPACE + value).fold(0.0, f64::max);
        Nets { lines: nets.len(), nets, digits, width: widest, names, cut: false }
    }

    /// The lines for these values.
    pub fn lines(&self, value: impl Fn(NetId) -> bool) -> Vec<Line> {
        let digit = |net: &NetId| if value(*net) { '1' } else { '0' };
        if !self.digits {
            let each = self.nets.iter().zip(&self.names);
            return each.map(|(net, name)| Line { name: name.clone(), value: digit(net).to_string() }).collect();
        }
        let lines = self.nets.chunks(DIGITS).take(LINES).enumerate().map(|(i, nets)| {
            let groups: Vec<String> = nets.chunks(4).map(|nets| nets.iter().map(digit).collect()).collect();
            let more = if self.cut && i + 1 == LINES { "…" } else { "" };
            Line { name: groups.join(" ") + more, value: String::new() }
        });
        lines.collect()
    }
}

/// The texts of all boxes and headings.
pub(super) struct Texts {
    /// Bold.
    pub variables: Nets,
    /// Outputs that are no state variables.
    pub outputs: Nets,
    pub heading: Nets,
    /// Width of the inside of a box.
    pub inside: f64,
}

impl Texts {
    /// The texts of this map; `varying` are the inputs in headings, each after its letter where arrows speak of letters.
    pub fn new(map: &Map<'_>, varying: &[NetId], with_letters: bool) -> Texts {
        let name = |net: NetId| words::net(map.scenario, net).to_string();
        let others = map.scenario.outputs.iter().copied();
        let others =
            others.filter(|net| !map.state_variables.contains(net) && !map.scenario.circuit.is_input(*net)).collect();
        let lettered = |net: NetId| match with_letters && !names_are_letters(map.scenario) {
            false => name(net),
            true => format!("{} {}", letter(map.scenario, net), name(net)),
        };
        let variables = Nets::new(map.state_variables.to_vec(), name, NAMED, BODY * BOLD);
        let outputs = Nets::new(others, name, NAMED, SMALL);
        // all letters are wanted where arrows speak of them
        let named = if with_letters { 16 } else { 2 * NAMED };
        let heading = Nets::new(varying.to_vec(), lettered, named, SMALL);
        // the number of a state and its mark stand in one line
        let first = width("S1000", BODY * BOLD) + width("▸ start", SMALL);
        let widest = [variables.width, outputs.width, heading.width, LEAST, first];
        let inside = widest.into_iter().fold(0.0, f64::max).ceil();
        Texts { variables, outputs, heading, inside }
    }

    /// Lines of a box below its number.
    pub fn of_state(&self, values: &Bits) -> (Vec<Line>, Vec<Line>) {
        let value = |net: NetId| values.get(net.index());
        (self.variables.lines(value), self.outputs.lines(value))
    }
}
