//! A sweep in parts says, to the byte, what it says in one go; what is no part, or no part of it, is refused; what is
//! interrupted or killed goes on.

mod forged;
mod interrupted;
mod machines;
mod merged;
mod refused;
mod until;

use std::collections::BTreeMap;
use std::path::{Path, PathBuf};
use std::process::{Command, Output};

use stillgate::control::Control;
use stillgate::engine::Program;
use stillgate::findings::Asked;
use stillgate::output::text::{self, Page};
use stillgate::output::{bundle, json};
use stillgate::review::{self, Sweeper};
use stillgate::scenario::Scenario;
use stillgate::sweep::{Cases, Overrides, Part};
use stillgate::{reader, sweep};

/// Two paddles that must not be drawn together, and their memory: races, glitches, oscillation to be judged, a reference,
/// two conditions.
const PADDLES: &str = r#"
title = "Two paddles"
outputs = ["upper", "lower"]
[inputs]
ask_upper = 0
ask_lower = 0
[initial]
upper = 0
lower = 0
[gates]
not_lower = { not = ["lower"], delay = [1, 4] }
not_upper = { not = ["upper"], delay = [1, 4] }
upper = { and = ["ask_upper", "not_lower"], delay = [3, 9] }
lower = { and = ["ask_lower", "not_upper"], delay = [3, 9] }
drawn = { or = ["upper", "lower"], delay = [2, 6] }
[[steps]]
label = "both ask"
at = 100
set = { ask_upper = 1, ask_lower = 1 }
expect = [{ upper = 1, lower = 0 }, { upper = 0, lower = 1 }]
[[steps]]
label = "upper is let go"
after = 60
set = { ask_upper = 0 }
[[steps]]
label = "and asks again"
after = [6, 14]
set = { ask_upper = 1 }
[[rules.never]]
name = "both drawn"
state = { upper = 1, lower = 1 }
[[rules.timing]]
name = "not at once"
from = "ask_upper rise"
to = "upper rise"
min = 4
[rules]
settle_within = 30
"#;

const COLD_AND_HOT: &str = "[conditions.cold]\nscale = 0.8\n[conditions.hot]\nscale = 1.7\n";

/// The demonstration with a reference, which some draws break.
fn permit(samples: u64) -> String {
    let text = include_str!("../../scenarios/permit.toml");
    let at = text.find("samples = ").expect("a number of samples");
    let end = at + text[at..].find('\n').expect("its line ends");
    format!("{}samples = {samples}{}", &text[..at], &text[end..])
}

/// Fourteen latches that power up in any state: more outcomes than a sweep keeps.
fn many_latches() -> String {
    let mut text = String::from("title = \"Fourteen latches\"\nbegin = \"random\"\n[inputs]\nset = 0\n[gates]\n");
    for latch in 0..14 {
        text += &format!("q{latch} = {{ nor = [\"set\", \"n{latch}\"], delay = [3, 5] }}\n");
        text += &format!("n{latch} = {{ nor = [\"set\", \"q{latch}\"], delay = [3, 5] }}\n");
    }
    text + "[[steps]]\nset = { set = 1 }\n"
}

/// A scenario, read, with what it asks and a program.
struct Read {
    text: String,
    scenario: Scenario,
    asked: Asked,
    program: Program,
}

impl Read {
    fn new(text: &str) -> Read {
        let scenario = reader::read(text, "paddles.toml").unwrap_or_else(|faults| panic!("{faults}")).scenario;
        let asked = Asked::of(&scenario);
        let program = Program::new(&scenario, &Control::default()).unwrap();
        Read { text: text.to_string(), scenario, asked, program }
    }

    /// Samples `from .. to` as a part.
    fn part(&self, from: u64, to: u64) -> Part {
        let mut cases = Cases::with_envelope(&self.scenario, &self.asked);
        let sweeper = Sweeper::new(&self.scenario, &self.program, &self.asked, 1).unwrap();
        sweeper.run(&mut cases, from..to, &Control::default());
        Part {
            name: "paddles.toml".into(),
            called: Some("paddles.toml".into()),
            title: self.scenario.title.clone(),
            text: self.text.clone(),
            overrides: Overrides::default(),
            plan: self.scenario.plan,
            wanted: (from, to),
            piece: true,
            curve: None,
            cases,
        }
    }

    /// Everything that a sweep says and leaves: text, JSON and files.
    fn said(&self, cases: &Cases) -> Result<Vec<bundle::File>, review::ReviewError> {
        let sweeper = Sweeper::new(&self.scenario, &self.program, &self.asked, 1)?;
        let report = sweeper.conclude(cases, None, &Control::default())?;
        let verdict = review::verdict(&self.scenario, &report);
        let mut said = bundle::of_sweep(&self.scenario, &self.asked, &report);
        said.add("sweep.json", json::sweep(&self.scenario, &self.asked, &report));
        said.add("text", text::sweep(&self.scenario, &self.asked, &report, &verdict, &Page::default()));
        Ok(said.files)
    }

    fn merge(&self, parts: &[(String, Part)]) -> Result<Part, Vec<sweep::Refusal>> {
        let mut all = sweep::Parts::default();
        parts.iter().for_each(|(file, part)| all.add(file, part.clone(), &self.scenario, &self.asked));
        all.finish(true)
    }
}

/// The program in a folder, ready to be started.
fn command(folder: &Path, arguments: &[&str]) -> Command {
    let mut command = Command::new(env!("CARGO_BIN_EXE_stillgate"));
    command.current_dir(folder).args(arguments);
    command
}

fn stillgate(folder: &Path, arguments: &[&str]) -> Output {
    command(folder, arguments).output().expect("the program starts")
}

/// Runs the program, which must succeed; what it prints.
fn done(folder: &Path, arguments: &[&str]) -> String {
    let output = stillgate(folder, arguments);
    assert!(output.status.success(), "{arguments:?}: {}", said(&output));
    String::from_utf8(output.stdout).unwrap()
}

/// What it says on standard error.
fn said(output: &Output) -> String {
    String::from_utf8(output.stderr.clone()).unwrap()
}

/// All files below a folder, by name.
fn files(folder: &Path) -> BTreeMap<String, Vec<u8>> {
    let each = std::fs::read_dir(folder).expect("the folder is there").map(|entry| {
        let path: PathBuf = entry.unwrap().path();
        (path.file_name().unwrap().to_string_lossy().into_owned(), std::fs::read(&path).unwrap())
    });
    each.collect()
}

/// A folder with a scenario file.
fn folder_with(text: &str) -> tempfile::TempDir {
    let folder = tempfile::tempdir().unwrap();
    std::fs::write(folder.path().join("paddles.toml"), text).unwrap();
    folder
}

/// `[sweep]` with these samples and tries.
fn plan(samples: u64, tries: u64) -> String {
    format!("[sweep]\nsamples = {samples}\ntries = {tries}\n")
}

/// All keys of a document, each with the way to it; the items of a list are one.
fn keys(value: &serde_json::Value, at: &str, into: &mut std::collections::BTreeSet<String>) {
    match value {
        serde_json::Value::Array(list) => list.iter().for_each(|it| keys(it, at, into)),
        serde_json::Value::Object(all) => all.iter().for_each(|(key, it)| {
            let at = format!("{at}.{key}");
            keys(it, &at, into);
            into.insert(at);
        }),
        _ => {}
    }
}

#[test]
fn what_a_part_holds_changes_only_with_its_format() {
    let read = Read::new(&permit(200));
    let mut part = read.part(0, 200);
    let sweeper = Sweeper::new(&read.scenario, &read.program, &read.asked, 1).unwrap();
    let report = sweeper.conclude(&part.cases, None, &Control::default()).unwrap();
    let mut curve = sweep::Curve::new("0.1".parse().unwrap());
    curve.look(&report);
    part.curve = Some(curve);
    let mut all = std::collections::BTreeSet::new();
    keys(&serde_json::to_value(&part).unwrap(), "", &mut all);
    let mut found = format!("format {}\n", sweep::FORMAT);
    all.iter().for_each(|key| found += &format!("{}\n", &key[1..]));
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/golden/part-keys.txt");
    if std::env::var_os("STILLGATE_GOLDEN").is_some_and(|it| it == "rewrite") {
        std::fs::write(&path, &found).unwrap();
    }
    let golden = std::fs::read_to_string(&path).unwrap_or_default();
    assert_eq!(found, golden, "a part holds something else: count `FORMAT` up, then STILLGATE_GOLDEN=rewrite");
}
