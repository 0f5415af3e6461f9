//! The bounded view against the engine: whatever a run with delays in their ranges does lies inside what the zones say.

use std::collections::BTreeSet;
use std::sync::Arc;

use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;
use stillgate::circuit::NetId;
use stillgate::control::Control;
use stillgate::delay::DelayRange;
use stillgate::engine::End;
use stillgate::instance::{Instance, Which};
use stillgate::logic::{Bits, Value};
use stillgate::proof::{Budget, Ended, Mode, Moves, Plant, START, Settles, explore};
use stillgate::scenario::{Bounce, Clock, Mark, Place, Scenario};
use stillgate::time::Span;

use crate::support::small_nets::SmallNet;
use crate::support::world::{World, fs, run, stable_states};
use crate::support::written;

#[derive(Debug, Default)]
struct Met {
    worlds: u64,
    runs: u64,
    windows: u64,
    figures: u64,
    moved: u64,
    /// Settling at the very bound.
    at_bound: u64,
    skipped: u64,
}

fn between(rng: &mut ChaCha8Rng, least: u64, width: u64) -> DelayRange {
    DelayRange::between(fs(least), fs(least + rng.random_range(0..=width)))
}

/// A world of 3 to 7 gates with ranges up to 12, sometimes wires, and two to four steps.
fn world(rng: &mut ChaCha8Rng, bounces: bool) -> World {
    let (inputs, gates) = (rng.random_range(1..=2), rng.random_range(3..=7));
    let net = match rng.random() {
        true => SmallNet::random_of_two(rng, inputs, gates),
        false => SmallNet::random(rng, inputs, gates),
    };
    let mut world = World::new();
    (0..inputs).for_each(|input| {
        world.input(&format!("i{input}"), rng.random());
    });
    let name = |at: usize| if at < inputs { format!("i{at}") } else { format!("g{}", at - inputs) };
    let range = |rng: &mut ChaCha8Rng| {
        let least = rng.random_range(1..=8);
        DelayRange::between(fs(least), fs(least + rng.random_range(0..=4)))
    };
    for (gate, (function, pins)) in net.gates.iter().enumerate() {
        let pins: Vec<String> = pins.iter().map(|pin| name(*pin)).collect();
        let refs: Vec<&str> = pins.iter().map(String::as_str).collect();
        world.gate(&name(inputs + gate), function.clone(), &refs, 1);
        world.gates[gate].delay = [range(rng), range(rng)];
        if rng.random_bool(0.1) {
            world.wires.push((pins[0].clone(), name(inputs + gate), [range(rng), range(rng)]));
        }
    }
    let mut values: Vec<bool> = world.inputs.iter().map(|(_, bit)| *bit).collect();
    let mut moving = 0;
    for _ in 0..rng.random_range(2..=4) {
        let place = match rng.random_range(0..3) {
            0 => {
                let least = moving + rng.random_range(4..20);
                Place::After(DelayRange::between(fs(least), fs(least + rng.random_range(0..=3))))
            }
            _ => Place::Rest(fs(rng.random_range(0..3))),
        };
        let at = rng.random_range(0..inputs);
        values[at] = !values[at];
        world.step(place, &[(&format!("i{at}"), values[at])]);
        if inputs == 2 && rng.random_bool(0.3) {
            values[1 - at] = !values[1 - at];
            world.set.last_mut().unwrap().push((format!("i{}", 1 - at), values[1 - at]));
            world.steps.last_mut().unwrap().skew = rng.random_bool(0.5).then(|| DelayRange::between(fs(0), fs(3)));
        }
        moving = 0;
        if bounces && rng.random_bool(0.6) {
            let step = world.steps.last_mut().unwrap();
            let lasting = between(rng, 1, 8);
            moving = lasting.max.fs();
            let fewest = rng.random_range(0..=1);
            (step.skew, step.bounce) = (None, Some(Bounce { lasting, pulses: (fewest, rng.random_range(1..=2)) }));
        }
    }
    world
}

/// The same with two inputs, the first of which is driven by a clock of two or three periods with ranges and jitter.
fn clocked(rng: &mut ChaCha8Rng) -> World {
    let mut world = loop {
        let world = world(rng, false);
        if world.inputs.len() == 2 {
            break world;
        }
    };
    let mut value = world.inputs[1].1;
    for (step, set) in world.steps.iter_mut().zip(&mut world.set) {
        value = !value;
        (*set, step.skew) = (vec![("i1".to_string(), value)], None);
    }
    let least = rng.random_range(1..=9);
    let first = between(rng, least, 3);
    let least = rng.random_range(4..=12);
    let high = between(rng, least, 2);
    let least = high.max.fs() + rng.random_range(4..=12);
    let period = between(rng, least, 2);
    let jitter = fs(rng.random_range(0..=1));
    let clock = Clock { net: NetId(0), first, period, high, jitter, count: rng.random_range(2..=3), mark: Mark(0) };
    world.clocks.push(("i0".into(), clock));
    world
}

/// One case: everything from its range, evenly, from the corners, or from whole numbers three apart.
fn drawn(scenario: &Scenario, rng: &mut ChaCha8Rng, fine: u64) -> Instance {
    let mut instance = Instance::of(scenario, &Which::Typ);
    let style = rng.random_range(0..3);
    let mut draw = |range: DelayRange| {
        let (least, most) = (range.min.fs() * fine, range.max.fs() * fine);
        let drawn = match style {
            0 => rng.random_range(least..=most),
            1 if rng.random() => least,
            1 => most,
            _ => rng.random_range(range.min.fs()..=range.max.fs()) * fine,
        };
        Span::from_fs(drawn)
    };
    for (to, from) in instance.delays.gate.iter_mut().zip(&scenario.delays.gate) {
        *to = [draw(from[0]), draw(from[1])];
    }
    for (to, from) in instance.delays.wire.iter_mut().zip(&scenario.delays.wire) {
        *to = [draw(from[0]), draw(from[1])];
    }
    for (case, clock) in instance.clocks.iter_mut().zip(&scenario.stimulus.clocks) {
        (case.first, case.period, case.high) = (draw(clock.first), draw(clock.period), draw(clock.high));
        let moves = DelayRange::between(fs(0), clock.jitter + clock.jitter);
        let most = (clock.jitter.fs() * fine) as i64;
        case.jitter.iter_mut().for_each(|moved| *moved = draw(moves).fs() as i64 - most);
    }
    for (s, step) in scenario.stimulus.steps.iter().enumerate() {
        instance.places[s] = match &step.place {
            Place::Rest(wait) => Span::from_fs(wait.fs() * fine),
            Place::At(range) | Place::After(range) => draw(*range),
            Place::When { wait, .. } => draw(*wait),
        };
        if let Some(skew) = step.skew {
            instance.skews[s] = step.set.iter().map(|_| draw(skew)).collect();
        }
    }
    for (s, step) in scenario.stimulus.steps.iter().enumerate() {
        if let Some(bounce) = &step.bounce {
            for toggles in &mut instance.bounces[s] {
                let pairs = rng.random_range(bounce.pulses.0..=bounce.pulses.1);
                let span = rng.random_range(bounce.lasting.min.fs() * fine..=bounce.lasting.max.fs() * fine);
                toggles.clear();
                if pairs > 0 {
                    toggles.extend((1..2 * pairs).map(|_| Span::from_fs(rng.random_range(0..span))));
                    toggles.sort_unstable();
                    toggles.push(Span::from_fs(span));
                }
            }
        }
    }
    instance
}

fn word(values: impl Iterator<Item = bool>) -> u64 {
    values.enumerate().fold(0, |all, (at, bit)| all | u64::from(bit) << at)
}

fn check(world: &World, rest: &Bits, rng: &mut ChaCha8Rng, met: &mut Met) -> Result<(), String> {
    let mut scenario = world.scenario();
    // an oscillation is cut short by the limit
    scenario.limits.transitions = 400;
    let nets: Vec<NetId> = scenario.circuit.nets().collect();
    let plant = Plant::of(&scenario, &nets, &[fs(1)]).map_err(|error| error.to_string())?;
    let start: Vec<bool> = nets.iter().map(|net| rest.get(net.index())).collect();
    let budget = Budget { zones: 6_000, bytes: 1 << 30, until: None, control: Control::default() };
    // the time in a window is bounded only if every window comes to rest; else it is not asked for
    let found = explore(&plant, std::slice::from_ref(&start), &stillgate::proof::Nothing, Mode::default(), &budget);
    if found.ended != Ended::Complete {
        met.skipped += 1;
        return Ok(());
    }
    let settles = Settles::default();
    let timed = explore(&plant, std::slice::from_ref(&start), &settles, Mode::default(), &budget);
    let timed = timed.ended == Ended::Complete;
    let state = |number: u32| if number >= START { u64::MAX } else { found.states[number as usize][0] };
    let rests: BTreeSet<(u32, u64, u64)> =
        (found.rests.keys()).map(|rest| (rest.steps, state(rest.origin), state(rest.state))).collect();
    let mut moves: Vec<Option<BTreeSet<(u32, bool, u32)>>> = Vec::new();
    for net in &nets[world.inputs.len()..] {
        let cone = Plant::of(&scenario, &[*net], &[fs(1)]).map_err(|error| error.to_string())?;
        let from: Vec<bool> = cone.nets.iter().map(|net| start[net.index()]).collect();
        let found = explore(
            &cone,
            &[from],
            &Moves { net: cone.local(*net).unwrap(), most: 2, from: None },
            Mode::default(),
            &budget,
        );
        moves.push((found.ended == Ended::Complete).then(|| {
            let moved = found.hits.keys().map(|hit| Moves::moved(*hit));
            moved.map(|moved| (moved.steps, moved.before, moved.count)).collect()
        }));
    }
    met.worlds += 1;

    // the engine runs in eighths; an event at the instant at which a window at rest begins is of the one before it
    let fine = 8;
    let mut scaled = scenario.clone();
    let stimulus = Arc::make_mut(&mut scaled.stimulus);
    for step in &mut stimulus.steps {
        if let Place::Rest(wait) = &mut step.place {
            *wait = Span::from_fs(wait.fs() * fine);
        }
    }
    let wires = scenario.circuit.wire_count();
    for _ in 0..40 {
        let instance = drawn(&scenario, rng, fine);
        let record = run(&scaled, rest, &instance);
        met.runs += 1;
        for window in &record.windows {
            let (first, together) = (window.moment + 1, window.opening.moments.len() as u32);
            let steps = match (scenario.stimulus.clocks.is_empty(), together) {
                (true, _) => window.moment + together,
                (false, 1) => first,
                (false, _) => plant.windows + first,
            };
            if window.end != End::Settled {
                continue;
            }
            met.windows += 1;
            let bits = |values: &[Value]| word(values.iter().map(|value| *value == Value::One));
            let (before, after) = (bits(&window.opening.state), bits(&window.state));
            let mask = (1 << nets.len()) - 1;
            let origin = if window.began_at_rest { before } else { u64::MAX };
            // a window in which a wire is not at its net's value at its begin did not begin at rest
            let fits = rests.iter().any(|rest| {
                let same =
                    rest.1 == origin || rest.1 != u64::MAX && origin != u64::MAX && rest.1 & mask == origin & mask;
                rest.0 == steps && same && rest.2 & mask == after & mask
            });
            if !fits && !window.opening.inputs.is_empty() {
                return Err(format!("{steps} steps, from {before:b} to {after:b} is not in {rests:?} ({wires} wires)"));
            }
            if let (Some(settling), true) = (window.settling, timed) {
                let figures = settles.figures.borrow();
                let Some([least, most]) = figures.get(&steps) else {
                    return Err(format!("no settling times after {steps} steps"));
                };
                let time = settling as i64;
                if time < least.0 * fine as i64 || time > most.0 * fine as i64 {
                    return Err(format!("settled {time}/{fine} after {steps} steps, outside {least:?}..{most:?}"));
                }
                met.figures += 1;
                met.at_bound += u64::from(time == most.0 * fine as i64);
            }
            if !window.began_at_rest {
                continue;
            }
            for (gate, moves) in moves.iter().enumerate() {
                let net = NetId((world.inputs.len() + gate) as u32);
                let cone = scenario.circuit.cone(&[net]);
                // a cone knows nothing of the windows of a clock outside it
                if scenario.stimulus.clocks.iter().any(|clock| !cone.contains(clock.net)) {
                    continue;
                }
                let Some(moves) =
                    moves.as_ref().filter(|_| window.opening.inputs.iter().any(|net| cone.contains(*net)))
                else {
                    continue;
                };
                let count = (record.changes.iter())
                    .filter(|(at, changed, _)| *changed == net && *at <= window.stop && *at > window.start)
                    .count()
                    .min(3) as u32;
                let was = window.opening.state[net.index()] == Value::One;
                if !moves.contains(&(steps, was, count)) {
                    return Err(format!(
                        "g{gate} moves {count} times from {was} after {steps} steps, not in {moves:?}"
                    ));
                }
                met.moved += 1;
            }
        }
    }
    Ok(())
}

/// Clocks with ranges and jitter, beside steps: at any time, after one another, after rest.
#[test]
fn every_clocked_run_lies_in_the_zones() {
    let percent: u64 = std::env::var("STILLGATE_CASES").ok().and_then(|text| text.parse().ok()).unwrap_or(100);
    let mut met = Met::default();
    for stream in 0..60 * percent / 100 {
        let mut rng = ChaCha8Rng::seed_from_u64(52);
        rng.set_stream(stream);
        let world = clocked(&mut rng);
        let inputs: Vec<bool> = world.inputs.iter().map(|(_, bit)| *bit).collect();
        for rest in stable_states(&world.scenario().circuit, &inputs).iter().take(1) {
            if let Err(error) = check(&world, rest, &mut rng, &mut met) {
                let start: Vec<bool> =
                    (inputs.len()..inputs.len() + world.gates.len()).map(|net| rest.get(net)).collect();
                panic!("seed 52, stream {stream}: {error}\n{}", written::scenario(&world, &start));
            }
        }
    }
    assert!(met.skipped * 2 < met.worlds && met.figures > met.worlds && met.moved > met.worlds, "{met:?}");
}

#[test]
fn every_run_lies_in_the_zones() {
    let met = simulated(51, 400, false);
    assert!(met.skipped * 10 < met.worlds && met.figures > met.worlds && met.at_bound > met.worlds / 4, "{met:?}");
}

/// Contacts that bounce, before steps at rest and at their times.
#[test]
fn every_bounce_lies_in_the_zones() {
    let met = simulated(53, 150, true);
    assert!(met.skipped * 2 < met.worlds && met.figures > met.worlds && met.moved > met.worlds, "{met:?}");
}

fn simulated(seed: u64, count: u64, bounces: bool) -> Met {
    let percent: u64 = std::env::var("STILLGATE_CASES").ok().and_then(|text| text.parse().ok()).unwrap_or(100);
    let mut met = Met::default();
    for stream in 0..count * percent / 100 {
        let mut rng = ChaCha8Rng::seed_from_u64(seed);
        rng.set_stream(stream);
        let world = world(&mut rng, bounces);
        let inputs: Vec<bool> = world.inputs.iter().map(|(_, bit)| *bit).collect();
        for rest in stable_states(&world.scenario().circuit, &inputs).iter().take(1) {
            if let Err(error) = check(&world, rest, &mut rng, &mut met) {
                let start: Vec<bool> =
                    (inputs.len()..inputs.len() + world.gates.len()).map(|net| rest.get(net)).collect();
                panic!("seed {seed}, stream {stream}: {error}\n{}", written::scenario(&world, &start));
            }
        }
    }
    met
}
