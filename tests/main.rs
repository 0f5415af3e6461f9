//! One module per promise to the user; `outside` checks against published sources.

mod outside;
