//! From a trace to the delays that make it happen: one constant delay a gate and edge, a wire and edge, one place a step,
//! as an exact linear program.

use std::collections::VecDeque;

use super::bounce::Begins;
use super::explored::Fired;
use super::key::{Mover, bit, excited, put};
use super::plant::{Plant, PlantPlace, Ticks};
use super::simplex::{Program, Solved};

/// One delay or place.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Unknown {
    /// Delay of a gate (by its number in the plant) to this value.
    Gate(u32, bool),
    /// Delay of a wire (by its number in the plant) to this value.
    Wire(u32, bool),
    /// Place of a step.
    Place(u32),
    /// How much later than its step an input (an entry of its set) changes.
    Late(u32, u32),
    /// How much later than its step an input toggles that bounces.
    Toggle {
        /// The step.
        step: u32,
        /// The input, an entry of its set.
        entry: u32,
        /// Which toggle, from 0; those at the instant of the step do not count.
        number: u32,
        /// Is it the last?
        last: bool,
    },
    /// First edge of a clock (by its number in the plant).
    First(u32),
    /// Period of a clock.
    Period(u32),
    /// Time high of a clock.
    High(u32),
    /// How much later than the earliest that jitter allows an edge of a clock comes.
    Jitter(u32, u32),
}

/// A sum of unknowns and a constant, in ticks; terms in the order of the unknowns, none with factor 0.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Form {
    /// Unknowns, by number in [`System::unknowns`], with their factors.
    pub terms: Vec<(usize, i64)>,
    /// The constant.
    pub constant: i64,
}

impl Form {
    fn plus(&self, unknown: usize) -> Form {
        let mut sum = self.clone();
        sum.add(unknown, 1);
        sum
    }

    fn add(&mut self, unknown: usize, factor: i64) {
        match self.terms.binary_search_by_key(&unknown, |term| term.0) {
            Ok(at) => {
                self.terms[at].1 += factor;
                if self.terms[at].1 == 0 {
                    self.terms.remove(at);
                }
            }
            Err(at) => self.terms.insert(at, (unknown, factor)),
        }
    }

    /// This and a constant.
    pub fn with(mut self, constant: i64) -> Form {
        self.constant += constant;
        self
    }

    /// This less another.
    pub fn minus(&self, other: &Form) -> Form {
        let mut difference = self.clone();
        difference.constant -= other.constant;
        for (unknown, factor) in &other.terms {
            difference.add(*unknown, -factor);
        }
        difference
    }
}

/// How a form stands to 0.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Sense {
    /// Below.
    Below,
    /// Below or at.
    AtMost,
    /// At.
    Equal,
}

/// One condition: a form below, at most, or at 0.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Row {
    /// The form.
    pub form: Form,
    /// How it stands to 0.
    pub sense: Sense,
}

/// The conditions under which constant delays give a trace.
#[derive(Clone, Debug, Default)]
pub struct System {
    /// The unknowns.
    pub unknowns: Vec<Unknown>,
    /// The range of each.
    pub ranges: Vec<Ticks>,
    /// Which edges of a gate or wire each stands for, `[fall, rise]`.
    pub edges: Vec<[bool; 2]>,
    /// Which firing of its gate, or change on its wire, each belongs to, where each has a delay of its own; else 0.
    pub(super) firing: Vec<u32>,
    /// The conditions.
    pub rows: Vec<Row>,
    /// When each block of the trace comes, from the start.
    pub times: Vec<Form>,
    /// When what still pends at the end would come: the gate (by its number in the plant) and the time.
    pub pending: Vec<(u32, Form)>,
}

/// A point of a system.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Point {
    /// Numerators of the unknowns, in ticks.
    pub values: Vec<i128>,
    /// Their denominator.
    pub denominator: i128,
    /// Rows that are tight in every point: they hold only by exact equality.
    pub ties: Vec<usize>,
}

/// What a system has.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Points {
    /// A point, as far from all its bounds as can be.
    Some(Point),
    /// None: this trace needs delays that change from one firing to the next.
    None,
    /// The numbers grew too large.
    GaveUp,
}

/// An input that bounces.
struct Bouncing {
    /// The entry of its step's set.
    entry: u32,
    /// Toggles so far.
    number: u32,
    /// When it last moved, or could have.
    moved: Form,
    /// Is it at its new value?
    at_new: bool,
}

/// What of a trace is walked along.
struct Walk<'a> {
    plant: &'a Plant,
    /// May a gate have different delays for its edges, even where one draw gives both?
    system: System,
    values: Vec<u64>,
    steps: usize,
    since: Vec<Option<Form>>,
    flights: Vec<VecDeque<(Form, u32)>>,
    /// Has each firing a delay of its own? How often each gate was excited, and changes set out on each wire.
    each: bool,
    excited: Vec<u32>,
    launched: Vec<u32>,
    step_time: Form,
    /// The inputs of the last step that bounce.
    bouncing: Vec<Bouncing>,
    /// When the pattern came that the next step waits for.
    came: Option<Form>,
    /// The last block, if its batch goes on since the pattern that shows after it has not come.
    goes_on: Option<usize>,
    /// Edges of each clock that have come.
    edges: Vec<u32>,
    /// The block of the last step or edge.
    opened: Option<usize>,
    /// For each signal the block that last changed it.
    last: Vec<Option<usize>>,
    /// Edges of these gates share one unknown.
    shared: &'a dyn Fn(Unknown) -> Unknown,
}

impl System {
    /// The conditions of a trace from start values. `shared` maps unknowns that are always equal to one of them.
    ///
    /// Dependent events keep their order; events that have nothing to do with each other may come in any order.
    pub fn of(plant: &Plant, start: &[u64], trace: &[Fired], shared: &dyn Fn(Unknown) -> Unknown) -> System {
        System::walked(plant, start, trace, shared, false)
    }

    /// The same where each firing takes a delay of its own from its range, as in the exploration.
    pub(super) fn of_each(plant: &Plant, start: &[u64], trace: &[Fired]) -> System {
        System::walked(plant, start, trace, &|unknown| unknown, true)
    }

    fn walked(
        plant: &Plant,
        start: &[u64],
        trace: &[Fired],
        shared: &dyn Fn(Unknown) -> Unknown,
        each: bool,
    ) -> System {
        let mut walk = Walk {
            plant,
            system: System::default(),
            values: start.to_vec(),
            steps: 0,
            since: vec![None; plant.gates.len()],
            flights: vec![VecDeque::new(); plant.wires.len()],
            each,
            excited: vec![0; plant.gates.len()],
            launched: vec![0; plant.wires.len()],
            step_time: Form::default(),
            bouncing: Vec::new(),
            came: plant.shows_pattern(0, start).then(Form::default),
            goes_on: None,
            edges: vec![0; plant.clocks.len()],
            opened: None,
            last: vec![None; plant.signals()],
            shared,
        };
        for gate in 0..plant.gates.len() {
            walk.since[gate] = excited(plant, &walk.values, gate).then(Form::default);
        }
        for (number, block) in trace.iter().enumerate() {
            walk.block(number, block);
        }
        if let Some(end) = walk.system.times.last().cloned()
            && let (None, Some(gives_up)) = (&walk.came, walk.gives_up())
        {
            walk.system.push(end.minus(&gives_up), Sense::AtMost);
        }
        walk.bounce_on();
        // edges that the trace does not hold come later
        if let Some(end) = walk.system.times.last().cloned() {
            for clock in 0..plant.clocks.len() {
                if walk.edges[clock] < plant.clocks[clock].edges {
                    let next = walk.edge_time(clock as u32);
                    walk.system.push(end.minus(&next), Sense::Below);
                }
            }
        }
        for gate in 0..plant.gates.len() as u32 {
            if let Some(since) = walk.since[gate as usize].clone() {
                let due = walk.due(gate, &since);
                walk.system.pending.push((gate, due));
            }
        }
        walk.system
    }

    /// Adds a condition.
    pub fn push(&mut self, form: Form, sense: Sense) {
        self.rows.push(Row { form, sense });
    }

    /// The number of an unknown of this range, in this firing.
    fn unknown(&mut self, unknown: Unknown, firing: u32, range: Ticks) -> usize {
        let known = (0..self.unknowns.len()).find(|at| self.unknowns[*at] == unknown && self.firing[*at] == firing);
        known.unwrap_or_else(|| {
            self.unknowns.push(unknown);
            self.firing.push(firing);
            self.ranges.push(range);
            self.edges.push([false; 2]);
            self.unknowns.len() - 1
        })
    }

    /// A point that keeps every condition, with the greatest least distance of those that say "below". Those that cannot be
    /// kept but by equality are kept so, and named.
    pub fn solve(&self) -> Points {
        let slack = self.unknowns.len();
        let mut ties: Vec<usize> = Vec::new();
        loop {
            let mut program = Program { variables: slack + 1, ..Program::default() };
            let mut strict = Vec::new();
            for (number, row) in self.rows.iter().enumerate() {
                // x = least + x'
                let base: i64 = row.form.terms.iter().map(|(unknown, factor)| factor * self.ranges[*unknown].min).sum();
                let limit = -row.form.constant - base;
                let mut terms = row.form.terms.clone();
                match row.sense {
                    Sense::Below if !ties.contains(&number) => {
                        strict.push((number, program.rows.len()));
                        terms.push((slack, 1));
                    }
                    Sense::Below | Sense::AtMost => {}
                    Sense::Equal => {
                        let other = terms.iter().map(|(unknown, factor)| (*unknown, -factor)).collect();
                        program.rows.push((other, -limit));
                    }
                }
                program.rows.push((terms, limit));
            }
            for (unknown, range) in self.ranges.iter().enumerate() {
                program.rows.push((vec![(unknown, 1)], range.max - range.min));
            }
            // the slack has an end even where nothing bounds it
            program.rows.push((vec![(slack, 1)], 1 << 40));
            program.objective.push((slack, 1));
            let best = match program.solve() {
                Solved::Best(best) => best,
                Solved::Infeasible => return Points::None,
                Solved::Unbounded | Solved::GaveUp => return Points::GaveUp,
            };
            let tight: Vec<usize> =
                strict.iter().filter(|(_, row)| best.prices[*row] > 0).map(|(number, _)| *number).collect();
            if best.objective > 0 || strict.is_empty() {
                let values = (0..slack)
                    .map(|unknown| best.values[unknown] + i128::from(self.ranges[unknown].min) * best.denominator)
                    .collect();
                return Points::Some(Point { values, denominator: best.denominator, ties });
            }
            if tight.is_empty() {
                return Points::GaveUp;
            }
            ties.extend(tight);
        }
    }
}

impl Walk<'_> {
    fn unknown(&mut self, unknown: Unknown, firing: u32, range: Ticks) -> usize {
        let shared = (self.shared)(unknown);
        let number = self.system.unknown(shared, if self.each { firing } else { 0 }, range);
        if let Unknown::Gate(_, rises) | Unknown::Wire(_, rises) = unknown {
            self.system.edges[number][usize::from(rises)] = true;
        }
        number
    }

    /// When a gate that has been excited since then fires.
    fn due(&mut self, gate: u32, since: &Form) -> Form {
        let rises = !bit(&self.values, self.plant.inputs + gate as usize);
        let range = self.plant.gates[gate as usize].delay[usize::from(rises)];
        since.plus(self.unknown(Unknown::Gate(gate, rises), self.excited[gate as usize], range))
    }

    /// When a change under way arrives, `place` being how many are before it.
    fn arrives(&mut self, wire: u32, place: u8) -> Form {
        let end = bit(&self.values, self.plant.nets.len() + wire as usize);
        let rises = end == (place % 2 == 1);
        let range = self.plant.wires[wire as usize].delay[usize::from(rises)];
        let (launched, number) = self.flights[wire as usize][place as usize].clone();
        launched.plus(self.unknown(Unknown::Wire(wire, rises), number, range))
    }

    /// When a mover comes; `step` is the number of the step, if it is one, and `before` when the step before it came.
    fn mover_time(&mut self, number: usize, mover: Mover, step: usize, before: &Form) -> Form {
        match mover {
            Mover::Gate(gate) => {
                let since = self.since[gate as usize].clone().unwrap_or_default();
                self.due(gate, &since)
            }
            Mover::Arrival(wire) => self.arrives(wire, 0),
            Mover::Overtaking(..) | Mover::Apart => unreachable!("it is part of another"),
            Mover::Edge(clock) => self.edge_time(clock),
            Mover::Step(_) => {
                let place = Unknown::Place(step as u32);
                match self.plant.steps[step].place {
                    PlantPlace::At(range) => Form::default().plus(self.unknown(place, 0, range)),
                    PlantPlace::After(range) => before.plus(self.unknown(place, 0, range)),
                    PlantPlace::When { wait, .. } => {
                        let came = self.came.clone().unwrap_or_default();
                        came.plus(self.unknown(place, 0, wait))
                    }
                    PlantPlace::Rest(wait) => {
                        // rest begins with the last event
                        let rest =
                            number.checked_sub(1).map(|last| self.system.times[last].clone()).unwrap_or_default();
                        for signal in 0..self.last.len() {
                            if let Some(block) = self.last[signal].filter(|block| block + 1 < number) {
                                let form = self.system.times[block].minus(&rest);
                                self.system.push(form, Sense::AtMost);
                            }
                        }
                        Form { constant: rest.constant + wait, ..rest }
                    }
                }
            }
            Mover::Toggle(entry, last) => self.toggle(entry, last, before),
            Mover::Late(entry) => {
                let step = self.steps - 1;
                let range = Ticks { min: 0, max: self.plant.steps[step].skew };
                before.plus(self.unknown(Unknown::Late(step as u32, entry), 0, range))
            }
        }
    }

    /// When the next edge of a clock comes: all from the same figures. One that jitter would put before the start is left out.
    fn edge_time(&mut self, clock: u32) -> Form {
        let it = &self.plant.clocks[clock as usize];
        let edge = self.edges[clock as usize];
        let mut time = Form::default().plus(self.unknown(Unknown::First(clock), 0, it.first));
        let mut periods = i64::from(edge / 2);
        if edge % 2 == 1 {
            let high = self.unknown(Unknown::High(clock), 0, it.high);
            time.add(high, if it.initial { -1 } else { 1 });
            periods += i64::from(it.initial);
        }
        if periods > 0 {
            let period = self.unknown(Unknown::Period(clock), 0, it.period);
            time.add(period, periods);
        }
        if it.jitter > 0 {
            let range = Ticks { min: 0, max: 2 * it.jitter };
            time = time.plus(self.unknown(Unknown::Jitter(clock, edge), 0, range)).with(-it.jitter);
            if edge == 0 {
                self.system.push(Form::default().minus(&time), Sense::AtMost);
            }
        }
        time
    }

    /// The inputs of the last step begin to bounce, if they do.
    fn begin_bounce(&mut self, movers: &[Mover], time: &Form) {
        self.bouncing.clear();
        let mask = movers.iter().rev().find_map(|mover| if let Mover::Step(mask) = mover { Some(*mask) } else { None });
        let step = &self.plant.steps[self.steps - 1];
        let (Some(mask), true) = (mask, step.bounce.is_some()) else { return };
        let begins = Begins(mask);
        for entry in (0..step.set.len()).filter(|entry| begins.goes_on(*entry)) {
            let at_new = begins.at_once(entry);
            self.bouncing.push(Bouncing { entry: entry as u32, number: 0, moved: time.clone(), at_new });
        }
    }

    /// When an input of the last step toggles, which came then. Its toggles come one after the other.
    fn toggle(&mut self, entry: u32, last: bool, step_time: &Form) -> Form {
        let step = self.steps - 1;
        let lasting = self.plant.steps[step].bounce.map_or_else(Ticks::default, |bounce| bounce.lasting);
        let range = if last { lasting } else { Ticks { min: 0, max: lasting.max } };
        let Some(at) = self.bouncing.iter().position(|it| it.entry == entry) else { return step_time.clone() };
        let number = self.bouncing[at].number;
        let time = step_time.plus(self.unknown(Unknown::Toggle { step: step as u32, entry, number, last }, 0, range));
        let it = &mut self.bouncing[at];
        self.system.push(it.moved.minus(&time), Sense::Below);
        (it.number, it.moved, it.at_new) = (number + 1, time.clone(), !it.at_new);
        if last {
            self.bouncing.swap_remove(at);
        }
        time
    }

    /// Toggles that the trace does not hold come after all that it holds.
    fn bounce_on(&mut self) {
        let before = self.step_time.clone();
        while let Some(Bouncing { entry, at_new, .. }) = self.bouncing.first() {
            let (entry, last) = (*entry, !at_new);
            let time = self.toggle(entry, last, &before);
            for block in &self.system.times {
                self.system.rows.push(Row { form: block.minus(&time), sense: Sense::Below });
            }
        }
    }

    /// When the next step gives up waiting for its pattern, if it does.
    fn gives_up(&self) -> Option<Form> {
        match self.plant.steps.get(self.steps)?.place {
            PlantPlace::When { timeout, .. } => timeout.map(|timeout| self.step_time.clone().with(timeout)),
            _ => None,
        }
    }

    /// Has the pattern come that the next step waits for? Then the batch ends, and what could alter it comes later.
    fn look(&mut self, number: usize, block: &Fired, time: &Form) {
        let plant = self.plant;
        if !block.came {
            let shows = plant.shows_pattern(self.steps, &block.values);
            let late = block.movers.iter().any(|mover| mover.is_late() || matches!(mover, Mover::Step(_)));
            self.goes_on = (shows && !late).then_some(number);
            return;
        }
        if let Some(gives_up) = self.gives_up() {
            self.system.push(time.minus(&gives_up), Sense::AtMost);
        }
        for &(net, _) in &plant.steps[self.steps].pattern {
            let Some(gate) = (net as usize).checked_sub(plant.inputs) else { continue };
            if let Some(since) = self.since[gate].clone().filter(|_| excited(plant, &block.values, gate)) {
                let due = self.due(gate as u32, &since);
                self.system.push(time.minus(&due), Sense::Below);
            }
        }
        self.came = Some(time.clone());
    }

    /// A change sets out on a wire, and removes so many of those before it.
    fn sets_out(&mut self, wire: u32, rises: bool, over: usize, time: &Form) {
        let range = self.plant.wires[wire as usize].delay[usize::from(rises)];
        self.launched[wire as usize] += 1;
        let number = self.launched[wire as usize];
        let due = time.plus(self.unknown(Unknown::Wire(wire, rises), number, range));
        let kept = self.flights[wire as usize].len() - over;
        for place in 0..self.flights[wire as usize].len() {
            let before = self.arrives(wire, place as u8);
            if place >= kept {
                self.system.push(due.minus(&before), Sense::AtMost);
            } else if place + 1 == kept {
                let form = before.minus(&due);
                if form.constant > 0 || form.terms.iter().any(|term| term.1 > 0) || form.terms.is_empty() {
                    self.system.push(form, Sense::Below);
                }
            }
        }
        self.flights[wire as usize].truncate(kept);
        if over.is_multiple_of(2) {
            self.flights[wire as usize].push_back((time.clone(), number));
        }
    }

    fn block(&mut self, number: usize, block: &Fired) {
        let plant = self.plant;
        let mut time: Option<Form> = None;
        // steps of one instant come one after the other
        let (mut taken, mut before) = (self.steps, self.step_time.clone());
        let own = block.movers.contains(&Mover::Apart);
        for mover in block.movers.iter().filter(|mover| !matches!(mover, Mover::Overtaking(..) | Mover::Apart)) {
            let due = self.mover_time(number, *mover, taken, &before);
            if matches!(mover, Mover::Step(_)) {
                taken += 1;
                before = due.clone();
            }
            match &time {
                None => time = Some(due),
                Some(time) => self.system.push(due.minus(time), Sense::Equal),
            }
        }
        let time = time.unwrap_or_default();
        if let (true, Some(came)) = (own, &self.came) {
            self.system.push(time.minus(came), Sense::Equal);
        }
        if let Some(before) = self.goes_on.take() {
            self.system.push(time.minus(&self.system.times[before]), Sense::Equal);
        }
        let edged = block.movers.iter().any(|mover| matches!(mover, Mover::Edge(_)));
        let step = taken > self.steps || edged;
        let rests = step && taken > self.steps && matches!(plant.steps[self.steps].place, PlantPlace::Rest(_));
        let changed: Vec<usize> =
            (0..plant.signals()).filter(|s| bit(&self.values, *s) != bit(&block.values, *s)).collect();

        // what came before and has to do with it
        let mut earlier: Vec<usize> = Vec::new();
        if step && !rests {
            earlier.extend(self.last.iter().flatten());
            earlier.extend(self.opened.filter(|_| !plant.clocks.is_empty()));
        } else if !rests {
            let mut see = |signal: usize| earlier.extend(self.last[signal]);
            for signal in &changed {
                see(*signal);
                let own = signal.checked_sub(plant.inputs).filter(|gate| *gate < plant.gates.len());
                let readers = plant.readers[*signal].iter().map(|gate| *gate as usize);
                for gate in own.into_iter().chain(readers) {
                    see(plant.inputs + gate);
                    plant.gates[gate].reads.iter().for_each(|read| see(read.0 as usize));
                }
            }
            // what a step waits for is like a gate that reads its pattern
            let pattern = plant.steps.get(self.steps).map_or(&[][..], |step| &step.pattern);
            let late = block.movers.iter().any(Mover::is_late);
            if late || pattern.iter().any(|entry| changed.contains(&(entry.0 as usize))) {
                pattern.iter().for_each(|entry| see(entry.0 as usize));
            }
        }
        earlier.sort_unstable();
        earlier.dedup();
        for before in earlier {
            let form = self.system.times[before].minus(&time);
            // a sum of delays less a part of itself needs no condition
            if form.constant > 0 || form.terms.iter().any(|term| term.1 > 0) || form.terms.is_empty() {
                self.system.push(form, if own { Sense::AtMost } else { Sense::Below });
            }
        }
        // what pends and hears of it, or must wait for the step
        for gate in 0..plant.gates.len() as u32 {
            let hears = step && !rests
                || plant.gates[gate as usize].reads.iter().any(|read| changed.contains(&(read.0 as usize)));
            if let (true, Some(since)) = (hears, self.since[gate as usize].clone())
                && !block.movers.contains(&Mover::Gate(gate))
            {
                let due = self.due(gate, &since);
                self.system.push(time.minus(&due), Sense::Below);
            }
        }

        // the state after it
        for mover in &block.movers {
            match *mover {
                Mover::Arrival(wire) => {
                    self.flights[wire as usize].pop_front();
                }
                Mover::Gate(gate) => self.since[gate as usize] = None,
                Mover::Edge(clock) => self.edges[clock as usize] += 1,
                Mover::Overtaking(..) | Mover::Apart | Mover::Step(_) | Mover::Late(_) | Mover::Toggle(..) => {}
            }
        }
        if step {
            self.opened = Some(number);
        }
        if taken > self.steps {
            self.step_time = time.clone();
            self.steps = taken;
            self.came = None;
            self.begin_bounce(&block.movers, &time);
        }
        if self.came.is_none() {
            self.look(number, block, &time);
        }
        for signal in &changed {
            put(&mut self.values, *signal, bit(&block.values, *signal));
            self.last[*signal] = Some(number);
        }
        for signal in &changed {
            for wire in plant.leads.get(*signal).into_iter().flatten() {
                let over = block.movers.iter().find_map(|mover| match mover {
                    Mover::Overtaking(other, over) if other == wire => Some(*over as usize),
                    _ => None,
                });
                self.sets_out(*wire, bit(&block.values, *signal), over.unwrap_or(0), &time);
            }
        }
        for gate in 0..plant.gates.len() {
            match excited(plant, &self.values, gate) {
                true if self.since[gate].is_none() => {
                    self.since[gate] = Some(time.clone());
                    self.excited[gate] += 1;
                }
                true => {}
                false => self.since[gate] = None,
            }
        }
        self.system.times.push(time);
    }
}
