//! From a point of a system to a case that can be run.

use super::Fired;
use super::bounce::Begins;
use super::key::Mover;
use super::plant::Plant;
use super::system::{Point, System, Unknown};
use crate::instance::{Instance, Which};
use crate::scenario::{Place, Scenario};
use crate::time::Span;

/// A case made of a point. What the plant does not hold is typical.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Case {
    /// The case.
    pub instance: Instance,
    /// Is every value a whole number of femtoseconds? If not they were rounded down, and what needs exact equality may be lost.
    pub exact: bool,
}

/// Which unknowns are always equal in a scenario: both edges of a gate or wire whose delays come from one draw.
pub fn one_draw<'a>(scenario: &'a Scenario, plant: &'a Plant) -> impl Fn(Unknown) -> Unknown + 'a {
    move |unknown| match unknown {
        Unknown::Gate(gate, _) if scenario.delays.gate_one_draw[plant.gates[gate as usize].gate.index()] => {
            Unknown::Gate(gate, false)
        }
        Unknown::Wire(wire, _) if scenario.delays.wire_one_draw[plant.wires[wire as usize].wire.index()] => {
            Unknown::Wire(wire, false)
        }
        other => other,
    }
}

/// The case of a point of the system of a trace. `start` are the values of all signals where the trace begins.
pub fn case(
    scenario: &Scenario,
    plant: &Plant,
    system: &System,
    point: &Point,
    trace: &[Fired],
    start: &[u64],
) -> Case {
    let mut instance = Instance::of(scenario, &Which::Typ);
    let mut exact = true;
    let mut span = |value: i128| {
        let fs = value * i128::from(plant.tick);
        exact &= fs % point.denominator == 0;
        Span::from_fs((fs / point.denominator) as u64)
    };
    // inputs with skew change with their step unless the trace says otherwise
    for (step, skews) in scenario.stimulus.steps.iter().zip(&mut instance.skews) {
        let least = step.skew.map_or(Span::ZERO, |range| range.min);
        skews.iter_mut().for_each(|skew| *skew = least);
    }
    // inputs that bounce do so as seldom and as briefly as they can where the trace says nothing
    instance.bounces = Instance::of(scenario, &Which::Min).bounces;
    for (step, begins) in bouncing_steps(plant, trace) {
        for (entry, toggles) in bounces_of(scenario, plant, step, &mut instance) {
            // at its old value it has toggled at the instant of the step
            let old = begins.goes_on(entry) && !begins.at_once(entry);
            *toggles = if old { vec![Span::ZERO] } else { Vec::new() };
        }
    }
    for (unknown, value) in system.unknowns.iter().zip(&point.values) {
        let value = span(*value);
        match *unknown {
            Unknown::Gate(gate, rises) => {
                let gate = plant.gates[gate as usize].gate.index();
                let edges = &mut instance.delays.gate[gate];
                match scenario.delays.gate_one_draw[gate] && !system.unknowns.contains(&unknown.other_edge()) {
                    true => *edges = [value; 2],
                    false => edges[usize::from(rises)] = value,
                }
            }
            Unknown::Wire(wire, rises) => {
                let wire = plant.wires[wire as usize].wire.index();
                let edges = &mut instance.delays.wire[wire];
                match scenario.delays.wire_one_draw[wire] && !system.unknowns.contains(&unknown.other_edge()) {
                    true => *edges = [value; 2],
                    false => edges[usize::from(rises)] = value,
                }
            }
            Unknown::Place(step) => instance.places[step as usize] = value,
            Unknown::First(clock) => instance.clocks[plant.clocks[clock as usize].clock as usize].first = value,
            Unknown::Period(clock) => instance.clocks[plant.clocks[clock as usize].clock as usize].period = value,
            Unknown::High(clock) => instance.clocks[plant.clocks[clock as usize].clock as usize].high = value,
            Unknown::Jitter(clock, edge) => {
                let it = &plant.clocks[clock as usize];
                let most = scenario.stimulus.clocks[it.clock as usize].jitter;
                let moved = value.fs() as i64 - most.fs() as i64;
                if let Some(place) = instance.clocks[it.clock as usize].jitter.get_mut(edge as usize) {
                    *place = moved;
                }
            }
            Unknown::Toggle { step, entry, .. } => {
                if let Some((_, toggles)) =
                    bounces_of(scenario, plant, step as usize, &mut instance).find(|it| it.0 == entry as usize)
                {
                    toggles.push(value);
                }
            }
            Unknown::Late(step, entry) => {
                let of = &scenario.stimulus.steps[step as usize];
                let (net, _) = plant.steps[step as usize].set[entry as usize];
                let net = plant.nets[net as usize];
                if let (Some(at), Some(range)) = (of.set.iter().position(|it| it.0 == net), of.skew) {
                    instance.skews[step as usize][at] = range.min + value;
                }
            }
        }
    }
    for (step, begins) in bouncing_steps(plant, trace) {
        let least = plant.steps[step].bounce.map_or(0, |bounce| 2 * bounce.pairs.0 as usize);
        for (entry, toggles) in bounces_of(scenario, plant, step, &mut instance) {
            // pairs that nobody sees fall together
            while begins.goes_on(entry) && toggles.len() < least {
                toggles.push(Span::ZERO);
            }
            toggles.sort_unstable();
            // rounded down, others may fall together with the last, which in a draw they never do
            if let Some((last, others)) = toggles.split_last_mut()
                && *last > Span::ZERO
            {
                others.iter_mut().for_each(|toggle| *toggle = (*toggle).min(*last - Span::TICK));
            }
        }
    }
    // figures that were tried beyond their ranges must still make a clock
    for clock in &mut instance.clocks {
        clock.high = clock.high.max(Span::TICK);
        clock.period = clock.period.max(clock.high + Span::TICK);
    }
    // steps that the trace does not reach stay in order behind it
    let movers = trace.iter().flat_map(|block| &block.movers);
    let reached = movers.filter(|mover| matches!(mover, Mover::Step(_))).count();
    for (step, place) in scenario.stimulus.steps.iter().zip(&mut instance.places).skip(reached) {
        if let Place::At(range) | Place::After(range) | Place::When { wait: range, .. } = &step.place {
            *place = range.max;
        }
    }
    if scenario.begin == crate::scenario::Begin::Random {
        for (gate, it) in plant.gates.iter().enumerate() {
            instance.start.set(it.gate.index(), super::key::bit(start, plant.inputs + gate));
        }
    }
    Case { instance, exact }
}

/// The steps of a trace that bounce, and how their inputs begin.
fn bouncing_steps(plant: &Plant, trace: &[Fired]) -> Vec<(usize, Begins)> {
    let masks = trace.iter().flat_map(|block| {
        block.movers.iter().filter_map(|mover| if let Mover::Step(mask) = mover { Some(Begins(*mask)) } else { None })
    });
    masks.enumerate().filter(|(step, _)| plant.steps[*step].bounce.is_some()).collect()
}

/// The toggles of the inputs of a step in a case, each with its entry in the plant's set.
fn bounces_of<'a>(
    scenario: &Scenario,
    plant: &'a Plant,
    step: usize,
    instance: &'a mut Instance,
) -> impl Iterator<Item = (usize, &'a mut Vec<Span>)> {
    let nets: Vec<_> = scenario.stimulus.steps[step].set.iter().map(|(net, _)| *net).collect();
    let entry =
        move |at: usize| plant.steps[step].set.iter().position(|(net, _)| plant.nets[*net as usize] == nets[at]);
    instance.bounces[step].iter_mut().enumerate().filter_map(move |(at, toggles)| Some((entry(at)?, toggles)))
}

impl Unknown {
    /// The other edge of the same gate or wire.
    pub fn other_edge(self) -> Unknown {
        match self {
            Unknown::Gate(gate, rises) => Unknown::Gate(gate, !rises),
            Unknown::Wire(wire, rises) => Unknown::Wire(wire, !rises),
            other => other,
        }
    }
}
