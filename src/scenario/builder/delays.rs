//! Delays: every edge of every gate looked up, wires, filters, groups.

use rustc_hash::FxHashMap;

use super::Builder;
use super::circuit::Network;
use super::context::{Context, Fraction, Least, name_list};
use super::said::{NewDelay, NewFilter, NewGroup, NewRange, Said};
use crate::circuit::{Function, GateId};
use crate::delay::{Billionths, DelayModel, DelayRange, Filter, Group, Together, is_causal};
use crate::scenario::{Fault, Mark, nearest};
use crate::time::Span;

/// The delays of a circuit, and what the checks of steps need of them.
pub(super) struct Checked {
    pub model: DelayModel,
    /// Default `rest` of a step: 0, or the largest delay where a gate has an involution filter.
    pub default_rest: Span,
}

const TICK: Least = Least::Tick("a delay");

/// One entry with its amounts converted.
#[derive(Clone, Copy, Default)]
struct Entry {
    delay: Option<Known>,
    /// `[fall, rise]`.
    edges: [Option<Known>; 2],
}

#[derive(Clone, Copy)]
struct Known {
    range: DelayRange,
    assumed: bool,
}

impl Entry {
    fn read(context: &mut Context<'_>, said: &NewDelay, assume: Fraction) -> Entry {
        if let Some(delay) = &said.delay {
            let beside = [("rise", &said.rise), ("fall", &said.fall)];
            if let Some((name, edge)) = beside.into_iter().find_map(|(name, edge)| Some((name, edge.as_ref()?))) {
                let fault = Fault::new(
                    delay.mark,
                    format!("`delay` stands beside `{name}`"),
                    "write `delay`, or `rise` and `fall`",
                );
                context.faults.push(fault.related(edge.mark, format!("`{name}` is here")));
            }
        }
        // a wrong amount was reported; here it only must not count as missing
        let wrong = Known { range: DelayRange::exact(Span::TICK), assumed: false };
        let mut known = |said: &Option<Said<NewRange>>| {
            let said = said.as_ref()?;
            let found = context.range_with(said, TICK, Some(assume));
            Some(found.map_or(wrong, |(range, assumed)| Known { range, assumed }))
        };
        Entry { delay: known(&said.delay), edges: [known(&said.fall), known(&said.rise)] }
    }

    /// The range of an edge (0 fall, 1 rise), and whether it is that of both edges.
    fn edge(&self, edge: usize) -> Option<(Known, bool)> {
        self.edges[edge].map(|known| (known, false)).or(self.delay.map(|known| (known, true)))
    }
}

/// Converts and looks up all delays.
pub(super) fn model(context: &mut Context<'_>, told: &Builder, network: &Network<'_>) -> Checked {
    let assume = fraction(context, told.assume_min.as_ref());
    let common = Entry::read(context, &told.default_delays, assume);
    let functions = function_entries(context, told, assume);
    let unit = DelayRange::exact(Span::from_fs(told.unit.femtoseconds()));

    let mut model = DelayModel::default();
    let mut largest = Span::ZERO;
    let mut first_involution = None;
    for (g, gate) in told.gates.iter().enumerate() {
        let own = if gate.delays.is_empty() { Entry::default() } else { Entry::read(context, &gate.delays, assume) };
        let of_function = functions.get(network.function(g).name()).copied().unwrap_or_default();
        let sources = [own, of_function, common];
        let mut ranges = [unit; 2];
        let mut from = [None; 2];
        let mut assumed = false;
        for edge in 0..2 {
            let found = sources.iter().enumerate().find_map(|(s, source)| Some((s, source.edge(edge)?)));
            if let Some((source, (known, both))) = found {
                ranges[edge] = known.range;
                assumed |= known.assumed;
                from[edge] = Some((source, both));
            }
        }
        let id = GateId(g as u32);
        if assumed {
            model.assumed_min.push(id);
        }
        if from.contains(&None) {
            model.no_delay.push(id);
        }
        let filter = gate.filter.as_ref().map_or(Filter::Inertial, |filter| filter_of(context, filter, ranges));
        if matches!(filter, Filter::Involution(_)) {
            first_involution.get_or_insert(id);
        }
        largest = largest.max(ranges[0].max).max(ranges[1].max);
        model.gate.push(ranges);
        model.gate_one_draw.push(matches!(from, [Some((a, true)), Some((b, true))] if a == b));
        model.filter.push(filter);
    }
    let assumed_wires = wires(context, told, network, &mut model, assume);
    let largest = model.wire.iter().flatten().map(|range| range.max).fold(largest, Span::max);
    notes(context, told, network, &model, assumed_wires);
    let default_rest = if first_involution.is_some() { largest } else { Span::ZERO };
    Checked { model, default_rest }
}

fn fraction(context: &mut Context<'_>, told: Option<&Said<String>>) -> Fraction {
    let Some(said) = told else { return Fraction::default() };
    Fraction::parse(&said.what).unwrap_or_else(|| {
        let message = format!("`assume_min` is {}; it lies above 0 and up to 1", said.what);
        context.faults.add(said.mark, message, "write the part of typical that the minimum is, as in 0.25");
        Fraction::default()
    })
}

fn function_entries(context: &mut Context<'_>, told: &Builder, assume: Fraction) -> FxHashMap<&'static str, Entry> {
    let names = || Function::LISTED.iter().map(Function::name).chain(["expr"]);
    let mut entries = FxHashMap::default();
    for (said, delays) in &told.function_delays {
        let entry = Entry::read(context, delays, assume);
        match names().find(|name| *name == said.what) {
            Some(name) => {
                if entries.insert(name, entry).is_some() {
                    context.faults.add(said.mark, format!("`{name}` has delays twice"), "keep one of them");
                }
            }
            None => {
                let help = match nearest(&said.what, names()) {
                    Some(likely) => format!("did you mean `{likely}`?"),
                    None => format!("the functions are {}", names().collect::<Vec<_>>().join(", ")),
                };
                context.faults.add(said.mark, format!("there is no function `{}`", said.what), help);
            }
        }
    }
    entries
}

fn filter_of(context: &mut Context<'_>, said: &Said<NewFilter>, ranges: [DelayRange; 2]) -> Filter {
    let [fall, rise] = ranges.map(|range| range.min);
    let least = fall.min(rise);
    match &said.what {
        NewFilter::Inertial => Filter::Inertial,
        NewFilter::Transport => Filter::Transport,
        NewFilter::Reject(limit) => {
            let Some(span) = context.span(limit) else { return Filter::Inertial };
            if span == Span::ZERO {
                context.faults.add(
                    limit.mark,
                    "a reject limit of 0 swallows nothing",
                    "write `filter = \"transport\"`",
                );
            } else if span >= least {
                let message = format!(
                    "the reject limit {} is not shorter than the least delay {}",
                    context.show(span),
                    context.show(least)
                );
                let help =
                    "shorten it, or leave `filter` out: an inertial gate swallows what is shorter than its delay";
                context.faults.add(limit.mark, message, help);
            }
            Filter::Reject(span)
        }
        NewFilter::Involution(tau) => {
            let Some(span) = context.span(tau) else { return Filter::Inertial };
            if span == Span::ZERO {
                context.faults.add(tau.mark, "a time constant of 0 is not possible", "write some time above 0");
            } else if !is_causal(span, rise, fall) {
                let message = format!(
                    "this involution is not causal: tau = {} is too long for the least rise {} and fall {}",
                    context.show(span),
                    context.show(rise),
                    context.show(fall)
                );
                // with equal minima the bound is delay / ln 2, which is more than the delay
                let help =
                    format!("it must hold that e^(-rise/tau) + e^(-fall/tau) < 1; {} would do", context.show(least));
                context.faults.add(tau.mark, message, help);
            }
            Filter::Involution(span)
        }
    }
}

/// Fills in the wires; returns where the first assumed minimum stands and how many there are.
fn wires(
    context: &mut Context<'_>,
    told: &Builder,
    network: &Network<'_>,
    model: &mut DelayModel,
    assume: Fraction,
) -> Option<(Mark, usize)> {
    let mut assumed: Option<(Mark, usize)> = None;
    for (w, said) in network.wire_delays.iter().enumerate() {
        let entry = Entry::read(context, said, assume);
        let mark = network.wire_marks[w];
        let (Some((fall, both_fall)), Some((rise, both_rise))) = (entry.edge(0), entry.edge(1)) else {
            let (net, gate) = network.wires[w];
            let wire = format!("`{}` to `{}`", context.nets.names[net.index()], told.gates[gate.index()].name.what);
            let help = "give it one delay for both edges, or `rise` and `fall`";
            context.faults.add(mark, format!("the wire from {wire} lacks a delay for one of its edges"), help);
            model.wire.push([DelayRange::exact(Span::TICK); 2]);
            model.wire_one_draw.push(true);
            continue;
        };
        if fall.assumed || rise.assumed {
            assumed = Some(assumed.map_or((mark, 1), |(first, count)| (first, count + 1)));
        }
        model.wire.push([fall.range, rise.range]);
        model.wire_one_draw.push(both_fall && both_rise);
    }
    assumed
}

fn notes(
    context: &mut Context<'_>,
    told: &Builder,
    network: &Network<'_>,
    model: &DelayModel,
    assumed_wires: Option<(Mark, usize)>,
) {
    let mark = |gate: GateId| told.gates[gate.index()].name.mark;
    let names = |gates: &[GateId]| name_list(gates.iter().map(|gate| network.gate_name(*gate)));
    let part = told.assume_min.as_ref().map_or("0.25", |said| said.what.as_str());
    if let Some(first) = model.no_delay.first() {
        let (verb, gates) = (if model.no_delay.len() == 1 { "has" } else { "have" }, names(&model.no_delay));
        context.note(mark(*first), format!("{gates} {verb} no delay: 1 {} assumed", told.unit));
    }
    if let Some(first) = model.assumed_min.first() {
        let gates = names(&model.assumed_min);
        context.note(mark(*first), format!("{gates}: minimum delay assumed, {part} of typical"));
    }
    if let Some((mark, count)) = assumed_wires {
        let wires = if count == 1 { "1 wire".to_string() } else { format!("{count} wires") };
        context.note(mark, format!("{wires}: minimum delay assumed, {part} of typical"));
    }
}

/// Checks groups. What has a fault is left out.
pub(super) fn groups(context: &mut Context<'_>, groups: &[NewGroup]) -> Vec<Group> {
    let mut owner: FxHashMap<u32, (usize, Mark)> = FxHashMap::default();
    let mut checked = Vec::with_capacity(groups.len());
    for (number, group) in groups.iter().enumerate() {
        let mut gates = Vec::with_capacity(group.gates.len());
        for said in &group.gates {
            let Some(net) = context.gate(said, "groups hold gates: inputs have no delay") else { continue };
            match owner.insert(net.0, (number, said.mark)) {
                Some((other, _)) if other == number => context.named_twice(said),
                Some((_, first)) => {
                    let fault = Fault::new(
                        said.mark,
                        format!("gate `{}` is in two groups", said.what),
                        "remove it from one of them",
                    );
                    context.faults.push(fault.related(first, "first here"));
                }
                None => gates.push(GateId(net.0 - context.nets.inputs as u32)),
            }
        }
        if group.gates.is_empty() && !group.incomplete {
            context.faults.add(group.mark, "this group has no gates", "name them, as in `gates = [\"q\", \"qn\"]`");
        }
        checked.extend(figures(context, group).map(|how| Group { gates, how }));
    }
    checked
}

fn figures(context: &mut Context<'_>, group: &NewGroup) -> Option<Together> {
    if let Some(tracking) = group.tracking.filter(|t| !(0.0..=1.0).contains(&t.what)) {
        let message = format!("`tracking` is {}; it lies from 0 to 1", tracking.what);
        context.faults.add(tracking.mark, message, "0 is independent, 1 is in step");
    }
    if let Some(scale) = group.scale.filter(|s| !(s.what.0 > 0.0 && s.what.0 <= s.what.1 && s.what.1.is_finite())) {
        let message =
            format!("`scale` runs from {} to {}; both lie above 0, the smaller first", scale.what.0, scale.what.1);
        context.faults.add(scale.mark, message, "write the least and the greatest factor, as in [0.6, 1.5]");
    }
    if let Some(mismatch) = group.mismatch.filter(|m| !(0.0..1.0).contains(&m.what)) {
        let message = format!("`mismatch` is {}; it lies from 0 to below 1", mismatch.what);
        context.faults.add(mismatch.mark, message, "write the greatest deviation as a fraction, as in 0.05");
    }
    if group.incomplete {
        return None;
    }
    let help = "write either `tracking`, or `scale` with `mismatch`";
    match (group.tracking, group.scale, group.mismatch) {
        (Some(tracking), None, None) => return Some(Together::Tracking(Billionths::nearest(tracking.what))),
        (None, Some(scale), Some(mismatch)) => {
            let (least, greatest) = (Billionths::nearest(scale.what.0), Billionths::nearest(scale.what.1));
            return Some(Together::Scale { least, greatest, mismatch: Billionths::nearest(mismatch.what) });
        }
        (None, None, None) => {
            context.faults.add(group.mark, "this group does not say how its gates belong together", help)
        }
        (Some(tracking), ..) => {
            context.faults.add(tracking.mark, "`tracking` stands beside `scale` or `mismatch`", help)
        }
        (None, Some(said), None) => context.faults.add(said.mark, "`scale` lacks its `mismatch`", help),
        (None, None, Some(said)) => context.faults.add(said.mark, "`mismatch` lacks its `scale`", help),
    }
    None
}
