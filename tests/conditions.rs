//! Conditions of temperature and supply: the same parts, slower or faster, each judged, all of them in the verdict.

use stillgate::control::Control;
use stillgate::delay::{Billionths, Filter};
use stillgate::engine::Program;
use stillgate::findings::{Asked, Kind};
use stillgate::instance::{Instance, Which};
use stillgate::output::text::{self, Page};
use stillgate::output::{json, tables};
use stillgate::reader;
use stillgate::review::{self, Call, Cell, Compared};
use stillgate::scenario::Scenario;
use stillgate::sweep::SweepReport;
use stillgate::time::Span;

/// A gate of 10 to 20 ns with a wire behind it, whose response must take 9 to 30 ns.
fn scenario(conditions: &str) -> Scenario {
    let text = format!(
        r#"
title = "Paddle valve"
[inputs]
s = 0
[gates]
q = {{ buf = ["s"], delay = [9, 12, 18] }}
lamp = {{ buf = ["q"], delay = [1, 2], wires = {{ q = [0.5, 1] }} }}
[[steps]]
label = "open"
at = 100
set = {{ s = 1 }}
expect = {{ q = 1 }}
[[rules.timing]]
name = "not too soon"
from = "s rise"
to = "q rise"
min = 8
[[rules.timing]]
name = "not too late"
from = "s rise"
to = "q rise"
max = 30
[sweep]
samples = 400
{conditions}
"#
    );
    reader::read(&text, "valve.toml").unwrap_or_else(|faults| panic!("{faults}")).scenario
}

fn swept(scenario: &Scenario) -> (Asked, SweepReport) {
    let program = Program::new(scenario, &Control::default()).unwrap();
    let asked = Asked::of(scenario);
    let report = review::sweep(scenario, &program, &asked, 1, &Control::default()).unwrap();
    (asked, report)
}

const COLD_AND_HOT: &str = "[conditions.cold]\nscale = 0.8\n[conditions.hot]\nscale = 1.9";

#[test]
fn every_delay_is_scaled_exactly_and_rounded_to_the_nearest() {
    let scenario = scenario("[conditions.odd]\nscale = 0.333333333");
    let mut filtered = scenario.clone();
    std::sync::Arc::make_mut(&mut filtered.delays).filter = vec![Filter::Reject(Span::from_fs(300)), Filter::Transport];
    let under = filtered.under(&scenario.conditions[0]);
    let scaled = |fs: u64| Span::from_fs(((u128::from(fs) * 333_333_333 * 2 + 1_000_000_000) / 2_000_000_000) as u64);
    let pairs = scenario.delays.gate.iter().zip(&under.delays.gate);
    for (plain, scaled_range) in pairs.chain(scenario.delays.wire.iter().zip(&under.delays.wire)) {
        for edge in 0..2 {
            let (plain, found) = (plain[edge], scaled_range[edge]);
            assert_eq!([found.min, found.typ, found.max], [plain.min, plain.typ, plain.max].map(|it| scaled(it.fs())));
        }
    }
    assert_eq!(under.delays.filter[0], Filter::Reject(Span::from_fs(100)), "99.9999999 fs");
    assert!(std::sync::Arc::ptr_eq(&under.stimulus, &filtered.stimulus), "steps do not change");
    assert_eq!(under.plan, filtered.plan, "nor do draws");
    assert!(under.conditions.is_empty() && under.title.contains("odd"), "{}", under.title);
}

#[test]
fn a_sample_is_the_same_part_at_another_speed() {
    let scenario = scenario(COLD_AND_HOT);
    let scales: Vec<Billionths> = scenario.conditions.iter().map(|it| it.scale).collect();
    assert_eq!(scales, [Billionths(800_000_000), Billionths(1_900_000_000)]);
    for condition in &scenario.conditions {
        let under = scenario.under(condition);
        for sample in 0..300 {
            let which = Which::Sample(sample);
            let (plain, scaled) = (Instance::of(&scenario, &which), Instance::of(&under, &which));
            let delays =
                |it: &Instance| it.delays.gate.iter().chain(&it.delays.wire).flatten().copied().collect::<Vec<Span>>();
            for (plain, scaled) in delays(&plain).into_iter().zip(delays(&scaled)) {
                let exact = condition.scale.of(plain).unwrap();
                assert!(exact.fs().abs_diff(scaled.fs()) <= 2, "{}: {plain:?} {scaled:?}", condition.name);
            }
            assert_eq!(plain.places, scaled.places);
        }
    }
}

#[test]
fn each_condition_is_judged_and_the_verdict_names_them() {
    let scenario = scenario(COLD_AND_HOT);
    let (asked, report) = swept(&scenario);
    assert!(report.findings.iter().all(|it| !it.breaks_rule), "{:?}", report.findings);
    // drawn from 7.2 to 14.4, and from 17.1 to 34.2
    for (condition, name, share) in [(0, "not too soon", 0.8 / 7.2), (1, "not too late", 4.2 / 17.1)] {
        let sweep = &report.conditions[condition].sweep;
        let found = sweep.findings.iter().find(|it| it.breaks_rule && it.subject.kind == Kind::Timing).unwrap();
        let question = &asked.questions[found.subject.question.unwrap() as usize];
        assert_eq!(question.name.as_deref(), Some(name));
        let (low, high) = stillgate::sweep::clopper_pearson(found.count, found.of, 0.999).unwrap();
        assert!(low <= share && share <= high, "{name}: {low} to {high}, not {share}");
        // and it replays under its condition
        let under = scenario.under(&scenario.conditions[condition]);
        let program = Program::new(&under, &Control::default()).unwrap();
        let which = Which::Sample(found.sample.unwrap());
        let run = review::run_one(&under, &program, &asked, which, &Control::default()).unwrap();
        assert!(run.facts.iter().any(|fact| fact.subject == found.subject), "{:?}", run.facts);
    }

    let verdict = review::verdict(&scenario, &report);
    assert_eq!(verdict.call, Call::Broken);
    assert!(verdict.sentence.starts_with("broken under condition cold: \"not too soon\""), "{}", verdict.sentence);
    assert!(verdict.sentence.ends_with("; nominal no failure found, hot broken"), "{}", verdict.sentence);
    let reasons = |name: &str| verdict.reasons.iter().filter(|it| it.starts_with(name)).count();
    assert_eq!((reasons("cold: "), reasons("hot: ")), (1, 1), "{:?}", verdict.reasons);

    let page = Page { scenario: Some("valve.toml"), options: " --seed 3", ..Page::default() };
    let said = text::sweep(&scenario, &asked, &report, &verdict, &page);
    for part in
        ["nominal (x 1)", "cold (x 0.8)", "hot (x 1.9)", "only under condition cold: timing", "longest settling"]
    {
        assert!(said.contains(part), "{part} in\n{said}");
    }
    assert!(said.contains("stillgate run valve.toml --seed 3 --condition hot --delays sample:"), "{said}");

    let comparison = review::compare(&scenario, &report).unwrap();
    let margins: Vec<&Vec<Option<Cell>>> =
        comparison.rows.iter().filter(|it| matches!(it.0, Compared::Margin(_))).map(|it| &it.1).collect();
    assert_eq!(margins.len(), 2, "a rule has one row, whatever its steps");
    for cells in margins {
        assert!(cells.iter().all(|cell| matches!(cell, Some(Cell::Margin(_)))), "{cells:?}");
    }
    let csv = tables::conditions(&scenario, &asked, &report).unwrap();
    let mut lines = csv.lines();
    assert_eq!(lines.next(), Some("figure,kind,shape,name,pattern,net,step,nominal (x 1),cold (x 0.8),hot (x 1.9)"));
    assert_eq!(lines.next(), Some("verdict,,,,,,,no failure found,broken,broken"));
    let found = tables::findings(&scenario, &asked, &report);
    assert!(found.lines().any(|line| line.starts_with("cold,timing")), "{found}");
    let document: serde_json::Value = serde_json::from_str(&json::sweep(&scenario, &asked, &report)).unwrap();
    assert_eq!(document["conditions"][0]["name"], "cold");
    assert_eq!(document["conditions"][0]["scale"], 0.8);
    assert_eq!(document["conditions"][1]["verdict"], "broken");
    assert_eq!(document["conditions"][1]["sweep"]["findings"][0]["condition"], "hot");
}

#[test]
fn conditions_that_all_hold_leave_no_failure_found() {
    let scenario = scenario("[conditions.cold]\nscale = 0.9");
    let (_, report) = swept(&scenario);
    let verdict = review::verdict(&scenario, &report);
    assert_eq!(verdict.call, Call::NoFailureFound, "{verdict:?}");
    assert!(verdict.sentence.starts_with("no failure found with nominal delays in 400 draws"), "{}", verdict.sentence);
    assert!(verdict.sentence.ends_with("; cold no failure found"), "{}", verdict.sentence);
    // the same without any condition says nothing of conditions
    let scenario = self::scenario("");
    let (asked, report) = swept(&scenario);
    assert!(review::compare(&scenario, &report).is_none() && tables::conditions(&scenario, &asked, &report).is_none());
    assert!(!review::verdict(&scenario, &report).sentence.contains("nominal"));
}

#[test]
fn a_condition_that_was_not_run_is_not_passed() {
    let scenario = scenario(COLD_AND_HOT);
    let (_, mut report) = swept(&scenario);
    for condition in &mut report.conditions {
        condition.sweep = review::sweep(
            &scenario.under(&condition.condition),
            &Program::new(&scenario, &Control::default()).unwrap(),
            &Asked::of(&scenario),
            1,
            &Control { cancel: std::sync::Arc::new(true.into()), ..Control::default() },
        )
        .unwrap();
    }
    let verdict = review::verdict(&scenario, &report);
    assert_eq!(verdict.call, Call::Undecided, "{verdict:?}");
}
