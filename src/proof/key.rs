//! The discrete part of an explored state, as words: values, step, what is on its way, what a watch remembers.

use super::bounce;
use super::outside;
use super::passed;
use super::plant::{Plant, PlantPlace, Ticks};
use super::zone::{self, Code};

/// Where each part is in the words of a key.
#[derive(Clone, Copy, Debug)]
pub(super) struct Layout {
    /// Words of signal values.
    pub values: usize,
    /// Word of steps taken (low half) and origin (high half).
    step: usize,
    /// Word of the watch's state (low half) and flags.
    watch: usize,
    /// Word of the inputs that the last step has still to change, a bit an entry of its set; those that bounce, too.
    skew: usize,
    /// First word of the numbers of arrivals under way, a byte a wire.
    flights: usize,
    /// First word of the inputs that bounce, a word an entry of the last step's set: toggles left at most (low half), flag.
    bounce: usize,
    /// First word of the gates that cool, a bit a gate.
    cool: usize,
    /// First word of the clocks, where there are any: the window, then the number of edges of each that have come.
    clocks: Option<usize>,
    /// Words in all.
    pub len: usize,
}

/// Arrivals under way on one wire, at most.
pub(super) const FLIGHTS: u8 = 16;

const FIRED: u64 = 1 << 32;
const CAME: u64 = 1 << 33;
const HELD: u64 = 1 << 34;
/// In the word of an input that bounces: the time since its last toggle is kept.
const TOGGLED: u64 = 1 << 32;
/// In the byte of a wire: the time since its last arrival is kept.
const APART: u8 = 1 << 7;

impl Layout {
    pub fn of(plant: &Plant) -> Layout {
        let values = plant.signals().div_ceil(64).max(1);
        let flights = values + 3;
        let bounce = flights + plant.wires.len().div_ceil(8);
        let cool = bounce + plant.bouncing();
        let end = cool + plant.gates.len().div_ceil(64);
        let clocks = (plant.ends || !plant.clocks.is_empty()).then_some(end);
        Layout {
            values,
            step: values,
            watch: values + 1,
            skew: values + 2,
            flights,
            bounce,
            cool,
            clocks,
            len: end + clocks.map_or(0, |_| 1 + plant.clocks.len()),
        }
    }
}

/// A key that can be read.
#[derive(Clone, Copy, Debug)]
pub(super) struct Key<'a> {
    pub words: &'a [u64],
    pub layout: Layout,
}

/// Is bit `at` of some words set?
#[inline]
pub(super) fn bit(words: &[u64], at: usize) -> bool {
    words[at >> 6] >> (at & 63) & 1 == 1
}

/// Sets bit `at` of some words.
#[inline]
pub(super) fn put(words: &mut [u64], at: usize, value: bool) {
    let mask = 1 << (at & 63);
    words[at >> 6] = if value { words[at >> 6] | mask } else { words[at >> 6] & !mask };
}

impl<'a> Key<'a> {
    /// The values of all signals.
    #[inline]
    pub fn values(&self) -> &'a [u64] {
        &self.words[..self.layout.values]
    }

    /// Steps taken.
    #[inline]
    pub fn steps(&self) -> usize {
        self.words[self.layout.step] as u32 as usize
    }

    /// The number of the state at rest in which the present window began; `NOWHERE` if it did not begin at rest.
    #[inline]
    pub fn origin(&self) -> u32 {
        (self.words[self.layout.step] >> 32) as u32
    }

    /// Its words, but for the number of that state, which depends on the exploration.
    pub fn without_origin(&self) -> Box<[u64]> {
        let mut words: Box<[u64]> = self.words.into();
        words[self.layout.step] = self.steps() as u64;
        words
    }

    #[inline]
    pub fn watch(&self) -> u32 {
        self.words[self.layout.watch] as u32
    }

    /// Does it keep the time since something last fired?
    pub fn fired(&self) -> bool {
        self.words[self.layout.watch] & FIRED != 0
    }

    /// Has the pattern come that the next step waits for?
    #[inline]
    pub fn came(&self) -> bool {
        self.words[self.layout.watch] & CAME != 0
    }

    /// Did a batch end with it, so that whatever fires next comes later (but for a step in a batch of its own)?
    #[inline]
    pub fn held(&self) -> bool {
        self.words[self.layout.watch] & HELD != 0
    }

    #[inline]
    pub fn skew(&self) -> u64 {
        self.words[self.layout.skew]
    }

    /// How many toggles an input that bounces (an entry of the last step's set) may still make.
    pub fn left(&self, entry: usize) -> u32 {
        self.words[self.layout.bounce + entry] as u32
    }

    /// Does it keep the time since the last toggle of an input?
    pub fn toggled(&self, entry: usize) -> bool {
        self.words[self.layout.bounce + entry] & TOGGLED != 0
    }

    fn of_wire(&self, wire: usize) -> u8 {
        (self.words[self.layout.flights + wire / 8] >> (8 * (wire % 8))) as u8
    }

    #[inline]
    pub fn flights(&self, wire: usize) -> u8 {
        self.of_wire(wire) & !APART
    }

    /// Does it keep the time since the last arrival on a wire?
    pub fn apart(&self, wire: usize) -> bool {
        self.of_wire(wire) & APART != 0
    }

    #[inline]
    pub fn cools(&self, gate: usize) -> bool {
        bit(&self.words[self.layout.cool..], gate)
    }

    #[inline]
    pub fn any_cools(&self) -> bool {
        let end = self.layout.clocks.unwrap_or(self.layout.len);
        self.words[self.layout.cool..end].iter().any(|word| *word != 0)
    }

    /// The window: the number of the step that began it, from 1, or of the edge (see [`PlantClock`]), 0 before the first.
    /// Where several began it, the first of them and the number of all windows.
    #[inline]
    pub fn window(&self) -> u32 {
        self.layout.clocks.map_or(self.steps() as u32, |at| self.words[at] as u32)
    }

    /// Edges of a clock that have come.
    pub fn edges(&self, clock: usize) -> u32 {
        self.layout.clocks.map_or(0, |at| self.words[at + 1 + clock] as u32)
    }

    /// Have all clocks ended?
    #[inline]
    pub fn clocks_over(&self, plant: &Plant) -> bool {
        plant.clocks.iter().enumerate().all(|(c, clock)| self.edges(c) == clock.edges)
    }
}

/// Changes to the words of a key.
pub(super) struct KeyMut<'a> {
    pub words: &'a mut [u64],
    pub layout: Layout,
}

impl KeyMut<'_> {
    #[inline]
    pub fn set_step(&mut self, steps: usize, origin: u32) {
        self.words[self.layout.step] = steps as u64 | u64::from(origin) << 32;
    }

    #[inline]
    pub fn set_watch(&mut self, state: u32, fired: bool) {
        let word = &mut self.words[self.layout.watch];
        *word = *word & (CAME | HELD) | u64::from(state) | if fired { FIRED } else { 0 };
    }

    /// Sets whether the pattern of the next step has come, and whether a batch ended here.
    #[inline]
    pub fn set_pattern(&mut self, came: bool, held: bool) {
        let word = &mut self.words[self.layout.watch];
        *word = *word & !(CAME | HELD) | if came { CAME } else { 0 } | if held { HELD } else { 0 };
    }

    pub fn set_skew(&mut self, mask: u64) {
        self.words[self.layout.skew] = mask;
    }

    /// Sets how many toggles an input that bounces may still make, and whether the time since its last is kept.
    pub fn set_toggles(&mut self, entry: usize, left: u32, toggled: bool) {
        self.words[self.layout.bounce + entry] = u64::from(left) | if toggled { TOGGLED } else { 0 };
    }

    /// Sets the number of changes under way on a wire, at most [`FLIGHTS`], and whether the time since its last arrival is
    /// kept.
    pub fn set_flights(&mut self, wire: usize, flights: u8, apart: bool) {
        let (at, shift) = (self.layout.flights + wire / 8, 8 * (wire % 8));
        let byte = flights | if apart { APART } else { 0 };
        self.words[at] = self.words[at] & !(0xFF << shift) | u64::from(byte) << shift;
    }

    /// Sets the window, where there are clocks.
    pub fn set_window(&mut self, window: u32) {
        if let Some(at) = self.layout.clocks {
            self.words[at] = u64::from(window);
        }
    }

    /// Sets the number of edges of a clock that have come.
    pub fn set_edges(&mut self, clock: usize, edges: u32) {
        if let Some(at) = self.layout.clocks {
            self.words[at + 1 + clock] = u64::from(edges);
        }
    }

    #[inline]
    pub fn set_cools(&mut self, gate: usize, cools: bool) {
        put(&mut self.words[self.layout.cool..], gate, cools);
    }
}

/// A clock of a key.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Slot {
    /// How long a gate has been excited.
    Gate(u32),
    /// How long an arrival has been under way: the wire, and how many are before it.
    Flight(u32, u8),
    /// Time since the last step.
    Since,
    /// Time since the start.
    Start,
    /// Time since the last edge of a clock; since the start before the first.
    Edge(u32),
    /// Time since the edge before that.
    Cycle(u32),
    /// Time since the pattern came that the next step waits for.
    Came,
    /// Time since something last fired.
    Fired,
    /// Time since a batch that nothing can join any more.
    Held,
    /// Time since a gate was disabled that could be excited again at once.
    Cool(u32),
    /// Time since the last arrival on a wire on which the next could be due at once.
    Apart(u32),
    /// Time since the last toggle of an input that bounces (an entry of the last step's set), as long as it may be none.
    Toggled(u32),
    /// A clock of the watch.
    Watch(u8),
}

/// What may happen next.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Mover {
    /// A gate (by its number in the plant) takes its new value.
    Gate(u32),
    /// The first change under way on a wire arrives.
    Arrival(u32),
    /// Beside what fires: the change that sets out on this wire would arrive with or before so many of those before it.
    /// They are gone; and so is it if their number is odd.
    Overtaking(u32, u8),
    /// Beside a step: it comes in a batch of its own, at the instant of the batch that brought its pattern.
    Apart,
    /// The next step comes; of the inputs that it sets, those of this mask (a bit an entry) change at once. If it bounces:
    /// how its inputs begin, see [`Begins`](super::bounce::Begins).
    Step(u64),
    /// The next edge of a clock (by its number in the plant) comes.
    Edge(u32),
    /// An input that the last step sets (entry of its set) changes, later than the step.
    Late(u32),
    /// An input that the last step sets (entry of its set) toggles; is that its last toggle?
    Toggle(u32, bool),
}

impl Mover {
    /// Does it change an input later than its step?
    pub(super) fn is_late(&self) -> bool {
        matches!(self, Mover::Late(_) | Mover::Toggle(..))
    }

    /// Does it change inputs?
    pub(super) fn moves_inputs(&self) -> bool {
        self.is_late() || matches!(self, Mover::Step(_) | Mover::Edge(_))
    }
}

/// One mover of a key with its clock and range.
#[derive(Clone, Copy, Debug)]
pub(super) struct Agent {
    pub mover: Mover,
    /// Row of its clock.
    pub row: usize,
    pub min: i64,
    /// For a step: how many steps come at its instant, itself counted.
    pub steps: u8,
    /// The clocks of which an edge comes at its instant, a bit a clock.
    pub edges: u32,
}

impl Agent {
    /// Does it come from outside, and begin a window?
    #[inline]
    pub fn opens(&self) -> bool {
        self.steps > 0 || self.edges != 0
    }
}

/// What follows from a key alone.
#[derive(Clone, Debug, Default)]
pub(super) struct Info {
    /// The clocks, row 1 first.
    pub slots: Vec<Slot>,
    /// What may happen next.
    pub agents: Vec<Agent>,
    /// How far clocks may run.
    pub limits: Vec<(usize, Code)>,
    /// For each agent those that it may have to happen together with, a bit an agent; empty until asked for.
    pub near: Vec<u64>,
    /// The excited gates, a bit a gate.
    pub excited: Vec<u64>,
    /// How far the clock since the last step may run while the next one waits for its pattern, if there is an end.
    pub gives_up: Option<(usize, i64)>,
    /// Is nothing pending in the plant?
    pub rest: bool,
    /// Is nothing pending in what is asked about?
    pub core_rest: bool,
    /// Row of the first clock of the watch.
    pub watch_row: usize,
    /// For each row the least delay that its clock waits for (2L + 1), as far as it may count whether that is over and no
    /// more; else [`passed::EXACT`].
    pub least: Vec<Code>,
}

impl Info {
    /// Bytes that it takes.
    pub fn memory(&self) -> usize {
        use std::mem::size_of;
        size_of::<Info>()
            + self.slots.len() * size_of::<Slot>()
            + self.agents.len() * (size_of::<Agent>() + size_of::<u64>())
            + self.limits.len() * size_of::<(usize, Code)>()
            + self.least.len() * size_of::<Code>()
            + self.excited.len() * size_of::<u64>()
    }

    #[inline]
    pub fn row(&self, slot: Slot) -> usize {
        self.slots.iter().position(|it| *it == slot).map_or(0, |at| at + 1)
    }

    /// As [`Info::row`], looking first behind the row that was found before: most clocks stay in order.
    #[inline]
    pub fn row_after(&self, slot: Slot, before: usize) -> usize {
        match self.slots.get(before) {
            Some(it) if *it == slot => before + 1,
            _ => self.row(slot),
        }
    }

    /// Sets `least`, where how much older an event is no longer counts from `old` of its least delay on.
    pub fn waits(&mut self, plant: &Plant, key: Key<'_>, old: impl Fn(i64) -> i64) {
        self.least = vec![passed::EXACT; self.slots.len() + 1];
        for (slot, row) in self.slots.iter().zip(1..) {
            let least = match *slot {
                Slot::Gate(_) => self.agents.iter().find(|agent| agent.row == row).map(|agent| old(agent.min)),
                // overtaking asks for strictly more than some least delays
                Slot::Flight(wire, place) => Some(old(flight_delay(plant, key.values(), wire as usize, place).min) + 1),
                // it must also be strictly after the step before
                Slot::Since if key.skew() == 0 => match plant.steps.get(key.steps()).map(|step| step.place) {
                    Some(PlantPlace::After(ticks)) => Some(old(ticks.min).max(1)),
                    _ => None,
                },
                _ => None,
            };
            self.least[row] = least.map_or(passed::EXACT, zone::at_most);
        }
    }
}

/// Is gate `gate` excited for these signal values?
#[inline]
pub(super) fn excited(plant: &Plant, values: &[u64], gate: usize) -> bool {
    let it = &plant.gates[gate];
    let mut sum = 0;
    for &(signal, weight) in &it.reads {
        if bit(values, signal as usize) {
            sum += weight;
        }
    }
    it.function.value(sum) != bit(values, plant.inputs + gate)
}

/// What follows from a key alone. `watch_clocks` is the number of clocks that the watch has in this state.
pub(super) fn info(plant: &Plant, key: Key<'_>, excited: Vec<u64>, watch_clocks: u8) -> Info {
    let values = key.values();
    let mut info = Info { excited, ..Info::default() };
    for gate in 0..plant.gates.len() {
        if bit(&info.excited, gate) {
            let delay = plant.gates[gate].delay[usize::from(!bit(values, plant.inputs + gate))];
            info.slots.push(Slot::Gate(gate as u32));
            let mover = Mover::Gate(gate as u32);
            info.agents.push(Agent { mover, row: info.slots.len(), min: delay.min, steps: 0, edges: 0 });
            info.limits.push((info.slots.len(), zone::at_most(delay.max)));
        }
    }
    for w in 0..plant.wires.len() {
        for place in 0..key.flights(w) {
            let delay = flight_delay(plant, values, w, place);
            info.slots.push(Slot::Flight(w as u32, place));
            let row = info.slots.len();
            if place == 0 {
                info.agents.push(Agent { mover: Mover::Arrival(w as u32), row, min: delay.min, steps: 0, edges: 0 });
                info.limits.push((row, zone::at_most(delay.max)));
            } else {
                // those before it come first
                info.limits.push((row, zone::below(delay.max)));
            }
        }
    }
    info.rest = info.slots.is_empty() && key.skew() == 0;
    let taken = key.steps();
    info.core_rest = info.rest || !plant.core.iter().all(|core| *core) && core_rests(plant, key, &info);
    let place = plant.steps.get(taken).map(|step| step.place);
    let skewed = key.skew() != 0;
    let timed = matches!(place, Some(PlantPlace::At(_) | PlantPlace::After(_)));
    let gives_up = match place {
        Some(PlantPlace::When { timeout, .. }) if !key.came() => timeout,
        _ => None,
    };
    if skewed || timed || gives_up.is_some() {
        info.slots.push(Slot::Since);
    }
    let since = info.slots.len();
    info.gives_up = gives_up.map(|timeout| (since, timeout));
    if skewed {
        let last = &plant.steps[taken - 1];
        if let Some(bounce) = last.bounce {
            bounce::toggles(plant, key, bounce, since, &mut info);
        } else {
            info.limits.push((since, zone::at_most(last.skew)));
            for entry in 0..last.set.len() as u32 {
                if key.skew() >> entry & 1 == 1 {
                    info.agents.push(Agent { mover: Mover::Late(entry), row: since, min: 0, steps: 0, edges: 0 });
                }
            }
        }
    }
    // `at` steps are never behind one that waits for rest
    if plant.steps[taken..].iter().any(|step| matches!(step.place, PlantPlace::At(_))) {
        info.slots.push(Slot::Start);
    }
    if key.came() {
        info.slots.push(Slot::Came);
    }
    let timed = match place {
        Some(PlantPlace::After(ticks)) => Some((since, ticks)),
        Some(PlantPlace::At(ticks)) => Some((info.slots.len(), ticks)),
        Some(PlantPlace::When { wait, .. }) if key.came() => Some((info.slots.len(), wait)),
        _ => None,
    };
    if let Some((row, ticks)) = timed {
        // with inputs still to change it can come at the instant of the last of them only
        let touching = match place {
            Some(PlantPlace::After(ticks)) => skewed && ticks.min <= plant.steps[taken - 1].moves_for(),
            _ => skewed,
        };
        let touching = touching && bounce::may_end(plant, key);
        if !skewed {
            info.limits.push((row, zone::at_most(ticks.max)));
        }
        if !skewed || touching {
            for steps in plant.at_once(taken) {
                info.agents.push(Agent { mover: Mover::Step(u64::MAX), row, min: ticks.min, steps, edges: 0 });
            }
        }
    }
    if !plant.clocks.is_empty() {
        outside::clocks(plant, key, &mut info);
    }
    if key.fired() {
        info.slots.push(Slot::Fired);
    }
    if key.held() {
        info.slots.push(Slot::Held);
    }
    if key.any_cools() {
        info.slots.extend((0..plant.gates.len()).filter(|gate| key.cools(*gate)).map(|gate| Slot::Cool(gate as u32)));
    }
    info.slots.extend((0..plant.wires.len()).filter(|wire| key.apart(*wire)).map(|wire| Slot::Apart(wire as u32)));
    bounce::clocks(plant, key, &mut info);
    info.watch_row = info.slots.len() + 1;
    info.slots.extend((0..watch_clocks).map(Slot::Watch));
    info
}

/// Is nothing pending in what is asked about?
fn core_rests(plant: &Plant, key: Key<'_>, info: &Info) -> bool {
    let late = |(net, _): &(u32, bool)| plant.core[*net as usize];
    let last = plant.steps[..key.steps()].last();
    let moves = last.is_some_and(|step| {
        step.set.iter().enumerate().any(|(entry, set)| key.skew() >> entry.min(63) & 1 == 1 && late(set))
    });
    !moves
        && info.slots.iter().all(|slot| match *slot {
            Slot::Gate(gate) => !plant.core[plant.inputs + gate as usize],
            Slot::Flight(wire, _) => !plant.core[plant.nets.len() + wire as usize],
            _ => true,
        })
}

/// The delay range of a change under way on a wire with so many before it.
pub(super) fn flight_delay(plant: &Plant, values: &[u64], wire: usize, place: u8) -> Ticks {
    // changes take turns: the first brings what the end has not
    let end = bit(values, plant.nets.len() + wire);
    plant.wires[wire].delay[usize::from(end == (place % 2 == 1))]
}
