//! The flow table, and what is read off it.

use rustc_hash::{FxHashMap, FxHashSet};

use super::paper::{Paper, Table, Tone};
use super::steps::state;
use crate::circuit::NetId;
use crate::flow::{
    Beyond, Cause, Choice, Compared, Contained, Flow, FlowTable, Hazard, Reached, Reading, StateNumber, Transition,
    TransitionRef,
};
use crate::logic::{Bits, State};
use crate::output::{flow_words, words};
use crate::review::StatesReport;
use crate::scenario::Scenario;
use crate::statics::{Change, Race};

/// Most notes of the flow table.
const NOTES: usize = 3;
/// Most rows of the flow table.
const ROWS: usize = 18;
const ROWS_OF_A_PAGE: usize = 64;
/// Most nets of one column of digits.
const DIGITS: usize = 12;
/// Most names of nets in a list.
const NAMES: usize = 8;
/// Most entries of a list of transitions or hazards.
const LISTED: usize = 4;
/// Most changes that no step makes.
const GAPS: usize = 6;
const GAPS_OF_A_PAGE: usize = 40;
/// Most states or groups in a list.
const STATES: usize = 8;
/// Most names of nets in the short form.
const SHORT: usize = 4;
const GROUPS: usize = 3;

/// Inputs, state variables, and outputs that are neither.
fn columns(scenario: &Scenario, report: &StatesReport) -> [(&'static str, Vec<NetId>); 3] {
    let variables = &report.state_variables;
    let is_shown = |net: &NetId| variables.contains(net) || scenario.circuit.is_input(*net);
    let outputs = scenario.outputs.iter().copied().filter(|net| !is_shown(net)).collect();
    [("inputs", scenario.circuit.inputs().collect()), ("variables", variables.clone()), ("outputs", outputs)]
}

/// The flow table if it fits, else how large it is. Was it shown?
pub(super) fn table(paper: &mut Paper, scenario: &Scenario, report: &StatesReport) -> bool {
    let flow = &report.flow;
    let all = &flow.table;
    if all.states.is_empty() {
        return false;
    }
    let nets: Vec<_> = columns(scenario, report).into_iter().filter(|(_, nets)| !nets.is_empty()).collect();
    let mut table = Table::new().word("state");
    for (title, _) in &nets {
        table = table.word(*title);
    }
    for input in scenario.circuit.inputs() {
        table = table.word(words::net(scenario, input));
    }
    let small = all.states.len() <= paper.most(ROWS, ROWS_OF_A_PAGE) && nets.iter().all(|it| it.1.len() <= DIGITS);
    if small {
        for number in 0..all.states.len() as StateNumber {
            table.row(Tone::Plain, row(scenario, flow, &nets, number));
        }
    }
    let shown = small && table.fits(paper);
    if shown {
        paper.heading("Flow table: the states, and what follows when one input changes");
        let list = |(title, nets): &(&str, Vec<NetId>)| {
            format!("{title} {}", words::some_names(&words::nets(scenario, nets), NAMES))
        };
        let digits: Vec<String> = nets.iter().map(list).collect();
        paper.say(2, Tone::Plain, &format!("Digits: {}.", digits.join("; ")));
        paper.table(&table);
        without_rest(paper, scenario, report);
    } else {
        paper.heading("Flow table");
        let states = words::many(all.states.len() as u64, "state");
        let reachable = all.states.iter().filter(|state| state.reachable).count() as u64;
        let (steps, single) = (words::count(all.steps.len() as u64), words::count(all.single.len() as u64));
        let text = format!(
            "{states}, {} of them reachable from the start; {single} changes of one input and {steps} of steps were looked \
             at (states.csv, transitions.csv; states.svg draws them).",
            words::count(reachable)
        );
        paper.say(2, Tone::Plain, &text);
    }
    if all.states_truncated {
        paper.say(2, Tone::Unsure, "A limit cut the flow table: there are more states, or changes not looked at.");
    }
    if all.steps_truncated {
        paper.say(2, Tone::Unsure, "A limit cut the list of steps.");
    }
    for note in all.notes.iter().take(NOTES) {
        paper.say(2, Tone::Plain, &words::sentence(note));
    }
    super::more(paper, all.notes.len().saturating_sub(NOTES), "states.json");
    shown
}

/// Input vectors that have no stable state.
fn without_rest(paper: &mut Paper, scenario: &Scenario, report: &StatesReport) {
    let inputs: Vec<NetId> = scenario.circuit.inputs().collect();
    let none: Vec<&Vec<bool>> = report.inputs.iter().filter(|it| it.1.is_empty()).map(|it| &it.0).collect();
    if none.is_empty() {
        return;
    }
    let told =
        none.iter().take(LISTED).map(|bits| state(scenario, &inputs, &State::known(Bits::of(bits.iter().copied()))));
    let more = left(none.len(), LISTED, "states.csv");
    let text = format!("No stable state, it must oscillate: {}{more}.", told.collect::<Vec<_>>().join("; "));
    paper.say(2, Tone::Unsure, &text);
}

/// One state: its number and mark, digits, outcomes.
fn row(scenario: &Scenario, flow: &Flow, nets: &[(&str, Vec<NetId>)], number: StateNumber) -> Vec<String> {
    let all = &flow.table;
    let state = &all.states[number as usize];
    let mut name = flow_words::state(number);
    if all.start.contains(&number) {
        name += " start";
    } else if !state.reachable {
        name += " unreachable";
    }
    let mut row = vec![name];
    let digit = |net: &NetId| if state.values.get(net.index()) { '1' } else { '0' };
    row.extend(nets.iter().map(|(_, nets)| nets.iter().map(digit).collect::<String>()));
    let mut outcomes = vec![String::new(); scenario.circuit.input_count()];
    for transition in all.single.iter().filter(|it| it.from == number) {
        if let Some(input) = transition.change.single(&state.values) {
            outcomes[input.index()] = flow_words::short_outcome(&transition.to);
        }
    }
    row.extend(outcomes);
    row
}

/// Races, oscillations, bounds and essential hazards of the table.
pub(super) fn dynamics(paper: &mut Paper, scenario: &Scenario, flow: &Flow) {
    let all = || flow.table.steps.iter().chain(&flow.table.single);
    let distinct = |list: Vec<_>| distinct(&flow.table, list);
    let of = |race: Race| distinct(all().filter(|it| flow_words::race(&it.to) == Some(race)).collect());
    let critical: Vec<&Transition> = of(Race::Critical);
    let alone = |to: &Reached| matches!(to, Reached::Exact { states, cycles: 1.., .. } if states.is_empty());
    let endless: Vec<&Transition> = distinct(all().filter(|it| alone(&it.to)).collect());
    let bound = |to: &Reached| matches!(to, Reached::Bound { .. }) && to.only().is_none();
    let unknown: Vec<&Transition> = distinct(all().filter(|it| bound(&it.to)).collect());
    let essential: Vec<&Transition> = distinct(all().filter(|it| it.essential == Some(true)).collect());
    if all().next().is_none() {
        return;
    }
    paper.heading("Races, oscillations, hazards");
    let some = |paper: &mut Paper, tone: Tone, what: &str, list: &[&Transition]| {
        if list.is_empty() {
            return;
        }
        let told = list.iter().take(LISTED).map(|it| {
            format!("{}: {}", flow_words::what(scenario, &flow.table, it), flow_words::short_outcome(&it.to))
        });
        let more = left(list.len(), LISTED, "transitions.csv");
        paper.item(tone, &format!("{what}: {}{more}.", told.collect::<Vec<_>>().join("; ")));
    };
    some(paper, Tone::Bad, "Critical races, the delays decide", &critical);
    some(paper, Tone::Bad, "Oscillates for certain", &endless);
    some(paper, Tone::Unsure, "Known only by a bound (ternary)", &unknown);
    let harmless = of(Race::NonCritical).len() as u64;
    match (critical.is_empty(), harmless) {
        (true, 0) if endless.is_empty() && unknown.is_empty() => {
            let exact = all().all(|it| matches!(it.to, Reached::Exact { .. }));
            let cut =
                if flow.table.states_truncated || flow.table.steps_truncated { ", as far as looked at" } else { "" };
            let what = if exact { "No race and no oscillation" } else { "Every change has one outcome" };
            let how = if exact { "" } else { " (by ternary simulation in whole or in part, which tells no races)" };
            paper.item(Tone::Plain, &format!("{what}, whatever the delays{how}{cut}."));
        }
        (_, 0) => {}
        (_, many) => {
            paper.item(Tone::Plain, &format!("Non-critical races, one outcome all the same: {}.", words::count(many)))
        }
    }
    hazards(paper, scenario, flow);
    if !essential.is_empty() {
        let told = essential.iter().take(LISTED).map(|it| flow_words::from(scenario, &flow.table, it.from, &it.change));
        let more = left(essential.len(), LISTED, "transitions.csv");
        let text = format!(
            "Essential hazards: {}{more}. They belong to the flow table: no gate change cures them, only delay in the \
             feedback (Unger 1959).",
            told.collect::<Vec<_>>().join("; ")
        );
        paper.item(Tone::Unsure, &text);
    }
}

/// Transitions without those that repeat an earlier one under another label.
fn distinct<'a>(table: &FlowTable, all: Vec<&'a Transition>) -> Vec<&'a Transition> {
    let mut seen = FxHashSet::default();
    let mut new = |it: &Transition| {
        let moved = moved(table, it.from, &it.change);
        let apart = it.change.apart && moved.len() > 1;
        seen.insert((it.from, moved, apart))
    };
    all.into_iter().filter(|it| new(it)).collect()
}

/// The inputs that move, with their new values: a step may also set one that has its value already.
fn moved(table: &FlowTable, from: StateNumber, change: &Change) -> Vec<(NetId, bool)> {
    change.moving(flow_words::values(table, from)).collect()
}

/// Hazards of one net that one sentence tells: alike in shape, cause and cure.
struct Group<'a> {
    first: &'a Hazard,
    /// The changes that have it: a step that changes one input is in the table of single inputs as well.
    changes: FxHashSet<Vec<(NetId, bool)>>,
}

/// Groups in the order of their first hazards: those of steps first.
fn groups(flow: &Flow) -> Vec<Group<'_>> {
    let mut index: FxHashMap<_, usize> = FxHashMap::default();
    let mut groups: Vec<Group<'_>> = Vec::new();
    for hazard in &flow.hazards {
        let cure = hazard.cure.as_ref().map(|cure| &cure.expression);
        let group = *index.entry((hazard.net, hazard.shape, hazard.cause, hazard.built, cure)).or_insert(groups.len());
        if group == groups.len() {
            groups.push(Group { first: hazard, changes: FxHashSet::default() });
        }
        groups[group].changes.insert(moved(&flow.table, hazard.from, &hazard.change));
    }
    groups
}

/// Hazards, those of steps first.
fn hazards(paper: &mut Paper, scenario: &Scenario, flow: &Flow) {
    let groups = groups(flow);
    for group in groups.iter().take(LISTED) {
        paper.item(Tone::Unsure, &of_hazard(scenario, flow, group));
    }
    super::more(paper, groups.len().saturating_sub(LISTED), "states.json");
    if flow.hazards_truncated {
        paper.item(Tone::Unsure, "A limit cut the search for hazards: there may be more, or cures that are not told.");
    }
    if flow.hazards_not_judged > 0 {
        let cases = words::many(flow.hazards_not_judged, "case");
        let text = format!(
            "Not judged for hazards: {cases} of a net and a change from a state; too many inputs move at once, or too many \
             changes are possible."
        );
        paper.item(Tone::Unsure, &text);
    }
    if groups.is_empty() && !flow.hazards_truncated && flow.hazards_not_judged == 0 {
        paper.item(Tone::Plain, "No static or dynamic hazard of watched nets or feedback nets.");
    }
    if !scenario.circuit.feedback().is_empty() {
        let text = "Hazards are those of the logic while the feedback nets are as they were; what nets do when these then \
                    change is for the sweep to see.";
        paper.say(2, Tone::Plain, text);
    }
}

/// `Static-1 hazard (logic) of level: step to the lower gauge (from S1 choose_upper 1→0), and 1 more change; cure: …`.
fn of_hazard(scenario: &Scenario, flow: &Flow, group: &Group<'_>) -> String {
    let hazard = group.first;
    let (net, cause) = (words::net(scenario, hazard.net), hazard.cause.word());
    let mut text = words::sentence(hazard.shape.word());
    text.truncate(text.len() - 1);
    text += &format!(" hazard ({cause}) of {net}: ");
    let from = flow_words::from(scenario, &flow.table, hazard.from, &hazard.change);
    text += &match words::step(scenario, hazard.moment) {
        Some(step) => format!("{} ({from})", words::the_step(step)),
        None => from,
    };
    if hazard.states > 1 {
        text += &format!(", and {}", words::many(hazard.states - 1, "more state"));
    }
    if group.changes.len() > 1 {
        text += &format!(", and {}", words::many(group.changes.len() as u64 - 1, "more change"));
    }
    if hazard.built {
        text += "; only if its expressions are built of several gates";
    }
    match (&hazard.cure, hazard.cause) {
        (Some(cure), _) => text += &format!("; cure: {net} = {}", cure.expression),
        (None, Cause::Function) => text += "; no choice of gates cures it",
        (None, Cause::Logic) => {}
    }
    text + "."
}

/// Which nets have hazards, in how many changes.
fn in_short(scenario: &Scenario, flow: &Flow) -> String {
    let mut nets: Vec<NetId> = flow.hazards.iter().map(|hazard| hazard.net).collect();
    nets.sort_unstable();
    nets.dedup();
    let open = if flow.hazards_truncated || flow.hazards_not_judged > 0 { " (not all judged)" } else { "" };
    if nets.is_empty() {
        return format!("no hazard{open}");
    }
    let changes: FxHashSet<_> =
        flow.hazards.iter().map(|it| (it.net, moved(&flow.table, it.from, &it.change))).collect();
    let names = words::some_names(&words::nets(scenario, &nets), SHORT);
    format!("hazards of {names} in {}{open}", words::many(changes.len() as u64, "change"))
}

fn left(all: usize, told: usize, place: &str) -> String {
    match all.saturating_sub(told) {
        0 => String::new(),
        left => format!("; and {} more ({place})", words::count(left as u64)),
    }
}

/// How many single-input changes the steps make.
pub(in crate::output) fn covered(flow: &Flow) -> String {
    let coverage = &flow.coverage;
    let (exercised, all) = (words::count(coverage.exercised), words::many(coverage.all, "single-input change"));
    let perhaps = match coverage.perhaps.len() {
        0 => String::new(),
        many => {
            let what = if flow.table.start.len() > 1 { "power-up or a race" } else { "a race" };
            format!(", and {} more if {what} goes that way", words::count(many as u64))
        }
    };
    let cut = if coverage.truncated { " of the part of the table that was looked at" } else { "" };
    format!("Steps exercise {exercised} of {all}{cut}{perhaps}")
}

/// Coverage with the names of what is left out, and the automaton.
pub(super) fn reading(paper: &mut Paper, scenario: &Scenario, flow: &Flow) {
    if flow.table.states.is_empty() {
        return;
    }
    let missing = &flow.coverage.missing;
    paper.heading("Coverage, and the circuit as an automaton");
    let most = paper.most(GAPS, GAPS_OF_A_PAGE);
    let mut text = covered(flow);
    if missing.is_empty() {
        text += ".";
    } else {
        let gap = |(number, input): &(StateNumber, NetId)| flow_words::single(scenario, &flow.table, *number, *input);
        let told: Vec<String> = missing.iter().take(most).map(gap).collect();
        text += &format!("; not: {}{}.", told.join(", "), left(missing.len(), most, "thin arrows of states.svg"));
    }
    paper.item(if missing.is_empty() { Tone::Plain } else { Tone::Unsure }, &text);
    let automaton = &flow.automaton;
    let reading = match automaton.reading {
        Reading::Combinational => "No memory: at rest the outputs follow the inputs alone.".to_string(),
        Reading::Moore => "Moore: the outputs are a function of the state variables alone.".to_string(),
        Reading::Mealy(one, other) => format!(
            "Mealy: the outputs depend on the inputs as well; {} and {} agree in the state variables and differ in an output.",
            flow_words::state(one),
            flow_words::state(other)
        ),
    };
    paper.item(Tone::Plain, &reading);
    let groups = |groups: &[Vec<StateNumber>]| {
        let told: Vec<String> =
            groups.iter().take(GROUPS).map(|group| format!("({})", flow_words::some_states(group, STATES))).collect();
        told.join(", ") + &left(groups.len(), GROUPS, "states.json")
    };
    if !automaton.unreachable.is_empty() {
        let states = flow_words::some_states(&automaton.unreachable, STATES);
        paper.item(Tone::Plain, &format!("Not reachable from the start: {states}."));
    }
    if !automaton.dead_ends.is_empty() {
        let text = format!("Dead ends, never left again: {}.", groups(&automaton.dead_ends));
        paper.item(Tone::Unsure, &text);
    }
    if !automaton.equal.is_empty() {
        let text = format!("Equal states, no sequence of inputs tells them apart: {}.", groups(&automaton.equal));
        paper.item(Tone::Plain, &text);
    }
    if automaton.truncated {
        paper.item(Tone::Unsure, "A limit cut the table: of the whole circuit some of this may be otherwise.");
    }
}

/// Is the circuit within its reference? One sentence.
pub(super) fn contained(compared: &Compared) -> String {
    let states = match compared.states {
        Contained::Proved => "Every stable state is one that the reference has",
        Contained::Not(_) => "There are stable states that the reference does not have",
        Contained::GaveUp => "Whether every stable state is one of the reference is not known: a budget ran out",
    };
    let count = |number: usize| words::count(number as u64);
    let mut text = format!(
        "{states}. Of {} compared, outcomes that it does not have: {}; choices that it does not have: {}",
        words::many(compared.compared, "transition"),
        count(compared.beyond.len()),
        count(compared.choices.len()),
    );
    if compared.not_compared > 0 {
        text += &format!("; not compared: {}", words::count(compared.not_compared));
    }
    text + "."
}

/// The tone of that sentence.
pub(super) fn tone(compared: &Compared) -> Tone {
    match compared.states {
        Contained::Not(_) => Tone::Bad,
        _ if !compared.beyond.is_empty() || !compared.choices.is_empty() => Tone::Bad,
        Contained::Proved if compared.not_compared == 0 => Tone::Plain,
        _ => Tone::Unsure,
    }
}

/// The circuit against its reference.
pub(super) fn reference(paper: &mut Paper, scenario: &Scenario, flow: &Flow) {
    let Some(compared) = &flow.compared else { return };
    paper.heading("Against the reference, without delays");
    paper.say(2, tone(compared), &contained(compared));
    if let Contained::Not(values) = &compared.states {
        let each: Vec<String> =
            values.iter().map(|(net, bit)| format!("{}={}", words::net(scenario, *net), u8::from(*bit))).collect();
        let each: Vec<&str> = each.iter().map(String::as_str).collect();
        paper.item(Tone::Bad, &format!("Stable here, and not in the reference: {}.", words::some_names(&each, NAMES)));
    }
    let nets: Vec<NetId> = scenario.reference.iter().flat_map(|it| it.compare.iter().map(|pair| pair.0)).collect();
    let list = |values: &[Vec<bool>]| {
        let told: Vec<String> = values
            .iter()
            .take(LISTED)
            .map(|bits| {
                let each = nets.iter().zip(bits).take(NAMES);
                let each = each.map(|(net, bit)| format!("{}={}", words::net(scenario, *net), u8::from(*bit)));
                each.collect::<Vec<_>>().join(" ")
            })
            .collect();
        if told.is_empty() {
            "nothing".to_string()
        } else {
            told.join(" or ") + &left(values.len(), LISTED, "states.json")
        }
    };
    let transition = |number: TransitionRef| match number {
        TransitionRef::Step(number) => &flow.table.steps[number as usize],
        TransitionRef::Single(number) => &flow.table.single[number as usize],
    };
    for Beyond { transition: number, reached, allowed } in compared.beyond.iter().take(LISTED) {
        let what = flow_words::what(scenario, &flow.table, transition(*number));
        let values: &Bits = flow_words::values(&flow.table, *reached);
        let projected = state(scenario, &nets, &State::known(values.clone()));
        let text = format!(
            "Beyond the reference: {what} to {} ({projected}); allowed: {}.",
            flow_words::state(*reached),
            list(allowed)
        );
        paper.item(Tone::Bad, &text);
    }
    super::more(paper, compared.beyond.len().saturating_sub(LISTED), "states.json");
    for Choice { transition: number, outcomes } in compared.choices.iter().take(LISTED) {
        let what = flow_words::what(scenario, &flow.table, transition(*number));
        paper.item(Tone::Bad, &format!("A choice that the reference does not have: {what} to {}.", list(outcomes)));
    }
    super::more(paper, compared.choices.len().saturating_sub(LISTED), "states.json");
}

/// What a review says of the delay-free view, in two or three lines.
pub(super) fn short(paper: &mut Paper, scenario: &Scenario, flow: &Flow) {
    let table = &flow.table;
    if table.states.is_empty() {
        return;
    }
    let all = || table.steps.iter().chain(&table.single);
    let critical =
        distinct(&flow.table, all().filter(|it| flow_words::race(&it.to) == Some(Race::Critical)).collect()).len();
    let essential = distinct(&flow.table, all().filter(|it| it.essential == Some(true)).collect()).len();
    let text = format!(
        "Without delays (see states): {}. On the table: {}, {}, {}.",
        covered(flow).replacen('S', "s", 1),
        words::many(critical as u64, "critical race"),
        in_short(scenario, flow),
        words::many(essential as u64, "essential hazard"),
    );
    paper.gap();
    paper.hang(0, 2, Tone::Plain, &text);
    if let Some(compared) = &flow.compared {
        paper.hang(0, 2, tone(compared), &format!("Against the reference, without delays: {}", contained(compared)));
    }
}
