//! `stimulus`: what takes the place of steps.

use std::ops::Range;
use std::path::Path;

use toml::de::{DeTable, DeValue};

use super::diagnostics::Diagnostics;
use super::dump::{self, DumpError, Recording, Request, Source, Wanted};
use super::walk::{Value, Walk};
use crate::scenario::{Builder, Fault, NewPlace, NewStep, Said};
use crate::time::{Span, Unit};

/// A dump as it was said.
pub(super) struct NewDump {
    /// `dump` and the name of its file, or `dump_text` and the dump itself: the text, the key, the value.
    source: (bool, String, Range<usize>, Range<usize>),
    map: Vec<(Said<String>, Said<String>)>,
    from: Option<Said<u64>>,
    to: Option<Said<u64>>,
    hold: bool,
}

/// What a dump made of a scenario.
#[derive(Clone, Debug)]
pub(super) struct Replaced {
    /// Places of the text with what would stand there if the dump were part of it, in order.
    pub pieces: [(Range<usize>, String); 2],
}

const KEYS: [&str; 6] = ["dump", "dump_text", "map", "from", "to", "unknown"];

/// A word, or a table that names a dump.
pub(super) fn stimulus(
    walk: &mut Walk,
    builder: &mut Builder,
    value: &Value<'_>,
    root: &DeTable<'_>,
) -> Option<NewDump> {
    let mark = walk.mark(value.span());
    let DeValue::Table(table) = value.get_ref() else {
        if walk.word(value, &[("every single change", ())]).is_some() {
            builder.every_single_change(mark);
        }
        return None;
    };
    let unit = unit(root);
    let mut source = None;
    let mut new = (Vec::new(), None, None, false);
    for (key, value) in table.iter() {
        match key.get_ref().as_ref() {
            name @ ("dump" | "dump_text") => {
                let text = walk.text(value, "\"trace.vcd\"")?;
                if source.is_some() {
                    walk.fault(key.span(), "this stimulus has a dump already", "keep one of `dump` and `dump_text`");
                }
                source = Some((name == "dump_text", text.what, key.span(), value.span()));
            }
            "map" => new.0 = map(walk, value)?,
            "from" => new.1 = Some(time(walk, value, unit)?),
            "to" => new.2 = Some(time(walk, value, unit)?),
            "unknown" => new.3 = walk.word(value, &[("refused", false), ("hold", true)])?,
            _ => {
                walk.unknown_key(key, &KEYS, "`stimulus`");
                return None;
            }
        }
    }
    let (map, from, to, hold) = new;
    if let (Some(first), Some(last)) = (&from, &to)
        && first.what > last.what
    {
        let fault = Fault::new(last.mark, "the stretch ends before it begins", "let `to` be `from` or later");
        walk.faults.push(fault.related(first.mark, "it begins here"));
        return None;
    }
    if let Some((steps, _)) = root.iter().find(|(key, _)| key.get_ref().as_ref() == "steps") {
        let fault = Fault::new(mark, "the dump takes the place of steps", "remove `stimulus`, or the steps");
        let steps = walk.mark(steps.span());
        walk.faults.push(fault.related(steps, "steps"));
        return None;
    }
    let Some(source) = source else {
        walk.missing(value.span(), "dump", "this stimulus", "\"trace.vcd\"");
        return None;
    };
    Some(NewDump { source, map, from, to, hold })
}

/// The unit of the file, wherever in it that is said.
fn unit(root: &DeTable<'_>) -> Unit {
    let said = root.iter().find(|(key, _)| key.get_ref().as_ref() == "time_unit");
    let name = said.and_then(|(_, value)| value.get_ref().as_str());
    name.and_then(Unit::from_name).unwrap_or_default()
}

fn time(walk: &mut Walk, value: &Value<'_>, unit: Unit) -> Option<Said<u64>> {
    let amount = walk.amount(value)?;
    let crate::scenario::Amount::Text(text) = &amount.what else { return None };
    match Span::parse(text, unit) {
        Ok(span) => Some(Said::at(span.fs(), amount.mark)),
        Err(error) => {
            walk.faults.push(Fault::time(amount.mark, &error));
            None
        }
    }
}

fn map(walk: &mut Walk, value: &Value<'_>) -> Option<Vec<(Said<String>, Said<String>)>> {
    let table = walk.table(value, "write inputs with what the dump calls them, as in `{ a = \"lock.a\" }`")?;
    let each = table.iter().map(|(key, value)| Some((walk.said_key(key), walk.text(value, "\"lock.a\"")?)));
    each.collect()
}

/// Inputs, their values, and which of them a clock drives.
fn inputs(root: &DeTable<'_>) -> Vec<(String, bool, bool)> {
    let table = |key: &str| root.iter().find(|(it, _)| it.get_ref().as_ref() == key).map(|(_, value)| value.get_ref());
    let clocks: Vec<&str> = match table("clocks") {
        Some(DeValue::Array(list)) => {
            let nets = list.iter().filter_map(|clock| clock.get_ref().as_table());
            nets.filter_map(|clock| clock.get("net").and_then(|net| net.get_ref().as_str())).collect()
        }
        _ => Vec::new(),
    };
    let inputs = table("inputs").and_then(DeValue::as_table).into_iter().flat_map(|table| table.iter());
    let one = |(key, value): (&toml::Spanned<std::borrow::Cow<'_, str>>, &Value<'_>)| {
        let high = matches!(value.get_ref(), DeValue::Integer(number) if number.as_str() == "1");
        (key.get_ref().to_string(), high, clocks.contains(&key.get_ref().as_ref()))
    };
    inputs.map(one).collect()
}

/// Reads the dump and tells the builder its steps. `None`: it has faults, which the walk has.
///
/// Errors: the dump is malformed.
pub(super) fn apply(
    new: &NewDump,
    walk: &mut Walk,
    builder: &mut Builder,
    root: &DeTable<'_>,
    (name, folder): (&str, Option<&Path>),
) -> Result<Option<Replaced>, Box<Diagnostics>> {
    let (within, text, key, value) = &new.source;
    let mark = walk.mark(value.clone());
    let source = match (within, folder) {
        (true, _) => Source::Text(text.clone(), name.to_string()),
        (false, Some(scenario)) => Source::File(dump::beside(scenario, text)),
        (false, None) => {
            let help = "read the scenario from its file, or write the dump itself as `dump_text`";
            walk.faults.add(mark, "this text was not read from a file, so a dump beside it is nowhere", help);
            return Ok(None);
        }
    };
    let all = inputs(root);
    for (input, variable) in &new.map {
        let known = all.iter().find(|(name, ..)| *name == input.what);
        if known.is_none() {
            let names: Vec<&str> = all.iter().map(|(name, ..)| name.as_str()).collect();
            let help = match walk.likely(&input.what, names.into_iter()) {
                Some(likely) => format!("did you mean `{likely}`?"),
                None => "write an input of the scenario, then what the dump calls it".to_string(),
            };
            walk.faults.add(input.mark, format!("there is no input `{}`", input.what), help);
        } else if known.is_some_and(|(_, _, clocked)| *clocked) {
            let message = format!("`{}` is driven by a clock", input.what);
            walk.faults.add(variable.mark, message, "map another input, or remove the clock");
        }
    }
    if !walk.faults.is_empty() {
        return Ok(None);
    }
    let called = |name: &str| new.map.iter().find(|(input, _)| input.what == name);
    let driven = all.iter().filter(|(_, _, clocked)| !clocked);
    let wanted = driven.map(|(name, assumed, _)| Wanted {
        name: name.clone(),
        called: called(name).map(|(_, variable)| variable.what.clone()),
        assumed: *assumed,
    });
    let request = Request {
        inputs: wanted.collect(),
        from: new.from.as_ref().map(|from| from.what),
        to: new.to.as_ref().map(|to| to.what),
        hold: new.hold,
    };
    let recording = match dump::read(&source, &request) {
        Ok(recording) => recording,
        Err(DumpError::Malformed(found)) => return Err(found),
        Err(DumpError::Unreadable(why)) => {
            let help = "check its name; it is looked for beside the scenario";
            walk.faults.add(mark, format!("this dump cannot be read: {why}"), help);
            return Ok(None);
        }
        Err(DumpError::Unmatched(all)) => {
            for (input, message, help) in all {
                let said = input.and_then(|i| called(&request.inputs[i].name)).map_or(mark, |(_, it)| it.mark);
                walk.faults.add(said, message, help);
            }
            return Ok(None);
        }
    };
    tell(&recording, &request, builder, Said::at(unit(root), mark));
    let head = (key.clone(), "dump_text".to_string());
    Ok(Some(Replaced { pieces: [head, (value.clone(), quoted(&recording.changes.copy))] }))
}

/// Steps, initial values and notes.
fn tell(recording: &Recording, request: &Request, builder: &mut Builder, unit: Said<Unit>) {
    let (mark, unit) = (unit.mark, unit.what);
    let changes = &recording.changes;
    let name = |input: usize| request.inputs[input].name.as_str();
    let mut unsaid = Vec::new();
    for (i, initial) in changes.initial.iter().enumerate() {
        match initial {
            Some(value) => {
                builder.input_begins(name(i), *value);
            }
            None if recording.found[i] => unsaid.push(name(i)),
            None => {}
        }
    }
    for (at, set) in &changes.steps {
        let at = Span::from_fs(*at);
        let exact = NewPlace::At(Said::at(at.into(), mark));
        let set = set.iter().map(|(input, value)| (Said::at(name(*input).to_string(), mark), *value));
        let label = Said::at(format!("at {} {unit}", at.decimal(unit)), mark);
        builder.step(NewStep {
            label: Some(label),
            places: vec![exact],
            set: set.collect(),
            mark,
            ..NewStep::default()
        });
    }
    let mut note = |sentence: String| {
        builder.note(Said::at(sentence, mark));
    };
    let driven = recording.found.iter().filter(|found| **found).count();
    note(format!("the stimulus is a dump: {} of {driven} inputs", many(changes.steps.len() as u64, "step")));
    let missing: Vec<&str> = (0..recording.found.len()).filter(|i| !recording.found[*i]).map(name).collect();
    if !missing.is_empty() {
        note(format!("not in the dump, so kept at the values under `inputs`: {}", listed(&missing)));
    }
    if !unsaid.is_empty() {
        note(format!("without a value where the dump begins, so taken from `inputs`: {}", listed(&unsaid)));
    }
    if recording.reals > 0 {
        note(format!("{} of the dump passed over", many(recording.reals as u64, "real variable")));
    }
    if changes.gaps > 0 {
        note(format!("the recording was off {}: inputs hold their values there", times(changes.gaps)));
    }
    if changes.held > 0 {
        note(format!("an input became x or z {} and holds its value", times(changes.held)));
    }
    if changes.overtaken > 0 {
        note(format!(
            "{} at the same instant as another of that input: the last one counts",
            many(changes.overtaken, "change")
        ));
    }
}

fn many(count: u64, what: &str) -> String {
    if count == 1 { format!("1 {what}") } else { format!("{count} {what}s") }
}

fn times(count: u64) -> String {
    if count == 1 { "once".to_string() } else { format!("{count} times") }
}

fn listed(names: &[&str]) -> String {
    const MOST: usize = 6;
    let some = names.iter().take(MOST).copied().collect::<Vec<_>>().join(", ");
    if names.len() > MOST { format!("{some} and {} more", names.len() - MOST) } else { some }
}

/// A text in quotes, as TOML has it.
fn quoted(text: &str) -> String {
    let mut quoted = String::with_capacity(text.len() + text.len() / 8 + 2);
    quoted.push('"');
    for letter in text.chars() {
        match letter {
            '"' => quoted += "\\\"",
            '\\' => quoted += "\\\\",
            '\n' => quoted += "\\n",
            letter if letter.is_control() => quoted += &format!("\\u{:04X}", u32::from(letter)),
            letter => quoted.push(letter),
        }
    }
    quoted.push('"');
    quoted
}
