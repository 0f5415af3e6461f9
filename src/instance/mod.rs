//! One concrete case: everything that one run needs beside the scenario.
//!
//! A case is typical, least, greatest, drawn by number, or given (by a file, a search, a proof): all of them are an
//! [`Instance`], so all of them can be run, drawn as a picture, and replayed.

mod bounces;
mod firings;
mod groups;
mod numbers;
mod perturb;
mod quantity;
mod sampler;
mod strata;
mod stream;

pub use firings::{Anew, Drawn, Firings};
pub use numbers::{Cases, Numbers};
pub use perturb::{PERTURBATIONS, Perturbed, Unmovable};
pub use quantity::{Quantities, Quantity, Target};
pub use sampler::{LAYOUT, Sampler};

use crate::delay::{DelayRange, Delays};
use crate::logic::Bits;
use crate::scenario::{Begin, Place, Scenario};
use crate::time::Span;

/// A delay for every gate, edge and wire, a place for every step, clock figures, start bits.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Instance {
    /// Delays of gates and wires.
    pub delays: Delays,
    /// Delays of gates that differ from firing to firing; `None`: every firing takes `delays`.
    pub firings: Option<Firings>,
    /// One a step: `at` from the start; `after`, `rest` and `when`: the wait.
    pub places: Vec<Span>,
    /// For each step, how much later than its placed instant each input of its `set` changes; empty without skew.
    pub skews: Vec<Vec<Span>>,
    /// For each step, how much later than its moment each input of its `set` toggles, ascending, an even number of times;
    /// empty without bounce.
    pub bounces: Vec<Vec<Vec<Span>>>,
    /// One a clock.
    pub clocks: Vec<ClockCase>,
    /// Output of every gate at the start, only where a run begins at random; else empty.
    pub start: Bits,
}

/// One clock of one case.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct ClockCase {
    /// First edge, from the start.
    pub first: Span,
    /// Period.
    pub period: Span,
    /// Time high in each period.
    pub high: Span,
    /// By how many fs each edge is moved.
    pub jitter: Vec<i64>,
}

/// Which case of a scenario.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Which {
    /// Typical delays, middle places, no skew, no jitter, bounces evenly spread.
    Typ,
    /// Least delays, earliest places, no skew, no jitter, fewest and shortest bounces.
    Min,
    /// Greatest delays, latest places, no skew, no jitter, most and longest bounces.
    Max,
    /// The sample of this number.
    Sample(u64),
    /// This very case.
    Given(Box<Instance>),
    /// Another case with every time moved by single femtoseconds, in the way of this number, from 1 to
    /// [`PERTURBATIONS`]; see [`Instance::perturbed`].
    Perturbed(Box<Which>, u8),
}

impl Which {
    /// The case in words: `typical`, `sample 8123`.
    pub fn words(&self) -> String {
        match self {
            Which::Typ => "typical".into(),
            Which::Min => "min".into(),
            Which::Max => "max".into(),
            Which::Sample(n) => format!("sample {n}"),
            Which::Given(_) => "given case".into(),
            Which::Perturbed(which, number) => format!("{}, perturbation {number}", which.words()),
        }
    }

    /// The case as `run --delays` takes it: `typ`, `sample:12`, `typ~3`; a given case is a file.
    pub fn key(&self) -> String {
        match self {
            Which::Typ => "typ".into(),
            Which::Min => "min".into(),
            Which::Max => "max".into(),
            Which::Sample(n) => format!("sample:{n}"),
            Which::Given(_) => "file".into(),
            Which::Perturbed(which, number) => format!("{}~{number}", which.key()),
        }
    }
}

impl Instance {
    /// The case of a scenario.
    ///
    /// Runs that begin at random take the start bits of sample 0 for typ, min and max. A perturbation of a case that has
    /// no room to be moved is that case; [`Instance::perturbed`] tells.
    pub fn of(scenario: &Scenario, which: &Which) -> Instance {
        let pick: fn(DelayRange) -> Span = match which {
            Which::Given(instance) => return (**instance).clone(),
            Which::Perturbed(which, number) => {
                let instance = Instance::of(scenario, which);
                return instance.perturbed(scenario, *number).map_or(instance, |it| it.instance);
            }
            Which::Sample(n) => {
                let mut instance = Instance::of(scenario, &Which::Typ);
                Sampler::new(scenario).fill(*n, &mut instance);
                return instance;
            }
            Which::Typ => |range| range.typ,
            Which::Min => |range| range.min,
            Which::Max => |range| range.max,
        };
        let stimulus = &scenario.stimulus;
        let place = |place: &Place| match place {
            Place::At(range) | Place::After(range) | Place::When { wait: range, .. } => pick(*range),
            Place::Rest(wait) => *wait,
        };
        let mut instance = Instance {
            delays: Delays {
                gate: scenario.delays.gate.iter().map(|edges| edges.map(pick)).collect(),
                wire: scenario.delays.wire.iter().map(|edges| edges.map(pick)).collect(),
            },
            firings: None,
            places: stimulus.steps.iter().map(|step| place(&step.place)).collect(),
            skews: stimulus
                .steps
                .iter()
                .map(|step| if step.skew.is_some() { vec![Span::ZERO; step.set.len()] } else { Vec::new() })
                .collect(),
            bounces: stimulus.steps.iter().map(|step| bounces::even(step, pick)).collect(),
            clocks: stimulus
                .clocks
                .iter()
                .map(|clock| ClockCase {
                    first: pick(clock.first),
                    period: pick(clock.period),
                    high: pick(clock.high),
                    jitter: if clock.jitter == Span::ZERO { Vec::new() } else { vec![0; 2 * clock.count as usize] },
                })
                .collect(),
            start: Bits::default(),
        };
        if scenario.begin == Begin::Random {
            instance.start = Bits::zeros(scenario.circuit.gate_count());
            Sampler::new(scenario).fill_start(0, &mut instance.start);
        }
        instance
    }
}

impl ClockCase {
    /// The instant of edge `edge` (from 0) of a clock whose input starts at `initial`; an edge that jitter would put
    /// before the start comes at the start.
    pub fn edge(&self, initial: bool, edge: u32) -> u64 {
        let cycles = u64::from(edge / 2) * self.period.fs();
        let half = if initial { self.period.fs() - self.high.fs() } else { self.high.fs() };
        let at = self.first.fs() + cycles + if edge % 2 == 1 { half } else { 0 };
        at.saturating_add_signed(self.jitter.get(edge as usize).copied().unwrap_or(0))
    }
}
