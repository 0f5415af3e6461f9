//! Machine-readable results: one JSON document a command.
//!
//! Every document begins with `"format": 1` and ends with a line feed. Times are JSON numbers, written as exact decimals
//! in the scenario's unit; they never pass through a float here, and a reader that keeps the digits gets the very
//! femtosecond. A state is an object `{net: 0 | 1 | "X"}` in net order. What is missing is `null`, never 0. A list that a
//! limit cut has a key beside it that says so. Shares have six significant digits.

mod check;
mod flow;
mod limit;
mod listed;
mod part;
mod parts;
mod prove;
mod races;
mod review;
mod run;
mod search;
mod states;
mod sweep;
mod why;

pub use check::check;
pub use limit::{limit, limit_map};
pub use listed::MOST_VALUES;
pub use part::part;
pub use prove::prove;
pub use review::review;
pub use run::run;
pub use states::states;
pub use sweep::sweep;

/// The format number of every document.
pub(super) const FORMAT: u32 = 1;

/// A document as text. Serialising borrowed names and numbers into memory does not fail.
fn document(body: &impl serde::Serialize) -> String {
    let mut text = serde_json::to_string_pretty(body).expect("keys are text and nothing is written to a device");
    text.push('\n');
    text
}
