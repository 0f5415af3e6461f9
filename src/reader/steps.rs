//! `[[steps]]` and `[[clocks]]`.

use std::ops::Range;

use toml::de::{DeTable, DeValue};

use super::walk::{Value, Walk};
use crate::control::Control;
use crate::flow;
use crate::scenario::Walk as Steps;
use crate::scenario::{Builder, Fault, NewBounce, NewClock, NewPlace, NewState, NewStep, Oscillation, Said, Scenario};

const STEP_KEYS: [&str; 16] = [
    "label",
    "at",
    "after",
    "rest",
    "when",
    "wait",
    "timeout",
    "set",
    "skew",
    "bounce",
    "expect",
    "edges",
    "settle_within",
    "oscillation",
    "times",
    "steps",
];

pub(super) const OSCILLATION: [(&str, Oscillation); 3] =
    [("forbidden", Oscillation::Forbidden), ("allowed", Oscillation::Allowed), ("required", Oscillation::Required)];

pub(super) fn steps(walk: &mut Walk, builder: &mut Builder, value: &Value<'_>) {
    for (span, table) in walk.tables(value, "steps") {
        if table.contains_key("times") || table.contains_key("steps") {
            repeat(walk, builder, span, table);
        } else {
            builder.step(step(walk, span, table));
        }
    }
}

fn repeat(walk: &mut Walk, builder: &mut Builder, span: Range<usize>, table: &DeTable<'_>) {
    let (mut times, mut steps) = (None, None);
    for (key, value) in table.iter() {
        match key.get_ref().as_ref() {
            "times" => times = Some(walk.integer(value)),
            "steps" => {
                let help = "write a list of steps, as in `steps = [ { after = 50, set = { a = 1 } } ]`";
                let list = walk.list(value, "a list of steps", help).unwrap_or_default();
                let mut inner = Vec::with_capacity(list.len());
                for item in list {
                    let Some(table) = walk.table(item, help) else { continue };
                    if table.contains_key("times") || table.contains_key("steps") {
                        walk.fault(
                            item.span(),
                            "a loop stands in a loop",
                            "write the inner one out: loops do not nest",
                        );
                    } else {
                        inner.push(step(walk, item.span(), table));
                    }
                }
                steps = Some((inner, list.is_empty()));
            }
            other if STEP_KEYS.contains(&other) => {
                let message = format!("`{other}` stands in a loop, outside its steps");
                walk.fault(key.span(), message, "a loop holds `times` and `steps`; put it into one of the steps");
            }
            _ => walk.unknown_key(key, &["times", "steps"], "a loop"),
        }
    }
    if times.is_none() {
        walk.missing(span.clone(), "times", "this loop", "100");
    }
    let Some((steps, empty)) = steps else {
        walk.missing(span, "steps", "this loop", "[ { after = 50, set = { a = 1 } } ]");
        return;
    };
    // a loop whose number is unknown still has its steps checked, once; one whose steps were all unreadable is passed over
    let mark = walk.mark(span);
    let times = times.flatten().unwrap_or(Said::at(1, mark));
    if empty || !steps.is_empty() {
        builder.repeat(times, steps);
    }
}

fn step(walk: &mut Walk, span: Range<usize>, table: &DeTable<'_>) -> NewStep {
    let mut step = NewStep { mark: walk.mark(span), ..NewStep::default() };
    let (mut wait, mut timeout) = (None, None);
    for (key, value) in table.iter() {
        let read = match key.get_ref().as_ref() {
            "label" => walk.text(value, "\"both call\"").map(|label| step.label = Some(label)),
            "at" => {
                let place = walk.range(value).map(NewPlace::At);
                step.places.push(place.unwrap_or(NewPlace::Unreadable));
                Some(())
            }
            "after" => {
                let place = walk.range(value).map(NewPlace::After);
                step.places.push(place.unwrap_or(NewPlace::Unreadable));
                Some(())
            }
            "rest" => {
                let place = walk.amount(value).map(NewPlace::Rest);
                step.places.push(place.unwrap_or(NewPlace::Unreadable));
                Some(())
            }
            "when" => {
                let pattern = state(walk, value, &mut step.incomplete);
                let place = pattern.map(|pattern| NewPlace::When { pattern, wait: None, timeout: None });
                step.places.push(place.unwrap_or(NewPlace::Unreadable));
                Some(())
            }
            "wait" => {
                wait = walk.range(value).map(|range| (key.span(), range));
                Some(())
            }
            "timeout" => {
                timeout = walk.amount(value).map(|amount| (key.span(), amount));
                Some(())
            }
            "set" => state(walk, value, &mut step.incomplete).map(|set| step.set = set.what),
            "skew" => walk.range(value).map(|range| step.skew = Some(range)),
            "bounce" => bounce(walk, value).map(|bounce| step.bounce = Some(bounce)),
            "expect" => expect(walk, value, &mut step.incomplete).map(|expect| step.expect = Some(expect)),
            "edges" => edges(walk, value, &mut step),
            "settle_within" => walk.amount(value).map(|bound| step.settle_within = Some(bound)),
            "oscillation" => walk.word(value, &OSCILLATION).map(|word| step.oscillation = Some(word)),
            _ => {
                walk.unknown_key(key, &STEP_KEYS, "[[steps]]");
                None
            }
        };
        step.incomplete |= read.is_none();
    }
    let pattern = step.places.iter_mut().find_map(|place| match place {
        NewPlace::When { wait, timeout, .. } => Some((wait, timeout)),
        _ => None,
    });
    match pattern {
        Some((of_wait, of_timeout)) => {
            *of_wait = wait.map(|(_, range)| range);
            *of_timeout = timeout.map(|(_, amount)| amount);
        }
        None if !step.incomplete => {
            let keys = [("wait", wait.map(|(key, _)| key)), ("timeout", timeout.map(|(key, _)| key))];
            for (name, key) in keys {
                if let Some(key) = key {
                    let help = "add `when = { net = 1 }`, or place the step by `at`, `after` or `rest`";
                    walk.fault(key, format!("`{name}` stands without `when`"), help);
                }
            }
        }
        None => {}
    }
    step
}

/// A state; what could not be read of it makes its step incomplete.
fn state(walk: &mut Walk, value: &Value<'_>, incomplete: &mut bool) -> Option<Said<NewState>> {
    let (state, complete) = walk.state(value)?;
    *incomplete |= !complete;
    Some(state)
}

fn expect(walk: &mut Walk, value: &Value<'_>, incomplete: &mut bool) -> Option<Said<Vec<Said<NewState>>>> {
    let mark = walk.mark(value.span());
    let alternatives = match value.get_ref() {
        DeValue::Array(list) => {
            let states: Vec<_> = list.iter().map(|item| state(walk, item, incomplete)).collect();
            *incomplete |= states.iter().any(Option::is_none);
            states.into_iter().flatten().collect()
        }
        _ => vec![state(walk, value, incomplete)?],
    };
    Some(Said::at(alternatives, mark))
}

fn edges(walk: &mut Walk, value: &Value<'_>, step: &mut NewStep) -> Option<()> {
    let table = walk.table(value, "write nets with their numbers of transitions, as in `{ q = 2 }`")?;
    for (key, value) in table.iter() {
        let name = walk.said_key(key);
        let count = walk.counts(value)?;
        step.edges.push((name, count));
    }
    Some(())
}

fn bounce(walk: &mut Walk, value: &Value<'_>) -> Option<NewBounce> {
    let table = walk.table(value, "write `{ lasting = [1, 5], pulses = [0, 6] }`")?;
    let (mut lasting, mut pulses) = (None, None);
    for (key, value) in table.iter() {
        match key.get_ref().as_ref() {
            "lasting" => lasting = Some(walk.range(value)),
            "pulses" => pulses = Some(walk.counts(value)),
            _ => {
                walk.unknown_key(key, &["lasting", "pulses"], "`bounce`");
                return None;
            }
        }
    }
    if lasting.is_none() {
        walk.missing(value.span(), "lasting", "this bounce", "[1, 5]");
    }
    if pulses.is_none() {
        walk.missing(value.span(), "pulses", "this bounce", "[0, 6]");
    }
    Some(NewBounce { lasting: lasting.flatten()?, pulses: pulses.flatten()? })
}

/// Adds the steps that `stimulus` stands for.
pub(super) fn lay_out(scenario: Scenario) -> Result<Scenario, Vec<Fault>> {
    let Steps::ToLayOut { mark, .. } = scenario.stimulus.walk else { return Ok(scenario) };
    flow::lay_out(scenario, &Control::default()).map_err(|error| {
        let message = format!("the changes cannot be walked: {error}");
        vec![Fault::new(mark, message, "write steps in its place, and report this with the file")]
    })
}

pub(super) fn clocks(walk: &mut Walk, builder: &mut Builder, value: &Value<'_>) {
    const KEYS: [&str; 6] = ["net", "first", "period", "high", "jitter", "count"];
    for (span, table) in walk.tables(value, "clocks") {
        let (mut net, mut first, mut period, mut high, mut count) = (None, None, None, None, None);
        let mut jitter = None;
        let mut known = true;
        for (key, value) in table.iter() {
            match key.get_ref().as_ref() {
                "net" => net = Some(walk.text(value, "\"tick\"")),
                "first" => first = Some(walk.range(value)),
                "period" => period = Some(walk.range(value)),
                "high" => high = Some(walk.range(value)),
                "jitter" => jitter = walk.amount(value),
                "count" => count = Some(walk.integer(value)),
                _ => {
                    walk.unknown_key(key, &KEYS, "[[clocks]]");
                    known = false;
                }
            }
        }
        let needed = [
            ("net", net.is_none(), "\"tick\""),
            ("first", first.is_none(), "50"),
            ("period", period.is_none(), "50"),
            ("high", high.is_none(), "25"),
            ("count", count.is_none(), "16"),
        ];
        for (key, missing, example) in needed {
            if missing && known {
                walk.missing(span.clone(), key, "this clock", example);
            }
        }
        let read = (net.flatten(), first.flatten(), period.flatten(), high.flatten(), count.flatten());
        if let (Some(net), Some(first), Some(period), Some(high), Some(count)) = read {
            builder.clock(NewClock { net, first, period, high, jitter, count, mark: walk.mark(span) });
        }
    }
}
