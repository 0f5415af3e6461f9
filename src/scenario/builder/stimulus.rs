//! Steps and clocks: loops unrolled, labels given, order checked, moments listed.

use rustc_hash::{FxHashMap, FxHashSet};

use super::context::{Context, Least};
use super::delays::Checked;
use super::said::{NewBounce, NewClock, NewPlace, NewState, NewStep, Said};
use super::{BeginAt, Builder};
use crate::circuit::NetId;
use crate::delay::DelayRange;
use crate::scenario::{
    Bounce, Clock, EdgeCount, Expectation, Fault, Mark, Moment, MomentKind, Place, Step, Stimulus, Walk,
};
use crate::time::{Span, Time};

/// Most moments of one scenario: power-up, steps with their loops unrolled, and clock edges.
pub const MAX_MOMENTS: usize = 1_000_000;

/// Most pairs of changes of one bounce.
const MAX_BOUNCES: u64 = 10_000;

/// A step, or several steps over and over.
#[derive(Clone, Debug)]
pub(super) struct Listed {
    pub times: Option<Said<u64>>,
    pub steps: Vec<NewStep>,
    pub mark: Mark,
}

/// A checked step before loops are unrolled; its label lacks the ` #n`.
struct Template {
    step: Step,
    /// Was the place told, and well? Only then its order is checked.
    placed: bool,
    place_mark: Mark,
    label_mark: Mark,
}

/// Checks all steps and clocks.
pub(super) fn check(context: &mut Context<'_>, told: &Builder, delays: &Checked) -> Stimulus {
    let clocks: Vec<Clock> = told.clocks.iter().filter_map(|said| clock(context, said)).collect();
    let clocked = clocked_nets(context, &told.clocks);
    let mut templates = Vec::new();
    for listed in &told.steps {
        for said in &listed.steps {
            let number = templates.len() + 1;
            templates.push(template(context, said, number, &clocked, delays.default_rest));
        }
    }
    let mut stimulus = Stimulus {
        initial: told.inputs.iter().map(|(_, value)| *value).collect(),
        steps: Vec::new(),
        clocks,
        moments: Vec::new(),
        walk: walk(context, told, delays.default_rest),
    };
    let power_up = told.begin.what != BeginAt::Rest;
    if !room(context, told, power_up) {
        return stimulus;
    }
    let order = unroll(told, templates.len());
    check_order(context, &templates, &order);
    label(context, &templates, &order, power_up, &mut stimulus);
    stimulus
}

/// Where the steps come from. A walk over every change moves the inputs alone, and has to know where it begins.
fn walk(context: &mut Context<'_>, told: &Builder, rest: Span) -> Walk {
    let Some(mark) = told.every_change else { return Walk::Written };
    if let Some(listed) = told.steps.first() {
        let other =
            listed.times.map_or_else(|| listed.steps.first().map_or(listed.mark, |step| step.mark), |it| it.mark);
        let message = "the walk over every single change takes the place of steps";
        let fault = Fault::new(mark, message, "remove `stimulus`, or the steps");
        context.faults.push(fault.related(other, "a step"));
    }
    if let Some(clock) = told.clocks.first() {
        let message = "the walk over every single change moves all inputs itself, those of clocks too";
        let fault = Fault::new(mark, message, "remove `stimulus`, or the clocks");
        context.faults.push(fault.related(clock.net.mark, "a clock"));
    }
    if told.begin.what != BeginAt::Rest {
        let message = "the walk over every single change has to know where it begins";
        let fault = Fault::new(mark, message, "begin at rest: remove `begin`, or write steps");
        context.faults.push(fault.related(told.begin.mark, "it begins elsewhere"));
    }
    if told.inputs.is_empty() {
        context.faults.add(mark, "there is no input to change", "list inputs under `[inputs]`, or remove `stimulus`");
    }
    Walk::ToLayOut { rest, mark }
}

/// Is there room for all moments? The first thing that is too much is reported.
fn room(context: &mut Context<'_>, told: &Builder, power_up: bool) -> bool {
    let mut total = u128::from(power_up);
    let mut well = true;
    for listed in &told.steps {
        if let Some(times) = listed.times {
            if times.what == 0 {
                context.faults.add(
                    times.mark,
                    "a loop runs at least once",
                    "write `times = 1` or more, or remove the loop",
                );
            }
            if listed.steps.is_empty() {
                context.faults.add(listed.mark, "this loop has no steps", "add steps, or remove the loop");
            }
        }
        let times = listed.times.map_or(1, |times| times.what);
        total += u128::from(times) * listed.steps.len() as u128;
        well &= within(context, total, listed.times.map_or(listed.mark, |times| times.mark), well);
    }
    for clock in &told.clocks {
        total += 2 * u128::from(clock.count.what);
        well &= within(context, total, clock.count.mark, well);
    }
    well
}

fn within(context: &mut Context<'_>, total: u128, mark: Mark, report: bool) -> bool {
    let fits = total <= MAX_MOMENTS as u128;
    if !fits && report {
        let message = format!("with this the scenario has {total} steps and clock edges; {MAX_MOMENTS} is the limit");
        context.faults.add(mark, message, "let it repeat less often");
    }
    fits
}

/// One pass through a listed step: (template, number of the pass if it is in a loop).
fn unroll(told: &Builder, templates: usize) -> Vec<(usize, Option<u64>)> {
    let mut order = Vec::with_capacity(templates);
    let mut first = 0;
    for listed in &told.steps {
        let all = first..first + listed.steps.len();
        match listed.times {
            None => order.extend(all.map(|t| (t, None))),
            Some(times) => {
                for pass in 1..=times.what {
                    order.extend(all.clone().map(|t| (t, Some(pass))));
                }
            }
        }
        first += listed.steps.len();
    }
    order
}

fn template(
    context: &mut Context<'_>,
    said: &NewStep,
    number: usize,
    clocked: &FxHashMap<NetId, Mark>,
    default_rest: Span,
) -> Template {
    let set = set(context, said, clocked);
    let (place, placed) = place(context, said, default_rest);
    let skew = said.skew.as_ref().and_then(|skew| context.range(skew, Least::Zero));
    let bounce = said.bounce.as_ref().and_then(|said| bounce(context, said));
    let expect = said.expect.as_ref().map(|expect| {
        if expect.what.is_empty() && !said.incomplete {
            context.faults.add(
                expect.mark,
                "this `expect` names no state",
                "name nets with their values, as in `{ q = 1 }`",
            );
        }
        let one = |state: &Said<NewState>| context.some_state(&state.what, state.mark, said.incomplete);
        Expectation { alternatives: expect.what.iter().map(one).collect(), mark: expect.mark }
    });
    let (label, label_mark) = match &said.label {
        Some(label) => {
            if label.what.trim().is_empty() {
                context.faults.add(label.mark, "this label is empty", "write some text, or leave `label` out");
            }
            (label.what.clone(), label.mark)
        }
        None => (format!("step {number}"), said.mark),
    };
    let step = Step {
        label,
        place,
        set,
        skew,
        bounce,
        expect,
        edges: edges(context, said),
        settle_within: said.settle_within.as_ref().and_then(|bound| context.span(bound)),
        oscillation: said.oscillation,
        mark: said.mark,
    };
    let place_mark = said.places.first().map_or(said.mark, |place| mark_of(place, said.mark));
    Template { step, placed, place_mark, label_mark }
}

fn set(context: &mut Context<'_>, said: &NewStep, clocked: &FxHashMap<NetId, Mark>) -> Vec<(NetId, bool)> {
    if said.set.is_empty() && !said.incomplete {
        let help = "name at least one input with its new value, as in `set = { a = 1 }`";
        context.faults.add(said.mark, "this step sets no input", help);
    }
    let mut seen = FxHashSet::default();
    let mut set = Vec::with_capacity(said.set.len());
    for (name, value) in &said.set {
        let Some(net) = context.input(name, "a step sets inputs; what a gate drives follows from them") else {
            continue;
        };
        if let Some(clock) = clocked.get(&net) {
            let fault = Fault::new(
                name.mark,
                format!("`{}` is driven by a clock", name.what),
                "set another input, or remove the clock",
            );
            context.faults.push(fault.related(*clock, "the clock"));
        } else if seen.insert(net) {
            set.push((net, *value));
        } else {
            context.named_twice(name);
        }
    }
    set
}

/// Where the step comes, and whether that was told well.
fn place(context: &mut Context<'_>, said: &NewStep, default_rest: Span) -> (Place, bool) {
    const NOWHERE: (Place, bool) = (Place::Rest(Span::ZERO), false);
    if let [first, second, ..] = said.places.as_slice() {
        let fault = Fault::new(
            mark_of(second, said.mark),
            "this step is placed twice",
            "keep one of `at`, `after`, `rest`, `when`",
        );
        context.faults.push(fault.related(mark_of(first, said.mark), "placed here already"));
        return NOWHERE;
    }
    let range = |context: &mut Context<'_>, said| context.range(said, Least::Zero);
    match said.places.first() {
        None => (Place::Rest(default_rest), true),
        Some(NewPlace::Unreadable) => NOWHERE,
        Some(NewPlace::At(said)) => range(context, said).map_or(NOWHERE, |range| (Place::At(range), true)),
        Some(NewPlace::After(said)) => range(context, said).map_or(NOWHERE, |range| (Place::After(range), true)),
        Some(NewPlace::Rest(said)) => context.span(said).map_or(NOWHERE, |span| (Place::Rest(span), true)),
        Some(NewPlace::When { pattern, wait, timeout }) => {
            let pattern = context.some_state(&pattern.what, pattern.mark, said.incomplete);
            let none = DelayRange::exact(Span::ZERO);
            let wait = wait.as_ref().map_or(Some(none), |wait| range(context, wait)).unwrap_or(none);
            let limit = timeout.as_ref().and_then(|timeout| context.span(timeout));
            if let (Some(Span::ZERO), Some(said)) = (limit, timeout) {
                context.faults.add(
                    said.mark,
                    "a timeout of 0 leaves no time",
                    "write some time above 0, or leave it out",
                );
            }
            (Place::When { pattern, wait, timeout: limit }, true)
        }
    }
}

/// Where a place was said; `step` is where its step was.
fn mark_of(place: &NewPlace, step: Mark) -> Mark {
    match place {
        NewPlace::At(range) | NewPlace::After(range) => range.mark,
        NewPlace::Rest(amount) => amount.mark,
        NewPlace::When { pattern, .. } => pattern.mark,
        NewPlace::Unreadable => step,
    }
}

fn bounce(context: &mut Context<'_>, said: &NewBounce) -> Option<Bounce> {
    let (least, most) = said.pulses.what;
    if least > most {
        context.faults.add(
            said.pulses.mark,
            format!("the least number of pulses {least} is above the greatest {most}"),
            "write the smaller one first",
        );
    } else if most > MAX_BOUNCES {
        context.faults.add(
            said.pulses.mark,
            format!("{most} pulses are too many"),
            format!("write at most {MAX_BOUNCES}"),
        );
    }
    let lasting = context.range(&said.lasting, Least::Tick("a bounce"))?;
    let narrow = |count: u64| u32::try_from(count).unwrap_or(u32::MAX);
    Some(Bounce { lasting, pulses: (narrow(least), narrow(most)) })
}

fn edges(context: &mut Context<'_>, said: &NewStep) -> Vec<EdgeCount> {
    let mut seen = FxHashSet::default();
    let mut edges = Vec::with_capacity(said.edges.len());
    for (name, count) in &said.edges {
        let (least, most) = count.what;
        let (Ok(low), Ok(high)) = (u32::try_from(least), u32::try_from(most)) else {
            let help = format!("write at most {}", u32::MAX);
            context.faults.add(count.mark, "so many transitions cannot be counted", help);
            continue;
        };
        if low > high {
            let message = format!("the least number of transitions {low} is above the greatest {high}");
            context.faults.add(count.mark, message, "write the smaller one first");
        }
        match context.net(name) {
            Some(net) if seen.insert(net) => edges.push(EdgeCount { net, least: low, most: high }),
            Some(_) => context.named_twice(name),
            None => {}
        }
    }
    edges.sort_by_key(|edge| edge.net);
    edges
}

/// How long the inputs of a step may still move after its placed instant.
fn tail(step: &Step) -> Span {
    let skew = step.skew.map_or(Span::ZERO, |skew| skew.max - skew.min);
    let bounce = step.bounce.as_ref().map_or(Span::ZERO, |bounce| bounce.lasting.max);
    skew + bounce
}

/// No step may come before the inputs of the one before it have changed; each step as written is reported once.
fn check_order(context: &mut Context<'_>, templates: &[Template], order: &[(usize, Option<u64>)]) {
    let mut reported = FxHashSet::default();
    let mut report = |context: &mut Context<'_>, template: usize, fault: Fault| {
        if reported.insert(template) {
            context.faults.push(fault);
        }
    };
    // latest placed instant so far, unless a place could not be read; and the first step that waits
    let mut latest = Some(Span::ZERO);
    let mut waits: Option<usize> = None;
    let mut before: Option<usize> = None;
    for &(t, pass) in order {
        let Template { step, placed, place_mark, .. } = &templates[t];
        let mark = *place_mark;
        let still = before.map_or(Span::ZERO, |b| tail(&templates[b].step));
        let before_mark = before.map(|b| (templates[b].step.mark, format!("`{}` is here", templates[b].step.label)));
        match &step.place {
            _ if !placed => latest = None,
            Place::At(_) if pass.is_some_and(|pass| pass > 1) => {
                let help = "use `after` inside a loop";
                report(
                    context,
                    t,
                    Fault::new(mark, "this step would come at the same time in every pass of its loop", help),
                );
                latest = None;
            }
            Place::At(range) => {
                if let Some(w) = waits {
                    let message = "a step placed by `at` cannot follow one that waits: nobody knows when that comes";
                    let help = "use `after` or `rest` from there on";
                    let fault = Fault::new(mark, message, help);
                    report(
                        context,
                        t,
                        fault.related(templates[w].step.mark, format!("`{}` waits", templates[w].step.label)),
                    );
                } else if let Some(last) = latest {
                    let end = last + still;
                    if range.min < end {
                        let (at, end) = (context.show(range.min), context.show(end));
                        let message = format!("this step may come at {at}, before the step before it is over at {end}");
                        let help = format!("put it at {end} or later, or use `after`");
                        let mut fault = Fault::new(mark, message, help);
                        fault.related.extend(before_mark);
                        report(context, t, fault);
                    }
                }
                latest = Some(range.max);
            }
            Place::After(range) => {
                if range.min < still {
                    let (after, still_shown) = (context.show(range.min), context.show(still));
                    let message = format!(
                        "this step may come {after} after the one before it, whose inputs move for {still_shown}"
                    );
                    let help = format!("let it come at least {still_shown} after");
                    let mut fault = Fault::new(mark, message, help);
                    fault.related.extend(before_mark);
                    report(context, t, fault);
                }
                latest = later(context, latest, range.max, mark);
            }
            Place::Rest(wait) => {
                waits = waits.or(Some(t));
                latest = later(context, latest, still + *wait, mark);
            }
            Place::When { wait, .. } => {
                waits = waits.or(Some(t));
                latest = later(context, latest, still + wait.max, mark);
            }
        }
        before = Some(t);
    }
}

/// The latest instant after one more wait; past the end of all runs it is reported once.
fn later(context: &mut Context<'_>, latest: Option<Span>, wait: Span, mark: Mark) -> Option<Span> {
    let next = latest?.fs().checked_add(wait.fs()).filter(|fs| *fs < Time::END.fs());
    if next.is_none() {
        too_long(context, mark, "the steps together");
    }
    next.map(Span::from_fs)
}

fn too_long(context: &mut Context<'_>, mark: Mark, what: &str) {
    let message = format!("{what} may last 2^63 fs (about 2.5 hours) or longer, which no run does");
    context.faults.add(mark, message, "shorten the waits, or let it repeat less often");
}

fn clocked_nets(context: &mut Context<'_>, clocks: &[NewClock]) -> FxHashMap<NetId, Mark> {
    let mut clocked: FxHashMap<NetId, Mark> = FxHashMap::default();
    for clock in clocks {
        let Some(net) = context.nets.ids.get(clock.net.what.as_str()).copied() else { continue };
        if let Some(first) = clocked.get(&net).copied() {
            let fault =
                Fault::new(clock.net.mark, format!("`{}` has two clocks", clock.net.what), "remove one of them");
            context.faults.push(fault.related(first, "the first"));
        } else {
            clocked.insert(net, clock.net.mark);
        }
    }
    clocked
}

fn clock(context: &mut Context<'_>, said: &NewClock) -> Option<Clock> {
    let net = context.input(&said.net, "a clock drives an input; list the net under `[inputs]`");
    let first = context.range(&said.first, Least::Zero);
    let period = context.range(&said.period, Least::Tick("a period"));
    let high = context.range(&said.high, Least::Tick("a high time"));
    let jitter = said.jitter.as_ref().map_or(Some(Span::ZERO), |jitter| context.span(jitter));
    if said.count.what == 0 {
        context.faults.add(said.count.mark, "a clock of no periods is no clock", "write `count = 1` or more");
    }
    let (first, period, high, jitter) = (first?, period?, high?, jitter?);
    if high.max >= period.min {
        let message = format!(
            "high lasts up to {}, which is not below the least period {}",
            context.show(high.max),
            context.show(period.min)
        );
        let fault = Fault::new(said.high.mark, message, "shorten `high`, or lengthen `period`");
        context.faults.push(fault.related(said.period.mark, "the period"));
        return None;
    }
    let least = high.min.min(period.min - high.max);
    if let (true, Some(jitter_said)) = (jitter.fs() >= least.fs().div_ceil(2), &said.jitter)
        && jitter > Span::ZERO
    {
        let message = format!(
            "with a jitter of {} either way edges could change their order: the least time between two is {}",
            context.show(jitter),
            context.show(least)
        );
        let help = format!("keep twice the jitter below {}", context.show(least));
        context.faults.add(jitter_said.mark, message, help);
    }
    let end = u128::from(first.max.fs())
        + u128::from(period.max.fs()) * u128::from(said.count.what)
        + u128::from(jitter.fs());
    if end >= u128::from(Time::END.fs()) {
        too_long(context, said.count.mark, "this clock");
    }
    let count = u32::try_from(said.count.what).ok()?;
    Some(Clock { net: net?, first, period, high, jitter, count, mark: said.mark })
}

/// Lists steps and moments with their labels, each of which must be unlike all others.
fn label(
    context: &mut Context<'_>,
    templates: &[Template],
    order: &[(usize, Option<u64>)],
    power_up: bool,
    stimulus: &mut Stimulus,
) {
    let mut moments: Vec<Moment> = Vec::new();
    if power_up {
        moments.push(Moment { label: POWER_UP.to_string(), kind: MomentKind::PowerUp });
    }
    let first_step = moments.len();
    for &(t, pass) in order {
        let mut step = templates[t].step.clone();
        if let Some(pass) = pass {
            step.label = format!("{} #{pass}", step.label);
        }
        let kind = MomentKind::Step(stimulus.steps.len() as u32);
        moments.push(Moment { label: step.label.clone(), kind });
        stimulus.steps.push(step);
    }
    for (c, clock) in stimulus.clocks.iter().enumerate() {
        let name = context.nets.names[clock.net.index()];
        let starts_high = stimulus.initial.get(clock.net.index()).copied().unwrap_or(false);
        for edge in 0..clock.count * 2 {
            let rises = (edge % 2 == 0) != starts_high;
            let label = format!("{name} {} {}", if rises { "rise" } else { "fall" }, edge / 2 + 1);
            moments.push(Moment { label, kind: MomentKind::Edge { clock: c as u32, edge } });
        }
    }

    let clock_mark = |moment: &Moment| match moment.kind {
        MomentKind::Edge { clock, .. } => stimulus.clocks[clock as usize].mark,
        _ => Mark::default(),
    };
    let mut taken: FxHashMap<&str, Mark> = FxHashMap::default();
    taken.insert(POWER_UP, Mark::default());
    for moment in &moments[first_step + order.len()..] {
        taken.insert(&moment.label, clock_mark(moment));
    }
    let mut reported = FxHashSet::default();
    for (moment, &(t, _)) in moments[first_step..].iter().zip(order) {
        let mark = templates[t].label_mark;
        match taken.insert(&moment.label, mark) {
            Some(other) if reported.insert(t) => {
                let (message, help) = if moment.label == POWER_UP {
                    ("the label `power-up` is reserved".to_string(), "choose another label")
                } else {
                    (format!("the label `{}` is taken", moment.label), "labels must differ: choose another one")
                };
                let mut fault = Fault::new(mark, message, help);
                if other != Mark::default() {
                    fault = fault.related(other, "used here already");
                }
                context.faults.push(fault);
            }
            _ => {}
        }
    }
    stimulus.moments = moments;
}

/// The label of the window before the first step.
const POWER_UP: &str = "power-up";
