//! `[firings]` of a case: delays of gates that differ from firing to firing.

use std::fmt::Write;

use super::key;
use crate::circuit::GateId;
use crate::delay::{DelayRange, Together};
use crate::instance::{Anew, Firings};
use crate::scenario::Scenario;
use crate::time::Decimal;

/// The section of a case's firings.
pub(super) fn firings(firings: &Firings, scenario: &Scenario) -> String {
    let circuit = &scenario.circuit;
    let name = |gate: GateId| key(circuit.name(circuit.net_of(gate)));
    let mut text = String::new();
    match firings {
        Firings::Drawn(drawn) => {
            write_to(&mut text, format_args!("\n[firings]\ndraw = \"{}\"\n\n[firings.drawn]", drawn.draw.name()));
            for (gate, anew) in circuit.gates().zip(&drawn.gates) {
                write_to(&mut text, format_args!("{} = {{ {} }}", name(gate), of_gate(anew, scenario)));
            }
        }
        Firings::Given(given) => {
            text += "\n[firings.given]\n";
            let mut last = None;
            for ((gate, firing), edges) in given {
                if last != Some(gate) {
                    write_to(&mut text, format_args!("\n[firings.given.{}]", name(*gate)));
                    last = Some(gate);
                }
                let [fall, rise] = edges.map(|span| span.decimal(scenario.unit));
                write_to(&mut text, format_args!("{firing} = {{ rise = {rise}, fall = {fall} }}"));
            }
        }
    }
    text
}

fn write_to(text: &mut String, line: std::fmt::Arguments<'_>) {
    text.write_fmt(line).expect("a string takes all text");
    text.push('\n');
}

fn of_gate(anew: &Anew, scenario: &Scenario) -> String {
    let range = |it: DelayRange| {
        let [min, typ, max] = [it.min, it.typ, it.max].map(|span| span.decimal(scenario.unit));
        format!("[{min}, {typ}, {max}]")
    };
    let [fall, rise] = anew.ranges.map(range);
    let mut text = format!("key = {:#018x}, rise = {rise}, fall = {fall}", anew.key);
    if anew.one_draw {
        text += ", one_draw = true";
    }
    if let Some((how, common)) = anew.group {
        text += &match how {
            Together::Tracking(rho) => format!(", tracking = {rho}"),
            Together::Scale { least, greatest, mismatch } => {
                format!(", scale = [{least}, {greatest}], mismatch = {mismatch}")
            }
        };
        text += &format!(", common = {common:#018x}");
    }
    if anew.moved != [0, 0] {
        let [fall, rise] = anew.moved.map(|fs| Decimal::new(i128::from(fs), scenario.unit));
        text += &format!(", moved = {{ rise = {rise}, fall = {fall} }}");
    }
    text
}
