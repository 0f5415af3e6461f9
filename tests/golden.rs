//! What a person sees stays the same, byte for byte: results built in code against files in `tests/golden/`.
//!
//! `STILLGATE_GOLDEN=rewrite cargo test golden` writes the files anew; look at the difference before it is kept.

mod cases;

use std::path::PathBuf;

use cases::*;
use stillgate::findings::{Asked, Shape};
use stillgate::instance::Which;
use stillgate::output::waves::{self, Picture};

/// Compares a text with its golden file, or writes the file.
fn golden(name: &str, text: &str) {
    let path = PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("tests/golden").join(name);
    if std::env::var("STILLGATE_GOLDEN").is_ok_and(|it| it == "rewrite") {
        std::fs::write(&path, text).unwrap();
        return;
    }
    let kept = std::fs::read_to_string(&path).unwrap_or_default();
    let first = kept.lines().zip(text.lines()).position(|(kept, new)| kept != new);
    assert!(
        kept == text,
        "{name} differs from its golden file, first in line {:?}\nkept: {:?}\nnew:  {:?}",
        first.map(|line| line + 1),
        first.and_then(|line| kept.lines().nth(line)),
        first.and_then(|line| text.lines().nth(line)),
    );
}

#[test]
fn waves_of_the_lock() {
    let scenario = lock();
    let asked = Asked::of(&scenario);
    let mut report = run(&scenario, Which::Typ);
    report.facts.push(glitch(net(&scenario, "open_upper"), Shape::Static0, 3, "640", "652"));
    let sheets = waves::sheets(&Picture::of_run(&scenario, &asked, &report, "waves"));
    assert_eq!(sheets.len(), 1);
    golden("lock.svg", &sheets[0].svg);
    golden("lock.csv", &waves::csv(&scenario, &report.trace));
}
