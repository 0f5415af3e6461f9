//! The sweep: windows, rules, findings.

use serde::Serialize;

use super::part::ends;
use super::parts::{Departed, Exact, Level, Lines, Measured, Object, OneLine, state};
use super::races::Race;
use super::why;
use crate::findings::Asked;
use crate::output::causes;
use crate::output::words::{self, six};
use crate::review::{Review, Verdict, by_condition};
use crate::scenario::Scenario;
use crate::sweep::{Finding, RuleReport, Settling, SweepReport, TiesSought, WindowReport};

#[derive(Serialize)]
pub(super) struct Sweep<'a> {
    #[serde(skip_serializing_if = "Option::is_none")]
    format: Option<u32>,
    samples: u64,
    samples_asked: u64,
    #[serde(skip_serializing_if = "Option::is_none")]
    missing: Option<OneLine<Vec<[u64; 2]>>>,
    #[serde(skip_serializing_if = "Option::is_none")]
    until: Option<OneLine<Until>>,
    seed: u64,
    tries: u64,
    draw: &'static str,
    vary: &'static str,
    windows: Vec<Window<'a>>,
    rules: Vec<Rule<'a>>,
    pub(super) findings: Vec<Found<'a>>,
    failures_at_most: Option<OneLine<AtMost>>,
    unseen_mass: Option<OneLine<Unseen<'a>>>,
    unseen_untold: u64,
    ties: OneLine<Ties>,
    #[serde(skip_serializing_if = "Option::is_none")]
    conditions: Option<Vec<Condition<'a>>>,
    #[serde(skip_serializing_if = "Option::is_none")]
    races_not_looked_for: Option<usize>,
}

#[derive(Serialize)]
struct Window<'a> {
    step: Option<&'a str>,
    reached: u64,
    named: u64,
    outcomes: Vec<Outcome<'a>>,
    outcomes_truncated: bool,
    settled: u64,
    unsettled: u64,
    oscillating: u64,
    cut: u64,
    began_before_rest: u64,
    settling_time: Option<SettlingTime>,
}

#[derive(Serialize)]
struct Outcome<'a> {
    state: OneLine<Object<&'a str, Level>>,
    count: u64,
    first: u64,
    breaks_rule: bool,
}

#[derive(Serialize)]
struct SettlingTime {
    min: Option<Exact>,
    median: Exact,
    p99: Exact,
    max: Exact,
    at_least: bool,
    median_at_least: bool,
    p99_at_least: bool,
    max_at_least: bool,
    resolution: f64,
}

#[derive(Serialize)]
struct Rule<'a> {
    rule: &'static str,
    name: Option<&'a str>,
    net: Option<&'a str>,
    pattern: Option<String>,
    step: Option<&'a str>,
    bound: Option<Exact>,
    judged: u64,
    broken: u64,
    not_judged: OneLine<Object<&'static str, u64>>,
    margin: Option<Exact>,
    margin_sample: Option<u64>,
    at_most: Option<f64>,
}

#[derive(Serialize)]
pub(super) struct Found<'a> {
    #[serde(skip_serializing_if = "Option::is_none")]
    condition: Option<&'a str>,
    kind: &'static str,
    shape: Option<&'static str>,
    rule: bool,
    rule_name: Option<&'a str>,
    pattern: Option<String>,
    net: Option<&'a str>,
    step: Option<&'a str>,
    count: u64,
    of: u64,
    share: Option<f64>,
    interval: Option<OneLine<[f64; 2]>>,
    boards: Option<OneLine<Boards>>,
    worst: Option<Measured>,
    tie: Option<&'static str>,
    sample: Option<u64>,
    worst_sample: Option<u64>,
    pub(super) case: Option<String>,
    #[serde(skip_serializing_if = "std::ops::Not::not")]
    rare: bool,
    #[serde(skip_serializing_if = "Option::is_none")]
    reference: Option<Departed<'a>>,
    #[serde(skip_serializing_if = "Option::is_none")]
    needs: Option<why::Needs>,
    #[serde(skip_serializing_if = "Option::is_none")]
    pull: Option<Lines<why::Decisive>>,
    #[serde(skip_serializing_if = "Option::is_none")]
    pull_remark: Option<String>,
    /// Absent where nobody looked for it.
    #[serde(skip_serializing_if = "Option::is_none")]
    race: Option<Option<Race<'a>>>,
}

#[derive(Serialize)]
struct Boards {
    of: u64,
    failing: u64,
    interval: Option<[f64; 2]>,
    mean_share: f64,
    worst_share: f64,
}

/// A sweep that was to stop when sure; the intervals allow for all its looks.
#[derive(Serialize)]
struct Until {
    width: f64,
    widest: Option<f64>,
    sure: bool,
    looks: u64,
    looked: u64,
}

/// The sweep under one condition.
#[derive(Serialize)]
struct Condition<'a> {
    name: &'a str,
    scale: Exact,
    verdict: &'static str,
    sentence: String,
    reasons: Vec<String>,
    sweep: Sweep<'a>,
}

/// An upper bound of what no draw (or board) showed; `side` and `level` say which.
#[derive(Serialize)]
struct AtMost {
    share: f64,
    of: u64,
    what: &'static str,
    level: f64,
    side: &'static str,
}

/// How far exactly equal times were looked for.
#[derive(Serialize)]
struct Ties {
    looked_for: bool,
    cases_not_moved: u64,
    first_not_moved: Option<String>,
    why_not_moved: Option<String>,
    findings_left_out: u64,
}

#[derive(Serialize)]
struct Unseen<'a> {
    estimate: f64,
    upper: f64,
    step: Option<&'a str>,
    once: u64,
    of: u64,
    high: bool,
}

impl<'a> Sweep<'a> {
    pub fn of(scenario: &'a Scenario, asked: &'a Asked, report: &'a SweepReport, format: Option<u32>) -> Sweep<'a> {
        let mut each = by_condition(scenario, report).into_iter().skip(1);
        let conditions = report.conditions.iter().filter_map(|it| {
            let Verdict { call, sentence, reasons } = each.next()?.verdict;
            let name = it.condition.name.as_str();
            let mut sweep = Sweep::of(scenario, asked, &it.sweep, None);
            sweep.conditions = None;
            sweep.findings.iter_mut().for_each(|finding| finding.condition = Some(name));
            let scale = Exact::factor(it.condition.scale);
            Some(Condition { name, scale, verdict: call.words(), sentence, reasons, sweep })
        });
        let conditions = conditions.collect();
        Sweep {
            format,
            samples: report.samples,
            samples_asked: report.plan.samples,
            missing: (!report.missing.is_empty()).then(|| ends(&report.missing)),
            until: report.stopped.as_ref().map(|it| {
                OneLine(Until {
                    width: it.curve.until.width(),
                    widest: it.widest.map(six),
                    sure: it.curve.sure,
                    looks: it.looks,
                    looked: it.curve.looked,
                })
            }),
            seed: report.plan.seed,
            tries: report.plan.tries,
            draw: report.plan.draw.name(),
            vary: report.plan.vary.name(),
            windows: report.windows.iter().map(|it| window(scenario, it)).collect(),
            rules: report.rules.iter().map(|it| rule(scenario, it)).collect(),
            findings: report.findings.iter().map(|it| finding(scenario, asked, it)).collect(),
            failures_at_most: report.at_most.map(|it| {
                OneLine(AtMost {
                    share: six(it.share),
                    of: it.of,
                    what: if it.boards { "boards" } else { "draws" },
                    level: 0.95,
                    side: "upper",
                })
            }),
            unseen_mass: report.unseen.map(|it| {
                OneLine(Unseen {
                    estimate: six(it.estimate),
                    upper: six(it.upper),
                    step: words::step(scenario, Some(it.moment)),
                    once: it.once,
                    of: it.of,
                    high: it.is_high(),
                })
            }),
            unseen_untold: report.unseen_untold,
            ties: ties(&report.ties),
            conditions: Some(conditions),
            races_not_looked_for: None,
        }
    }

    /// With why findings happen, where that was looked into.
    pub fn explained(mut self, scenario: &'a Scenario, review: &Review) -> Sweep<'a> {
        let files = causes::case_files(scenario, review);
        for ((finding, why), file) in self.findings.iter_mut().zip(&review.why).zip(files) {
            let Some(why) = why else { continue };
            finding.race = Some(why.race.as_ref().map(|pair| Race::of(scenario, pair)));
            finding.needs = why::needs(scenario, why, file);
            finding.pull = why::pull(scenario, why);
            finding.pull_remark = causes::pull_remark(why);
        }
        self.races_not_looked_for = Some(review.why.iter().filter(|why| why.is_none()).count());
        self
    }
}

fn ties(sought: &TiesSought) -> OneLine<Ties> {
    let unmoved = sought.unmoved.as_ref();
    OneLine(Ties {
        looked_for: sought.done,
        cases_not_moved: unmoved.map_or(0, |it| it.cases),
        first_not_moved: unmoved.map(|it| it.first.key()),
        why_not_moved: unmoved.map(|it| it.why.to_string()),
        findings_left_out: sought.left_out,
    })
}

fn window<'a>(scenario: &'a Scenario, report: &WindowReport) -> Window<'a> {
    let outcomes = report.outcomes.iter().map(|it| Outcome {
        state: state(&scenario.circuit, &it.state),
        count: it.count,
        first: it.first,
        breaks_rule: it.breaks_rule,
    });
    Window {
        step: words::step(scenario, Some(report.moment)),
        reached: report.reached,
        named: report.named,
        outcomes: outcomes.collect(),
        outcomes_truncated: report.outcomes_truncated,
        settled: report.settled,
        unsettled: report.unsettled,
        oscillating: report.oscillating,
        cut: report.cut,
        began_before_rest: report.began_before_rest,
        settling_time: report.settling.as_ref().map(|it| settling_time(scenario, it)),
    }
}

fn settling_time(scenario: &Scenario, settling: &Settling) -> SettlingTime {
    let exact = |span| Exact::span(span, scenario.unit);
    SettlingTime {
        min: settling.min.map(exact),
        median: exact(settling.median),
        p99: exact(settling.p99),
        max: exact(settling.max),
        at_least: settling.median_at_least || settling.p99_at_least || settling.max_at_least,
        median_at_least: settling.median_at_least,
        p99_at_least: settling.p99_at_least,
        max_at_least: settling.max_at_least,
        resolution: six(settling.resolution),
    }
}

fn rule<'a>(scenario: &'a Scenario, report: &'a RuleReport) -> Rule<'a> {
    let question = &report.question;
    Rule {
        rule: question.rule.word(),
        name: question.name.as_deref(),
        net: question.net.map(|net| words::net(scenario, net)),
        pattern: question.pattern.as_ref().map(|pattern| pattern.words(&scenario.circuit)),
        step: words::step(scenario, question.moment),
        bound: question.bound.map(|bound| Exact::span(bound, scenario.unit)),
        judged: report.judged,
        broken: report.broken,
        not_judged: OneLine(Object(report.not_judged.iter().map(|(reason, n)| (reason.words(), *n)).collect())),
        margin: report.margin.map(|fs| Exact::signed(fs, scenario.unit)),
        margin_sample: report.margin_sample,
        at_most: report.at_most.map(|it| six(it.share)),
    }
}

fn finding<'a>(scenario: &'a Scenario, asked: &'a Asked, finding: &Finding) -> Found<'a> {
    let named = words::subject(scenario, asked, &finding.subject);
    Found {
        condition: None,
        kind: named.kind,
        shape: named.shape,
        rule: finding.breaks_rule,
        rule_name: named.rule_name,
        pattern: named.pattern,
        net: named.net,
        step: named.step,
        count: finding.count,
        of: finding.of,
        share: finding.share.map(six),
        interval: finding.interval.map(|(low, high)| OneLine([six(low), six(high)])),
        boards: finding.boards.map(|it| {
            OneLine(Boards {
                of: it.of,
                failing: it.failing,
                interval: it.interval.map(|(low, high)| [six(low), six(high)]),
                mean_share: six(it.mean_share),
                worst_share: six(it.worst_share),
            })
        }),
        worst: finding.worst.map(|worst| Measured::of(worst, scenario.unit)),
        tie: finding.tie.map(words::tie),
        sample: finding.sample,
        worst_sample: finding.worst_sample,
        case: finding.case.as_ref().map(|case| case.key()),
        rare: finding.rare,
        reference: finding.against.as_ref().map(|it| Departed::of(scenario, it)),
        needs: None,
        pull: None,
        pull_remark: None,
        race: None,
    }
}

/// The document of `sweep`.
pub fn sweep(scenario: &Scenario, asked: &Asked, report: &SweepReport) -> String {
    super::document(&Sweep::of(scenario, asked, report, Some(super::FORMAT)))
}
