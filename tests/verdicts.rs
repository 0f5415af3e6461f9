//! The verdict is honest: what was not judged is never counted as passed.

use stillgate::control::Control;
use stillgate::engine::Program;
use stillgate::findings::{Kind, Reason, RuleKey};
use stillgate::output::text::{self, Page};
use stillgate::review::{self, Call, Review};
use stillgate::scenario::Scenario;

struct Seen {
    scenario: Scenario,
    review: Review,
}

impl Seen {
    fn call(&self) -> Call {
        self.review.verdict.call
    }

    fn reasons(&self) -> String {
        self.review.verdict.reasons.join("\n")
    }

    fn has(&self, kind: Kind, breaks_rule: bool) -> bool {
        self.review.sweep.findings.iter().any(|f| f.subject.kind == kind && f.breaks_rule == breaks_rule)
    }

    fn not_judged(&self, reason: Reason) -> u64 {
        let all = self.review.sweep.rules.iter().flat_map(|rule| &rule.not_judged);
        all.filter(|(found, _)| *found == reason).map(|(_, count)| count).sum()
    }
}

fn review_of(text: &str) -> Seen {
    let loaded = stillgate::reader::read(text, "case.toml").unwrap_or_else(|faults| panic!("{}", faults.render(false)));
    let mut scenario = loaded.scenario;
    scenario.plan.samples = scenario.plan.samples.min(300);
    let program = Program::new(&scenario, &Control::default()).unwrap();
    let review = review::review(&scenario, &program, 1, &Control::default()).unwrap();
    let seen = Seen { scenario, review };
    let page = text::review(&seen.scenario, &seen.review, &Page::default());
    for word in ["proved", "holds", "passed"] {
        assert!(!page.contains(word), "a sweep never says {word}: {page}");
    }
    seen
}

/// A buffer, quicker or slower than its steps.
fn buffer(extra: &str) -> String {
    format!("[inputs]\na = 0\n[gates]\nq = {{ buf = [\"a\"], delay = [8, 12] }}\n{extra}")
}

#[test]
fn nothing_wrong_says_how_many_draws_and_which_steps() {
    let seen = review_of(&buffer("[[steps]]\nat = 10\nset = { a = 1 }\nexpect = { q = 1 }\n"));
    assert_eq!(seen.call(), Call::NoFailureFound, "{}", seen.reasons());
    let sentence = &seen.review.verdict.sentence;
    assert!(sentence.contains("no failure found in 300 draws") && sentence.contains("the 1 step"), "{sentence}");
}

#[test]
fn a_runt_across_two_windows_is_found_by_min_pulse() {
    // q rises in the first window and falls in the second: neither window glitches
    let seen = review_of(
        "[inputs]\na = 0\nb = 1\n[gates]\nq = { and = [\"a\", \"b\"], rise = 20, fall = 5 }\n\
         [[steps]]\nat = 100\nset = { a = 1 }\n[[steps]]\nat = 120\nset = { b = 0 }\n\
         [rules]\nmin_pulse = { q = { high = 10 } }\nglitch_free = []\n",
    );
    // the event at 120 is one batch with the step: q rises at 120, falls at 125
    assert_eq!(seen.call(), Call::Broken);
    assert!(seen.has(Kind::MinPulse, true));
    assert!(!seen.has(Kind::Glitch, true) && !seen.has(Kind::Glitch, false));
    let finding = seen.review.sweep.findings.iter().find(|f| f.subject.kind == Kind::MinPulse).unwrap();
    assert_eq!(finding.subject.moment, Some(1), "it belongs to the step of the pulse's end");
}

#[test]
fn a_slow_sample_cut_by_the_next_step_is_not_judged_and_makes_figures_at_least() {
    let steps = "[[steps]]\nat = 100\nset = { a = 1 }\nexpect = { q = 1 }\n[[steps]]\nafter = 10\nset = { a = 0 }\nexpect = { q = 0 }\n";
    let seen = review_of(&buffer(steps));
    assert_eq!(seen.call(), Call::Undecided, "{}", seen.reasons());
    assert!(seen.not_judged(Reason::Cut) > 50 && seen.not_judged(Reason::BeganBeforeRest) > 50);
    let window = &seen.review.sweep.windows[0];
    let settling = window.settling.as_ref().unwrap();
    assert!(window.cut > 50 && window.settled > 50 && settling.max_at_least, "{settling:?}");
    assert!(seen.reasons().contains("cut"), "{}", seen.reasons());
    let page = text::review(&seen.scenario, &seen.review, &Page::default());
    assert!(page.contains("≥"), "{page}");
    // accepted by name, where it was judged in other draws
    let seen = review_of(&buffer(&format!("{steps}[rules]\nnot_judged = \"allowed\"\n")));
    assert_eq!(seen.call(), Call::NoFailureFound, "{}", seen.reasons());
}

#[test]
fn accepting_the_unjudged_does_not_cover_a_rule_that_never_was_judged() {
    let seen = review_of(&buffer(
        "[[steps]]\nat = 100\nset = { a = 1 }\nexpect = { q = 1 }\n[[steps]]\nafter = 3\nset = { a = 0 }\n\
         [rules]\nnot_judged = \"allowed\"\n",
    ));
    assert_eq!(seen.call(), Call::Undecided, "{}", seen.reasons());
    assert!(seen.reasons().contains("expect"), "{}", seen.reasons());
}

#[test]
fn a_rule_that_was_never_put_to_the_test_makes_it_undecided() {
    let step = "[[steps]]\nat = 10\nset = { a = 1 }\n";
    for (rule, word) in [
        ("[rules]\nmin_pulse = { q = { high = 5 } }\n", "min_pulse"),
        ("[[rules.timing]]\nname = \"fall\"\nfrom = \"a fall\"\nto = \"q fall\"\nmax = 20\n", "timing"),
    ] {
        let seen = review_of(&buffer(&format!("{step}{rule}")));
        assert_eq!(seen.call(), Call::Undecided, "{rule}");
        assert!(
            seen.reasons().contains(word) && seen.reasons().contains("never put to the test"),
            "{}",
            seen.reasons()
        );
    }
    // no step touches the net
    let seen = review_of(
        "[inputs]\na = 0\nb = 0\n[gates]\nq = { buf = [\"a\"] }\nz = { buf = [\"b\"] }\n\
         [[steps]]\nat = 10\nset = { a = 1 }\n[rules]\nglitch_free = [\"q\", \"z\"]\n",
    );
    assert_eq!(seen.call(), Call::Undecided);
    assert!(seen.reasons().contains("glitch_free z"), "{}", seen.reasons());
    // and no step at all
    assert_eq!(review_of(&buffer("")).call(), Call::Undecided);
}

#[test]
fn a_swallowed_pulse_at_a_latch_is_listed_and_named_in_the_sentence() {
    let latch = "outputs = [\"q\"]\n[inputs]\ns = 1\nr = 1\n[initial]\nq = 0\n\
         [gates]\nq = { nand = [\"s\", \"qn\"], delay = [8, 12] }\nqn = { nand = [\"r\", \"q\"], delay = 10 }\n\
         [[steps]]\nat = 10\nset = { s = 0 }\n[[steps]]\nafter = 5\nset = { s = 1 }\n\
         [rules]\ncritical_race = \"allowed\"\noscillation = \"allowed\"\nglitch_free = []\n";
    let seen = review_of(latch);
    assert!(seen.has(Kind::Swallowed, false));
    let sentence = &seen.review.verdict.sentence;
    assert!(sentence.contains("runts at loop nets q") && sentence.contains("metastable"), "{sentence}");
    let strict = review_of(&format!("{latch}swallowed = \"forbidden\"\n"));
    assert!(strict.has(Kind::Swallowed, true));
    assert_eq!(strict.call(), Call::Broken);
}

#[test]
fn a_race_breaks_unless_each_outcome_fits_an_alternative_of_its_own() {
    let race = |expect: &str| {
        format!(
            "[inputs]\ns = 0\nr = 0\n[gates]\nq = {{ nand = [\"s\", \"qn\"], delay = [5, 9] }}\n\
             qn = {{ nand = [\"r\", \"q\"], delay = [5.5, 9] }}\n\
             [[steps]]\nat = 10\nset = {{ s = 1, r = 1 }}\n{expect}[rules]\nglitch_free = []\n"
        )
    };
    assert_eq!(review_of(&race("")).call(), Call::Broken);
    let both = "expect = [{ q = 1, qn = 0 }, { q = 0, qn = 1 }]\n";
    let seen = review_of(&race(both));
    assert_eq!(seen.call(), Call::NoFailureFound, "{}", seen.reasons());
    assert!(seen.has(Kind::CriticalRace, false));
    // two outcomes that fit one alternative
    assert_eq!(review_of(&race("expect = [{ s = 1 }]\n")).call(), Call::Broken);
    // one of them is not expected, and marked
    let seen = review_of(&race("expect = { q = 1 }\n"));
    assert_eq!(seen.call(), Call::Broken);
    let marks: Vec<bool> = seen.review.sweep.windows[0].outcomes.iter().map(|outcome| outcome.breaks_rule).collect();
    assert_eq!(marks.iter().filter(|mark| **mark).count(), 1, "{marks:?}");
}

#[test]
fn what_is_not_analysed_yet_is_never_silence() {
    let step = "[[steps]]\nat = 10\nset = { a = 1 }\nexpect = { q = 1 }\n";
    for (text, undecided) in [
        (buffer(step).replace("[8, 12]", "[8, 12], filter = { reject = 2 }"), true),
        (buffer(step).replace("[8, 12]", "[8, 12], filter = { involution = { tau = 3 } }"), true),
        (buffer(&format!("{step}[[steps]]\nwhen = {{ q = 1 }}\nset = {{ a = 0 }}\nexpect = {{ q = 0 }}\n")), true),
        (buffer(&step.replace("set =", "bounce = { lasting = [1, 5], pulses = [0, 6] }\nset =")), true),
        (buffer(&format!("{step}[reference.gates]\nq = {{ buf = [\"a\"] }}\n")), true),
        (buffer(&format!("{step}[[groups]]\ngates = [\"q\"]\ntracking = 0.9\n")), true),
        (buffer(&format!("{step}[conditions.cold]\nscale = 0.8\n")), true),
        (buffer(&format!("{step}[plot]\nnets = [\"q\"]\n")), false),
    ] {
        let seen = review_of(&text);
        let said = [seen.scenario.not_analysed.clone(), seen.scenario.notes.clone()].concat().join("\n");
        assert!(said.contains("not analysed yet"), "{text}\n{said}");
        let page = text::review(&seen.scenario, &seen.review, &Page::default());
        assert!(page.contains("not analysed yet"), "{page}");
        let wanted = if undecided { Call::Undecided } else { Call::NoFailureFound };
        assert_eq!(seen.call(), wanted, "{text}\n{}", seen.reasons());
    }
}

#[test]
fn x_at_rest_and_limits_make_it_undecided_and_are_named() {
    let latch = "outputs = [\"q\"]\nbegin = \"unknown\"\n[inputs]\ns = 1\nr = 1\n\
         [gates]\nq = { nand = [\"s\", \"qn\"] }\nqn = { nand = [\"r\", \"q\"] }\n[rules]\nglitch_free = []\n";
    let seen = review_of(latch);
    assert_eq!(seen.call(), Call::Undecided);
    assert!(seen.has(Kind::Unresolved, false) && seen.reasons().contains('X'), "{}", seen.reasons());

    // 4 transitions are not enough for a ring
    let ring = "[inputs]\nen = 0\n[gates]\na = { nand = [\"en\", \"c\"] }\nb = { not = [\"a\"] }\nc = { not = [\"b\"] }\n\
         [[steps]]\nat = 10\nset = { en = 1 }\n[rules]\noscillation = \"required\"\nnot_judged = \"allowed\"\nglitch_free = []\n\
         [limits]\ntransitions = 4\n";
    let seen = review_of(ring);
    assert_eq!(seen.call(), Call::Undecided, "{}", seen.reasons());
    assert!(seen.reasons().contains("limits.transitions"), "{}", seen.reasons());
    let seen = review_of(&ring.replace("transitions = 4", "transitions = 1000"));
    assert_eq!(seen.call(), Call::NoFailureFound, "{}", seen.reasons());
}

#[test]
fn oscillation_is_forbidden_unless_it_is_allowed_or_wanted() {
    let ring = |rule: &str| {
        format!(
            "outputs = [\"c\"]\n[inputs]\nen = 0\n[gates]\na = {{ nand = [\"en\", \"c\"] }}\nb = {{ not = [\"a\"] }}\n\
             c = {{ not = [\"b\"] }}\n[[steps]]\nat = 10\nset = {{ en = 1 }}\n[rules]\n{rule}"
        )
    };
    assert_eq!(review_of(&ring("")).call(), Call::Broken);
    assert_eq!(review_of(&ring("oscillation = \"required\"\n")).call(), Call::NoFailureFound);
    let quiet = buffer("[[steps]]\nat = 10\nset = { a = 1 }\n[rules]\noscillation = \"required\"\n");
    let seen = review_of(&quiet);
    assert_eq!(seen.call(), Call::Broken);
    assert!(seen.has(Kind::Oscillation, true));
}

#[test]
fn accepting_the_unjudged_does_not_cover_what_is_not_analysed_yet() {
    // nothing is asked of a window, and one rule of the whole run
    let file = |gate: &str, step: &str, more: &str| {
        review_of(&format!(
            "[inputs]\na = 0\nb = 0\n[gates]\nq = {{ buf = [\"a\"], delay = [5, 6] {gate} }}\n\
             [[steps]]\nat = 100\nset = {{ a = 1 }}\n[[steps]]\nset = {{ b = 1 }}\n{step}\n\
             [rules]\ncritical_race = \"allowed\"\noscillation = \"allowed\"\nglitch_free = []\n\
             not_judged = \"allowed\"\n[[rules.never]]\nstate = {{ a = 0, b = 1 }}\n{more}"
        ))
    };
    assert_eq!(file("", "after = 50", "").call(), Call::NoFailureFound);
    for seen in [
        file("", "when = { q = 1 }\nwait = 5", ""),
        file("", "after = 50\nbounce = { lasting = [1, 5], pulses = [0, 6] }", ""),
        file(", filter = { reject = 2 }", "after = 50", ""),
        file("", "after = 50", "[reference.gates]\nq = { buf = [\"a\"] }\n"),
    ] {
        assert_eq!(seen.call(), Call::Undecided, "{}", seen.reasons());
        assert!(seen.reasons().contains("not analysed yet"), "{}", seen.reasons());
    }
    // what is broken without it is broken
    let broken = "[reference.gates]\nq = { buf = [\"a\"] }\n[[rules.never]]\nstate = { a = 0 }\n";
    assert_eq!(file("", "after = 50", broken).call(), Call::Broken);
}

#[test]
fn a_bound_that_is_over_before_the_next_step_is_broken_in_windows_that_are_cut_too() {
    let file = |bound: u32| {
        buffer(&format!(
            "[[steps]]\nat = 100\nset = {{ a = 1 }}\n[[steps]]\nafter = 10\nset = {{ a = 0 }}\n\
             [rules]\nsettle_within = {bound}\n"
        ))
    };
    let seen = review_of(&file(20));
    assert_eq!(seen.call(), Call::Undecided, "{}", seen.reasons());
    let seen = review_of(&file(7));
    assert_eq!(seen.call(), Call::Broken, "{}", seen.reasons());
    // a sample that the next step cuts has not moved yet: it is not judged, and the others are broken
    let rule = seen.review.sweep.rules.iter().find(|rule| rule.question.rule == RuleKey::SettleWithin).unwrap();
    let window = &seen.review.sweep.windows[0];
    assert_eq!((rule.broken, rule.judged), (window.settled, window.settled));
    assert_eq!(rule.not_judged, [(Reason::Cut, window.cut)]);
}

#[test]
fn swallowed_pulses_break_a_rule_where_it_is_asked() {
    let latch = |at: &str| {
        review_of(&format!(
            "[inputs]\ns = 1\nr = 1\n[initial]\nq = 0\n[gates]\nq = {{ nand = [\"s\", \"qn\"], delay = 10 }}\n\
             qn = {{ nand = [\"r\", \"q\"], delay = 10 }}\n[[steps]]\nat = 10\nset = {{ s = 0 }}\n\
             [[steps]]\nafter = 5\nset = {{ s = 1 }}\n[rules]\nswallowed = {at}\n"
        ))
    };
    assert_eq!(latch("[\"q\"]").call(), Call::Broken);
    assert_ne!(latch("[\"qn\"]").call(), Call::Broken);
}

#[test]
fn outcomes_that_break_a_rule_are_marked() {
    let race = |more: &str| {
        review_of(&format!(
            "[inputs]\ns = 0\nr = 0\n[gates]\nq = {{ nand = [\"s\", \"qn\"], delay = [5, 9] }}\n\
             qn = {{ nand = [\"r\", \"q\"], delay = [5, 9] }}\n\
             [[steps]]\nat = 10\nset = {{ s = 1, r = 1 }}\n{more}"
        ))
    };
    let marks = |seen: &Seen| {
        let q = seen.scenario.circuit.net("q").unwrap().index();
        let mut marks: Vec<(bool, bool)> = Vec::new();
        for outcome in &seen.review.sweep.windows[0].outcomes {
            marks.push((outcome.state.ones.get(q), outcome.breaks_rule));
        }
        marks.sort_unstable();
        marks
    };
    assert_eq!(marks(&race("")), [(false, true), (true, true)], "a race that is forbidden blames both");
    let shared = race("expect = { s = 1 }\n");
    assert_eq!(marks(&shared), [(false, true), (true, true)], "both share the one alternative");
    let own = race("expect = [{ q = 1, qn = 0 }, { q = 0, qn = 1 }]\n");
    assert_eq!(marks(&own), [(false, false), (true, false)]);
    assert_eq!(marks(&race("expect = { q = 1 }\n")), [(false, true), (true, false)], "one has its own");
    let allowed = "[rules]\ncritical_race = \"allowed\"\n";
    assert_eq!(marks(&race(allowed)), [(false, false), (true, false)]);
    let rest = race(&format!("{allowed}[[rules.never_at_rest]]\nname = \"q rests high\"\nstate = {{ q = 1 }}\n"));
    assert_eq!(marks(&rest), [(false, false), (true, true)]);
    assert!(rest.reasons().contains("q rests high"), "{}", rest.reasons());
}

#[test]
fn a_limit_of_time_and_draws_of_corners_are_named() {
    let ring = "[inputs]\nen = 0\n[gates]\na = { nand = [\"en\", \"c\"], delay = 5 }\nb = { not = [\"a\"], delay = 5 }\n\
         c = { not = [\"b\"], delay = 5 }\n[[steps]]\nat = 10\nset = { en = 1 }\n\
         [rules]\noscillation = \"allowed\"\nglitch_free = []\n[limits]\ntime = 100\n";
    let seen = review_of(ring);
    assert_eq!(seen.call(), Call::Undecided, "{}", seen.reasons());
    assert!(seen.reasons().contains("limits.time"), "{}", seen.reasons());
    let corners = buffer("[[steps]]\nat = 10\nset = { a = 1 }\n[sweep]\nsamples = 64\ndraw = \"corners\"\n");
    let seen = review_of(&corners);
    let sentence = &seen.review.verdict.sentence;
    assert!(sentence.contains("64 draws of corners"), "{sentence}");
}

/// Two gates of exactly equal typical delays oscillate in the typical run alone: no draw has such a tie.
#[test]
fn what_only_the_typical_run_breaks_is_told_and_makes_it_undecided() {
    let seen = review_of(
        "[inputs]\ns = 0\nr = 0\n[gates]\nq = { nand = [\"s\", \"qn\"], delay = [5, 9] }\n\
         qn = { nand = [\"r\", \"q\"], delay = [5, 9] }\n\
         [[steps]]\nat = 10\nset = { s = 1, r = 1 }\nexpect = [{ q = 1, qn = 0 }, { q = 0, qn = 1 }]\n\
         [rules]\nglitch_free = []\n",
    );
    assert_eq!(seen.call(), Call::Undecided, "{}", seen.reasons());
    assert!(seen.reasons().contains("typical delays") && seen.reasons().contains("oscillation"), "{}", seen.reasons());
    assert!(seen.review.sweep.findings.iter().all(|finding| !finding.breaks_rule));
}
