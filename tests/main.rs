//! The promises to the user, one module each; `outside` checks against published sources.

mod engine_agrees;
mod golden;
mod malformed;
mod outside;
mod support;
