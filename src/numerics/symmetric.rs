//! Small symmetric systems: Cholesky solution, eigenvalues by Jacobi rotations, damped pseudo-inverse.

/// A symmetric matrix of small size, stored in full, row by row.
#[derive(Debug, Clone, PartialEq)]
pub struct Symmetric {
    size: usize,
    entries: Vec<f64>,
}

impl Symmetric {
    /// All zero.
    pub fn zeros(size: usize) -> Self {
        Self { size, entries: vec![0.0; size * size] }
    }

    /// Number of rows.
    pub fn size(&self) -> usize {
        self.size
    }

    /// One entry.
    pub fn get(&self, row: usize, column: usize) -> f64 {
        self.entries[row * self.size + column]
    }

    /// Adds to an entry and to its mirror image (once on the diagonal).
    pub fn add(&mut self, row: usize, column: usize, value: f64) {
        self.entries[row * self.size + column] += value;
        if row != column {
            self.entries[column * self.size + row] += value;
        }
    }

    /// Sum of the diagonal.
    pub fn trace(&self) -> f64 {
        (0..self.size).map(|index| self.get(index, index)).sum()
    }

    /// Lower Cholesky factor, or `None` when the matrix is not positive definite.
    pub fn cholesky(&self) -> Option<Vec<f64>> {
        let size = self.size;
        let mut factor = vec![0.0; size * size];
        for row in 0..size {
            for column in 0..=row {
                let mut sum = self.get(row, column);
                for inner in 0..column {
                    sum -= factor[row * size + inner] * factor[column * size + inner];
                }
                if row == column {
                    if sum.is_nan() || sum <= 0.0 {
                        return None;
                    }
                    factor[row * size + row] = sum.sqrt();
                } else {
                    factor[row * size + column] = sum / factor[column * size + column];
                }
            }
        }
        Some(factor)
    }

    /// Solution of `self * x = right` for a positive definite matrix, or `None`.
    pub fn solve(&self, right: &[f64]) -> Option<Vec<f64>> {
        let factor = self.cholesky()?;
        Some(solve_factored(&factor, self.size, right))
    }

    /// Eigenvalues and eigenvectors (one per row, in step with the values) by cyclic Jacobi rotations.
    pub fn eigen(&self) -> (Vec<f64>, Vec<Vec<f64>>) {
        let size = self.size;
        let mut a = self.entries.clone();
        let mut vectors: Vec<Vec<f64>> =
            (0..size).map(|row| (0..size).map(|column| f64::from(u8::from(row == column))).collect()).collect();
        for _sweep in 0..60 {
            let mut off = 0.0;
            let mut on = 0.0;
            for row in 0..size {
                on += a[row * size + row] * a[row * size + row];
                for column in 0..row {
                    off += a[row * size + column] * a[row * size + column];
                }
            }
            if off <= 1e-28 * on.max(f64::MIN_POSITIVE) {
                break;
            }
            for p in 0..size {
                for q in p + 1..size {
                    rotate(&mut a, &mut vectors, size, p, q);
                }
            }
        }
        ((0..size).map(|index| a[index * size + index]).collect(), vectors)
    }

    /// Pseudo-inverse: directions whose eigenvalue is below `relative_cut` of the largest are left out.
    #[must_use]
    pub fn pseudo_inverse(&self, relative_cut: f64) -> Self {
        let (values, vectors) = self.eigen();
        let largest = values.iter().fold(0.0_f64, |largest, value| largest.max(value.abs()));
        let mut inverse = Self::zeros(self.size);
        for (value, vector) in values.iter().zip(&vectors) {
            if value.abs() <= relative_cut * largest || value.abs() <= f64::MIN_POSITIVE {
                continue;
            }
            for row in 0..self.size {
                for column in 0..=row {
                    inverse.add(row, column, vector[row] * vector[column] / value);
                }
            }
        }
        inverse
    }

    /// Product with a vector.
    pub fn times(&self, vector: &[f64]) -> Vec<f64> {
        (0..self.size).map(|row| (0..self.size).map(|column| self.get(row, column) * vector[column]).sum()).collect()
    }
}

/// Solution with a lower Cholesky factor (row by row).
pub fn solve_factored(factor: &[f64], size: usize, right: &[f64]) -> Vec<f64> {
    let mut solution = right.to_vec();
    for row in 0..size {
        for inner in 0..row {
            solution[row] -= factor[row * size + inner] * solution[inner];
        }
        solution[row] /= factor[row * size + row];
    }
    for row in (0..size).rev() {
        for inner in row + 1..size {
            solution[row] -= factor[inner * size + row] * solution[inner];
        }
        solution[row] /= factor[row * size + row];
    }
    solution
}

fn rotate(a: &mut [f64], vectors: &mut [Vec<f64>], size: usize, p: usize, q: usize) {
    let off = a[p * size + q];
    if off.abs() < f64::MIN_POSITIVE {
        return;
    }
    let theta = (a[q * size + q] - a[p * size + p]) / (2.0 * off);
    let tangent = theta.signum() / (theta.abs() + (theta * theta + 1.0).sqrt());
    let cosine = 1.0 / (tangent * tangent + 1.0).sqrt();
    let sine = tangent * cosine;
    for k in 0..size {
        let (kp, kq) = (a[k * size + p], a[k * size + q]);
        a[k * size + p] = cosine * kp - sine * kq;
        a[k * size + q] = sine * kp + cosine * kq;
    }
    for k in 0..size {
        let (pk, qk) = (a[p * size + k], a[q * size + k]);
        a[p * size + k] = cosine * pk - sine * qk;
        a[q * size + k] = sine * pk + cosine * qk;
    }
    let (before, from_q) = vectors.split_at_mut(q);
    for (vp, vq) in before[p].iter_mut().zip(&mut from_q[0]) {
        (*vp, *vq) = (cosine * *vp - sine * *vq, sine * *vp + cosine * *vq);
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn example() -> Symmetric {
        let mut matrix = Symmetric::zeros(3);
        for (row, column, value) in [(0, 0, 4.0), (1, 1, 3.0), (2, 2, 2.0), (1, 0, 1.0), (2, 0, -0.5), (2, 1, 0.25)] {
            matrix.add(row, column, value);
        }
        matrix
    }

    #[test]
    fn solution_and_inverse_undo_the_product() {
        let matrix = example();
        let truth = [1.0, -2.0, 0.5];
        let right = matrix.times(&truth);
        let solved = matrix.solve(&right).unwrap();
        let inverted = matrix.pseudo_inverse(1e-12).times(&right);
        for index in 0..3 {
            assert!((solved[index] - truth[index]).abs() < 1e-12);
            assert!((inverted[index] - truth[index]).abs() < 1e-12);
        }
    }

    #[test]
    fn eigenvalues_keep_trace_and_pairs() {
        let matrix = example();
        let (values, vectors) = matrix.eigen();
        assert!((values.iter().sum::<f64>() - matrix.trace()).abs() < 1e-12);
        for (value, vector) in values.iter().zip(&vectors) {
            for (image, entry) in matrix.times(vector).iter().zip(vector) {
                assert!((image - value * entry).abs() < 1e-10);
            }
        }
    }

    #[test]
    fn a_matrix_that_is_not_positive_definite_is_refused() {
        let mut matrix = Symmetric::zeros(2);
        matrix.add(0, 1, 1.0);
        assert_eq!(matrix.solve(&[1.0, 1.0]), None);
    }
}
