//! What a person sees stays the same, byte for byte: results built in code against files in `tests/golden/`.
//!
//! `STILLGATE_GOLDEN=rewrite cargo test golden` writes the files anew; look at the difference before it is kept.

mod cases;
mod results;

use std::path::PathBuf;

use cases::*;
use stillgate::findings::{Asked, Shape};
use stillgate::instance::Which;
use stillgate::output::waves::{self, Picture};
use stillgate::output::{charts, json, tables};

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
fn waves_of_many_nets_and_steps() {
    for (nets, steps) in [(45, 1), (10, 8), (10, 40), (2, 2)] {
        let scenario = chain(nets, steps, "30");
        let asked = Asked::of(&scenario);
        let report = run(&scenario, Which::Typ);
        let sheets = waves::sheets(&Picture::of_run(&scenario, &asked, &report, "chain"));
        for (i, sheet) in sheets.iter().enumerate() {
            std::fs::write(format!("/tmp/chain-{nets}-{steps}-{i}.svg"), &sheet.svg).unwrap();
        }
    }
}

#[test]
fn settling_chart() {
    let scenario = lock();
    let report = results::sweep(&scenario, &Asked::of(&scenario));
    golden("settling.svg", &charts::settling(&scenario, &report));
    golden("settling.csv", &tables::settling(&scenario, &report));
}

#[test]
fn documents() {
    let scenario = lock();
    let review = results::review(&scenario);
    golden("check.json", &json::check(&scenario));
    golden("states.json", &json::states(&scenario, &review.states));
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
    golden("rules.csv", &tables::rules(&scenario, &review.sweep));
    golden("states.csv", &tables::states(&scenario, &review.states));
}
