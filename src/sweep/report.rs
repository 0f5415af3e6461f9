//! What a sweep says, in ids and exact times; names and texts are made where results are written.

use std::collections::BTreeMap;

use crate::engine::Hit;
use crate::findings::{Against, Kind, Measure, Question, Reason, Subject};
use crate::instance::{Unmovable, Which};
use crate::logic::State;
use crate::scenario::{Condition, Plan};
use crate::time::Span;

use super::conclude::confidence;
use super::envelope::Envelope;
use super::looks::{Curve, Point, widest};
use super::margins::Margins;
use super::ranges::Ranges;
use super::stats::clopper_pearson;
use super::unseen::UnseenMass;

/// The result of a sweep.
#[derive(Clone, Debug)]
pub struct SweepReport {
    /// What was drawn. `plan.samples` is what was asked for.
    pub plan: Plan,
    /// Samples that were run; fewer than asked for only when interrupted, 0 if the circuit cannot be run yet.
    pub samples: u64,
    /// One a moment, in the order of [`crate::scenario::Stimulus::moments`].
    pub windows: Vec<WindowReport>,
    /// One a question, in the order of [`crate::findings::Asked::questions`].
    pub rules: Vec<RuleReport>,
    /// Findings, worst first: rule breakers before others, by kind, by count.
    pub findings: Vec<Finding>,
    /// If no draw broke a rule: how often one may at most. `None` if one did, if something was not judged, and for draws of
    /// `corners` and `hypercube`.
    pub at_most: Option<AtMost>,
    /// The window of whose behaviour most has not been seen yet. `None` if that cannot be told of any: with tries, for draws
    /// of `corners` and `hypercube`, where no window led from rest to rest, or there were more orders than are kept.
    pub unseen: Option<UnseenMass>,
    /// For how many windows that cannot be told because there were more orders than are kept.
    pub unseen_untold: u64,
    /// For what breaks a rule, but for races, the lowest samples that show it, ascending, at most [`FAILING`](super::FAILING).
    pub failing: BTreeMap<Subject, Vec<u64>>,
    /// Samples that were asked for and are not in it: it was interrupted, or parts of it are not there. None where it
    /// stopped by itself.
    pub missing: Ranges,
    /// How it stopped when its shares were sure, if it was to; `None` within a condition.
    pub stopped: Option<Box<Stopped>>,
    /// The same draws under each condition of the scenario; empty within one.
    pub conditions: Vec<ConditionReport>,
    /// How far exactly equal times were looked for.
    pub ties: TiesSought,
    /// Between which times each edge came; `None` if that was not asked for, and within a condition.
    pub envelope: Option<Box<Envelope>>,
}

/// How far exactly equal times were looked for: of which cases and findings it is not known what they have to do with a
/// finding.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct TiesSought {
    /// All cases were run that were to be: typical, min and max, first samples, and their perturbations. If not, no
    /// finding has a tie.
    pub done: bool,
    /// Cases whose times could not be moved.
    pub unmoved: Option<Unmoved>,
    /// Findings whose first sample was left out, since there were too many.
    pub left_out: u64,
}

/// Cases whose times could not be moved.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Unmoved {
    /// How many: typical, min and max count, and each first sample of a finding.
    pub cases: u64,
    /// The first of them.
    pub first: Which,
    /// Why it could not.
    pub why: Unmovable,
}

/// A sweep under one condition of temperature and supply.
#[derive(Clone, Debug)]
pub struct ConditionReport {
    /// The condition.
    pub condition: Condition,
    /// What its sweep says.
    pub sweep: SweepReport,
}

/// How a sweep stopped that was to stop when its shares are sure. Its intervals allow for all its looks.
#[derive(Clone, Debug)]
pub struct Stopped {
    /// When it may stop, and what each look saw.
    pub curve: Curve,
    /// Looks that were planned.
    pub looks: u64,
    /// The widest interval at its end; `None` if there was no share with an interval.
    pub widest: Option<f64>,
}

impl Stopped {
    /// What may be known of a sweep with this curve and so many planned looks.
    pub fn of(curve: Curve, looks: u64, report: &SweepReport) -> Stopped {
        Stopped { curve, looks, widest: widest(report) }
    }

    /// The interval of a share at one of the looks: from, to.
    pub fn interval(&self, point: &Point) -> Option<(f64, f64)> {
        clopper_pearson(point.count, point.of, confidence(self.looks))
    }
}

/// What was never seen, and how often it happens at most: an upper bound, one-sided, 95 %.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct AtMost {
    /// Share of draws that fail, at most; of boards (failing in any of their tries) where they have several.
    pub share: f64,
    /// Independent draws without a failure, or boards.
    pub of: u64,
    /// Are they boards?
    pub boards: bool,
}

/// What happened in the windows of one moment.
#[derive(Clone, Debug)]
pub struct WindowReport {
    /// The moment.
    pub moment: u32,
    /// Samples in which the moment came (alone, or together with one that names the window).
    pub reached: u64,
    /// Samples in which the moment named the window; all other figures count these.
    pub named: u64,
    /// Settled states, commonest first.
    pub outcomes: Vec<Outcome>,
    /// There were more outcomes than are kept; the counts of those listed are exact.
    pub outcomes_truncated: bool,
    /// Windows that settled.
    pub settled: u64,
    /// Windows that a limit ended.
    pub unsettled: u64,
    /// The limits that ended them, with their numbers; only those that did.
    pub hits: Vec<(Hit, u64)>,
    /// Windows that oscillated.
    pub oscillating: u64,
    /// Windows that the next step ended.
    pub cut: u64,
    /// Windows that began with events pending.
    pub began_before_rest: u64,
    /// Settling time; `None` if no window settled or was cut.
    pub settling: Option<Settling>,
    /// Every state of rest from which its step led to more than one state, with the commonest of them; in order.
    pub forks: Vec<Fork>,
}

/// A state of rest from which one step led to several.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Fork {
    /// The state before the step.
    pub before: State,
    /// The commonest of those after it; of equally common ones that of the lowest sample.
    pub commonest: State,
}

/// One settled state of a window.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Outcome {
    /// The state.
    pub state: State,
    /// In how many samples.
    pub count: u64,
    /// The first of them.
    pub first: u64,
    /// Does resting here break a rule (`expect`, the reference, `never_at_rest`, or a forbidden critical race) in some sample?
    pub breaks_rule: bool,
}

/// Settling times of one moment; nearest rank over settled windows and lengths of cut ones.
#[derive(Clone, Debug, PartialEq)]
pub struct Settling {
    /// Shortest of the settled windows.
    pub min: Option<Span>,
    /// Median.
    pub median: Span,
    /// A cut window could make the median longer.
    pub median_at_least: bool,
    /// 99th percentile.
    pub p99: Span,
    /// A cut window could make the 99th percentile longer.
    pub p99_at_least: bool,
    /// Longest.
    pub max: Span,
    /// A cut window could make the longest longer.
    pub max_at_least: bool,
    /// Relative width of the classes that median and p99 are lower edges of; 0 where they are exact.
    pub resolution: f64,
    /// Histogram of settled windows for pictures: (from, up to but not including, count), in order, no empty ends.
    pub bars: Vec<(Span, Span, u64)>,
    /// The last bar is not of the width of the others: it holds the few windows that settled far later than the rest. So it
    /// is where the latest of 999 of 1000 windows (at least all but one) lies less than a fifth of the way from the earliest
    /// to the latest.
    pub far: bool,
}

/// How a question was answered over all samples.
#[derive(Clone, Debug)]
pub struct RuleReport {
    /// The question.
    pub question: Question,
    /// Samples judged.
    pub judged: u64,
    /// Samples that broke it.
    pub broken: u64,
    /// Samples not judged, by reason, only those that occurred.
    pub not_judged: Vec<(Reason, u64)>,
    /// The worst slack seen, in fs; negative when broken. `None` for rules without a number, or never judged.
    pub margin: Option<i128>,
    /// The sample of the worst slack.
    pub margin_sample: Option<u64>,
    /// The worst slack of each sample that was judged and has one, in classes. Judged samples in which there was nothing to
    /// measure have none, such as those in which a state that `never` tolerates for a while did not come.
    pub margins: Margins,
    /// If no draw broke it: how often one may at most. `None` for races, which no draw shows alone, with tries where it was
    /// not judged in every sample, and for draws of `corners` and `hypercube`.
    pub at_most: Option<AtMost>,
}

/// One finding over all samples.
#[derive(Clone, Debug)]
pub struct Finding {
    /// What it is about.
    pub subject: Subject,
    /// Does it break a rule?
    pub breaks_rule: bool,
    /// Samples that show it.
    pub count: u64,
    /// Samples judged.
    pub of: u64,
    /// count / of; `None` for `corners` draws and where nothing was judged.
    pub share: Option<f64>,
    /// 95 % interval of the share (Clopper–Pearson, two-sided); `None` with tries and for draws of `corners` and
    /// `hypercube`, which are not independent.
    pub interval: Option<(f64, f64)>,
    /// By boards, where a board has several tries.
    pub boards: Option<Boards>,
    /// The worst value seen.
    pub worst: Option<Worst>,
    /// How the first sample departed from the reference, where that was found.
    pub against: Option<Against>,
    /// What exact equality of times has to do with it; `None`: not analysed, or nothing.
    pub tie: Option<Tie>,
    /// The first sample that shows it; `None` if no draw does.
    pub sample: Option<u64>,
    /// The sample of the worst value; the first if there is no measure.
    pub worst_sample: Option<u64>,
    /// The case that shows it where no draw does.
    pub case: Option<Box<Which>>,
    /// Refuted by a proof over all delays and met by nothing else; `case` is its witness.
    pub rare: bool,
}

impl Finding {
    /// The case that shows it worst: a sample, or what shows it where no draw does.
    pub fn shown_by(&self) -> Option<Which> {
        let sample = self.worst_sample.or(self.sample).map(Which::Sample);
        sample.or_else(|| self.case.as_deref().cloned())
    }
}

/// A finding by boards.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Boards {
    /// Boards drawn.
    pub of: u64,
    /// Boards that ever show it.
    pub failing: u64,
    /// 95 % interval of the share of such boards (Clopper–Pearson, two-sided); `None` for `hypercube` draws.
    pub interval: Option<(f64, f64)>,
    /// The share of tries that show it on those boards, all together.
    pub mean_share: f64,
    /// The greatest share of one board's tries.
    pub worst_share: f64,
}

/// What boards say of the cause of a finding.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Cause {
    /// Few boards show it, and they in most of their tries: it lies in their parts.
    Parts,
    /// Most boards show it, but in few of their tries: it lies in the moment.
    Moment,
    /// Neither is clear.
    Mixed,
}

impl Boards {
    /// Do few boards show it always, or all boards rarely? Each is a matter of more or less than half.
    pub fn cause(&self) -> Cause {
        let most_boards = 2 * self.failing > self.of;
        match (most_boards, self.mean_share > 0.5) {
            (false, true) => Cause::Parts,
            (true, false) => Cause::Moment,
            _ => Cause::Mixed,
        }
    }
}

/// The worst value of a finding.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Worst {
    /// A time.
    Time(Span),
    /// Longer than any time: it lasts for ever, or what is waited for never comes.
    Endless,
    /// A share of a delay, 0 to 1.
    Share(f64),
}

impl Worst {
    /// The value that a measure of this kind of finding stands for.
    pub fn of(kind: Kind, measure: Measure) -> Worst {
        match kind {
            Kind::Swallowed => Worst::Share(measure.as_share()),
            _ if measure == Measure::ENDLESS => Worst::Endless,
            _ => Worst::Time(Span::from_fs(measure.value)),
        }
    }
}

/// What exact equality of times has to do with a finding.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Tie {
    /// Gone in all cases in which times were moved by single femtoseconds.
    Vanishes,
    /// Seen only when times are moved by single femtoseconds.
    Appears,
}
