//! tour comes later
pub mod circuit;
pub mod control;
pub mod delay;
pub mod engine;
pub mod instance;
pub mod logic;
pub mod scenario;
pub mod time;
