//! Which single-input changes the steps make, and a walk that makes them all.

use stillgate::control::Control;
use stillgate::flow::Coverage;
use stillgate::review;
use stillgate::scenario::Scenario;

fn demonstration(change: impl Fn(&str) -> String) -> Scenario {
    let file = std::path::Path::new(env!("CARGO_MANIFEST_DIR")).join("scenarios/interlock.toml");
    let text = change(&std::fs::read_to_string(file).unwrap());
    stillgate::reader::read(&text, "interlock").unwrap_or_else(|it| panic!("{}", it.render(false))).scenario
}

/// The changes that are never made, as `inputs: which changes`.
fn missing(scenario: &Scenario) -> (Coverage, Vec<String>) {
    let flow = review::states(scenario, &Control::default()).unwrap().flow;
    let name = |(state, input): &(u32, _)| {
        let values = &flow.table.states[*state as usize].values;
        let nets = scenario.circuit.inputs().chain(scenario.outputs.iter().copied());
        let bits: String = nets.map(|net| if values.get(net.index()) { '1' } else { '0' }).collect();
        format!("{bits}: {}", scenario.circuit.name(*input))
    };
    let named = flow.coverage.missing.iter().map(name).collect();
    (flow.coverage, named)
}

#[test]
fn the_interlock_names_the_single_changes_that_its_steps_leave_out() {
    let (coverage, mut named) = missing(&demonstration(str::to_string));
    // call_upper, call_lower, open_upper, open_lower, green: five states, two inputs. The steps make four of the ten
    // changes: upper calls, lower calls too, upper lets go, lower lets go
    assert_eq!((coverage.all, coverage.exercised), (10, 4));
    named.sort();
    let left = [
        "00000: call_lower", // lower calls first
        "01011: call_upper", // upper calls while lower has it
        "10101: call_upper", // upper lets go while nobody waits
        "11011: call_upper", // upper gives up waiting
        "11011: call_lower", // lower lets go while upper waits
        "11101: call_lower", // lower gives up waiting
    ];
    let mut left: Vec<String> = left.map(String::from).into();
    left.sort();
    assert_eq!(named, left);
    assert!(coverage.perhaps.is_empty() && !coverage.truncated);
}

#[test]
fn the_walk_over_every_single_change_closes_the_gap() {
    let scenario = demonstration(|text| {
        let (head, rest) = text.split_once("[[steps]]").unwrap();
        let rules = &rest[rest.find("[rules]").unwrap()..];
        format!("stimulus = \"every single change\"\n{head}{rules}")
    });
    assert!(scenario.not_analysed.is_empty(), "{:?}", scenario.not_analysed);
    let (coverage, named) = missing(&scenario);
    assert_eq!((coverage.all, coverage.exercised), (10, 10));
    assert!(named.is_empty(), "{named:?}");
    let program = stillgate::engine::Program::new(&scenario, &Control::default()).unwrap();
    let mut few = scenario.clone();
    few.plan.samples = 200;
    let review = review::review(&few, &program, 1, &Control::default()).unwrap();
    assert!(review.sweep.windows.iter().all(|window| window.settled == 200));
}
