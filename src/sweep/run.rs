//! Running the samples: all cores, one machine and one tally a worker, merged at the end.

use std::sync::Mutex;
use std::sync::atomic::{AtomicU64, Ordering};

use super::envelope::Edges;
use super::tally::Tally;
use crate::control::Control;
use crate::engine::{Observer, Program};
use crate::findings::{Asked, Judge};
use crate::instance::{Instance, Sampler, Which};
use crate::scenario::Scenario;

/// Samples that a worker takes at a time, before rounding up to whole boards.
const CHUNK: u64 = 128;

/// Runs samples `from .. to` of a scenario on this many threads (0: all cores) and tallies them.
///
/// The result depends on nothing but scenario and samples. If the control cancels, it holds the samples from the first on
/// up to the one that `samples` of the tally tells: whole boards, and none behind a gap.
pub fn run_samples(
    scenario: &Scenario,
    program: &Program,
    asked: &Asked,
    samples: std::ops::Range<u64>,
    threads: usize,
    control: &Control,
) -> Tally {
    run_heard(scenario, program, (Tally::new(scenario, asked), samples), threads, control, || {
        Judge::new(scenario, asked, Tally::new(scenario, asked))
    })
}

/// As [`run_samples`]; the tally also has between which times each edge came.
pub fn run_samples_with_envelope(
    scenario: &Scenario,
    program: &Program,
    asked: &Asked,
    samples: std::ops::Range<u64>,
    threads: usize,
    control: &Control,
) -> Tally {
    run_heard(scenario, program, (Tally::with_envelope(scenario, asked), samples), threads, control, || {
        (Judge::new(scenario, asked, Tally::new(scenario, asked)), Edges::new(scenario))
    })
}

/// Who hears the runs of one worker.
trait Hearer: Observer<Tag = ()> {
    fn tally(&mut self) -> &mut Tally;
    /// All runs are over.
    fn finish(self) -> Tally;
}

impl Hearer for Judge<Tally> {
    #[inline]
    fn tally(&mut self) -> &mut Tally {
        &mut self.sink
    }

    fn finish(mut self) -> Tally {
        self.sink.finish();
        self.sink
    }
}

impl Hearer for (Judge<Tally>, Edges) {
    #[inline]
    fn tally(&mut self) -> &mut Tally {
        self.0.tally()
    }

    fn finish(self) -> Tally {
        let mut tally = self.0.finish();
        tally.envelope = Some(self.1.envelope);
        tally
    }
}

fn run_heard<H: Hearer>(
    scenario: &Scenario,
    program: &Program,
    (empty, samples): (Tally, std::ops::Range<u64>),
    threads: usize,
    control: &Control,
    hearer: impl Fn() -> H + Sync,
) -> Tally {
    let tries = scenario.plan.tries.max(1);
    let chunk = CHUNK.div_ceil(tries) * tries;
    let threads = match threads {
        0 => std::thread::available_parallelism().map_or(1, usize::from),
        n => n,
    };
    let threads = threads.min(usize::try_from((samples.end - samples.start).div_ceil(chunk)).unwrap_or(threads)).max(1);
    let next = AtomicU64::new(samples.start);
    let done = AtomicU64::new(0);
    let total = samples.end - samples.start;
    let whole = Mutex::new(empty);
    let work = || {
        let mut machine = program.machine::<()>();
        let mut sampler = Sampler::new(scenario);
        let mut instance = Instance::of(scenario, &Which::Typ);
        let mut hearer = hearer();
        // a sample is all or nothing: the caller's control stops between chunks
        let whole_sample = Control::default();
        loop {
            // a chunk that was taken is run, so that what is done has no gap
            if control.cancelled() {
                break;
            }
            let from = next.fetch_add(chunk, Ordering::Relaxed);
            if from >= samples.end {
                break;
            }
            let to = (from + chunk).min(samples.end);
            for sample in from..to {
                sampler.fill(sample, &mut instance);
                hearer.tally().begin(sample);
                machine.run(&instance, &whole_sample, &mut hearer);
            }
            control.report(done.fetch_add(to - from, Ordering::Relaxed) + (to - from), total);
        }
        let tally = hearer.finish();
        whole.lock().unwrap_or_else(std::sync::PoisonError::into_inner).absorb(tally);
    };
    if threads == 1 {
        work();
    } else {
        std::thread::scope(|scope| {
            for _ in 0..threads {
                scope.spawn(work);
            }
        });
    }
    whole.into_inner().unwrap_or_else(std::sync::PoisonError::into_inner)
}
