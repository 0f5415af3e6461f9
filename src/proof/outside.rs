//! What comes from outside besides the listed steps: edges of clocks.
//!
//! Each clock counts for itself. An edge comes a range of times after the one before it, and, where jitter or the time high
//! leaves room, another range after the one before that; both hold for every clock whose figures are in their ranges. That all
//! periods are equal is not held: what is proved holds for clocks that drift within their ranges, too.

use super::key::{Agent, Info, Key, Mover, Slot};
use super::plant::{Plant, PlantPlace, Ticks};
use super::zone;
use crate::scenario::Clock;
use crate::time::Span;

/// One clock, in ticks.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct PlantClock {
    /// Its number in the scenario.
    pub clock: u32,
    /// The input that it drives, by its number in the plant.
    pub net: u32,
    /// Does it start at 1, so that it falls first?
    pub initial: bool,
    /// How many edges it has.
    pub edges: u32,
    /// The window of its first edge; those of the others follow.
    pub base: u32,
    /// First edge, from the start.
    pub first: Ticks,
    /// Period.
    pub period: Ticks,
    /// Time high in each period.
    pub high: Ticks,
    /// By how much each edge may move either way.
    pub jitter: i64,
}

impl PlantClock {
    pub(super) fn of(
        clock: &Clock,
        number: u32,
        net: u32,
        initial: bool,
        base: u32,
        ticks: &dyn Fn(Span) -> i64,
    ) -> PlantClock {
        let range = |range: crate::delay::DelayRange| Ticks { min: ticks(range.min), max: ticks(range.max) };
        PlantClock {
            clock: number,
            net,
            initial,
            edges: 2 * clock.count,
            base,
            first: range(clock.first),
            period: range(clock.period),
            high: range(clock.high),
            jitter: ticks(clock.jitter),
        }
    }

    /// The time from the first edge of a period to the second.
    fn half(&self) -> Ticks {
        match self.initial {
            true => Ticks { min: self.period.min - self.high.max, max: self.period.max - self.high.min },
            false => self.high,
        }
    }

    fn moved(&self, range: Ticks) -> Ticks {
        Ticks { min: (range.min - 2 * self.jitter).max(0), max: range.max + 2 * self.jitter }
    }

    /// How long after the edge before it an edge comes, the first after the start.
    pub fn after(&self, edge: u32) -> Ticks {
        let (half, period) = (self.half(), self.period);
        match edge {
            0 => self.from_start(0),
            _ if edge % 2 == 1 => self.moved(half),
            // the time low, or that high if it falls first
            _ if self.initial => self.moved(self.high),
            _ => self.moved(Ticks { min: period.min - self.high.max, max: period.max - self.high.min }),
        }
    }

    /// How long after the edge before the last an edge comes, where that says more than [`PlantClock::after`].
    pub fn after_two(&self, edge: u32) -> Option<Ticks> {
        let loose = self.jitter > 0 || self.high.min < self.high.max;
        (edge >= 2 && loose).then(|| self.moved(self.period))
    }

    /// When an edge comes, from the start; one that jitter would put before the start comes there.
    pub fn from_start(&self, edge: u32) -> Ticks {
        let cycles = i64::from(edge / 2);
        let half = if edge % 2 == 1 { self.half() } else { Ticks::default() };
        Ticks {
            min: (self.first.min + cycles * self.period.min + half.min - self.jitter).max(0),
            max: self.first.max + cycles * self.period.max + half.max + self.jitter,
        }
    }
}

/// The clocks of a key that measure when the next edge of a clock comes, with their ranges: rows of its info.
pub(super) fn measures(plant: &Plant, key: Key<'_>, info: &Info, clock: usize) -> [Option<(usize, Ticks)>; 3] {
    let (it, edge) = (&plant.clocks[clock], key.edges(clock));
    let row = |slot: Slot, ticks: Ticks| Some(info.row(slot)).filter(|row| *row > 0).map(|row| (row, ticks));
    [
        row(Slot::Edge(clock as u32), it.after(edge)),
        it.after_two(edge).and_then(|ticks| row(Slot::Cycle(clock as u32), ticks)),
        row(Slot::Start, it.from_start(edge)),
    ]
}

/// Adds what follows from the clocks of a key: how long they run, and what may come. Edges may come alone, several of them
/// together, and together with steps.
pub(super) fn clocks(plant: &Plant, key: Key<'_>, info: &mut Info) {
    let running: Vec<usize> = (0..plant.clocks.len()).filter(|c| key.edges(*c) < plant.clocks[*c].edges).collect();
    for c in &running {
        info.slots.push(Slot::Edge(*c as u32));
        if plant.clocks[*c].after_two(key.edges(*c)).is_some() {
            info.slots.push(Slot::Cycle(*c as u32));
        }
    }
    for c in &running {
        let bounds = measures(plant, key, info, *c);
        info.limits.extend(bounds.into_iter().flatten().map(|(row, ticks)| (row, zone::at_most(ticks.max))));
    }
    let steps: Vec<Agent> = info.agents.iter().filter(|agent| agent.steps > 0).copied().collect();
    for part in 1u32..1 << running.len() {
        let these = running.iter().enumerate().filter(|(i, _)| part >> i & 1 == 1).map(|(_, c)| *c);
        let edges = these.clone().fold(0u32, |all, c| all | 1 << c);
        let first = these.clone().next().unwrap_or(0);
        let row = info.row(Slot::Edge(first as u32));
        let min = plant.clocks[first].after(key.edges(first)).min;
        info.agents.push(Agent { mover: Mover::Edge(first as u32), row, min, steps: 0, edges });
        info.agents.extend(steps.iter().map(|agent| Agent { edges, ..*agent }));
    }
}

/// The numbers of clocks in a mask.
pub(super) fn numbers(edges: u32) -> impl Iterator<Item = usize> + Clone {
    (0..32).filter(move |c| edges >> c & 1 == 1)
}

/// Has everything come from outside that can?
pub(super) fn ended(plant: &Plant, key: Key<'_>) -> bool {
    key.steps() == plant.steps.len() && key.clocks_over(plant)
}

/// The windows in which a question about one of them is asked: its own, and those of steps that begin none of their own here
/// or that may come at its instant.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(super) struct Stretch {
    /// Its own.
    pub start: u32,
    /// The end of those that follow it one after the other.
    end: u32,
    /// Others.
    others: Vec<u32>,
}

impl Stretch {
    pub fn contains(&self, window: &u32) -> bool {
        (self.start..self.end).contains(window) || self.others.contains(window)
    }
}

impl Plant {
    /// When the step or edge that begins a window comes, from the start, as far as it is known; the greatest number where it is
    /// not.
    fn opens_at(&self, window: u32) -> Ticks {
        let edge = self.clocks.iter().find(|clock| (clock.base..clock.base + clock.edges).contains(&window));
        if let Some(clock) = edge {
            return clock.from_start(window - clock.base);
        }
        let mut at = Ticks::default();
        for step in self.steps.iter().take(window as usize) {
            at = match step.place {
                PlantPlace::At(ticks) => ticks,
                PlantPlace::After(ticks) => Ticks { min: at.min + ticks.min, max: at.max.saturating_add(ticks.max) },
                PlantPlace::Rest(wait) => Ticks { min: at.min + wait, max: i64::MAX },
                PlantPlace::When { wait, .. } => Ticks { min: at.min + wait.min, max: i64::MAX },
            };
        }
        at
    }

    /// The windows of a question about this one: from its step to the next that surely begins another, since it changes an
    /// input of the plant and can neither come at the instant of the one before it nor at that of its last input change: an
    /// input that changes there and is set back is seen to stay.
    pub(super) fn stretch(&self, start: u32) -> Stretch {
        let count = self.steps.len() as u32;
        let listed = start <= count;
        let mut inputs = self.initial.clone();
        let (mut end, mut idle) = (None, Vec::new());
        for (number, step) in self.steps.iter().enumerate() {
            // a contact that surely bounces moves, whatever it leads to
            let bounces = step.bounce.is_some_and(|bounce| bounce.pairs.0 > 0);
            let meets = |net: u32| self.may_meet(number) && self.steps[number - 1].set.iter().any(|set| set.0 == net);
            let moves = |net: u32, value: bool| bounces || inputs[net as usize] != value && !meets(net);
            let changes = step.set.iter().any(|(net, value)| self.core[*net as usize] && moves(*net, *value));
            step.set.iter().for_each(|(net, value)| inputs[*net as usize] = *value);
            let window = number as u32 + 1;
            if listed && window > start && changes && !self.may_coincide(number) {
                end = end.or(Some(window));
            }
            if !changes {
                idle.push(window);
            }
        }
        let end = if listed { end.unwrap_or(count + 1) } else { start + 1 };
        let mut others = Vec::new();
        if !self.clocks.is_empty() {
            let own = self.opens_at(start);
            if !listed {
                others.extend(idle.into_iter().filter(|window| self.opens_at(*window).max >= own.min));
            }
            // several at one instant, named by the first of them
            let at_once = |window: &u32| {
                let other = self.opens_at(*window);
                other.min <= own.max && own.min <= other.max
            };
            others.extend((1..start).filter(at_once).map(|first| self.windows + first));
            others.extend((start..end).map(|first| self.windows + first));
            let idle: Vec<u32> = others.iter().filter(|window| **window < self.windows).copied().collect();
            others.extend(idle.into_iter().map(|first| self.windows + first));
        }
        Stretch { start, end, others }
    }
}
