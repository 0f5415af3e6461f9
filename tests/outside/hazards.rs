//! Hazards and their cures against published cases and definitions.

use std::collections::HashMap;

use stillgate::circuit::{Circuit, Expr, Function, NetId};
use stillgate::control::Control;
use stillgate::flow::{Cause, FlowState, FlowTable, Hazard, Hazards, Reached, Transition, hazards};
use stillgate::logic::{Bits, Shape, State, Value};
use stillgate::statics::{Change, Race, ternary};

use super::networks::{self, Draw, circuit, owned, stable_by_trying};
use super::words_of_nets::cut;

/// Every stable state and every change of one input, and these steps (inputs that change) from every state.
fn table(circuit: &Circuit, steps: &[Vec<NetId>]) -> FlowTable {
    let states: Vec<FlowState> = stable_by_trying(circuit)
        .into_iter()
        .map(|values| FlowState { values: Bits::of(values.into_iter()), reachable: true, explored: true })
        .collect();
    let transition = |from: usize, moment, change| Transition {
        moment,
        from: from as u32,
        change,
        to: Reached::Exact { states: Vec::new(), cycles: 0, race: Race::None },
        essential: None,
        sure: true,
    };
    let mut table = FlowTable::default();
    for (from, state) in states.iter().enumerate() {
        table.single.extend(circuit.inputs().map(|net| transition(from, None, Change::of_one(&state.values, net))));
        table.steps.extend(steps.iter().zip(0..).map(|(nets, moment)| {
            let set = nets.iter().map(|net| (*net, !state.values.get(net.index()))).collect();
            transition(from, Some(moment), Change { set, apart: false })
        }));
    }
    table.states = states;
    table
}

fn of(circuit: &Circuit, watched: &[&str], steps: &[Vec<NetId>]) -> Hazards {
    let watched: Vec<NetId> = watched.iter().map(|name| circuit.net(name).unwrap()).collect();
    let found = hazards(circuit, &watched, &table(circuit, steps), &Control::default()).unwrap();
    assert!(!found.truncated);
    found
}

/// "f static-1 logic, a=0, 2 states, f | b & c".
fn told(circuit: &Circuit, hazard: &Hazard) -> String {
    let set: Vec<String> =
        hazard.change.set.iter().map(|(net, bit)| format!("{}={}", circuit.name(*net), u8::from(*bit))).collect();
    format!(
        "{} {} {}{}, {}, {} states, {}",
        circuit.name(hazard.net),
        hazard.shape.word(),
        hazard.cause.word(),
        if hazard.built { " if built" } else { "" },
        set.join(" "),
        hazard.states,
        hazard.cure.as_ref().map_or("no cure", |cure| &cure.expression),
    )
}

fn all_told(circuit: &Circuit, watched: &[&str]) -> Vec<String> {
    of(circuit, watched, &[]).list.iter().map(|hazard| told(circuit, hazard)).collect()
}

use Function::{And, Nand, Not, Or};

/// f = ab + a'c has a static-1 hazard while b = c = 1, and bc covers it: [PAGE
/// http://icblogs.blogspot.com/2004/09/static-hazards.html] (that page misprints the term). In ternary simulation f goes
/// to X, and with bc it does not [computed].
#[test]
fn consensus_term() {
    let gates: &[(&str, Function, &[&str])] =
        &[("n", Not, &["a"]), ("p", And, &["a", "b"]), ("q", And, &["n", "c"]), ("f", Or, &["p", "q"])];
    let plain = circuit(&["a", "b", "c"], gates);
    let want = ["f static-1 logic, a=0, 1 states, p | q | b & c", "f static-1 logic, a=1, 1 states, p | q | b & c"];
    assert_eq!(all_told(&plain, &["f"]), want);
    let found = of(&plain, &["f"], &[]);
    let literals = |hazard: &Hazard| hazard.cure.as_ref().unwrap().literals.clone();
    assert!(found.list.iter().all(|hazard| literals(hazard) == [(NetId(1), true), (NetId(2), true)]));

    let cured = circuit(
        &["a", "b", "c"],
        &[gates[0].clone(), gates[1].clone(), gates[2].clone(), ("r", And, &["b", "c"]), ("f", Or, &["p", "q", "r"])],
    );
    assert_eq!(all_told(&cured, &["f"]), [""; 0]);

    // the dual: (a + b)(a' + c) with b = c = 0
    let sums = circuit(
        &["a", "b", "c"],
        &[("n", Not, &["a"]), ("p", Or, &["a", "b"]), ("q", Or, &["n", "c"]), ("f", And, &["p", "q"])],
    );
    let want = ["f static-0 logic, a=0, 1 states, p & q & (b | c)", "f static-0 logic, a=1, 1 states, p & q & (b | c)"];
    assert_eq!(all_told(&sums, &["f"]), want);
}

/// The same function as one gate shows nothing; built of an AND for each product it does.
#[test]
fn expressions_and_multiplexers_if_built_of_several_gates() {
    let expr = |text: &str| Function::Expr(Expr::parse(text).unwrap());
    let one = circuit(&["a", "b", "c"], &[("f", expr("a & b | !a & c"), &["a", "b", "c"])]);
    let cure = "a & b | !a & c | b & c";
    let want = [0, 1].map(|bit| format!("f static-1 logic if built, a={bit}, 1 states, {cure}"));
    assert_eq!(all_told(&one, &["f"]), want);
    assert_eq!(all_told(&circuit(&["a", "b", "c"], &[("f", expr(cure), &["a", "b", "c"])]), &["f"]), [""; 0]);

    // behind another gate, too: select, value when 0, value when 1
    let mux = circuit(&["s", "l", "h"], &[("m", Function::Mux, &["s", "l", "h"]), ("f", Not, &["m"])]);
    let want = [0, 1].map(|bit| format!("f static-0 logic if built, s={bit}, 1 states, !m & (!l | !h)"));
    assert_eq!(all_told(&mux, &["f"]), want);
    let own = [0, 1].map(|bit| format!("m static-1 logic if built, s={bit}, 1 states, !s & l | s & h | l & h"));
    assert_eq!(all_told(&mux, &["m"]), own);

    // product of sums as written, and a hazard that the one gate has: its sources come late
    let sums = circuit(&["a", "b", "c"], &[("f", expr("(a | b) & (!a | c)"), &["a", "b", "c"])]);
    assert_eq!(all_told(&sums, &["f"])[0], "f static-0 logic if built, a=0, 1 states, (a | b) & (!a | c) & (b | c)");
    let late = circuit(&["a"], &[("n", Not, &["a"]), ("f", Function::Xor, &["a", "n"])]);
    let want = ["f static-1 logic, a=0, 1 states, no cure", "f static-1 logic, a=1, 1 states, no cure"];
    assert_eq!(all_told(&late, &["f"]), want, "the function is constant");
}

/// c17 has four single-input-change static hazards: output 22, static-1, input 3 either way while 1 = 2 = 6 = 1, with 7
/// at 0 or 1 [computed]. The netlist is in several public files. As 22 = 1·3 + 2·(3·6)', 1·2 covers them.
#[test]
fn static_hazards_of_c17() {
    let circuit = networks::c17();
    let found = of(&circuit, &["n22", "n23"], &[]);
    let statics: Vec<&Hazard> = found.list.iter().filter(|hazard| hazard.shape != Shape::Dynamic).collect();
    let told: Vec<String> = statics.iter().map(|hazard| told(&circuit, hazard)).collect();
    let want = [0, 1].map(|bit| format!("n22 static-1 logic, n3={bit}, 2 states, !(n10 & n16) | n1 & n2"));
    assert_eq!(told, want);
    assert_eq!(statics.iter().map(|hazard| hazard.states).sum::<u64>(), 4);
    let table = table(&circuit, &[]);
    for hazard in statics {
        let first = &table.states[hazard.from as usize].values;
        for name in ["n1", "n2", "n6"] {
            assert!(first.get(circuit.net(name).unwrap().index()), "{name}");
        }
    }
}

/// p = gd, q = g'f, f = p + q holds its bit in f while g = 0. When g falls with d = 1 the bit may be lost; the term df
/// keeps it [computed].
#[test]
fn d_latch_without_its_consensus_term() {
    let gates: &[(&str, Function, &[&str])] =
        &[("gn", Not, &["g"]), ("p", And, &["g", "d"]), ("q", And, &["gn", "f"]), ("f", Or, &["p", "q"])];
    let latch = circuit(&["g", "d"], gates);
    assert_eq!(latch.feedback(), [latch.net("f").unwrap()]);
    let want = ["f static-1 logic, g=0, 1 states, p | q | d & f", "f static-1 logic, g=1, 1 states, p | q | d & f"];
    assert_eq!(all_told(&latch, &[]), want);
    let cured = circuit(
        &["g", "d"],
        &[gates[0].clone(), gates[1].clone(), gates[2].clone(), ("r", And, &["d", "f"]), ("f", Or, &["p", "q", "r"])],
    );
    assert_eq!(all_told(&cured, &["f"]), [""; 0]);

    // with the loop cut at q the same pulse is a static-0 hazard of q: it is what takes the bit over, so that a term
    // that holds q at 0 would cure the hazard and kill the latch
    let other = circuit(&["g", "d"], &[gates[3].clone(), gates[0].clone(), gates[1].clone(), gates[2].clone()]);
    assert_eq!(other.feedback(), [other.net("q").unwrap()]);
    assert_eq!(
        all_told(&other, &[]),
        ["q static-0 logic, g=0, 1 states, no cure", "q static-0 logic, g=1, 1 states, no cure"]
    );
}

/// The divide-by-two table with rows 00, 01, 11, 10 for y1y2: Y1 = x'y2 + x y1 + y1y2 and Y2 = x y1' + x'y2 + y1'y2 are
/// free of hazards; without the last product of each they are not [computed].
#[test]
fn covers_of_the_divide_by_two_table() {
    let products: &[(&str, Function, &[&str])] = &[
        ("nx", Not, &["x"]),
        ("ny1", Not, &["y1"]),
        ("a", And, &["nx", "y2"]),
        ("b", And, &["x", "y1"]),
        ("c", And, &["y1", "y2"]),
        ("d", And, &["x", "ny1"]),
        ("e", And, &["ny1", "y2"]),
    ];
    let with = |y1: &'static [&'static str], y2: &'static [&'static str]| {
        let mut gates = products.to_vec();
        gates.extend([("y1", Or, y1), ("y2", Or, y2)]);
        circuit(&["x"], &gates)
    };
    let free = with(&["a", "b", "c"], &["d", "a", "e"]);
    assert_eq!(free.feedback().len(), 2);
    assert_eq!(all_told(&free, &["y1", "y2"]), [""; 0]);
    let bare = with(&["a", "b"], &["d", "a"]);
    // x rises at 11, falls at 01: the two moves of the table in which that variable has to stay
    let want =
        ["y1 static-1 logic, x=1, 1 states, a | b | y1 & y2", "y2 static-1 logic, x=0, 1 states, d | a | !y1 & y2"];
    assert_eq!(all_told(&bare, &["y1", "y2"]), want);
}

/// The gauge selector and its twin of the demonstrations: the cure is the twin's term.
#[test]
fn the_selectors_of_the_demonstrations() {
    let read = |name: &str| {
        let path = format!("{}/scenarios/{name}.toml", env!("CARGO_MANIFEST_DIR"));
        stillgate::reader::read(&std::fs::read_to_string(path).unwrap(), name).unwrap().scenario
    };
    let (selector, cured) = (read("selector"), read("selector-cured"));
    let found = of(&selector.circuit, &["level"], &[]);
    let cure = "from_upper | from_lower | gauge_upper & gauge_lower";
    let want = [0, 1].map(|bit| format!("level static-1 logic, choose_upper={bit}, 1 states, {cure}"));
    assert_eq!(found.list.iter().map(|hazard| told(&selector.circuit, hazard)).collect::<Vec<_>>(), want);
    let twin = &cured.circuit;
    let both = twin.driver(twin.net("both").unwrap()).unwrap();
    let term: Vec<&str> = twin.pins(both).iter().map(|net| twin.name(*net)).collect();
    assert_eq!((twin.function(both), term), (&And, vec!["gauge_upper", "gauge_lower"]));
    assert_eq!(all_told(twin, &["level"]), [""; 0]);
}

/// Every order in which the inputs may change, one at a time: the most changes of the function.
fn most_in_any_order(value: &dyn Fn(u32) -> bool, from: u32, moving: u32) -> u32 {
    fn walk(value: &dyn Fn(u32) -> bool, at: u32, left: u32, known: &mut HashMap<(u32, u32), u32>) -> u32 {
        if let Some(most) = known.get(&(at, left)) {
            return *most;
        }
        let next = |bit: u32| {
            let to = at ^ (1 << bit);
            (bit, to, u32::from(value(at) != value(to)))
        };
        let steps: Vec<_> = (0..32).filter(|bit| left >> bit & 1 == 1).map(next).collect();
        let most = steps.into_iter().map(|(bit, to, one)| one + walk(value, to, left & !(1 << bit), known)).max();
        known.insert((at, left), most.unwrap_or(0));
        most.unwrap_or(0)
    }
    walk(value, from, moving, &mut HashMap::new())
}

/// Sums of products. Function hazard: the function itself does more than it must on the way (static: it is not constant
/// on the subcube between the ends). Static-1 logic hazard: no function hazard, and no single product covers the subcube;
/// static-0 logic hazards need a product with a net and its inverse. Eichelberger 1965, as on [PAGE
/// https://courses.e-ce.uth.gr/CE664/handouts-html/L7-Hazards_files/slide0005.htm].
#[test]
fn two_level_networks_by_the_definitions() {
    const INPUTS: usize = 4;
    let mut draw = Draw(0x50_50);
    let (mut functions, mut logics, mut cures) = ([0; 3], 0, 0);
    for case in 0..60 {
        // products as (inputs read, their values)
        let products: Vec<(u32, u32)> = (0..2 + draw.below(3))
            .map(|_| {
                let read = (1 + draw.below((1 << INPUTS) - 1)) as u32;
                (read, draw.below(1 << INPUTS) as u32 & read)
            })
            .collect();
        let value = |row: u32| products.iter().any(|(read, bits)| row & read == *bits);
        let names: Vec<String> = (0..INPUTS).map(|i| format!("i{i}")).collect();
        let mut gates: Vec<(String, Function, Vec<String>)> =
            names.iter().map(|name| (format!("n{name}"), Not, vec![name.clone()])).collect();
        for (at, (read, bits)) in products.iter().enumerate() {
            let mut pins: Vec<String> = (0..INPUTS)
                .filter(|i| read >> i & 1 == 1)
                .map(|i| if bits >> i & 1 == 1 { names[i].clone() } else { format!("n{}", names[i]) })
                .collect();
            let function = if pins.len() == 1 { Function::Buf } else { And };
            pins.truncate(INPUTS);
            gates.push((format!("p{at}"), function, pins));
        }
        gates.push(("f".into(), Or, (0..products.len()).map(|at| format!("p{at}")).collect()));
        let circuit = owned(&names.iter().map(String::as_str).collect::<Vec<_>>(), &gates);
        // every set of inputs that may change, as a step
        let sets: Vec<u32> = (1..1 << INPUTS).collect();
        let steps: Vec<Vec<NetId>> =
            sets.iter().map(|set| (0..INPUTS as u32).filter(|i| set >> i & 1 == 1).map(NetId).collect()).collect();
        let found = of(&circuit, &["f"], &steps);
        assert_eq!(found.not_judged, 0);
        for (moment, set) in sets.iter().enumerate() {
            let mut want: HashMap<(Shape, Cause), u64> = HashMap::new();
            for row in 0..1u32 << INPUTS {
                let (before, after) = (value(row), value(row ^ set));
                let shape = match (before, after) {
                    (false, false) => Shape::Static0,
                    (true, true) => Shape::Static1,
                    _ => Shape::Dynamic,
                };
                let by_function = most_in_any_order(&value, row, *set) > 1;
                let covered = products.iter().any(|(read, bits)| row & read == *bits && read & set == 0);
                let cause = match shape {
                    _ if by_function => Cause::Function,
                    Shape::Static1 if !covered => Cause::Logic,
                    // dynamic logic hazards have no such short definition
                    _ => continue,
                };
                if cause == Cause::Function {
                    functions[shape as usize] += 1;
                } else {
                    logics += 1;
                }
                *want.entry((shape, cause)).or_default() += 1;
            }
            let mut have: HashMap<(Shape, Cause), u64> = HashMap::new();
            for hazard in found.list.iter().filter(|hazard| hazard.moment == Some(moment as u32)) {
                if (hazard.shape, hazard.cause) != (Shape::Dynamic, Cause::Logic) {
                    *have.entry((hazard.shape, hazard.cause)).or_default() += hazard.states;
                }
                if let Some(cure) = &hazard.cure {
                    cures += 1;
                    check_cure(&cure.literals, &value, *set);
                }
            }
            assert_eq!(have, want, "case {case}: {products:?}, {set:b} change");
        }
    }
    assert!(functions.iter().all(|times| *times > 100) && logics > 100 && cures > 30, "{functions:?} {logics} {cures}");
}

/// A cure is a product within the function that no longer is one if a literal is left out, and reads nothing that changes.
fn check_cure(literals: &[(NetId, bool)], value: &dyn Fn(u32) -> bool, moving: u32) {
    assert!(literals.iter().all(|(net, _)| moving >> net.0 & 1 == 0));
    let within = |skip: Option<usize>| {
        (0..16u32).all(|row| {
            let holds =
                literals.iter().enumerate().all(|(at, (net, bit))| Some(at) == skip || (row >> net.0 & 1 == 1) == *bit);
            !holds || value(row)
        })
    };
    assert!(within(None));
    assert!((0..literals.len()).all(|skip| !within(Some(skip))), "prime");
}

#[test]
fn function_hazards_of_well_known_gates() {
    // common practice, no source: inputs that cross at an AND, and parities
    let circuit = circuit(
        &["a", "b", "c"],
        &[("and", And, &["a", "b"]), ("nand", Nand, &["a", "b"]), ("odd", Function::Xor, &["a", "b", "c"])],
    );
    let [a, b, c] = [0, 1, 2].map(NetId);
    let found = of(&circuit, &["and", "nand", "odd"], &[vec![a, b], vec![a, b, c]]);
    let told: Vec<String> = found
        .list
        .iter()
        .map(|h| format!("{} {} {} {:?} {}", circuit.name(h.net), h.shape.word(), h.cause.word(), h.moment, h.states))
        .collect();
    let want = [
        // a and b cross, either way, with either value of c
        "and static-0 function Some(0) 4",
        "nand static-1 function Some(0) 4",
        "odd static-0 function Some(0) 4",
        "odd static-1 function Some(0) 4",
        "and static-0 function Some(1) 4",
        "nand static-1 function Some(1) 4",
        "odd dynamic function Some(1) 8",
    ];
    assert_eq!(told, want);
}

/// Random networks with loops, every stable state and single-input change: static hazards by ternary simulation of the
/// network with its feedback nets cut; cures by trying all values of its sources.
#[test]
fn random_networks_by_ternary_simulation_and_by_trying() {
    let mut draw = Draw(0x4a2a_4d00);
    let (mut statics, mut cures, mut dynamics, mut if_built) = (0, 0, 0, 0);
    for case in 0..300 {
        let (inputs, gates) = (2 + draw.below(3), 3 + draw.below(6));
        let circuit = draw.network(inputs, gates, gates);
        let names: Vec<&str> = circuit.gates().map(|gate| circuit.name(circuit.net_of(gate))).collect();
        let found = of(&circuit, &names, &[]);
        let table = table(&circuit, &[]);
        let (network, shifted) = cut(&circuit);
        let sources = inputs + circuit.feedback().len();
        // the values of all nets of the cut network for all values of its sources
        let rows: Vec<Bits> = (0..1usize << sources)
            .map(|row| {
                let mut full = Bits::of((0..network.net_count()).map(|net| net < sources && row >> net & 1 == 1));
                for gate in network.evaluation_order() {
                    let value = network.wants(*gate, |net| full.get(net.index()));
                    full.set(network.net_of(*gate).index(), value);
                }
                full
            })
            .collect();
        let seen = |net: NetId| match circuit.feedback().iter().position(|cut| *cut == net) {
            Some(at) => inputs + at,
            None => shifted(net).index(),
        };
        let row_of = |state: &Bits| {
            let source = |at: usize| if at < inputs { NetId(at as u32) } else { circuit.feedback()[at - inputs] };
            (0..sources).map(|at| usize::from(state.get(source(at).index())) << at).sum::<usize>()
        };

        let mut want: HashMap<(NetId, bool, (NetId, bool)), u64> = HashMap::new();
        for transition in &table.single {
            let state = &table.states[transition.from as usize].values;
            let row = row_of(state);
            let moved = transition.change.set[0];
            let mut spread = State::known(rows[row].clone());
            spread.set(moved.0.index(), Value::X);
            ternary::spread(&network, &mut spread);
            for gate in circuit.gates() {
                let net = circuit.net_of(gate);
                let there = shifted(net).index();
                let (before, after) = (rows[row].get(there), rows[row ^ (1 << moved.0.0)].get(there));
                if before == after && spread.get(there) == Value::X {
                    *want.entry((net, before, moved)).or_default() += 1;
                }
            }
        }
        let mut have = HashMap::new();
        for hazard in &found.list {
            assert_eq!((hazard.cause, hazard.moment), (Cause::Logic, None), "one input has no function hazard");
            if hazard.shape == Shape::Dynamic {
                dynamics += 1;
                assert_eq!(hazard.cure, None);
                continue;
            }
            let one = hazard.shape == Shape::Static1;
            let moved = hazard.change.set[0];
            if hazard.built {
                if_built += 1;
            } else {
                statics += 1;
                *have.entry((hazard.net, one, moved)).or_default() += hazard.states;
            }
            let Some(cure) = &hazard.cure else { continue };
            cures += 1;
            let context = || format!("case {case}: {}", told(&circuit, hazard));
            let state = &table.states[hazard.from as usize].values;
            let holds = |full: &dyn Fn(NetId) -> bool| cure.literals.iter().all(|(net, bit)| full(*net) == *bit);
            assert!(holds(&|net| state.get(net.index())), "{}", context());
            assert!(cure.literals.iter().all(|(net, _)| *net != moved.0), "{}", context());
            let expr = Expr::parse(&cure.expression).unwrap();
            for full in &rows {
                let value = full.get(shifted(hazard.net).index());
                assert!(!holds(&|net| full.get(seen(net))) || value == one, "{}", context());
                let pins =
                    expr.nets().iter().map(|name| full.get(seen(circuit.net(name).unwrap()))).collect::<Vec<_>>();
                assert_eq!(expr.value(&pins), value, "{}", context());
            }
        }
        assert_eq!(have, want, "case {case}");
    }
    let met = [statics, cures, dynamics, if_built];
    assert!(met.iter().all(|times| *times > 30), "{met:?}");
}
