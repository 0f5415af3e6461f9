//! Checks against published sources. Marks: \[PAGE …\] was seen on that page; \[from memory\] recalled, not looked up;
//! \[computed\] computed apart from this program, by hand or brute force, from the stated formula.

mod engine;
