//! What a person sees: waveforms, charts, tables, JSON, texts and the folder that they go into.
//!
//! Nothing about circuits is computed here. Every function takes results in numbers and exact times, and a
//! [`Scenario`](crate::scenario::Scenario) for the names, and gives back text or bytes; the same input gives the same
//! bytes on every machine. Only [`bundle`] and [`stream`] touch a disk, and nothing prints.

mod assumptions;
pub mod bundle;
mod causes;
mod cautions;
pub mod charts;
pub mod convergence;
mod deciding;
pub mod dump;
mod far;
mod fitted;
pub mod flow_map;
pub mod flow_tables;
mod flow_words;
mod ink;
pub mod instance;
pub mod json;
pub mod limit_charts;
pub mod limit_map;
pub mod limit_tables;
mod limit_words;
mod log_axis;
pub mod margin_charts;
pub mod margins;
mod measure;
pub mod page;
mod pictures;
mod races;
mod search;
pub mod sensitivity;
pub mod shares;
mod stands_in;
pub mod stream;
pub mod tables;
pub mod text;
pub mod waves;
mod words;
