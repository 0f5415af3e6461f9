//! Checks against what others found: published tables, or programs that share no code with ours. Every test names its
//! source. \[PAGE …\] marks a page on which the value was seen, \[computed\] a value from an independent throw-away
//! program or by hand, "from memory" a source that was not at hand, "common practice, no source" a fact of the trade.

mod eichelberger;
mod engine;
mod exact_windows;
mod filters;
mod flow_tables;
mod hazards;
mod hundreds_of_gates;
mod large_networks;
mod limits;
mod linear_programs;
mod networks;
mod random_networks;
mod small_networks;
mod stable_states;
mod statistics;
mod ties;
mod words_of_nets;
