//! What a search for a limit says: ids and exact times; texts are made where results are written.

use super::parameter::Parameter;
use super::variant::Legal;
use crate::engine::Hit;
use crate::findings::{Reason, Subject};
use crate::instance::Instance;

/// What came of one value.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Outcome {
    /// All rules pass in all draws, all that the easy end has judged was judged, and every window settled.
    Passes,
    /// Something that was judged at the easy end was not, in some draw.
    NotJudged,
    /// A limit ended a window in some draw.
    Unsettled,
    /// A rule is broken in some draw.
    Breaks,
    /// A file that said so would be refused.
    Refused,
}

impl Outcome {
    /// All of them.
    pub const ALL: [Outcome; 5] =
        [Outcome::Passes, Outcome::NotJudged, Outcome::Unsettled, Outcome::Breaks, Outcome::Refused];

    /// The words used in every file and text.
    pub const fn words(self) -> &'static str {
        match self {
            Outcome::Passes => "passes",
            Outcome::NotJudged => "not judged",
            Outcome::Unsettled => "unsettled",
            Outcome::Breaks => "breaks a rule",
            Outcome::Refused => "not possible",
        }
    }

    /// The letter used in maps.
    pub const fn letter(self) -> char {
        match self {
            Outcome::Passes => '.',
            Outcome::NotJudged => '?',
            Outcome::Unsettled => 'U',
            Outcome::Breaks => 'F',
            Outcome::Refused => '-',
        }
    }

    pub(super) const fn rank(self) -> u8 {
        self as u8
    }
}

/// One value that was tried.
#[derive(Clone, Debug, PartialEq)]
pub struct Point {
    /// The value, fs.
    pub value: i64,
    /// What came of it, in the worst condition.
    pub outcome: Outcome,
    /// Draws that broke a rule.
    pub failing: u64,
    /// A critical race among the broken rules is counted by the draws that did the rarer thing; there may be more.
    pub at_least: bool,
    /// Draws that left the question open which most of them did.
    pub not_judged: u64,
    /// Draws.
    pub of: u64,
    /// 95 % interval of the share of failing draws (Clopper–Pearson, two-sided), for independent draws.
    pub interval: Option<(f64, f64)>,
    /// What kept it from passing.
    pub breach: Option<Box<Breach>>,
    /// Why a file that said so would be refused.
    pub refused: Option<String>,
}

impl Point {
    pub(super) fn refused(value: i64, of: u64, why: String) -> Point {
        let outcome = Outcome::Refused;
        let (failing, not_judged) = (0, 0);
        Point {
            value,
            outcome,
            failing,
            at_least: false,
            not_judged,
            of,
            interval: None,
            breach: None,
            refused: Some(why),
        }
    }

    /// Does it pass?
    pub fn passes(&self) -> bool {
        self.outcome == Outcome::Passes
    }

    /// The share of failing draws.
    pub fn share(&self) -> f64 {
        self.failing as f64 / self.of.max(1) as f64
    }
}

/// What kept a value from passing.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Breach {
    /// The number of the condition under which it happens; `None`: with the file's own delays.
    pub condition: Option<usize>,
    /// What it is.
    pub cause: Cause,
    /// Draws that show it.
    pub count: u64,
    /// Draws.
    pub of: u64,
    /// The first draw that shows it, where the sweep tells.
    pub sample: Option<u64>,
}

/// What kept a value from passing.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Cause {
    /// A rule is broken, or (of kind unresolved) an X remained at rest.
    Broken {
        /// The worst finding.
        subject: Subject,
        /// How many more findings break a rule.
        others: usize,
    },
    /// A question could not be judged that the easy end has judged.
    NotJudged {
        /// The question, by number in [`crate::findings::Asked::questions`].
        question: u32,
        /// The commonest reason; `None`: what it speaks of did not happen.
        reason: Option<Reason>,
    },
    /// A limit ended a window.
    Unsettled {
        /// The moment that names the window.
        moment: u32,
        /// The limit.
        hit: Option<Hit>,
    },
}

/// The range of a parameter that was searched.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Range {
    /// What is varied.
    pub parameter: Parameter,
    /// From and to as asked, fs.
    pub asked: (i64, i64),
    /// The part in which a file would not be refused.
    pub legal: Legal,
    /// Was it given, or chosen from the scenario?
    pub given: bool,
}

impl Range {
    /// The end that asks less of the circuit, fs.
    pub fn easy_end(&self) -> i64 {
        match self.parameter.easy() {
            super::Easy::Long => self.legal.to,
            super::Easy::Short => self.legal.from,
        }
    }
}

/// Neighbouring values of which one passes and the other does not.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Boundary {
    /// The value that passes, fs.
    pub passes: i64,
    /// The value that does not, fs.
    pub fails: i64,
}

/// A stretch of tried values of one kind.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Stretch {
    /// The first of them, fs.
    pub from: i64,
    /// The last of them, fs.
    pub to: i64,
    /// Do they pass?
    pub passes: bool,
}

/// The first value beyond the limit, and a case that shows why.
#[derive(Clone, Debug, PartialEq)]
pub struct Beyond {
    /// What came of it.
    pub point: Point,
    /// Sample and case that show it, to be run with the scenario as it is; `None` if no single draw does.
    pub case: Option<(u64, Instance)>,
}

/// What a search for a limit found.
#[derive(Clone, Debug)]
pub struct LimitReport {
    /// What was varied, and how far.
    pub range: Range,
    /// Boundaries were followed until the two values were this close, fs.
    pub within: u64,
    /// Draws at every value.
    pub samples: u64,
    /// All draws are alike, so that one says all.
    pub alike: bool,
    /// The distance of the values of the first scan, fs; an interval narrower than this may have been passed over.
    pub scan: u64,
    /// Every value tried, ascending.
    pub points: Vec<Point>,
    /// Stretches of values that pass and that do not, ascending.
    pub stretches: Vec<Stretch>,
    /// Every change from passing to not passing, ascending.
    pub boundaries: Vec<Boundary>,
    /// Boundaries that were not followed, for there are too many.
    pub not_followed: usize,
    /// The boundary of the passing stretch that reaches the easy end; `None` if there is no boundary or the easy end does
    /// not pass.
    pub limit: Option<Boundary>,
    /// What happens just beyond the limit; at the easy end if that does not pass.
    pub beyond: Option<Beyond>,
    /// Questions that were not judged in every draw at the easy end, and in how many they were: no more is asked of others.
    pub open: Vec<(u32, u64)>,
    /// The caller stopped it before all values were tried.
    pub interrupted: bool,
}

impl LimitReport {
    /// Is there at most one change from passing to not passing, the easy end passing?
    pub fn is_monotone(&self) -> bool {
        self.stretches.len() <= 1 || (self.stretches.len() == 2 && self.easy_end_passes())
    }

    /// Does the easy end pass?
    pub fn easy_end_passes(&self) -> bool {
        let easy = self.range.easy_end();
        self.points.iter().any(|point| point.value == easy && point.passes())
    }

    /// Do all values that were tried agree, and how?
    pub fn everywhere(&self) -> Option<bool> {
        match self.stretches[..] {
            [only] => Some(only.passes),
            _ => None,
        }
    }
}

/// What a map over two parameters found.
#[derive(Clone, Debug)]
pub struct MapReport {
    /// The parameter of the columns, and its values, ascending.
    pub across: (Range, Vec<i64>),
    /// The parameter of the rows, and its values, ascending.
    pub up: (Range, Vec<i64>),
    /// Draws at every pair of values.
    pub samples: u64,
    /// All draws are alike, so that one says all.
    pub alike: bool,
    /// Row by row in the order of `up`, each in the order of `across`; `value` is that of `up`. `None`: not tried, since the
    /// caller stopped it.
    pub cells: Vec<Vec<Option<Point>>>,
    /// Questions that were not judged in every draw at the easy corner.
    pub open: Vec<(u32, u64)>,
}

impl MapReport {
    /// Did the caller stop it?
    pub fn interrupted(&self) -> bool {
        self.cells.iter().flatten().any(Option::is_none)
    }

    /// How many pairs of values had this outcome.
    pub fn count(&self, outcome: Outcome) -> usize {
        self.cells.iter().flatten().flatten().filter(|point| point.outcome == outcome).count()
    }
}
