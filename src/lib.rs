//! tour comes later
pub mod circuit;
pub mod control;
pub mod delay;
pub mod logic;
pub mod statics;
pub mod time;
