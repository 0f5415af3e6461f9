//! The kernel against a textbook kernel, taking turns in one run: `cargo bench --bench ratios`.
//!
//! Both run the same cases; each case must end in the same state, at the same instant, after as many events. A row says how
//! long an event takes in both (the fastest turn; reset included, nothing drawn), their ratio, and what ratio is wanted.
//! Names given after `--` choose rows.

#![allow(clippy::print_stdout)] // its figures are its output

#[allow(dead_code)] // other programs use the rest
mod networks;
mod textbook;
#[allow(dead_code)]
mod workloads;

use std::time::Instant;

use stillgate::circuit::NetId;
use stillgate::control::Control;
use stillgate::engine::{Deaf, Finish, Observer, Program};
use stillgate::instance::{Instance, Which};
use stillgate::logic::{State, Value};
use stillgate::scenario::Scenario;
use stillgate::time::Time;
use textbook::Textbook;

/// One row: name, scenario, cases, wanted ratio.
type Row = (&'static str, fn() -> Scenario, u64, f64);

const ROWS: [Row; 6] = [
    ("latch", || workloads::latch(400), 64, 1.1),
    ("divider-8", || workloads::dividers(1, 2, 400), 64, 1.2),
    ("ripple-64", || workloads::dividers(10, 4, 400), 64, 1.5),
    ("busy-64", || workloads::busy(64, 2_000), 64, 1.1),
    ("busy-100k", || workloads::busy(100_000, 2_000_000), 1, 2.0),
    ("busy-1M", || workloads::busy(1_000_000, 5_000_000), 1, 3.5),
];

/// Seconds that a row takes at least, and turns.
const AT_LEAST: f64 = 2.0;
const TURNS: usize = 3;

/// Where a run ends.
#[derive(Default)]
struct Last {
    events: u64,
    state: State,
    at: u64,
}

impl Observer for Last {
    type Tag = ();
    fn change(&mut self, _: Time, _: NetId, _: Value, (): ()) {
        self.events += 1;
    }
    fn finish(&mut self, finish: &Finish<'_>) {
        self.state.clone_from(finish.state);
        self.at = finish.at.fs();
    }
}

fn main() {
    let asked: Vec<String> = std::env::args().skip(1).filter(|arg| !arg.starts_with('-')).collect();
    println!("{:10} {:>9} {:>12} {:>12} {:>7} {:>7}", "", "events", "kernel ns", "textbook ns", "ratio", "wanted");
    for (name, scenario, cases, wanted) in ROWS {
        if !asked.is_empty() && !asked.iter().any(|asked| asked == name) {
            continue;
        }
        let scenario = scenario();
        let control = Control::default();
        let program = Program::new(&scenario, &control).expect("it has a start");
        let cases: Vec<Instance> = (0..cases).map(|case| Instance::of(&scenario, &Which::Sample(case))).collect();
        let mut machine = program.machine::<()>();
        let mut textbook =
            Textbook::new(&scenario, |net| program.start().map_or(Value::Zero, |start| start.get(net.index())));
        let mut events = 0;
        for case in &cases {
            let mut last = Last::default();
            machine.run(case, &control, &mut last);
            textbook.run(case);
            assert_eq!((textbook.events, textbook.now), (last.events, last.at), "{name}");
            let differs = |net: &NetId| (last.state.get(net.index()) == Value::One) != textbook.values()[net.index()];
            assert_eq!(scenario.circuit.nets().find(differs), None, "{name}");
            events += last.events;
        }
        assert!(events >= 500 * cases.len() as u64, "{name} moves");
        let (mut kernel, mut other) = (f64::MAX, f64::MAX);
        let began = Instant::now();
        let mut turns = 0;
        while turns < TURNS || began.elapsed().as_secs_f64() < AT_LEAST {
            turns += 1;
            kernel = kernel.min(seconds(|| {
                for case in &cases {
                    machine.run(case, &control, &mut Deaf);
                }
            }));
            other = other.min(seconds(|| {
                for case in &cases {
                    textbook.run(case);
                }
            }));
        }
        let each = |seconds: f64| seconds * 1e9 / events as f64;
        let events = events / cases.len() as u64;
        println!(
            "{name:10} {events:>9} {:>12.2} {:>12.2} {:>7.2} {wanted:>7.1}",
            each(kernel),
            each(other),
            other / kernel
        );
    }
}

fn seconds(work: impl FnOnce()) -> f64 {
    let began = Instant::now();
    work();
    began.elapsed().as_secs_f64()
}
