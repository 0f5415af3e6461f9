//! Exactly equal times: what a sweep found, and what typical, min and max runs show, again with every time moved by single
//! femtoseconds. What is gone then was an accident of equality; what only shows then was hidden by one.

use std::collections::{BTreeMap, BTreeSet};

use super::ReviewError;
use super::single::run_one;
use crate::control::Control;
use crate::engine::{End, Machine, Program, Trace};
use crate::findings::{Asked, Fact, Judge, Kind, Reason, RuleKey, Seen, Sink, Subject};
use crate::instance::{Instance, PERTURBATIONS, Unmovable, Which};
use crate::logic::State;
use crate::scenario::Scenario;
use crate::sweep::{Finding, SweepReport, Tally, Tie, TiesSought, Unmoved, Worst, race_breaks, worst_first};

/// First samples that are perturbed, at most: those of the worst findings.
const SAMPLES: usize = 256;

/// Looks for ties in what a sweep found, and adds what only a typical, min or max run, or only a perturbation, shows.
/// Returns the typical, min and max runs. A cancelled control leaves the report as it was, but for saying so.
pub(super) fn look(
    scenario: &Scenario,
    program: &Program,
    asked: &Asked,
    tally: &Tally,
    report: &mut SweepReport,
    control: &Control,
) -> Result<Vec<(Which, Trace)>, ReviewError> {
    let mut search = Search::new(scenario, asked, tally, report);
    let mut traces = Vec::new();
    for which in [Which::Typ, Which::Min, Which::Max] {
        let mut observers = (Trace::default(), Judge::new(scenario, asked, Heard::default()));
        let done = program.machine().hear(&Instance::of(scenario, &which), control, &mut observers);
        if !done || control.cancelled() {
            return Ok(Vec::new());
        }
        search.add(which.clone(), None, observers.1.sink, None);
        traces.push((which, observers.0));
    }
    let mut runner =
        Runner { scenario, machine: program.machine(), judge: Judge::new(scenario, asked, Heard::default()), control };
    for base in 0..traces.len() {
        if runner.perturb(&mut search, base).is_none() {
            return Ok(Vec::new());
        }
    }
    let mut sought = TiesSought { done: true, ..TiesSought::default() };
    let mut bases: BTreeMap<u64, usize> = BTreeMap::new();
    for finding in &report.findings {
        let Some(sample) = finding.sample.filter(|sample| !bases.contains_key(sample)) else { continue };
        if bases.len() == SAMPLES {
            sought.left_out += 1;
            continue;
        }
        let Some(heard) = runner.run(&Instance::of(scenario, &Which::Sample(sample))) else { return Ok(Vec::new()) };
        bases.insert(sample, search.cases.len());
        search.add(Which::Sample(sample), None, heard, None);
        if runner.perturb(&mut search, bases[&sample]).is_none() {
            return Ok(Vec::new());
        }
    }
    sought.unmoved = search.unmoved.take();

    for finding in &mut report.findings {
        let base = finding.sample.and_then(|sample| bases.get(&sample));
        finding.tie = base.filter(|base| search.vanishes(finding, **base)).map(|_| Tie::Vanishes);
    }
    let mut runs = BTreeMap::new();
    for new in search.news(report) {
        let finding = search.finding(program, report, &new, &mut runs)?;
        report.findings.push(finding);
    }
    worst_first(&mut report.findings);
    report.ties = sought;
    Ok(traces)
}

/// What was told of one run.
#[derive(Clone, Debug, Default)]
struct Heard {
    facts: Vec<Fact>,
    /// Questions with a number, and the slack.
    slack: BTreeMap<u32, i64>,
    /// From which state a window led to which, without X.
    passages: Vec<Passed>,
}

/// A window that led from one state at rest to another.
#[derive(Clone, Debug, PartialEq, Eq)]
struct Passed {
    moment: u32,
    before: State,
    after: State,
}

impl Sink for Heard {
    fn judged(&mut self, question: u32, _broken: bool, slack: Option<i64>) {
        if let Some(slack) = slack {
            self.slack.insert(question, slack);
        }
    }

    fn not_judged(&mut self, _question: u32, _reason: Reason) {}

    fn fact(&mut self, fact: Fact) {
        self.facts.push(fact);
    }

    fn reached(&mut self, _moment: u32, _named: bool) {}

    fn window(&mut self, seen: &Seen<'_>) {
        if let (End::Settled, Some(before)) = (seen.end, seen.before)
            && !seen.state.has_unknown()
        {
            let (before, after) = (before.clone(), seen.state.clone());
            self.passages.push(Passed { moment: seen.moment, before, after });
        }
    }
}

/// Runs cases, one after the other.
struct Runner<'a> {
    scenario: &'a Scenario,
    machine: Machine<()>,
    judge: Judge<Heard>,
    control: &'a Control,
}

impl Runner<'_> {
    /// `None`: the control cancelled it.
    fn run(&mut self, instance: &Instance) -> Option<Heard> {
        self.judge.sink = Heard::default();
        let done = self.machine.hear(instance, self.control, &mut self.judge);
        (done && !self.control.cancelled()).then(|| std::mem::take(&mut self.judge.sink))
    }

    /// Runs all perturbations of a case. `None`: the control cancelled it.
    fn perturb(&mut self, search: &mut Search<'_>, base: usize) -> Option<()> {
        let which = search.cases[base].which.clone();
        let instance = Instance::of(self.scenario, &which);
        for number in 1..=PERTURBATIONS {
            match instance.perturbed(self.scenario, number) {
                Ok(perturbed) => {
                    let heard = self.run(&perturbed.instance)?;
                    let least = instance.least_delay();
                    // no more than all moves together, and less than any change of what happens would make it
                    let all = perturbed.total.fs().min(least.map_or(0, |least| least.fs() / 2));
                    search.add(Which::Perturbed(Box::new(which.clone()), number), Some(base), heard, Some(all));
                }
                Err(why) => {
                    search.not_moved(base, why);
                    return Some(());
                }
            }
        }
        search.cases[base].moved = true;
        Some(())
    }
}

/// One case that was run.
struct Case {
    which: Which,
    /// The case that it is a perturbation of.
    of: Option<usize>,
    /// All its perturbations were run.
    moved: bool,
    facts: BTreeMap<Subject, bool>,
    slack: BTreeMap<u32, i64>,
    /// Passages of moments at which draws raced, and passages that no draw showed.
    passages: Vec<Passed>,
}

/// Something that no draw shows.
struct New {
    subject: Subject,
    case: usize,
    tie: Option<Tie>,
}

/// All cases that were run, and what the draws said.
struct Search<'a> {
    scenario: &'a Scenario,
    asked: &'a Asked,
    tally: &'a Tally,
    /// Moments at which draws raced.
    raced: BTreeSet<u32>,
    cases: Vec<Case>,
    unmoved: Option<Unmoved>,
}

impl<'a> Search<'a> {
    fn new(scenario: &'a Scenario, asked: &'a Asked, tally: &'a Tally, report: &SweepReport) -> Search<'a> {
        let races = report.findings.iter().filter(|it| it.subject.kind == Kind::CriticalRace);
        let raced = races.filter_map(|it| it.subject.moment).collect();
        Search { scenario, asked, tally, raced, cases: Vec::new(), unmoved: None }
    }

    /// Adds a run. A bound that its base keeps, and it exceeds by no more than `all` that the moves come to, is met
    /// exactly: that is no tie.
    fn add(&mut self, which: Which, of: Option<usize>, heard: Heard, all: Option<u64>) {
        let Heard { facts, slack, passages } = heard;
        let kept = |question: u32| {
            let (base, now) = (self.cases[of?].slack.get(&question)?, slack.get(&question)?);
            let near = i128::from(*base) - i128::from(*now) <= i128::from(all?);
            Some(*base >= 0 && *now < 0 && near)
        };
        let facts = facts.iter().filter(|fact| fact.subject.question.and_then(kept) != Some(true));
        let facts = facts.map(|fact| (fact.subject, fact.breaks_rule)).collect();
        let unknown = |it: &Passed| {
            let known = &self.tally.windows[it.moment as usize].passages;
            let passage = crate::sweep::Passage { before: Some(it.before.clone()), after: it.after.clone() };
            // where not all were kept nobody knows whether one is new
            !known.is_truncated() && !known.has(&passage)
        };
        let passages = passages.into_iter().filter(|it| self.raced.contains(&it.moment) || unknown(it)).collect();
        self.cases.push(Case { which, of, moved: false, facts, slack, passages });
    }

    fn not_moved(&mut self, base: usize, why: Unmovable) {
        match &mut self.unmoved {
            Some(unmoved) => unmoved.cases += 1,
            None => self.unmoved = Some(Unmoved { cases: 1, first: self.cases[base].which.clone(), why }),
        }
    }

    fn perturbed(&self) -> impl Iterator<Item = &Case> {
        self.cases.iter().filter(|case| case.of.is_some())
    }

    /// Does a perturbed run show it?
    fn stays(&self, subject: &Subject) -> bool {
        self.perturbed().any(|case| case.facts.contains_key(subject))
    }

    /// Is something that draws show gone whenever times are moved? `base` is its first sample.
    fn vanishes(&self, finding: &Finding, base: usize) -> bool {
        let subject = &finding.subject;
        self.cases[base].moved
            && match subject.kind {
                Kind::CriticalRace => self.race_vanishes(subject, base),
                Kind::NonCriticalRace => false,
                _ => !self.stays(subject),
            }
    }

    /// Does no perturbed run leave the common way from the state from which the sample did?
    fn race_vanishes(&self, subject: &Subject, base: usize) -> bool {
        let Some(moment) = subject.moment else { return false };
        let mine = self.cases[base].passages.iter().find(|it| it.moment == moment);
        let Some(Passed { before, .. }) = mine else { return false };
        let ways = self.tally.windows[moment as usize].passages.iter();
        let ways = ways.filter(|(passage, _)| passage.before.as_ref() == Some(before) && !passage.after.has_unknown());
        let Some((common, _)) = ways.min_by_key(|(_, count)| (std::cmp::Reverse(count.count), count.first)) else {
            return false;
        };
        let mut moved = self.perturbed().flat_map(|case| &case.passages);
        !moved.any(|it| it.moment == moment && it.before == *before && it.after != common.after)
    }

    /// What no draw shows and matters to the verdict, each with the case that shows it best.
    fn news(&self, report: &SweepReport) -> Vec<New> {
        let drawn: BTreeSet<Subject> = report.findings.iter().map(|it| it.subject).collect();
        let mut shown: BTreeMap<Subject, Vec<usize>> = BTreeMap::new();
        for (number, case) in self.cases.iter().enumerate() {
            for (subject, breaks_rule) in &case.facts {
                let undecided = matches!(subject.kind, Kind::Unsettled | Kind::Unresolved);
                if (*breaks_rule || undecided) && !drawn.contains(subject) {
                    shown.entry(*subject).or_default().push(number);
                }
            }
        }
        let new = |(subject, cases): (Subject, Vec<usize>)| {
            let (moved, bases): (Vec<usize>, Vec<usize>) =
                cases.into_iter().partition(|it| self.cases[*it].of.is_some());
            let stays = |base: &&usize| moved.iter().any(|it| self.cases[*it].of == Some(**base));
            let base = bases.iter().find(stays).or(bases.first());
            match base {
                Some(&case) => {
                    let vanishes = moved.is_empty() && self.cases[case].moved;
                    New { subject, case, tie: vanishes.then_some(Tie::Vanishes) }
                }
                None => New { subject, case: moved[0], tie: Some(Tie::Appears) },
            }
        };
        shown.into_iter().map(new).chain(self.new_races(report)).collect()
    }

    /// Races that break a rule by an outcome that no draw came to.
    fn new_races(&self, report: &SweepReport) -> Vec<New> {
        let mut news = Vec::new();
        let moments: BTreeSet<u32> = self.cases.iter().flat_map(|case| &case.passages).map(|it| it.moment).collect();
        for moment in moments {
            let question = self.asked.find(RuleKey::CriticalRace, 0, None, Some(moment));
            let subject = Subject { kind: Kind::CriticalRace, shape: None, question, net: None, moment: Some(moment) };
            let broken = report.findings.iter().any(|it| it.subject == subject && it.breaks_rule);
            if question.is_none() || broken || self.tally.windows[moment as usize].passages.is_truncated() {
                continue;
            }
            let moved = self.race_with(moment, &|case| case.of.is_some());
            if let Some(case) = self.race_with(moment, &|case| case.of.is_none()) {
                let vanishes = moved.is_none() && self.cases[case].moved;
                news.push(New { subject, case, tie: vanishes.then_some(Tie::Vanishes) });
            } else if let Some(case) = moved.or_else(|| self.race_with(moment, &|_| true)) {
                news.push(New { subject, case, tie: Some(Tie::Appears) });
            }
        }
        news
    }

    /// The first of some cases with an outcome that, together with the draws, breaks the rule on races.
    fn race_with(&self, moment: u32, take: &dyn Fn(&Case) -> bool) -> Option<usize> {
        let mut ways: BTreeMap<&State, BTreeSet<&State>> = BTreeMap::new();
        for (passage, _) in self.tally.windows[moment as usize].passages.iter() {
            if let Some(before) = passage.before.as_ref().filter(|_| !passage.after.has_unknown()) {
                ways.entry(before).or_default().insert(&passage.after);
            }
        }
        for (number, case) in self.cases.iter().enumerate().filter(|it| take(it.1)) {
            for it in case.passages.iter().filter(|it| it.moment == moment) {
                let outcomes = ways.entry(&it.before).or_default();
                if outcomes.insert(&it.after) && race_breaks(self.scenario, moment, outcomes) {
                    return Some(number);
                }
            }
        }
        None
    }

    /// The finding of something new, of which its case is run again.
    fn finding(
        &self,
        program: &Program,
        report: &SweepReport,
        new: &New,
        runs: &mut BTreeMap<usize, super::RunReport>,
    ) -> Result<Finding, ReviewError> {
        let (subject, which) = (new.subject, &self.cases[new.case].which);
        let run = match runs.entry(new.case) {
            std::collections::btree_map::Entry::Occupied(run) => run.into_mut(),
            std::collections::btree_map::Entry::Vacant(place) => {
                let run = run_one(self.scenario, program, self.asked, which.clone(), &Control::default());
                place.insert(run.ok_or(ReviewError::Cancelled)?)
            }
        };
        let race = subject.kind == Kind::CriticalRace;
        let fact = run.facts.iter().find(|fact| fact.subject == subject);
        if fact.is_none() && !race {
            let kind = subject.kind.word();
            return Err(ReviewError::Contradiction(format!("{} run alone does not show its {kind}", which.words())));
        }
        let judged = subject.question.and_then(|question| report.rules.get(question as usize)).map(|rule| rule.judged);
        let reached = subject.moment.map_or(report.samples, |moment| report.windows[moment as usize].reached);
        Ok(Finding {
            subject,
            breaks_rule: race || fact.is_some_and(|fact| fact.breaks_rule),
            count: 0,
            of: judged.unwrap_or(reached),
            share: None,
            interval: None,
            boards: None,
            worst: fact.and_then(|fact| fact.measure).map(|measure| Worst::of(subject.kind, measure)),
            against: fact.and_then(|fact| run.against(fact)).cloned(),
            tie: new.tie,
            sample: None,
            worst_sample: None,
            case: Some(Box::new(which.clone())),
            rare: false,
        })
    }
}
