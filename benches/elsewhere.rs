//! Stable states counted by another decision diagram library (biodivine-lib-bdd), which shares no code with ours: other
//! variables, another order, another way to put the relations together.

use biodivine_lib_bdd::{Bdd, BddVariable, BddVariableSet};
use num_bigint::BigUint;
use stillgate::circuit::{Circuit, Function, GateId, NetId};

/// The stable states of a circuit of ands, ors, nots, exclusive ors and their complements.
pub struct Elsewhere {
    /// of each net that is one
    variables: Vec<Option<BddVariable>>,
    states: Bdd,
    nets: Vec<Option<Bdd>>,
}

impl Elsewhere {
    /// One relation over inputs and feedback nets, functions by definition. The variables stand in the order in which a
    /// walk along the gates meets them.
    pub fn of(circuit: &Circuit) -> Elsewhere {
        let is_variable = |net: NetId| circuit.is_input(net) || circuit.feedback().contains(&net);
        let read = circuit.gates().flat_map(|gate| circuit.pins(gate).iter().copied().chain([circuit.net_of(gate)]));
        let mut order: Vec<NetId> = Vec::new();
        for net in read.chain(circuit.nets()) {
            if is_variable(net) && !order.contains(&net) {
                order.push(net);
            }
        }
        let space = BddVariableSet::new_anonymous(order.len() as u16);
        let mut variables = vec![None; circuit.net_count()];
        let mut nets: Vec<Option<Bdd>> = vec![None; circuit.net_count()];
        for (net, variable) in order.iter().zip(space.variables()) {
            variables[net.index()] = Some(variable);
            nets[net.index()] = Some(space.mk_var(variable));
        }
        let mut relations = Vec::new();
        let mut bound = Vec::new();
        for gate in circuit.evaluation_order() {
            let net = circuit.net_of(*gate);
            if nets[net.index()].is_some() {
                bound.push(*gate);
            } else {
                nets[net.index()] = Some(function(&space, circuit, *gate, &nets));
            }
        }
        for gate in bound {
            let own = nets[circuit.net_of(gate).index()].clone().expect("a variable");
            relations.push(own.iff(&function(&space, circuit, gate, &nets)));
        }
        // the two smallest, again and again
        while relations.len() > 1 {
            relations.sort_by_key(|relation| std::cmp::Reverse(relation.size()));
            let (a, b) = (relations.pop().expect("two"), relations.pop().expect("two"));
            relations.push(a.and(&b));
        }
        let states = relations.pop().unwrap_or_else(|| space.mk_true());
        Elsewhere { variables, states, nets }
    }

    /// How many there are.
    pub fn count(&self) -> BigUint {
        number(&self.states)
    }

    /// How many value vectors these nets show in them: vector by vector, each split by the value of the next net. Takes
    /// time for every vector.
    pub fn shown(&self, nets: &[NetId]) -> usize {
        let mut sets = vec![self.states.clone()];
        for net in nets {
            let function = self.nets[net.index()].as_ref().expect("every net has a function");
            let halves = sets.iter().flat_map(|set| [set.and(function), set.and_not(function)]);
            sets = halves.filter(|set| !set.is_false()).collect();
        }
        sets.iter().filter(|set| !set.is_false()).count()
    }

    /// How many value vectors these variables (inputs and feedback nets) take in them.
    pub fn taken(&self, nets: &[NetId]) -> BigUint {
        let asked: Vec<Option<BddVariable>> = nets.iter().map(|net| self.variables[net.index()]).collect();
        let others: Vec<BddVariable> =
            self.variables.iter().flatten().copied().filter(|variable| !asked.contains(&Some(*variable))).collect();
        number(&self.states.exists(&others)) >> others.len()
    }
}

fn number(states: &Bdd) -> BigUint {
    states.exact_cardinality().to_string().parse().expect("a number")
}

fn function(space: &BddVariableSet, circuit: &Circuit, gate: GateId, nets: &[Option<Bdd>]) -> Bdd {
    let pins = circuit.pins(gate).iter().map(|net| nets[net.index()].as_ref().expect("evaluated before it is read"));
    match circuit.function(gate) {
        Function::Not => pins.fold(space.mk_false(), |_, pin| pin.not()),
        Function::And => pins.fold(space.mk_true(), |so_far, pin| so_far.and(pin)),
        Function::Nand => pins.fold(space.mk_true(), |so_far, pin| so_far.and(pin)).not(),
        Function::Or => pins.fold(space.mk_false(), |so_far, pin| so_far.or(pin)),
        Function::Nor => pins.fold(space.mk_false(), |so_far, pin| so_far.or(pin)).not(),
        Function::Xor => pins.fold(space.mk_false(), |so_far, pin| so_far.xor(pin)),
        other => panic!("{other:?} is not in these networks"),
    }
}
