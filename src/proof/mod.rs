//! All delays in their ranges at once: bounded-delay verdicts by zones.

mod cycles;
mod explore;
mod joint;
mod key;
mod plant;
mod watch;
mod watches;
pub mod zone;

pub use cycles::{Cycle, RestVerdict, comes_to_rest};
pub use explore::{
    Budget, Ended, Exact, Explored, Fired, Merge, Mode, NOWHERE, Rest, Semantics, explore, explore_under,
};
pub use key::Mover;
pub use plant::{NotCovered, Plant, PlantGate, PlantPlace, PlantStep, PlantWire, Ticks};
pub use watch::{Arrival, Block, Fate, Nothing, SAME, Watch};
pub use watches::{Moved, Moves, Settles, Shows};
