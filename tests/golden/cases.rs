//! Small scenarios and results, built in code, that golden files are made of.

use std::sync::Arc;

use stillgate::circuit::{Circuit, Function, GateId, GateSpec, NetId};
use stillgate::control::Control;
use stillgate::delay::{DelayModel, DelayRange, Filter};
use stillgate::engine::{Change, End, Hit, Program, Trace};
use stillgate::findings::{Fact, Kind, Measure, Shape, Subject};
use stillgate::instance::{Instance, Which};
use stillgate::logic::Bits;
use stillgate::review::RunReport;
use stillgate::scenario::{
    Begin, Clock, GlitchFree, Limits, Moment, MomentKind, Never, Place, Plan, Rules, Scenario, Step, Stimulus,
};
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
            walk: Default::default(),
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
            padding: None,
            plot: Default::default(),
            conditions: Vec::new(),
            notes: Vec::new(),
            not_analysed: Vec::new(),
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
    RunReport { which, instance, trace, facts: Vec::new(), judged: 1, not_judged: Vec::new(), against: Vec::new() }
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
    let mut scenario = Case::new("Canal-lock gate interlock")
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
        .build();
    let both = ["open_upper", "open_lower"].map(|name| net(&scenario, name));
    let glitch_free = |net| GlitchFree { net, shorter_than: Span::ZERO, mark: Default::default() };
    scenario.rules = Arc::new(Rules {
        never: vec![Never {
            name: Some("both gates open".into()),
            state: both.iter().map(|net| (*net, true)).collect(),
            longer_than: Span::ZERO,
            mark: Default::default(),
        }],
        glitch_free: both.map(glitch_free).into(),
        settle_within: Some(ns("20")),
        ..Rules::default()
    });
    scenario.notes.push("open_lower has an exact delay".into());
    scenario.not_analysed.push("plot is not analysed yet.".into());
    let mut delays = (*scenario.delays).clone();
    delays.assumed_min.push(GateId(2));
    delays.no_delay.push(GateId(3));
    scenario.delays = Arc::new(delays);
    scenario
}

/// A multiplexer of gates with a static-1 hazard, watched through two more gates.
pub fn hazard() -> Scenario {
    Case::new("Lamp selector <day & night>, \"first\" draft")
        .input("day", 1)
        .input("call", 1)
        .input("bell", 1)
        .gate("night", Function::Not, &["day"], ["4", "5", "6"])
        .gate("by_day", Function::And, &["day", "call"], ["2", "3", "4"])
        .gate("by_night", Function::And, &["night", "bell"], ["2", "2.9", "4"])
        .gate("lamp", Function::Or, &["by_day", "by_night"], ["2", "3", "4"])
        .gate("horn", Function::Not, &["lamp"], ["2", "3", "4"])
        .at("20", "dusk", &[("day", 0)])
        .after("60", "dawn", &[("day", 1)])
        .after("60", "dusk again & <late>", &[("day", 0), ("call", 0)])
        .build()
}

pub fn hazard_facts(scenario: &Scenario) -> Vec<Fact> {
    let (lamp, horn, night) = (net(scenario, "lamp"), net(scenario, "horn"), net(scenario, "night"));
    let mut late = glitch(lamp, Shape::Static1, 2, "146", "150.9");
    let mut swallowed = glitch(horn, Shape::Dynamic, 1, "83", "85.9");
    swallowed.subject.kind = Kind::Swallowed;
    swallowed.subject.shape = None;
    swallowed.measure = Some(Measure::share(ns("2.9"), ns("3")));
    swallowed.breaks_rule = false;
    let mut never = glitch(night, Shape::Static0, 0, "26", "29");
    never.subject = Subject { kind: Kind::Never, shape: None, question: None, net: None, moment: Some(0) };
    late.subject.kind = Kind::MinPulse;
    vec![
        glitch(lamp, Shape::Static1, 0, "26", "30.9"),
        late,
        glitch(lamp, Shape::Dynamic, 1, "86", "86.2"),
        glitch(lamp, Shape::Static0, 1, "88", "88.001"),
        swallowed,
        never,
    ]
}

/// A gated ring of three inverting gates.
pub fn ring(limit: u64) -> Scenario {
    let d = ["2", "3", "4"];
    let mut scenario = Case::new("Bell")
        .input("ring", 0)
        .gate("a", Function::Nand, &["ring", "c"], d)
        .gate("b", Function::Not, &["a"], ["1", "2", "3"])
        .gate("c", Function::Not, &["b"], d)
        .gate("hammer", Function::Buf, &["c"], d)
        .gate("still", Function::Not, &["ring"], d)
        .at("10", "press", &[("ring", 1)])
        .build();
    scenario.limits.transitions = limit;
    scenario
}

/// Power-up from unknown values, then a clear.
pub fn unknown() -> Scenario {
    let d = ["2", "3", "4"];
    Case::new("Latch after power-up")
        .input("clear", 0)
        .input("load", 0)
        .gate("q", Function::Nor, &["clear", "qn"], d)
        .gate("qn", Function::Nor, &["load", "q"], ["3", "4", "5"])
        .gate("both", Function::And, &["q", "qn"], d)
        .gate("steady", Function::Not, &["load"], d)
        .begin(Begin::Unknown)
        .at("20", "clear", &[("clear", 1)])
        .after("20", "let go", &[("clear", 0)])
        .build()
}

/// A chain of buffers and inverters, this many nets in all, and this many steps.
pub fn chain(nets: usize, steps: usize, apart: &str) -> Scenario {
    let mut case = Case::new("Chain of gauges").input("level", 0);
    let mut before = "level".to_string();
    for i in 1..nets {
        let name = format!("gauge_{i}");
        let function = if i % 3 == 0 { Function::Not } else { Function::Buf };
        case = case.gate(&name, function, &[&before], ["1", "2", "3"]);
        before = name;
    }
    for step in 0..steps {
        let label = format!("tide {}", if step % 2 == 0 { "rises" } else { "falls again" });
        let value = u8::from(step % 2 == 0);
        case = case.after(apart, &format!("{label} {}", step / 2 + 1), &[("level", value)]);
    }
    case.build()
}

/// Names and labels of 200 letters, and letters that no picture may hold.
pub fn long_names() -> Scenario {
    let name = |tail: &str| format!("{}_{tail}", "n".repeat(200));
    let (a, b, c) = (name("a[0]"), name("a[1]"), name("late"));
    let d = ["1", "2", "3"];
    Case::new(&format!("Title\u{1}\n<b>{}</b> & \"more\"", " and on".repeat(30)))
        .input("x", 0)
        .input(&a, 0)
        .gate(&b, Function::Buf, &["x"], d)
        .gate(&c, Function::Not, &[&b], d)
        .at("10", &format!("first {}", "label ".repeat(34)), &[("x", 1)])
        .after("10", "<script>alert(1)</script>", &[("x", 0), (&a, 1)])
        .build()
}

/// Goes on with the last window of a ring for this many changes more, as if no recurrence had been found.
pub fn without_recurrence(scenario: &Scenario, report: &mut RunReport, more: usize) {
    let trace = &mut report.trace;
    let period: Vec<_> = trace.changes[trace.changes.len() - 8..].to_vec();
    let length = ns("16").fs();
    for round in 1..=(more / 8) as u64 {
        trace
            .changes
            .extend(period.iter().map(|change| Change { at: change.at + Span::from_fs(length * round), ..*change }));
    }
    let end = trace.changes.last().unwrap().at;
    let window = trace.windows.last_mut().unwrap();
    (window.stop, window.end) = (end, End::Unsettled(Hit::Transitions));
    trace.end = end;
    assert!(scenario.circuit.net_count() < 10);
}

/// A divider with a clock that is too fast for its last stage.
pub fn clocked() -> Scenario {
    let d = ["1", "2", "3"];
    let mut scenario = Case::new("Bell divider")
        .input("tick", 0)
        .input("hush", 0)
        .gate("late", Function::Buf, &["tick"], ["7", "8", "9"])
        .gate("later", Function::Buf, &["late"], ["7", "8", "9"])
        .gate("bell", Function::Nor, &["later", "hush"], d)
        .at("33", "hush", &[("hush", 1)])
        .build();
    let exact = |text: &str| DelayRange::exact(ns(text));
    let mut stimulus = (*scenario.stimulus).clone();
    stimulus.clocks.push(Clock {
        net: net(&scenario, "tick"),
        first: exact("10"),
        period: exact("24"),
        high: exact("12"),
        jitter: Span::ZERO,
        count: 8,
        mark: Default::default(),
    });
    for edge in 0..16 {
        let label = format!("tick {} {}", if edge % 2 == 0 { "rise" } else { "fall" }, edge / 2 + 1);
        stimulus.moments.push(Moment { label, kind: MomentKind::Edge { clock: 0, edge } });
    }
    scenario.stimulus = Arc::new(stimulus);
    scenario
}
