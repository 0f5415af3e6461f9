//! The two paths that race, in words that text, JSON and pictures share.

use crate::findings::{Leg, Path, RacePair};
use crate::logic::Value;
use crate::output::words;
use crate::scenario::Scenario;
use crate::time::{Span, Unit};

/// Longest text of a path by itself.
const WIDTH: usize = 200;
/// Most digits behind the point.
const DECIMALS: u32 = 4;

/// One text a path, beginning with its letter: `A 21.4 ns = hold_lower↑ 9.8 + open_lower↓ 11.6, from call_upper↓`. What both
/// begin with is said once. Long chains are cut in the middle so that a text has at most `width` letters, if names allow.
/// Delays are rounded.
pub(super) fn lines(scenario: &Scenario, pair: &RacePair, width: usize) -> Vec<String> {
    let alike = pair.second.as_ref().is_none_or(|it| (it.from, it.at) == (pair.first.from, pair.first.at));
    let meet = pair.meet.filter(|_| pair.second.is_some());
    let meet = meet.map_or_else(String::new, |net| format!("; meet at {}", words::net(scenario, net)));
    let tail = |path: &Path| beginning(scenario, path, alike);
    let first = line(scenario, &pair.first, "A", &tail(&pair.first), width);
    let second = pair.second.as_ref().map(|path| {
        let from = if alike && !path.legs.is_empty() { String::new() } else { tail(path) };
        line(scenario, path, "B", &format!("{from}{meet}"), width)
    });
    std::iter::once(first).chain(second).collect()
}

/// A path by itself, without a letter.
pub(super) fn alone(scenario: &Scenario, path: &Path) -> String {
    line(scenario, path, "", &beginning(scenario, path, false), WIDTH).trim_start().to_string()
}

fn line(scenario: &Scenario, path: &Path, letter: &str, tail: &str, width: usize) -> String {
    let unit = scenario.unit;
    let decimals = decimals(path, unit);
    let number = |span: Span| fixed(span, unit, decimals);
    if path.legs.is_empty() {
        return format!("{letter} 0 {unit}{tail}");
    }
    let head = format!("{letter} {} {unit} = ", number(path.total()));
    let legs: Vec<String> = path.legs.iter().map(|leg| leg_words(scenario, leg, &number(leg.delay))).collect();
    let length = |text: &str| text.chars().count();
    let room = width.saturating_sub(length(&head) + length(tail));
    format!("{head}{}{tail}", joined(&legs, room))
}

/// The legs with plus signs between; of too many the middle is left out.
fn joined(legs: &[String], room: usize) -> String {
    let whole = legs.join(" + ");
    if whole.chars().count() <= room || legs.len() < 4 {
        return whole;
    }
    let (first, rest) = (legs.len().div_ceil(2).min(legs.len() - 2), legs.len());
    // from the middle on leg after leg goes, in turn before and behind it, down to the first and the last
    let (mut before, mut behind) = (first, rest - first);
    loop {
        if before > behind {
            before -= 1
        } else {
            behind -= 1
        }
        let left_out = rest - before - behind;
        let (start, end) = (legs[..before].join(" + "), legs[rest - behind..].join(" + "));
        let text = format!("{start} + … {left_out} more + {end}");
        if text.chars().count() <= room || before + behind <= 2 {
            return text;
        }
    }
}

fn leg_words(scenario: &Scenario, leg: &Leg, delay: &str) -> String {
    let lost = if leg.came { "" } else { " (cancelled)" };
    match leg.wire {
        Some(wire) => {
            let circuit = &scenario.circuit;
            let to = circuit.net_of(circuit.wires()[wire.0 as usize].1);
            format!("wire to {} {delay}{lost}", words::net(scenario, to))
        }
        None => format!("{}{} {delay}{lost}", words::net(scenario, leg.net), arrow(leg.new)),
    }
}

/// What a path begins with, and when, if the other one begins with something else.
fn beginning(scenario: &Scenario, path: &Path, alike: bool) -> String {
    let unit = scenario.unit;
    let when = match alike {
        true => String::new(),
        false => {
            let at = path.at.from_start();
            let whole = at.fs().is_multiple_of(unit.femtoseconds());
            format!(" at {} {unit}", fixed(at, unit, if whole { 0 } else { decimals(path, unit) }))
        }
    };
    match path.from {
        None => format!(", from power-up{when}"),
        Some((net, value)) => {
            let edge = format!("{}{}", words::net(scenario, net), arrow(value));
            match (path.left_out, scenario.circuit.is_input(net), path.legs.is_empty()) {
                (0, true, true) => format!(": {edge} itself{when}"),
                (0, true, false) => format!(", from {edge}{when}"),
                (0, false, _) => format!(", once round from {edge}{when}"),
                (n, _, _) => format!(", from {edge} after {} more{when}", words::count(u64::from(n))),
            }
        }
    }
}

/// An edge as people draw it.
pub(super) const fn arrow(new: Value) -> &'static str {
    match new {
        Value::Zero => "↓",
        Value::One => "↑",
        Value::X => "→X",
    }
}

/// An edge in the words of the scenario file: `rise`, `fall`, or `X`.
pub(super) const fn edge(new: Value) -> &'static str {
    match new {
        Value::Zero => "fall",
        Value::One => "rise",
        Value::X => "X",
    }
}

/// Digits behind the point that show three digits of the sum and two of its least part, but none that are all zero.
fn decimals(path: &Path, unit: Unit) -> u32 {
    let spans = || path.legs.iter().map(|leg| leg.delay).chain([path.total()]);
    let digits = |span: Span| span.fs().checked_ilog10().unwrap_or(0);
    let behind = |span: Span, wanted: u32| (unit.exponent() + wanted).saturating_sub(digits(span) + 1);
    let least = path.legs.iter().map(|leg| leg.delay).min().unwrap_or(Span::ZERO);
    let wanted = behind(path.total(), 3).max(behind(least, 2)).min(behind(path.total(), 3) + 2);
    let wanted = wanted.min(DECIMALS + behind(path.total(), 1)).min(unit.exponent());
    let needed = |n: u32| spans().all(|span| span.fs() % 10u64.pow(unit.exponent() - n) == 0);
    (0..wanted).find(|n| needed(*n)).unwrap_or(wanted)
}

/// A time with so many digits behind the point, rounded half up.
fn fixed(span: Span, unit: Unit, decimals: u32) -> String {
    let step = 10u128.pow(unit.exponent() - decimals);
    let (rounded, scale) = ((u128::from(span.fs()) + step / 2) / step, 10u128.pow(decimals));
    match decimals {
        0 => rounded.to_string(),
        _ => format!("{}.{:0width$}", rounded / scale, rounded % scale, width = decimals as usize),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_time_is_rounded_half_up_to_the_digits_asked_for() {
        let text = |fs: u64, decimals: u32| fixed(Span::from_fs(fs), Unit::Ns, decimals);
        assert_eq!((text(21_449_999, 1), text(21_450_000, 1)), ("21.4".into(), "21.5".into()));
        assert_eq!((text(999_999, 0), text(1, 3), text(49_000, 2)), ("1".into(), "0.000".into(), "0.05".into()));
    }

    #[test]
    fn long_chains_lose_their_middle() {
        let legs: Vec<String> = (0..9).map(|n| format!("g{n}↑ 1")).collect();
        assert_eq!(joined(&legs, 200).matches('+').count(), 8);
        let cut = joined(&legs, 40);
        assert_eq!(cut, "g0↑ 1 + g1↑ 1 + … 5 more + g7↑ 1 + g8↑ 1");
        assert_eq!(joined(&legs, 39), "g0↑ 1 + g1↑ 1 + … 6 more + g8↑ 1");
        assert_eq!(joined(&legs, 3), "g0↑ 1 + … 7 more + g8↑ 1", "the ends stay");
    }
}
