//! The part of a scenario that an exploration works on: the cone of some nets, with delays and steps in whole ticks.
//!
//! A signal is a net (inputs first, then gates) or the end of a wire. Gates read signals; a wire end follows its net.

use rustc_hash::FxHashMap;

use super::bounce::{BOUNCING, PlantBounce};
use super::outside::PlantClock;
use crate::circuit::{Compiled, GateId, NetId, NetSet, WireId};
use crate::delay::{DelayRange, Filter};
use crate::scenario::{Clock, Place, Scenario};
use crate::time::Span;

/// Inputs of one step with skew, at most: any part of them may change first.
const SKEWED: usize = 6;

/// Clocks of one cone, at most: edges of any of them may come at one instant.
const CLOCKS: usize = 4;

/// Why an exploration cannot speak of a part of a scenario.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
pub enum NotCovered {
    /// A gate that is not inertial.
    #[error("the proof knows inertial gates only, and {0} is none")]
    Filter(String),
    /// More clocks in one cone than an exploration tells apart.
    #[error("more than 4 clocks have to do with it, and the proof tells no more apart")]
    Clocks,
    /// A step that bounces and has skew.
    #[error("step \"{0}\" bounces and has skew, and the proof does not know both in one")]
    SkewedBounce(String),
    /// More inputs of one step that bounce than an exploration tells apart.
    #[error("step \"{0}\" lets more than 4 inputs bounce that have to do with it")]
    WideBounce(String),
    /// A step that bounces beside a clock.
    #[error("step \"{0}\" bounces beside a clock, and the proof does not know both in one")]
    ClockedBounce(String),
    /// Gates that begin at X.
    #[error("the proof does not begin with unknown values")]
    UnknownStart,
    /// More inputs of one step with skew than an exploration tells apart.
    #[error("step \"{0}\" sets more than 6 inputs with skew")]
    WideSkew(String),
    /// Times that do not fit whole numbers of 64 bits.
    #[error("the times are too far apart for whole numbers of 64 bits")]
    TooLong,
}

/// Least and greatest delay, in ticks.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Ticks {
    /// Least.
    pub min: i64,
    /// Greatest.
    pub max: i64,
}

/// One gate.
#[derive(Clone, Debug)]
pub struct PlantGate {
    /// Its number in the circuit.
    pub gate: GateId,
    /// Its function of the weighted sum of its signals.
    pub function: Compiled,
    /// The signals it reads, each with its weight.
    pub reads: Vec<(u32, u64)>,
    /// Delay of `[fall, rise]`.
    pub delay: [Ticks; 2],
}

/// One wire.
#[derive(Clone, Debug)]
pub struct PlantWire {
    /// Its number in the circuit.
    pub wire: WireId,
    /// The net it comes from.
    pub net: u32,
    /// Delay of `[fall, rise]`.
    pub delay: [Ticks; 2],
    /// Have both edges always the same delay, so that no arrival overtakes another?
    pub in_order: bool,
}

/// When a step comes.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum PlantPlace {
    /// From the start.
    At(Ticks),
    /// From the step before.
    After(Ticks),
    /// This long after rest.
    Rest(i64),
    /// After the pattern of the step shows.
    When {
        /// How long after.
        wait: Ticks,
        /// How long after the step before it gives up.
        timeout: Option<i64>,
    },
}

/// One step.
#[derive(Clone, Debug)]
pub struct PlantStep {
    /// Its moment.
    pub moment: u32,
    /// When.
    pub place: PlantPlace,
    /// The inputs that it sets here, by local net.
    pub set: Vec<(u32, bool)>,
    /// The pattern that it waits for, by local net; empty for other steps.
    pub pattern: Vec<(u32, bool)>,
    /// How much later than the first the last of its inputs may change.
    pub skew: i64,
    /// How its inputs bounce, if they do. Then it has no skew.
    pub bounce: Option<PlantBounce>,
    /// With skew: does it set other inputs besides, so that none of these need be the first?
    pub others: bool,
}

/// The part of a scenario that an exploration works on.
#[derive(Clone, Debug)]
pub struct Plant {
    /// Femtoseconds a tick.
    pub tick: u64,
    /// Local net to net of the circuit.
    pub nets: Vec<NetId>,
    /// How many of the nets are inputs.
    pub inputs: usize,
    /// For each signal: does it belong to the cone that is asked about, and not only to that of a pattern? Windows and rest
    /// are judged by these.
    pub core: Vec<bool>,
    /// The gates; the net of gate g is `inputs + g`.
    pub gates: Vec<PlantGate>,
    /// The wires; the end of wire w is signal `nets.len() + w`.
    pub wires: Vec<PlantWire>,
    /// For each signal the gates that read it.
    pub readers: Vec<Vec<u32>>,
    /// For each net the wires that come from it.
    pub leads: Vec<Vec<u32>>,
    /// The steps, all of them, in order.
    pub steps: Vec<PlantStep>,
    /// The clocks that drive inputs here.
    pub clocks: Vec<PlantClock>,
    /// How many windows the scenario can have: moments, and what comes before the first.
    pub windows: u32,
    /// May what comes from outside end after each of its events? Then whatever recurs in a window can go on for ever.
    pub ends: bool,
    /// Values of the inputs before the first step.
    pub initial: Vec<bool>,
    /// Is there a window from the start on, since it does not begin at rest?
    pub power_up: bool,
}

/// The greatest common divisor.
fn common(a: u64, b: u64) -> u64 {
    if b == 0 { a } else { common(b, a % b) }
}

impl Plant {
    /// The cone of these nets and of the patterns that steps wait for, with the whole stimulus. `spans` are times that matter besides, such as bounds of rules: they
    /// are whole ticks, too.
    ///
    /// Errors: what the exploration does not cover.
    pub fn of(scenario: &Scenario, of: &[NetId], spans: &[Span]) -> Result<Plant, NotCovered> {
        let (circuit, delays, stimulus) = (&*scenario.circuit, &*scenario.delays, &*scenario.stimulus);
        let core: NetSet = circuit.cone(of);
        let mut of = of.to_vec();
        for (s, step) in stimulus.steps.iter().enumerate() {
            if let Place::When { pattern, .. } = &step.place {
                of.extend(pattern.iter().map(|entry| entry.0));
                // the pattern is looked for once the inputs of the step before have changed
                let before = s.checked_sub(1).map(|before| &stimulus.steps[before]).filter(|it| it.moves_on());
                of.extend(before.into_iter().flat_map(|step| &step.set).map(|entry| entry.0));
            }
        }
        let cone: NetSet = circuit.cone(&of);
        let nets: Vec<NetId> = cone.iter().collect();
        let local: FxHashMap<NetId, u32> = nets.iter().enumerate().map(|(i, net)| (*net, i as u32)).collect();
        let inputs = nets.iter().filter(|net| circuit.is_input(**net)).count();
        if scenario.begin == crate::scenario::Begin::Unknown {
            return Err(NotCovered::UnknownStart);
        }
        let mut times: Vec<Span> = spans.to_vec();
        let mut add = |range: DelayRange| times.extend([range.min, range.max]);
        let gates_of: Vec<GateId> = nets[inputs..].iter().filter_map(|net| circuit.driver(*net)).collect();
        for gate in &gates_of {
            if delays.filter[gate.index()] != Filter::Inertial {
                return Err(NotCovered::Filter(circuit.name(circuit.net_of(*gate)).to_string()));
            }
            delays.gate[gate.index()].into_iter().for_each(&mut add);
        }
        let wires_of: Vec<WireId> = (0..circuit.wire_count() as u32)
            .map(WireId)
            .filter(|w| cone.contains(circuit.net_of(circuit.wires()[w.index()].1)))
            .collect();
        wires_of.iter().for_each(|wire| delays.wire[wire.index()].into_iter().for_each(&mut add));
        for step in &stimulus.steps {
            if let Some(bounce) = step.bounce.as_ref().filter(|bounce| bounce.pulses.1 > 0) {
                if step.skew.is_some_and(|skew| !skew.is_exact()) {
                    return Err(NotCovered::SkewedBounce(step.label.clone()));
                }
                let here = step.set.iter().filter(|(net, _)| cone.contains(*net)).count();
                if here > BOUNCING {
                    return Err(NotCovered::WideBounce(step.label.clone()));
                }
                if here > 0 && stimulus.clocks.iter().any(|clock| cone.contains(clock.net)) {
                    return Err(NotCovered::ClockedBounce(step.label.clone()));
                }
                add(bounce.lasting);
            }
            match &step.place {
                Place::At(range) | Place::After(range) => add(*range),
                Place::Rest(wait) => add(DelayRange::exact(*wait)),
                Place::When { wait, timeout, .. } => {
                    add(*wait);
                    add(DelayRange::exact(timeout.unwrap_or_default()));
                }
            }
            if let Some(skew) = step.skew {
                if step.set.len() > SKEWED {
                    return Err(NotCovered::WideSkew(step.label.clone()));
                }
                add(skew);
            }
        }
        let clocks: Vec<(usize, &Clock)> =
            stimulus.clocks.iter().enumerate().filter(|(_, clock)| cone.contains(clock.net)).collect();
        if clocks.len() > CLOCKS {
            return Err(NotCovered::Clocks);
        }
        for (_, clock) in &clocks {
            [clock.first, clock.period, clock.high].into_iter().for_each(&mut add);
            add(DelayRange::exact(clock.jitter));
        }
        let tick = times.iter().fold(0, |tick, span| common(tick, span.fs())).max(1);
        // every bound that can arise is a sum of some of these
        let sum = times.iter().map(|span| u128::from(span.fs() / tick)).sum::<u128>();
        let cycles = |clock: &Clock| u128::from(clock.count) * u128::from(clock.period.max.fs() / tick);
        let sum = sum + clocks.iter().map(|(_, clock)| cycles(clock)).sum::<u128>();
        if sum * 8 >= 1 << 60 {
            return Err(NotCovered::TooLong);
        }
        let ticks = |span: Span| (span.fs() / tick) as i64;
        let range = |range: DelayRange| Ticks { min: ticks(range.min), max: ticks(range.max) };

        let wire_at: FxHashMap<(NetId, GateId), u32> =
            wires_of.iter().enumerate().map(|(i, w)| (circuit.wires()[w.index()], i as u32)).collect();
        let signals = nets.len() + wires_of.len();
        let mut readers = vec![Vec::new(); signals];
        let mut gates = Vec::new();
        for (g, gate) in gates_of.iter().enumerate() {
            let mut reads = Vec::new();
            for &(net, weight) in circuit.sources(*gate) {
                let signal = match wire_at.get(&(net, *gate)) {
                    Some(wire) => nets.len() as u32 + wire,
                    None => local[&net],
                };
                readers[signal as usize].push(g as u32);
                reads.push((signal, weight));
            }
            let function = circuit.compiled(*gate).clone();
            gates.push(PlantGate { gate: *gate, function, reads, delay: delays.gate[gate.index()].map(range) });
        }
        let mut leads = vec![Vec::new(); nets.len()];
        let mut wires = Vec::new();
        for (w, wire) in wires_of.iter().enumerate() {
            let net = local[&circuit.wires()[wire.index()].0];
            leads[net as usize].push(w as u32);
            let in_order = delays.wire_one_draw[wire.index()];
            wires.push(PlantWire { wire: *wire, net, delay: delays.wire[wire.index()].map(range), in_order });
        }
        let steps = stimulus.steps.iter().enumerate().map(|(s, step)| PlantStep {
            moment: stimulus.moment_of_step(s as u32),
            place: match &step.place {
                Place::At(it) => PlantPlace::At(range(*it)),
                Place::After(it) => PlantPlace::After(range(*it)),
                Place::Rest(wait) => PlantPlace::Rest(ticks(*wait)),
                Place::When { wait, timeout, .. } => {
                    PlantPlace::When { wait: range(*wait), timeout: timeout.map(ticks) }
                }
            },
            pattern: match &step.place {
                Place::When { pattern, .. } => pattern.iter().map(|(net, value)| (local[net], *value)).collect(),
                _ => Vec::new(),
            },
            set: step.set.iter().filter_map(|(net, value)| local.get(net).map(|net| (*net, *value))).collect(),
            skew: step.skew.map_or(0, |skew| ticks(skew.max - skew.min)),
            bounce: step
                .bounce
                .as_ref()
                .filter(|bounce| bounce.pulses.1 > 0)
                .map(|bounce| PlantBounce { lasting: range(bounce.lasting), pairs: bounce.pulses }),
            others: step.set.iter().any(|(net, _)| !local.contains_key(net)),
        });
        let steps = steps.collect();
        let edges = |clocks: &[Clock]| clocks.iter().map(|clock| 2 * clock.count).sum::<u32>();
        let clocks = clocks.into_iter().map(|(number, clock)| {
            let base = stimulus.steps.len() as u32 + 1 + edges(&stimulus.clocks[..number]);
            let initial = stimulus.initial[clock.net.index()];
            PlantClock::of(clock, number as u32, local[&clock.net], initial, base, &ticks)
        });
        let clocks = clocks.collect();
        let initial = nets[..inputs].iter().map(|net| stimulus.initial[net.index()]).collect();
        let end = |wire: &WireId| core.contains(circuit.net_of(circuit.wires()[wire.index()].1));
        let core = nets.iter().map(|net| core.contains(*net)).chain(wires_of.iter().map(end)).collect();
        Ok(Plant {
            tick,
            core,
            nets,
            inputs,
            gates,
            wires,
            readers,
            leads,
            steps,
            clocks,
            windows: stimulus.steps.len() as u32 + 1 + edges(&stimulus.clocks),
            ends: false,
            initial,
            power_up: scenario.begin_window().is_some(),
        })
    }

    /// How many steps can come at the instant of this one, itself counted: each number that is possible.
    pub(super) fn at_once(&self, step: usize) -> Vec<u8> {
        let mut numbers = Vec::new();
        for last in step..self.steps.len().min(step + 255) {
            let (may_join, may_wait) = match self.steps.get(last + 1).map(|next| next.place) {
                // the bounce takes time
                _ if self.steps[last].bounce.is_some() => (false, true),
                Some(PlantPlace::After(ticks)) => (ticks.min == 0 && self.steps[last].skew == 0, ticks.max > 0),
                Some(PlantPlace::At(ticks)) => match self.steps[last].place {
                    PlantPlace::At(before) => {
                        (ticks.min <= before.max && self.steps[last].skew == 0, ticks.max > before.min)
                    }
                    _ => (self.steps[last].skew == 0, true),
                },
                _ => (false, true),
            };
            if may_wait {
                numbers.push((last + 1 - step) as u8);
            }
            if !may_join {
                break;
            }
        }
        numbers
    }

    /// May a step come at the very instant of the one before it?
    pub fn may_coincide(&self, step: usize) -> bool {
        let Some(before) = step.checked_sub(1).map(|before| &self.steps[before]) else { return false };
        if before.bounce.is_some() {
            return false;
        }
        let before = before.place;
        match (self.steps[step].place, before) {
            // a batch of its own
            (PlantPlace::Rest(_) | PlantPlace::When { .. }, _) => false,
            (PlantPlace::After(after), _) => after.min == 0,
            (PlantPlace::At(at), PlantPlace::At(before)) => at.min <= before.max,
            (PlantPlace::At(_), _) => true,
        }
    }

    /// Does anything come from outside whose time is not counted from rest?
    pub(super) fn is_timed(&self) -> bool {
        !self.clocks.is_empty() || self.steps.iter().any(|step| !matches!(step.place, PlantPlace::Rest(_)))
    }

    /// Does this step wait for a pattern, and does that show in these values?
    pub(super) fn shows_pattern(&self, step: usize, values: &[u64]) -> bool {
        let step = self.steps.get(step).filter(|step| matches!(step.place, PlantPlace::When { .. }));
        step.is_some_and(|step| {
            step.pattern.iter().all(|(net, value)| super::key::bit(values, *net as usize) == *value)
        })
    }

    /// Everything is asked about, patterns included.
    pub(super) fn asks_all(mut self) -> Plant {
        self.core.fill(true);
        self
    }

    /// Number of signals: nets and wire ends.
    pub fn signals(&self) -> usize {
        self.nets.len() + self.wires.len()
    }

    /// The local number of a net.
    pub fn local(&self, net: NetId) -> Option<u32> {
        self.nets.binary_search(&net).ok().map(|at| at as u32)
    }

    /// A time in ticks; it must have been among the plant's times or be a multiple of the tick.
    pub fn ticks(&self, span: Span) -> i64 {
        (span.fs() / self.tick) as i64
    }

    /// A number of ticks as a time.
    pub fn span(&self, ticks: i64) -> Span {
        Span::from_fs(ticks.max(0) as u64 * self.tick)
    }
}
