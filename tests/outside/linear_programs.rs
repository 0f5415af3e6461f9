//! The exact simplex method against a float solver that shares no code with it, on random programs.

use microlp::{ComparisonOp, OptimizationDirection, Problem, SolveOutcome};
use proptest::prelude::*;
use proptest::test_runner::{Config, RngSeed};
use stillgate::proof::simplex::{Program, Solved};

/// What the float solver says of a program: the greatest value, or why there is none.
#[derive(Debug, PartialEq)]
enum Float {
    Best(f64),
    Infeasible,
    Unbounded,
}

fn float(program: &Program) -> Option<Float> {
    let mut problem = Problem::new(OptimizationDirection::Maximize);
    let factor = |variable: usize| {
        program.objective.iter().filter(|term| term.0 == variable).map(|term| term.1 as f64).sum::<f64>()
    };
    let variables: Vec<_> =
        (0..program.variables).map(|it| problem.add_var(factor(it), (0.0, f64::INFINITY))).collect();
    for (terms, limit) in &program.rows {
        let terms: Vec<_> = terms.iter().map(|(variable, factor)| (variables[*variable], *factor as f64)).collect();
        problem.add_constraint(terms, ComparisonOp::Le, *limit as f64);
    }
    match problem.solve() {
        Ok(SolveOutcome::Solution(solution)) => Some(Float::Best(solution.objective())),
        Err(microlp::Error::Infeasible) => Some(Float::Infeasible),
        Err(microlp::Error::Unbounded) => Some(Float::Unbounded),
        Ok(SolveOutcome::Interrupted(_)) | Err(_) => None,
    }
}

/// Rows with up to as many terms as there are variables, each variable once.
fn programs() -> impl Strategy<Value = Program> {
    (1usize..6, 1usize..9).prop_flat_map(|(variables, rows)| {
        let terms = proptest::collection::btree_map(0..variables, -4i64..=4, 1..=variables);
        let row = (terms, -30i64..=40);
        let objective = proptest::collection::vec(-5i64..=5, variables);
        (proptest::collection::vec(row, rows), objective).prop_map(move |(rows, objective)| Program {
            variables,
            rows: rows.into_iter().map(|(terms, limit)| (terms.into_iter().collect(), limit)).collect(),
            objective: objective.into_iter().enumerate().collect(),
        })
    })
}

/// Feasible or not, bounded or not, and the optimum agree; and the exact answer proves itself: its point keeps every row,
/// and its prices bound the objective from above by the very same number.
#[test]
fn the_exact_method_agrees_with_floats() {
    let config = Config { cases: 3000, rng_seed: RngSeed::Fixed(11), failure_persistence: None, ..Config::default() };
    let mut kinds = [0u32; 3];
    let mut runner = proptest::test_runner::TestRunner::new(config);
    let counted = std::cell::RefCell::new(&mut kinds);
    runner
        .run(&programs(), |program| {
            let theirs = float(&program);
            match program.solve() {
                Solved::Best(best) => {
                    let value = |terms: &[(usize, i64)]| -> i128 {
                        terms.iter().map(|(variable, factor)| i128::from(*factor) * best.values[*variable]).sum()
                    };
                    for (terms, limit) in &program.rows {
                        prop_assert!(value(terms) <= i128::from(*limit) * best.denominator);
                    }
                    prop_assert_eq!(value(&program.objective), best.objective);
                    let rows = program.rows.iter().zip(&best.prices);
                    let bound: i128 = rows.clone().map(|((_, limit), price)| i128::from(*limit) * price).sum();
                    prop_assert_eq!(bound, best.objective);
                    for variable in 0..program.variables {
                        let of = |terms: &[(usize, i64)]| -> i128 {
                            terms.iter().filter(|it| it.0 == variable).map(|it| i128::from(it.1)).sum()
                        };
                        let dual: i128 = rows.clone().map(|((terms, _), price)| of(terms) * price).sum();
                        prop_assert!(dual >= of(&program.objective) * best.denominator);
                    }
                    prop_assert!(best.prices.iter().all(|price| *price >= 0));
                    let exact = best.objective as f64 / best.denominator as f64;
                    let near =
                        |it: &Float| matches!(it, Float::Best(it) if (it - exact).abs() <= 1e-6 * exact.abs().max(1.0));
                    prop_assert!(theirs.as_ref().is_none_or(near), "{exact} {theirs:?} {program:?}");
                    counted.borrow_mut()[0] += 1;
                }
                Solved::Infeasible => {
                    prop_assert!(theirs.as_ref().is_none_or(|it| *it == Float::Infeasible), "{theirs:?} {program:?}");
                    counted.borrow_mut()[1] += 1;
                }
                Solved::Unbounded => {
                    prop_assert!(theirs.as_ref().is_none_or(|it| *it == Float::Unbounded), "{theirs:?} {program:?}");
                    counted.borrow_mut()[2] += 1;
                }
                Solved::GaveUp => prop_assert!(false, "gave up on {program:?}"),
            }
            Ok(())
        })
        .unwrap();
    assert!(kinds.iter().all(|kind| *kind > 100), "{kinds:?}");
}
