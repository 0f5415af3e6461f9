//! Figures of many values, computed the slow way.

/// The greatest distance of the empirical distribution of `values` (as parts of the unit interval) from the uniform one.
pub fn kolmogorov(mut values: Vec<f64>) -> f64 {
    values.sort_by(f64::total_cmp);
    let n = values.len() as f64;
    let distance = |(i, x): (usize, &f64)| ((i + 1) as f64 / n - x).max(x - i as f64 / n);
    values.iter().enumerate().map(distance).fold(0.0, f64::max)
}

/// Spearman's rank correlation of pairs; equal values get their middle rank.
pub fn spearman(pairs: &[(u64, u64)]) -> f64 {
    let ranks = |mut values: Vec<(u64, usize)>| {
        values.sort_unstable();
        let mut ranks = vec![0.0; values.len()];
        let mut from = 0;
        while from < values.len() {
            let equal = values[from..].iter().take_while(|it| it.0 == values[from].0).count();
            let middle = from as f64 + (equal - 1) as f64 / 2.0;
            values[from..from + equal].iter().for_each(|it| ranks[it.1] = middle);
            from += equal;
        }
        ranks
    };
    let first = ranks(pairs.iter().enumerate().map(|(i, it)| (it.0, i)).collect());
    let second = ranks(pairs.iter().enumerate().map(|(i, it)| (it.1, i)).collect());
    let mean = (pairs.len() - 1) as f64 / 2.0;
    let dot = |a: &[f64], b: &[f64]| a.iter().zip(b).map(|(a, b)| (a - mean) * (b - mean)).sum::<f64>();
    dot(&first, &second) / (dot(&first, &first) * dot(&second, &second)).sqrt()
}
