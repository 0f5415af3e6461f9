//! From the integers of a tally to what a sweep says: outcomes, races, shares, intervals, settling figures.

use std::collections::{BTreeMap, BTreeSet};

use super::bars::bars;
use super::lowest::Lowest;
use super::ranges::Ranges;
use super::report::{
    AtMost, Boards, Finding, Fork, Outcome, RuleReport, Settling, SweepReport, TiesSought, WindowReport, Worst,
};
use super::seen::Count;
use super::spread::{self, Spread};
use super::stats::{clopper_pearson, none_in};
use super::tally::{FactTally, Passage, Tally, WindowTally};
use super::unseen::UnseenMass;
use crate::delay::Marginal;
use crate::engine::Hit;
use crate::findings::{Against, Asked, Kind, Match, Reason, RuleKey, Subject, matches, matches_any};
use crate::logic::State;
use crate::scenario::{Alternative, Permission, Scenario};
use crate::time::Span;

/// Confidence of every interval.
const CONFIDENCE: f64 = 0.95;

/// Draws the conclusions of a tally.
pub fn conclude(scenario: &Scenario, asked: &Asked, tally: &Tally) -> SweepReport {
    conclude_after(scenario, asked, tally, 1)
}

/// The confidence of an interval at one of so many looks, such that intervals hold at all looks together with that of every
/// interval, 0.95 (see [`looks`](super::looks())).
pub(super) fn confidence(looks: u64) -> f64 {
    1.0 - (1.0 - CONFIDENCE) / looks.max(1) as f64
}

/// Draws the conclusions of a tally at one of so many looks at a growing sweep: its intervals and bounds are as wide as it
/// takes to hold at whichever look the sweep is stopped.
pub fn conclude_after(scenario: &Scenario, asked: &Asked, tally: &Tally, looks: u64) -> SweepReport {
    let races: Vec<Race> = tally.windows.iter().enumerate().map(|(m, w)| Race::of(scenario, m as u32, w)).collect();
    let windows = tally.windows.iter().zip(&races).enumerate();
    let windows: Vec<WindowReport> = windows.map(|(m, (w, race))| window(scenario, asked, m as u32, w, race)).collect();

    let mut rules: Vec<RuleReport> = asked
        .questions
        .iter()
        .zip(&tally.rows)
        .map(|(question, row)| {
            let mut not_judged: Vec<(Reason, u64)> = Vec::new();
            for (reason, count) in Reason::ALL.into_iter().zip(row.not_judged) {
                if count > 0 {
                    not_judged.push((reason, count));
                }
            }
            RuleReport {
                question: question.clone(),
                judged: row.judged,
                broken: row.broken,
                not_judged,
                margin: row.margin.map(|(slack, _)| i128::from(slack)),
                margin_sample: row.margin.map(|(_, sample)| sample),
                margins: row.margins.clone(),
                at_most: None,
            }
        })
        .collect();

    let judging = Judging { scenario, asked, tally, confidence: confidence(looks) };
    let mut findings: Vec<Finding> =
        tally.facts.iter().map(|(subject, fact)| judging.finding(*subject, fact, judging.judged(subject))).collect();
    for (m, race) in races.iter().enumerate() {
        let moment = Some(m as u32);
        let question = asked.find(RuleKey::CriticalRace, 0, None, moment);
        if let (true, Some(question)) = (tally.windows[m].passages.is_truncated(), question) {
            // only what was kept can be compared
            let rule = &mut rules[question as usize];
            let left = rule.judged.saturating_sub(race.of);
            rule.judged -= left;
            rule.not_judged.extend((left > 0).then_some((Reason::TooManyStates, left)));
        }
        let subject = |kind| Subject { kind, shape: None, question, net: None, moment };
        let fact = |strays: &Strays, breaks_rule| FactTally {
            breaks_rule,
            count: strays.count,
            first: strays.first,
            lowest: Lowest::default(),
            worst: None,
            boards_failing: 0,
            worst_board: (0, 1),
            on_boards: (0, 0),
        };
        if let Some(strays) = &race.critical {
            let breaks = race.breaks_rule;
            let found = fact(strays, breaks);
            findings.push(judging.finding(subject(Kind::CriticalRace), &found, race.of));
            if let (true, Some(question)) = (breaks, question) {
                rules[question as usize].broken = strays.count;
            }
        }
        if let Some(strays) = &race.non_critical {
            let kind = Subject { question: None, ..subject(Kind::NonCriticalRace) };
            findings.push(judging.finding(kind, &fact(strays, false), race.of));
        }
    }
    worst_first(&mut findings);
    for rule in &mut rules {
        rule.at_most = judging.rule_at_most(rule);
    }
    let breakers = tally.facts.iter().filter(|(_, fact)| fact.breaks_rule);
    let failing = breakers.map(|(subject, fact)| (*subject, fact.lowest.numbers().to_vec())).collect();
    let at_most = judging.at_most(&windows, &rules, &findings);
    let (unseen, unseen_untold) = judging.unseen();
    SweepReport {
        plan: scenario.plan,
        samples: tally.samples,
        windows,
        rules,
        findings,
        at_most,
        unseen,
        unseen_untold,
        failing,
        missing: Ranges::default(),
        stopped: None,
        conditions: Vec::new(),
        ties: TiesSought::default(),
        envelope: tally.envelope.clone().map(Box::new),
    }
}

/// Puts findings in the order of a report: rule breakers before others, by kind, by count.
pub fn worst_first(findings: &mut [Finding]) {
    findings.sort_by(|a, b| {
        let key = |f: &Finding| (!f.breaks_rule, f.subject.kind, std::cmp::Reverse(f.count), f.subject);
        key(a).cmp(&key(b))
    });
}

/// Would a race that leads from one state at rest to these settled states, without X, break a rule at this moment?
pub fn race_breaks(scenario: &Scenario, moment: u32, outcomes: &BTreeSet<&State>) -> bool {
    let states: Vec<&State> = outcomes.iter().copied().collect();
    let forbidden = scenario.rules.critical_race == Permission::Forbidden;
    states.len() > 1 && forbidden && !each_has_its_own(&states, &expected(scenario, moment))
}

/// What the samples of one moment did from each state before, beyond the commonest.
#[derive(Debug, Default)]
struct Race {
    /// Settled windows that began at rest.
    of: u64,
    critical: Option<Strays>,
    breaks_rule: bool,
    /// Outcomes of races that break the rule, but for those with an alternative that they need not share.
    blamed: BTreeSet<State>,
    non_critical: Option<Strays>,
    forks: Vec<Fork>,
}

/// Samples that did not do the commonest thing.
#[derive(Clone, Copy, Debug)]
struct Strays {
    count: u64,
    first: u64,
}

/// Which of several things is the commonest; of equally common ones that of the lower sample.
fn commonest(counts: &[Count]) -> Option<usize> {
    let each = counts.iter().enumerate();
    each.min_by_key(|(_, c)| (std::cmp::Reverse(c.count), c.first)).map(|(i, _)| i)
}

impl Strays {
    /// Of several things: all but the commonest.
    fn of(counts: &[Count]) -> Option<Strays> {
        let commonest = commonest(counts)?;
        let others = counts.iter().enumerate().filter(|(i, _)| *i != commonest).map(|(_, c)| c);
        let first = others.clone().map(|c| c.first).min()?;
        Some(Strays { count: others.map(|c| c.count).sum(), first })
    }

    fn join(ours: &mut Option<Strays>, theirs: Option<Strays>) {
        *ours = match (*ours, theirs) {
            (Some(a), Some(b)) => Some(Strays { count: a.count + b.count, first: a.first.min(b.first) }),
            (a, b) => a.or(b),
        };
    }
}

impl Race {
    fn of(scenario: &Scenario, moment: u32, window: &WindowTally) -> Race {
        let mut groups: BTreeMap<&State, Vec<(&Passage, Count)>> = BTreeMap::new();
        for (passage, count) in window.passages.iter() {
            if let Some(before) = passage.before.as_ref().filter(|_| !passage.after.has_unknown()) {
                groups.entry(before).or_default().push((passage, count));
            }
        }
        let mut orders: BTreeMap<u64, Vec<Count>> = BTreeMap::new();
        for (order, count) in window.orders.iter() {
            orders.entry(order.passage).or_default().push(count);
        }
        let alternatives = expected(scenario, moment);
        let forbidden = scenario.rules.critical_race == Permission::Forbidden;
        let mut race = Race::default();
        for (before, outcomes) in &groups {
            let counts: Vec<Count> = outcomes.iter().map(|(_, count)| *count).collect();
            race.of += counts.iter().map(|c| c.count).sum::<u64>();
            if let [(passage, _)] = outcomes[..] {
                if let Some(orders) = orders.get(&passage.mark()) {
                    Strays::join(&mut race.non_critical, Strays::of(orders));
                }
                continue;
            }
            Strays::join(&mut race.critical, Strays::of(&counts));
            race.forks.extend(
                commonest(&counts)
                    .map(|it| Fork { before: (*before).clone(), commonest: outcomes[it].0.after.clone() }),
            );
            let states: Vec<&State> = outcomes.iter().map(|(passage, _)| &passage.after).collect();
            if forbidden && !each_has_its_own(&states, &alternatives) {
                race.breaks_rule = true;
                race.blamed.extend(without_one_alone(&states, &alternatives).cloned());
            }
        }
        race
    }
}

/// The alternatives that the step of a moment expects; none where it expects nothing.
fn expected(scenario: &Scenario, moment: u32) -> Vec<Alternative> {
    let step = scenario.stimulus.step_of(&scenario.stimulus.moments[moment as usize]);
    step.and_then(|step| step.expect.as_ref()).map_or_else(Vec::new, |expect| expect.alternatives.clone())
}

/// Can every state be given an alternative of its own that it matches (augmenting paths; Kuhn 1955)?
fn each_has_its_own(states: &[&State], alternatives: &[Alternative]) -> bool {
    fn place(s: usize, fits: &[Vec<usize>], taken: &mut [Option<usize>], tried: &mut [bool]) -> bool {
        for &a in &fits[s] {
            if !std::mem::replace(&mut tried[a], true) && taken[a].is_none_or(|other| place(other, fits, taken, tried))
            {
                taken[a] = Some(s);
                return true;
            }
        }
        false
    }
    if states.len() > alternatives.len() {
        return false;
    }
    let fit = |state: &&State| {
        let each = alternatives.iter().enumerate().filter(|(_, a)| matches(a, state) == Match::Yes);
        each.map(|(i, _)| i).collect()
    };
    let fits: Vec<Vec<usize>> = states.iter().map(fit).collect();
    let mut taken = vec![None; alternatives.len()];
    (0..states.len()).all(|s| place(s, &fits, &mut taken, &mut vec![false; alternatives.len()]))
}

/// The states that match no alternative which no other of them matches.
fn without_one_alone<'a>(states: &[&'a State], alternatives: &[Alternative]) -> impl Iterator<Item = &'a State> {
    let fits = |a: &Alternative, state: &State| matches(a, state) == Match::Yes;
    let alone = |a: &&Alternative| states.iter().filter(|state| fits(a, state)).count() == 1;
    let alone: Vec<&Alternative> = alternatives.iter().filter(alone).collect();
    let blamed = |state: &&&State| !alone.iter().any(|a| fits(a, state));
    states.iter().filter(blamed).copied().collect::<Vec<_>>().into_iter()
}

fn window(scenario: &Scenario, asked: &Asked, moment: u32, tally: &WindowTally, race: &Race) -> WindowReport {
    let alternatives = expected(scenario, moment);
    let forbidden_rest = |state: &State| {
        scenario.rules.never_at_rest.iter().enumerate().any(|(i, rule)| {
            let asked = asked.find(RuleKey::NeverAtRest, i as u32, None, Some(moment)).is_some();
            asked && matches(&rule.state, state) == Match::Yes
        })
    };
    let breaks = |state: &State| {
        (!alternatives.is_empty() && matches_any(&alternatives, state) == Match::No)
            || forbidden_rest(state)
            || tally.astray.has(state)
            || race.blamed.contains(state)
    };
    let mut outcomes: Vec<Outcome> = tally
        .outcomes
        .iter()
        .map(|(state, count)| Outcome {
            state: state.clone(),
            count: count.count,
            first: count.first,
            breaks_rule: breaks(state),
        })
        .collect();
    outcomes.sort_by_key(|outcome| (std::cmp::Reverse(outcome.count), outcome.first));
    WindowReport {
        moment,
        reached: tally.reached,
        named: tally.named,
        outcomes,
        outcomes_truncated: tally.outcomes.is_truncated(),
        settled: tally.settled,
        unsettled: tally.unsettled,
        hits: Hit::ALL.into_iter().zip(tally.hits).filter(|(_, count)| *count > 0).collect(),
        oscillating: tally.oscillating,
        cut: tally.cut,
        began_before_rest: tally.began_before_rest,
        settling: settling(&tally.settling, &tally.cut_after),
        forks: race.forks.clone(),
    }
}

fn settling(settled: &Spread, cut: &Spread) -> Option<Settling> {
    let parts = [settled, cut];
    let median = spread::nearest_rank(&parts, 0.5)?;
    let p99 = spread::nearest_rank(&parts, 0.99)?;
    let max = settled.max().max(cut.max())?;
    // had every cut window gone on for ever, would another be of that rank?
    let at_least = |share: f64, figure: Span| settled.up_to(figure) < spread::rank(settled.len() + cut.len(), share);
    let exact = settled.is_exact() && cut.is_exact();
    let (bars, far) = bars(settled);
    Some(Settling {
        min: settled.min(),
        median,
        median_at_least: at_least(0.5, median),
        p99,
        p99_at_least: at_least(0.99, p99),
        max,
        max_at_least: !cut.is_empty(),
        resolution: if exact { 0.0 } else { spread::RESOLUTION },
        bars,
        far,
    })
}

struct Judging<'a> {
    scenario: &'a Scenario,
    asked: &'a Asked,
    tally: &'a Tally,
    confidence: f64,
}

impl Judging<'_> {
    /// Of how many samples a finding's count is a share.
    fn judged(&self, subject: &Subject) -> u64 {
        let reached = || match subject.moment {
            Some(moment) => self.tally.windows[moment as usize].reached,
            None => self.tally.samples,
        };
        match (subject.kind, subject.question) {
            (Kind::Swallowed, _) | (_, None) => reached(),
            (_, Some(question)) => self.tally.rows[question as usize].judged,
        }
    }

    /// How often something happens at most that no draw showed.
    fn never_seen(&self, judged: u64) -> Option<AtMost> {
        let plan = &self.scenario.plan;
        let boards = plan.tries > 1;
        let of = match boards {
            // boards of which every try was judged
            true if judged < self.tally.samples => return None,
            true => self.tally.boards,
            false => judged,
        };
        let share = none_in(of, self.confidence).filter(|_| plan.draw.allows_intervals())?;
        Some(AtMost { share, of, boards })
    }

    fn rule_at_most(&self, rule: &RuleReport) -> Option<AtMost> {
        let alone = rule.question.rule != RuleKey::CriticalRace;
        if alone && rule.broken == 0 { self.never_seen(rule.judged) } else { None }
    }

    fn at_most(&self, windows: &[WindowReport], rules: &[RuleReport], findings: &[Finding]) -> Option<AtMost> {
        let judged = !rules.is_empty() && rules.iter().all(|rule| rule.not_judged.is_empty());
        let settled = windows.iter().all(|window| window.unsettled == 0);
        let resolved = findings.iter().all(|it| !it.breaks_rule && it.subject.kind != Kind::Unresolved);
        if judged && settled && resolved { self.never_seen(self.tally.samples) } else { None }
    }

    /// The window with most of its behaviour unseen, and how many windows have too many orders to tell.
    fn unseen(&self) -> (Option<UnseenMass>, u64) {
        let plan = &self.scenario.plan;
        if plan.tries > 1 || !plan.draw.allows_intervals() {
            return (None, 0);
        }
        let windows = &self.tally.windows;
        let told = windows.iter().filter(|window| window.orders.total() > 0).count() as u64;
        let each = windows.iter().enumerate();
        let masses = each.filter_map(|(m, window)| UnseenMass::of(m as u32, window, told, self.confidence));
        // the greatest estimate, of equal ones the greatest bound, of equal ones the first
        let most = masses.fold(None, |most: Option<UnseenMass>, mass| match most {
            Some(most) if (most.estimate, most.upper) >= (mass.estimate, mass.upper) => Some(most),
            _ => Some(mass),
        });
        (most, windows.iter().filter(|window| window.orders.is_truncated()).count() as u64)
    }

    /// How the first sample departed from the reference.
    fn against(&self, subject: &Subject) -> Option<Against> {
        let moment = subject.moment.filter(|_| subject.kind == Kind::NotInReference)?;
        let (_, departure) = self.tally.windows[moment as usize].departed.as_ref()?;
        self.asked.allowed.as_ref().map(|allowed| departure.against(allowed))
    }

    fn finding(&self, subject: Subject, fact: &FactTally, of: u64) -> Finding {
        let plan = &self.scenario.plan;
        let corners = plan.draw == Marginal::Corners;
        let several = plan.tries > 1;
        let race = matches!(subject.kind, Kind::CriticalRace | Kind::NonCriticalRace);
        let share = (!corners && of > 0).then(|| fact.count as f64 / of as f64);
        Finding {
            subject,
            breaks_rule: fact.breaks_rule,
            count: fact.count,
            of,
            share,
            interval: share
                .filter(|_| !several && plan.draw.allows_intervals())
                .and_then(|_| clopper_pearson(fact.count, of, self.confidence)),
            boards: (several && !race && !corners).then(|| Boards {
                of: self.tally.boards,
                failing: fact.boards_failing,
                interval: clopper_pearson(fact.boards_failing, self.tally.boards, self.confidence)
                    .filter(|_| plan.draw.allows_intervals()),
                mean_share: fact.on_boards.0 as f64 / fact.on_boards.1.max(1) as f64,
                worst_share: fact.worst_board.0 as f64 / fact.worst_board.1 as f64,
            }),
            worst: fact.worst.map(|(measure, _)| Worst::of(subject.kind, measure)),
            against: self.against(&subject),
            tie: None,
            sample: Some(fact.first),
            worst_sample: Some(fact.worst.map_or(fact.first, |(_, sample)| sample)),
            case: None,
            rare: false,
        }
    }
}
