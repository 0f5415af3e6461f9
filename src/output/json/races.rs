//! The two paths that race.

use serde::Serialize;

use super::parts::{Exact, Lines};
use crate::findings::{Path, RacePair};
use crate::output::{races, words};
use crate::scenario::Scenario;

/// The two paths that race; `second` is null where one path runs against a bound, or once round a loop.
#[derive(Serialize)]
pub(super) struct Race<'a> {
    meet: Option<&'a str>,
    first: Chain<'a>,
    second: Option<Chain<'a>>,
}

/// One path: the change that it begins with (null: power-up), the step that made it, its exact delays and their sum.
#[derive(Serialize)]
struct Chain<'a> {
    from: Option<String>,
    step: Option<&'a str>,
    at: Exact,
    total: Exact,
    left_out: u32,
    legs: Lines<Part<'a>>,
    text: String,
}

/// One delay of a path. Of a wire `net` is what it carries and `to` the net of the gate at its end. `came` is false for an
/// event that was cancelled.
#[derive(Serialize)]
struct Part<'a> {
    net: &'a str,
    edge: &'static str,
    delay: Exact,
    at: Exact,
    wire: bool,
    #[serde(skip_serializing_if = "Option::is_none")]
    to: Option<&'a str>,
    came: bool,
}

impl<'a> Race<'a> {
    pub fn of(scenario: &'a Scenario, pair: &RacePair) -> Race<'a> {
        Race {
            meet: pair.meet.map(|net| words::net(scenario, net)),
            first: chain(scenario, &pair.first),
            second: pair.second.as_ref().map(|path| chain(scenario, path)),
        }
    }
}

fn chain<'a>(scenario: &'a Scenario, path: &Path) -> Chain<'a> {
    let (circuit, unit) = (&*scenario.circuit, scenario.unit);
    let legs = path.legs.iter().map(|leg| Part {
        net: words::net(scenario, leg.net),
        edge: races::edge(leg.new),
        delay: Exact::span(leg.delay, unit),
        at: Exact::time(leg.at, unit),
        wire: leg.wire.is_some(),
        to: leg.wire.map(|wire| words::net(scenario, circuit.net_of(circuit.wires()[wire.0 as usize].1))),
        came: leg.came,
    });
    Chain {
        from: path.from.map(|(net, new)| format!("{} {}", words::net(scenario, net), races::edge(new))),
        step: words::step(scenario, path.moment),
        at: Exact::time(path.at, unit),
        total: Exact::span(path.total(), unit),
        left_out: path.left_out,
        legs: Lines(legs.collect()),
        text: races::alone(scenario, path),
    }
}
