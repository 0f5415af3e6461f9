//! Nets, gate functions, the circuit, its loops, blocks and cones. No delay and no rule lives here.
//!
//! Nets are numbered inputs first, then one net a gate, each in the order in which it was given.

mod compiled;
mod cut;
mod expr;
mod function;
mod strongly;
mod topology;

use rustc_hash::FxHashMap;
use serde::{Deserialize, Serialize};

pub use compiled::Compiled;
pub use expr::{Expr, ExprError, MAX_EXPR_NETS, Op};
pub use function::{Arity, Function};
pub(crate) use strongly::strong_components;
pub use topology::NetSet;
use topology::Topology;

/// A net's number: inputs first, then gates.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord, Serialize, Deserialize)]
pub struct NetId(pub u32);

/// A gate's number. Its net is the number of inputs plus this.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord, Serialize, Deserialize)]
pub struct GateId(pub u32);

/// The number of a wire with a delay of its own, from a net to one gate that reads it.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord, Serialize, Deserialize)]
pub struct WireId(pub u32);

impl NetId {
    /// The number as an index.
    pub const fn index(self) -> usize {
        self.0 as usize
    }
}

impl GateId {
    /// The number as an index.
    pub const fn index(self) -> usize {
        self.0 as usize
    }
}

impl WireId {
    /// The number as an index.
    pub const fn index(self) -> usize {
        self.0 as usize
    }
}

/// One gate as it is given to [`Circuit::new`].
#[derive(Clone, Debug)]
pub struct GateSpec {
    /// The name of the net it drives.
    pub name: String,
    /// What it computes.
    pub function: Function,
    /// What it reads, in order; may repeat; may hold its own net. For an expression: its nets in the order of
    /// [`Expr::nets`].
    pub pins: Vec<NetId>,
}

/// Why a circuit cannot be built.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
pub enum CircuitError {
    /// Two nets of one name.
    #[error("net `{0}` is driven twice")]
    DrivenTwice(String),
    /// Not a net name.
    #[error("`{0}` is no net name; a name is a letter or `_`, then letters, digits, `_`, `.`, `[` or `]`")]
    BadName(String),
    /// A pin that is no net.
    #[error("gate `{0}` reads a net that does not exist")]
    NoSuchNet(String),
    /// Too few or too many pins.
    #[error("gate `{gate}`: {function} takes {wanted}, not {found}")]
    WrongArity {
        /// The gate.
        gate: String,
        /// Its function.
        function: &'static str,
        /// What the function takes.
        wanted: Arity,
        /// What it was given.
        found: usize,
    },
    /// A wire from a net to a gate that does not read it, or the same wire twice.
    #[error("there is no place for a wire from `{net}` to `{gate}`")]
    NoSuchWire {
        /// Where it would begin.
        net: String,
        /// Where it would end.
        gate: String,
    },
}

/// One gate that reads a net. A gate that reads a net on several pins has one entry.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Reader {
    /// The reading gate.
    pub gate: GateId,
    /// What a 1 of the net adds to the gate's input sum; see [`Compiled`].
    pub weight: u64,
    /// The wire between net and gate, if it has a delay.
    pub wire: Option<WireId>,
}

/// A network of gates. Immutable once built; share it by reference count.
#[derive(Clone, Debug)]
pub struct Circuit {
    names: Vec<Box<str>>,
    by_name: FxHashMap<Box<str>, NetId>,
    inputs: u32,
    functions: Vec<Function>,
    pin_start: Vec<u32>,
    pins: Vec<NetId>,
    compiled: Vec<Compiled>,
    source_start: Vec<u32>,
    sources: Vec<(NetId, u64)>,
    fan_start: Vec<u32>,
    fan: Vec<Reader>,
    wires: Vec<(NetId, GateId)>,
    topology: Topology,
}

/// Is this a net name? A letter or `_`, then letters, digits, `_`, `.`, `[`, `]`.
pub fn is_net_name(name: &str) -> bool {
    let mut letters = name.chars();
    letters.next().is_some_and(|c| c.is_alphabetic() || c == '_')
        && letters.all(|c| c.is_alphanumeric() || matches!(c, '_' | '.' | '[' | ']'))
}

impl Circuit {
    /// Builds a circuit from its inputs, gates and delayed wires.
    ///
    /// ```
    /// use stillgate::circuit::{Circuit, Function, GateSpec, NetId};
    /// // a latch of two NORs: inputs 0 and 1, gates 2 and 3
    /// let nor = |name: &str, a, b| GateSpec { name: name.into(), function: Function::Nor, pins: vec![NetId(a), NetId(b)] };
    /// let latch = Circuit::new(&["r", "s"], vec![nor("q", 0, 3), nor("qn", 1, 2)], vec![]).unwrap();
    /// assert_eq!(latch.net("qn"), Some(NetId(3)));
    /// assert_eq!(latch.feedback().len(), 1);
    /// ```
    ///
    /// Errors: the first of [`CircuitError`] that applies.
    pub fn new<S: AsRef<str>>(
        inputs: &[S],
        gates: Vec<GateSpec>,
        wires: Vec<(NetId, GateId)>,
    ) -> Result<Circuit, CircuitError> {
        let input_count = inputs.len();
        let nets = input_count + gates.len();
        let mut names: Vec<Box<str>> = Vec::with_capacity(nets);
        let mut by_name = FxHashMap::with_capacity_and_hasher(nets, Default::default());
        for name in inputs.iter().map(AsRef::as_ref).chain(gates.iter().map(|gate| gate.name.as_str())) {
            if !is_net_name(name) {
                return Err(CircuitError::BadName(name.to_string()));
            }
            if by_name.insert(Box::from(name), NetId(names.len() as u32)).is_some() {
                return Err(CircuitError::DrivenTwice(name.to_string()));
            }
            names.push(name.into());
        }

        let mut functions = Vec::with_capacity(gates.len());
        let mut compiled = Vec::with_capacity(gates.len());
        let (mut pin_start, mut pins) = (vec![0u32], Vec::new());
        let (mut source_start, mut sources) = (vec![0u32], Vec::new());
        for gate in gates {
            if gate.pins.iter().any(|net| net.index() >= nets) {
                return Err(CircuitError::NoSuchNet(gate.name));
            }
            let wanted = gate.function.arity();
            if !wanted.accepts(gate.pins.len()) {
                let (function, found) = (gate.function.name(), gate.pins.len());
                return Err(CircuitError::WrongArity { gate: gate.name, function, wanted, found });
            }
            let (form, weighted) = Compiled::of(&gate.function, &gate.pins);
            compiled.push(form);
            sources.extend(weighted);
            source_start.push(sources.len() as u32);
            pins.extend_from_slice(&gate.pins);
            pin_start.push(pins.len() as u32);
            functions.push(gate.function);
        }

        let gate_sources = |g: usize| &sources[source_start[g] as usize..source_start[g + 1] as usize];
        let mut fan_start = vec![0u32; nets + 1];
        for (net, _) in &sources {
            fan_start[net.index() + 1] += 1;
        }
        for n in 0..nets {
            fan_start[n + 1] += fan_start[n];
        }
        let mut next = fan_start.clone();
        let mut fan = vec![Reader { gate: GateId(0), weight: 0, wire: None }; sources.len()];
        for g in 0..functions.len() {
            let gate = GateId(g as u32);
            for &(net, weight) in gate_sources(g) {
                fan[next[net.index()] as usize] = Reader { gate, weight, wire: None };
                next[net.index()] += 1;
            }
        }
        for (w, &(net, gate)) in wires.iter().enumerate() {
            // the gates that read a net are in gate order
            let ends = fan_start.get(net.index()..=net.index() + 1);
            let readers = ends.map_or(0..0, |ends| ends[0] as usize..ends[1] as usize);
            let readers = &mut fan[readers];
            let place = readers.binary_search_by_key(&gate, |reader| reader.gate);
            match place {
                Ok(at) if readers[at].wire.is_none() => readers[at].wire = Some(WireId(w as u32)),
                _ => {
                    let name = |i: usize| names.get(i).map_or_else(|| "?".to_string(), ToString::to_string);
                    let (net, gate) = (name(net.index()), name(input_count + gate.index()));
                    return Err(CircuitError::NoSuchWire { net, gate });
                }
            }
        }
        let topology = Topology::of(input_count, &source_start, &sources, &fan_start, &fan);
        Ok(Circuit {
            names,
            by_name,
            inputs: input_count as u32,
            functions,
            pin_start,
            pins,
            compiled,
            source_start,
            sources,
            fan_start,
            fan,
            wires,
            topology,
        })
    }

    /// Number of nets: inputs and gates.
    pub fn net_count(&self) -> usize {
        self.names.len()
    }

    /// Number of inputs.
    pub fn input_count(&self) -> usize {
        self.inputs as usize
    }

    /// Number of gates.
    pub fn gate_count(&self) -> usize {
        self.functions.len()
    }

    /// Number of wires with a delay.
    pub fn wire_count(&self) -> usize {
        self.wires.len()
    }

    /// All nets, in order.
    pub fn nets(&self) -> impl ExactSizeIterator<Item = NetId> + use<> {
        (0..self.names.len() as u32).map(NetId)
    }

    /// All inputs, in order.
    pub fn inputs(&self) -> impl ExactSizeIterator<Item = NetId> + use<> {
        (0..self.inputs).map(NetId)
    }

    /// All gates, in order.
    pub fn gates(&self) -> impl ExactSizeIterator<Item = GateId> + use<> {
        (0..self.functions.len() as u32).map(GateId)
    }

    /// All wires: (net, reading gate), by wire number.
    pub fn wires(&self) -> &[(NetId, GateId)] {
        &self.wires
    }

    /// A net's name. Panics if there is no such net.
    pub fn name(&self, net: NetId) -> &str {
        &self.names[net.index()]
    }

    /// The net of this name.
    pub fn net(&self, name: &str) -> Option<NetId> {
        self.by_name.get(name).copied()
    }

    /// Is the net an input?
    pub fn is_input(&self, net: NetId) -> bool {
        net.0 < self.inputs
    }

    /// The gate that drives a net, `None` for an input.
    pub fn driver(&self, net: NetId) -> Option<GateId> {
        net.0.checked_sub(self.inputs).map(GateId)
    }

    /// The net that a gate drives.
    pub fn net_of(&self, gate: GateId) -> NetId {
        NetId(self.inputs + gate.0)
    }

    /// A gate's function as written.
    pub fn function(&self, gate: GateId) -> &Function {
        &self.functions[gate.index()]
    }

    /// A gate's pins as written, in order, repeats included.
    pub fn pins(&self, gate: GateId) -> &[NetId] {
        &self.pins[self.pin_start[gate.index()] as usize..self.pin_start[gate.index() + 1] as usize]
    }

    /// A gate's function in the form that the engine evaluates.
    pub fn compiled(&self, gate: GateId) -> &Compiled {
        &self.compiled[gate.index()]
    }

    /// What a gate reads: each net once, with what a 1 of it adds to the gate's input sum.
    pub fn sources(&self, gate: GateId) -> &[(NetId, u64)] {
        &self.sources[self.source_start[gate.index()] as usize..self.source_start[gate.index() + 1] as usize]
    }

    /// The gates that read a net, each once, in gate order.
    pub fn readers(&self, net: NetId) -> &[Reader] {
        &self.fan[self.fan_start[net.index()] as usize..self.fan_start[net.index() + 1] as usize]
    }

    /// A small set of nets that cuts every loop, in net order.
    pub fn feedback(&self) -> &[NetId] {
        &self.topology.feedback
    }

    /// Is the net inside a loop: one of several gates that reach each other, or a gate that reads itself?
    pub fn in_loop(&self, net: NetId) -> bool {
        self.driver(net).is_some_and(|gate| self.topology.in_loop[gate.index()])
    }

    /// The loop component of a gate (strongly connected gates share a number).
    pub fn component(&self, gate: GateId) -> u32 {
        self.topology.component[gate.index()]
    }

    /// The block of a gate: gates tied together by gates share a number, counted from 0 in gate order.
    pub fn block(&self, gate: GateId) -> u32 {
        self.topology.block[gate.index()]
    }

    /// Number of blocks.
    pub fn block_count(&self) -> usize {
        self.topology.blocks as usize
    }

    /// Gates in an order in which each comes after every gate that it reads, but for the feedback nets.
    pub fn evaluation_order(&self) -> &[GateId] {
        &self.topology.order
    }

    /// The cone of some nets: they and every net from which one of them can be reached.
    pub fn cone(&self, nets: &[NetId]) -> NetSet {
        let mut cone = NetSet::none(self.net_count());
        let mut open: Vec<NetId> = nets.to_vec();
        while let Some(net) = open.pop() {
            if cone.insert(net)
                && let Some(gate) = self.driver(net)
            {
                open.extend(self.sources(gate).iter().map(|s| s.0));
            }
        }
        cone
    }

    /// Does the gate output equal its function when the nets have these (known) values?
    pub fn wants(&self, gate: GateId, value: impl Fn(NetId) -> bool) -> bool {
        let sum = self.sources(gate).iter().map(|&(net, weight)| if value(net) { weight } else { 0 }).sum();
        self.compiled(gate).value(sum)
    }
}
