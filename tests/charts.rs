//! Charts of a review: their tables say what the report says, and no name or label can spoil a picture.

use std::collections::BTreeSet;

use stillgate::control::Control;
use stillgate::engine::Program;
use stillgate::output::text::Page;
use stillgate::output::{bundle, charts, sensitivity, shares, tables};
use stillgate::review::{self, Review};
use stillgate::scenario::Scenario;
use stillgate::sweep::SweepReport;

fn read(text: &str, samples: u64) -> Scenario {
    let read = stillgate::reader::read(text, "block.toml").unwrap_or_else(|it| panic!("{}", it.render(false)));
    let mut scenario = read.scenario;
    scenario.plan.samples = samples;
    scenario.plan.search = 0;
    scenario
}

fn demonstration(name: &str, samples: u64) -> Scenario {
    let path = std::path::Path::new(env!("CARGO_MANIFEST_DIR")).join(format!("scenarios/{name}.toml"));
    read(&std::fs::read_to_string(path).unwrap(), samples)
}

fn reviewed(scenario: &Scenario, threads: usize) -> Review {
    let program = Program::new(scenario, &Control::default()).unwrap();
    review::review(scenario, &program, threads, &Control::default()).unwrap()
}

/// The fields of some columns, row by row.
fn columns(table: &str, names: &[&str]) -> Vec<Vec<String>> {
    let mut rows = csv::Reader::from_reader(table.as_bytes());
    let header = rows.headers().unwrap().clone();
    let at: Vec<usize> =
        names.iter().map(|name| header.iter().position(|it| it == *name).unwrap_or_else(|| panic!("{name}"))).collect();
    let each = rows.records().map(|row| {
        let row = row.unwrap();
        at.iter().map(|at| row[*at].to_string()).collect()
    });
    each.collect()
}

/// All texts of a picture, as a parser of pages reads it; no name may have become an element.
fn texts(svg: &str) -> Vec<String> {
    let html = scraper::Html::parse_fragment(svg);
    assert_eq!(html.select(&scraper::Selector::parse("svg").unwrap()).count(), 1);
    assert_eq!(html.select(&scraper::Selector::parse("script, img, b").unwrap()).count(), 0, "{svg}");
    let text = scraper::Selector::parse("text").unwrap();
    html.select(&text).map(|it| it.text().collect::<String>().trim().to_string()).collect()
}

#[test]
fn shares_are_those_of_the_findings() {
    for name in ["interlock", "selector", "sequencer"] {
        let scenario = demonstration(name, 300);
        let review = reviewed(&scenario, 2);
        let figures = ["condition", "kind", "net", "step", "count", "of", "share", "interval_low", "interval_high"];
        let found = columns(&tables::findings(&scenario, &review.asked, &review.sweep), &figures);
        let table = shares::csv(&scenario, &review.asked, &review.sweep);
        let mut told = columns(&table, &figures);
        told.retain(|row| !row[1].is_empty());
        assert!(found.len() > 1);
        assert_eq!(told, found, "{name}");
        let drawn = texts(&shares::svg(&scenario, &review.asked, &review.sweep));
        for row in found.iter().filter(|row| row[0] == "nominal").take(shares::MOST_ROWS) {
            let beside = format!("({} of {})", row[4], row[5]);
            assert!(drawn.iter().any(|text| text.contains(&beside)), "{name}: {beside} in {drawn:?}");
        }
    }
}

#[test]
fn what_was_not_seen_is_told_apart() {
    let scenario = demonstration("divider", 300);
    let review = reviewed(&scenario, 1);
    let most = review.sweep.at_most.expect("no rule is broken");
    let rows = columns(
        &shares::csv(&scenario, &review.asked, &review.sweep),
        &["is", "count", "of", "interval_high", "at_most"],
    );
    let bound = rows.iter().find(|row| row[0] == "no rule was broken").unwrap();
    assert_eq!((&bound[1][..], &bound[2][..], &bound[3][..]), ("0", "300", ""));
    assert!((bound[4].parse::<f64>().unwrap() - most.share).abs() < 1e-6 * most.share.max(1.0));
    let unseen = review.sweep.unseen.expect("windows lead from rest to rest");
    let row = rows.iter().find(|row| row[0] == "not seen yet").unwrap();
    assert_eq!((row[1].parse::<u64>().unwrap(), row[2].parse::<u64>().unwrap()), (unseen.once, unseen.of));
    assert!((row[4].parse::<f64>().unwrap() - unseen.upper).abs() < 1e-5);
    // a bound has no dot
    let svg = shares::svg(&scenario, &review.asked, &review.sweep);
    assert!(review.sweep.findings.is_empty() && !svg.contains("<circle"), "{svg}");
    assert_eq!((sensitivity::svg(&scenario, &review), sensitivity::csv(&scenario, &review)), (None, None));
}

#[test]
fn shares_go_by_boards_where_a_board_has_several_tries() {
    let mut scenario = demonstration("interlock", 300);
    scenario.plan.tries = 10;
    let review = reviewed(&scenario, 1);
    let boards: Vec<_> = review.sweep.findings.iter().filter_map(|it| it.boards).collect();
    assert!(!boards.is_empty());
    let rows = columns(&shares::csv(&scenario, &review.asked, &review.sweep), &["kind", "unit", "count", "of"]);
    let told: Vec<_> = rows.iter().filter(|row| row[1] == "boards" && !row[0].is_empty()).collect();
    assert_eq!(told.len(), boards.len());
    for (row, boards) in told.iter().zip(boards) {
        assert_eq!((row[2].clone(), row[3].clone()), (boards.failing.to_string(), boards.of.to_string()));
    }
}

#[test]
fn more_findings_than_rows_are_counted() {
    let scenario = demonstration("interlock", 300);
    let review = reviewed(&scenario, 1);
    let one = review.sweep.findings[0].clone();
    let many = SweepReport { findings: vec![one; shares::MOST_ROWS + 7], ..review.sweep.clone() };
    let extra = usize::from(many.at_most.is_some()) + usize::from(many.unseen.is_some());
    let drawn = texts(&shares::svg(&scenario, &review.asked, &many));
    let left = format!("Left out, but in shares.csv: {} rows.", 7 + extra);
    assert!(drawn.contains(&left), "{left} in {drawn:?}");
}

#[test]
fn what_decides_is_what_the_causes_say() {
    for name in ["interlock", "selector", "sequencer"] {
        let scenario = demonstration(name, 600);
        let review = reviewed(&scenario, 2);
        let files = bundle::of_review(&scenario, &review, &Page::default()).files;
        let file = |name: &str| {
            let bytes = &files.iter().find(|file| file.name == name).unwrap_or_else(|| panic!("{name}")).bytes;
            std::str::from_utf8(bytes).unwrap().to_string()
        };
        let figures = ["finding", "quantity", "strength", "failing", "passing"];
        let told = |name: &str| -> BTreeSet<Vec<String>> {
            columns(&file(name), &figures).into_iter().filter(|row| !row[2].is_empty()).collect()
        };
        let strong = told("sensitivity.csv");
        assert_eq!(strong, told("causes.csv"), "{name}");
        assert!(!strong.is_empty(), "{name}");
        let drawn = texts(&file("sensitivity.svg"));
        let shown = review.why.iter().flatten().filter_map(|why| why.pull.as_ref()).take(sensitivity::MOST_PANELS);
        for pull in shown.flat_map(|pulls| &pulls.told) {
            let (sign, way) = if pull.strength < 0.0 { ('\u{2212}', "short") } else { ('+', "long") };
            let said = format!("{sign}{:.2}, fails when {way}", pull.strength.abs());
            assert!(drawn.contains(&said), "{name}: {said} in {drawn:?}");
        }
    }
}

#[test]
fn a_finding_that_tells_nothing_says_why() {
    let scenario = demonstration("sequencer", 1000);
    let mut review = reviewed(&scenario, 2);
    let pulls = review.why.iter_mut().flatten().filter_map(|why| why.pull.as_mut());
    let untold = pulls.filter_map(|pull| pull.untold).next().expect("one that happens rarely");
    let drawn = texts(&sensitivity::svg(&scenario, &review).unwrap());
    assert!(drawn.iter().any(|text| text.trim_end_matches('.').to_lowercase() == untold.words()), "{drawn:?}");
    let rows = columns(&sensitivity::csv(&scenario, &review).unwrap(), &["quantity", "strength", "remarks"]);
    assert!(rows.contains(&vec![String::new(), String::new(), untold.words().to_string()]), "{rows:?}");
}

#[test]
fn the_proved_bound_is_a_labelled_line() {
    let scenario = demonstration("divider", 200);
    let program = Program::new(&scenario, &Control::default()).unwrap();
    let review = review::review_proving(&scenario, &program, 20_000, 2, &Control::default()).unwrap();
    let proof = review.proof.as_ref().unwrap();
    let bounds: Vec<_> = proof.windows.iter().filter_map(|it| Some((it.settling?.1, it.settling_below))).collect();
    assert!(!bounds.is_empty());
    let drawn = texts(&charts::settling_with(&scenario, &review.sweep, Some(proof)));
    for (most, below) in bounds {
        let label = format!("proved bound {}{}", if below { "below " } else { "" }, most.rounded());
        assert!(drawn.iter().any(|text| text.starts_with(&label)), "{label} in {drawn:?}");
    }
    assert!(!charts::settling_with(&scenario, &review.sweep, None).contains("proved"));
}

#[test]
fn any_number_of_threads_draws_the_same() {
    let scenario = demonstration("selector", 500);
    let [one, two] = [1, 2].map(|threads| reviewed(&scenario, threads));
    assert_eq!(shares::svg(&scenario, &one.asked, &one.sweep), shares::svg(&scenario, &two.asked, &two.sweep));
    assert_eq!(sensitivity::svg(&scenario, &one), sensitivity::svg(&scenario, &two));
}

#[test]
fn hostile_names_stay_text() {
    let mut scenario = demonstration("interlock", 300);
    let hostile = "<script>x</script> & \"quoted\" <b>\u{7}\u{fffe}";
    scenario.title = hostile.to_string();
    let stimulus = std::sync::Arc::make_mut(&mut scenario.stimulus);
    stimulus.moments.iter_mut().for_each(|moment| moment.label = hostile.to_string());
    stimulus.steps.iter_mut().for_each(|step| step.label = hostile.repeat(9));
    let review = reviewed(&scenario, 1);
    for svg in [
        shares::svg(&scenario, &review.asked, &review.sweep),
        sensitivity::svg(&scenario, &review).unwrap(),
        charts::settling_with(&scenario, &review.sweep, None),
    ] {
        let drawn = texts(&svg);
        assert!(drawn.iter().any(|text| text.contains("<script>x</script> & \"quoted\"")), "{drawn:?}");
        assert!(svg.chars().all(|it| !it.is_control() || it == '\n'), "letters that XML cannot hold");
    }
}
