//! Windows of the six-NAND flip-flop and the essential hazard, as `prove` finds them, against textbook figures.

use stillgate::control::Control;
use stillgate::engine::{Program, Trace};
use stillgate::instance::{Instance, Which};
use stillgate::proof::{Call, Claim, Relation};
use stillgate::scenario::Scenario;

use crate::bounded::read;
use crate::races::{claim, proof, sides};

/// The flip-flop with data and clock at these times (fs); it must leave its old value.
///
/// The network is the one of the 7474 data sheets; setup and hold follow from it by hand, gate by gate, in each test.
fn flip_flop(delay: &str, data: u8, changes: u64, clock: u64, wants: u8) -> Scenario {
    let mut steps = [(changes, format!("d = {}", 1 - data)), (clock, "c = 1".to_string())];
    steps.sort();
    let distance = steps[1].0 - steps[0].0;
    read(&format!(
        r#"
outputs = ["q"]
[inputs]
d = {data}
c = 0
[initial]
q = {q}
[gates]
n1 = {{ nand = ["n4", "n2"], {delay} }}
n2 = {{ nand = ["n1", "c"], {delay} }}
n3 = {{ nand = ["n2", "c", "n4"], {delay} }}
n4 = {{ nand = ["n3", "d"], {delay} }}
q = {{ nand = ["n2", "qb"], {delay} }}
qb = {{ nand = ["n3", "q"], {delay} }}
[rules]
oscillation = "allowed"
critical_race = "allowed"
[[rules.never]]
state = {{ c = 1, q = {old} }}
longer_than = 60
[[steps]]
set = {{ {} }}
[[steps]]
after = "{distance} fs"
set = {{ {} }}
"#,
        steps[0].1,
        steps[1].1,
        q = 1 - wants,
        old = 1 - wants
    ))
}

fn taken(scenario: &Scenario) -> (Call, bool) {
    let claim = kept_out(scenario);
    (claim.call, claim.but_for_ties)
}

/// That the old value does not last.
fn kept_out(scenario: &Scenario) -> Claim {
    let (asked, told) = proof(scenario, false, false);
    let never = |claim: &&Claim| asked.questions[claim.question as usize].rule.word() == "never";
    told.claims.iter().find(never).unwrap().clone()
}

/// Where q rests in the engine; `None` if it does not.
fn engine(scenario: &Scenario, slow: &[&str], nominal: u64) -> Option<bool> {
    let mut instance = Instance::of(scenario, &Which::Typ);
    for (number, gate) in scenario.circuit.gates().enumerate() {
        let name = scenario.circuit.name(scenario.circuit.net_of(gate));
        let range = scenario.delays.gate[number];
        let pick = |edge: usize| match name {
            _ if nominal > 0 => range[edge].typ,
            _ if slow.contains(&name) => range[edge].max,
            _ => range[edge].min,
        };
        instance.delays.gate[gate.index()] = [pick(0), pick(1)];
    }
    let program = Program::new(scenario, &Control::default()).unwrap();
    let mut run = Trace::default();
    assert!(program.machine().run(&instance, &Control::default(), &mut run));
    let q = scenario.circuit.net("q").unwrap();
    let last = run.windows.last().unwrap();
    last.settling.map(|_| last.state.get(q.index()) == true.into())
}

const NS: u64 = 1_000_000;

/// All gates exactly 1 unit. Inertial gates: setup 1 for a falling, 0 for a rising data input; hold 0 for a 0, −1 for a 1
/// (*computed*, methods of the six-NAND flip-flop; the textbook's 2 and 1 gate delays stand for pure delays, from memory).
/// The very bound needs an exact tie; 1 fs beyond it the data is taken, 1 fs short of it not, in the proof and in the engine.
#[test]
fn windows_of_equal_gates() {
    let unit = "rise = 1, fall = 1";
    // (data before, data changes how long before the clock, in units; what is wanted is the new value)
    for (data, setup) in [(1u8, 1i64), (0, 0)] {
        let at = |fs: i64| flip_flop(unit, data, (50 * NS as i64 - fs) as u64, 50 * NS, 1 - data);
        let bound = setup * NS as i64;
        let inside = at(bound + 1);
        assert_eq!(taken(&inside), (Call::Proved, false), "setup of {}", 1 - data);
        assert_eq!(engine(&inside, &[], 1), Some(data == 0));
        let outside = at(bound - 1);
        assert_ne!(taken(&outside).0, Call::Proved, "setup of {}", 1 - data);
        assert_ne!(engine(&outside, &[], 1), Some(data == 0));
    }
    for (data, hold) in [(0u8, 0i64), (1, -1)] {
        let at = |fs: i64| flip_flop(unit, data, (50 * NS as i64 + fs) as u64, 50 * NS, data);
        let bound = hold * NS as i64;
        let inside = at(bound + 1);
        let wanted = |scenario: &Scenario| taken(scenario).0;
        // a hold below 0: the data may change before the clock does
        assert_eq!(engine(&inside, &[], 1), Some(data == 1), "hold of {data}");
        assert_eq!(wanted(&inside), Call::Proved, "hold of {data}");
        let outside = at(bound - 1);
        assert_ne!(engine(&outside, &[], 1), Some(data == 1), "hold of {data}");
        assert_ne!(wanted(&outside), Call::Proved, "hold of {data}");
    }
}

/// Ranges 4 to 6, by hand: a rising data input needs more than n4 at most less n3 at least = 2 before the clock, a falling one
/// n4 and n1 at most less n2 at least = 8; a held 0 needs n3 at most less n4 at least = 2.
#[test]
fn windows_of_ranges() {
    let range = "rise = [4, 6], fall = [4, 6]";
    let sets: [(u8, i64, &[&str]); 2] = [(0, 2, &["n4"]), (1, 8, &["n4", "n1"])];
    for (data, setup, slow) in sets {
        let at = |fs: i64| flip_flop(range, data, (50 * NS as i64 - fs) as u64, 50 * NS, 1 - data);
        let inside = at(setup * NS as i64 + 1);
        assert_eq!(taken(&inside), (Call::Proved, false), "setup of {}", 1 - data);
        assert_eq!(engine(&inside, slow, 0), Some(data == 0));
        let outside = at(setup * NS as i64 - 1);
        assert_eq!(taken(&outside), (Call::Refuted, false), "setup of {}", 1 - data);
        assert_eq!(engine(&outside, slow, 0), Some(data == 1));
    }
    let at = |fs: u64| flip_flop(range, 0, 50 * NS + fs, 50 * NS, 0);
    let (inside, outside) = (at(2 * NS + 1), at(2 * NS - 1));
    assert_eq!(taken(&inside), (Call::Proved, false));
    assert_eq!(taken(&outside), (Call::Refuted, false));
    assert_eq!(engine(&inside, &["n3"], 0), Some(false));
    assert_eq!(engine(&outside, &["n3"], 0), Some(true));
    // and the race is named as in a data sheet
    let claim = kept_out(&outside);
    let (first, relation, second) = sides(&outside, claim.race.as_ref().unwrap());
    assert_eq!((first, second), (vec!["n3v".to_string()], vec!["n4v".to_string(), "step 2".to_string()]));
    assert_ne!(relation, Relation::Apart);
    assert_eq!(claim.race.as_ref().unwrap().short(&outside), 1);
}

/// A toggle of two latches: the inverter of its input against the way through the second latch and back (Unger 1959: the
/// essential hazard is cured by delay alone). Inverter at most 5 and the way at least 6 is proved; 12 to 16 against 1 to 3
/// each is refuted, and the sum that must be longer is the way back.
#[test]
fn the_essential_hazard_of_a_toggle() {
    let toggle = |inverter: &str, back: &str, others: &str| {
        read(&format!(
            r#"
outputs = ["y2"]
[inputs]
x = 0
[initial]
y2 = 0
y1 = 0
[gates]
nx = {{ not = ["x"], {inverter} }}
ny = {{ not = ["y2"], {back} }}
a = {{ and = ["x", "ny"], {others} }}
b = {{ and = ["nx", "y1"], {others} }}
h = {{ and = ["ny", "y1"], {others} }}
y1 = {{ or = ["a", "b", "h"], {others} }}
c = {{ and = ["nx", "y1"], {others} }}
d = {{ and = ["x", "y2"], {others} }}
g = {{ and = ["y1", "y2"], {others} }}
y2 = {{ or = ["c", "d", "g"], {others} }}
[rules]
glitch_free = []
[[steps]]
set = {{ x = 1 }}
expect = {{ y1 = 1, y2 = 0 }}
"#
        ))
    };
    let good = toggle("rise = [2, 5], fall = [2, 5]", "rise = [2, 3], fall = [2, 3]", "rise = [2, 3], fall = [2, 3]");
    let (asked, told) = proof(&good, false, false);
    assert_eq!(claim(&good, &asked, &told, "expect", 1, None).call, Call::Proved);
    let bad =
        toggle("rise = [12, 16], fall = [12, 16]", "rise = [1, 3], fall = [1, 3]", "rise = [1, 3], fall = [1, 3]");
    let (asked, told) = proof(&bad, false, false);
    let claim = claim(&bad, &asked, &told, "expect", 1, None);
    assert_eq!((claim.call, claim.but_for_ties), (Call::Refuted, false));
    let race = claim.race.as_ref().unwrap_or_else(|| panic!("{claim:?}"));
    let (first, _, second) = sides(&bad, race);
    assert!(first.contains(&"nxv".to_string()), "{first:?} {second:?}");
    assert!(second.contains(&"a^".to_string()) && second.contains(&"y1^".to_string()), "{first:?} {second:?}");
}
