//! Running the samples: all cores, one machine and one tally a worker, merged at the end.

use std::sync::Mutex;
use std::sync::atomic::{AtomicU64, Ordering};

use super::tally::Tally;
use crate::control::Control;
use crate::engine::Program;
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
    let whole = Mutex::new(Tally::new(scenario, asked));
    let work = || {
        let mut machine = program.machine::<()>();
        let mut sampler = Sampler::new(scenario);
        let mut instance = Instance::of(scenario, &Which::Typ);
        let mut judge = Judge::new(scenario, asked, Tally::new(scenario, asked));
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
                judge.sink.begin(sample);
                machine.run(&instance, &whole_sample, &mut judge);
            }
            control.report(done.fetch_add(to - from, Ordering::Relaxed) + (to - from), total);
        }
        judge.sink.finish();
        whole.lock().unwrap_or_else(std::sync::PoisonError::into_inner).absorb(judge.sink);
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
