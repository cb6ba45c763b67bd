//! Cubic splines at equal distances, kept as one polynomial a cell.

use crate::lanes::F64x4;

/// Cubic cells of width 1, cell k around k: c0 + t·(c1 + t·(c2 + t·c3)) with t from −½ to ½.
#[derive(Clone, Debug)]
pub(crate) struct Cells(pub Vec<F64x4>);

impl Cells {
    /// The clamped cubic spline through `values` at equal distances, with the given end slopes a cell (de Boor, *A
    /// Practical Guide to Splines*, chapter IV). The first cell lies between the first two values.
    ///
    /// # Panics
    /// If there are fewer than two values.
    pub fn spline(values: &[f64], end_slopes: (f64, f64)) -> Cells {
        let slopes = slopes(values, end_slopes);
        let cell = |k: usize| {
            let rise = values[k + 1] - values[k];
            let (d0, d1) = (slopes[k], slopes[k + 1]);
            // From the cell's left edge first, then moved to its middle.
            let (square, cube) = (3.0 * rise - 2.0 * d0 - d1, d0 + d1 - 2.0 * rise);
            F64x4([
                values[k] + 0.5 * (d0 + 0.5 * (square + 0.5 * cube)),
                d0 + square + 0.75 * cube,
                square + 1.5 * cube,
                cube,
            ])
        };
        Cells((0..values.len() - 1).map(cell).collect())
    }

    /// Adds a straight cell that goes on from `value`, its left edge, with `slope`: past its middle it has no end.
    pub fn straight_on(mut self, value: f64, slope: f64) -> Cells {
        self.0.push(F64x4([value + 0.5 * slope, slope, 0.0, 0.0]));
        self
    }

    /// Adds a cell of zeros before the first.
    pub fn preceded_by_zeros(mut self) -> Cells {
        self.0.insert(0, F64x4::default());
        self
    }
}

/// Slopes at the values of the C² cubic with clamped ends: a tridiagonal system.
fn slopes(values: &[f64], (first, last): (f64, f64)) -> Vec<f64> {
    let n = values.len();
    let (mut ratio, mut slopes) = (vec![0.0; n], vec![first; n]);
    for k in 1..n - 1 {
        let pivot = 4.0 - ratio[k - 1];
        ratio[k] = 1.0 / pivot;
        slopes[k] = (3.0 * (values[k + 1] - values[k - 1]) - slopes[k - 1]) / pivot;
    }
    slopes[n - 1] = last;
    for k in (1..n - 1).rev() {
        slopes[k] -= ratio[k] * slopes[k + 1];
    }
    slopes
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Value, slope and second derivative of a cell at t.
    fn at(cell: F64x4, t: f64) -> [f64; 3] {
        let [c0, c1, c2, c3] = cell.0;
        [c0 + t * (c1 + t * (c2 + t * c3)), c1 + t * (2.0 * c2 + t * 3.0 * c3), 2.0 * c2 + 6.0 * t * c3]
    }

    #[test]
    fn neighbours_share_value_slope_and_curvature() {
        let values: Vec<f64> = (0..40).map(|k| libm::sin(0.3 * k as f64)).collect();
        let cells = Cells::spline(&values, (0.3, 0.3 * libm::cos(0.3 * 39.0)));
        for pair in cells.0.windows(2) {
            let (left, right) = (at(pair[0], 0.5), at(pair[1], -0.5));
            for order in 0..3 {
                assert!((left[order] - right[order]).abs() < 1e-13, "derivative {order}: {left:?} {right:?}");
            }
        }
    }

    #[test]
    fn a_cubic_is_met_exactly() {
        let cubic = |x: f64| 2.0 - x + 0.5 * x * x - 0.25 * x * x * x;
        let slope = |x: f64| -1.0 + x - 0.75 * x * x;
        let values: Vec<f64> = (0..6).map(|k| cubic(k as f64)).collect();
        let cells = Cells::spline(&values, (slope(0.0), slope(5.0)));
        for (k, &cell) in cells.0.iter().enumerate() {
            for t in [-0.5, -0.2, 0.0, 0.37] {
                let x = k as f64 + 0.5 + t;
                assert!((at(cell, t)[0] - cubic(x)).abs() < 1e-12);
                assert!((at(cell, t)[1] - slope(x)).abs() < 1e-12);
            }
        }
    }
}
