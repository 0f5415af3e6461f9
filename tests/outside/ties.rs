//! A latch of two NORs, both inputs released from 1 at the same instant: for ever if the gates are equally fast, a race if
//! they are not. Figures computed by hand from the two models of a gate; that the end state is open:
//! <https://curioustab.com/sr-nor-latch-both-inputs-high-invalid-condition-79886>.

use stillgate::control::Control;
use stillgate::engine::Program;
use stillgate::findings::Kind;
use stillgate::reader;
use stillgate::review::{self, Call, Review};
use stillgate::sweep::{Finding, Tie};

fn released(filter: &str, rules: &str) -> Review {
    let text = format!(
        r#"
        [inputs]
        s = 1
        r = 1
        [gates]
        q = {{ nor = ["r", "qb"], delay = 1, filter = "{filter}" }}
        qb = {{ nor = ["s", "q"], delay = 1, filter = "{filter}" }}
        [[steps]]
        label = "release"
        at = 10
        set = {{ s = 0, r = 0 }}
        [rules]
        {rules}
        [sweep]
        samples = 20
        "#
    );
    let scenario = reader::read(&text, "latch.toml").unwrap_or_else(|faults| panic!("{faults}")).scenario;
    let program = Program::new(&scenario, &Control::default()).unwrap();
    review::review(&scenario, &program, 1, &Control::default()).unwrap_or_else(|error| panic!("{error}"))
}

fn find(review: &Review, kind: Kind) -> Option<&Finding> {
    review.sweep.findings.iter().find(|finding| finding.subject.kind == kind)
}

/// Inertial gates: any difference at all lets the latch fall to one side. So the oscillation is an accident of equality,
/// and the race behind it shows only without it.
#[test]
fn the_oscillation_of_equally_fast_inertial_gates_is_a_tie() {
    let review = released("inertial", "");
    let endless = find(&review, Kind::Oscillation).unwrap();
    assert_eq!((endless.count, endless.of, endless.sample), (20, 20, Some(0)));
    assert_eq!((endless.tie, endless.breaks_rule, &endless.case), (Some(Tie::Vanishes), true, &None));
    let race = find(&review, Kind::CriticalRace).expect("both sides are reached");
    assert_eq!((race.tie, race.breaks_rule, race.count, race.sample), (Some(Tie::Appears), true, 0, None));
    assert!(race.case.is_some());
    assert_eq!(review.verdict.call, Call::Broken);
    let words = review.verdict.reasons.join("\n");
    assert!(
        words.contains("oscillation after \"release\" in 20 of 20 draws (only with exactly equal times)"),
        "{words}"
    );
    assert!(words.contains("critical-race after \"release\" in no draw, only when times are moved"), "{words}");

    // a tie of what is allowed is told all the same
    let allowed = released("inertial", "oscillation = \"allowed\"\ncritical_race = \"allowed\"\nglitch_free = []");
    assert_eq!(allowed.verdict.call, Call::NoFailureFound, "{:?}", allowed.verdict);
    assert_eq!(
        find(&allowed, Kind::Oscillation).map(|it| (it.tie, it.breaks_rule)),
        Some((Some(Tie::Vanishes), false))
    );
}

/// Gates that pass every pulse: inputs less than one gate delay apart leave it oscillating for ever, so single
/// femtoseconds change nothing.
#[test]
fn the_oscillation_of_pure_delays_is_none() {
    let review = released("transport", "");
    let endless = find(&review, Kind::Oscillation).unwrap();
    assert_eq!((endless.count, endless.tie), (20, None), "{endless:?}");
    assert!(find(&review, Kind::CriticalRace).is_none());
}
