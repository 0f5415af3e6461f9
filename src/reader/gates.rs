//! `[gates]`, `[delays]`, `[[groups]]`, `[conditions]` and `[reference]`.

use toml::de::DeTable;

use super::walk::{Key, Value, Walk};
use crate::circuit::Function;
use crate::scenario::{Builder, Mark, NewCondition, NewDelay, NewFilter, NewGroup, Said};

/// The keys of a gate that are no function.
const GATE_KEYS: [&str; 5] = ["delay", "rise", "fall", "wires", "filter"];

fn functions() -> impl Iterator<Item = &'static str> + Clone {
    Function::LISTED.iter().map(Function::name).chain(["expr"])
}

fn is_function(name: &str) -> bool {
    functions().any(|function| function == name)
}

/// What a gate computes and reads, as far as it could be read.
enum Logic {
    Listed(Function, Vec<Said<String>>, Mark),
    Expr(Said<String>),
    Unreadable,
}

pub(super) fn gates(walk: &mut Walk, builder: &mut Builder, value: &Value<'_>) {
    let Some(table) = walk.table(value, "write `[gates]`, then one gate a line") else { return };
    if table.is_empty() {
        walk.fault(value.span(), "there is no gate", "add at least one, as in `q = { nor = [\"r\", \"qn\"] }`");
    }
    for (key, value) in table.iter() {
        let name = walk.said_key(key);
        let Some(table) = gate_table(walk, key, value) else {
            builder.unreadable_gate(name);
            continue;
        };
        let logic = logic(walk, key, value, table, &GATE_KEYS);
        let mut delays = NewDelay::default();
        let (mut filter, mut wires) = (None, Vec::new());
        for (key, value) in table.iter() {
            match key.get_ref().as_ref() {
                "filter" => filter = self::filter(walk, value),
                "wires" => wires = self::wires(walk, value),
                known if walk.delay_key(known, value, &mut delays) => {}
                _ => {}
            }
        }
        let gate = match logic {
            Logic::Listed(function, pins, mark) => builder.gate(name, function, pins).function_mark(mark),
            Logic::Expr(text) => {
                let mark = text.mark;
                builder.expr(name, text).function_mark(mark)
            }
            Logic::Unreadable => builder.unreadable_gate(name),
        };
        gate.delays = delays;
        if let Some(filter) = filter {
            gate.filter(filter);
        }
        for (net, delays) in wires {
            gate.wire(net, delays);
        }
    }
}

fn gate_table<'v, 'i>(walk: &mut Walk, key: &Key<'_>, value: &'v Value<'i>) -> Option<&'v DeTable<'i>> {
    let name = key.get_ref();
    walk.table(value, &format!("write function and inputs, as in `{name} = {{ nand = [\"a\", \"b\"] }}`"))
}

/// The one function of a gate. Keys that are neither a function nor among `others` are reported.
fn logic(walk: &mut Walk, name: &Key<'_>, gate: &Value<'_>, table: &DeTable<'_>, others: &[&'static str]) -> Logic {
    let mut found: Option<(&Key<'_>, &Value<'_>)> = None;
    let mut unclear = false;
    for (key, value) in table.iter() {
        let word = key.get_ref().as_ref();
        if is_function(word) {
            match found {
                None => found = Some((key, value)),
                Some((first, _)) => {
                    let message = format!("gate `{}` has two functions", name.get_ref());
                    let label = "the first";
                    walk.fault_beside(key.span(), message, "keep one of them", first.span(), label);
                    unclear = true;
                }
            }
        } else if !others.contains(&word) {
            unclear = true;
            let dotted = value.get_ref().as_table().is_some_and(|t| t.iter().any(|(k, _)| is_function(k.get_ref())));
            if dotted {
                let message = format!("unknown key `{word}` in gate `{}`", name.get_ref());
                let help = format!("a name with a dot is quoted, as in `\"{}.{word}\" = {{ … }}`", name.get_ref());
                walk.fault(key.span(), message, help);
            } else if others.is_empty() && GATE_KEYS.contains(&word) {
                let message = format!("gate `{}` of the reference has no `{word}`", name.get_ref());
                walk.fault(key.span(), message, "remove it: the reference knows no delays");
                unclear = found.is_none();
            } else {
                let known: Vec<&str> = functions().chain(others.iter().copied()).collect();
                walk.unknown_key(key, &known, &format!("gate `{}`", name.get_ref()));
            }
        }
    }
    match found {
        Some((key, value)) => function(walk, key.get_ref(), value),
        None => {
            if !unclear {
                let message = format!("gate `{}` has no function", name.get_ref());
                let help = format!("give it one of {}", functions().collect::<Vec<_>>().join(", "));
                walk.fault(gate.span(), message, help);
            }
            Logic::Unreadable
        }
    }
}

fn function(walk: &mut Walk, name: &str, value: &Value<'_>) -> Logic {
    match Function::from_name(name) {
        Some(function) => match walk.names(value) {
            Some(pins) => Logic::Listed(function, pins, walk.mark(value.span())),
            None => Logic::Unreadable,
        },
        None => walk.text(value, "\"a & !b\"").map_or(Logic::Unreadable, Logic::Expr),
    }
}

fn filter(walk: &mut Walk, value: &Value<'_>) -> Option<Said<NewFilter>> {
    const TABLES: [&str; 2] = ["reject", "involution"];
    let mark = walk.mark(value.span());
    let Some(table) = value.get_ref().as_table() else {
        let words = [("inertial", false), ("transport", true)];
        let transport = walk.word(value, &words)?;
        return Some(Said::at(if transport { NewFilter::Transport } else { NewFilter::Inertial }, mark));
    };
    let mut filters = Vec::new();
    for (key, value) in table.iter() {
        match key.get_ref().as_ref() {
            "reject" => filters.push(walk.amount(value).map(NewFilter::Reject)),
            "involution" => filters.push(involution(walk, value)),
            _ => {
                walk.unknown_key(key, &TABLES, "a filter");
                filters.push(None);
            }
        }
    }
    if filters.len() != 1 {
        let help = "write `{ reject = 2 }` or `{ involution = { tau = 3 } }`";
        walk.fault(value.span(), "a filter table holds one key, `reject` or `involution`", help);
        return None;
    }
    filters.pop().flatten().map(|filter| Said::at(filter, mark))
}

fn involution(walk: &mut Walk, value: &Value<'_>) -> Option<NewFilter> {
    let table = walk.table(value, "write `{ involution = { tau = 3 } }`")?;
    let (mut tau, mut unclear) = (None, false);
    for (key, value) in table.iter() {
        unclear = true;
        match key.get_ref().as_ref() {
            "tau" => tau = walk.amount(value),
            _ => walk.unknown_key(key, &["tau"], "an involution"),
        }
    }
    if !unclear {
        walk.missing(value.span(), "tau", "this involution", "3");
    }
    tau.map(NewFilter::Involution)
}

fn wires(walk: &mut Walk, value: &Value<'_>) -> Vec<(Said<String>, NewDelay)> {
    let Some(table) = walk.table(value, "write nets with the delays of their wires, as in `{ a = [0.2, 0.5] }`") else {
        return Vec::new();
    };
    let mut wires = Vec::with_capacity(table.len());
    for (key, value) in table.iter() {
        let name = walk.said_key(key);
        let mut delays = NewDelay::default();
        let mut complete = true;
        match value.get_ref().as_table() {
            Some(edges) if edges.iter().any(|(key, _)| matches!(key.get_ref().as_ref(), "rise" | "fall" | "delay")) => {
                for (key, value) in edges.iter() {
                    if !walk.delay_key(key.get_ref(), value, &mut delays) {
                        walk.unknown_key(key, &["delay", "rise", "fall"], "a wire");
                        complete = false;
                    }
                }
                complete &= edges.len() == [&delays.delay, &delays.rise, &delays.fall].into_iter().flatten().count();
            }
            _ => {
                delays.delay = walk.range(value);
                complete = delays.delay.is_some();
            }
        }
        if complete {
            wires.push((name, delays));
        }
    }
    wires
}

pub(super) fn delays(walk: &mut Walk, builder: &mut Builder, value: &Value<'_>) {
    let Some(table) = walk.table(value, "write `[delays]`, then `delay`, or `rise` and `fall`") else { return };
    for (key, value) in table.iter() {
        let name = key.get_ref().as_ref();
        if walk.delay_key(name, value, builder.default_delays()) {
        } else if name == "assume_min" {
            if let Some(fraction) = walk.decimal(value) {
                builder.assume_min(fraction);
            }
        } else if is_function(name) {
            let said = walk.said_key(key);
            let help = format!("write `[delays.{name}]`, then `delay`, or `rise` and `fall`");
            let Some(table) = walk.table(value, &help) else { continue };
            let entry = builder.function_delays(said);
            for (key, value) in table.iter() {
                if !walk.delay_key(key.get_ref(), value, entry) {
                    walk.unknown_key(key, &["delay", "rise", "fall"], &format!("[delays.{name}]"));
                }
            }
        } else {
            let known: Vec<&str> = ["delay", "rise", "fall", "assume_min"].into_iter().chain(functions()).collect();
            walk.unknown_key(key, &known, "[delays]");
        }
    }
}

pub(super) fn groups(walk: &mut Walk, builder: &mut Builder, value: &Value<'_>) {
    const KEYS: [&str; 4] = ["gates", "tracking", "scale", "mismatch"];
    for (span, table) in walk.tables(value, "groups") {
        let mut group = NewGroup { mark: walk.mark(span), ..NewGroup::default() };
        for (key, value) in table.iter() {
            let read = match key.get_ref().as_ref() {
                "gates" => walk.names(value).map(|names| group.gates = names),
                "tracking" => walk.number(value).map(|number| group.tracking = Some(number)),
                "mismatch" => walk.number(value).map(|number| group.mismatch = Some(number)),
                "scale" => factors(walk, value).map(|factors| group.scale = Some(factors)),
                _ => {
                    walk.unknown_key(key, &KEYS, "[[groups]]");
                    None
                }
            };
            group.incomplete |= read.is_none();
        }
        builder.group(group);
    }
}

pub(super) fn conditions(walk: &mut Walk, builder: &mut Builder, value: &Value<'_>) {
    const HELP: &str = "write one table a condition, as in `[conditions.cold]`, then `scale = 0.8`";
    let Some(table) = walk.table(value, HELP) else { return };
    for (key, value) in table.iter() {
        let name = walk.said_key(key);
        let Some(condition) = walk.table(value, HELP) else { continue };
        let mut scale = None;
        let mut said = false;
        for (key, value) in condition.iter() {
            match key.get_ref().as_ref() {
                "scale" => (scale, said) = (walk.decimal(value), true),
                _ => walk.unknown_key(key, &["scale"], &format!("[conditions.{}]", name.what)),
            }
        }
        if !said {
            walk.missing(key.span(), "scale", &format!("[conditions.{}]", name.what), "0.8");
        }
        builder.condition(NewCondition { name, scale });
    }
}

fn factors(walk: &mut Walk, value: &Value<'_>) -> Option<Said<(f64, f64)>> {
    const HELP: &str = "write the least and the greatest factor, as in [0.6, 1.5]";
    let mark = walk.mark(value.span());
    match walk.list(value, "a list of two numbers", HELP)? {
        [least, most] => {
            let (least, most) = (walk.number(least), walk.number(most));
            Some(Said::at((least?.what, most?.what), mark))
        }
        list => {
            walk.fault(value.span(), format!("expected two numbers, found a list of {}", list.len()), HELP);
            None
        }
    }
}

pub(super) fn reference(walk: &mut Walk, builder: &mut Builder, value: &Value<'_>) {
    let Some(table) = walk.table(value, "write `[reference.gates]`, then one gate a line") else { return };
    builder.reference().mark = walk.mark(value.span());
    for (key, value) in table.iter() {
        match key.get_ref().as_ref() {
            "compare" => {
                if let Some(names) = walk.names(value) {
                    builder.reference().compare = Some(names);
                }
            }
            "gates" => {
                let Some(gates) = walk.table(value, "write `[reference.gates]`, then one gate a line") else {
                    continue;
                };
                for (key, value) in gates.iter() {
                    let name = walk.said_key(key);
                    let logic = gate_table(walk, key, value).map(|table| logic(walk, key, value, table, &[]));
                    match logic {
                        Some(Logic::Listed(function, pins, mark)) => {
                            builder.reference().gate(name, function, pins).function_mark(mark);
                        }
                        Some(Logic::Expr(text)) => {
                            let mark = text.mark;
                            builder.reference().expr(name, text).function_mark(mark);
                        }
                        Some(Logic::Unreadable) | None => {
                            builder.reference().unreadable_gate(name);
                        }
                    }
                }
            }
            _ => walk.unknown_key(key, &["gates", "compare"], "[reference]"),
        }
    }
}
