//! Speed of the kernel, the judges, the sweep and the state set, side by side in one run: `cargo bench`.
//!
//! Every benchmark asserts its answer. Items are events (transitions of nets), samples or states.

#[allow(dead_code)] // other programs use the rest
mod networks;
mod replay;
#[allow(dead_code)]
mod workloads;

use divan::counter::ItemsCount;
use divan::{Bencher, black_box};
use replay::Record;
use stillgate::circuit::{Circuit, Function};
use stillgate::control::Control;
use stillgate::engine::{Deaf, Observer, Program};
use stillgate::findings::{Asked, Judge};
use stillgate::instance::{Instance, Sampler, Which};
use stillgate::scenario::{Builder, NewStep, Scenario};
use stillgate::statics::StateSet;
use stillgate::sweep::{Tally, run_samples, run_samples_with_envelope};
use workloads::{dividers, latch};

fn main() {
    divan::main();
}

/// 100,000 gates: 20 rows of 5,000 XORs, each gate reads two gates of the row before; 500 inputs change at each step.
fn grid() -> Scenario {
    let (rows, columns) = (20usize, 5000usize);
    let mut b = Builder::new("grid");
    for c in 0..columns {
        b.input(format!("i{c}"), c % 3 == 0);
    }
    for r in 0..rows {
        for c in 0..columns {
            let source = |c: usize| {
                let c = c % columns;
                if r == 0 { format!("i{c}") } else { format!("g{}.{c}", r - 1) }
            };
            let sources = [source(c), source(c + 7)];
            b.gate(format!("g{r}.{c}"), Function::Xor, sources.iter().map(String::as_str)).delay(["6", "9", "14"]);
        }
    }
    for i in 0..4 {
        let mut step = NewStep::rest("10");
        for c in (i..columns).step_by(10) {
            step = step.set(format!("i{c}"), c % 3 != 0);
        }
        b.step(step);
    }
    b.output(format!("g{}.0", rows - 1));
    b.limit_transitions(100_000_000u64);
    b.finish().expect("the grid is a good scenario")
}

fn scenario(name: &str) -> Scenario {
    match name {
        "latch of 2, 400 steps" => latch(400),
        "divider of 6, 200 edges" => dividers(1, 0, 200),
        "ripple of 48, 200 edges" => dividers(8, 0, 200),
        _ => grid(),
    }
}

const CIRCUITS: [&str; 4] =
    ["latch of 2, 400 steps", "divider of 6, 200 edges", "ripple of 48, 200 edges", "grid of 100,000"];

/// Counts changes and nothing else.
#[derive(Default)]
struct Count(u64);

impl Observer for Count {
    type Tag = ();
    fn change(&mut self, _: stillgate::time::Time, _: stillgate::circuit::NetId, _: stillgate::logic::Value, _: ()) {
        self.0 += 1;
    }
}

/// Runs one sample again and again with an observer, reset included; the items are events.
fn run_with<O: Observer<Tag = ()>>(bencher: Bencher<'_, '_>, scenario: &Scenario, mut observer: O) {
    let control = Control::default();
    let program = Program::new(scenario, &control).expect("it begins at rest");
    let mut machine = program.machine::<()>();
    let instance = Instance::of(scenario, &Which::Sample(7));
    let mut count = Count::default();
    machine.run(&instance, &control, &mut count);
    assert!(count.0 > 500, "the circuit moves: {} events", count.0);
    bencher.counter(ItemsCount::new(count.0)).bench_local(|| {
        assert!(machine.run(black_box(&instance), &control, &mut observer));
    });
}

/// Drawing the delays of one sample; the items are quantities.
#[divan::bench(args = CIRCUITS)]
fn draw(bencher: Bencher<'_, '_>, circuit: &str) {
    let scenario = scenario(circuit);
    let mut sampler = Sampler::new(&scenario);
    let mut instance = Instance::of(&scenario, &Which::Typ);
    let mut sample = 0;
    bencher.counter(ItemsCount::new(scenario.circuit.gate_count())).bench_local(|| {
        sampler.fill(sample, &mut instance);
        sample += 1;
        assert!(instance.delays.gate[0][0] > stillgate::time::Span::ZERO);
    });
}

/// Kernel alone.
#[divan::bench(args = CIRCUITS)]
fn kernel(bencher: Bencher<'_, '_>, circuit: &str) {
    run_with(bencher, &scenario(circuit), Deaf);
}

/// Kernel with all judges and the tally of a sweep.
#[divan::bench(args = CIRCUITS)]
fn kernel_and_judges(bencher: Bencher<'_, '_>, circuit: &str) {
    let scenario = scenario(circuit);
    let asked = Asked::of(&scenario);
    run_with(bencher, &scenario, Judge::new(&scenario, &asked, Tally::new(&scenario, &asked)));
}

/// Judges and tally without the kernel: they are told again and again what one run told; the items are events.
#[divan::bench(args = [CIRCUITS[0], CIRCUITS[1], CIRCUITS[2]])]
fn judges_alone(bencher: Bencher<'_, '_>, circuit: &str) {
    let scenario = scenario(circuit);
    let asked = Asked::of(&scenario);
    let program = Program::new(&scenario, &Control::default()).expect("it begins at rest");
    let mut record = Record::default();
    program.machine().run(&Instance::of(&scenario, &Which::Sample(7)), &Control::default(), &mut record);
    let mut judge = Judge::new(&scenario, &asked, Tally::new(&scenario, &asked));
    let mut runs = 0;
    bencher.counter(ItemsCount::new(record.changes)).bench_local(|| {
        record.tell(&mut judge);
        runs += 1;
    });
    judge.sink.finish();
    assert!(judge.sink.windows.iter().all(|window| window.settled == runs), "every window is judged in every run");
}

/// Short samples on one and on two threads: drawing, reset, run, judges and tally; the items are samples.
#[divan::bench(args = [1, 2], sample_count = 20)]
fn short_samples(bencher: Bencher<'_, '_>, threads: usize) {
    const SAMPLES: u64 = 50_000;
    let scenario = latch(4);
    let program = Program::new(&scenario, &Control::default()).expect("it begins at rest");
    let asked = Asked::of(&scenario);
    bencher.counter(ItemsCount::new(SAMPLES)).bench_local(|| {
        let tally = run_samples(&scenario, &program, &asked, 0..SAMPLES, threads, &Control::default());
        assert_eq!((tally.samples, tally.failing), (SAMPLES, 0));
        assert!(tally.windows.iter().all(|window| window.settled == SAMPLES && window.outcomes.total() == SAMPLES));
        tally
    });
}

/// Samples of the latch, on one and on two threads.
#[divan::bench(args = [1, 2], sample_count = 10)]
fn sweep_of_2000_latches(bencher: Bencher<'_, '_>, threads: usize) {
    let scenario = latch(400);
    let program = Program::new(&scenario, &Control::default()).expect("it begins at rest");
    let asked = Asked::of(&scenario);
    bencher.counter(ItemsCount::new(2000u64)).bench_local(|| {
        let tally = run_samples(&scenario, &program, &asked, 0..2000, threads, &Control::default());
        assert_eq!(tally.samples, 2000);
        assert_eq!(tally.windows[399].settled, 2000);
        tally
    });
}

/// The same with the times of all edges, as `sweep` and `review` keep them.
#[divan::bench(args = [1, 2], sample_count = 10)]
fn sweep_of_2000_latches_with_envelope(bencher: Bencher<'_, '_>, threads: usize) {
    let scenario = latch(400);
    let program = Program::new(&scenario, &Control::default()).expect("it begins at rest");
    let asked = Asked::of(&scenario);
    bencher.counter(ItemsCount::new(2000u64)).bench_local(|| {
        let tally = run_samples_with_envelope(&scenario, &program, &asked, 0..2000, threads, &Control::default());
        assert_eq!(tally.samples, 2000);
        assert!(tally.envelope.is_some());
        tally
    });
}

/// All stable states of a chain of six-NAND dividers.
#[divan::bench(args = [8, 64], sample_count = 10)]
fn states_of_dividers(bencher: Bencher<'_, '_>, stages: usize) {
    let scenario = dividers(stages, 0, 1);
    let circuit: &Circuit = &scenario.circuit;
    bencher.bench_local(|| {
        let set = StateSet::of(circuit, &Control::default()).expect("within the budget");
        // the first clock is free; each divider rests in two states whatever its clock is
        assert_eq!(set.count().bits(), stages as u64 + 2);
        set.count()
    });
}
