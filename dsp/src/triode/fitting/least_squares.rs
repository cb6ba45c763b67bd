//! Levenberg–Marquardt within bounds, for a handful of parameters.
//!
//! Written here rather than taken from a crate because the data files must come out the same on every machine: nothing
//! but the basic operations, in a fixed order.

use crate::linear::Matrix;

/// Where a minimum was found.
#[derive(Clone, Debug)]
pub(super) struct Minimum {
    /// The parameters.
    pub at: Vec<f64>,
    /// Half the sum of squared residuals.
    pub cost: f64,
}

/// Bounds of one parameter.
#[derive(Clone, Copy, Debug)]
pub(super) struct Bounds {
    pub low: f64,
    pub high: f64,
}

/// Step of the forward differences: near the root of the rounding unit, for parameters of order one.
const DIFFERENCE: f64 = 1e-7;

/// Relative fall of the cost below which an iteration counts as the last.
const CONVERGED: f64 = 1e-9;

/// Minimises half the sum of squares of what `residuals` writes, from `start`, for at most `iterations` steps.
pub(super) fn minimise(
    residuals: impl Fn(&[f64], &mut Vec<f64>),
    start: &[f64],
    bounds: &[Bounds],
    iterations: usize,
) -> Minimum {
    let mut at: Vec<f64> = start.iter().zip(bounds).map(|(x, b)| x.clamp(b.low, b.high)).collect();
    let (mut here, mut there) = (Vec::new(), Vec::new());
    residuals(&at, &mut here);
    let mut cost = half_square(&here);
    let mut damping = 1e-3;
    for _ in 0..iterations {
        let (matrix, gradient) = normal_equations(&residuals, &mut at, bounds, &here, &mut there);
        let before = cost;
        // Raise the damping until a step helps; ten times tenfold is the end of the road.
        for _ in 0..10 {
            let step = damped_step(&matrix, &gradient, &at, bounds, damping);
            let trial: Vec<f64> =
                at.iter().zip(&step).zip(bounds).map(|((x, s), b)| (x + s).clamp(b.low, b.high)).collect();
            residuals(&trial, &mut there);
            let trial_cost = half_square(&there);
            if trial_cost < cost {
                (at, cost) = (trial, trial_cost);
                std::mem::swap(&mut here, &mut there);
                damping = (damping * 0.2).max(1e-12);
                break;
            }
            damping *= 10.0;
        }
        if before - cost <= CONVERGED * before {
            break;
        }
    }
    Minimum { at, cost }
}

fn half_square(residuals: &[f64]) -> f64 {
    let sum = 0.5 * residuals.iter().map(|r| r * r).sum::<f64>();
    if sum.is_finite() { sum } else { f64::INFINITY }
}

/// JᵀJ and Jᵀr by forward differences (backward at an upper bound).
fn normal_equations(
    residuals: &impl Fn(&[f64], &mut Vec<f64>),
    at: &mut [f64],
    bounds: &[Bounds],
    here: &[f64],
    scratch: &mut Vec<f64>,
) -> (Matrix<f64>, Vec<f64>) {
    let columns: Vec<Vec<f64>> = (0..at.len())
        .map(|j| {
            let kept = at[j];
            let step = if kept + DIFFERENCE > bounds[j].high { -DIFFERENCE } else { DIFFERENCE };
            at[j] = kept + step;
            residuals(at, scratch);
            at[j] = kept;
            scratch.iter().zip(here).map(|(a, b)| (a - b) / step).collect()
        })
        .collect();
    let dot = |a: &[f64], b: &[f64]| a.iter().zip(b).map(|(x, y)| x * y).sum::<f64>();
    let mut matrix = Matrix::zeros(at.len(), at.len());
    for (i, a) in columns.iter().enumerate() {
        for (j, b) in columns.iter().enumerate() {
            matrix[(i, j)] = dot(a, b);
        }
    }
    (matrix, columns.iter().map(|a| dot(a, here)).collect())
}

/// The step that solves (JᵀJ + damping·diagonal)·step = −gradient over the parameters that may move.
fn damped_step(matrix: &Matrix<f64>, gradient: &[f64], at: &[f64], bounds: &[Bounds], damping: f64) -> Vec<f64> {
    let outward = |&j: &usize| {
        if gradient[j] > 0.0 { at[j] <= bounds[j].low } else { at[j] >= bounds[j].high }
    };
    let free: Vec<usize> = (0..at.len()).filter(|j| !outward(j)).collect();
    let mut system = Matrix::zeros(free.len(), free.len());
    for (row, &i) in free.iter().enumerate() {
        for (column, &j) in free.iter().enumerate() {
            system[(row, column)] = matrix[(i, j)];
        }
        // A parameter that no residual feels still gets a pivot.
        system[(row, row)] += damping * matrix[(i, i)].max(1e-9);
    }
    let right: Vec<f64> = free.iter().map(|&j| -gradient[j]).collect();
    let mut step = vec![0.0; at.len()];
    for (&j, value) in free.iter().zip(system.solve_vector(&right).unwrap_or_default()) {
        step[j] = value;
    }
    step
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Rosenbrock's valley as two residuals; its minimum, 0 at (1, 1), is textbook (Rosenbrock 1960).
    fn rosenbrock(x: &[f64], out: &mut Vec<f64>) {
        out.clear();
        out.extend([10.0 * (x[1] - x[0] * x[0]), 1.0 - x[0]]);
    }

    const WIDE: Bounds = Bounds { low: -5.0, high: 5.0 };

    #[test]
    fn finds_the_end_of_rosenbrocks_valley() {
        let found = minimise(rosenbrock, &[-1.2, 1.0], &[WIDE, WIDE], 200);
        assert!((found.at[0] - 1.0).abs() < 1e-6 && (found.at[1] - 1.0).abs() < 1e-6, "{found:?}");
    }

    #[test]
    fn stays_within_bounds_and_finds_the_minimum_on_the_edge() {
        let edge = Bounds { low: -5.0, high: 0.5 };
        let found = minimise(rosenbrock, &[-1.2, 1.0], &[edge, WIDE], 200);
        // With x at most 0.5 the best is x = 0.5, y = 0.25, where half the sum of squares is 0.125.
        assert!((found.at[0] - 0.5).abs() < 1e-9 && (found.at[1] - 0.25).abs() < 1e-6, "{found:?}");
        assert!((found.cost - 0.125).abs() < 1e-9);
    }
}
