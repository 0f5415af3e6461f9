//! The bounded view against every run on a grid of time.
//!
//! The zones speak of dense time, the grid of halves, thirds and so on of the unit in which all ranges are whole. What a
//! run on any grid shows must be in the zones. The other way round no grid is fine enough for all circuits with feedback
//! (Asarin, Maler and Pnueli 1998, On discretization of delays in timed automata and digital circuits); but a run of k
//! events that is possible is possible with all events on multiples of 1/(k + 1), and what these few gates can show they
//! show within a few events. So what the zones say and a grid does not show is looked for on finer grids, and is an
//! error only if none of them shows it.

use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;
use std::collections::BTreeSet;
use std::sync::Arc;
use stillgate::control::Control;
use stillgate::delay::DelayRange;
use stillgate::proof::zone::{self, Code};
use stillgate::proof::{
    Budget, Ended, Exact, Explored, Mode, Moves, Nothing, Plant, RestVerdict, START, Semantics, Settles, Watch,
    comes_to_rest, explore_under,
};
use stillgate::scenario::{Begin, Bounce, Clock, Place, Scenario};

use crate::support::grid::{Grid, NO_ORIGIN, Seen};
use crate::support::small_nets::{SmallNet, every_network};
use crate::support::world::{World, fs, stable_states};
use crate::support::written;

/// A world, its start and what else a grid needs to know.
struct Case {
    world: World,
    start: Vec<bool>,
    in_order: Vec<bool>,
}

/// How often what was met, so that a test cannot pass by meeting nothing.
#[derive(Debug, Default)]
struct Met {
    cases: u64,
    several: u64,
    hazards: u64,
    cycles: u64,
    tie_cycles: u64,
    apart_in_zones_only: u64,
    /// Oscillations that took too many zones to decide.
    undecided: u64,
    cut: u64,
    /// Steps whose pattern came, and that never came.
    waited: u64,
    missed: u64,
    /// Cases in which a contact bounces.
    bounced: u64,
    finer: u64,
    too_many: u64,
    states: u64,
    zones: u64,
}

/// The right rules, or one of them made weaker.
#[derive(Clone, Copy, Debug, PartialEq)]
enum Rule {
    Right,
    /// Fires too early.
    Due,
    /// Cancels what is due in this batch.
    Cancelled,
    /// Judges states that do not last.
    Lasts,
    /// A step after what fired at its instant, two arrivals on a wire at once.
    Later,
    /// Excites again at once.
    Cools,
    /// Takes an event for old from its beginning on.
    Old,
    /// A step comes strictly after its pattern.
    Follows,
    /// Takes a pattern between the parts of a batch for come.
    Peeks,
    /// A contact bounces once less.
    Pairs,
    /// A contact bounces once more.
    MorePairs,
}

type Rules = (Rule, Mode);

const TOGETHER: Mode = Mode { merge: stillgate::proof::Merge::Inclusion, joint: true, edges: false, first_hit: false };
const RIGHT: Rules = (Rule::Right, TOGETHER);

impl Semantics for Rule {
    fn due(&self, min: i64) -> i64 {
        if *self == Rule::Due { min - 1 } else { Exact.due(min) }
    }
    fn old(&self, min: i64) -> i64 {
        if *self == Rule::Old { 0 } else { Exact.old(min) }
    }
    fn cancelled(&self, max: i64) -> Code {
        if *self == Rule::Cancelled { zone::at_most(max) } else { Exact.cancelled(max) }
    }
    fn lasts(&self, limit: Code) -> Code {
        if *self == Rule::Lasts { limit } else { Exact.lasts(limit) }
    }
    fn later(&self) -> Code {
        if *self == Rule::Later { zone::AT_MOST_ZERO } else { Exact.later() }
    }
    fn cools(&self) -> bool {
        *self != Rule::Cools
    }
    fn follows(&self) -> bool {
        *self != Rule::Follows
    }
    fn peeks(&self) -> bool {
        *self == Rule::Peeks
    }
    fn pairs(&self, most: u32) -> u32 {
        match self {
            Rule::Pairs => most - 1,
            Rule::MorePairs => most + 1,
            _ => Exact.pairs(most),
        }
    }
}

fn budget() -> Budget {
    Budget { zones: 100_000, bytes: 1 << 30, until: None, control: Control::default() }
}

/// What one exploration of each kind says.
struct Said {
    rests: BTreeSet<(u32, u32, u32)>,
    moves: Vec<BTreeSet<(u32, bool, u32)>>,
    settles: Vec<(u32, (i64, i64))>,
    /// Steps whose pattern does not come.
    missed: BTreeSet<u32>,
}

impl Case {
    fn scenario(&self) -> Scenario {
        let mut scenario = self.world.scenario();
        Arc::make_mut(&mut scenario.delays).wire_one_draw.copy_from_slice(&self.in_order);
        scenario
    }

    fn full_start(&self) -> Vec<bool> {
        self.world.inputs.iter().map(|(_, bit)| *bit).chain(self.start.iter().copied()).collect()
    }

    /// Is there no clock, or is it in the cone of this net?
    fn knows_clock(&self, net: stillgate::circuit::NetId) -> bool {
        let clock = self.world.clocks.first().map(|(name, _)| self.world.net(name));
        clock.is_none_or(|clock| self.world.scenario().circuit.cone(&[net]).contains(clock))
    }

    fn start_of(&self, plant: &Plant) -> Vec<bool> {
        let all = self.full_start();
        plant.nets.iter().map(|net| all[net.index()]).collect()
    }

    fn explore<W: Watch>(&self, by: &Rules, plant: &Plant, watch: &W) -> Explored {
        explore_under(&by.0, plant, &[self.start_of(plant)], watch, by.1, &budget())
    }

    fn said(&self, by: &Rules, settles: bool, met: &mut Met) -> Result<Said, String> {
        let scenario = self.scenario();
        let nets: Vec<_> = scenario.circuit.nets().collect();
        let plant = Plant::of(&scenario, &nets, &[fs(1)]).map_err(|error| error.to_string())?;
        let found = self.explore(by, &plant, &Nothing);
        met.zones += found.zones;
        if found.ended != Ended::Complete {
            return Err(format!("{:?}", found.ended));
        }
        let state = |number: u32| found.states[number as usize][0] as u32;
        let origin = |number: u32| if number >= START { NO_ORIGIN } else { state(number) };
        let rests = found.rests.keys().map(|rest| (rest.steps, origin(rest.origin), state(rest.state))).collect();
        let mut moves = Vec::new();
        for net in &nets[self.world.inputs.len()..] {
            if !self.knows_clock(*net) {
                moves.push(BTreeSet::new());
                continue;
            }
            let cone = Plant::of(&scenario, &[*net], &[fs(1)]).map_err(|error| error.to_string())?;
            let watch = Moves { net: cone.local(*net).unwrap(), most: 2, from: None };
            let found = self.explore(by, &cone, &watch);
            if found.ended != Ended::Complete {
                return Err(format!("{:?}", found.ended));
            }
            let moved = found.hits.keys().map(|hit| Moves::moved(*hit));
            moves.push(moved.map(|moved| (moved.steps, moved.before, moved.count)).collect());
        }
        let mut figures = Vec::new();
        if settles {
            let watch = Settles::default();
            if self.explore(by, &plant, &watch).ended == Ended::Complete {
                figures = watch.figures.borrow().iter().map(|(s, [least, most])| (*s, (least.0, most.0))).collect();
            }
        }
        let missed = found.missed.keys().copied().collect();
        Ok(Said { rests, moves, settles: figures, missed })
    }

    fn seen(&self, fine: u64, times: bool, most: usize) -> Option<Seen> {
        let grid = Grid::of(&self.world, fine, &self.in_order);
        let values = self.full_start().iter().enumerate().fold(0, |all, (i, bit)| all | u32::from(*bit) << i);
        let mut seen = grid.runs(&[values], !matches!(self.world.begin, Begin::AtRest { .. }), times, most)?;
        // a cone knows nothing of the windows of a clock outside it
        let inputs = self.world.inputs.len();
        for (gate, moves) in seen.moves.iter_mut().enumerate() {
            if !self.knows_clock(stillgate::circuit::NetId((inputs + gate) as u32)) {
                moves.clear();
            }
        }
        Some(seen)
    }

    /// Compares both; an error in words.
    fn compare(&self, by: &Rules, met: &mut Met) -> Result<(), String> {
        met.cases += 1;
        let most = 20_000;
        let mut fine = 2;
        let mut seen = self.seen(fine, false, most);
        if seen.is_none() {
            fine = 1;
            seen = self.seen(fine, false, most);
        }
        // the time since a step grows without end where something oscillates
        if seen.as_ref().is_some_and(|seen| !seen.cycle) {
            seen = self.seen(fine, true, 4 * most);
        }
        let Some(mut seen) = seen else {
            met.too_many += 1;
            return Ok(());
        };
        met.states += seen.states as u64;
        let said = self.said(by, !seen.cycle, met)?;
        // a step after rest comes in a cone even if the rest of the circuit never rests
        let rest_later = (self.world.steps.iter().skip(1)).any(|step| matches!(step.place, Place::Rest(_)));
        let power_up = !matches!(self.world.begin, Begin::AtRest { .. });
        let by_parts = seen.cycle && (rest_later || power_up);
        let mut finer = [2, 3, 4, 6].into_iter();
        loop {
            if let Some(more) = seen.rests.difference(&said.rests).next() {
                return Err(format!("not in the zones: {}", rest(more)));
            }
            for (gate, (seen, said)) in seen.moves.iter().zip(&said.moves).enumerate() {
                if let Some(more) = seen.difference(said).next() {
                    return Err(format!("not in the zones: g{gate} {more:?} (steps, before, transitions)"));
                }
            }
            if let Some(more) = seen.never_came.difference(&said.missed).next() {
                return Err(format!("not in the zones: step {} never comes", more + 1));
            }
            for (steps, (least, most)) in &seen.settles {
                let Some((_, (lo, hi))) = said.settles.iter().find(|figure| figure.0 == *steps) else { continue };
                if (*least as i64) < lo * fine as i64 || *most as i64 > hi * fine as i64 {
                    return Err(format!("settling after {steps} steps: {least}..{most} / {fine} outside {lo}..{hi}"));
                }
            }
            let over = said.rests.difference(&seen.rests).next().map(rest);
            let over = over.or_else(|| {
                let mut pairs = said.moves.iter().zip(&seen.moves).enumerate();
                pairs.find_map(|(gate, (said, seen))| {
                    let more = said.difference(seen).next().filter(|_| !by_parts)?;
                    Some(format!("g{gate} {more:?} (steps, before, transitions)"))
                })
            });
            let over = over.or_else(|| {
                let more = said.missed.difference(&seen.never_came).next()?;
                Some(format!("step {} never comes", more + 1))
            });
            let Some(over) = over else { break };
            let Some(next) = finer.next() else { return Err(format!("on no grid: {over}")) };
            met.finer += 1;
            match self.seen(next, false, 20 * most) {
                Some(next) => seen = next,
                None => {
                    met.too_many += 1;
                    return Ok(());
                }
            }
        }
        if matches!(by.0, Rule::Right) {
            self.compare_cycles(&seen, met)?;
        }
        met.missed += u64::from(!said.missed.is_empty());
        met.waited += u64::from(self.world.steps.iter().enumerate().any(|(s, step)| {
            let came = |rest: &(u32, u32, u32)| rest.0 as usize > s;
            matches!(step.place, Place::When { .. }) && said.rests.iter().any(came)
        }));
        met.bounced += u64::from(self.world.steps.iter().any(|step| step.bounce.is_some()));
        met.cycles += u64::from(seen.cycle);
        met.tie_cycles += u64::from(seen.cycle && !seen.cycle_apart);
        met.several +=
            u64::from(said.rests.iter().any(|a| said.rests.iter().any(|b| (a.0, a.1) == (b.0, b.1) && a.2 != b.2)));
        met.hazards += u64::from(said.moves.iter().flatten().any(|it| it.2 >= 2));
        met.cut += u64::from(said.rests.iter().any(|it| it.1 == NO_ORIGIN && it.0 > 1));
        Ok(())
    }

    /// Is there a run without end, and one without exact ties?
    fn compare_cycles(&self, seen: &Seen, met: &mut Met) -> Result<(), String> {
        let scenario = self.scenario();
        let nets: Vec<_> = scenario.circuit.nets().collect();
        let plant = Plant::of(&scenario, &nets, &[fs(1)]).map_err(|error| error.to_string())?;
        match comes_to_rest(&plant, &[self.start_of(&plant)], &Budget { zones: 20_000, ..budget() }) {
            RestVerdict::Always if !seen.cycle => Ok(()),
            RestVerdict::Cycles(cycles) if seen.cycle => {
                let apart = cycles.iter().any(|cycle| cycle.needs_ties == Some(false));
                if cycles.iter().any(|cycle| cycle.nets.is_empty()) {
                    return Err(format!("{cycles:?}"));
                }
                if cycles.iter().any(|cycle| cycle.needs_ties.is_none()) {
                    met.undecided += 1;
                } else if seen.cycle_apart && !apart {
                    return Err("oscillates without ties, and it is said not to".into());
                }
                met.apart_in_zones_only += u64::from(apart && !seen.cycle_apart);
                Ok(())
            }
            RestVerdict::Undecided(_) => {
                met.undecided += 1;
                Ok(())
            }
            other => Err(format!("on the grid a run without end: {}; said: {other:?}", seen.cycle)),
        }
    }

    fn check(&self, name: &str, met: &mut Met) {
        if let Err(error) = self.compare(&RIGHT, met) {
            panic!("{name}: {error}\n{}", written::scenario(&self.world, &self.start));
        }
    }
}

fn rest(it: &(u32, u32, u32)) -> String {
    let origin = if it.1 == NO_ORIGIN { "elsewhere".to_string() } else { format!("{:b}", it.1) };
    format!("after {} steps from {origin} to {:b} (lowest net last)", it.0, it.2)
}

/// Ranges of small whole numbers.
fn range(rng: &mut ChaCha8Rng) -> DelayRange {
    let least = rng.random_range(1..=4);
    let width = [0, 0, 1, 1, 2, 3][rng.random_range(0..6usize)];
    DelayRange::between(fs(least), fs(least + width))
}

/// A network with ranges, its inputs at 0.
fn world(net: &SmallNet, rng: &mut ChaCha8Rng) -> World {
    let mut world = World::new();
    for input in 0..net.inputs {
        world.input(&format!("i{input}"), false);
    }
    let name = |at: usize| if at < net.inputs { format!("i{at}") } else { format!("g{}", at - net.inputs) };
    for (gate, (function, pins)) in net.gates.iter().enumerate() {
        let pins: Vec<String> = pins.iter().map(|pin| name(*pin)).collect();
        let pins: Vec<&str> = pins.iter().map(String::as_str).collect();
        world.gate(&name(net.inputs + gate), function.clone(), &pins, 1);
        let one = range(rng);
        let other = if rng.random() { one } else { range(rng) };
        world.gates[gate].delay = [one, other];
    }
    world
}

/// Each stable start of a world.
fn at_rest(world: &World) -> Vec<Case> {
    let circuit = world.scenario().circuit;
    let inputs: Vec<bool> = world.inputs.iter().map(|(_, bit)| *bit).collect();
    let of = |state: &stillgate::logic::Bits| Case {
        world: world.clone(),
        start: (inputs.len()..circuit.net_count()).map(|net| state.get(net)).collect(),
        in_order: vec![false; world.wires.len()],
    };
    stable_states(&circuit, &inputs).iter().map(of).collect()
}

/// Is a network the first of those that differ by the names of their gates only?
fn is_first(net: &SmallNet) -> bool {
    let n = net.gates.len();
    let key = |order: &[usize]| -> Vec<(String, Vec<usize>)> {
        let place = |pin: &usize| if *pin < net.inputs { *pin } else { net.inputs + order[*pin - net.inputs] };
        let mut gates = vec![(String::new(), Vec::new()); n];
        for (gate, (function, pins)) in net.gates.iter().enumerate() {
            let mut pins: Vec<usize> = pins.iter().map(place).collect();
            pins.sort_unstable();
            gates[order[gate]] = (function.name().to_string(), pins);
        }
        gates
    };
    let orders: &[&[usize]] = match n {
        1 => &[&[0]],
        2 => &[&[0, 1], &[1, 0]],
        _ => &[&[0, 1, 2], &[0, 2, 1], &[1, 0, 2], &[1, 2, 0], &[2, 0, 1], &[2, 1, 0]],
    };
    let own = key(orders[0]);
    orders.iter().all(|order| own <= key(order))
}

/// One input, one step, from each stable state; up to three gates of two pins. All of them with
/// `STILLGATE_ALL_NETWORKS=1`, else each so many-th.
#[test]
fn every_network_of_up_to_three_gates() {
    let all = std::env::var_os("STILLGATE_ALL_NETWORKS").is_some();
    let mut met = Met::default();
    let mut networks = 0u64;
    for gates in 1..=3 {
        every_network(1, gates, &mut |net| {
            if gates > 1 && !is_first(net) {
                return;
            }
            networks += 1;
            if !all && gates == 3 && !networks.is_multiple_of(23 * 100 / scaled(100)) {
                return;
            }
            for set in 0..2 {
                let mut rng = ChaCha8Rng::seed_from_u64(21 + set);
                rng.set_stream(networks);
                let mut world = world(net, &mut rng);
                for from in [false, true] {
                    world.inputs[0].1 = from;
                    world.steps.clear();
                    world.set.clear();
                    world.rest(0, &[("i0", !from)]);
                    for case in at_rest(&world) {
                        case.check(&format!("network {networks}"), &mut met);
                    }
                }
            }
        });
    }
    assert!(networks > 36_000);
    assert!(met.several > 20 && met.hazards > 100 && met.cycles > 100 && met.tie_cycles > 5, "{met:?}");
    assert!(met.too_many * 100 < met.cases, "{met:?}");
}

/// What random worlds are made of.
#[derive(Clone, Copy)]
struct Kind {
    wires: f64,
    timed: bool,
    power_up: bool,
    waits: bool,
    /// Delays of 1 or 2 and no ranges: everything meets everything.
    ties: bool,
    /// The last input is driven by a clock.
    clock: bool,
    /// Contacts bounce.
    bounces: bool,
}

/// Two or three steps of one or two inputs.
fn steps(world: &mut World, rng: &mut ChaCha8Rng, kind: Kind) {
    let number = if kind.clock {
        1
    } else if kind.timed {
        rng.random_range(2..=3)
    } else {
        2
    };
    // `at` only until another kind of step has come
    let (mut by_time, mut latest, mut skew) = (true, 0, 0);
    let mut inputs: Vec<String> = world.inputs.iter().map(|(name, _)| name.clone()).collect();
    if kind.clock {
        inputs.pop();
    }
    let mut values: Vec<bool> = world.inputs.iter().map(|(_, bit)| *bit).collect();
    for step in 0..number {
        let width = |rng: &mut ChaCha8Rng| [0, 0, 1, 2][rng.random_range(0..4usize)];
        let place = match rng.random_range(0..5) {
            _ if !kind.timed => Place::Rest(fs(0)),
            0 | 1 if by_time => {
                let least = latest + rng.random_range(0..4);
                latest = least + width(rng);
                Place::At(DelayRange::between(fs(least), fs(latest)))
            }
            0 if step == 0 => Place::Rest(fs(rng.random_range(0..2))),
            1 if kind.waits => Place::Rest(fs(rng.random_range(0..2))),
            2 | 3 if kind.waits => {
                let nets = (world.inputs.len() + world.gates.len()) as u32;
                let pattern = vec![(stillgate::circuit::NetId(rng.random_range(0..nets)), rng.random())];
                let least = rng.random_range(0..3);
                let wait = DelayRange::between(fs(least), fs(least + width(rng)));
                let timeout = rng.random_bool(0.5).then(|| fs(rng.random_range(1..8)));
                Place::When { pattern, wait, timeout }
            }
            _ => {
                let least = skew + [0, 0, 1, 2, 3, 5, 8][rng.random_range(0..7usize)];
                let most = least + width(rng);
                latest += most;
                Place::After(DelayRange::between(fs(least), fs(most)))
            }
        };
        by_time &= !matches!(place, Place::Rest(_) | Place::When { .. });
        let mut set: Vec<(&str, bool)> = Vec::new();
        for (at, name) in inputs.iter().enumerate() {
            if rng.random_bool(0.6) || at + 1 == inputs.len() && set.is_empty() {
                values[at] = if rng.random_bool(0.85) { !values[at] } else { values[at] };
                set.push((name, values[at]));
            }
        }
        world.step(place, &set);
        if kind.bounces && rng.random_bool(0.7) {
            let least = rng.random_range(1..=2);
            skew = least + rng.random_range(0..=1);
            let fewest = rng.random_range(0..=1);
            let lasting = DelayRange::between(fs(least), fs(skew));
            world.steps.last_mut().unwrap().bounce = Some(Bounce { lasting, pulses: (fewest, 1) });
            latest += skew;
            continue;
        }
        skew = if set.len() > 1 && rng.random_bool(0.4) { rng.random_range(1..=3) } else { 0 };
        if skew > 0 {
            world.steps.last_mut().unwrap().skew = Some(DelayRange::between(fs(0), fs(skew)));
        }
        latest += skew;
    }
}

/// A clock whose intervals are independent: of one period with ranges, or of two in which only the first edge has one.
fn clock(world: &mut World, rng: &mut ChaCha8Rng) {
    let least = rng.random_range(1..=5);
    let first = DelayRange::between(fs(least), fs(least + rng.random_range(0..=2)));
    let count = rng.random_range(1..=2);
    let high = rng.random_range(1..=4);
    let high = DelayRange::between(fs(high), fs(high + if count == 1 { rng.random_range(0..=2) } else { 0 }));
    let period = DelayRange::exact(high.max + fs(rng.random_range(1..=4)));
    let clock = Clock {
        net: stillgate::circuit::NetId(0),
        first,
        period,
        high,
        jitter: fs(0),
        count,
        mark: stillgate::scenario::Mark(0),
    };
    world.clocks.push((world.inputs[world.inputs.len() - 1].0.clone(), clock));
}

fn random_cases(seed: u64, count: u64, kind: Kind) -> Met {
    let mut met = Met::default();
    for stream in 0..count {
        for case in random_case(seed, stream, kind) {
            case.check(&format!("seed {seed}, stream {stream}"), &mut met);
        }
    }
    assert!(met.cases > count / 3 && met.too_many * 10 < met.cases, "{met:?}");
    // where clock edges cut most windows fewer are judged
    let least = if kind.clock { count / 300 } else { count / 60 };
    assert!(met.hazards > least && met.undecided * 50 < met.cases, "{met:?}");
    met
}

/// A random world with one or two of its starts.
fn random_case(seed: u64, stream: u64, kind: Kind) -> Vec<Case> {
    let mut rng = ChaCha8Rng::seed_from_u64(seed);
    rng.set_stream(stream);
    let (inputs, gates) = (rng.random_range(1..=2), if kind.ties { 4 } else { rng.random_range(1..=3) });
    let inputs = if kind.clock { 2 } else { inputs };
    let net = SmallNet::random_of_two(&mut rng, inputs, gates);
    let mut world = world(&net, &mut rng);
    world.inputs.iter_mut().for_each(|(_, bit)| *bit = rng.random());
    if kind.ties {
        let exact = |rng: &mut ChaCha8Rng| DelayRange::exact(fs(rng.random_range(1..=2)));
        world.gates.iter_mut().for_each(|gate| gate.delay = [exact(&mut rng), exact(&mut rng)]);
    }
    let mut in_order = Vec::new();
    for gate in world.gates.clone() {
        let mut pins = gate.pins.clone();
        pins.sort();
        pins.dedup();
        for pin in pins {
            if rng.random_bool(kind.wires) && in_order.len() < 2 {
                let one = range(&mut rng);
                in_order.push(rng.random());
                let other = if in_order[in_order.len() - 1] { one } else { range(&mut rng) };
                world.wires.push((pin, gate.name.clone(), [one, other]));
            }
        }
    }
    steps(&mut world, &mut rng, kind);
    if kind.clock {
        clock(&mut world, &mut rng);
    }
    let cases = match kind.power_up {
        true => {
            world.begin = Begin::Random;
            let start = (0..gates).map(|_| rng.random()).collect();
            vec![Case { world, start, in_order }]
        }
        false => at_rest(&world).into_iter().map(|case| Case { in_order: in_order.clone(), ..case }).collect(),
    };
    cases.into_iter().take(2).collect()
}

/// So many cases, or `STILLGATE_CASES` percent of that.
fn scaled(count: u64) -> u64 {
    let percent = std::env::var("STILLGATE_CASES").ok().and_then(|text| text.parse().ok()).unwrap_or(100);
    count * percent / 100
}

#[test]
fn steps_at_their_times() {
    let kind =
        Kind { wires: 0.0, timed: true, power_up: false, waits: false, ties: false, clock: false, bounces: false };
    let met = random_cases(31, scaled(10_000), kind);
    assert!(met.cut > 20, "{met:?}");
}

#[test]
fn wires() {
    random_cases(
        32,
        scaled(1500),
        Kind { wires: 0.5, timed: false, power_up: false, waits: false, ties: false, clock: false, bounces: false },
    );
    random_cases(
        33,
        scaled(1500),
        Kind { wires: 0.5, timed: true, power_up: false, waits: false, ties: false, clock: false, bounces: false },
    );
}

/// A clock beside one step, at any time, after rest or with skew.
#[test]
fn clocks() {
    let kind =
        Kind { wires: 0.0, timed: true, power_up: false, waits: false, ties: false, clock: true, bounces: false };
    let met = random_cases(38, scaled(800), kind);
    assert!(met.cut > 20, "{met:?}");
    random_cases(39, scaled(200), Kind { wires: 0.4, power_up: true, ..kind });
    random_cases(40, scaled(200), Kind { ties: true, power_up: true, ..kind });
}

#[test]
fn any_start() {
    random_cases(
        34,
        scaled(1500),
        Kind { wires: 0.0, timed: true, power_up: true, waits: false, ties: false, clock: false, bounces: false },
    );
    random_cases(
        35,
        scaled(1000),
        Kind { wires: 0.4, timed: true, power_up: true, waits: false, ties: false, clock: false, bounces: false },
    );
}

/// Steps that wait for a pattern, with and without an end of the wait.
#[test]
fn patterns() {
    let kind =
        Kind { wires: 0.0, timed: true, power_up: false, waits: true, ties: false, clock: false, bounces: false };
    let met = random_cases(44, scaled(3000), kind);
    assert!(met.waited * 5 > met.cases && met.missed * 10 > met.cases, "{met:?}");
    random_cases(45, scaled(800), Kind { wires: 0.4, power_up: true, ..kind });
    let met = random_cases(46, scaled(2000), Kind { ties: true, power_up: true, ..kind });
    assert!(met.waited * 5 > met.cases && met.missed * 20 > met.cases, "{met:?}");
    random_cases(47, scaled(300), Kind { clock: true, ..kind });
}

/// Contacts that bounce, before every kind of step.
#[test]
fn bounces() {
    let kind =
        Kind { wires: 0.0, timed: true, power_up: false, waits: false, ties: false, clock: false, bounces: true };
    let met = random_cases(61, scaled(600), kind);
    assert!(met.bounced * 2 > met.cases, "{met:?}");
    random_cases(62, scaled(200), Kind { timed: false, ..kind });
    random_cases(63, scaled(200), Kind { waits: true, power_up: true, ..kind });
    random_cases(64, scaled(200), Kind { ties: true, power_up: true, ..kind });
    random_cases(65, scaled(150), Kind { wires: 0.4, ..kind });
}

/// Everything at once, with exact delays.
#[test]
fn ties() {
    random_cases(
        36,
        scaled(3000),
        Kind { wires: 0.0, timed: true, power_up: true, waits: false, ties: true, clock: false, bounces: false },
    );
    random_cases(
        37,
        scaled(300),
        Kind { wires: 0.2, timed: true, power_up: true, waits: false, ties: true, clock: false, bounces: false },
    );
}

/// Each rule made weaker makes a difference that the comparison finds.
#[test]
fn a_weaker_rule_is_noticed() {
    let kinds = [
        Kind { wires: 0.0, timed: false, power_up: false, waits: false, ties: false, clock: false, bounces: false },
        Kind { wires: 0.0, timed: true, power_up: true, waits: false, ties: false, clock: false, bounces: false },
        Kind { wires: 0.5, timed: true, power_up: false, waits: false, ties: false, clock: false, bounces: false },
        Kind { wires: 0.0, timed: true, power_up: true, waits: false, ties: true, clock: false, bounces: false },
        Kind { wires: 0.0, timed: true, power_up: true, waits: true, ties: true, clock: false, bounces: false },
        Kind { wires: 0.0, timed: true, power_up: false, waits: false, ties: false, clock: false, bounces: true },
    ];
    let apart = Mode { joint: false, ..TOGETHER };
    let rules = [
        Rule::Due,
        Rule::Cancelled,
        Rule::Lasts,
        Rule::Later,
        Rule::Cools,
        Rule::Old,
        Rule::Follows,
        Rule::Peeks,
        Rule::Pairs,
        Rule::MorePairs,
    ];
    let weaker = rules.map(|rule| (rule, TOGETHER));
    for rules in weaker.into_iter().chain([(Rule::Right, apart)]) {
        let mut met = Met::default();
        let noticed = (0..3000).position(|stream| {
            kinds
                .iter()
                .any(|kind| random_case(41, stream, *kind).iter().any(|case| case.compare(&rules, &mut met).is_err()))
        });
        assert!(noticed.is_some(), "{rules:?}");
    }
}

/// One zone a key holds whatever the exact exploration finds, and seldom more.
#[test]
fn a_hull_holds_no_less() {
    let kinds = [
        Kind { wires: 0.0, timed: true, power_up: true, waits: false, ties: false, clock: false, bounces: false },
        Kind { wires: 0.5, timed: true, power_up: false, waits: false, ties: false, clock: false, bounces: false },
        Kind { wires: 0.0, timed: true, power_up: true, waits: false, ties: true, clock: false, bounces: false },
        Kind { wires: 0.0, timed: true, power_up: true, waits: true, ties: true, clock: false, bounces: false },
        Kind { wires: 0.0, timed: true, power_up: false, waits: false, ties: false, clock: false, bounces: true },
    ];
    let hull = Mode { merge: stillgate::proof::Merge::Hull, ..TOGETHER };
    let (mut met, mut cases, mut more) = (Met::default(), 0, 0);
    for stream in 0..scaled(1000) {
        for (number, case) in kinds.iter().flat_map(|kind| random_case(43, stream, *kind)).enumerate() {
            let exact = case.said(&RIGHT, false, &mut met).unwrap();
            let Ok(held) = case.said(&(Rule::Right, hull), false, &mut met) else { continue };
            cases += 1;
            let moves = exact.moves.iter().zip(&held.moves).all(|(exact, held)| exact.is_subset(held));
            let missed = exact.missed.is_subset(&held.missed);
            assert!(exact.rests.is_subset(&held.rests) && moves && missed, "stream {stream}, case {number}");
            more += u64::from(exact.rests != held.rests || exact.moves != held.moves);
        }
    }
    assert!(cases > scaled(2000) && more * 20 < cases, "{cases} {more}");
}
