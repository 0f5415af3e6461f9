//! Big circuits and long runs: what is found in circuits of a million gates is right, and what is too long to be kept is
//! written, cut and marked.

mod circuits;
mod long_runs;
