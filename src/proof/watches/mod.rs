//! Watches for single questions.

mod early;
mod edges;
mod moves;
mod settles;
mod shows;
mod swallows;
mod tolerates;

pub use early::BeforeRest;
pub use edges::{Answered, Apart, Edge, Width};
pub use moves::{Moved, Moves};
pub use settles::{Late, Settles};
pub use shows::{Shows, ShowsLonger};
pub use swallows::Swallows;
pub use tolerates::Tolerates;
