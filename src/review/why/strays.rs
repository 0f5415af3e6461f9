//! Which of the first samples of a sweep go another way than most: no sample shows a race alone, so a tally cannot tell.

use std::collections::BTreeMap;

use super::probe::strays;
use crate::control::Control;
use crate::engine::Program;
use crate::findings::{Asked, Fact, Judge, Reason, Seen, Sink};
use crate::instance::{Instance, Sampler, Which};
use crate::scenario::Scenario;
use crate::sweep::{Fork, SweepReport};

/// Samples run again, at most.
const SAMPLES: u64 = 2048;

/// Samples that stray, by moment.
#[derive(Clone, Debug, Default)]
pub(super) struct Strays {
    /// Samples `0 .. looked_at` were run.
    pub looked_at: u64,
    /// Those that stray after each moment, ascending.
    pub of: BTreeMap<u32, Vec<u64>>,
}

impl Strays {
    /// Runs the first samples of the sweep again, all moments at once.
    pub fn of(scenario: &Scenario, program: &Program, asked: &Asked, sweep: &SweepReport, control: &Control) -> Strays {
        let forks = sweep.windows.iter().map(|window| &window.forks[..]).collect();
        let hears = Hears { forks, sample: 0, of: BTreeMap::new() };
        let mut judge = Judge::new(scenario, asked, hears);
        let mut machine = program.machine::<()>();
        let mut sampler = Sampler::new(scenario);
        let mut instance = Instance::of(scenario, &Which::Typ);
        let mut looked_at = 0;
        while looked_at < SAMPLES.min(sweep.samples) && !control.cancelled() {
            sampler.fill(looked_at, &mut instance);
            judge.sink.sample = looked_at;
            if !machine.hear(&instance, control, &mut judge) {
                break;
            }
            looked_at += 1;
        }
        let mut of = judge.sink.of;
        of.values_mut().for_each(|samples| samples.retain(|sample| *sample < looked_at));
        Strays { looked_at, of }
    }
}

struct Hears<'a> {
    forks: Vec<&'a [Fork]>,
    sample: u64,
    of: BTreeMap<u32, Vec<u64>>,
}

impl Sink for Hears<'_> {
    fn judged(&mut self, _question: u32, _broken: bool, _slack: Option<i64>) {}
    fn not_judged(&mut self, _question: u32, _reason: Reason) {}
    fn fact(&mut self, _fact: Fact) {}
    fn reached(&mut self, _moment: u32, _named: bool) {}
    fn window(&mut self, seen: &Seen<'_>) {
        if self.forks.get(seen.moment as usize).is_some_and(|forks| strays(forks, seen)) {
            let samples = self.of.entry(seen.moment).or_default();
            if samples.last() != Some(&self.sample) {
                samples.push(self.sample);
            }
        }
    }
}
