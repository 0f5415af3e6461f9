//! tour comes later
pub mod circuit;
pub mod control;
pub mod delay;
pub mod engine;
pub mod findings;
pub mod instance;
pub mod logic;
pub mod output;
pub mod reader;
pub mod review;
pub mod scenario;
pub mod statics;
pub mod sweep;
pub mod time;
