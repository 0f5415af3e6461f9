//! What a verdict may say, a promise each, on short scenarios.

use stillgate::circuit::NetId;
use stillgate::control::Control;
use stillgate::engine::Program;
use stillgate::findings::{Kind, Reason, RuleKey};
use stillgate::logic::Value;
use stillgate::output::text;
use stillgate::reader;
use stillgate::review::{Call, Review, review_proving};
use stillgate::scenario::Scenario;
use stillgate::sweep::{Finding, RuleReport, WindowReport};

/// A scenario, reviewed.
struct Reviewed {
    scenario: Scenario,
    review: Review,
}

impl Reviewed {
    fn of(text: &str) -> Reviewed {
        let scenario = reader::read(text, "test.toml").unwrap_or_else(|faults| panic!("{faults}\n{text}")).scenario;
        let program = Program::new(&scenario, &Control::default()).expect("a state to begin in");
        // what the views without a proof may say
        let review =
            review_proving(&scenario, &program, 0, 1, &Control::default()).unwrap_or_else(|error| panic!("{error}"));
        let reviewed = Reviewed { scenario, review };
        reviewed.claims_no_proof();
        reviewed
    }

    /// No text of a sweep claims more than a sweep can show.
    fn claims_no_proof(&self) {
        let page = text::Page::default();
        let texts = [
            self.review.verdict.sentence.clone(),
            self.review.verdict.reasons.join("\n"),
            text::review(&self.scenario, &self.review, &page),
            text::sweep(&self.scenario, &self.review.asked, &self.review.sweep, &self.review.verdict, &page),
        ];
        for text in texts {
            let text = text.replace("so nothing is proved.", "");
            for word in text.split(|c: char| !c.is_alphanumeric()) {
                let word = word.to_lowercase();
                assert!(
                    !["proved", "proven", "proves", "holds", "passed", "passes"].contains(&word.as_str()),
                    "{text}"
                );
            }
        }
    }

    fn call(&self) -> Call {
        self.review.verdict.call
    }

    /// Everything that the verdict says.
    fn words(&self) -> String {
        format!("{}\n{}", self.review.verdict.sentence, self.review.verdict.reasons.join("\n"))
    }

    fn is(&self, call: Call, words: &[&str]) -> &Reviewed {
        assert_eq!(self.call(), call, "{}", self.words());
        assert!(self.review.verdict.sentence.starts_with(call.words()), "{}", self.words());
        for part in words {
            assert!(self.words().contains(part), "no \"{part}\" in: {}", self.words());
        }
        self
    }

    fn net(&self, name: &str) -> NetId {
        self.scenario.circuit.net(name).unwrap()
    }

    fn find(&self, kind: Kind) -> Option<&Finding> {
        self.review.sweep.findings.iter().find(|finding| finding.subject.kind == kind)
    }

    fn window(&self, label: &str) -> &WindowReport {
        let moment = self.scenario.stimulus.moments.iter().position(|moment| moment.label == label).unwrap();
        &self.review.sweep.windows[moment]
    }

    fn rule(&self, rule: RuleKey, label: &str) -> &RuleReport {
        let moment = self.scenario.stimulus.moments.iter().position(|moment| moment.label == label);
        let mut rules = self.review.sweep.rules.iter();
        rules.find(|it| it.question.rule == rule && it.question.moment == moment.map(|it| it as u32)).unwrap()
    }

    fn why_not(&self, rule: RuleKey, label: &str, reason: Reason) -> u64 {
        self.rule(rule, label).not_judged.iter().find(|it| it.0 == reason).map_or(0, |it| it.1)
    }
}

/// A buffer with a delay range, two steps the given time apart; what follows are rules.
fn buffer(delay: &str, apart: &str, rules: &str) -> String {
    format!(
        r#"
        [inputs]
        a = 0
        [gates]
        out = {{ buf = ["a"], delay = {delay} }}
        [[steps]]
        label = "up"
        at = 100
        set = {{ a = 1 }}
        [[steps]]
        label = "down"
        after = {apart}
        set = {{ a = 0 }}
        [rules]
        {rules}
        [sweep]
        samples = 200
        "#
    )
}

#[test]
fn a_runt_across_two_windows_is_found_by_min_pulse() {
    // each window holds one transition of `out`: no glitch in either, and yet a pulse of 8 between them
    let runt = Reviewed::of(
        r#"
        [inputs]
        a = 0
        b = 1
        [gates]
        out = { and = ["a", "b"], delay = 5 }
        [[steps]]
        label = "a comes"
        at = 100
        set = { a = 1 }
        [[steps]]
        label = "b goes"
        after = 8
        set = { b = 0 }
        [rules]
        min_pulse = { out = { high = 10 } }
        [sweep]
        samples = 20
        "#,
    );
    runt.is(Call::Broken, &["min-pulse", "out", "b goes", "20 of 20 draws"]);
    assert!(runt.find(Kind::Glitch).is_none());
    assert_eq!(runt.rule(RuleKey::GlitchFree, "a comes").judged, 20);
    assert_eq!(runt.rule(RuleKey::GlitchFree, "b goes").broken, 0);
    let finding = runt.find(Kind::MinPulse).unwrap();
    assert_eq!((finding.subject.net, finding.count, finding.of), (Some(runt.net("out")), 20, 20));
    let margin = runt.review.sweep.rules.iter().find(|it| it.question.rule == RuleKey::MinPulse).unwrap().margin;
    assert_eq!(margin, Some(-2_000_000), "8 ns of 10");
}

#[test]
fn a_slow_sample_that_the_next_step_cuts_is_not_judged_and_counts_as_at_least() {
    let cut = Reviewed::of(&buffer("[5, 15]", "10", "settle_within = 20"));
    cut.is(Call::Undecided, &["not judged", "cut"]);
    let up = cut.window("up");
    assert!(up.cut > 50 && up.settled > 50, "{up:?}");
    assert_eq!(cut.why_not(RuleKey::SettleWithin, "up", Reason::Cut), up.cut);
    assert_eq!(cut.rule(RuleKey::SettleWithin, "up").judged, up.settled);
    assert_eq!(cut.why_not(RuleKey::SettleWithin, "down", Reason::BeganBeforeRest), up.cut);
    let settling = up.settling.as_ref().unwrap();
    assert!(settling.max_at_least && settling.p99_at_least, "{settling:?}");
    // samples in time for the next step and over the bound are broken; those that it cuts have not moved yet
    let broken = Reviewed::of(&buffer("[5, 15]", "10", "settle_within = 4"));
    broken.is(Call::Broken, &["settle-within"]);
    let (rule, window) = (broken.rule(RuleKey::SettleWithin, "up"), broken.window("up"));
    assert_eq!((rule.broken, rule.judged), (window.settled, window.settled));
    assert_eq!(broken.why_not(RuleKey::SettleWithin, "up", Reason::Cut), window.cut);
    // with time enough nothing is left open
    let patient = Reviewed::of(&buffer("[5, 15]", "20", "settle_within = 20"));
    patient.is(Call::NoFailureFound, &[]);
    let settling = patient.window("up").settling.as_ref().unwrap();
    assert!(!settling.max_at_least && !settling.p99_at_least && !settling.median_at_least);
}

/// A latch of two NORs and a short pulse at its set input.
fn short_pulse(rules: &str) -> Reviewed {
    Reviewed::of(&format!(
        r#"
        [inputs]
        s = 0
        r = 0
        [initial]
        q = 0
        [gates]
        q = {{ nor = ["r", "qn"], delay = [9, 11] }}
        qn = {{ nor = ["s", "q"], delay = [9, 11] }}
        [[steps]]
        label = "pulse begins"
        at = 100
        set = {{ s = 1 }}
        [[steps]]
        label = "pulse ends"
        after = 6
        set = {{ s = 0 }}
        [rules]
        {rules}
        [sweep]
        samples = 50
        "#
    ))
}

#[test]
fn a_pulse_swallowed_at_a_latch_is_listed_and_named_in_the_sentence() {
    let latch = short_pulse("");
    let finding = latch.find(Kind::Swallowed).expect("a swallowed pulse");
    assert_eq!(finding.subject.net, Some(latch.net("qn")));
    assert!(!finding.breaks_rule && finding.count == 50, "{finding:?}");
    let sentence = &latch.review.verdict.sentence;
    assert!(sentence.contains("qn") && sentence.contains("runt") && sentence.contains("metastable"), "{sentence}");
    short_pulse("swallowed = \"forbidden\"").is(Call::Broken, &["swallowed", "qn", "50 of 50 draws"]);
    short_pulse("swallowed = [\"qn\"]").is(Call::Broken, &["swallowed", "qn"]);
    assert_ne!(short_pulse("swallowed = [\"q\"]").call(), Call::Broken);
}

#[test]
fn a_rule_that_was_never_put_to_the_test_makes_the_verdict_undecided() {
    let timing = "[[rules.timing]]\nname = \"hold\"\nfrom = \"a rise\"\nto = \"b rise\"\nmin = 5";
    let never = |rules: &str| {
        Reviewed::of(&format!(
            r#"
            [inputs]
            a = 0
            b = 0
            [gates]
            out = {{ buf = ["a"], delay = 5 }}
            other = {{ buf = ["b"], delay = 5 }}
            [[steps]]
            at = 100
            set = {{ a = 1 }}
            {rules}
            [sweep]
            samples = 20
            "#
        ))
    };
    never("").is(Call::NoFailureFound, &[]);
    never(timing).is(Call::Undecided, &["hold"]);
    never("[rules]\nmin_pulse = { other = { high = 5 } }").is(Call::Undecided, &["min_pulse", "other"]);
    never("[rules]\nglitch_free = [\"other\"]").is(Call::Undecided, &["glitch_free", "other"]);
    // what may stay open must have been judged somewhere
    never(&format!("[rules]\nnot_judged = \"allowed\"\n{timing}")).is(Call::Undecided, &["hold"]);
}

#[test]
fn what_was_not_judged_is_accepted_only_where_something_was() {
    let allowed = "settle_within = 20\nnot_judged = \"allowed\"";
    Reviewed::of(&buffer("[5, 15]", "10", allowed)).is(Call::NoFailureFound, &["in 200 draws"]);
    // every draw is cut by the next step
    Reviewed::of(&buffer("[11, 15]", "10", allowed)).is(Call::Undecided, &["not judged", "cut"]);
}

#[test]
fn what_is_not_analysed_yet_is_never_called_better_than_undecided() {
    let file = |gate: &str, step: &str, more: &str| {
        Reviewed::of(&format!(
            r#"
            [inputs]
            a = 0
            b = 0
            [gates]
            out = {{ buf = ["a"], delay = [5, 6] {gate} }}
            [[steps]]
            label = "first"
            at = 100
            set = {{ a = 1 }}
            [[steps]]
            label = "second"
            set = {{ b = 1 }}
            {step}
            [rules]
            # nothing is asked of a window, and accepting the unjudged accepts no ignorance
            not_judged = "allowed"
            critical_race = "allowed"
            oscillation = "allowed"
            glitch_free = []
            [[rules.never]]
            state = {{ a = 0, b = 1 }}
            {more}
            "#
        ))
    };
    file("", "after = 50", "").is(Call::NoFailureFound, &[]);
    let case = file("", "after = 50", "[parts]\nx = 1");
    case.is(Call::Undecided, &["not analysed yet"]);
    let text = text::sweep(
        &case.scenario,
        &case.review.asked,
        &case.review.sweep,
        &case.review.verdict,
        &text::Page::default(),
    );
    assert!(text.contains("not analysed yet"), "{text}");
    file("", "after = 50", "[sweep]\nvary = \"per-event\"").is(Call::NoFailureFound, &[]);
    // steps that wait for a partner and contacts that bounce are analysed
    let analysed = "when = { out = 1 }\nwait = 5\nbounce = { lasting = [1, 5], pulses = [0, 6] }";
    file("", analysed, "").is(Call::NoFailureFound, &[]);
    let never = file("", "when = { a = 0 }\nwait = 5", "");
    never.is(Call::Broken, &["never-came a=0 after \"second\""]);
    let (rule, samples) = (never.rule(RuleKey::When, "second"), never.review.sweep.samples);
    assert_eq!((rule.judged, rule.broken), (samples, samples));
    assert_eq!(never.why_not(RuleKey::Never, "", Reason::NotReached), samples);
    // but what is broken without it is broken
    let broken = "[[rules.never]]\nstate = { a = 0 }\n[parts]\nx = 1";
    file("", "after = 50", broken).is(Call::Broken, &["never"]);
}

#[test]
fn a_state_that_the_reference_does_not_allow_breaks_it() {
    let file = |wanted: &str, rules: &str| {
        Reviewed::of(&format!(
            r#"
            [inputs]
            a = 0
            [gates]
            out = {{ buf = ["a"], delay = [5, 15] }}
            [[steps]]
            label = "first"
            at = 100
            set = {{ a = 1 }}
            [[steps]]
            label = "second"
            {rules}
            set = {{ a = 0 }}
            [sweep]
            samples = 200
            [reference]
            [reference.gates]
            out = {{ {wanted} }}
            "#
        ))
    };
    file("buf = [\"a\"]", "").is(Call::NoFailureFound, &["in 200 draws"]);
    // it should hold what it was given
    let held = file("expr = \"a | out\"", "");
    held.is(
        Call::Broken,
        &["not-in-reference", "\"second\"", "rests at out=0, the reference allows out=1", "in 200 of 200"],
    );
    let [first, second] = &held.review.sweep.windows[..] else { panic!("two steps") };
    assert!(!first.outcomes[0].breaks_rule && second.outcomes[0].breaks_rule);
    // a step that comes too early leaves a window that is not judged, and one whose state before is not known:
    // out = 0 is a stable state of the reference, and that is all that can be asked
    let early = file("expr = \"a | out\"", "after = 4");
    early.is(Call::Undecided, &["reference", "cut"]);
    let rule = |case: &Reviewed, moment: u32| {
        let mut rules = case.review.sweep.rules.iter();
        let found = rules.find(|it| it.question.rule == RuleKey::Reference && it.question.moment == Some(moment));
        let found = found.expect("a question for each step");
        (found.judged, found.broken, found.not_judged.clone())
    };
    let (judged, broken, not_judged) = rule(&early, 0);
    assert_eq!((broken, not_judged), (0, vec![(Reason::Cut, 200 - judged)]));
    assert_eq!(rule(&early, 1), (200, 0, vec![]));
    // an impossible state before: nothing may follow
    let never = file("expr = \"!a\"", "");
    never.is(Call::Broken, &["\"first\" (the first rests at out=1, the reference allows nothing from there)"]);
}

#[test]
fn a_race_of_which_the_reference_allows_one_end() {
    let latch = |wanted: &str| {
        Reviewed::of(&format!(
            r#"
            outputs = ["q"]
            [inputs]
            r = 1
            s = 1
            [gates]
            q = {{ nor = ["r", "qn"], delay = [5, 9] }}
            qn = {{ nor = ["s", "q"], delay = [4, 7] }}
            [[steps]]
            label = "both let go"
            at = 100
            set = {{ r = 0, s = 0 }}
            [rules]
            critical_race = "allowed"
            [sweep]
            samples = 200
            [reference]
            [reference.gates]
            {wanted}
            "#
        ))
    };
    let either = "q = { nor = [\"r\", \"other\"] }\nother = { nor = [\"s\", \"q\"] }";
    latch(either).is(Call::NoFailureFound, &[]);
    // resetting wins
    let reset = latch("q = { expr = \"!r & (s | q)\" }");
    reset.is(Call::Broken, &["not-in-reference", "rests at q=1, the reference allows q=0"]);
    let window = &reset.review.sweep.windows[0];
    assert_eq!(window.outcomes.len(), 2);
    for outcome in &window.outcomes {
        let q = reset.scenario.circuit.net("q").unwrap();
        assert_eq!(outcome.breaks_rule, outcome.state.get(q.index()) == Value::One, "{outcome:?}");
    }
    let finding = &reset.review.sweep.findings[0];
    assert_eq!(finding.subject.kind, Kind::NotInReference);
    assert_eq!(finding.count, window.outcomes.iter().filter(|it| it.breaks_rule).map(|it| it.count).sum::<u64>());
}

#[test]
fn a_reference_that_is_too_much_to_follow_leaves_the_verdict_undecided() {
    // 14 gates of one ring that all want to rise together
    let ring: String = (0..14).map(|at| format!("g{at} = {{ nor = [\"stop\", \"g{}\"] }}\n", (at + 1) % 14)).collect();
    let file = |gates: &str| {
        Reviewed::of(&format!(
            r#"
            outputs = ["g0", "g1"]
            [inputs]
            stop = 1
            [gates]
            {gates}
            [[steps]]
            set = {{ stop = 0 }}
            [rules]
            critical_race = "allowed"
            oscillation = "allowed"
            [sweep]
            samples = 200
            [reference]
            [reference.gates]
            {ring}
            "#
        ))
    };
    let pair =
        file("g0 = { nor = [\"stop\", \"g1\"], delay = [4, 9] }\ng1 = { nor = [\"stop\", \"g0\"], delay = [4, 9] }");
    pair.is(Call::Undecided, &["reference not judged: budget ran out in up to 200 draws"]);
    // but where the reference has no such stable state it is broken all the same
    file("g0 = { not = [\"stop\"] }\ng1 = { not = [\"stop\"] }")
        .is(Call::Broken, &["rests at g0=1 g1=1, the reference allows g0=0 g1=1 or g0=1 g1=0"]);
}

#[test]
fn after_power_up_the_reference_says_where_it_may_rest() {
    let file = |wanted: &str| {
        Reviewed::of(&format!(
            r#"
            begin = "random"
            outputs = ["q"]
            [inputs]
            r = 0
            s = 0
            [gates]
            q = {{ nor = ["r", "qn"], delay = [5, 9] }}
            qn = {{ nor = ["s", "q"], delay = [4, 7] }}
            [rules]
            critical_race = "allowed"
            [sweep]
            samples = 200
            [reference]
            [reference.gates]
            q = {{ {wanted} }}
            "#
        ))
    };
    // a random start is no state of rest to come from: either bit will do
    file("expr = \"!r & (s | q)\"").is(Call::NoFailureFound, &[]);
    file("expr = \"s & !r\"").is(Call::Broken, &["\"power-up\" (the first rests at q=1, the reference allows q=0)"]);
}

#[test]
fn an_x_at_rest_makes_the_verdict_undecided() {
    let latch = |more: &str| {
        Reviewed::of(&format!(
            r#"
            begin = "unknown"
            [inputs]
            s = 0
            r = 0
            [gates]
            q = {{ nor = ["r", "qn"], delay = 5 }}
            qn = {{ nor = ["s", "q"], delay = 5 }}
            [rules]
            critical_race = "allowed"
            oscillation = "allowed"
            glitch_free = []
            not_judged = "allowed"
            [[steps]]
            label = "reset"
            at = 100
            set = {{ r = 1 }}
            expect = {{ q = 0, qn = 1 }}
            {more}
            [sweep]
            samples = 10
            "#
        ))
    };
    let unresolved = latch("");
    unresolved.is(Call::Undecided, &["X", "power-up"]);
    let finding = unresolved.find(Kind::Unresolved).unwrap();
    assert_eq!((finding.subject.moment, finding.count, finding.breaks_rule), (Some(0), 10, false));
    // after the reset nothing is unknown: only power-up is
    assert_eq!(unresolved.window("reset").outcomes.len(), 1);
    assert!(!unresolved.window("reset").outcomes[0].state.has_unknown());
    assert_eq!(unresolved.rule(RuleKey::Expect, "reset").judged, 10);
}

/// A ring of one NAND and two inverters that a step starts.
fn ring(limits: &str, rules: &str) -> Reviewed {
    Reviewed::of(&format!(
        r#"
        [inputs]
        go = 0
        [gates]
        a = {{ nand = ["go", "c"], delay = [5, 6] }}
        b = {{ not = ["a"], delay = [5, 6] }}
        c = {{ not = ["b"], delay = [5, 6] }}
        [[steps]]
        label = "go"
        at = 100
        set = {{ go = 1 }}
        [limits]
        {limits}
        [rules]
        glitch_free = []
        {rules}
        [sweep]
        samples = 20
        "#
    ))
}

#[test]
fn a_limit_makes_the_verdict_undecided_and_is_named() {
    let few = ring("transitions = 40", "not_judged = \"allowed\"\noscillation = \"allowed\"");
    few.is(Call::Undecided, &["go", "limits.transitions", "20 draws"]);
    assert_eq!(few.window("go").unsettled, 20);
    let finding = few.find(Kind::Unsettled).unwrap();
    assert!(!finding.breaks_rule && finding.count == 20, "{finding:?}");
    ring("time = 150", "oscillation = \"allowed\"").is(Call::Undecided, &["limits.time"]);
    ring("", "oscillation = \"allowed\"").is(Call::NoFailureFound, &[]);
}

#[test]
fn oscillation_is_a_fault_or_the_purpose_as_the_file_says() {
    ring("", "").is(Call::Broken, &["oscillation", "go"]);
    ring("", "oscillation = \"required\"").is(Call::NoFailureFound, &[]);
    Reviewed::of(&buffer("5", "20", "oscillation = \"required\"")).is(Call::Broken, &["oscillation"]);
}

/// A latch of two NANDs, both inputs rising together; what `expect` says, and rules.
fn race(expect: &str, rules: &str) -> Reviewed {
    Reviewed::of(&format!(
        r#"
        [inputs]
        a = 0
        b = 0
        [gates]
        p = {{ nand = ["a", "q"], delay = [5, 9] }}
        q = {{ nand = ["b", "p"], delay = [5.5, 9.5] }}
        [[steps]]
        label = "both"
        at = 100
        set = {{ a = 1, b = 1 }}
        {expect}
        [rules]
        glitch_free = []
        {rules}
        [sweep]
        samples = 400
        "#
    ))
}

#[test]
fn a_forbidden_race_breaks_unless_each_outcome_has_an_alternative_of_its_own() {
    let marks = |race: &Reviewed| race.window("both").outcomes.iter().map(|it| it.breaks_rule).collect::<Vec<_>>();

    let forbidden = race("", "");
    forbidden.is(Call::Broken, &["critical-race", "both"]);
    assert_eq!(marks(&forbidden), [true, true], "both outcomes of the race are marked");
    let finding = forbidden.find(Kind::CriticalRace).unwrap();
    assert!(finding.breaks_rule);
    let outcomes = &forbidden.window("both").outcomes;
    assert!(outcomes[0].count >= outcomes[1].count, "commonest first");
    assert_eq!((finding.count, finding.sample), (outcomes[1].count, Some(outcomes[1].first)), "the less common");

    let own = race("expect = [{ p = 0, q = 1 }, { p = 1, q = 0 }]", "");
    own.is(Call::NoFailureFound, &["in 400 draws"]);
    assert_eq!(marks(&own), [false, false]);
    assert!(!own.find(Kind::CriticalRace).unwrap().breaks_rule, "it is listed all the same");

    // both outcomes fit the one alternative
    let shared = race("expect = { a = 1 }", "");
    shared.is(Call::Broken, &["critical-race"]);
    assert_eq!(marks(&shared), [true, true]);

    // one outcome fits none: that one is to blame, by `expect` and in the race
    let one = race("expect = { p = 0, q = 1 }", "");
    one.is(Call::Broken, &["expect", "critical-race"]);
    let bad = one.window("both").outcomes.iter().filter(|it| it.breaks_rule).collect::<Vec<_>>();
    assert_eq!(bad.len(), 1);
    assert!(bad[0].state.ones.get(one.net("p").index()), "the one with p = 1");

    let allowed = race("", "critical_race = \"allowed\"");
    allowed.is(Call::NoFailureFound, &[]);
    assert_eq!(marks(&allowed), [false, false]);
}

#[test]
fn a_forbidden_state_of_rest_is_marked_among_the_outcomes() {
    let rules = "critical_race = \"allowed\"\n[[rules.never_at_rest]]\nname = \"p wins\"\nstate = { p = 0 }";
    let marked = race("", rules);
    marked.is(Call::Broken, &["p wins"]);
    for outcome in &marked.window("both").outcomes {
        assert_eq!(outcome.breaks_rule, !outcome.state.ones.get(marked.net("p").index()), "{outcome:?}");
    }
}

#[test]
fn where_nothing_was_found_the_sentence_says_in_how_many_draws_and_for_what() {
    let quiet = Reviewed::of(&buffer("[5, 9]", "20", ""));
    quiet.is(Call::NoFailureFound, &["no failure found in 200 draws", "Monte Carlo", "2 steps"]);
    assert!(quiet.review.verdict.reasons.is_empty(), "{}", quiet.words());
    let corners = buffer("[5, 9]", "20", "").replace("samples = 200", "samples = 64\ndraw = \"corners\"");
    Reviewed::of(&corners).is(Call::NoFailureFound, &["64 draws of corners"]);
}

#[test]
fn nothing_asked_is_not_a_pass() {
    let still = Reviewed::of("[inputs]\na = 0\n[gates]\nout = { buf = [\"a\"], delay = 5 }");
    still.is(Call::Undecided, &[]);
}

/// Two gates of exactly equal typical delays oscillate in the typical run alone: no draw has such a tie.
#[test]
fn what_only_the_typical_run_breaks_is_told_and_breaks_its_rule() {
    let seen = Reviewed::of(
        r#"
        [inputs]
        s = 0
        r = 0
        [gates]
        q = { nand = ["s", "qn"], delay = [5, 9] }
        qn = { nand = ["r", "q"], delay = [5, 9] }
        [[steps]]
        at = 10
        set = { s = 1, r = 1 }
        expect = [{ q = 1, qn = 0 }, { q = 0, qn = 1 }]
        [rules]
        glitch_free = []
        "#,
    );
    let words = "oscillation after \"step 1\" in no draw, but with typical delays (only with exactly equal times)";
    seen.is(Call::Broken, &[words, "10,000 draws"]);
    assert!(seen.review.sweep.findings.iter().all(|finding| !finding.breaks_rule || finding.count == 0));
}
