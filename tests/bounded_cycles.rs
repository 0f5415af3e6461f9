//! Oscillations that are known, circuits that are known to have none, and parts that are explored apart.

use stillgate::circuit::Function::{And, Buf, Majority, Nand, Nor, Not, Or};
use stillgate::circuit::NetId;
use stillgate::control::Control;
use stillgate::delay::DelayRange;
use stillgate::proof::{Budget, Cycle, Ended, Mode, Nothing, Plant, RestVerdict, comes_to_rest, explore};

use crate::support::world::{World, fs};

fn budget() -> Budget {
    Budget { zones: 50_000, bytes: 1 << 30, until: None, control: Control::default() }
}

fn ranges(world: &mut World, ranges: &[(u64, u64)]) {
    for (gate, (least, most)) in world.gates.iter_mut().zip(ranges) {
        gate.delay = [DelayRange::between(fs(*least), fs(*most)); 2];
    }
}

/// The plant of these nets, or all of them, and its start.
fn plant(world: &World, start: &[bool], of: Option<&str>) -> (Plant, Vec<bool>) {
    let scenario = world.scenario();
    let nets: Vec<NetId> = match of {
        Some(net) => vec![world.net(net)],
        None => scenario.circuit.nets().collect(),
    };
    let plant = Plant::of(&scenario, &nets, &[]).unwrap();
    let all: Vec<bool> = world.inputs.iter().map(|(_, bit)| *bit).chain(start.iter().copied()).collect();
    let start = plant.nets.iter().map(|net| all[net.index()]).collect();
    (plant, start)
}

fn verdict(world: &World, start: &[bool]) -> RestVerdict {
    let (plant, start) = plant(world, start, None);
    comes_to_rest(&plant, &[start], &budget())
}

/// The names of the nets that move in the only cycle, its window, and whether it needs ties.
fn only(world: &World, verdict: RestVerdict) -> (Vec<String>, u32, Option<bool>) {
    let RestVerdict::Cycles(cycles) = verdict else { panic!("{verdict:?}") };
    let [Cycle { steps, needs_ties, nets, lead, round, .. }] = &cycles[..] else { panic!("{cycles:?}") };
    assert!(!lead.is_empty() && round.len() > 1);
    let name = |net: &u32| match world.inputs.get(*net as usize) {
        Some(input) => input.0.clone(),
        None => world.gates[*net as usize - world.inputs.len()].name.clone(),
    };
    (nets.iter().map(name).collect(), *steps, *needs_ties)
}

/// A ring of an odd number of inversions runs as long as it is let (common practice, no source).
#[test]
fn a_gated_ring_runs_without_ties() {
    let mut world = World::new();
    world.input("go", false);
    world.gate("a", Nand, &["go", "c"], 1).gate("b", Not, &["a"], 1).gate("c", Not, &["b"], 1);
    ranges(&mut world, &[(2, 3), (3, 5), (1, 4)]);
    world.rest(0, &[("go", true)]).after(40, &[("go", false)]).rest(0, &[("go", true)]);
    let found = verdict(&world, &[true, false, true]);
    // the first time a step ends it
    assert_eq!(only(&world, found), (vec!["a".into(), "b".into(), "c".into()], 3, Some(false)));
    world.steps.truncate(2);
    world.set.truncate(2);
    assert_eq!(verdict(&world, &[true, false, true]), RestVerdict::Always);
}

/// Two NORs let go at once toggle only as long as both fire at exactly equal times (common practice, no source).
#[test]
fn a_latch_let_go_at_once_needs_ties() {
    let latch = |q: (u64, u64), qn: (u64, u64)| {
        let mut world = World::new();
        world.input("r", true).input("s", true);
        world.gate("q", Nor, &["r", "qn"], 1).gate("qn", Nor, &["s", "q"], 1);
        ranges(&mut world, &[q, qn]);
        world.rest(0, &[("r", false), ("s", false)]);
        world
    };
    let world = latch((4, 8), (5, 9));
    let found = verdict(&world, &[false, false]);
    assert_eq!(only(&world, found), (vec!["q".into(), "qn".into()], 1, Some(true)));
    assert_eq!(verdict(&latch((4, 6), (7, 9)), &[false, false]), RestVerdict::Always);
    // ranges that touch in one point
    let world = latch((4, 6), (6, 9));
    assert_eq!(only(&world, verdict(&world, &[false, false])).2, Some(true));
}

/// A ring of three C-elements with one inversion, let go by a reset: a token runs round (common practice, no source).
#[test]
fn a_ring_of_c_elements_runs_without_ties() {
    let mut world = World::new();
    world.input("reset", true);
    world.gate("run", Not, &["reset"], 1).gate("back", Not, &["c"], 1).gate("into", And, &["back", "run"], 1);
    for (own, before, after) in [("a", "into", "nb"), ("b", "a", "nc"), ("c", "b", "a")] {
        world.gate(own, Majority, &[own, before, after], 1);
    }
    for (own, of) in [("nb", "b"), ("nc", "c")] {
        world.gate(own, Not, &[of], 1);
    }
    ranges(&mut world, &[(1, 2), (1, 2), (1, 2), (3, 4), (3, 4), (3, 4), (1, 2), (1, 2)]);
    world.rest(0, &[("reset", false)]);
    let found = verdict(&world, &[false, true, false, false, false, false, true, true]);
    let (nets, steps, needs_ties) = only(&world, found);
    assert_eq!((steps, needs_ties), (1, Some(false)));
    assert!(nets.contains(&"a".to_string()) && nets.contains(&"c".to_string()), "{nets:?}");
}

/// What runs out of its budget is undecided, and never said to rest.
#[test]
fn too_few_zones_decide_nothing() {
    let mut world = World::new();
    world.input("i", false);
    world.gate("a", Buf, &["i"], 3).gate("b", Buf, &["a"], 3).gate("c", Or, &["a", "b"], 3);
    world.rest(0, &[("i", true)]);
    let (plant, start) = plant(&world, &[false; 3], None);
    let few = Budget { zones: 2, ..budget() };
    assert_eq!(comes_to_rest(&plant, std::slice::from_ref(&start), &few), RestVerdict::Undecided(Ended::Zones));
    let small = Budget { bytes: 400, ..budget() };
    assert_eq!(comes_to_rest(&plant, std::slice::from_ref(&start), &small), RestVerdict::Undecided(Ended::Bytes));
    assert_eq!(comes_to_rest(&plant, &[start], &budget()), RestVerdict::Always);
}

/// Asked of the cone of one net, latches beside each other cost a sum: 64 times the zones of one.
#[test]
fn latches_side_by_side_cost_a_sum() {
    let mut world = World::new();
    world.input("go", true);
    for number in 0..64 {
        let (q, qn) = (format!("q{number}"), format!("p{number}"));
        world.gate(&q, Nor, &["go", &qn], 1).gate(&qn, Nor, &["go", &q], 1);
    }
    let both = [(4, 8), (5, 9)];
    ranges(&mut world, &both.repeat(64));
    world.rest(0, &[("go", false)]);
    let zones: Vec<u64> = (0..64)
        .map(|number| {
            let (plant, start) = plant(&world, &[false; 128], Some(&format!("q{number}")));
            assert_eq!(plant.gates.len(), 2);
            let found = explore(&plant, &[start], &Nothing, Mode::default(), &budget());
            assert_eq!(
                (found.ended, found.rests.iter().filter(|(rest, _)| rest.steps == 1).count()),
                (Ended::Complete, 2)
            );
            found.zones
        })
        .collect();
    assert!(zones.iter().all(|it| *it == zones[0] && *it < 20), "{zones:?}");
}
