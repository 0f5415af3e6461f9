//! The inks and sizes of every picture. Nothing is told by ink alone.

/// Lines and text.
pub(super) const INK: &str = "#1d2430";
/// Grid, axes, rules between groups.
pub(super) const QUIET: &str = "#8a93a0";
/// Filled areas: bars, and bands in which an edge may come.
pub(super) const BAND: &str = "#d9dee6";
/// A finding: also a bracket below the lane and a label.
pub(super) const FINDING: &str = "#b3420f";
/// Rest: also a triangle on the time axis.
pub(super) const REST: &str = "#2f6f3e";
/// Path A of a race: also solid, with its letter.
pub(super) const FIRST: &str = "#0b6b7d";
/// Path B of a race: also dashed.
pub(super) const SECOND: &str = "#7a3fa0";
/// Body text, pixels.
pub(super) const BODY: f64 = 12.0;
/// Text at axes and marks, pixels.
pub(super) const SMALL: f64 = 11.0;
