//! The words in which a scenario is told to the builder: names and raw values, each with its [`Mark`].

use crate::circuit::Function;
use crate::delay::DelayRange;
use crate::scenario::{Mark, Oscillation};
use crate::time::Span;

/// Something said, and where. Whatever is handed in without a mark has mark 0.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Said<T> {
    /// What was said.
    pub what: T,
    /// Where.
    pub mark: Mark,
}

impl<T> Said<T> {
    /// Something said at a place.
    pub fn at(what: T, mark: Mark) -> Said<T> {
        Said { what, mark }
    }
}

impl<T> From<T> for Said<T> {
    fn from(what: T) -> Said<T> {
        Said { what, mark: Mark::default() }
    }
}

impl From<&str> for Said<String> {
    fn from(text: &str) -> Said<String> {
        Said::from(text.to_string())
    }
}

/// A length of time: text that still waits for its unit (`"2.5"`, `"2.5 us"`), or exact.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Amount {
    /// A number in the scenario's unit, or with a unit of its own; see [`Span::parse`].
    Text(String),
    /// Exact.
    Exact(Span),
}

impl From<&str> for Amount {
    fn from(text: &str) -> Amount {
        Amount::Text(text.to_string())
    }
}

impl From<Span> for Amount {
    fn from(span: Span) -> Amount {
        Amount::Exact(span)
    }
}

impl From<&str> for Said<Amount> {
    fn from(text: &str) -> Said<Amount> {
        Said::from(Amount::from(text))
    }
}

impl From<Span> for Said<Amount> {
    fn from(span: Span) -> Said<Amount> {
        Said::from(Amount::from(span))
    }
}

/// A range of times as it was said.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum NewRange {
    /// Always the same.
    Exact(Said<Amount>),
    /// `[min, max]`; typical is the middle, rounded down.
    Between([Said<Amount>; 2]),
    /// `[min, typ, max]`.
    Three([Said<Amount>; 3]),
    /// `{ typ, max }`; the minimum is assumed. For delays only.
    TypMax([Said<Amount>; 2]),
}

impl From<&str> for NewRange {
    fn from(text: &str) -> NewRange {
        NewRange::Exact(text.into())
    }
}

impl From<Span> for NewRange {
    fn from(span: Span) -> NewRange {
        NewRange::Exact(span.into())
    }
}

impl<A: Into<Said<Amount>>> From<[A; 2]> for NewRange {
    fn from(ends: [A; 2]) -> NewRange {
        NewRange::Between(ends.map(Into::into))
    }
}

impl<A: Into<Said<Amount>>> From<[A; 3]> for NewRange {
    fn from(all: [A; 3]) -> NewRange {
        NewRange::Three(all.map(Into::into))
    }
}

impl From<DelayRange> for NewRange {
    fn from(range: DelayRange) -> NewRange {
        NewRange::from([range.min, range.typ, range.max])
    }
}

/// One entry of delays: `delay` for both edges, or `rise` and `fall`. An edge that it leaves open is looked up further on.
#[derive(Clone, Debug, Default)]
pub struct NewDelay {
    /// Of both edges, in one draw.
    pub delay: Option<Said<NewRange>>,
    /// Of the edge to 1.
    pub rise: Option<Said<NewRange>>,
    /// Of the edge to 0.
    pub fall: Option<Said<NewRange>>,
}

impl NewDelay {
    /// The delay of both edges, in one draw.
    pub fn delay(&mut self, range: impl Into<NewRange>) -> &mut NewDelay {
        self.delay = Some(Said::from(range.into()));
        self
    }

    /// The delay of the edge to 1.
    pub fn rise(&mut self, range: impl Into<NewRange>) -> &mut NewDelay {
        self.rise = Some(Said::from(range.into()));
        self
    }

    /// The delay of the edge to 0.
    pub fn fall(&mut self, range: impl Into<NewRange>) -> &mut NewDelay {
        self.fall = Some(Said::from(range.into()));
        self
    }

    pub(super) fn is_empty(&self) -> bool {
        self.delay.is_none() && self.rise.is_none() && self.fall.is_none()
    }
}

/// What a gate does with short pulses, as it was said.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum NewFilter {
    /// A pulse shorter than the delay is swallowed; the default.
    Inertial,
    /// Every pulse passes.
    Transport,
    /// Pulses not longer than this are swallowed; shorter than the least delay.
    Reject(Said<Amount>),
    /// Short pulses shrink; the time constant.
    Involution(Said<Amount>),
}

/// The function of a gate, as it was said.
#[derive(Clone, Debug)]
pub(super) enum NewFunction {
    Known(Function),
    Expr,
    Unreadable,
}

/// A gate as it was said; made by [`Builder::gate`](super::Builder::gate), which names function and pins.
#[derive(Clone, Debug)]
pub struct NewGate {
    pub(super) name: Said<String>,
    pub(super) function: Said<NewFunction>,
    /// Pins, or the one text of an expression.
    pub(super) pins: Vec<Said<String>>,
    pub(super) wires: Vec<(Said<String>, NewDelay)>,
    pub(super) filter: Option<Said<NewFilter>>,
    /// The gate's own delays.
    pub delays: NewDelay,
}

impl NewGate {
    /// Where the function was said; by default where the name was.
    pub fn function_mark(&mut self, mark: Mark) -> &mut NewGate {
        self.function.mark = mark;
        self
    }

    /// The delay of both edges, in one draw.
    pub fn delay(&mut self, range: impl Into<NewRange>) -> &mut NewGate {
        self.delays.delay(range);
        self
    }

    /// The delay of the edge to 1.
    pub fn rise(&mut self, range: impl Into<NewRange>) -> &mut NewGate {
        self.delays.rise(range);
        self
    }

    /// The delay of the edge to 0.
    pub fn fall(&mut self, range: impl Into<NewRange>) -> &mut NewGate {
        self.delays.fall(range);
        self
    }

    /// What it does with short pulses.
    pub fn filter(&mut self, filter: impl Into<Said<NewFilter>>) -> &mut NewGate {
        self.filter = Some(filter.into());
        self
    }

    /// A delay of the wire from a net to this gate.
    pub fn wire(&mut self, net: impl Into<Said<String>>, delays: NewDelay) -> &mut NewGate {
        self.wires.push((net.into(), delays));
        self
    }
}

/// Nets with the values that they must have or get.
pub type NewState = Vec<(Said<String>, bool)>;

/// Names and values into a [`NewState`].
pub fn state<N: Into<Said<String>>>(values: impl IntoIterator<Item = (N, bool)>) -> NewState {
    values.into_iter().map(|(net, value)| (net.into(), value)).collect()
}

/// Where a step was put.
#[derive(Clone, Debug)]
pub enum NewPlace {
    /// At this time from the start, or within `[lo, hi]`.
    At(Said<NewRange>),
    /// This long after the step before.
    After(Said<NewRange>),
    /// This long after the circuit has come to rest.
    Rest(Said<Amount>),
    /// Some time after a pattern has become true.
    When {
        /// The pattern.
        pattern: Said<NewState>,
        /// How long after; default at once.
        wait: Option<Said<NewRange>>,
        /// Longest time from the step before.
        timeout: Option<Said<Amount>>,
    },
    /// It could not be read, and that was reported: asks for no check.
    Unreadable,
}

/// Contact bounce as it was said.
#[derive(Clone, Debug)]
pub struct NewBounce {
    /// How long the contact bounces.
    pub lasting: Said<NewRange>,
    /// Least and greatest number of extra pairs of changes.
    pub pulses: Said<(u64, u64)>,
}

/// A net with the least and the greatest number of its transitions.
pub type NewEdges = (Said<String>, Said<(u64, u64)>);

/// A step as it was said. Build it up by its methods, or fill its fields to give marks.
#[derive(Clone, Debug, Default)]
pub struct NewStep {
    /// Label; by default `step N`, N being its number among all steps as written.
    pub label: Option<Said<String>>,
    /// Places; more than one is a fault, none means at rest.
    pub places: Vec<NewPlace>,
    /// Inputs and their new values.
    pub set: NewState,
    /// How far apart the changes may come.
    pub skew: Option<Said<NewRange>>,
    /// Contact bounce.
    pub bounce: Option<NewBounce>,
    /// Where nets must rest after it: one of these partial states.
    pub expect: Option<Said<Vec<Said<NewState>>>>,
    /// Least and greatest number of transitions of nets in its window.
    pub edges: Vec<NewEdges>,
    /// Settling bound of this step.
    pub settle_within: Option<Said<Amount>>,
    /// What is said of oscillation after this step.
    pub oscillation: Option<Oscillation>,
    /// Where the step was written.
    pub mark: Mark,
    /// Part of it could not be read, and that was reported: nothing more is asked of it.
    pub incomplete: bool,
}

impl NewStep {
    /// A step placed at this time from the start.
    pub fn at(range: impl Into<NewRange>) -> NewStep {
        NewStep { places: vec![NewPlace::At(Said::from(range.into()))], ..NewStep::default() }
    }

    /// A step this long after the one before; the first counts from 0.
    pub fn after(range: impl Into<NewRange>) -> NewStep {
        NewStep { places: vec![NewPlace::After(Said::from(range.into()))], ..NewStep::default() }
    }

    /// A step this long after the whole circuit has come to rest and clocks have ended.
    pub fn rest(amount: impl Into<Amount>) -> NewStep {
        NewStep { places: vec![NewPlace::Rest(Said::from(amount.into()))], ..NewStep::default() }
    }

    /// Its label.
    pub fn label(mut self, label: impl Into<Said<String>>) -> NewStep {
        self.label = Some(label.into());
        self
    }

    /// Sets an input.
    pub fn set(mut self, input: impl Into<Said<String>>, value: bool) -> NewStep {
        self.set.push((input.into(), value));
        self
    }

    /// Spreads the changes of the inputs.
    pub fn skew(mut self, range: impl Into<NewRange>) -> NewStep {
        self.skew = Some(Said::from(range.into()));
        self
    }

    /// One more partial state in which the nets may rest after it.
    pub fn expect<N: Into<Said<String>>>(mut self, values: impl IntoIterator<Item = (N, bool)>) -> NewStep {
        self.expect.get_or_insert_default().what.push(Said::from(state(values)));
        self
    }

    /// The net makes at least and at most so many transitions in the step's window.
    pub fn edges(mut self, net: impl Into<Said<String>>, least: u64, most: u64) -> NewStep {
        self.edges.push((net.into(), Said::from((least, most))));
        self
    }

    /// Settling bound of this step.
    pub fn settle_within(mut self, amount: impl Into<Amount>) -> NewStep {
        self.settle_within = Some(Said::from(amount.into()));
        self
    }

    /// What is said of oscillation after this step.
    pub fn oscillation(mut self, oscillation: Oscillation) -> NewStep {
        self.oscillation = Some(oscillation);
        self
    }
}

/// A clock as it was said.
#[derive(Clone, Debug)]
pub struct NewClock {
    /// The input that it drives.
    pub net: Said<String>,
    /// First edge.
    pub first: Said<NewRange>,
    /// Period.
    pub period: Said<NewRange>,
    /// Time high in each period.
    pub high: Said<NewRange>,
    /// Each edge moves by up to this either way; default none.
    pub jitter: Option<Said<Amount>>,
    /// Number of periods.
    pub count: Said<u64>,
    /// Where the clock was written.
    pub mark: Mark,
}

impl NewClock {
    /// A clock without jitter.
    pub fn new(
        net: impl Into<Said<String>>,
        first: impl Into<NewRange>,
        period: impl Into<NewRange>,
        high: impl Into<NewRange>,
        count: u64,
    ) -> NewClock {
        NewClock {
            net: net.into(),
            first: Said::from(first.into()),
            period: Said::from(period.into()),
            high: Said::from(high.into()),
            jitter: None,
            count: Said::from(count),
            mark: Mark::default(),
        }
    }

    /// Moves each edge by up to this either way.
    pub fn jitter(mut self, amount: impl Into<Amount>) -> NewClock {
        self.jitter = Some(Said::from(amount.into()));
        self
    }
}

/// Gates whose delays belong together: either `tracking`, or `scale` and `mismatch`.
#[derive(Clone, Debug, Default)]
pub struct NewGroup {
    /// Its gates.
    pub gates: Vec<Said<String>>,
    /// Correlation of their delays, 0 to 1.
    pub tracking: Option<Said<f64>>,
    /// Least and greatest common factor, both above 0.
    pub scale: Option<Said<(f64, f64)>>,
    /// Greatest deviation of one gate from the common factor, 0 to below 1.
    pub mismatch: Option<Said<f64>>,
    /// Where the group was written.
    pub mark: Mark,
    /// Part of it could not be read, and that was reported: nothing more is asked of it.
    pub incomplete: bool,
}

/// The reference network as it was said: gates without delays, and the nets to compare.
#[derive(Clone, Debug, Default)]
pub struct NewReference {
    pub(super) gates: Vec<NewGate>,
    /// The nets to compare; default the outputs.
    pub compare: Option<Vec<Said<String>>>,
    /// Where it was written.
    pub mark: Mark,
}
