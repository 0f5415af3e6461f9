//! `[firings]` of a case: delays of gates that differ from firing to firing.

use std::collections::BTreeMap;
use std::ops::Range;

use toml::de::DeTable;

use super::super::walk::{Value, Walk};
use super::{Case, lacks, place_of, section};
use crate::circuit::GateId;
use crate::delay::{Billionths, DelayRange, Marginal, Together};
use crate::instance::{Anew, Drawn, Firings};
use crate::time::Span;

const KEYS: [&str; 3] = ["draw", "drawn", "given"];
const GATE_KEYS: [&str; 9] = ["key", "rise", "fall", "one_draw", "tracking", "scale", "mismatch", "common", "moved"];

impl Case<'_> {
    pub(super) fn firings(&self, walk: &mut Walk, value: Option<&Value<'_>>) -> Option<Firings> {
        let section = section(walk, value, "firings", false)?;
        let part = |name: &str| section.iter().find(|(key, _)| key.get_ref() == name).map(|(_, value)| value);
        for (key, _) in section.iter() {
            if !KEYS.contains(&key.get_ref().as_ref()) {
                walk.unknown_key(key, &KEYS, "[firings]");
            }
        }
        let place = value.map_or(0..0, toml::Spanned::span);
        match (part("drawn"), part("given")) {
            (Some(drawn), None) => {
                let draw = match part("draw") {
                    Some(value) => walk.word(value, &Marginal::ALL.map(|draw| (draw.name(), draw))),
                    None => {
                        walk.missing(place, "draw", "[firings]", "\"uniform\"");
                        None
                    }
                };
                let gates = self.drawn(walk, drawn);
                Some(Firings::Drawn(Drawn { draw: draw?, gates: gates? }))
            }
            (None, Some(given)) => {
                if let Some((key, _)) = section.iter().find(|(key, _)| key.get_ref() == "draw") {
                    walk.fault(key.span(), "firings that are given are not drawn", "remove `draw`");
                }
                Some(Firings::Given(self.given(walk, given)))
            }
            (Some(_), Some(_)) => {
                walk.fault(place, "firings are both drawn and given", "keep one of `drawn` and `given`");
                None
            }
            (None, None) => {
                let help = "add `[firings.drawn]` or `[firings.given]`, or remove `[firings]`";
                walk.fault(place, "`firings` of the case says nothing", help);
                None
            }
        }
    }

    /// The gates of a section by their number, each with what is said of it.
    fn by_gate<'v, 'i>(
        &self,
        walk: &mut Walk,
        value: &'v Value<'i>,
        name: &str,
        help: &str,
    ) -> Vec<(GateId, &'v DeTable<'i>, Range<usize>)> {
        let circuit = &*self.scenario.circuit;
        let mut found = Vec::new();
        for (key, value) in walk.table(value, &format!("write `[{name}]`")).into_iter().flat_map(|it| it.iter()) {
            match circuit.net(key.get_ref()).and_then(|net| circuit.driver(net)) {
                Some(gate) => found.extend(walk.table(value, help).map(|table| (gate, table, value.span()))),
                None => {
                    Self::unknown(walk, key, "gate", circuit.gates().map(|gate| circuit.name(circuit.net_of(gate))));
                }
            }
        }
        found
    }

    fn drawn(&self, walk: &mut Walk, value: &Value<'_>) -> Option<Vec<Anew>> {
        let circuit = &*self.scenario.circuit;
        let help = "write what it draws from, as in `{ key = 0x2a, rise = [6, 9, 14], fall = [5, 8, 12] }`";
        let mut gates = vec![None; circuit.gate_count()];
        let mut known = vec![false; circuit.gate_count()];
        for (gate, table, span) in self.by_gate(walk, value, "firings.drawn", help) {
            known[gate.index()] = true;
            let place = format!("gate `{}`", circuit.name(circuit.net_of(gate)));
            gates[gate.index()] = self.anew(walk, table, span, &place);
        }
        let missing = circuit.gates().filter(|gate| !known[gate.index()]);
        let missing: Vec<&str> = missing.map(|gate| circuit.name(circuit.net_of(gate))).collect();
        lacks(walk, place_of(Some(value)), "firings.drawn", &missing);
        gates.into_iter().collect()
    }

    fn anew(&self, walk: &mut Walk, table: &DeTable<'_>, span: Range<usize>, place: &str) -> Option<Anew> {
        let part = |name: &str| table.iter().find(|(key, _)| key.get_ref() == name).map(|(_, value)| value);
        for (key, _) in table.iter() {
            if !GATE_KEYS.contains(&key.get_ref().as_ref()) {
                walk.unknown_key(key, &GATE_KEYS, place);
            }
        }
        let number = |walk: &mut Walk, name: &str| match part(name) {
            Some(value) => walk.integer(value).map(|said| said.what),
            None => {
                walk.missing(span.clone(), name, place, "0x2a");
                None
            }
        };
        let key = number(walk, "key");
        let range = |walk: &mut Walk, name: &str| match part(name) {
            Some(value) => self.range(walk, value, name),
            None => {
                walk.missing(span.clone(), name, place, "[6, 9, 14]");
                None
            }
        };
        let ranges = (range(walk, "fall"), range(walk, "rise"));
        let one_draw = part("one_draw").is_some_and(|value| match value.get_ref().as_bool() {
            Some(both) => both,
            None => {
                walk.fault(value.span(), "`one_draw` is true or false", "write true where both edges share a draw");
                false
            }
        });
        let factors = |walk: &mut Walk, name: &str| part(name).map(|value| billionths(walk, value));
        let how = match (factors(walk, "tracking"), part("scale"), factors(walk, "mismatch")) {
            (None, None, None) => None,
            (Some(tracking), None, None) => {
                let within = |it: &Billionths| *it <= Billionths::ONE;
                if tracking.is_some_and(|it| !within(&it)) {
                    walk.fault(span.clone(), format!("`tracking` of {place} is above 1"), "it lies from 0 to 1");
                }
                Some(tracking.filter(within).map(Together::Tracking))
            }
            (None, Some(scale), Some(mismatch)) => {
                let list = walk.list(scale, "two factors", "write the least and the greatest, as in [0.6, 1.5]")?;
                let [least, greatest] = list else {
                    walk.fault(scale.span(), "`scale` is two factors", "write the least and the greatest");
                    return None;
                };
                let (least, greatest) = (billionths(walk, least)?, billionths(walk, greatest)?);
                if least > greatest || mismatch.is_some_and(|it| it > Billionths::ONE) {
                    let help = "`scale` begins with the least factor, `mismatch` lies from 0 to 1";
                    walk.fault(span.clone(), format!("the group of {place} is not possible"), help);
                    return None;
                }
                Some(mismatch.map(|mismatch| Together::Scale { least, greatest, mismatch }))
            }
            _ => {
                let help = "write either `tracking`, or `scale` with `mismatch`";
                walk.fault(span.clone(), format!("{place} does not say how it belongs to its group"), help);
                return None;
            }
        };
        let group = match how {
            Some(how) => Some((how?, number(walk, "common")?)),
            None => {
                if let Some(common) = part("common") {
                    walk.fault(common.span(), format!("{place} is in no group"), "remove `common`");
                }
                None
            }
        };
        let moved = part("moved").map_or(Some([0; 2]), |value| {
            let help = "write how far its delays are moved, as in `{ rise = 0.001, fall = -0.002 }`";
            let table = walk.table(value, help)?;
            let mut found = [None; 2];
            for (key, value) in table.iter() {
                match key.get_ref().as_ref() {
                    "fall" => found[0] = self.signed(walk, value),
                    "rise" => found[1] = self.signed(walk, value),
                    _ => walk.unknown_key(key, &["rise", "fall"], "`moved`"),
                }
            }
            let [Some(fall), Some(rise)] = found else {
                walk.fault(value.span(), format!("`moved` of {place} is not a rise and a fall"), help);
                return None;
            };
            Some([fall, rise])
        });
        Some(Anew { moved: moved?, key: key?, ranges: [ranges.0?, ranges.1?], one_draw, group })
    }

    /// `[min, typ, max]`.
    fn range(&self, walk: &mut Walk, value: &Value<'_>, what: &str) -> Option<DelayRange> {
        const HELP: &str = "write least, typical and greatest, as in [6, 9, 14]";
        let list = walk.list(value, "three times", HELP)?;
        let [min, typ, max] = list else {
            walk.fault(value.span(), format!("`{what}` is three times, not {}", list.len()), HELP);
            return None;
        };
        let what = format!("`{what}`");
        let three = [min, typ, max].map(|item| self.delay(walk, item, &what));
        let [Some(min), Some(typ), Some(max)] = three else { return None };
        if min > typ || typ > max {
            walk.fault(value.span(), format!("{what} is not in order"), HELP);
            return None;
        }
        Some(DelayRange { min, typ, max })
    }

    fn given(&self, walk: &mut Walk, value: &Value<'_>) -> BTreeMap<(GateId, u64), [Span; 2]> {
        let circuit = &*self.scenario.circuit;
        let help = "write its firings by number, as in `{ 3 = { rise = 9.8, fall = 8 } }`";
        let mut given = BTreeMap::new();
        for (gate, table, _) in self.by_gate(walk, value, "firings.given", help) {
            for (key, value) in table.iter() {
                let name = key.get_ref().as_ref();
                let number = name.parse::<u64>().ok().filter(|number| number.to_string() == name);
                let Some(firing) = number else {
                    let message = format!("`{name}` is no number of a firing");
                    walk.fault(key.span(), message, "count the events that the gate schedules, from 0 on");
                    continue;
                };
                let place = format!("firing {firing} of gate `{}`", circuit.name(circuit.net_of(gate)));
                let Some(edges) = walk.table(value, "write `{ rise = 9.8, fall = 8 }`") else { continue };
                if let [Some(fall), Some(rise)] =
                    self.figures(walk, (edges, value.span()), ["fall", "rise"], &[], &place)
                {
                    given.insert((gate, firing), [fall, rise]);
                }
            }
        }
        given
    }
}

/// A factor with up to 9 digits behind the point.
fn billionths(walk: &mut Walk, value: &Value<'_>) -> Option<Billionths> {
    let said = walk.decimal(value)?;
    let (whole, part) = said.what.split_once('.').unwrap_or((&said.what, ""));
    let digits = |text: &str| text.bytes().all(|byte| byte.is_ascii_digit());
    let all = (digits(whole) && digits(part) && part.len() <= 9).then(|| format!("{whole}{part:0<9}").parse().ok());
    let found = all.flatten().filter(|all| *all <= 1 << 62).map(Billionths);
    if found.is_none() {
        let help = "write a plain decimal with at most 9 digits behind the point, as in 0.85";
        walk.fault(value.span(), format!("`{}` is no factor", said.what), help);
    }
    found
}
