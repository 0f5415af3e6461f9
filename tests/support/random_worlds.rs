//! Random small circuits with random stimulus, by number: the same number gives the same case on every machine.

use std::collections::BTreeMap;
use std::sync::Arc;

use rand::seq::IndexedRandom;
use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;
use stillgate::circuit::{Expr, Function, GateId, NetId};
use stillgate::delay::{Billionths, DelayRange, Filter, Group, Marginal, Together};
use stillgate::instance::{Firings, Instance, Which};
use stillgate::logic::Bits;
use stillgate::scenario::{Begin, Bounce, Clock, Mark, Place, Scenario, Vary};

use super::world::{Gate, World, exact, fs, stable_states};

/// What a batch of random cases is made of.
#[derive(Clone, Copy, Debug)]
pub struct Kind {
    pub gates: (usize, usize),
    pub filters: Filters,
    pub begin: Start,
    pub wires: f64,
    pub delays: Lengths,
    pub steps: (usize, usize),
    pub clocks: bool,
    pub limits: &'static [u64],
    pub rings: bool,
    /// Gates that make a row of pulses of every change of an input, and steps that mostly wait for rest.
    pub hazards: bool,
    /// How many of the steps bounce, and how many of the others wait for a pattern.
    pub hands: f64,
    /// Delays with a range, and firings of a gate that differ: drawn, or some of them given.
    pub anew: bool,
}

#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Filters {
    Inertial,
    Transport,
    /// Inertial and transport gates.
    Mixed,
    Reject,
    Involution,
    /// Gates of all kinds.
    All,
}

/// A filter of a kind that fits a gate's delays.
fn filter(rng: &mut ChaCha8Rng, filters: Filters, delay: [DelayRange; 2]) -> Filter {
    let [fall, rise] = delay.map(|range| range.min.fs());
    let least = fall.min(rise);
    match filters {
        Filters::Inertial => Filter::Inertial,
        Filters::Transport => Filter::Transport,
        Filters::Mixed => *[Filter::Inertial, Filter::Transport].choose(rng).unwrap(),
        // a limit of at least 1 lies below the least delay
        Filters::Reject if least == 1 => Filter::Transport,
        Filters::Reject => Filter::Reject(fs(rng.random_range(1..least))),
        Filters::Involution => {
            // from hardly felt to hardly causal
            let causal = |tau: u64| (-(fall as f64) / tau as f64).exp() + (-(rise as f64) / tau as f64).exp() < 1.0;
            let mut tau = rng.random_range(1..=2 * least.max(2));
            while tau > 1 && !causal(tau) {
                tau -= 1;
            }
            if causal(tau) { Filter::Involution(fs(tau)) } else { Filter::Transport }
        }
        Filters::All => {
            let one = *[Filters::Mixed, Filters::Reject, Filters::Involution, Filters::Involution].choose(rng).unwrap();
            filter(rng, one, delay)
        }
    }
}

#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Start {
    Rest,
    Random,
    Unknown,
}

#[derive(Clone, Copy, Debug)]
pub enum Lengths {
    /// 1 to 4 fs: everything meets everything.
    Ties,
    /// Up to 40 fs.
    Short,
    /// Up to 100,000 fs: hardly anything meets.
    Wide,
}

impl Lengths {
    fn draw(self, rng: &mut ChaCha8Rng) -> u64 {
        match self {
            Lengths::Ties => rng.random_range(1..=4),
            Lengths::Short => rng.random_range(1..=40),
            Lengths::Wide => rng.random_range(1..=100_000),
        }
    }
}

fn function(rng: &mut ChaCha8Rng, nets: &[String]) -> (Function, Vec<String>) {
    let choice = rng.random_range(0..12);
    // functions of more than six nets have other forms in the engine
    let wide = rng.random_bool(0.15);
    if choice >= 10 {
        // an expression over some of the nets, some of them twice
        let (nets_in_use, terms) = if wide { (9..=14, 10..=20) } else { (1..=4, 1..=6) };
        let nets: Vec<&String> = (0..rng.random_range(nets_in_use)).map(|_| nets.choose(rng).unwrap()).collect();
        let mut text = String::new();
        for i in 0..rng.random_range(terms) {
            if i > 0 {
                text.push_str([" & ", " | ", " ^ "].choose(rng).unwrap());
            }
            let (open, close) = [("", ""), ("!", ""), ("!(1 & ", ")")].choose(rng).unwrap();
            text.push_str(&format!("{open}{}{close}", nets.choose(rng).unwrap()));
        }
        let expr = Expr::parse(&text).unwrap();
        let pins = expr.nets().iter().map(ToString::to_string).collect();
        return (Function::Expr(expr), pins);
    }
    let function = Function::LISTED[choice].clone();
    let pins = match function {
        Function::Buf | Function::Not => 1,
        Function::Mux => 3,
        Function::Majority => rng.random_range(if wide { 4..=7 } else { 1..=2 }) * 2 + 1,
        _ if wide => rng.random_range(8..=14),
        _ => rng.random_range(2..=4),
    };
    (function, (0..pins).map(|_| nets.choose(rng).unwrap().clone()).collect())
}

/// A ring of inverters and buffers with an odd number of inversions, all its gates new; returns a net of it.
fn ring(world: &mut World, rng: &mut ChaCha8Rng, name: &str, lengths: Lengths) -> String {
    let gates = rng.random_range(1..=3);
    for i in 0..gates {
        let function = if i == 0 { Function::Not } else { Function::Buf };
        let pin = format!("{name}{}", (i + gates - 1) % gates);
        let (rise, fall) = (lengths.draw(rng), lengths.draw(rng));
        world.gate_edges(&format!("{name}{i}"), function, &[&pin], rise, fall);
    }
    format!("{name}0")
}

/// A chain of buffers behind an input, and a parity over some of its taps: as many pulses as there are taps.
fn pulses(world: &mut World, rng: &mut ChaCha8Rng, lengths: Lengths) {
    let mut taps = vec![world.inputs.choose(rng).unwrap().0.clone()];
    for i in 0..rng.random_range(1..=5) {
        let (rise, fall) = (lengths.draw(rng) + lengths.draw(rng), lengths.draw(rng) + lengths.draw(rng));
        let pin = taps.last().unwrap().clone();
        world.gate_edges(&format!("p{i}"), Function::Buf, &[&pin], rise, fall);
        taps.push(format!("p{i}"));
    }
    taps.retain(|_| rng.random_bool(0.8));
    let mut pins: Vec<&str> = taps.iter().map(String::as_str).collect();
    pins.resize(pins.len().max(2), "p0");
    let function = [Function::Xor, Function::Xnor].choose(rng).unwrap().clone();
    world.gate("p", function, &pins, 1);
}

fn world(rng: &mut ChaCha8Rng, kind: Kind) -> World {
    let mut world = World::new();
    for i in 0..rng.random_range(1..=4) {
        world.input(&format!("i{i}"), rng.random());
    }
    let gates = rng.random_range(kind.gates.0..=kind.gates.1);
    let mut nets: Vec<String> = world.inputs.iter().map(|(name, _)| name.clone()).collect();
    nets.extend((0..gates).map(|g| format!("g{g}")));
    for g in 0..gates {
        let (function, pins) = function(rng, &nets);
        let one = kind.delays.draw(rng);
        let other = if rng.random_bool(0.5) { one } else { kind.delays.draw(rng) };
        let delay = [exact(one), exact(other)];
        world.gates.push(Gate {
            name: nets[nets.len() - gates + g].clone(),
            function,
            pins,
            delay,
            filter: Filter::Inertial,
        });
    }
    if kind.rings {
        let (a, b) = (ring(&mut world, rng, "a", kind.delays), ring(&mut world, rng, "b", kind.delays));
        if rng.random_bool(0.7) {
            let delay = kind.delays.draw(rng);
            world.gate("c", Function::Xor, &[&a, &b], delay);
        }
    }
    if kind.hazards {
        pulses(&mut world, rng, kind.delays);
    }
    for gate in &mut world.gates {
        gate.filter = filter(rng, kind.filters, gate.delay);
    }
    for gate in world.gates.clone() {
        let mut pins = gate.pins.clone();
        pins.sort();
        pins.dedup();
        for pin in pins {
            if rng.random_bool(kind.wires) {
                let (rise, fall) = (kind.delays.draw(rng), kind.delays.draw(rng));
                world.wire(&pin, &gate.name, rise, fall);
            }
        }
    }
    let clocks = if kind.clocks { rng.random_range(1..=2.min(world.inputs.len())) } else { 0 };
    clock_and_steps(&mut world, rng, kind, clocks);
    world.begin = match kind.begin {
        Start::Rest => Begin::AtRest { named: Vec::new() },
        Start::Random => Begin::Random,
        Start::Unknown => Begin::Unknown,
    };
    world.limits.transitions = *kind.limits.choose(rng).unwrap();
    if rng.random_bool(0.1) {
        world.limits.time = Some(fs(rng.random_range(1..=20) * kind.delays.draw(rng)));
    }
    world.plan.seed = rng.random_range(0..1 << 40);
    world
}

fn clock_and_steps(world: &mut World, rng: &mut ChaCha8Rng, kind: Kind, clocks: usize) {
    let lengths = kind.delays;
    let range = |rng: &mut ChaCha8Rng, least: u64| {
        DelayRange::between(fs(least), fs(least + if rng.random() { lengths.draw(rng) } else { 0 }))
    };
    for c in 0..clocks {
        let first = if rng.random() { 0 } else { lengths.draw(rng) };
        let first = range(rng, first);
        let jitter = rng.random_range(0..=2u64);
        let high = 2 * jitter + lengths.draw(rng);
        let high = range(rng, high);
        let low = 2 * jitter + lengths.draw(rng);
        let period = range(rng, high.max.fs() + low);
        let count = rng.random_range(1..=12);
        let clock =
            Clock { net: world.net(&format!("i{c}")), first, period, high, jitter: fs(jitter), count, mark: Mark(0) };
        world.clocks.push((format!("i{c}"), clock));
    }
    let free: Vec<String> = world.inputs[clocks..].iter().map(|(name, _)| name.clone()).collect();
    let (mut by_time, mut earliest, mut skew_before) = (true, 0, 0);
    for _ in 0..rng.random_range(kind.steps.0..=kind.steps.1) {
        let wait = if rng.random_bool(0.3) { 0 } else { rng.random_range(0..=4) * lengths.draw(rng) };
        let patient = kind.hazards && rng.random_bool(0.7);
        let place = match rng.random_range(0..4) {
            _ if patient => Place::Rest(fs(wait)),
            0 if by_time => Place::At(exact(earliest + wait)),
            0 | 1 => Place::Rest(fs(wait)),
            _ => Place::After(exact(skew_before + wait)),
        };
        by_time &= !matches!(place, Place::Rest(_));
        earliest += wait;
        let mut inputs = free.clone();
        inputs.retain(|_| rng.random_bool(0.7));
        let set: Vec<(&str, bool)> = inputs.iter().map(|net| (net.as_str(), rng.random())).collect();
        world.step(place, &set);
        skew_before = 0;
        if rng.random_bool(0.3) {
            skew_before = lengths.draw(rng);
            world.steps.last_mut().unwrap().skew = Some(DelayRange::between(fs(0), fs(skew_before)));
        }
        if rng.random_bool(kind.hands) {
            let (shortest, fewest) = (lengths.draw(rng), rng.random_range(0..3));
            let lasting = range(rng, shortest);
            skew_before += lasting.max.fs();
            let bounce = Bounce { lasting, pulses: (fewest, fewest + rng.random_range(0..3)) };
            world.steps.last_mut().unwrap().bounce = Some(bounce);
        } else if rng.random_bool(kind.hands) {
            let nets = (world.inputs.len() + world.gates.len()) as u32;
            let pattern =
                (0..rng.random_range(1..=2)).map(|_| (NetId(rng.random_range(0..nets)), rng.random())).collect();
            let least = if rng.random() { 0 } else { lengths.draw(rng) };
            let wait = range(rng, least);
            let timeout = rng.random_bool(0.5).then(|| fs(rng.random_range(1..=8) * lengths.draw(rng)));
            world.steps.last_mut().unwrap().place = Place::When { pattern, wait, timeout };
            by_time = false;
        }
        earliest += skew_before;
    }
}

/// Small inertial circuits that begin at rest, full of ties.
pub const PLAIN: Kind = Kind {
    gates: (2, 9),
    filters: Filters::Inertial,
    begin: Start::Rest,
    wires: 0.0,
    delays: Lengths::Ties,
    steps: (1, 6),
    clocks: false,
    limits: &[7, 40, 300, 2000],
    rings: false,
    hazards: false,
    hands: 0.02,
    anew: false,
};

/// Longer greatest delays, groups, and a draw for every firing; least delays stay, so every filter still fits.
fn widen(scenario: &mut Scenario, rng: &mut ChaCha8Rng, lengths: Lengths) {
    scenario.plan.vary = Vary::PerEvent;
    scenario.plan.draw = *Marginal::ALL.choose(rng).unwrap();
    let delays = Arc::make_mut(&mut scenario.delays);
    let mut groups: Vec<Group> = [
        Together::Tracking(Billionths::nearest(0.7)),
        Together::Scale {
            least: Billionths::nearest(0.5),
            greatest: Billionths::nearest(2.0),
            mismatch: Billionths::nearest(0.4),
        },
    ]
    .map(|how| Group { gates: Vec::new(), how })
    .into();
    for (gate, edges) in delays.gate.iter_mut().enumerate() {
        for edge in edges.iter_mut() {
            if rng.random_bool(0.2) {
                continue;
            }
            let typ = edge.min.fs() + lengths.draw(rng) - 1;
            *edge = DelayRange { min: edge.min, typ: fs(typ), max: fs(typ + lengths.draw(rng) - 1) };
        }
        delays.gate_one_draw[gate] = edges[0] == edges[1];
        if let Some(group) = groups.get_mut(rng.random_range(0..6)) {
            group.gates.push(GateId(gate as u32));
        }
    }
    for edges in &mut delays.wire {
        *edges = edges.map(|edge| DelayRange::between(edge.min, fs(edge.min.fs() + lengths.draw(rng) - 1)));
    }
    groups.retain(|group| !group.gates.is_empty());
    delays.groups = groups;
}

/// A few firings with delays of their own, not shorter than the least of their gate.
fn given(scenario: &Scenario, rng: &mut ChaCha8Rng, lengths: Lengths) -> Firings {
    let mut given = BTreeMap::new();
    for (gate, edges) in scenario.delays.gate.iter().enumerate() {
        for _ in 0..rng.random_range(0..4) {
            let most = *[6, 60].choose(rng).unwrap();
            let firing = rng.random_range(0..most);
            given.insert((GateId(gate as u32), firing), edges.map(|edge| fs(edge.min.fs() + lengths.draw(rng) - 1)));
        }
    }
    Firings::Given(given)
}

/// One random case.
pub struct Case {
    /// Kind and number, for messages.
    pub name: String,
    pub world: World,
    pub scenario: Scenario,
    /// The values of all nets at rest; zeros where it does not begin at rest.
    pub rest: Bits,
    pub instance: Instance,
}

/// The first `count` random cases of a kind, but for those that should begin at rest and cannot.
pub fn cases(count: u64, kind: Kind) -> impl Iterator<Item = Case> {
    (0..count).filter_map(move |number| {
        let mut rng = ChaCha8Rng::seed_from_u64(1);
        rng.set_stream(number);
        let world = world(&mut rng, kind);
        let mut scenario = world.scenario();
        if kind.anew {
            widen(&mut scenario, &mut rng, kind.delays);
        }
        let rest = match kind.begin {
            Start::Rest => stable_states(&scenario.circuit, &scenario.stimulus.initial).choose(&mut rng)?.clone(),
            _ => Bits::zeros(scenario.circuit.net_count()),
        };
        let mut instance = Instance::of(&scenario, &Which::Sample(rng.random_range(0..1000)));
        if kind.anew && rng.random_bool(0.3) {
            instance.firings = Some(given(&scenario, &mut rng, kind.delays));
        }
        if let Some(Firings::Drawn(drawn)) = &mut instance.firings {
            drawn.gates.iter_mut().for_each(|gate| gate.moved = [0, 1].map(|_| rng.random_range(0..=1)));
        }
        Some(Case { name: format!("{kind:?} case {number}"), world, scenario, rest, instance })
    })
}
