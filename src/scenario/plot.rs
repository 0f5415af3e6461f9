//! What pictures of waves show.

use crate::circuit::NetId;
use crate::time::Time;

/// What pictures of waves show, where the file says so.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Plot {
    /// These nets in this order, each once; `None`: not said.
    pub nets: Option<Vec<NetId>>,
    /// From this instant of a run on.
    pub from: Option<Time>,
    /// Up to this instant, later than `from`.
    pub to: Option<Time>,
}

impl Plot {
    /// The span of time, if the file chose one: `to` is the end of time where only `from` was said.
    pub fn span(&self) -> Option<(Time, Time)> {
        let said = self.from.is_some() || self.to.is_some();
        said.then(|| (self.from.unwrap_or(Time::ZERO), self.to.unwrap_or(Time::END)))
    }
}
