//! The conjunction of many relations, with variables quantified away as early as can be.
//!
//! The order of the work decides how large the diagrams on the way become. Here the smallest relation is always joined
//! next, with the one that leaves the fewest variables together, and a hidden variable goes as soon as only one relation
//! depends on it (early quantification: Burch, Clarke, Long 1991; choosing by what enters and leaves: Geist, Beer 1994).
//! Where everything is local, as in a chain, neighbours meet and the work grows like a balanced tree.

use std::cmp::Reverse;
use std::collections::{BTreeSet, BinaryHeap};

use rustc_hash::FxHashMap;

use super::GaveUp;
use super::diagram::{Diagram, Edge};

/// Independent relations that together are the conjunction: no two depend on the same level.
pub(super) struct Factor {
    pub root: Edge,
    /// ascending
    pub support: Vec<u32>,
}

/// A relation that waits to be joined.
struct Cluster {
    root: Edge,
    /// nodes
    size: usize,
    support: Vec<u32>,
}

struct Clusters<'a, H> {
    diagram: &'a mut Diagram,
    hidden: H,
    waiting: Vec<Option<Cluster>>,
    /// for each level the places of the clusters that depend on it
    places: FxHashMap<u32, BTreeSet<usize>>,
    /// the smallest first; entries go stale and are checked when taken
    smallest: BinaryHeap<Reverse<(usize, usize)>>,
}

/// The conjunction of these relations, those levels quantified away ("there is a value") that `hidden` names. Relations
/// that stand close together should have to do with each other: among equally good ones the nearest are joined.
pub(super) fn conjunction(
    diagram: &mut Diagram,
    relations: &[Edge],
    hidden: impl Fn(u32) -> bool,
) -> Result<Vec<Factor>, GaveUp> {
    let count = relations.len();
    let mut clusters = Clusters {
        diagram,
        hidden,
        waiting: std::iter::repeat_with(|| None).take(count).collect(),
        places: FxHashMap::default(),
        smallest: BinaryHeap::with_capacity(count),
    };
    let supports: Vec<Vec<u32>> = relations.iter().map(|root| clusters.diagram.support(*root)).collect();
    for (place, support) in supports.iter().enumerate() {
        for level in support {
            clusters.places.entry(*level).or_default().insert(place);
        }
    }
    for (place, support) in supports.into_iter().enumerate() {
        clusters.join(place, relations[place], Edge::TRUE, support)?;
    }
    let mut factors = Vec::new();
    while let Some(Reverse((size, place))) = clusters.smallest.pop() {
        let Some(smallest) = clusters.waiting[place].take_if(|cluster| cluster.size == size) else { continue };
        if smallest.root == Edge::FALSE {
            return Ok(vec![Factor { root: Edge::FALSE, support: Vec::new() }]);
        }
        // a level may have left the last other relation that depended on it
        if smallest.support.iter().any(|level| clusters.can_go(*level)) {
            clusters.join(place, smallest.root, Edge::TRUE, smallest.support)?;
            continue;
        }
        match clusters.partner(place, &smallest) {
            Some(other) => {
                let partner = clusters.waiting[other].take().expect("a cluster that is listed waits");
                for level in &partner.support {
                    let places = clusters.places.get_mut(level).expect("listed");
                    places.remove(&other);
                    places.insert(place);
                }
                let mut support = [smallest.support, partner.support].concat();
                support.sort_unstable();
                support.dedup();
                clusters.join(place, smallest.root, partner.root, support)?;
            }
            None if smallest.root == Edge::TRUE => {}
            None => factors.push(Factor { root: smallest.root, support: smallest.support }),
        }
    }
    factors.sort_by_key(|factor| factor.support[0]);
    Ok(factors)
}

impl<H: Fn(u32) -> bool> Clusters<'_, H> {
    /// Is it hidden, and does only one cluster depend on it?
    fn can_go(&self, level: u32) -> bool {
        (self.hidden)(level) && self.places[&level].len() == 1
    }

    /// Makes the cluster of a place from two relations that depend on `support` together.
    fn join(&mut self, place: usize, f: Edge, g: Edge, support: Vec<u32>) -> Result<(), GaveUp> {
        let gone: Vec<u32> = support.iter().copied().filter(|level| self.can_go(*level)).collect();
        let cube = self.diagram.cube(&gone)?;
        let root = self.diagram.and_exists(f, g, cube)?;
        let (left, size) = self.diagram.extent(root);
        for level in support.iter().filter(|level| left.binary_search(level).is_err()) {
            self.places.get_mut(level).expect("listed").remove(&place);
        }
        self.waiting[place] = Some(Cluster { root, size, support: left });
        self.smallest.push(Reverse((size, place)));
        Ok(())
    }

    /// The best cluster to join with this one: of the nearest on either side at each of its levels the one that leaves
    /// the fewest variables, then the smallest, then the nearest. `None`: it has no level in common with any.
    fn partner(&self, place: usize, cluster: &Cluster) -> Option<usize> {
        let mut near: Vec<usize> = Vec::new();
        for level in &cluster.support {
            let places = &self.places[level];
            near.extend(places.range(..place).next_back());
            near.extend(places.range(place + 1..).next());
        }
        near.sort_unstable();
        near.dedup();
        near.into_iter().min_by_key(|other| {
            let partner = self.waiting[*other].as_ref().expect("a cluster that is listed waits");
            let (mut common, mut gone) = (0, 0usize);
            for level in cluster.support.iter().filter(|level| partner.support.binary_search(level).is_ok()) {
                common += 1;
                gone += usize::from((self.hidden)(*level) && self.places[level].len() == 2);
            }
            // variables that the cluster does not have already, less those that go
            let added = (partner.support.len() - common) as isize - gone as isize;
            (added, partner.size, other.abs_diff(place))
        })
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::control::Control;
    use crate::statics::walk::tests::{Truth, build, truth};

    /// Relations over four variables, many of them over fewer, in a fixed order.
    fn samples() -> Vec<Vec<Truth>> {
        let mut word = 0x0f1e_2d3c_4b5a_6978u64;
        let mut next = || {
            word ^= word << 13;
            word ^= word >> 7;
            word ^= word << 17;
            word
        };
        let variable = [0xaaaau16, 0xcccc, 0xf0f0, 0xff00];
        let mut relation = || {
            let (a, b) = (variable[next() as usize % 4], variable[next() as usize % 4]);
            match next() % 6 {
                0 => a | b,
                1 => !(a ^ b),
                2 => a | !b,
                3 => a & b | !a & (next() as u16),
                4 => a,
                _ => next() as u16 | a,
            }
        };
        (0..3000).map(|case| (0..1 + case % 5).map(|_| relation()).collect()).collect()
    }

    #[test]
    fn factors_are_the_conjunction_without_the_hidden_levels() {
        let exists = |t: Truth, v: u32| {
            let ones = [0xaaaau16, 0xcccc, 0xf0f0, 0xff00][v as usize];
            t | (t & ones) >> (1 << v) | (t & !ones) << (1 << v)
        };
        let mut several = 0;
        for (case, tables) in samples().into_iter().enumerate() {
            let mut diagram = Diagram::new(&Control::default());
            let relations: Vec<Edge> = tables.iter().map(|table| build(&mut diagram, *table)).collect();
            let set = case as u32 % 16;
            let hidden = |level: u32| set >> level & 1 == 1;
            let all = tables.iter().fold(Truth::MAX, |all, table| all & table);
            let want = (0..4).filter(|v| hidden(*v)).fold(all, exists);
            let factors = conjunction(&mut diagram, &relations, hidden).unwrap();
            let found = factors.iter().fold(Truth::MAX, |all, factor| all & truth(&diagram, factor.root));
            assert_eq!(found, want, "case {case}: {tables:04x?}, hidden {set:04b}");
            let levels: Vec<u32> = factors.iter().flat_map(|factor| factor.support.clone()).collect();
            let different: BTreeSet<u32> = levels.iter().copied().collect();
            assert_eq!(levels.len(), different.len(), "case {case}: factors share nothing");
            assert!(!levels.into_iter().any(hidden), "case {case}: nothing hidden is left");
            several += usize::from(factors.len() > 1);
        }
        assert!(several > 50, "some fall into factors: {several}");
    }

    #[test]
    fn a_long_chain_grows_like_its_length() {
        // x(k) = x(k+1) for 20,000 variables, in a bad order, all but the ends hidden: the ends are equal
        const N: u32 = 20_000;
        let mut diagram = Diagram::new(&Control::default());
        let mut relations = Vec::new();
        for k in 0..N - 1 {
            let (a, b) = (diagram.variable(k).unwrap(), diagram.variable(k + 1).unwrap());
            relations.push(!diagram.xor(a, b).unwrap());
        }
        relations.sort_by_key(|root| (diagram.level(*root) % 7, *root));
        let factors = conjunction(&mut diagram, &relations, |level| level > 0 && level < N - 1).unwrap();
        assert_eq!(factors.len(), 1);
        assert_eq!(factors[0].support, [0, N - 1]);
        assert!(diagram.len() < 20 * N as usize, "{} nodes", diagram.len());
    }
}
