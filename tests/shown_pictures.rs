//! The pictures that the documents show are those that the program draws today.
//!
//! `STILLGATE_GOLDEN=rewrite cargo test --test promises shown_pictures` draws them anew; look at them before they are kept.

use std::collections::BTreeMap;
use std::fmt::Write;
use std::path::{Path, PathBuf};

use stillgate::control::Control;
use stillgate::engine::Program;
use stillgate::output::bundle;
use stillgate::output::text::Page;
use stillgate::review;

/// Draws of each demonstration: bands and failing cases come of them.
const SAMPLES: u64 = 300;

fn project(part: &str) -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join(part)
}

/// What the comment at the top of a scenario says, as one line.
fn says(text: &str) -> String {
    let comment = text.lines().take_while(|line| line.starts_with('#'));
    comment.map(|line| line.trim_start_matches('#').trim()).collect::<Vec<_>>().join(" ")
}

/// The pictures of one demonstration by their names in the documents, each with what it shows.
fn pictures(name: &str, text: &str) -> Vec<(String, String, String)> {
    let mut scenario = stillgate::reader::read(text, name).unwrap_or_else(|it| panic!("{}", it.render(false))).scenario;
    scenario.plan.samples = SAMPLES;
    let program = Program::new(&scenario, &Control::default()).unwrap();
    let review = review::review(&scenario, &program, 1, &Control::default()).unwrap();
    let bundle = bundle::of_review(&scenario, &review, &Page::default());
    let file = |name: &str| {
        let file = bundle.files.iter().find(|file| file.name == name)?;
        Some(String::from_utf8(file.bytes.clone()).unwrap())
    };
    let mut found = Vec::new();
    let mut add = |kind: &str, what: &str, svg: Option<String>| {
        found.extend(svg.map(|svg| (format!("{name}-{kind}.svg"), what.to_string(), svg)));
    };
    add("waves", "Typical delays, with the bands of 300 draws", file("waves-typical.svg"));
    // files of findings come worst first
    if review.sweep.findings.first().is_some_and(|finding| finding.breaks_rule) {
        let mut all = bundle.files.iter().filter(|file| file.name.starts_with("waves-") && file.name.ends_with(".svg"));
        let worst = all.find(|file| !file.name.starts_with("waves-typical"));
        add("finding", "The failing case of the worst finding", worst.and_then(|it| file(&it.name)));
    }
    add("map", "The flow map", file("states.svg"));
    found
}

#[test]
fn what_the_documents_show_is_drawn_today() {
    let rewrite = std::env::var("STILLGATE_GOLDEN").is_ok_and(|it| it == "rewrite");
    let mut names: Vec<String> = std::fs::read_dir(project("scenarios"))
        .unwrap()
        .filter_map(|it| it.unwrap().path().file_stem().map(|stem| stem.to_string_lossy().into_owned()))
        .collect();
    names.sort();
    let mut wanted = BTreeMap::new();
    let mut page = String::from(
        "# Pictures of the demonstrations\n\nEach scenario in `scenarios/`, as `stillgate review SCENARIO --samples 300` draws it. \
         Made by a test, which fails when one of them is no longer what the program draws.\n",
    );
    for name in &names {
        let text = std::fs::read_to_string(project("scenarios").join(format!("{name}.toml"))).unwrap();
        let _ = write!(page, "\n## {name}\n\n{}\n", says(&text));
        for (file, what, svg) in pictures(name, &text) {
            let _ = write!(page, "\n{what}:\n\n![{name}: {what}](pictures/{file})\n");
            wanted.insert(format!("pictures/{file}"), svg);
        }
    }
    assert!(wanted.len() > 2 * names.len(), "{}", wanted.len());
    wanted.insert("pictures.md".into(), page);

    let folder = project("docs/pictures");
    if rewrite {
        let _ = std::fs::remove_dir_all(&folder);
        std::fs::create_dir_all(&folder).unwrap();
        for (file, text) in &wanted {
            std::fs::write(project("docs").join(file), text).unwrap();
        }
        return;
    }
    for (file, text) in &wanted {
        let kept = std::fs::read_to_string(project("docs").join(file)).unwrap_or_default();
        assert!(kept == *text, "docs/{file} is stale: draw it anew with STILLGATE_GOLDEN=rewrite and look at it");
    }
    for entry in std::fs::read_dir(folder).unwrap() {
        let file = format!("pictures/{}", entry.unwrap().file_name().to_string_lossy());
        assert!(wanted.contains_key(&file), "docs/{file} is shown nowhere");
    }
    // other documents show pictures of that folder, or those that measured figures are drawn in
    for document in ["README.md", "docs/performance.md", "docs/limit.md", "docs/flow-map.md"] {
        let text = std::fs::read_to_string(project(document)).unwrap();
        for picture in
            text.split("](").skip(1).filter_map(|rest| rest.split(')').next()).filter(|it| it.ends_with(".svg"))
        {
            let file = picture.trim_start_matches("docs/");
            assert!(wanted.contains_key(file) || file.starts_with("growth-"), "{document} shows {picture}");
        }
    }
}
