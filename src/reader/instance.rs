//! Files of one concrete case, to be run again with the scenario that they belong to.

mod firings;

use std::ops::Range;
use std::path::Path;
use std::sync::Arc;

use rustc_hash::FxHashMap;
use toml::de::DeTable;

use super::walk::{Key, Value, Walk};
use super::{Diagnostics, ReadError, file, place, syntax};
use crate::circuit::NetId;
use crate::delay::Delays;
use crate::instance::{ClockCase, Instance};
use crate::logic::Bits;
use crate::scenario::{Amount, Begin, Clock, Fault, Place, Said, Scenario};
use crate::time::{Span, Time, Unit};

const KEYS: [&str; 9] = ["format", "kind", "time_unit", "gates", "firings", "wires", "steps", "clocks", "start"];

/// Names listed in one fault.
const LISTED: usize = 8;

/// Reads the file of one concrete case of a scenario; see [`read_instance`].
///
/// Errors: a [`FileError`](super::FileError) for a file that cannot be read as text, else all faults of the case.
pub fn load_instance(path: &Path, scenario: &Scenario) -> Result<Instance, ReadError> {
    let text = file::text(path)?;
    Ok(read_instance(&text, &path.display().to_string(), scenario)?)
}

/// Reads the text of one concrete case of a scenario, as [`write_instance`](crate::output::instance::write_instance)
/// gives it. `name` is what diagnostics call the text.
///
/// The case must be complete: every gate, wire, step and clock of the scenario, and nothing else. Its delays are at
/// least 1 fs and need not lie in the scenario's ranges.
///
/// Errors: all faults of the text at once.
pub fn read_instance(text: &str, name: &str, scenario: &Scenario) -> Result<Instance, Diagnostics> {
    let text: Arc<str> = text.into();
    let mut walk = Walk::new();
    let instance = syntax::parse(&mut walk, &text).map(|table| Case::read(&mut walk, scenario, table.get_ref()));
    match instance {
        Some(instance) if walk.faults.is_empty() => Ok(instance),
        _ => Err(place(name, text, &walk.spans, walk.faults.into_vec())),
    }
}

/// What a case says of its steps.
struct Steps {
    places: Vec<Span>,
    skews: Vec<Vec<Span>>,
    bounces: Vec<Vec<Vec<Span>>>,
}

/// What every part needs.
struct Case<'s> {
    scenario: &'s Scenario,
    unit: Unit,
}

impl Case<'_> {
    fn read(walk: &mut Walk, scenario: &Scenario, table: &DeTable<'_>) -> Instance {
        let part = |name: &str| table.iter().find(|(key, _)| key.get_ref() == name).map(|(_, value)| value);
        for (key, _) in table.iter() {
            if !KEYS.contains(&key.get_ref().as_ref()) {
                walk.unknown_key(key, &KEYS, "a case");
            }
        }
        head(walk, part("format"), part("kind"));
        let words = Unit::ALL.map(|unit| (unit.name(), unit));
        let unit = match part("time_unit") {
            Some(value) => walk.word(value, &words).unwrap_or_default(),
            None => {
                walk.missing(0..0, "time_unit", "the case", &format!("\"{}\"", scenario.unit));
                Unit::default()
            }
        };
        let case = Case { scenario, unit };
        let gate = case.gates(walk, part("gates"));
        let firings = case.firings(walk, part("firings"));
        let wire = case.wires(walk, part("wires"));
        let Steps { places, skews, bounces } = case.steps(walk, part("steps"));
        let clocks = case.clocks(walk, part("clocks"));
        let start = case.start(walk, part("start"));
        Instance { delays: Delays { gate, wire }, firings, places, skews, bounces, clocks, start }
    }

    /// An amount in the file's unit.
    fn span(&self, walk: &mut Walk, value: &Value<'_>) -> Option<Span> {
        let said = walk.amount(value)?;
        let Amount::Text(text) = said.what else { return None };
        match Span::parse(&text, self.unit) {
            Ok(span) => Some(span),
            Err(error) => {
                walk.faults.push(Fault::time(said.mark, &error));
                None
            }
        }
    }

    /// At least 1 fs.
    fn delay(&self, walk: &mut Walk, value: &Value<'_>, what: &str) -> Option<Span> {
        let span = self.span(walk, value)?;
        if span == Span::ZERO {
            walk.fault(value.span(), format!("{what} of 0 is not possible"), "write at least \"1 fs\"");
            return None;
        }
        Some(span)
    }

    /// A signed amount in femtoseconds.
    fn signed(&self, walk: &mut Walk, value: &Value<'_>) -> Option<i64> {
        let Said { what: Amount::Text(text), mark } = walk.amount(value)? else { return None };
        let text = text.trim();
        let (sign, size) = text.strip_prefix('-').map_or((1, text), |rest| (-1, rest));
        match Span::parse(size, self.unit) {
            Ok(span) => Some(sign * i64::try_from(span.fs()).expect("below 2^62")),
            Err(error) => {
                walk.faults.push(Fault::time(mark, &error));
                None
            }
        }
    }

    /// The entries of `{ rise, fall }` or the like, in the order of `keys`; all must be there.
    fn figures<const N: usize>(
        &self,
        walk: &mut Walk,
        (table, span): (&DeTable<'_>, Range<usize>),
        keys: [&str; N],
        others: &[&str],
        place: &str,
    ) -> [Option<Span>; N] {
        let mut found = [None; N];
        let mut missing = [true; N];
        for (key, value) in table.iter() {
            let word = key.get_ref().as_ref();
            match keys.iter().position(|known| *known == word) {
                Some(k) => {
                    missing[k] = false;
                    found[k] = match word {
                        "first" => self.span(walk, value),
                        _ => self.delay(walk, value, &format!("`{word}`")),
                    };
                }
                None if others.contains(&word) => {}
                None => {
                    let known: Vec<&str> = keys.iter().chain(others).copied().collect();
                    walk.unknown_key(key, &known, place);
                }
            }
        }
        for k in 0..N {
            if missing[k] {
                walk.missing(span.clone(), keys[k], place, "9.8");
            }
        }
        found
    }

    fn gates(&self, walk: &mut Walk, value: Option<&Value<'_>>) -> Vec<[Span; 2]> {
        let circuit = &*self.scenario.circuit;
        let mut delays = vec![None; circuit.gate_count()];
        let Some(table) = section(walk, value, "gates", true) else { return Vec::new() };
        for (key, value) in table.iter() {
            let name = key.get_ref().as_ref();
            let Some(gate) = circuit.net(name).and_then(|net| circuit.driver(net)) else {
                Self::unknown(walk, key, "gate", circuit.gates().map(|gate| circuit.name(circuit.net_of(gate))));
                continue;
            };
            let help = "write its delays, as in `{ rise = 9.8, fall = 8 }`";
            let edges = walk.table(value, help).map(|edges| {
                self.figures(walk, (edges, value.span()), ["fall", "rise"], &[], &format!("gate `{name}`"))
            });
            delays[gate.index()] = Some(edges.unwrap_or_default());
        }
        let missing = circuit.gates().filter(|gate| delays[gate.index()].is_none());
        let missing: Vec<&str> = missing.map(|gate| circuit.name(circuit.net_of(gate))).collect();
        lacks(walk, place_of(value), "gates", &missing);
        delays.into_iter().map(|edges| edges.unwrap_or_default().map(|edge| edge.unwrap_or(Span::TICK))).collect()
    }

    fn wires(&self, walk: &mut Walk, value: Option<&Value<'_>>) -> Vec<[Span; 2]> {
        let circuit = &*self.scenario.circuit;
        let numbers: FxHashMap<(NetId, NetId), usize> =
            circuit.wires().iter().enumerate().map(|(w, (net, gate))| ((*net, circuit.net_of(*gate)), w)).collect();
        let mut delays = vec![None; circuit.wire_count()];
        let tables = value.map(|value| walk.tables(value, "wires")).unwrap_or_default();
        for (span, table) in tables {
            let end = |walk: &mut Walk, key: &str| -> Option<String> {
                match table.iter().find(|(found, _)| found.get_ref() == key) {
                    Some((_, value)) => walk.text(value, "\"q\"").map(|name| name.what),
                    None => {
                        walk.missing(span.clone(), key, "this wire", "\"q\"");
                        None
                    }
                }
            };
            let ends = (end(walk, "from"), end(walk, "to"));
            let edges = self.figures(walk, (table, span.clone()), ["fall", "rise"], &["from", "to"], "this wire");
            let (Some(from), Some(to)) = ends else { continue };
            let number = circuit.net(&from).zip(circuit.net(&to)).and_then(|ends| numbers.get(&ends));
            match number {
                None => {
                    let message = format!("the scenario has no wire with a delay from `{from}` to `{to}`");
                    walk.fault(span, message, "correct its ends, or remove it");
                }
                Some(&w) if delays[w].is_some() => {
                    walk.fault(span, format!("the wire from `{from}` to `{to}` comes twice"), "keep one of them");
                }
                Some(&w) => delays[w] = Some(edges),
            }
        }
        let missing = circuit.wires().iter().enumerate().filter(|(w, _)| delays[*w].is_none());
        let missing: Vec<String> = missing
            .map(|(_, (net, gate))| format!("{} to {}", circuit.name(*net), circuit.name(circuit.net_of(*gate))))
            .collect();
        let place = value.map_or(0..0, toml::Spanned::span);
        lacks(walk, Some(place), "wires", &missing.iter().map(String::as_str).collect::<Vec<_>>());
        delays.into_iter().map(|edges| edges.unwrap_or_default().map(|edge| edge.unwrap_or(Span::TICK))).collect()
    }

    fn steps(&self, walk: &mut Walk, value: Option<&Value<'_>>) -> Steps {
        let steps = &self.scenario.stimulus.steps;
        let table = section(walk, value, "steps", !steps.is_empty());
        let mut numbers: FxHashMap<&str, usize> = FxHashMap::default();
        steps.iter().enumerate().for_each(|(s, step)| {
            numbers.insert(&step.label, s);
        });
        let mut found: Vec<Option<(Option<Span>, Range<usize>)>> = vec![None; steps.len()];
        let mut skews = vec![Vec::new(); steps.len()];
        let mut bounces = vec![Vec::new(); steps.len()];
        for (key, value) in table.into_iter().flat_map(|table| table.iter()) {
            let label = key.get_ref().as_ref();
            let Some(&s) = numbers.get(label) else {
                Self::unknown(walk, key, "step", steps.iter().map(|step| step.label.as_str()));
                continue;
            };
            let placed = place_key(&steps[s].place);
            let (skewed, bouncing) = (steps[s].skew.is_some(), steps[s].bounce.is_some());
            let help = format!("write its place, as in `{{ {placed} = 100 }}`");
            let Some(table) = walk.table(value, &help) else {
                found[s] = Some((None, value.span()));
                continue;
            };
            let (mut place, mut at) = (None, value.span());
            let (mut has_place, mut has_skew, mut has_bounce) = (false, false, false);
            for (key, value) in table.iter() {
                match key.get_ref().as_ref() {
                    // a case may move the inputs of any step apart
                    "skew" => {
                        has_skew = true;
                        skews[s] = self.skew(walk, value, steps[s].set.len());
                    }
                    "bounce" if bouncing => {
                        has_bounce = true;
                        bounces[s] = self.bounce(walk, value, steps[s].set.len());
                    }
                    word if word == placed => {
                        has_place = true;
                        place = self.span(walk, value);
                        at = value.span();
                    }
                    word @ ("at" | "after" | "rest" | "wait") => {
                        let message = format!("`{word}` does not place step `{label}`");
                        walk.fault(key.span(), message, format!("the scenario places it by `{placed}`"));
                        has_place = true;
                    }
                    "bounce" => walk.fault(key.span(), format!("step `{label}` does not bounce"), "remove it"),
                    _ => walk.unknown_key(key, &[placed, "skew", "bounce"], &format!("step `{label}`")),
                }
            }
            if !has_place {
                walk.missing(value.span(), placed, &format!("step `{label}`"), "100");
            }
            if skewed && !has_skew {
                let example = format!("[{}]", vec!["0"; steps[s].set.len()].join(", "));
                walk.missing(value.span(), "skew", &format!("step `{label}`"), &example);
            }
            if bouncing && !has_bounce {
                let example = format!("[{}]", vec!["[]"; steps[s].set.len()].join(", "));
                walk.missing(value.span(), "bounce", &format!("step `{label}`"), &example);
            }
            found[s] = Some((place, at));
        }
        let missing: Vec<&str> =
            (0..steps.len()).filter(|s| found[*s].is_none()).map(|s| steps[s].label.as_str()).collect();
        lacks(walk, place_of(value), "steps", &missing);
        self.order(walk, &found, &skews, &bounces);
        let places = found.into_iter().map(|step| step.and_then(|(place, _)| place).unwrap_or_default()).collect();
        Steps { places, skews, bounces }
    }

    fn skew(&self, walk: &mut Walk, value: &Value<'_>, inputs: usize) -> Vec<Span> {
        let help = format!("write one time for each of the {inputs} inputs that the step sets");
        let list = walk.list(value, "a list of times", &help).unwrap_or_default();
        if list.len() != inputs && value.get_ref().is_array() {
            walk.fault(value.span(), format!("the skew has {} times, not {inputs}", list.len()), help);
        }
        list.iter().map(|item| self.span(walk, item).unwrap_or_default()).collect()
    }

    /// For each input that a step sets, when it toggles.
    fn bounce(&self, walk: &mut Walk, value: &Value<'_>, inputs: usize) -> Vec<Vec<Span>> {
        let help = format!("write a list of times for each of the {inputs} inputs that the step sets");
        let lists = walk.list(value, "a list of lists of times", &help).unwrap_or_default();
        if lists.len() != inputs && value.get_ref().is_array() {
            walk.fault(value.span(), format!("the bounce has {} lists, not {inputs}", lists.len()), help.clone());
        }
        let mut bounces = Vec::with_capacity(inputs);
        for list in lists {
            let times = walk.list(list, "a list of times", &help).unwrap_or_default();
            let toggles: Vec<Span> = times.iter().map(|item| self.span(walk, item).unwrap_or_default()).collect();
            if toggles.len() % 2 == 1 {
                let message = "this input toggles an odd number of times, and would not keep its new value";
                walk.fault(list.span(), message, "add or remove a time");
            }
            if !toggles.is_sorted() {
                walk.fault(list.span(), "its toggles are not in order", "write earlier times first");
            }
            bounces.push(toggles);
        }
        bounces.resize(inputs, Vec::new());
        bounces
    }

    /// No step before the inputs of the one before it have changed, and none past the end of all runs.
    fn order(
        &self,
        walk: &mut Walk,
        found: &[Option<(Option<Span>, Range<usize>)>],
        skews: &[Vec<Span>],
        bounces: &[Vec<Vec<Span>>],
    ) {
        let mut latest = 0u64;
        let mut still = Span::ZERO;
        for (s, step) in self.scenario.stimulus.steps.iter().enumerate() {
            let Some((Some(place), at)) = &found[s] else { return };
            let too_early = match step.place {
                Place::At(_) => place.fs() < latest.saturating_add(still.fs()),
                Place::After(_) => *place < still,
                Place::Rest(_) | Place::When { .. } => false,
            };
            if too_early {
                let message =
                    format!("step `{}` comes before the inputs of the step before it have changed", step.label);
                walk.fault(at.clone(), message, "let it come later");
            }
            latest = match step.place {
                Place::At(_) => place.fs(),
                Place::After(_) => latest.saturating_add(place.fs()),
                Place::Rest(_) | Place::When { .. } => latest.saturating_add(still.fs()).saturating_add(place.fs()),
            };
            if latest >= Time::END.fs() {
                let message = "the steps together last 2^63 fs (about 2.5 hours) or longer, which no run does";
                walk.fault(at.clone(), message, "shorten the waits");
                return;
            }
            let first = skews[s].iter().min().copied().unwrap_or_default();
            let end = |input: usize| {
                let skew = skews[s].get(input).copied().unwrap_or(first) - first;
                skew + bounces[s].get(input).and_then(|toggles| toggles.last().copied()).unwrap_or_default()
            };
            still = (0..step.set.len()).map(end).max().unwrap_or_default();
        }
    }

    fn clocks(&self, walk: &mut Walk, value: Option<&Value<'_>>) -> Vec<ClockCase> {
        let (circuit, clocks) = (&*self.scenario.circuit, &self.scenario.stimulus.clocks);
        let table = section(walk, value, "clocks", !clocks.is_empty());
        let numbers: FxHashMap<NetId, usize> = clocks.iter().enumerate().map(|(c, clock)| (clock.net, c)).collect();
        let mut found: Vec<Option<ClockCase>> = vec![None; clocks.len()];
        for (key, value) in table.into_iter().flat_map(|table| table.iter()) {
            let name = key.get_ref().as_ref();
            let Some(&c) = circuit.net(name).and_then(|net| numbers.get(&net)) else {
                Self::unknown(walk, key, "clock", clocks.iter().map(|clock| circuit.name(clock.net)));
                continue;
            };
            let help = "write `{ first = 3, period = 50, high = 25 }`";
            let figures =
                walk.table(value, help).and_then(|table| self.clock(walk, table, value.span(), &clocks[c], name));
            found[c] = Some(figures.unwrap_or_default());
        }
        let missing = (0..clocks.len()).filter(|c| found[*c].is_none());
        let missing: Vec<&str> = missing.map(|c| circuit.name(clocks[c].net)).collect();
        lacks(walk, place_of(value), "clocks", &missing);
        found.into_iter().map(Option::unwrap_or_default).collect()
    }

    fn clock(
        &self,
        walk: &mut Walk,
        table: &DeTable<'_>,
        span: Range<usize>,
        clock: &Clock,
        name: &str,
    ) -> Option<ClockCase> {
        let place = format!("clock `{name}`");
        let jitters = clock.jitter > Span::ZERO;
        let keys = ["first", "period", "high"];
        let [first, period, high] = self.figures(walk, (table, span.clone()), keys, &["jitter"], &place);
        let edges = 2 * clock.count as usize;
        let mut jitter = Vec::new();
        let given = table.iter().find(|(key, _)| key.get_ref() == "jitter");
        if jitters && given.is_none() {
            walk.missing(span, "jitter", &place, "[0.2, -0.1]");
            return None;
        }
        // a case may move the edges of any clock
        if let Some((_, value)) = given {
            let help = format!("write one time for each of its {edges} edges");
            let list = walk.list(value, "a list of times", &help)?;
            if list.len() != edges {
                walk.fault(value.span(), format!("the jitter has {} times, not {edges}", list.len()), help);
                return None;
            }
            let read: Vec<_> = list.iter().map(|item| self.signed(walk, item)).collect();
            jitter = read.into_iter().collect::<Option<_>>()?;
        }
        let case = ClockCase { first: first?, period: period?, high: high?, jitter };
        if case.high >= case.period {
            walk.fault(span, format!("{place} is high for its whole period"), "let `high` be shorter than `period`");
            return None;
        }
        // so far apart that no sum of them overflows
        let end = u128::from(case.first.fs()) + u128::from(case.period.fs()) * u128::from(clock.count) + (1 << 62);
        if end >= u128::from(Time::END.fs()) {
            let message = format!("{place} lasts longer than any run");
            walk.fault(span, message, "shorten its period: a run ends below 2^63 fs (about 2.5 hours)");
            return None;
        }
        let initial = self.scenario.stimulus.initial[clock.net.index()];
        let ordered = (1..2 * clock.count).all(|edge| case.edge(initial, edge - 1) < case.edge(initial, edge));
        if !ordered {
            walk.fault(span, format!("the jitter of {place} changes the order of its edges"), "make it smaller");
            return None;
        }
        Some(case)
    }

    fn start(&self, walk: &mut Walk, value: Option<&Value<'_>>) -> Bits {
        let circuit = &*self.scenario.circuit;
        if self.scenario.begin != Begin::Random {
            if let Some(value) = value {
                walk.fault(value.span(), "the scenario does not begin at random", "remove `[start]`");
            }
            return Bits::default();
        }
        let Some(table) = section(walk, value, "start", true) else { return Bits::default() };
        let mut bits = Bits::zeros(circuit.gate_count());
        let mut known = vec![false; circuit.gate_count()];
        for (key, value) in table.iter() {
            let name = key.get_ref().as_ref();
            let Some(gate) = circuit.net(name).and_then(|net| circuit.driver(net)) else {
                Self::unknown(walk, key, "gate", circuit.gates().map(|gate| circuit.name(circuit.net_of(gate))));
                continue;
            };
            known[gate.index()] = true;
            bits.set(gate.index(), walk.bit(value).unwrap_or(false));
        }
        let missing = circuit.gates().filter(|gate| !known[gate.index()]);
        let missing: Vec<&str> = missing.map(|gate| circuit.name(circuit.net_of(gate))).collect();
        lacks(walk, place_of(value), "start", &missing);
        bits
    }

    /// A name that the scenario does not have.
    fn unknown<'n>(walk: &mut Walk, key: &Key<'_>, what: &str, names: impl ExactSizeIterator<Item = &'n str>) {
        let name = key.get_ref();
        let help = match walk.likely(name, names) {
            Some(likely) => format!("did you mean `{likely}`?"),
            None => "remove it, or take the scenario that this case belongs to".to_string(),
        };
        walk.fault(key.span(), format!("the scenario has no {what} `{name}`"), help);
    }
}

fn head(walk: &mut Walk, format: Option<&Value<'_>>, kind: Option<&Value<'_>>) {
    match format {
        None => walk.missing(0..0, "format", "the case", "1"),
        Some(value) => {
            if let Some(said) = walk.integer(value).filter(|said| said.what != 1) {
                walk.fault(value.span(), format!("format {} is not known", said.what), "write `format = 1`");
            }
        }
    }
    match kind {
        None => walk.missing(0..0, "kind", "the case", "\"instance\""),
        Some(value) => {
            walk.word(value, &[("instance", ())]);
        }
    }
}

/// How a file says when a step comes.
fn place_key(place: &Place) -> &'static str {
    match place {
        Place::At(_) => "at",
        Place::After(_) => "after",
        Place::Rest(_) => "rest",
        Place::When { .. } => "wait",
    }
}

/// The table of a section, which must be there if `needed`.
fn section<'v, 'i>(walk: &mut Walk, value: Option<&'v Value<'i>>, name: &str, needed: bool) -> Option<&'v DeTable<'i>> {
    match value {
        Some(value) => walk.table(value, &format!("write `[{name}]`, then one a line")),
        None => {
            if needed {
                walk.fault(0..0, format!("the case lacks `[{name}]`"), "take a case of this scenario");
            }
            None
        }
    }
}

/// Names that a section lacks; `None`: the section itself could not be read, which was reported.
fn lacks(walk: &mut Walk, section: Option<Range<usize>>, name: &str, missing: &[&str]) {
    let Some(span) = section.filter(|_| !missing.is_empty()) else { return };
    let names: Vec<String> = missing.iter().take(LISTED).map(|name| format!("`{name}`")).collect();
    let more = missing.len().saturating_sub(LISTED);
    let more = if more > 0 { format!(" and {more} more") } else { String::new() };
    let message = format!("`{name}` of the case lacks {}{more}", names.join(", "));
    walk.fault(span, message, "add them, or take the scenario that this case belongs to");
}

/// Where a section is, if it is a table.
fn place_of(value: Option<&Value<'_>>) -> Option<Range<usize>> {
    value.filter(|value| value.get_ref().is_table()).map(toml::Spanned::span)
}
