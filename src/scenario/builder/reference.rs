//! The reference network: the same checks as for the circuit, with its own names.

use super::Builder;
use super::circuit::{names, network};
use super::context::Context;
use super::said::{NewFunction, NewGate, NewReference, Said};
use crate::circuit::{Function, NetId};
use crate::scenario::{Fault, Faults, Mark, RefNet, Reference};

impl NewReference {
    /// A gate of the reference, which has no delay; it reads the circuit's inputs and the reference's gates.
    pub fn gate<P: Into<Said<String>>>(
        &mut self,
        name: impl Into<Said<String>>,
        function: Function,
        pins: impl IntoIterator<Item = P>,
    ) -> &mut NewGate {
        let pins = pins.into_iter().map(Into::into).collect();
        self.push(NewGate::new(name.into(), NewFunction::Known(function), pins))
    }

    /// A gate of the reference that computes a Boolean expression.
    pub fn expr(&mut self, name: impl Into<Said<String>>, text: impl Into<Said<String>>) -> &mut NewGate {
        self.push(NewGate::new(name.into(), NewFunction::Expr, vec![text.into()]))
    }

    /// A gate whose function could not be read, which was reported elsewhere.
    pub fn unreadable_gate(&mut self, name: impl Into<Said<String>>) -> &mut NewGate {
        self.push(NewGate::new(name.into(), NewFunction::Unreadable, Vec::new()))
    }

    /// One more net to compare; without any, the outputs.
    pub fn compare(&mut self, net: impl Into<Said<String>>) -> &mut NewReference {
        self.compare.get_or_insert_default().push(net.into());
        self
    }

    fn push(&mut self, gate: NewGate) -> &mut NewGate {
        self.gates.push(gate);
        self.gates.last_mut().expect("just pushed")
    }
}

/// Checks the reference, if there is one; `outputs` are the default of the nets to compare.
pub(super) fn check(context: &mut Context<'_>, told: &Builder, outputs: &[NetId]) -> Option<Reference> {
    let said = told.reference.as_ref()?;
    if said.gates.is_empty() {
        let help = "add its gates under `[reference.gates]`, or remove the reference";
        context.faults.add(said.mark, "the reference has no gates", help);
        return None;
    }

    // names of the circuit's inputs were checked with the circuit
    let mut own = Context::new(names(&told.inputs, &said.gates), context.unit, Faults::default());
    let network = network(&mut own, &told.inputs, &said.gates, told.inputs.len());

    let compare = match &said.compare {
        Some(list) => {
            if list.is_empty() {
                let help = "name nets, or leave it out to compare the outputs";
                context.faults.add(said.mark, "`compare` names no net", help);
            }
            context.list(list)
        }
        None => outputs.iter().map(|net| (*net, said.mark)).collect(),
    };
    let compare =
        compare.into_iter().filter_map(|(net, mark)| Some((net, of_reference(context, &mut own, net, mark)?)));
    let compare: Vec<(NetId, RefNet)> = compare.collect();

    context.faults.append(std::mem::take(&mut own.faults));
    if !context.faults.is_empty() {
        return None;
    }
    let built = network.build(&mut own);
    context.faults.append(own.faults);
    built.map(|circuit| Reference { circuit, compare })
}

fn of_reference(context: &mut Context<'_>, own: &mut Context<'_>, net: NetId, mark: Mark) -> Option<RefNet> {
    let name = context.nets.names[net.index()];
    if let Some(found) = own.nets.ids.get(name) {
        return Some(RefNet(*found));
    }
    let help = match own.likely(name) {
        Some(likely) => format!("add it under `[reference.gates]`; did you mean `{likely}`?"),
        None => "add it under `[reference.gates]`, or name other nets in `compare`".to_string(),
    };
    context.faults.push(Fault::new(mark, format!("the reference has no net `{name}`"), help));
    None
}
