//! Rules: names to nets, edges, bounds, defaults.

use rustc_hash::FxHashSet;

use super::context::Context;
use super::said::Said;
use super::said_rules::{NewRules, NewSwallowed, NewTiming};
use crate::circuit::NetId;
use crate::scenario::{
    EdgeKind, EdgeSpec, Fault, GlitchFree, Mark, MinPulse, Never, NeverAtRest, Rules, Swallowed, Timing,
};
use crate::time::Span;

/// Checks all rules; `outputs` are the default of `glitch_free`.
pub(super) fn check(context: &mut Context<'_>, told: &NewRules, outputs: &[NetId]) -> Rules {
    let never = told.never.iter().map(|said| Never {
        name: said.name.clone(),
        state: context.some_state(&said.state, said.mark, said.incomplete),
        longer_than: said.longer_than.as_ref().and_then(|bound| context.span(bound)).unwrap_or(Span::ZERO),
        mark: said.mark,
    });
    let never = never.collect();
    let never_at_rest = told.never_at_rest.iter().map(|said| NeverAtRest {
        name: said.name.clone(),
        state: context.some_state(&said.state, said.mark, said.incomplete),
        mark: said.mark,
    });
    let never_at_rest = never_at_rest.collect();
    Rules {
        never,
        never_at_rest,
        timing: told.timing.iter().filter_map(|said| timing(context, said)).collect(),
        min_pulse: min_pulse(context, told),
        glitch_free: glitch_free(context, told, outputs),
        glitch_free_written: told.glitch_free.is_some(),
        settle_within: told.settle_within.as_ref().and_then(|bound| context.span(bound)),
        critical_race: told.critical_race.unwrap_or_default(),
        critical_race_written: told.critical_race.is_some(),
        oscillation: told.oscillation.unwrap_or_default(),
        oscillation_written: told.oscillation.is_some(),
        swallowed: swallowed(context, told.swallowed.as_ref()),
        before_rest: told.before_rest.unwrap_or_default(),
        accept_not_judged: told.accept_not_judged,
    }
}

fn timing(context: &mut Context<'_>, said: &NewTiming) -> Option<Timing> {
    let from = said.from.as_ref().and_then(|edge| self::edge(context, edge));
    let to = said.to.as_ref().and_then(|edge| self::edge(context, edge));
    let min = said.min.as_ref().and_then(|bound| context.span(bound));
    let max = said.max.as_ref().and_then(|bound| context.span(bound));
    if !said.incomplete {
        for (key, edge) in [("from", &said.from), ("to", &said.to)] {
            if edge.is_none() {
                let help = format!("name an edge, as in `{key} = \"q rise\"`");
                context.faults.add(said.mark, format!("this timing rule lacks `{key}`"), help);
            }
        }
        if said.min.is_none() && said.max.is_none() {
            context.faults.add(said.mark, "this timing rule has no bound", "give it `min`, `max` or both");
        }
    }
    if let (Some(low), Some(high), Some(min_said), Some(max_said)) = (min, max, &said.min, &said.max)
        && low > high
    {
        let message = format!("min is greater than max: {} > {}", context.show(low), context.show(high));
        let fault = Fault::new(min_said.mark, message, "no distance is within both: correct one of them");
        context.faults.push(fault.related(max_said.mark, "max is here"));
    }
    Some(Timing { name: said.name.clone(), from: from?, to: to?, min, max, mark: said.mark })
}

/// An edge from its text `NET rise`, `NET fall` or `NET any`.
fn edge(context: &mut Context<'_>, said: &Said<String>) -> Option<EdgeSpec> {
    let mut words = said.what.split_whitespace();
    let (Some(name), Some(kind), None) = (words.next(), words.next(), words.next()) else {
        let message = format!("`{}` names no edge", said.what);
        context.faults.add(said.mark, message, "write a net and `rise`, `fall` or `any`, as in \"q rise\"");
        return None;
    };
    let kind_at = said.what.rfind(kind).unwrap_or(0);
    let found = EdgeKind::from_name(kind);
    if found.is_none() {
        let fault = Fault::new(said.mark, format!("`{kind}` is no edge"), "the edges are `rise`, `fall` and `any`");
        context.faults.push(fault.within(kind_at..kind_at + kind.len()));
    }
    let name_at = said.what.find(name).unwrap_or(0);
    let net = context.nets.ids.get(name).copied();
    if net.is_none() {
        let help = context.name_help(name);
        let fault = Fault::new(said.mark, format!("there is no net `{name}`"), help);
        context.faults.push(fault.within(name_at..name_at + name.len()));
    }
    Some(EdgeSpec { net: net?, edge: found? })
}

fn min_pulse(context: &mut Context<'_>, told: &NewRules) -> Vec<MinPulse> {
    let mut seen = FxHashSet::default();
    let mut rules = Vec::with_capacity(told.min_pulse.len());
    for said in &told.min_pulse {
        let high = said.high.as_ref().and_then(|bound| context.span(bound));
        let low = said.low.as_ref().and_then(|bound| context.span(bound));
        if said.high.is_none() && said.low.is_none() && !said.incomplete {
            let message = format!("the shortest pulse of `{}` has no bound", said.net.what);
            context.faults.add(said.net.mark, message, "give it `high`, `low` or both, as in `{ high = 4 }`");
        }
        match context.net(&said.net) {
            Some(net) if seen.insert(net) => rules.push(MinPulse { net, high, low, mark: said.net.mark }),
            Some(_) => context.named_twice(&said.net),
            None => {}
        }
    }
    rules
}

fn glitch_free(context: &mut Context<'_>, told: &NewRules, outputs: &[NetId]) -> Vec<GlitchFree> {
    let Some(list) = &told.glitch_free else {
        let strict = |net: &NetId| GlitchFree { net: *net, shorter_than: Span::ZERO, mark: Mark::default() };
        return outputs.iter().map(strict).collect();
    };
    let mut seen = FxHashSet::default();
    let mut rules = Vec::with_capacity(list.len());
    for (name, bound) in list {
        let shorter_than = bound.as_ref().and_then(|bound| context.span(bound)).unwrap_or(Span::ZERO);
        match context.net(name) {
            Some(net) if seen.insert(net) => rules.push(GlitchFree { net, shorter_than, mark: name.mark }),
            Some(_) => context.named_twice(name),
            None => {}
        }
    }
    rules
}

fn swallowed(context: &mut Context<'_>, told: Option<&NewSwallowed>) -> Swallowed {
    match told {
        None | Some(NewSwallowed::Listed) => Swallowed::Listed,
        Some(NewSwallowed::Forbidden) => Swallowed::Forbidden,
        Some(NewSwallowed::At(names)) => {
            let mut nets = Vec::with_capacity(names.len());
            let mut seen = FxHashSet::default();
            for said in names {
                match context.gate(said, "only gates swallow pulses: name gates") {
                    Some(net) if seen.insert(net) => nets.push(net),
                    Some(_) => context.named_twice(said),
                    None => {}
                }
            }
            nets.sort_unstable();
            Swallowed::At(nets)
        }
    }
}
