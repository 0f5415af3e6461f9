//! The geometry of one sheet: where every lane, mark and label goes. Nothing is written here.

use super::arrows::{self, Chain};
use super::axis::Axis;
use super::bands::Drawn;
use super::behind::Behind;
use super::captions::{self, Seen};
use super::flags::{self, Flags};
use super::laid::Stretch;
use super::lane::Wave;
use super::marks::{self, Ending, Spot, Step};
use super::places::{self, BRACKET, Bracket, Rest};
use super::{MOST_EDGES, Picture, Scale};
use crate::circuit::NetId;
use crate::engine::{End, Window};
use crate::logic::{State, Value};
use crate::output::ink::BODY;
use crate::output::measure::{cut_end, cut_middle, width};
use crate::output::words;
use crate::review::RunReport;
use crate::time::{Span, Time};

/// Width of every sheet.
pub(super) const WIDTH: f64 = 1000.0;
/// White around everything.
pub(super) const MARGIN: f64 = 12.0;
/// From the last instant to the end of the lanes, so that final levels can be seen.
const TAIL: f64 = 26.0;
/// Room for values at rest, right of the lanes.
const VALUES: f64 = 40.0;
/// Widest and narrowest column of names; the captions of the axis stand in it, too.
const NAMES: f64 = 190.0;
const LEAST_NAMES: f64 = 94.0;
/// From a name to its lane.
pub(super) const SPACE: f64 = 8.0;
/// Height of the title.
const TITLE: f64 = 34.0;
/// From one lane to the next.
const PITCH: f64 = 27.0;
/// Height of a wave.
pub(super) const SWING: f64 = 16.0;
/// One line of small text.
pub(super) const LINE: f64 = 15.0;

/// One lane.
pub(super) struct Lane {
    pub net: NetId,
    pub name: String,
    pub full_name: String,
    /// Height of 1 and of 0.
    pub top: f64,
    pub bottom: f64,
    /// One wave a run, the front one first.
    pub waves: Vec<Wave>,
    /// Runs that are laid on the front one, stretch by stretch.
    pub laid: Vec<Vec<Stretch>>,
    /// Where it may change.
    pub bands: Vec<Drawn>,
    /// What stands at the right end.
    pub value: String,
    /// The run ends while this net may still move.
    pub is_open: bool,
    pub brackets: Vec<Bracket>,
}

/// Everything about one sheet.
pub(super) struct Frame {
    pub title: String,
    pub full_title: String,
    pub description: String,
    pub left: f64,
    pub right: f64,
    pub axis: Axis,
    /// The first instant that is drawn.
    pub from: Time,
    pub steps: Vec<Step>,
    pub flags: Flags,
    /// Top of the lanes.
    pub lanes_top: f64,
    pub lanes: Vec<Lane>,
    /// The two paths that race.
    pub chains: Vec<Chain>,
    /// Height of the hairline between inputs and gates.
    pub hairline: Option<f64>,
    /// Brackets of findings that are about no single net, and the base line of their caption.
    pub whole: Vec<Bracket>,
    pub whole_caption: Option<f64>,
    /// What the values at the right end are.
    pub values_caption: &'static str,
    pub axis_y: f64,
    pub rests: Vec<Rest>,
    /// Base line of the first row of notes.
    pub notes_y: f64,
    pub notes: Vec<String>,
    /// Base line of the first row of the key.
    pub key_y: f64,
    pub key: Vec<String>,
    pub height: f64,
    pub solid: bool,
}

impl Frame {
    /// Lays out sheet `sheet.0` of `sheet.1`, from top to bottom.
    pub fn new(
        picture: &Picture<'_>,
        behind: &Behind<'_>,
        nets: &[NetId],
        left_out: &[NetId],
        sheet: (usize, usize),
    ) -> Frame {
        let scenario = picture.scenario;
        let front = picture.front();
        let end = picture.end().max(behind.end());
        let part = picture.part(end);
        let range = part.unwrap_or((Time::ZERO, end));
        let range = (range.0, range.1.max(range.0 + Span::TICK));
        let shown = |from: Time, to: Time| from <= range.1 && range.0 <= to;
        let mut steps: Vec<Step> = front.map_or_else(Vec::new, |run| marks::steps(scenario, run));
        steps.retain(|step| shown(step.at, step.at));
        let mut endings: Vec<Ending> = front.map_or_else(Vec::new, |run| marks::endings(scenario, run));
        endings.retain(|ending| shown(ending.at, ending.at));
        let mut spots: Vec<Spot> = front.map_or_else(Vec::new, |run| marks::spots(scenario, picture.asked, run));
        let findings = spots.len();
        spots.retain(|spot| shown(spot.from, spot.to));
        let outside = findings - spots.len();

        let names = nets.iter().map(|net| width(words::net(scenario, *net), BODY)).fold(LEAST_NAMES, f64::max);
        let left = MARGIN + names.min(NAMES) + SPACE;
        let right = WIDTH - MARGIN - VALUES;
        let changes = picture.runs().flat_map(|run| run.trace.changes.iter().map(|change| change.at));
        let marked = steps.iter().map(|step| step.at).chain(endings.iter().map(|ending| ending.at));
        let mut busy: Vec<Time> = changes.chain(marked).chain(behind.busy()).collect();
        busy.sort_unstable();
        let axis = Axis::new(range, &busy, &behind.whole(), (left, right - TAIL), scenario.unit);

        let at: Vec<(f64, &Step)> = steps.iter().map(|step| (axis.x(step.at), step)).collect();
        let flags = flags::place(&at, (MARGIN, WIDTH - MARGIN));
        let lanes_top = TITLE + flags.rows as f64 * flags.pitch() + 8.0;

        let mut missing = false;
        let last = last_window(front, range.1);
        let lanes =
            Lanes::new(picture, nets, &Given { range, axis: &axis, left, spots: &spots, last, behind }, lanes_top);
        missing |= lanes.missing;
        let others: Vec<&Spot> = spots.iter().filter(|spot| spot.net.is_none()).collect();
        let mut y = lanes.end;
        let (whole, rows) = places::brackets(&others, &axis, left, y + 5.0, &mut missing);
        let whole_caption = (!others.is_empty()).then_some(y + 18.0);
        if !others.is_empty() {
            y += 6.0 + rows.max(1) as f64 * BRACKET;
        }
        let axis_y = y + 12.0;
        let (rests, rows) = places::rests(&endings, &axis, left, axis_y, &mut missing);
        y = axis_y + 20.0 + rows as f64 * LINE;

        let edges: usize = lanes.lanes.iter().flat_map(|lane| &lane.waves).map(|wave| wave.edges.len()).sum();
        let solid = edges > MOST_EDGES;
        let seen = Seen {
            nets,
            left_out,
            sheet,
            solid,
            missing,
            steps: &steps,
            spots: &spots,
            outside,
            part,
            end,
            behind,
            axis: &axis,
        };
        let mut notes = captions::notes(picture, &seen);
        let chains = arrows::chains(picture, &lanes.lanes, &axis, range);
        if chains.iter().any(|chain| chain.goes_back) {
            notes.push(format!("Of a long path the last {} arrows are drawn.", arrows::MOST));
        }
        let key = if flags.numbered { captions::key(picture, &steps) } else { Vec::new() };
        let notes_y = y + 8.0 + LINE;
        y += if notes.is_empty() { 0.0 } else { 8.0 + notes.len() as f64 * LINE };
        let key_y = y + 10.0 + LINE;
        y += if key.is_empty() { 0.0 } else { 10.0 + key.len().div_ceil(2) as f64 * LINE };

        let full_title = captions::title(picture, sheet);
        // bold letters are wider than the estimate
        let cut = cut_end(&full_title, 14.0, (WIDTH - 2.0 * MARGIN) / 1.15);
        Frame {
            title: cut.unwrap_or_else(|| full_title.clone()),
            full_title,
            description: captions::describe(picture, behind, &lanes.lanes, &steps, &spots, range),
            left,
            right,
            axis,
            from: range.0,
            steps,
            flags,
            lanes_top,
            chains,
            lanes: lanes.lanes,
            hairline: lanes.hairline,
            whole,
            whole_caption,
            values_caption: last.caption,
            axis_y,
            rests,
            notes_y,
            notes,
            key_y,
            key,
            height: (y + MARGIN).ceil(),
            solid,
        }
    }
}

impl Frame {
    /// Where times are.
    pub fn scale(&self) -> Scale {
        Scale { pieces: self.axis.pieces(), lanes: (self.lanes_top, self.axis_y), size: (WIDTH, self.height) }
    }
}

/// What lanes are laid out with.
struct Given<'a> {
    range: (Time, Time),
    axis: &'a Axis,
    left: f64,
    spots: &'a [Spot],
    last: Last<'a>,
    behind: &'a Behind<'a>,
}

/// All lanes of a sheet.
struct Lanes {
    lanes: Vec<Lane>,
    hairline: Option<f64>,
    /// Some labels had no room.
    missing: bool,
    /// Where the lanes end.
    end: f64,
}

impl Lanes {
    fn new(picture: &Picture<'_>, nets: &[NetId], given: &Given<'_>, top: f64) -> Lanes {
        let circuit = &picture.scenario.circuit;
        let starts: Vec<_> = picture.runs().map(|run| &run.trace.start).collect();
        let changes: Vec<_> = picture.runs().map(|run| run.trace.by_net(circuit.net_count())).collect();
        let mut all = Lanes { lanes: Vec::with_capacity(nets.len()), hairline: None, missing: false, end: top };
        // in an order of its own a picture may have inputs anywhere
        let inputs = nets.iter().take_while(|net| circuit.is_input(**net)).count();
        let parted = !nets[inputs..].iter().any(|net| circuit.is_input(*net));
        for (i, net) in nets.iter().enumerate() {
            if i > 0 && i == inputs && parted {
                all.hairline = Some(all.end + 4.0);
                all.end += 8.0;
            }
            let of_run = |(start, changes): (&&State, &Vec<Vec<(Time, Value)>>)| {
                let start = start.get(net.index());
                Wave::of(start, &changes[net.index()], given.range, given.range.0 == Time::ZERO)
            };
            let waves: Vec<Wave> = starts.iter().zip(&changes).map(of_run).collect();
            let end = waves.first().map(|wave| wave.edges.last().map_or(wave.before, |edge| edge.1));
            let open = given.last.open.filter(|(window, _)| {
                let moves = changes[0][net.index()].iter().filter(|change| change.0 >= window.start).count();
                moves >= 3 || window.moving.iter().any(|(it, _)| it == net)
            });
            let value = match open {
                Some((_, sign)) => sign.to_string(),
                None => end.map_or_else(String::new, |value| value.to_string()),
            };
            let laid = given.behind.laid.iter().map(|(run, laid)| laid.stretches(run, *net, given.range)).collect();
            let bands = given.behind.bands.iter().flat_map(|it| it.drawn(*net, given.axis, given.range)).collect();
            let (top, bottom) = (all.end + 5.0, all.end + 5.0 + SWING);
            let own: Vec<&Spot> = given.spots.iter().filter(|spot| spot.net == Some(*net)).collect();
            let (brackets, rows) = places::brackets(&own, given.axis, given.left, bottom + 4.0, &mut all.missing);
            all.end += PITCH + rows as f64 * BRACKET - if rows > 0 { 3.0 } else { 0.0 };
            let full_name = words::net(picture.scenario, *net).to_string();
            let cut = cut_middle(&full_name, BODY, given.left - SPACE - MARGIN);
            let name = cut.unwrap_or_else(|| full_name.clone());
            let is_open = open.is_some();
            all.lanes.push(Lane {
                net: *net,
                name,
                full_name,
                top,
                bottom,
                waves,
                laid,
                bands,
                value,
                is_open,
                brackets,
            });
        }
        all
    }
}

/// How a picture ends.
#[derive(Clone, Copy)]
struct Last<'a> {
    /// A window that is not at rest at the end, and the sign for nets that may move on.
    open: Option<(&'a Window, &'static str)>,
    /// What the values at the right end are.
    caption: &'static str,
}

fn last_window(front: Option<&RunReport>, to: Time) -> Last<'_> {
    let window = front.and_then(|run| run.trace.windows.iter().rfind(|window| window.start <= to));
    let Some(window) = window else { return Last { open: None, caption: "at rest" } };
    let rest = window.settle_from + window.settling.unwrap_or_default();
    match window.end {
        End::Settled if rest <= to => Last { open: None, caption: "at rest" },
        End::Oscillating { .. } if window.stop <= to => Last { open: Some((window, "osc.")), caption: "at end" },
        End::Unsettled(_) => Last { open: Some((window, "?")), caption: "at end" },
        _ => Last { open: None, caption: "at end" },
    }
}
