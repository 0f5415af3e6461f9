//! The promises to the user, one module each.

mod draws;
mod engine_agrees;
mod engine_properties;
mod outside;
mod support;
