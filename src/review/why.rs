//! Why something was found: the two paths that race, the delays it takes, and the delays that matter.

use crate::findings::RacePair;
use crate::instance::{Instance, Quantity};
use crate::time::Span;

/// The cause of one finding.
#[derive(Clone, Debug, Default)]
pub struct Why {
    /// The two paths that race; `None` where the finding has no such pair.
    pub race: Option<RacePair>,
    /// The least that must leave typical for it to happen; `None` where it could not be told, or typical delays show it.
    pub needs: Option<Needs>,
    /// Which quantities decide, the most decisive first; empty where too few samples fail or pass.
    pub pull: Vec<Pull>,
}

/// A smallest set of quantities that must leave typical for a finding to happen: with any of them put back it is gone.
#[derive(Clone, Debug)]
pub struct Needs {
    /// How far each must go: the value nearest to typical, the others being as they are here, that still shows it.
    pub away: Vec<Away>,
    /// The case with nothing but them away from typical; it shows the finding and can be replayed.
    pub case: Box<Instance>,
}

/// One quantity away from typical.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Away {
    /// Which.
    pub quantity: Quantity,
    /// Its value in the case.
    pub value: Span,
}

/// How much a quantity has to do with a finding.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Pull {
    /// Which.
    pub quantity: Quantity,
    /// From -1 (it fails where this is short) to 1 (where this is long).
    pub strength: f64,
}
