//! Promises to the user, one module a promise.

mod golden;
