//! What a proof says, in ids and exact times; names and texts are made where results are written.

use super::margin::Margin;
use super::padding::Padding;
use super::race::Race;
use crate::instance::Instance;
use crate::logic::State;
use crate::time::Span;

/// How a claim came out.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Call {
    /// It holds for every delay in the ranges.
    Proved,
    /// It does not: delays in the ranges break it.
    Refuted,
    /// Neither could be shown.
    Undecided,
    /// The method does not speak of it.
    NotCovered,
}

impl Call {
    /// The word used in every file and text.
    pub const fn word(self) -> &'static str {
        match self {
            Call::Proved => "proved",
            Call::Refuted => "refuted",
            Call::Undecided => "undecided",
            Call::NotCovered => "not-covered",
        }
    }

    /// How much it speaks against a claim: the gravest of several answers is the answer.
    pub const fn severity(self) -> u8 {
        match self {
            Call::Proved => 0,
            Call::NotCovered => 1,
            Call::Undecided => 2,
            Call::Refuted => 3,
        }
    }
}

/// What it takes to break a claim.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Variation {
    /// Constant delays do.
    Constant,
    /// Only delays that change from one firing to the next do: all traces were looked through, none has constant delays. The
    /// claim is undecided then, since it holds for constant delays and may not for others.
    CycleToCycle,
    /// Constant delays that do were not found, nor was shown that there are none.
    Unknown,
}

impl Variation {
    /// The word used in every file and text.
    pub const fn word(self) -> &'static str {
        match self {
            Variation::Constant => "constant",
            Variation::CycleToCycle => "cycle-to-cycle",
            Variation::Unknown => "unknown",
        }
    }
}

/// One claim.
#[derive(Clone, Debug)]
pub struct Claim {
    /// That the question of this number (in [`crate::findings::Asked::questions`]) is answered well in every run.
    pub question: u32,
    /// How it came out.
    pub call: Call,
    /// Refuted only by exactly equal times.
    pub but_for_ties: bool,
    /// For a claim that something was found against, what it takes to break it.
    pub variation: Option<Variation>,
    /// For a refuted claim a case that shows it when it is run.
    pub witness: Option<Box<Instance>>,
    /// Why it is undecided or not covered; or what of the scenario was left out in refuting it.
    pub reason: Option<String>,
    /// For a refuted claim the inequality that decides it, where runs on both sides of one confirm it.
    pub race: Option<Race>,
    /// How far the ranges may be stretched, where that was asked and found out.
    pub margin: Option<Margin>,
}

impl Claim {
    /// A claim of which no more is known yet.
    pub(super) fn new(question: u32, call: Call) -> Claim {
        Claim {
            question,
            call,
            but_for_ties: false,
            variation: None,
            witness: None,
            reason: None,
            race: None,
            margin: None,
        }
    }
}

/// What is known of the window of one moment.
#[derive(Clone, Debug)]
pub struct WindowProof {
    /// The moment.
    pub moment: u32,
    /// Every state in which it can come to rest, in order; `None` if not known, or too many.
    pub states: Option<Vec<State>>,
    /// Least and greatest settling time; `None` if not known, or there is none.
    pub settling: Option<(Span, Span)>,
    /// Is the greatest time only come near to?
    pub settling_below: bool,
    /// Does the greatest leave out what takes exactly equal times?
    pub settling_but_for_ties: bool,
}

impl Proof {
    /// Names for the files of the witnesses, by claim. A name goes with its question, so that a file of an earlier proof of
    /// the same scenario, made within another budget, still refutes what its name says.
    pub fn witness_files(&self) -> Vec<Option<String>> {
        let name = |claim: &Claim| {
            let number = claim.question + 1;
            claim.witness.as_ref().map(|_| format!("refuted-{number}.toml"))
        };
        self.claims.iter().map(name).collect()
    }

    /// How many claims came out so.
    pub fn count(&self, call: Call) -> u64 {
        self.claims.iter().filter(|claim| claim.call == call).count() as u64
    }
}

/// What a proof says.
#[derive(Clone, Debug, Default)]
pub struct Proof {
    /// The claims, in the order of the questions.
    pub claims: Vec<Claim>,
    /// The windows, in the order of their moments.
    pub windows: Vec<WindowProof>,
    /// Delays to add, where that was asked.
    pub padding: Option<Padding>,
    /// Zones that were kept, in all explorations.
    pub zones: u64,
    /// Zones that all explorations together were allowed, where that was bounded.
    pub allowed: Option<u64>,
    /// What was left out, in whole sentences.
    pub notes: Vec<String>,
}
