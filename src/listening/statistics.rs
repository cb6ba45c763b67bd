//! What chance does: exact binomial figures, no approximations.

/// P(X = k) of n trials that each succeed with probability p.
fn mass(k: u32, n: u32, p: f64) -> f64 {
    if p <= 0.0 || p >= 1.0 {
        return if (p <= 0.0 && k == 0) || (p >= 1.0 && k == n) { 1.0 } else { 0.0 };
    }
    let (k, n) = (f64::from(k), f64::from(n));
    let ways = libm::lgamma(n + 1.0) - libm::lgamma(k + 1.0) - libm::lgamma(n - k + 1.0);
    libm::exp(ways + k * libm::log(p) + (n - k) * libm::log1p(-p))
}

/// P(X ≥ k) of n trials that each succeed with probability p.
pub fn at_least(k: u32, n: u32, p: f64) -> f64 {
    // The shorter side is summed, smallest terms first.
    let sum = if f64::from(k) > f64::from(n) * p {
        (k..=n).rev().map(|k| mass(k, n, p)).sum::<f64>()
    } else {
        1.0 - (0..k.min(n + 1)).map(|k| mass(k, n, p)).sum::<f64>()
    };
    sum.clamp(0.0, 1.0)
}

/// The fewest right answers of n that guessing reaches with probability alpha at most; none where not even n of n do.
pub fn needed(n: u32, alpha: f64) -> Option<u32> {
    let mut tail = 0.0;
    let mut fewest = None;
    for k in (0..=n).rev() {
        tail += mass(k, n, 0.5);
        if tail > alpha {
            break;
        }
        fewest = Some(k);
    }
    fewest
}

/// The interval in which the probability of a right answer lies with at least `confidence`, after Clopper & Pearson,
/// Biometrika 26 (1934).
pub fn clopper_pearson(k: u32, n: u32, confidence: f64) -> (f64, f64) {
    let tail = (1.0 - confidence) / 2.0;
    let low = if k == 0 { 0.0 } else { solve(|p| at_least(k, n, p) - tail) };
    let high = if k == n { 1.0 } else { solve(|p| tail - (1.0 - at_least(k + 1, n, p))) };
    (low, high)
}

/// The probability at which a rising function passes zero.
fn solve(rising: impl Fn(f64) -> f64) -> f64 {
    let (mut low, mut high) = (0.0, 1.0);
    // Halving 1 so often leaves nothing between neighbouring numbers.
    for _ in 0..60 {
        let middle = 0.5 * (low + high);
        if rising(middle) < 0.0 { low = middle } else { high = middle }
    }
    0.5 * (low + high)
}

/// The two-sided sign test: how often chance alone gives a preference at least as uneven, ties left out.
pub fn sign_test(one: u32, other: u32) -> f64 {
    (2.0 * at_least(one.max(other), one + other, 0.5)).min(1.0)
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Published tables of the method give these counts at 95 %.
    #[test]
    fn needed_counts_are_the_published_ones() {
        for (count, trials) in [(9, 10), (10, 12), (12, 16), (15, 20), (18, 25)] {
            assert_eq!(needed(trials, 0.05), Some(count), "{trials} trials");
        }
        assert_eq!(needed(4, 0.05), None);
        assert_eq!(needed(5, 0.05), Some(5));
        assert_eq!(needed(0, 0.05), None);
    }

    /// Published: 12 of 16 by guessing has probability 0.0384.
    #[test]
    fn twelve_of_sixteen_has_the_published_probability() {
        assert!((at_least(12, 16, 0.5) - 0.0384).abs() < 5e-5);
    }

    /// Whole-number arithmetic as a twin: binomial coefficients by Pascal's triangle.
    #[test]
    fn tails_are_exact() {
        for n in 1..=60_u32 {
            let mut row = vec![1_u128];
            for _ in 0..n {
                let next: Vec<u128> = row.windows(2).map(|pair| pair[0] + pair[1]).collect();
                row = [vec![1], next, vec![1]].concat();
            }
            for k in 0..=n {
                let exact = row[k as usize..].iter().sum::<u128>() as f64 / (1_u128 << n) as f64;
                let found = at_least(k, n, 0.5);
                assert!((found / exact - 1.0).abs() < 1e-12, "{k} of {n}: {found}, exactly {exact}");
            }
        }
    }

    /// scipy.stats, from tools/reference/binomial.py.
    #[test]
    fn figures_agree_with_scipy() {
        let table: serde_json::Value =
            serde_json::from_str(include_str!("../../tests/reference/binomial.json")).unwrap();
        let rows = |name: &str| table[name].as_array().unwrap().clone();
        let number = |row: &serde_json::Value, key: &str| row[key].as_f64().unwrap();
        let count = |row: &serde_json::Value, key: &str| row[key].as_u64().unwrap() as u32;
        let mut checked = 0;
        for row in rows("at_least") {
            let found = at_least(count(&row, "k"), count(&row, "n"), number(&row, "p"));
            assert!((found - number(&row, "probability")).abs() < 1e-10, "{row}: {found}");
            checked += 1;
        }
        for row in rows("clopper_pearson") {
            let (low, high) = clopper_pearson(count(&row, "k"), count(&row, "n"), number(&row, "confidence"));
            let error = (low - number(&row, "low")).abs().max((high - number(&row, "high")).abs());
            assert!(error < 1e-9, "{row}: {low} to {high}");
            checked += 1;
        }
        for row in rows("sign_test") {
            let found = sign_test(count(&row, "one"), count(&row, "other"));
            assert!((found - number(&row, "probability")).abs() < 1e-10, "{row}: {found}");
            checked += 1;
        }
        assert_eq!(checked, 58);
    }
}
