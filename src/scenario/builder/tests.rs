//! What a scenario means: defaults, look-up of delays, labels, order.

use crate::circuit::{Function, GateId, NetId};
use crate::delay::{DelayRange, Filter};
use crate::scenario::{
    BeginAt, Builder, Fault, MomentKind, NewClock, NewFilter, NewPlace, NewRange, NewStep, Place, Said, Scenario, state,
};
use crate::time::{Span, Unit};

fn ns(ns: u64) -> Span {
    Span::from_fs(ns * 1_000_000)
}

/// Inputs a, b; gates p (reads a, q), q (reads b, p), out (reads q).
fn latch() -> Builder {
    let mut builder = Builder::new("latch");
    builder.input("a", false).input("b", true);
    builder.gate("p", Function::Nor, ["a", "q"]);
    builder.gate("q", Function::Nor, ["b", "p"]);
    builder.gate("out", Function::Buf, ["q"]);
    builder
}

fn finish(builder: Builder) -> Scenario {
    builder.finish().unwrap_or_else(|faults| panic!("{faults:#?}"))
}

fn faults(builder: Builder) -> Vec<Fault> {
    builder.finish().expect_err("a fault")
}

fn only(builder: Builder) -> String {
    let faults = faults(builder);
    assert_eq!(faults.len(), 1, "{faults:#?}");
    faults[0].to_string()
}

#[test]
fn each_edge_is_looked_up_alone() {
    let mut builder = latch();
    builder.default_delays().rise("6").fall("5");
    builder.function_delays("nor").delay(["2", "4"]);
    builder.gate("own", Function::Nor, ["a", "b"]).rise("9");
    builder.gate("both", Function::And, ["a", "b"]).delay("7");
    builder.gate("common", Function::And, ["a", "b"]);
    let delays = finish(builder).delays;
    let exact = |n| DelayRange::exact(ns(n));
    let nor = DelayRange { min: ns(2), typ: ns(3), max: ns(4) };
    // p, q: from [delays.nor]; out, common: from [delays]; own: rise its own, fall from [delays.nor]
    assert_eq!(
        delays.gate,
        [[nor, nor], [nor, nor], [exact(5), exact(6)], [nor, exact(9)], [exact(7); 2], [exact(5), exact(6)]]
    );
    assert_eq!(delays.gate_one_draw, [true, true, false, false, true, false]);
    assert!(delays.no_delay.is_empty());
}

#[test]
fn a_gate_without_delay_has_one_unit_and_a_note() {
    let mut builder = latch();
    builder.unit(Unit::Us);
    builder.gate("half", Function::Not, ["a"]).fall("3");
    let scenario = finish(builder);
    let unit = DelayRange::exact(Span::from_fs(1_000_000_000));
    assert_eq!(scenario.delays.gate[0], [unit; 2]);
    assert_eq!(scenario.delays.gate[3], [DelayRange::exact(Span::from_fs(3_000_000_000)), unit]);
    assert_eq!(scenario.delays.no_delay, [0, 1, 2, 3].map(GateId));
    assert_eq!(scenario.notes, ["`p`, `q`, `out`, `half` have no delay: 1 us assumed"]);
}

#[test]
fn a_minimum_is_assumed_as_a_part_of_typical() {
    let typ_max = || NewRange::TypMax(["6", "9"].map(Said::from));
    let mut builder = latch();
    builder.default_delays().delay("1");
    builder.gate("x", Function::Not, ["a"]).delay(typ_max());
    builder.gate("tiny", Function::Not, ["a"]).delay(NewRange::TypMax(["3 fs", "4 fs"].map(Said::from)));
    let scenario = finish(builder.clone());
    let range = |g: usize| scenario.delays.gate[g][0];
    assert_eq!(range(3), DelayRange { min: Span::from_fs(1_500_000), typ: ns(6), max: ns(9) });
    assert_eq!(range(4).min, Span::TICK, "at least 1 fs");
    assert_eq!(scenario.delays.assumed_min, [GateId(3), GateId(4)]);
    builder.assume_min("0.5");
    assert_eq!(finish(builder.clone()).delays.gate[3][0].min, ns(3));
    builder.assume_min("0");
    assert!(only(builder).contains("`assume_min` is 0"));
}

#[test]
fn outputs_default_to_gates_that_no_other_gate_reads() {
    let scenario = finish(latch());
    assert_eq!(scenario.outputs, [NetId(4)]);
    assert_eq!(scenario.watched, [NetId(4)]);

    let mut itself = Builder::new("reads itself");
    itself.input("a", false);
    itself.gate("keep", Function::Or, ["a", "keep"]);
    itself.gate("x", Function::Not, ["y"]);
    itself.gate("y", Function::Not, ["x"]);
    itself.begin(BeginAt::Random);
    assert_eq!(finish(itself).outputs, [NetId(1)], "reading itself does not count");

    let mut ring = Builder::new("ring");
    ring.gate("x", Function::Not, ["y"]);
    ring.gate("y", Function::Not, ["x"]);
    ring.initial("x", true);
    assert_eq!(finish(ring).outputs, [NetId(0), NetId(1)], "all are read: all are outputs");

    let mut watched = latch();
    watched.output("q");
    watched.rules().glitch_free("p");
    let scenario = finish(watched);
    assert_eq!(
        (scenario.outputs.as_slice(), scenario.watched.as_slice()),
        (&[NetId(3)][..], &[NetId(2), NetId(3)][..])
    );
    assert_eq!(scenario.rules.glitch_free.len(), 1, "a written list replaces the outputs");
}

#[test]
fn moments_are_power_up_then_steps_then_clock_edges() {
    let mut builder = latch();
    builder.begin(BeginAt::Random).input("low", false).input("high", true);
    builder.step(NewStep::at("5").set("a", true));
    builder.repeat(2, vec![NewStep::after("9").set("a", false), NewStep::after("9").set("a", true).label("on")]);
    builder.step(NewStep::after("9").set("a", false));
    builder.clock(NewClock::new("low", "0", "10", "4", 2));
    builder.clock(NewClock::new("high", "0", "10", "4", 1));
    let stimulus = finish(builder).stimulus;
    let labels: Vec<&str> = stimulus.moments.iter().map(|moment| moment.label.as_str()).collect();
    assert_eq!(
        labels,
        [
            "power-up",
            "step 1",
            "step 2 #1",
            "on #1",
            "step 2 #2",
            "on #2",
            "step 4",
            "low rise 1",
            "low fall 1",
            "low rise 2",
            "low fall 2",
            "high fall 1",
            "high rise 1",
        ]
    );
    assert_eq!(stimulus.moments[4].kind, MomentKind::Step(3));
    assert_eq!(stimulus.moments[8].kind, MomentKind::Edge { clock: 0, edge: 1 });
    assert_eq!(stimulus.moment_of_step(0), 1);
}

#[test]
fn a_step_without_a_place_waits_for_rest() {
    let place = |filter: Option<NewFilter>| {
        let mut builder = latch();
        builder.default_delays().delay(["4", "6"]);
        let gate = builder.gate("slow", Function::Buf, ["a"]).delay(["20", "30"]);
        filter.into_iter().for_each(|filter| {
            gate.filter(filter);
        });
        builder.step(NewStep { set: state([("a", true)]), ..NewStep::default() });
        finish(builder)
    };
    assert_eq!(place(None).stimulus.steps[0].place, Place::Rest(Span::ZERO));
    let involution = place(Some(NewFilter::Involution("10".into())));
    assert_eq!(involution.stimulus.steps[0].place, Place::Rest(ns(30)), "the largest delay of the file");
    assert_eq!(involution.delays.filter[3], Filter::Involution(ns(10)));
    assert_eq!(involution.not_analysed, [""; 0]);
}

#[test]
fn an_involution_is_causal_up_to_its_bound() {
    // equal minima d: causal while 2 e^(-d/tau) < 1, that is tau < d / ln 2 = 1.442695… d
    let with = |tau: &str| {
        let mut builder = latch();
        builder.gate("x", Function::Buf, ["a"]).delay("10").filter(NewFilter::Involution(tau.into()));
        builder.finish()
    };
    assert!(with("14.42").is_ok());
    assert!(with("14.43").is_err());
    assert!(with("0").is_err());
}

#[test]
fn a_reject_limit_is_shorter_than_the_least_delay() {
    let with = |limit: &str| {
        let mut builder = latch();
        builder
            .gate("x", Function::Buf, ["a"])
            .rise(["5", "9"])
            .fall(["4", "8"])
            .filter(NewFilter::Reject(limit.into()));
        builder.finish()
    };
    assert!(with("3.999999").is_ok());
    assert!(with("4").is_err());
    assert!(with("0").is_err());
}

#[test]
fn steps_keep_their_order_whatever_is_drawn() {
    let two = |first: NewStep, second: NewStep| {
        let mut builder = latch();
        builder.step(first.set("a", true)).step(second.set("a", false));
        builder.finish()
    };
    assert!(two(NewStep::at(["5", "9"]), NewStep::at(["9", "12"])).is_ok(), "equal is allowed");
    assert!(two(NewStep::at(["5", "9"]), NewStep::at(["8.999999", "12"])).is_err());
    assert!(two(NewStep::at("5").skew(["0", "4"]), NewStep::at("9")).is_ok());
    assert!(two(NewStep::at("5").skew(["0", "4"]), NewStep::at("8")).is_err());
    assert!(two(NewStep::at("5").skew(["0", "4"]), NewStep::after("4")).is_ok());
    assert!(two(NewStep::at("5").skew(["0", "4"]), NewStep::after("3")).is_err());
    assert!(two(NewStep::after(["1", "3"]), NewStep::at("3")).is_ok(), "the first counts from 0");
    assert!(two(NewStep::rest("0"), NewStep::at("100")).is_err());
    assert!(two(NewStep::rest("0"), NewStep::after("100")).is_ok());
    let when = NewPlace::When { pattern: state([("q", true)]).into(), wait: None, timeout: None };
    let when = NewStep { places: vec![when], ..NewStep::default() };
    assert!(two(when.clone(), NewStep::at("100")).is_err());
    let scenario = two(NewStep::at("1"), when).expect("a step that waits for a pattern");
    assert_eq!(scenario.not_analysed.len(), 0);
}

#[test]
fn a_fault_in_a_loop_is_reported_once() {
    let mut builder = latch();
    let steps = vec![NewStep::after("1").set("a", true).skew(["0", "5"]), NewStep::after("2").set("a", false)];
    builder.repeat(1000, steps);
    let faults = faults(builder);
    assert_eq!(faults.len(), 1, "{faults:#?}");
}

#[test]
fn too_many_moments_and_endless_stimuli_are_faults() {
    let mut builder = latch();
    builder.repeat(u64::MAX, vec![NewStep::after("1").set("a", true)]);
    builder.clock(NewClock::new("b", "0", "10", "4", u64::MAX));
    let faults = faults(builder);
    assert!(faults.iter().any(|fault| fault.message.contains("1000000 is the limit")), "{faults:#?}");

    let mut long = latch();
    long.repeat(4, vec![NewStep::after("3000 s").set("a", true)]);
    assert!(only(long).contains("which no run does"));
}

#[test]
fn an_expression_of_constants_is_a_gate_without_inputs() {
    let mut builder = latch();
    builder.expr("one", "!0 | 0");
    let scenario = finish(builder);
    let one = scenario.circuit.net("one").expect("a gate");
    let gate = scenario.circuit.driver(one).expect("its driver");
    assert!(scenario.circuit.sources(gate).is_empty());
    assert!(scenario.circuit.wants(gate, |_| unreachable!("it reads nothing")));
}

#[test]
fn gates_that_hide_hazards_are_noted() {
    let mut builder = latch();
    builder.default_delays().delay("1");
    builder.gate("m", Function::Mux, ["a", "b", "q"]);
    builder.expr("e", "a & b | !a & q");
    builder.expr("plain", "a & b");
    let note = "`m`, `e`: as one gate each can show no hazard of its own; if one is built of several gates, write them";
    assert_eq!(finish(builder).notes, [note]);
}

#[test]
fn the_reference_has_nets_of_its_own() {
    let mut builder = latch();
    builder.reference().expr("out", "!b & (a | out)");
    let scenario = finish(builder.clone());
    let reference = scenario.reference.expect("a reference");
    assert_eq!(reference.compare.len(), 1, "the outputs by default");
    assert_eq!(reference.circuit.name(reference.compare[0].1.0), "out");
    builder.reference().compare("p");
    assert_eq!(
        only(builder),
        "the reference has no net `p`; add it under `[reference.gates]`, or name other nets in `compare`"
    );
}

#[test]
fn a_hundred_thousand_gates_are_built_in_linear_time() {
    let time = |gates: u32| {
        let mut builder = Builder::new("chain");
        builder.input("g0", false);
        for i in 1..=gates {
            builder.gate(format!("g{i}"), Function::Nand, [format!("g{}", i - 1), "g0".to_string()]).delay(["5", "9"]);
        }
        let begun = std::time::Instant::now();
        let scenario = finish(builder);
        assert_eq!(scenario.circuit.gate_count(), gates as usize);
        begun.elapsed().as_secs_f64()
    };
    let (small, large) = (time(20_000), time(100_000));
    assert!(large < 60.0 * small.max(0.01), "20,000 gates took {small} s, 100,000 took {large} s");
}
