//! The eigenproblem of a [`Pencil`] on a line that goes on for ever: x(z + L) = e^{iφ} x(z), and A x′ likewise.
//!
//! The inner nodes are eliminated (static condensation), which leaves a real symmetric 2 × 2 matrix D(λ) on the two end
//! nodes. With x = 1 at the start and e^{iφ} at the end the condition is
//!
//! S(λ, φ) = D₁₁ + D₂₂ + 2 D₁₂ cos φ = 0.
//!
//! The levels below λ are those of the inner problem, with x = 0 at both ends, and one more where S is negative: by
//! Sylvester's law of inertia, as in Wittrick and Williams, Q. J. Mech. Appl. Math. 24, 263 (1971). No level is missed,
//! and poles of A and graded coefficients change nothing.

use super::banded::Factored;
use super::pencil::{Pencil, dot};

/// The problem at one λ with its inner nodes eliminated.
#[derive(Clone, Debug)]
pub struct Condensed {
    /// D₁₁, D₁₂ and D₂₂.
    pub ends: [f64; 3],
    /// Levels below λ of the problem with both ends held at zero.
    inner: usize,
    /// The solutions inside that are 1 at one end and 0 at the other: at the start, at the end.
    from_start: Vec<f64>,
    from_end: Vec<f64>,
    /// Their products under N(λ, λ): start with start, start with end, end with end.
    norms: [f64; 3],
}

/// A solution as real and imaginary part.
#[derive(Clone, Debug)]
pub struct Wave {
    pub value: f64,
    pub real: Vec<f64>,
    pub imaginary: Vec<f64>,
}

impl Condensed {
    pub fn at(pencil: &Pencil, lambda: f64) -> Condensed {
        let mut matrix = pencil.storage();
        pencil.assemble(lambda, &mut matrix);
        let factored = matrix.factor();
        let last = pencil.mesh.node_count() - 1;
        let (start_image, from_start) = solution(pencil, lambda, &factored, 0);
        let (end_image, from_end) = solution(pencil, lambda, &factored, last);
        let norm = |x: &[f64], y: &[f64]| pencil.inner(lambda, x, lambda, y);
        Condensed {
            ends: [
                dot(&start_image, &from_start),
                dot(&start_image, &from_end),
                dot(&end_image, &from_end),
            ],
            inner: factored.negative(),
            norms: [
                norm(&from_start, &from_start),
                norm(&from_start, &from_end),
                norm(&from_end, &from_end),
            ],
            from_start,
            from_end,
        }
    }

    /// S(λ, φ).
    pub fn condition(&self, phase: f64) -> f64 {
        self.ends[0] + self.ends[2] + 2.0 * self.ends[1] * phase.cos()
    }

    /// −∂S/∂λ: the norm of the solution that is 1 at the start.
    pub fn norm(&self, phase: f64) -> f64 {
        self.norms[0] + self.norms[2] + 2.0 * self.norms[1] * phase.cos()
    }

    /// The number of levels below λ at a phase.
    pub fn count(&self, phase: f64) -> usize {
        self.inner + usize::from(self.condition(phase) < 0.0)
    }

    /// The phase from 0 to π at which λ is a level; `None` in a gap.
    pub fn phase(&self) -> Option<f64> {
        let cosine = -(self.ends[0] + self.ends[2]) / (2.0 * self.ends[1]);
        (cosine.abs() <= 1.0).then(|| cosine.acos())
    }

    /// dλ/dφ of a level, by implicit differentiation of S = 0.
    pub fn slope(&self, phase: f64) -> f64 {
        -2.0 * self.ends[1] * phase.sin() / self.norm(phase)
    }

    /// d²λ/dφ² of a level at φ = 0 or π, where its slope vanishes.
    pub fn curvature(&self, phase: f64) -> f64 {
        -2.0 * self.ends[1] * phase.cos() / self.norm(phase)
    }

    /// The solution at a level, normalised under N over the line.
    pub fn wave(&self, lambda: f64, phase: f64) -> Wave {
        let scale = 1.0 / self.norm(phase).sqrt();
        let (sin, cos) = phase.sin_cos();
        // The sine of π is zero, not a rounding error.
        let sin = if sin.abs() < 1e-15 { 0.0 } else { sin };
        let pairs = || self.from_start.iter().zip(&self.from_end);
        Wave {
            value: lambda,
            real: pairs().map(|(s, e)| scale * (s + cos * e)).collect(),
            imaginary: pairs().map(|(_, e)| scale * sin * e).collect(),
        }
    }
}

/// T times the unit vector of an end node, and the solution inside that is 1 there and 0 at the other end.
fn solution(pencil: &Pencil, lambda: f64, factored: &Factored, end: usize) -> (Vec<f64>, Vec<f64>) {
    let count = pencil.mesh.node_count();
    let mut unit = vec![0.0; count];
    unit[end] = 1.0;
    let image = pencil.times_with_ends(lambda, &unit);
    let mut x: Vec<f64> = image.iter().map(|v| -v).collect();
    factored.solve(&mut x[1..count - 1]);
    x[0] = unit[0];
    x[count - 1] = unit[count - 1];
    (image, x)
}

/// Steps of a search, beyond which the bracket is as narrow as rounding allows.
const MOST_STEPS: usize = 200;
/// A Newton step below this part of the searched range is the last one: the next would be its square.
const LAST_STEP: f64 = 1e-9;

/// Level number `k`, counted from 1, at a phase from 0 to π, between two values with fewer and not fewer levels below.
pub fn level(pencil: &Pencil, k: usize, phase: f64, [low, high]: [f64; 2]) -> f64 {
    let range = high - low;
    let (mut low, mut high) = (low, high);
    let mut next = 0.5 * (low + high);
    for _ in 0..MOST_STEPS {
        let condensed = Condensed::at(pencil, next);
        if condensed.count(phase) < k {
            low = next;
        } else {
            high = next;
        }
        // Between two levels of the inner problem S falls from +∞ to −∞, and has this level's zero.
        let step = condensed.condition(phase) / condensed.norm(phase);
        let newton = next + step;
        let alone = condensed.inner + 1 == k;
        if alone && newton >= low && newton <= high {
            if step.abs() < LAST_STEP * range {
                return newton;
            }
            next = newton;
        } else {
            next = 0.5 * (low + high);
        }
        if high - low <= 4.0 * f64::EPSILON * range.max(next.abs()) {
            break;
        }
    }
    next
}

/// Values with no level below, and with at least `count` levels below at any phase.
pub fn bracket(pencil: &Pencil, count: usize) -> [f64; 2] {
    let floor = pencil.floor();
    let mut high = pencil.weyl_estimate(count as f64 + 0.5);
    for _ in 0..100 {
        if Condensed::at(pencil, high).inner >= count {
            break;
        }
        high = floor + 1.3 * (high - floor);
    }
    [floor - 1e-3 * (high - floor), high]
}

#[cfg(test)]
mod tests {
    use super::super::mesh::Mesh;
    use super::super::pencil::Coefficient;
    use super::*;
    use std::f64::consts::PI;

    /// −x″ = λ x without a border: λ = (φ + 2π n)², all phases.
    #[test]
    fn a_uniform_line_has_the_squares_of_all_wave_numbers() {
        let pencil = Pencil::new(Mesh::new(&[0.7, 0.3], &[2, 1], 12), |_, _, _| Coefficient {
            stiffness: 1.0,
            poles: [None; 2],
            constant: 0.0,
        });
        let range = bracket(&pencil, 5);
        for phase in [0.0, 0.3, 1.0, 2.5, PI] {
            let mut exact: Vec<f64> = (-3..=3)
                .map(|n| (phase + 2.0 * PI * f64::from(n)).powi(2))
                .collect();
            exact.sort_by(f64::total_cmp);
            for k in 1..=5 {
                let found = level(&pencil, k, phase, range);
                assert!(
                    (found - exact[k - 1]).abs() < 1e-7 * exact[k - 1].max(1.0),
                    "{k} at {phase}: {found} for {}",
                    exact[k - 1]
                );
            }
        }
    }
}
