//! Later in this branch.
