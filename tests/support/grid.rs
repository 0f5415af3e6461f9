//! Every run of a small network of inertial gates and wires whose delays lie on a grid of time, by visiting every state.
//!
//! Written from the words of the semantics: every single event takes a delay of its range, all events of one instant are
//! applied together, then what reads them is evaluated once. Which delay the event of a gate takes, or the place of a step,
//! is drawn when it is needed: each time that it could come by now, it comes or does not. It knows no zone.

use std::collections::{BTreeSet, HashMap};

use stillgate::circuit::Function;
use stillgate::delay::DelayRange;
use stillgate::scenario::Place;

use super::world::World;

/// A network and its steps; times in units of the grid.
#[derive(Clone, Debug)]
pub struct Grid {
    pub inputs: usize,
    pub gates: Vec<GridGate>,
    pub wires: Vec<GridWire>,
    pub steps: Vec<GridStep>,
    pub clock: Option<GridClock>,
}

/// One clock, each time between two of its edges drawn by itself: the same as one with figures of its own, if it has but two
/// edges or if only the first of them is in a range.
#[derive(Clone, Debug)]
pub struct GridClock {
    net: usize,
    first: (u64, u64),
    /// To the second edge of a period, and to the first of the next.
    between: [(u64, u64); 2],
    edges: u8,
}

#[derive(Clone, Debug)]
pub struct GridGate {
    /// The value for each combination of pins, pin 0 the lowest bit.
    table: u32,
    /// Signals: nets, then the ends of wires.
    pins: Vec<usize>,
    /// `[fall, rise]`
    delay: [(u64, u64); 2],
}

#[derive(Clone, Debug)]
pub struct GridWire {
    net: usize,
    delay: [(u64, u64); 2],
    /// May no change overtake another?
    in_order: bool,
}

#[derive(Clone, Debug)]
pub struct GridStep {
    place: GridPlace,
    set: Vec<(usize, bool)>,
    skew: u64,
    /// How each of its inputs may bounce; empty without bounce.
    bounces: Vec<GridBounce>,
}

/// One way in which an input may bounce.
#[derive(Clone, PartialEq, Eq, PartialOrd, Ord, Hash, Debug)]
struct GridBounce {
    /// Does it take its new value at the instant of the step?
    at_once: bool,
    /// When it toggles after that.
    toggles: Vec<u64>,
}

/// All ways to bounce, from numbers of pairs and spans: of 2k toggles the last comes at the end of the span, the others at
/// any grid points before it. An even number of them at one point cannot be seen, an odd number is one.
fn bounces(pairs: (u32, u32), lasting: (u64, u64)) -> Vec<GridBounce> {
    let mut all = BTreeSet::new();
    for pairs in pairs.0..=pairs.1 {
        if pairs == 0 {
            all.insert(GridBounce { at_once: true, toggles: Vec::new() });
            continue;
        }
        for span in lasting.0..=lasting.1 {
            let mut some: Vec<Vec<u64>> = vec![Vec::new()];
            for _ in 1..2 * pairs {
                let from = |it: &Vec<u64>| it.last().copied().unwrap_or(0);
                some = some
                    .iter()
                    .flat_map(|it| (from(it)..span).map(move |at| it.iter().copied().chain([at]).collect()))
                    .collect();
            }
            for offsets in some {
                let count = |at: u64| offsets.iter().filter(|it| **it == at).count();
                let toggles = (1..span).filter(|at| count(*at) % 2 == 1).chain([span]).collect();
                all.insert(GridBounce { at_once: count(0) % 2 == 0, toggles });
            }
        }
    }
    all.into_iter().collect()
}

#[derive(Clone, Debug)]
enum GridPlace {
    At(u64, u64),
    After(u64, u64),
    Rest(u64),
    When(Vec<(usize, bool)>, (u64, u64), Option<u64>),
}

/// No step comes by itself.
const NEVER: u64 = u64::MAX;
/// No state at rest.
pub const NO_ORIGIN: u32 = u32::MAX;

#[derive(Clone, PartialEq, Eq, Hash, Debug)]
struct State {
    values: u32,
    /// Pending events: node (gates, then wires), value; of a gate how long ago it was scheduled, of a wire how soon it
    /// comes. By node and time.
    due: Vec<(u8, u64, bool)>,
    /// Inputs still to change.
    late: Vec<(u8, u64)>,
    /// The next step, and the time that its place counts, if it does by now.
    next: u8,
    /// Edges that have come, and the time since the last, as long as there are more.
    edges: u8,
    tick: u64,
    /// The number of the step or edge that began the window, from 1, edges behind steps; where several did, that of the first and
    /// the number of all windows.
    window: u32,
    wait: u64,
    /// Has that time just begun, so that a step could come at once?
    fresh: bool,
    /// When the step that waits for a pattern gives up, from now.
    gives_up: u64,
    /// Time since the start, as long as that matters.
    now: u64,
    /// Time since the last input change of a step, where that is asked for.
    since: u64,
    origin: u32,
    /// For each gate: transitions up to 3, value before, judged.
    nets: [u8; 5],
    /// A step never came.
    over: bool,
}

const BEFORE: u8 = 4;
const JUDGED: u8 = 8;

/// What was seen.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Seen {
    /// Steps taken, state at rest in which the window began, state at rest.
    pub rests: BTreeSet<(u32, u32, u32)>,
    /// For each gate's net, in its own windows: steps taken, value before, transitions (3 stands for more).
    pub moves: Vec<BTreeSet<(u32, bool, u32)>>,
    /// Least and greatest settling time after so many steps.
    pub settles: HashMap<u32, (u64, u64)>,
    /// Is there a run without end?
    pub cycle: bool,
    /// Is there one in which no two events ever fall together?
    pub cycle_apart: bool,
    /// Steps (by number, from 0) that never came.
    pub never_came: BTreeSet<u32>,
    pub states: usize,
}

impl Grid {
    /// A world with so many grid points a femtosecond.
    pub fn of(world: &World, fine: u64, in_order: &[bool]) -> Grid {
        let inputs = world.inputs.len();
        let nets = inputs + world.gates.len();
        let range = |range: DelayRange| (range.min.fs() * fine, range.max.fs() * fine);
        let net = |name: &str| world.net(name).index();
        let wire_at = |from: &str, to: &str| world.wires.iter().position(|wire| wire.0 == from && wire.1 == to);
        let gate = |gate: &super::world::Gate| {
            let pins: Vec<usize> = gate
                .pins
                .iter()
                .map(|pin| wire_at(pin, &gate.name).map_or_else(|| net(pin), |wire| nets + wire))
                .collect();
            GridGate { table: table(&gate.function, pins.len()), pins, delay: gate.delay.map(range) }
        };
        let wires = world.wires.iter().zip(in_order).map(|((from, _, delay), in_order)| GridWire {
            net: net(from),
            delay: delay.map(range),
            in_order: *in_order,
        });
        let steps = world.steps.iter().zip(&world.set).map(|(step, set)| GridStep {
            place: match &step.place {
                Place::At(it) => GridPlace::At(range(*it).0, range(*it).1),
                Place::After(it) => GridPlace::After(range(*it).0, range(*it).1),
                Place::Rest(wait) => GridPlace::Rest(wait.fs() * fine),
                Place::When { pattern, wait, timeout } => GridPlace::When(
                    pattern.iter().map(|(net, bit)| (net.index(), *bit)).collect(),
                    range(*wait),
                    timeout.map(|timeout| timeout.fs() * fine),
                ),
            },
            set: set.iter().map(|(name, bit)| (net(name), *bit)).collect(),
            skew: step.skew.map_or(0, |skew| skew.max.fs() * fine),
            bounces: step.bounce.as_ref().map_or_else(Vec::new, |it| bounces(it.pulses, range(it.lasting))),
        });
        let clock = world.clocks.first().map(|(name, clock)| {
            let (period, high) = (range(clock.period), range(clock.high));
            let low = (period.0 - high.1, period.1 - high.0);
            let rises = !world.inputs[net(name)].1;
            GridClock {
                net: net(name),
                first: range(clock.first),
                between: if rises { [high, low] } else { [low, high] },
                edges: 2 * clock.count as u8,
            }
        });
        let gates = world.gates.iter().map(gate).collect();
        Grid { inputs, gates, wires: wires.collect(), steps: steps.collect(), clock }
    }

    fn nets(&self) -> usize {
        self.inputs + self.gates.len()
    }

    fn wants(&self, values: u32, gate: usize) -> bool {
        let gate = &self.gates[gate];
        let row = gate.pins.iter().enumerate().fold(0, |row, (i, signal)| row | (values >> signal & 1) << i);
        gate.table >> row & 1 == 1
    }

    /// For each gate the gates, inputs and wires that it depends on.
    fn cones(&self) -> Vec<Cone> {
        let of = |gate: usize| {
            let mut cone = Cone { inputs: 0, nodes: 1 << gate };
            let mut open = vec![gate];
            while let Some(gate) = open.pop() {
                for &signal in &self.gates[gate].pins {
                    let mut net = signal;
                    if signal >= self.nets() {
                        cone.nodes |= 1 << (self.gates.len() + signal - self.nets());
                        net = self.wires[signal - self.nets()].net;
                    }
                    if net < self.inputs {
                        cone.inputs |= 1 << net;
                    } else if cone.nodes >> (net - self.inputs) & 1 == 0 {
                        cone.nodes |= 1 << (net - self.inputs);
                        open.push(net - self.inputs);
                    }
                }
            }
            cone
        };
        (0..self.gates.len()).map(of).collect()
    }

    /// All runs from these values of the nets. `power_up`: the start is a window of its own. `times`: settling times,
    /// too. None: more states than this.
    pub fn runs(&self, starts: &[u32], power_up: bool, times: bool, most: usize) -> Option<Seen> {
        let mut runs = Runs {
            grid: self,
            cones: self.cones(),
            times,
            timed_from_start: (0..=self.steps.len())
                .map(|from| self.steps[from..].iter().any(|step| matches!(step.place, GridPlace::At(..))))
                .collect(),
            seen: Seen { moves: vec![BTreeSet::new(); self.gates.len()], ..Seen::default() },
        };
        let mut numbers: HashMap<State, u32> = HashMap::new();
        let mut states: Vec<State> = Vec::new();
        let mut leads: Vec<Vec<(u32, bool)>> = Vec::new();
        for start in starts {
            let mut values = *start;
            for (w, wire) in self.wires.iter().enumerate() {
                values |= (values >> wire.net & 1) << (self.nets() + w);
            }
            let mut nets = [0; 5];
            for (gate, net) in nets.iter_mut().enumerate().take(self.gates.len()) {
                *net = if values >> (self.inputs + gate) & 1 == 1 { BEFORE } else { 0 };
                *net |= if power_up { JUDGED } else { 0 };
            }
            let state = State {
                values,
                due: Vec::new(),
                late: Vec::new(),
                next: 0,
                edges: 0,
                tick: 0,
                window: 0,
                wait: NEVER,
                fresh: true,
                gives_up: NEVER,
                now: 0,
                since: 0,
                origin: if power_up { values } else { NO_ORIGIN },
                nets,
                over: false,
            };
            // every gate is evaluated once at time 0; steps at 0 come after that
            let mut begun = Vec::new();
            for state in runs.evaluated(&state, u32::MAX, 0) {
                begun.push(runs.looked(runs.placed(&state)));
            }
            for state in begun {
                runs.note(&state);
                numbers.entry(state.clone()).or_insert_with(|| {
                    states.push(state);
                    states.len() as u32 - 1
                });
            }
        }
        let mut at = 0;
        let first = states.len();
        while at < states.len() {
            if states.len() > most {
                return None;
            }
            let mut next = Vec::new();
            runs.next(&states[at].clone(), &mut next);
            let mut to = Vec::with_capacity(next.len());
            for (state, joint) in next {
                let number = *numbers.entry(state).or_insert_with_key(|state| {
                    runs.note(state);
                    states.push(state.clone());
                    states.len() as u32 - 1
                });
                to.push((number, joint));
            }
            to.sort_unstable();
            to.dedup();
            leads.push(to);
            at += 1;
        }
        let mut seen = runs.seen;
        seen.states = states.len();
        seen.cycle = has_cycle(&leads, (0..first as u32).collect(), true);
        seen.cycle_apart = seen.cycle && has_cycle(&leads, (0..first as u32).collect(), false);
        Some(seen)
    }
}

fn table(function: &Function, pins: usize) -> u32 {
    assert!(pins <= 5);
    let mut table = 0;
    for row in 0..1 << pins {
        let values: Vec<bool> = (0..pins).map(|pin| row >> pin & 1 == 1).collect();
        table |= u32::from(function.value(&values)) << row;
    }
    table
}

/// Is there a way back to a state, over single events only or all of them?
fn has_cycle(leads: &[Vec<(u32, bool)>], mut open: Vec<u32>, joint: bool) -> bool {
    let mut live = vec![false; leads.len()];
    let mut order = Vec::new();
    while let Some(at) = open.pop() {
        if !std::mem::replace(&mut live[at as usize], true) {
            order.push(at);
            open.extend(leads[at as usize].iter().filter(|(_, both)| joint || !both).map(|(to, _)| *to));
        }
    }
    // those that nothing leads to any more fall away
    let mut into = vec![0u32; leads.len()];
    let on = |at: u32| leads[at as usize].iter().filter(move |(_, both)| joint || !*both).map(|(to, _)| *to as usize);
    order.iter().for_each(|at| on(*at).for_each(|to| into[to] += 1));
    let mut bare: Vec<u32> = order.iter().copied().filter(|at| into[*at as usize] == 0).collect();
    let mut gone = 0;
    while let Some(at) = bare.pop() {
        gone += 1;
        for to in on(at) {
            into[to] -= 1;
            if into[to] == 0 {
                bare.push(to as u32);
            }
        }
    }
    gone < order.len()
}

#[derive(Clone, Copy, Debug)]
struct Cone {
    inputs: u32,
    nodes: u32,
}

struct Runs<'a> {
    grid: &'a Grid,
    cones: Vec<Cone>,
    times: bool,
    /// For each number of steps taken: does the time since the start still matter?
    timed_from_start: Vec<bool>,
    seen: Seen,
}

impl Runs<'_> {
    fn quiet(&self, state: &State, gate: usize) -> bool {
        let cone = self.cones[gate];
        state.due.iter().all(|event| cone.nodes >> event.0 & 1 == 0)
            && state.late.iter().all(|late| cone.inputs >> late.0 & 1 == 0)
    }

    /// Notes what a state after a batch shows.
    fn note(&mut self, state: &State) {
        let steps = state.window;
        if state.due.is_empty() && state.late.is_empty() {
            self.seen.rests.insert((steps, state.origin, state.values));
            if self.times {
                let entry = self.seen.settles.entry(steps).or_insert((state.since, state.since));
                *entry = (entry.0.min(state.since), entry.1.max(state.since));
            }
        }
        for gate in 0..self.grid.gates.len() {
            let net = state.nets[gate];
            if net & JUDGED != 0 && self.quiet(state, gate) {
                self.seen.moves[gate].insert((steps, net & BEFORE != 0, u32::from(net & 3)));
            }
        }
        if state.over {
            self.seen.never_came.insert(u32::from(state.next));
        }
    }

    /// The range of the time that the place of the next step counts, where it counts one by now.
    fn window(&self, state: &State) -> Option<(u64, u64)> {
        if state.wait == NEVER {
            return None;
        }
        match self.grid.steps.get(state.next as usize).map(|step| &step.place)? {
            GridPlace::At(lo, hi) | GridPlace::After(lo, hi) | GridPlace::When(_, (lo, hi), _) => Some((*lo, *hi)),
            GridPlace::Rest(wait) => Some((*wait, *wait)),
        }
    }

    /// The range of the time from the last edge of the clock to the next, if there is one.
    fn edge(&self, state: &State) -> Option<(u64, u64)> {
        let clock = self.grid.clock.as_ref().filter(|clock| state.edges < clock.edges)?;
        Some(match state.edges {
            0 => clock.first,
            edges => clock.between[usize::from(edges % 2 == 0)],
        })
    }

    /// The states after the next instant at which something can happen, each with whether several things fall together.
    fn next(&self, state: &State, into: &mut Vec<(State, bool)>) {
        let grid = self.grid;
        if state.over {
            return;
        }
        let mut state = state.clone();
        let gates = grid.gates.len();
        let range = |event: &(u8, u64, bool)| grid.gates[event.0 as usize].delay[usize::from(event.2)];
        let soon = |event: &(u8, u64, bool)| match (event.0 as usize) < gates {
            true => range(event).0.saturating_sub(event.1).max(1),
            false => event.1,
        };
        let pending = state.due.iter().map(soon).chain(state.late.iter().map(|late| late.1));
        let alone = state.fresh
            && matches!(self.grid.steps.get(state.next as usize).map(|step| &step.place), Some(GridPlace::When(..)));
        let step = self.window(&state).map(|(lo, _)| match state.fresh && state.wait >= lo {
            true => 0,
            false => lo.saturating_sub(state.wait).max(1),
        });
        let edge = self.edge(&state).map(|(lo, _)| lo.saturating_sub(state.tick).max(1));
        let mut soonest = pending.chain(step).chain(edge).chain([state.gives_up]).min().unwrap_or(NEVER);
        if soonest == NEVER {
            match grid.steps.get(state.next as usize).map(|step| &step.place) {
                Some(GridPlace::Rest(wait)) => {
                    state.wait = 0;
                    soonest = *wait;
                }
                Some(GridPlace::When(..)) => {
                    state.over = true;
                    into.push((state, false));
                    return;
                }
                _ => return,
            }
        }
        for event in &mut state.due {
            event.1 = if (event.0 as usize) < gates { event.1 + soonest } else { event.1 - soonest };
        }
        state.late.iter_mut().for_each(|late| late.1 -= soonest);
        let settled = state.due.is_empty() && state.late.is_empty();
        if self.times && !settled {
            state.since += soonest;
        }
        if state.wait != NEVER {
            state.wait += soonest;
        }
        if state.gives_up != NEVER {
            state.gives_up -= soonest;
        }
        if edge.is_some() {
            state.tick += soonest;
        }
        state.now = if self.timed_from_start[state.next as usize] { state.now + soonest } else { 0 };
        state.fresh = false;

        // what must come now, and what may
        let mut must: Vec<usize> = Vec::new();
        let mut may: Vec<usize> = Vec::new();
        // a batch that brought the pattern has ended: the step comes in one of its own
        let own = soonest == 0 && alone;
        for (at, event) in state.due.iter().enumerate().filter(|_| !own) {
            if event.0 as usize >= gates {
                if event.1 == 0 {
                    must.push(at);
                }
            } else if event.1 == range(event).1 {
                must.push(at);
            } else if event.1 >= range(event).0 {
                may.push(at);
            }
        }
        const STEP: usize = 99;
        if let Some((lo, hi)) = self.window(&state) {
            match state.wait {
                wait if wait == hi => must.push(STEP),
                wait if wait >= lo => may.push(STEP),
                _ => {}
            }
        }
        const EDGE: usize = 98;
        if let Some((lo, hi)) = self.edge(&state).filter(|_| !own) {
            match state.tick {
                tick if tick == hi => must.push(EDGE),
                tick if tick >= lo => may.push(EDGE),
                _ => {}
            }
        }
        let late = state.late.iter().any(|late| late.1 == 0);
        for choice in 0..1u32 << may.len() {
            let chosen = may.iter().enumerate().filter(|(i, _)| choice >> i & 1 == 1).map(|(_, at)| *at);
            let all: Vec<usize> = must.iter().copied().chain(chosen).collect();
            if all.is_empty() && !late && state.gives_up != 0 {
                into.push((state.clone(), false));
                continue;
            }
            let stepping = all.contains(&STEP);
            let edging = all.contains(&EDGE);
            let fires: Vec<usize> = all.into_iter().filter(|at| *at != STEP && *at != EDGE).collect();
            let fell = fires.len()
                + usize::from(stepping)
                + usize::from(edging)
                + state.late.iter().filter(|late| late.1 == 0).count();
            self.batch(&state, &fires, (stepping, edging), settled, &mut |next| into.push((next, fell > 1)));
        }
    }

    /// All that can come of these events firing, with or without the next step and the next edge.
    fn batch(
        &self,
        state: &State,
        fires: &[usize],
        (stepping, edging): (bool, bool),
        settled: bool,
        into: &mut dyn FnMut(State),
    ) {
        let grid = self.grid;
        let mut state = state.clone();
        let before = state.clone();
        // inputs first, the late ones before those of a step; then the batch
        let mut changed = 0u32;
        for (input, left) in std::mem::take(&mut state.late) {
            if left == 0 {
                state.values ^= 1 << input;
                changed ^= 1 << input;
                state.since = 0;
            } else {
                state.late.push((input, left));
            }
        }
        let mut ready = vec![(state, (0u32, 0u32, 0u32), stepping)];
        let mut taken = Vec::new();
        // which inputs the steps set, and to what in the end
        while let Some((mut state, (set, to, bounced), stepping)) = ready.pop() {
            if !stepping {
                taken.push((state, (before.values ^ to) & set | bounced));
                continue;
            }
            let step = &grid.steps[state.next as usize];
            state.next += 1;
            state.since = 0;
            let moving: Vec<(usize, bool)> =
                step.set.iter().copied().filter(|(net, value)| (state.values >> net & 1 == 1) != *value).collect();
            let set = step.set.iter().fold(set, |all, (net, _)| all | 1 << net);
            let to = step.set.iter().fold(to, |to, (net, value)| to & !(1 << net) | u32::from(*value) << net);
            if !step.bounces.is_empty() {
                let mut ways = vec![(state, bounced)];
                for (net, value) in &step.set {
                    ways = ways
                        .iter()
                        .flat_map(|(state, bounced)| {
                            step.bounces.iter().map(move |way| {
                                let mut state = state.clone();
                                let now = *value == way.at_once;
                                state.values = state.values & !(1 << net) | u32::from(now) << net;
                                state.late.extend(way.toggles.iter().map(|at| (*net as u8, *at)));
                                let moves = u32::from(!way.toggles.is_empty()) << net;
                                (state, bounced | moves)
                            })
                        })
                        .collect();
                }
                for (mut state, bounced) in ways {
                    state.late.sort_unstable();
                    ready.push((self.placed(&state), (set, to, bounced), false));
                }
                continue;
            }
            // offsets of those that move; some entry of the set is the first
            let stays = moving.len() < step.set.len();
            let mut offsets = vec![Vec::new()];
            for _ in &moving {
                offsets = offsets
                    .iter()
                    .flat_map(|some: &Vec<u64>| {
                        (0..=step.skew).map(move |offset| some.iter().copied().chain([offset]).collect())
                    })
                    .collect();
            }
            for some in offsets {
                if !moving.is_empty() && !stays && !some.contains(&0) {
                    continue;
                }
                let mut state = state.clone();
                for ((net, _), offset) in moving.iter().zip(&some) {
                    if *offset == 0 {
                        state.values ^= 1 << net;
                    } else {
                        state.late.push((*net as u8, *offset));
                    }
                }
                state.late.sort_unstable();
                let state = self.placed(&state);
                // the next one may come with it, or later
                if let Some((lo, hi)) = self.window(&state) {
                    if state.wait >= lo {
                        ready.push((state.clone(), (set, to, bounced), true));
                    }
                    if state.wait >= hi {
                        continue;
                    }
                }
                ready.push((state, (set, to, bounced), false));
            }
        }
        for (mut state, mut becomes) in taken {
            let mut changed = changed;
            let mut opened: Vec<u32> = (before.next..state.next).map(|step| u32::from(step) + 1).collect();
            if let Some(clock) = grid.clock.as_ref().filter(|_| edging) {
                opened.push(grid.steps.len() as u32 + 1 + u32::from(state.edges));
                state.values ^= 1 << clock.net;
                becomes |= 1 << clock.net;
                state.edges += 1;
                (state.tick, state.since) = (0, 0);
            }
            match (opened.as_slice(), &grid.clock) {
                ([.., last], None) => state.window = *last,
                ([one], _) => state.window = *one,
                ([first, ..], Some(clock)) => {
                    state.window = grid.steps.len() as u32 + 1 + u32::from(clock.edges) + first;
                }
                ([], _) => {}
            }
            if stepping || edging {
                changed = (before.values ^ state.values) & ((1 << grid.inputs) - 1);
                // a step that changes nothing begins no window
                if becomes != 0 {
                    state.origin = if settled { before.values } else { NO_ORIGIN };
                }
                for gate in 0..grid.gates.len() {
                    if becomes & self.cones[gate].inputs != 0 {
                        state.nets[gate] = if before.values >> (grid.inputs + gate) & 1 == 1 { BEFORE } else { 0 };
                        state.nets[gate] |= if self.quiet(&before, gate) { JUDGED } else { 0 };
                    }
                }
            }
            for at in fires {
                let event = state.due[*at];
                let signal = grid.inputs + event.0 as usize;
                assert_ne!(state.values >> signal & 1 == 1, event.2, "an event that changes nothing");
                changed |= 1 << signal;
            }
            state.values ^= changed & !((1 << grid.inputs) - 1);
            let mut at = 0;
            state.due.retain(|_| {
                at += 1;
                !fires.contains(&(at - 1))
            });
            for gate in 0..grid.gates.len() {
                let moves = changed >> (grid.inputs + gate) & 1 == 1;
                if moves && state.nets[gate] & JUDGED != 0 && state.nets[gate] & 3 < 3 {
                    state.nets[gate] += 1;
                }
            }
            for state in self.evaluated(&state, changed, changed) {
                into(self.looked(state));
            }
        }
    }

    /// All ways in which gates that read these signals, and wires from these nets, take their delays.
    fn evaluated(&self, state: &State, read: u32, left: u32) -> Vec<State> {
        let grid = self.grid;
        let mut all = vec![state.clone()];
        for (gate, it) in grid.gates.iter().enumerate() {
            if !it.pins.iter().any(|signal| read >> signal & 1 == 1) {
                continue;
            }
            let value = state.values >> (grid.inputs + gate) & 1 == 1;
            let wanted = grid.wants(state.values, gate);
            let pending = state.due.iter().find(|event| event.0 as usize == gate).map(|event| event.2);
            if wanted == pending.unwrap_or(value) {
                continue;
            }
            all.iter_mut().for_each(|state| state.due.retain(|event| event.0 as usize != gate));
            if wanted != value {
                all.iter_mut().for_each(|state| state.due.push((gate as u8, 0, wanted)));
            }
        }
        for (w, wire) in grid.wires.iter().enumerate() {
            if left >> wire.net & 1 == 0 {
                continue;
            }
            let node = (grid.gates.len() + w) as u8;
            let value = state.values >> wire.net & 1 == 1;
            let (lo, hi) = wire.delay[usize::from(value)];
            let end = state.values >> (grid.nets() + w) & 1 == 1;
            all = all
                .iter()
                .flat_map(|state| {
                    (lo..=hi).filter_map(move |delay| {
                        let mut state = state.clone();
                        let overtakes = |event: &(u8, u64, bool)| event.0 == node && event.1 >= delay;
                        if wire.in_order && state.due.iter().any(overtakes) {
                            return None;
                        }
                        state.due.retain(|event| !overtakes(event));
                        let mine = state.due.iter().filter(|event| event.0 == node);
                        let last = mine.max_by_key(|event| event.1).map_or(end, |event| event.2);
                        if last != value {
                            state.due.push((node, delay, value));
                        }
                        Some(state)
                    })
                })
                .collect();
        }
        all.iter_mut().for_each(|state| state.due.sort_unstable());
        all
    }

    /// The next step begins to count its time, once the one before it has come.
    fn placed(&self, state: &State) -> State {
        let mut state = state.clone();
        (state.wait, state.gives_up) = (NEVER, NEVER);
        match self.grid.steps.get(state.next as usize).map(|step| &step.place) {
            Some(GridPlace::At(..)) => state.wait = state.now,
            Some(GridPlace::After(..)) => state.wait = 0,
            Some(GridPlace::When(_, _, timeout)) => state.gives_up = timeout.unwrap_or(NEVER),
            _ => {}
        }
        state
    }

    /// After a batch: has the pattern come that the next step waits for?
    fn looked(&self, state: State) -> State {
        let place = self.grid.steps.get(state.next as usize).map(|step| &step.place);
        let Some(GridPlace::When(pattern, ..)) = place else { return state };
        if state.wait != NEVER {
            return state;
        }
        let there = pattern.iter().all(|(net, bit)| (state.values >> net & 1 == 1) == *bit);
        if !state.late.is_empty() || !there {
            // what happens at the very instant of the timeout may still bring it
            let over = state.over || state.gives_up == 0;
            return State { over, ..state };
        }
        State { wait: 0, fresh: true, gives_up: NEVER, ..state }
    }
}
