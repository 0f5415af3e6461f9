//! The program as a user meets it: commands, exit codes, files, same bytes.

use std::collections::BTreeMap;
use std::path::{Path, PathBuf};
use std::process::{Command, Output};

use serde_json::Value;

/// Runs the program in a folder of its own, so that nothing is left behind elsewhere.
fn stillgate(folder: &Path, arguments: &[&str]) -> Output {
    Command::new(env!("CARGO_BIN_EXE_stillgate"))
        .current_dir(folder)
        .args(arguments)
        .output()
        .expect("the program starts")
}

fn project(path: &str) -> String {
    Path::new(env!("CARGO_MANIFEST_DIR")).join(path).display().to_string()
}

fn text(bytes: &[u8]) -> String {
    String::from_utf8(bytes.to_vec()).expect("text is UTF-8")
}

/// All files below a folder, by name.
fn files(folder: &Path) -> BTreeMap<String, Vec<u8>> {
    let each = std::fs::read_dir(folder).expect("the folder is there").map(|entry| {
        let path: PathBuf = entry.expect("a readable entry").path();
        let name = path.file_name().expect("a name").to_string_lossy().into_owned();
        (name, std::fs::read(&path).expect("a readable file"))
    });
    each.collect()
}

#[test]
fn the_main_job_on_the_demonstration_leaves_its_files() {
    let folder = tempfile::tempdir().unwrap();
    let output = stillgate(folder.path(), &["review", "--samples", "2000"]);
    assert!(output.status.success(), "{}", text(&output.stderr));
    let said = text(&output.stdout);
    assert!(said.lines().next().is_some_and(|line| line.to_lowercase().starts_with("broken")), "{said}");
    assert!(said.contains("green") && said.contains("--delays sample:"), "{said}");
    assert!(said.lines().all(|line| line.chars().count() <= 100), "{said}");
    let files = files(&folder.path().join("stillgate-out/interlock"));
    for name in [
        "result.json",
        "waves-typical.svg",
        "waves-typical.csv",
        "waves-typical.vcd",
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
        "envelope.csv",
        "states.svg",
        "states.csv",
        "transitions.csv",
    ] {
        assert!(files.get(name).is_some_and(|bytes| !bytes.is_empty()), "{name} in {:?}", files.keys());
    }
    assert!(files.keys().any(|name| name.starts_with("waves-glitch-green") && name.ends_with(".svg")));
    let result: Value = serde_json::from_slice(&files["result.json"]).unwrap();
    assert_eq!(result["format"], 1);
    assert_eq!(result["verdict"], "broken");
    assert_eq!(result["draws"], 2000);
}

#[test]
fn same_bytes_for_one_and_two_threads_and_on_a_second_run() {
    for scenario in ["interlock", "contactors", "clock-switch", "power-up", "horn"] {
        let path = project(&format!("scenarios/{scenario}.toml"));
        let mut all = Vec::new();
        for threads in ["1", "2", "1"] {
            // the page has commands that name the folder
            let (folder, out) = (tempfile::tempdir().unwrap(), "out");
            let arguments = ["review", &path, "--samples", "700", "--threads", threads, "--out", out, "--json"];
            let output = stillgate(folder.path(), &arguments);
            assert!(output.status.success(), "{scenario}: {}", text(&output.stderr));
            all.push((text(&output.stdout), files(&folder.path().join(out))));
        }
        assert!(all[0] == all[1], "{scenario}: two threads change a byte");
        assert!(all[0] == all[2], "{scenario}: a second run changes a byte");
    }
}

#[test]
fn strict_tells_the_verdict_by_the_exit_code() {
    let folder = tempfile::tempdir().unwrap();
    let code = |scenario: &str, strict: bool| {
        let path = project(scenario);
        let mut arguments = vec!["sweep", &path, "--samples", "300", "--quiet"];
        if strict {
            arguments.push("--strict");
        }
        stillgate(folder.path(), &arguments).status.code()
    };
    assert_eq!(code("scenarios/selector.toml", false), Some(0));
    assert_eq!(code("scenarios/selector.toml", true), Some(1));
    assert_eq!(code("scenarios/selector-cured.toml", true), Some(0));
}

#[test]
fn bad_files_give_exit_code_2_a_place_and_no_file() {
    let malformed = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/malformed");
    let mut seen = 0;
    for entry in std::fs::read_dir(malformed).unwrap() {
        let path = entry.unwrap().path();
        if path.extension().is_none_or(|extension| extension != "toml") {
            continue;
        }
        seen += 1;
        let folder = tempfile::tempdir().unwrap();
        let name = path.display().to_string();
        let output = stillgate(folder.path(), &["review", &name]);
        let said = text(&output.stderr);
        assert_eq!(output.status.code(), Some(2), "{name}: {said}");
        let file = path.file_name().unwrap().to_string_lossy().into_owned();
        let place = said.split(&format!("{file}:")).nth(1).unwrap_or_else(|| panic!("{name}: no place in {said}"));
        let mut numbers = place.split(|c: char| !c.is_ascii_digit());
        assert!(numbers.next().is_some_and(|line| !line.is_empty()), "{name}: no line in {said}");
        assert!(numbers.next().is_some_and(|column| !column.is_empty()), "{name}: no column in {said}");
        assert!(said.contains("help"), "{name}: no remedy in {said}");
        assert!(!said.contains("panicked"), "{name}: {said}");
        assert!(output.stdout.is_empty(), "{name}");
        assert_eq!(std::fs::read_dir(folder.path()).unwrap().count(), 0, "{name} left a file");
    }
    assert!(seen >= 50, "only {seen} malformed files");
}

#[test]
fn a_bad_command_line_gives_exit_code_2() {
    let folder = tempfile::tempdir().unwrap();
    for arguments in [
        &["frobnicate"][..],
        &["review", "no-such-file.toml"],
        &["review", "."],
        &["review", "--samples", "0"],
        &["review", "--samples", "many"],
        &["review", "--draw", "sideways"],
        &["run", "--delays", "sample:x"],
        &["run", "--delays", "no-such-case.toml"],
        &["run", "--nets", "grene"],
        &[],
    ] {
        let output = stillgate(folder.path(), arguments);
        assert_eq!(output.status.code(), Some(2), "{arguments:?}");
        assert!(!output.stderr.is_empty(), "{arguments:?} says nothing");
        assert_eq!(std::fs::read_dir(folder.path()).unwrap().count(), 0, "{arguments:?} left a file");
    }
    assert_eq!(stillgate(folder.path(), &["--help"]).status.code(), Some(0));
    assert_eq!(stillgate(folder.path(), &["--version"]).status.code(), Some(0));
}

#[test]
fn a_finding_replays_to_the_same_femtosecond() {
    let folder = tempfile::tempdir().unwrap();
    let output = stillgate(folder.path(), &["review", "--samples", "1500", "--json"]);
    let review: Value = serde_json::from_slice(&output.stdout).unwrap();
    let findings = review["sweep"]["findings"].as_array().unwrap();
    let finding = findings.iter().find(|finding| finding["kind"] == "glitch").unwrap();
    for (sample, exact) in [("worst_sample", true), ("sample", false)] {
        let case = format!("sample:{}", finding[sample]);
        let case_file = format!("again/case-sample-{}.toml", finding[sample]);
        let output = stillgate(folder.path(), &["run", "--delays", &case, "--json", "--out", "again"]);
        let run: Value = serde_json::from_slice(&output.stdout).unwrap();
        let facts = run["facts"].as_array().unwrap();
        let same = |fact: &&Value| ["kind", "shape", "net", "step"].iter().all(|key| fact[key] == finding[key]);
        let fact = facts.iter().find(same).unwrap_or_else(|| panic!("{case} does not show it: {run}"));
        assert!(!exact || fact["worst"] == finding["worst"], "{fact} {finding}");

        // and once more from the file of the case
        let output = stillgate(folder.path(), &["run", "--delays", &case_file, "--json", "--out", "third"]);
        assert!(output.status.success(), "{}", text(&output.stderr));
        let given: Value = serde_json::from_slice(&output.stdout).unwrap();
        assert_eq!(given["waves"], run["waves"], "{case} from its file");
        assert_eq!(
            std::fs::read(folder.path().join(&case_file)).unwrap(),
            std::fs::read(folder.path().join("third/case-given-case.toml")).unwrap(),
            "written and read back exactly"
        );
    }
}

#[test]
fn every_command_answers_in_json_and_in_text() {
    let folder = tempfile::tempdir().unwrap();
    let path = project("scenarios/handshake.toml");
    for command in ["check", "states", "run", "sweep", "review"] {
        let output = stillgate(folder.path(), &[command, &path, "--json"]);
        assert!(output.status.success(), "{command}: {}", text(&output.stderr));
        let said = text(&output.stdout);
        assert!(said.trim_start().starts_with("{\n  \"format\": 1"), "{command}: {said:.60}");
        let document: Value = serde_json::from_str(&said).unwrap();
        assert!(document.is_object());
        let output = stillgate(folder.path(), &[command, &path]);
        let said = text(&output.stdout);
        // a command to be copied stays on one line, whatever the path
        let fits = |line: &str| line.chars().count() <= 100 || line.trim_start().starts_with("stillgate run ");
        assert!(said.lines().count() > 3 && said.lines().all(fits), "{command}: {said}");
        assert!(!said.contains('\u{1b}'), "{command}: colour without a terminal");
        // what a review calls proved was proved
        for word in ["proved", "holds", "passed"].iter().filter(|word| command != "review" || **word != "proved") {
            assert!(!said.contains(word), "{command} says {word}: {said}");
        }
        assert!(stillgate(folder.path(), &[command, &path, "--quiet"]).stdout.is_empty(), "{command} --quiet");
    }
}

#[test]
fn completions_and_manual_know_every_command_and_option() {
    let folder = tempfile::tempdir().unwrap();
    let said = |arguments: &[&str]| {
        let output = stillgate(folder.path(), arguments);
        assert!(output.status.success(), "{arguments:?}: {}", text(&output.stderr));
        text(&output.stdout)
    };
    let commands = ["review", "run", "sweep", "merge", "limit", "states", "prove", "check", "completions", "manual"];
    for shell in ["bash", "zsh", "fish", "elvish", "powershell"] {
        let script = said(&["completions", shell]);
        for word in commands.iter().chain(&["proof-zones", "keep-every", "to-within"]) {
            assert!(script.contains(word), "{shell} lacks {word}");
        }
    }
    let page = said(&["manual"]);
    assert!(page.contains(".TH stillgate 1") && commands.iter().all(|it| page.contains(it)), "{page}");
    for command in commands {
        let page = said(&["manual", command]);
        assert!(page.contains(&format!(".TH stillgate-{command} 1")), "{page}");
    }
    assert!(said(&["manual", "review"]).contains("proof\\-zones"));
    let output = stillgate(folder.path(), &["manual", "revew"]);
    assert_eq!(output.status.code(), Some(2));
    assert!(text(&output.stderr).contains("did you mean `review`?"));
    assert_eq!(stillgate(folder.path(), &["completions", "tcsh"]).status.code(), Some(2));
}

#[test]
fn every_command_can_be_quiet() {
    let folder = tempfile::tempdir().unwrap();
    let selector = project("scenarios/selector.toml");
    for arguments in [
        &["review", "--samples", "50", "--search", "50"][..],
        &["sweep", "--samples", "50"],
        &["run"],
        &["limit", "--samples", "20", "--of", "spacing", "all", "--points", "3"],
        &["prove"],
        &["states"],
        &["check"],
    ] {
        let output = stillgate(folder.path(), &[arguments, &[selector.as_str(), "--quiet"]].concat());
        assert!(output.status.success(), "{arguments:?}: {}", text(&output.stderr));
        assert!(output.stdout.is_empty() && output.stderr.is_empty(), "{arguments:?}: {}", text(&output.stderr));
    }
}

#[test]
fn a_folder_that_cannot_be_made_is_named() {
    let folder = tempfile::tempdir().unwrap();
    std::fs::write(folder.path().join("taken"), "a file").unwrap();
    let output = stillgate(folder.path(), &["review", "--samples", "10", "--out", "taken/deep"]);
    assert_eq!(output.status.code(), Some(2));
    assert!(text(&output.stderr).contains("taken"), "{}", text(&output.stderr));
}

#[test]
fn the_scenario_in_the_readme_is_a_good_one() {
    let readme = std::fs::read_to_string(project("README.md")).unwrap();
    let example = readme.split("```toml\n").nth(1).and_then(|rest| rest.split("```").next()).expect("an example");
    let folder = tempfile::tempdir().unwrap();
    std::fs::write(folder.path().join("latch.toml"), example).unwrap();
    let output = stillgate(folder.path(), &["review", "latch.toml", "--samples", "500", "--strict"]);
    assert!(output.status.success(), "{}{}", text(&output.stdout), text(&output.stderr));
    assert!(text(&output.stdout).starts_with("Proved for every delay in the ranges; no failure found in 500 draws"));
    // every document that it links to is there, and the heading within it
    for link in readme.split("](").skip(1).filter_map(|rest| rest.split(')').next()) {
        let (file, heading) = link.split_once('#').unwrap_or((link, ""));
        assert!(Path::new(&project(file)).exists(), "the README links to {link}");
        if !heading.is_empty() {
            let document = std::fs::read_to_string(project(file)).unwrap();
            let name = |line: &str| line.trim_start_matches('#').trim().to_lowercase().replace(' ', "-");
            let mut headings = document.lines().filter(|line| line.starts_with('#'));
            assert!(headings.any(|line| name(line) == heading), "the README links to {link}");
        }
    }
}
