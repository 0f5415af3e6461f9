//! Texts fit the terminal, from 60 columns on, and say the same however wide it is.

use std::collections::BTreeMap;
use std::path::Path;

use stillgate::control::Control;
use stillgate::engine::Program;
use stillgate::findings::Asked;
use stillgate::instance::Which;
use stillgate::output::text::{self, Page};
use stillgate::review;

/// Letters and digits of a text, counted; without titles of columns that go below their rows, since one that is empty has no
/// title there.
fn letters(text: &str) -> BTreeMap<char, usize> {
    let text = text.replace("99th perc.", "").replace("median", "");
    let mut counts = BTreeMap::new();
    text.chars().filter(|c| c.is_alphanumeric()).for_each(|c| *counts.entry(c).or_default() += 1);
    counts
}

#[test]
fn every_text_of_every_demonstration_fits_and_loses_nothing() {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("scenarios");
    let (mut texts, mut commands, mut elsewhere) = (0, 0, 0);
    let mut wrong = String::new();
    for entry in std::fs::read_dir(folder).unwrap() {
        let path = entry.unwrap().path();
        let name = format!("scenarios/{}", path.file_name().unwrap().to_string_lossy());
        let mut scenario = stillgate::reader::load(&path).unwrap().scenario;
        scenario.plan.samples = 60;
        scenario.plan.search = 0;
        let control = Control::default();
        let program = Program::new(&scenario, &control).unwrap();
        let asked = Asked::of(&scenario);
        let review = review::review(&scenario, &program, 1, &control).unwrap();
        let run = review::run_one(&scenario, &program, &asked, Which::Typ, &control).unwrap();
        let proof = review.proof.as_ref().expect("a proof within its budget");
        let files = proof.witness_files();
        let verdict = review::verdict(&scenario, &review.sweep);
        let all = |width: usize| {
            let page = Page { width, scenario: Some(&name), folder: "stillgate-out/block", ..Page::default() };
            [
                ("check", text::check(&scenario, &page)),
                ("states", text::states(&scenario, &review.states, &page)),
                ("run", text::run(&scenario, &asked, &run, &page)),
                ("sweep", text::sweep(&scenario, &asked, &review.sweep, &verdict, &page)),
                ("review", text::review(&scenario, &review, &page)),
                ("prove", text::prove(&scenario, &asked, proof, &files, &page)),
            ]
        };
        let wide = all(100);
        for width in [60, 80, 100] {
            for ((command, text), (_, widest)) in all(width).iter().zip(&wide) {
                texts += 1;
                for line in text.lines().filter(|line| line.chars().count() > width) {
                    // a command stays whole, to be copied
                    if line.trim_start().starts_with("stillgate ") {
                        commands += 1;
                    } else {
                        wrong += &format!("{name} {command} at {width}: {line}\n");
                    }
                }
                // a flow table that is wider than the page is in a file, and the text says so
                const ELSEWHERE: &str = "states.svg draws them";
                let flat = |text: &str| text.split_whitespace().collect::<Vec<_>>().join(" ");
                if flat(text).contains(ELSEWHERE) && !flat(widest).contains(ELSEWHERE) {
                    elsewhere += 1;
                    continue;
                }
                let (narrow, wide) = (letters(text), letters(widest));
                let lost: Vec<_> = wide.iter().filter(|(c, n)| narrow.get(c).unwrap_or(&0) < n).collect();
                if !lost.is_empty() || (text.contains('…') && !widest.contains('…')) {
                    wrong += &format!("{name} {command} at {width} loses {lost:?}:\n{text}\n---\n{widest}\n");
                }
            }
        }
    }
    assert!(wrong.is_empty(), "{wrong}");
    assert!(elsewhere < texts / 10, "{elsewhere} tables are elsewhere");
    assert!(texts >= 18 * 6 * 3, "{texts}");
    assert!((1..500).contains(&commands), "{commands} commands are longer than a line");
}
