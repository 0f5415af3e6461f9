//! Conditions of temperature and supply: the same parts, all of them slower or faster.

use std::sync::Arc;

use super::Scenario;
use crate::delay::Billionths;

/// One condition.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Condition {
    /// Its name; never [`Condition::NOMINAL`].
    pub name: String,
    /// What every delay is multiplied by, above 0.
    pub scale: Billionths,
}

impl Condition {
    /// What the delays of the file themselves are called.
    pub const NOMINAL: &str = "nominal";
}

impl Scenario {
    /// This scenario under one of its conditions: every delay range is scaled, so that the same random numbers give the
    /// same parts at another speed. Steps, clocks and rules are as they were. The result has no conditions; its title names
    /// the one it is under.
    ///
    /// Panics if the condition takes a delay out of bounds; the [`Builder`](super::Builder) lets no such condition through.
    pub fn under(&self, condition: &Condition) -> Scenario {
        let delays = self.delays.scaled(condition.scale).expect("the builder has tried it");
        Scenario {
            title: format!("{}, condition {}", self.title, condition.name),
            delays: Arc::new(delays),
            conditions: Vec::new(),
            ..self.clone()
        }
    }
}
