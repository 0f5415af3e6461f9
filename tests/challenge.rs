//! `review` challenges the sweep by the proof and the proof by the sweep: nothing seen may be excluded, and what is refuted
//! and was never seen is told with a case.

use std::path::Path;
use std::process::Command;

use stillgate::control::Control;
use stillgate::engine::Program;
use stillgate::findings::{Asked, RuleKey};
use stillgate::instance::Which;
use stillgate::output::text::{self, Page};
use stillgate::proof::{Call as Claimed, Claim, Proof, Spend, prove};
use stillgate::review::{self, Call, Review, ReviewError, challenge, challenge_run};
use stillgate::scenario::Scenario;
use stillgate::time::Span;

use crate::bounded::read;

fn reviewed(scenario: &Scenario, zones: u64) -> Review {
    let program = Program::new(scenario, &Control::default()).unwrap();
    review::review_proving(scenario, &program, zones, 1, &Control::default()).unwrap_or_else(|error| panic!("{error}"))
}

/// Two chains of six: the lower gauge passes its own in 12 to 24 ns, the upper in 30 to 42 ns. They come nearer than 6.5 ns
/// only where nearly all of the lower are slow and nearly all of the upper fast, which is neither typical, min nor max.
fn chains(more: &str) -> String {
    let mut gates = String::new();
    for (name, range) in [("low", "[2, 4]"), ("high", "[5, 7]")] {
        for n in 1..=6 {
            let source = if n == 1 { "gauge".to_string() } else { format!("{name}{}", n - 1) };
            gates += &format!("{name}{n} = {{ buf = [\"{source}\"], delay = {range} }}\n");
        }
    }
    format!(
        r#"
[inputs]
gauge = 0
[gates]
{gates}
[[rules.timing]]
name = "lamp after bell"
from = "low6 rise"
to = "high6 rise"
min = 6.5
[[steps]]
label = "rise"
at = 100
set = {{ gauge = 1 }}
[sweep]
samples = 200
search = 0
{more}
"#
    )
}

fn names(gates: usize) -> String {
    let names = (1..=gates).flat_map(|n| [format!("\"low{n}\""), format!("\"high{n}\"")]);
    names.collect::<Vec<_>>().join(", ")
}

/// What no draw, no typical, min or max run met, and nobody searched for, the proof refutes: a finding that breaks the
/// verdict, with its race.
#[test]
fn a_rare_failure_is_found_by_the_proof_alone() {
    let review = reviewed(&read(&chains("")), review::PROOF_ZONES);
    let broken: Vec<_> = review.sweep.findings.iter().filter(|it| it.breaks_rule).collect();
    let [finding] = broken[..] else { panic!("{broken:?}") };
    assert!(finding.rare && finding.count == 0 && finding.of == 200, "{finding:?}");
    assert_eq!(review.verdict.call, Call::Broken);
    assert!(
        review.verdict.sentence.contains("in no draw of 200, but refuted by the proof (rare)"),
        "{:?}",
        review.verdict
    );
    let scenario = read(&chains(""));
    let page = text::review(&scenario, &review, &Page::default());
    let lines = page.split_whitespace().collect::<Vec<_>>().join(" ");
    assert!(
        lines.contains("Rare, refuted and met by nothing else: timing \"lamp after bell\" (refuted-5.toml)."),
        "{page}"
    );
    assert!(lines.contains("low5↑ + low6↑ + 6.5 ns (18.5 … 30.5) must not exceed high1↑ +"), "its race: {page}");
    assert!(page.lines().all(|line| line.chars().count() <= 100), "{page}");
    assert!(
        !page.contains("Smallest margins"),
        "a rule that the proof refutes has no margin without a failure: {page}"
    );

    // the search meets it: then it is rare no more, and told once
    let searched = read(&chains("").replace("search = 0", "search = 1000"));
    let review = reviewed(&searched, review::PROOF_ZONES);
    let broken: Vec<_> = review.sweep.findings.iter().filter(|it| it.breaks_rule).collect();
    let [finding] = broken[..] else { panic!("{broken:?}") };
    assert!(!finding.rare, "{finding:?}");
    assert_eq!(review.proof.unwrap().count(Claimed::Refuted), 1);
}

/// The same as a user meets it: the text gives the command, and the command shows the failure.
#[test]
fn a_rare_failure_replays() {
    let folder = tempfile::tempdir().unwrap();
    let scenario = folder.path().join("chains.toml");
    std::fs::write(&scenario, chains("")).unwrap();
    let run = |arguments: &[&str]| {
        let mut command = Command::new(env!("CARGO_BIN_EXE_stillgate"));
        let output = command.current_dir(folder.path()).args(arguments).output().unwrap();
        (output.status.code(), String::from_utf8(output.stdout).unwrap())
    };
    let (code, page) = run(&["review", "chains.toml", "--out", "out", "--strict"]);
    assert_eq!(code, Some(1), "{page}");
    let command = page.lines().find(|line| line.contains("refuted-5.toml") && line.contains("stillgate run")).unwrap();
    let words: Vec<&str> = command.split_whitespace().skip(1).collect();
    assert_eq!(words, ["run", "chains.toml", "--delays", "out/refuted-5.toml"]);
    let (code, shown) = run(&[&words[..], &["--json", "--out", "again"]].concat());
    assert_eq!(code, Some(0));
    let shown: serde_json::Value = serde_json::from_str(&shown).unwrap();
    let fact = &shown["facts"][0];
    assert_eq!((&fact["kind"], &fact["rule_name"]), (&"timing".into(), &"lamp after bell".into()), "{shown}");

    let (_, json) = run(&["review", "chains.toml", "--out", "out", "--json"]);
    let json: serde_json::Value = serde_json::from_str(&json).unwrap();
    assert_eq!(json["verdict"], "broken");
    let finding = &json["sweep"]["findings"][0];
    assert_eq!((&finding["rare"], &finding["case"]), (&true.into(), &"refuted-5.toml".into()), "{finding}");
    let claims = json["proof"]["claims"].as_array().unwrap();
    let claim = claims.iter().find(|claim| claim["rule"] == "timing").unwrap();
    assert_eq!((&claim["verdict"], &claim["witness"]), (&"refuted".into(), &"refuted-5.toml".into()));
    assert!(claim["race"]["text"].as_str().unwrap().contains("high6"), "{claim}");
    // a claim has the same keys as in the document of `prove`
    let (_, proved) = run(&["prove", "chains.toml", "--out", "proof", "--json"]);
    let proved: serde_json::Value = serde_json::from_str(&proved).unwrap();
    let keys = |it: &serde_json::Value| it.as_object().unwrap().keys().cloned().collect::<Vec<_>>();
    assert_eq!(keys(claim), keys(&proved["claims"][0]));
    for key in keys(&json["proof"]) {
        assert!(proved.get(&key).is_some(), "{key}");
    }

    // without a proof nothing is found, and nothing is said to be proved
    let (code, page) = run(&["review", "chains.toml", "--out", "none", "--strict", "--proof-zones", "0"]);
    assert_eq!(code, Some(0), "{page}");
    assert!(page.starts_with("No failure found in 200 draws"), "{page}");
    assert!(page.contains("Proof over all delays: none was asked for, so nothing is proved."), "{page}");
    assert!(!folder.path().join("none/refuted-5.toml").exists());
    let (_, sweep) = run(&["sweep", "chains.toml", "--out", "swept", "--json"]);
    assert!(!sweep.contains("\"proof\"") && !sweep.contains("\"rare\""), "a sweep makes no proof");
}

/// Groups that cannot draw the case leave the claim undecided; those that can do not.
#[test]
fn a_witness_must_fit_the_groups() {
    let call = |group: &str, gates: usize| {
        let more = format!("[[groups]]\ngates = [{}]\n{group}\n", names(gates));
        let scenario = read(&chains(&more));
        let review = reviewed(&scenario, review::PROOF_ZONES);
        let proof = review.proof.unwrap();
        let timing = |it: &&Claim| review.asked.questions[it.question as usize].rule == RuleKey::Timing;
        let claim = proof.claims.iter().find(timing).unwrap().clone();
        let rare = review.sweep.findings.iter().any(|it| it.rare);
        assert_eq!(rare, claim.call == Claimed::Refuted, "{claim:?}");
        if let Some(witness) = &claim.witness {
            let of = |gate: &str| {
                let net = scenario.circuit.net(gate).unwrap();
                let gate = scenario.circuit.gates().find(|gate| scenario.circuit.net_of(*gate) == net).unwrap();
                witness.delays.gate[gate.index()][1].fs() as f64 / 1e6
            };
            return (claim.call, String::new(), Some((of("low1") / 3.0, of("high1") / 6.0)));
        }
        (claim.call, claim.reason.unwrap(), None)
    };
    for group in ["tracking = 1", "scale = [0.5, 1.5]\nmismatch = 0.01"] {
        let (called, reason, _) = call(group, 6);
        assert_eq!((called, reason.contains("excluded by a group")), (Claimed::Undecided, true), "{group}: {reason}");
    }
    assert_eq!(call("tracking = 0.9", 6).0, Claimed::Refuted);
    let (called, _, ratios) = call("scale = [0.5, 1.5]\nmismatch = 0.4", 6);
    assert_eq!(called, Claimed::Refuted);
    let (slow, fast) = ratios.unwrap();
    assert!(slow > 1.25 && fast < 0.9 && slow / fast <= 1.4 / 0.6, "{slow} {fast}");
}

/// A proof that is wrong is noticed, whatever it is wrong about.
#[test]
fn a_contradiction_is_told() {
    let scenario = read(include_str!("../scenarios/selector.toml"));
    let control = Control::default();
    let program = Program::new(&scenario, &control).unwrap();
    let asked = Asked::of(&scenario);
    let sweep = review::sweep(&scenario, &program, &asked, 1, &control).unwrap();
    let run = |which| review::run_one(&scenario, &program, &asked, which, &control).unwrap();
    let right = prove(&scenario, &program, &asked, &Spend::default(), &control);
    let broken = sweep.findings.iter().find(|it| it.breaks_rule).unwrap().clone();
    let failing = run(broken.shown_by().unwrap());
    assert_eq!(challenge(&scenario, &asked, &right, &sweep), Ok(()));
    assert_eq!(challenge_run(&scenario, &asked, &right, &failing), Ok(()));

    let both = |wrong: &dyn Fn(&mut Proof), words: &str| {
        let mut proof = right.clone();
        wrong(&mut proof);
        for said in [
            challenge(&scenario, &asked, &proof, &sweep).map_err(|it| it.to_string()),
            challenge_run(&scenario, &asked, &proof, &failing).map_err(|it| it.to_string()),
        ] {
            let said = said.expect_err(words);
            assert!(said.contains(words) && said.contains("to the lower gauge"), "{said}");
        }
    };
    let moment = broken.subject.moment.unwrap();
    both(
        &|proof| {
            let claim = proof.claims.iter_mut().find(|it| Some(it.question) == broken.subject.question).unwrap();
            claim.call = Claimed::Proved;
        },
        "is proved for the delays in the ranges, but",
    );
    let window = |proof: &mut Proof| proof.windows.iter().position(|it| it.moment == moment).unwrap();
    both(
        &|proof| {
            let at = window(proof);
            proof.windows[at].states = Some(Vec::new());
        },
        "settles in a state that no delay in the ranges leads to",
    );
    both(
        &|proof| {
            let at = window(proof);
            proof.windows[at].settling = Some((Span::ZERO, Span::from_fs(1)));
        },
        "beyond the 1 fs that the proof allows",
    );
    // a least time above what was seen, in the sweep
    let mut proof = right.clone();
    let at = window(&mut proof);
    let most = proof.windows[at].settling.unwrap().1;
    proof.windows[at].settling = Some((most, most));
    assert!(matches!(challenge(&scenario, &asked, &proof, &sweep), Err(ReviewError::Contradiction(_))));
    // what is not known excludes nothing
    proof.windows.iter_mut().for_each(|it| (it.states, it.settling) = (None, None));
    assert_eq!(challenge(&scenario, &asked, &proof, &sweep), Ok(()));
    // a bound that is only come near to is not met
    let longest = sweep.windows[moment as usize].settling.as_ref().unwrap().max;
    let mut proof = right.clone();
    proof.windows[at].settling = Some((Span::ZERO, longest));
    assert_eq!(challenge(&scenario, &asked, &proof, &sweep), Ok(()));
    proof.windows[at].settling_below = true;
    assert!(challenge(&scenario, &asked, &proof, &sweep).is_err());
}

/// How the claims of demonstrations come out beside a sweep, and none of them contradicts it.
#[test]
fn demonstrations_agree() {
    let table = [
        ("handshake", [29, 0, 0, 0], 0),
        ("interlock-walk", [104, 2, 0, 0], 0),
        ("permit", [14, 2, 2, 0], 0),
        ("power-up", [9, 1, 0, 0], 0),
        ("pulse-train", [1, 0, 0, 2], 0),
        ("push-button", [5, 2, 9, 0], 0),
        ("selector", [9, 1, 0, 0], 0),
        ("selector-cured", [10, 0, 0, 0], 0),
    ];
    for (name, counts, rare) in table {
        let path = Path::new(env!("CARGO_MANIFEST_DIR")).join(format!("scenarios/{name}.toml"));
        let mut scenario = stillgate::reader::load(&path).unwrap().scenario;
        scenario.plan.samples = 300;
        let review = reviewed(&scenario, review::PROOF_ZONES);
        let proof = review.proof.as_ref().unwrap();
        assert_eq!(proof.claims.len(), review.asked.questions.len(), "{name}: one claim a question");
        let calls = [Claimed::Proved, Claimed::Refuted, Claimed::Undecided, Claimed::NotCovered];
        assert_eq!(calls.map(|call| proof.count(call)), counts, "{name}");
        assert_eq!(review.sweep.findings.iter().filter(|it| it.rare).count(), rare, "{name}");
        let all = proof.claims.iter().all(|it| it.call == Claimed::Proved);
        assert_eq!(review.verdict.call == Call::Proved, all, "{name}: {:?}", review.verdict);
        if all {
            assert!(
                review.verdict.sentence.starts_with("proved for every delay in the ranges; no failure found in 300")
            );
        }
    }
}

/// What takes exactly equal times is told and breaks nothing: the sweep kept the rule, and typical delays did.
#[test]
fn what_takes_exactly_equal_times_is_told_apart() {
    // both let go at once: which of them goes first is open, but for a tie they come to rest
    let latch = crate::bounded::latch_text("[40, 80]", "[50, 90]");
    let expect = "set = { r = 0, s = 0 }\nexpect = [ { q = 1, qn = 0 }, { q = 0, qn = 1 } ]";
    let text = latch.replace("set = { r = 0, s = 0 }", expect) + "[sweep]\nsamples = 200\n";
    let scenario = read(&text);
    let review = reviewed(&scenario, review::PROOF_ZONES);
    let proof = review.proof.as_ref().unwrap();
    let ties: Vec<_> = proof.claims.iter().filter(|it| it.but_for_ties).collect();
    assert!(!ties.is_empty() && ties.iter().all(|it| it.call != Claimed::Proved), "{:?}", proof.claims);
    assert!(review.sweep.findings.iter().all(|it| !it.rare), "{:?}", review.sweep.findings);
    assert_eq!(review.verdict.call, Call::NoFailureFound, "{:?}", review.verdict);
}

/// Random starts are proved of all of them; a proof speaks of nominal delays, so conditions leave the verdict below proved.
#[test]
fn random_starts_and_conditions() {
    let text = |more: &str| {
        format!(
            "begin = \"random\"\n[inputs]\na = 0\n[gates]\nb = {{ not = [\"a\"], delay = [2, 5] }}\n\
             c = {{ buf = [\"b\"], delay = [3, 7] }}\n[rules]\nsettle_within = 13\n\
             [[steps]]\nset = {{ a = 1 }}\n[sweep]\nsamples = 100\n{more}"
        )
    };
    let review = reviewed(&read(&text("")), review::PROOF_ZONES);
    assert_eq!(review.verdict.call, Call::Proved, "{:?}", review.verdict);
    // twice as slow breaks the rule, and contradicts nothing
    for (conditions, call) in
        [("[conditions.warm]\nscale = 1.05", Call::NoFailureFound), ("[conditions.hot]\nscale = 2", Call::Broken)]
    {
        let scenario = read(&text(conditions));
        let review = reviewed(&scenario, review::PROOF_ZONES);
        let proof = review.proof.as_ref().unwrap();
        assert!(proof.claims.iter().all(|it| it.call == Claimed::Proved), "{:?}", proof.claims);
        assert_eq!(review.verdict.call, call, "{:?}", review.verdict);
        let page = text::review(&scenario, &review, &Page::default());
        let lines = page.split_whitespace().collect::<Vec<_>>().join(" ");
        assert!(lines.contains("It speaks of nominal delays, not of conditions."), "{page}");
    }
}

/// A budget that runs out leaves claims undecided and names itself; nothing is proved by it, and what was broken stays.
#[test]
fn a_small_budget_is_said() {
    let scenario = read(include_str!("../scenarios/handshake.toml"));
    let review = reviewed(&scenario, 30);
    let proof = review.proof.as_ref().unwrap();
    assert!(proof.zones <= 30 + 10, "{}", proof.zones);
    assert!(proof.count(Claimed::Undecided) > 0);
    let open = proof.claims.iter().filter(|it| it.call == Claimed::Undecided);
    let reasons: Vec<&str> = open.map(|it| it.reason.as_deref().unwrap()).collect();
    assert!(reasons.iter().all(|it| it.contains("zones") && it.contains("ran out")), "{reasons:?}");
    assert!(reasons.contains(&"the budget of 30 zones in all ran out"), "{reasons:?}");
    assert_eq!(review.verdict.call, Call::NoFailureFound);
}

/// The same claims, zones and findings however many threads the sweep has.
#[test]
fn threads_change_nothing() {
    let scenario = read(&chains(""));
    let program = Program::new(&scenario, &Control::default()).unwrap();
    let of = |threads| {
        let review = review::review(&scenario, &program, threads, &Control::default()).unwrap();
        stillgate::output::json::review(&scenario, &review)
    };
    assert_eq!(of(1), of(2));
    // and the case of the proof is the one that a run of it shows
    let review = review::review(&scenario, &program, 1, &Control::default()).unwrap();
    let finding = review.sweep.findings.iter().find(|it| it.rare).unwrap();
    assert!(matches!(finding.shown_by(), Some(Which::Given(_))));
    assert!(
        review.shown.iter().any(|(index, _)| review.sweep.findings[*index].subject == finding.subject),
        "a picture"
    );
}
