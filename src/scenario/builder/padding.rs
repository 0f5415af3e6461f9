//! `[padding]`: names to gates and wires.

use super::circuit::Network;
use super::context::Context;
use super::said::Said;
use crate::circuit::{GateId, WireId};
use crate::scenario::Padded;

/// Checks what may be padded, told as the name of a gate or as `net -> gate` for a wire.
pub(super) fn check(
    context: &mut Context<'_>,
    told: Option<&[Said<String>]>,
    network: &Network<'_>,
) -> Option<Vec<Padded>> {
    let told = told?;
    if told.is_empty() {
        return Some(Vec::new());
    }
    let mut all: Vec<(Padded, &Said<String>)> = Vec::new();
    for name in told {
        let found = match name.what.split_once("->") {
            Some((from, to)) => wire(context, name, from.trim(), to.trim(), network),
            None => gate(context, name, &name.what),
        };
        let Some(found) = found else { continue };
        if all.iter().any(|it| it.0 == found) {
            context.faults.add(name.mark, format!("`{}` is allowed twice", name.what), "name it once");
        } else {
            all.push((found, name));
        }
    }
    let mut all: Vec<Padded> = all.into_iter().map(|it| it.0).collect();
    all.sort_unstable();
    Some(all)
}

fn gate(context: &mut Context<'_>, name: &Said<String>, of: &str) -> Option<Padded> {
    let net = context.net(&Said::at(of.to_string(), name.mark))?;
    if context.is_input(net) {
        let help = "name gates, or wires from a net to a gate as in \"a -> g\"";
        context.faults.add(name.mark, format!("`{of}` is an input and has no delay"), help);
        return None;
    }
    Some(Padded::Gate(GateId((net.index() - context.nets.inputs) as u32)))
}

fn wire(context: &mut Context<'_>, name: &Said<String>, from: &str, to: &str, network: &Network<'_>) -> Option<Padded> {
    let net = context.net(&Said::at(from.to_string(), name.mark));
    let gate = gate(context, name, to);
    let (net, Padded::Gate(gate)) = (net?, gate?) else { return None };
    let found = network.wires.iter().position(|wire| *wire == (net, gate));
    if found.is_none() {
        let help = format!("give `{to}` a wire, as in `wires = {{ {from} = \"1 fs\" }}`");
        context.faults.add(
            name.mark,
            format!("there is no wire from `{from}` to `{to}` with a delay of its own"),
            help,
        );
    }
    found.map(|wire| Padded::Wire(WireId(wire as u32)))
}
