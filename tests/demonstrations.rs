//! The demonstrations show what their first comments say.

use stillgate::control::Control;
use stillgate::engine::Program;
use stillgate::findings::Kind;
use stillgate::output::text::{self, Page};
use stillgate::review::{self, Call};

/// What the first comment of each demonstration says it shows.
#[test]
fn every_demonstration_shows_what_it_says() {
    let table = [
        ("interlock", Call::Broken, Some(Kind::Glitch)),
        ("interlock-walk", Call::Broken, Some(Kind::Glitch)),
        ("selector", Call::Broken, Some(Kind::Glitch)),
        ("selector-cured", Call::NoFailureFound, None),
        ("divider", Call::NoFailureFound, None),
        ("horn", Call::NoFailureFound, Some(Kind::Oscillation)),
        ("handshake", Call::NoFailureFound, None),
        ("sequencer", Call::Broken, Some(Kind::Expect)),
        ("power-up", Call::NoFailureFound, Some(Kind::CriticalRace)),
        ("contactors", Call::Broken, Some(Kind::Never)),
        ("clock-switch", Call::Broken, Some(Kind::MinPulse)),
        ("pulse-train", Call::NoFailureFound, Some(Kind::Swallowed)),
        ("push-button", Call::Broken, Some(Kind::Edges)),
        ("handshake-partner", Call::NoFailureFound, None),
        ("clock-switch-safe", Call::NoFailureFound, Some(Kind::Swallowed)),
    ];
    let folder = std::path::Path::new(env!("CARGO_MANIFEST_DIR")).join("scenarios");
    assert_eq!(std::fs::read_dir(&folder).unwrap().count(), table.len(), "a demonstration without its row here");
    for (name, call, kind) in table {
        let text = std::fs::read_to_string(folder.join(format!("{name}.toml"))).unwrap();
        assert!(text.starts_with('#'), "{name} begins with a comment on what it shows");
        let mut scenario =
            stillgate::reader::read(&text, name).unwrap_or_else(|it| panic!("{}", it.render(false))).scenario;
        scenario.plan.samples = 300;
        let program = Program::new(&scenario, &Control::default()).unwrap();
        let review = review::review(&scenario, &program, 1, &Control::default()).unwrap();
        assert_eq!(review.verdict.call, call, "{name}: {:?}", review.verdict.reasons);
        let shows = |kind| {
            let mut all = review.sweep.findings.iter();
            all.any(|found| found.subject.kind == kind && found.breaks_rule == (call == Call::Broken))
        };
        assert!(kind.is_none_or(shows), "{name}: {:?}", review.sweep.findings);
        let page = text::review(&scenario, &review, &Page::default());
        assert!(page.lines().count() <= 60, "{name} takes more than a screen:\n{page}");
    }
}
