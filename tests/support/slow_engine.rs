//! A slow engine without tricks, for comparison: everything pending lies in one ordered set, every question is answered
//! by looking through it, and the rules are written in the order in which the semantics states them.

use std::collections::{BTreeMap, BTreeSet};

use stillgate::circuit::{GateId, NetId};
use stillgate::delay::{Filter, Marginal};
use stillgate::engine::{End, Hit};
use stillgate::instance::{Firings, Instance};
use stillgate::logic::{Bits, Value};
use stillgate::scenario::{Begin, MomentKind, Place, Scenario};
use stillgate::time::{Span, Time};

use super::recorder::{Record, RecordedOpening, RecordedWindow, Swallow};
use super::slow_recurrence::{Block, Recurred};

/// Something that will happen at a node: gate number, or number of gates plus wire number.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub struct Event {
    pub at: u64,
    pub node: usize,
    pub value: Value,
    pub since: u64,
    /// The batch that scheduled it.
    pub batch: usize,
}

/// What led to what, by batches: 0 is the first, at power-up that in which every gate is evaluated.
#[derive(Debug, Default)]
pub struct Links {
    /// For each batch the nets that changed and the wires at whose ends something arrived.
    pub heard: Vec<(Vec<NetId>, Vec<usize>)>,
    /// Events that came, in the order of batches: the event, and the batch in which it came.
    pub came: Vec<(Event, usize)>,
    /// Events that were cancelled, and the batch that did it.
    pub lost: Vec<(Event, usize)>,
}

struct Open {
    opening: RecordedOpening,
    start: u64,
    settle_from: u64,
    last: Option<u64>,
    at_rest: bool,
    transitions: u64,
}

struct Slow<'a> {
    scenario: &'a Scenario,
    instance: &'a Instance,
    now: u64,
    nets: Vec<Value>,
    ends: Vec<Value>,
    pending: BTreeSet<Event>,
    /// For each gate the last change of its output that was computed, also if it vanished; `None`: none, or endlessly
    /// far back.
    computed: Vec<Option<i128>>,
    /// How many events each gate has scheduled.
    scheduled: Vec<u64>,
    /// Input changes of steps with skew or bounce that are still to come, in the order in which they were placed.
    coming: Vec<(u64, NetId, bool)>,
    /// Clock edges still to come.
    edges: BTreeSet<(u64, u32, NetId, bool)>,
    next_step: usize,
    /// The instant of the step before.
    placed: u64,
    /// When the last input of the steps before has changed.
    inputs_done: u64,
    /// When the pattern came that the next step waits for.
    came: Option<u64>,
    blocks: Vec<Block>,
    window: Option<Open>,
    record: Record,
    links: Links,
}

/// Runs one case. `rest` holds the values of all nets where the scenario begins at rest.
pub fn run(scenario: &Scenario, rest: Option<&Bits>, instance: &Instance) -> Record {
    run_with_links(scenario, rest, instance).0
}

/// As [`run`], with what led to what.
pub fn run_with_links(scenario: &Scenario, rest: Option<&Bits>, instance: &Instance) -> (Record, Links) {
    let circuit = &scenario.circuit;
    let nets: Vec<Value> = circuit
        .nets()
        .map(|net| match (circuit.driver(net), &scenario.begin) {
            (_, Begin::AtRest { .. }) => Value::from(rest.expect("a state of rest").get(net.index())),
            (None, _) => Value::from(scenario.stimulus.initial[net.index()]),
            (Some(gate), Begin::Random) => Value::from(instance.start.get(gate.index())),
            (Some(_), Begin::Unknown) => Value::X,
        })
        .collect();
    let ends = circuit.wires().iter().map(|(net, _)| nets[net.index()]).collect();
    let mut edges = BTreeSet::new();
    for (moment, kind) in scenario.stimulus.moments.iter().map(|m| m.kind).enumerate() {
        if let MomentKind::Edge { clock, edge } = kind {
            let net = scenario.stimulus.clocks[clock as usize].net;
            let initial = scenario.stimulus.initial[net.index()];
            edges.insert((edge_instant(instance, clock, edge, initial), moment as u32, net, initial ^ (edge % 2 == 0)));
        }
    }
    let blocks = (0..circuit.block_count() as u32).map(|block| Block::of(circuit, block)).collect();
    let record = Record { start: nets.clone(), ..Record::default() };
    let mut slow = Slow {
        scenario,
        instance,
        now: 0,
        nets,
        ends,
        pending: BTreeSet::new(),
        computed: vec![None; circuit.gate_count()],
        scheduled: vec![0; circuit.gate_count()],
        coming: Vec::new(),
        edges,
        next_step: 0,
        placed: 0,
        inputs_done: 0,
        came: None,
        blocks,
        window: None,
        record,
        links: Links::default(),
    };
    if !matches!(scenario.begin, Begin::AtRest { .. }) {
        let opening = RecordedOpening { moments: vec![0], state: slow.nets.clone(), ..RecordedOpening::default() };
        slow.window = Some(Open { opening, start: 0, settle_from: 0, last: None, at_rest: true, transitions: 0 });
        for gate in circuit.gates() {
            slow.evaluate(gate);
        }
        slow.links.heard.push((Vec::new(), Vec::new()));
    }
    slow.look_for_pattern();
    while slow.batch() {}
    (slow.record, slow.links)
}

/// Edge `edge` of a clock: first, first + high (or low), first + period, …, moved by its jitter, not before 0.
fn edge_instant(instance: &Instance, clock: u32, edge: u32, initial: bool) -> u64 {
    let case = &instance.clocks[clock as usize];
    let mut at = case.first.fs() as i64 + i64::from(edge / 2) * case.period.fs() as i64;
    if edge % 2 == 1 {
        at += if initial { case.period.fs() - case.high.fs() } else { case.high.fs() } as i64;
    }
    (at + case.jitter.get(edge as usize).copied().unwrap_or(0)).max(0) as u64
}

impl Slow<'_> {
    /// The instant of the next listed step, if that is known by now.
    fn step_instant(&self) -> Option<u64> {
        let step = self.scenario.stimulus.steps.get(self.next_step)?;
        let wait = self.instance.places[self.next_step].fs();
        match step.place {
            Place::At(_) => Some(wait),
            Place::After(_) => Some(self.placed + wait),
            Place::Rest(_) => (!self.busy() && self.edges.is_empty()).then_some(self.now + wait),
            Place::When { .. } => self.came.map(|came| came + wait),
        }
    }

    /// Looks whether the next step waits for a pattern that shows now.
    fn look_for_pattern(&mut self) {
        let Some(step) = self.scenario.stimulus.steps.get(self.next_step) else { return };
        if let Place::When { pattern, .. } = &step.place
            && self.now >= self.inputs_done
            && pattern.iter().all(|(net, bit)| self.nets[net.index()] == Value::from(*bit))
        {
            self.came = self.came.or(Some(self.now));
        }
    }

    /// The step that waits for a pattern which has not come, and when it gives up.
    fn waiting(&self) -> Option<(usize, Option<u64>)> {
        match self.scenario.stimulus.steps.get(self.next_step)?.place {
            Place::When { timeout, .. } if self.came.is_none() => {
                Some((self.next_step, timeout.map(|timeout| self.placed + timeout.fs())))
            }
            _ => None,
        }
    }

    /// The run ends without the pattern that the next step waits for.
    fn give_up(&mut self, at: u64, end: End) -> bool {
        self.close(at, end);
        self.record.never_came = self.waiting().map(|(step, _)| self.moment(step));
        false
    }

    /// Is anything pending, input changes to come included?
    fn busy(&self) -> bool {
        !self.pending.is_empty() || !self.coming.is_empty()
    }

    /// Will a clock edge or a step come whose instant does not depend on rest?
    fn timed_to_come(&self) -> bool {
        let next = self.scenario.stimulus.steps.get(self.next_step);
        !self.edges.is_empty()
            || self.came.is_some()
            || self.waiting().is_some_and(|(_, timeout)| timeout.is_some())
            || next.is_some_and(|step| matches!(step.place, Place::At(_) | Place::After(_)))
    }

    /// Have all blocks with events pending recurred? Then the first of them.
    fn oscillation(&self) -> Option<&Recurred> {
        let at_work = || self.blocks.iter().filter(|block| self.pending.iter().any(|event| block.holds(event.node)));
        if !self.coming.is_empty() || at_work().any(|block| block.recurred.is_none()) {
            return None;
        }
        at_work().filter_map(|block| block.recurred.as_ref()).min_by_key(|found| found.at)
    }

    fn end_of(found: &Recurred) -> End {
        let range = found.range.map(|(least, most)| (Span::from_fs(least), Span::from_fs(most)));
        End::Oscillating { period: Span::from_fs(found.period), range }
    }

    /// The nets of what is pending.
    fn pending_nets(&self) -> Vec<NetId> {
        let circuit = &self.scenario.circuit;
        let of = |event: &Event| match event.node.checked_sub(circuit.gate_count()) {
            None => circuit.net_of(GateId(event.node as u32)),
            Some(wire) => circuit.net_of(circuit.wires()[wire].1),
        };
        self.pending.iter().map(of).chain(self.coming.iter().map(|change| change.1)).collect()
    }

    fn close(&mut self, at: u64, end: End) {
        self.record.end = at;
        let Some(open) = self.window.take() else { return };
        let moving = match end {
            End::Oscillating { .. } => self.oscillation().map_or(Vec::new(), |found| found.moving.clone()),
            _ => Vec::new(),
        };
        self.record.windows.push(RecordedWindow {
            moment: open.opening.moments[0],
            opening: open.opening,
            start: open.start,
            settle_from: open.settle_from,
            stop: at,
            began_at_rest: open.at_rest,
            end,
            settling: (end == End::Settled).then(|| open.last.unwrap_or(0).saturating_sub(open.settle_from)),
            transitions: open.transitions,
            state: self.nets.clone(),
            pending: self.pending_nets(),
            moving,
        });
    }

    /// One batch: all that happens at the next instant. False at the end of the run.
    fn batch(&mut self) -> bool {
        let event = self.pending.first().map(|event| event.at);
        let change = self.coming.iter().map(|change| change.0).min();
        let edge = self.edges.first().map(|edge| edge.0);
        let step = self.step_instant();
        let next = [event, change, edge, step].into_iter().flatten().min();
        if let Some((_, Some(timeout))) = self.waiting() {
            let limit = self.scenario.limits.time.zip(self.window.as_ref()).filter(|_| self.busy());
            let limit = limit.map(|(limit, open)| open.start + limit.fs());
            // what happens at the very instant of the timeout is in time
            if next.is_none_or(|at| at > timeout) && limit.is_none_or(|at| at >= timeout) {
                let end = match self.busy() {
                    false => End::Settled,
                    true => self.oscillation().map_or(End::Cut, Slow::end_of),
                };
                return self.give_up(timeout, end);
            }
        }
        let Some(at) = next else { return self.give_up(self.now, End::Settled) };
        if let (Some(limit), Some(open)) = (self.scenario.limits.time, &self.window)
            && self.busy()
            && at > open.start + limit.fs()
            && open.start + limit.fs() < Time::END.fs()
        {
            let end = open.start + limit.fs();
            self.close(end, End::Unsettled(Hit::Time));
            return false;
        }
        if at >= Time::END.fs() {
            let end = if self.busy() { End::Unsettled(Hit::Longest) } else { End::Settled };
            self.close(self.now, end);
            return false;
        }
        if step == Some(at) || edge == Some(at) {
            self.open_window(at);
        }
        self.now = at;

        // apply everything of this instant
        let mut set: Vec<(NetId, bool)> = Vec::new();
        self.coming.retain(|change| {
            let due = change.0 == at;
            if due {
                set.push((change.1, change.2));
            }
            !due
        });
        while self.edges.first().is_some_and(|edge| edge.0 == at) {
            set.extend(self.edges.pop_first().map(|edge| (edge.2, edge.3)));
        }
        let before = (self.nets.clone(), self.ends.clone());
        for (net, bit) in set {
            self.nets[net.index()] = Value::from(bit);
        }
        let gates = self.scenario.circuit.gate_count();
        while self.pending.first().is_some_and(|event| event.at == at) {
            let event = self.pending.pop_first().expect("just seen");
            self.links.came.push((event, self.links.heard.len()));
            if event.node < gates {
                self.nets[self.scenario.circuit.net_of(GateId(event.node as u32)).index()] = event.value;
            } else {
                self.ends[event.node - gates] = event.value;
            }
        }
        self.react(&before.0, &before.1);
        self.look_for_pattern();
        if self.busy() {
            if let (Some(end), false) = (self.oscillation().map(Slow::end_of), self.timed_to_come()) {
                return self.give_up(at, end);
            }
            if self.window.as_ref().is_some_and(|open| open.transitions >= self.scenario.limits.transitions) {
                self.close(at, End::Unsettled(Hit::Transitions));
                return false;
            }
        }
        true
    }

    /// Ends the window before and begins one for the steps and clock edges of this instant.
    fn open_window(&mut self, at: u64) {
        let at_rest = !self.busy();
        let end = if at_rest { End::Settled } else { self.oscillation().map_or(End::Cut, Slow::end_of) };
        self.close(at, end);
        let mut opening =
            RecordedOpening { pending: self.pending_nets(), state: self.nets.clone(), ..RecordedOpening::default() };
        let mut settle_from = at;
        let mut last: BTreeMap<NetId, bool> = BTreeMap::new();
        let mut bouncing: BTreeSet<NetId> = BTreeSet::new();
        // a step by rest is a batch of its own; steps right after it, without a wait, belong to it
        while self.step_instant() == Some(at) && (opening.moments.is_empty() || !self.by_rest()) {
            opening.moments.push(self.moment(self.next_step));
            let skews = self.instance.skews.get(self.next_step).filter(|skews| !skews.is_empty());
            let least = skews.and_then(|skews| skews.iter().min()).map_or(0, |skew| skew.fs());
            for (entry, (net, bit)) in self.scenario.stimulus.steps[self.next_step].set.iter().enumerate() {
                let when = at + skews.map_or(0, |skews| skews[entry].fs()) - least;
                let before = self.coming.iter().rfind(|change| change.1 == *net).map(|change| Value::from(change.2));
                last.insert(*net, *bit);
                // an input that is set to what it has does not change, but its contact bounces all the same
                let mut before = before.unwrap_or(self.nets[net.index()]);
                let mut moves = BTreeMap::from([(when, *bit)]);
                for (n, toggle) in self.instance.bounces[self.next_step].get(entry).into_iter().flatten().enumerate() {
                    moves.insert(when + toggle.fs(), *bit ^ (n % 2 == 0));
                }
                for (when, bit) in moves {
                    if before != Value::from(bit) {
                        settle_from = settle_from.max(when);
                        self.coming.push((when, *net, bit));
                        if self.scenario.stimulus.steps[self.next_step].bounce.is_some() {
                            bouncing.insert(*net);
                        }
                    }
                    before = Value::from(bit);
                }
            }
            self.placed = at;
            self.inputs_done = settle_from;
            self.came = None;
            self.next_step += 1;
        }
        for (_, moment, net, bit) in self.edges.iter().filter(|edge| edge.0 == at) {
            opening.moments.push(*moment);
            last.insert(*net, *bit);
        }
        let changes =
            |(net, bit): &(NetId, bool)| self.nets[net.index()] != Value::from(*bit) || bouncing.contains(net);
        opening.inputs = last.into_iter().filter(changes).map(|(net, _)| net).collect();
        self.window = Some(Open { opening, start: at, settle_from, last: None, at_rest, transitions: 0 });
    }

    fn moment(&self, step: usize) -> u32 {
        let kind = MomentKind::Step(step as u32);
        self.scenario.stimulus.moments.iter().position(|m| m.kind == kind).expect("a moment a step") as u32
    }

    fn by_rest(&self) -> bool {
        matches!(self.scenario.stimulus.steps[self.next_step].place, Place::Rest(_))
    }

    /// Tells what changed, lets wires and gates react to it, and looks for recurrence.
    fn react(&mut self, nets: &[Value], ends: &[Value]) {
        let (circuit, at) = (self.scenario.circuit.clone(), self.now);
        let open = self.window.as_mut().expect("nothing moves before the first window");
        let changed: Vec<NetId> = circuit.nets().filter(|net| self.nets[net.index()] != nets[net.index()]).collect();
        let arrived: Vec<usize> = (0..ends.len()).filter(|w| self.ends[*w] != ends[*w]).collect();
        for net in &changed {
            self.record.changes.push((at, *net, self.nets[net.index()]));
            open.transitions += 1;
            if !circuit.is_input(*net) {
                open.last = Some(at);
            }
        }
        if !arrived.is_empty() {
            open.last = Some(at);
        }
        self.record.events += (changed.len() + arrived.len()) as u64;

        let wires = circuit.wires();
        for (w, (net, _)) in wires.iter().enumerate() {
            if changed.contains(net) {
                let (node, delay) = (circuit.gate_count() + w, self.instance.delays.wire[w]);
                self.schedule_all(node, self.ends[w], self.nets[net.index()], delay);
            }
        }
        for gate in circuit.gates() {
            let near = |net: &NetId| changed.contains(net) && !wires.contains(&(*net, gate));
            if circuit.pins(gate).iter().any(near) || arrived.iter().any(|w| wires[*w].1 == gate) {
                self.evaluate(gate);
            }
        }

        self.links.heard.push((changed.clone(), arrived.clone()));
        let mut blocks = std::mem::take(&mut self.blocks);
        for block in &mut blocks {
            let age = |node: usize| self.age(node);
            let own = |node: usize| self.own(node);
            block.after_batch(at, &changed, &arrived, &self.nets, &self.ends, &self.pending, age, own);
        }
        self.blocks = blocks;
    }

    /// The function of a gate of its present inputs: known if every completion of the X's gives the same.
    fn function(&self, gate: GateId) -> Value {
        let circuit = &self.scenario.circuit;
        let pins = circuit.pins(gate);
        let seen = |net: &NetId| match circuit.wires().iter().position(|wire| *wire == (*net, gate)) {
            Some(wire) => self.ends[wire],
            None => self.nets[net.index()],
        };
        let unknown: BTreeSet<NetId> = pins.iter().copied().filter(|net| seen(net) == Value::X).collect();
        let outcomes: BTreeSet<bool> = (0..1u32 << unknown.len())
            .map(|completion| {
                let bit = |net: &NetId| match unknown.iter().position(|other| other == net) {
                    Some(at) => completion >> at & 1 == 1,
                    None => seen(net) == Value::One,
                };
                circuit.function(gate).value(&pins.iter().map(bit).collect::<Vec<bool>>())
            })
            .collect();
        if outcomes.len() == 1 { Value::from(outcomes.contains(&true)) } else { Value::X }
    }

    fn evaluate(&mut self, gate: GateId) {
        let f = self.function(gate);
        let v = self.nets[self.scenario.circuit.net_of(gate).index()];
        let node = gate.index();
        let asks = match self.scenario.delays.filter[node] {
            // where the function is the output's value, or is pending already, nothing is scheduled
            Filter::Inertial => f != v && !self.pending.iter().any(|event| event.node == node && event.value == f),
            // every change of the function
            _ => self.pending.iter().rfind(|event| event.node == node).map_or(v, |event| event.value) != f,
        };
        let delay = self.delay(node);
        self.scheduled[node] += u64::from(asks);
        match self.scenario.delays.filter[gate.index()] {
            Filter::Inertial => {
                let pending = self.pending.iter().find(|event| event.node == node).copied();
                if pending.is_some_and(|event| event.value == f) {
                    return;
                }
                if let Some(event) = pending {
                    self.cancel(event);
                }
                if f != v {
                    self.pending.insert(Event {
                        at: self.now + span(delay, f),
                        node,
                        value: f,
                        since: self.now,
                        batch: self.links.heard.len(),
                    });
                }
            }
            Filter::Transport => self.schedule_all(node, v, f, delay),
            Filter::Reject(limit) => {
                self.schedule_all(node, v, f, delay);
                // the newest event stands; what lies before it, not farther than the limit, made a pulse too short
                let mine = |pending: &BTreeSet<Event>| -> Vec<Event> {
                    pending.iter().filter(|event| event.node == node).copied().collect()
                };
                let events = mine(&self.pending);
                let Some((newest, before)) = events.split_last() else { return };
                if newest.since < self.now {
                    return;
                }
                for event in before.iter().filter(|event| newest.at - event.at <= limit.fs()) {
                    self.cancel(*event);
                }
                // without them it may change nothing any more
                let events = mine(&self.pending);
                if events.iter().rev().nth(1).map_or(v, |event| event.value) == newest.value {
                    self.pending.remove(newest);
                }
            }
            Filter::Involution(tau) => {
                let newest = self.pending.iter().rfind(|event| event.node == node).copied();
                if newest.map_or(v, |event| event.value) == f {
                    return;
                }
                let now = i128::from(self.now);
                let since = self.computed[node].map(|last| now - last);
                let at = involution(tau, delay, f == Value::One, since).map(|delta| match since {
                    // the previous change is over: at least 1
                    Some(0..) | None => now + delta.max(1),
                    Some(_) => now + delta,
                });
                let standing = newest.filter(|event| Some(i128::from(event.at)) == self.computed[node]);
                let at = match standing {
                    Some(last) if at.is_none_or(|at| at <= i128::from(last.at)) => {
                        self.cancel(last);
                        at
                    }
                    // where rounding to whole fs would have it go with one that is gone already it stands, in order
                    _ => {
                        let earliest = newest.map_or(self.now, |event| event.at) + 1;
                        let at = at.map_or(earliest, |at| at.max(i128::from(earliest)) as u64);
                        self.pending.insert(Event {
                            at,
                            node,
                            value: f,
                            since: self.now,
                            batch: self.links.heard.len(),
                        });
                        Some(i128::from(at))
                    }
                };
                self.computed[node] = at;
            }
        }
    }

    /// `[fall, rise]` of the next event that a gate schedules.
    fn delay(&self, gate: usize) -> [Span; 2] {
        let (plain, number) = (self.instance.delays.gate[gate], self.scheduled[gate]);
        match &self.instance.firings {
            None => plain,
            Some(Firings::Given(given)) => {
                given.iter().find(|(which, _)| **which == (GateId(gate as u32), number)).map_or(plain, |it| *it.1)
            }
            Some(Firings::Drawn(drawn)) => {
                let gate = &drawn.gates[gate];
                [0, 1].map(|edge| {
                    let random = split_mix(gate.key, 2 * number + if gate.one_draw { 0 } else { edge });
                    let range = gate.ranges[edge as usize];
                    let span = match gate.group {
                        Some((how, common)) => how.draw(drawn.draw, range, random, common),
                        None if drawn.draw == Marginal::Uniform => {
                            let (min, width) = (range.min.fs(), range.max.fs() - range.min.fs() + 1);
                            Span::from_fs(min + ((u128::from(random) * u128::from(width)) >> 64) as u64)
                        }
                        None => drawn.draw.quantile(range, random),
                    };
                    Span::from_fs((span.fs() as i64 + gate.moved[edge as usize]).clamp(1, (1 << 62) - 1) as u64)
                })
            }
        }
    }

    /// How many events a gate has scheduled that are not followed by equal delays alone.
    fn own(&self, gate: usize) -> u64 {
        let Some(scheduled) = self.scheduled.get(gate) else { return 0 };
        match &self.instance.firings {
            None => 0,
            Some(Firings::Drawn(drawn)) => {
                let differ = drawn.gates[gate].ranges.iter().any(|range| range.min < range.max);
                *scheduled * u64::from(differ)
            }
            Some(Firings::Given(given)) => {
                let numbers = given.keys().filter(|which| which.0.index() == gate).map(|which| which.1);
                numbers.max().map_or(0, |last| (*scheduled).min(last + 1))
            }
        }
    }

    /// How long ago an involution gate's last computed change was, while that still changes a delay.
    fn age(&self, node: usize) -> Option<i128> {
        let Some(Filter::Involution(tau)) = self.scenario.delays.filter.get(node) else { return None };
        let (age, delay) = (i128::from(self.now) - self.computed[node]?, self.delay(node));
        let full = |rise| involution(*tau, delay, rise, Some(age)) == involution(*tau, delay, rise, None);
        (!full(false) || !full(true)).then_some(age)
    }

    /// Transport: removes what is scheduled for the new time or later; what would change nothing is no event.
    fn schedule_all(&mut self, node: usize, present: Value, new: Value, delay: [Span; 2]) {
        let last = |pending: &BTreeSet<Event>| pending.iter().rfind(|event| event.node == node).copied();
        if last(&self.pending).map_or(present, |event| event.value) == new {
            return;
        }
        let at = self.now + span(delay, new);
        while let Some(event) = last(&self.pending).filter(|event| event.at >= at) {
            self.cancel(event);
        }
        if last(&self.pending).map_or(present, |event| event.value) != new {
            self.pending.insert(Event { at, node, value: new, since: self.now, batch: self.links.heard.len() });
        }
    }

    fn cancel(&mut self, event: Event) {
        self.pending.remove(&event);
        self.links.lost.push((event, self.links.heard.len()));
        let age = self.now - event.since;
        if event.node < self.scenario.circuit.gate_count() && age > 0 {
            let window = self.record.windows.len();
            self.record.swallowed.push(Swallow {
                window,
                at: self.now,
                gate: event.node,
                age,
                delay: event.at - event.since,
            });
        }
    }
}

/// Number `index`, from 0, of the generator SplitMix64 from a seed: its state has moved on `index + 1` times.
fn split_mix(seed: u64, index: u64) -> u64 {
    let moved = u128::from(index + 1) * 0x9E37_79B9_7F4A_7C15;
    let state = ((u128::from(seed) + moved) & u128::from(u64::MAX)) as u64;
    let z = (state ^ (state >> 30)).wrapping_mul(0xBF58_476D_1CE4_E5B9);
    let z = (z ^ (z >> 27)).wrapping_mul(0x94D0_49BB_1331_11EB);
    z ^ (z >> 31)
}

/// The formulas of the involution model, rounded; `None`: minus infinity.
fn involution(tau: Span, delay: [Span; 2], rise: bool, since: Option<i128>) -> Option<i128> {
    let [fall, up] = delay.map(|span| span.fs() as f64);
    let (this, other) = if rise { (up, fall) } else { (fall, up) };
    let Some(since) = since else { return Some(this as i128) };
    let inside = 1.0 - (-(since as f64 + other) / tau.fs() as f64).exp();
    (inside > 0.0).then(|| (tau.fs() as f64 * inside.ln() + this).round() as i128)
}

/// To 1 takes rise, to 0 takes fall, to X the shorter of both.
fn span(delay: [Span; 2], new: Value) -> u64 {
    match new {
        Value::Zero => delay[0].fs(),
        Value::One => delay[1].fs(),
        Value::X => delay[0].min(delay[1]).fs(),
    }
}
