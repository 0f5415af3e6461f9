//! The promises to the user, one module each.

#![allow(clippy::unwrap_used)] // a helper that fails is a test that fails

mod draws;
mod engine_agrees;
mod engine_properties;
mod outside;
mod support;
