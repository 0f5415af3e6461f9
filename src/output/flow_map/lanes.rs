//! Lanes between rows, for arrows that pass columns on their way.

use super::grid::{Grid, Link};

/// The way of an arrow that passes columns: which lane, lane 0 above row 0, and which track in it.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Lane {
    pub lane: usize,
    pub track: usize,
}

/// The gaps right and left of columns: gap 0 lies between columns 0 and 1.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Gaps {
    /// Does it run to the right?
    pub rightwards: bool,
    /// The gap at its beginning.
    pub from: usize,
    /// The gap at its end.
    pub to: usize,
}

impl Gaps {
    pub fn of(grid: &Grid, link: &Link) -> Gaps {
        let from = grid.nodes[link.from].column;
        let to = link.to.first().map_or(from, |to| grid.nodes[*to].column);
        if from < to {
            Gaps { rightwards: true, from, to: to - 1 }
        } else {
            Gaps { rightwards: false, from: from.saturating_sub(1), to }
        }
    }

    /// Does it pass no column?
    pub fn is_direct(self) -> bool {
        self.from == self.to
    }
}

/// A lane for every link that passes columns, and how many tracks every lane has.
pub(super) fn lanes(grid: &Grid) -> (Vec<Option<Lane>>, Vec<usize>) {
    let mut ways = vec![None; grid.links.len()];
    // what is taken of each track of each lane, in gaps from left to right
    let mut taken: Vec<Vec<Vec<(usize, usize)>>> = vec![Vec::new(); grid.rows + 1];
    let mut far: Vec<usize> = (0..grid.links.len()).filter(|i| !Gaps::of(grid, &grid.links[*i]).is_direct()).collect();
    // short ways first: they lie next to the boxes
    far.sort_by_key(|i| {
        let gaps = Gaps::of(grid, &grid.links[*i]);
        (gaps.from.abs_diff(gaps.to), *i)
    });
    for i in far {
        let link = &grid.links[i];
        let gaps = Gaps::of(grid, link);
        let span = (gaps.from.min(gaps.to), gaps.from.max(gaps.to));
        let free = |track: &Vec<(usize, usize)>| track.iter().all(|other| span.1 < other.0 || other.1 < span.0);
        let rows: Vec<usize> = std::iter::once(&link.from).chain(&link.to).map(|node| grid.nodes[*node].row).collect();
        let (least, most) = (rows.iter().min().copied().unwrap_or(0), rows.iter().max().copied().unwrap_or(0));
        let track = |lane: usize| taken[lane].iter().position(free).unwrap_or(taken[lane].len());
        let cost = |lane: usize| {
            let way: usize = rows.iter().map(|row| (2 * row + 1).abs_diff(2 * lane)).sum();
            2 * way + track(lane)
        };
        let lane = (least..=most + 1).min_by_key(|lane| (cost(*lane), *lane)).unwrap_or(0);
        let track = track(lane);
        if track == taken[lane].len() {
            taken[lane].push(Vec::new());
        }
        taken[lane][track].push(span);
        ways[i] = Some(Lane { lane, track });
    }
    (ways, taken.iter().map(Vec::len).collect())
}
