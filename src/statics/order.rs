//! Static orders of the variables: inputs and feedback nets, each close to what it is read with.
//!
//! Which order is good can only be guessed. [`depth_first`] keeps chains of loops together, and inside a loop follows
//! the gates; [`drawn_together`] starts from there and moves nets to the middle of what they are tied to, which finds
//! the way round a long loop. Whatever the order of the feedback nets, an input comes where it is first used, so that
//! what all blocks share is on top.

use crate::circuit::{Circuit, GateId, NetId};

/// Rounds in which nets are moved.
const ROUNDS: usize = 60;

/// Feedback nets in the order of the diagram, topmost first: loop components one after the other, each after those that
/// it reads, and inside a component depth-first through its gates. Only nets that `open` admits are entered; the others
/// are constants.
pub(super) fn depth_first(circuit: &Circuit, open: impl Fn(NetId) -> bool) -> Vec<NetId> {
    let mut members = vec![Vec::new(); circuit.gate_count()];
    for gate in circuit.gates().filter(|gate| circuit.in_loop(circuit.net_of(*gate))) {
        members[circuit.component(gate) as usize].push(gate);
    }
    let order = component_order(circuit, &open, &members);
    let is_feedback = feedback_marks(circuit);
    let mut placed = vec![false; circuit.net_count()];
    let mut feedback = Vec::new();
    let mut nets = Vec::new();
    for component in order {
        for member in &members[component] {
            nets.push(circuit.net_of(*member));
            while let Some(net) = nets.pop() {
                let Some(gate) = circuit.driver(net).filter(|gate| circuit.component(*gate) as usize == component)
                else {
                    continue;
                };
                if !open(net) || std::mem::replace(&mut placed[net.index()], true) {
                    continue;
                }
                if is_feedback[net.index()] {
                    feedback.push(net);
                }
                nets.extend(circuit.sources(gate).iter().rev().map(|source| source.0));
            }
        }
    }
    feedback
}

/// The loop components, each after those that it reads, depth first.
fn component_order(circuit: &Circuit, open: &impl Fn(NetId) -> bool, members: &[Vec<GateId>]) -> Vec<usize> {
    enum Visit {
        Enter(NetId),
        Leave(usize),
    }
    let mut seen = vec![false; circuit.net_count()];
    let mut begun = vec![false; circuit.gate_count()];
    let mut order = Vec::new();
    let mut visits = Vec::new();
    for root in circuit.feedback() {
        visits.push(Visit::Enter(*root));
        while let Some(visit) = visits.pop() {
            let net = match visit {
                Visit::Enter(net) => net,
                Visit::Leave(component) => {
                    order.push(component);
                    continue;
                }
            };
            if std::mem::replace(&mut seen[net.index()], true) || !open(net) {
                continue;
            }
            let Some(gate) = circuit.driver(net) else { continue };
            if !circuit.in_loop(net) {
                visits.extend(circuit.sources(gate).iter().rev().map(|source| Visit::Enter(source.0)));
                continue;
            }
            let component = circuit.component(gate) as usize;
            if !std::mem::replace(&mut begun[component], true) {
                visits.push(Visit::Leave(component));
                for member in members[component].iter().rev() {
                    visits.extend(circuit.sources(*member).iter().rev().map(|source| Visit::Enter(source.0)));
                }
            }
        }
    }
    order
}

/// All variables: these feedback nets, the inputs that a net needs right below it unless they are further up, then the
/// inputs that only other gates or none need.
pub(super) fn with_inputs(circuit: &Circuit, open: impl Fn(NetId) -> bool, feedback: &[NetId]) -> Vec<NetId> {
    let is_feedback = feedback_marks(circuit);
    let mut placed = vec![false; circuit.net_count()];
    let mut order = Vec::new();
    let mut nets = Vec::new();
    let gates = circuit.gates().map(|gate| circuit.net_of(gate));
    for root in feedback.iter().copied().chain(gates).chain(circuit.inputs()) {
        nets.push(root);
        while let Some(net) = nets.pop() {
            // other feedback nets have their own turn
            let inner = net != root && is_feedback[net.index()];
            if inner || !open(net) || std::mem::replace(&mut placed[net.index()], true) {
                continue;
            }
            match circuit.driver(net) {
                None => order.push(net),
                Some(gate) => {
                    if is_feedback[net.index()] {
                        order.push(net);
                    }
                    nets.extend(circuit.sources(gate).iter().rev().map(|source| source.0));
                }
            }
        }
    }
    order
}

fn feedback_marks(circuit: &Circuit) -> Vec<bool> {
    let mut marks = vec![false; circuit.net_count()];
    for net in circuit.feedback() {
        marks[net.index()] = true;
    }
    marks
}

/// The feedback nets moved to the middle of what they are tied to, again and again (the idea of FORCE: Aloul, Markov and
/// Sakallah 2003): every gate pulls its nets towards their common centre. `None` if that draws nothing closer.
pub(super) fn drawn_together(
    circuit: &Circuit,
    open: impl Fn(NetId) -> bool,
    feedback: &[NetId],
) -> Option<Vec<NetId>> {
    // the nets in the given order, each feedback net followed by those between it and the next ones
    let is_feedback = feedback_marks(circuit);
    let mut nets: Vec<NetId> = Vec::new();
    let mut number = vec![u32::MAX; circuit.net_count()];
    let mut stack: Vec<NetId> = Vec::new();
    for root in feedback {
        stack.push(*root);
        while let Some(net) = stack.pop() {
            let inner = net != *root && is_feedback[net.index()];
            if !inner && open(net) && number[net.index()] == u32::MAX {
                number[net.index()] = nets.len() as u32;
                nets.push(net);
                let gate = circuit.driver(net);
                stack.extend(gate.iter().flat_map(|gate| circuit.sources(*gate)).rev().map(|source| source.0));
            }
        }
    }
    let mut pulls: Vec<Vec<u32>> = Vec::new();
    for gate in nets.iter().filter_map(|net| circuit.driver(*net)) {
        let tied = circuit.sources(gate).iter().map(|source| source.0).chain([circuit.net_of(gate)]);
        let mut pull: Vec<u32> = tied.map(|net| number[net.index()]).filter(|net| *net != u32::MAX).collect();
        pull.sort_unstable();
        pull.dedup();
        pulls.push(pull);
    }
    let start: Vec<u32> = (0..nets.len() as u32).collect();
    let mut place = start.clone();
    let (mut least, mut best) = (total_span(&pulls, &place), None);
    for _ in 0..ROUNDS {
        let (mut sum, mut ties) = (vec![0u64; nets.len()], vec![0u64; nets.len()]);
        for pull in &pulls {
            // in fixed point, so that the order is the same everywhere
            let centre = pull.iter().map(|net| u64::from(place[*net as usize])).sum::<u64>() * 256 / pull.len() as u64;
            for net in pull {
                sum[*net as usize] += centre;
                ties[*net as usize] += 1;
            }
        }
        let mut order = start.clone();
        order.sort_by_key(|net| (sum[*net as usize] / ties[*net as usize].max(1), place[*net as usize]));
        for (at, net) in order.iter().enumerate() {
            place[*net as usize] = at as u32;
        }
        let span = total_span(&pulls, &place);
        if span < least {
            (least, best) = (span, Some(order));
        }
    }
    let is_feedback = feedback_marks(circuit);
    best.map(|order| order.iter().map(|net| nets[*net as usize]).filter(|net| is_feedback[net.index()]).collect())
}

/// How far apart the nets of the gates are, all together.
fn total_span(pulls: &[Vec<u32>], place: &[u32]) -> u64 {
    let span = |pull: &Vec<u32>| {
        let places = pull.iter().map(|net| u64::from(place[*net as usize]));
        places.clone().max().unwrap_or(0) - places.min().unwrap_or(0)
    };
    pulls.iter().map(span).sum()
}
