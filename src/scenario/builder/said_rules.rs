//! The words in which rules are told to the builder.

use super::said::{Amount, NewState, Said, state};
use crate::scenario::{Before, Mark, Oscillation, Permission};

/// All rules as they were said; what is not said has its default.
#[derive(Clone, Debug, Default)]
pub struct NewRules {
    /// Partial states that must never show.
    pub never: Vec<NewNever>,
    /// Partial states in which the circuit must never rest.
    pub never_at_rest: Vec<NewNeverAtRest>,
    /// Order and distance of edges.
    pub timing: Vec<NewTiming>,
    /// Shortest highs and lows.
    pub min_pulse: Vec<NewMinPulse>,
    /// Nets that must not glitch, each with the width below which a pulse is tolerated. Default: the outputs.
    pub glitch_free: Option<Vec<NewGlitchFree>>,
    /// Bound on the settling time of every watched net after every step.
    pub settle_within: Option<Said<Amount>>,
    /// May outcomes of one step differ?
    pub critical_race: Option<Permission>,
    /// May, must, or must not windows oscillate?
    pub oscillation: Option<Oscillation>,
    /// Where a swallowed pulse breaks a rule.
    pub swallowed: Option<NewSwallowed>,
    /// May a step come before rest?
    pub before_rest: Option<Before>,
    /// Does the user accept what was not judged?
    pub accept_not_judged: bool,
}

/// A net that must not glitch, and the width below which a pulse is tolerated.
pub type NewGlitchFree = (Said<String>, Option<Said<Amount>>);

/// Where a swallowed pulse breaks a rule, as it was said.
#[derive(Clone, Debug)]
pub enum NewSwallowed {
    /// Nowhere.
    Listed,
    /// At every gate.
    Forbidden,
    /// At these gates.
    At(Vec<Said<String>>),
}

/// A partial state that must never show.
#[derive(Clone, Debug, Default)]
pub struct NewNever {
    /// The user's name for it.
    pub name: Option<String>,
    /// The partial state.
    pub state: NewState,
    /// Default 0: not even for no time.
    pub longer_than: Option<Said<Amount>>,
    /// Where it was written.
    pub mark: Mark,
    /// Part of it could not be read, and that was reported: nothing more is asked of it.
    pub incomplete: bool,
}

/// A partial state in which the circuit must never rest.
#[derive(Clone, Debug, Default)]
pub struct NewNeverAtRest {
    /// The user's name for it.
    pub name: Option<String>,
    /// The partial state.
    pub state: NewState,
    /// Where it was written.
    pub mark: Mark,
    /// Part of it could not be read, and that was reported: nothing more is asked of it.
    pub incomplete: bool,
}

/// Distance from one kind of edge to another.
#[derive(Clone, Debug, Default)]
pub struct NewTiming {
    /// The user's name for it.
    pub name: Option<String>,
    /// The earlier edge: `NET rise`, `NET fall` or `NET any`.
    pub from: Option<Said<String>>,
    /// The later edge.
    pub to: Option<Said<String>>,
    /// Least time from the latest `from` edge to each `to` edge.
    pub min: Option<Said<Amount>>,
    /// Greatest time from each `from` edge to the next `to` edge.
    pub max: Option<Said<Amount>>,
    /// Where it was written.
    pub mark: Mark,
    /// Part of it could not be read, and that was reported: nothing more is asked of it.
    pub incomplete: bool,
}

/// Shortest high and low of one net.
#[derive(Clone, Debug)]
pub struct NewMinPulse {
    /// The net.
    pub net: Said<String>,
    /// Shortest high.
    pub high: Option<Said<Amount>>,
    /// Shortest low.
    pub low: Option<Said<Amount>>,
    /// Part of it could not be read, and that was reported: nothing more is asked of it.
    pub incomplete: bool,
}

impl NewRules {
    /// A partial state that must never show, not even for no time.
    pub fn never<N: Into<Said<String>>>(&mut self, values: impl IntoIterator<Item = (N, bool)>) -> &mut NewNever {
        self.never.push(NewNever { state: state(values), ..NewNever::default() });
        self.never.last_mut().expect("just pushed")
    }

    /// A partial state in which the circuit must never rest.
    pub fn never_at_rest<N: Into<Said<String>>>(
        &mut self,
        values: impl IntoIterator<Item = (N, bool)>,
    ) -> &mut NewNeverAtRest {
        self.never_at_rest.push(NewNeverAtRest { state: state(values), ..NewNeverAtRest::default() });
        self.never_at_rest.last_mut().expect("just pushed")
    }

    /// A distance from one kind of edge to another, such as `from` = `"data any"`; give it `min`, `max` or both.
    pub fn timing(&mut self, from: impl Into<Said<String>>, to: impl Into<Said<String>>) -> &mut NewTiming {
        let timing = NewTiming { from: Some(from.into()), to: Some(to.into()), ..NewTiming::default() };
        self.timing.push(timing);
        self.timing.last_mut().expect("just pushed")
    }

    /// One more net that must not glitch; outputs that are not named are then free to.
    pub fn glitch_free(&mut self, net: impl Into<Said<String>>) -> &mut NewRules {
        self.glitch_free.get_or_insert_default().push((net.into(), None));
        self
    }
}

impl NewTiming {
    /// Least time from the latest `from` edge to each `to` edge.
    pub fn min(&mut self, amount: impl Into<Amount>) -> &mut NewTiming {
        self.min = Some(Said::from(amount.into()));
        self
    }

    /// Greatest time from each `from` edge to the next `to` edge.
    pub fn max(&mut self, amount: impl Into<Amount>) -> &mut NewTiming {
        self.max = Some(Said::from(amount.into()));
        self
    }
}
