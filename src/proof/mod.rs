//! All delays in their ranges at once: bounded-delay verdicts by zones.

mod arriving;
mod bounce;
mod claim;
mod cycles;
mod deciding;
mod evidence;
mod explore;
mod explored;
mod firing;
mod goals;
mod grouped;
mod joint;
mod key;
mod known;
mod margin;
mod oscillations;
mod outcomes;
mod outside;
mod padding;
mod passed;
mod patterns;
mod plant;
mod prove;
mod race;
mod ratio;
mod semantics;
pub mod simplex;
mod system;
mod together;
mod varying;
mod watch;
mod watches;
mod windows;
mod witness;
pub mod zone;

pub use bounce::{Begins, PlantBounce};
pub use claim::{Call, Claim, Proof, Variation, WindowProof};
pub use cycles::{Cycle, RestVerdict, comes_to_rest};
pub use explore::{explore, explore_under};
pub use explored::{Budget, Ended, Explored, Fired, Merge, Mode, NOWHERE, Rest, SINCE, START};
pub use key::Mover;
pub use margin::{Margin, MarginEnd};
pub use outside::PlantClock;
pub use padding::{Padding, PaddingEnd};
pub use plant::{NotCovered, Plant, PlantGate, PlantPlace, PlantStep, PlantWire, Ticks};
pub use prove::{Spend, prove};
pub use race::{Quantity, Race, Relation, Sum};
pub use ratio::Ratio;
pub use semantics::{Exact, Semantics};
pub use system::{Form, Point, Points, Row, Sense, System, Unknown};
pub use watch::{Arrival, Block, Fate, Nothing, SAME, Watch};
pub use watches::{
    Answered, Apart, BeforeRest, Edge, Late, Moved, Moves, Settles, Shows, ShowsLonger, Swallows, Tolerates, Width,
};
pub use witness::{Case, case, one_draw};
