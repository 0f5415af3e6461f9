//! The bounded view on circuits whose answers are known: numbers of states, settling bounds, hazards.

use stillgate::circuit::NetId;
use stillgate::control::Control;
use stillgate::engine::Program;
use stillgate::proof::{
    Budget, Ended, Explored, Mode, Moves, Nothing, Plant, Points, Settles, System, Watch, case, explore, one_draw,
};
use stillgate::reader;
use stillgate::scenario::Scenario;

fn read(text: &str) -> Scenario {
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
        let found = self.explore(&Moves { net, most: 2 }, mode);
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

fn latch(q: &str, qn: &str) -> World {
    World::of(&format!(
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
    ))
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

#[test]
fn demonstrations() {
    let folder = std::path::Path::new(env!("CARGO_MANIFEST_DIR")).join("scenarios");
    let mut names: Vec<_> = std::fs::read_dir(&folder).unwrap().map(|it| it.unwrap().path()).collect();
    names.sort();
    for path in names {
        let text = std::fs::read_to_string(&path).unwrap();
        let scenario = read(&text);
        let program = Program::new(&scenario, &Control::default()).unwrap();
        let asked = stillgate::findings::Asked::of(&scenario);
        let started = std::time::Instant::now();
        let proof = stillgate::proof::prove(&scenario, &program, &asked, &Default::default(), &Control::default());
        println!("== {} zones {} {:?}", path.file_stem().unwrap().to_string_lossy(), proof.zones, started.elapsed());
        for claim in &proof.claims {
            let stillgate::proof::Subject::Question(q) = claim.subject else { continue };
            let question = &asked.questions[q as usize];
            println!(
                "  {:12} {:?} {:?} net {:?} moment {:?} ties {} {:?}",
                claim.call.word(), question.rule, question.name,
                question.net.map(|net| scenario.circuit.name(net).to_string()),
                question.moment.map(|m| scenario.stimulus.moments[m as usize].label.clone()), claim.but_for_ties, claim.reason
            );
        }
        for window in &proof.windows {
            println!("  window {} states {:?} settling {:?} {} {}", scenario.stimulus.moments[window.moment as usize].label, window.states.as_ref().map(Vec::len), window.settling.map(|(a,b)| (a.fs() as f64/1e6, b.fs() as f64/1e6)), window.settling_below, window.settling_but_for_ties);
        }
    }
}
