//! Complex symmetric banded matrices (A = Aᵀ, not Aᴴ): L D Lᵀ factorisation with the determinant, and solves.

use nalgebra::Complex;

/// A complex number.
pub type C64 = Complex<f64>;
pub const ZERO: C64 = Complex::new(0.0, 0.0);
pub const ONE: C64 = Complex::new(1.0, 0.0);
pub const I: C64 = Complex::new(0.0, 1.0);

/// A matrix of [`super::banded`]'s shape with complex entries.
#[derive(Clone, Debug)]
pub struct ComplexBanded {
    stride: usize,
    reach: Vec<usize>,
    values: Vec<C64>,
}

/// The factors: D on the diagonal, L below.
#[derive(Clone, Debug)]
pub struct ComplexFactored {
    matrix: ComplexBanded,
    pub determinant: Determinant,
}

/// A determinant as its size and its phase: it can be too large or too small for a number.
#[derive(Clone, Copy, Debug)]
pub struct Determinant {
    ln_size: f64,
    phase: C64,
}

impl Determinant {
    /// ln(other / self), the phase between −π and π.
    pub fn step_to(&self, other: &Determinant) -> C64 {
        Complex::new(
            other.ln_size - self.ln_size,
            (other.phase * self.phase.conj()).arg(),
        )
    }
}

impl ComplexBanded {
    /// A zero matrix whose column k has `reach[k]` entries below the diagonal. A reach beyond the last row is cut.
    pub fn zeros(mut reach: Vec<usize>) -> ComplexBanded {
        let size = reach.len();
        for (k, r) in reach.iter_mut().enumerate() {
            *r = (*r).min(size - 1 - k);
        }
        let stride = reach.iter().max().map_or(1, |r| r + 1);
        ComplexBanded {
            stride,
            values: vec![ZERO; stride * size],
            reach,
        }
    }

    pub fn size(&self) -> usize {
        self.reach.len()
    }

    /// The entries (k, k), (k + 1, k) … of column k.
    #[inline]
    pub fn column_mut(&mut self, k: usize) -> &mut [C64] {
        let start = k * self.stride;
        &mut self.values[start..=start + self.reach[k]]
    }

    /// Makes row and column k those of the unit matrix.
    pub fn pin(&mut self, k: usize) {
        let stride = self.stride;
        for j in k.saturating_sub(stride)..k {
            if k - j <= self.reach[j] {
                self.values[j * stride + k - j] = ZERO;
            }
        }
        let column = self.column_mut(k);
        column.fill(ZERO);
        column[0] = ONE;
    }

    /// Factors the matrix as L D Lᵀ without exchanges, which keeps the band. A pivot that vanishes within rounding is
    /// moved off zero by a rounding error's size.
    pub fn factor(mut self) -> ComplexFactored {
        let stride = self.stride;
        let diagonal = self.values.iter().step_by(stride);
        let smallest = 1e-30 + 1e-18 * diagonal.fold(0.0_f64, |m, v| m.max(v.norm()));
        let (mut ln_size, mut phase) = (0.0, ONE);
        for k in 0..self.size() {
            let reach = self.reach[k];
            let (head, tail) = self.values.split_at_mut((k + 1) * stride);
            let (diagonal, below) = head[k * stride..].split_at_mut(1);
            let below = &mut below[..reach];
            if diagonal[0].norm() < smallest {
                diagonal[0] = Complex::new(smallest, 0.0);
            }
            let pivot = diagonal[0];
            let size = pivot.norm();
            ln_size += size.ln();
            phase *= pivot / size;
            // The phase is a product of many: its size must not drift.
            phase /= phase.norm();
            let inverse = pivot.inv();
            for r in 0..reach {
                let factor = below[r] * inverse;
                let target = &mut tail[r * stride..][..reach - r];
                for (value, other) in target.iter_mut().zip(&below[r..]) {
                    *value -= factor * other;
                }
            }
            for value in below {
                *value *= inverse;
            }
        }
        ComplexFactored {
            matrix: self,
            determinant: Determinant { ln_size, phase },
        }
    }
}

impl ComplexFactored {
    /// Solves in place.
    pub fn solve(&self, x: &mut [C64]) {
        let ComplexBanded {
            stride,
            reach,
            values,
        } = &self.matrix;
        let size = reach.len();
        for k in 0..size {
            let (head, tail) = x.split_at_mut(k + 1);
            let factor = head[k];
            let below = &values[k * stride + 1..=k * stride + reach[k]];
            for (value, l) in tail.iter_mut().zip(below) {
                *value -= factor * l;
            }
        }
        for k in (0..size).rev() {
            let below = &values[k * stride + 1..=k * stride + reach[k]];
            let (head, tail) = x.split_at_mut(k + 1);
            let mut value = head[k] / values[k * stride];
            for (other, l) in tail.iter().zip(below) {
                value -= l * other;
            }
            head[k] = value;
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use nalgebra::{DMatrix, DVector};
    use proptest::prelude::*;

    proptest! {
        /// Solution and determinant against nalgebra's dense LU, a general-purpose library.
        #[test]
        fn solution_and_determinant_are_those_of_the_dense_matrix(
            entries in prop::collection::vec((-1.0..1.0f64, -1.0..1.0f64), 48),
            reach in prop::collection::vec(0usize..4, 12),
        ) {
            // A variable band without fill beyond it: the reach shrinks by one per column at most.
            let mut reach = reach;
            for k in 1..12 {
                reach[k] = reach[k].max(reach[k - 1].saturating_sub(1));
            }
            let mut banded = ComplexBanded::zeros(reach);
            let mut dense = DMatrix::zeros(12, 12);
            let mut next = entries.into_iter();
            for k in 0..12 {
                for (d, value) in banded.column_mut(k).iter_mut().enumerate() {
                    let (re, im) = next.next().unwrap_or((0.3, 0.1));
                    // A heavy diagonal keeps the pivots of both methods away from zero.
                    *value = Complex::new(re + if d == 0 { 4.0 } else { 0.0 }, im);
                    dense[(k, k + d)] = *value;
                    dense[(k + d, k)] = *value;
                }
            }
            let factored = banded.factor();
            let lu = dense.clone().lu();
            let determinant = lu.determinant();
            prop_assert!((factored.determinant.ln_size - determinant.norm().ln()).abs() < 1e-10);
            prop_assert!((factored.determinant.phase - determinant / determinant.norm()).norm() < 1e-10);
            let right: Vec<C64> = (0..12).map(|k| Complex::new((k as f64).sin(), 0.2)).collect();
            let mut x = right.clone();
            factored.solve(&mut x);
            let residual = dense * DVector::from_vec(x) - DVector::from_vec(right);
            prop_assert!(residual.iter().all(|r| r.norm() < 1e-10));
        }
    }
}
