//! The file of one concrete case: everything needed to run it again with its scenario.

mod firings;

use std::fmt::Write;

use crate::instance::Instance;
use crate::scenario::{Begin, Place, Scenario};
use crate::time::{Decimal, Span};

/// Times of a list in one line of the file.
const IN_A_LINE: usize = 12;

/// A case of a scenario as TOML, in the scenario's unit and exact;
/// [`read_instance`](crate::reader::read_instance) gives the same case back.
///
/// Panics if the case belongs to another scenario and lacks one of its gates, wires, steps or clocks.
pub fn write_instance(instance: &Instance, scenario: &Scenario) -> String {
    let (circuit, stimulus) = (&*scenario.circuit, &*scenario.stimulus);
    let mut text = String::new();
    let mut line = |arguments: std::fmt::Arguments<'_>| {
        text.write_fmt(arguments).expect("a string takes all text");
        text.push('\n');
    };
    let time = |span: Span| span.decimal(scenario.unit);
    let edges = |[fall, rise]: [Span; 2]| format!("rise = {}, fall = {}", time(rise), time(fall));

    line(format_args!("# one concrete case of: {}", one_line(&scenario.title)));
    line(format_args!("format = 1"));
    line(format_args!("kind = \"instance\""));
    line(format_args!("time_unit = \"{}\"", scenario.unit));

    line(format_args!("\n[gates]"));
    for gate in circuit.gates() {
        let name = key(circuit.name(circuit.net_of(gate)));
        line(format_args!("{name} = {{ {} }}", edges(instance.delays.gate[gate.index()])));
    }
    if let Some(firings) = &instance.firings {
        line(format_args!("{}", firings::firings(firings, scenario).trim_end()));
    }
    for (w, (net, gate)) in circuit.wires().iter().enumerate() {
        let (from, to) = (quoted(circuit.name(*net)), quoted(circuit.name(circuit.net_of(*gate))));
        let [fall, rise] = instance.delays.wire[w].map(time);
        line(format_args!("\n[[wires]]\nfrom = {from}\nto = {to}\nrise = {rise}\nfall = {fall}"));
    }
    if !stimulus.steps.is_empty() {
        line(format_args!("\n[steps]"));
    }
    for (s, step) in stimulus.steps.iter().enumerate() {
        let word = match step.place {
            Place::At(_) => "at",
            Place::After(_) => "after",
            Place::Rest(_) => "rest",
            Place::When { .. } => "wait",
        };
        let skew = match step.skew.is_some() || !instance.skews[s].is_empty() {
            true => format!(", skew = {}", list(instance.skews[s].iter().map(|skew| time(*skew)))),
            false => String::new(),
        };
        let bounce = match step.bounce {
            Some(_) => {
                let each = instance.bounces[s].iter().map(|it| list(it.iter().map(|toggle| time(*toggle))));
                format!(", bounce = [{}]", each.collect::<Vec<_>>().join(", "))
            }
            None => String::new(),
        };
        line(format_args!("{} = {{ {word} = {}{skew}{bounce} }}", quoted(&step.label), time(instance.places[s])));
    }
    if !stimulus.clocks.is_empty() {
        line(format_args!("\n[clocks]"));
    }
    for (clock, case) in stimulus.clocks.iter().zip(&instance.clocks) {
        let jitter = if clock.jitter == Span::ZERO && case.jitter.is_empty() {
            String::new()
        } else {
            let signed = case.jitter.iter().map(|fs| Decimal::new(i128::from(*fs), scenario.unit));
            format!(", jitter = {}", list(signed))
        };
        let [first, period, high] = [case.first, case.period, case.high].map(time);
        let name = key(circuit.name(clock.net));
        line(format_args!("{name} = {{ first = {first}, period = {period}, high = {high}{jitter} }}"));
    }
    if scenario.begin == Begin::Random {
        line(format_args!("\n[start]"));
        for gate in circuit.gates() {
            let name = key(circuit.name(circuit.net_of(gate)));
            line(format_args!("{name} = {}", u8::from(instance.start.get(gate.index()))));
        }
    }
    text
}

/// Some times in brackets, broken into lines if they are many.
fn list(times: impl ExactSizeIterator<Item = Decimal>) -> String {
    let long = times.len() > IN_A_LINE;
    let mut text = String::from("[");
    for (i, time) in times.enumerate() {
        let before = match i {
            _ if long && i.is_multiple_of(IN_A_LINE) => ",\n  ",
            _ => ", ",
        };
        text += if i == 0 { before.trim_start_matches([',', ' ']) } else { before };
        text += &time.to_string();
    }
    text + if long { "\n]" } else { "]" }
}

/// A key of TOML: bare where it may be, else quoted.
fn key(name: &str) -> String {
    let bare = |c: char| c.is_ascii_alphanumeric() || c == '_' || c == '-';
    if !name.is_empty() && name.chars().all(bare) { name.to_string() } else { quoted(name) }
}

/// A basic string of TOML.
fn quoted(text: &str) -> String {
    let mut quoted = String::from("\"");
    for letter in text.chars() {
        match letter {
            '"' => quoted += "\\\"",
            '\\' => quoted += "\\\\",
            '\n' => quoted += "\\n",
            '\t' => quoted += "\\t",
            c if c.is_control() => quoted += &format!("\\u{:04X}", u32::from(c)),
            c => quoted.push(c),
        }
    }
    quoted + "\""
}

/// A title for a comment.
fn one_line(text: &str) -> String {
    text.chars().map(|c| if c.is_control() { ' ' } else { c }).collect()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::instance::Which;
    use crate::reader::{self, read_instance};

    const ODD: &str = r#"
begin = "random"
time_unit = "ps"
[inputs]
"bus[0]" = 0
"clk.main" = 1
[gates]
"u1.q" = { nand = ["bus[0]", "qn"], delay = [5, 9], wires = { "bus[0]" = [1, 3] } }
qn = { nand = ["clk.main", "u1.q"], rise = ["7 fs", 20], fall = 12.345 }
[[steps]]
label = "a \"quoted\" step \\ with\ttabs and ü"
at = [100, 900]
set = { "bus[0]" = 1 }
[[steps]]
when = { qn = 1, "u1.q" = 0 }
wait = [0, 7]
timeout = 500
set = { "bus[0]" = 0 }
bounce = { lasting = [1, 20], pulses = [0, 30] }
[[steps]]
times = 3
steps = [ { after = [50, 70], set = { "bus[0]" = 0 }, skew = [0, 5], bounce = { lasting = 9, pulses = [1, 5] } }, { set = { "bus[0]" = 1 } } ]
[[clocks]]
net = "clk.main"
first = [0, 10]
period = [40, 50]
high = [15, 20]
jitter = 3.5
count = 5
"#;

    #[test]
    fn a_written_case_is_read_back_as_it_was() {
        let complete = include_str!("../../tests/cases/complete.toml");
        for text in [complete, ODD] {
            let scenario = reader::read(text, "case.toml").unwrap_or_else(|faults| panic!("{faults}")).scenario;
            for which in [Which::Typ, Which::Min, Which::Max, Which::Sample(0), Which::Sample(77)] {
                let instance = Instance::of(&scenario, &which);
                let written = write_instance(&instance, &scenario);
                let read =
                    read_instance(&written, "case", &scenario).unwrap_or_else(|faults| panic!("{faults}{written}"));
                assert_eq!(read, instance, "{which:?}\n{written}");
            }
        }
    }

    #[test]
    fn what_a_case_lacks_or_has_too_much_is_reported() {
        let scenario = reader::read(ODD, "case.toml").unwrap_or_else(|faults| panic!("{faults}")).scenario;
        let written = write_instance(&Instance::of(&scenario, &Which::Sample(3)), &scenario);
        let line_of = |start: &str| {
            let line = written.lines().find(|line| line.starts_with(start));
            line.unwrap_or_else(|| panic!("no line {start} in\n{written}")).to_string()
        };
        let gate = line_of("qn = { rise");
        let loop_step = line_of("\"step 3 #1\"");
        let clock = line_of("\"clk.main\" = ");
        let bounce = |lists: &str| format!("\"step 3 #1\" = {{ after = 50, skew = [0], bounce = {lists} }}");
        let cases = [
            (gate.clone(), String::new(), "`gates` of the case lacks `qn`"),
            (gate.clone(), format!("{gate}\nqm = {{ rise = 1, fall = 1 }}"), "the scenario has no gate `qm`"),
            (gate.clone(), "qn = { rise = 0, fall = 1 }".into(), "`rise` of 0 is not possible"),
            (gate.clone(), "qn = { rise = 1 }".into(), "gate `qn` lacks `fall`"),
            (gate.clone(), "qn = { rise = 1, fall = \"1 yd\" }".into(), "`yd` is no unit of time"),
            (gate, "qn = { rise = 1, fall = 1, fell = 1 }".into(), "unknown key `fell` in gate `qn`"),
            ("from = \"bus[0]\"".into(), "from = \"qn\"".into(), "no wire with a delay from `qn` to `u1.q`"),
            (loop_step.clone(), String::new(), "`steps` of the case lacks `step 3 #1`"),
            (loop_step.clone(), loop_step.replace("after", "at"), "`at` does not place step `step 3 #1`"),
            (
                loop_step.clone(),
                "\"step 3 #1\" = { after = 50, skew = [0, 1], bounce = [[]] }".into(),
                "the skew has 2 times, not 1",
            ),
            (loop_step.clone(), "\"step 3 #1\" = { after = 50 }".into(), "step `step 3 #1` lacks `skew`"),
            (loop_step.clone(), "\"step 3 #1\" = { after = 50, skew = [0] }".into(), "step `step 3 #1` lacks `bounce`"),
            (loop_step.clone(), bounce("[]"), "the bounce has 0 lists, not 1"),
            (loop_step.clone(), bounce("[[1]]"), "toggles an odd number of times"),
            (loop_step, bounce("[[2, 1]]"), "its toggles are not in order"),
            (clock.clone(), clock.replace("high = ", "high = 9"), "is high for its whole period"),
            (clock.clone(), clock.replace("jitter = [", "jitter = [[], "), "the jitter has 11 times, not 10"),
            (clock, "clck = { first = 1 }".into(), "the scenario has no clock `clck`"),
            ("qn = 0".into(), "qn = 2".into(), "expected 0 or 1, found 2"),
            ("format = 1".into(), "format = 2".into(), "format 2 is not known"),
            ("kind = \"instance\"".into(), "kind = \"scenario\"".into(), "has no meaning here"),
            ("time_unit = \"ps\"".into(), "time_unit = \"pt\"".into(), "`pt` has no meaning here"),
        ];
        for (old, new, fragment) in cases {
            let old = if old == "qn = 0" && !written.contains("\nqn = 0") { "qn = 1".into() } else { old };
            let wrong = written.replacen(&format!("\n{old}"), &format!("\n{new}"), 1);
            assert_ne!(wrong, written, "{old} stands in\n{written}");
            match read_instance(&wrong, "case", &scenario) {
                Ok(_) => panic!("`{new}` was taken, expected: {fragment}"),
                Err(found) => {
                    assert!(found.items().iter().any(|item| item.message.contains(fragment)), "{fragment}\n{found}");
                }
            }
        }
    }

    #[test]
    fn a_step_may_not_come_before_the_one_before_it() {
        let text = "[inputs]\na = 0\nb = 0\n[gates]\nq = { and = [\"a\", \"b\"] }\n\
            [[steps]]\nat = 10\nset = { a = 1, b = 1 }\nskew = [0, 5]\n[[steps]]\nat = [15, 30]\nset = { a = 0 }\n";
        let scenario = reader::read(text, "case.toml").unwrap_or_else(|faults| panic!("{faults}")).scenario;
        let mut instance = Instance::of(&scenario, &Which::Min);
        instance.skews[0] = vec![Span::ZERO, Span::from_fs(5_000_000)];
        let written = write_instance(&instance, &scenario);
        assert_eq!(read_instance(&written, "case", &scenario).ok(), Some(instance));
        let early = written.replace("at = 15", "at = 14.999999");
        let found = read_instance(&early, "case", &scenario).expect_err("a step too early");
        assert!(found.items()[0].message.contains("comes before the inputs"), "{found}");
    }
}
