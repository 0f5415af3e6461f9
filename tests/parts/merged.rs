//! Any split, any order, written and read back in between: the same bytes.

use std::path::Path;

use proptest::prelude::*;
use proptest::test_runner::RngSeed;
use stillgate::sweep::Part;

use super::{COLD_AND_HOT, PADDLES, Read, done, files, folder_with, many_latches, permit, plan};

/// Written and read back.
fn there_and_back(part: &Part) -> Part {
    let bytes = part.to_bytes();
    let back = Part::from_bytes(&bytes).unwrap_or_else(|damage| panic!("{damage}"));
    assert!(&back == part, "a part comes back as it was");
    assert!(back.to_bytes() == bytes, "and gives the same bytes");
    back
}

/// The parts of a sweep between these cuts, which are rounded down to whole boards.
fn split(read: &Read, cuts: &[u64]) -> Vec<(String, Part)> {
    let plan = read.scenario.plan;
    let mut cuts: Vec<u64> = cuts.iter().map(|cut| cut % plan.samples / plan.tries * plan.tries).collect();
    cuts.extend([0, plan.samples]);
    cuts.sort_unstable();
    cuts.dedup();
    let parts =
        cuts.windows(2).map(|two| (format!("{}-{}", two[0], two[1]), there_and_back(&read.part(two[0], two[1]))));
    parts.collect()
}

/// Merges them two by two in this order, each written and read back.
fn tree(read: &Read, mut parts: Vec<(String, Part)>, order: &[usize]) -> Part {
    let mut order = order.iter().cycle();
    while parts.len() > 1 {
        let mut take = || {
            let at = order.next().unwrap_or(&0) % parts.len();
            parts.swap_remove(at)
        };
        let (a, b) = (take(), take());
        let mut both = stillgate::sweep::Parts::default();
        both.add(&a.0, a.1, &read.scenario, &read.asked);
        both.add(&b.0, b.1, &read.scenario, &read.asked);
        let both = both.finish(false).unwrap_or_else(|refusals| panic!("{refusals:?}"));
        parts.push((format!("{} {}", a.0, b.0), there_and_back(&both)));
    }
    parts.pop().unwrap().1
}

#[test]
fn any_split_and_order_and_tree_gives_the_same_bytes() {
    let cases = [
        Read::new(&format!("{PADDLES}{}", plan(400, 1))),
        Read::new(&format!("{PADDLES}{COLD_AND_HOT}{}", plan(250, 1))),
        Read::new(&format!("{PADDLES}{COLD_AND_HOT}{}", plan(251, 7))),
        Read::new(&format!("{PADDLES}{}draw = \"hypercube\"\n", plan(300, 3))),
        Read::new(&format!("{PADDLES}{}draw = \"corners\"\n", plan(200, 1))),
        Read::new(&permit(300)),
    ];
    let wholes: Vec<_> = cases.iter().map(|read| read.part(0, read.scenario.plan.samples)).collect();
    let said: Vec<_> = cases.iter().zip(&wholes).map(|(read, whole)| read.said(&whole.cases).unwrap()).collect();
    let found =
        |what: &str| said.iter().any(|files| files.iter().any(|it| String::from_utf8_lossy(&it.bytes).contains(what)));
    assert!(found("critical-race") && found("glitch") && found("not-in-reference"), "the scenarios show too little");

    let config = ProptestConfig {
        cases: 30,
        failure_persistence: None,
        rng_seed: RngSeed::Fixed(11),
        ..ProptestConfig::default()
    };
    proptest!(config, |(
        case in 0..cases.len(),
        cuts in proptest::collection::vec(0u64..1000, 0..6),
        order in proptest::collection::vec(0usize..100, 12),
    )| {
        let read = &cases[case];
        let parts = split(read, &cuts);
        let merged = tree(read, parts.clone(), &order);
        prop_assert!(merged.cases == wholes[case].cases, "case {case}: the tallies differ");
        prop_assert!(read.said(&merged.cases).unwrap() == said[case], "case {case}: a byte differs");

        let mut turned = parts;
        turned.sort_by_key(|(file, part)| (order[part.wanted.0 as usize % order.len()], file.clone()));
        let merged = read.merge(&turned).unwrap();
        prop_assert!(read.said(&merged.cases).unwrap() == said[case], "case {case}: a byte differs in another order");
    });
}

#[test]
fn what_is_too_much_to_keep_is_cut_the_same_way() {
    // more settling times and more outcomes than a sweep keeps
    let read = Read::new(&format!("{}{}", many_latches(), plan(6000, 1)));
    let whole = read.part(0, 6000);
    let report = stillgate::sweep::conclude(&read.scenario, &read.asked, &whole.cases.0[0].tally);
    assert!(report.windows[0].outcomes_truncated, "{} outcomes", report.windows[0].outcomes.len());
    assert!(report.windows.iter().any(|it| it.settling.as_ref().is_some_and(|it| it.resolution > 0.0)));
    let parts = split(&read, &[1000, 1100, 5000]);
    for order in [[0, 1, 2, 3], [3, 1, 0, 2], [2, 0, 3, 1]] {
        let merged = tree(&read, parts.clone(), &order);
        assert!(merged.cases == whole.cases, "all that a sweep says is made of these");
    }
}

#[test]
fn the_program_merges_to_the_bytes_of_one_sweep() {
    for (text, parts) in
        [(format!("{PADDLES}{COLD_AND_HOT}{}", plan(700, 1)), 4), (format!("{PADDLES}{}", plan(503, 10)), 3)]
    {
        let folder = folder_with(&text);
        let at = folder.path();
        let whole = done(at, &["sweep", "paddles.toml", "--seed", "5", "--out", "whole"]);
        for part in 1..=parts {
            let part = format!("{part}/{parts}");
            done(at, &["sweep", "paddles.toml", "--seed", "5", "--part", &part, "--out", "p", "--threads", "1"]);
        }
        let names: Vec<String> = files(&at.join("p")).into_keys().map(|name| format!("p/{name}")).collect();
        assert_eq!(names.len(), parts);
        let merge = |names: &[String], more: &[&str]| {
            let names = names.iter().map(String::as_str);
            let arguments: Vec<&str> = std::iter::once("merge").chain(names).chain(more.iter().copied()).collect();
            done(at, &arguments)
        };
        let forth = merge(&names, &["--out", "forth"]);
        let back: Vec<String> = names.iter().rev().cloned().collect();
        assert!(forth == whole && merge(&back, &["--out", "back"]) == whole, "{forth}\n{whole}");
        assert!(files(&at.join("forth")) == files(&at.join("whole")));
        assert!(files(&at.join("back")) == files(&at.join("whole")));
        let json = merge(&back, &["--json"]);
        assert_eq!(json.as_bytes(), files(&at.join("whole"))["sweep.json"]);
        // without --out the files go where those of the sweep would have gone
        assert!(files(&at.join("stillgate-out/paddles")) == files(&at.join("whole")));

        // in two steps, the second half first
        merge(&names[1..], &["--save", "later.stillgate-part"]);
        let two = merge(&["later.stillgate-part".into(), names[0].clone()], &["--out", "two"]);
        assert!(two == whole && files(&at.join("two")) == files(&at.join("whole")));
        // a part may be made on a machine that calls the file otherwise
        std::fs::create_dir(at.join("else")).unwrap();
        std::fs::copy(at.join("paddles.toml"), at.join("else/paddles.toml")).unwrap();
        let last = format!("{parts}/{parts}");
        done(at, &["sweep", "else/paddles.toml", "--seed", "5", "--part", &last, "--out", "q"]);
        let mut mixed: Vec<String> = files(&at.join("q")).into_keys().map(|name| format!("q/{name}")).collect();
        let again = mixed[0].clone();
        mixed.extend(names.iter().filter(|name| !again.ends_with(&name[2..])).cloned());
        assert_eq!(mixed.len(), parts);
        assert!(merge(&mixed, &["--out", "mixed"]) == whole);
    }
}

#[test]
fn gaps_are_accepted_only_where_asked_for_and_never_silently() {
    let folder = folder_with(&format!("{PADDLES}{COLD_AND_HOT}{}", plan(300, 1)));
    let at = folder.path();
    for (from, count) in [("0", "100"), ("150", "50")] {
        done(at, &["sweep", "paddles.toml", "--samples-from", from, "--count", count, "--out", "p"]);
    }
    let parts = ["p/part-150-199.stillgate-part", "p/part-0-99.stillgate-part"];
    let text = done(at, &[&["merge", parts[0], parts[1]][..], &["--allow-gaps", "--out", "gaps"]].concat());
    assert!(text.contains("Only 150 of 300 draws were run"), "{text}");
    assert!(text.contains("samples 100 to 149 and 200 to 299 (150 samples)"), "{text}");
    let json: serde_json::Value = serde_json::from_slice(&files(&at.join("gaps"))["sweep.json"]).unwrap();
    assert_eq!(json["missing"], serde_json::json!([[100, 149], [200, 299]]));
    assert_eq!(json["conditions"][0]["sweep"]["missing"], json["missing"]);
    assert_eq!((&json["samples"], &json["samples_asked"]), (&150.into(), &300.into()));
    assert!(!Path::new(&at.join("stillgate-out")).exists());
}
