//! What a person sees stays the same, byte for byte: results built in code against files in `tests/golden/`.
//!
//! `STILLGATE_GOLDEN=rewrite cargo test golden` writes the files anew; look at the difference before it is kept.

#![allow(clippy::unwrap_used)]

mod cases;
mod flows;
mod limits;
mod results;

use std::path::PathBuf;
use std::sync::Arc;

use cases::*;
use stillgate::circuit::{Function, NetId};
use stillgate::control::Control;
use stillgate::engine::Program;
use stillgate::findings::{Asked, Shape};
use stillgate::flow::{Flow, FlowState, FlowTable, Reached, Transition};
use stillgate::instance::Which;
use stillgate::logic::Bits;
use stillgate::output::flow_map::{self, Map};
use stillgate::output::text::{self, Page, Style};
use stillgate::output::waves::{self, Picture};
use stillgate::output::{bundle, charts, flow_tables, json, margin_charts, margins, sensitivity, shares, tables};
use stillgate::review::{RunReport, StatesReport};
use stillgate::scenario::{Plot, RefNet, Reference, Scenario};
use stillgate::statics::{Change, Race};
use stillgate::sweep::{SweepReport, conclude, run_samples_with_envelope};

/// Compares a text with its golden file, or writes the file.
fn golden(name: &str, text: &str) {
    let path = PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("tests/golden").join(name);
    if std::env::var("STILLGATE_GOLDEN").is_ok_and(|it| it == "rewrite") {
        std::fs::write(&path, text).unwrap();
        return;
    }
    let kept = std::fs::read_to_string(&path).unwrap_or_default();
    let first = kept.lines().zip(text.lines()).position(|(kept, new)| kept != new);
    assert!(
        kept == text,
        "{name} differs from its golden file, first in line {:?}\nkept: {:?}\nnew:  {:?}",
        first.map(|line| line + 1),
        first.and_then(|line| kept.lines().nth(line)),
        first.and_then(|line| text.lines().nth(line)),
    );
}

/// All sheets of a run with all its nets.
fn draw(scenario: &Scenario, report: &RunReport) -> Vec<String> {
    let asked = Asked::of(scenario);
    let sheets = waves::sheets(&Picture::of_run(scenario, &asked, report, "waves"));
    sheets.into_iter().map(|sheet| sheet.svg).collect()
}

/// A small check of XML: every tag is closed in order, and `&` begins an entity.
pub fn well_formed(svg: &str) {
    assert!(!svg.chars().any(|letter| letter.is_control() && letter != '\n'), "a control character");
    let mut open: Vec<&str> = Vec::new();
    let mut rest = svg;
    while let Some(at) = rest.find('<') {
        let (text, tag) = rest.split_at(at);
        assert!(!text.contains('>'), "a bare > in {text:?}");
        for entity in text.split('&').skip(1) {
            let known = ["amp;", "lt;", "gt;", "quot;", "apos;"].iter().any(|it| entity.starts_with(it));
            assert!(known || entity.starts_with('#'), "a bare & in {text:?}");
        }
        let end = tag.find('>').expect("a tag ends");
        let inner = &tag[1..end];
        assert_eq!(inner.matches('"').count() % 2, 0, "an open quote in <{inner}>");
        if let Some(name) = inner.strip_prefix('/') {
            assert_eq!(open.pop(), Some(name.trim()), "closed out of order");
        } else if !inner.ends_with('/') {
            open.push(inner.split_whitespace().next().unwrap());
        }
        rest = &tag[end + 1..];
    }
    assert!(open.is_empty(), "never closed: {open:?}");
}

#[test]
fn waves_of_the_lock() {
    let scenario = lock();
    let asked = Asked::of(&scenario);
    let mut report = run(&scenario, Which::Typ);
    report.facts.push(glitch(net(&scenario, "open_upper"), Shape::Static0, 3, "628", "631.1"));
    let sheets = waves::sheets(&Picture::of_run(&scenario, &asked, &report, "waves"));
    assert_eq!(sheets.len(), 1);
    golden("lock.svg", &sheets[0].svg);
    golden("lock.csv", &waves::csv(&scenario, &report.trace));
}

#[test]
fn waves_of_a_hazard() {
    let scenario = hazard();
    let asked = Asked::of(&scenario);
    let mut report = run(&scenario, Which::Typ);
    report.facts = hazard_facts(&scenario);
    let sheets = waves::sheets(&Picture::of_run(&scenario, &asked, &report, "hazard"));
    golden("hazard.svg", &sheets[0].svg);
}

#[test]
fn waves_of_a_ring() {
    let scenario = ring(100);
    let asked = Asked::of(&scenario);
    let report = run(&scenario, Which::Min);
    let sheets = waves::sheets(&Picture::of_run(&scenario, &asked, &report, "ring"));
    golden("ring.svg", &sheets[0].svg);
}

#[test]
fn waves_from_an_unknown_start() {
    let scenario = unknown();
    let asked = Asked::of(&scenario);
    let report = run(&scenario, Which::Sample(7));
    let sheets = waves::sheets(&Picture::of_run(&scenario, &asked, &report, "unknown"));
    golden("unknown.svg", &sheets[0].svg);
    golden("unknown.csv", &waves::csv(&scenario, &report.trace));
}

#[test]
fn labels_of_eight_steps_are_staggered() {
    let scenario = chain(5, 8, "30");
    golden("eight-steps.svg", &draw(&scenario, &run(&scenario, Which::Typ))[0]);
}

#[test]
fn forty_steps_are_numbered_and_have_a_key() {
    let scenario = chain(4, 40, "30");
    golden("forty-steps.svg", &draw(&scenario, &run(&scenario, Which::Typ))[0]);
}

#[test]
fn long_quiet_stretches_are_cut() {
    let scenario = chain(6, 5, "250000");
    golden("quiet.svg", &draw(&scenario, &run(&scenario, Which::Max))[0]);
}

#[test]
fn two_nets_and_one_step() {
    let scenario = chain(2, 1, "0.000003");
    golden("two-nets.svg", &draw(&scenario, &run(&scenario, Which::Typ))[0]);
}

#[test]
fn very_long_names_and_odd_titles() {
    let scenario = long_names();
    let sheets = draw(&scenario, &run(&scenario, Which::Typ));
    assert!(sheets[0].contains(&"n".repeat(180)), "the full name is in a title element");
    golden("long-names.svg", &sheets[0]);
}

#[test]
fn a_run_without_steps() {
    let scenario = Case::new("Nothing happens").input("a", 1).gate("b", Function::Not, &["a"], ["1", "1", "1"]).build();
    let report = run(&scenario, Which::Typ);
    golden("empty.svg", &draw(&scenario, &report)[0]);
    golden("empty.csv", &waves::csv(&scenario, &report.trace));
}

#[test]
fn thousands_of_edges_become_blocks() {
    let scenario = ring(9_000);
    let mut report = run(&scenario, Which::Typ);
    without_recurrence(&scenario, &mut report, 8_000);
    let svg = &draw(&scenario, &report)[0];
    assert!(svg.len() < 60_000, "{} bytes", svg.len());
    golden("blocks.svg", svg);
}

#[test]
fn clock_edges_and_cut_windows() {
    let scenario = clocked();
    let report = run(&scenario, Which::Typ);
    golden("clock.svg", &draw(&scenario, &report)[0]);
}

#[test]
fn a_second_run_is_dashed() {
    let scenario = lock();
    let asked = Asked::of(&scenario);
    let (front, behind) = (run(&scenario, Which::Typ), run(&scenario, Which::Max));
    let mut picture = Picture::of_run(&scenario, &asked, &front, "waves");
    picture.layers.push(waves::Layer::Run(&behind));
    let svg = &waves::sheets(&picture)[0].svg;
    well_formed(svg);
    golden("two-runs.svg", svg);
}

#[test]
fn a_run_is_laid_on_another_step_by_step() {
    let scenario = lock();
    let asked = Asked::of(&scenario);
    let (front, behind) = (run(&scenario, Which::Max), run(&scenario, Which::Typ));
    let svg = &waves::sheets(&Picture::of_run(&scenario, &asked, &front, "waves").against(&behind))[0].svg;
    well_formed(svg);
    golden("laid.svg", svg);
}

/// What a sweep of some draws says, with the times of edges.
fn swept(scenario: &Scenario) -> SweepReport {
    let asked = Asked::of(scenario);
    let program = Program::with_rest(scenario, &rest(scenario));
    let control = Control::default();
    conclude(scenario, &asked, &run_samples_with_envelope(scenario, &program, &asked, 0..200, 1, &control))
}

#[test]
fn bands_in_which_nets_may_change() {
    let scenario = lock();
    let (asked, sweep) = (Asked::of(&scenario), swept(&scenario));
    let report = run(&scenario, Which::Typ);
    let svg = &waves::sheets(&Picture::of_run(&scenario, &asked, &report, "waves").with_bands(&sweep))[0].svg;
    well_formed(svg);
    golden("bands.svg", svg);
    golden("envelope.csv", &tables::envelope(&scenario, &sweep, sweep.envelope.as_deref().unwrap()));
}

#[test]
fn bands_beside_long_quiet_stretches() {
    let scenario = chain(6, 5, "250000");
    let (asked, sweep) = (Asked::of(&scenario), swept(&scenario));
    let report = run(&scenario, Which::Typ);
    let svg = &waves::sheets(&Picture::of_run(&scenario, &asked, &report, "waves").with_bands(&sweep))[0].svg;
    well_formed(svg);
    golden("bands-quiet.svg", svg);
}

#[test]
fn chosen_nets_come_in_the_order_chosen() {
    let mut scenario = lock();
    let nets = ["open_lower", "call_lower", "open_upper", "call_upper"].map(|name| net(&scenario, name));
    scenario.plot = Plot { nets: Some(nets.to_vec()), from: Some(at("400")), to: None };
    let asked = Asked::of(&scenario);
    let mut report = run(&scenario, Which::Typ);
    report.facts.push(glitch(net(&scenario, "hold_upper"), Shape::Static0, 3, "628", "631.1"));
    report.facts.push(glitch(net(&scenario, "open_upper"), Shape::Static0, 1, "220", "231.1"));
    let sheet = &waves::sheets(&Picture::of_run(&scenario, &asked, &report, "waves"))[0];
    assert_eq!(sheet.nets, nets);
    well_formed(&sheet.svg);
    golden("chosen.svg", &sheet.svg);
}

#[test]
fn a_part_of_a_run() {
    let scenario = chain(4, 20, "30");
    let asked = Asked::of(&scenario);
    let report = run(&scenario, Which::Typ);
    let range = Some((at("100"), at("220")));
    let picture = Picture { range, ..Picture::of_run(&scenario, &asked, &report, "waves") };
    golden("part.svg", &waves::sheets(&picture)[0].svg);
}

#[test]
fn many_nets_take_several_sheets() {
    let scenario = chain(45, 1, "10");
    let sheets = draw(&scenario, &run(&scenario, Which::Typ));
    assert_eq!(sheets.len(), 2);
    golden("sheet-2.svg", &sheets[1]);
}

#[test]
fn nets_without_a_sheet_are_named() {
    let scenario = chain(400, 1, "10");
    let asked = Asked::of(&scenario);
    let report = run(&scenario, Which::Typ);
    let all = waves::sheets(&Picture::of_run(&scenario, &asked, &report, "waves"));
    assert_eq!(all.len(), waves::MOST_SHEETS);
    let shown: usize = all.iter().map(|sheet| sheet.nets.len()).sum();
    assert_eq!(shown + all[0].left_out.len(), 400, "every net is shown or named as left out");
    assert!(all[0].svg.contains("Left out: 80 nets (") && all[0].svg.contains("--nets"));
    let picture = Picture { nets: waves::Nets::Telling, ..Picture::of_run(&scenario, &asked, &report, "waves") };
    let telling = waves::sheets(&picture);
    assert_eq!((telling.len(), telling[0].nets.len()), (1, waves::MOST_LANES));
    assert!(telling[0].nets.contains(&net(&scenario, "gauge_399")), "the output is watched");
}

#[test]
fn the_files_of_a_review() {
    let scenario = lock();
    let review = results::review(&scenario);
    let bundle = bundle::of_review(&scenario, &review, &Page::default());
    let names: Vec<&str> = bundle.files.iter().map(|file| file.name.as_str()).collect();
    let wanted = [
        "result.json",
        "report.html",
        "waves-typical.svg",
        "waves-typical.csv",
        "waves-typical.vcd",
        "waves-never-open-upper-1-open-lower-1-together.svg",
        "waves-never-open-upper-1-open-lower-1-together.csv",
        "waves-never-open-upper-1-open-lower-1-together.vcd",
        "waves-critical-race-together.svg",
        "waves-critical-race-together.csv",
        "waves-critical-race-together.vcd",
        "waves-glitch-open-lower-together.svg",
        "waves-glitch-open-lower-together.csv",
        "waves-glitch-open-lower-together.vcd",
        "causes.csv",
        "sensitivity.svg",
        "sensitivity.csv",
        "case-never-open-upper-1-open-lower-1-together.toml",
        "case-critical-race-together.toml",
        "refuted-1.toml",
        "settling.svg",
        "settling.csv",
        "settling-figures.csv",
        "shares.svg",
        "shares.csv",
        "outcomes.csv",
        "findings.csv",
        "rules.csv",
        "margins.svg",
        "margins.csv",
        "states.svg",
        "states.csv",
        "transitions.csv",
    ];
    assert_eq!(names, wanted);
    assert!(bundle.notes[0].starts_with("3 of 6 findings have a picture"), "{:?}", bundle.notes);
    assert_eq!(bundle, bundle::of_review(&scenario, &review, &Page::default()), "the same bytes again");
}

/// The map of a table with one state variable.
fn map(scenario: &Scenario, flow: &Flow, variable: &[&str]) -> String {
    let state_variables: Vec<_> = variable.iter().map(|name| net(scenario, name)).collect();
    flow_map::svg(&Map { scenario, flow, state_variables: &state_variables, id: "states" })
}

#[test]
fn the_map_of_a_lock_has_a_race_and_gaps() {
    let scenario = lock();
    let svg = map(&scenario, &flows::lock(&scenario), &["hold_upper"]);
    well_formed(&svg);
    golden("map-lock.svg", &svg);
}

#[test]
fn the_map_of_a_ring_ends_in_a_loop() {
    let scenario = ring(100);
    let svg = map(&scenario, &flows::ring(&scenario), &[]);
    well_formed(&svg);
    golden("map-ring.svg", &svg);
}

#[test]
fn the_map_of_a_latch_after_power_up_has_two_starts_and_an_open_end() {
    let scenario = unknown();
    let flow = flows::unknown(&scenario);
    let svg = map(&scenario, &flow, &["q"]);
    well_formed(&svg);
    golden("map-latch.svg", &svg);
    let report = StatesReport { flow, ..results::states(&lock()) };
    golden("map-latch.csv", &flow_tables::states(&scenario, &report));
}

/// What a user wrote is escaped in a map, and long names stay on the sheet.
#[test]
fn a_map_of_very_long_names() {
    let scenario = long_names();
    let mut values = rest(&scenario);
    let state = |values: &Bits| FlowState { values: values.clone(), reachable: true, explored: true };
    let first = state(&values);
    values.flip(0);
    values.flip(2);
    values.flip(3);
    let change = Change::of_one(&first.values, NetId(0));
    let to = Reached::Exact { states: vec![1], cycles: 0, race: Race::None };
    let step = Transition { moment: Some(0), from: 0, change, to, essential: None, sure: true };
    let table =
        FlowTable { states: vec![first, state(&values)], start: vec![0], steps: vec![step], ..Default::default() };
    let svg = map(&scenario, &Flow { table, ..Flow::default() }, &[]);
    well_formed(&svg);
    golden("map-long-names.svg", &svg);
}

/// A comparison with a reference is told in the text and in the JSON of `states`, and in the review.
#[test]
fn a_reference_in_every_output() {
    let mut scenario = lock();
    let open = ["open_upper", "open_lower"].map(|name| net(&scenario, name));
    scenario.reference = Some(Arc::new(Reference {
        circuit: (*scenario.circuit).clone(),
        compare: open.iter().map(|net| (*net, RefNet(*net))).collect(),
    }));
    let mut review = results::review(&scenario);
    review.states.flow.compared = Some(flows::compared(&scenario));
    golden("states-reference.txt", &text::states(&scenario, &review.states, &Page::default()));
    let said = text::review(&scenario, &review, &Page::default());
    assert!(said.contains("There are stable states that the reference does not have"), "{said}");
    let document: serde_json::Value =
        serde_json::from_str(&json::states(&scenario, &review.states, json::MOST_VALUES)).unwrap();
    let reference = &document["reference"];
    assert_eq!(reference["states"], "not");
    assert_eq!(reference["beyond"][0]["allowed"][0], serde_json::json!({"open_upper": 1, "open_lower": 0}));
    assert_eq!(reference["choices"][0]["step"], "together");
    assert_eq!(reference["choices"][0]["outcomes"].as_array().unwrap().len(), 2);
}

/// Every sheet is XML: tags match, and what a user wrote is escaped.
#[test]
fn every_picture_is_well_formed() {
    for scenario in [lock(), hazard(), ring(100), unknown(), long_names(), clocked(), chain(45, 3, "10")] {
        for svg in draw(&scenario, &run(&scenario, Which::Typ)) {
            well_formed(&svg);
        }
        well_formed(&charts::settling(&scenario, &results::sweep_of_nothing(&scenario)));
    }
    let scenario = lock();
    well_formed(&charts::settling(&scenario, &results::sweep(&scenario, &Asked::of(&scenario))));
}

#[test]
fn shares_chart() {
    let scenario = lock();
    let asked = Asked::of(&scenario);
    let report = results::sweep(&scenario, &asked);
    let svg = shares::svg(&scenario, &asked, &report);
    well_formed(&svg);
    well_formed(&shares::svg(&scenario, &asked, &results::sweep_of_nothing(&scenario)));
    golden("shares.svg", &svg);
    golden("shares.csv", &shares::csv(&scenario, &asked, &report));
}

#[test]
fn settling_chart() {
    let scenario = lock();
    let report = results::sweep(&scenario, &Asked::of(&scenario));
    golden("settling.svg", &charts::settling(&scenario, &report));
    golden("settling.csv", &tables::settling(&scenario, &report));
    golden("settling-figures.csv", &tables::settling_figures(&scenario, &report, None));
}

#[test]
fn margins_chart() {
    let scenario = lock();
    let report = results::sweep(&scenario, &Asked::of(&scenario));
    let svg = margin_charts::svg(&scenario, &report);
    well_formed(&svg);
    golden("margins.svg", &svg);
    golden("margins.csv", &margins::csv(&scenario, &report));
}

#[test]
fn documents() {
    let scenario = lock();
    let review = results::review(&scenario);
    golden("check.json", &json::check(&scenario));
    golden("states.json", &json::states(&scenario, &review.states, json::MOST_VALUES));
    golden("run.json", &json::run(&scenario, &review.asked, review.typical.as_ref().unwrap()));
    golden("sweep.json", &json::sweep(&scenario, &review.asked, &review.sweep));
    golden("review.json", &json::review(&scenario, &review));
}

#[test]
fn lists() {
    let scenario = lock();
    let review = results::review(&scenario);
    golden("outcomes.csv", &tables::outcomes(&scenario, &review.sweep));
    golden("findings.csv", &tables::findings(&scenario, &review.asked, &review.sweep));
    let bundle = bundle::of_review(&scenario, &review, &Page::default());
    let causes = bundle.files.iter().find(|file| file.name == "causes.csv").unwrap();
    golden("causes.csv", std::str::from_utf8(&causes.bytes).unwrap());
    let svg = sensitivity::svg(&scenario, &review).unwrap();
    well_formed(&svg);
    golden("sensitivity.svg", &svg);
    golden("sensitivity.csv", &sensitivity::csv(&scenario, &review).unwrap());
    let proved = charts::settling_with(&scenario, &review.sweep, review.proof.as_ref());
    well_formed(&proved);
    golden("settling-proved.svg", &proved);
    golden("rules.csv", &tables::rules(&scenario, &review.sweep, None));
    golden("states.csv", &flow_tables::states(&scenario, &review.states));
    golden("transitions.csv", &flow_tables::transitions(&scenario, &review.states));
}

#[test]
fn texts() {
    let scenario = lock();
    let mut review = results::review(&scenario);
    let page = Page { scenario: Some("locks/interlock.toml"), ..Page::default() };
    let narrow = Page { width: 60, ..page };
    let colour = Page { style: Style::Ansi, ..page };
    golden("check.txt", &text::check(&scenario, &page));
    golden("states.txt", &text::states(&scenario, &review.states, &page));
    golden("sweep.txt", &text::sweep(&scenario, &review.asked, &review.sweep, &review.verdict, &page));
    golden("review.txt", &text::review(&scenario, &review, &page));
    golden("review-60.txt", &text::review(&scenario, &review, &narrow));
    golden("review-colour.txt", &text::review(&scenario, &review, &colour));
    let mut typical = review.typical.take().unwrap();
    typical.facts.push(glitch(net(&scenario, "open_upper"), Shape::Static0, 3, "628", "631.1"));
    golden("run.txt", &text::run(&scenario, &review.asked, &typical, &page));
}

/// No line of a text is wider than the page, but for commands to be copied; and a review takes about one screen.
#[test]
fn texts_keep_to_the_page() {
    let scenario = lock();
    let review = results::review(&scenario);
    for width in [60, 72, 80, 100, 250] {
        let page = Page { width, scenario: Some("locks/interlock.toml"), ..Page::default() };
        let run = review.typical.as_ref().unwrap();
        let texts = [
            text::review(&scenario, &review, &page),
            text::states(&scenario, &review.states, &page),
            text::check(&scenario, &page),
            text::run(&scenario, &review.asked, run, &page),
        ];
        for line in texts.iter().flat_map(|text| text.lines()).filter(|line| !line.contains("stillgate run")) {
            assert!(line.chars().count() <= width.min(100), "{width} columns: {line}");
        }
        if width >= 100 {
            assert!(texts[0].lines().count() <= 70, "{}", texts[0]);
        }
    }
}

/// A sweep without findings never claims more than it saw.
#[test]
fn a_clean_sweep_claims_nothing() {
    let scenario = lock();
    let mut review = results::review(&scenario);
    review.sweep.findings.clear();
    for rule in &mut review.sweep.rules {
        (rule.broken, rule.not_judged) = (0, Vec::new());
    }
    let verdict = stillgate::review::Verdict {
        call: stillgate::review::Call::NoFailureFound,
        sentence: "no failure found in 10,000 draws (Monte Carlo), for the 4 steps of this scenario".into(),
        reasons: Vec::new(),
    };
    let text = text::sweep(&scenario, &review.asked, &review.sweep, &verdict, &Page::default());
    assert!(text.starts_with("No failure found in 10,000 draws"), "{text}");
    for claim in ["proved", "proven", "holds", "passed", "guarantee", "safe "] {
        assert!(!text.to_lowercase().contains(claim), "\"{claim}\" in\n{text}");
    }
}

/// Documents are JSON, begin with the format, and keep every digit of a time.
#[test]
fn documents_are_json() {
    let scenario = lock();
    let review = results::review(&scenario);
    let asked = &review.asked;
    let documents = [
        json::check(&scenario),
        json::states(&scenario, &review.states, json::MOST_VALUES),
        json::run(&scenario, asked, review.typical.as_ref().unwrap()),
        json::sweep(&scenario, asked, &review.sweep),
        json::review(&scenario, &review),
    ];
    for document in &documents {
        let value: serde_json::Value = serde_json::from_str(document).unwrap();
        assert_eq!(value["format"], 1);
        assert!(document.starts_with("{\n  \"format\": 1,") && document.ends_with("}\n"), "{document}");
    }
    let value: serde_json::Value = serde_json::from_str(&documents[4]).unwrap();
    for part in ["states", "typical", "sweep"] {
        assert!(value[part]["format"].is_null(), "{part} is no document of its own");
    }
    assert!(value["sweep"]["findings"][1]["worst"].is_null(), "what is missing is null");
    assert_eq!(value["typical"]["waves"]["open_upper"][1], serde_json::json!([114, 1]));
    assert!(documents[3].contains("\"worst\": 2.100001"), "a time of an odd femtosecond");
}
