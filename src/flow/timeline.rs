//! The moments of a scenario in their typical order, one instant after the other.

use std::cmp::Reverse;
use std::collections::{BTreeMap, BinaryHeap};

use crate::circuit::NetId;
use crate::instance::ClockCase;
use crate::scenario::{Place, Scenario, Step, Stimulus};
use crate::statics::Change;
use crate::time::Span;

/// What happens at one instant: listed steps and clock edges, one batch of input changes.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Group {
    /// The moment that names it: the first listed step, else the edge of the first clock.
    pub moment: u32,
    /// All input changes. They may come one after the other if any of the steps has skew.
    pub change: Change,
    /// May inputs move back and forth before they stay, also those that end where they were? So it is where contacts
    /// bounce, and where steps of one instant set an input twice and one of them has skew.
    pub restless: bool,
}

/// The groups of a scenario, made one by one as they are asked for.
///
/// Places and clocks are typical and without jitter. `at` and `after` steps and clock edges come by time. The first step
/// that waits (`rest`, `when`) comes after all clocks have ended; nobody knows when, so what follows it counts from it.
///
/// ```
/// use stillgate::circuit::Function;
/// use stillgate::flow::Timeline;
/// use stillgate::scenario::{Builder, NewStep};
///
/// let mut gate = Builder::new("two steps of one instant, and one more");
/// gate.input("a", false).input("b", false);
/// gate.gate("out", Function::And, ["a", "b"]).delay("1");
/// gate.step(NewStep::at("10").set("a", true)).step(NewStep::after("0").set("b", true));
/// gate.step(NewStep::rest("0").set("a", false));
/// let scenario = gate.finish().unwrap();
/// let sizes: Vec<usize> = Timeline::of(&scenario.stimulus).map(|group| group.change.set.len()).collect();
/// assert_eq!(sizes, [2, 1]);
/// ```
#[derive(Clone, Debug)]
pub struct Timeline<'a> {
    stimulus: &'a Stimulus,
    /// The next listed step.
    step: usize,
    /// Placed instant of the listed step before, in fs; also the instant of the group before, if that is later.
    last_step: u64,
    now: u64,
    cases: Vec<ClockCase>,
    /// The moment of the first edge of each clock.
    base: Vec<u32>,
    /// The next edge of each clock that has not ended: instant, clock, edge; the first on top.
    edges: BinaryHeap<Reverse<(u64, u32, u32)>>,
}

impl<'a> Timeline<'a> {
    /// All groups of a stimulus.
    pub fn of(stimulus: &'a Stimulus) -> Timeline<'a> {
        let all_edges: u32 = stimulus.clocks.iter().map(|clock| 2 * clock.count).sum();
        let mut next = stimulus.moments.len() as u32 - all_edges;
        let mut timeline = Timeline {
            stimulus,
            step: 0,
            last_step: 0,
            now: 0,
            cases: Vec::with_capacity(stimulus.clocks.len()),
            base: Vec::with_capacity(stimulus.clocks.len()),
            edges: BinaryHeap::with_capacity(stimulus.clocks.len()),
        };
        for (number, clock) in stimulus.clocks.iter().enumerate() {
            timeline.base.push(next);
            next += 2 * clock.count;
            timeline.cases.push(ClockCase {
                first: clock.first.typ,
                period: clock.period.typ,
                high: clock.high.typ,
                jitter: Vec::new(),
            });
            timeline.wait_for(number as u32, 0);
        }
        timeline
    }

    /// The clock's next edge, if it has one.
    fn wait_for(&mut self, number: u32, edge: u32) {
        let clock = &self.stimulus.clocks[number as usize];
        if edge < 2 * clock.count {
            let initial = self.stimulus.initial[clock.net.index()];
            self.edges.push(Reverse((self.cases[number as usize].edge(initial, edge), number, edge)));
        }
    }

    /// When a listed step comes, if it does not wait.
    fn placed(&self, step: &Step) -> Option<u64> {
        match step.place {
            Place::At(range) => Some(range.typ.fs()),
            Place::After(range) => Some(self.last_step.saturating_add(range.typ.fs())),
            Place::Rest(_) | Place::When { .. } => None,
        }
    }
}

impl Iterator for Timeline<'_> {
    type Item = Group;

    fn next(&mut self) -> Option<Group> {
        let step = self.stimulus.steps.get(self.step);
        let edge = self.edges.peek().map(|Reverse((at, ..))| *at);
        let placed = step.and_then(|step| self.placed(step));
        let at = match (step, placed, edge) {
            (_, Some(placed), Some(edge)) => placed.min(edge),
            (_, Some(at), None) | (_, None, Some(at)) => at,
            // a step that waits, and all clocks have ended: any instant will do
            (Some(_), None, None) => self.now,
            (None, None, None) => return None,
        };
        let at = at.max(self.now);
        self.now = at;
        let mut set: BTreeMap<NetId, bool> = BTreeMap::new();
        let mut group = Group { moment: 0, change: Change { set: Vec::new(), apart: false }, restless: false };
        let (mut name, mut twice) = (None, false);
        let mut waits = edge.is_none();
        while let Some(step) = self.stimulus.steps.get(self.step) {
            match self.placed(step) {
                Some(placed) if placed <= at => {}
                None if waits => {}
                _ => break,
            }
            // what is placed at rest after a step of this instant is a batch of its own
            waits = false;
            name = name.or(Some(self.stimulus.moment_of_step(self.step as u32)));
            for (net, bit) in &step.set {
                twice |= set.insert(*net, *bit).is_some_and(|other| other != *bit);
            }
            // offsets that are all the same keep the changes together
            group.change.apart |= step.skew.is_some_and(|skew| !skew.is_exact());
            group.restless |= step.bounce.as_ref().is_some_and(|bounce| bounce.pulses.1 > 0);
            self.last_step = at;
            self.step += 1;
        }
        while let Some(Reverse((due, number, edge))) = self.edges.peek().copied()
            && due <= at
        {
            self.edges.pop();
            let net = self.stimulus.clocks[number as usize].net;
            set.insert(net, self.stimulus.initial[net.index()] ^ (edge % 2 == 0));
            name = name.or(Some(self.base[number as usize] + edge));
            self.wait_for(number, edge + 1);
        }
        group.restless |= twice && group.change.apart;
        group.moment = name.expect("a step or an edge is due");
        group.change.set = set.into_iter().collect();
        Some(group)
    }
}

/// What the typical order does not show, in whole sentences.
pub(super) fn notes(scenario: &Scenario) -> Vec<String> {
    let stimulus = &scenario.stimulus;
    let mut notes = Vec::new();
    let labels = |wanted: fn(&Step) -> bool| -> Vec<&str> {
        stimulus.steps.iter().filter(|step| wanted(step)).map(|step| step.label.as_str()).collect()
    };
    let waiting = labels(|step| matches!(step.place, Place::When { .. }));
    if let [first, rest @ ..] = waiting.as_slice() {
        let more = if rest.is_empty() { String::new() } else { format!(" and {} more", rest.len()) };
        notes.push(format!(
            "step \"{first}\"{more} waits for a pattern: this view takes it that the pattern comes, after all clocks have ended"
        ));
    }
    let timed = stimulus.steps.iter().any(|step| matches!(step.place, Place::At(_) | Place::After(_)));
    if timed || !stimulus.clocks.is_empty() {
        notes.push(
            "steps placed by time and clock edges are taken to come at rest: this view knows no delays, so it cannot tell \
             whether they do"
                .into(),
        );
    }
    // clock edges keep their order to other moments only where all of it is exact
    let loose = |range: crate::delay::DelayRange| !range.is_exact();
    let drifts = stimulus
        .clocks
        .iter()
        .any(|clock| loose(clock.first) || loose(clock.period) || loose(clock.high) || clock.jitter != Span::ZERO)
        || stimulus.steps.iter().any(|step| match step.place {
            Place::At(range) | Place::After(range) => loose(range),
            _ => false,
        });
    if drifts && (stimulus.clocks.len() > 1 || (timed && !stimulus.clocks.is_empty())) {
        notes.push(
            "clock edges and steps placed by time come in their typical order here; drawn ones may come in another"
                .into(),
        );
    }
    notes
}
