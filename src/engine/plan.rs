//! A scenario in the form that the kernel runs: flat arrays that no run changes.

use std::sync::Arc;

use super::observer::Site;
use crate::circuit::{Circuit, Compiled, GateId, NetId, WireId};
use crate::delay::Filter;
use crate::instance::Instance;
use crate::logic::{Bits, State, Value};
use crate::scenario::{Begin, Limits, Place, Scenario, Stimulus};
use crate::time::Span;

/// One reader of a node's value: a gate, or a wire (numbers from the number of gates on).
#[derive(Clone, Copy, Debug)]
pub(super) struct Fan {
    pub node: u32,
    pub weight: u64,
}

/// What a node is.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Kind {
    /// Is its function a one-word table?
    pub table: bool,
    /// What it does with the changes of its function.
    pub rule: Rule,
}

/// What a node does with the changes of its function.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Rule {
    /// A gate with one pending event.
    Inertial,
    /// A gate that passes every pulse.
    Transport,
    /// A gate that swallows pulses up to a limit.
    Reject,
    /// A gate whose delay depends on its last change.
    Involution,
    /// The end of a wire.
    Wire,
}

impl Kind {
    /// Do its pending events wait in a list?
    pub(super) fn is_listed(self) -> bool {
        self.rule != Rule::Inertial
    }
}

/// What a step does, where it is the simple case: one input, without skew and bounce.
#[derive(Clone, Copy, Debug)]
pub(super) struct Simple {
    /// The input and its value; `None` if the step is not simple.
    pub sets: Option<(NetId, bool)>,
    /// Its moment.
    pub moment: u32,
    /// What its time counts from.
    pub from: From,
}

/// What the time of a step counts from.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum From {
    Start,
    StepBefore,
    Rest,
    Pattern,
}

#[derive(Clone, Debug)]
pub(super) struct Plan {
    pub circuit: Arc<Circuit>,
    pub stimulus: Arc<Stimulus>,
    /// One a step.
    pub steps: Vec<Simple>,
    pub limits: Limits,
    pub inputs: u32,
    pub gates: u32,
    /// Does the run begin with a power-up window?
    pub power_up: bool,
    /// The state at the start, where it is the same in every run.
    pub start: Option<State>,
    pub fan: Vec<Fan>,
    pub input_fan: Vec<(u32, u32)>,
    node_fan: Vec<(u32, u32)>,
    kinds: Vec<Kind>,
    /// For each gate its reject limit or time constant; empty where no gate has one.
    figures: Vec<Span>,
}

impl Plan {
    /// `rest` is the stable state of the start, for a run that begins at rest.
    pub(super) fn new(scenario: &Scenario, rest: Option<&Bits>) -> Plan {
        let circuit = scenario.circuit.clone();
        let (inputs, gates) = (circuit.input_count(), circuit.gate_count());
        let mut fan = Vec::new();
        let mut net_fan = |net: NetId| {
            let first = fan.len() as u32;
            for reader in circuit.readers(net) {
                let node = reader.wire.map_or(reader.gate.0, |wire| gates as u32 + wire.0);
                fan.push(Fan { node, weight: reader.weight });
            }
            (first, fan.len() as u32)
        };
        let input_fan = circuit.inputs().map(&mut net_fan).collect();
        let mut node_fan: Vec<(u32, u32)> = circuit.gates().map(|gate| net_fan(circuit.net_of(gate))).collect();
        for &(net, gate) in circuit.wires() {
            let weight = circuit.sources(gate).iter().find(|source| source.0 == net).map_or(0, |source| source.1);
            node_fan.push((fan.len() as u32, fan.len() as u32 + 1));
            fan.push(Fan { node: gate.0, weight });
        }
        let filters = &scenario.delays.filter;
        let mut kinds: Vec<Kind> = circuit
            .gates()
            .map(|gate| Kind {
                table: matches!(circuit.compiled(gate), Compiled::Table(_)),
                rule: match filters[gate.index()] {
                    Filter::Inertial => Rule::Inertial,
                    Filter::Transport => Rule::Transport,
                    Filter::Reject(_) => Rule::Reject,
                    Filter::Involution(_) => Rule::Involution,
                },
            })
            .collect();
        kinds.resize(gates + circuit.wire_count(), Kind { table: false, rule: Rule::Wire });
        let figure = |filter: &Filter| match filter {
            Filter::Reject(span) | Filter::Involution(span) => *span,
            Filter::Inertial | Filter::Transport => Span::ZERO,
        };
        let figures = match filters.iter().any(|filter| figure(filter) > Span::ZERO) {
            true => filters.iter().map(figure).collect(),
            false => Vec::new(),
        };

        let stimulus = &scenario.stimulus;
        let steps = (0u32..)
            .zip(&stimulus.steps)
            .map(|(number, step)| Simple {
                sets: match step.set.as_slice() {
                    [set] if step.skew.is_none() && step.bounce.is_none() => Some(*set),
                    _ => None,
                },
                moment: stimulus.moment_of_step(number),
                from: match step.place {
                    Place::At(_) => From::Start,
                    Place::After(_) => From::StepBefore,
                    Place::Rest(_) => From::Rest,
                    Place::When { .. } => From::Pattern,
                },
            })
            .collect();

        let with_inputs = |gate: Value| {
            let mut state = State::zeros(circuit.net_count());
            for (input, value) in scenario.stimulus.initial.iter().enumerate() {
                state.set(input, Value::from(*value));
            }
            for net in inputs..inputs + gates {
                state.set(net, gate);
            }
            state
        };
        let start = match &scenario.begin {
            Begin::AtRest { .. } => rest.map(|rest| State::known(rest.clone())),
            Begin::Random => None,
            Begin::Unknown => Some(with_inputs(Value::X)),
        };
        Plan {
            stimulus: scenario.stimulus.clone(),
            steps,
            limits: scenario.limits,
            inputs: inputs as u32,
            gates: gates as u32,
            power_up: !matches!(scenario.begin, Begin::AtRest { .. }),
            start,
            fan,
            input_fan,
            node_fan,
            kinds,
            figures,
            circuit,
        }
    }

    pub(super) fn nodes(&self) -> usize {
        self.kinds.len()
    }

    pub(super) fn kind(&self, node: u32) -> Kind {
        self.kinds[node as usize]
    }

    pub(super) fn fan_range(&self, node: u32) -> (u32, u32) {
        self.node_fan[node as usize]
    }

    pub(super) fn table(&self, node: u32) -> u64 {
        match (node < self.gates).then(|| self.circuit.compiled(GateId(node))) {
            Some(Compiled::Table(table)) => *table,
            _ => 0,
        }
    }

    /// The net that a wire comes from.
    pub(super) fn wire_source(&self, wire: usize) -> NetId {
        self.circuit.wires()[wire].0
    }

    /// The block that a node belongs to.
    pub(super) fn block(&self, node: u32) -> u32 {
        let gate = node.checked_sub(self.gates).map_or(GateId(node), |wire| self.circuit.wires()[wire as usize].1);
        self.circuit.block(gate)
    }

    /// The gate or wire that a node is.
    pub(super) fn site(&self, node: u32) -> Site {
        node.checked_sub(self.gates).map_or(Site::Gate(GateId(node)), |wire| Site::Wire(WireId(wire)))
    }

    /// The net of the gate that a node belongs to.
    pub(super) fn owner(&self, node: u32) -> NetId {
        let gate = match node.checked_sub(self.gates) {
            None => GateId(node),
            Some(wire) => self.circuit.wires()[wire as usize].1,
        };
        self.circuit.net_of(gate)
    }

    /// The state at the start of one case, where it differs from run to run.
    pub(super) fn open_start(&self, instance: &Instance, state: &mut State) {
        for (input, value) in self.stimulus.initial.iter().enumerate() {
            state.set(input, Value::from(*value));
        }
        for gate in 0..self.gates as usize {
            state.set(self.inputs as usize + gate, Value::from(instance.start.get(gate)));
        }
    }

    /// The reject limit or time constant of a gate that has one.
    pub(super) fn figure(&self, gate: u32) -> Span {
        self.figures[gate as usize]
    }

    /// Does any gate's delay depend on its last change?
    pub(super) fn has_involution(&self) -> bool {
        self.kinds.iter().any(|kind| kind.rule == Rule::Involution)
    }

    /// Does any node keep a list of pending events?
    pub(super) fn needs_lists(&self) -> bool {
        self.kinds.iter().any(|kind| kind.is_listed())
    }
}
