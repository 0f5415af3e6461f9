//! Zones: sets of clock values given by bounds on differences of two clocks (difference bound matrices; Dill 1989,
//! Bengtsson and Yi 2004), in whole numbers.
//!
//! A matrix for n clocks has n + 1 rows; row and column 0 stand for the constant 0. Entry (i, j) bounds xᵢ − xⱼ from
//! above. A bound is a code: 2c + 1 for "≤ c", 2c for "< c", so that a smaller code is a tighter bound. Every matrix here
//! is closed (no entry can be tightened by two others) unless a function says otherwise.

/// An upper bound on a difference of clocks: 2c + 1 for "≤ c", 2c for "< c".
pub type Code = i64;

/// No bound.
pub const FREE: Code = i64::MAX / 4;
/// "≤ 0".
pub const AT_MOST_ZERO: Code = 1;
/// "< 0".
pub const BELOW_ZERO: Code = 0;

/// "≤ c".
pub const fn at_most(c: i64) -> Code {
    2 * c + 1
}

/// "< c".
pub const fn below(c: i64) -> Code {
    2 * c
}

/// The same bound, not reached.
pub const fn strictly(code: Code) -> Code {
    code & !1
}

/// The bound on a sum of two differences.
#[inline]
pub const fn plus(a: Code, b: Code) -> Code {
    if a == FREE || b == FREE { FREE } else { a + b - ((a | b) & 1) }
}

/// The number of a bound, and whether it is reached.
pub const fn limit(code: Code) -> (i64, bool) {
    (code >> 1, code & 1 == 1)
}

/// A matrix that is being worked on.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Matrix {
    /// Rows, the constant counted.
    pub size: usize,
    /// The bounds, row by row.
    pub bounds: Vec<Code>,
}

impl Matrix {
    /// All clocks at 0.
    pub fn zero(clocks: usize) -> Matrix {
        let size = clocks + 1;
        Matrix { size, bounds: vec![AT_MOST_ZERO; size * size] }
    }

    /// Takes over the bounds of a zone.
    #[inline]
    pub fn load(&mut self, size: usize, bounds: &[Code]) {
        self.size = size;
        self.bounds.clear();
        self.bounds.extend_from_slice(bounds);
    }

    /// The bound on xᵢ − xⱼ.
    #[inline]
    pub fn at(&self, i: usize, j: usize) -> Code {
        self.bounds[i * self.size + j]
    }

    /// Adds a bound on xᵢ − xⱼ. False: nothing is left.
    #[inline]
    pub fn bound(&mut self, i: usize, j: usize, code: Code) -> bool {
        let n = self.size;
        if self.bounds[i * n + j] <= code {
            return true;
        }
        if plus(self.bounds[j * n + i], code) < AT_MOST_ZERO {
            return false;
        }
        for a in 0..n {
            let to_i = self.bounds[a * n + i];
            if to_i == FREE {
                continue;
            }
            let over = plus(to_i, code);
            // what does not come nearer to j comes nearer to nothing behind it
            if over >= self.bounds[a * n + j] {
                continue;
            }
            for b in 0..n {
                let through = plus(over, self.bounds[j * n + b]);
                let entry = &mut self.bounds[a * n + b];
                if through < *entry {
                    *entry = through;
                }
            }
        }
        true
    }

    /// xᵢ is at least c. False: nothing is left.
    #[inline]
    pub fn at_least(&mut self, i: usize, c: i64) -> bool {
        self.bound(0, i, at_most(-c))
    }

    /// Would something be left with an upper bound on xᵢ? Several such bounds leave something if each of them does: they all
    /// end at the constant, so no two of them are part of one contradiction.
    #[inline]
    pub fn allows(&self, i: usize, code: Code) -> bool {
        plus(self.bounds[i], code) >= AT_MOST_ZERO
    }

    /// Could xᵢ be at least c?
    #[inline]
    pub fn may_reach(&self, i: usize, c: i64) -> bool {
        self.at(i, 0) >= at_most(c)
    }

    /// Could xᵢ be above c?
    pub fn may_pass(&self, i: usize, c: i64) -> bool {
        self.at(i, 0) > at_most(c)
    }

    /// Lets time pass as long as every listed clock keeps its bound. The bounds must hold now.
    #[inline]
    pub fn elapse(&mut self, limits: &[(usize, Code)]) {
        let n = self.size;
        for i in 1..n {
            let mut most = FREE;
            for (clock, limit) in limits {
                most = most.min(plus(self.bounds[i * n + clock], *limit));
            }
            self.bounds[i * n] = most;
        }
        for i in 1..n {
            let most = self.bounds[i * n];
            if most == FREE {
                continue;
            }
            for j in 1..n {
                let through = plus(most, self.bounds[j]);
                let entry = &mut self.bounds[i * n + j];
                if through < *entry {
                    *entry = through;
                }
            }
        }
    }

    /// Lets exactly this much time pass.
    pub fn shift(&mut self, by: i64) {
        let n = self.size;
        for i in 1..n {
            if self.bounds[i * n] != FREE {
                self.bounds[i * n] += 2 * by;
            }
            if self.bounds[i] != FREE {
                self.bounds[i] -= 2 * by;
            }
        }
    }

    /// Puts clocks in a new order into `into`: new clock k + 1 is old clock `from[k]`, or begins at 0 where that is 0.
    #[inline]
    pub fn gather(&self, from: &[usize], into: &mut Matrix) {
        let n = from.len() + 1;
        into.size = n;
        into.bounds.clear();
        for old in std::iter::once(&0).chain(from) {
            let row = &self.bounds[old * self.size..(old + 1) * self.size];
            into.bounds.push(row[0]);
            into.bounds.extend(from.iter().map(|column| row[*column]));
        }
    }
}

/// Does zone `b` hold every point of zone `a`? Both of one size.
#[inline]
pub fn within(a: &[Code], b: &[Code]) -> bool {
    a.iter().zip(b).all(|(a, b)| a <= b)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn codes_add_as_bounds_do() {
        assert_eq!(plus(at_most(2), at_most(3)), at_most(5));
        assert_eq!(plus(below(2), at_most(3)), below(5));
        assert_eq!(plus(below(2), below(-3)), below(-1));
        assert_eq!(plus(at_most(-2), below(-3)), below(-5));
        assert_eq!(plus(FREE, below(-3)), FREE);
        assert!(below(2) < at_most(2) && at_most(1) < below(2));
        assert_eq!((limit(at_most(-3)), limit(below(-3))), ((-3, true), (-3, false)));
    }

    #[test]
    fn two_clocks_that_start_together_stay_together() {
        let mut zone = Matrix::zero(2);
        zone.elapse(&[(1, at_most(5)), (2, at_most(9))]);
        assert_eq!((zone.at(1, 0), zone.at(2, 0)), (at_most(5), at_most(5)));
        assert_eq!((zone.at(1, 2), zone.at(2, 1)), (at_most(0), at_most(0)));
        assert!(zone.may_reach(1, 5) && !zone.may_reach(1, 6) && !zone.may_pass(1, 5) && zone.may_pass(1, 4));
        let mut late = zone.clone();
        assert!(late.at_least(1, 4));
        assert_eq!(late.at(0, 2), at_most(-4));
        assert!(within(&late.bounds, &zone.bounds) && !within(&zone.bounds, &late.bounds));
        assert!(!late.bound(2, 0, below(4)), "the other one cannot be younger");
        // the second goes on, a new one begins
        let mut next = Matrix::default();
        late = zone.clone();
        assert!(late.at_least(1, 4));
        late.gather(&[2, 0], &mut next);
        assert_eq!((next.at(0, 1), next.at(1, 0), next.at(2, 0)), (at_most(-4), at_most(5), at_most(0)));
        assert_eq!(next.at(1, 2), at_most(5));
        next.shift(3);
        assert_eq!(
            (next.at(0, 1), next.at(2, 0), next.at(0, 2), next.at(1, 2)),
            (at_most(-7), at_most(3), at_most(-3), at_most(5))
        );
    }
}
