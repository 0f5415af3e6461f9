//! The scenario with another value of a parameter, and whether a file could say so.

use std::sync::Arc;

use super::parameter::{Parameter, Side, instant_of, shortest, typical_in_chain};
use super::places::{Places, fs};
use crate::circuit::Function;
use crate::delay::DelayRange;
use crate::scenario::{
    Builder, Mark, NewBounce, NewClock, NewPlace, NewRange, NewStep, Place, Said, Scenario, Stimulus,
};
use crate::time::{Decimal, Span};

/// The scenario with the parameters at these values (fs), applied in order.
///
/// Errors: why a file that said so would be refused.
pub(super) fn variant(scenario: &Scenario, values: &[(Parameter, i64)]) -> Result<Scenario, String> {
    let mut scenario = scenario.clone();
    for (parameter, value) in values {
        let stimulus = set(&scenario, *parameter, i128::from(*value))?;
        scenario.stimulus = Arc::new(stimulus);
    }
    match refused(&scenario) {
        Some(why) => Err(why),
        None => Ok(scenario),
    }
}

fn span(fs: i128) -> Result<Span, String> {
    match u64::try_from(fs) {
        Ok(fs) if fs < Span::LIMIT.fs() => Ok(Span::from_fs(fs)),
        Ok(_) => Err("a time would be 2^62 fs (about 77 minutes) or longer".to_string()),
        Err(_) => Err("a time would be negative".to_string()),
    }
}

fn exact(fs: i128) -> Result<DelayRange, String> {
    span(fs).map(DelayRange::exact)
}

/// A range with each of its figures changed in the same way.
fn each(range: DelayRange, change: impl Fn(i128) -> i128) -> Result<DelayRange, String> {
    let figure = |at: Span| span(change(fs(at)));
    Ok(DelayRange { min: figure(range.min)?, typ: figure(range.typ)?, max: figure(range.max)? })
}

fn set(scenario: &Scenario, parameter: Parameter, value: i128) -> Result<Stimulus, String> {
    let mut stimulus = Stimulus::clone(&scenario.stimulus);
    let places = Places::of(&stimulus);
    match parameter {
        Parameter::Spacing { step } => space(&mut stimulus, &places, step as usize, value)?,
        Parameter::SpacingOfAll => scale(&mut stimulus, &places, value)?,
        Parameter::Pulse { from, to, .. } => {
            let rest: Option<i128> = (from + 2..=to).map(|s| places.distance(s as usize)).sum();
            let rest = rest.ok_or("a step within the pulse comes at a drawn time")?;
            space(&mut stimulus, &places, from as usize + 1, value - rest)?;
        }
        Parameter::High { clock } => stimulus.clocks[clock as usize].high = exact(value)?,
        Parameter::Period { clock } => {
            let clock = &mut stimulus.clocks[clock as usize];
            let typ = fs(clock.period.typ).max(1);
            let scaled = |at: i128| at * value / typ;
            clock.high = each(clock.high, scaled)?;
            clock.period = each(clock.period, scaled)?;
        }
        Parameter::Skew { step } => {
            let skew = stimulus.steps[step as usize].skew.as_mut().ok_or("the step has no skew")?;
            let most = span(value)?;
            if most < skew.min {
                return Err("the upper end of the skew would be below its lower end".to_string());
            }
            *skew = DelayRange::between(skew.min, most);
        }
        Parameter::Distance { step, to, side } => {
            let to = instant_of(scenario, &places, to)?;
            let at = if side == Side::Lead { to.1 - value } else { to.1 + value };
            put(&mut stimulus, &places, step as usize, (to.0, at))?;
        }
    }
    Ok(stimulus)
}

/// Puts a step this long after the one before it; those after it keep their distances.
fn space(stimulus: &mut Stimulus, places: &Places, step: usize, distance: i128) -> Result<(), String> {
    let moved = match stimulus.steps[step].place {
        Place::After(range) => {
            stimulus.steps[step].place = Place::After(exact(distance)?);
            distance - fs(range.typ)
        }
        Place::At(range) => {
            let (chain, before) = places.before(step);
            if chain != 0 {
                return Err("the step before comes at a drawn time, so place this one by `after`".to_string());
            }
            stimulus.steps[step].place = Place::At(exact(before + distance)?);
            before + distance - fs(range.typ)
        }
        Place::Rest(_) | Place::When { .. } => return Err("the step waits for the circuit".to_string()),
    };
    for later in &mut stimulus.steps[step + 1..] {
        if let Place::At(range) = &mut later.place {
            *range = each(*range, |at| at + moved)?;
        }
    }
    Ok(())
}

/// Scales all distances between steps so that the shortest becomes this long. The first step stays, and so do waits for
/// the circuit.
fn scale(stimulus: &mut Stimulus, places: &Places, value: i128) -> Result<(), String> {
    let shortest = shortest(stimulus, places).ok_or("no two steps have a distance")?;
    let base = places.typical_before(1).filter(|_| !stimulus.steps.is_empty()).unwrap_or(0);
    for step in stimulus.steps.iter_mut().skip(1) {
        match &mut step.place {
            Place::At(range) => *range = each(*range, |at| base + (at - base) * value / shortest)?,
            Place::After(range) => *range = each(*range, |at| at * value / shortest)?,
            Place::Rest(_) | Place::When { .. } => {}
        }
    }
    Ok(())
}

/// Puts a step at a place of a chain; all others stay where they are.
fn put(stimulus: &mut Stimulus, places: &Places, step: usize, at: (usize, i128)) -> Result<(), String> {
    let was = typical_in_chain(stimulus, places, step).ok_or("the step waits for the circuit")?;
    if was.0 != at.0 {
        return Err("the two are no fixed time apart".to_string());
    }
    stimulus.steps[step].place = match stimulus.steps[step].place {
        Place::At(_) => Place::At(exact(at.1)?),
        _ => Place::After(exact(at.1 - places.before(step).1)?),
    };
    if let Some(next) = stimulus.steps.get_mut(step + 1)
        && let Place::After(range) = &mut next.place
    {
        let back = at.1 - was.1;
        *range = each(*range, |after| after - back)?;
    }
    Ok(())
}

/// Why the builder refuses such steps and clocks: it is told the same steps on a circuit that does not matter.
fn refused(scenario: &Scenario) -> Option<String> {
    let (circuit, stimulus) = (&*scenario.circuit, &*scenario.stimulus);
    let mut told = Builder::new("");
    told.unit(scenario.unit);
    let mut fresh = "g".to_string();
    for net in circuit.inputs() {
        told.input(circuit.name(net), stimulus.initial[net.index()]);
        while circuit.name(net).starts_with(&fresh) {
            fresh.push('_');
        }
    }
    let first = circuit.inputs().next()?;
    told.gate(fresh.as_str(), Function::Buf, [circuit.name(first)]);
    let range = |range: DelayRange, mark: Mark| Said::at(NewRange::from(range), mark);
    for (number, step) in (0..).zip(&stimulus.steps) {
        let mark = Mark(number);
        let place = match &step.place {
            Place::At(at) => NewPlace::At(range(*at, mark)),
            Place::After(after) => NewPlace::After(range(*after, mark)),
            Place::Rest(rest) => NewPlace::Rest(Said::at((*rest).into(), mark)),
            // a wait for a pattern is a wait like any other to the order of steps
            Place::When { wait, .. } => NewPlace::Rest(Said::at(wait.max.into(), mark)),
        };
        let set = step.set.iter().map(|(net, value)| (Said::at(circuit.name(*net).to_string(), mark), *value));
        told.step(NewStep {
            label: Some(Said::at(step.label.clone(), mark)),
            places: vec![place],
            set: set.collect(),
            skew: step.skew.map(|skew| range(skew, mark)),
            bounce: step.bounce.as_ref().map(|bounce| NewBounce {
                lasting: range(bounce.lasting, mark),
                pulses: Said::at((u64::from(bounce.pulses.0), u64::from(bounce.pulses.1)), mark),
            }),
            mark,
            ..NewStep::default()
        });
    }
    let steps = stimulus.steps.len() as u32;
    for (number, clock) in (steps..).zip(&stimulus.clocks) {
        let mark = Mark(number);
        told.clock(NewClock {
            net: Said::at(circuit.name(clock.net).to_string(), mark),
            first: range(clock.first, mark),
            period: range(clock.period, mark),
            high: range(clock.high, mark),
            jitter: (clock.jitter > Span::ZERO).then(|| Said::at(clock.jitter.into(), mark)),
            count: Said::at(u64::from(clock.count), mark),
            mark,
        });
    }
    let faults = told.finish().err()?;
    let fault = faults.first()?;
    let who = match stimulus.steps.get(fault.mark.0 as usize) {
        Some(step) => format!("step `{}`", step.label),
        None => {
            let clock = stimulus.clocks.get((fault.mark.0.saturating_sub(steps)) as usize);
            clock.map_or_else(String::new, |clock| format!("clock `{}`", circuit.name(clock.net)))
        }
    };
    Some(format!("{who}: {}", fault.message))
}

/// The part of a range in which a file would not be refused, and why it ends there.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Legal {
    /// Least value, fs.
    pub from: i64,
    /// Greatest value, fs.
    pub to: i64,
    /// Why no lower value of the asked range is possible.
    pub below: Option<String>,
    /// Why no higher value of the asked range is possible.
    pub above: Option<String>,
}

/// Cuts a range at both ends to values that a file could have. The possible values are taken to be without a gap.
///
/// Errors: why no value of the range is possible.
pub(super) fn legal(
    asked: (i64, i64),
    tried: impl Iterator<Item = i64>,
    why_not: impl Fn(i64) -> Option<String>,
) -> Result<Legal, String> {
    let (from, to) = asked;
    let (below, above) = (why_not(from), why_not(to));
    let mut legal = Legal { from, to, below, above };
    if legal.below.is_none() && legal.above.is_none() {
        return Ok(legal);
    }
    let inside = match (&legal.below, &legal.above) {
        (None, _) => from,
        (_, None) => to,
        (Some(below), Some(_)) => {
            let mut tried = tried;
            tried.find(|value| why_not(*value).is_none()).ok_or_else(|| below.clone())?
        }
    };
    if legal.below.is_some() {
        (legal.from, legal.below) = edge(from, inside, &why_not);
    }
    if legal.above.is_some() {
        (legal.to, legal.above) = edge(to, inside, &why_not);
    }
    Ok(legal)
}

/// The last possible value on the way from a possible one to one that is not, and why the next is not.
fn edge(bad: i64, good: i64, why_not: &impl Fn(i64) -> Option<String>) -> (i64, Option<String>) {
    let (mut bad, mut good) = (bad, good);
    let mut why = why_not(bad);
    while bad.abs_diff(good) > 1 {
        let middle = middle(bad, good);
        match why_not(middle) {
            None => good = middle,
            because => (bad, why) = (middle, because),
        }
    }
    (good, why)
}

/// Halfway, without overflow.
pub(super) fn middle(a: i64, b: i64) -> i64 {
    ((i128::from(a) + i128::from(b)).div_euclid(2)) as i64
}

/// A value in the scenario's unit, exact.
pub(super) fn shown(value: i64, scenario: &Scenario) -> String {
    format!("{} {}", Decimal::new(i128::from(value), scenario.unit), scenario.unit)
}
