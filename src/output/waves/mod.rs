//! Waveforms: lanes drawn like a data-book timing diagram, and the same as a table.
//!
//! A picture is a stack of [`Layer`]s on one time axis. It is split into sheets where it has more nets than are legible
//! on one, and says which nets no sheet shows.

mod arrows;
mod axis;
mod bands;
mod behind;
mod captions;
mod changes;
mod choose;
mod csv;
mod draw;
mod flags;
mod frame;
mod laid;
mod lane;
mod marks;
mod places;

use crate::circuit::NetId;
use crate::findings::{Asked, RacePair};
use crate::review::RunReport;
use crate::scenario::Scenario;
use crate::sweep::SweepReport;
use crate::time::{Span, Time};

pub use self::changes::{Changes, Overflow};
pub use self::csv::csv;

/// Most lanes of one sheet.
pub const MOST_LANES: usize = 40;
/// Most sheets of one picture.
pub const MOST_SHEETS: usize = 8;
/// Most edges of one sheet that are drawn one by one; above, edges within one pixel become a solid block.
pub const MOST_EDGES: usize = 5_000;

/// One thing drawn on the common time axis, the first at the front.
#[derive(Clone, Copy, Debug)]
pub enum Layer<'a> {
    /// One run: its waves, and, for the first of a picture, its steps, settling times and findings. Further runs are thin
    /// and dashed, at their own times.
    Run(&'a RunReport),
    /// A further run, thin and dashed; each of its windows is laid on the first run's window of the same step.
    Laid(&'a RunReport),
    /// Where nets change in the samples of a sweep, as grey bands, laid on the first run's windows in the same way. Nothing
    /// where the sweep did not keep that.
    Bands(&'a SweepReport),
}

/// Which nets get a lane. Lanes come in net order, the order of the file with inputs first, if it is not said otherwise.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub enum Nets {
    /// All, on as many sheets as it takes, up to [`MOST_SHEETS`].
    #[default]
    All,
    /// At most one sheet: all if they fit, else those that tell most: nets of findings, watched nets, inputs that move,
    /// loop nets, other nets that move.
    Telling,
    /// These, in this order.
    These(Vec<NetId>),
}

/// A picture to draw.
#[derive(Clone, Debug)]
pub struct Picture<'a> {
    /// Names, unit and title.
    pub scenario: &'a Scenario,
    /// The questions that facts refer to.
    pub asked: &'a Asked,
    /// What to draw.
    pub layers: Vec<Layer<'a>>,
    /// For which nets.
    pub nets: Nets,
    /// The two paths that race, drawn from edge to edge on the front run.
    pub race: Option<RacePair>,
    /// From when to when; `None` for the whole run.
    pub range: Option<(Time, Time)>,
    /// Begins every XML id in the picture, so that several pictures can stand in one page: letters, digits, `-`.
    pub id: String,
}

/// Where times are on a sheet, so that something can be drawn over it.
#[derive(Clone, Debug, PartialEq)]
pub struct Scale {
    /// Straight pieces of the time axis, in order: from, to, and the pixels of both. Between two of them time is left out.
    pub pieces: Vec<(Time, Time, f64, f64)>,
    /// Height of the top of the lanes and of the axis, pixels.
    pub lanes: (f64, f64),
    /// Width and height of the sheet, pixels.
    pub size: (f64, f64),
}

/// One sheet of a picture.
#[derive(Clone, Debug, PartialEq)]
pub struct Sheet {
    /// A complete SVG element, about 1000 pixels wide, with a text alternative.
    pub svg: String,
    /// Where times are.
    pub scale: Scale,
    /// The nets it shows.
    pub nets: Vec<NetId>,
    /// Nets that were asked for and that no sheet shows.
    pub left_out: Vec<NetId>,
}

impl<'a> Picture<'a> {
    /// A picture of one run, with the nets and the time that the scenario's `[plot]` chooses, else all.
    pub fn of_run(scenario: &'a Scenario, asked: &'a Asked, run: &'a RunReport, id: &str) -> Picture<'a> {
        let layers = vec![Layer::Run(run)];
        let nets = scenario.plot.nets.clone().map_or(Nets::All, Nets::These);
        Picture { scenario, asked, layers, nets, race: None, range: scenario.plot.span(), id: id.to_string() }
    }

    /// The same with a further run laid on the first, behind it.
    #[must_use]
    pub fn against(mut self, run: &'a RunReport) -> Picture<'a> {
        self.layers.push(Layer::Laid(run));
        self
    }

    /// The same with may-change bands.
    #[must_use]
    pub fn with_bands(mut self, sweep: &'a SweepReport) -> Picture<'a> {
        self.layers.push(Layer::Bands(sweep));
        self
    }

    /// The run at the front.
    fn front(&self) -> Option<&'a RunReport> {
        self.runs().next()
    }

    /// From when to when it is drawn; `None` for the whole of the run. A run of which not everything was kept is drawn as
    /// far as it was.
    fn part(&self, end: Time) -> Option<(Time, Time)> {
        let range = self.range.map(|(from, to)| (from, to.min(end).max(from + Span::TICK)));
        let range = range.filter(|(from, to)| *from > Time::ZERO || *to < end);
        let Some(after) = self.runs().filter_map(|run| run.trace.cut).map(|cut| cut.after).min() else {
            return range;
        };
        match range {
            Some((from, to)) if from < after => Some((from, to.min(after))),
            _ => Some((Time::ZERO, after)),
        }
    }

    /// The last instant of all runs, and at least one unit.
    fn end(&self) -> Time {
        let mut end = Time::ZERO;
        for run in self.runs() {
            end = end.max(run.trace.end);
            end = run.trace.windows.iter().fold(end, |end, window| end.max(window.stop));
            end = run.trace.changes.last().map_or(end, |change| end.max(change.at));
        }
        if end == Time::ZERO { Time::from_fs(self.scenario.unit.femtoseconds()) } else { end }
    }

    fn runs(&self) -> impl Iterator<Item = &'a RunReport> {
        self.layers.iter().filter_map(|layer| match layer {
            Layer::Run(run) => Some(*run),
            Layer::Laid(_) | Layer::Bands(_) => None,
        })
    }

    /// The runs that are laid on the front one.
    fn laid(&self) -> impl Iterator<Item = &'a RunReport> {
        self.layers.iter().filter_map(|layer| match layer {
            Layer::Laid(run) => Some(*run),
            Layer::Run(_) | Layer::Bands(_) => None,
        })
    }
}

/// Draws a picture: at least one sheet.
pub fn sheets(picture: &Picture<'_>) -> Vec<Sheet> {
    let choice = choose::choose(picture);
    let many = choice.sheets.len();
    let behind = behind::Behind::of(picture);
    let draw = |(number, nets): (usize, Vec<NetId>)| {
        let frame = frame::Frame::new(picture, &behind, &nets, &choice.left_out, (number, many));
        Sheet { svg: draw::svg(picture, &frame), scale: frame.scale(), nets, left_out: choice.left_out.clone() }
    };
    choice.sheets.into_iter().enumerate().map(draw).collect()
}
