//! A further run behind the front one: each of its windows is laid on the front run's window of the same step, so that what
//! differs is what the step led to, and not when the step came.

use super::Picture;
use super::lane::Wave;
use crate::circuit::NetId;
use crate::engine::End;
use crate::logic::Value;
use crate::output::words;
use crate::review::RunReport;
use crate::time::Time;

/// Most steps that a note names.
const NAMED: usize = 4;

/// A run that is laid on the front one.
pub(super) struct Laid {
    /// Stretches of the front run's time that it fills, in order.
    pieces: Vec<Piece>,
    /// For each net its changes, piece by piece, in the front run's time.
    changes: Vec<Vec<(u32, Time, Value)>>,
    /// What is not drawn of it, and why.
    pub notes: Vec<String>,
}

struct Piece {
    from: Time,
    /// The front run's next step; `None` for its last window.
    to: Option<Time>,
    /// The run's window; `None` for the stretch before the first.
    window: Option<usize>,
}

/// What is drawn of one net in one piece.
pub(super) struct Stretch {
    pub from: Time,
    /// `None`: to the end of the picture.
    pub to: Option<Time>,
    pub wave: Wave,
}

impl Laid {
    /// Lays a run on the front one.
    pub fn of(picture: &Picture<'_>, front: &RunReport, run: &RunReport) -> Laid {
        let scenario = picture.scenario;
        let (steps, own) = (&front.trace.windows, &run.trace.windows);
        let mut pieces = Vec::with_capacity(steps.len() + 1);
        let (mut missing, mut otherwise, mut ended) = (Vec::new(), Vec::new(), Vec::new());
        pieces.push(Piece { from: Time::ZERO, to: steps.first().map(|first| first.start), window: None });
        // the piece that each window of the run fills
        let mut fills: Vec<Option<u32>> = vec![None; own.len()];
        let mut named: Vec<Option<usize>> = vec![None; scenario.stimulus.moments.len()];
        for (i, window) in own.iter().enumerate() {
            named[window.moment as usize] = Some(i);
        }
        for (i, window) in steps.iter().enumerate() {
            let to = steps.get(i + 1).map(|next| next.start);
            match named[window.moment as usize] {
                Some(found) => {
                    if own[found].before != window.before {
                        otherwise.extend(words::step(scenario, Some(window.moment)));
                    }
                    fills[found] = Some(pieces.len() as u32);
                    let lasted = own[found].stop.since(own[found].start);
                    let left = Time::from_fs(window.start.fs().saturating_add(lasted.fs()));
                    let unfinished = !matches!(own[found].end, End::Settled);
                    // nothing is known of it once it was left
                    if unfinished && left < to.unwrap_or(front.trace.end) {
                        ended.extend(words::step(scenario, Some(window.moment)));
                    }
                    let to = if unfinished { Some(to.map_or(left, |to| to.min(left))) } else { to };
                    pieces.push(Piece { from: window.start, to, window: Some(found) });
                }
                None => missing.extend(words::step(scenario, Some(window.moment))),
            }
        }
        let mut changes = vec![Vec::new(); scenario.circuit.net_count()];
        let mut late = 0;
        for change in &run.trace.changes {
            let Some(window) = own.partition_point(|it| it.batch <= change.batch).checked_sub(1) else { continue };
            let Some(number) = fills[window] else { continue };
            let piece = &pieces[number as usize];
            let at = piece.from + change.at.since(own[window].start);
            if piece.to.is_some_and(|to| to < at) {
                late += 1;
            } else {
                changes[change.net.index()].push((number, at, change.new));
            }
        }
        let case = words::delays(&run.which);
        let mut notes = vec![format!("Thin dashed lines: {case}, each step laid on that of the run in front.")];
        if !otherwise.is_empty() {
            let steps = words::labels(&otherwise, NAMED);
            notes.push(format!("The two runs come to {steps} in different states."));
        }
        if !missing.is_empty() {
            let steps = words::labels(&missing, NAMED);
            notes.push(format!("Not dashed: {case} had no window of {steps}."));
        }
        if !ended.is_empty() {
            let steps = words::labels(&ended, NAMED);
            notes.push(format!("The dashed run was followed for a shorter time after {steps}."));
        }
        if late > 0 {
            let late = words::many(late, "dashed edge");
            notes.push(format!(
                "Not drawn: {late} that came longer after the step than the next step of the run in front."
            ));
        }
        if run.trace.cut.is_some() {
            notes.push(format!("Of {case} only the beginning was kept."));
        }
        Laid { pieces, changes, notes }
    }

    /// The last instant at which something of it is drawn.
    pub fn end(&self) -> Time {
        self.changes.iter().flatten().map(|change| change.1).max().unwrap_or(Time::ZERO)
    }

    /// All instants at which something of it changes.
    pub fn busy(&self) -> impl Iterator<Item = Time> + '_ {
        self.changes.iter().flatten().map(|change| change.1)
    }

    /// What is drawn of a net between two instants.
    pub fn stretches(&self, run: &RunReport, net: NetId, range: (Time, Time)) -> Vec<Stretch> {
        let changes = &self.changes[net.index()];
        let mut next = 0;
        let mut all = Vec::new();
        for (number, piece) in (0u32..).zip(&self.pieces) {
            let first = next;
            while changes.get(next).is_some_and(|change| change.0 == number) {
                next += 1;
            }
            let end = piece.to.unwrap_or(Time::END);
            let (from, to) = (piece.from.max(range.0), end.min(range.1));
            if from >= to {
                continue;
            }
            let before = match piece.window {
                Some(window) => run.trace.windows[window].before.get(net.index()),
                None => run.trace.start.get(net.index()),
            };
            let own: Vec<(Time, Value)> = changes[first..next].iter().map(|it| (it.1, it.2)).collect();
            let wave = Wave::of(before, &own, (from, to), from == piece.from);
            all.push(Stretch { from, to: (end <= range.1).then_some(end), wave });
        }
        all
    }
}
