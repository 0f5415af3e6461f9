//! What a directed search says.

use crate::findings::{Against, Measure, Subject};
use crate::instance::{Instance, Which};
use crate::sweep::{Finding, RuleReport, SweepReport, Worst};

/// The result of a directed search. The worst it met is no bound: where it found nothing there may be something.
#[derive(Clone, Debug)]
pub struct SearchReport {
    /// Runs that a question was to get, as the plan says; 0: nothing was searched.
    pub per_question: u64,
    /// Runs that a question could take, all questions sharing what all together may take.
    pub budget: u64,
    /// Runs taken by all.
    pub runs: u64,
    /// One a question, in the order of [`crate::findings::Asked::questions`].
    pub searched: Vec<Searched>,
    /// Was it stopped before its end?
    pub interrupted: bool,
}

/// The search of one question.
#[derive(Clone, Debug, PartialEq)]
pub struct Searched {
    /// The question, by number.
    pub question: u32,
    /// The worst margin of the draws, in fs.
    pub start_margin: Option<i128>,
    /// The worst margin that the search met, in fs, negative when broken; `None` where the question has no number, or was
    /// not judged in any case tried.
    pub margin: Option<i128>,
    /// How it went about it.
    pub guidance: Guidance,
    /// Runs taken.
    pub runs: u64,
    /// Why it ended.
    pub ended: Ended,
    /// Breaches set aside because they vanish when times are moved by single femtoseconds.
    pub ties: u64,
    /// The worst case met, if it is worse than what the draws showed.
    pub case: Option<Box<Instance>>,
    /// The breach that this case shows, where it breaks the question.
    pub breach: Option<Breach>,
}

/// What a case shows that breaks a question.
#[derive(Clone, Debug, PartialEq)]
pub struct Breach {
    /// What it is about.
    pub subject: Subject,
    /// How bad.
    pub measure: Option<Measure>,
    /// How it departed from the reference, if that is it.
    pub against: Option<Against>,
}

/// What told the search whether a case is nearer.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Guidance {
    /// Nothing did, or nothing was tried.
    Nothing,
    /// The margin of the rule.
    Margin,
    /// The time by which the parts of a pattern missed each other: the least in fs.
    Apart(i64),
    /// The time from rest to the step: the least in fs.
    Rest(i64),
    /// How nearly some gate did something else.
    Meetings,
}

impl Guidance {
    /// The word in files.
    pub const fn word(self) -> &'static str {
        match self {
            Guidance::Nothing => "nothing",
            Guidance::Margin => "margin",
            Guidance::Apart(_) => "apart",
            Guidance::Rest(_) => "from rest",
            Guidance::Meetings => "meetings",
        }
    }

    /// The least time, where it is one other than the margin.
    pub const fn least(self) -> Option<i64> {
        match self {
            Guidance::Apart(fs) | Guidance::Rest(fs) => Some(fs),
            _ => None,
        }
    }
}

/// Why the search of a question ended.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Ended {
    /// Search is off.
    Off,
    /// A draw broke it: there is nothing to search for.
    BrokenInDraws,
    /// Nothing that could be moved has a say in it.
    NothingVaries,
    /// Too many questions for the budget: it was not searched.
    NoBudget,
    /// It was broken, and how badly has no number.
    Found,
    /// All runs were taken.
    Budget,
    /// No move helped any more.
    NoMove,
    /// Nothing told whether a case is nearer; only the starts and some chance moves were tried.
    NoGuide,
    /// The caller stopped it.
    Interrupted,
}

impl Ended {
    /// The words in files.
    pub const fn words(self) -> &'static str {
        match self {
            Ended::Off => "off",
            Ended::BrokenInDraws => "broken in draws",
            Ended::NothingVaries => "nothing varies",
            Ended::NoBudget => "not searched: too many questions",
            Ended::Found => "found",
            Ended::Budget => "budget used up",
            Ended::NoMove => "no move helps",
            Ended::NoGuide => "chance moves only",
            Ended::Interrupted => "interrupted",
        }
    }
}

impl Searched {
    /// A question that was not searched (yet).
    pub(super) fn unsearched(question: u32, rule: &RuleReport) -> Searched {
        Searched {
            question,
            start_margin: rule.margin,
            margin: None,
            guidance: Guidance::Nothing,
            runs: 0,
            ended: Ended::NoBudget,
            ties: 0,
            case: None,
            breach: None,
        }
    }
}

impl SearchReport {
    /// What no draw showed, as findings of this sweep: count 0, no share, the case beside it.
    pub fn findings(&self, sweep: &SweepReport) -> Vec<Finding> {
        let each = self.searched.iter().filter_map(|it| Some((it, it.breach.as_ref()?, it.case.as_ref()?)));
        each.map(|(it, breach, case)| Finding {
            subject: breach.subject,
            breaks_rule: true,
            count: 0,
            of: sweep.rules[it.question as usize].judged,
            share: None,
            interval: None,
            boards: None,
            worst: breach.measure.map(|measure| Worst::of(breach.subject.kind, measure)),
            against: breach.against.clone(),
            tie: None,
            sample: None,
            worst_sample: None,
            case: Some(Box::new(Which::Given(case.clone()))),
            rare: false,
        })
        .collect()
    }

    /// How many questions were searched.
    pub fn count(&self) -> u64 {
        self.searched.iter().filter(|it| it.runs > 0).count() as u64
    }

    /// Questions for which there was no budget.
    pub fn left_out(&self) -> u64 {
        self.searched.iter().filter(|it| it.ended == Ended::NoBudget).count() as u64
    }
}
