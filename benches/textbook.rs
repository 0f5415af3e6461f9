//! A kernel as textbooks draw it, to compare with: a binary heap of events in which cancelled ones stay until they come
//! up (lazy deletion by a stamp), two values, one pending event a gate, each pin of a gate looked up at every change.

use std::cmp::Reverse;
use std::collections::BinaryHeap;

use stillgate::circuit::{Circuit, Compiled, NetId};
use stillgate::instance::Instance;
use stillgate::logic::Value;
use stillgate::scenario::{Place, Scenario};

/// One circuit with its steps, ready to run again and again.
pub struct Textbook {
    inputs: usize,
    limit: u64,
    /// Truth table of each gate, by its sources in order.
    tables: Vec<u64>,
    sources: Vec<(u32, u32)>,
    source_nets: Vec<u32>,
    readers: Vec<(u32, u32)>,
    reader_gates: Vec<u32>,
    steps: Vec<Vec<(NetId, bool)>>,
    after: Vec<bool>,
    start: Vec<bool>,
    values: Vec<bool>,
    stamp: Vec<u32>,
    pending: Vec<Option<bool>>,
    heap: BinaryHeap<Reverse<(u64, u32, u32)>>,
    /// Transitions of all nets, inputs counted, of the last run.
    pub events: u64,
    /// The last instant of the last run, fs.
    pub now: u64,
}

impl Textbook {
    /// `start`: the values of all nets at the start; not read if the scenario begins at random.
    pub fn new(scenario: &Scenario, start: impl Fn(NetId) -> Value) -> Textbook {
        let circuit: &Circuit = &scenario.circuit;
        let (mut sources, mut source_nets) = (Vec::new(), Vec::new());
        let (mut readers, mut reader_gates) = (Vec::new(), Vec::new());
        let mut tables = Vec::new();
        for gate in circuit.gates() {
            let Compiled::Table(table) = circuit.compiled(gate) else { panic!("at most six pins") };
            tables.push(*table);
            let first = source_nets.len() as u32;
            for (k, &(net, weight)) in circuit.sources(gate).iter().enumerate() {
                assert_eq!(weight, 1 << k);
                source_nets.push(net.0);
            }
            sources.push((first, source_nets.len() as u32));
        }
        for net in circuit.nets() {
            let first = reader_gates.len() as u32;
            reader_gates.extend(circuit.readers(net).iter().map(|reader| reader.gate.0));
            readers.push((first, reader_gates.len() as u32));
        }
        let steps = &scenario.stimulus.steps;
        assert!(scenario.stimulus.clocks.is_empty());
        assert!(steps.iter().all(|step| matches!(step.place, Place::After(_) | Place::Rest(_))));
        Textbook {
            inputs: circuit.input_count(),
            limit: scenario.limits.transitions,
            tables,
            sources,
            source_nets,
            readers,
            reader_gates,
            steps: steps.iter().map(|step| step.set.clone()).collect(),
            after: steps.iter().map(|step| matches!(step.place, Place::After(_))).collect(),
            start: circuit
                .nets()
                .map(|net| {
                    scenario.stimulus.initial.get(net.index()).copied().unwrap_or_else(|| start(net) == Value::One)
                })
                .collect(),
            values: vec![false; circuit.net_count()],
            stamp: vec![0; circuit.gate_count()],
            pending: vec![None; circuit.gate_count()],
            heap: BinaryHeap::new(),
            events: 0,
            now: 0,
        }
    }

    /// Runs one case.
    pub fn run(&mut self, instance: &Instance) {
        self.heap.clear();
        self.stamp.fill(0);
        self.pending.fill(None);
        self.values.copy_from_slice(&self.start);
        (self.events, self.now) = (0, 0);
        if instance.start.words().iter().any(|word| *word != 0) {
            for gate in 0..self.tables.len() {
                self.values[self.inputs + gate] = instance.start.get(gate);
            }
            for gate in 0..self.tables.len() as u32 {
                self.evaluate(gate, instance);
            }
        }
        let mut in_window = 0;
        let mut last_step = 0;
        let mut step = 0;
        let mut changed: Vec<u32> = Vec::new();
        while in_window < self.limit {
            // what was cancelled goes when it comes up
            while let Some(Reverse((_, gate, stamp))) = self.heap.peek()
                && self.stamp[*gate as usize] != *stamp
            {
                self.heap.pop();
            }
            let next = self.heap.peek().map(|event| event.0.0);
            let outside = (step < self.steps.len())
                .then(|| if self.after[step] { Some(last_step) } else { next.is_none().then_some(self.now) })
                .flatten()
                .map(|since| since + instance.places[step].fs());
            let Some(at) = next.into_iter().chain(outside).min() else { break };
            self.now = at;
            changed.clear();
            if outside == Some(at) {
                for &(net, value) in &self.steps[step] {
                    if self.values[net.index()] != value {
                        self.values[net.index()] = value;
                        changed.push(net.0);
                    }
                }
                (last_step, in_window) = (at, 0);
                step += 1;
            }
            while let Some(&Reverse((due, gate, stamp))) = self.heap.peek()
                && due == at
            {
                self.heap.pop();
                if self.stamp[gate as usize] == stamp {
                    let net = self.inputs + gate as usize;
                    self.values[net] = self.pending[gate as usize].take().expect("a live event is pending");
                    changed.push(net as u32);
                }
            }
            self.events += changed.len() as u64;
            in_window += changed.len() as u64;
            for &net in &changed {
                let (first, last) = self.readers[net as usize];
                for reader in first..last {
                    self.evaluate(self.reader_gates[reader as usize], instance);
                }
            }
        }
    }

    fn evaluate(&mut self, gate: u32, instance: &Instance) {
        let g = gate as usize;
        let (first, last) = self.sources[g];
        let mut sum = 0;
        for (k, net) in self.source_nets[first as usize..last as usize].iter().enumerate() {
            sum |= u32::from(self.values[*net as usize]) << k;
        }
        let value = self.tables[g] >> sum & 1 == 1;
        let out = self.values[self.inputs + g];
        if value == self.pending[g].unwrap_or(out) {
            return;
        }
        self.stamp[g] += 1;
        if value == out {
            self.pending[g] = None;
        } else {
            self.pending[g] = Some(value);
            let due = self.now + instance.delays.gate[g][usize::from(value)].fs();
            self.heap.push(Reverse((due, gate, self.stamp[g])));
        }
    }

    /// Value of every net after the last run.
    pub fn values(&self) -> &[bool] {
        &self.values
    }
}
