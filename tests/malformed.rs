//! What is wrong in a file is found, placed and explained, all of it at once; and no text makes the reader panic.

use std::fs;
use std::path::{Path, PathBuf};

use proptest::prelude::*;
use proptest::test_runner::{Config, RngSeed};
use stillgate::reader::{self, Diagnostics, ReadError};

fn folder(name: &str) -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("tests").join(name)
}

fn files(name: &str) -> Vec<PathBuf> {
    let entries = fs::read_dir(folder(name)).expect("the folder of cases");
    let mut paths: Vec<_> = entries.map(|entry| entry.expect("an entry").path()).collect();
    paths.sort();
    paths
}

fn complete() -> String {
    fs::read_to_string(folder("cases").join("complete.toml")).expect("the complete example")
}

/// `# expect LINE:COLUMN fragment` in the first line of a file.
fn expected(text: &str) -> Option<(usize, usize, &str)> {
    let (place, fragment) = text.lines().next()?.strip_prefix("# expect ")?.split_once(' ')?;
    let (line, column) = place.split_once(':')?;
    Some((line.parse().ok()?, column.parse().ok()?, fragment))
}

#[test]
fn each_malformed_file_gets_its_one_fault() {
    let files = files("malformed");
    assert!(files.len() >= 60, "only {} cases", files.len());
    let mut wrong = String::new();
    for path in files {
        let text = fs::read_to_string(&path).expect("a text");
        let (line, column, fragment) = expected(&text).unwrap_or_else(|| panic!("{path:?} says what to expect"));
        match reader::load(&path) {
            Err(ReadError::Faults(found)) => {
                let item = &found.items()[0];
                let right = found.items().len() == 1
                    && (item.line, item.column) == (line, column)
                    && item.message.contains(fragment)
                    && !item.help.is_empty();
                let shown = found.render(false);
                let picture = shown.contains(&format!("{}:{line}:{column}", path.display()))
                    && shown.contains(&format!("help: {}", item.help));
                if !right || !picture {
                    wrong += &format!("{path:?} expects {line}:{column} {fragment}\n{shown}\n");
                }
            }
            Err(ReadError::File(error)) => wrong += &format!("{path:?} was not read: {error}\n"),
            Ok(_) => wrong += &format!("{path:?} reads without a fault\n"),
        }
    }
    assert!(wrong.is_empty(), "{wrong}");
}

#[test]
fn all_faults_of_a_file_are_reported_at_once() {
    let text = r#"
time_unit = "ns"
outputs = ["q", "lamp"]
[inputs]
r = 0
s = 2
[gates]
q  = { nor = ["r", "qm"], delay = [9, 5] }
qn = { nor = ["s"], delay = 0 }
z  = { nandd = ["q", "r"] }
e  = { expr = "q & & r" }
[[steps]]
at = 5
set = { q = 1 }
[[steps]]
at = 4
set = { s = 1 }
[[clocks]]
net = "r"
first = 1
period = 5
high = 6
count = 2
[[rules.timing]]
from = "q rises"
to = "qn fall"
min = 1
[rules]
swallowed = "sometimes"
[sweep]
samples = 0
"#;
    let found = reader::read(text, "many.toml").expect_err("many faults");
    let lines: Vec<usize> = found.items().iter().map(|item| item.line).collect();
    assert_eq!(lines, [3, 6, 8, 8, 9, 9, 10, 11, 14, 16, 22, 25, 29, 31], "{found}");
    assert!(found.render(false).ends_with("many.toml: 14 errors\n"), "{found}");
    assert!(found.render(true).contains("\u{1b}["), "styled text has colours");
}

#[test]
fn faults_of_syntax_on_several_lines_are_all_reported() {
    let found = reader::read("[inputs]\nr =\ns = 0\n[gates]\nq = nor\n", "syntax.toml").expect_err("no TOML");
    let places: Vec<_> = found.items().iter().map(|item| (item.line, item.column)).collect();
    assert_eq!(places, [(2, 4), (5, 5)], "{found}");
}

#[test]
fn the_complete_example_reads_without_fault() {
    let loaded = reader::read(&complete(), "complete.toml").unwrap_or_else(|faults| panic!("{faults}"));
    let scenario = &loaded.scenario;
    assert_eq!(scenario.title, "Canal-lock gate interlock");
    let names: Vec<_> = scenario.circuit.nets().map(|net| scenario.circuit.name(net)).collect();
    assert_eq!(
        names,
        ["call_upper", "call_lower", "tick", "hold_upper", "hold_lower", "open_upper", "open_lower", "lamp"],
        "nets keep the order of the file"
    );
    assert_eq!(scenario.stimulus.steps.len(), 4);
    assert_eq!(scenario.stimulus.moments.len(), 4 + 32);
    // the mark of a step leads back to its place
    let step = &scenario.stimulus.steps[1];
    let place = &loaded.spans[step.mark.0 as usize];
    assert_eq!(&loaded.text[place.clone()], "[[steps]]");
}

/// The examples of the documentation, each made whole by what it leaves out of a small circuit.
#[test]
fn the_examples_of_the_format_read_without_fault() {
    let manual = fs::read_to_string(folder("../docs/scenario-format.md")).expect("the documentation");
    let parts = [
        ("[inputs]", "[inputs]\na = 0\nb = 1\n"),
        ("[gates]", "[gates]\nq = { nor = [\"a\", \"qn\"] }\nqn = { nor = [\"b\", \"q\"] }\nout = { buf = [\"q\"] }\n"),
    ];
    let mut examples = 0;
    for block in manual.split("```toml\n").skip(1) {
        let mut text = block.split("```").next().expect("the end of an example").to_string();
        // a gate that reads itself has several stable states
        if text.contains("majority") {
            text.insert_str(0, "begin = \"random\"\n");
        }
        for (header, part) in parts {
            if !text.contains(header) {
                text += part;
            }
        }
        if let Err(faults) = reader::read(&text, "example.toml") {
            panic!("{faults}\n{text}");
        }
        examples += 1;
    }
    assert!(examples >= 10, "only {examples} examples");
}

#[test]
fn a_case_of_the_complete_example_reads_without_fault() {
    let scenario = reader::read(&complete(), "complete.toml").unwrap_or_else(|faults| panic!("{faults}")).scenario;
    let path = folder("cases").join("complete-sample-5.toml");
    let case = reader::load_instance(&path, &scenario).unwrap_or_else(|error| panic!("{error}"));
    let fs = |span: stillgate::time::Span| span.fs();
    assert_eq!(case.delays.gate[1].map(fs), [11_095_209, 13_694_352], "fall, then rise");
    assert_eq!(
        case.places.iter().copied().map(fs).collect::<Vec<_>>(),
        [100_000_000, 107_767_971, 200_000_000, 200_000_000]
    );
    assert_eq!(case.skews[3].iter().copied().map(fs).collect::<Vec<_>>(), [9_640_374, 15_051_720]);
    assert_eq!(case.clocks[0].jitter[..2], [-275_629, 469_219]);
}

#[test]
fn a_byte_order_mark_is_passed_over() {
    let text = format!("\u{feff}{}", complete());
    assert!(reader::read(&text, "mark.toml").is_ok());
    let found = reader::read("\u{feff}rulez = 1\n", "mark.toml").expect_err("an unknown key");
    assert_eq!((found.items()[0].line, found.items()[0].column), (1, 1), "{found}");
}

#[test]
fn an_empty_text_says_so() {
    for text in ["", "  \n\n", "\u{feff}\n"] {
        let found = reader::read(text, "empty.toml").expect_err("an empty text");
        assert_eq!(found.items()[0].message, "this text is empty");
    }
    assert!(reader::read("# nothing but a comment\n", "empty.toml").is_err());
}

#[test]
fn hostile_texts_are_refused_in_few_words() {
    let latch = "[inputs]\na = 0\n[gates]\nq = { not = [\"a\"] }\n";
    let texts = [
        "[".repeat(1_000_000),
        format!("a = {}", "[".repeat(1_000_000)),
        format!("a = {}", "{b=".repeat(300_000)),
        format!("{} = 1", "a.".repeat(300_000)),
        format!("title = \"{}", "x".repeat(2_000_000)),
        format!("[gates]\nq = {{ expr = \"{}\" }}\n", "!(".repeat(500_000)),
        // one line, many faults
        format!("outputs = [{}]\n{latch}", "\"nobody\", ".repeat(200_000)),
        // many lines, many faults, many names to compare with
        format!("{latch}{}", (0..40_000).map(|i| format!("g{i} = {{ not = [\"h{i}\"] }}\n")).collect::<String>()),
        format!("{latch}{}", "q = { not = [\"a\"] }\n".repeat(30_000)),
        format!("{latch}{}", "b =\n".repeat(100_000)),
        format!("{latch}[[steps]]\ntimes = 99999999999999999999999999\nsteps = [ {{ set = {{ a = 1 }} }} ]\n"),
        format!("{latch}[[clocks]]\nnet = \"a\"\nfirst = 0\nperiod = \"4000 s\"\nhigh = 1\ncount = 400000\n"),
        format!("{latch}[[steps]]\nat = 1e99999999999\nset = {{ a = 1 }}\n"),
    ];
    for text in texts {
        let found = reader::read(&text, "hostile.toml").expect_err("a hostile text");
        let shown = found.render(false);
        let head: String = text.chars().take(60).collect();
        assert!(shown.len() < 2_000_000, "{head}… gave {} bytes", shown.len());
    }
}

/// Whatever is reported lies within the text and has a remedy.
fn sound(text: &str, found: &Diagnostics) -> Result<(), TestCaseError> {
    prop_assert!(!found.items().is_empty());
    let lines = text.lines().count().max(1) + 1;
    for item in found.items() {
        prop_assert!(item.line >= 1 && item.line <= lines, "line {} of {lines}", item.line);
        prop_assert!(!item.message.is_empty() && !item.help.is_empty());
    }
    prop_assert!(!found.render(false).is_empty());
    Ok(())
}

/// Words, numbers, signs, blanks and line breaks of a text.
fn tokens(text: &str) -> Vec<String> {
    let mut tokens: Vec<String> = Vec::new();
    let word = |c: char| c.is_alphanumeric() || c == '_' || c == '.';
    for letter in text.chars() {
        match tokens.last_mut() {
            Some(last) if word(letter) && last.chars().all(word) => last.push(letter),
            _ => tokens.push(letter.to_string()),
        }
    }
    tokens
}

/// What to do with two tokens: delete, duplicate, swap, overwrite.
type Edit = (u8, prop::sample::Index, prop::sample::Index);

fn edits() -> impl Strategy<Value = Vec<Edit>> {
    prop::collection::vec((0u8..4, any::<prop::sample::Index>(), any::<prop::sample::Index>()), 1..6)
}

fn mutated(text: &str, edits: &[Edit]) -> String {
    let mut parts = tokens(text);
    for (edit, a, b) in edits {
        let (a, b) = (a.index(parts.len()), b.index(parts.len()));
        match edit {
            0 => {
                parts.remove(a);
            }
            1 => parts.insert(b, parts[a].clone()),
            2 => parts.swap(a, b),
            _ => parts[a] = parts[b].clone(),
        }
    }
    parts.concat()
}

fn config(cases: u32) -> Config {
    Config { cases, failure_persistence: None, rng_seed: RngSeed::Fixed(7), ..Config::default() }
}

proptest! {
    #![proptest_config(config(2000))]

    #[test]
    fn no_text_makes_the_reader_panic(text in "([a-z_]{1,6}|[0-9.]{1,4}|[\\[\\]{}=,\"'#.\\\\ \n]|\\PC){0,60}") {
        if let Err(found) = reader::read(&text, "random.toml") {
            sound(&text, &found)?;
        }
    }

    #[test]
    fn no_mutation_of_a_scenario_makes_the_reader_panic(
        which in 0usize..1000,
        edits in edits(),
    ) {
        let paths = files("malformed");
        let text = match paths.get(which) {
            Some(path) => fs::read_to_string(path).expect("a text"),
            None => complete(),
        };
        let text = mutated(&text, &edits);
        if let Err(found) = reader::read(&text, "mutated.toml") {
            sound(&text, &found)?;
        }
    }

    #[test]
    fn no_mutation_of_a_case_makes_the_reader_panic(edits in edits()) {
        let scenario = reader::read(&complete(), "complete.toml").expect("a sound scenario").scenario;
        let path = folder("cases").join("complete-sample-5.toml");
        let text = mutated(&fs::read_to_string(path).expect("a text"), &edits);
        if let Err(found) = reader::read_instance(&text, "mutated.toml", &scenario) {
            sound(&text, &found)?;
        }
    }
}
