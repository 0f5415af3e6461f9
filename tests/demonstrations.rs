//! The demonstrations show what their first comments say.

use stillgate::control::Control;
use stillgate::engine::Program;
use stillgate::findings::{Asked, Kind};
use stillgate::flow::Contained;
use stillgate::instance::Which;
use stillgate::logic::{State, Value};
use stillgate::output::text::{self, Page};
use stillgate::review::{self, Call};

/// What the first comment of each demonstration says it shows.
#[test]
fn every_demonstration_shows_what_it_says() {
    let table = [
        ("interlock", Call::Broken, Some(Kind::Glitch)),
        ("interlock-walk", Call::Broken, Some(Kind::Glitch)),
        ("selector", Call::Broken, Some(Kind::Glitch)),
        ("selector-cured", Call::Proved, None),
        ("divider", Call::NoFailureFound, None),
        ("horn", Call::Proved, Some(Kind::Oscillation)),
        ("bell", Call::Broken, Some(Kind::Timing)),
        ("handshake", Call::Proved, None),
        ("sequencer", Call::Broken, Some(Kind::Expect)),
        ("permit", Call::Broken, Some(Kind::NotInReference)),
        ("stepper", Call::Broken, Some(Kind::Expect)),
        ("power-up", Call::NoFailureFound, Some(Kind::CriticalRace)),
        ("contactors", Call::Broken, Some(Kind::Never)),
        ("clock-switch", Call::Broken, Some(Kind::MinPulse)),
        ("pulse-train", Call::NoFailureFound, Some(Kind::Swallowed)),
        ("push-button", Call::Broken, Some(Kind::Edges)),
        ("handshake-partner", Call::Proved, None),
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
        assert!(page.lines().count() <= 70, "{name} takes more than a screen:\n{page}");
        let page = text::states(&scenario, &review.states, &Page::default());
        assert!(page.lines().count() <= 60, "{name} takes more than a screen:\n{page}");
        assert!(page.lines().all(|line| line.chars().count() <= 100), "{page}");
        assert!(!page.contains("glitch"), "a glitch is seen, a hazard is not: {page}");
    }
}

/// The share of draws, and a replay of the first, of the one thing that is wrong with the memory.
#[test]
fn the_permit_that_is_forgotten_is_found_by_the_reference_alone_and_replays() {
    let path = std::path::Path::new(env!("CARGO_MANIFEST_DIR")).join("scenarios/permit.toml");
    let mut scenario = stillgate::reader::load(&path).unwrap().scenario;
    scenario.plan.samples = 2000;
    let control = Control::default();
    let program = Program::new(&scenario, &control).unwrap();
    let review = review::review(&scenario, &program, 1, &control).unwrap();
    let broken: Vec<_> = review.sweep.findings.iter().filter(|it| it.breaks_rule).collect();
    let [finding] = broken[..] else { panic!("{broken:?}") };
    let share = finding.share.unwrap();
    assert!(finding.subject.kind == Kind::NotInReference && (0.02..0.08).contains(&share), "{finding:?}");
    let net = |name: &str| scenario.circuit.net(name).unwrap().index();
    let against = finding.against.as_ref().unwrap();
    let kept = |state: &State| state.get(net("kept"));
    let before = against.departure.before.as_ref().unwrap();
    assert_eq!((kept(before), kept(&against.departure.reached)), (Value::One, Value::Zero));
    assert_eq!((&against.allowed.values[..], against.allowed.open), (&[vec![true]][..], false));

    // each sample by itself: the first that shows it is the one named
    let asked = Asked::of(&scenario);
    let sample = finding.sample.unwrap();
    for number in 0..=sample {
        let run = review::run_one(&scenario, &program, &asked, Which::Sample(number), &control).unwrap();
        let fact = run.facts.iter().find(|fact| fact.subject == finding.subject);
        assert_eq!(fact.is_some(), number == sample, "sample {number}");
        assert_eq!(fact.and_then(|fact| run.against(fact)), (number == sample).then_some(against));
    }

    // without delays: the circuit rests nowhere else, and may get there wrongly on letting the key go
    let compared = review.states.flow.compared.as_ref().unwrap();
    assert_eq!(compared.states, Contained::Proved);
    assert!(!compared.beyond.is_empty() && compared.beyond.iter().all(|it| it.allowed == [[true]]), "{compared:?}");

    // the cure that its first comment names
    let text = std::fs::read_to_string(&path).unwrap();
    let cured =
        text.replace(r#"kept   = { or = ["taken", "held"]"#, r#"kept = { expr = "taken | held | permit & kept""#);
    assert_ne!(cured, text);
    let mut scenario = stillgate::reader::read(&cured, "cured").unwrap().scenario;
    scenario.plan.samples = 2000;
    let program = Program::new(&scenario, &control).unwrap();
    let review = review::review(&scenario, &program, 1, &control).unwrap();
    assert_eq!(review.verdict.call, Call::Proved, "{:?}", review.verdict.reasons);
    assert_eq!(review.states.flow.compared.unwrap().beyond, []);
}

/// The same as a user replays it.
#[test]
fn a_departure_from_the_reference_is_told_in_every_file() {
    let folder = tempfile::tempdir().unwrap();
    let scenario = std::path::Path::new(env!("CARGO_MANIFEST_DIR")).join("scenarios/permit.toml");
    let run = |arguments: &[&str]| {
        let mut command = std::process::Command::new(env!("CARGO_BIN_EXE_stillgate"));
        let output = command.current_dir(folder.path()).args(arguments).arg(&scenario).output().unwrap();
        assert!(output.status.success(), "{output:?}");
        String::from_utf8(output.stdout).unwrap()
    };
    let json = |text: &str| serde_json::from_str::<serde_json::Value>(text).unwrap();
    let sweep = json(&run(&["sweep", "--samples", "1000", "--json"]));
    let of = |list: &serde_json::Value| {
        let mut all = list.as_array().unwrap().iter();
        all.find(|it| it["kind"] == "not-in-reference").expect("it was found").clone()
    };
    let finding = of(&sweep["findings"]);
    assert_eq!((&finding["step"], &finding["rule"]), (&"key let go".into(), &true.into()));
    let reference = &finding["reference"];
    assert_eq!((&reference["before"]["kept"], &reference["before"]["key"]), (&1.into(), &1.into()));
    assert_eq!((&reference["reached"]["kept"], &reference["reached"]["permit"]), (&0.into(), &1.into()));
    assert_eq!(reference["allowed"], json(r#"[{"kept": 1}]"#));
    assert_eq!(reference["allowed_truncated"], false);
    let sample = format!("sample:{}", finding["sample"]);
    let replay = json(&run(&["run", "--delays", &sample, "--json"]));
    assert_eq!(of(&replay["facts"])["reference"], *reference);
    let text = run(&["run", "--delays", &sample]);
    let words = "from permit=1 key=1 kept=1 to kept=0; the reference allows kept=1";
    let one_line = text.split_whitespace().collect::<Vec<_>>().join(" ");
    assert!(one_line.contains(words), "{text}");
    let page = run(&["sweep", "--samples", "1000"]);
    assert!(page.contains(words), "{page}");
    let csv = std::fs::read_to_string(folder.path().join("stillgate-out/permit/findings.csv")).unwrap();
    assert!(
        csv.contains("reference: allowed") && csv.contains("permit=1 key=1 let_go=0 taken=1 held=0 kept=1"),
        "{csv}"
    );
}
