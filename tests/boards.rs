//! With several tries a board, a result tells whether a failure lies in the parts or in the moment.

use stillgate::control::Control;
use stillgate::engine::Program;
use stillgate::findings::{Asked, Kind};
use stillgate::output::text::{self, Page};
use stillgate::sweep::{Boards, Cause, clopper_pearson};
use stillgate::{reader, review};

/// The two contactors of the demonstration, but the winch is turned round: stop, then down `after` the stop.
fn turned_round(change: &[(&str, &str)], after: &str, min: &str, sweep: &str) -> (Boards, u64, u64, String) {
    let demonstration = include_str!("../scenarios/contactors.toml");
    let steps = demonstration.find("[[steps]]").expect("steps");
    let mut text = demonstration[..steps].to_string();
    for (old, new) in change {
        assert!(text.contains(old), "{old}");
        text = text.replace(old, new);
    }
    text += &format!(
        r#"
[[steps]]
at = 50
set = {{ button_up = 1 }}
[[steps]]
label = "stop"
after = 200
set = {{ stop = 1, button_up = 0 }}
[[steps]]
label = "down"
after = {after}
set = {{ stop = 0, button_down = 1 }}
[[rules.timing]]
name = "dead time up to down"
from = "main_up fall"
to = "main_down rise"
min = {min}
[sweep]
{sweep}
"#
    );
    let scenario = reader::read(&text, "winch.toml").unwrap_or_else(|faults| panic!("{faults}")).scenario;
    let program = Program::new(&scenario, &Control::default()).unwrap();
    let asked = Asked::of(&scenario);
    let report = review::sweep(&scenario, &program, &asked, 1, &Control::default()).unwrap();
    let found = report.findings.iter().find(|it| it.breaks_rule && it.subject.kind == Kind::Timing).expect("broken");
    let verdict = review::verdict(&scenario, &report);
    let said = text::sweep(&scenario, &asked, &report, &verdict, &Page::default());
    assert_eq!(found.interval, None, "samples of one board are not independent");
    (found.boards.expect("tries"), found.count, found.of, said)
}

/// Dead time = fall of the auxiliary contact + coil + rise − fall of the main contacts: of the board alone.
#[test]
fn a_dead_time_that_few_boards_break_always() {
    let (boards, count, of, said) = turned_round(&[], "20", "22", "samples = 4000\ntries = 10");
    assert_eq!((boards.of, of), (400, 4000));
    assert_eq!(count, 10 * boards.failing, "a board that fails, fails in every try");
    assert!((1..120).contains(&boards.failing), "{boards:?}");
    assert_eq!((boards.mean_share, boards.worst_share, boards.cause()), (1.0, 1.0, Cause::Parts));
    assert_eq!(boards.interval, clopper_pearson(boards.failing, 400, 0.95));
    assert!(said.contains("it lies in their parts"), "{said}");
}

/// With quick auxiliary contacts and contactors all alike, dead time is the hand's: 1 to 100 ms, and 5 are needed.
#[test]
fn a_dead_time_that_all_boards_break_rarely() {
    let alike = [
        ("rise = [8, 12, 20], fall = [5, 9, 16]", "rise = [8, 8.5, 9], fall = [0.5, 0.6, 0.7]"),
        ("rise = [12, 18, 28], fall = [4, 8, 14]", "rise = [12, 12.2, 12.4], fall = [10, 10.2, 10.4]"),
    ];
    let (boards, count, _, said) = turned_round(&alike, "[1, 100]", "5", "samples = 6000\ntries = 300");
    assert_eq!((boards.of, boards.cause()), (20, Cause::Moment), "{boards:?}");
    assert_eq!(boards.failing, 20, "every board, sooner or later");
    assert!((boards.mean_share - count as f64 / 6000.0).abs() < 1e-12 && boards.mean_share < 0.1, "{boards:?}");
    assert!(boards.worst_share < 0.2 && boards.worst_share > boards.mean_share, "{boards:?}");
    assert!(said.contains("it lies in the moment of the step"), "{said}");
}

#[test]
fn a_hypercube_has_boards_but_no_interval() {
    let sweep = "samples = 4000\ntries = 10\ndraw = \"hypercube\"";
    let (boards, ..) = turned_round(&[], "20", "22", sweep);
    assert_eq!((boards.of, boards.interval, boards.cause()), (400, None, Cause::Parts));
}
