//! Runs that are too long to be kept: the table on disk has all of them, everything else says what it left out.

use std::collections::HashMap;
use std::path::Path;
use std::process::{Command, Output};

use serde_json::Value;

/// Rings tied together. A step is still to come, so that no oscillation ends the run: the limit of transitions does.
fn rings(count: usize, transitions: u64) -> String {
    let mut text =
        "title = \"rings\"\noutputs = [\"x0\"]\n[inputs]\ngo = 0\n[delays]\nrise = [6, 9, 14]\nfall = [5, 8, 12]\n\
                    [gates]\n"
            .to_string();
    for ring in 0..count {
        let before = if ring == 0 { "go".to_string() } else { format!("x{}", ring - 1) };
        text += &format!(
            "a{ring} = {{ nand = [\"go\", \"c{ring}\"] }}\nb{ring} = {{ not = [\"a{ring}\"] }}\nc{ring} = {{ not = \
             [\"b{ring}\"] }}\nx{ring} = {{ xor = [\"c{ring}\", \"{before}\"] }}\n"
        );
    }
    text + &format!(
        "[limits]\ntransitions = {transitions}\n[[steps]]\nat = 10\nset = {{ go = 1 }}\n[[steps]]\nat = 1000000000\nset = {{ go = 0 }}\n"
    )
}

fn stillgate(folder: &Path, arguments: &[&str]) -> Output {
    Command::new(env!("CARGO_BIN_EXE_stillgate")).current_dir(folder).args(arguments).output().expect("it starts")
}

fn names(folder: &Path) -> Vec<String> {
    let mut all: Vec<String> =
        std::fs::read_dir(folder).unwrap().map(|it| it.unwrap().file_name().into_string().unwrap()).collect();
    all.sort();
    all
}

#[test]
fn a_run_beyond_what_is_kept_is_on_the_disk_whole() {
    let folder = tempfile::tempdir().unwrap();
    let transitions = 1_500_000;
    std::fs::write(folder.path().join("long.toml"), rings(4, transitions)).unwrap();
    let case = ["run", "long.toml", "--delays", "sample:3", "--out", "out", "--json"];
    let output = stillgate(folder.path(), &case);
    assert!(output.status.success(), "{}", String::from_utf8_lossy(&output.stderr));
    assert!(output.stdout.len() < 4_000_000, "{} bytes", output.stdout.len());
    let document: Value = serde_json::from_slice(&output.stdout).unwrap();
    let count = document["transitions"].as_u64().unwrap();
    assert!(count >= transitions, "{count}");
    assert_eq!(document["waves_truncated"], true);
    assert_eq!(document["windows"][0]["limit"], "limits.transitions", "how it ended is known all the same");
    assert_eq!(
        names(&folder.path().join("out")),
        ["case-sample-3.toml", "changes-sample-3.csv", "run-sample-3.json", "waves-sample-3.svg", "waves-sample-3.vcd"]
    );
    let svg = std::fs::read_to_string(folder.path().join("out/waves-sample-3.svg")).unwrap();
    assert!(svg.contains("A part of the run") && svg.contains("came after what was kept"), "the picture says so");

    // every transition is a row; each changes its net; the waves of the JSON are its beginning
    let mut table = csv::Reader::from_path(folder.path().join("out/changes-sample-3.csv")).unwrap();
    assert_eq!(table.headers().unwrap(), vec!["time [ns]", "net", "value"]);
    let until = document["waves_until"].as_f64().unwrap();
    let (mut now, mut rows, mut last) = (HashMap::<String, String>::new(), 0u64, 0.0);
    let mut begun: HashMap<String, usize> = HashMap::new();
    for record in table.records() {
        let record = record.unwrap();
        let at: f64 = record[0].parse().unwrap();
        assert!(at >= last);
        last = at;
        let before = now.insert(record[1].to_string(), record[2].to_string());
        assert_ne!(before.as_deref(), Some(&record[2]), "row {rows}");
        if before.is_none() {
            assert_eq!(&record[0], "0", "the start comes first");
        } else {
            rows += 1;
        }
        if at <= until {
            *begun.entry(record[1].to_string()).or_default() += 1;
        }
    }
    assert_eq!(rows, count);
    let listed = |net: &str| document["waves"][net].as_array().unwrap().len();
    assert!(begun.iter().all(|(net, rows)| listed(net) == *rows), "whole up to {until}");
    assert!(begun.values().sum::<usize>() > 100_000);

    // the dump has the same transitions, told by an independent reader
    let dump = std::fs::File::open(folder.path().join("out/waves-sample-3.vcd")).unwrap();
    let mut parser = vcd::Parser::new(std::io::BufReader::new(dump));
    let header = parser.parse_header().unwrap();
    assert_eq!(header.timescale.map(|(number, unit)| u64::from(number) * 10u64.pow(15) / unit.divisor()), Some(1));
    let mut all = csv::Reader::from_path(folder.path().join("out/changes-sample-3.csv")).unwrap();
    let mut rows = all.records().map(Result::unwrap);
    let ids: HashMap<_, _> = header
        .items
        .iter()
        .flat_map(|item| match item {
            vcd::ScopeItem::Scope(scope) => scope
                .items
                .iter()
                .filter_map(|item| match item {
                    vcd::ScopeItem::Var(var) => Some((var.code, var.reference.clone())),
                    _ => None,
                })
                .collect::<Vec<_>>(),
            _ => vec![],
        })
        .collect();
    let mut now = 0;
    for command in parser {
        match command.unwrap() {
            vcd::Command::Timestamp(at) => now = at,
            vcd::Command::ChangeScalar(id, value) => {
                let row = rows.next().expect("a row for every change");
                let at = stillgate::time::Span::parse(&row[0], stillgate::time::Unit::Ns).unwrap().fs();
                assert_eq!((at, &row[1], &row[2]), (now, ids[&id].as_str(), value.to_string().as_str()));
            }
            _ => {}
        }
    }
    assert!(rows.next().is_none());

    // a shorter run in the same folder has no table of changes of another run beside it
    std::fs::write(folder.path().join("long.toml"), rings(4, 5_000)).unwrap();
    assert!(stillgate(folder.path(), &case).status.success());
    assert_eq!(
        names(&folder.path().join("out")),
        ["case-sample-3.toml", "run-sample-3.json", "waves-sample-3.csv", "waves-sample-3.svg", "waves-sample-3.vcd"]
    );
}

#[test]
fn a_wide_circuit_gets_the_table_of_changes_too() {
    let folder = tempfile::tempdir().unwrap();
    std::fs::write(folder.path().join("wide.toml"), rings(250, 40_000)).unwrap();
    let output = stillgate(folder.path(), &["run", "wide.toml", "--out", "out"]);
    assert!(output.status.success(), "{}", String::from_utf8_lossy(&output.stderr));
    let said = String::from_utf8_lossy(&output.stderr);
    assert!(said.contains("waves-typical.csv is left out") && said.contains("changes-typical.csv"), "{said}");
    let table = std::fs::read_to_string(folder.path().join("out/changes-typical.csv")).unwrap();
    assert!(table.lines().count() > 41_000, "1,001 nets at the start, then 40,000 transitions");
    let document: Value =
        serde_json::from_slice(&std::fs::read(folder.path().join("out/run-typical.json")).unwrap()).unwrap();
    assert_eq!((&document["waves_truncated"], &document["waves_until"]), (&false.into(), &Value::Null));
}

#[test]
fn a_table_that_cannot_be_written_ends_the_run_and_leaves_nothing() {
    let folder = tempfile::tempdir().unwrap();
    std::fs::write(folder.path().join("long.toml"), rings(4, 1_200_000)).unwrap();
    // where the table would be written beside its place there is a folder
    std::fs::create_dir_all(folder.path().join("out/.changes-typical.csv.part")).unwrap();
    let output = stillgate(folder.path(), &["run", "long.toml", "--out", "out"]);
    assert_eq!(output.status.code(), Some(2));
    assert!(String::from_utf8_lossy(&output.stderr).contains("changes-typical.csv"));
    assert_eq!(names(&folder.path().join("out")), [".changes-typical.csv.part"], "nothing but what was there");
}

#[test]
fn lists_of_states_are_cut_and_counts_are_exact() {
    let folder = tempfile::tempdir().unwrap();
    // ten latches with inputs of their own
    let mut text = "title = \"latches\"\n[inputs]\n".to_string();
    (0..10).for_each(|i| text += &format!("s{i} = 0\nr{i} = 0\n"));
    text += "[initial]\n";
    (0..10).for_each(|i| text += &format!("q{i} = 0\n"));
    text += "[gates]\n";
    for i in 0..10 {
        text += &format!(
            "q{i} = {{ nor = [\"r{i}\", \"n{i}\"], delay = 1 }}\nn{i} = {{ nor = [\"s{i}\", \"q{i}\"], delay = 1 }}\n"
        );
    }
    std::fs::write(folder.path().join("many.toml"), text).unwrap();
    let states = |most: &str| {
        let output = stillgate(folder.path(), &["states", "many.toml", "--json", "--most-values", most]);
        assert!(output.status.success(), "{}", String::from_utf8_lossy(&output.stderr));
        serde_json::from_slice::<Value>(&output.stdout).unwrap()
    };
    let (few, more) = (states("1000"), states("100000"));
    let len = |document: &Value, key: &str| document[key].as_array().unwrap().len();
    // each of 4^10 input vectors has one state, or two where both inputs are 0: 5^10
    assert_eq!((&few["count"], &more["count"]), (&"9765625".into(), &"9765625".into()));
    assert_eq!(few["table_count"], more["table_count"]);
    for (key, flag) in [("inputs", "truncated"), ("table", "table_truncated"), ("transitions", "transitions_truncated")]
    {
        assert_eq!(few[flag], true, "{key}");
        assert!((1..=1000 / 20).contains(&len(&few, key)), "{key}: {}", len(&few, key));
        assert!(len(&more, key) > len(&few, key), "{key}");
        let beginning = &more[key].as_array().unwrap()[..len(&few, key)];
        assert_eq!(few[key].as_array().unwrap(), beginning, "{key}");
    }
}
