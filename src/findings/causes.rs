//! What led to what in one run: the links of a trace, walked backwards.

use std::ops::Range;

use super::paths::{Leg, Path};
use crate::circuit::{Circuit, GateId, NetId, WireId};
use crate::engine::{Link, Lost, Site, Trace};
use crate::logic::Value;
use crate::scenario::{MomentKind, Scenario};
use crate::time::Time;

/// Inputs at X of one gate up to which it is found out which of several changes at one instant mattered.
const UNKNOWN: usize = 10;

/// A trace with what is needed to walk it.
#[derive(Debug)]
pub(super) struct Causes<'a> {
    pub scenario: &'a Scenario,
    pub circuit: &'a Circuit,
    pub trace: &'a Trace,
    /// For each net its changes, by index, in order.
    of_net: Vec<Vec<u32>>,
    /// For each wire the arrivals at its end.
    of_wire: Vec<Vec<u32>>,
}

/// Where a gate hears a net: directly, or at the end of a wire.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Pin {
    pub net: NetId,
    pub wire: Option<WireId>,
}

impl<'a> Causes<'a> {
    pub fn new(scenario: &'a Scenario, trace: &'a Trace) -> Causes<'a> {
        let circuit = &*scenario.circuit;
        let mut of_net = vec![Vec::new(); circuit.net_count()];
        for (i, change) in trace.changes.iter().enumerate() {
            of_net[change.net.index()].push(i as u32);
        }
        let mut of_wire = vec![Vec::new(); circuit.wire_count()];
        for (i, arrival) in trace.arrivals.iter().enumerate() {
            of_wire[arrival.wire.0 as usize].push(i as u32);
        }
        Causes { scenario, circuit, trace, of_net, of_wire }
    }

    /// The changes of a net in some batches.
    pub fn changes(&self, net: NetId, batches: &Range<u32>) -> &[u32] {
        let all = &self.of_net[net.index()];
        let until = |batch: u32| all.partition_point(|i| self.trace.changes[*i as usize].batch < batch);
        &all[until(batches.start)..until(batches.end.max(batches.start))]
    }

    fn arrivals(&self, wire: WireId, batches: &Range<u32>) -> &[u32] {
        let all = &self.of_wire[wire.0 as usize];
        let until = |batch: u32| all.partition_point(|i| self.trace.arrivals[*i as usize].batch < batch);
        &all[until(batches.start)..until(batches.end.max(batches.start))]
    }

    /// What a gate hears at one of its pins in some batches.
    pub fn heard(&self, pin: Pin, batches: &Range<u32>) -> Vec<Link> {
        match pin.wire {
            Some(wire) => self.arrivals(wire, batches).iter().map(|i| Link::Arrival(*i)).collect(),
            None => self.changes(pin.net, batches).iter().map(|i| Link::Change(*i)).collect(),
        }
    }

    /// Where a gate hears its nets, each once.
    pub fn pins(&self, gate: GateId) -> impl Iterator<Item = Pin> + '_ {
        self.circuit.sources(gate).iter().map(move |(net, _)| {
            let mut readers = self.circuit.readers(*net).iter();
            Pin { net: *net, wire: readers.find(|reader| reader.gate == gate).and_then(|reader| reader.wire) }
        })
    }

    /// The value at a pin just before a batch.
    pub fn at_pin(&self, pin: Pin, batch: u32) -> Value {
        let last = match pin.wire {
            Some(wire) => self.arrivals(wire, &(0..batch)).last().map(|i| self.trace.arrivals[*i as usize].new),
            None => self.changes(pin.net, &(0..batch)).last().map(|i| self.trace.changes[*i as usize].new),
        };
        last.unwrap_or_else(|| self.trace.start.get(pin.net.index()))
    }

    /// The value that a change or arrival brings.
    pub fn value(&self, link: Link) -> Option<Value> {
        match link {
            Link::Start => None,
            Link::Change(i) => Some(self.trace.changes[i as usize].new),
            Link::Arrival(i) => Some(self.trace.arrivals[i as usize].new),
        }
    }

    /// When it came.
    pub fn time(&self, link: Link) -> Time {
        match link {
            Link::Start => Time::ZERO,
            Link::Change(i) => self.trace.changes[i as usize].at,
            Link::Arrival(i) => self.trace.arrivals[i as usize].at,
        }
    }

    /// In which batch; what is there at power-up is answered in the first.
    pub fn batch(&self, link: Link) -> u32 {
        match link {
            Link::Start => 0,
            Link::Change(i) => self.trace.changes[i as usize].batch,
            Link::Arrival(i) => self.trace.arrivals[i as usize].batch,
        }
    }

    /// What scheduled a change of a gate's net.
    pub fn cause(&self, change: u32) -> Link {
        let it = &self.trace.changes[change as usize];
        let told = match (it.through, it.cause) {
            (Some(arrival), _) => Link::Arrival(arrival),
            (None, Some(change)) => Link::Change(change),
            (None, None) => Link::Start,
        };
        self.circuit.driver(it.net).map_or(told, |gate| self.decisive(gate, told))
    }

    /// What cancelled an event.
    pub fn ended_by(&self, lost: &Lost) -> Link {
        match lost.event.site {
            Site::Gate(gate) => self.decisive(gate, lost.event.by),
            Site::Wire(_) => lost.event.by,
        }
    }

    /// Of the changes that a gate heard of in one batch, that without which its function would not have changed: the one
    /// that the engine names, or else the first in the order of its nets. If there is none, the one that the engine names.
    fn decisive(&self, gate: GateId, told: Link) -> Link {
        if told == Link::Start {
            return told;
        }
        let batch = self.batch(told);
        let heard = |pin: Pin| self.heard(pin, &(batch..batch + 1)).last().copied();
        let heard: Vec<(Pin, Link)> = self.pins(gate).filter_map(|pin| Some((pin, heard(pin)?))).collect();
        if heard.len() < 2 {
            return told;
        }
        let before: Vec<(Pin, Value)> = self.pins(gate).map(|pin| (pin, self.at_pin(pin, batch))).collect();
        let after = |pin: Pin| self.at_pin(pin, batch + 1);
        let new = self.function(gate, after);
        let mattered = |pin: Pin| {
            let was = before.iter().find(|it| it.0 == pin).map(|it| it.1);
            let without =
                self.function(gate, |other| if other == pin { was.unwrap_or(Value::X) } else { after(other) });
            without.is_some() && new.is_some() && without != new
        };
        let told_first = heard.iter().filter(|it| it.1 == told).chain(heard.iter().filter(|it| it.1 != told));
        told_first.copied().find(|(pin, _)| mattered(*pin)).map_or(told, |it| it.1)
    }

    /// A gate's function: X unless every completion of the X's gives the same. `None`: too many of them to try.
    pub fn function(&self, gate: GateId, value: impl Fn(Pin) -> Value) -> Option<Value> {
        let values: Vec<(NetId, Value)> = self.pins(gate).map(|pin| (pin.net, value(pin))).collect();
        let open: Vec<NetId> = values.iter().filter(|it| it.1 == Value::X).map(|it| it.0).collect();
        if open.len() > UNKNOWN {
            return None;
        }
        let of = |completion: u32| {
            self.circuit.wants(gate, |net| match open.iter().position(|it| *it == net) {
                Some(at) => completion >> at & 1 == 1,
                None => values.contains(&(net, Value::One)),
            })
        };
        let first = of(0);
        let alike = (1..1u32 << open.len()).all(|completion| of(completion) == first);
        Some(if alike { Value::from(first) } else { Value::X })
    }

    /// The path to a change or arrival.
    pub fn path(&self, to: Link) -> Path {
        self.walk(to, Vec::new())
    }

    /// The path to an event that was cancelled, as far as it would have come.
    pub fn path_to_lost(&self, lost: &Lost) -> Path {
        let event = &lost.event;
        let (net, wire, cause) = match event.site {
            Site::Gate(gate) => (self.circuit.net_of(gate), None, self.decisive(gate, event.cause)),
            Site::Wire(wire) => (self.circuit.wires()[wire.0 as usize].0, Some(wire), event.cause),
        };
        let delay = event.due.since(event.since);
        self.walk(cause, vec![Leg { net, wire, new: event.new, delay, at: event.due, came: false }])
    }

    /// Walks back from `link`, before which lie `legs`, latest first.
    fn walk(&self, mut link: Link, mut legs: Vec<Leg>) -> Path {
        let mut path = Path { from: None, moment: None, at: Time::ZERO, legs: Vec::new(), left_out: 0 };
        let mut full = false;
        while let Some((leg, cause)) = self.leg(link) {
            if full {
                path.left_out += 1;
            } else if legs.len() + 1 == Path::MOST && matches!(cause, Link::Arrival(_)) {
                // it begins with a change, not in the middle between a wire and its gate
                (full, path.left_out) = (true, 1);
                (path.from, path.at) = (self.change_of(link), self.time(link));
            } else {
                legs.push(leg);
                full = legs.len() == Path::MOST;
                // where it begins, should there be more
                (path.from, path.at) = (self.change_of(cause), self.time(cause));
            }
            link = cause;
        }
        if path.left_out == 0 {
            (path.from, path.at) = (self.change_of(link), self.time(link));
            if let Link::Change(i) = link {
                path.moment = self.moment(i);
            }
        }
        legs.reverse();
        path.legs = legs;
        path
    }

    /// One step back: the leg that brought this, and what it began with. `None` for inputs and the start.
    fn leg(&self, link: Link) -> Option<(Leg, Link)> {
        let (net, wire, new, cause) = match link {
            Link::Start => return None,
            Link::Change(i) => {
                let change = &self.trace.changes[i as usize];
                self.circuit.driver(change.net)?;
                (change.net, None, change.new, self.cause(i))
            }
            Link::Arrival(i) => {
                let arrival = &self.trace.arrivals[i as usize];
                let net = self.circuit.wires()[arrival.wire.0 as usize].0;
                (net, Some(arrival.wire), arrival.new, arrival.cause.map_or(Link::Start, Link::Change))
            }
        };
        let at = self.time(link);
        Some((Leg { net, wire, new, delay: at.since(self.time(cause)), at, came: true }, cause))
    }

    /// What led to this: nothing for inputs and the start.
    pub fn before(&self, link: Link) -> Option<Link> {
        self.leg(link).map(|it| it.1)
    }

    /// The net and value of a change or arrival.
    fn change_of(&self, link: Link) -> Option<(NetId, Value)> {
        Some((self.net(link)?, self.value(link)?))
    }

    /// The net that changed, or that the wire carries.
    pub fn net(&self, link: Link) -> Option<NetId> {
        match link {
            Link::Start => None,
            Link::Change(i) => Some(self.trace.changes[i as usize].net),
            Link::Arrival(i) => Some(self.circuit.wires()[self.trace.arrivals[i as usize].wire.0 as usize].0),
        }
    }

    /// The moment that made an input's change: the latest that sets it.
    fn moment(&self, change: u32) -> Option<u32> {
        let it = &self.trace.changes[change as usize];
        let sets = |moment: u32, start: Time| {
            let moment = &self.scenario.stimulus.moments[moment as usize];
            let edge = matches!(moment.kind, MomentKind::Edge { .. });
            self.scenario.stimulus.inputs_of(moment).contains(&it.net) && (!edge || start == it.at)
        };
        let windows = &self.trace.windows;
        let until = windows.partition_point(|window| window.batch <= it.batch);
        let mut earlier = windows[..until].iter().rev();
        earlier.find_map(|window| window.moments.iter().rev().copied().find(|m| sets(*m, window.start)))
    }

    /// The last change of a net at an instant, to a value if one is given.
    pub fn change_at(&self, net: NetId, at: Time, new: Option<Value>) -> Option<Link> {
        let all = &self.of_net[net.index()];
        let until = all.partition_point(|i| self.trace.changes[*i as usize].at <= at);
        let mut same = all[..until].iter().rev().take_while(|i| self.trace.changes[**i as usize].at == at);
        same.find(|i| new.is_none_or(|new| self.trace.changes[**i as usize].new == new)).map(|i| Link::Change(*i))
    }

    /// The whole window that a moment opens: its number, and its batches.
    pub fn window(&self, moment: u32) -> Option<(usize, Range<u32>)> {
        let windows = &self.trace.windows;
        let at = windows.iter().position(|window| window.moments.contains(&moment))?;
        Some((at, windows[at].batch..self.start_of(at + 1)))
    }

    /// The window of some nets that a moment opens: to the next step that touches them.
    pub fn window_of(&self, moment: u32, nets: &[NetId]) -> Option<(usize, Range<u32>)> {
        let cone = self.circuit.cone(nets);
        let (at, _) = self.window(moment)?;
        let later = self.trace.windows.iter().skip(at + 1);
        let more = later.take_while(|window| !window.inputs.iter().any(|net| cone.contains(*net))).count();
        Some((at, self.trace.windows[at].batch..self.start_of(at + 1 + more)))
    }

    fn start_of(&self, window: usize) -> u32 {
        self.trace.windows.get(window).map_or(self.trace.batches, |window| window.batch)
    }

    /// Events at gates that were cancelled in some batches.
    pub fn lost(&self, batches: &Range<u32>) -> &[Lost] {
        let all = &self.trace.lost;
        let until = |batch: u32| all.partition_point(|lost| lost.batch < batch);
        &all[until(batches.start)..until(batches.end.max(batches.start))]
    }
}
