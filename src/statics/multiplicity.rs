//! None, one or several: how often a relation holds for each choice of some of its variables.

use rustc_hash::FxHashMap;

use super::GaveUp;
use super::diagram::{BOTTOM, Diagram, Edge};

/// Two functions of the outer variables: for which the relation holds for at least one choice of the inner ones, and
/// for at least two.
pub(super) struct Multiplicity {
    pub some: Edge,
    pub several: Edge,
}

/// Splits the `levels` (ascending; the support of `root` is among them) into outer and inner, and looks how many
/// choices of the inner ones there are. The result is made in another diagram, with the same levels.
pub(super) fn multiplicity(
    from: &Diagram,
    root: Edge,
    levels: &[u32],
    outer: impl Fn(u32) -> bool,
    into: &mut Diagram,
) -> Result<Multiplicity, GaveUp> {
    // number of inner variables from each place on: one that is skipped is free, and doubles the choices
    let mut inner = vec![0u32; levels.len() + 1];
    for (place, level) in levels.iter().enumerate().rev() {
        inner[place] = inner[place + 1] + u32::from(!outer(*level));
    }
    let place = |edge: Edge| match from.level(edge) {
        BOTTOM => levels.len(),
        level => levels.binary_search(&level).expect("the support is among the levels"),
    };
    let mut found: FxHashMap<Edge, (Edge, Edge)> = FxHashMap::default();
    found.insert(Edge::FALSE, (Edge::FALSE, Edge::FALSE));
    found.insert(Edge::TRUE, (Edge::TRUE, Edge::FALSE));
    let seen_from = |found: &FxHashMap<Edge, (Edge, Edge)>, edge: Edge, above: usize| {
        let (some, several) = found[&edge];
        (some, if inner[above] > inner[place(edge)] { some } else { several })
    };
    for edge in from.below(root) {
        let (low, high) = from.halves(edge);
        let next = place(edge) + 1;
        let (some_low, several_low) = seen_from(&found, low, next);
        let (some_high, several_high) = seen_from(&found, high, next);
        let level = from.level(edge);
        let pair = if outer(level) {
            (into.node(level, some_low, some_high)?, into.node(level, several_low, several_high)?)
        } else {
            let both = into.and(some_low, some_high)?;
            let several = into.or(several_low, several_high)?;
            (into.or(some_low, some_high)?, into.or(several, both)?)
        };
        found.insert(edge, pair);
    }
    let (some, several) = seen_from(&found, root, 0);
    Ok(Multiplicity { some, several })
}
