//! Kinds of findings, and reasons for not judging.

use serde::{Deserialize, Serialize};

use crate::circuit::NetId;
use crate::logic::Shape;
use crate::time::{Span, Time};

/// What kind of thing was found.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord, Serialize, Deserialize)]
pub enum Kind {
    /// A partial state that must never show.
    Never,
    /// Rest in a partial state in which the circuit must not rest.
    NeverAtRest,
    /// Rest in a state that the step does not expect.
    Expect,
    /// A settled state that the reference does not allow.
    NotInReference,
    /// More than one settled state from one state and step.
    CriticalRace,
    /// Events without end that recur.
    Oscillation,
    /// An unwanted pulse on a watched net.
    Glitch,
    /// A wrong number of transitions.
    Edges,
    /// Edges too close or too far apart.
    Timing,
    /// A high or low that is too short.
    MinPulse,
    /// A net that moved too late.
    SettleWithin,
    /// A gate absorbed a pulse.
    Swallowed,
    /// A step came before rest.
    BeforeRest,
    /// A pattern that a step waited for never came.
    NeverCame,
    /// A limit was reached with events pending.
    Unsettled,
    /// A settled state with an X in it.
    Unresolved,
    /// One settled state, but loop nets changed in different orders.
    NonCriticalRace,
}

impl Kind {
    /// All kinds, most serious first.
    pub const ALL: [Kind; 17] = [
        Kind::Never,
        Kind::NeverAtRest,
        Kind::Expect,
        Kind::NotInReference,
        Kind::CriticalRace,
        Kind::Oscillation,
        Kind::Glitch,
        Kind::Edges,
        Kind::Timing,
        Kind::MinPulse,
        Kind::SettleWithin,
        Kind::Swallowed,
        Kind::BeforeRest,
        Kind::NeverCame,
        Kind::Unsettled,
        Kind::Unresolved,
        Kind::NonCriticalRace,
    ];

    /// The word used in every file and text.
    pub const fn word(self) -> &'static str {
        match self {
            Kind::Never => "never",
            Kind::NeverAtRest => "never-at-rest",
            Kind::Expect => "expect",
            Kind::NotInReference => "not-in-reference",
            Kind::CriticalRace => "critical-race",
            Kind::Oscillation => "oscillation",
            Kind::Glitch => "glitch",
            Kind::Edges => "edges",
            Kind::Timing => "timing",
            Kind::MinPulse => "min-pulse",
            Kind::SettleWithin => "settle-within",
            Kind::Swallowed => "swallowed",
            Kind::BeforeRest => "before-rest",
            Kind::NeverCame => "never-came",
            Kind::Unsettled => "unsettled",
            Kind::Unresolved => "unresolved",
            Kind::NonCriticalRace => "non-critical-race",
        }
    }
}

/// What a finding is about: there is one finding for each subject.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord, Serialize, Deserialize)]
pub struct Subject {
    /// What kind.
    pub kind: Kind,
    /// Shape of a glitch.
    pub shape: Option<Shape>,
    /// The question that it breaks or belongs to, by number in [`super::Asked::questions`].
    pub question: Option<u32>,
    /// The net, where it is about one.
    pub net: Option<NetId>,
    /// The moment that names the window; `None`: at rest before the first step.
    pub moment: Option<u32>,
}

/// How bad it was: the measured value, and a rank that orders such values, greater being worse.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord, Serialize, Deserialize)]
pub struct Measure {
    /// Greater is worse; the unit is that of the kind.
    pub rank: u64,
    /// Femtoseconds; for [`Kind::Swallowed`] the share p/d of the delay in units of 2^-53.
    pub value: u64,
}

impl Measure {
    /// A time of which more is worse.
    pub const fn long(span: Span) -> Measure {
        Measure { rank: span.fs(), value: span.fs() }
    }

    /// Worse than any time: for ever.
    pub const ENDLESS: Measure = Measure { rank: u64::MAX, value: u64::MAX };

    /// A share p/d of a delay, of which more is worse.
    pub fn share(part: Span, whole: Span) -> Measure {
        let value = ((u128::from(part.fs()) << 53) / u128::from(whole.fs().max(1))) as u64;
        Measure { rank: value, value }
    }

    /// A share, from 0 to 1.
    pub fn as_share(self) -> f64 {
        self.value as f64 / (1u64 << 53) as f64
    }
}

/// One thing found in one run.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Fact {
    /// What it is about.
    pub subject: Subject,
    /// Does it break a rule?
    pub breaks_rule: bool,
    /// How bad, where it has a measure.
    pub measure: Option<Measure>,
    /// Where in the run, for pictures: from and to.
    pub place: Option<(Time, Time)>,
}

/// Why a question was not judged in some sample. The first that holds is counted.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord, Serialize, Deserialize)]
#[repr(u8)]
pub enum Reason {
    /// The run ended before.
    NotReached,
    /// The window began with events pending.
    BeganBeforeRest,
    /// The window oscillated.
    Oscillating,
    /// A limit was reached.
    Unsettled,
    /// The next step came before rest.
    Cut,
    /// An X was in the way.
    Unresolved,
    /// The program does not analyse it yet.
    NotAnalysedYet,
    /// There were too many different states to keep and compare.
    TooManyStates,
    /// What the reference can do was not found out.
    GaveUp,
}

impl Reason {
    /// All reasons, in the order in which they are counted.
    pub const ALL: [Reason; 9] = [
        Reason::NotReached,
        Reason::BeganBeforeRest,
        Reason::Oscillating,
        Reason::Unsettled,
        Reason::Cut,
        Reason::Unresolved,
        Reason::NotAnalysedYet,
        Reason::TooManyStates,
        Reason::GaveUp,
    ];

    /// The words used in every file and text.
    pub const fn words(self) -> &'static str {
        match self {
            Reason::NotReached => "not reached",
            Reason::BeganBeforeRest => "began before rest",
            Reason::Oscillating => "oscillating",
            Reason::Unsettled => "unsettled",
            Reason::Cut => "cut",
            Reason::Unresolved => "unresolved",
            Reason::NotAnalysedYet => "not analysed yet",
            Reason::TooManyStates => "too many different states",
            Reason::GaveUp => "budget ran out",
        }
    }
}
