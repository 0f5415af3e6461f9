//! An essential hazard: seen where the inverter of an input is slow, never seen where the way back is slow enough, and in
//! the flow table all the same.
//!
//! The machine is the divide-by-two table with the codes y1 y2 = 00, 01, 11, 10 and the covers Y1 = x'y2 + x y1 + y1 y2,
//! Y2 = x y1' + x'y2 + y1'y2, free of races and of logic hazards (Unger 1959, from memory; thresholds \[computed\]).

use stillgate::control::Control;
use stillgate::engine::Program;
use stillgate::findings::Kind;
use stillgate::instance::{Instance, Which};
use stillgate::reader;
use stillgate::review::{Call, Review, review};
use stillgate::scenario::Scenario;

/// The scenario with these delays of the inverter and, if there are any, of a buffer in the way back of y1 and y2.
fn scenario(inverter: &str, back: Option<&str>, draw: &str) -> Scenario {
    let (y1, y2, buffers) = match back {
        None => ("y1", "y2", String::new()),
        Some(delay) => {
            let buffer = |name: &str| format!("{name}_back = {{ buf = [\"{name}\"], delay = {delay} }}\n");
            ("y1_back", "y2_back", buffer("y1") + &buffer("y2"))
        }
    };
    let text = format!(
        r#"
        outputs = ["y1", "y2"]
        [inputs]
        x = 0
        [initial]
        y1 = 0
        y2 = 0
        [gates]
        xn = {{ not = ["x"], delay = {inverter} }}
        y1n = {{ not = ["{y1}"] }}
        a1 = {{ and = ["xn", "{y2}"] }}
        a2 = {{ and = ["x", "{y1}"] }}
        a3 = {{ and = ["{y1}", "{y2}"] }}
        y1 = {{ or = ["a1", "a2", "a3"] }}
        b1 = {{ and = ["x", "y1n"] }}
        b2 = {{ and = ["xn", "{y2}"] }}
        b3 = {{ and = ["y1n", "{y2}"] }}
        y2 = {{ or = ["b1", "b2", "b3"] }}
        {buffers}
        [delays]
        delay = [5, 8, 12]
        [[steps]]
        label = "first rise"
        at = 100
        set = {{ x = 1 }}
        expect = {{ y1 = 0, y2 = 1 }}
        [[steps]]
        label = "first fall"
        set = {{ x = 0 }}
        expect = {{ y1 = 1, y2 = 1 }}
        [[steps]]
        label = "second rise"
        set = {{ x = 1 }}
        expect = {{ y1 = 1, y2 = 0 }}
        [[steps]]
        label = "second fall"
        set = {{ x = 0 }}
        expect = {{ y1 = 0, y2 = 0 }}
        [sweep]
        samples = 2000
        draw = "{draw}"
        "#
    );
    reader::read(&text, "essential.toml").unwrap_or_else(|faults| panic!("{faults}\n{text}")).scenario
}

fn reviewed(scenario: &Scenario) -> Review {
    let program = Program::new(scenario, &Control::default()).unwrap();
    review(scenario, &program, 1, &Control::default()).unwrap_or_else(|error| panic!("{error}"))
}

/// In how many samples of each step, in order, the machine rests in another row than the step expects.
fn wrong(review: &Review) -> Vec<u64> {
    let wrong = |moment: u32| {
        let mut of_step = review.sweep.findings.iter().filter(|found| found.subject.kind == Kind::Expect);
        of_step.find(|found| found.subject.moment == Some(moment)).map_or(0, |found| found.count)
    };
    (0..4).map(wrong).collect()
}

#[test]
fn the_wrong_row_is_reached_where_the_inverter_is_slower_than_three_gates() {
    let scenario = scenario("[4, 12, 34]", None, "uniform");
    let review = reviewed(&scenario);
    assert_eq!(review.verdict.call, Call::Broken);
    // b1, y2 and a1 must rise before xn falls; if y1 and a2 have risen by then, too, nothing takes it back
    let gate = |name: &str| scenario.circuit.driver(scenario.circuit.net(name).unwrap()).unwrap().index();
    let left = |sample: u64, path: &[&str]| {
        let case = Instance::of(&scenario, &Which::Sample(sample));
        let delay = |name: &str, edge: usize| case.delays.gate[gate(name)][edge].fs() as i64;
        delay("xn", 0) - path.iter().map(|name| delay(name, 1)).sum::<i64>()
    };
    let count = |path: &[&str]| (0..scenario.plan.samples).filter(|sample| left(*sample, path) > 0).count() as u64;
    let (surely, perhaps) = (count(&["b1", "y2", "a1", "y1", "a2"]), count(&["b1", "y2", "a1"]));
    let seen = wrong(&review);
    assert!(surely < seen[0] && seen[0] <= perhaps && perhaps < 1000, "{surely}, {seen:?}, {perhaps}");
    let failing = review.sweep.findings.iter().find(|found| found.subject.kind == Kind::Expect).unwrap();
    assert!(left(failing.sample.unwrap(), &["b1", "y2", "a1"]) > 0, "the failing case has the slow inverter");
    // one rise counts for three changes: it rests in row 4, code 10
    let first = &review.sweep.windows[0];
    let code = |state: &stillgate::logic::State| {
        ["y1", "y2"].map(|name| state.get(scenario.circuit.net(name).unwrap().index()).letter())
    };
    let rows: Vec<([char; 2], u64)> = first.outcomes.iter().map(|it| (code(&it.state), it.count)).collect();
    assert_eq!(rows, [(['0', '1'], 2000 - seen[0]), (['1', '0'], seen[0])]);
}

#[test]
fn a_slow_inverter_always_fails_and_a_fast_one_never() {
    // slower than three gates at their slowest (36), and faster than three at their fastest (15)
    let always = reviewed(&scenario("[37, 40, 45]", None, "uniform"));
    assert_eq!(wrong(&always)[0], 2000);
    for draw in ["uniform", "corners"] {
        let never = reviewed(&scenario("[4, 8, 14]", None, draw));
        assert_eq!(wrong(&never), [0; 4], "{draw}");
    }
}

#[test]
fn delay_in_the_way_back_keeps_the_wrong_row_away() {
    // AND + OR + buffer + AND at their fastest, 5 + 5 + 20 + 5 = 35, are slower than the inverter at its slowest, 34
    for draw in ["uniform", "normal", "corners"] {
        let review = reviewed(&scenario("[4, 12, 34]", Some("[20, 25, 32]"), draw));
        assert_eq!(wrong(&review), [0; 4], "{draw}");
        assert_eq!(review.verdict.call, Call::Proved, "{draw}: {:?}", review.verdict.reasons);
    }
    // and a little less is not enough: 5 + 5 + 10 + 5 = 25
    let too_fast = reviewed(&scenario("[4, 12, 34]", Some("[10, 11, 12]"), "corners"));
    assert!(wrong(&too_fast)[0] > 0);
}

#[test]
fn the_demonstration_turns_back_in_a_few_of_a_hundred_draws_and_a_slow_way_back_cures_it() {
    let text = include_str!("../scenarios/stepper.toml");
    let read = |text: &str| reader::read(text, "stepper.toml").unwrap_or_else(|faults| panic!("{faults}")).scenario;
    let mut stepper = read(text);
    stepper.plan.samples = 4000;
    let review = reviewed(&stepper);
    let seen = wrong(&review);
    assert!((40..=200).contains(&seen[0]) && (40..=200).contains(&seen[2]), "1 to 5 percent: {seen:?}");
    // a slow buffer in each way back from the second latch to the first
    let slowed = text
        .replace(r#"["push_not", "paddle_not"]"#, r#"["push_not", "paddle_not_late"]"#)
        .replace(r#"["push_not", "paddle"]"#, r#"["push_not", "paddle_late"]"#)
        .replace(
            "\n[delays]",
            "paddle_late = { buf = [\"paddle\"], delay = [20, 25, 32] }
             paddle_not_late = { buf = [\"paddle_not\"], delay = [20, 25, 32] }
             [delays]",
        );
    for draw in ["uniform", "corners"] {
        let mut scenario = read(&format!("{slowed}\n[sweep]\nsamples = 4000\ndraw = \"{draw}\"\n"));
        scenario.plan.samples = 4000;
        assert_eq!(scenario.circuit.gate_count(), stepper.circuit.gate_count() + 2);
        let review = reviewed(&scenario);
        assert_eq!(wrong(&review), [0; 4], "{draw}");
        assert_eq!(review.verdict.call, Call::Proved, "{draw}: {:?}", review.verdict.reasons);
    }
}

/// The changes of x that Unger's test flags, of the four of the table.
fn flagged(review: &Review) -> usize {
    let table = &review.states.flow.table;
    assert!(!table.states_truncated);
    assert_eq!((table.states.len(), table.single.len()), (4, 4));
    table.single.iter().filter(|change| change.essential == Some(true)).count()
}

#[test]
fn each_change_of_the_table_is_an_essential_hazard() {
    // the table itself, each state variable one gate: one change never leads where three do
    let text = r#"
        outputs = ["y1", "y2"]
        [inputs]
        x = 0
        [initial]
        y1 = 0
        y2 = 0
        [gates]
        y1 = { expr = "!x & y2 | x & y1 | y1 & y2" }
        y2 = { expr = "x & !y1 | !x & y2 | !y1 & y2" }
        [[steps]]
        set = { x = 1 }
        [sweep]
        samples = 10
    "#;
    let scenario = reader::read(text, "table.toml").unwrap_or_else(|faults| panic!("{faults}")).scenario;
    assert_eq!(flagged(&reviewed(&scenario)), 4);
}

#[test]
fn the_flag_stays_whatever_the_delays() {
    // it belongs to the flow table: neither a fast inverter nor a slow way back takes it away
    for (inverter, back) in [("[4, 12, 34]", None), ("[4, 8, 14]", None), ("[4, 12, 34]", Some("[20, 25, 32]"))] {
        let mut scenario = scenario(inverter, back, "uniform");
        scenario.plan.samples = 10;
        assert_eq!(flagged(&reviewed(&scenario)), 4, "inverter {inverter}, way back {back:?}");
    }
}
