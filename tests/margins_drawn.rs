//! Margins of rules over the draws: exact counts, whatever the split; what has no margin is said in words.

use std::collections::BTreeMap;

use stillgate::control::Control;
use stillgate::engine::Program;
use stillgate::findings::{Asked, RuleKey};
use stillgate::output::{margin_charts, margins};
use stillgate::reader;
use stillgate::scenario::Scenario;
use stillgate::sweep::{Margins, Tally, conclude, run_samples};
use stillgate::time::Span;

use crate::golden::well_formed;
use crate::support::heard::Heard;
use crate::support::slow_judge::Answer;
use crate::support::slow_sweep::one_by_one;

struct Swept {
    scenario: Scenario,
    program: Program,
    asked: Asked,
    samples: u64,
}

impl Swept {
    fn new(text: &str, samples: u64) -> Swept {
        let mut scenario = reader::read(text, "margins.toml").unwrap_or_else(|faults| panic!("{faults}")).scenario;
        scenario.plan.samples = samples;
        let program = Program::new(&scenario, &Control::default()).unwrap();
        let asked = Asked::of(&scenario);
        Swept { scenario, program, asked, samples }
    }

    fn demonstration(name: &str, samples: u64) -> Swept {
        let path = std::path::Path::new(env!("CARGO_MANIFEST_DIR")).join(format!("scenarios/{name}.toml"));
        Swept::new(&std::fs::read_to_string(path).unwrap(), samples)
    }

    fn tally(&self, from: u64, to: u64, threads: usize) -> Tally {
        run_samples(&self.scenario, &self.program, &self.asked, from..to, threads, &Control::default())
    }

    /// Picture and table.
    fn told(&self, tally: &Tally) -> (String, String) {
        let report = conclude(&self.scenario, &self.asked, tally);
        (margin_charts::svg(&self.scenario, &report), margins::csv(&self.scenario, &report))
    }

    fn whole(&self) -> (String, String) {
        self.told(&self.tally(0, self.samples, 1))
    }

    /// Slacks of a question in all samples, run one by one, and samples without one by the words of the table.
    fn slowly(&self, runs: &[Heard], question: u32) -> (Vec<i128>, BTreeMap<String, u64>) {
        let (mut slacks, mut without) = (Vec::new(), BTreeMap::new());
        for run in runs {
            let why = match run.said.answers.get(&question) {
                Some(Answer::Judged { slack: Some(slack), .. }) => {
                    slacks.push(i128::from(*slack));
                    continue;
                }
                Some(Answer::Judged { slack: None, .. }) => "nothing to measure".to_string(),
                Some(Answer::Not(reason)) => format!("not judged: {}", reason.words()),
                None => "not put to the test".to_string(),
            };
            *without.entry(why).or_default() += 1;
        }
        (slacks, without)
    }
}

/// A signed time of the table in fs.
fn fs(text: &str, scenario: &Scenario) -> i128 {
    let size = Span::parse(text.trim_start_matches('-'), scenario.unit).unwrap().fs();
    if text.starts_with('-') { -i128::from(size) } else { i128::from(size) }
}

/// Which margins each draw has is counted anew from single runs, row by row of the table.
#[test]
fn the_table_counts_what_single_runs_have() {
    let mut broken = 0;
    let mut words: BTreeMap<String, u64> = BTreeMap::new();
    for (name, samples) in
        [("interlock", 150), ("contactors", 400), ("pulse-train", 60), ("clock-switch", 60), ("horn", 60)]
    {
        let swept = Swept::demonstration(name, samples);
        let runs = one_by_one(&swept.scenario, &swept.program, &swept.asked, samples);
        let table = swept.whole().1;
        let mut rows = csv::Reader::from_reader(table.as_bytes());
        let rows: Vec<csv::StringRecord> = rows.records().map(Result::unwrap).collect();
        let mut rows = rows.iter().peekable();
        for (number, question) in (0..).zip(&swept.asked.questions) {
            let (slacks, without) = swept.slowly(&runs, number);
            let bounded = question.bound.is_some_and(|bound| bound > Span::ZERO);
            let measures = match question.rule {
                RuleKey::Timing | RuleKey::MinPulse | RuleKey::SettleWithin => true,
                RuleKey::GlitchFree | RuleKey::Never => bounded,
                _ => false,
            };
            if !measures {
                assert!(slacks.is_empty(), "{name}: {question:?} has a margin after all");
                continue;
            }
            let step = question.moment.map_or("", |it| &swept.scenario.stimulus.moments[it as usize].label);
            let net = question.net.map_or("", |net| swept.scenario.circuit.name(net));
            let (mut counted, mut said, mut end) = (0, BTreeMap::new(), i128::MIN);
            let of_this = |row: &&csv::StringRecord, counted: u64| {
                counted < samples && (&row[0], &row[2], &row[4]) == (question.rule.word(), net, step)
            };
            while let Some(row) = rows.next_if(|row| of_this(row, counted)) {
                let count: u64 = row[8].parse().unwrap();
                counted += count;
                if &row[5] != "margin" {
                    said.insert(row[5].to_string(), count);
                    *words.entry(row[5].to_string()).or_default() += count;
                    continue;
                }
                let (from, to) = (fs(&row[6], &swept.scenario), fs(&row[7], &swept.scenario));
                assert!(end <= from && from < to && (from >= 0 || to <= 0), "{name}: {row:?}");
                end = to;
                let within = slacks.iter().filter(|slack| (from..to).contains(*slack)).count() as u64;
                assert_eq!(count, within, "{name}: {row:?}");
                broken += if to <= 0 { count } else { 0 };
            }
            assert_eq!(said, without, "{name}: {question:?}");
            assert_eq!(counted, samples, "{name}: {question:?}: every draw is in one row");
        }
        assert!(rows.next().is_none(), "{name}: rows of no question");
    }
    assert!(broken > 0 && words["not put to the test"] > 0, "{broken} broken, {words:?}");
}

#[test]
fn parts_in_any_order_and_threads_are_the_whole() {
    for name in ["interlock", "contactors"] {
        let swept = Swept::demonstration(name, 240);
        let whole = swept.whole();
        assert_eq!(swept.told(&swept.tally(0, 240, 2)), whole, "{name}: two threads");
        let mut merged = swept.tally(200, 240, 1);
        for (from, to) in [(0, 8), (96, 200), (8, 96)] {
            merged.merge(&swept.tally(from, to, 1));
        }
        assert_eq!(swept.told(&merged), whole, "{name}: four parts");
    }
}

/// A bell that rings without end, a button that is never pressed, and a gate that is never both.
const NOTHING: &str = r#"
title = "Bell"
outputs = ["ring"]
[inputs]
pull = 0
button = 0
[gates]
ring = { nand = ["pull", "ring"], delay = [4, 6] }
lamp = { buf = ["button"], delay = [2, 3] }
[[steps]]
at = 100
set = { pull = 1 }
oscillation = "allowed"
[[rules.never]]
name = "dark"
state = { lamp = 1, ring = 0 }
longer_than = 5
[[rules.timing]]
name = "</svg><script>&amp; \"lamp\" 'on' ]]>"
from = "button rise"
to = "lamp rise"
max = 10
[rules]
min_pulse = { lamp = { high = 3 } }
"#;

#[test]
fn what_is_never_measured_has_words_and_no_bars() {
    let swept = Swept::new(NOTHING, 30);
    let (svg, table) = swept.whole();
    well_formed(&svg);
    // the ground is the only area
    assert_eq!(svg.matches("<rect").count(), 1, "{svg}");
    for said in ["No margin of never \"dark\"", "No margin of timing", "in 30 draws"] {
        assert!(svg.replace("&quot;", "\"").contains(said), "no {said} in {svg}");
    }
    assert!(!svg.contains("<script") && !table.contains("margin,"), "{svg}\n{table}");
    assert!(table.lines().skip(1).all(|row| row.ends_with(",,,30")), "{table}");
}

#[test]
fn rules_without_times_are_said_to_measure_none() {
    let text = "[inputs]\na = 0\n[gates]\nb = { not = [\"a\"], delay = [1, 2] }\n[[steps]]\nset = { a = 1 }\n";
    let (svg, table) = Swept::new(text, 5).whole();
    well_formed(&svg);
    assert!(svg.contains("No rule measures times."), "{svg}");
    assert_eq!(table.lines().count(), 1, "{table}");
}

/// Thirty rules: the worst have panels, in order, and all others are named as left out.
#[test]
fn the_least_margins_have_panels() {
    let mut text = String::from("[inputs]\na = 0\n[gates]\nb = { buf = [\"a\"], delay = [10, 20] }\n");
    text += "[[steps]]\nat = 100\nset = { a = 1 }\n";
    for rule in 0..30 {
        let bound = 15 + (rule * 7) % 30;
        text += &format!(
            "[[rules.timing]]\nname = \"<{bound}> & of \\\"b\\\"\"\nfrom = \"a rise\"\nto = \"b rise\"\nmax = {bound}\n"
        );
    }
    let (svg, table) = Swept::new(&text, 100).whole();
    well_formed(&svg);
    let titles = svg.split("&lt;").skip(1).map(|it| it.split("&gt;").next().unwrap().parse().unwrap());
    let order: Vec<u32> = titles.collect();
    // the name of the picture has all, then come the panels, then a line with those left out, as many as fit; its title has all
    assert_eq!(order[..30], (15..45).collect::<Vec<u32>>(), "{svg}");
    assert_eq!(order[30..42], (15..27).collect::<Vec<u32>>(), "{svg}");
    assert!(order[42..].first() == Some(&27) && order.ends_with(&(27..45).collect::<Vec<u32>>()), "{order:?}");
    assert_eq!(svg.matches("Left out, but in margins.csv").count(), 3, "{svg}");
    assert!((15..45).all(|bound| table.contains(&format!("<{bound}> & of"))), "{table}");
    assert!(svg.contains("broken") && svg.contains("kept") && svg.contains("least"));
}

/// The same numbers give the same classes on every machine and in every version of a format.
#[test]
fn classes_of_a_part_never_change() {
    let mut margins = Margins::default();
    for fs in [i64::MIN, -20_000_000, -1, 0, 127, 128, 255, 256, 257, 1_000_000, i64::MAX] {
        margins.add(fs);
    }
    let written = serde_json::to_string(&margins).unwrap();
    let kept = "[[-7296,1],[-2329,1],[-1,1],[0,1],[127,1],[128,1],[255,1],[256,2],[1780,1],[7295,1]]";
    assert_eq!(written, kept, "raise the number of the format of parts with this");
}
