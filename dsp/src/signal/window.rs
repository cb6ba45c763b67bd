//! The Kaiser window, computed with `libm` in a fixed order so that every CPU gets the same coefficients.
//!
//! Kaiser, "Nonrecursive digital filter design using the I0-sinh window function", ISCAS 1974.

/// The window's shape parameter for a wanted rejection in dB (above 50 dB).
pub(super) fn kaiser_beta(rejection_db: f64) -> f64 {
    0.1102 * (rejection_db - 8.7)
}

/// The window at `position`, where −1 and 1 are its ends and 0 its middle, which is 1.
pub(super) fn kaiser(beta: f64, position: f64) -> f64 {
    let inside = (1.0 - position * position).max(0.0);
    bessel_i0(beta * libm::sqrt(inside)) / bessel_i0(beta)
}

/// The modified Bessel function of the first kind and order zero, by its power series.
fn bessel_i0(x: f64) -> f64 {
    let (mut sum, mut term) = (1.0, 1.0);
    for k in 1..500 {
        let ratio = x / (2.0 * f64::from(k));
        term *= ratio * ratio;
        sum += term;
        if term < 1e-18 * sum {
            break;
        }
    }
    sum
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Abramowitz & Stegun, Handbook of Mathematical Functions, table 9.8 (from memory): e^−x·I0(x).
    #[test]
    fn bessel_matches_the_published_table() {
        for (x, scaled) in [(1.0, 0.465_759_607_7), (5.0, 0.183_540_812_6), (10.0, 0.127_833_337_2)] {
            assert!((bessel_i0(x) * libm::exp(-x) - scaled).abs() < 1e-9, "I0({x})");
        }
    }

    #[test]
    fn window_is_one_in_the_middle_and_even() {
        let beta = kaiser_beta(140.0);
        assert_eq!(kaiser(beta, 0.0), 1.0);
        assert_eq!(kaiser(beta, 0.3), kaiser(beta, -0.3));
        assert!(kaiser(beta, 1.0) < 1e-5);
    }
}
