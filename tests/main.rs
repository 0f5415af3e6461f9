//! The promises to the user, one module each.

mod engine_agrees;
mod support;
//! One module per promise to the user; `outside` checks against published sources.

mod outside;
//! Promises to the user, one module each.

mod malformed;
//! Promises to the user, one module a promise.

mod golden;
