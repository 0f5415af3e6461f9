//! Between which times each edge comes, over all samples: what single runs say one by one, in a space that does not grow
//! with the number of samples, and the same however a sweep is split.

#![allow(clippy::unwrap_used)]

use std::collections::BTreeMap;
use std::sync::Arc;

use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;
use stillgate::circuit::NetId;
use stillgate::control::Control;
use stillgate::delay::DelayRange;
use stillgate::engine::Program;
use stillgate::findings::Asked;
use stillgate::instance::Which;
use stillgate::logic::Value;
use stillgate::output::bundle;
use stillgate::reader;
use stillgate::review::{self, run_one};
use stillgate::scenario::Scenario;
use stillgate::sweep::{Envelope, MOST_EDGES, conclude, run_samples, run_samples_with_envelope};

use crate::support::random_worlds::{Kind as Worlds, Lengths, PLAIN, Start, cases};
use crate::support::world::fs;

/// Moment, net, number of the edge and value it leads to: samples, earliest, latest.
type Seen = BTreeMap<(u32, NetId, usize, Value), (u64, u64, u64)>;
/// Moment and net: samples with more edges than are told apart.
type More = BTreeMap<(u32, NetId), u64>;

/// The same from single runs: every sample by itself, its edges numbered window by window from its list of transitions.
fn one_by_one(scenario: &Scenario, program: &Program, samples: u64, most: usize) -> (Seen, More) {
    let asked = Asked::of(scenario);
    let (mut seen, mut more) = (Seen::new(), More::new());
    for sample in 0..samples {
        let run = run_one(scenario, program, &asked, Which::Sample(sample), &Control::default()).unwrap();
        assert!(run.trace.cut.is_none());
        let windows = &run.trace.windows;
        for (i, window) in windows.iter().enumerate() {
            let behind = windows.get(i + 1).map_or(u32::MAX, |next| next.batch);
            let own = run.trace.changes.iter().filter(|it| window.batch <= it.batch && it.batch < behind);
            let mut edges: BTreeMap<NetId, Vec<(u64, Value)>> = BTreeMap::new();
            own.for_each(|it| edges.entry(it.net).or_default().push((it.at.fs() - window.start.fs(), it.new)));
            for (net, edges) in edges {
                if edges.len() > most {
                    *more.entry((window.moment, net)).or_default() += 1;
                }
                for (number, (at, to)) in edges.into_iter().take(most).enumerate() {
                    let slot = seen.entry((window.moment, net, number, to)).or_insert((0, at, at));
                    *slot = (slot.0 + 1, slot.1.min(at), slot.2.max(at));
                }
            }
        }
    }
    (seen, more)
}

/// All that an envelope holds.
fn all_of(scenario: &Scenario, envelope: &Envelope) -> (Seen, More) {
    let (mut seen, mut more) = (Seen::new(), More::new());
    for moment in 0..scenario.stimulus.moments.len() as u32 {
        for net in scenario.circuit.nets() {
            for edge in envelope.of(moment, net) {
                let figures = (edge.samples, edge.earliest.fs(), edge.latest.fs());
                assert!(seen.insert((moment, net, edge.number, edge.to), figures).is_none());
            }
            if envelope.more(moment, net) > 0 {
                more.insert((moment, net), envelope.more(moment, net));
            }
        }
    }
    (seen, more)
}

fn envelope(scenario: &Scenario, program: &Program, samples: std::ops::Range<u64>, threads: usize) -> Envelope {
    let asked = Asked::of(scenario);
    let control = Control::default();
    let tally = run_samples_with_envelope(scenario, program, &asked, samples.clone(), threads, &control);
    let without = run_samples(scenario, program, &asked, samples, threads, &control);
    let found = tally.envelope.clone().unwrap();
    let mut tally = tally;
    tally.envelope = None;
    assert_eq!(tally, without, "all else is as it is without");
    found
}

fn read(text: &str, samples: u64) -> (Scenario, Program) {
    let mut scenario = reader::read(text, "test.toml").unwrap_or_else(|faults| panic!("{faults}")).scenario;
    scenario.plan.samples = samples;
    let program = Program::new(&scenario, &Control::default()).unwrap();
    (scenario, program)
}

const BUFFER: &str = r#"
[inputs]
a = 0
[gates]
q = { buf = ["a"], delay = [3, 5] }
[[steps]]
label = "up"
at = [10, 20]
set = { a = 1 }
"#;

/// By hand: a buffer of 3 to 5 ns follows its step, whenever that comes, between 3 and 5 ns later; at the corners after
/// exactly 3 or exactly 5.
#[test]
fn an_edge_behind_one_buffer() {
    let (scenario, program) = read(&format!("{BUFFER}[sweep]\ndraw = \"corners\"\n"), 64);
    let asked = Asked::of(&scenario);
    let report = review::sweep(&scenario, &program, &asked, 1, &Control::default()).unwrap();
    let files = bundle::of_sweep(&scenario, &asked, &report).files;
    let table = files.iter().find(|file| file.name == "envelope.csv").unwrap();
    let wanted =
        "step,net,edge,direction,earliest [ns],latest [ns],samples,of\nup,a,1,rise,0,0,64,64\nup,q,1,rise,3,5,64,64\n";
    assert_eq!(String::from_utf8(table.bytes.clone()).unwrap(), wanted);

    let (scenario, program) = read(BUFFER, 400);
    let envelope = envelope(&scenario, &program, 0..400, 1);
    let edges: Vec<_> = envelope.of(0, scenario.circuit.net("q").unwrap()).collect();
    let [edge] = edges.as_slice() else { panic!("{edges:?}") };
    assert_eq!((edge.number, edge.to, edge.samples), (0, Value::One, 400));
    // of 400 even draws the ends are surely met within a tenth
    assert!((3_000_000..3_200_000).contains(&edge.earliest.fs()), "{edge:?}");
    assert!((4_800_000..=5_000_000).contains(&edge.latest.fs()), "{edge:?}");
}

#[test]
fn the_demonstrations_say_what_their_samples_say() {
    let mut both_ways = 0;
    for name in
        ["interlock", "selector", "divider", "handshake", "sequencer", "push-button", "clock-switch", "power-up"]
    {
        let path = std::path::Path::new(env!("CARGO_MANIFEST_DIR")).join(format!("scenarios/{name}.toml"));
        let (scenario, program) = read(&std::fs::read_to_string(path).unwrap(), 300);
        let found = envelope(&scenario, &program, 0..300, 1);
        let wanted = one_by_one(&scenario, &program, 300, found.edges());
        assert_eq!(all_of(&scenario, &found), wanted, "{name}");
        both_ways += wanted.0.keys().filter(|key| wanted.0.contains_key(&(key.0, key.1, key.2, Value::Zero))).count();
        assert_eq!(envelope(&scenario, &program, 0..300, 2), found, "{name} on two threads");
    }
    assert!(both_ways > 10, "{both_ways}");
}

#[test]
fn random_networks_say_what_their_samples_say() {
    let kind = Worlds { delays: Lengths::Short, ..PLAIN };
    let kinds = [
        Worlds { hazards: true, ..kind },
        Worlds { clocks: true, delays: Lengths::Ties, ..kind },
        Worlds { begin: Start::Random, rings: true, ..kind },
        Worlds { begin: Start::Unknown, ..kind },
        Worlds { wires: 0.5, ..kind },
    ];
    let (mut edges, mut unknown, mut more) = (0, 0, 0);
    for kind in kinds {
        for (number, case) in cases(60, kind).enumerate() {
            let mut rng = ChaCha8Rng::seed_from_u64(7);
            rng.set_stream(number as u64);
            let mut scenario = case.scenario;
            for delay in Arc::make_mut(&mut scenario.delays).gate.iter_mut().flatten() {
                *delay = DelayRange::between(delay.min, delay.min + fs(rng.random_range(0..=2 * delay.max.fs())));
            }
            scenario.plan.samples = 100;
            let program = Program::with_rest(&scenario, &case.rest);
            let found = envelope(&scenario, &program, 0..100, 1);
            let wanted = one_by_one(&scenario, &program, 100, found.edges());
            assert_eq!(all_of(&scenario, &found), wanted, "{}", case.name);
            edges += wanted.0.len();
            unknown += wanted.0.keys().filter(|key| key.3 == Value::X).count();
            more += wanted.1.len();

            let asked = Asked::of(&scenario);
            let part =
                |samples| run_samples_with_envelope(&scenario, &program, &asked, samples, 1, &Control::default());
            let mut merged = part(70..100);
            merged.merge(&part(0..31));
            merged.merge(&part(31..70));
            assert_eq!(merged.envelope.as_ref(), Some(&found), "{} split", case.name);
            // through a file and back
            let text = serde_json::to_string(&found).unwrap();
            assert_eq!(serde_json::from_str::<Envelope>(&text).unwrap(), found);
            // without those of some samples there is none
            merged.merge(&run_samples(&scenario, &program, &asked, 0..1, 1, &Control::default()));
            assert!(merged.envelope.is_none());
        }
    }
    assert!(
        edges > 3000 && unknown > 0 && more > 10,
        "{edges} edges, {unknown} to X, {more} with more than {MOST_EDGES}"
    );
}

/// The space has a bound, and what is left out is said.
#[test]
fn many_nets_and_steps_keep_what_fits() {
    let mut text = String::from("[inputs]\ntick = 0\n[gates]\n");
    for gate in 0..199 {
        text += &format!("g{gate} = {{ buf = [\"tick\"], delay = [1, 2] }}\n");
    }
    text += "[[clocks]]\nnet = \"tick\"\nfirst = 10\nperiod = 20\nhigh = 10\ncount = 1000\n";
    let (scenario, program) = read(&text, 1);
    let asked = Asked::of(&scenario);
    let tally = run_samples_with_envelope(&scenario, &program, &asked, 0..1, 1, &Control::default());
    let report = conclude(&scenario, &asked, &tally);
    let found = report.envelope.as_deref().unwrap();
    // 2^18 edges in all: 200 nets in 1310 of 2000 windows, one edge each
    assert_eq!((found.moments(), found.edges()), (1310, 1));
    let net = scenario.circuit.net("g7").unwrap();
    assert_eq!((found.of(1309, net).count(), found.of(1310, net).count()), (1, 0));
    let said = bundle::of_sweep(&scenario, &asked, &report).notes;
    assert!(said.contains(&"envelope.csv has the first 1310 of 2000 steps and clock edges.".to_string()), "{said:?}");
}

/// A sweep that was not asked for it has none.
#[test]
fn nothing_is_kept_unasked() {
    let (scenario, program) = read(BUFFER, 10);
    let asked = Asked::of(&scenario);
    let tally = run_samples(&scenario, &program, &asked, 0..10, 1, &Control::default());
    let report = conclude(&scenario, &asked, &tally);
    assert!(report.envelope.is_none());
    assert!(bundle::of_sweep(&scenario, &asked, &report).files.iter().all(|file| file.name != "envelope.csv"));
}

/// Figures that cannot be are refused when they are read.
#[test]
fn forged_envelopes_are_refused() {
    let (scenario, program) = read(BUFFER, 10);
    let sound = serde_json::to_value(envelope(&scenario, &program, 0..10, 1)).unwrap();
    assert!(serde_json::from_value::<Envelope>(sound.clone()).is_ok());
    for (place, value) in [
        ("/edges", serde_json::json!(65)),
        ("/edges", serde_json::json!(0)),
        ("/nets", serde_json::json!(u64::MAX)),
        ("/moments", serde_json::json!(1u64 << 40)),
        ("/seen/0/0", serde_json::json!(2)),
        ("/seen/1/1", serde_json::json!(192)),
        ("/seen/0/2", serde_json::json!(0)),
        ("/seen/1/3", serde_json::json!(u64::MAX)),
        ("/more", serde_json::json!([[5, 1]])),
    ] {
        let mut forged = sound.clone();
        *forged.pointer_mut(place).unwrap() = value;
        assert!(serde_json::from_value::<Envelope>(forged).is_err(), "{place}");
    }
}
