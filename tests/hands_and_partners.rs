//! Contacts bounce as it is written, and steps that wait for a pattern come when it has come, or say that it never did.
//! Times are derived by hand.

use stillgate::circuit::Function::{Buf, Nand, Or};
use stillgate::control::Control;
use stillgate::delay::DelayRange;
use stillgate::engine::{End, Program};
use stillgate::findings::Kind;
use stillgate::instance::{Instance, Which};
use stillgate::review::{self, Call, Review};
use stillgate::scenario::{Begin, Bounce, Clock, Mark, Place};
use stillgate::time::Span;

use crate::support::world::{Run, World, exact, fs, run, stable_states};

fn range(min: u64, max: u64) -> DelayRange {
    DelayRange::between(fs(min), fs(max))
}

/// A buffer of 5 fs behind input a; at 10 a rises and bounces.
fn bouncing(lasting: DelayRange, pulses: (u32, u32)) -> World {
    let mut world = World::new();
    world.input("a", false).gate("y", Buf, &["a"], 5).at(10, &[("a", true)]);
    world.steps[0].bounce = Some(Bounce { lasting, pulses });
    world
}

// ---- bounce

#[test]
fn a_contact_toggles_and_then_stays() {
    let run = bouncing(exact(12), (3, 3)).run();
    assert_eq!(run.of("a"), [(10, 1), (12, 0), (14, 1), (16, 0), (18, 1), (20, 0), (22, 1)]);
    // every pulse is shorter than the gate's delay; one step is one window, and settling counts from the last toggle
    assert_eq!(run.of("y"), [(27, 1)]);
    let window = &run.record.windows;
    assert_eq!(window.len(), 1);
    assert_eq!((window[0].start, window[0].settle_from, window[0].end), (10, 22, End::Settled));
    assert_eq!(window[0].settling, Some(5));
    assert_eq!(window[0].opening.inputs, [run.world.net("a")]);
}

#[test]
fn typical_fewest_and_most_bounces_are_evenly_spread() {
    let lasting = DelayRange { min: fs(4), typ: fs(8), max: fs(20) };
    let scenario = bouncing(lasting, (1, 4)).scenario();
    let toggles = |which| Instance::of(&scenario, &which).bounces[0][0].iter().map(|it| it.fs()).collect::<Vec<u64>>();
    // the middle of 1 and 4 is 2, rounded down
    assert_eq!(toggles(Which::Typ), [2, 4, 6, 8]);
    assert_eq!(toggles(Which::Min), [2, 4]);
    // ⌊20j/8⌋
    assert_eq!(toggles(Which::Max), [2, 5, 7, 10, 12, 15, 17, 20]);
    let none = bouncing(lasting, (0, 0)).run();
    assert_eq!(none.of("a"), [(10, 1)]);
    assert_eq!(none.record.windows[0].settle_from, 10);
}

#[test]
fn every_input_bounces_from_its_own_moment_also_if_it_ends_where_it_was() {
    let mut world = World::new();
    world.input("a", false).input("b", false).input("c", true).gate("y", Or, &["a", "b", "c"], 5);
    world.at(100, &[("a", true), ("b", true), ("c", true)]);
    world.steps[0].skew = Some(range(0, 50));
    world.steps[0].bounce = Some(Bounce { lasting: exact(8), pulses: (1, 1) });
    let scenario = world.scenario();
    let mut instance = Instance::of(&scenario, &Which::Typ);
    instance.skews[0] = vec![fs(7), fs(37), fs(0)];
    let rest = stable_states(&scenario.circuit, &[false, false, true]).remove(0);
    let run = Run { record: run(&scenario, &rest, &instance), world };
    assert_eq!(run.of("a"), [(107, 1), (111, 0), (115, 1)]);
    assert_eq!(run.of("b"), [(137, 1), (141, 0), (145, 1)]);
    assert_eq!(run.of("c"), [(104, 0), (108, 1)]);
    assert_eq!(run.record.windows[0].opening.inputs.len(), 3, "all of them move");
    assert_eq!((run.record.windows[0].start, run.record.windows[0].settle_from), (100, 145));
}

#[test]
fn of_toggles_at_one_instant_only_what_is_left_counts() {
    // ⌊j/4⌋: three toggles at the change itself undo it, the last comes 1 fs later
    let run = bouncing(exact(1), (2, 2)).run();
    assert_eq!(run.of("a"), [(11, 1)]);
    assert_eq!((run.record.windows[0].start, run.record.windows[0].settle_from), (10, 11));
}

// ---- when

/// An echo: y follows a after 30 up and 20 down. The first step raises a at 10.
fn echo() -> World {
    let mut world = World::new();
    world.input("a", false).input("b", false).gate_edges("y", Buf, &["a"], 30, 20).at(10, &[("a", true)]);
    world
}

fn when(world: &mut World, pattern: &[(&str, bool)], wait: u64, timeout: Option<u64>, set: &[(&str, bool)]) {
    let pattern = pattern.iter().map(|(net, bit)| (world.net(net), *bit)).collect();
    world.step(Place::When { pattern, wait: exact(wait), timeout: timeout.map(fs) }, set);
}

fn starts(run: &Run) -> Vec<u64> {
    run.record.windows.iter().map(|window| window.start).collect()
}

#[test]
fn a_partner_answers_so_long_after_the_pattern() {
    let mut world = echo();
    when(&mut world, &[("y", true)], 5, None, &[("a", false)]);
    // without a wait the step is a batch of its own at the instant of the pattern
    when(&mut world, &[("y", false)], 0, None, &[("a", true)]);
    let run = world.run();
    assert_eq!(run.of("a"), [(10, 1), (45, 0), (65, 1)]);
    assert_eq!(run.of("y"), [(40, 1), (65, 0), (95, 1)]);
    assert_eq!(starts(&run), [10, 45, 65]);
    assert!(run.record.windows.iter().all(|window| window.began_at_rest && window.end == End::Settled));
    assert_eq!(run.record.never_came, None);
}

#[test]
fn a_pattern_that_shows_already_comes_at_once() {
    // y is still 0 when a has changed
    let mut world = echo();
    when(&mut world, &[("y", false)], 3, None, &[("b", true)]);
    // and two that wait for the same thing come one after the other at one instant, in windows of their own
    when(&mut world, &[("b", true)], 0, None, &[("b", false)]);
    let run = world.run();
    assert_eq!(starts(&run), [10, 13, 13]);
    assert_eq!(run.record.windows[0].end, End::Cut);
    assert_eq!(run.of("b"), [(13, 1), (13, 0)]);
    // before any step it is looked for from the start on
    let mut world = World::new();
    world.input("a", false).gate("y", Buf, &["a"], 5);
    when(&mut world, &[("y", false)], 7, None, &[("a", true)]);
    assert_eq!(starts(&world.run()), [7]);
}

#[test]
fn a_pattern_need_not_stay_and_one_that_passed_before_all_inputs_changed_is_missed() {
    // y is high from 40 to 45
    let mut world = echo();
    world.gates[0].delay = [exact(30), exact(30)];
    world.gates[0].filter = stillgate::delay::Filter::Transport;
    world.at(15, &[("a", false)]);
    when(&mut world, &[("y", true)], 100, None, &[("b", true)]);
    assert_eq!(starts(&world.run()), [10, 15, 140]);
    // b bounces until 60, when y is low again
    let mut world = echo();
    world.input("c", false);
    world.gates[0].delay = [exact(30), exact(30)];
    world.gates[0].filter = stillgate::delay::Filter::Transport;
    world.at(15, &[("a", false)]).at(16, &[("b", true)]);
    world.steps[2].bounce = Some(Bounce { lasting: exact(44), pulses: (1, 1) });
    when(&mut world, &[("y", true)], 0, None, &[("c", true)]);
    let run = world.run();
    assert_eq!(starts(&run), [10, 15, 16]);
    assert_eq!((run.record.never_came, run.record.end), (Some(3), 60));
}

#[test]
fn what_never_comes_ends_the_run_at_its_timeout() {
    // y rises at 40: 30 after the step before is in time, 29 is not, and leaves the rise pending
    for (timeout, comes) in [(31, true), (30, true), (29, false), (1, false)] {
        let mut world = echo();
        when(&mut world, &[("y", true)], 5, Some(timeout), &[("a", false)]);
        let run = world.run();
        if comes {
            assert_eq!((starts(&run), run.record.never_came), (vec![10, 45], None));
        } else {
            assert_eq!((starts(&run), run.record.never_came), (vec![10], Some(1)));
            let window = &run.record.windows[0];
            assert_eq!((window.end, window.stop, run.record.end), (End::Cut, 10 + timeout, 10 + timeout));
            assert_eq!(window.pending, [run.world.net("y")]);
        }
    }
    // at rest the window has settled; without a timeout the run ends with the last event
    for (timeout, end) in [(Some(500), 510), (None, 40)] {
        let mut world = echo();
        when(&mut world, &[("y", true), ("b", true)], 5, timeout, &[("a", false)]);
        let run = world.rest(0, &[("b", true)]).run();
        let window = &run.record.windows[0];
        assert_eq!((window.end, window.settling, run.record.end), (End::Settled, Some(30), end));
        assert_eq!((run.record.windows.len(), run.record.never_came), (1, Some(1)), "later steps do not come");
    }
}

#[test]
fn what_never_comes_in_an_oscillation_ends_it() {
    let ring = |timeout| {
        let mut world = World::new();
        world.input("e", false).gate("q", Nand, &["e", "q"], 10).at(10, &[("e", true)]);
        when(&mut world, &[("e", false)], 0, timeout, &[("e", false)]);
        world.run().record
    };
    let record = ring(None);
    assert_eq!(record.windows[0].end, End::Oscillating { period: fs(20), range: None });
    assert_eq!(record.never_came, Some(1));
    // a timeout is something still to come: the ring runs on to it
    let record = ring(Some(5000));
    assert_eq!(record.windows[0].end, End::Oscillating { period: fs(20), range: None });
    assert_eq!((record.never_came, record.end), (Some(1), 5010));
    // one that comes before the recurrence is known cuts the window
    let record = ring(Some(100));
    assert_eq!((record.windows[0].end, record.never_came, record.end), (End::Cut, Some(1), 110));
    // and a limit that ends the run says nothing of the pattern
    let mut world = World::new();
    world.input("e", false).gate("q", Nand, &["e", "q"], 10).limit(20).at(10, &[("e", true)]);
    when(&mut world, &[("e", false)], 0, Some(5000), &[("e", false)]);
    assert_eq!(world.run().record.never_came, None);
}

#[test]
fn clocks_run_on_while_a_step_waits_and_an_x_is_no_match() {
    let mut world = World::new();
    world.input("a", false).input("clk", false).gate("y", Buf, &["clk"], 2);
    let (first, period, high) = (exact(100), exact(50), exact(25));
    let net = world.net("clk");
    world.clocks.push(("clk".into(), Clock { net, first, period, high, jitter: fs(0), count: 3, mark: Mark(0) }));
    world.at(110, &[("a", true)]);
    when(&mut world, &[("y", true)], 1, None, &[("a", false)]);
    // y is high from 102 to 127: it shows as soon as a has changed
    let run = world.run();
    assert_eq!(run.of("a"), [(110, 1), (111, 0)]);

    let mut world = World::new();
    world.input("a", true).input("b", false).gate("y", Nand, &["a", "y"], 2);
    world.begin = Begin::Unknown;
    when(&mut world, &[("y", false)], 0, None, &[("b", true)]);
    let record = world.run().record;
    assert_eq!((record.windows.len(), record.never_came), (1, Some(1)));
}

// ---- whole blocks

fn reviewed(text: &str) -> Review {
    let mut scenario =
        stillgate::reader::read(text, "test.toml").unwrap_or_else(|it| panic!("{}", it.render(false))).scenario;
    scenario.plan.samples = 60;
    let program = Program::new(&scenario, &Control::default()).unwrap();
    review::review(&scenario, &program, 1, &Control::default()).unwrap()
}

/// Three stages of C-elements (Muller 1955) with two rails a token: a stage takes a token while the next one is empty, and
/// empties once the next one is full. Two tokens find room in it.
fn pipeline(steps: &str) -> String {
    let mut text = String::from("outputs = [\"t3\", \"f3\"]\n[inputs]\nt0 = 0\nf0 = 0\nack = 0\n[initial]\n");
    let each = |line: &dyn Fn(usize) -> String| (1..=3).map(line).collect::<String>();
    text += &each(&|i| format!("t{i} = 0\nf{i} = 0\n"));
    text += "[delays]\ndelay = [1, 3]\n[gates]\n";
    text += &each(&|i| {
        let rail = |r: &str| {
            let (from, may) = (format!("{r}{}", i - 1), format!("may{i}"));
            format!("{r}{i} = {{ expr = \"{from} & {may} | {r}{i} & ({from} | {may})\" }}\n")
        };
        let may =
            if i == 3 { "{ not = [\"ack\"] }".into() } else { format!("{{ nor = [\"t{0}\", \"f{0}\"] }}", i + 1) };
        format!("{}{}may{i} = {may}\n", rail("t"), rail("f"))
    });
    text + steps
}

/// The sender offers a token on a rail, and takes it away once the first stage has it.
fn sends(rail: &str, wait: &str) -> String {
    format!(
        "[[steps]]\nwhen = {{ t1 = 0, f1 = 0 }}\nwait = {wait}\ntimeout = 9000\nset = {{ {rail}0 = 1 }}\n\
         [[steps]]\nwhen = {{ {rail}1 = 1 }}\nwait = {wait}\ntimeout = 9000\nset = {{ {rail}0 = 0 }}\n"
    )
}

/// The receiver waits for a token on this very rail, and for its going.
fn receives(rail: &str, wait: &str) -> String {
    format!(
        "[[steps]]\nwhen = {{ {rail}3 = 1 }}\nwait = {wait}\ntimeout = 9000\nset = {{ ack = 1 }}\n\
         [[steps]]\nwhen = {{ t3 = 0, f3 = 0 }}\nwait = {wait}\ntimeout = 9000\nset = {{ ack = 0 }}\n"
    )
}

const CALM: &str = "[rules]\nglitch_free = []\ncritical_race = \"allowed\"\noscillation = \"allowed\"\nnot_judged = \"allowed\"\n[[rules.never]]\nstate = { t3 = 1, f3 = 1 }\n";

#[test]
fn a_pipeline_delivers_its_tokens_in_order_to_fast_and_slow_partners() {
    for (sender, receiver) in [("0", "0"), ("[0, 2]", "[200, 500]"), ("[200, 500]", "[0, 2]"), ("[0, 40]", "[0, 40]")] {
        // 1 0 0 1 0, two of them ahead of the receiver
        let tokens = ["t", "f", "f", "t", "f"];
        let mut steps = sends(tokens[0], sender);
        for (n, token) in tokens.iter().enumerate() {
            steps += &tokens.get(n + 1).map_or(String::new(), |next| sends(next, sender));
            steps += &receives(token, receiver);
        }
        let review = reviewed(&(pipeline(&steps) + CALM));
        assert_eq!(review.verdict.call, Call::Proved, "{sender} {receiver}: {:?}", review.verdict.reasons);
        let reached: Vec<u64> = review.sweep.windows.iter().map(|window| window.reached).collect();
        assert_eq!(reached, [60; 20], "every step comes in every draw");
    }
}

#[test]
fn a_partner_that_never_answers_is_found() {
    // nobody takes the tokens: the first stage takes the second, and has no room for a third
    let steps = ["t", "f", "t"].map(|rail| sends(rail, "[0, 20]")).concat() + &receives("t", "0");
    let review = reviewed(&(pipeline(&steps) + CALM));
    assert_eq!(review.verdict.call, Call::Broken, "{:?}", review.verdict.reasons);
    let never: Vec<_> = review.sweep.findings.iter().filter(|it| it.subject.kind == Kind::NeverCame).collect();
    assert_eq!(never.len(), 1, "{never:?}");
    assert_eq!((never[0].subject.moment, never[0].count, never[0].of, never[0].breaks_rule), (Some(4), 60, 60, true));
    let reached: Vec<u64> = review.sweep.windows.iter().map(|window| window.reached).collect();
    assert_eq!(reached, [60, 60, 60, 60, 0, 0, 0, 0]);
    assert!(
        review.verdict.reasons.iter().any(|it| it.contains("never-came t1=0 f1=0 after \"step 5\"")),
        "{:?}",
        review.verdict.reasons
    );
}

/// A button that bounces sets a latch of two NORs once, and a toggle of six NANDs (the clocked divider) more than once.
#[test]
fn a_latch_survives_a_bouncing_button_and_a_counter_does_not() {
    let text = |gates: &str, initial: &str, edges: &str| {
        format!(
            "[inputs]\nbutton = 0\nreset = 0\n[initial]\n{initial}\n[delays]\ndelay = [6, 14]\n[gates]\n{gates}\n\
             [[steps]]\nat = 1000\nset = {{ button = 1 }}\nbounce = {{ lasting = [\"1 ms\", \"5 ms\"], pulses = [1, 6] }}\n\
             edges = {{ {edges} }}\n"
        )
    };
    let latch = "q = { nor = [\"reset\", \"qn\"] }\nqn = { nor = [\"button\", \"q\"] }";
    let review = reviewed(&text(latch, "q = 0", "q = 1, qn = 1"));
    // no draw has more; but two toggles some 10 ns apart could let qn go and take it back, which only the proof finds
    let broken: Vec<_> = review.sweep.findings.iter().filter(|it| it.breaks_rule).collect();
    let [rare] = broken.as_slice() else { panic!("{broken:?}") };
    assert!(rare.rare && rare.count == 0 && rare.subject.kind == Kind::Edges, "{rare:?}");
    let qn = review.sweep.scenario.circuit.net("qn");
    assert_eq!(rare.subject.net, qn);

    let toggle = "n1 = { nand = [\"n4\", \"n2\"] }\nn2 = { nand = [\"n1\", \"button\"] }\n\
        n3 = { nand = [\"n2\", \"button\", \"n4\"] }\nn4 = { nand = [\"n3\", \"qn\"] }\n\
        q = { nand = [\"n2\", \"qn\"] }\nqn = { nand = [\"n3\", \"q\"] }\nidle = { buf = [\"reset\"] }";
    let review = reviewed(&text(toggle, "q = 0", "q = 1"));
    assert_eq!(review.verdict.call, Call::Broken, "{:?}", review.verdict.reasons);
    let counted = review.sweep.findings.iter().find(|it| it.subject.kind == Kind::Edges).unwrap();
    // every draw has at least one pair too many
    assert_eq!((counted.count, counted.of), (60, 60));
    // pressed once without bounce it counts once
    let clean = text(toggle, "q = 0", "q = 1").replace("pulses = [1, 6]", "pulses = [0, 0]");
    assert_eq!(reviewed(&clean).verdict.call, Call::NoFailureFound);
}

#[test]
fn spans_of_drawn_bounces_lie_in_their_ranges_and_the_last_toggle_ends_them() {
    let mut world = bouncing(range(1000, 3000), (0, 3));
    world.plan.seed = 9;
    let scenario = world.scenario();
    let mut pairs = [0; 4];
    for sample in 0..400 {
        let toggles = &Instance::of(&scenario, &Which::Sample(sample)).bounces[0][0];
        pairs[toggles.len() / 2] += 1;
        assert!(toggles.len().is_multiple_of(2) && toggles.is_sorted());
        assert!(toggles.last().is_none_or(|last| (fs(1000)..=fs(3000)).contains(last)), "{toggles:?}");
        assert!(toggles.iter().rev().skip(1).all(|it| Some(it) < toggles.last() && *it >= Span::ZERO));
    }
    // a quarter each: 100, standard deviation 8.7
    assert!(pairs.iter().all(|count| (65..135).contains(count)), "{pairs:?}");
}
