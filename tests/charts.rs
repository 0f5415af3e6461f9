//! Charts of a review: their tables say what the report says, and no name or label can spoil a picture.

use std::collections::BTreeSet;

use stillgate::control::Control;
use stillgate::engine::Program;
use stillgate::output::text::Page;
use stillgate::output::{bundle, charts, sensitivity, shares, tables};
use stillgate::review::{self, Review};
use stillgate::scenario::Scenario;
use stillgate::sweep::SweepReport;
use stillgate::time::Span;

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
            let inside = format!("{said}; in the inequality");
            assert!(drawn.contains(&said) || drawn.contains(&inside), "{name}: {said} in {drawn:?}");
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

/// A step's label that holds letters which mean something in a picture.
const LABEL: &str = "<script>x</script> & \"all\" 'one' <b>";

/// The selector with names of nets of 200 letters and more, and such a label.
fn hostile_nets() -> Scenario {
    let [lower, path, level] = ["lower", "path", "level"].map(|it| format!("{it}_{}", "n".repeat(200)));
    let label = LABEL.replace('"', "\\\"");
    let text = format!(
        "title = \"Selector\"
outputs = [\"{level}\"]
inputs = {{ upper = 1 }}
[gates]
{lower} = {{ not = [\"upper\"], delay = [4, 6, 9] }}
above = {{ buf = [\"upper\"] }}
{path} = {{ buf = [\"{lower}\"] }}
{level} = {{ or = [\"above\", \"{path}\"], delay = [3, 4, 6] }}
[delays]
delay = [5, 6, 8]
[[steps]]
label = \"{label}\"
at = 50
set = {{ upper = 0 }}
[rules]
glitch_free = [\"{level}\"]
settle_within = 40
"
    );
    read(&text, 400)
}

/// x, anchor, font size, letters.
type Drawn = (f64, String, f64, String);

/// XML as it must be, by a reader that forgives nothing; gives x, anchor, font size and letters of each text without its
/// title, and all titles.
fn strict(svg: &str) -> (Vec<Drawn>, Vec<String>) {
    let (mut open, mut texts, mut titles) = (Vec::<String>::new(), Vec::new(), Vec::new());
    let decode = |text: &str| {
        let mut whole = String::new();
        for (number, part) in text.split('&').enumerate() {
            let Some((name, rest)) = part.split_once(';').filter(|_| number > 0) else {
                assert_eq!(number, 0, "a bare & in {text:?}");
                whole += part;
                continue;
            };
            let letter = [("amp", '&'), ("lt", '<'), ("gt", '>'), ("quot", '"'), ("apos", '\'')];
            whole.push(letter.iter().find(|it| it.0 == name).unwrap_or_else(|| panic!("&{name}; in {text:?}")).1);
            whole += rest;
        }
        whole
    };
    let mut rest = svg;
    while let Some(at) = rest.find('<') {
        let text = decode(&rest[..at]);
        assert!(!rest[..at].contains('>'), "a bare > in {text:?}");
        let end = rest.find('>').expect("a tag ends");
        let inner = &rest[at + 1..end];
        assert!(!inner.contains('<') && inner.matches('"').count().is_multiple_of(2), "<{inner}>");
        match open.last().map(String::as_str) {
            Some("text") => texts.last_mut().map(|it: &mut Drawn| it.3 += text.trim()).unwrap(),
            Some("title") => titles.push(text),
            _ => assert!(text.trim().is_empty(), "{text:?} is no text"),
        }
        match inner.strip_prefix('/') {
            Some(name) => assert_eq!(open.pop().as_deref(), Some(name), "closed out of order"),
            None => {
                let name = inner.split([' ', '/']).next().unwrap().to_string();
                assert!(
                    ["svg", "rect", "text", "title", "circle", "polyline", "line"].contains(&&name[..]),
                    "<{inner}>"
                );
                if name == "text" {
                    let of = |key: &str| {
                        inner.split(&format!(" {key}=\"")).nth(1).and_then(|it| it.split('"').next()).unwrap()
                    };
                    let number = |key: &str| of(key).parse::<f64>().unwrap();
                    let anchor = if inner.contains("rotate(") { "turned" } else { of("text-anchor") };
                    texts.push((number("x"), anchor.to_string(), number("font-size"), String::new()));
                }
                if !inner.ends_with('/') {
                    open.push(name);
                }
            }
        }
        rest = &rest[end + 1..];
    }
    assert!(open.is_empty(), "never closed: {open:?}");
    (texts, titles)
}

#[test]
fn hostile_names_of_nets_neither_break_nor_overflow() {
    let scenario = hostile_nets();
    let review = reviewed(&scenario, 1);
    let names: Vec<String> = scenario.circuit.nets().map(|net| scenario.circuit.name(net).to_string()).collect();
    assert!(names.iter().filter(|name| name.len() > 200).count() == 3, "{names:?}");
    let label = format!("{LABEL} ").repeat(9);
    let mut relabelled = scenario.clone();
    let stimulus = std::sync::Arc::make_mut(&mut relabelled.stimulus);
    stimulus.moments.iter_mut().for_each(|moment| moment.label = label.clone());
    let tables = [
        (
            shares::svg(&scenario, &review.asked, &review.sweep),
            shares::csv(&scenario, &review.asked, &review.sweep),
            &names[4..],
        ),
        (sensitivity::svg(&scenario, &review).unwrap(), sensitivity::csv(&scenario, &review).unwrap(), &names[3..]),
        (
            charts::settling_with(&relabelled, &review.sweep, None),
            tables::settling(&relabelled, &review.sweep),
            &[label][..],
        ),
    ];
    for (svg, table, whole) in tables {
        let (texts, titles) = strict(&svg);
        let read: Vec<String> = csv::Reader::from_reader(table.as_bytes())
            .records()
            .flat_map(|row| row.unwrap().iter().map(str::to_string).collect::<Vec<_>>())
            .collect();
        for name in whole {
            assert!(titles.iter().any(|title| title.contains(name.trim())), "{name} has no title: {titles:?}");
            assert!(read.iter().any(|field| field.contains(name)), "{name} is not in {table}");
        }
        assert!(texts.iter().any(|it| it.3.contains('…')), "nothing was cut: {texts:?}");
        for (x, anchor, size, text) in texts {
            // letters of a sans-serif font are half as wide as they are high, at least on average
            let wide = 0.5 * size * text.chars().count() as f64;
            let (from, to) = match &anchor[..] {
                "start" => (x, x + wide),
                "end" => (x - wide, x),
                // its lines go down from x, turned to the right
                "turned" => (x, x + size),
                _ => (x - wide / 2.0, x + wide / 2.0),
            };
            assert!(from >= 0.0 && to <= 1000.0, "{text:?} from {from} to {to}");
        }
    }
}

#[test]
fn the_inequality_of_the_proof_stands_with_its_bars() {
    let scenario = demonstration("selector", 600);
    let program = Program::new(&scenario, &Control::default()).unwrap();
    let review = review::review_proving(&scenario, &program, 20_000, 1, &Control::default()).unwrap();
    let svg = sensitivity::svg(&scenario, &review).unwrap();
    let drawn = texts(&svg);
    let said = "The inequality of the proof: choose_lower↑ + from_lower↑ (9 … 17) must stay below from_upper↓ + level (8 … 14)";
    assert!(drawn.iter().any(|text| text.starts_with(said)), "{drawn:?}");
    let inside = columns(&sensitivity::csv(&scenario, &review).unwrap(), &["quantity", "in_inequality"]);
    assert_eq!(inside.len(), 4);
    assert!(inside.iter().all(|row| row[1] == "yes"), "all four delays are its terms: {inside:?}");
    assert_eq!(drawn.iter().filter(|text| text.ends_with("; in the inequality")).count(), 4, "{drawn:?}");

    // an inequality of one of them leaves the others unmarked
    let mut fewer = review.clone();
    let claims = &mut fewer.proof.as_mut().unwrap().claims;
    let race = claims.iter_mut().find_map(|claim| claim.race.as_mut()).unwrap();
    race.first.terms.truncate(1);
    race.second.terms.clear();
    let inside = columns(&sensitivity::csv(&scenario, &fewer).unwrap(), &["quantity", "in_inequality"]);
    for row in &inside {
        assert_eq!(row[1] == "yes", row[0].contains("choose_lower"), "{inside:?}");
    }

    let without = Review { proof: None, ..review };
    assert!(!sensitivity::svg(&scenario, &without).unwrap().contains("inequality"));
    let inside = columns(&sensitivity::csv(&scenario, &without).unwrap(), &["in_inequality"]);
    assert!(inside.iter().all(|row| row[0].is_empty()));
}

/// A window of the sweep with these bars, of 1 ns from 10 ns on, and perhaps a last one of what is far later.
fn with_bars(report: &SweepReport, counts: &[u64], far: Option<(u64, u64)>) -> SweepReport {
    let ns = |it: u64| Span::from_fs(it * 1_000_000);
    let mut report = report.clone();
    let settling = report.windows[0].settling.as_mut().unwrap();
    settling.bars =
        (10..).map(ns).zip((11..).map(ns)).zip(counts).map(|((from, to), count)| (from, to, *count)).collect();
    let end = 10 + counts.len() as u64;
    settling.bars.extend(far.map(|(count, latest)| (ns(end), ns(latest) + Span::from_fs(1), count)));
    settling.far = far.is_some();
    (settling.min, settling.median, settling.p99) = (Some(ns(10)), ns(12), ns(end));
    settling.max = ns(far.map_or(end, |it| it.1));
    report.windows.truncate(1);
    report
}

/// Width of the first filled bar of a settling chart.
fn bar_width(svg: &str) -> f64 {
    let bar = svg.lines().find(|line| line.starts_with("<rect") && line.contains("fill=\"#D9DEE6\"")).expect("a bar");
    bar.split("width=\"").nth(1).unwrap().split('"').next().unwrap().parse().unwrap()
}

#[test]
fn a_far_window_leaves_the_others_their_shape() {
    let mut scenario = demonstration("selector", 100);
    let review = reviewed(&scenario, 1);
    std::sync::Arc::make_mut(&mut scenario.stimulus).steps[0].settle_within = Some(Span::from_fs(30_000_000));
    let counts = [50, 200, 300, 100, 40];
    let near = with_bars(&review.sweep, &counts, None);
    let plain = charts::settling(&scenario, &near);
    assert!(!plain.contains("not to scale"), "a limit of four times the breadth is drawn to scale");

    let far = with_bars(&review.sweep, &counts, Some((2, 812)));
    let svg = charts::settling(&scenario, &far);
    let drawn = texts(&svg);
    for said in ["later than 15 ns: 2 draws, up to 812 ns", "limit 30 ns", "not to scale"] {
        assert!(drawn.iter().any(|text| text == said), "{said} in {drawn:?}");
    }
    assert!(bar_width(&svg) >= bar_width(&plain), "one far window makes no bar thinner");
    let rows = columns(&tables::settling(&scenario, &far), &["from [ns]", "count", "far"]);
    assert_eq!(rows.last().unwrap()[..], ["15", "2", "yes"]);
    assert!(rows[..rows.len() - 1].iter().all(|row| row[2] == "no"));

    // the same for a limit that is far
    std::sync::Arc::make_mut(&mut scenario.stimulus).steps[0].settle_within = Some(Span::from_fs(5_000_000_000));
    let svg = charts::settling(&scenario, &near);
    let drawn = texts(&svg);
    for said in ["limit 5 us", "not to scale"] {
        assert!(drawn.iter().any(|text| text == said), "{said} in {drawn:?}");
    }
    assert!(bar_width(&svg) > 20.0, "{svg}");
}

/// Two draws of 5,000 have an echo that comes tens of times later than all else.
#[test]
fn a_rare_late_run_is_told_and_flattens_nothing() {
    let scenario = read(
        r#"
title = "Rare echo of a paddle switch"
outputs = ["light"]
inputs = { key = 0 }
[gates]
open  = { not = ["key"], delay = [5, 6, 8] }
turn  = { buf = ["key"], delay = [7.85, 9, 12] }
both  = { and = ["open", "turn"], delay = 3, filter = "transport" }
echo  = { buf = ["both"], delay = [600, 700, 800], filter = "transport" }
light = { or = ["turn", "echo"], delay = [5, 6, 8] }
[[steps]]
label = "turn"
at = 50
set = { key = 1 }
[rules]
settle_within = 40
"#,
        5000,
    );
    let review = reviewed(&scenario, 2);
    let settling = review.sweep.windows[0].settling.as_ref().unwrap();
    let late = settling.bars.last().unwrap();
    assert!(settling.far && settling.max > Span::from_fs(600_000_000) && (1..=5).contains(&late.2), "{settling:?}");
    assert!(settling.bars.len() > 30, "the others keep their shape: {settling:?}");
    assert_eq!(settling.bars.iter().map(|bar| bar.2).sum::<u64>(), 5000);
    let svg = charts::settling(&scenario, &review.sweep);
    let drawn = texts(&svg);
    let said = format!(": {} draws, up to {}", late.2, settling.max.rounded());
    assert!(drawn.iter().any(|text| text.starts_with("later than ") && text.ends_with(&said)), "{drawn:?}");
    assert!(drawn.iter().any(|text| text == "limit 40 ns"), "{drawn:?}");
}

#[test]
fn the_figures_of_a_step_are_those_of_the_report() {
    let scenario = demonstration("selector", 200);
    let program = Program::new(&scenario, &Control::default()).unwrap();
    let review = review::review_proving(&scenario, &program, 20_000, 1, &Control::default()).unwrap();
    let proof = review.proof.as_ref().unwrap();
    let table = tables::settling_figures(&scenario, &review.sweep, Some(proof));
    let figures = ["settled", "least [ns]", "median [ns]", "p99 [ns]", "worst [ns]", "limit [ns]", "proved_bound [ns]"];
    let rows = columns(&table, &figures);
    assert_eq!(rows.len(), review.sweep.windows.len());
    for (row, window) in rows.iter().zip(&review.sweep.windows) {
        let it = window.settling.as_ref().unwrap();
        let times: Vec<f64> = row[1..].iter().map(|it| it.parse().unwrap()).collect();
        let bound = proof.windows.iter().find(|it| it.moment == window.moment).unwrap().settling.unwrap().1;
        let limit = Span::from_fs(40_000_000);
        for (told, is) in times.iter().zip([it.min.unwrap(), it.median, it.p99, it.max, limit, bound]) {
            assert!((told * 1e6 - is.fs() as f64).abs() < 0.5, "{told} is not {is:?}");
        }
        assert_eq!(row[0], window.settled.to_string());
        assert!(times.windows(2).take(3).all(|pair| pair[0] <= pair[1]) && times[3] <= times[5], "{times:?}");
    }
    let without =
        columns(&tables::settling_figures(&scenario, &review.sweep, None), &["proved_bound [ns]", "proved_below"]);
    assert!(without.iter().flatten().all(String::is_empty), "what was not asked is empty: {without:?}");
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
