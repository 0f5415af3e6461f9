//! Shares of draws.

use stillgate::sweep::clopper_pearson;

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
