//! Watches for single questions.

mod edges;
mod moves;
mod settles;
mod shows;
mod swallows;

pub use edges::{Answered, Apart, Edge, Width};
pub use moves::{Moved, Moves};
pub use settles::{Late, Settles};
pub use shows::{Shows, ShowsLonger};
pub use swallows::Swallows;
