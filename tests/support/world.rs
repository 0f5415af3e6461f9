//! A short way to write a small scenario down, by net names, with exact delays.

use std::sync::Arc;

use stillgate::circuit::{Circuit, Expr, Function, GateId, GateSpec, NetId};
use stillgate::control::Control;
use stillgate::delay::{DelayModel, DelayRange, Filter};
use stillgate::engine::Program;
use stillgate::instance::{Instance, Which};
use stillgate::logic::{Bits, Value};
use stillgate::scenario::{
    Begin, Clock, Limits, Mark, Moment, MomentKind, Place, Plan, Rules, Scenario, Step, Stimulus,
};
use stillgate::time::{Span, Unit};

use super::recorder::{Record, Recorder};

/// A scenario in the making. Times are in femtoseconds.
#[derive(Clone, Debug)]
pub struct World {
    pub inputs: Vec<(String, bool)>,
    pub gates: Vec<Gate>,
    /// (net, gate, [fall, rise])
    pub wires: Vec<(String, String, [DelayRange; 2])>,
    pub steps: Vec<Step>,
    pub set: Vec<Vec<(String, bool)>>,
    pub clocks: Vec<(String, Clock)>,
    pub begin: Begin,
    pub limits: Limits,
    pub plan: Plan,
    /// Start bits by gate, where the start is random; else drawn.
    pub start: Option<Vec<bool>>,
}

#[derive(Clone, Debug)]
pub struct Gate {
    pub name: String,
    pub function: Function,
    pub pins: Vec<String>,
    /// [fall, rise]
    pub delay: [DelayRange; 2],
    pub filter: Filter,
}

pub fn fs(fs: u64) -> Span {
    Span::from_fs(fs)
}

pub fn exact(span: u64) -> DelayRange {
    DelayRange::exact(fs(span))
}

impl World {
    pub fn new() -> World {
        World {
            inputs: Vec::new(),
            gates: Vec::new(),
            wires: Vec::new(),
            steps: Vec::new(),
            set: Vec::new(),
            clocks: Vec::new(),
            begin: Begin::AtRest { named: Vec::new() },
            limits: Limits::default(),
            plan: Plan::default(),
            start: None,
        }
    }

    pub fn input(&mut self, name: &str, initial: bool) -> &mut World {
        self.inputs.push((name.into(), initial));
        self
    }

    /// An inertial gate with one delay for both edges.
    pub fn gate(&mut self, name: &str, function: Function, pins: &[&str], delay: u64) -> &mut World {
        self.gate_edges(name, function, pins, delay, delay)
    }

    /// An inertial gate.
    pub fn gate_edges(&mut self, name: &str, function: Function, pins: &[&str], rise: u64, fall: u64) -> &mut World {
        self.gates.push(Gate {
            name: name.into(),
            function,
            pins: pins.iter().map(ToString::to_string).collect(),
            delay: [exact(fall), exact(rise)],
            filter: Filter::Inertial,
        });
        self
    }

    /// An inertial gate that computes an expression.
    pub fn expr(&mut self, name: &str, text: &str, delay: u64) -> &mut World {
        let expr = Expr::parse(text).unwrap();
        let pins: Vec<String> = expr.nets().iter().map(ToString::to_string).collect();
        let pins: Vec<&str> = pins.iter().map(String::as_str).collect();
        self.gate(name, Function::Expr(expr), &pins, delay)
    }

    /// Gives every gate this filter.
    pub fn filter(&mut self, filter: Filter) -> &mut World {
        self.gates.iter_mut().for_each(|gate| gate.filter = filter);
        self
    }

    pub fn wire(&mut self, net: &str, gate: &str, rise: u64, fall: u64) -> &mut World {
        self.wires.push((net.into(), gate.into(), [exact(fall), exact(rise)]));
        self
    }

    pub fn step(&mut self, place: Place, set: &[(&str, bool)]) -> &mut World {
        self.steps.push(Step {
            label: format!("step {}", self.steps.len() + 1),
            place,
            set: Vec::new(),
            skew: None,
            bounce: None,
            expect: None,
            edges: Vec::new(),
            settle_within: None,
            oscillation: None,
            mark: Mark(0),
        });
        self.set.push(set.iter().map(|(net, bit)| (net.to_string(), *bit)).collect());
        self
    }

    pub fn at(&mut self, at: u64, set: &[(&str, bool)]) -> &mut World {
        self.step(Place::At(exact(at)), set)
    }

    pub fn after(&mut self, wait: u64, set: &[(&str, bool)]) -> &mut World {
        self.step(Place::After(exact(wait)), set)
    }

    pub fn rest(&mut self, wait: u64, set: &[(&str, bool)]) -> &mut World {
        self.step(Place::Rest(fs(wait)), set)
    }

    /// The gates start with these outputs, in gate order.
    pub fn starts(&mut self, bits: &[bool]) -> &mut World {
        self.begin = Begin::Random;
        self.start = Some(bits.to_vec());
        self
    }

    pub fn limit(&mut self, transitions: u64) -> &mut World {
        self.limits.transitions = transitions;
        self
    }

    pub fn net(&self, name: &str) -> NetId {
        let inputs = self.inputs.iter().map(|(name, _)| name);
        let mut all = inputs.chain(self.gates.iter().map(|gate| &gate.name));
        NetId(all.position(|net| net == name).unwrap_or_else(|| panic!("no net {name}")) as u32)
    }

    pub fn scenario(&self) -> Scenario {
        let pins = |gate: &Gate| gate.pins.iter().map(|pin| self.net(pin)).collect();
        let spec =
            |gate: &Gate| GateSpec { name: gate.name.clone(), function: gate.function.clone(), pins: pins(gate) };
        let inputs: Vec<&str> = self.inputs.iter().map(|(name, _)| name.as_str()).collect();
        let to = |gate: &str| GateId(self.net(gate).0 - inputs.len() as u32);
        let wires = self.wires.iter().map(|(net, gate, _)| (self.net(net), to(gate))).collect();
        let circuit = Circuit::new(&inputs, self.gates.iter().map(spec).collect(), wires).unwrap();
        let delays = DelayModel {
            gate: self.gates.iter().map(|gate| gate.delay).collect(),
            gate_one_draw: vec![false; self.gates.len()],
            wire: self.wires.iter().map(|(_, _, delay)| *delay).collect(),
            wire_one_draw: vec![false; self.wires.len()],
            filter: self.gates.iter().map(|gate| gate.filter).collect(),
            ..DelayModel::default()
        };
        let named = |set: &[(String, bool)]| set.iter().map(|(net, bit)| (self.net(net), *bit)).collect();
        let steps: Vec<Step> =
            self.steps.iter().zip(&self.set).map(|(step, set)| Step { set: named(set), ..step.clone() }).collect();
        let clocks: Vec<Clock> =
            self.clocks.iter().map(|(net, clock)| Clock { net: self.net(net), ..clock.clone() }).collect();
        let stimulus = Stimulus {
            initial: self.inputs.iter().map(|(_, bit)| *bit).collect(),
            moments: self.moments(),
            steps,
            clocks,
            walk: Default::default(),
        };
        Scenario {
            title: "a test".into(),
            unit: Unit::Fs,
            circuit: Arc::new(circuit),
            delays: Arc::new(delays),
            stimulus: Arc::new(stimulus),
            rules: Arc::new(Rules::default()),
            outputs: Vec::new(),
            watched: Vec::new(),
            begin: self.begin.clone(),
            reference: None,
            limits: self.limits,
            plan: self.plan,
            padding: None,
            plot: Default::default(),
            conditions: Vec::new(),
            notes: Vec::new(),
            not_analysed: Vec::new(),
        }
    }

    fn moments(&self) -> Vec<Moment> {
        let mut moments = Vec::new();
        if !matches!(self.begin, Begin::AtRest { .. }) {
            moments.push(Moment { label: "power-up".into(), kind: MomentKind::PowerUp });
        }
        for (number, step) in self.steps.iter().enumerate() {
            moments.push(Moment { label: step.label.clone(), kind: MomentKind::Step(number as u32) });
        }
        for (number, (net, clock)) in self.clocks.iter().enumerate() {
            for edge in 0..2 * clock.count {
                let kind = MomentKind::Edge { clock: number as u32, edge };
                moments.push(Moment { label: format!("{net} edge {edge}"), kind });
            }
        }
        moments
    }

    /// The typical case, with the start bits given.
    pub fn instance(&self, scenario: &Scenario) -> Instance {
        let mut instance = Instance::of(scenario, &Which::Typ);
        if let Some(start) = &self.start {
            instance.start = Bits::of(start.iter().copied());
        }
        instance
    }

    /// The typical run of this world. At rest it must have one stable state only, or `initial` names enough nets.
    pub fn run(&self) -> Run {
        let scenario = self.scenario();
        let instance = self.instance(&scenario);
        let rest = match &scenario.begin {
            Begin::AtRest { named } => {
                let states = stable_states(&scenario.circuit, &scenario.stimulus.initial);
                let fits = |state: &Bits| named.iter().all(|(net, bit)| state.get(net.index()) == *bit);
                let states: Vec<Bits> = states.into_iter().filter(fits).collect();
                assert_eq!(states.len(), 1, "one stable state to start in: {states:?}");
                states[0].clone()
            }
            _ => Bits::default(),
        };
        Run { world: self.clone(), record: run(&scenario, &rest, &instance) }
    }

    /// Chooses among several stable states of the start.
    pub fn initially(&mut self, named: &[(&str, bool)]) -> &mut World {
        self.begin = Begin::AtRest { named: named.iter().map(|(net, bit)| (self.net(net), *bit)).collect() };
        self
    }
}

/// One run by the engine.
pub fn run(scenario: &Scenario, rest: &Bits, instance: &Instance) -> Record {
    let mut recorder = Recorder::new(scenario.circuit.net_count());
    let finished = Program::with_rest(scenario, rest).machine().run(instance, &Control::default(), &mut recorder);
    assert!(finished, "nobody cancelled it");
    recorder.record
}

/// Every stable state for these inputs, by trying all of them.
pub fn stable_states(circuit: &Circuit, inputs: &[bool]) -> Vec<Bits> {
    let gates = circuit.gate_count();
    assert!(gates <= 16, "too many to try");
    let mut found = Vec::new();
    let mut values: Vec<bool> = inputs.to_vec();
    values.resize(circuit.net_count(), false);
    let mut pins = Vec::new();
    for number in 0..1u32 << gates {
        for gate in 0..gates {
            values[inputs.len() + gate] = number >> gate & 1 == 1;
        }
        let stable = circuit.gates().all(|gate| {
            pins.clear();
            pins.extend(circuit.pins(gate).iter().map(|net| values[net.index()]));
            circuit.function(gate).value(&pins) == values[circuit.net_of(gate).index()]
        });
        if stable {
            found.push(Bits::of(values.iter().copied()));
        }
    }
    found
}

/// A run with its names.
pub struct Run {
    pub world: World,
    pub record: Record,
}

impl Run {
    /// Transitions of a net as (time, new value).
    pub fn of(&self, net: &str) -> Vec<(u64, u8)> {
        self.record.of(self.world.net(net)).into_iter().map(|(at, value)| (at, value as u8)).collect()
    }

    /// The value of a net at the end of the last window.
    pub fn last(&self, net: &str) -> Value {
        self.record.windows.last().expect("a window").state[self.world.net(net).index()]
    }
}
