//! `[rules]`.

use toml::de::DeValue;

use super::steps::OSCILLATION;
use super::walk::{Value, Walk};
use crate::scenario::{Before, NewMinPulse, NewNever, NewNeverAtRest, NewRules, NewSwallowed, NewTiming, Permission};

const KEYS: [&str; 11] = [
    "glitch_free",
    "min_pulse",
    "settle_within",
    "critical_race",
    "oscillation",
    "swallowed",
    "before_rest",
    "not_judged",
    "never",
    "never_at_rest",
    "timing",
];

pub(super) fn rules(walk: &mut Walk, rules: &mut NewRules, value: &Value<'_>) {
    let Some(table) = walk.table(value, "write `[rules]`, then one rule a line") else { return };
    for (key, value) in table.iter() {
        match key.get_ref().as_ref() {
            "glitch_free" => glitch_free(walk, rules, value),
            "min_pulse" => min_pulse(walk, rules, value),
            "settle_within" => rules.settle_within = walk.amount(value),
            "critical_race" => {
                let words = [("forbidden", Permission::Forbidden), ("allowed", Permission::Allowed)];
                rules.critical_race = walk.word(value, &words);
            }
            "oscillation" => rules.oscillation = walk.word(value, &OSCILLATION),
            "swallowed" => swallowed(walk, rules, value),
            "before_rest" => {
                let words = [("allowed", Before::Allowed), ("forbidden", Before::Forbidden)];
                rules.before_rest = walk.word(value, &words);
            }
            "not_judged" => {
                let words = [("undecided", false), ("allowed", true)];
                rules.accept_not_judged = walk.word(value, &words).unwrap_or(false);
            }
            "never" => never(walk, rules, value),
            "never_at_rest" => never_at_rest(walk, rules, value),
            "timing" => timing(walk, rules, value),
            _ => walk.unknown_key(key, &KEYS, "[rules]"),
        }
    }
}

fn glitch_free(walk: &mut Walk, rules: &mut NewRules, value: &Value<'_>) {
    let DeValue::Table(table) = value.get_ref() else {
        if let Some(names) = walk.names(value) {
            rules.glitch_free = Some(names.into_iter().map(|name| (name, None)).collect());
        }
        return;
    };
    let mut list = Vec::with_capacity(table.len());
    for (key, value) in table.iter() {
        let name = walk.said_key(key);
        let mut bound = None;
        let help = "write `{ shorter_than = 5 }`, or `{}` to tolerate no glitch";
        let Some(table) = walk.table(value, help) else { continue };
        for (key, value) in table.iter() {
            match key.get_ref().as_ref() {
                "shorter_than" => bound = walk.amount(value),
                _ => walk.unknown_key(key, &["shorter_than"], "`glitch_free`"),
            }
        }
        list.push((name, bound));
    }
    rules.glitch_free = Some(list);
}

fn min_pulse(walk: &mut Walk, rules: &mut NewRules, value: &Value<'_>) {
    let Some(table) = walk.table(value, "write nets with their bounds, as in `{ q = { high = 4, low = 4 } }`") else {
        return;
    };
    for (key, value) in table.iter() {
        let mut rule = NewMinPulse { net: walk.said_key(key), high: None, low: None, incomplete: false };
        let Some(table) = walk.table(value, "write `{ high = 4 }`, `{ low = 4 }` or both") else { continue };
        for (key, value) in table.iter() {
            let read = match key.get_ref().as_ref() {
                "high" => walk.amount(value).map(|bound| rule.high = Some(bound)),
                "low" => walk.amount(value).map(|bound| rule.low = Some(bound)),
                _ => {
                    walk.unknown_key(key, &["high", "low"], "`min_pulse`");
                    None
                }
            };
            rule.incomplete |= read.is_none();
        }
        rules.min_pulse.push(rule);
    }
}

fn swallowed(walk: &mut Walk, rules: &mut NewRules, value: &Value<'_>) {
    rules.swallowed = match value.get_ref() {
        DeValue::Array(_) => walk.names(value).map(NewSwallowed::At),
        _ => walk
            .word(value, &[("listed", false), ("forbidden", true)])
            .map(|forbidden| if forbidden { NewSwallowed::Forbidden } else { NewSwallowed::Listed }),
    };
}

fn never(walk: &mut Walk, rules: &mut NewRules, value: &Value<'_>) {
    for (span, table) in walk.tables(value, "rules.never") {
        let mut rule = NewNever { mark: walk.mark(span.clone()), ..NewNever::default() };
        for (key, value) in table.iter() {
            let read = match key.get_ref().as_ref() {
                "name" => walk.text(value, "\"both open\"").map(|name| rule.name = Some(name.what)),
                "state" => walk.state(value).map(|(state, complete)| {
                    rule.state = state.what;
                    rule.incomplete |= !complete;
                }),
                "longer_than" => walk.amount(value).map(|bound| rule.longer_than = Some(bound)),
                _ => {
                    walk.unknown_key(key, &["name", "state", "longer_than"], "[[rules.never]]");
                    None
                }
            };
            rule.incomplete |= read.is_none();
        }
        if !table.contains_key("state") && !rule.incomplete {
            walk.missing(span, "state", "this rule", "{ q = 1, qn = 1 }");
            rule.incomplete = true;
        }
        rules.never.push(rule);
    }
}

fn never_at_rest(walk: &mut Walk, rules: &mut NewRules, value: &Value<'_>) {
    for (span, table) in walk.tables(value, "rules.never_at_rest") {
        let mut rule = NewNeverAtRest { mark: walk.mark(span.clone()), ..NewNeverAtRest::default() };
        for (key, value) in table.iter() {
            let read = match key.get_ref().as_ref() {
                "name" => walk.text(value, "\"both open\"").map(|name| rule.name = Some(name.what)),
                "state" => walk.state(value).map(|(state, complete)| {
                    rule.state = state.what;
                    rule.incomplete |= !complete;
                }),
                _ => {
                    walk.unknown_key(key, &["name", "state"], "[[rules.never_at_rest]]");
                    None
                }
            };
            rule.incomplete |= read.is_none();
        }
        if !table.contains_key("state") && !rule.incomplete {
            walk.missing(span, "state", "this rule", "{ q = 1, qn = 1 }");
            rule.incomplete = true;
        }
        rules.never_at_rest.push(rule);
    }
}

fn timing(walk: &mut Walk, rules: &mut NewRules, value: &Value<'_>) {
    const KEYS: [&str; 5] = ["name", "from", "to", "min", "max"];
    for (span, table) in walk.tables(value, "rules.timing") {
        let mut rule = NewTiming { mark: walk.mark(span), ..NewTiming::default() };
        for (key, value) in table.iter() {
            let read = match key.get_ref().as_ref() {
                "name" => walk.text(value, "\"dead time\"").map(|name| rule.name = Some(name.what)),
                "from" => walk.text(value, "\"q rise\"").map(|edge| rule.from = Some(edge)),
                "to" => walk.text(value, "\"q rise\"").map(|edge| rule.to = Some(edge)),
                "min" => walk.amount(value).map(|bound| rule.min = Some(bound)),
                "max" => walk.amount(value).map(|bound| rule.max = Some(bound)),
                _ => {
                    walk.unknown_key(key, &KEYS, "[[rules.timing]]");
                    None
                }
            };
            rule.incomplete |= read.is_none();
        }
        rules.timing.push(rule);
    }
}
