//! What was understood of a scenario.

use super::Page;
use super::notes;
use super::paper::{Paper, Table, Tone};
use crate::circuit::NetId;
use crate::delay::DelayRange;
use crate::output::words;
use crate::scenario::{MomentKind, Place, Scenario, Step};

/// Most names in a list.
const NAMES: usize = 16;
/// Most rows of a table.
const ROWS: usize = 14;

/// The text of `check`: the circuit, what is watched and why, the steps, assumptions and notes.
pub fn check(scenario: &Scenario, page: &Page<'_>) -> String {
    let mut paper = page.paper();
    let circuit = &scenario.circuit;
    let counts = format!(
        "{}: {}, {}, {}.",
        scenario.title,
        words::many(circuit.input_count() as u64, "input"),
        words::many(circuit.gate_count() as u64, "gate"),
        words::steps(scenario)
    );
    paper.say(0, Tone::Strong, &counts);
    let mut list = |label: &str, nets: &[NetId]| {
        let names = match nets {
            [] => "none".to_string(),
            nets => words::some_names(&words::nets(scenario, nets), NAMES),
        };
        paper.hang(2, 4, Tone::Plain, &format!("{label}: {names}"));
    };
    list("Inputs", &circuit.inputs().collect::<Vec<_>>());
    list("Gates", &circuit.gates().map(|gate| circuit.net_of(gate)).collect::<Vec<_>>());
    list("Outputs", &scenario.outputs);
    list("Feedback nets (cut every loop)", circuit.feedback());
    if !scenario.conditions.is_empty() {
        let each: Vec<String> = scenario.conditions.iter().map(|it| format!("{} (x {})", it.name, it.scale)).collect();
        let each: Vec<&str> = each.iter().map(String::as_str).collect();
        paper.hang(2, 4, Tone::Plain, &format!("Conditions: {}", words::some_names(&each, NAMES)));
    }
    watched(&mut paper, scenario);
    steps(&mut paper, scenario);
    notes::notes(&mut paper, scenario);
    paper.finish()
}

/// Watched nets, and why.
fn watched(paper: &mut Paper, scenario: &Scenario) {
    let mut reasons: Vec<(&str, Vec<&str>)> = Vec::new();
    for net in &scenario.watched {
        let (why, name) = (scenario.why_watched(*net), words::net(scenario, *net));
        match reasons.iter_mut().find(|entry| entry.0 == why) {
            Some(entry) => entry.1.push(name),
            None => reasons.push((why, vec![name])),
        }
    }
    if reasons.is_empty() {
        paper.say(2, Tone::Unsure, "Watched: none");
    }
    for (why, names) in reasons {
        paper.hang(2, 4, Tone::Plain, &format!("Watched ({why}): {}", words::some_names(&names, NAMES)));
    }
}

fn steps(paper: &mut Paper, scenario: &Scenario) {
    let stimulus = &scenario.stimulus;
    if stimulus.moments.is_empty() {
        return;
    }
    paper.heading("Steps");
    let mut table = Table::new().text("step").text("when").text("sets");
    for moment in stimulus.moments.iter().take(ROWS) {
        let (when, sets) = match moment.kind {
            MomentKind::PowerUp => ("at the start".to_string(), String::new()),
            MomentKind::Edge { clock, .. } => {
                let clock = &stimulus.clocks[clock as usize];
                let period = clock.period.typ.decimal(scenario.unit);
                (format!("clock, period {period} {}", scenario.unit), words::net(scenario, clock.net).to_string())
            }
            MomentKind::Step(step) => {
                let step = &stimulus.steps[step as usize];
                (place(scenario, &step.place), sets(scenario, step))
            }
        };
        table.row(Tone::Plain, vec![moment.label.clone(), when, sets]);
    }
    paper.table(&table);
    super::more(paper, stimulus.moments.len().saturating_sub(ROWS), "check --json");
}

/// What a step sets: `call=1 permit=0`, and how its contacts bounce.
pub(in crate::output) fn sets(scenario: &Scenario, step: &Step) -> String {
    let sets = step.set.iter().map(|(net, value)| format!("{}={}", words::net(scenario, *net), u8::from(*value)));
    let mut sets = sets.collect::<Vec<_>>().join(" ");
    if let Some(bounce) = &step.bounce {
        let (least, most) = bounce.pulses;
        let pairs = if least == most { least.to_string() } else { format!("{least} to {most}") };
        sets += &format!(", bouncing {pairs} times within {}", range(scenario, &bounce.lasting));
    }
    sets
}

/// A range of times: `100 ns`, `100 to 140 ns`.
pub(in crate::output) fn range(scenario: &Scenario, range: &DelayRange) -> String {
    let unit = scenario.unit;
    if range.is_exact() {
        format!("{} {unit}", range.min.decimal(unit))
    } else {
        format!("{} to {} {unit}", range.min.decimal(unit), range.max.decimal(unit))
    }
}

/// When a step comes: `at 100 ns`, `100 to 140 ns after the step before`.
pub(in crate::output) fn place(scenario: &Scenario, place: &Place) -> String {
    let unit = scenario.unit;
    let range = |it: &DelayRange| range(scenario, it);
    match place {
        Place::At(it) => format!("at {}", range(it)),
        Place::After(it) => format!("{} after the step before", range(it)),
        Place::Rest(wait) if wait.fs() == 0 => "at rest".to_string(),
        Place::Rest(wait) => format!("{} {unit} after rest", wait.decimal(unit)),
        Place::When { pattern, wait, timeout } => {
            let nets =
                pattern.iter().map(|(net, value)| format!("{}={}", words::net(scenario, *net), u8::from(*value)));
            let nets = nets.collect::<Vec<_>>().join(" ");
            let limit = timeout.map_or_else(String::new, |limit| format!(", for up to {} {unit}", limit.decimal(unit)));
            if wait.is_exact() && wait.min.fs() == 0 {
                format!("when {nets}{limit}")
            } else {
                format!("{} after {nets}{limit}", range(wait))
            }
        }
    }
}
