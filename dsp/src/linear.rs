//! Small dense linear algebra in a fixed order of operations.
//!
//! The matrices here have at most some fifteen rows and their results reach files, so they are worked by hand: a library
//! that chooses its kernels by CPU would give other bits on another machine.

use num_complex::Complex64;
use std::ops::{AddAssign, DivAssign, Mul, MulAssign, SubAssign};

/// A number that a matrix can hold.
pub(crate) trait Scalar:
    Copy + Default + Mul<Output = Self> + AddAssign + SubAssign + MulAssign + DivAssign
{
    /// Size for choosing a pivot.
    fn size(self) -> f64;
}

impl Scalar for f64 {
    fn size(self) -> f64 {
        self.abs()
    }
}

impl Scalar for Complex64 {
    fn size(self) -> f64 {
        self.re.abs().max(self.im.abs())
    }
}

/// A dense matrix, row by row.
#[derive(Clone, Debug, PartialEq)]
pub(crate) struct Matrix<T> {
    rows: usize,
    columns: usize,
    cells: Vec<T>,
}

impl<T> std::ops::Index<(usize, usize)> for Matrix<T> {
    type Output = T;
    fn index(&self, (row, column): (usize, usize)) -> &T {
        &self.cells[row * self.columns + column]
    }
}

impl<T> std::ops::IndexMut<(usize, usize)> for Matrix<T> {
    fn index_mut(&mut self, (row, column): (usize, usize)) -> &mut T {
        &mut self.cells[row * self.columns + column]
    }
}

impl<T: Scalar> Matrix<T> {
    pub(crate) fn zeros(rows: usize, columns: usize) -> Self {
        Matrix { rows, columns, cells: vec![T::default(); rows * columns] }
    }

    pub(crate) fn rows(&self) -> usize {
        self.rows
    }

    pub(crate) fn columns(&self) -> usize {
        self.columns
    }

    pub(crate) fn row(&self, row: usize) -> &[T] {
        &self.cells[row * self.columns..(row + 1) * self.columns]
    }

    pub(crate) fn transposed(&self) -> Self {
        let mut out = Matrix::zeros(self.columns, self.rows);
        for row in 0..self.rows {
            for column in 0..self.columns {
                out[(column, row)] = self[(row, column)];
            }
        }
        out
    }

    pub(crate) fn times(&self, other: &Self) -> Self {
        assert_eq!(self.columns, other.rows, "matrix shapes");
        let mut out = Matrix::zeros(self.rows, other.columns);
        for row in 0..self.rows {
            for inner in 0..self.columns {
                let factor = self[(row, inner)];
                for column in 0..other.columns {
                    out[(row, column)] += factor * other[(inner, column)];
                }
            }
        }
        out
    }

    /// Solves `self · x = right` for every column of `right`, by elimination with partial pivoting; `None` where the
    /// matrix is singular.
    pub(crate) fn solve(mut self, mut right: Self) -> Option<Self> {
        assert!(self.rows == self.columns && self.rows == right.rows, "matrix shapes");
        let n = self.rows;
        for pivot in 0..n {
            let best = (pivot..n).max_by(|&a, &b| self[(a, pivot)].size().total_cmp(&self[(b, pivot)].size()))?;
            let size = self[(best, pivot)].size();
            if size == 0.0 || !size.is_finite() {
                return None;
            }
            self.swap_rows(pivot, best);
            right.swap_rows(pivot, best);
            for row in pivot + 1..n {
                let mut factor = self[(row, pivot)];
                factor /= self[(pivot, pivot)];
                if factor.size() == 0.0 {
                    continue;
                }
                self.subtract_row(row, pivot, factor);
                right.subtract_row(row, pivot, factor);
            }
        }
        for row in (0..n).rev() {
            for lower in row + 1..n {
                let factor = self[(row, lower)];
                right.subtract_row(row, lower, factor);
            }
            for column in 0..right.columns {
                let divisor = self[(row, row)];
                right[(row, column)] /= divisor;
            }
        }
        Some(right)
    }

    /// Solves for one right-hand side.
    pub(crate) fn solve_vector(self, right: &[T]) -> Option<Vec<T>> {
        let column = Matrix { rows: right.len(), columns: 1, cells: right.to_vec() };
        Some(self.solve(column)?.cells)
    }

    fn swap_rows(&mut self, a: usize, b: usize) {
        if a != b {
            for column in 0..self.columns {
                self.cells.swap(a * self.columns + column, b * self.columns + column);
            }
        }
    }

    fn subtract_row(&mut self, from: usize, row: usize, factor: T) {
        for column in 0..self.columns {
            let term = factor * self[(row, column)];
            self[(from, column)] -= term;
        }
    }
}

impl Matrix<f64> {
    pub(crate) fn identity(n: usize) -> Self {
        let mut out = Matrix::zeros(n, n);
        for k in 0..n {
            out[(k, k)] = 1.0;
        }
        out
    }

    pub(crate) fn times_vector(&self, vector: &[f64]) -> Vec<f64> {
        (0..self.rows).map(|row| self.row(row).iter().zip(vector).map(|(a, b)| a * b).sum()).collect()
    }

    /// Eigenvalues and orthonormal eigenvectors (as columns) of a symmetric matrix, by cyclic Jacobi rotations
    /// (Golub & Van Loan, *Matrix Computations*, section 8.5).
    pub(crate) fn symmetric_eigen(mut self) -> (Vec<f64>, Self) {
        let n = self.rows;
        let mut vectors = Matrix::identity(n);
        // Quadratic convergence: a matrix of this size is diagonal to the last bit after some eight sweeps.
        for _ in 0..30 {
            let mut rotated = false;
            for p in 0..n {
                for q in p + 1..n {
                    rotated |= self.rotate(&mut vectors, p, q);
                }
            }
            if !rotated {
                break;
            }
        }
        ((0..n).map(|k| self[(k, k)]).collect(), vectors)
    }

    /// One Jacobi rotation that clears cell (p, q); false where the cell is already negligible.
    fn rotate(&mut self, vectors: &mut Self, p: usize, q: usize) -> bool {
        let cell = self[(p, q)];
        let (at_p, at_q) = (self[(p, p)], self[(q, q)]);
        if cell.abs() <= 1e-18 || (at_p.abs() + cell.abs() == at_p.abs() && at_q.abs() + cell.abs() == at_q.abs()) {
            return false;
        }
        let theta = (at_q - at_p) / (2.0 * cell);
        let t = if theta.abs() > 1e150 {
            0.5 / theta
        } else {
            theta.signum() / (theta.abs() + (theta * theta + 1.0).sqrt())
        };
        let c = 1.0 / (t * t + 1.0).sqrt();
        let s = t * c;
        let n = self.rows;
        for k in 0..n {
            let (a, b) = (self[(k, p)], self[(k, q)]);
            self[(k, p)] = c * a - s * b;
            self[(k, q)] = s * a + c * b;
        }
        for k in 0..n {
            let (a, b) = (self[(p, k)], self[(q, k)]);
            self[(p, k)] = c * a - s * b;
            self[(q, k)] = s * a + c * b;
        }
        self[(p, q)] = 0.0;
        self[(q, p)] = 0.0;
        for k in 0..n {
            let (a, b) = (vectors[(k, p)], vectors[(k, q)]);
            vectors[(k, p)] = c * a - s * b;
            vectors[(k, q)] = s * a + c * b;
        }
        true
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn hilbert(n: usize) -> Matrix<f64> {
        let mut m = Matrix::zeros(n, n);
        for r in 0..n {
            for c in 0..n {
                m[(r, c)] = 1.0 / (r + c + 1) as f64;
            }
        }
        m
    }

    #[test]
    fn solves_the_hilbert_matrix_of_order_three() {
        // Inverse of the Hilbert matrix, order 3: Abramowitz & Stegun list whole numbers (9, -36, 30; …).
        let inverse = hilbert(3).solve(Matrix::identity(3)).unwrap();
        let known = [9.0, -36.0, 30.0, -36.0, 192.0, -180.0, 30.0, -180.0, 180.0];
        for (got, want) in inverse.cells.iter().zip(known) {
            assert!((got - want).abs() < 1e-10, "{got} {want}");
        }
    }

    #[test]
    fn a_singular_matrix_is_refused() {
        let mut m = Matrix::zeros(2, 2);
        m[(0, 0)] = 1.0;
        assert!(m.solve_vector(&[1.0, 1.0]).is_none());
    }

    #[test]
    fn eigenvectors_rebuild_the_matrix() {
        let m = hilbert(11);
        let (values, vectors) = m.clone().symmetric_eigen();
        let mut scaled = vectors.clone();
        for r in 0..11 {
            for c in 0..11 {
                scaled[(r, c)] *= values[c];
            }
        }
        let back = scaled.times(&vectors.transposed());
        for (got, want) in back.cells.iter().zip(&m.cells) {
            assert!((got - want).abs() < 1e-14);
        }
        // The trace of the Hilbert matrix of order 11 is the sum of the odd reciprocals to 1/21.
        let trace: f64 = (0..11).map(|k| 1.0 / (2 * k + 1) as f64).sum();
        assert!((values.iter().sum::<f64>() - trace).abs() < 1e-14);
    }
}
