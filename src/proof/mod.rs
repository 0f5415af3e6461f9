//! All delays in their ranges at once: bounded-delay verdicts by zones.

mod arriving;
mod claim;
mod cycles;
mod explore;
mod explored;
mod firing;
mod goals;
mod joint;
mod key;
mod known;
mod oscillations;
mod outcomes;
mod passed;
mod plant;
mod prove;
mod semantics;
pub mod simplex;
mod system;
mod together;
mod watch;
mod watches;
mod windows;
mod witness;
pub mod zone;

pub use claim::{Call, Claim, Proof, Variation, WindowProof};
pub use cycles::{Cycle, RestVerdict, comes_to_rest};
pub use explore::{explore, explore_under};
pub use explored::{Budget, Ended, Explored, Fired, Merge, Mode, NOWHERE, Rest};
pub use key::Mover;
pub use plant::{NotCovered, Plant, PlantGate, PlantPlace, PlantStep, PlantWire, Ticks};
pub use prove::{Spend, prove};
pub use semantics::{Exact, Semantics};
pub use system::{Form, Point, Points, Row, Sense, System, Unknown};
pub use watch::{Arrival, Block, Fate, Nothing, SAME, Watch};
pub use watches::{
    Answered, Apart, BeforeRest, Edge, Late, Moved, Moves, Settles, Shows, ShowsLonger, Swallows, Width,
};
pub use witness::{Case, case, one_draw};
