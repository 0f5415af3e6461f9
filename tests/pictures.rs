//! Pictures of waves show what the user chose: nets and time from `[plot]` or the command line, one run or two.

#![allow(clippy::unwrap_used)]

use std::path::Path;
use std::process::{Command, Output};

const LATCH: &str = r#"
title = "Paddle memory"
[inputs]
let_go = 0
draw = 0
[initial]
drawn = 0
[gates]
drawn = { nor = ["let_go", "held"], delay = [6, 14] }
held = { nor = ["draw", "drawn"], delay = [5, 12] }
lamp = { buf = ["drawn"], delay = [2, 3] }
[[steps]]
label = "draw"
at = 100
set = { draw = 1 }
[[steps]]
label = "release"
rest = 50
set = { draw = 0 }
[[steps]]
label = "let go"
rest = 50
set = { let_go = 1 }
"#;

fn stillgate(folder: &Path, arguments: &[&str]) -> Output {
    Command::new(env!("CARGO_BIN_EXE_stillgate")).current_dir(folder).args(arguments).output().unwrap()
}

fn done(folder: &Path, arguments: &[&str]) {
    let output = stillgate(folder, arguments);
    assert!(output.status.success(), "{arguments:?}: {}", String::from_utf8_lossy(&output.stderr));
}

fn folder(text: &str) -> tempfile::TempDir {
    let folder = tempfile::tempdir().unwrap();
    std::fs::write(folder.path().join("latch.toml"), text).unwrap();
    folder
}

fn picture(folder: &tempfile::TempDir, name: &str) -> String {
    std::fs::read_to_string(folder.path().join("out").join(name)).unwrap()
}

/// The names of the lanes, from top to bottom.
fn lanes(svg: &str) -> Vec<String> {
    let each = svg.split("-net-").skip(1).map(|lane| {
        let title = lane.split("<title>").nth(1).unwrap();
        title.split(':').next().unwrap().to_string()
    });
    each.collect()
}

#[test]
fn the_file_chooses_nets_and_time_and_the_command_line_has_the_last_word() {
    let plot = "[plot]\nnets = [\"lamp\", \"draw\", \"drawn\"]\nfrom = 90\nto = 150\n";
    let folder = folder(&format!("{LATCH}{plot}"));
    done(folder.path(), &["run", "latch.toml", "--out", "out", "-q"]);
    let svg = picture(&folder, "waves-typical.svg");
    assert_eq!(lanes(&svg), ["lamp", "draw", "drawn"]);
    assert!(svg.contains("A part of the run: from 90 to 150 of "), "{svg}");
    // the table has all nets and all time
    let table = picture(&folder, "waves-typical.csv");
    assert!(table.starts_with("time [ns],let_go,draw,drawn,held,lamp\n0,"), "{table}");

    done(folder.path(), &["run", "latch.toml", "--out", "out", "-q", "--nets", "held,let_go"]);
    assert_eq!(lanes(&picture(&folder, "waves-typical.svg")), ["held", "let_go"]);

    done(folder.path(), &["review", "latch.toml", "--out", "out", "-q", "--samples", "50"]);
    assert_eq!(lanes(&picture(&folder, "waves-typical.svg")), ["lamp", "draw", "drawn"]);
    let check = stillgate(folder.path(), &["check", "latch.toml"]);
    assert!(!String::from_utf8_lossy(&check.stdout).contains("not analysed"), "it is analysed now");
}

#[test]
fn a_span_beyond_the_run_says_so() {
    let folder = folder(&format!("{LATCH}[plot]\nfrom = \"2 us\"\n"));
    done(folder.path(), &["run", "latch.toml", "--out", "out", "-q"]);
    assert!(picture(&folder, "waves-typical.svg").contains("The run ends before this span of time"));
}

#[test]
fn two_runs_in_one_picture() {
    let folder = folder(LATCH);
    done(folder.path(), &["run", "latch.toml", "--out", "out", "-q", "--delays", "sample:3", "--against", "typ"]);
    let svg = picture(&folder, "waves-sample-3-against-typical.svg");
    assert!(svg.contains("Paddle memory: sample 3 (solid), typical delays (dashed)</title>"), "{svg}");
    let alone = picture(&folder, "waves-sample-3.svg");
    assert!(!alone.contains("dashed)"), "{alone}");
    // a case from a file against a perturbed one
    done(folder.path(), &["run", "latch.toml", "--out", "out", "-q", "--delays", "max"]);
    let arguments = ["run", "latch.toml", "--out", "out", "-q", "--delays", "out/case-max.toml", "--against", "typ~2"];
    done(folder.path(), &arguments);
    let svg = picture(&folder, "waves-given-case-against-typical-perturbation-2.svg");
    assert!(svg.contains("(solid), typical delays, perturbation 2 (dashed)</title>"), "{svg}");

    let bad = stillgate(folder.path(), &["run", "latch.toml", "--against", "nothing.toml"]);
    assert_eq!(bad.status.code(), Some(2));
    assert!(String::from_utf8_lossy(&bad.stderr).contains("`--against nothing.toml`"), "{bad:?}");
}

/// Where the lines of a lane go up or down: of the run in front, and of what lies behind it.
fn edges(svg: &str, net: &str) -> (Vec<String>, Vec<String>) {
    let lane = svg.split("-net-").find(|lane| lane.contains(&format!("<title>{net}:"))).unwrap();
    let (mut front, mut behind) = (Vec::new(), Vec::new());
    for path in lane.split("</g>").next().unwrap().split("<path d=\"").skip(1) {
        let (data, rest) = path.split_once('"').unwrap();
        let into = if rest.split("/>").next().unwrap().contains("#8a93a0") { &mut behind } else { &mut front };
        let mut x = "";
        let starts: Vec<usize> = data.match_indices(['M', 'H', 'V']).map(|it| it.0).chain([data.len()]).collect();
        for piece in starts.windows(2).map(|it| &data[it[0]..it[1]]) {
            match piece.split_at(1) {
                ("M", to) => x = to.split(' ').next().unwrap(),
                ("H", to) => x = to,
                _ => into.push(x.to_string()),
            }
        }
    }
    (front, behind)
}

/// Steps that come at rest come at other times in another run; what is laid on the run in front begins at its steps.
#[test]
fn each_step_is_laid_on_that_of_the_run_in_front() {
    let folder = folder(LATCH);
    let run = |case: &str| {
        done(folder.path(), &["run", "latch.toml", "--out", "out", "-q", "--delays", case, "--against", "typ"]);
    };
    run("typ");
    let svg = picture(&folder, "waves-typical-against-typical.svg");
    for (net, changes) in [("let_go", 1), ("draw", 2), ("drawn", 2), ("held", 2), ("lamp", 2)] {
        let (front, behind) = edges(&svg, net);
        assert_eq!((front.len(), &behind), (changes, &front), "{net} of a run against itself");
    }
    run("max");
    let svg = picture(&folder, "waves-max-against-typical.svg");
    for net in ["let_go", "draw"] {
        let (front, behind) = edges(&svg, net);
        assert_eq!(front, behind, "{net} changes at its steps, whenever they come");
    }
    let (front, behind) = edges(&svg, "lamp");
    assert!(
        front.len() == 2
            && front.iter().zip(&behind).all(|(a, b)| a.parse::<f64>().unwrap() > b.parse::<f64>().unwrap()),
        "{svg}"
    );
}
