//! A stack at given values of its variables, solved and set against the aims.

use super::aim::{Aim, Goal};
use crate::models::{BandOperator, Unsuitable};
use crate::numerics::sensitivity::{
    Change, PairSlope, moment, moment_slope, pair_slopes, value_slope,
};
use crate::structure::{ConductionModel, Knob, Stack};
use crate::subbands::{self, Accuracy, Subbands, change};
use nalgebra::{DMatrix, DVector};

/// One variable with its bounds, in inner units.
#[derive(Clone, Debug, PartialEq)]
pub struct Variable {
    pub knob: Knob,
    pub low: f64,
    pub high: f64,
    /// How messages call it: `width of well`.
    pub name: String,
}

impl Variable {
    /// From the unit interval of the search to the variable's own.
    pub fn from_unit(&self, u: f64) -> f64 {
        // The ends are given back exactly: bounds are honoured to the last bit.
        if u >= 1.0 {
            self.high
        } else {
            self.low + u.max(0.0) * (self.high - self.low)
        }
    }

    pub fn to_unit(&self, value: f64) -> f64 {
        ((value - self.low) / (self.high - self.low)).clamp(0.0, 1.0)
    }
}

/// Everything that stays the same during a search.
#[derive(Clone, Debug)]
pub struct Task {
    pub stack: Stack,
    pub model: ConductionModel,
    pub variables: Vec<Variable>,
    pub aims: Vec<Aim>,
    pub accuracy: Accuracy,
    /// Number of states to solve for.
    pub count: usize,
}

/// A solved design.
#[derive(Clone, Debug)]
pub struct Design {
    pub stack: Stack,
    pub subbands: Subbands,
    /// The pair of states that each aim speaks of here.
    pub states: Vec<(usize, usize)>,
    /// Energy in eV or dipole in nm of each aim.
    pub values: Vec<f64>,
    pub residuals: DVector<f64>,
}

impl Design {
    /// Half the sum of the squared residuals.
    pub fn cost(&self) -> f64 {
        0.5 * self.residuals.norm_squared()
    }
}

/// Envelopes of the states that aims by character speak of.
pub type Characters = Vec<Vec<f64>>;

/// States beyond the highest that an aim names, so that a followed state is still among the solved after crossings.
const SPARE_STATES: usize = 3;

impl Task {
    /// Number of states that the aims need.
    pub fn states_needed(aims: &[Aim]) -> usize {
        let highest = aims
            .iter()
            .map(|aim| aim.from.max(aim.to) + 1)
            .max()
            .unwrap_or(1);
        if aims.iter().any(|aim| aim.by_character) {
            highest + SPARE_STATES
        } else {
            highest
        }
    }

    /// The variables as they stand in the file's stack, on the unit interval.
    pub fn start(&self) -> DVector<f64> {
        DVector::from_iterator(
            self.variables.len(),
            self.variables
                .iter()
                .map(|v| v.to_unit(v.knob.value(&self.stack).unwrap_or(v.low))),
        )
    }

    /// The stack with the variables set.
    pub fn stack_at(&self, u: &DVector<f64>) -> Stack {
        let mut stack = self.stack.clone();
        for (variable, &u) in self.variables.iter().zip(u.iter()) {
            variable.knob.set(&mut stack, variable.from_unit(u));
        }
        stack
    }

    /// Solves a stack. `characters` are the envelopes that aims by character look for; without them the states are
    /// taken by their order.
    pub fn design(
        &self,
        stack: Stack,
        characters: Option<&Characters>,
    ) -> Result<Design, (usize, Unsuitable)> {
        let operator = BandOperator::conduction(&stack, self.model)?;
        let subbands = subbands::solve(&operator, self.count, self.accuracy);
        let own: Vec<Vec<f64>> = match characters {
            Some(_) => subbands::layer_envelopes(&subbands, &stack),
            None => Vec::new(),
        };
        let last = subbands.pairs.len().saturating_sub(1);
        let states: Vec<(usize, usize)> = self
            .aims
            .iter()
            .map(|aim| match characters {
                Some(wanted) if aim.by_character => {
                    let alike = |k: usize| {
                        wanted
                            .get(k)
                            .map_or(k.min(last), |envelope| most_alike(envelope, &own))
                    };
                    (alike(aim.from), alike(aim.to))
                }
                _ => (aim.from.min(last), aim.to.min(last)),
            })
            .collect();
        let values: Vec<f64> = self
            .aims
            .iter()
            .zip(&states)
            .map(|(aim, &(from, to))| match aim.goal {
                Goal::Energy { .. } => subbands.pairs[to].value - subbands.pairs[from].value,
                _ => moment(&subbands.pencil, &subbands.pairs[from], &subbands.pairs[to]).abs(),
            })
            .collect();
        let residuals = self
            .aims
            .iter()
            .zip(&values)
            .map(|(aim, &value)| aim.weight * aim.goal.residual(value).0);
        let residuals = DVector::from_iterator(self.aims.len(), residuals);
        drop(operator);
        Ok(Design {
            stack,
            subbands,
            states,
            values,
            residuals,
        })
    }

    /// The slopes of the aims' values: one row per aim, one column per variable, per inner unit of the variable.
    pub fn value_slopes(&self, design: &Design) -> DMatrix<f64> {
        let mut slopes = DMatrix::zeros(self.aims.len(), self.variables.len());
        let Ok(operator) = BandOperator::conduction(&design.stack, self.model) else {
            return slopes;
        };
        let Subbands { pencil, pairs, .. } = &design.subbands;
        let changes: Vec<Change> = self
            .variables
            .iter()
            .map(|v| change(&operator, pencil, v.knob))
            .collect();
        let mut with_vectors: Vec<Option<Vec<PairSlope>>> = vec![None; pairs.len()];
        for (row, (aim, &(from, to))) in self.aims.iter().zip(&design.states).enumerate() {
            if aim.goal.is_energy() {
                for (column, change) in changes.iter().enumerate() {
                    slopes[(row, column)] = value_slope(pencil, change, &pairs[to])
                        - value_slope(pencil, change, &pairs[from]);
                }
                continue;
            }
            for state in [from, to] {
                if with_vectors[state].is_none() {
                    with_vectors[state] = Some(pair_slopes(pencil, &changes, &pairs[state]));
                }
            }
            if let (Some(from_slopes), Some(to_slopes)) = (&with_vectors[from], &with_vectors[to]) {
                let sign = moment(pencil, &pairs[from], &pairs[to]).signum();
                for (column, change) in changes.iter().enumerate() {
                    let (i, j) = (
                        (&pairs[from], &from_slopes[column]),
                        (&pairs[to], &to_slopes[column]),
                    );
                    slopes[(row, column)] = sign * moment_slope(pencil, change, i, j);
                }
            }
        }
        slopes
    }

    /// The slopes of the residuals on the unit intervals of the variables.
    pub fn jacobian(&self, design: &Design) -> DMatrix<f64> {
        let mut jacobian = self.value_slopes(design);
        for (row, (aim, &value)) in self.aims.iter().zip(&design.values).enumerate() {
            let outer = aim.weight * aim.goal.residual(value).1;
            jacobian.row_mut(row).scale_mut(outer);
        }
        for (column, variable) in self.variables.iter().enumerate() {
            jacobian
                .column_mut(column)
                .scale_mut(variable.high - variable.low);
        }
        jacobian
    }

    /// Whether every aim is met.
    pub fn is_met(&self, design: &Design) -> bool {
        self.aims
            .iter()
            .zip(&design.values)
            .all(|(aim, &value)| aim.goal.is_met(value))
    }
}

/// The state whose envelope overlaps most with the wanted one.
fn most_alike(wanted: &[f64], own: &[Vec<f64>]) -> usize {
    let overlap = |envelope: &Vec<f64>| {
        envelope
            .iter()
            .zip(wanted)
            .map(|(a, b)| a * b)
            .sum::<f64>()
            .abs()
    };
    (0..own.len())
        .max_by(|&a, &b| overlap(&own[a]).total_cmp(&overlap(&own[b])))
        .unwrap_or(0)
}
