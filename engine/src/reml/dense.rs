//! Small dense matrices: products, and symmetric positive ones by Cholesky's factor.

use std::ops::{Index, IndexMut};

/// Rows by columns, row after row.
#[derive(Debug, Clone, Default, PartialEq)]
pub(super) struct Matrix {
    rows: usize,
    columns: usize,
    entries: Vec<f64>,
}

/// Lower triangle `L` with `L L' =` the matrix.
#[derive(Debug, Clone)]
pub(super) struct Cholesky {
    factor: Matrix,
}

impl Index<(usize, usize)> for Matrix {
    type Output = f64;

    fn index(&self, (row, column): (usize, usize)) -> &f64 {
        &self.entries[row * self.columns + column]
    }
}

impl IndexMut<(usize, usize)> for Matrix {
    fn index_mut(&mut self, (row, column): (usize, usize)) -> &mut f64 {
        &mut self.entries[row * self.columns + column]
    }
}

impl Matrix {
    pub(super) fn zero(rows: usize, columns: usize) -> Matrix {
        Matrix {
            rows,
            columns,
            entries: vec![0.0; rows * columns],
        }
    }

    pub(super) fn from_fn(
        rows: usize,
        columns: usize,
        entry: impl Fn(usize, usize) -> f64,
    ) -> Matrix {
        let mut matrix = Matrix::zero(rows, columns);
        for row in 0..rows {
            for column in 0..columns {
                matrix[(row, column)] = entry(row, column);
            }
        }
        matrix
    }

    pub(super) fn rows(&self) -> usize {
        self.rows
    }

    pub(super) fn row(&self, row: usize) -> &[f64] {
        &self.entries[row * self.columns..(row + 1) * self.columns]
    }

    /// `self + weight × other`.
    pub(super) fn add(&mut self, weight: f64, other: &Matrix) {
        add(&mut self.entries, weight, &other.entries);
    }

    pub(super) fn clear(&mut self) {
        self.entries.fill(0.0);
    }

    /// `self × other`.
    pub(super) fn times(&self, other: &Matrix) -> Matrix {
        let mut product = Matrix::zero(self.rows, other.columns);
        self.times_into(other, &mut product);
        product
    }

    /// `self × other`, into a matrix of that shape.
    pub(super) fn times_into(&self, other: &Matrix, product: &mut Matrix) {
        product.clear();
        let rows = self.entries.chunks_exact(self.columns.max(1));
        let out = product.entries.chunks_exact_mut(other.columns.max(1));
        for (row, out) in rows.zip(out) {
            for (&weight, from) in row
                .iter()
                .zip(other.entries.chunks_exact(other.columns.max(1)))
            {
                add(out, weight, from);
            }
        }
    }

    /// `self × other'`, into a matrix of that shape.
    pub(super) fn times_transposed_into(&self, other: &Matrix, product: &mut Matrix) {
        let rows = self.entries.chunks_exact(self.columns.max(1));
        let out = product.entries.chunks_exact_mut(other.rows.max(1));
        for (row, out) in rows.zip(out) {
            for (out, of_other) in out
                .iter_mut()
                .zip(other.entries.chunks_exact(other.columns.max(1)))
            {
                *out = dot(row, of_other);
            }
        }
    }

    /// Adds `weight × left' × right`.
    pub(super) fn add_across(&mut self, weight: f64, left: &Matrix, right: &Matrix) {
        let lefts = left.entries.chunks_exact(left.columns.max(1));
        let rights = right.entries.chunks_exact(right.columns.max(1));
        for (left, right) in lefts.zip(rights) {
            let columns = right.len().max(1);
            for (&entry, out) in left.iter().zip(self.entries.chunks_exact_mut(columns)) {
                add(out, weight * entry, right);
            }
        }
    }

    /// Trace of `self × other'`: the sum of the products of entries.
    pub(super) fn overlap(&self, other: &Matrix) -> f64 {
        dot(&self.entries, &other.entries)
    }

    pub(super) fn transposed(&self) -> Matrix {
        Matrix::from_fn(self.columns, self.rows, |row, column| self[(column, row)])
    }

    /// Trace of `self × other`.
    pub(super) fn trace_with(&self, other: &Matrix) -> f64 {
        let mut sum = 0.0;
        for row in 0..self.rows {
            for column in 0..self.columns {
                sum += self[(row, column)] * other[(column, row)];
            }
        }
        sum
    }

    /// `self × vector`.
    pub(super) fn apply(&self, vector: &[f64]) -> Vec<f64> {
        let mut product = Vec::with_capacity(self.rows);
        self.apply_into(vector, &mut product);
        product
    }

    /// `self × vector`, in the place of what `product` held.
    pub(super) fn apply_into(&self, vector: &[f64], product: &mut Vec<f64>) {
        product.clear();
        let rows = self.entries.chunks_exact(self.columns.max(1));
        product.extend(rows.map(|row| dot(row, vector)));
    }

    /// Adds `self' × vector`.
    pub(super) fn add_applied(&self, vector: &[f64], sum: &mut [f64]) {
        let rows = self.entries.chunks_exact(self.columns.max(1));
        for (&weight, row) in vector.iter().zip(rows) {
            add(sum, weight, row);
        }
    }

    /// The rows and columns with the given numbers.
    pub(super) fn part(&self, kept: &[usize]) -> Matrix {
        Matrix::from_fn(kept.len(), kept.len(), |row, column| {
            self[(kept[row], kept[column])]
        })
    }

    /// The factor of a symmetric matrix; `None` when it is not positive.
    pub(super) fn cholesky(&self) -> Option<Cholesky> {
        let n = self.rows;
        let mut factor = Matrix::zero(n, n);
        for row in 0..n {
            let (above, from) = factor.entries.split_at_mut(row * n);
            let own = &mut from[..n];
            for column in 0..row {
                let other = &above[column * n..column * n + column + 1];
                own[column] =
                    (self[(row, column)] - dot(&own[..column], &other[..column])) / other[column];
            }
            let rest = self[(row, row)] - dot(&own[..row], &own[..row]);
            if !(rest > 0.0 && rest.is_finite()) {
                return None;
            }
            own[row] = rest.sqrt();
        }
        Some(Cholesky { factor })
    }
}

impl Cholesky {
    pub(super) fn log_determinant(&self) -> f64 {
        let n = self.factor.rows;
        2.0 * (0..n).map(|i| self.factor[(i, i)].ln()).sum::<f64>()
    }

    /// The last entry on the diagonal.
    pub(super) fn last(&self) -> f64 {
        self.factor.entries.last().copied().unwrap_or(0.0)
    }

    /// The vector that the matrix takes to `right`.
    pub(super) fn solve(&self, right: &[f64]) -> Vec<f64> {
        let (factor, n) = (&self.factor, self.factor.rows);
        let mut x = right.to_vec();
        for i in 0..n {
            let known = dot(&factor.row(i)[..i], &x[..i]);
            x[i] = (x[i] - known) / factor[(i, i)];
        }
        for i in (0..n).rev() {
            x[i] /= factor[(i, i)];
            let (earlier, from) = x.split_at_mut(i);
            for (earlier, entry) in earlier.iter_mut().zip(factor.row(i)) {
                *earlier -= entry * from[0];
            }
        }
        x
    }

    pub(super) fn inverse(&self) -> Matrix {
        let n = self.factor.rows;
        let mut root = Matrix::zero(n, n);
        for column in 0..n {
            root[(column, column)] = 1.0 / self.factor[(column, column)];
            for row in column + 1..n {
                let known: f64 = (column..row)
                    .map(|k| self.factor[(row, k)] * root[(k, column)])
                    .sum();
                root[(row, column)] = -known / self.factor[(row, row)];
            }
        }
        let mut inverse = Matrix::zero(n, n);
        inverse.add_across(1.0, &root, &root);
        inverse
    }
}

fn add(sum: &mut [f64], weight: f64, row: &[f64]) {
    if weight != 0.0 {
        for (sum, entry) in sum.iter_mut().zip(row) {
            *sum += weight * entry;
        }
    }
}

pub(super) fn dot(a: &[f64], b: &[f64]) -> f64 {
    a.iter().zip(b).map(|(a, b)| a * b).sum()
}

#[cfg(test)]
mod tests {
    use super::*;

    /// The inverse of the 3 × 3 Hilbert matrix has whole entries (Choi 1983), its determinant is 1/2160.
    #[test]
    fn hilbert_matrix_of_three() {
        let hilbert = Matrix::from_fn(3, 3, |i, j| 1.0 / (i + j + 1) as f64);
        let factor = hilbert.cholesky().unwrap();
        let inverse = factor.inverse();
        let expected = [
            [9.0, -36.0, 30.0],
            [-36.0, 192.0, -180.0],
            [30.0, -180.0, 180.0],
        ];
        for (i, row) in expected.iter().enumerate() {
            for (j, entry) in row.iter().enumerate() {
                assert!((inverse[(i, j)] - entry).abs() < 1e-9);
            }
        }
        assert!((factor.log_determinant() + 2160f64.ln()).abs() < 1e-12);
        let x = factor.solve(&[1.0, 0.0, 0.0]);
        assert!((x[1] + 36.0).abs() < 1e-9);
    }

    #[test]
    fn what_is_not_positive_has_no_factor() {
        let flat = Matrix::from_fn(2, 2, |_, _| 1.0);
        assert!(flat.cholesky().is_none());
    }
}
