//! A test's world as a scenario file, so that a failing case can be looked at by itself.

use std::fmt::Write as _;

use stillgate::circuit::Function;
use stillgate::delay::DelayRange;
use stillgate::scenario::{Begin, Place};

use super::world::World;

fn range(range: DelayRange) -> String {
    format!("[{}, {}]", range.min.fs(), range.max.fs())
}

fn bits(set: impl Iterator<Item = (String, bool)>) -> String {
    let all: Vec<String> = set.map(|(name, bit)| format!("{name} = {}", u8::from(bit))).collect();
    format!("{{ {} }}", all.join(", "))
}

/// The world, beginning with these values of the gates.
pub fn scenario(world: &World, start: &[bool]) -> String {
    let mut text = String::from("unit = \"fs\"\n");
    if !matches!(world.begin, Begin::AtRest { .. }) {
        text += "begin = \"random\"\n";
    }
    text += "[inputs]\n";
    for (name, bit) in &world.inputs {
        let _ = writeln!(text, "{name} = {}", u8::from(*bit));
    }
    text += "[initial]\n";
    for (gate, bit) in world.gates.iter().zip(start) {
        let _ = writeln!(text, "{} = {}", gate.name, u8::from(*bit));
    }
    text += "[gates]\n";
    for gate in &world.gates {
        let function = match &gate.function {
            Function::Expr(expr) => format!("expr = \"{}\"", expr.text()),
            listed => {
                let pins: Vec<String> = gate.pins.iter().map(|pin| format!("\"{pin}\"")).collect();
                format!("{} = [{}]", listed.name(), pins.join(", "))
            }
        };
        let [fall, rise] = gate.delay.map(range);
        let wires: Vec<String> = (world.wires.iter())
            .filter(|wire| wire.1 == gate.name)
            .map(|(net, _, [fall, rise])| format!("{net} = {{ rise = {}, fall = {} }}", range(*rise), range(*fall)))
            .collect();
        let wires = if wires.is_empty() { String::new() } else { format!(", wires = {{ {} }}", wires.join(", ")) };
        let _ = writeln!(text, "{} = {{ {function}, rise = {rise}, fall = {fall}{wires} }}", gate.name);
    }
    for (step, set) in world.steps.iter().zip(&world.set) {
        text += "[[steps]]\n";
        let _ = match &step.place {
            Place::At(at) => writeln!(text, "at = {}", range(*at)),
            Place::After(wait) => writeln!(text, "after = {}", range(*wait)),
            Place::Rest(wait) => writeln!(text, "rest = {}", wait.fs()),
            Place::When { pattern, wait, timeout } => {
                let name = |net: usize| match world.inputs.get(net) {
                    Some(input) => input.0.clone(),
                    None => world.gates[net - world.inputs.len()].name.clone(),
                };
                let pattern = bits(pattern.iter().map(|(net, bit)| (name(net.index()), *bit)));
                let timeout = timeout.map_or(String::new(), |timeout| format!("timeout = {}\n", timeout.fs()));
                write!(text, "when = {pattern}\nwait = {}\n{timeout}", range(*wait))
            }
        };
        if let Some(bounce) = &step.bounce {
            let (least, most) = bounce.pulses;
            let _ = writeln!(text, "bounce = {{ lasting = {}, pulses = [{least}, {most}] }}", range(bounce.lasting));
        }
        if let Some(skew) = step.skew {
            let _ = writeln!(text, "skew = {}", range(skew));
        }
        let _ = writeln!(text, "set = {}", bits(set.iter().cloned()));
    }
    text
}
