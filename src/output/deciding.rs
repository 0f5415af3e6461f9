//! The inequality that decides a claim, margins and delays to add, in words that text and JSON share.

use super::races::arrow;
use super::words;
use crate::logic::Value;
use crate::proof::{Margin, MarginEnd, Quantity, Race, Ratio, Relation, Sum};
use crate::scenario::{Padded, Place, Scenario};
use crate::time::{Decimal, Span};

/// One quantity: `q↑`, `a → g` for a wire, a place by the label of its step.
pub(super) fn quantity(scenario: &Scenario, quantity: Quantity) -> String {
    let circuit = &scenario.circuit;
    let edges = |edges: [bool; 2]| match edges {
        [true, true] => "",
        [fall, _] => arrow(if fall { Value::Zero } else { Value::One }),
    };
    match quantity {
        Quantity::Gate(gate, of) => format!("{}{}", words::net(scenario, circuit.net_of(gate)), edges(of)),
        Quantity::Wire(wire, of) => format!("({}{})", wire_name(scenario, wire), edges(of)),
        Quantity::Place(step) => {
            let step = &scenario.stimulus.steps[step as usize];
            match step.place {
                Place::After(_) => format!("wait before \"{}\"", step.label),
                _ => format!("time of \"{}\"", step.label),
            }
        }
        Quantity::First(clock) => format!("first edge of {}", clock_name(scenario, clock)),
        Quantity::Period(clock) => format!("period of {}", clock_name(scenario, clock)),
        Quantity::High(clock) => format!("time high of {}", clock_name(scenario, clock)),
        Quantity::Jitter(clock, edge) => {
            format!("edge {} of {} after its earliest", edge + 1, clock_name(scenario, clock))
        }
        Quantity::Toggle { step, net, number, last } => {
            let label = &scenario.stimulus.steps[step as usize].label;
            let which = if last { "last toggle".to_string() } else { format!("toggle {}", number + 1) };
            format!("{which} of {} in \"{label}\"", words::net(scenario, net))
        }
        Quantity::Late(step, net) => {
            let label = &scenario.stimulus.steps[step as usize].label;
            format!("lateness of {} in \"{label}\"", words::net(scenario, net))
        }
    }
}

fn clock_name(scenario: &Scenario, clock: u32) -> &str {
    words::net(scenario, scenario.stimulus.clocks[clock as usize].net)
}

fn wire_name(scenario: &Scenario, wire: crate::circuit::WireId) -> String {
    let circuit = &scenario.circuit;
    let (net, gate) = circuit.wires()[wire.index()];
    format!("{} → {}", words::net(scenario, net), words::net(scenario, circuit.net_of(gate)))
}

/// A sum with its range: `a↑ + b↓ (12.1 … 27)`.
fn sum(scenario: &Scenario, sum: &Sum) -> String {
    let mut terms: Vec<String> = sum
        .terms
        .iter()
        .map(|(of, factor)| match factor {
            1 => quantity(scenario, *of),
            factor => format!("{factor} × {}", quantity(scenario, *of)),
        })
        .collect();
    let unit = scenario.unit;
    let number = |fs: i128| Decimal::new(fs, unit).to_string();
    let constant = format!("{} {unit}", number(sum.constant as i128));
    if terms.is_empty() {
        return constant;
    }
    if sum.constant > 0 {
        terms.push(constant);
    }
    let [least, most] = sum.range(scenario);
    let range = if least == most { number(least) } else { format!("{} … {}", number(least), number(most)) };
    format!("{} ({range})", terms.join(" + "))
}

/// A race as a whole sentence, without a full stop.
pub(super) fn race(scenario: &Scenario, race: &Race) -> String {
    let (first, second) = (sum(scenario, &race.first), sum(scenario, &race.second));
    let short = race.short(scenario);
    let amount = format!("{} {}", Decimal::new(short.abs(), scenario.unit), scenario.unit);
    match race.relation {
        Relation::Apart => format!("{first} must never exactly equal {second}"),
        relation => {
            let must = if relation == Relation::Below { "must stay below" } else { "must not exceed" };
            let end = match short {
                0 if relation == Relation::Below => "they can be equal in the worst case".to_string(),
                0 => "nothing in hand in the worst case".to_string(),
                1.. => format!("short by {amount} in the worst case"),
                _ => format!("{amount} in hand"),
            };
            format!("{first} {must} {second}: {end}")
        }
    }
}

/// A factor with up to four decimals, rounded down so that it never promises more.
pub(super) fn factor(ratio: Ratio) -> String {
    let scaled = ratio.numerator().checked_mul(10_000).map_or(0, |it| it.div_euclid(ratio.denominator()));
    let text = format!("{}.{:04}", scaled / 10_000, scaled % 10_000);
    text.trim_end_matches('0').trim_end_matches('.').to_string()
}

/// What a margin says of the ranges.
pub(super) fn margin(margin: &Margin) -> String {
    let about = factor(margin.factor);
    match margin.end {
        MarginEnd::Limit => format!("{about} or more"),
        MarginEnd::Budget => format!("{about}, perhaps more"),
        MarginEnd::Refuted | MarginEnd::Undecided => about,
    }
}

/// Where delay is added.
pub(super) fn place(scenario: &Scenario, place: Padded) -> String {
    match place {
        Padded::Gate(gate) => words::net(scenario, scenario.circuit.net_of(gate)).to_string(),
        Padded::Wire(wire) => wire_name(scenario, wire),
    }
}

/// The lines that the delays of a place become with so much added, as keys of its gate in a scenario file.
pub(super) fn patch(scenario: &Scenario, place: Padded, pad: Span) -> Vec<String> {
    let (ranges, one) = match place {
        Padded::Gate(gate) => (scenario.delays.gate[gate.index()], scenario.delays.gate_one_draw[gate.index()]),
        Padded::Wire(wire) => (scenario.delays.wire[wire.index()], scenario.delays.wire_one_draw[wire.index()]),
    };
    let [fall, rise] = ranges.map(|range| {
        let figures = [range.min, range.typ, range.max].map(|span| (span + pad).decimal(scenario.unit).to_string());
        match figures[0] == figures[2] {
            true => figures[0].clone(),
            false => format!("[{}]", figures.join(", ")),
        }
    });
    let name = |key: &str| {
        if key.bytes().all(|b| b.is_ascii_alphanumeric() || b == b'_' || b == b'-') {
            key.to_string()
        } else {
            format!("{key:?}")
        }
    };
    match place {
        Padded::Gate(gate) => {
            let gate = name(scenario.circuit.name(scenario.circuit.net_of(gate)));
            match one {
                true => vec![format!("gates.{gate}.delay = {rise}")],
                false => vec![format!("gates.{gate}.rise = {rise}"), format!("gates.{gate}.fall = {fall}")],
            }
        }
        Padded::Wire(wire) => {
            let (net, gate) = scenario.circuit.wires()[wire.index()];
            let (net, gate) =
                (name(scenario.circuit.name(net)), name(scenario.circuit.name(scenario.circuit.net_of(gate))));
            match one {
                true => vec![format!("gates.{gate}.wires.{net} = {rise}")],
                false => vec![format!("gates.{gate}.wires.{net} = {{ rise = {rise}, fall = {fall} }}")],
            }
        }
    }
}
