//! The general multiple-winner method (Brzozowski and Yoeli 1979; Brzozowski and Seger, *Asynchronous Circuits*, 1995,
//! from memory) done plainly: every non-empty set of excited gates may change at once, every state is visited, nothing
//! is taken apart or left out. Slow, and written from the definition alone.

use stillgate::circuit::{Circuit, Function, NetId};
use stillgate::logic::{Bits, State, Value};
use stillgate::statics::{Change, Race};

/// Where delays are, beside those of the gates.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Delays {
    /// Nowhere.
    Gates,
    /// In the wire from every net to every gate that reads it, too.
    GatesAndWires,
}

/// Something that takes a value after a delay.
enum Element {
    /// An input; it wants a value only while a change that takes its time is under way.
    Input,
    /// The elements that a gate reads, pin by pin, and its value for every row of pins, pin 0 as the lowest digit.
    Gate(Vec<usize>, Vec<bool>),
    /// A wire from an element.
    Wire(usize),
}

/// A circuit ready to be explored. A state is a number: bit `i` is the value of element `i`; nets come first, in order.
pub struct Explorer {
    inputs: usize,
    nets: usize,
    elements: Vec<Element>,
    /// For each gate that lies in a loop with others or itself: the elements of that loop component.
    loops: Vec<u32>,
}

/// What was found.
pub struct Explored {
    /// The stable states that can be reached, over all nets, in lexicographic order.
    pub stable: Vec<Vec<bool>>,
    /// The largest strongly connected sets of two and more states in which no gate is excited with the same value
    /// throughout; the states over all nets, in lexicographic order, each once.
    pub cycles: Vec<Vec<Vec<bool>>>,
    /// All states that can be reached, likewise.
    pub reached: Vec<Vec<bool>>,
    /// Stable states, states of lasting cycles, and whatever these reach, likewise.
    pub outcome: Vec<Vec<bool>>,
    /// More than one outcome is critical; else two excited nets of one loop component in one state.
    pub race: Race,
}

impl Explorer {
    pub fn new(circuit: &Circuit, delays: Delays) -> Explorer {
        let (inputs, nets) = (circuit.input_count(), circuit.net_count());
        let mut elements: Vec<Element> = (0..inputs).map(|_| Element::Input).collect();
        let mut wires = Vec::new();
        for gate in circuit.gates() {
            let mut own: Vec<(NetId, usize)> = Vec::new();
            let mut read = |net: NetId| {
                if delays == Delays::Gates {
                    return net.index();
                }
                if let Some((_, wire)) = own.iter().find(|(known, _)| *known == net) {
                    return *wire;
                }
                wires.push(Element::Wire(net.index()));
                own.push((net, nets + wires.len() - 1));
                nets + wires.len() - 1
            };
            let pins = circuit.pins(gate).iter().map(|net| read(*net)).collect();
            elements.push(Element::Gate(pins, table(circuit.function(gate), circuit.pins(gate).len())));
        }
        elements.extend(wires);
        assert!(elements.len() <= 20, "too large to visit every state");
        Explorer { inputs, nets, loops: loops(circuit), elements }
    }

    /// Every stable state, over all nets, by trying.
    pub fn stable_states(&self) -> Vec<Vec<bool>> {
        assert_eq!(self.elements.len(), self.nets, "wires only repeat what their nets say");
        let every = 0..1u32 << self.nets;
        every.filter(|state| self.excited(*state, *state) == 0).map(|state| bits(state, self.nets)).collect()
    }

    /// Everything that may follow a change from a stable state.
    pub fn explore(&self, from: &[bool], change: &Change) -> Explored {
        let mut start = number(from);
        // wires hold what their nets held
        for (element, kind) in self.elements.iter().enumerate() {
            if let Element::Wire(net) = kind {
                start |= (start >> net & 1) << element;
            }
        }
        // inputs that still have to change, and the values that all inputs want
        let mut wanted_inputs = start;
        for (net, bit) in &change.set {
            set(&mut wanted_inputs, net.index(), *bit);
        }
        if !change.apart {
            let mask = (1 << self.inputs) - 1;
            start = start & !mask | wanted_inputs & mask;
        }
        let graph = Graph::from(start, self.elements.len(), |state| self.excited(state, wanted_inputs));
        self.conclude(&graph)
    }

    /// The elements that want another value than they have.
    fn excited(&self, state: u32, wanted_inputs: u32) -> u32 {
        let value = |element: usize| state >> element & 1 == 1;
        let mut excited = 0;
        for (number, element) in self.elements.iter().enumerate() {
            let wanted = match element {
                Element::Input => wanted_inputs >> number & 1 == 1,
                Element::Wire(net) => value(*net),
                Element::Gate(reads, table) => {
                    table[reads.iter().enumerate().map(|(pin, read)| usize::from(value(*read)) << pin).sum::<usize>()]
                }
            };
            excited |= u32::from(wanted != value(number)) << number;
        }
        excited
    }

    fn conclude(&self, graph: &Graph) -> Explored {
        let members = graph.components();
        let lasting = |component: &&Vec<usize>| {
            // an excited element wants the opposite of its value: the same value throughout is the same wish throughout
            let held = |element: u32| {
                let first = graph.states[component[0]] >> element & 1;
                component
                    .iter()
                    .all(|at| graph.excited[*at] >> element & 1 == 1 && graph.states[*at] >> element & 1 == first)
            };
            component.len() >= 2 && !(0..self.elements.len() as u32).any(held)
        };
        let cycles: Vec<&Vec<usize>> = members.iter().filter(lasting).collect();
        let stable: Vec<usize> = (0..graph.states.len()).filter(|at| graph.excited[*at] == 0).collect();
        let race = if stable.len() + cycles.len() > 1 {
            Race::Critical
        } else if self.loops.iter().any(|nets| graph.excited.iter().any(|it| (it & nets).count_ones() >= 2)) {
            Race::NonCritical
        } else {
            Race::None
        };
        let mut outcome = vec![false; graph.states.len()];
        let mut open: Vec<usize> = stable.clone();
        open.extend(cycles.iter().flat_map(|cycle| cycle.iter()));
        while let Some(at) = open.pop() {
            if !std::mem::replace(&mut outcome[at], true) {
                open.extend(&graph.next[at]);
            }
        }
        let shown = |states: &mut dyn Iterator<Item = usize>| {
            let mut shown: Vec<Vec<bool>> = states.map(|at| bits(graph.states[at], self.nets)).collect();
            shown.sort();
            shown.dedup();
            shown
        };
        Explored {
            stable: shown(&mut stable.iter().copied()),
            cycles: cycles.iter().map(|cycle| shown(&mut cycle.iter().copied())).collect(),
            reached: shown(&mut (0..graph.states.len())),
            outcome: shown(&mut (0..graph.states.len()).filter(|at| outcome[*at])),
            race,
        }
    }
}

/// The states that can be reached, breadth first, and what follows each.
struct Graph {
    states: Vec<u32>,
    excited: Vec<u32>,
    next: Vec<Vec<usize>>,
}

impl Graph {
    fn from(start: u32, elements: usize, excited: impl Fn(u32) -> u32) -> Graph {
        const NEW: u32 = u32::MAX;
        let mut place = vec![NEW; 1 << elements];
        let mut graph = Graph { states: vec![start], excited: Vec::new(), next: Vec::new() };
        place[start as usize] = 0;
        while graph.next.len() < graph.states.len() {
            let state = graph.states[graph.next.len()];
            let all = excited(state);
            let mut next = Vec::new();
            // every non-empty subset of the excited
            let mut subset = all;
            while subset != 0 {
                let to = state ^ subset;
                if place[to as usize] == NEW {
                    place[to as usize] = graph.states.len() as u32;
                    graph.states.push(to);
                }
                next.push(place[to as usize] as usize);
                subset = (subset - 1) & all;
            }
            graph.excited.push(all);
            graph.next.push(next);
        }
        graph
    }

    /// The largest strongly connected sets: leave every state in depth-first order, then walk backwards from the last
    /// that was left (Kosaraju and Sharir, from memory).
    fn components(&self) -> Vec<Vec<usize>> {
        let count = self.states.len();
        let mut back = vec![Vec::new(); count];
        for (at, next) in self.next.iter().enumerate() {
            for to in next {
                back[*to].push(at);
            }
        }
        let mut left = Vec::new();
        let mut seen = vec![false; count];
        for root in 0..count {
            walk(root, &self.next, &mut seen, &mut left);
        }
        seen.fill(false);
        let mut components = Vec::new();
        for root in left.into_iter().rev() {
            let mut component = Vec::new();
            walk(root, &back, &mut seen, &mut component);
            if !component.is_empty() {
                components.push(component);
            }
        }
        components
    }
}

/// Adds all that can be reached from here and was not seen, each after all that it leads to.
fn walk(root: usize, next: &[Vec<usize>], seen: &mut [bool], left: &mut Vec<usize>) {
    if std::mem::replace(&mut seen[root], true) {
        return;
    }
    let mut path = vec![(root, 0)];
    while let Some((at, edge)) = path.last_mut() {
        match next[*at].get(*edge) {
            Some(to) => {
                *edge += 1;
                if !std::mem::replace(&mut seen[*to], true) {
                    path.push((*to, 0));
                }
            }
            None => {
                left.push(*at);
                path.pop();
            }
        }
    }
}

/// The loop components: sets of nets that reach each other through gates, by plain search.
fn loops(circuit: &Circuit) -> Vec<u32> {
    let nets = circuit.net_count();
    let mut reaches = vec![0u32; nets];
    for gate in circuit.gates() {
        for net in circuit.pins(gate) {
            reaches[net.index()] |= 1 << circuit.net_of(gate).index();
        }
    }
    for _ in 0..nets {
        for net in 0..nets {
            for other in 0..nets {
                if reaches[net] >> other & 1 == 1 {
                    reaches[net] |= reaches[other];
                }
            }
        }
    }
    let both = |a: usize, b: usize| reaches[a] >> b & 1 == 1 && reaches[b] >> a & 1 == 1;
    let component = |net| (0..nets).filter(|other| both(net, *other)).map(|other| 1 << other).sum();
    let mut loops: Vec<u32> = (0..nets).map(component).collect();
    loops.retain(|members| *members != 0);
    loops.sort_unstable();
    loops.dedup();
    loops
}

/// The value of a function for every row of pins, pin 0 as the lowest digit.
fn table(function: &Function, pins: usize) -> Vec<bool> {
    (0..1 << pins).map(|row| function.value(&bits(row, pins))).collect()
}

fn set(state: &mut u32, element: usize, bit: bool) {
    *state = *state & !(1 << element) | u32::from(bit) << element;
}

fn number(values: &[bool]) -> u32 {
    values.iter().enumerate().map(|(at, bit)| u32::from(*bit) << at).sum()
}

fn bits(state: u32, count: usize) -> Vec<bool> {
    (0..count).map(|at| state >> at & 1 == 1).collect()
}

/// The values of all nets of a state.
pub fn values(circuit: &Circuit, state: &Bits) -> Vec<bool> {
    circuit.nets().map(|net| state.get(net.index())).collect()
}

/// The least state with X's that agrees with all of these: X wherever two of them differ. None at all has none.
pub fn least_upper_bound(states: &[Vec<bool>]) -> Option<State> {
    let mut bound = State::known(Bits::of(states.first()?.iter().copied()));
    for state in states {
        for (net, bit) in state.iter().enumerate() {
            if bound.get(net) != Value::from(*bit) {
                bound.set(net, Value::X);
            }
        }
    }
    Some(bound)
}

/// Does the state agree with this one wherever that is known?
pub fn agrees(state: &[bool], bound: &State) -> bool {
    state.iter().enumerate().all(|(net, bit)| matches!(bound.get(net), Value::X) || bound.get(net) == Value::from(*bit))
}

/// A state in letters, net 0 first.
pub fn letters(state: &[bool]) -> String {
    state.iter().map(|bit| if *bit { '1' } else { '0' }).collect()
}
