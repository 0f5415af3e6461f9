//! Where a run settles or oscillates is always among what may follow without delays: the views contain each other.

use stillgate::control::Control;
use stillgate::engine::{End, Program};
use stillgate::review::{self, ReviewError};

use crate::support::random_worlds::{Filters, Kind, Lengths, PLAIN, Start, cases};

/// Kinds of circuits for which the multiple-winner method is valid, then kinds with a ternary bound only.
fn kinds() -> [Kind; 12] {
    let short = Kind { delays: Lengths::Short, ..PLAIN };
    let hazards = Kind { hazards: true, gates: (0, 4), ..short };
    [
        PLAIN,
        hazards,
        Kind { rings: true, gates: (1, 4), ..PLAIN },
        Kind { clocks: true, ..PLAIN },
        Kind { begin: Start::Random, ..short },
        Kind { wires: 0.4, ..hazards },
        Kind { filters: Filters::Mixed, ..hazards },
        Kind { wires: 0.3, filters: Filters::Transport, rings: true, ..PLAIN },
        Kind { filters: Filters::Reject, ..hazards },
        Kind { filters: Filters::Involution, ..hazards },
        Kind { wires: 0.2, filters: Filters::All, ..short },
        Kind { hands: 0.3, ..short },
    ]
}

#[test]
fn sweeps_settle_only_where_the_delay_free_view_leads() {
    let (mut settled, mut oscillating, mut races) = (0, 0, 0);
    for kind in kinds() {
        for case in cases(250, kind) {
            let mut scenario = case.scenario;
            for delay in std::sync::Arc::make_mut(&mut scenario.delays).gate.iter_mut().flatten() {
                delay.max = delay.max + delay.max + delay.max;
            }
            scenario.plan.samples = 40;
            let program = Program::with_rest(&scenario, &case.rest);
            let control = Control::default();
            // runs are held against proofs in `bounded_simulated`
            match review::review_proving(&scenario, &program, 0, 1, &control) {
                Err(ReviewError::Contradiction(what)) => panic!("{}: {what}", case.name),
                Err(ReviewError::Cancelled) => unreachable!("nobody cancels"),
                Ok(review) => {
                    let windows = || review.sweep.windows.iter();
                    settled += windows().map(|window| window.settled).sum::<u64>();
                    races += windows().filter(|window| window.outcomes.len() > 1).count();
                    let runs = review.typical.iter().flat_map(|run| &run.trace.windows);
                    oscillating += runs.filter(|window| matches!(window.end, End::Oscillating { .. })).count();
                }
            }
        }
    }
    // a comparison that meets nothing proves nothing
    assert!(settled > 50_000 && oscillating > 50 && races > 300, "{settled} {oscillating} {races}");
}
