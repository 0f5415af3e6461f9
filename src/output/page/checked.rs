//! What was checked: circuit, stimulus, rules, delays, draws, versions.

use maud::{Markup, html};

use super::parts::{Cell, Table, cut};
use super::{Told, waveforms};
use crate::circuit::{Circuit, Function, GateId, NetId};
use crate::delay::DelayRange;
use crate::findings::RuleKey;
use crate::instance::LAYOUT;
use crate::output::json::FORMAT;
use crate::output::text;
use crate::output::words::{self, clean, count, many};
use crate::scenario::{Begin, MomentKind, Scenario, Vary};
use crate::sweep::FORMAT as PART_FORMAT;

/// Most names in a list.
const NAMES: usize = 40;
/// Most rows of a table.
const ROWS: usize = 120;

pub(super) fn section(told: &Told<'_>) -> Markup {
    let scenario = told.scenario;
    html! {
        dl { @for (term, said) in facts(told) { dt { (term) } dd { (clean(&said)) } } }
        (gates(scenario))
        (wires(scenario))
        (steps(scenario))
        (clocks(scenario))
        @if let Some(run) = told.drawn.iter().find(|run| run.finding.is_none()) { (waveforms::draw(scenario, run)) }
    }
}

/// Terms and what is said of them.
fn facts(told: &Told<'_>) -> Vec<(&'static str, String)> {
    let (scenario, review) = (told.scenario, told.review);
    let (circuit, plan) = (&*scenario.circuit, &review.sweep.plan);
    let list = |nets: &[NetId]| match nets {
        [] => "none".to_string(),
        nets => words::some_names(&words::nets(scenario, nets), NAMES),
    };
    let inputs: Vec<NetId> = circuit.inputs().collect();
    let mut all = vec![
        ("Scenario", told.page.scenario.map_or_else(|| "the built-in demonstration".into(), String::from)),
        ("Circuit", format!("{}, {}", many(inputs.len() as u64, "input"), many(circuit.gate_count() as u64, "gate"))),
        ("Inputs", list(&inputs)),
        ("Outputs", list(&scenario.outputs)),
        ("Watched", watched(scenario)),
        ("Feedback nets (cut every loop)", list(circuit.feedback())),
        ("Begins", begin(scenario)),
        ("Stimulus", stimulus(scenario)),
        ("Rules", questions(told)),
        ("Draws", text::draws(&review.sweep)),
    ];
    let varies = match plan.vary {
        Vary::PerPart => "each delay is drawn once a board and stays: part differs from part",
        Vary::PerEvent => "each firing of a gate takes a delay of its own",
    };
    all.push(("Delay model", format!("whole femtoseconds between min and max of every gate and edge; {varies}")));
    if let Some(search) = &review.search {
        let runs = many(search.per_question, "run");
        all.push(("Directed search", format!("up to {runs} for each question, from the worst draws on")));
    }
    if let Some(proof) = &review.proof {
        let allowed = proof.allowed.map_or_else(String::new, |most| format!(" of at most {}", count(most)));
        all.push((
            "Proof",
            format!("every delay in the ranges, bounded inertial gates; {}{allowed} zones", count(proof.zones)),
        ));
    }
    if !scenario.conditions.is_empty() {
        let each: Vec<String> = scenario.conditions.iter().map(|it| format!("{} (x {})", it.name, it.scale)).collect();
        all.push(("Conditions", each.join(", ")));
    }
    if let Some(reference) = &scenario.reference {
        let pairs: Vec<NetId> = reference.compare.iter().map(|pair| pair.0).collect();
        let gates = many(reference.circuit.gate_count() as u64, "gate");
        all.push(("Reference", format!("a network of {gates}, compared on {}", list(&pairs))));
    }
    let time = scenario.limits.time.map_or_else(String::new, |limit| format!(", {}", limit.rounded()));
    all.push(("Limits of a window", format!("{}{time}", many(scenario.limits.transitions, "transition"))));
    all.push((
        "Versions",
        format!(
            "Stillgate {}, results format {FORMAT}, parts format {}, layout of the draws {LAYOUT}",
            env!("CARGO_PKG_VERSION"),
            PART_FORMAT
        ),
    ));
    all
}

/// How many steps, and how many of them clocks make.
fn stimulus(scenario: &Scenario) -> String {
    let edges = scenario.stimulus.moments.iter().filter(|it| matches!(it.kind, MomentKind::Edge { .. })).count();
    match edges {
        0 => words::steps(scenario),
        n => format!(
            "{}, of which {} are edges of {}",
            words::steps(scenario),
            count(n as u64),
            many(scenario.stimulus.clocks.len() as u64, "clock")
        ),
    }
}

fn watched(scenario: &Scenario) -> String {
    let each: Vec<String> = scenario
        .watched
        .iter()
        .take(NAMES)
        .map(|net| format!("{} ({})", words::net(scenario, *net), scenario.why_watched(*net)))
        .collect();
    let more = match scenario.watched.len().saturating_sub(NAMES) {
        0 => String::new(),
        left => format!(" and {} more", count(left as u64)),
    };
    if each.is_empty() { "none".to_string() } else { each.join(", ") + &more }
}

fn begin(scenario: &Scenario) -> String {
    match &scenario.begin {
        Begin::AtRest { named } if named.is_empty() => "at rest".to_string(),
        Begin::AtRest { named } => {
            let each: Vec<String> = named
                .iter()
                .map(|(net, value)| format!("{}={}", words::net(scenario, *net), u8::from(*value)))
                .collect();
            let each: Vec<&str> = each.iter().map(String::as_str).collect();
            format!("at rest, with {}", words::some_names(&each, NAMES))
        }
        Begin::Random => "at power-up, gate outputs at random".to_string(),
        Begin::Unknown => "at power-up, gate outputs unknown (X)".to_string(),
    }
}

/// How many questions each rule asks.
fn questions(told: &Told<'_>) -> String {
    let mut rules: Vec<(RuleKey, u64)> = Vec::new();
    for question in &told.review.asked.questions {
        match rules.iter_mut().find(|it| it.0 == question.rule) {
            Some(it) => it.1 += 1,
            None => rules.push((question.rule, 1)),
        }
    }
    let each: Vec<String> =
        rules.iter().map(|(rule, n)| format!("{} ({})", rule.word(), many(*n, "question"))).collect();
    if each.is_empty() { "none".to_string() } else { each.join(", ") }
}

/// A range in the scenario's unit: `6, 9, 14`, or one number.
pub(super) fn figures(scenario: &Scenario, range: &DelayRange) -> String {
    let number = |span: crate::time::Span| span.decimal(scenario.unit).to_string();
    match range.is_exact() {
        true => number(range.min),
        false => format!("{}, {}, {}", number(range.min), number(range.typ), number(range.max)),
    }
}

/// What a gate computes: `nand(a, b)`, or its expression.
fn function(circuit: &Circuit, gate: GateId) -> String {
    match circuit.function(gate) {
        Function::Expr(expr) => expr.text().to_string(),
        function => {
            let pins: Vec<&str> = circuit.pins(gate).iter().map(|net| circuit.name(*net)).collect();
            format!("{}({})", function.name(), words::some_names(&pins, NAMES))
        }
    }
}

fn gates(scenario: &Scenario) -> Markup {
    let circuit = &*scenario.circuit;
    let (rise, fall) = (format!("rise [{}]", scenario.unit), format!("fall [{}]", scenario.unit));
    let row = |gate: GateId| {
        let [fall, rise] = &scenario.delays.gate[gate.index()];
        let name = circuit.name(circuit.net_of(gate)).to_string();
        let (rise, fall) = (figures(scenario, rise), figures(scenario, fall));
        vec![Cell::Text(name), Cell::Code(function(circuit, gate)), Cell::Number(rise), Cell::Number(fall)]
    };
    let table = Table {
        id: "gates",
        caption: "Gates with their delay ranges: least, typical, greatest (one number: always the same)",
        head: vec![("net", false), ("function", false), (&rise, true), (&fall, true)],
        rows: circuit.gates().take(ROWS).map(row).collect(),
    };
    html! { (table.draw()) (cut(circuit.gate_count().saturating_sub(ROWS), "gates", "the scenario file")) }
}

fn wires(scenario: &Scenario) -> Markup {
    let circuit = &*scenario.circuit;
    if circuit.wire_count() == 0 {
        return html! {};
    }
    let (rise, fall) = (format!("rise [{}]", scenario.unit), format!("fall [{}]", scenario.unit));
    let row = |((net, gate), [fall, rise]): (&(NetId, GateId), &[DelayRange; 2])| {
        let name = format!("{} to {}", circuit.name(*net), circuit.name(circuit.net_of(*gate)));
        vec![Cell::Text(name), Cell::Number(figures(scenario, rise)), Cell::Number(figures(scenario, fall))]
    };
    let table = Table {
        id: "wires",
        caption: "Wires with a delay of their own: least, typical, greatest",
        head: vec![("wire", false), (&rise, true), (&fall, true)],
        rows: circuit.wires().iter().zip(&scenario.delays.wire).take(ROWS).map(row).collect(),
    };
    html! { (table.draw()) (cut(circuit.wire_count().saturating_sub(ROWS), "wires", "the scenario file")) }
}

fn steps(scenario: &Scenario) -> Markup {
    let steps = &scenario.stimulus.steps;
    if steps.is_empty() {
        return html! {};
    }
    let row = |step: &crate::scenario::Step| {
        let expect =
            step.expect.as_ref().map(|it| crate::findings::Pattern::OneOf(it.clone()).words(&scenario.circuit));
        vec![
            Cell::Text(step.label.clone()),
            Cell::Text(text::place(scenario, &step.place)),
            Cell::Code(text::sets(scenario, step)),
            step.skew.as_ref().map_or(Cell::Empty, |skew| Cell::Text(text::range(scenario, skew))),
            expect.map_or(Cell::Empty, Cell::Code),
        ]
    };
    let table = Table {
        id: "stimulus",
        caption: "Steps",
        head: vec![("step", false), ("when", false), ("sets", false), ("skew", false), ("expects", false)],
        rows: steps.iter().take(ROWS).map(row).collect(),
    };
    html! { (table.draw()) (cut(steps.len().saturating_sub(ROWS), "steps", "the scenario file")) }
}

fn clocks(scenario: &Scenario) -> Markup {
    let stimulus = &scenario.stimulus;
    if stimulus.clocks.is_empty() {
        return html! {};
    }
    let range = |it: &DelayRange| Cell::Number(text::range(scenario, it));
    let row = |clock: &crate::scenario::Clock| {
        vec![
            Cell::Text(words::net(scenario, clock.net).to_string()),
            range(&clock.first),
            range(&clock.period),
            range(&clock.high),
            Cell::Number(if clock.jitter.fs() == 0 { "none".into() } else { format!("± {}", clock.jitter.rounded()) }),
            Cell::Number(count(u64::from(clock.count))),
        ]
    };
    let table = Table {
        id: "clocks",
        caption: "Clocks",
        head: vec![
            ("net", false),
            ("first edge", true),
            ("period", true),
            ("time high", true),
            ("jitter", true),
            ("periods", true),
        ],
        rows: stimulus.clocks.iter().take(ROWS).map(row).collect(),
    };
    html! {
        (table.draw())
        (cut(stimulus.clocks.len().saturating_sub(ROWS), "clocks", "the scenario file"))
        p { "Every edge is a step of its own." }
    }
}
