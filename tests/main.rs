//! The promises to the user, one module each; `outside` checks against published sources.

#![allow(clippy::unwrap_used)] // a helper that fails is a test that fails

mod boards;
mod bounded;
mod bounded_agrees;
mod bounded_cycles;
mod bounded_simulated;
mod causes;
mod challenge;
mod commands;
mod conditions;
mod coverage;
mod demonstrations;
mod draws;
mod engine_agrees;
mod engine_properties;
mod essential;
mod golden;
mod groups;
mod hands_and_partners;
mod hypercube;
mod judges_agree;
mod limits;
mod malformed;
mod margins;
mod outcomes_agree;
mod outside;
mod paddings;
mod parts;
mod paths;
mod per_event;
mod proof_table;
mod proofs;
mod proofs_agree;
mod races;
mod scale;
mod searches;
mod settling_bounds;
mod support;
mod sweeps_agree;
mod ties;
mod verdicts;
mod views_agree;
mod wanted;
