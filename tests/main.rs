//! Promises to the user, one module each.

mod malformed;
