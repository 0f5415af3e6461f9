//! Draws that belong together, and shares of draws.

use rand::{Rng, SeedableRng};
use rand_chacha::ChaCha8Rng;
use stillgate::control::Control;
use stillgate::delay::Marginal;
use stillgate::engine::Program;
use stillgate::findings::Asked;
use stillgate::instance::{Instance, Which};
use stillgate::scenario::Scenario;
use stillgate::sweep::{SweepReport, clopper_pearson, none_in, unseen_mass};
use stillgate::time::Span;
use stillgate::{reader, review};

use crate::support::spread::spearman;

/// R. G. Newcombe, "Two-sided confidence intervals for the single proportion", Statistics in Medicine 17 (1998) 857-872:
/// the four examples of that paper [PAGE https://studylib.net/doc/7960426/two-sided-confidence-intervals-for-the-single-proportion;
/// rows from memory and recomputed, identical to 4 places]; 23/60 an example input of [PAGE
/// http://vassarstats.net/prop1.html], the last two [computed].
#[test]
fn clopper_pearson_against_published_figures() {
    for (count, of, low, high) in [
        (81, 263, 0.2527, 0.3676),
        (15, 148, 0.0578, 0.1617),
        (0, 20, 0.0, 0.1684),
        (1, 29, 0.0009, 0.1776),
        (23, 60, 0.2607, 0.5179),
        (0, 1000, 0.0, 0.0037),
        (3, 1000, 0.0006, 0.0087),
    ] {
        let (l, h) = clopper_pearson(count, of, 0.95).unwrap();
        assert!((l - low).abs() < 5.1e-5 && (h - high).abs() < 5.1e-5, "{count}/{of}: {l} {h}");
    }
    assert_eq!(clopper_pearson(20, 20, 0.95).map(|it| it.1), Some(1.0));
    assert_eq!(clopper_pearson(0, 0, 0.95), None);
}

/// With no failure in n draws the two-sided upper bound at 95 % is 1 - 0.025^(1/n) (common practice, no source): a closed
/// form for any n, also for millions of draws.
#[test]
fn no_failure_in_n_draws_has_a_closed_form() {
    for n in [1u64, 10, 100, 10_000, 1_000_000, 1_000_000_000] {
        let high = clopper_pearson(0, n, 0.95).unwrap().1;
        let exact = -f64::exp_m1(0.025f64.ln() / n as f64);
        assert!((high / exact - 1.0).abs() < 1e-6, "{n}: {high} {exact}");
        let low = clopper_pearson(n, n, 0.95).unwrap().0;
        assert!((low - (1.0 - exact)).abs() < 1e-6, "{n}: {low}");
    }
}

/// A scenario of two delays of 8 to 12 and 9 to 15 ns behind one input, and how often the second is faster.
fn race(more: &str) -> (Scenario, SweepReport) {
    let text = format!(
        "[inputs]\ns = 0\n[gates]\na = {{ buf = [\"s\"], delay = [8, 12] }}\nb = {{ buf = [\"s\"], delay = [9, 15] }}\n\
         [[steps]]\nset = {{ s = 1 }}\n[[rules.never]]\nstate = {{ a = 0, b = 1 }}\n{more}"
    );
    let scenario = reader::read(&text, "race.toml").unwrap_or_else(|faults| panic!("{faults}")).scenario;
    let program = Program::new(&scenario, &Control::default()).unwrap();
    let asked = Asked::of(&scenario);
    let report = review::sweep(&scenario, &program, &asked, 1, &Control::default()).unwrap();
    (scenario, report)
}

/// A ~ U(8, 12), B ~ U(9, 15): P(A > B) = 4.5/24 = 0.1875 \[computed by hand: the triangle of side 3 in a box of 4 by 6\].
/// With five seeds the 95 % interval may miss once.
#[test]
fn a_failure_of_known_probability_lies_in_its_interval() {
    let mut hits = 0;
    for seed in 1..=5 {
        let (_, report) = race(&format!("[sweep]\nseed = {seed}\nsamples = 4000"));
        let finding = report.findings.iter().find(|it| it.breaks_rule).expect("the race is lost at times");
        let (low, high) = finding.interval.expect("independent draws");
        assert!(high - low < 0.026, "{low} {high}");
        hits += u32::from(low <= 0.1875 && 0.1875 <= high);
    }
    assert!(hits >= 4, "{hits} of 5");
    // in step, 8 + 4u is never slower than 9 + 6u
    let (_, report) = race("[[groups]]\ngates = [\"a\", \"b\"]\ntracking = 1\n[sweep]\nsamples = 4000");
    assert!(report.findings.iter().all(|it| !it.breaks_rule), "{:?}", report.findings);
}

/// Spearman's rank correlation under a Gaussian copula of correlation ρ is (6/π)·asin(ρ/2) \[PAGE
/// https://forum.wilmott.com/search.php?author_id=58780&sr=posts states the inverse, 2·sin(π·ρ/6)\]; figures \[computed\].
/// Kruskal 1958, from memory. The estimate spreads by less than 1/√n; within five of that.
#[test]
fn tracking_gives_the_published_rank_correlation() {
    let samples = 20_000u64;
    for (rho, published) in [(0.3, 0.287_564), (0.5, 0.482_584), (0.7, 0.682_911), (0.9, 0.891_456)] {
        let formula = 6.0 / std::f64::consts::PI * f64::asin(rho / 2.0);
        assert!((formula - published).abs() < 1e-6, "the formula itself at {rho}");
        for draw in ["uniform", "triangular", "normal"] {
            let text = format!(
                "[inputs]\ns = 0\n[gates]\na = {{ buf = [\"s\"], delay = [8, 11, 12] }}\n\
                 b = {{ buf = [\"s\"], rise = [9, 15], fall = [1, 2] }}\n\
                 [[groups]]\ngates = [\"a\", \"b\"]\ntracking = {rho}\n[sweep]\ndraw = \"{draw}\""
            );
            let scenario = reader::read(&text, "two.toml").unwrap_or_else(|faults| panic!("{faults}")).scenario;
            let draws = (0..samples).map(|sample| Instance::of(&scenario, &Which::Sample(sample)).delays.gate);
            let draws: Vec<Vec<[Span; 2]>> = draws.collect();
            // rise of both gates; rise and fall of one gate
            for (first, second) in [((0, 1), (1, 1)), ((1, 0), (1, 1))] {
                let of = |draw: &Vec<[Span; 2]>, it: (usize, usize)| draw[it.0][it.1].fs();
                let pairs: Vec<(u64, u64)> = draws.iter().map(|draw| (of(draw, first), of(draw, second))).collect();
                let found = spearman(&pairs);
                assert!((found - published).abs() < 5.0 / (samples as f64).sqrt(), "{draw}, {rho}: {found}");
            }
        }
    }
}

/// Two normal scores of correlation ρ are both above their median with probability 1/4 + asin(ρ)/(2π): W. F. Sheppard,
/// Phil. Trans. A 192 (1899) 101-167 \[from memory\]; 1/3 at ρ = 1/2. So corners that track are both max, or both min.
#[test]
fn tracking_corners_meet_as_sheppard_says() {
    for (rho, both) in [(0.0, 0.25), (0.5, 1.0 / 3.0), (0.8, 0.397_583_617)] {
        let (mut scenario, _) =
            race(&format!("[[groups]]\ngates = [\"a\", \"b\"]\ntracking = {rho}\n[sweep]\nsamples = 1"));
        scenario.plan.draw = Marginal::Corners;
        let samples = 20_000u64;
        let high = |sample: &u64| {
            let delays = Instance::of(&scenario, &Which::Sample(*sample)).delays.gate;
            delays.iter().zip(&scenario.delays.gate).all(|(drawn, range)| drawn[1] == range[1].max)
        };
        let share = (0..samples).filter(high).count() as f64 / samples as f64;
        assert!((share - both).abs() < 5.0 * (both * (1.0 - both) / samples as f64).sqrt(), "{rho}: {share} {both}");
    }
}

/// No failure in n independent draws: the exact one-sided 95 % bound 1 − 0.05^(1/n), about 3/n (B. D. Jovanovic, P. S. Levy
/// 1997 \[PAGE https://www.rti.org/publication/look-rule-three\]; examples 0/300 → 1 in 100, 0/1500 → 1 in 500 \[PAGE
/// http://w.owiki.org/wiki/Rule_of_three_%28statistics%29\]); rows and the numbers of runs needed \[computed\].
#[test]
fn none_in_n_draws_against_the_rule_of_three() {
    for (n, bound) in [(30, 0.095_034), (100, 0.029_513), (300, 0.009_936), (1000, 0.002_991), (1500, 0.001_995)] {
        let exact = none_in(n, 0.95).unwrap();
        assert!((exact - bound).abs() < 6e-7, "{n}: {exact}");
        assert!(exact < 3.0 / n as f64 && exact > 2.85 / n as f64, "{n}: rule of three");
    }
    for (p, runs) in [(0.05, 59), (0.01, 299), (0.001, 2995)] {
        assert!(none_in(runs, 0.95).unwrap() <= p && none_in(runs - 1, 0.95).unwrap() > p, "{runs} runs for {p}");
    }
    assert_eq!(none_in(0, 0.95), None);
    // the sweep says it of draws that are independent, and of no others
    let never = "[[groups]]\ngates = [\"a\", \"b\"]\ntracking = 1\n[sweep]\nsamples = 300\n";
    let (_, report) = race(never);
    let at_most = report.at_most.expect("nothing broken");
    assert!((at_most.share - 0.009_936).abs() < 6e-7 && at_most.of == 300 && !at_most.boards, "{at_most:?}");
    let (_, report) = race(&format!("{never}tries = 10"));
    let at_most = report.at_most.expect("nothing broken");
    assert!((at_most.share - 0.095_034).abs() < 6e-7 && at_most.of == 30 && at_most.boards, "{at_most:?}");
    for draw in ["corners", "hypercube"] {
        let (_, report) = race(&format!("{never}draw = \"{draw}\""));
        assert!(report.findings.iter().all(|it| !it.breaks_rule));
        assert!(report.at_most.is_none() && report.unseen.is_none(), "{draw}");
        assert!(report.rules.iter().all(|rule| rule.at_most.is_none()), "{draw}");
    }
}

/// Ten carp, three perch, two whitefish, one trout, one salmon, one eel: the next fish is of a new kind with probability
/// 3/18 (Good 1953; the example \[PAGE
/// https://kiwix.lukehooper.xyz/content/datascience.stackexchange.com_en_all_2024-11/questions/2502/good-turing-smoothing-intuition\]).
#[test]
fn good_and_turing_go_fishing() {
    let (estimate, upper) = unseen_mass(3, 18, 0.95).unwrap();
    assert!((estimate - 0.1667).abs() < 5e-5 && upper == 1.0);
    // (2·√2 + √3)·√(ln(60)/10,000) = 4.560478 · 0.0202345 = 0.0922789 [computed]
    let (estimate, upper) = unseen_mass(0, 10_000, 0.95).unwrap();
    assert!(estimate == 0.0 && (upper - 0.092_278_9).abs() < 1e-6, "{upper}");
    assert_eq!((unseen_mass(0, 0, 0.95), unseen_mass(2, 1, 0.95)), (None, None));
}

/// Kinds of known probability 1/2, 1/4, 1/8, …, and a thousand alike: the mean of the estimates is that of the unseen
/// probability, and the bound is broken in at most 5 of 100 samples (it is wide: in none).
#[test]
fn the_unseen_is_estimated_and_bounded() {
    let mut rng = ChaCha8Rng::seed_from_u64(11);
    let halves: Vec<f64> = (1..=50).map(|i| 0.5f64.powi(i)).collect();
    for kinds in [halves, vec![0.001; 1000]] {
        let (mut estimates, mut truths) = (0.0, 0.0);
        for _ in 0..200 {
            let mut counts = vec![0u64; kinds.len()];
            let n = 500;
            for _ in 0..n {
                let mut left = (rng.next_u64() >> 11) as f64 / (1u64 << 53) as f64;
                let kind = kinds.iter().position(|p| {
                    left -= p;
                    left < 0.0
                });
                counts[kind.unwrap_or(0)] += 1;
            }
            let truth: f64 = kinds.iter().zip(&counts).filter(|it| *it.1 == 0).map(|it| it.0).sum();
            let once = counts.iter().filter(|count| **count == 1).count() as u64;
            let (estimate, upper) = unseen_mass(once, n, 0.95).unwrap();
            assert!(truth <= upper, "{truth} {upper}");
            (estimates, truths) = (estimates + estimate / 200.0, truths + truth / 200.0);
        }
        assert!((estimates - truths).abs() < 0.006, "{estimates} {truths}");
    }
}

/// The mean of U1 + U2 over 100 draws has a standard deviation of 0.0408 with independent draws, and of 0.000408 in a Latin
/// hypercube \[computed\]: additive figures gain most (McKay, Beckman, Conover 1979).
#[test]
fn a_hypercube_tells_a_sum_a_hundred_times_as_exactly() {
    let text = "[inputs]\ns = 0\n[gates]\na = { buf = [\"s\"], delay = [1, 2] }\nb = { buf = [\"s\"], delay = [1, 2] }\n\
        [sweep]\nsamples = 100";
    let mut scenario = reader::read(text, "sum.toml").unwrap_or_else(|faults| panic!("{faults}")).scenario;
    for (draw, published) in [(Marginal::Uniform, 0.0408), (Marginal::Hypercube, 0.000_408)] {
        scenario.plan.draw = draw;
        let seeds = 300;
        let means = (0..seeds).map(|seed| {
            scenario.plan.seed = seed;
            let delays = |sample| Instance::of(&scenario, &Which::Sample(sample)).delays.gate;
            let sum = |sample| delays(sample).iter().map(|edges| edges[1].fs() as f64 / 1e6 - 1.0).sum::<f64>();
            (0..100).map(sum).sum::<f64>() / 100.0
        });
        let means: Vec<f64> = means.collect();
        let mean = means.iter().sum::<f64>() / seeds as f64;
        let spread = (means.iter().map(|it| (it - mean).powi(2)).sum::<f64>() / (seeds - 1) as f64).sqrt();
        assert!((mean - 1.0).abs() < 5.0 * published / (seeds as f64).sqrt(), "{draw:?}: {mean}");
        // a standard deviation of 300 values is itself known to about 4 %
        assert!((spread / published - 1.0).abs() < 0.2, "{draw:?}: {spread}");
    }
}
