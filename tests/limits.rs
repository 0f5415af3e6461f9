//! How fast it may go: what `limit` finds, is what a person works out by hand and what a file with that value says.

use std::collections::BTreeMap;
use std::path::Path;
use std::process::{Command, Output};

use serde_json::Value;
use stillgate::control::Control;
use stillgate::engine::Program;
use stillgate::findings::Asked;
use stillgate::limit::{Boundary, LimitError, LimitReport, Outcome, Parameter, Search, limit, map};
use stillgate::review;
use stillgate::scenario::Scenario;

/// One nanosecond in fs.
pub const NS: i64 = 1_000_000;

pub fn read(text: &str) -> Scenario {
    stillgate::reader::read(text, "limit.toml").unwrap_or_else(|faults| panic!("{}", faults.render(false))).scenario
}

/// Searches from one value to another, in ns.
pub fn search(text: &str, of: &[&str], from: i64, to: i64) -> LimitReport {
    search_with(text, of, from, to, None)
}

pub fn search_with(text: &str, of: &[&str], from: i64, to: i64, within: Option<u64>) -> LimitReport {
    let scenario = read(text);
    let parameter = Parameter::named(of, &scenario).unwrap();
    let search = Search { from: Some(from * NS), to: Some(to * NS), within, ..Search::of(parameter) };
    limit(&scenario, &search, 1, &Control::default()).unwrap()
}

fn divider(rules: &str, delay: &str, samples: u64) -> String {
    let file = std::fs::read_to_string(Path::new(env!("CARGO_MANIFEST_DIR")).join("scenarios/divider.toml")).unwrap();
    let (circuit, _) = file.split_once("[rules]").unwrap();
    let circuit = circuit.replace("delay = [6, 9, 15]", &format!("delay = {delay}"));
    assert!(circuit.contains(&format!("delay = {delay}")));
    format!("{circuit}[rules]\n{rules}\n[sweep]\nsamples = {samples}\n")
}

/// Edges come half a period apart. The longest way from one to rest, by hand: turn rises while half is 0, set falls (1 gate
/// delay), half rises (2), half_not falls (3), data_hold rises (4); the falls of turn take 2 and 3, the other rise 3. An
/// edge that comes at the very instant of the last event comes before rest. So half a period is 4 gate delays and 1 fs.
#[test]
fn the_divider_takes_the_delay_of_its_longest_path() {
    let rules = "glitch_free = [\"half\", \"half_not\"]\nsettle_within = 60";
    for delay in [9, 7] {
        let report = search(&divider(rules, &delay.to_string(), 100), &["period", "turn"], 20, 200);
        assert!(report.alike && report.samples == 1 && report.within == 1);
        let shortest = 2 * (4 * delay * NS + 1);
        assert_eq!(report.limit, Some(Boundary { passes: shortest, fails: shortest - 1 }), "delay {delay}");
        assert!(report.is_monotone());
    }
}

/// For ranges the figure lies between those of all gates at their least and all at their greatest.
#[test]
fn the_divider_of_drawn_delays_lies_between_its_bounds() {
    let rules = "glitch_free = [\"half\", \"half_not\"]\nsettle_within = 60";
    let report = search(&divider(rules, "[6, 9, 15]", 150), &["period", "turn"], 20, 200);
    let found = report.limit.unwrap();
    assert!(!report.alike && report.samples == 150);
    assert!(found.passes.abs_diff(found.fails) <= report.within && report.within == 100_000, "{found:?}");
    assert!(2 * 4 * 6 * NS < found.passes && found.passes <= 2 * (4 * 15 * NS + 1) + 100_000, "{found:?}");
    // the very draws: a sample that breaks it just beyond does so in the scenario as it is, with its clock at that value
    let (_, instance) = report.beyond.unwrap().case.expect("a single draw shows it");
    assert_eq!(instance.clocks[0].period.fs() as i64, found.fails);
}

/// The rules can ask for more than rest: a high of the output lasts one period here.
#[test]
fn a_rule_with_a_number_sets_the_limit() {
    let report = search(&divider("min_pulse = { half = { high = 150 } }", "9", 1), &["period", "turn"], 80, 200);
    // half rises 2 gate delays after one rise of turn and falls 3 after the next
    let shortest = 150 * NS - 9 * NS;
    assert_eq!(report.limit, Some(Boundary { passes: shortest, fails: shortest - 1 }));
}

/// Two pulses on one wire: the gap between them is swallowed if it is shorter than the gate's delay of 1 ns, too short for
/// the rule up to 5 ns, and long enough from there on.
pub const GAP: &str = r#"
title = "Two lamps on one line"
[inputs]
a = 0
b = 0
[gates]
line = { or = ["a", "b"], delay = 1 }
[[steps]]
label = "a on"
at = 10
set = { a = 1 }
[[steps]]
label = "a off"
after = 20
set = { a = 0 }
[[steps]]
label = "b on"
after = 10
set = { b = 1 }
[[steps]]
label = "b off"
after = 20
set = { b = 0 }
[rules]
glitch_free = []
min_pulse = { line = { high = 3, low = 5 } }
not_judged = "allowed"
"#;

#[test]
fn what_fails_only_in_between_is_told_with_all_its_stretches() {
    let report = search(GAP, &["spacing", "b on"], 0, 16);
    let stretches: Vec<(i64, i64, bool)> = report.stretches.iter().map(|it| (it.from, it.to, it.passes)).collect();
    assert_eq!(stretches, [(0, NS - 1, true), (NS, 5 * NS - 1, false), (5 * NS, 16 * NS, true)]);
    assert!(!report.is_monotone() && report.easy_end_passes());
    assert_eq!(report.limit, Some(Boundary { passes: 5 * NS, fails: 5 * NS - 1 }), "that of the easy end");
    assert_eq!(report.boundaries.len(), 2);
}

#[test]
fn a_parameter_that_no_rule_depends_on_is_said_to_be_one() {
    let all = GAP.replace("low = 5", "low = 0.000001");
    let report = search(&all, &["spacing", "b off"], 4, 40);
    assert_eq!((report.everywhere(), report.limit, report.beyond.is_none()), (Some(true), None, true));
    let none = GAP.replace("high = 3", "high = 1000");
    let report = search(&none, &["spacing", "b on"], 0, 40);
    assert_eq!((report.everywhere(), report.limit), (Some(false), None));
    assert_eq!(report.beyond.unwrap().point.value, 40 * NS, "what happens at the easy end is told");
}

/// Skew, spacing of all steps, and the time high of a clock, each worked out by hand.
#[test]
fn every_kind_of_parameter_is_varied_as_it_says() {
    let skewed = r#"
[inputs]
a = 0
b = 1
[gates]
y = { and = ["a", "b"], delay = 2 }
[[steps]]
label = "swap"
at = 10
set = { a = 1, b = 0 }
skew = [0, 1]
[sweep]
samples = 400
"#;
    // a pulse as long as the gate's delay passes: a skew of 2 ns can give one, a shorter one cannot
    let report = search_with(skewed, &["skew", "swap"], 0, 8, Some(1));
    let found = report.limit.unwrap();
    assert!(2 * NS - 1 <= found.passes && found.passes < 3 * NS, "{found:?}");
    let one = &report.points[0];
    assert!(one.value == 0 && one.passes() && one.failing == 0);
    let last = report.points.last().unwrap();
    // the share of two uniform draws from 0 to 8 of which b's is 2 or more after a's: (6/8)^2 / 2
    let (low, high) = last.interval.unwrap();
    assert!(low < 0.28125 && 0.28125 < high, "{last:?}");

    // distances 20, 10, 20: the shortest is the gap, which must be 5
    let report = search(GAP, &["spacing", "all"], 2, 16);
    assert_eq!(report.limit, Some(Boundary { passes: 5 * NS, fails: 5 * NS - 1 }));

    let clocked = r#"
[inputs]
c = 0
[gates]
y = { buf = ["c"], delay = 3 }
[[clocks]]
net = "c"
first = 10
period = 40
high = 20
count = 2
[rules]
min_pulse = { y = { high = 7 } }
not_judged = "allowed"
"#;
    let report = search(clocked, &["pulse", "c"], 1, 39);
    let found = report.limit.unwrap();
    assert_eq!((found.passes, found.fails), (7 * NS, 7 * NS - 1));
}

/// The figures of every value are those of a file that says so: brute force through the reader.
#[test]
fn values_and_pairs_agree_with_files_that_say_so() {
    let text = GAP.replace("delay = 1 ", "delay = [0.5, 1.5] ") + "[sweep]\nsamples = 60\n";
    let of_file = |gap: i64, last: i64| -> (bool, u64) {
        let shown = |fs: i64| format!("after = \"{fs} fs\"");
        let text = text.replace("after = 10", &shown(gap));
        let (head, tail) = text.rsplit_once("after = 20").unwrap();
        let scenario = read(&format!("{head}{}{tail}", shown(last)));
        let program = Program::new(&scenario, &Control::default()).unwrap();
        let report = review::sweep(&scenario, &program, &Asked::of(&scenario), 1, &Control::default()).unwrap();
        let broken = report.findings.iter().filter(|finding| finding.breaks_rule);
        let count = broken.clone().map(|finding| finding.count).max().unwrap_or(0);
        (broken.count() == 0 && review::verdict(&scenario, &report).call.words() == "no failure found", count)
    };
    let scenario = read(&text);
    let search = |of: &[&str], to: i64| Search {
        from: Some(0),
        to: Some(to),
        points: 6,
        ..Search::of(Parameter::named(of, &scenario).unwrap())
    };
    let (across, up) = (search(&["spacing", "b on"], 8 * NS), search(&["spacing", "b off"], 8 * NS + 1));
    let report = map(&scenario, &across, &up, 2, &Control::default()).unwrap();
    assert_eq!((report.across.1.len(), report.up.1.len(), report.interrupted()), (6, 6, false));
    let mut seen: BTreeMap<&str, usize> = BTreeMap::new();
    for (last, row) in report.up.1.iter().zip(&report.cells) {
        for (gap, cell) in report.across.1.iter().zip(row) {
            let cell = cell.as_ref().unwrap();
            let (passes, count) = of_file(*gap, *last);
            assert_eq!(cell.passes(), passes, "{gap} {last}: {cell:?}");
            assert!(cell.failing >= count, "{gap} {last}: {cell:?}, {count}");
            *seen.entry(cell.outcome.words()).or_insert(0) += 1;
        }
    }
    assert!(seen.len() >= 2, "both kinds occur: {seen:?}");
}

#[test]
fn an_impossible_value_cuts_the_range_and_says_why() {
    let text = GAP.replace("set = { a = 0 }", "set = { a = 0 }\nbounce = { lasting = 3, pulses = [1, 1] }")
        + "[sweep]\nsamples = 20\n";
    let report = search(&text, &["spacing", "b on"], -4, 16);
    assert_eq!((report.range.asked.0, report.range.legal.from), (-4 * NS, 3 * NS));
    let why = report.range.legal.below.unwrap();
    assert!(why.contains("b on") && why.contains("move for 3"), "{why}");
    assert!(report.points.iter().all(|point| point.outcome != Outcome::Refused));
}

/// Without a range it is chosen: from 0 to four times the longest settling, or the file's own value if that is longer.
#[test]
fn a_range_is_chosen_from_the_scenario() {
    let scenario = read(GAP);
    let search = |of: &[&str]| Search::of(Parameter::named(of, &scenario).unwrap());
    let report = limit(&scenario, &search(&["spacing", "b on"]), 1, &Control::default()).unwrap();
    assert_eq!((report.range.legal.from, report.range.legal.to, report.range.given), (0, 10 * NS, false));
    let report = limit(&scenario, &search(&["lead", "a off", "b off"]), 1, &Control::default()).unwrap();
    assert_eq!(report.range.asked, (-4 * NS, 30 * NS));
    assert_eq!(report.range.legal.from, 20 * NS, "it may not come after the step behind it");
}

#[test]
fn what_cannot_be_varied_is_refused_with_a_remedy() {
    let scenario = read(GAP);
    let clocked = read(&divider("", "9", 1));
    let refused = |words: &[&str], scenario: &Scenario| match Parameter::named(words, scenario) {
        Err(LimitError::Bad(message)) => message,
        other => panic!("{words:?}: {other:?}"),
    };
    for (words, part) in [
        (&["spacing", "b onn"][..], "did you mean `b on`?"),
        (&["spacin", "b on"], "did you mean `spacing`?"),
        (&["spacing"], "`spacing` needs STEP"),
        (&["pulse", "lin"], "did you mean `line`?"),
        (&["pulse", "line"], "driven by a gate"),
        (&["pulse", "a", "a off", "a on"], "does not come before"),
        (&["pulse", "a", "a on", "b on"], "does not set `a`"),
        (&["period", "a"], "has no clocks"),
        (&["skew", "a on"], "one input"),
        (&["lead", "a on", "a on"], "no distance from itself"),
        (&["lag", "a on", "a offf"], "did you mean `a off`?"),
        (&[], "name what to vary"),
    ] {
        assert!(refused(words, &scenario).contains(part), "{words:?}: {}", refused(words, &scenario));
    }
    assert!(refused(&["period", "trun"], &clocked).contains("did you mean `turn`?"));
    let resting = read(&GAP.replace("after = 10", "rest = 10"));
    assert!(refused(&["spacing", "b on"], &resting).contains("comes at rest"));

    let parameter = Parameter::named(&["spacing", "b on"], &scenario).unwrap();
    for (from, to, part) in [(5, 5, "empty"), (6, 5, "reversed"), (-9, -4, "no value from -9 ns to -4 ns is possible")]
    {
        let search = Search { from: Some(from * NS), to: Some(to * NS), ..Search::of(parameter) };
        match limit(&scenario, &search, 1, &Control::default()) {
            Err(LimitError::Bad(message)) => assert!(message.contains(part), "{message}"),
            other => panic!("{from} to {to}: {other:?}"),
        }
    }
}

#[test]
fn a_search_that_is_stopped_says_so() {
    let scenario = read(GAP);
    let search = Search::of(Parameter::named(&["spacing", "b on"], &scenario).unwrap());
    let control = Control::default();
    control.cancel.store(true, std::sync::atomic::Ordering::Relaxed);
    assert!(matches!(limit(&scenario, &search, 1, &control), Err(LimitError::Cancelled)));
    let mut control = Control::default();
    let cancel = control.cancel.clone();
    control.progress = Some(std::sync::Arc::new(move |done, _| {
        if done == 5 {
            cancel.store(true, std::sync::atomic::Ordering::Relaxed);
        }
    }));
    let report = limit(&scenario, &search, 1, &control).unwrap();
    assert!(report.interrupted && report.points.len() == 5, "{}", report.points.len());
}

// ---- the command

fn stillgate(folder: &Path, arguments: &[&str]) -> Output {
    Command::new(env!("CARGO_BIN_EXE_stillgate")).current_dir(folder).args(arguments).output().unwrap()
}

fn text(bytes: &[u8]) -> String {
    String::from_utf8(bytes.to_vec()).unwrap()
}

#[test]
fn the_command_writes_the_same_bytes_for_any_threads_and_a_case_that_replays() {
    let folder = tempfile::tempdir().unwrap();
    let file = folder.path().join("gap.toml");
    std::fs::write(&file, GAP.replace("delay = 1 ", "delay = [0.5, 1.5] ") + "[sweep]\nsamples = 300\n").unwrap();
    let file = file.display().to_string();
    let mut all = Vec::new();
    for (out, threads) in [("one", "1"), ("two", "2")] {
        let arguments =
            ["limit", &file, "--of", "spacing", "b on", "--to", "12", "--threads", threads, "--out", out, "--json"];
        let output = stillgate(folder.path(), &arguments);
        assert!(output.status.success(), "{}", text(&output.stderr));
        let mut files = BTreeMap::new();
        for name in ["limit.svg", "limit.csv", "limit.json", "beyond-limit.toml"] {
            files.insert(name, std::fs::read(folder.path().join(out).join(name)).unwrap());
        }
        all.push((text(&output.stdout), files));
    }
    assert!(all[0] == all[1], "two threads change a byte");
    let said = &all[0].0;
    assert!(said.trim_start_matches('{').trim_start().starts_with("\"format\": 1"), "{said}");
    let result: Value = serde_json::from_str(said).unwrap();
    assert_eq!((&result["model"], &result["samples"]), (&"inertial gates".into(), &300.into()));
    assert_eq!(result["beyond"]["breach"]["kind"], "min-pulse");
    let output = stillgate(folder.path(), &["run", &file, "--delays", "one/beyond-limit.toml", "--strict", "--json"]);
    assert_eq!(output.status.code(), Some(1), "{}", text(&output.stderr));
    let run: Value = serde_json::from_slice(&output.stdout).unwrap();
    let facts = run["facts"].as_array().unwrap();
    assert!(facts.iter().any(|fact| fact["kind"] == "min-pulse"), "{facts:?}");
}

#[test]
fn exit_codes_tell_bad_words_and_a_range_that_never_passes() {
    let folder = tempfile::tempdir().unwrap();
    let file = folder.path().join("gap.toml");
    std::fs::write(&file, GAP).unwrap();
    let file = file.display().to_string();
    let code = |more: &[&str]| {
        let output = stillgate(folder.path(), &[&["limit", &file, "--quiet"], more].concat());
        (output.status.code(), text(&output.stderr))
    };
    assert_eq!(code(&["--of", "spacing", "b on"]).0, Some(0));
    assert_eq!(code(&["--of", "spacing", "b on", "--to", "4", "--from", "2"]).0, Some(0));
    assert_eq!(code(&["--of", "spacing", "b on", "--to", "4", "--from", "2", "--strict"]).0, Some(1));
    let (bad, said) = code(&["--of", "spacing", "b onn"]);
    assert!(bad == Some(2) && said.contains("did you mean `b on`?"), "{said}");
    let (bad, said) = code(&["--of", "spacing", "b on", "--from", "4 yd"]);
    assert!(bad == Some(2) && said.contains("--from") && said.contains("yd"), "{said}");
    let map = ["--of", "spacing", "b on", "--and", "spacing", "b off", "--points", "4"];
    assert_eq!(code(&map).0, Some(0));
    assert!(folder.path().join("stillgate-out/gap/limit-map.svg").exists());
    assert_eq!(code(&["--of", "spacing", "b on", "--and", "spacing", "b on"]).0, Some(2));
}
