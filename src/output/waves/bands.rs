//! May-change bands: where nets change in some sample of a sweep, each window laid on the front run's window of the same
//! step.

use super::Picture;
use super::axis::Axis;
use crate::circuit::NetId;
use crate::engine::{End, Window};
use crate::logic::Value;
use crate::output::words;
use crate::review::RunReport;
use crate::scenario::Scenario;
use crate::sweep::{EdgeSpan, Envelope, SweepReport, WindowReport};
use crate::time::Time;

/// Widest slant of an end, in pixels.
const SLANT: f64 = 4.0;
/// A band is at least this wide, in pixels.
const NARROWEST: f64 = 2.0;
/// Bands closer than this become one, in pixels.
const CLOSE: f64 = 0.5;
/// Most names in a note, and most edges in a tooltip.
const NAMED: usize = 4;

/// All bands on one run.
pub(super) struct Bands {
    /// For each net, in order of time and apart from each other.
    nets: Vec<Vec<Band>>,
    /// What the bands are, and what they do not show.
    pub notes: Vec<String>,
}

/// Where edges of a net may come.
#[derive(Clone, Debug, PartialEq)]
struct Band {
    from: Time,
    to: Time,
    way: Way,
    title: String,
}

/// Where the edges of a band lead.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Way {
    Up,
    Down,
    /// Up and down, or to X.
    Both,
}

impl Way {
    fn of(value: Value) -> Way {
        match value {
            Value::Zero => Way::Down,
            Value::One => Way::Up,
            Value::X => Way::Both,
        }
    }

    fn and(self, other: Way) -> Way {
        if self == other { self } else { Way::Both }
    }
}

/// A band on a sheet.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Drawn {
    pub left: f64,
    pub right: f64,
    pub way: Way,
    pub title: String,
}

impl Drawn {
    /// Its corners in a lane: its ends are slanted, and lie at the earliest and at the latest edge.
    pub fn corners(&self, top: f64, bottom: f64) -> Vec<(f64, f64)> {
        let (left, right) = (self.left, self.right);
        let slant = SLANT.min((right - left) / 2.0);
        let middle = f64::midpoint(top, bottom);
        match self.way {
            Way::Up => vec![(left, bottom), (left + slant, top), (right, top), (right - slant, bottom)],
            Way::Down => vec![(left, top), (left + slant, bottom), (right, bottom), (right - slant, top)],
            Way::Both => vec![
                (left, middle),
                (left + slant, top),
                (right - slant, top),
                (right, middle),
                (right - slant, bottom),
                (left + slant, bottom),
            ],
        }
    }
}

impl Bands {
    /// The bands of a sweep on a run; `None` where the sweep did not keep when edges came.
    pub fn of(picture: &Picture<'_>, front: &RunReport, sweep: &SweepReport) -> Option<Bands> {
        let envelope = sweep.envelope.as_deref()?;
        let (scenario, windows) = (picture.scenario, &front.trace.windows);
        let changes = front.trace.by_net(scenario.circuit.net_count());
        let mut nets = vec![Vec::new(); scenario.circuit.net_count()];
        let mut unsaid = Unsaid::default();
        let mut shown = vec![false; sweep.windows.len()];
        for (i, window) in windows.iter().enumerate() {
            let next = windows.get(i + 1).map(|next| next.start);
            let Some(report) = sweep.windows.get(window.moment as usize) else { continue };
            shown[window.moment as usize] = true;
            unsaid.look(scenario, envelope, window, report, sweep.samples);
            if window.moment as usize >= envelope.moments() {
                continue;
            }
            for net in scenario.circuit.nets() {
                let own = Own { scenario, window, report, changes: &changes[net.index()], next };
                let late = own.add(envelope.of(window.moment, net), &mut nets[net.index()]);
                unsaid.late(scenario, window, late);
            }
        }
        let absent = sweep.windows.iter().filter(|it| it.named > 0 && !shown[it.moment as usize]);
        unsaid.absent.extend(absent.filter_map(|it| words::step(scenario, Some(it.moment))));
        Some(Bands { nets, notes: unsaid.notes(envelope, sweep.samples) })
    }

    /// The last instant of all of them.
    pub fn end(&self) -> Time {
        self.nets.iter().flatten().map(|band| band.to).max().unwrap_or(Time::ZERO)
    }

    /// From when to when any net may change.
    pub fn spans(&self) -> impl Iterator<Item = (Time, Time)> + '_ {
        self.nets.iter().flatten().map(|band| (band.from, band.to))
    }

    /// The bands of a net on an axis, within a range.
    pub fn drawn(&self, net: NetId, axis: &Axis, range: (Time, Time)) -> Vec<Drawn> {
        let mut all: Vec<Drawn> = Vec::new();
        let inside = self.nets[net.index()].iter().filter(|band| band.from <= range.1 && range.0 <= band.to);
        for band in inside {
            let (left, right) = (axis.x(band.from.max(range.0)), axis.x(band.to.min(range.1)));
            let grow = ((NARROWEST - (right - left)) / 2.0).max(0.0);
            let (left, right) = (left - grow, right + grow);
            match all.last_mut().filter(|last| left - last.right < CLOSE && grow > 0.0) {
                Some(last) => {
                    last.right = right.max(last.right);
                    last.way = last.way.and(band.way);
                }
                None => all.push(Drawn { left, right, way: band.way, title: band.title.clone() }),
            }
        }
        all
    }
}

/// One net in one window of the front run.
struct Own<'a> {
    scenario: &'a Scenario,
    window: &'a Window,
    report: &'a WindowReport,
    /// The net's changes in the front run.
    changes: &'a [(Time, Value)],
    /// The front run's next step.
    next: Option<Time>,
}

impl Own<'_> {
    /// Adds the bands of these edges; do some of them reach beyond the next step?
    fn add(&self, edges: impl Iterator<Item = EdgeSpan>, to: &mut Vec<Band>) -> bool {
        let start = self.window.start;
        let mut edges: Vec<EdgeSpan> = edges.collect();
        edges.sort_by_key(|edge| (edge.earliest, edge.latest));
        let end = self.next.unwrap_or(Time::END);
        let late = edges.iter().any(|edge| start + edge.latest > end);
        let mut from = 0;
        while from < edges.len() {
            let mut latest = edges[from].latest;
            let mut behind = from + 1;
            while edges.get(behind).is_some_and(|edge| edge.earliest <= latest) {
                latest = latest.max(edges[behind].latest);
                behind += 1;
            }
            let group = &edges[from..behind];
            from = behind;
            let (first, last) = (start + group[0].earliest, (start + latest).min(end));
            // an edge that comes at one time alone, and in this run as well, is no band
            let always = group.len() == 1 && group[0].samples == self.report.named;
            let certain =
                always && first == last && self.changes.binary_search_by_key(&first, |change| change.0).is_ok();
            if first > end || certain {
                continue;
            }
            let way = group.iter().map(|edge| Way::of(edge.to)).reduce(Way::and).unwrap_or(Way::Both);
            to.push(Band { from: first, to: last, way, title: self.title(group) });
        }
        late
    }

    fn title(&self, edges: &[EdgeSpan]) -> String {
        let unit = self.scenario.unit;
        let each = edges.iter().take(NAMED).map(|edge| {
            let word = match edge.to {
                Value::Zero => "fall",
                Value::One => "rise",
                Value::X => "change to X",
            };
            let (from, to) = (edge.earliest.decimal(unit), edge.latest.decimal(unit));
            let (some, all) = (words::count(edge.samples), words::count(self.report.named));
            format!("{word} {from} to {to} {unit} (edge {}, {some} of {all} samples)", edge.number + 1)
        });
        let mut all: Vec<String> = each.collect();
        if edges.len() > NAMED {
            all.push(format!("{} more", edges.len() - NAMED));
        }
        let step = words::step(self.scenario, Some(self.window.moment)).unwrap_or_default();
        format!("after {step}: {}", all.join("; "))
    }
}

/// What bands do not show, as names of steps, each once.
#[derive(Default)]
struct Unsaid<'a> {
    /// Samples end them in another state than the run, or otherwise.
    otherwise: Vec<&'a str>,
    /// Not all samples have them.
    fewer: Vec<&'a str>,
    /// Nets have more edges in them than are told apart.
    more: Vec<&'a str>,
    /// They are beyond what is kept.
    beyond: Vec<&'a str>,
    /// Edges come later than the run's next step.
    late: Vec<&'a str>,
    /// Samples have them, and the run does not.
    absent: Vec<&'a str>,
}

impl<'a> Unsaid<'a> {
    fn look(
        &mut self,
        scenario: &'a Scenario,
        envelope: &Envelope,
        window: &Window,
        report: &WindowReport,
        samples: u64,
    ) {
        let Some(step) = words::step(scenario, Some(window.moment)) else { return };
        let add = |to: &mut Vec<&'a str>, is_so: bool| {
            if is_so {
                to.push(step);
            }
        };
        let settled = window.end == End::Settled;
        let same = |it: &crate::sweep::Outcome| settled && it.state == window.state;
        let alike = match window.end {
            End::Settled => report.settled,
            End::Oscillating { .. } => report.oscillating,
            End::Unsettled(_) => report.unsettled,
            End::Cut => report.cut,
        };
        add(&mut self.otherwise, alike < report.named || (settled && !report.outcomes.iter().all(same)));
        add(&mut self.fewer, report.named < samples);
        let kept = (window.moment as usize) < envelope.moments();
        add(&mut self.beyond, !kept);
        add(&mut self.more, kept && scenario.circuit.nets().any(|net| envelope.more(window.moment, net) > 0));
    }

    fn late(&mut self, scenario: &'a Scenario, window: &Window, late: bool) {
        let step = words::step(scenario, Some(window.moment)).filter(|_| late);
        if let Some(step) = step.filter(|step| self.late.last().is_none_or(|last| last != step)) {
            self.late.push(step);
        }
    }

    fn notes(&self, envelope: &Envelope, samples: u64) -> Vec<String> {
        let list = |steps: &[&str]| words::labels(steps, NAMED);
        let samples = words::many(samples, "sample");
        let mut notes = vec![format!(
            "Grey bands: where nets change in some of {samples}, counted from the step. An edge without a band comes at that time in all."
        )];
        let levels = "The line is this run alone";
        notes.push(match self.otherwise.as_slice() {
            [] => format!("{levels}."),
            steps => format!("{levels}: some samples end in another state, or otherwise, after {}.", list(steps)),
        });
        if !self.fewer.is_empty() {
            notes.push(format!(
                "Not every sample has a window of {}: its bands are of those that have.",
                list(&self.fewer)
            ));
        }
        if !self.more.is_empty() {
            let (most, steps) = (words::many(envelope.edges() as u64, "edge"), list(&self.more));
            notes.push(format!("No bands for more than {most} of a net in one window: some have more after {steps}."));
        }
        if !self.beyond.is_empty() {
            let steps = list(&self.beyond);
            notes.push(format!("No bands for want of space, with so many nets and steps: {steps}."));
        }
        if !self.late.is_empty() {
            notes.push(format!(
                "Bands end at the next step of this run; some samples go on longer after {}.",
                list(&self.late)
            ));
        }
        if !self.absent.is_empty() {
            notes.push(format!("Not shown: {}, which samples have and this run has not.", list(&self.absent)));
        }
        notes
    }
}
