//! The search for a limit on a latch of two NORs: text, JSON, CSV, pictures.

use stillgate::control::Control;
use stillgate::findings::Asked;
use stillgate::limit::{Parameter, Search, limit, map};
use stillgate::output::text::{self, Page};
use stillgate::output::{json, limit_charts, limit_map, limit_tables};

use super::{golden, well_formed};

const LATCH: &str = r#"
title = "Latch of two NORs"
outputs = []
[inputs]
s = 0
r = 0
look = 0
[initial]
q = 0
[gates]
q = { nor = ["r", "qb"] }
qb = { nor = ["s", "q"] }
seen = { buf = ["look"] }
[delays]
rise = [0.7, 1, 1.5]
fall = [0.6, 1, 1.4]
[[steps]]
label = "set"
at = 10
set = { s = 1 }
[[steps]]
label = "let go"
after = 4
set = { s = 0 }
[[steps]]
label = "look"
rest = 10
set = { look = 1 }
expect = { q = 1 }
[rules]
not_judged = "allowed"
[sweep]
samples = 60
"#;

#[test]
fn the_limit_of_a_latch() {
    let scenario = stillgate::reader::read(LATCH, "latch.toml").unwrap().scenario;
    let asked = Asked::of(&scenario);
    let search = |words: &[&str], from, to, points| Search {
        from: Some(from),
        to: Some(to),
        points,
        ..Search::of(Parameter::named(words, &scenario).unwrap())
    };
    let pulse = search(&["pulse", "s"], 0, 4_000_000, 9);
    let report = limit(&scenario, &pulse, 1, &Control::default()).unwrap();
    let page = Page { scenario: Some("latch.toml"), ..Page::default() };
    let said = text::limit(&scenario, &asked, &report, Some("out/beyond-limit.toml"), &page);
    assert!(said.lines().all(|line| line.chars().count() <= 100), "{said}");
    golden("limit.txt", &said);
    let document = json::limit(&scenario, &asked, &report);
    assert!(document.starts_with("{\n  \"format\": 1,"), "{document}");
    golden("limit.json", &document);
    golden("limit.csv", &limit_tables::limit(&scenario, &asked, &report));
    let svg = limit_charts::limit(&scenario, &report);
    well_formed(&svg);
    golden("limit.svg", &svg);

    let start = search(&["spacing", "set"], 0, 8_000_000, 5);
    let report = map(&scenario, &Search { points: 9, ..pulse }, &start, 1, &Control::default()).unwrap();
    golden("limit-map.txt", &text::limit_map(&scenario, &asked, &report, &page));
    let document = json::limit_map(&scenario, &asked, &report);
    let value: serde_json::Value = serde_json::from_str(&document).unwrap();
    assert_eq!((&value["format"], &value["rows"][4]["cells"][8]["value"]), (&1.into(), &4.into()));
    golden("limit-map.csv", &limit_tables::limit_map(&scenario, &asked, &report));
    let svg = limit_map::svg(&scenario, &report);
    well_formed(&svg);
    golden("limit-map.svg", &svg);
}
