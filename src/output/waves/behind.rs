//! What lies behind the front run: further runs laid on it, and bands.

use super::bands::Bands;
use super::laid::Laid;
use super::{Layer, Picture};
use crate::review::RunReport;
use crate::time::Time;

/// What lies behind the front run, made once for all sheets.
#[derive(Default)]
pub(super) struct Behind<'a> {
    /// Runs, each with how it is laid.
    pub laid: Vec<(&'a RunReport, Laid)>,
    pub bands: Vec<Bands>,
}

impl<'a> Behind<'a> {
    /// The layers of a picture but for its runs at their own times. Without a front run there is nothing to lay them on.
    pub fn of(picture: &Picture<'a>) -> Behind<'a> {
        let Some(front) = picture.front() else { return Behind::default() };
        let bands = picture.layers.iter().filter_map(|layer| match layer {
            Layer::Bands(sweep) => Bands::of(picture, front, sweep),
            Layer::Run(_) | Layer::Laid(_) => None,
        });
        let laid = picture.laid().map(|run| (run, Laid::of(picture, front, run)));
        Behind { laid: laid.collect(), bands: bands.collect() }
    }

    /// The last instant at which something of it is drawn.
    pub fn end(&self) -> Time {
        let laid = self.laid.iter().map(|(_, laid)| laid.end());
        laid.chain(self.bands.iter().map(Bands::end)).max().unwrap_or(Time::ZERO)
    }

    /// Instants at which something of it changes.
    pub fn busy(&self) -> impl Iterator<Item = Time> + '_ {
        let spans = self.bands.iter().flat_map(Bands::spans).flat_map(|(from, to)| [from, to]);
        self.laid.iter().flat_map(|(_, laid)| laid.busy()).chain(spans)
    }

    /// Stretches in which nothing may be cut out, apart from each other and in order.
    pub fn whole(&self) -> Vec<(Time, Time)> {
        let mut spans: Vec<(Time, Time)> = self.bands.iter().flat_map(Bands::spans).collect();
        spans.sort_unstable();
        spans.dedup_by(|next, last| {
            let touches = next.0 <= last.1;
            last.1 = if touches { last.1.max(next.1) } else { last.1 };
            touches
        });
        spans
    }

    /// What it is, and what it does not show.
    pub fn notes(&self) -> impl Iterator<Item = &String> {
        self.laid.iter().flat_map(|(_, laid)| &laid.notes).chain(self.bands.iter().flat_map(|bands| &bands.notes))
    }
}
