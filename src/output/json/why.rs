//! Why a finding happens.

use serde::Serialize;

use super::parts::{Exact, Lines};
use crate::instance::Quantity;
use crate::output::causes;
use crate::output::words::{self, six};
use crate::review::{Away, Pull, Why};
use crate::scenario::Scenario;

/// What must leave typical: the quantities, the farthest first; `minimal` if each was shown to be needed, to 1 fs; what
/// stays as in the failing case; the file of the case; runs that it took; what cut the search.
#[derive(Serialize)]
pub(super) struct Needs {
    away: Lines<AwayFrom>,
    typical_shows_it: bool,
    minimal: bool,
    kept: Vec<&'static str>,
    case: Option<String>,
    runs: u64,
    cut: Option<String>,
}

#[derive(Serialize)]
struct AwayFrom {
    what: String,
    value: Exact,
    min: Exact,
    typ: Exact,
    max: Exact,
    place: f64,
}

/// How decisive a quantity is, and how many failing and passing draws (boards) say so.
#[derive(Serialize)]
pub(super) struct Decisive {
    what: String,
    strength: f64,
    failing: u64,
    passing: u64,
}

fn time(scenario: &Scenario, quantity: &Quantity, span: crate::time::Span) -> Exact {
    Exact::signed(words::value(quantity, span), scenario.unit)
}

pub(super) fn needs(scenario: &Scenario, why: &Why, case: Option<String>) -> Option<Needs> {
    let needs = why.needs.as_ref()?;
    let away = |it: &Away| AwayFrom {
        what: words::quantity(scenario, it.quantity.target),
        value: time(scenario, &it.quantity, it.value),
        min: time(scenario, &it.quantity, it.quantity.range.min),
        typ: time(scenario, &it.quantity, it.typical),
        max: time(scenario, &it.quantity, it.quantity.range.max),
        place: six(it.place()),
    };
    Some(Needs {
        away: Lines(needs.away.iter().map(away).collect()),
        typical_shows_it: needs.typical_shows_it(),
        minimal: needs.minimal,
        kept: causes::kept(needs),
        case,
        runs: needs.runs,
        cut: needs.cut.map(words::cut),
    })
}

pub(super) fn pull(scenario: &Scenario, why: &Why) -> Option<Lines<Decisive>> {
    let decisive = |it: &Pull| Decisive {
        what: words::quantity(scenario, it.quantity.target),
        strength: six(it.strength),
        failing: it.failing,
        passing: it.passing,
    };
    let pull = why.pull.as_ref()?;
    Some(Lines(pull.told.iter().map(decisive).collect()))
}
