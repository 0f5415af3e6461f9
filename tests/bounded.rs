//! The bounded view on circuits whose answers are known: numbers of states, settling bounds, hazards.

use stillgate::circuit::NetId;
use stillgate::control::Control;
use stillgate::engine::Program;
use stillgate::findings::Asked;
use stillgate::proof::{
    Budget, Call, Ended, Explored, Mode, Moves, Nothing, Plant, Points, Settles, Spend, System, Watch, case, explore,
    one_draw, prove,
};
use stillgate::reader;
use stillgate::scenario::Scenario;

pub fn read(text: &str) -> Scenario {
    reader::read(text, "t").unwrap_or_else(|faults| panic!("{faults}")).scenario
}

fn budget() -> Budget {
    Budget { zones: 200_000, bytes: 1 << 30, until: None, control: Control::default() }
}

struct World {
    scenario: Scenario,
    plant: Plant,
    start: Vec<bool>,
}

impl World {
    fn of(text: &str) -> World {
        let scenario = read(text);
        let nets: Vec<NetId> = scenario.circuit.nets().collect();
        let plant = Plant::of(&scenario, &nets, &[]).unwrap();
        let program = Program::new(&scenario, &Control::default()).unwrap();
        let start = program.start().unwrap().clone();
        let start = plant.nets.iter().map(|net| start.ones.get(net.index())).collect();
        World { scenario, plant, start }
    }

    fn explore<W: Watch>(&self, watch: &W, mode: Mode) -> Explored {
        let found = explore(&self.plant, std::slice::from_ref(&self.start), watch, mode, &budget());
        assert_eq!(found.ended, Ended::Complete);
        found
    }

    /// Settled states after so many steps, as letters of the gates.
    fn rests(&self, steps: u32, mode: Mode) -> Vec<String> {
        let found = self.explore(&Nothing, mode);
        let letters = |state: u32| {
            let values = &found.states[state as usize];
            (self.plant.inputs..self.plant.nets.len())
                .map(|net| if values[net / 64] >> (net % 64) & 1 == 1 { '1' } else { '0' })
                .collect::<String>()
        };
        let mut all: Vec<String> =
            found.rests.keys().filter(|rest| rest.steps == steps).map(|rest| letters(rest.state)).collect();
        all.sort();
        all.dedup();
        all
    }

    fn settling(&self, steps: u32, mode: Mode) -> (i64, i64) {
        let watch = Settles::default();
        self.explore(&watch, mode);
        let [least, most] = watch.figures.borrow()[&steps];
        (least.0, most.0)
    }

    fn moves(&self, net: &str, steps: u32, mode: Mode) -> Vec<u32> {
        let net = self.plant.local(self.scenario.circuit.net(net).unwrap()).unwrap();
        let found = self.explore(&Moves { net, most: 2, from: None }, mode);
        let mut all: Vec<u32> = found
            .hits
            .keys()
            .map(|hit| Moves::moved(*hit))
            .filter(|moved| moved.steps == steps)
            .map(|moved| moved.count)
            .collect();
        all.sort();
        all.dedup();
        all
    }
}

const WITHOUT_TIES: Mode =
    Mode { joint: false, merge: stillgate::proof::Merge::Inclusion, edges: false, first_hit: false };

/// A NOR latch of these delays, both inputs let go at once.
pub fn latch_text(q: &str, qn: &str) -> String {
    format!(
        r#"
[inputs]
r = 1
s = 1
[gates]
q = {{ nor = ["r", "qn"], delay = {q} }}
qn = {{ nor = ["s", "q"], delay = {qn} }}
[[steps]]
set = {{ r = 0, s = 0 }}
"#
    )
}

fn latch(q: &str, qn: &str) -> World {
    World::of(&latch_text(q, qn))
}

#[test]
fn a_latch_released_at_once() {
    let mode = Mode::default();
    let world = latch("[4, 8]", "[5, 9]");
    assert_eq!(world.rests(1, mode), ["01", "10"]);
    assert_eq!(world.rests(1, WITHOUT_TIES), ["01", "10"]);
    assert_eq!(world.settling(1, WITHOUT_TIES), (4, 8));
    assert_eq!(world.moves("q", 1, WITHOUT_TIES), [0, 1]);
    assert_eq!(world.moves("q", 1, mode), [0, 1, 2, 3]);
    let world = latch("[4, 6]", "[7, 9]");
    assert_eq!(world.rests(1, mode), ["10"]);
    assert_eq!(world.settling(1, mode), (4, 6));
    // exactly touching: the other state needs an exact tie
    let world = latch("[4, 6]", "[6, 9]");
    assert_eq!(world.rests(1, mode), ["01", "10"]);
    assert_eq!(world.rests(1, WITHOUT_TIES), ["10"]);
}

#[test]
fn a_static_hazard_and_its_cure() {
    let selector = |na: &str, ab: &str| {
        World::of(&format!(
            r#"
[inputs]
a = 1
b = 1
c = 1
[gates]
na = {{ not = ["a"], delay = {na} }}
ab = {{ nand = ["a", "b"], delay = {ab} }}
ac = {{ nand = ["na", "c"], delay = [3, 5] }}
y = {{ nand = ["ab", "ac"], delay = [4, 7] }}
[[steps]]
set = {{ a = 0 }}
[[steps]]
set = {{ a = 1 }}
"#
        ))
    };
    let world = selector("[2, 5]", "[3, 5]");
    assert_eq!(world.moves("y", 1, Mode::default()), [0, 2]);
    assert_eq!(world.moves("y", 2, Mode::default()), [0]);
    // just as long as the least delay of y: it still passes
    let world = selector("[2, 5]", "[6, 8]");
    assert_eq!(world.moves("y", 1, WITHOUT_TIES), [0, 2]);
    let world = selector("[2, 5]", "[7, 8]");
    assert_eq!(world.moves("y", 1, Mode::default()), [0]);
}

const FLIP_FLOP: &str = r#"
[inputs]
d = 0
c = 0
[initial]
q = 0
[gates]
n1 = { nand = ["n4", "n2"], delay = [4, 6] }
n2 = { nand = ["n1", "c"], delay = [4, 6] }
n3 = { nand = ["n2", "c", "n4"], delay = [4, 6] }
n4 = { nand = ["n3", "d"], delay = [4, 6] }
q = { nand = ["n2", "qb"], delay = [4, 6] }
qb = { nand = ["n3", "q"], delay = [4, 6] }
"#;

/// Setup of the six-NAND flip-flop, each gate 4 to 6: a rising data input 3 before the clock is taken, 2 before it need not
/// be (n4 against n3); a falling one needs more than 8 (n4 and n1 against n2).
#[test]
fn setup_of_a_flip_flop() {
    let outcomes = |first: &str, second: &str, apart: u32, data: u8| {
        let text = format!(
            "{}[[steps]]\nset = {{ {first} }}\n[[steps]]\nafter = {apart}\nset = {{ {second} }}\n",
            FLIP_FLOP.replace("d = 0", &format!("d = {data}"))
        );
        let world = World::of(&text);
        let mut q: Vec<char> = world.rests(2, WITHOUT_TIES).iter().map(|state| state.chars().nth(4).unwrap()).collect();
        q.dedup();
        q
    };
    assert_eq!(outcomes("d = 1", "c = 1", 3, 0), ['1']);
    assert_eq!(outcomes("d = 1", "c = 1", 2, 0), ['1']);
    assert_eq!(outcomes("d = 1", "c = 1", 1, 0), ['0', '1']);
    assert_eq!(outcomes("d = 0", "c = 1", 9, 1), ['0']);
    assert_eq!(outcomes("d = 0", "c = 1", 7, 1), ['0', '1']);
}

/// Every state at rest that the exploration finds is shown by a run with delays that its trace gives.
#[test]
fn traces_become_cases_that_run() {
    let latch = latch("[4, 8]", "[5, 9]");
    let flip_flop = World::of(&format!(
        "{}[[steps]]\nset = {{ d = 1 }}\n[[steps]]\nafter = [1, 12]\nset = {{ c = 1 }}\n[[steps]]\nset = {{ c = 0, d = 0 }}\nskew = [0, 9]\n",
        FLIP_FLOP
    ));
    for (world, least) in [(latch, 2), (flip_flop, 4)] {
        let found = world.explore(&Nothing, WITHOUT_TIES);
        let program = Program::new(&world.scenario, &Control::default()).unwrap();
        let mut shown = 0;
        for (rest, node) in &found.rests {
            let (trace, start) = (found.trace(*node), found.start(*node));
            let system = System::of(&world.plant, &start, &trace, &one_draw(&world.scenario, &world.plant));
            let Points::Some(point) = system.solve() else { panic!("{rest:?}: {system:?}") };
            let case = case(&world.scenario, &world.plant, &system, &point, &trace, &start);
            let mut run = stillgate::engine::Trace::default();
            assert!(program.machine().run(&case.instance, &Control::default(), &mut run));
            if rest.steps == 0 {
                continue;
            }
            let window = &run.windows[rest.steps as usize - 1];
            let values = &found.states[rest.state as usize];
            let same = |net: usize| window.state.get(net) == stillgate::logic::Value::from(values[0] >> net & 1 == 1);
            assert!((0..world.plant.nets.len()).all(same), "{rest:?} {trace:?}\n{:?}\n{window:?}", case.instance);
            shown += 1;
        }
        assert!(shown >= least, "{shown}");
    }
}

/// What of a demonstration is proved, refuted and left open, by rule: counts of claims.
fn claims(name: &str) -> std::collections::BTreeMap<(&'static str, &'static str), u32> {
    let path = std::path::Path::new(env!("CARGO_MANIFEST_DIR")).join("scenarios").join(name).with_extension("toml");
    let scenario = read(&std::fs::read_to_string(path).unwrap());
    let program = Program::new(&scenario, &Control::default()).unwrap();
    let asked = Asked::of(&scenario);
    let proof = prove(&scenario, &program, &asked, &Spend { zones: 20_000, ..Spend::default() }, &Control::default());
    assert_eq!(proof.claims.len(), asked.questions.len());
    let mut counts = std::collections::BTreeMap::new();
    for claim in &proof.claims {
        let rule = asked.questions[claim.question as usize].rule.word();
        *counts.entry((rule, claim.call.word())).or_insert(0) += 1;
        // a reason for what is open, a case for what is refuted
        assert_eq!(claim.reason.is_some(), matches!(claim.call, Call::Undecided | Call::NotCovered), "{claim:?}");
        assert_eq!(claim.witness.is_some(), claim.call == Call::Refuted, "{claim:?}");
    }
    // no draw does what was proved impossible, nor rests or settles elsewhere
    let sampled = Scenario { plan: stillgate::scenario::Plan { samples: 300, ..scenario.plan }, ..scenario.clone() };
    let sweep = stillgate::review::sweep(&sampled, &program, &asked, 1, &Control::default()).unwrap();
    for claim in proof.claims.iter().filter(|claim| claim.call == Call::Proved) {
        let question = claim.question;
        assert_eq!(
            sweep.rules[question as usize].broken, 0,
            "{name}: {claim:?} {:?}",
            asked.questions[question as usize]
        );
    }
    for window in &proof.windows {
        let seen = &sweep.windows[window.moment as usize];
        if let Some(states) = &window.states {
            assert!(seen.outcomes.iter().all(|outcome| states.contains(&outcome.state)), "{name}: {seen:?}");
        }
        if let (Some((least, most)), Some(settling)) = (window.settling, &seen.settling) {
            assert!(settling.min.is_none_or(|min| least <= min), "{name}: {window:?} {settling:?}");
            assert!(
                window.settling_but_for_ties || settling.max_at_least || settling.max <= most,
                "{name}: {window:?}"
            );
        }
    }
    counts
}

/// The selector glitches and its cured twin does not; what each step expects holds for every delay.
#[test]
fn claims_of_the_selectors() {
    let counts = claims("selector");
    println!("{counts:?}");
    assert!(counts[&("glitch_free", "refuted")] >= 1, "{counts:?}");
    let counts = claims("selector-cured");
    println!("{counts:?}");
    assert!(counts.keys().all(|(_, call)| *call == "proved"), "{counts:?}");
}

/// Clocks beside steps: nothing that a sweep meets is excluded by what is proved; what is refuted has its case.
#[test]
fn claims_with_clocks() {
    let counts = claims("divider");
    assert!(counts[&("glitch_free", "proved")] == 80 && counts[&("settle_within", "proved")] == 80, "{counts:?}");
    let counts = claims("clock-switch");
    assert_eq!(counts.get(&("min_pulse", "refuted")), Some(&1), "{counts:?}");
}
