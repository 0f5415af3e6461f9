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
    /// Placed instant of the listed step before, in fs.
    last_step: u64,
    /// Instant of the group before, in fs; once a step has waited, counted from anywhere.
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
    let is_timed = |step: &Step| matches!(step.place, Place::At(_) | Place::After(_));
    let timed = stimulus.steps.iter().any(is_timed);
    // a run that begins at rest is so before the first of all moments
    let first = usize::from(scenario.begin_window().is_none());
    if stimulus.steps.iter().skip(first).any(is_timed) || !stimulus.clocks.is_empty() {
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

#[cfg(test)]
mod tests {
    use super::super::tests::scenario;

    use super::*;

    /// The groups as text: label, changes, and what is special of them.
    fn groups(stimulus: &str) -> Vec<String> {
        let circuit = r#"
            outputs = ["out"]
            [gates]
            out = { or = ["a", "b", "tick", "tock"] }
            [inputs]
            a = 0
            b = 0
            tick = 0
            tock = 1
        "#;
        let scenario = scenario(&format!("{circuit}{stimulus}"));
        let name = |group: &Group| scenario.stimulus.moments[group.moment as usize].label.clone();
        Timeline::of(&scenario.stimulus)
            .map(|group| {
                let set: Vec<String> = group
                    .change
                    .set
                    .iter()
                    .map(|(net, bit)| format!("{}={}", scenario.circuit.name(*net), u8::from(*bit)))
                    .collect();
                let apart = if group.change.apart { " apart" } else { "" };
                let restless = if group.restless { " restless" } else { "" };
                format!("{}: {}{apart}{restless}", name(&group), set.join(" "))
            })
            .collect()
    }

    #[test]
    fn clock_edges_and_steps_come_by_time() {
        // tick rises at 5 and 15, falls at 10 and 20; step 1 comes with the first fall, step 3 once all is over
        let all = groups(
            r#"
            [[clocks]]
            net = "tick"
            first = 5
            period = 10
            high = 5
            count = 2
            [[steps]]
            at = [9, 11]
            set = { a = 1 }
            [[steps]]
            after = 2
            set = { b = 1 }
            [[steps]]
            set = { a = 0 }
            [[steps]]
            after = 0
            set = { b = 0 }
            [[steps]]
            after = 3
            set = { a = 1 }
            "#,
        );
        assert_eq!(
            all,
            [
                "tick rise 1: tick=1",
                "step 1: a=1 tick=0",
                "step 2: b=1",
                "tick rise 2: tick=1",
                "tick fall 2: tick=0",
                "step 3: a=0 b=0",
                "step 5: a=1",
            ]
        );
    }

    #[test]
    fn two_clocks_of_one_instant_are_one_group() {
        // tock starts at 1, so it falls first; in typical runs it is at 0 from 3 to 6
        let all = groups(
            r#"
            [[clocks]]
            net = "tock"
            first = [2, 4]
            period = 6
            high = 3
            count = 1
            jitter = 1
            [[clocks]]
            net = "tick"
            first = 6
            period = 9
            high = 1
            count = 1
            "#,
        );
        assert_eq!(all, ["tock fall 1: tock=0", "tock rise 1: tick=1 tock=1", "tick fall 1: tick=0"]);
    }

    #[test]
    fn waiting_steps_are_groups_of_their_own() {
        let all = groups(
            r#"
            [[steps]]
            set = { a = 1 }
            [[steps]]
            rest = 0
            set = { a = 0 }
            [[steps]]
            when = { out = 1 }
            set = { b = 1 }
            [[steps]]
            after = 0
            set = { a = 1 }
            "#,
        );
        assert_eq!(all, ["step 1: a=1", "step 2: a=0", "step 3: a=1 b=1"]);
    }

    #[test]
    fn skew_bounce_and_repeats_within_one_instant_are_told() {
        let all = groups(
            r#"
            [[steps]]
            set = { a = 1, b = 1 }
            skew = [0, 4]
            [[steps]]
            set = { a = 0, b = 0 }
            skew = [3, 3]
            [[steps]]
            set = { a = 1 }
            bounce = { lasting = 4, pulses = [0, 2] }
            [[steps]]
            set = { b = 1 }
            [[steps]]
            after = 0
            set = { a = 0, b = 0 }
            skew = [0, 4]
            "#,
        );
        assert_eq!(
            all,
            ["step 1: a=1 b=1 apart", "step 2: a=0 b=0", "step 3: a=1 restless", "step 4: a=0 b=0 apart restless",]
        );
    }

    #[test]
    fn the_last_word_of_one_instant_counts() {
        let all = groups(
            r#"
            [[steps]]
            at = 1
            set = { a = 1, b = 1 }
            [[steps]]
            at = 1
            set = { a = 0 }
            "#,
        );
        assert_eq!(all, ["step 1: a=0 b=1"]);
    }

    #[test]
    fn a_long_clock_is_not_unrolled() {
        let text = r#"
            outputs = ["out"]
            [inputs]
            tick = 0
            [gates]
            out = { buf = ["tick"] }
            [[clocks]]
            net = "tick"
            first = 1
            period = 2
            high = 1
            count = 400000
        "#;
        let scenario = scenario(text);
        let mut timeline = Timeline::of(&scenario.stimulus);
        let first: Vec<u32> = timeline.by_ref().take(3).map(|group| group.moment).collect();
        assert_eq!(first, [0, 1, 2]);
        assert_eq!(timeline.edges.len(), 1, "one edge of each clock waits");
        assert_eq!(timeline.count(), 799_997);
    }
}
