//! A window that ended where the reference does not allow it: from which state, in which, and what it allows.

use serde::{Deserialize, Serialize};

use crate::flow::{Allowed, Coming, List, Passed};
use crate::logic::State;

/// A window that ended where the reference does not allow it.
#[derive(Debug)]
pub struct Departed<'a> {
    /// The moment that names it.
    pub moment: u32,
    /// The state before its step, if it came at rest and without X.
    pub before: Option<&'a State>,
    /// How the inputs changed.
    pub coming: &'a Coming,
    /// The state reached.
    pub reached: &'a State,
}

/// As [`Departed`], to be kept.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
pub struct Departure {
    /// The moment that names the window.
    pub moment: u32,
    /// The state before its step, if it came at rest and without X.
    pub before: Option<State>,
    /// How the inputs changed.
    pub coming: Coming,
    /// The state reached.
    pub reached: State,
}

/// A departure with what the reference allows instead.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Against {
    /// What happened.
    pub departure: Departure,
    /// What the reference allows, on the compared nets.
    pub allowed: List,
}

impl Departed<'_> {
    /// A copy that is kept.
    pub fn kept(&self) -> Departure {
        let (before, coming, reached) = (self.before.cloned(), self.coming.clone(), self.reached.clone());
        Departure { moment: self.moment, before, coming, reached }
    }
}

impl Departure {
    /// With what the reference allows instead.
    pub fn against(&self, allowed: &Allowed) -> Against {
        let before = self.before.as_ref().map(|state| allowed.view(&state.ones));
        let after = allowed.view(&self.reached.ones);
        let passed = Passed { before: before.as_ref(), coming: &self.coming, after: &after };
        Against { departure: self.clone(), allowed: allowed.list(&passed) }
    }
}
