//! What the proof says of every demonstration, as the table in `docs/proof.md`. `STILLGATE_GOLDEN=rewrite` rewrites it.

use std::collections::BTreeMap;
use std::path::Path;

use stillgate::control::Control;
use stillgate::engine::Program;
use stillgate::findings::Asked;
use stillgate::proof::{Call, Spend, prove};

use crate::bounded::read;

const BEGIN: &str = "<!-- what prove says of the demonstrations -->\n";
const END: &str = "<!-- end -->\n";

/// `expect 3, never 1`
fn by_rule(rules: &BTreeMap<&'static str, u64>) -> String {
    rules.iter().map(|(rule, count)| format!("{rule} {count}")).collect::<Vec<_>>().join(", ")
}

fn row(name: &str, text: &str) -> String {
    let scenario = read(text);
    let control = Control::default();
    let program = Program::new(&scenario, &control).unwrap();
    let asked = Asked::of(&scenario);
    let proof = prove(&scenario, &program, &asked, &Spend::in_all(20_000), &control);
    let mut cells = vec![name.to_string()];
    for call in [Call::Proved, Call::Refuted, Call::Undecided, Call::NotCovered] {
        let claims: Vec<_> = proof.claims.iter().filter(|claim| claim.call == call).collect();
        let mut rules = BTreeMap::new();
        let mut reasons: BTreeMap<&str, u64> = BTreeMap::new();
        for claim in &claims {
            *rules.entry(asked.questions[claim.question as usize].rule.word()).or_insert(0) += 1;
            // what is refuted has a run that shows it
            assert_eq!(call == Call::Refuted, claim.witness.is_some(), "{name}");
            if let Some(reason) = &claim.reason {
                *reasons.entry(reason).or_insert(0) += 1;
            }
        }
        let mut cell = by_rule(&rules);
        if !reasons.is_empty() {
            cell += &format!(" ({})", reasons.keys().copied().collect::<Vec<_>>().join("; "));
        }
        cells.push(cell);
    }
    format!("| {} |\n", cells.join(" | "))
}

#[test]
fn the_table_in_the_docs_is_what_prove_says() {
    let root = Path::new(env!("CARGO_MANIFEST_DIR"));
    let mut files: Vec<_> = std::fs::read_dir(root.join("scenarios")).unwrap().map(|it| it.unwrap().path()).collect();
    files.retain(|path| path.extension().is_some_and(|it| it == "toml"));
    files.sort();
    let mut table =
        String::from("| demonstration | proved | refuted | undecided | not covered |\n|---|---|---|---|---|\n");
    for path in files {
        let name = path.file_stem().unwrap().to_string_lossy();
        table += &row(&name, &std::fs::read_to_string(&path).unwrap());
    }
    let docs = root.join("docs/proof.md");
    let text = std::fs::read_to_string(&docs).unwrap();
    let (head, rest) = text.split_once(BEGIN).expect("the table has its place");
    let (written, tail) = rest.split_once(END).expect("the table has an end");
    if std::env::var("STILLGATE_GOLDEN").is_ok_and(|it| it == "rewrite") {
        std::fs::write(&docs, format!("{head}{BEGIN}{table}{END}{tail}")).unwrap();
    } else {
        assert_eq!(written, table, "STILLGATE_GOLDEN=rewrite rewrites it");
    }
}
