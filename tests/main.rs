//! The promises to the user, one module each.

mod engine_agrees;
mod outside;
mod support;
