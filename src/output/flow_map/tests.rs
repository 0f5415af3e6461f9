//! What every map keeps to, on random tables: no line through a box, no label on a box or another label, all of it on the
//! sheet, the limits kept, and everything left out named.

use std::sync::Arc;

use super::arrows::Place;
use super::frame::{BOX_LINE, Frame, RACE, Way};
use super::labels::BELOW;
use super::{MOST_ARROWS, MOST_BOXES, MOST_COLUMNS, Map, svg};
use crate::circuit::{Circuit, Function, GateSpec, NetId};
use crate::flow::{Flow, FlowState, FlowTable, Reached, Transition};
use crate::logic::{Bits, State, Value};
use crate::output::ink::SMALL;
use crate::output::measure::width;
use crate::scenario::{Builder, Moment, MomentKind, Scenario};
use crate::statics::{Change, Race};

/// Numbers that look random (Knuth's constants for a linear congruential generator).
struct Draw(u64);

impl Draw {
    fn below(&mut self, many: usize) -> usize {
        self.0 = self.0.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
        ((self.0 >> 33) as usize) % many.max(1)
    }
}

/// A scenario of inputs and gates whose names are up to `letters` long, and labels of steps.
fn scenario(draw: &mut Draw, inputs: usize, gates: usize, steps: usize, letters: usize) -> Scenario {
    let mut name = |stem: &str, i: usize| format!("{stem}{}_{i}", "n".repeat(draw.below(letters)));
    let names: Vec<String> = (0..inputs).map(|i| name("in", i)).collect();
    let specs = (0..gates)
        .map(|i| GateSpec { name: name("gate", i), function: Function::Buf, pins: vec![NetId((inputs + i) as u32)] })
        .collect();
    let circuit = Circuit::new(&names, specs, Vec::new()).unwrap();
    let mut builder = Builder::new("Title ".repeat(draw.below(30) + 1));
    builder.gate("y", Function::Buf, ["y"]);
    builder.initial("y", false);
    let mut scenario = builder.finish().unwrap();
    scenario.outputs = circuit.gates().map(|gate| circuit.net_of(gate)).collect();
    scenario.circuit = Arc::new(circuit);
    let mut stimulus = (*scenario.stimulus).clone();
    stimulus.moments = (0..steps)
        .map(|i| Moment { label: format!("step {} {i}", "l".repeat(draw.below(letters))), kind: MomentKind::Step(0) })
        .collect();
    scenario.stimulus = Arc::new(stimulus);
    scenario
}

/// A table that no circuit need have: states and outcomes at random.
fn flow(draw: &mut Draw, scenario: &Scenario, states: usize) -> Flow {
    let nets = scenario.circuit.net_count();
    let inputs = scenario.circuit.input_count();
    let mut table = FlowTable::default();
    for _ in 0..states {
        let values = Bits::of((0..nets).map(|_| draw.below(2) == 1).collect::<Vec<_>>().into_iter());
        table.states.push(FlowState { values, reachable: draw.below(4) > 0, explored: true });
    }
    table.start = vec![draw.below(states) as u32];
    let step = |draw: &mut Draw, table: &FlowTable, from: usize, change: Change, moment| {
        let mut after = table.states[from].values.clone();
        for (net, bit) in &change.set {
            after.set(net.index(), *bit);
        }
        let fits = |it: &&FlowState| (0..inputs).all(|net| it.values.get(net) == after.get(net));
        let possible: Vec<u32> =
            (0..).zip(&table.states).filter(|(_, it)| fits(it)).map(|(number, _)| number).collect();
        let many = [1, 1, 1, 2, 3][draw.below(5)].min(possible.len());
        let states: Vec<u32> = possible[..many].to_vec();
        let cycles = u64::from(states.is_empty() || draw.below(6) == 0);
        let race = if states.len() as u64 + cycles > 1 { Race::Critical } else { Race::None };
        let mut unknown = State::zeros(nets);
        unknown.set(inputs, Value::X);
        let to = match draw.below(8) {
            0 => Reached::Bound { state: unknown, states, truncated: false },
            _ => Reached::Exact { states, cycles, race },
        };
        Transition { moment, from: from as u32, change, to, essential: None, sure: draw.below(3) > 0 }
    };
    for moment in 0..scenario.stimulus.moments.len() {
        let from = draw.below(states);
        let set = (0..inputs).filter_map(|net| match draw.below(4) {
            value @ 0..=1 => Some((NetId(net as u32), value == 1)),
            _ => None,
        });
        let change = Change { set: set.collect::<Vec<_>>(), apart: false };
        let transition = step(draw, &table, from, change, Some(moment as u32));
        table.steps.push(transition);
    }
    for from in 0..states {
        for input in 0..inputs {
            let change = Change::of_one(&table.states[from].values, NetId(input as u32));
            let transition = step(draw, &table, from, change, None);
            table.single.push(transition);
        }
    }
    Flow { table, ..Flow::default() }
}

/// Left, top, right, bottom.
type Area = [f64; 4];

fn overlap(one: &Area, other: &Area) -> bool {
    one[0] < other[2] && other[0] < one[2] && one[1] < other[3] && other[1] < one[3]
}

/// The area of a text at its base line.
fn text(x: f64, y: f64, text: &str, to_the_right: bool, wider: f64) -> Area {
    let wide = width(text, SMALL) * wider;
    let left = if to_the_right { x } else { x - wide };
    [left, y - 8.5, left + wide, y + 2.0]
}

/// All labels of an arrow.
fn labels(way: &Way) -> Vec<Area> {
    let begin = way.branches[0][0];
    let x = if way.rightwards { begin.0 + 6.0 } else { begin.0 - 6.0 };
    let mut all = Vec::new();
    if !way.label.above.is_empty() {
        let wider = if way.label.bold { super::labels::BOLD } else { 1.0 };
        all.push(text(x, begin.1 - 4.0, &way.label.above, way.rightwards, wider));
    }
    for (i, line) in way.label.below.iter().enumerate() {
        all.push(text(x, begin.1 + BELOW * (i + 1) as f64, line, way.rightwards, 1.0));
    }
    if way.label.number.is_some() {
        let x = if way.rightwards { begin.0 + 12.0 } else { begin.0 - 12.0 };
        all.push([x - 8.0, begin.1 - 8.0, x + 8.0, begin.1 + 8.0]);
    }
    if way.fork.is_some() {
        for branch in &way.branches {
            let (x, y) = branch[branch.len() - 1];
            let x = if way.rightwards { x - 12.0 } else { x + 12.0 };
            all.push(text(x, y - 3.0, RACE, !way.rightwards, 1.0));
        }
    }
    all
}

fn check(map: &Map<'_>, case: &str) {
    let frame = Frame::new(map);
    let boxes: Vec<Area> = frame.blocks.iter().map(|it| [it.x, it.y, it.x + frame.wide, it.y + it.height]).collect();
    for (i, one) in boxes.iter().enumerate() {
        assert!(one[0] >= 0.0 && one[2] <= frame.width && one[3] <= frame.height, "{case}: a box off the sheet");
        assert!(boxes[..i].iter().all(|other| !overlap(one, other)), "{case}: two boxes overlap");
        let block = &frame.blocks[i];
        let lines = 1 + block.variables.len() + block.outputs.len();
        assert!(lines as f64 * BOX_LINE <= block.height, "{case}: {lines} lines in a box of {}", block.height);
    }
    let all: Vec<(usize, Area)> =
        frame.ways.iter().enumerate().flat_map(|(i, way)| labels(way).into_iter().map(move |it| (i, it))).collect();
    for (i, (way, one)) in all.iter().enumerate() {
        assert!(boxes.iter().all(|other| !overlap(one, other)), "{case}: label {way} on a box");
        let other = all[..i].iter().find(|other| overlap(one, &other.1));
        assert!(other.is_none(), "{case}: labels of {way} and {other:?} overlap");
    }
    let mut taken: Vec<(usize, Area)> = Vec::new();
    for (i, way) in frame.ways.iter().enumerate() {
        for branch in &way.branches {
            for (k, pair) in branch.windows(2).enumerate() {
                let (a, b) = (pair[0], pair[1]);
                assert!(a.0 == b.0 || a.1 == b.1, "{case}: a slanted line {branch:?}");
                let line = [a.0.min(b.0), a.1.min(b.1), a.0.max(b.0), a.1.max(b.1)];
                let inner = [line[0] + 0.1, line[1] - 0.1, line[2] - 0.1, line[3] + 0.1];
                assert!(boxes.iter().all(|area| !overlap(&inner, area)), "{case}: {branch:?} runs through a box");
                let grown = [line[0] - 1.0, line[1] - 1.0, line[2] + 1.0, line[3] + 1.0];
                // vertical pieces keep clear of all labels
                let clear = a.0 != b.0 || all.iter().all(|(_, label)| !overlap(&grown, label));
                assert!(clear, "{case}: the line {k} of {branch:?} crosses a label");
                // two arrows may cross, but do not run along each other
                let along = |other: &&(usize, Area)| {
                    let (way, it) = other;
                    let level = line[1] == line[3] && it[1] == it[3] && (line[1] - it[1]).abs() < 2.0;
                    let upright = line[0] == line[2] && it[0] == it[2] && (line[0] - it[0]).abs() < 2.0;
                    let meet = line[0].max(it[0]) < line[2].min(it[2]) && level
                        || line[1].max(it[1]) < line[3].min(it[3]) && upright;
                    *way != i && meet
                };
                let other = taken.iter().find(along);
                assert!(other.is_none(), "{case}: line {k} of {i} {line:?} lies on {other:?}");
                taken.push((i, line));
            }
        }
    }
    let states = frame.blocks.iter().filter(|it| matches!(it.place, Place::State(_))).count();
    assert!(states <= MOST_BOXES && frame.headings.len() <= MOST_COLUMNS, "{case}: {states} boxes");
    let steps = frame.ways.iter().filter(|way| way.is_step).count();
    assert!(steps <= MOST_ARROWS && frame.ways.len() - steps <= MOST_ARROWS, "{case}: too many arrows");
    let said = frame.notes.join(" ");
    let table = &map.flow.table;
    if states < table.states.len() {
        assert!(said.contains(&format!("{states} of {}", table.states.len())), "{case}: {said}");
    }
    for note in &frame.notes {
        assert!(width(note, SMALL) <= frame.width, "{case}: {note}");
    }
    assert_eq!(svg(map), svg(map), "{case}: the same bytes again");
}

#[test]
fn lines_labels_and_boxes_keep_clear_of_each_other() {
    let mut draw = Draw(1);
    for case in 0..150 {
        let (inputs, gates) = (draw.below(4), draw.below(7) + 1);
        let steps = draw.below(10);
        let letters = [1, 10, 40, 200][draw.below(4)];
        let scenario = scenario(&mut draw, inputs, gates, steps, letters);
        let states = draw.below(24) + 1;
        let flow = flow(&mut draw, &scenario, states);
        let variables: Vec<NetId> = scenario.outputs.iter().copied().take(draw.below(6)).collect();
        let map = Map { scenario: &scenario, flow: &flow, state_variables: &variables, id: "map" };
        check(&map, &format!("case {case}"));
    }
}

#[test]
fn large_tables_are_cut_and_say_so() {
    let mut draw = Draw(7);
    for (inputs, states, steps) in [(6, 300, 30), (5, 61, 0), (2, 200, 400), (20, 50, 40), (9, 3, 0)] {
        let scenario = scenario(&mut draw, inputs, 5, steps, 12);
        let flow = flow(&mut draw, &scenario, states);
        let variables = scenario.outputs.clone();
        let map = Map { scenario: &scenario, flow: &flow, state_variables: &variables, id: "map" };
        check(&map, &format!("{inputs} inputs, {states} states, {steps} steps"));
    }
}

#[test]
fn a_map_of_nothing_says_so() {
    let scenario = scenario(&mut Draw(3), 2, 2, 0, 5);
    let flow = Flow::default();
    let map = Map { scenario: &scenario, flow: &flow, state_variables: &[], id: "map" };
    assert!(svg(&map).contains("There is no stable state."));
}
