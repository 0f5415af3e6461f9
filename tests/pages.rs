//! The report page: whole, valid, self-contained, accessible by its structure, and it says what the results say.

use std::collections::BTreeSet;

use scraper::{ElementRef, Html, Selector};
use serde_json::Value;
use stillgate::control::Control;
use stillgate::engine::Program;
use stillgate::output::text::Page;
use stillgate::output::{json, page};
use stillgate::review::{self, Review};
use stillgate::scenario::Scenario;

/// Sections in the order of a review meeting.
const SECTIONS: [&str; 12] = [
    "verdict",
    "checked",
    "findings",
    "stepping",
    "rules",
    "assumptions",
    "steps",
    "coverage",
    "proof",
    "states",
    "not-covered",
    "cautions",
];

fn reviewed(scenario: &Scenario, threads: usize) -> Review {
    let program = Program::new(scenario, &Control::default()).unwrap();
    review::review_proving(scenario, &program, 500, threads, &Control::default()).unwrap()
}

fn read(text: &str, name: &str, samples: u64) -> Scenario {
    let loaded = stillgate::reader::read(text, name).unwrap_or_else(|it| panic!("{}", it.render(false)));
    let mut scenario = loaded.scenario;
    scenario.plan.samples = samples;
    scenario.plan.search = 0;
    scenario
}

fn demonstration(name: &str) -> Scenario {
    let folder = std::path::Path::new(env!("CARGO_MANIFEST_DIR")).join("scenarios");
    read(&std::fs::read_to_string(folder.join(format!("{name}.toml"))).unwrap(), name, 40)
}

fn told<'a>(name: &'a str) -> Page<'a> {
    Page { scenario: Some(name), folder: "out", options: " --samples 40", ..Page::default() }
}

fn all<'a>(html: &'a Html, selector: &str) -> Vec<ElementRef<'a>> {
    html.select(&Selector::parse(selector).unwrap()).collect()
}

fn text(element: ElementRef<'_>) -> String {
    element.text().collect::<Vec<_>>().concat()
}

/// Everything that must hold of every page.
fn check(name: &str, page: &str, review: &Review, scenario: &Scenario) {
    let html = Html::parse_document(page);
    assert_eq!(html.errors, Vec::<std::borrow::Cow<'static, str>>::new(), "{name}: not valid");
    let text_of = |selector: &str| all(&html, selector).into_iter().map(text).collect::<Vec<_>>();

    // self-contained: no address but the names of the picture format
    let bare = page.replace("http://www.w3.org/2000/svg", "");
    for word in ["http:", "https:", "src=", "@import", "url(http", "//cdn", "<link", "<iframe", "<base"] {
        assert!(!bare.contains(word), "{name} reaches for {word}");
    }

    // ids and links
    let mut ids = BTreeSet::new();
    for element in all(&html, "[id]") {
        let id = element.attr("id").unwrap();
        assert!(!id.contains(char::is_whitespace) && ids.insert(id), "{name}: the id {id} twice, or with a space");
    }
    for link in all(&html, "a") {
        let target = link.attr("href").unwrap().strip_prefix('#').unwrap_or_else(|| panic!("{name}: a link outside"));
        assert!(ids.contains(target), "{name}: no target #{target}");
        assert!(!text(link).trim().is_empty(), "{name}: a link without words to {target}");
    }
    for attribute in ["aria-labelledby", "aria-describedby", "for"] {
        for element in all(&html, &format!("[{attribute}]")) {
            for id in element.attr(attribute).unwrap().split_whitespace() {
                assert!(ids.contains(id), "{name}: {attribute} names {id}, which is not there");
            }
        }
    }
    for reference in page.split("url(#").skip(1) {
        let id = reference.split(')').next().unwrap();
        assert!(ids.contains(id), "{name}: a picture takes {id} from elsewhere");
    }

    // order
    let sections: Vec<&str> = all(&html, "main > section").iter().map(|it| it.attr("id").unwrap()).collect();
    assert_eq!(sections, SECTIONS, "{name}");
    assert_eq!(all(&html, "h1").len(), 1);
    let mut level = 1;
    for heading in all(&html, "h1, h2, h3, h4") {
        let next = heading.value().name()[1..].parse::<u32>().unwrap();
        assert!(next <= level + 1, "{name}: {} comes after a heading of level {level}", text(heading));
        assert!(!text(heading).trim().is_empty());
        level = next;
    }
    assert_eq!(all(&html, "html").first().and_then(|it| it.attr("lang")), Some("en"));

    // tables, pictures, controls
    for table in all(&html, "table") {
        let has = |selector: &str| table.select(&Selector::parse(selector).unwrap()).next().is_some();
        let caption = table.select(&Selector::parse("caption").unwrap()).map(text).collect::<String>();
        assert!(!caption.trim().is_empty() && has("thead th[scope=col]"), "{name}: the table {caption:?}");
        // a corner without a title is a cell and no header
        let columns = table.select(&Selector::parse("thead th, thead td").unwrap()).count();
        let header = Selector::parse("thead th").unwrap();
        assert!(
            table.select(&header).all(|it| !text(it).trim().is_empty()),
            "{name}: {caption}: a header without a title"
        );
        for row in table.select(&Selector::parse("tbody tr").unwrap()) {
            assert_eq!(row.child_elements().count(), columns, "{name}: {caption}: {}", text(row));
        }
        let region = table.parent().and_then(ElementRef::wrap).unwrap();
        assert_eq!((region.attr("tabindex"), region.attr("role")), (Some("0"), Some("region")), "{name}: {caption}");
    }
    for svg in all(&html, "svg") {
        let named = svg.attr("aria-label").is_some_and(|it| !it.is_empty()) || svg.attr("aria-labelledby").is_some();
        assert!(svg.attr("role") == Some("img") && named, "{name}: a picture without a name");
    }
    for figure in all(&html, "figure") {
        assert_eq!(figure.select(&Selector::parse("figcaption").unwrap()).count(), 1);
    }
    for control in all(&html, "input, select") {
        let id = control.attr("id").unwrap();
        assert_eq!(all(&html, &format!("label[for={id}]")).len(), 1, "{name}: no label for {id}");
    }
    for hidden in ["#stepping", "li[data-scripted]", "[data-step-through]"] {
        assert!(all(&html, hidden).iter().all(|it| it.attr("hidden").is_some()), "{name}: {hidden} without a script");
    }

    // what it says
    let verdict = text_of("#verdict").concat();
    assert!(verdict.to_lowercase().contains(review.verdict.call.words()), "{name}: {verdict}");
    let cautions = text_of("#cautions").concat();
    assert!(cautions.contains("local code") && cautions.contains("licensed"), "{cautions}");
    let checked = text_of("#checked").concat();
    for word in [format!("seed {}", review.sweep.plan.seed), env!("CARGO_PKG_VERSION").to_string()] {
        assert!(checked.contains(&word), "{name}: {word} is not in {checked}");
    }
    findings(name, &html, review, scenario);
    charts(name, &html, review);
    data(name, &html, review, scenario);
}

/// Every finding of the JSON is on the page, in order, with the command that replays it.
fn findings(name: &str, html: &Html, review: &Review, scenario: &Scenario) {
    let whole: Value = serde_json::from_str(&json::review(scenario, review)).unwrap();
    let articles: Vec<String> = all(html, "#findings article").into_iter().map(text).collect();
    let rows: Vec<String> = all(html, "#further-findings tbody tr").into_iter().map(text).collect();
    let told: Vec<&String> = articles.iter().chain(&rows).collect();
    let found = whole["sweep"]["findings"].as_array().unwrap();
    assert_eq!(told.len(), found.len(), "{name}");
    for (told, finding) in told.iter().zip(found) {
        let told_low = told.to_lowercase();
        let kind = finding["kind"].as_str().unwrap();
        assert!(told_low.contains(kind) || told.contains("o oscillation where"), "{name}: {kind} is not in {told}");
        for key in ["net", "step", "rule_name", "pattern"] {
            let Some(word) = finding[key].as_str() else { continue };
            assert!(told_low.contains(&word.to_lowercase()), "{name}: {key} {word} is not in {told}");
        }
        let replay = match (finding["worst_sample"].as_u64(), finding["case"].as_str()) {
            (Some(sample), _) => format!("stillgate run {name} --samples 40 --delays sample:{sample}"),
            (None, Some(case)) if case.ends_with(".toml") => format!("stillgate run {name} --delays out/{case}"),
            (None, Some(case)) => format!("stillgate run {name} --samples 40 --delays {case}"),
            (None, None) => continue,
        };
        assert!(told.contains(&replay), "{name}: {replay} is not in {told}");
    }
}

/// All shares come before the findings, and what decides after them; each only where there is something to show.
fn charts(name: &str, html: &Html, review: &Review) {
    let sweep = &review.sweep;
    let shares = !sweep.findings.is_empty() || sweep.at_most.is_some() || sweep.unseen.is_some();
    let decides = review.why.iter().flatten().any(|why| why.pull.is_some());
    let order: Vec<&str> = all(html, "#findings > article, #findings > figure > .picture > svg")
        .iter()
        .map(|it| it.attr("id").unwrap())
        .map(|id| if id.starts_with("finding-") { "finding" } else { id })
        .collect();
    let findings = all(html, "#findings > article").len();
    let mut wanted = vec!["shares"; usize::from(shares)];
    wanted.extend(vec!["finding"; findings]);
    wanted.extend(vec!["sensitivity"; usize::from(decides)]);
    assert_eq!(order, wanted, "{name}");
    for (id, files) in
        [("shares", ["shares.svg", "shares.csv"]), ("sensitivity", ["sensitivity.svg", "sensitivity.csv"])]
    {
        for caption in all(html, &format!("#figure-{id} figcaption")) {
            assert!(files.iter().all(|file| text(caption).contains(file)), "{name}: {}", text(caption));
        }
    }
}

/// What the slider steps through is what happened.
fn data(name: &str, html: &Html, review: &Review, scenario: &Scenario) {
    let data: Value = serde_json::from_str(&text(all(html, "#runs")[0])).unwrap();
    let nets: Vec<&str> = data["nets"].as_array().unwrap().iter().map(|it| it.as_str().unwrap()).collect();
    let of = |run: &Value| all(html, &format!("svg#{}", run["id"].as_str().unwrap())).len();
    let runs = data["runs"].as_array().unwrap();
    assert_eq!(runs.len(), all(html, "svg[id^=run-]").len(), "{name}: every picture can be stepped through");
    for run in runs {
        assert_eq!(of(run), 1, "{name}: its picture");
        let at = run["at"].as_array().unwrap();
        assert_eq!(at.len(), run["moves"].as_array().unwrap().len());
        let times: Vec<f64> = at.iter().map(|it| it.as_str().unwrap().parse().unwrap()).collect();
        assert!(times.windows(2).all(|pair| pair[0] <= pair[1]) && times[0] == 0.0, "{name}: {times:?}");
        for pair in run["steps"].as_array().unwrap().iter().chain(run["rest"].as_array().unwrap()) {
            assert!((pair[0].as_u64().unwrap() as usize) < at.len());
        }
    }
    // all changes of the typical run played back give its last state
    let (Some(typical), Some(run)) = (&review.typical, runs.first()) else { return };
    if !run["cut"].is_null() {
        return;
    }
    let mut values: Vec<char> = run["start"].as_str().unwrap().chars().collect();
    let mut changes = 0;
    for moves in run["moves"].as_array().unwrap() {
        for pair in moves.as_array().unwrap().chunks(2) {
            values[pair[0].as_u64().unwrap() as usize] = ['0', '1', 'X'][pair[1].as_u64().unwrap() as usize];
            changes += 1;
        }
    }
    assert_eq!(changes, typical.trace.changes.len(), "{name}: no change is lost");
    for (net, value) in nets.iter().zip(&values) {
        let id = scenario.circuit.nets().find(|id| scenario.circuit.name(*id) == *net).unwrap();
        let last = typical.trace.changes.iter().rfind(|change| change.net == id).map(|change| change.new);
        let last = last.unwrap_or(typical.trace.start.get(id.index()));
        assert_eq!(value.to_string(), last.to_string(), "{name}: {net}");
    }
}

fn demonstrations(names: &[&str]) {
    for name in names {
        let scenario = demonstration(name);
        let review = reviewed(&scenario, 1);
        let told = told(name);
        check(name, &page::report(&scenario, &review, &told), &review, &scenario);
    }
}

const SOME: [&str; 9] = [
    "interlock",
    "selector",
    "selector-cured",
    "handshake",
    "sequencer",
    "permit",
    "contactors",
    "clock-switch",
    "pulse-train",
];
const OTHERS: [&str; 9] = [
    "interlock-walk",
    "divider",
    "horn",
    "bell",
    "stepper",
    "power-up",
    "push-button",
    "handshake-partner",
    "clock-switch-safe",
];

#[test]
fn demonstrations_have_whole_pages() {
    demonstrations(&SOME);
}

#[test]
fn further_demonstrations_have_whole_pages() {
    demonstrations(&OTHERS);
    let folder = std::path::Path::new(env!("CARGO_MANIFEST_DIR")).join("scenarios");
    assert_eq!(std::fs::read_dir(folder).unwrap().count(), SOME.len() + OTHERS.len(), "a demonstration is not checked");
}

#[test]
fn the_same_bytes_for_any_number_of_threads() {
    let scenario = demonstration("contactors");
    let page = |threads| page::report(&scenario, &reviewed(&scenario, threads), &told("contactors"));
    let one = page(1);
    assert!(one == page(3), "threads change a byte");
}

/// Titles, labels and names of rules and conditions that would open elements or end scripts, and a net name of 200 letters.
#[test]
fn hostile_names_are_only_names() {
    let long = "gauge_".repeat(33) + "ab";
    assert_eq!(long.len(), 200);
    let file = format!(
        r#"
title = "</title><script>alert(1)</script>"
outputs = ["{long}"]
[inputs]
set_not = 1
reset_not = 1
[initial]
"q.a[0]" = 0
[gates]
"q.a[0]" = {{ nand = ["set_not", "{long}"] }}
{long} = {{ nand = ["reset_not", "q.a[0]"] }}
[delays]
delay = [5, 8, 13]
[[steps]]
label = "</script><b> & 'one'"
at = 100
set = {{ set_not = 0 }}
[[steps]]
label = "<!-- \"two\""
after = 100
set = {{ set_not = 1 }}
[rules]
settle_within = 12
[[rules.never]]
name = "<img onerror=alert(2)> &amp; ]]>"
state = {{ "q.a[0]" = 1, {long} = 0 }}
[conditions."<i>hot</i>"]
scale = 1.2
"#
    );
    let scenario = read(&file, "hostile", 40);
    let review = reviewed(&scenario, 1);
    assert!(review.sweep.findings.iter().any(|finding| finding.breaks_rule), "there is a finding to name them");
    let page = page::report(&scenario, &review, &told("hostile"));
    check("hostile", &page, &review, &scenario);
    let html = Html::parse_document(&page);
    assert_eq!(all(&html, "script").len(), 2, "no script but the page's own");
    assert!(all(&html, "b, i, img").is_empty(), "a name has become an element");
    let data: Value = serde_json::from_str(&text(all(&html, "#runs")[0])).unwrap();
    assert!(data["nets"].as_array().unwrap().iter().any(|it| it == &long));
    assert_eq!(text(all(&html, "title")[0]), "</title><script>alert(1)</script>: review");
    let told = text(all(&html, "main")[0]);
    for name in ["</script><b> & 'one'", "<!-- \"two\"", "<img onerror=alert(2)> &amp; ]]>", "<i>hot</i>", &long] {
        assert!(told.contains(name), "{name} is told as it is written");
    }
    let style = text(all(&html, "style")[0]);
    assert!(style.contains("overflow-wrap: anywhere"), "long names are broken, they do not run out of the page");
}

/// A long run is cut in the data of the slider, and the page says so.
#[test]
fn long_runs_are_cut_and_said_to_be() {
    let mut file = "title = \"Bells\"\noutputs = [\"bell_0\"]\n[inputs]\ntick = 0\n[gates]\n".to_string();
    for bell in 0..9 {
        file += &format!("bell_{bell} = {{ buf = [\"tick\"] }}\n");
    }
    file +=
        "[delays]\ndelay = [1, 2, 3]\n[[clocks]]\nnet = \"tick\"\nfirst = 10\nperiod = 20\nhigh = 10\ncount = 1200\n";
    let scenario = read(&file, "bells", 2);
    let program = Program::new(&scenario, &Control::default()).unwrap();
    let review = review::review_proving(&scenario, &program, 0, 1, &Control::default()).unwrap();
    let page = page::report(&scenario, &review, &told("bells"));
    let html = Html::parse_document(&page);
    let data: Value = serde_json::from_str(&text(all(&html, "#runs")[0])).unwrap();
    let run = &data["runs"][0];
    let moves: usize = run["moves"].as_array().unwrap().iter().map(|it| it.as_array().unwrap().len() / 2).sum();
    assert_eq!(moves, 20_000);
    let cut = run["cut"].as_str().unwrap();
    assert!(cut.contains("4,000 changes of this run left out"), "{cut}");
    assert!(page.len() < 4_000_000, "{} bytes", page.len());
}
