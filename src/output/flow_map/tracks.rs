//! Vertical pieces of arrows between two columns: which stands left of which.

/// A vertical piece.
#[derive(Clone, Debug, Default, PartialEq)]
pub(super) struct Piece {
    pub top: f64,
    pub bottom: f64,
    /// Heights at which a horizontal piece leaves it to the left.
    pub left: Vec<f64>,
    /// And to the right.
    pub right: Vec<f64>,
}

impl Piece {
    /// The piece that joins these heights.
    pub fn new(left: Vec<f64>, right: Vec<f64>) -> Piece {
        let all = || left.iter().chain(&right).copied();
        let (top, bottom) = (all().fold(f64::INFINITY, f64::min), all().fold(f64::NEG_INFINITY, f64::max));
        Piece { top, bottom, left, right }
    }

    /// Does a horizontal line at this height cross it?
    fn is_at(&self, y: f64) -> bool {
        self.top < y && y < self.bottom
    }
}

/// Pieces that come closer than this do not share a track.
const CLEAR: f64 = 8.0;
/// Rounds in which pieces are moved to better places.
const ROUNDS: usize = 8;

/// The track of every piece, 0 the leftmost: such that few lines cross, and no two pieces of a track meet. And the number of
/// tracks.
pub(super) fn tracks(pieces: &[Piece]) -> (Vec<usize>, usize) {
    let order = order(pieces);
    let mut track = vec![0; pieces.len()];
    let mut many = 0;
    for (i, piece) in order.iter().enumerate() {
        let meets = |other: &&usize| {
            let (one, other) = (&pieces[*piece], &pieces[**other]);
            one.top < other.bottom + CLEAR && other.top < one.bottom + CLEAR
        };
        let after = order[..i].iter().filter(meets).map(|other| track[*other] + 1);
        track[*piece] = after.max().unwrap_or(0);
        many = many.max(track[*piece] + 1);
    }
    (track, many)
}

/// Crossings if the first stands left of the second.
fn crossings(one: &Piece, other: &Piece) -> usize {
    one.right.iter().filter(|y| other.is_at(**y)).count() + other.left.iter().filter(|y| one.is_at(**y)).count()
}

/// An order from left to right with few crossings: each piece is moved to its best place, as long as that helps.
fn order(pieces: &[Piece]) -> Vec<usize> {
    let many = pieces.len();
    let cost: Vec<Vec<usize>> =
        pieces.iter().map(|one| pieces.iter().map(|other| crossings(one, other)).collect()).collect();
    let mut order: Vec<usize> = (0..many).collect();
    for _ in 0..ROUNDS {
        let mut better = false;
        for (piece, before) in cost.iter().enumerate() {
            let at = order.iter().position(|it| *it == piece).expect("every piece is in the order");
            order.remove(at);
            // cost of standing before everything; then what each step to the right changes
            let mut sum: i64 = order.iter().map(|other| before[*other] as i64).sum();
            let (mut best, mut least, mut now) = (0, sum, sum);
            for (i, other) in order.iter().enumerate() {
                sum += cost[*other][piece] as i64 - before[*other] as i64;
                if i + 1 == at {
                    now = sum;
                }
                if sum < least {
                    (best, least) = (i + 1, sum);
                }
            }
            let to = if least < now { best } else { at };
            better |= least < now;
            order.insert(to, piece);
        }
        if !better {
            break;
        }
    }
    order
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn pieces_that_would_cross_change_places() {
        // both come from the left and leave to the right, the first from 0 down to 100, the second from 20 to 120
        let pieces = [Piece::new(vec![0.0], vec![100.0]), Piece::new(vec![20.0], vec![120.0])];
        let (track, many) = tracks(&pieces);
        assert_eq!((track, many), (vec![1, 0], 2), "the lower one turns first");
    }

    #[test]
    fn pieces_that_are_apart_share_a_track() {
        let pieces = [Piece::new(vec![0.0], vec![40.0]), Piece::new(vec![60.0], vec![90.0])];
        assert_eq!(tracks(&pieces), (vec![0, 0], 1));
        let close = [Piece::new(vec![0.0], vec![40.0]), Piece::new(vec![44.0], vec![90.0])];
        assert_eq!(tracks(&close).1, 2);
        assert_eq!(tracks(&[]), (vec![], 0));
    }
}
