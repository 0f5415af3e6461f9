//! One value: the same draws as at every other, and whether all rules pass in them.

use std::collections::BTreeSet;

use super::report::{Breach, Cause, Outcome, Point};
use super::variant::variant;
use super::{LimitError, Parameter};
use crate::control::Control;
use crate::engine::Program;
use crate::findings::{Answers, Asked, Judge, Kind, Question, Reason, RuleKey};
use crate::instance::{Instance, Quantities, Which};
use crate::logic::Bits;
use crate::scenario::{Begin, Scenario};
use crate::statics;
use crate::sweep::{SweepReport, clopper_pearson, conclude, run_samples};

/// Confidence of every interval.
const CONFIDENCE: f64 = 0.95;

/// What all values of a search share.
pub(super) struct Trials<'a> {
    pub scenario: &'a Scenario,
    /// The scenario's own delays, then those under each condition.
    cases: Vec<Case>,
    rest: Bits,
    threads: usize,
    /// How often each question of each case was judged at the easy end; `None` until that is known.
    judged: Option<Vec<Vec<u64>>>,
    /// The same for windows that rested with an X.
    unresolved: Vec<u64>,
    quiet: Control,
    pub control: &'a Control,
    pub samples: u64,
}

struct Case {
    /// The number of the condition; `None` for the file's own delays.
    condition: Option<usize>,
    scenario: Scenario,
    asked: Asked,
}

/// Why there is no result of a value.
pub(super) enum Stop {
    /// The caller asked to stop.
    Cancelled,
    /// Anything else.
    Failed(LimitError),
}

impl<'a> Trials<'a> {
    pub fn new(scenario: &'a Scenario, threads: usize, control: &'a Control) -> Result<Trials<'a>, LimitError> {
        let rest = match &scenario.begin {
            Begin::AtRest { named } => statics::rest(&scenario.circuit, &scenario.stimulus.initial, named, control)
                .map_err(|error| LimitError::Bad(error.to_string()))?,
            Begin::Random | Begin::Unknown => Bits::default(),
        };
        let own = Case { condition: None, scenario: scenario.clone(), asked: Asked::of(scenario) };
        let under = scenario.conditions.iter().enumerate().map(|(c, condition)| {
            let scenario = scenario.under(condition);
            Case { condition: Some(c), asked: Asked::of(&scenario), scenario }
        });
        Ok(Trials {
            scenario,
            cases: std::iter::once(own).chain(under).collect(),
            rest,
            threads,
            judged: None,
            unresolved: Vec::new(),
            quiet: Control { cancel: control.cancel.clone(), ..Control::default() },
            control,
            samples: scenario.plan.samples,
        })
    }

    /// Are all draws alike at these values? Then one of them says all.
    pub fn are_alike(&self, values: &[(Parameter, i64)]) -> bool {
        let Ok(scenario) = variant(self.scenario, values) else { return true };
        let bounces = scenario.stimulus.steps.iter().any(|step| step.bounce.is_some());
        scenario.begin != Begin::Random && !bounces && Quantities::of(&scenario).iter().next().is_none()
    }

    /// The variant of a case.
    fn of_case(&self, case: &Case, varied: &Scenario) -> Scenario {
        let mut scenario = case.scenario.clone();
        scenario.stimulus = varied.stimulus.clone();
        scenario.plan.samples = self.samples;
        scenario
    }

    fn sweep(&self, case: &Case, varied: &Scenario) -> Result<(SweepReport, u64), Stop> {
        let scenario = self.of_case(case, varied);
        let program = Program::with_rest(&scenario, &self.rest);
        let tally = run_samples(&scenario, &program, &case.asked, 0..self.samples, self.threads, &self.quiet);
        if tally.samples < self.samples {
            return Err(Stop::Cancelled);
        }
        let report = conclude(&scenario, &case.asked, &tally);
        for window in &report.windows {
            for outcome in window.outcomes.iter().filter(|outcome| !outcome.state.has_unknown()) {
                if !statics::is_stable(&scenario.circuit, &outcome.state) {
                    let label = &scenario.stimulus.moments[window.moment as usize].label;
                    return Err(Stop::Failed(LimitError::Contradiction(format!(
                        "after \"{label}\" sample {} settles in a state that is not stable",
                        outcome.first
                    ))));
                }
            }
        }
        Ok((report, tally.failing))
    }

    /// What the scenario does as it is.
    pub fn as_it_is(&self) -> Result<SweepReport, Stop> {
        self.sweep(&self.cases[0], self.scenario).map(|it| it.0)
    }

    /// Takes what is judged at these values for what is asked of all others.
    pub fn measure_by(&mut self, values: &[(Parameter, i64)]) -> Result<(), Stop> {
        let varied = variant(self.scenario, values).map_err(|why| Stop::Failed(LimitError::Bad(why)))?;
        let mut judged = Vec::new();
        let mut unresolved = Vec::new();
        for case in &self.cases {
            let (report, _) = self.sweep(case, &varied)?;
            judged.push(report.rules.iter().map(|rule| rule.judged).collect());
            unresolved.push(unresolved_in(&report));
        }
        (self.judged, self.unresolved) = (Some(judged), unresolved);
        Ok(())
    }

    /// Questions of the file's own delays that were not judged in every draw at the easy end: they are not asked of any value
    /// beyond what they were judged there.
    pub fn open(&self) -> Vec<(u32, u64)> {
        let judged = self.judged.iter().flat_map(|cases| &cases[0]);
        let each = (0..).zip(judged).filter(|(_, judged)| **judged < self.samples);
        each.map(|(question, judged)| (question, *judged)).collect()
    }

    /// The outcome at these values.
    pub fn at(&self, values: &[(Parameter, i64)]) -> Result<Point, Stop> {
        let value = values.last().map_or(0, |it| it.1);
        let varied = match variant(self.scenario, values) {
            Ok(varied) => varied,
            Err(why) => return Ok(Point::refused(value, self.samples, why)),
        };
        let mut worst: Option<Point> = None;
        for (number, case) in self.cases.iter().enumerate() {
            let (report, failing) = self.sweep(case, &varied)?;
            let point = self.point(value, number, case, &report, failing);
            let is_worse = |it: &Point| (point.outcome.rank(), point.failing) > (it.outcome.rank(), it.failing);
            if worst.as_ref().is_none_or(is_worse) {
                worst = Some(point);
            }
        }
        Ok(worst.expect("there is one case at least"))
    }

    fn point(&self, value: i64, number: usize, case: &Case, report: &SweepReport, failing: u64) -> Point {
        let broken: Vec<_> = report.findings.iter().filter(|finding| finding.breaks_rule).collect();
        let race = broken.iter().filter(|it| it.subject.kind == Kind::CriticalRace).map(|it| it.count).max();
        let total = failing.max(race.unwrap_or(0));
        let at_least = race.is_some() && failing < self.samples;
        let plan = self.scenario.plan;
        let independent = plan.tries <= 1 && plan.draw.allows_intervals() && self.samples > 1 && !at_least;
        let (not_judged, first_open) = self.left_open(number, case, report);
        let unsettled = report.windows.iter().max_by_key(|window| (window.unsettled, std::cmp::Reverse(window.moment)));
        let breach = |cause, count, sample| {
            Some(Box::new(Breach { condition: case.condition, cause, count, of: self.samples, sample }))
        };
        let (outcome, breach) = if let Some(first) = broken.first() {
            let cause = Cause::Broken { subject: first.subject, others: broken.len() - 1 };
            (Outcome::Breaks, breach(cause, first.count, first.sample))
        } else if let Some(window) = unsettled.filter(|window| window.unsettled > 0) {
            let cause = Cause::Unsettled { moment: window.moment, hit: window.hits.first().map(|hit| hit.0) };
            (Outcome::Unsettled, breach(cause, window.unsettled, None))
        } else if unresolved_in(report) > self.unresolved.get(number).copied().unwrap_or(0) {
            let found = report.findings.iter().find(|it| it.subject.kind == Kind::Unresolved);
            let found = found.expect("it was counted");
            (Outcome::NotJudged, breach(Cause::Broken { subject: found.subject, others: 0 }, found.count, found.sample))
        } else if let Some((question, reason, count)) = first_open {
            (Outcome::NotJudged, breach(Cause::NotJudged { question, reason }, count, None))
        } else {
            (Outcome::Passes, None)
        };
        Point {
            value,
            outcome,
            failing: total,
            at_least,
            not_judged,
            of: self.samples,
            interval: if independent { clopper_pearson(total, self.samples, CONFIDENCE) } else { None },
            breach,
            refused: None,
        }
    }

    /// How many draws at most left a question open that was judged at the easy end, and the question with most of them.
    fn left_open(&self, number: usize, case: &Case, report: &SweepReport) -> (u64, Option<(u32, Option<Reason>, u64)>) {
        let Some(judged) = self.judged.as_ref().map(|cases| &cases[number]) else { return (0, None) };
        // what may be left open, as the verdict of a sweep has it: a rule that was judged elsewhere
        let group = |question: &Question| {
            let own = matches!(question.rule, RuleKey::Expect | RuleKey::Edges | RuleKey::When);
            (question.rule, question.index, question.net, question.moment.filter(|_| own))
        };
        let mut elsewhere: BTreeSet<_> = BTreeSet::new();
        if case.scenario.rules.accept_not_judged {
            elsewhere = report.rules.iter().filter(|it| it.judged > 0).map(|it| group(&it.question)).collect();
        }
        let mut most: Option<(u32, Option<Reason>, u64)> = None;
        for (question, (rule, before)) in (0..).zip(report.rules.iter().zip(judged)) {
            // a race is judged between draws: those of an endless window are missing in its count, too
            let missing = before.saturating_sub(rule.judged);
            let passes = missing == 0 || elsewhere.contains(&group(&rule.question));
            if !passes && most.is_none_or(|most| missing > most.2) {
                let reason = rule.not_judged.iter().max_by_key(|it| it.1).map(|it| it.0);
                most = Some((question, reason, missing));
            }
        }
        (most.map_or(0, |most| most.2), most)
    }

    /// The case of a breach, so that it can be run again, after it was checked that it shows the breach in the scenario as
    /// it is in the file.
    pub fn case_of(&self, values: &[(Parameter, i64)], breach: &Breach) -> Result<Option<(u64, Instance)>, LimitError> {
        let Ok(varied) = variant(self.scenario, values) else { return Ok(None) };
        let case = self.cases.iter().find(|case| case.condition == breach.condition).expect("it was swept");
        let scenario = self.of_case(case, &varied);
        let samples = match breach.sample {
            Some(sample) => sample..sample + 1,
            None => 0..self.samples,
        };
        let own = Program::with_rest(&case.scenario, &self.rest);
        let mut machine = own.machine::<()>();
        for sample in samples {
            if self.control.cancelled() {
                return Ok(None);
            }
            let instance = Instance::of(&scenario, &Which::Sample(sample));
            let mut judge = Judge::new(&case.scenario, &case.asked, Answers::default());
            machine.run(&instance, &Control::default(), &mut judge);
            let answers = &judge.sink;
            let shows = match breach.cause {
                Cause::Broken { subject, .. } if subject.kind == Kind::CriticalRace => true,
                Cause::Broken { subject, .. } => answers.facts.iter().any(|fact| fact.subject == subject),
                Cause::NotJudged { question, .. } => {
                    let race = case.asked.questions[question as usize].rule == RuleKey::CriticalRace;
                    race || answers.not_judged.iter().any(|it| it.0 == question)
                }
                Cause::Unsettled { moment, .. } => answers
                    .facts
                    .iter()
                    .any(|fact| fact.subject.kind == Kind::Unsettled && fact.subject.moment == Some(moment)),
            };
            if shows {
                return Ok(Some((sample, instance)));
            }
            if breach.sample.is_some() {
                let message = format!("sample {sample} run alone does not show what its sweep found");
                return Err(LimitError::Contradiction(message));
            }
        }
        Ok(None)
    }
}

fn unresolved_in(report: &SweepReport) -> u64 {
    report.findings.iter().filter(|it| it.subject.kind == Kind::Unresolved).map(|it| it.count).sum()
}
