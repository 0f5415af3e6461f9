//! Small scenarios and results, built in code, that golden files are made of.

use std::sync::Arc;

use stillgate::circuit::{Circuit, Function, GateSpec, NetId};
use stillgate::control::Control;
use stillgate::delay::{DelayModel, DelayRange, Filter};
use stillgate::engine::{Program, Trace};
use stillgate::findings::{Fact, Kind, Measure, Shape, Subject};
use stillgate::instance::{Instance, Which};
use stillgate::logic::Bits;
use stillgate::review::RunReport;
use stillgate::scenario::{Begin, Limits, Moment, MomentKind, Place, Plan, Rules, Scenario, Step, Stimulus};
use stillgate::time::{Span, Time, Unit};

pub fn ns(text: &str) -> Span {
    Span::parse(text, Unit::Ns).unwrap()
}

pub fn at(text: &str) -> Time {
    Time::ZERO + ns(text)
}

/// A scenario in the making: nets and steps by name, delays in ns.
pub struct Case {
    title: String,
    inputs: Vec<(String, bool)>,
    gates: Vec<(String, Function, Vec<String>, [&'static str; 3])>,
    steps: Vec<Step>,
    begin: Begin,
}

impl Case {
    pub fn new(title: &str) -> Case {
        Case {
            title: title.into(),
            inputs: Vec::new(),
            gates: Vec::new(),
            steps: Vec::new(),
            begin: Begin::AtRest { named: Vec::new() },
        }
    }

    pub fn input(mut self, name: &str, value: u8) -> Case {
        self.inputs.push((name.into(), value == 1));
        self
    }

    pub fn gate(mut self, name: &str, function: Function, pins: &[&str], delay: [&'static str; 3]) -> Case {
        self.gates.push((name.into(), function, pins.iter().map(ToString::to_string).collect(), delay));
        self
    }

    pub fn begin(mut self, begin: Begin) -> Case {
        self.begin = begin;
        self
    }

    pub fn step(mut self, label: &str, place: Place, set: &[(&str, u8)]) -> Case {
        let id = |name: &str| NetId(self.inputs.iter().position(|it| it.0 == name).unwrap() as u32);
        let set = set.iter().map(|(name, value)| (id(name), *value == 1)).collect();
        self.steps.push(Step {
            label: label.into(),
            place,
            set,
            skew: None,
            bounce: None,
            expect: None,
            edges: Vec::new(),
            settle_within: None,
            oscillation: None,
            mark: Default::default(),
        });
        self
    }

    pub fn at(self, time: &str, label: &str, set: &[(&str, u8)]) -> Case {
        self.step(label, Place::At(DelayRange::exact(ns(time))), set)
    }

    pub fn after(self, time: &str, label: &str, set: &[(&str, u8)]) -> Case {
        self.step(label, Place::After(DelayRange::exact(ns(time))), set)
    }

    pub fn build(self) -> Scenario {
        let names: Vec<&str> =
            self.inputs.iter().map(|it| it.0.as_str()).chain(self.gates.iter().map(|it| it.0.as_str())).collect();
        let id = |name: &String| NetId(names.iter().position(|it| it == name).unwrap() as u32);
        let specs = self
            .gates
            .iter()
            .map(|(name, function, pins, _)| GateSpec {
                name: name.clone(),
                function: function.clone(),
                pins: pins.iter().map(id).collect(),
            })
            .collect();
        let inputs: Vec<&str> = self.inputs.iter().map(|it| it.0.as_str()).collect();
        let circuit = Circuit::new(&inputs, specs, Vec::new()).unwrap();
        let ranges = self.gates.iter().map(|gate| {
            let [min, typ, max] = gate.3.map(ns);
            [DelayRange { min, typ, max }; 2]
        });
        let delays = DelayModel {
            gate: ranges.collect(),
            gate_one_draw: vec![true; self.gates.len()],
            filter: vec![Filter::Inertial; self.gates.len()],
            ..DelayModel::default()
        };
        let mut moments = Vec::new();
        if !matches!(self.begin, Begin::AtRest { .. }) {
            moments.push(Moment { label: "power-up".into(), kind: MomentKind::PowerUp });
        }
        for (number, step) in self.steps.iter().enumerate() {
            moments.push(Moment { label: step.label.clone(), kind: MomentKind::Step(number as u32) });
        }
        let stimulus = Stimulus {
            initial: self.inputs.iter().map(|it| it.1).collect(),
            steps: self.steps,
            clocks: Vec::new(),
            moments,
        };
        let outputs: Vec<NetId> =
            circuit.gates().map(|gate| circuit.net_of(gate)).filter(|net| circuit.readers(*net).is_empty()).collect();
        Scenario {
            title: self.title,
            unit: Unit::Ns,
            circuit: Arc::new(circuit),
            delays: Arc::new(delays),
            stimulus: Arc::new(stimulus),
            rules: Arc::new(Rules::default()),
            watched: outputs.clone(),
            outputs,
            begin: self.begin,
            reference: None,
            limits: Limits::default(),
            plan: Plan::default(),
            notes: Vec::new(),
            not_analysed: Vec::new(),
            cannot_run: false,
        }
    }
}

/// The nets at 1 in the state that a circuit without hidden memory comes to, by letting gates follow their inputs.
pub fn rest(scenario: &Scenario) -> Bits {
    let circuit = &scenario.circuit;
    let mut bits = Bits::zeros(circuit.net_count());
    for (input, value) in scenario.stimulus.initial.iter().enumerate() {
        bits.set(input, *value);
    }
    for _ in 0..circuit.net_count() + 2 {
        for gate in circuit.gates() {
            let value = circuit.wants(gate, |net| bits.get(net.index()));
            bits.set(circuit.net_of(gate).index(), value);
        }
    }
    bits
}

/// One run, without facts.
pub fn run(scenario: &Scenario, which: Which) -> RunReport {
    let instance = Instance::of(scenario, &which);
    let mut trace = Trace::default();
    let program = Program::with_rest(scenario, &rest(scenario));
    assert!(program.machine().run(&instance, &Control::default(), &mut trace));
    RunReport { which, instance, trace, facts: Vec::new() }
}

pub fn net(scenario: &Scenario, name: &str) -> NetId {
    scenario.circuit.net(name).unwrap()
}

/// A glitch of this net as wide as the place.
pub fn glitch(net: NetId, shape: Shape, moment: u32, from: &str, to: &str) -> Fact {
    Fact {
        subject: Subject {
            kind: Kind::Glitch,
            shape: Some(shape),
            question: None,
            net: Some(net),
            moment: Some(moment),
        },
        breaks_rule: true,
        measure: Some(Measure::long(at(to).since(at(from)))),
        place: Some((at(from), at(to))),
    }
}

/// The interlock of two canal-lock gates: a latch of two NANDs and two drivers.
pub fn lock() -> Scenario {
    let d = ["5", "8", "13"];
    Case::new("Canal-lock gate interlock")
        .input("call_upper", 0)
        .input("call_lower", 0)
        .gate("hold_upper", Function::Nand, &["call_upper", "hold_lower"], d)
        .gate("hold_lower", Function::Nand, &["call_lower", "hold_upper"], ["6", "8.5", "15"])
        .gate("open_upper", Function::Not, &["hold_upper"], ["1.5", "6", "9"])
        .gate("open_lower", Function::Not, &["hold_lower"], ["6", "6", "6"])
        .at("100", "upper calls", &[("call_upper", 1)])
        .after("120", "both call", &[("call_lower", 1)])
        .after("200", "both let go", &[("call_upper", 0), ("call_lower", 0)])
        .after("200", "together", &[("call_upper", 1), ("call_lower", 1)])
        .build()
}
