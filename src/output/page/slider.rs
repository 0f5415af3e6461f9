//! Stepping through runs: what the script needs to know of them, and the section that it fills.
//!
//! The data is JSON in the page, bounded in nets and changes; what is cut is said where it is shown.

use std::collections::{BTreeMap, BTreeSet};

use maud::{Markup, html};
use rustc_hash::FxHashMap;
use serde::Serialize;

use super::states::map;
use super::waveforms::{Drawn, called};
use super::{Told, about};
use crate::circuit::NetId;
use crate::engine::End;
use crate::flow::StateNumber;
use crate::logic::{Bits, State, Value};
use crate::output::flow_map::{self, Area};
use crate::output::words;
use crate::output::words::{clean, many, the_step};
use crate::scenario::{Begin, Scenario};
use crate::time::{Time, Unit};

/// Most nets of which values are shown.
const NETS: usize = 200;
/// Most changes of one run.
const CHANGES: usize = 20_000;

/// The circuit moves, or is known to go on moving.
const MOVING: i64 = -1;
/// It rests in a state that the flow table does not have.
const ELSEWHERE: i64 = -2;

/// The section. Its parts are filled by the script, which also makes it visible.
pub(super) fn section(told: &Told<'_>) -> Markup {
    let nets = chosen(told).len();
    let left_out = told.scenario.circuit.net_count().saturating_sub(nets) as u64;
    html! {
        p { "Choose a run and an instant: arrow keys on the slider and both buttons go from change to change. The waveform has a \
             line at the instant, the flow map a ring around the box in which the circuit rests." }
        div.controls role="group" aria-label="Run and instant" {
            label for="slider-run" { "Run" }
            select #slider-run {}
            button #slider-back type="button" { "Previous change" }
            button #slider-on type="button" { "Next change" }
            div.along {
                label for="slider" { "Instant" }
                input #slider type="range" min="0" max="0" step="1" value="0" aria-describedby="slider-time";
            }
        }
        p #slider-time aria-live="polite" {}
        p #slider-cut.note hidden {}
        div.stage {
            svg #slider-waves role="img" aria-label="Waveform of the chosen run with a line at the instant" {}
        }
        div.beside {
            div.scroll role="region" tabindex="0" aria-labelledby="values-caption" {
                table #values {
                    caption id="values-caption" { "Values at the chosen instant" }
                    thead { tr {
                        th scope="col" { "net" }
                        th scope="col" { "value" }
                        th scope="col" { "since [" (told.scenario.unit) "]" }
                    } }
                    tbody {}
                }
            }
            div.stage {
                svg #slider-map role="img" aria-label="Flow map with a ring around the box in which the circuit rests" {}
                p #slider-box {}
            }
        }
        @if left_out > 0 { p.note { "Left out of the table: " (many(left_out, "net")) "; the CSV files of the runs have all." } }
    }
}

/// The data of the script as JSON that can stand in a page.
pub(super) fn data(told: &Told<'_>) -> String {
    let (_, size, boxes) = flow_map::with_boxes(&map(told));
    let nets = chosen(told);
    let data = Data {
        unit: told.scenario.unit.name(),
        nets: nets.iter().map(|net| words::net(told.scenario, *net)).collect(),
        runs: told.drawn.iter().map(|run| of_run(told, &nets, run)).collect(),
        map: OnMap {
            id: super::states::MAP,
            size: [size.0, size.1],
            boxes: boxes.iter().map(|(number, area)| (*number, corners(*area))).collect(),
        },
        states: told.review.states.flow.table.states.len(),
    };
    in_a_page(&serde_json::to_string(&data).expect("plain data has a JSON form"))
}

/// Letters that could end or open an element become escapes, which mean the same within JSON.
fn in_a_page(json: &str) -> String {
    let mut text = String::with_capacity(json.len());
    for letter in json.chars() {
        match letter {
            '<' | '>' | '&' | '\u{2028}' | '\u{2029}' => text += &format!("\\u{:04x}", letter as u32),
            _ => text.push(letter),
        }
    }
    text
}

/// What the script knows.
#[derive(Serialize)]
struct Data<'a> {
    unit: &'static str,
    nets: Vec<&'a str>,
    runs: Vec<Run>,
    map: OnMap,
    states: usize,
}

/// Where boxes are on the map: `[x, y, width, height]` by number of the state.
#[derive(Serialize)]
struct OnMap {
    id: &'static str,
    size: [f64; 2],
    boxes: BTreeMap<StateNumber, [f64; 4]>,
}

/// One run.
#[derive(Serialize)]
struct Run {
    /// The id of its picture.
    id: String,
    name: String,
    /// Values at the start, a letter a net.
    start: String,
    /// Instants at which something happens, exact, in the unit of the scenario.
    at: Vec<String>,
    /// For each instant nets (by place in the list) and their new values, in turn; 2 is X.
    moves: Vec<Vec<usize>>,
    /// Steps: number of the instant, words.
    steps: Vec<(usize, String)>,
    /// Where it rests from some instant on: number of the state, or [`MOVING`], [`ELSEWHERE`].
    rest: Vec<(usize, i64)>,
    /// Pieces of the time axis: from, to, pixels of both.
    scale: Vec<[f64; 4]>,
    /// Top of the lanes, height of the axis.
    lanes: [f64; 2],
    size: [f64; 2],
    /// What is left out, in words.
    cut: Option<String>,
}

fn corners(area: Area) -> [f64; 4] {
    [area.x, area.y, area.width, area.height]
}

/// Which nets have their values shown: those of the pictures first.
fn chosen(told: &Told<'_>) -> Vec<NetId> {
    let pictured = told.drawn.iter().flat_map(|run| run.sheet.nets.iter().copied());
    let mut chosen = BTreeSet::new();
    for net in pictured.chain(told.scenario.circuit.nets()) {
        if chosen.len() == NETS {
            break;
        }
        chosen.insert(net);
    }
    chosen.into_iter().collect()
}

/// Everything of one instant.
#[derive(Default)]
struct Instant {
    moves: Vec<usize>,
    step: Option<String>,
    rest: Option<i64>,
}

fn of_run(told: &Told<'_>, nets: &[NetId], drawn: &Drawn<'_>) -> Run {
    let (scenario, trace) = (told.scenario, &drawn.run.trace);
    let place: FxHashMap<NetId, usize> = nets.iter().enumerate().map(|(i, net)| (*net, i)).collect();
    let mut instants: BTreeMap<Time, Instant> = BTreeMap::from([(Time::ZERO, Instant::default())]);
    let last = trace.changes.get(CHANGES).map(|change| change.at);
    // whole instants only
    let shown = |at: Time| last.is_none_or(|last| at < last);
    for change in trace.changes.iter().take_while(|change| shown(change.at)) {
        let instant = instants.entry(change.at).or_default();
        if let Some(place) = place.get(&change.net) {
            instant.moves.extend([*place, digit(change.new)]);
        }
    }
    rests(told, drawn, &mut instants, &shown);
    for window in trace.windows.iter().filter(|window| shown(window.start)) {
        let label = words::step(scenario, Some(window.moment)).unwrap_or_default();
        instants.entry(window.start).or_default().step.get_or_insert_with(|| the_step(label));
    }
    let at = |time: &Time| time.from_start().decimal(scenario.unit).to_string();
    let name = match drawn.finding {
        None => format!("{} (no finding)", called(drawn)),
        Some(finding) => format!("finding {}: {}, {}", finding + 1, about(told, finding), called(drawn)),
    };
    let scale = &drawn.sheet.scale;
    Run {
        id: drawn.id.clone(),
        name: clean(&name),
        start: nets.iter().map(|net| letter(trace.start.get(net.index()))).collect(),
        at: instants.keys().map(at).collect(),
        steps: each(&instants, |it| it.step.clone()),
        rest: each(&instants, |it| it.rest),
        scale: scale.pieces.iter().map(|piece| in_units(scenario.unit, piece)).collect(),
        lanes: [scale.lanes.0, scale.lanes.1],
        size: [scale.size.0, scale.size.1],
        cut: cut(scenario, drawn, last),
        moves: instants.into_values().map(|instant| instant.moves).collect(),
    }
}

/// What some instants have, with their numbers.
fn each<T>(instants: &BTreeMap<Time, Instant>, what: impl Fn(&Instant) -> Option<T>) -> Vec<(usize, T)> {
    instants.values().enumerate().filter_map(|(i, instant)| Some((i, what(instant)?))).collect()
}

/// Where the circuit rests, and from when to when it does not.
fn rests(told: &Told<'_>, drawn: &Drawn<'_>, instants: &mut BTreeMap<Time, Instant>, shown: &dyn Fn(Time) -> bool) {
    let table = &told.review.states.flow.table;
    let numbers: FxHashMap<&Bits, i64> = (0..).zip(&table.states).map(|(n, state)| (&state.values, n)).collect();
    let number = |state: &State| {
        let nets = told.scenario.circuit.net_count();
        let bits = (!state.has_unknown()).then(|| Bits::of((0..nets).map(|net| state.get(net) == Value::One)));
        bits.and_then(|bits| numbers.get(&bits).copied()).unwrap_or(ELSEWHERE)
    };
    let trace = &drawn.run.trace;
    let at_rest = matches!(told.scenario.begin, Begin::AtRest { .. });
    instants.entry(Time::ZERO).or_default().rest = Some(if at_rest { number(&trace.start) } else { MOVING });
    for window in trace.windows.iter().filter(|window| shown(window.start)) {
        instants.entry(window.start).or_default().rest = Some(MOVING);
        if let (End::Settled, Some(settling)) = (&window.end, window.settling) {
            let rest = window.settle_from + settling;
            if shown(rest) && trace.cut.is_none_or(|cut| rest <= cut.after) {
                instants.entry(rest).or_default().rest = Some(number(&window.state));
            }
        }
    }
}

/// What is not in the data.
fn cut(scenario: &Scenario, drawn: &Drawn<'_>, last: Option<Time>) -> Option<String> {
    let trace = &drawn.run.trace;
    let later = last.map_or(0, |last| trace.changes.iter().filter(|change| change.at >= last).count() as u64);
    let beyond = trace.cut.map_or(0, |cut| cut.transitions);
    let end = last.or(trace.cut.map(|cut| cut.after))?;
    let (end, later) = (end.from_start().decimal(scenario.unit), many(later + beyond, "change"));
    Some(format!("The slider ends before or at {end} {}: {later} of this run left out here.", scenario.unit))
}

/// A piece of the axis in units, as floats: only pixels come of it.
fn in_units(unit: Unit, piece: &(Time, Time, f64, f64)) -> [f64; 4] {
    let units = |time: Time| time.fs() as f64 / unit.femtoseconds() as f64;
    [units(piece.0), units(piece.1), piece.2, piece.3]
}

fn digit(value: Value) -> usize {
    match value {
        Value::Zero => 0,
        Value::One => 1,
        Value::X => 2,
    }
}

fn letter(value: Value) -> char {
    match value {
        Value::Zero => '0',
        Value::One => '1',
        Value::X => 'X',
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn data_cannot_end_its_element() {
        let json = serde_json::to_string("</script><!-- & \u{2028}").unwrap();
        let text = in_a_page(&json);
        assert!(!text.contains(['<', '>', '&', '\u{2028}']), "{text}");
        assert_eq!(serde_json::from_str::<String>(&text).unwrap(), "</script><!-- & \u{2028}");
    }
}
