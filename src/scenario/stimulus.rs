//! Steps and clocks, and the moments that they make.

use crate::circuit::NetId;
use crate::delay::DelayRange;
use crate::scenario::{Alternative, EdgeCount, Expectation, Mark};
use crate::time::Span;

/// How the inputs move.
#[derive(Clone, Debug, Default)]
pub struct Stimulus {
    /// Value of every input before the first step, by net number.
    pub initial: Vec<bool>,
    /// Steps in order, loops unrolled.
    pub steps: Vec<Step>,
    /// Clocks in the order of the file.
    pub clocks: Vec<Clock>,
    /// Every moment at which a window can begin; see [`Moment`]. Filled by the builder.
    pub moments: Vec<Moment>,
    /// Where the steps come from.
    pub walk: Walk,
}

/// Where listed steps come from.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum Walk {
    /// They were written.
    #[default]
    Written,
    /// They are to make every single-input change from every reachable stable state, and are still missing:
    /// [`crate::flow::lay_out`] adds them, since they depend on what the circuit does.
    ToLayOut {
        /// How long after rest each comes.
        rest: Span,
        /// Where it was written.
        mark: Mark,
    },
    /// They were laid out.
    LaidOut,
}

/// A moment at which a window can begin, by number: power-up if there is one, then steps, then the edges of each clock.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Moment {
    /// The label: `power-up`, the step's label, or as in `tick rise 1`.
    pub label: String,
    /// What begins there.
    pub kind: MomentKind,
}

/// What begins a window.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum MomentKind {
    /// The start of a run that does not begin at rest.
    PowerUp,
    /// A listed step, by its number in [`Stimulus::steps`].
    Step(u32),
    /// The edge number `edge` (from 0) of clock `clock`.
    Edge {
        /// Which clock.
        clock: u32,
        /// Which of its edges; even edges lead away from the clock's initial value.
        edge: u32,
    },
}

/// One change of inputs.
#[derive(Clone, Debug)]
pub struct Step {
    /// Unique label.
    pub label: String,
    /// When.
    pub place: Place,
    /// The inputs it sets, in the order of the file, each once.
    pub set: Vec<(NetId, bool)>,
    /// How far apart the changes may come: each is moved by its own draw of this range.
    pub skew: Option<DelayRange>,
    /// Contact bounce of the inputs it sets.
    pub bounce: Option<Bounce>,
    /// Where nets must rest after it.
    pub expect: Option<Expectation>,
    /// How often nets must move after it, in net order.
    pub edges: Vec<EdgeCount>,
    /// Settling bound of this step, in place of the rule.
    pub settle_within: Option<Span>,
    /// What is said of oscillation after this step, in place of the rule.
    pub oscillation: Option<crate::scenario::Oscillation>,
    /// Where it was written.
    pub mark: Mark,
}

impl Step {
    /// May its inputs still change after it, by skew or bounce?
    pub fn moves_on(&self) -> bool {
        self.skew.is_some() || self.bounce.is_some()
    }
}

/// When a step comes. A range is drawn per try; typ, min and max runs take middle, lo, hi.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Place {
    /// At this time from the start.
    At(DelayRange),
    /// This long after the placed instant of the step before; the first counts from 0.
    After(DelayRange),
    /// This long after the circuit has come to rest and clocks have ended.
    Rest(Span),
    /// This long after a pattern has become true.
    When {
        /// The pattern.
        pattern: Alternative,
        /// How long after.
        wait: DelayRange,
        /// Longest time from the step before.
        timeout: Option<Span>,
    },
}

/// Contact bounce: each input set by the step toggles some extra pairs of times within a span.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Bounce {
    /// How long the contact bounces.
    pub lasting: DelayRange,
    /// Least and greatest number of extra pairs.
    pub pulses: (u32, u32),
}

/// A periodic input.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Clock {
    /// The input it drives.
    pub net: NetId,
    /// First edge, per try. A clock that starts at 1 falls first.
    pub first: DelayRange,
    /// Period, per board.
    pub period: DelayRange,
    /// Time high in each period, per board; its longest is below the shortest period.
    pub high: DelayRange,
    /// Each edge moves by up to this either way.
    pub jitter: Span,
    /// Number of periods, at least 1: twice as many edges.
    pub count: u32,
    /// Where it was written.
    pub mark: Mark,
}

impl Stimulus {
    /// The number of the moment of a listed step.
    pub fn moment_of_step(&self, step: u32) -> u32 {
        let power_up = matches!(self.moments.first(), Some(Moment { kind: MomentKind::PowerUp, .. }));
        step + u32::from(power_up)
    }

    /// The inputs that a moment can change.
    pub fn inputs_of(&self, moment: &Moment) -> Vec<NetId> {
        match moment.kind {
            MomentKind::PowerUp => Vec::new(),
            MomentKind::Step(step) => self.steps[step as usize].set.iter().map(|(net, _)| *net).collect(),
            MomentKind::Edge { clock, .. } => vec![self.clocks[clock as usize].net],
        }
    }

    /// Adds a step with its moment, which comes after those of the other listed steps.
    pub(crate) fn add_step(&mut self, step: Step) {
        let kind = MomentKind::Step(self.steps.len() as u32);
        let place = self.moment_of_step(self.steps.len() as u32) as usize;
        self.moments.insert(place, Moment { label: step.label.clone(), kind });
        self.steps.push(step);
    }

    /// The listed step of a moment.
    pub fn step_of(&self, moment: &Moment) -> Option<&Step> {
        match moment.kind {
            MomentKind::Step(step) => Some(&self.steps[step as usize]),
            _ => None,
        }
    }
}
