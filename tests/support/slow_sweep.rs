//! What a sweep must say, from the answers of its samples run one by one, by looking through all of them.

use std::collections::{BTreeMap, BTreeSet};

use stillgate::control::Control;
use stillgate::delay::Marginal;
use stillgate::engine::{End, Program};
use stillgate::findings::{Asked, Judge, Kind, Measure, Reason, RuleKey, Subject};
use stillgate::instance::{Instance, Which};
use stillgate::logic::State;
use stillgate::scenario::{Permission, Scenario};
use stillgate::sweep::{AtMost, Boards, Finding, SweepReport, WindowReport, Worst, clopper_pearson};

use super::heard::{Heard, HeardWindow};
use super::slow_judge::{Answer, shows};

/// Runs samples one by one, each with judges of its own.
pub fn one_by_one(scenario: &Scenario, program: &Program, asked: &Asked, samples: u64) -> Vec<Heard> {
    let run = |sample: u64| {
        let mut judge = Judge::new(scenario, asked, Heard::default());
        let instance = Instance::of(scenario, &Which::Sample(sample));
        assert!(program.machine().run(&instance, &Control::default(), &mut judge));
        judge.sink
    };
    (0..samples).map(run).collect()
}

/// A finding: its subject, whether it breaks a rule, and the samples that show it, with the measure of each.
struct Found {
    subject: Subject,
    breaks_rule: bool,
    samples: Vec<(u64, Option<Measure>)>,
    of: u64,
}

/// All samples of a sweep, and what is asked of them.
pub struct Whole<'a> {
    pub scenario: &'a Scenario,
    pub asked: &'a Asked,
    pub runs: &'a [Heard],
}

impl Whole<'_> {
    /// Compares a report with what the samples said.
    pub fn check(&self, report: &SweepReport, of: &str) {
        assert_eq!(report.samples, self.runs.len() as u64, "{of}");
        self.sure(report, of);
        assert_eq!(report.windows.len(), self.scenario.stimulus.moments.len(), "{of}");
        for (moment, window) in report.windows.iter().enumerate() {
            assert_eq!(window.moment, moment as u32, "{of}");
            self.window(window, &format!("{of}, moment {moment}"));
        }
        self.rules(report, of);
        self.findings(report, of);
        self.failing(report, of);
    }

    /// The first samples that break each rule, and the commonest way on from every state that has several.
    fn failing(&self, report: &SweepReport, of: &str) {
        let breakers = self.facts().into_iter().filter(|found| found.breaks_rule);
        let first = |found: &Found| found.samples.iter().map(|it| it.0).take(256).collect::<Vec<u64>>();
        let expected: BTreeMap<Subject, Vec<u64>> = breakers.map(|found| (found.subject, first(&found))).collect();
        assert_eq!(report.failing, expected, "{of}");
        for window in &report.windows {
            let mut expected = Vec::new();
            for (before, group) in self.rest_to_rest(window.moment) {
                let strays = not_the_commonest(&group, |window| window.state.clone());
                let most = group.iter().find(|it| !strays.contains(&it.0)).expect("the commonest is not empty");
                let several = group.iter().any(|it| it.1.state != most.1.state);
                expected.extend(several.then(|| (before, most.1.state.clone())));
            }
            let said: Vec<_> = window.forks.iter().map(|it| (it.before.clone(), it.commonest.clone())).collect();
            assert_eq!(said, expected, "{of}");
        }
    }

    /// Samples in which a moment came.
    fn reached(&self, moment: u32) -> u64 {
        self.runs.iter().filter(|run| run.reached.iter().any(|it| it.0 == moment)).count() as u64
    }

    /// The windows that a moment names, with their samples.
    fn named(&self, moment: u32) -> Vec<(u64, &HeardWindow)> {
        let mut all = Vec::new();
        for (sample, run) in self.runs.iter().enumerate() {
            all.extend(run.windows.iter().filter(|it| it.moment == moment).map(|window| (sample as u64, window)));
        }
        all
    }

    fn window(&self, report: &WindowReport, of: &str) {
        let moment = report.moment;
        let named = self.named(moment);
        assert_eq!((report.reached, report.named), (self.reached(moment), named.len() as u64), "{of}");
        let count = |fits: &dyn Fn(&HeardWindow) -> bool| named.iter().filter(|it| fits(it.1)).count() as u64;
        assert_eq!(report.settled, count(&|it| it.end == End::Settled), "{of}");
        assert_eq!(report.cut, count(&|it| it.end == End::Cut), "{of}");
        assert_eq!(report.unsettled, count(&|it| matches!(it.end, End::Unsettled(_))), "{of}");
        assert_eq!(report.oscillating, count(&|it| matches!(it.end, End::Oscillating { .. })), "{of}");
        assert_eq!(report.began_before_rest, count(&|it| !it.began_at_rest), "{of}");

        let mut outcomes: BTreeMap<&State, (u64, u64)> = BTreeMap::new();
        for (sample, window) in named.iter().filter(|it| it.1.end == End::Settled) {
            outcomes.entry(&window.state).or_insert((0, *sample)).0 += 1;
        }
        let mut outcomes: Vec<(State, u64, u64)> = outcomes.into_iter().map(|(s, (n, f))| (s.clone(), n, f)).collect();
        outcomes.sort_by_key(|(_, count, first)| (u64::MAX - count, *first));
        let said: Vec<(State, u64, u64)> =
            report.outcomes.iter().map(|o| (o.state.clone(), o.count, o.first)).collect();
        assert!(!report.outcomes_truncated && said == outcomes, "{of}: {said:?} for {outcomes:?}");
        for outcome in &report.outcomes {
            assert_eq!(outcome.breaks_rule, self.breaks(moment, &outcome.state), "{of}: {outcome:?}");
        }
        self.settling(report, &named, of);
    }

    /// Does resting in this state break a rule?
    fn breaks(&self, moment: u32, state: &State) -> bool {
        let values: Vec<_> = (0..self.scenario.circuit.net_count()).map(|net| state.get(net)).collect();
        let stimulus = &self.scenario.stimulus;
        let expect = stimulus.step_of(&stimulus.moments[moment as usize]).and_then(|step| step.expect.as_ref());
        let unexpected = expect.is_some_and(|it| it.alternatives.iter().all(|it| shows(&values, it) == Some(false)));
        // a step that touches none of the nets of a pattern is not asked
        let mut never = self.scenario.rules.never_at_rest.iter().enumerate();
        let never = never.any(|(index, rule)| {
            let asked = self.asked.find(RuleKey::NeverAtRest, index as u32, None, Some(moment)).is_some();
            asked && shows(&values, &rule.state) == Some(true)
        });
        let astray = self.runs.iter().any(|run| {
            let facts = &mut run.said.facts.keys();
            let astray = facts.any(|it| it.kind == Kind::NotInReference && it.moment == Some(moment));
            astray && run.windows.iter().any(|window| window.moment == moment && window.state == *state)
        });
        unexpected || never || astray || self.races(moment).is_some_and(|race| race.breaks(state))
    }

    fn settling(&self, report: &WindowReport, named: &[(u64, &HeardWindow)], of: &str) {
        // (time, was it cut?)
        let mut times: Vec<(u64, bool)> = Vec::new();
        for (_, window) in named {
            match window.end {
                End::Settled => times.push((window.time, false)),
                End::Cut => times.push((window.time, true)),
                _ => {}
            }
        }
        let Some(said) = &report.settling else {
            assert!(times.is_empty(), "{of}: no settling figures for {times:?}");
            return;
        };
        assert_eq!(said.min.map(|it| it.fs()), times.iter().filter(|it| !it.1).map(|it| it.0).min(), "{of}");
        let as_seen: Vec<u64> = sorted(times.iter().map(|it| it.0));
        // cut windows might have gone on for ever
        let at_worst: Vec<u64> = sorted(times.iter().map(|it| if it.1 { u64::MAX } else { it.0 }));
        let rank = |list: &[u64], percent: u64| list[(percent * list.len() as u64).div_ceil(100).max(1) as usize - 1];
        for (name, percent, value, at_least) in [
            ("median", 50, said.median, said.median_at_least),
            ("p99", 99, said.p99, said.p99_at_least),
            ("max", 100, said.max, said.max_at_least),
        ] {
            let exact = rank(&as_seen, percent);
            if name == "max" || said.resolution == 0.0 {
                assert_eq!(value.fs(), exact, "{of}: {name} of {as_seen:?}");
                assert_eq!(at_least, rank(&at_worst, percent) > exact, "{of}: {name} at least, of {times:?}");
            } else {
                let low = exact as f64 / (1.0 + said.resolution);
                assert!(value.fs() as f64 >= low.floor() && value.fs() <= exact, "{of}: {name} {value:?} of {exact}");
            }
        }
        let bars: u64 = said.bars.iter().map(|bar| bar.2).sum();
        assert_eq!(bars, times.iter().filter(|it| !it.1).count() as u64, "{of}: bars {:?}", said.bars);
        assert!(said.bars.windows(2).all(|pair| pair[0].1 <= pair[1].0), "{of}: bars {:?}", said.bars);
        for (from, to, count) in &said.bars {
            if said.resolution > 0.0 {
                // a value near an edge may count as its class begins
                continue;
            }
            let within = times.iter().filter(|it| !it.1 && (from.fs()..to.fs()).contains(&it.0)).count() as u64;
            assert_eq!(within, *count, "{of}: bar {from:?} to {to:?} of {times:?}");
        }
    }

    /// What no draw showed, and what was not seen yet.
    fn sure(&self, report: &SweepReport, of: &str) {
        let (plan, n) = (&self.scenario.plan, self.runs.len() as u64);
        let independent = !matches!(plan.draw, Marginal::Corners | Marginal::Hypercube);
        let never = |n: u64| -> Option<AtMost> {
            let share = 1.0 - 0.05f64.powf(1.0 / n as f64);
            (n > 0 && independent).then_some(AtMost { share, of: n, boards: plan.tries > 1 })
        };
        let same = |said: Option<AtMost>, wanted: Option<AtMost>, of: &str| {
            let pair = said.zip(wanted);
            let close =
                pair.is_none_or(|(a, b)| (a.share - b.share).abs() < 1e-12 && (a.of, a.boards) == (b.of, b.boards));
            assert!(said.is_some() == wanted.is_some() && close, "{of}: {said:?}, not {wanted:?}");
        };
        for rule in &report.rules {
            let race = rule.question.rule == RuleKey::CriticalRace;
            let wanted = match plan.tries {
                _ if rule.broken > 0 || race => None,
                1 => never(rule.judged),
                tries if rule.judged == n => never(n.div_ceil(tries)),
                _ => None,
            };
            same(rule.at_most, wanted, &format!("{of}, {rule:?}"));
        }
        let clean = report.findings.iter().all(|it| !it.breaks_rule && it.subject.kind != Kind::Unresolved)
            && report.windows.iter().all(|window| window.unsettled == 0)
            && report.rules.iter().all(|rule| rule.not_judged.is_empty())
            && !report.rules.is_empty();
        same(report.at_most, never(n.div_ceil(plan.tries)).filter(|_| clean), of);

        // orders seen in one draw only, of the window with the greatest share of them
        let mut most: Option<(f64, u64, u64)> = None;
        for moment in 0..self.scenario.stimulus.moments.len() as u32 {
            let mut orders: BTreeMap<(&State, &State, u64), u64> = BTreeMap::new();
            for (_, window) in self.named(moment).iter().filter(|it| it.1.end == End::Settled) {
                let Some(before) = &window.before else { continue };
                *orders.entry((before, &window.state, window.order)).or_default() += 1;
            }
            let (once, all) = (orders.values().filter(|it| **it == 1).count() as u64, orders.values().sum::<u64>());
            let estimate = once as f64 / all as f64;
            if all > 0 && most.is_none_or(|it| estimate > it.0) {
                most = Some((estimate, once, all));
            }
        }
        let wanted = most.filter(|_| plan.tries == 1 && independent);
        assert_eq!(report.unseen.map(|it| it.estimate), wanted.map(|it| it.0), "{of}");
        assert_eq!(report.unseen_untold, 0, "{of}");
        if let Some(unseen) = report.unseen {
            assert!(unseen.upper > unseen.estimate && unseen.upper <= 1.0 || unseen.estimate == 1.0, "{of}");
        }
    }

    fn rules(&self, report: &SweepReport, of: &str) {
        assert_eq!(report.rules.len(), self.asked.questions.len(), "{of}");
        for (number, rule) in report.rules.iter().enumerate() {
            let of = format!("{of}, question {number}: {rule:?}");
            let (mut judged, mut broken, mut margin) = (0, 0, None);
            let mut slacks = Vec::new();
            let mut reasons: BTreeMap<Reason, u64> = BTreeMap::new();
            for (sample, run) in self.runs.iter().enumerate() {
                match run.said.answers.get(&(number as u32)) {
                    None => {}
                    Some(Answer::Not(reason)) => *reasons.entry(*reason).or_default() += 1,
                    Some(Answer::Judged { broken: this, slack }) => {
                        judged += 1;
                        broken += u64::from(*this);
                        slacks.extend(slack.map(i128::from));
                        if let Some(slack) =
                            slack.filter(|slack| margin.is_none_or(|worst: (i64, u64)| *slack < worst.0))
                        {
                            margin = Some((slack, sample as u64));
                        }
                    }
                }
            }
            assert_eq!(rule.judged, judged, "{of}");
            assert_eq!(rule.not_judged, reasons.into_iter().collect::<Vec<_>>(), "{of}");
            assert_eq!(rule.margin, margin.map(|it| i128::from(it.0)), "{of}");
            assert_eq!(rule.margin_sample, margin.map(|it| it.1), "{of}");
            assert_eq!(rule.margins.len(), slacks.len() as u64, "{of}");
            for (from, to, count) in rule.margins.classes() {
                let within = slacks.iter().filter(|slack| (from..to).contains(*slack)).count();
                assert_eq!(count, within as u64, "{of}, margins from {from} to {to} fs");
            }
            if rule.question.rule == RuleKey::CriticalRace {
                let race = self.races(rule.question.moment.expect("a moment")).filter(|race| race.forbidden);
                broken = race.map_or(0, |race| race.strays.len() as u64);
            }
            assert_eq!(rule.broken, broken, "{of}");
        }
    }

    fn findings(&self, report: &SweepReport, of: &str) {
        let mut expected = self.facts();
        for moment in 0..self.scenario.stimulus.moments.len() as u32 {
            if let Some(race) = self.races(moment) {
                expected.push(Found {
                    subject: self.race_subject(Kind::CriticalRace, moment),
                    breaks_rule: race.forbidden,
                    samples: race.strays.iter().map(|sample| (*sample, None)).collect(),
                    of: race.of,
                });
            }
            let (strays, of) = self.orders(moment);
            if !strays.is_empty() {
                expected.push(Found {
                    subject: self.race_subject(Kind::NonCriticalRace, moment),
                    breaks_rule: false,
                    samples: strays.into_iter().map(|sample| (sample, None)).collect(),
                    of,
                });
            }
        }
        let key = |subject: &Subject| (subject.kind, subject.shape, subject.net, subject.moment, subject.question);
        let said: BTreeSet<_> = report.findings.iter().map(|it| key(&it.subject)).collect();
        let wanted: BTreeSet<_> = expected.iter().map(|it| key(&it.subject)).collect();
        assert_eq!(said, wanted, "{of}");
        assert_eq!(report.findings.len(), wanted.len(), "{of}: a subject twice");
        for found in &expected {
            let finding = report.findings.iter().find(|it| it.subject == found.subject).expect("just compared");
            self.finding(found, finding, of);
        }
        let order = |it: &Finding| (!it.breaks_rule, it.subject.kind, u64::MAX - it.count);
        assert!(report.findings.is_sorted_by_key(order), "{of}: worst first, {:#?}", report.findings);
    }

    fn finding(&self, found: &Found, said: &Finding, of: &str) {
        let of = format!("{of}, {said:?}");
        let (plan, count) = (&self.scenario.plan, found.samples.len() as u64);
        assert_eq!((said.breaks_rule, said.count, said.of), (found.breaks_rule, count, found.of), "{of}");
        assert_eq!(said.sample, Some(found.samples[0].0), "{of}");
        let corners = plan.draw == Marginal::Corners;
        assert_eq!(said.share, (!corners).then(|| count as f64 / found.of as f64), "{of}");
        let interval =
            clopper_pearson(count, found.of, 0.95).filter(|_| plan.draw.allows_intervals() && plan.tries == 1);
        assert_eq!(said.interval, interval, "{of}");
        let race = matches!(said.subject.kind, Kind::CriticalRace | Kind::NonCriticalRace);
        assert_eq!(said.boards, self.boards(found).filter(|_| plan.tries > 1 && !corners && !race), "{of}");
        // the worst; of equally bad ones the first
        let worst = found.samples.iter().rev().max_by_key(|it| it.1).expect("one");
        assert_eq!(said.worst_sample, Some(worst.0), "{of}");
        let value = worst.1.map(|measure| match said.subject.kind {
            Kind::Swallowed => Worst::Share(measure.as_share()),
            _ if measure == stillgate::findings::Measure::ENDLESS => Worst::Endless,
            _ => Worst::Time(stillgate::time::Span::from_fs(measure.value)),
        });
        assert_eq!(said.worst, value, "{of}");
        assert_eq!(said.tie, None, "{of}: not analysed");
        self.against(found, said, &of);
    }

    /// What departs from the reference is told as the first sample did it.
    fn against(&self, found: &Found, said: &Finding, of: &str) {
        let Some(against) = &said.against else {
            return assert_ne!(said.subject.kind, Kind::NotInReference, "{of}");
        };
        let moment = said.subject.moment.expect("a moment");
        let mut windows = self.runs[found.samples[0].0 as usize].windows.iter();
        let window = windows.find(|window| window.moment == moment).expect("the first sample has the window");
        let before = window.before.as_ref().filter(|_| self.scenario.begin_window() != Some(moment));
        assert_eq!((against.departure.before.as_ref(), &against.departure.reached), (before, &window.state), "{of}");
        let reference = self.scenario.reference.as_ref().expect("a reference");
        let reached: Vec<bool> = reference.compare.iter().map(|(net, _)| window.state.ones.get(net.index())).collect();
        assert!(!against.allowed.values.contains(&reached), "{of}: {reached:?} is allowed");
    }

    fn boards(&self, found: &Found) -> Option<Boards> {
        let samples: BTreeSet<u64> = found.samples.iter().map(|it| it.0).collect();
        let all: Vec<u64> = (0..self.runs.len() as u64).collect();
        let boards: Vec<&[u64]> = all.chunks(self.scenario.plan.tries as usize).collect();
        let shown = |board: &&&[u64]| board.iter().filter(|sample| samples.contains(sample)).count();
        let failing: Vec<&&[u64]> = boards.iter().filter(|board| shown(board) > 0).collect();
        let share = |board: &&[u64]| shown(&board) as f64 / board.len() as f64;
        Some(Boards {
            of: boards.len() as u64,
            failing: failing.len() as u64,
            interval: clopper_pearson(failing.len() as u64, boards.len() as u64, 0.95)
                .filter(|_| self.scenario.plan.draw.allows_intervals()),
            mean_share: failing.iter().map(shown).sum::<usize>() as f64
                / failing.iter().map(|board| board.len()).sum::<usize>().max(1) as f64,
            worst_share: boards.iter().map(share).fold(0.0, f64::max),
        })
    }

    fn facts(&self) -> Vec<Found> {
        let mut all: BTreeMap<Subject, Found> = BTreeMap::new();
        for (sample, run) in self.runs.iter().enumerate() {
            for (subject, fact) in &run.said.facts {
                let (subject, breaks_rule) = (*subject, fact.breaks_rule);
                let new = || Found { subject, breaks_rule, samples: Vec::new(), of: self.judged(&subject) };
                let measure = fact.worst.first().copied();
                let found = all.entry(subject).or_insert_with(new);
                assert_eq!(
                    found.breaks_rule, breaks_rule,
                    "{subject:?} breaks a rule in one sample and not in another"
                );
                found.samples.push((sample as u64, measure));
            }
        }
        all.into_values().collect()
    }

    /// How many samples were judged for a finding.
    fn judged(&self, subject: &Subject) -> u64 {
        let judged = |question: u32| {
            let answers = self.runs.iter().filter_map(|run| run.said.answers.get(&question));
            answers.filter(|answer| matches!(answer, Answer::Judged { .. })).count() as u64
        };
        match (subject.question, subject.moment) {
            (Some(question), _) if subject.kind != Kind::Swallowed => judged(question),
            (_, Some(moment)) => self.reached(moment),
            (_, None) => self.runs.len() as u64,
        }
    }

    fn race_subject(&self, kind: Kind, moment: u32) -> Subject {
        let asked = self.asked.find(RuleKey::CriticalRace, 0, None, Some(moment));
        let question = asked.filter(|_| kind == Kind::CriticalRace);
        Subject { kind, shape: None, question, net: None, moment: Some(moment) }
    }

    /// Windows of a moment from rest to rest, without X, by the state before.
    fn rest_to_rest(&self, moment: u32) -> BTreeMap<State, Vec<(u64, &HeardWindow)>> {
        let mut all: BTreeMap<State, Vec<(u64, &HeardWindow)>> = BTreeMap::new();
        for (sample, window) in self.named(moment) {
            if let (Some(before), End::Settled, false) = (&window.before, window.end, window.state.has_unknown()) {
                all.entry(before.clone()).or_default().push((sample, window));
            }
        }
        all
    }

    fn races(&self, moment: u32) -> Option<Race> {
        let (mut strays, mut outcomes, mut of, mut forbidden) = (Vec::new(), BTreeSet::new(), 0, false);
        let groups = self.rest_to_rest(moment);
        for group in groups.values() {
            of += group.len() as u64;
            let states: BTreeSet<&State> = group.iter().map(|it| &it.1.state).collect();
            if states.len() < 2 {
                continue;
            }
            strays.extend(not_the_commonest(group, |window| window.state.clone()));
            if !self.each_fits_its_own(moment, &states) {
                forbidden = true;
                // one that has an alternative to itself is not to blame
                let shared = |state: &&&State| {
                    let mut fitting = self.fitting(moment, state).into_iter();
                    !fitting.any(|it| {
                        states.iter().all(|other| other == *state || !self.fitting(moment, other).contains(&it))
                    })
                };
                outcomes.extend(states.iter().filter(shared).map(|state| (*state).clone()));
            }
        }
        strays.sort_unstable();
        let asked = self.scenario.rules.critical_race == Permission::Forbidden;
        (!strays.is_empty()).then_some(Race { strays, of, forbidden: forbidden && asked, outcomes })
    }

    /// The alternatives that a state surely fits, by number.
    fn fitting(&self, moment: u32, state: &State) -> Vec<usize> {
        let stimulus = &self.scenario.stimulus;
        let expect = stimulus.step_of(&stimulus.moments[moment as usize]).and_then(|step| step.expect.as_ref());
        let alternatives = expect.map_or(&[][..], |expect| &expect.alternatives);
        let values: Vec<_> = (0..self.scenario.circuit.net_count()).map(|net| state.get(net)).collect();
        (0..alternatives.len()).filter(|it| shows(&values, &alternatives[*it]) == Some(true)).collect()
    }

    /// Does each outcome fit an alternative of its own?
    fn each_fits_its_own(&self, moment: u32, outcomes: &BTreeSet<&State>) -> bool {
        // every way to give the outcomes different alternatives
        fn assign(left: &[Vec<usize>], taken: &[usize]) -> bool {
            let Some((first, left)) = left.split_first() else { return true };
            first.iter().any(|it| !taken.contains(it) && assign(left, &[taken, &[*it]].concat()))
        }
        let fitting: Vec<Vec<usize>> = outcomes.iter().map(|state| self.fitting(moment, state)).collect();
        assign(&fitting, &[])
    }

    /// Samples whose loop nets changed in another order, where the state at the end is one.
    fn orders(&self, moment: u32) -> (Vec<u64>, u64) {
        let (mut strays, mut of) = (Vec::new(), 0);
        for group in self.rest_to_rest(moment).values() {
            of += group.len() as u64;
            if group.iter().all(|it| it.1.state == group[0].1.state) {
                strays.extend(not_the_commonest(group, |window| window.order));
            }
        }
        strays.sort_unstable();
        (strays, of)
    }
}

/// A critical race of one moment.
struct Race {
    /// Samples that did not do the commonest thing.
    strays: Vec<u64>,
    of: u64,
    forbidden: bool,
    /// Outcomes of the races that no alternatives excuse.
    outcomes: BTreeSet<State>,
}

impl Race {
    fn breaks(&self, state: &State) -> bool {
        self.forbidden && self.outcomes.contains(state)
    }
}

fn sorted(times: impl Iterator<Item = u64>) -> Vec<u64> {
    let mut times: Vec<u64> = times.collect();
    times.sort_unstable();
    times
}

/// The samples that did not do the commonest thing; of equally common ones that of the lower sample counts as commonest.
fn not_the_commonest<K: Ord>(group: &[(u64, &HeardWindow)], what: impl Fn(&HeardWindow) -> K) -> Vec<u64> {
    let mut counts: BTreeMap<K, (u64, u64)> = BTreeMap::new();
    for (sample, window) in group {
        counts.entry(what(window)).or_insert((0, u64::MAX - sample)).0 += 1;
    }
    let commonest = counts.values().max().copied().expect("not empty");
    let strays = group.iter().filter(|it| counts[&what(it.1)] != commonest);
    strays.map(|it| it.0).collect()
}
