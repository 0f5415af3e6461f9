//! Names, functions and pins: from what was said of gates to a circuit.

use rustc_hash::FxHashSet;

use super::context::{Context, Nets, name_list};
use super::said::{NewDelay, NewFunction, NewGate, Said};
use crate::circuit::{Arity, Circuit, Expr, Function, GateId, GateSpec, NetId, is_net_name};
use crate::scenario::{Fault, Mark};

impl NewGate {
    pub(super) fn new(name: Said<String>, function: NewFunction, pins: Vec<Said<String>>) -> NewGate {
        let function = Said::at(function, name.mark);
        NewGate { name, function, pins, wires: Vec::new(), filter: None, delays: NewDelay::default() }
    }
}

/// The names of a network by number. Of a name that comes twice the first counts; see [`network`] for the fault.
pub(super) fn names<'a>(inputs: &'a [(Said<String>, bool)], gates: &'a [NewGate]) -> Nets<'a> {
    let all = inputs.iter().map(|(name, _)| name).chain(gates.iter().map(|gate| &gate.name));
    let mut nets = Nets { inputs: inputs.len(), ..Nets::default() };
    for name in all {
        nets.ids.entry(&name.what).or_insert(NetId(nets.names.len() as u32));
        nets.names.push(&name.what);
        nets.marks.push(name.mark);
    }
    nets
}

/// A checked network: as many gates as were told, so that numbers agree whatever is wrong.
pub(super) struct Network<'a> {
    inputs: Vec<&'a str>,
    gates: Vec<GateSpec>,
    pub wires: Vec<(NetId, GateId)>,
    /// For each wire, what was said of its delay.
    pub wire_delays: Vec<&'a NewDelay>,
    /// For each wire, where its net was named.
    pub wire_marks: Vec<Mark>,
}

/// Checks names, functions, pins and wires of a network whose names the context knows. Names before number `unchecked`
/// are not checked: those of the reference's inputs are the circuit's.
pub(super) fn network<'a>(
    context: &mut Context<'_>,
    inputs: &'a [(Said<String>, bool)],
    gates: &'a [NewGate],
    unchecked: usize,
) -> Network<'a> {
    check_names(context, inputs, gates, unchecked);
    if gates.is_empty() && context.faults.is_empty() {
        let help = "add at least one gate under `[gates]`, as in `q = { nor = [\"r\", \"qn\"] }`";
        context.faults.add(Mark::default(), "there is no gate", help);
    }
    let mut network = Network {
        inputs: inputs.iter().map(|(name, _)| name.what.as_str()).collect(),
        gates: Vec::with_capacity(gates.len()),
        wires: Vec::new(),
        wire_delays: Vec::new(),
        wire_marks: Vec::new(),
    };
    let mut hides: Vec<&NewGate> = Vec::new();
    for (number, gate) in gates.iter().enumerate() {
        let spec = gate_spec(context, gate);
        if spec.function.hides_hazards() {
            hides.push(gate);
        }
        if !matches!(gate.function.what, NewFunction::Unreadable) {
            wires(context, gate, &spec, GateId(number as u32), &mut network);
        }
        network.gates.push(spec);
    }
    if let Some(first) = hides.first() {
        let names = name_list(hides.iter().map(|gate| gate.name.what.as_str()));
        let note = match hides.len() {
            1 => "as one gate it can show no hazard of its own; if it is built of several gates, write them",
            _ => "as one gate each can show no hazard of its own; if one is built of several gates, write them",
        };
        context.note(first.name.mark, format!("{names}: {note}"));
    }
    network
}

fn check_names(context: &mut Context<'_>, inputs: &[(Said<String>, bool)], gates: &[NewGate], unchecked: usize) {
    let all = inputs.iter().map(|(name, _)| name).chain(gates.iter().map(|gate| &gate.name));
    for (number, name) in all.enumerate().skip(unchecked) {
        if !is_net_name(&name.what) {
            let help = "a name is a letter or `_`, then letters, digits, `_`, `.`, `[` or `]`";
            context.faults.add(name.mark, format!("`{}` is no net name", name.what), help);
            continue;
        }
        let first = context.nets.ids[name.what.as_str()].index();
        if first == number {
            continue;
        }
        let fault = if first < inputs.len() && number >= inputs.len() {
            let message = format!("`{}` is an input, and a gate drives it", name.what);
            Fault::new(name.mark, message, "rename the gate, or remove the input")
                .related(context.nets.marks[first], "the input")
        } else {
            let message = format!("net `{}` is driven twice", name.what);
            Fault::new(name.mark, message, "give one of them another name")
                .related(context.nets.marks[first], "first driven here")
        };
        context.faults.push(fault);
    }
}

/// The gate's function and pins. What is wrong is reported and replaced by something harmless.
fn gate_spec(context: &mut Context<'_>, gate: &NewGate) -> GateSpec {
    let name = gate.name.what.clone();
    let harmless = |name| GateSpec { name, function: Function::Buf, pins: vec![NetId(0)] };
    match &gate.function.what {
        NewFunction::Unreadable => harmless(name),
        NewFunction::Expr => {
            let text = &gate.pins[0];
            let expr = match Expr::parse(&text.what) {
                Ok(expr) => expr,
                Err(error) => {
                    let (message, help) = match error.what.split_once("; ") {
                        Some((message, help)) => (message, help),
                        None => ("this is no Boolean expression", error.what.as_str()),
                    };
                    let at = error.at.clone();
                    context.faults.push(Fault::new(text.mark, message, help).within(at));
                    return harmless(name);
                }
            };
            let mut pins = Vec::with_capacity(expr.nets().len());
            for net in expr.nets() {
                match context.nets.ids.get(&**net) {
                    Some(id) => pins.push(*id),
                    None => {
                        let help = context.name_help(net);
                        let message = undriven(&name, net);
                        let fault = Fault::new(text.mark, message, help);
                        context.faults.push(match place_of(&text.what, net) {
                            Some(at) => fault.within(at..at + net.len()),
                            None => fault,
                        });
                        pins.push(NetId(0));
                    }
                }
            }
            GateSpec { name, function: Function::Expr(expr), pins }
        }
        NewFunction::Known(function) => {
            let wanted = function.arity();
            if !wanted.accepts(gate.pins.len()) {
                let message = format!("`{}` takes {wanted}, not {}", function.name(), gate.pins.len());
                context.faults.add(gate.function.mark, message, arity_help(function, gate.pins.len()));
            }
            let mut pins = Vec::with_capacity(gate.pins.len());
            for pin in &gate.pins {
                match context.nets.ids.get(pin.what.as_str()) {
                    Some(id) => pins.push(*id),
                    None => {
                        let help = context.name_help(&pin.what);
                        context.faults.add(pin.mark, undriven(&name, &pin.what), help);
                    }
                }
            }
            GateSpec { name, function: function.clone(), pins }
        }
    }
}

fn undriven(gate: &str, net: &str) -> String {
    format!("gate `{gate}` reads net `{net}`, which nothing drives")
}

fn arity_help(function: &Function, pins: usize) -> &'static str {
    match (function, pins) {
        (Function::Nand | Function::Nor | Function::Xnor, 1) => "for one input use `not`",
        (Function::And | Function::Or | Function::Xor, 1) => "for one input use `buf`",
        (Function::Buf, 2..) => "for several inputs use `and`, `or` or another function",
        (Function::Not, 2..) => "for several inputs use `nand`, `nor` or another function",
        (Function::Mux, _) => "write select, value when 0, value when 1",
        (Function::Majority, _) => "an even number has no majority: add or remove an input",
        _ if function.arity() == Arity::Exactly(1) => "name the net that it reads",
        _ => "name all nets that it reads",
    }
}

/// Where a net's name stands in an expression (bytes).
fn place_of(text: &str, net: &str) -> Option<usize> {
    let part_of_name = |c: char| c.is_alphanumeric() || matches!(c, '_' | '.' | '[' | ']');
    text.match_indices(net)
        .map(|(at, _)| at)
        .find(|&at| !text[..at].ends_with(part_of_name) && !text[at + net.len()..].starts_with(part_of_name))
}

fn wires<'a>(context: &mut Context<'_>, gate: &'a NewGate, spec: &GateSpec, id: GateId, network: &mut Network<'a>) {
    if gate.wires.is_empty() {
        return;
    }
    let pins: FxHashSet<NetId> = spec.pins.iter().copied().collect();
    let mut seen = FxHashSet::default();
    for (name, delays) in &gate.wires {
        let Some(net) = context.net(name) else { continue };
        if !pins.contains(&net) {
            let message = format!("gate `{}` does not read `{}`", gate.name.what, name.what);
            let help = "a wire leads from a net to a gate that reads it: correct the name, or remove the wire";
            context.faults.push(Fault::new(name.mark, message, help).related(gate.function.mark, "what it reads"));
        } else if !seen.insert(net) {
            context.named_twice(name);
        } else {
            network.wires.push((net, id));
            network.wire_delays.push(delays);
            network.wire_marks.push(name.mark);
        }
    }
}

/// The outputs as told, else the gates that no other gate reads, else all gates.
pub(super) fn outputs(context: &mut Context<'_>, told: Option<&[Said<String>]>, network: &Network<'_>) -> Vec<NetId> {
    if let Some(names) = told {
        return context.list(names).into_iter().map(|(net, _)| net).collect();
    }
    let inputs = network.inputs.len();
    let mut read = vec![false; inputs + network.gates.len()];
    for (g, gate) in network.gates.iter().enumerate() {
        for pin in gate.pins.iter().filter(|pin| pin.index() != inputs + g) {
            read[pin.index()] = true;
        }
    }
    let gates = || (inputs..read.len()).map(|net| NetId(net as u32));
    let unread: Vec<NetId> = gates().filter(|net| !read[net.index()]).collect();
    if unread.is_empty() { gates().collect() } else { unread }
}

impl Network<'_> {
    /// The circuit, if nothing was wrong.
    pub fn build(self, context: &mut Context<'_>) -> Option<Circuit> {
        if !context.faults.is_empty() {
            return None;
        }
        match Circuit::new(&self.inputs, self.gates, self.wires) {
            Ok(circuit) => Some(circuit),
            Err(error) => {
                context.faults.add(Mark::default(), error.to_string(), "correct this gate");
                None
            }
        }
    }

    pub fn gate_name(&self, gate: GateId) -> &str {
        &self.gates[gate.index()].name
    }

    pub fn function(&self, gate: usize) -> &Function {
        &self.gates[gate].function
    }
}
