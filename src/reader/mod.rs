//! Files into scenarios: TOML text walked once, everything said handed to a [`Builder`] with its place, all faults
//! shown at once.
//!
//! Numbers stay the text they are in the file until their unit is known, so no time passes through a float.

mod diagnostics;
mod dump;
mod file;
mod gates;
mod instance;
mod part;
mod rules;
mod start;
mod steps;
mod stimulus;
mod syntax;
mod walk;

use std::ops::Range;
use std::path::Path;
use std::sync::Arc;

use toml::de::DeTable;

pub use diagnostics::{Diagnostic, Diagnostics, Related};
pub use file::{FileError, MAX_BYTES, ReadError};
pub use instance::{load_instance, read_instance};
pub use part::{LoadedPart, MAX_PART_BYTES, load_part, read_part, scenario_of};

use crate::delay::Marginal;
use crate::scenario::{BeginAt, Builder, Fault, Mark, NewPlot, Said, Scenario, Vary};
use crate::time::Unit;
use diagnostics::Placed;
use walk::{Value, Walk};

/// A scenario with the text it came from, to place later faults in.
#[derive(Clone, Debug)]
pub struct Loaded {
    /// The scenario.
    pub scenario: Scenario,
    /// For each [`Mark`] of the scenario, its place in the text, in bytes.
    pub spans: Vec<Range<usize>>,
    /// The text.
    pub text: Arc<str>,
    /// The name of the text, as in `file:line:column`.
    pub name: String,
    /// Places of the text that name another file, each with what says the same without it.
    replaced: Option<stimulus::Replaced>,
}

impl Loaded {
    /// The text such that it needs no other file: the dump that it names is in it, as far as it matters. Read by [`read`], it
    /// gives the same scenario.
    pub fn self_contained(&self) -> String {
        let mut text = self.text.to_string();
        if let Some(replaced) = &self.replaced {
            for (place, with) in replaced.pieces.iter().rev() {
                text.replace_range(place.clone(), with);
            }
        }
        text
    }

    /// Faults found later, such as an ambiguous start, placed in the text.
    pub fn diagnose(&self, faults: Vec<Fault>) -> Diagnostics {
        place(&self.name, self.text.clone(), &self.spans, faults)
    }
}

/// Reads a scenario file.
///
/// Errors: a [`FileError`] for a file that cannot be read as text (missing, a folder, not UTF-8, empty, larger than
/// [`MAX_BYTES`]), else all faults of the scenario.
pub fn load(path: &Path) -> Result<Loaded, ReadError> {
    let text = file::text(path)?;
    Ok(read_beside(&text, &path.display().to_string(), Some(path))?)
}

/// Reads the text of a scenario. `name` is what diagnostics call it; its stem is the title if the text gives none.
///
/// ```
/// let text = r#"
/// [inputs]
/// r = 0
/// s = 0
/// [initial]
/// q = 0
/// [gates]
/// q  = { nor = ["r", "qn"], delay = [6, 14] }
/// qn = { nor = ["s", "q"], rise = 2.5, fall = "900 ps" }
/// "#;
/// let loaded = stillgate::reader::read(text, "latch.toml").unwrap();
/// assert_eq!(loaded.scenario.title, "latch");
/// assert_eq!(loaded.scenario.circuit.gate_count(), 2);
///
/// let wrong = stillgate::reader::read(&text.replace("qn\"]", "qm\"]"), "latch.toml").unwrap_err();
/// assert_eq!((wrong.items()[0].line, wrong.items()[0].column), (8, 20));
/// assert_eq!(wrong.items()[0].help, "did you mean `q`?");
/// ```
///
/// Errors: all faults of the text at once; of a text that is no TOML only the faults of its syntax. A text that names a dump
/// must come from a file ([`load`]).
pub fn read(text: &str, name: &str) -> Result<Loaded, Diagnostics> {
    read_beside(text, name, None)
}

/// As [`read`]; other files are looked for beside this one.
fn read_beside(text: &str, name: &str, file: Option<&Path>) -> Result<Loaded, Diagnostics> {
    let text: Arc<str> = text.into();
    let mut walk = Walk::new();
    let mut builder = Builder::new(stem(name));
    let Some(table) = syntax::parse(&mut walk, &text) else {
        return Err(place(name, text, &walk.spans, walk.faults.into_vec()));
    };
    let dump = root(&mut walk, &mut builder, table.get_ref());
    let replaced = match &dump {
        Some(dump) if walk.faults.is_empty() => {
            stimulus::apply(dump, &mut walk, &mut builder, table.get_ref(), (name, file)).map_err(|found| *found)?
        }
        _ => None,
    };
    let said = ["initial", "begin", "inputs", "gates"].into_iter().find_map(|wanted| {
        table.get_ref().keys().find(|key| key.get_ref().as_ref() == wanted).map(toml::Spanned::span)
    });
    let start = walk.mark(said.unwrap_or(0..0));
    builder.faults(walk.faults);
    let checked = builder.finish().and_then(|scenario| match start::check(&scenario, start) {
        None => steps::lay_out(scenario),
        Some(fault) => Err(vec![fault]),
    });
    match checked {
        Ok(scenario) => Ok(Loaded { scenario, spans: walk.spans, text, name: name.to_string(), replaced }),
        Err(faults) => Err(place(name, text, &walk.spans, faults)),
    }
}

fn stem(name: &str) -> String {
    Path::new(name).file_stem().map_or_else(|| name.to_string(), |stem| stem.to_string_lossy().into_owned())
}

const KEYS: [&str; 19] = [
    "title",
    "time_unit",
    "outputs",
    "begin",
    "inputs",
    "initial",
    "gates",
    "delays",
    "groups",
    "conditions",
    "steps",
    "stimulus",
    "clocks",
    "rules",
    "reference",
    "limits",
    "sweep",
    "padding",
    "plot",
];

/// Keys that later versions will read; until then they are named in every result.
const RESERVED: [&str; 3] = ["cells", "parts", "split"];

/// Tells the builder everything; a dump is left for later, when inputs and clocks are known.
fn root(walk: &mut Walk, builder: &mut Builder, table: &DeTable<'_>) -> Option<stimulus::NewDump> {
    let mut dump = None;
    for (key, value) in table.iter() {
        match key.get_ref().as_ref() {
            "title" => {
                if let Some(title) = walk.text(value, "\"Canal lock\"") {
                    builder.title(title.what);
                }
            }
            "time_unit" => {
                let words = Unit::ALL.map(|unit| (unit.name(), unit)).into_iter().chain([("µs", Unit::Us)]);
                if let Some(unit) = walk.word(value, &words.collect::<Vec<_>>()) {
                    builder.unit(unit);
                }
            }
            "outputs" => {
                if let Some(names) = walk.names(value) {
                    builder.only_named_outputs();
                    names.into_iter().for_each(|name| {
                        builder.output(name);
                    });
                }
            }
            "begin" => {
                let words = [("at-rest", BeginAt::Rest), ("random", BeginAt::Random), ("unknown", BeginAt::Unknown)];
                if let Some(begin) = walk.word(value, &words) {
                    builder.begin(Said::at(begin, walk.mark(value.span())));
                }
            }
            "inputs" => inputs(walk, builder, value),
            "initial" => {
                if let Some((initial, _)) = walk.state(value) {
                    initial.what.into_iter().for_each(|(net, bit)| {
                        builder.initial(net, bit);
                    });
                }
            }
            "gates" => gates::gates(walk, builder, value),
            "delays" => gates::delays(walk, builder, value),
            "groups" => gates::groups(walk, builder, value),
            "conditions" => gates::conditions(walk, builder, value),
            "steps" => steps::steps(walk, builder, value),
            "stimulus" => dump = stimulus::stimulus(walk, builder, value, table),
            "clocks" => steps::clocks(walk, builder, value),
            "rules" => rules::rules(walk, builder.rules(), value),
            "reference" => gates::reference(walk, builder, value),
            "limits" => limits(walk, builder, value),
            "sweep" => sweep(walk, builder, value),
            "padding" => padding(walk, builder, value),
            "plot" => plot(walk, builder, value),
            reserved if RESERVED.contains(&reserved) => {
                let mark = walk.mark(key.span());
                let sentence = Said::at(format!("`{reserved}`: not analysed yet; it has no effect"), mark);
                builder.not_analysed(sentence);
            }
            _ => walk.unknown_key(key, &KEYS, "the file"),
        }
    }
    dump
}

fn inputs(walk: &mut Walk, builder: &mut Builder, value: &Value<'_>) {
    let Some(table) = walk.table(value, "write `[inputs]`, then one input a line, as in `a = 0`") else { return };
    for (key, value) in table.iter() {
        let name = walk.said_key(key);
        // an input without a sound value still is a net
        let bit = walk.bit(value).unwrap_or(false);
        builder.input(name, bit);
    }
}

fn limits(walk: &mut Walk, builder: &mut Builder, value: &Value<'_>) {
    let Some(table) = walk.table(value, "write `[limits]`, then `transitions` or `time`") else { return };
    for (key, value) in table.iter() {
        match key.get_ref().as_ref() {
            "transitions" => {
                if let Some(transitions) = walk.integer(value) {
                    builder.limit_transitions(transitions);
                }
            }
            "time" => {
                if let Some(time) = walk.amount(value) {
                    builder.limit_time(time);
                }
            }
            _ => walk.unknown_key(key, &["transitions", "time"], "[limits]"),
        }
    }
}

fn sweep(walk: &mut Walk, builder: &mut Builder, value: &Value<'_>) {
    const KEYS: [&str; 6] = ["samples", "seed", "tries", "draw", "vary", "search"];
    let wanted = "write `[sweep]`, then `samples`, `seed`, `tries`, `draw` or `search`";
    let Some(table) = walk.table(value, wanted) else { return };
    for (key, value) in table.iter() {
        match key.get_ref().as_ref() {
            "samples" => {
                if let Some(samples) = walk.integer(value) {
                    builder.samples(samples);
                }
            }
            "seed" => {
                if let Some(seed) = walk.integer(value) {
                    builder.seed(seed.what);
                }
            }
            "tries" => {
                if let Some(tries) = walk.integer(value) {
                    builder.tries(tries);
                }
            }
            "draw" => draw(walk, builder, value),
            "search" => {
                if let Some(runs) = walk.integer(value) {
                    builder.search(runs);
                }
            }
            "vary" => {
                if let Some(vary) = walk.word(value, &Vary::ALL.map(|vary| (vary.name(), vary))) {
                    builder.vary(vary);
                }
            }
            _ => walk.unknown_key(key, &KEYS, "[sweep]"),
        }
    }
}

fn padding(walk: &mut Walk, builder: &mut Builder, value: &Value<'_>) {
    let wanted = "write `[padding]`, then `allow = [\"a gate\", \"a net -> a gate\"]`";
    let Some(table) = walk.table(value, wanted) else { return };
    for (key, value) in table.iter() {
        match key.get_ref().as_ref() {
            "allow" => {
                if let Some(names) = walk.names(value) {
                    builder.padding(names);
                }
            }
            _ => walk.unknown_key(key, &["allow"], "[padding]"),
        }
    }
}

fn plot(walk: &mut Walk, builder: &mut Builder, value: &Value<'_>) {
    let Some(table) = walk.table(value, "write `[plot]`, then `nets`, `from` or `to`") else { return };
    let mut plot = NewPlot::default();
    for (key, value) in table.iter() {
        match key.get_ref().as_ref() {
            "nets" => {
                let mark = walk.mark(value.span());
                plot.nets = walk.names(value).map(|names| Said::at(names, mark));
            }
            "from" => plot.from = walk.amount(value),
            "to" => plot.to = walk.amount(value),
            _ => walk.unknown_key(key, &["nets", "from", "to"], "[plot]"),
        }
    }
    builder.plot(plot);
}

fn draw(walk: &mut Walk, builder: &mut Builder, value: &Value<'_>) {
    if let Some(draw) = walk.word(value, &Marginal::ALL.map(|draw| (draw.name(), draw))) {
        builder.draw(draw);
    }
}

/// Places faults in the text.
fn place(name: &str, text: Arc<str>, spans: &[Range<usize>], faults: Vec<Fault>) -> Diagnostics {
    let span = |mark: Mark| spans.get(mark.0 as usize).cloned().unwrap_or(0..0);
    let placed = faults.into_iter().map(|fault| {
        let whole = span(fault.mark);
        let part = fault.at.and_then(|at| within_string(&text, &whole, at));
        let related = fault.related.into_iter().map(|(mark, label)| (span(mark), label)).collect();
        Placed { span: part.unwrap_or(whole), message: fault.message, help: fault.help, related }
    });
    let placed = placed.collect();
    Diagnostics::new(name, text, placed)
}

/// The place of some bytes of a string's content, if the string is written without escapes.
fn within_string(text: &str, whole: &Range<usize>, at: Range<usize>) -> Option<Range<usize>> {
    let raw = text.get(whole.clone())?;
    let literal = raw.starts_with('\'');
    let quotes = if raw.starts_with("\"\"\"") || raw.starts_with("'''") { 3 } else { 1 };
    let inner = raw.get(quotes..raw.len().checked_sub(quotes)?)?;
    if !literal && inner.contains('\\') {
        return None;
    }
    // a line break right behind three quotes is not part of the content
    let skipped = match quotes {
        3 if inner.starts_with("\r\n") => 2,
        3 if inner.starts_with('\n') => 1,
        _ => 0,
    };
    let start = whole.start + quotes + skipped;
    let end = whole.end - quotes;
    Some((start + at.start).min(end)..(start + at.end).min(end))
}
