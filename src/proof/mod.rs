//! All delays in their ranges at once: bounded-delay verdicts by zones.

mod claim;
mod cycles;
mod explore;
mod goals;
mod joint;
mod key;
mod oscillations;
mod outcomes;
mod plant;
mod prove;
pub mod simplex;
mod system;
mod watch;
mod watches;
mod witness;
pub mod zone;

pub use claim::{Call, Claim, Proof, Variation, WindowProof};
pub use cycles::{Cycle, RestVerdict, comes_to_rest};
pub use explore::{
    Budget, Ended, Exact, Explored, Fired, Merge, Mode, NOWHERE, Rest, Semantics, explore, explore_under,
};
pub use key::Mover;
pub use plant::{NotCovered, Plant, PlantGate, PlantPlace, PlantStep, PlantWire, Ticks};
pub use prove::{Spend, prove};
pub use system::{Form, Point, Points, Row, Sense, System, Unknown};
pub use watch::{Arrival, Block, Fate, Nothing, SAME, Watch};
pub use watches::{
    Answered, Apart, BeforeRest, Edge, Late, Moved, Moves, Settles, Shows, ShowsLonger, Swallows, Width,
};
pub use witness::{Case, case, one_draw};
