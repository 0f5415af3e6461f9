//! placeholder
use crate::scenario::Scenario;
/// Assumptions.
pub fn assumptions(_s: &Scenario) -> Vec<String> {
    Vec::new()
}
