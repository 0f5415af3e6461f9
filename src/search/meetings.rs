//! How nearly a gate did something else.
//!
//! What a gate is asked for is the value of its function over time, whatever its delay. When that value changes and changes
//! back after w, the gate passes the pulse if w is at least its threshold (its delay), else it swallows it: *threshold − w*
//! is how far the pulse is from passing, positive while it is swallowed. When two events meet at a gate in the order in which
//! they ask for nothing, while in the other order they would ask for a pulse, and come apart by t, then *threshold + t* is
//! how far that pulse is from passing: t to turn the order, the threshold to pass. Both are one measure that falls without a
//! jump while the lag between two paths moves from one order through runts to the other: on a latch whose inputs let go
//! nearly at once it is the lag between the paths that decides.
//!
//! This guides a search; it decides nothing.

use crate::circuit::{Circuit, GateId, NetId, NetSet, WireId};
use crate::delay::{Delays, Filter};
use crate::engine::{Closing, Observer, Opening};
use crate::logic::{State, Value};
use crate::scenario::Scenario;
use crate::time::Time;

/// One source of a gate.
#[derive(Clone, Copy, Debug)]
struct Ear {
    slot: u32,
    weight: u64,
    net: u32,
}

/// One gate that is listened to.
#[derive(Clone, Debug)]
struct Slot {
    gate: GateId,
    /// Sums of the weights of sources at 1 and at X.
    ones: u64,
    unknown: u64,
    /// What the function says: `None` while an X decides.
    asked: Option<bool>,
    /// When it last changed in the stretch that is recorded.
    turned: Option<u64>,
    /// The event before: when, the sum before it, the nets that changed.
    last: Option<(u64, u64, Vec<u32>)>,
    /// The event of this instant: the sum before, the nets that change with what each adds.
    now: Vec<(u32, u64)>,
    before: u64,
    clear: bool,
    /// How far each pulse is from passing, in fs.
    found: Vec<i64>,
}

/// Which meeting is followed: of the pulses asked of a gate that one which in the first case was the nearest to pass, or to
/// be swallowed, counted from the one that passes most easily.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub(super) struct Meeting {
    /// How far it is from changing, in fs, in the first case.
    pub away: i64,
    slot: u32,
    rank: u32,
    passes: bool,
}

impl Meeting {
    /// Two cases may show the same meeting.
    pub fn same(&self, other: &Meeting) -> bool {
        (self.slot, self.passes) == (other.slot, other.passes)
    }
}

/// All meetings of one run at the gates of a cone.
#[derive(Clone, Debug)]
pub(super) struct Meetings {
    slots: Vec<Slot>,
    by_net: Vec<Vec<Ear>>,
    by_wire: Vec<Vec<Ear>>,
    circuit: std::sync::Arc<Circuit>,
    filters: Vec<Filter>,
    delays: Delays,
    /// Values of nets, then of the ends of wires.
    values: Vec<Value>,
    /// Only in the window of this moment.
    only: Option<u32>,
    recording: bool,
    dirty: Vec<u32>,
}

impl Meetings {
    pub fn new(scenario: &Scenario, cone: &NetSet, only: Option<u32>) -> Meetings {
        let circuit = &scenario.circuit;
        let mut slots = Vec::new();
        let mut by_net = vec![Vec::new(); circuit.net_count()];
        let mut by_wire = vec![Vec::new(); circuit.wire_count()];
        let mut slot_of = vec![None; circuit.gate_count()];
        for gate in circuit.gates().filter(|gate| cone.contains(circuit.net_of(*gate))) {
            slot_of[gate.index()] = Some(slots.len() as u32);
            slots.push(Slot {
                gate,
                ones: 0,
                unknown: 0,
                asked: None,
                turned: None,
                last: None,
                now: Vec::new(),
                before: 0,
                clear: true,
                found: Vec::new(),
            });
        }
        for net in circuit.nets() {
            for reader in circuit.readers(net) {
                let Some(slot) = slot_of[reader.gate.index()] else { continue };
                let ear = Ear { slot, weight: reader.weight, net: net.0 };
                match reader.wire {
                    Some(wire) => by_wire[wire.index()].push(ear),
                    None => by_net[net.index()].push(ear),
                }
            }
        }
        let (circuit, filters) = (circuit.clone(), scenario.delays.filter.clone());
        let values = vec![Value::Zero; by_net.len() + by_wire.len()];
        let (delays, dirty) = (Delays::default(), Vec::new());
        Meetings { slots, by_net, by_wire, circuit, filters, delays, values, only, recording: false, dirty }
    }

    /// The next run has these delays.
    pub fn with(&mut self, delays: &Delays) {
        self.delays.clone_from(delays);
    }

    /// A pulse of `level` passes from this width on, in fs.
    fn threshold(&self, gate: GateId, level: bool) -> i64 {
        let [fall, rise] = self.delays.gate[gate.index()].map(|delay| delay.fs() as i64);
        let (lead, trail) = if level { (rise, fall) } else { (fall, rise) };
        match self.filters[gate.index()] {
            Filter::Transport => (lead - trail).max(0),
            Filter::Reject(limit) => limit.fs() as i64,
            _ => lead,
        }
    }

    fn hear(&mut self, ear: Ear, old: Value, new: Value) {
        let slot = &mut self.slots[ear.slot as usize];
        if slot.now.is_empty() {
            slot.before = slot.ones;
            slot.clear = slot.unknown == 0;
            self.dirty.push(ear.slot);
        }
        let ones = slot.ones;
        match old {
            Value::One => slot.ones = slot.ones.wrapping_sub(ear.weight),
            Value::X => slot.unknown = slot.unknown.wrapping_sub(ear.weight),
            Value::Zero => {}
        }
        match new {
            Value::One => slot.ones = slot.ones.wrapping_add(ear.weight),
            Value::X => slot.unknown = slot.unknown.wrapping_add(ear.weight),
            Value::Zero => {}
        }
        slot.clear &= slot.unknown == 0;
        slot.now.push((ear.net, slot.ones.wrapping_sub(ones)));
    }

    fn meet(&mut self, at: u64, slot: u32) {
        let gate = self.slots[slot as usize].gate;
        let circuit = self.circuit.clone();
        let compiled = circuit.compiled(gate);
        let thresholds = [false, true].map(|level| self.threshold(gate, level));
        let recording = self.recording;
        let slot = &mut self.slots[slot as usize];
        let now = std::mem::take(&mut slot.now);
        let asked = (slot.unknown == 0).then(|| compiled.value(slot.ones));
        if recording
            && slot.clear
            && let (Some(was), Some(is)) = (slot.asked, asked)
        {
            if was != is {
                if let Some(turned) = slot.turned.replace(at) {
                    slot.found.push(thresholds[usize::from(was)] - (at - turned) as i64);
                }
            } else {
                // what this event would have asked for alone, before the one before it
                if let Some((then, before, nets)) = &slot.last
                    && compiled.value(*before) == is
                    && !now.iter().any(|(net, _)| nets.contains(net))
                {
                    let alone = now.iter().fold(*before, |sum, (_, adds)| sum.wrapping_add(*adds));
                    let value = compiled.value(alone);
                    if value != is {
                        slot.found.push(thresholds[usize::from(value)] + (at - then) as i64);
                    }
                }
                // and each of several at one instant alone
                if now.len() > 1 {
                    for (net, adds) in &now {
                        let value = compiled.value(slot.before.wrapping_add(*adds));
                        // a net that changed twice in the instant has no change of its own
                        if now.iter().filter(|(other, _)| other == net).count() == 1 && value != is {
                            slot.found.push(thresholds[usize::from(value)]);
                        }
                    }
                }
            }
            slot.last = Some((at, slot.before, now.iter().map(|(net, _)| *net).collect()));
        } else {
            (slot.last, slot.turned) = (None, None);
        }
        slot.asked = asked;
    }

    /// The meetings of the run, for each gate the nearest to passing and the nearest to being swallowed.
    pub fn nearest(&self) -> Vec<Meeting> {
        let mut all = Vec::new();
        for (number, slot) in self.slots.iter().enumerate() {
            let slot_number = number as u32;
            let pass = slot.found.iter().filter(|away| **away <= 0).count();
            let mut found = slot.found.clone();
            found.sort_unstable();
            if let Some(away) = found.get(pass) {
                all.push(Meeting { away: *away, slot: slot_number, rank: pass as u32, passes: false });
            }
            if let Some(rank) = pass.checked_sub(1) {
                let away = -found[rank];
                all.push(Meeting { away, slot: slot_number, rank: rank as u32, passes: true });
            }
        }
        all.sort_unstable();
        all
    }

    /// How far this meeting is from changing in this run, in fs; below 0 once it has. `None` if there is none such.
    pub fn away(&mut self, meeting: &Meeting) -> Option<i64> {
        let found = &mut self.slots[meeting.slot as usize].found;
        let rank = meeting.rank as usize;
        if rank >= found.len() {
            return None;
        }
        let (_, away, _) = found.select_nth_unstable(rank);
        Some(if meeting.passes { -*away } else { *away })
    }
}

impl Observer for Meetings {
    type Tag = ();

    fn start(&mut self, state: &State) {
        for slot in &mut self.slots {
            (slot.ones, slot.unknown, slot.turned, slot.last) = (0, 0, None, None);
            slot.found.clear();
            slot.now.clear();
        }
        self.dirty.clear();
        self.recording = self.only.is_none();
        for (net, value) in self.values[..self.by_net.len()].iter_mut().enumerate() {
            *value = state.get(net);
        }
        for (wire, (net, _)) in self.circuit.wires().iter().enumerate() {
            self.values[self.by_net.len() + wire] = state.get(net.index());
        }
        for ears in self.by_net.iter().chain(&self.by_wire) {
            for ear in ears {
                add(&mut self.slots[ear.slot as usize], ear.weight, state.get(ear.net as usize));
            }
        }
        for slot in &mut self.slots {
            let compiled = self.circuit.compiled(slot.gate);
            slot.asked = (slot.unknown == 0).then(|| compiled.value(slot.ones));
        }
    }

    fn open(&mut self, opening: &Opening<'_>) {
        let Some(only) = self.only else { return };
        self.recording = opening.moments.contains(&only);
        if self.recording {
            for slot in &mut self.slots {
                (slot.turned, slot.last) = (None, None);
            }
        }
    }

    fn change(&mut self, _at: Time, net: NetId, new: Value, _cause: ()) {
        let old = std::mem::replace(&mut self.values[net.index()], new);
        for i in 0..self.by_net[net.index()].len() {
            self.hear(self.by_net[net.index()][i], old, new);
        }
    }

    fn arrival(&mut self, _at: Time, wire: WireId, new: Value, _cause: ()) {
        let end = self.by_net.len() + wire.index();
        let old = std::mem::replace(&mut self.values[end], new);
        for i in 0..self.by_wire[wire.index()].len() {
            self.hear(self.by_wire[wire.index()][i], old, new);
        }
    }

    fn batch(&mut self, at: Time) {
        while let Some(slot) = self.dirty.pop() {
            self.meet(at.fs(), slot);
        }
    }

    fn close(&mut self, _closing: &Closing<'_>) {
        self.recording = self.only.is_none();
    }
}

fn add(slot: &mut Slot, weight: u64, value: Value) {
    match value {
        Value::One => slot.ones += weight,
        Value::X => slot.unknown += weight,
        Value::Zero => {}
    }
}
