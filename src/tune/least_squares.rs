//! Least squares with bounds: Levenberg–Marquardt (Marquardt, J. SIAM 11, 431 (1963)) on the free variables, with the
//! trial projected into the box (Kanzow, Yamashita and Fukushima, J. Comput. Appl. Math. 172, 375 (2004)).
//!
//! Variables run from 0 to 1. The cost is half the sum of the squared residuals.

use argmin::core::{
    ArgminError, Error, IterState, Jacobian, KV, Operator, Problem, Solver, TerminationReason,
    TerminationStatus,
};
use nalgebra::{DMatrix, DVector};

/// The solver's tuning numbers.
#[derive(Clone, Debug)]
pub struct BoundedLeastSquares {
    /// Damping at the start, relative to the diagonal of JᵀJ.
    pub damping: f64,
    /// The search ends when no variable moves by more than this part of its range.
    pub smallest_step: f64,
    /// The search ends when the projected gradient falls below this.
    pub smallest_gradient: f64,
    /// The search ends when the cost falls below this, or by less than this part of itself in a step.
    pub smallest_cost: f64,
    pub smallest_gain: f64,
    /// Trials with growing damping before a point is taken as the minimum.
    pub max_trials: usize,
    converged: bool,
}

impl Default for BoundedLeastSquares {
    fn default() -> Self {
        Self {
            damping: 1e-3,
            smallest_step: 1e-9,
            smallest_gradient: 1e-11,
            smallest_cost: 1e-14,
            smallest_gain: 1e-5,
            max_trials: 25,
            converged: false,
        }
    }
}

impl BoundedLeastSquares {
    /// Good enough to rank designs by their cost.
    pub fn rough() -> Self {
        Self {
            smallest_step: 1e-6,
            smallest_gain: 1e-2,
            max_trials: 4,
            ..Self::default()
        }
    }
}

/// The state that argmin keeps for this solver.
pub type Progress = IterState<DVector<f64>, (), DMatrix<f64>, (), DVector<f64>, f64>;

impl<O> Solver<O, Progress> for BoundedLeastSquares
where
    O: Operator<Param = DVector<f64>, Output = DVector<f64>>
        + Jacobian<Param = DVector<f64>, Jacobian = DMatrix<f64>>,
{
    fn name(&self) -> &str {
        "bounded least squares"
    }

    fn init(
        &mut self,
        problem: &mut Problem<O>,
        mut state: Progress,
    ) -> Result<(Progress, Option<KV>), Error> {
        let start = state.take_param().ok_or(ArgminError::NotInitialized {
            text: "no start was given".into(),
        })?;
        let residuals = problem.apply(&start)?;
        let cost = 0.5 * residuals.norm_squared();
        Ok((state.param(start).residuals(residuals).cost(cost), None))
    }

    fn next_iter(
        &mut self,
        problem: &mut Problem<O>,
        mut state: Progress,
    ) -> Result<(Progress, Option<KV>), Error> {
        let lost = || ArgminError::PotentialBug {
            text: "the state lost its point".into(),
        };
        let point = state.take_param().ok_or_else(lost)?;
        let residuals = state.take_residuals().ok_or_else(lost)?;
        let cost = state.get_cost();
        let jacobian = problem.jacobian(&point)?;
        let gradient = jacobian.tr_mul(&residuals);
        // A variable at a bound that the descent pushes outwards stays there.
        let free: Vec<usize> = (0..point.len())
            .filter(|&k| {
                !(point[k] <= 0.0 && gradient[k] > 0.0 || point[k] >= 1.0 && gradient[k] < 0.0)
            })
            .collect();
        let steepest = free.iter().map(|&k| gradient[k].abs()).fold(0.0, f64::max);
        if steepest <= self.smallest_gradient {
            self.converged = true;
            return Ok((state.param(point).residuals(residuals).cost(cost), None));
        }
        let free_jacobian = jacobian.select_columns(&free);
        let normal = free_jacobian.tr_mul(&free_jacobian);
        let descent = -free_jacobian.tr_mul(&residuals);
        let largest = normal.diagonal().max().max(f64::MIN_POSITIVE);
        for _ in 0..self.max_trials {
            let mut damped = normal.clone();
            for k in 0..free.len() {
                damped[(k, k)] += self.damping * normal[(k, k)].max(1e-6 * largest);
            }
            let Some(step) = damped.cholesky().map(|c| c.solve(&descent)) else {
                self.damping *= 4.0;
                continue;
            };
            let mut trial = point.clone();
            for (&k, s) in free.iter().zip(step.iter()) {
                trial[k] = (point[k] + s).clamp(0.0, 1.0);
            }
            let moved = (&trial - &point).amax();
            let trial_residuals = problem.apply(&trial)?;
            let trial_cost = 0.5 * trial_residuals.norm_squared();
            if trial_cost < cost {
                self.damping = (self.damping / 5.0).max(1e-12);
                self.converged = moved < self.smallest_step
                    || trial_cost < self.smallest_cost
                    || cost - trial_cost < self.smallest_gain * cost;
                return Ok((
                    state
                        .param(trial)
                        .residuals(trial_residuals)
                        .cost(trial_cost),
                    None,
                ));
            }
            if moved < self.smallest_step {
                break;
            }
            self.damping *= 4.0;
        }
        self.converged = true;
        Ok((state.param(point).residuals(residuals).cost(cost), None))
    }

    fn terminate(&mut self, _state: &Progress) -> TerminationStatus {
        if self.converged {
            TerminationStatus::Terminated(TerminationReason::SolverConverged)
        } else {
            TerminationStatus::NotTerminated
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use argmin::core::Executor;
    use nalgebra::{dmatrix, dvector};

    /// Rosenbrock's function (Comput. J. 3, 175 (1960)) on x, y = 4u − 2: minimum at (1, 1).
    struct Rosenbrock;

    impl Operator for Rosenbrock {
        type Param = DVector<f64>;
        type Output = DVector<f64>;
        fn apply(&self, u: &DVector<f64>) -> Result<DVector<f64>, Error> {
            let (x, y) = (4.0 * u[0] - 2.0, 4.0 * u[1] - 2.0);
            Ok(dvector![10.0 * (y - x * x), 1.0 - x])
        }
    }

    impl Jacobian for Rosenbrock {
        type Param = DVector<f64>;
        type Jacobian = DMatrix<f64>;
        fn jacobian(&self, u: &DVector<f64>) -> Result<DMatrix<f64>, Error> {
            let x = 4.0 * u[0] - 2.0;
            Ok(dmatrix![-80.0 * x, 40.0; -4.0, 0.0])
        }
    }

    fn minimum(start: DVector<f64>) -> DVector<f64> {
        let run = Executor::new(Rosenbrock, BoundedLeastSquares::default())
            .configure(|state| state.param(start).max_iters(200))
            .timer(false)
            .run()
            .unwrap();
        run.state.best_param.unwrap()
    }

    #[test]
    fn finds_the_minimum_inside_and_the_best_point_of_a_box() {
        let inside = minimum(dvector![0.2, 0.75]);
        assert!((inside - dvector![0.75, 0.75]).amax() < 1e-7);
        // From a corner the path hugs the bounds.
        let from_corner = minimum(dvector![0.0, 0.0]);
        assert!((from_corner - dvector![0.75, 0.75]).amax() < 1e-7);
    }
}
