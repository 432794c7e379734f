//! Symmetric banded matrices: L D Lᵀ factorisation with inertia, and solves.

/// A symmetric matrix whose column k has `reach[k]` entries below the diagonal.
///
/// Columns have a common stride, and lie one after the other: entry (k + d, k) stands at `values[k * stride + d]`.
#[derive(Clone, Debug)]
pub struct Banded {
    stride: usize,
    reach: Vec<usize>,
    values: Vec<f64>,
}

/// The factors of a [`Banded`] matrix, in its storage: D on the diagonal, L below.
#[derive(Clone, Debug)]
pub struct Factored {
    matrix: Banded,
    negative: usize,
}

/// Calls a kernel compiled for the reach of the column at hand: columns are short, and a loop of known length is unrolled
/// where one of unknown length costs more than its work. Longer columns are worked off by the kernel for any length.
macro_rules! by_reach {
    ($reach:expr, $kernel:ident($($argument:expr),*)) => {
        by_reach!(@match $reach, $kernel($($argument),*), 0 1 2 3 4 5 6 7 8 9 10 11 12 13 14)
    };
    (@match $reach:expr, $kernel:ident $arguments:tt, $($length:literal)*) => {
        match $reach {
            $($length => by_reach!(@call $kernel, $length, $arguments),)*
            _ => by_reach!(@call $kernel, ANY, $arguments),
        }
    };
    (@call $kernel:ident, $length:expr, ($($argument:expr),*)) => {
        $kernel::<{ $length }>($($argument),*)
    };
}

/// The length of a kernel that takes it from its slice.
const ANY: usize = usize::MAX;

/// One column's step of the factorisation: the columns in `tail` lose its outer product, and it becomes a column of L.
#[inline]
fn eliminate<const REACH: usize>(below: &mut [f64], inverse: f64, tail: &mut [f64], stride: usize) {
    let reach = if REACH == ANY { below.len() } else { REACH };
    let below = &mut below[..reach];
    for r in 0..reach {
        let factor = below[r] * inverse;
        let target = &mut tail[r * stride..][..reach - r];
        for d in 0..reach - r {
            target[d] -= factor * below[r + d];
        }
    }
    for value in below {
        *value *= inverse;
    }
}

/// x ← x − factor · column, as far as the column reaches.
#[inline]
fn subtract<const REACH: usize>(below: &[f64], factor: f64, x: &mut [f64]) {
    let reach = if REACH == ANY { below.len() } else { REACH };
    let (below, x) = (&below[..reach], &mut x[..reach]);
    for d in 0..reach {
        x[d] -= factor * below[d];
    }
}

/// column · x, as far as the column reaches.
#[inline]
fn product<const REACH: usize>(below: &[f64], x: &[f64]) -> f64 {
    let reach = if REACH == ANY { below.len() } else { REACH };
    let (below, x) = (&below[..reach], &x[..reach]);
    let mut sum = 0.0;
    // The nearest is the last to be known in a back substitution: it is waited for last.
    for d in (0..reach).rev() {
        sum += below[d] * x[d];
    }
    sum
}

impl Banded {
    /// A zero matrix with these reaches. A reach beyond the last row is cut.
    pub fn zeros(mut reach: Vec<usize>) -> Banded {
        let size = reach.len();
        for (k, r) in reach.iter_mut().enumerate() {
            *r = (*r).min(size - 1 - k);
        }
        let stride = reach.iter().max().map_or(1, |r| r + 1);
        Banded {
            stride,
            values: vec![0.0; stride * size],
            reach,
        }
    }

    pub fn size(&self) -> usize {
        self.reach.len()
    }

    pub fn clear(&mut self) {
        self.values.fill(0.0);
    }

    /// The entries (k, k), (k + 1, k) … of column k.
    #[inline]
    pub fn column_mut(&mut self, k: usize) -> &mut [f64] {
        let start = k * self.stride;
        &mut self.values[start..=start + self.reach[k]]
    }

    /// The product with a vector.
    pub fn times(&self, x: &[f64]) -> Vec<f64> {
        let mut y = vec![0.0; x.len()];
        for k in 0..self.size() {
            let column = &self.values[k * self.stride..=k * self.stride + self.reach[k]];
            y[k] += column[0] * x[k];
            for (d, &value) in column.iter().enumerate().skip(1) {
                y[k + d] += value * x[k];
                y[k] += value * x[k + d];
            }
        }
        y
    }

    /// Makes row and column k those of the unit matrix.
    pub fn pin(&mut self, k: usize) {
        let stride = self.stride;
        for j in k.saturating_sub(stride)..k {
            if k - j <= self.reach[j] {
                self.values[j * stride + k - j] = 0.0;
            }
        }
        let column = self.column_mut(k);
        column.fill(0.0);
        column[0] = 1.0;
    }

    /// Factors the matrix as L D Lᵀ without exchanges, which keeps the band.
    ///
    /// By Sylvester's law of inertia the number of negative pivots is the number of negative eigenvalues. A pivot that
    /// vanishes within rounding is moved off zero by a rounding error's size: this changes an eigenvalue by no more.
    pub fn factor(mut self) -> Factored {
        let stride = self.stride;
        let mut negative = 0;
        let diagonal = self.values.iter().step_by(stride);
        let smallest = 1e-30 + 1e-18 * diagonal.fold(0.0_f64, |m, v| m.max(v.abs()));
        for k in 0..self.size() {
            let (head, tail) = self.values.split_at_mut((k + 1) * stride);
            let (diagonal, below) = head[k * stride..].split_at_mut(1);
            let mut pivot = diagonal[0];
            let below = &mut below[..self.reach[k]];
            if pivot.abs() < smallest {
                pivot = smallest;
                diagonal[0] = pivot;
            }
            negative += usize::from(pivot < 0.0);
            by_reach!(below.len(), eliminate(below, 1.0 / pivot, tail, stride));
        }
        Factored {
            matrix: self,
            negative,
        }
    }
}

impl Factored {
    pub fn size(&self) -> usize {
        self.matrix.size()
    }

    /// Number of negative eigenvalues.
    pub fn negative(&self) -> usize {
        self.negative
    }

    /// Solves in place.
    pub fn solve(&self, x: &mut [f64]) {
        let Banded {
            stride,
            reach,
            values,
        } = &self.matrix;
        let size = reach.len();
        for k in 0..size {
            let (head, tail) = x.split_at_mut(k + 1);
            let below = &values[k * stride + 1..=k * stride + reach[k]];
            by_reach!(below.len(), subtract(below, head[k], tail));
        }
        for k in (0..size).rev() {
            let below = &values[k * stride + 1..=k * stride + reach[k]];
            let sum = by_reach!(below.len(), product(below, &x[k + 1..]));
            x[k] = x[k] / values[k * stride] - sum;
        }
    }

    /// Gives the storage back, for the next matrix of the same shape.
    pub fn into_storage(self) -> Banded {
        self.matrix
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use nalgebra::{DMatrix, DVector, SymmetricEigen};
    use proptest::prelude::*;

    fn dense(banded: &Banded) -> DMatrix<f64> {
        let n = banded.size();
        let mut matrix = DMatrix::zeros(n, n);
        for k in 0..n {
            let mut unit = vec![0.0; n];
            unit[k] = 1.0;
            matrix.set_column(k, &DVector::from_vec(banded.times(&unit)));
        }
        matrix
    }

    proptest! {
        /// Inertia and solution against nalgebra's dense symmetric eigenvalues and LU, a general-purpose library.
        #[test]
        fn inertia_and_solution_are_those_of_the_dense_matrix(
            entries in prop::collection::vec(-1.0..1.0f64, 60),
            reach in prop::collection::vec(0usize..5, 12),
        ) {
            // A variable band without fill beyond it: the reach shrinks by one per column at most.
            let mut reach = reach;
            for k in 1..12 {
                reach[k] = reach[k].max(reach[k - 1].saturating_sub(1));
            }
            let mut banded = Banded::zeros(reach);
            let mut next = entries.into_iter();
            for k in 0..12 {
                for value in banded.column_mut(k) {
                    *value = next.next().unwrap_or(0.3);
                }
            }
            let matrix = dense(&banded);
            let eigenvalues = SymmetricEigen::new(matrix.clone()).eigenvalues;
            prop_assume!(eigenvalues.iter().all(|e| e.abs() > 1e-6));
            let factored = banded.factor();
            prop_assert_eq!(factored.negative(), eigenvalues.iter().filter(|e| **e < 0.0).count());
            let right: Vec<f64> = (0..12).map(|k| (k as f64).sin()).collect();
            let mut x = right.clone();
            factored.solve(&mut x);
            let residual = matrix * DVector::from_vec(x.clone()) - DVector::from_vec(right);
            let size = x.iter().fold(1.0_f64, |m, v| m.max(v.abs()));
            prop_assert!(residual.amax() < 1e-6 * size, "residual {}", residual.amax());
        }
    }
}
