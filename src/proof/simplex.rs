//! Linear programs solved exactly: the simplex method on whole numbers with one common denominator (fraction-free pivots;
//! Edmonds 1967, Bareiss 1968), Bland's rule (1977), so that it ends. No float decides anything.

/// Maximise a linear objective over variables of at least 0 with rows `coefficients · x ≤ limit`.
#[derive(Clone, Debug, Default)]
pub struct Program {
    /// Number of variables.
    pub variables: usize,
    /// Rows: coefficients (variable, factor) and the limit.
    pub rows: Vec<(Vec<(usize, i64)>, i64)>,
    /// The objective.
    pub objective: Vec<(usize, i64)>,
}

/// What a program came to.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Solved {
    /// The greatest value.
    Best(Solution),
    /// No point keeps all rows.
    Infeasible,
    /// The objective has no greatest value.
    Unbounded,
    /// Numbers grew beyond 128 bits, or too many pivots were needed: nothing is known.
    GaveUp,
}

/// An optimal point, exact.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Solution {
    /// The common denominator, above 0.
    pub denominator: i128,
    /// Numerators of the variables.
    pub values: Vec<i128>,
    /// Numerator of the objective.
    pub objective: i128,
    /// Numerators of the prices of the rows (the dual solution), none below 0: what one more of a limit is worth. A row
    /// with a price is tight in every optimal point; the rows times their prices add up to the objective's bound.
    pub prices: Vec<i128>,
}

/// Pivots, at most.
const PIVOTS: usize = 20_000;

/// A tableau: rows of basic variables, columns of non-basic ones, all entries over one denominator.
struct Tableau {
    width: usize,
    /// Rows, the objective last; the last column is the right hand side.
    cells: Vec<i128>,
    rows: usize,
    denominator: i128,
    /// Variable of each row: below `variables` a variable, else a slack.
    basic: Vec<usize>,
    free: Vec<usize>,
    pivots: usize,
}

impl Tableau {
    fn at(&self, row: usize, column: usize) -> i128 {
        self.cells[row * self.width + column]
    }

    /// Exchanges the variables of a row and a column. `None`: the numbers grew too large.
    fn pivot(&mut self, row: usize, column: usize) -> Option<()> {
        let (width, old) = (self.width, self.denominator);
        let pivot = self.at(row, column);
        for r in 0..=self.rows {
            if r == row {
                continue;
            }
            let factor = self.at(r, column);
            for c in 0..width {
                if c == column {
                    continue;
                }
                let ours = self.at(r, c).checked_mul(pivot)?;
                let theirs = factor.checked_mul(self.at(row, c))?;
                self.cells[r * width + c] = ours.checked_sub(theirs)? / old;
            }
            self.cells[r * width + column] = -factor;
        }
        self.cells[row * width + column] = old;
        self.denominator = pivot;
        if pivot < 0 {
            self.denominator = -pivot;
            for cell in &mut self.cells {
                *cell = -*cell;
            }
        }
        std::mem::swap(&mut self.basic[row], &mut self.free[column]);
        self.pivots += 1;
        (self.pivots < PIVOTS).then_some(())
    }

    /// Pivots to the optimum from a feasible point. `None`: gave up; false: unbounded.
    fn climb(&mut self, barred: Option<usize>) -> Option<bool> {
        let last = self.width - 1;
        loop {
            // Bland: the variable of least number that helps
            let helps = (0..last).filter(|c| Some(self.free[*c]) != barred && self.at(self.rows, *c) < 0);
            let Some(column) = helps.min_by_key(|c| self.free[*c]) else { return Some(true) };
            let mut best: Option<usize> = None;
            for row in 0..self.rows {
                let entry = self.at(row, column);
                if entry <= 0 {
                    continue;
                }
                best = match best {
                    None => Some(row),
                    Some(other) => {
                        let ours = self.at(row, last).checked_mul(self.at(other, column))?;
                        let theirs = self.at(other, last).checked_mul(entry)?;
                        let closer = (ours, self.basic[row]) < (theirs, self.basic[other]);
                        Some(if closer { row } else { other })
                    }
                };
            }
            let Some(row) = best else { return Some(false) };
            self.pivot(row, column)?;
        }
    }
}

impl Program {
    /// Solves it.
    pub fn solve(&self) -> Solved {
        self.run().unwrap_or(Solved::GaveUp)
    }

    fn run(&self) -> Option<Solved> {
        let (variables, rows) = (self.variables, self.rows.len());
        // one more column for the variable that makes any point feasible
        let width = variables + 2;
        let (extra, last) = (variables, variables + 1);
        let mut cells = vec![0i128; (rows + 1) * width];
        for (r, (coefficients, limit)) in self.rows.iter().enumerate() {
            for (variable, factor) in coefficients {
                cells[r * width + variable] += i128::from(*factor);
            }
            cells[r * width + extra] = -1;
            cells[r * width + last] = i128::from(*limit);
        }
        let artificial = variables + rows;
        let mut free: Vec<usize> = (0..variables).collect();
        free.push(artificial);
        let basic = (variables..variables + rows).collect();
        let mut it = Tableau { width, cells, rows, denominator: 1, basic, free, pivots: 0 };
        let worst = (0..rows).min_by_key(|r| it.at(*r, last)).filter(|r| it.at(*r, last) < 0);
        if let Some(row) = worst {
            // maximise minus the extra variable
            it.cells[rows * width + extra] = 1;
            it.pivot(row, extra)?;
            it.climb(None)?;
            if it.at(rows, last) != 0 {
                return Some(Solved::Infeasible);
            }
            if let Some(row) = it.basic.iter().position(|variable| *variable == artificial) {
                // it is 0: out of the way with it
                match (0..last).find(|c| it.at(row, *c) != 0) {
                    Some(column) => it.pivot(row, column)?,
                    None => return None,
                }
            }
        }
        // the objective in terms of what is non-basic now
        let objective_row = rows * width;
        let mut objective = vec![0i128; width];
        for (variable, factor) in &self.objective {
            let factor = i128::from(*factor);
            match it.free.iter().position(|free| free == variable) {
                Some(column) => {
                    objective[column] = objective[column].checked_sub(factor.checked_mul(it.denominator)?)?
                }
                None => {
                    let row = it.basic.iter().position(|basic| basic == variable)?;
                    for (c, cell) in objective.iter_mut().enumerate() {
                        *cell = cell.checked_add(factor.checked_mul(it.at(row, c))?)?;
                    }
                }
            }
        }
        it.cells[objective_row..].copy_from_slice(&objective);
        // the extra variable stays at 0
        if let Some(column) = it.free.iter().position(|variable| *variable == artificial) {
            for row in 0..=rows {
                it.cells[row * width + column] = 0;
            }
        }
        if !it.climb(Some(artificial))? {
            return Some(Solved::Unbounded);
        }
        let mut values = vec![0; variables];
        for (row, variable) in it.basic.iter().enumerate() {
            if *variable < variables {
                values[*variable] = it.at(row, last);
            }
        }
        let mut prices = vec![0; rows];
        for (column, variable) in it.free.iter().enumerate() {
            if (variables..variables + rows).contains(variable) {
                prices[variable - variables] = it.at(rows, column);
            }
        }
        Some(Solved::Best(Solution { denominator: it.denominator, values, objective: it.at(rows, last), prices }))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn best(program: &Program) -> (i128, i128, Vec<i128>) {
        match program.solve() {
            Solved::Best(it) => (it.objective, it.denominator, it.values),
            other => panic!("{other:?}"),
        }
    }

    #[test]
    fn textbook_programs() {
        // maximise 3x + 5y, x ≤ 4, 2y ≤ 12, 3x + 2y ≤ 18: 36 at (2, 6) (Hillier and Lieberman, from memory)
        let rows = vec![(vec![(0, 1)], 4), (vec![(1, 2)], 12), (vec![(0, 3), (1, 2)], 18)];
        let program = Program { variables: 2, rows, objective: vec![(0, 3), (1, 5)] };
        let (objective, denominator, values) = best(&program);
        assert_eq!(objective, 36 * denominator);
        assert_eq!(values, [2 * denominator, 6 * denominator]);
        // a point that is not feasible at the origin: x + y ≥ 2, maximise -x - 2y
        let rows = vec![(vec![(0, -1), (1, -1)], -2), (vec![(0, 1)], 1)];
        let program = Program { variables: 2, rows, objective: vec![(0, -1), (1, -2)] };
        let (objective, denominator, values) = best(&program);
        assert_eq!((objective, &values[..]), (-3 * denominator, &[denominator, denominator][..]));
        let program = Program { variables: 1, rows: vec![(vec![(0, 1)], 1), (vec![(0, -1)], -2)], objective: vec![] };
        assert_eq!(program.solve(), Solved::Infeasible);
        let program = Program { variables: 1, rows: vec![(vec![(0, -1)], 2)], objective: vec![(0, 1)] };
        assert_eq!(program.solve(), Solved::Unbounded);
        // thirds: maximise s, s ≤ 1 - x, s ≤ x - y, s ≤ y
        let rows = vec![(vec![(2, 1), (0, 1)], 1), (vec![(2, 1), (0, -1), (1, 1)], 0), (vec![(2, 1), (1, -1)], 0)];
        let program = Program { variables: 3, rows, objective: vec![(2, 1)] };
        let (objective, denominator, _) = best(&program);
        assert_eq!(3 * objective, denominator);
    }
}
